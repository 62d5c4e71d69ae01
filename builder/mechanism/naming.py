"""Names as chemists type them: what does not count in a spelling, and an index of names that also knows near misses."""

import re
from collections.abc import Iterable, Sequence
from difflib import get_close_matches
from typing import Generic, TypeVar

from builder.table import NOTHING, refuse_twice

__all__ = ["NameIndex", "name_key", "names_in"]

Named = TypeVar("Named")

_LETTERS = str.maketrans(
    {"α": "alpha", "β": "beta", "γ": "gamma", "δ": "delta", "ü": "u", "å": "a"}
    | dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789", strict=True))
)
_NO_MATTER = re.compile(r"[\s\-‐‑‒–—−⁻⁺+±·∙,.'’′ʹ`()\[\]]+")


def name_key(name: str) -> str:
    """Return what counts in a name: no case, spaces, hyphens, charges, commas, primes or brackets."""
    return _NO_MATTER.sub("", name.casefold().translate(_LETTERS))


def names_in(cell: str) -> tuple[str, ...]:
    """Return the entries of a table cell that lists them between upright strokes."""
    return () if cell == NOTHING else tuple(cell.split("|"))


_BRACKET = r"\((?:\d*[rsez][*]?,?|[\d,]+|±|[+-]|rac)+\)"
_PREFIX = r"(?<![a-z])(?:rac|meso|cis|trans|syn|anti|endo|exo|tert|sec|iso|alpha|beta|gamma|dl|[nistompdlrsez])"
_PLACES = re.compile(rf"{_BRACKET}|{_PREFIX}(?=[-,])|(?<![a-z])\d+(?:,\d+)*(?=-)|(?<=-)\d+(?=-|$)")
"""Locants, stereodescriptors and the prefixes of branched chains: what tells isomers apart in a name."""
_DIGITS = re.compile(r"\d+")


_LENGTHS = re.compile("dodec|undec|meth|prop|pent|hept|eth|but|hex|oct|non|dec")
"""How many carbon atoms a chain has."""


def _letters(name: str) -> str:
    """Return the letters of a name, without locants, stereodescriptors and digits."""
    return _DIGITS.sub("", name_key(_PLACES.sub("", _folded(name))))


def _may_be_a_slip(typed: str, known: str) -> bool:
    """Say whether a known name is what somebody may have meant, and not that of another compound."""
    typed, known = _folded(typed), _folded(known)
    if sorted(_PLACES.findall(typed)) != sorted(_PLACES.findall(known)):
        return False
    lengths = _LENGTHS.findall(typed)
    if lengths and lengths != _LENGTHS.findall(known):
        return False
    same_digits = _DIGITS.findall(typed) == _DIGITS.findall(known)
    return bool(_letters(typed)) and (same_digits or _letters(typed) != _letters(known))


def _folded(name: str) -> str:
    return name.casefold().translate(_LETTERS).replace("−", "-").replace("‐", "-").replace("‑", "-").strip()


NEAR_MISSES = 3
"""Names that are looked at besides those with the same letters in another order."""


class NameIndex(Generic[Named]):
    """Things by each of their names.

    table: for the message of the ValueError that a name given twice raises.
    """

    def __init__(self, table: str, things: Iterable[tuple[Named, Sequence[str]]]) -> None:
        named = [(name_key(name), name, thing) for thing, names in things for name in names]
        refuse_twice(table, "name", [key for key, _, _ in named])
        self._things = {key: thing for key, _, thing in named}
        self._spellings = {key: name for key, name, _ in named}

    def find(self, name: str) -> Named | None:
        """Return the thing of that name, however it is spelled."""
        return self._things.get(name_key(name))

    def nearest(self, name: str) -> tuple[str, ...]:
        """Return known names that `name` may be a slip of, nearest first, one per thing; empty if it is known.

        Letters in the wrong order ("LAD") come first, then spellings that differ by little. Names that differ in
        locants, stereodescriptors or the length of a chain, or in nothing but digits, are other compounds, no slips.
        """
        key = name_key(name)
        if key in self._things:
            return ()
        swapped = [other for other in self._spellings if sorted(other) == sorted(key)]
        close = [*swapped, *get_close_matches(key, self._spellings, n=NEAR_MISSES, cutoff=0.8)]
        close = [other for other in close if _may_be_a_slip(name, self._spellings[other])]
        spelling_of = {id(self._things[other]): self._spellings[other] for other in reversed(close)}
        return tuple(reversed(spelling_of.values()))
