"""The chemists' YAML, with no chemistry in it."""
