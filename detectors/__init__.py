"""The numerics: pure functions of counts, with no clock, file, socket or log line."""
