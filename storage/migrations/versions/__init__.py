"""One file for each version of the tables."""
