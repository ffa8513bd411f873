"""Tell: put shifts into words and figures, and into the outbox."""
