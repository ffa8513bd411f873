"""Outlets: where alerts go."""
