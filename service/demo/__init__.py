"""An invented house with invented counts, watched at high speed on this machine alone."""
