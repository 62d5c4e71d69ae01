"""Reagents by name and by structure, and what they do to the flask, from reagents.tsv; reads strengths off names."""

import math
import re
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from functools import cache

from builder.chemistry.patterns import load_leaving_groups
from builder.chemistry.structure import parse_smiles
from builder.mechanism.naming import NameIndex, names_in
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = ["Dose", "Reagent", "Role", "find_reagent", "load_reagents", "nearest_reagents", "reagent_by_structure"]

_TABLE = "reagents.tsv"
_COLUMNS = (
    *("name", "synonyms", "smiles", "role", "strength", "concentrated", "fuming"),
    *("supplies", "activates", "needs", "source", "note"),
)


class Role(StrEnum):
    """What a reagent is to the flask; the table's header explains each."""

    BRONSTED_ACID = "bronsted acid"
    LEWIS_ACID = "lewis acid"
    BUFFER_ACID = "buffer acid"
    SILVER = "silver"
    CROWN = "crown"
    ONIUM = "onium"
    ACTIVATOR = "activator"
    NITROSATION = "nitrosation"
    BASE = "base"
    DRYING = "drying"
    OXIDANT = "oxidant"
    PEROXIDE = "peroxide"
    IODIDE_SOURCE = "iodide source"
    WATER = "water"


