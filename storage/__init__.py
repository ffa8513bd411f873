"""What is kept: readings, posteriors, shifts, deliveries."""
