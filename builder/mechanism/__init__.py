"""The rule engine: knows substrates and conditions, not files or pages."""
