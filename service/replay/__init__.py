"""A whole record, run through the detector as if it arrived one count at a time."""
