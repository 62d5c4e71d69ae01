"""Numbers of the fact tables: each may be missing, has a range, and a source in the column beside it."""

from collections.abc import Mapping
from types import MappingProxyType

from builder.table import NOTHING

__all__ = ["Ranges", "sourced_numbers", "sources_of"]

Ranges = Mapping[str, tuple[float, float]]
"""Lowest and highest value by name of the quantity, which is the name of its column too."""


def sourced_numbers(table: str, row: Mapping[str, str], ranges: Ranges) -> dict[str, float | None]:
    """Return the value of each quantity in a row; None where the table gives none.

    Raises ValueError for a value out of range or not finite, and for a value without a source or the reverse.
    """
    return {quantity: _number(table, row, quantity, ranges[quantity]) for quantity in ranges}


def sources_of(row: Mapping[str, str], ranges: Ranges) -> Mapping[str, str]:
    """Return the bibliography key of each quantity that the row gives."""
    return MappingProxyType({q: row[f"{q}_source"] for q in ranges if row[q] != NOTHING})


def _number(table: str, row: Mapping[str, str], quantity: str, allowed: tuple[float, float]) -> float | None:
    if (row[quantity] == NOTHING) != (row[f"{quantity}_source"] == NOTHING):
        raise ValueError(f"{table}: {row['name']}: {quantity} needs a value and a source, or neither")
    if row[quantity] == NOTHING:
        return None
    low, high = allowed
    if not low <= float(row[quantity]) <= high:
        raise ValueError(f"{table}: {row['name']}: {quantity} {row[quantity]} is out of range")
    return float(row[quantity])
