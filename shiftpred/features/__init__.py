"""One site → one named row, and one molecule → arrays for the environment model."""
