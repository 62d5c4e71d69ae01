"""Structures, what reacts in them, and what becomes of them. The only home of RDKit."""
