"""Cut a molecule at a site into substituents; positions; canonical names of groups."""
