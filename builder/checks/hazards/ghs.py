"""GHS statements of substances: codes from ghs.tsv, their wording from ghs_statements.tsv.

The data sheet of the supplier decides; what is not listed is not harmless.
"""

from dataclasses import dataclass
from functools import cache

from builder.checks.hazards.kinds import hazard_table
from builder.chemistry.structure import Structure, parse_smiles
from builder.table import NOTHING, refuse_twice

__all__ = ["Labelled", "Statement", "labelled", "load_ghs", "load_statements"]


@dataclass(frozen=True, slots=True)
class Statement:
    """One statement: code (H225, EUH032) and wording."""

    code: str
    text: str


@dataclass(frozen=True, slots=True)
class Labelled:
    """One row of ghs.tsv: a substance with its statements; source, its revision, and when it was read."""

    name: str
    statements: tuple[Statement, ...]
    source: str
    revision: str
    read: str


@cache
def load_statements() -> dict[str, Statement]:
    """Return the statements by code; ValueError for blanks, unknown sources and codes given twice."""
    table = "ghs_statements.tsv"
    rows = list(hazard_table(table, ("code", "text", "source", "revision", "read")))
    refuse_twice(table, "code", [row["code"] for row in rows])
    return {row["code"]: Statement(row["code"], row["text"]) for row in rows}


@cache
def load_ghs() -> dict[str, Labelled]:
    """Return the substances by SMILES without stereochemistry.

    Raises ValueError for blanks, unknown sources, codes without wording, and substances given twice.
    """
    table = "ghs.tsv"
    known = load_statements()
    found: list[tuple[str, Labelled]] = []
    for row in hazard_table(table, ("name", "smiles", "h", "euh", "source", "revision", "read")):
        codes = [code for column in ("h", "euh") if row[column] != NOTHING for code in row[column].split()]
        if unknown := [code for code in codes if code not in known]:
            raise ValueError(f"{table}: {row['name']}: {unknown[0]} has no wording in ghs_statements.tsv")
        statements = tuple(known[code] for code in codes)
        labelled_row = Labelled(row["name"], statements, row["source"], row["revision"], row["read"])
        found.append((parse_smiles(row["smiles"]).flat_smiles, labelled_row))
    refuse_twice(table, "smiles", [smiles for smiles, _ in found])
    return dict(found)


def labelled(structure: Structure) -> Labelled | None:
    """Return the statements of a substance as charged; None where the table does not hold it."""
    return load_ghs().get(structure.flat_smiles)
