"""What can be wrong with a record."""
