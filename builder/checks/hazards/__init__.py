"""Hazards of a record: what must not meet, what is dangerous by itself, what forms, and what a review covers.

Tables hold the facts, functions the judgement. It is a screen, never a clearance: local rules and qualified people
decide.
"""
