"""Raw error size → interval at a nominal coverage, by environment class; and: is this site like the training data?"""
