"""Solvents: names, structure, kind and bulk properties, from solvents.tsv; loads it and looks names up.

Every value carries a key into the bibliography. A further quantity needs two columns in the table (the value and its
source), a line in `_RANGES` and a field of `Solvent`.
"""

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from functools import cache

from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.naming import NameIndex, names_in
from builder.sources import load_sources
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "Solvent",
    "SolventKind",
    "boiling_point_c",
    "find_solvent",
    "freezing_point_c",
    "load_solvents",
    "nearest_solvents",
    "solvent_of",
    "structure_of",
]

TRACE = 0.01
"""Share by volume below which a component does not decide where a mixture boils or freezes."""
LOWEST_AZEOTROPE_K = 18.0
"""How far below its lowest component a mixture may boil: nitromethane and water 17 K, toluene and water 16 K."""
HIGHEST_AZEOTROPE_K = 7.0
"""How far above its highest component a mixture may boil: formic acid and water 6 K."""
EUTECTIC_K = 75.0
"""How far below its lowest component a mixture may stay liquid: DMSO and water 73 K."""

_RANGES: Mapping[str, tuple[float, float]] = {
    "bp_c": (-50.0, 350.0),
    "mp_c": (-150.0, 60.0),
    "density_g_ml": (0.5, 2.0),
    "permittivity": (1.7, 200.0),
}
_TEMPERATURES = ("density_t_c", "permittivity_t_c")
_COLUMNS = (
    *("name", "synonyms", "smiles", "cas", "kind", "bp_c", "bp_c_source", "mp_c", "mp_c_source"),
    *("density_g_ml", "density_t_c", "density_g_ml_source"),
    *("permittivity", "permittivity_t_c", "permittivity_source", "note"),
)

_GRADES = re.compile(
    r"^(?:absolute|anhydrous|dry|glacial|degassed|distilled|deionised|deionized)\s+|\s*\((?:dry|anhydrous)\)$"
)


class SolventKind(StrEnum):
    """What a solvent offers a solute; the table's header says where the lines are drawn."""

    PROTIC = "protic"
    DIPOLAR_APROTIC = "dipolar aprotic"
    APOLAR = "apolar"


@dataclass(frozen=True, slots=True, kw_only=True)
class Solvent:
    """One pure solvent.

    smiles: canonical. bp_c, mp_c: °C at 1.013 bar. density_g_ml: at density_t_c (°C). permittivity: relative, at
    permittivity_t_c (°C). None where the table gives no value.
    sources: bibliography key by name of the quantity.
    """

    name: str
    synonyms: tuple[str, ...]
    smiles: str
    cas: str
    kind: SolventKind
    bp_c: float
    mp_c: float
    density_g_ml: float | None
    density_t_c: float | None
    permittivity: float | None
    permittivity_t_c: float | None
    note: str
    sources: Mapping[str, str] = field(compare=False)

    @property
    def names(self) -> tuple[str, ...]:
        """Return the name and all synonyms."""
        return (self.name, *self.synonyms)


@cache
def load_solvents() -> tuple[Solvent, ...]:
    """Return the solvents in table order.

    Raises ValueError for a wrong header, blank cells, numbers that are not finite or out of range, unknown sources,
    and names, structures or CAS numbers given twice.
    """
    return _read_solvents(table_text("builder.mechanism", "solvents.tsv"))


def find_solvent(name: str, smiles: str | None = None) -> Solvent | None:
    """Return the solvent of that name, synonym or structure; None if it is not in the table.

    name: in any case, with or without a grade ("anhydrous DMF"), Greek letters and dashes as typed.
    smiles: canonical SMILES (`Structure.smiles`); where given it decides, whatever the name says.
    """
    if smiles is not None:
        return _by_smiles().get(smiles)
    return _index().find(name) or _index().find(_GRADES.sub("", name.strip().lower()))


def solvent_of(name: str, structure: Structure | None) -> Solvent | None:
    """Return the solvent that a substance of a record is: by its structure where one is drawn, else by its name."""
    return find_solvent(name, structure.smiles if structure is not None else None)


def structure_of(name: str, structure: Structure | None) -> Structure | None:
    """Return the structure of a substance: as drawn, else that of the solvent of this name; None for others."""
    if structure is not None:
        return structure
    solvent = find_solvent(name)
    return parse_smiles(solvent.smiles) if solvent is not None else None


def nearest_solvents(name: str) -> tuple[str, ...]:
    """Return known names that `name` may be a slip of, nearest first, one per solvent; empty if it is known.

    Letters in the wrong order ("DFM") come first, then spellings that differ by little.
    """
    return () if find_solvent(name) is not None else _index().nearest(name)


