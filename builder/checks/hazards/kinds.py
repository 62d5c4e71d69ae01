"""Kinds of substance that cautions speak of, from substance_kinds.tsv; and which kinds a structure belongs to."""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache, lru_cache

from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure
from builder.table import NOTHING, rows_of, table_text

__all__ = ["SubstanceKind", "hazard_table", "kinds_of", "load_substance_kinds"]

_PH_RANGE = re.compile(r"pH (\d+(?:\.\d+)?)-(\d+(?:\.\d+)?)")
_HYDROGEN_HALIDES = frozenset({"Cl", "Br", "I"})


@dataclass(frozen=True, slots=True)
class SubstanceKind:
    """One row of substance_kinds.tsv.

    other_things: names inside which its words do not count. scope_words: by which a safety review names it, beside
    its words.
    """

    name: str
    fragments: tuple[Fragment, ...]
    words: tuple[str, ...]
    other_things: tuple[str, ...]
    scope_words: tuple[str, ...]
    ph_ranges: tuple[tuple[float, float], ...]
    note: str

    def holds_ph(self, value: float) -> bool:
        """Answer whether a pH lies in one of its ranges."""
        return any(low <= value < high for low, high in self.ph_ranges)


def hazard_table(name: str, columns: tuple[str, ...]) -> Iterator[dict[str, str]]:
    """Yield the rows of a table of this room by column; ValueError as `rows_of`."""
    return rows_of(name, table_text("builder.checks.hazards", name), columns)


@cache
def load_substance_kinds() -> dict[str, SubstanceKind]:
    """Return the kinds of substance by name, in table order.

    Raises ValueError for blanks, names given twice, bad SMARTS, and rows with neither SMARTS nor words nor pH.
    """
    found: dict[str, SubstanceKind] = {}
    for row in hazard_table("substance_kinds.tsv", ("name", "smarts", "words", "note")):
        words = () if row["words"] == NOTHING else tuple(row["words"].split("|"))
        ranges = [match for word in words if (match := _PH_RANGE.fullmatch(word))]
        kind = SubstanceKind(
            name=row["name"],
            fragments=() if row["smarts"] == NOTHING else tuple(map(Fragment.from_smarts, row["smarts"].split())),
            words=tuple(word for word in words if word[0] not in "!=" and not _PH_RANGE.fullmatch(word)),
            other_things=tuple(word[1:] for word in words if word[0] == "!"),
            scope_words=tuple(word[1:] for word in words if word[0] == "="),
            ph_ranges=tuple((float(match[1]), float(match[2])) for match in ranges),
            note="" if row["note"] == NOTHING else row["note"],
        )
        if kind.name in found or not (kind.fragments or kind.words or kind.ph_ranges):
            raise ValueError(f"substance_kinds.tsv: {kind.name}: given twice, or without SMARTS, words and pH")
        found[kind.name] = kind
    return found


@lru_cache(maxsize=512)
def kinds_of(structure: Structure) -> frozenset[str]:
    """Return the kinds a structure belongs to; an amine drawn beside HCl is its hydrochloride."""
    pieces = {piece.smiles: _kinds_of_piece(piece) for piece in structure.fragments}
    if _HYDROGEN_HALIDES & pieces.keys() and any("basic amine" in kinds for kinds in pieces.values()):
        pieces = {smiles: kinds for smiles, kinds in pieces.items() if smiles not in _HYDROGEN_HALIDES}
        pieces["hydrochloride"] = frozenset({"alkylammonium salt"})
    return frozenset().union(*pieces.values())


@lru_cache(maxsize=512)
def _kinds_of_piece(piece: Structure) -> frozenset[str]:
    asked = _asked_of(frozenset(piece.elements), piece.signs)
    return frozenset().union(*(kinds for fragment, kinds in asked if fragment.is_in(piece)))


@lru_cache(maxsize=256)
def _asked_of(elements: frozenset[str], signs: frozenset[int]) -> tuple[tuple[Fragment, frozenset[str]], ...]:
    """Return the fragments that a piece with these elements and signs of charges can hold, with their kinds."""
    return tuple(
        (fragment, kinds)
        for fragment, kinds in _kinds_by_fragment().items()
        if fragment.query.elements.keys() <= elements and fragment.query.signs <= signs
    )


@cache
def _kinds_by_fragment() -> dict[Fragment, frozenset[str]]:
    """Return the kinds that ask for a fragment, so that each is looked for once though several ask for it."""
    found: dict[Fragment, set[str]] = {}
    for kind in load_substance_kinds().values():
        for fragment in kind.fragments:
            found.setdefault(fragment, set()).add(kind.name)
    return {fragment: frozenset(kinds) for fragment, kinds in found.items()}
