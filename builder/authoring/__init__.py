"""What helps people write records."""
