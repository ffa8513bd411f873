"""One pass for one source: read, keep, advance, record."""