def boiling_point_c(parts: Sequence[tuple[Solvent, float]]) -> tuple[float, float]:
    """Return between which temperatures (°C, 1.013 bar) a mixture begins to boil; twice the same for one solvent.

    parts: solvents with their share by volume, in any unit; traces below 1 % are left out.
    A mixture boils between its lowest and its highest component unless it forms an azeotrope, so the interval reaches
    18 K below the lowest and 7 K above the highest, as far as common azeotropes go. Dissolved salts raise the boiling
    point by up to some kelvin (brine 9 K) and are not counted.
    Source of the widening: CRC Handbook, azeotropic data for binary mixtures (from memory).
    Raises ValueError if no part has a positive share.
    """
    points = [solvent.bp_c for solvent in _main_parts(parts)]
    if len(points) == 1:
        return points[0], points[0]
    return min(points) - LOWEST_AZEOTROPE_K, max(points) + HIGHEST_AZEOTROPE_K


def freezing_point_c(parts: Sequence[tuple[Solvent, float]]) -> tuple[float, float]:
    """Return between which temperatures (°C) a mixture begins to freeze; twice the same for one solvent.

    parts: as for `boiling_point_c`.
    Above the upper end nothing freezes. The lower end is the lowest component less 75 K, the deepest common
    depression (DMSO and water, from memory); dissolved salts lower the freezing point and are not counted.
    Raises ValueError if no part has a positive share.
    """
    points = [solvent.mp_c for solvent in _main_parts(parts)]
    if len(points) == 1:
        return points[0], points[0]
    return min(points) - EUTECTIC_K, max(points)


def _main_parts(parts: Sequence[tuple[Solvent, float]]) -> list[Solvent]:
    total = sum(share for _, share in parts if share > 0)
    if not 0 < total < math.inf:
        raise ValueError("a solvent mixture needs at least one part with a positive share")
    shares: dict[Solvent, float] = {}
    for solvent, share in parts:
        shares[solvent] = shares.get(solvent, 0.0) + max(share, 0.0)
    return [solvent for solvent, share in shares.items() if share >= TRACE * total]


# --- names ----------------------------------------------------------------------------------------------------


@cache
def _index() -> NameIndex[Solvent]:
    return _index_of(load_solvents())


def _index_of(solvents: Sequence[Solvent]) -> NameIndex[Solvent]:
    return NameIndex("solvents.tsv", [(solvent, solvent.names) for solvent in solvents])


@cache
def _by_smiles() -> dict[str, Solvent]:
    return {solvent.smiles: solvent for solvent in load_solvents()}


# --- the table ------------------------------------------------------------------------------------------------


def _read_solvents(text: str) -> tuple[Solvent, ...]:
    found = tuple(_solvent(row) for row in rows_of("solvents.tsv", text, _COLUMNS))
    refuse_twice("solvents.tsv", "structure", [solvent.smiles for solvent in found])
    refuse_twice("solvents.tsv", "CAS number", [solvent.cas for solvent in found])
    _index_of(found)  # refuses names given twice
    return found


def _solvent(row: Mapping[str, str]) -> Solvent:
    numbers = {quantity: _number(row, quantity) for quantity in _RANGES}
    temperatures = {column: _number(row, column) for column in _TEMPERATURES}
    bp_c, mp_c = numbers["bp_c"], numbers["mp_c"]
    if bp_c is None or mp_c is None:
        raise ValueError(f"solvents.tsv: {row['name']}: a boiling point and a melting point are needed")
    return Solvent(
        name=row["name"],
        synonyms=names_in(row["synonyms"]),
        smiles=parse_smiles(row["smiles"]).smiles,
        cas=row["cas"],
        kind=SolventKind(row["kind"]),
        bp_c=bp_c,
        mp_c=mp_c,
        density_g_ml=numbers["density_g_ml"],
        density_t_c=temperatures["density_t_c"],
        permittivity=numbers["permittivity"],
        permittivity_t_c=temperatures["permittivity_t_c"],
        note="" if row["note"] == NOTHING else row["note"],
        sources={quantity: _source(row, quantity) for quantity in _RANGES if numbers[quantity] is not None},
    )


def _number(row: Mapping[str, str], column: str) -> float | None:
    if row[column] == NOTHING:
        return None
    number = float(row[column])
    low, high = _RANGES.get(column, (-273.15, 400.0))
    if not low <= number <= high:
        raise ValueError(f"solvents.tsv: {row['name']}: {column} {number} is out of range")
    return number


def _source(row: Mapping[str, str], quantity: str) -> str:
    key = row[f"{quantity}_source"]
    if key not in load_sources():
        raise ValueError(f"solvents.tsv: {row['name']}: unknown source {key} of {quantity}")
    return key
