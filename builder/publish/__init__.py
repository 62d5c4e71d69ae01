"""A checked book into pages; returns text, never reads entries."""
