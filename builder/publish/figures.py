"""Formulae, counts and lists as a reader wants to see them."""

import re
from collections.abc import Iterable

__all__ = ["capital", "formula_parts", "how_many", "joined"]

_FORMULA = re.compile(r"(?P<atoms>(?:[A-Z][a-z]?\d*)+)(?P<charge>[+-]\d*)?")


def formula_parts(formula: str) -> tuple[tuple[str, str], ...]:
    """Split a molecular formula into (text, subscript) pairs; a charge is a text of its own.

    >>> formula_parts("C8H17N3")
    (('C', '8'), ('H', '17'), ('N', '3'))
    >>> formula_parts("C2H5O-")
    (('C', '2'), ('H', '5'), ('O', ''), ('-', ''))
    """
    match = _FORMULA.fullmatch(formula)
    if match is None:
        return ((formula, ""),)
    pairs = re.findall(r"([A-Z][a-z]?)(\d*)", match["atoms"])
    return (*pairs, (match["charge"], "")) if match["charge"] else tuple(pairs)


def capital(text: str) -> str:
    """Return `text` with a capital at its beginning, and the rest as it is."""
    return f"{text[:1].upper()}{text[1:]}"


def how_many(number: int, one: str, many: str) -> str:
    """Return a number with its noun.

    >>> how_many(1, "entry", "entries"), how_many(0, "entry", "entries")
    ('1 entry', '0 entries')
    """
    return f"{number} {one if number == 1 else many}"


def joined(parts: Iterable[str], joint: str = ", ") -> str:
    """Join the parts that are not empty."""
    return joint.join(part for part in parts if part)
