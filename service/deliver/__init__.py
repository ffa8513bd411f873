"""Deliver: take what is due from the outbox, send it, record every attempt."""
