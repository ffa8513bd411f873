"""Where counts are read: one document a round, from JSON, CSV or an SQL query."""
