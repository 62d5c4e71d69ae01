"""Small tables of constants: σ+ of aryl substituents, strain of rings, conformational energies."""

from dataclasses import dataclass
from functools import cache

from builder.chemistry.geometry import ArylPosition, ArylSubstituent
from builder.table import refuse_twice, rows_of, table_text

__all__ = ["Sigma", "conformational_energy_kj", "ring_strain_kj", "sigma_plus"]


@dataclass(frozen=True, slots=True)
class Sigma:
    """σm and σp+ of one substituent."""

    meta: float
    para: float


def sigma_plus(substituent: ArylSubstituent) -> float:
    """Return σ+ of a substituent at its place; 0 for one that the table does not know, ortho as para."""
    row = _sigmas().get(substituent.name or "")
    if row is None:
        return 0.0
    return row.meta if substituent.position is ArylPosition.META else row.para


@cache
def _sigmas() -> dict[str, Sigma]:
    rows = _rows("aryl_constants.tsv", ("name", "meta", "para"))
    return {row["name"]: Sigma(float(row["meta"]), float(row["para"])) for row in rows}


def ring_strain_kj(size: int) -> float:
    """Return the strain of a carbocycle, kJ/mol; sizes above 9 as 9."""
    strain = _ring_strains()
    return strain[min(size, max(strain))]


@cache
def _ring_strains() -> dict[int, float]:
    rows = _rows("ring_strain.tsv", ("size", "strain_kj_mol"))
    return {int(row["size"]): float(row["strain_kj_mol"]) for row in rows}


@cache
def _conformational_energies() -> dict[str, float]:
    rows = _rows("conformational_energies.tsv", ("group", "a_value_kj_mol"))
    return {row["group"]: float(row["a_value_kj_mol"]) for row in rows}


def _rows(name: str, columns: tuple[str, ...]) -> list[dict[str, str]]:
    """Return the rows of a table, the first of whose columns is its key."""
    rows = list(rows_of(name, table_text("builder.mechanism", name), (*columns, "source")))
    refuse_twice(name, columns[0], [row[columns[0]] for row in rows])
    return rows


def conformational_energy_kj(symbol: str, branches: int) -> float:
    """Return the A value of a ring substituent, kJ/mol, by element of its first atom and, for carbon, its branches.

    branches: heavy neighbours of the first atom beside the ring; an aryl carbon counts as phenyl ("C aryl").
    Raises KeyError for an element that is not in the table.
    """
    table = _conformational_energies()
    return table.get(f"{symbol}{branches}", table.get(symbol, table["other"]))
