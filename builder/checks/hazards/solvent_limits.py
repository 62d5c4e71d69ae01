"""Solvents that a law restricts, and limits of residual solvents in medicinal products; loads both tables."""

from dataclasses import dataclass
from functools import cache

from builder.checks.hazards.kinds import hazard_table
from builder.chemistry.structure import parse_smiles
from builder.table import refuse_twice

__all__ = ["ResidualLimit", "Restriction", "load_residual_limits", "load_restrictions"]


@dataclass(frozen=True, slots=True)
class Restriction:
    """One row of restricted_solvents.tsv.

    inhalation: mg/m³, dermal: mg/kg a day, both DNEL of workers, as typed. since: day from which it applies.
    """

    name: str
    jurisdiction: str
    entry: str
    inhalation: str
    dermal: str
    since: str
    source: str
    read: str


@dataclass(frozen=True, slots=True)
class ResidualLimit:
    """One row of residual_solvents.tsv: class 1, 2 or 3, and µg/g at a dose of 10 g a day."""

    name: str
    solvent_class: int
    most_ppm: float
    source: str
    revision: str
    read: str

    @property
    def pde_mg(self) -> float:
        """Return the permitted daily exposure, mg: that of 10 g with the limit in it."""
        return self.most_ppm / 100.0


@cache
def load_restrictions() -> dict[str, Restriction]:
    """Return the restrictions by canonical SMILES; ValueError for blanks, unknown sources and solvents given twice."""
    table = "restricted_solvents.tsv"
    columns = ("name", "smiles", "jurisdiction", "entry", "inhalation", "dermal", "from", "source", "read")
    rows = [(parse_smiles(row.pop("smiles")).smiles, row) for row in hazard_table(table, columns)]
    refuse_twice(table, "smiles", [smiles for smiles, _ in rows])
    return {smiles: Restriction(since=row.pop("from"), **row) for smiles, row in rows}


@cache
def load_residual_limits() -> dict[str, ResidualLimit]:
    """Return the limits by canonical SMILES; ValueError for blanks, unknown sources and solvents given twice."""
    table = "residual_solvents.tsv"
    columns = ("name", "smiles", "class", "most_ppm", "source", "revision", "read")
    rows = [(parse_smiles(row["smiles"]).smiles, row) for row in hazard_table(table, columns)]
    refuse_twice(table, "smiles", [smiles for smiles, _ in rows])
    return {
        smiles: ResidualLimit(
            name=row["name"],
            solvent_class=int(row["class"]),
            most_ppm=float(row["most_ppm"]),
            source=row["source"],
            revision=row["revision"],
            read=row["read"],
        )
        for smiles, row in rows
    }
