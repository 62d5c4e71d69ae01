"""Builds a synthesis group's handbook of substitution and elimination conditions from reviewed records."""
