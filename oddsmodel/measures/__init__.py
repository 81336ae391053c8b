"""What analysts report from a fitted model and from its records: one measure a file."""