_STRENGTHS: Mapping[Role, tuple[float, float]] = {
    Role.BRONSTED_ACID: (-16.0, 6.0),
    Role.BUFFER_ACID: (5.0, 11.0),
    Role.LEWIS_ACID: (1.0, 3.0),
    Role.BASE: (3.0, 55.0),
}
"""The roles that have a strength, and its range."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Reagent:
    """One reagent.

    smiles: canonical; None for what has no one structure.
    strength: pKa in water of an acid, or of the conjugate acid of a base; grade 1 to 3 of a Lewis acid; else None.
    concentrated_percent, fuming_percent: mass percent of the usual grades so called.
    supplies: canonical SMILES of the anion it brings. activates: the leaving group it makes of a hydroxyl group.
    needs: names of partners, one of which must be there; empty where it acts alone.
    """

    name: str
    synonyms: tuple[str, ...]
    smiles: str | None
    role: Role
    strength: float | None
    concentrated_percent: float | None
    fuming_percent: float | None
    supplies: str | None
    activates: str | None
    needs: tuple[str, ...]
    source: str
    note: str

    def works_beside(self, present: Collection[str]) -> bool:
        """Answer whether it acts alone or one of its partners is present, by `Reagent.name`."""
        return not self.needs or any(name in present for name in self.needs)


@dataclass(frozen=True, slots=True)
class Dose:
    """A reagent as somebody wrote it down.

    mass_percent: as typed, or that of the usual grade where "conc." or "fuming" is; None where nothing says it.
    is_concentrated: at least nine tenths of the usual grade, or called concentrated or fuming.
    """

    reagent: Reagent
    mass_percent: float | None
    is_aqueous: bool
    is_catalytic: bool
    is_concentrated: bool


@cache
def load_reagents() -> tuple[Reagent, ...]:
    """Return the reagents in table order.

    Raises ValueError for a wrong header, blank cells, strengths out of range or where the role has none, SMILES that
    are not canonical, unknown leaving groups and partners, and names or structures given twice.
    """
    return _read_reagents(table_text("builder.mechanism", _TABLE))


def find_reagent(text: str) -> Dose | None:
    """Return the reagent of that name and what is typed beside it; None if it is not in the table.

    "HBr (48% aq)", "conc. H2SO4", "HBr (fuming)", "4 M HCl in dioxane", "cat. TsOH", "TBAI (10 mol%)", "TsOH·H2O".
    """
    reagent = _index().find(text)
    if reagent is not None:
        return _dose(reagent, "", text)
    name, qualifiers = _part(text)
    reagent = _index().find(name)
    return None if reagent is None else _dose(reagent, qualifiers, name)


def reagent_by_structure(smiles: str) -> Reagent | None:
    """Return the reagent of a canonical SMILES (`Structure.smiles`); stereo marks are overlooked."""
    found = _by_smiles().get(smiles)
    if found is None and set(smiles) & set("@/\\"):
        return _by_smiles().get(parse_smiles(smiles).flat_smiles)
    return found


def nearest_reagents(text: str) -> tuple[str, ...]:
    """Return known names that `text` may be a slip of, nearest first; empty if it is known."""
    return () if find_reagent(text) is not None else _index().nearest(_part(text)[0])


# --- what stands beside a name ----------------------------------------------------------------------------------------

_NUMBER = r"\d+(?:[.,]\d+)?"
_MOL_PERCENT = re.compile(rf"({_NUMBER})\s*mol[\s-]*%")
_MASS_PERCENT = re.compile(rf"({_NUMBER})\s*(?:wt\.?|w/w|weight)?\s*%(?:\s*(?:w/w|wt|by mass|by weight))?")
_MOLARITY = re.compile(rf"\b{_NUMBER}\s*[mn]\b(?!-)")
_MEDIUM = re.compile(r"\bin\s+(?P<medium>[\w\s,-]+)")
_AQUEOUS = re.compile(r"\b(?:aq|aqueous|dil|dilute|diluted|sat|satd|saturated)\b\.?")
_CONCENTRATED = re.compile(r"\b(?:conc|concd|concentrated|fuming)\b\.?")
_CATALYTIC = re.compile(r"\b(?:cat|catalytic|catalyst)\b\.?(?:\s+amounts?\s+of\b|\s+amounts?\b)?")
_NO_MATTER = re.compile(
    r"\b(?:anhydrous|dry|gaseous|gas|glacial|moist|wet|powdered|solid|neat|excess|solution|freshly|prepared)\b"
    r"|\(g\)|[·*]\s*\d*\s*h2o\b|\b(?:\w*hydrate)\b"
)
_QUALIFIERS = (_MOL_PERCENT, _MASS_PERCENT, _MOLARITY, _MEDIUM, _AQUEOUS, _CONCENTRATED, _CATALYTIC, _NO_MATTER)
_AQUEOUS_BY_NAME = re.compile(r"^(?:hydro\w+|hydriod)ic acid")
MOST_CATALYST_MOL_PERCENT = 50.0
"""A larger amount than this is no catalyst."""
NEARLY_ANHYDROUS_PERCENT = 95.0
"""Above this mass percent an acid is not called aqueous: concentrated sulfuric acid is 98 %."""


def _part(text: str) -> tuple[str, str]:
    """Return the name and, apart from it, what is said of strength, amount and medium, in small letters."""
    name, said = text.lower(), []
    for pattern in _QUALIFIERS:
        said += [match.group() for match in pattern.finditer(name)]
        name = pattern.sub(" ", name)
    return name.strip(" ,;()"), " ; ".join(said)


def _dose(reagent: Reagent, said: str, name: str) -> Dose:
    grade = reagent.concentrated_percent
    percent = _percent(said, reagent)
    concentrated = _CONCENTRATED.search(said) is not None or (
        percent is not None and grade is not None and percent >= 0.9 * grade
    )
    return Dose(
        reagent=reagent,
        mass_percent=percent,
        is_aqueous=_is_aqueous(said, name) or _is_a_grade_in_water(said, percent, grade),
        is_catalytic=_CATALYTIC.search(said) is not None or _mol_percent(said) <= MOST_CATALYST_MOL_PERCENT,
        is_concentrated=concentrated,
    )


def _percent(said: str, reagent: Reagent) -> float | None:
    """Return the mass percent that is typed, or that of the grade that is named."""
    typed = _MASS_PERCENT.search(_MOL_PERCENT.sub(" ", said))
    if typed:
        return _number(typed.group(1))
    if "fuming" in said:
        return reagent.fuming_percent
    return reagent.concentrated_percent if _CONCENTRATED.search(said) else None


def _is_aqueous(said: str, name: str) -> bool:
    medium = _MEDIUM.search(said)
    in_water = medium is not None and medium["medium"].strip() in {"water", "h2o"}
    return in_water or _AQUEOUS.search(said) is not None or _AQUEOUS_BY_NAME.match(name.strip().lower()) is not None


def _is_a_grade_in_water(said: str, percent: float | None, grade: float | None) -> bool:
    """Answer whether a strength is given and no medium, of a reagent whose usual grade is a solution in water."""
    if grade is None or _MEDIUM.search(said):
        return False
    has_strength = percent is not None or _MOLARITY.search(said) or _CONCENTRATED.search(said)
    return bool(has_strength) and (percent or min(grade, NEARLY_ANHYDROUS_PERCENT - 1)) < NEARLY_ANHYDROUS_PERCENT


def _mol_percent(said: str) -> float:
    typed = _MOL_PERCENT.search(said)
    return _number(typed.group(1)) if typed else math.inf


def _number(text: str) -> float:
    return float(text.replace(",", "."))


# --- the table --------------------------------------------------------------------------------------------------------


@cache
def _index() -> NameIndex[Reagent]:
    return _index_of(load_reagents())


def _index_of(reagents: Sequence[Reagent]) -> NameIndex[Reagent]:
    return NameIndex(_TABLE, [(each, (each.name, *each.synonyms)) for each in reagents])


@cache
def _by_smiles() -> dict[str, Reagent]:
    return {each.smiles: each for each in load_reagents() if each.smiles is not None}


def _read_reagents(text: str) -> tuple[Reagent, ...]:
    found = tuple(_reagent(row) for row in rows_of(_TABLE, text, _COLUMNS))
    refuse_twice(_TABLE, "structure", [each.smiles for each in found if each.smiles is not None])
    _index_of(found)
    names = {each.name for each in found}
    groups = {group.name for group in load_leaving_groups()}
    for each in found:
        unknown = sorted({*each.needs} - names) + sorted({each.activates or "hydroxyl"} - groups)
        if unknown:
            raise ValueError(f"{_TABLE}: {each.name}: unknown partner or leaving group: {', '.join(unknown)}")
    return found


def _reagent(row: Mapping[str, str]) -> Reagent:
    role = Role(row["role"])
    for complaint in _complaints(row, role):
        raise ValueError(f"{_TABLE}: {row['name']}: {complaint}")
    value = {column: None if cell == NOTHING else cell for column, cell in row.items()}
    return Reagent(
        name=row["name"],
        synonyms=names_in(row["synonyms"]),
        smiles=value["smiles"],
        role=role,
        strength=None if row["strength"] == NOTHING else float(row["strength"]),
        concentrated_percent=None if row["concentrated"] == NOTHING else float(row["concentrated"]),
        fuming_percent=None if row["fuming"] == NOTHING else float(row["fuming"]),
        supplies=value["supplies"],
        activates=value["activates"],
        needs=names_in(row["needs"]),
        source=row["source"],
        note=value["note"] or "",
    )


def _complaints(row: Mapping[str, str], role: Role) -> Iterator[str]:
    for column in ("smiles", "supplies"):
        if row[column] != NOTHING and parse_smiles(row[column]).smiles != row[column]:
            yield f"{row[column]} is not canonical"
    if (role in _STRENGTHS) != (row["strength"] != NOTHING):
        yield f"a strength is given for a {role}, or lacks"
    elif role in _STRENGTHS and not _STRENGTHS[role][0] <= float(row["strength"]) <= _STRENGTHS[role][1]:
        yield f"strength {row['strength']} is out of range"
    if role is Role.ACTIVATOR and row["activates"] == NOTHING:
        yield "an activator must say what it makes"
