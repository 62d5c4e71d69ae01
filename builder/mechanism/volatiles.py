"""Volatile reagents: what boils below some 75 °C and is charged as reactant; loads volatiles.tsv."""

from dataclasses import dataclass
from functools import cache

from builder.chemistry.structure import parse_smiles
from builder.table import refuse_twice, rows_of, table_text

__all__ = ["Volatile", "find_volatile", "load_volatiles"]


@dataclass(frozen=True, slots=True)
class Volatile:
    """One volatile substance. smiles: canonical. bp_c: °C at 1.013 bar. source: key of the bibliography."""

    name: str
    smiles: str
    cas: str
    bp_c: float
    source: str


def find_volatile(smiles: str) -> Volatile | None:
    """Return the volatile substance of that canonical SMILES; None for all others."""
    return _by_smiles().get(smiles)


@cache
def load_volatiles() -> tuple[Volatile, ...]:
    """Return the volatile substances in table order.

    Raises ValueError for a wrong header, blank cells, unknown sources, and structures or CAS numbers given twice.
    """
    name = "volatiles.tsv"
    rows = rows_of(name, table_text("builder.mechanism", name), ("name", "smiles", "cas", "bp_c", "source"))
    found = tuple(
        Volatile(row["name"], parse_smiles(row["smiles"]).smiles, row["cas"], float(row["bp_c"]), row["source"])
        for row in rows
    )
    refuse_twice(name, "structure", [each.smiles for each in found])
    refuse_twice(name, "CAS number", [each.cas for each in found])
    return found


@cache
def _by_smiles() -> dict[str, Volatile]:
    return {each.smiles: each for each in load_volatiles()}
