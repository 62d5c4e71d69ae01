"""Amounts of everything charged: mass, moles, volume and equivalents, derived from what was typed once."""

from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum

from builder.chemistry.structure import Structure
from builder.records.model import Charged, Record
from builder.records.quantities import Dimension, Quantity, half_unit
from builder.rule import Path

__all__ = [
    "QUANTITY_ORDER",
    "AmountRow",
    "Amounts",
    "Role",
    "charged_rows",
    "derive_amounts",
    "moles_from",
    "present_rows",
    "present_solvents",
    "rounding_of",
]

QUANTITY_ORDER = ("mass", "amount", "volume", "equivalents")
"""The first of these that is typed is used; the others check it."""


class Role(StrEnum):
    """What a charged substance is there for."""

    SUBSTRATE = "substrate"
    NUCLEOPHILE = "nucleophile"
    BASE = "base"
    REAGENT = "reagent"
    SOLVENT = "solvent"


@dataclass(frozen=True, slots=True)
class AmountRow:
    """One charged substance with its derived amounts; None where the record cannot tell.

    typed: which of mass, amount, volume, equivalents the row is derived from.
    molar_mass in g/mol, mass_g of the material as charged (purity or strength included), amount_mol, volume_l.
    equivalents: relative to the substrate.
    """

    path: Path
    name: str
    role: Role
    use: str
    typed: str
    molar_mass: float | None
    mass_g: float | None
    amount_mol: float | None
    volume_l: float | None
    equivalents: float | None


@dataclass(frozen=True, slots=True)
class Amounts:
    """All rows of a record, the solvent volume, and the concentration of the substrate in it."""

    rows: tuple[AmountRow, ...]
    solvent_volume_l: float | None
    concentration_mol_per_l: float | None

    @property
    def substrate(self) -> AmountRow:
        """Return the row of the substrate, always the first."""
        return self.rows[0]

    def at(self, path: Path) -> AmountRow:
        """Return the row of the substance at `path`.

        Raises KeyError where no substance stands there.
        """
        for row in self.rows:
            if row.path == path:
                return row
        raise KeyError(path)


def charged_rows(record: Record) -> tuple[tuple[Path, Role, Charged], ...]:
    """Return every charged substance with its path and role, in the order of the record."""
    nucleophile_paths = ((("nucleophile", i), n) for i, n in enumerate(record.nucleophiles))
    base_paths = ((("base", i), b) for i, b in enumerate(record.bases))
    return (
        (("substrate",), Role.SUBSTRATE, record.substrate),
        *((path, Role.NUCLEOPHILE, n) for path, n in nucleophile_paths),
        *((path, Role.BASE, b) for path, b in base_paths),
        *((("reagents", i), Role.REAGENT, r) for i, r in enumerate(record.reagents)),
        *((("solvent", i), Role.SOLVENT, s) for i, s in enumerate(record.solvents)),
    )


def present_solvents(record: Record, stage: int) -> tuple[int, ...]:
    """Return the positions of the solvents that are in the flask during a stage: all but those that go in later."""
    absent = _added_later(record, stage)
    return tuple(i for i, solvent in enumerate(record.solvents) if solvent.name not in absent)


def present_rows(record: Record, amounts: Amounts, stage: int) -> tuple[AmountRow, ...]:
    """Return the rows of all that is in the flask during a stage: all but what goes in later."""
    absent = _added_later(record, stage)
    return tuple(row for row in amounts.rows if row.name not in absent)


def _added_later(record: Record, stage: int) -> set[str]:
    so_far = {name for each in record.stages[: stage + 1] for name in each.add or ()}
    later = {name for each in record.stages[stage + 1 :] for name in each.add or ()}
    return later - so_far


def derive_amounts(record: Record, structures: Mapping[Path, Structure]) -> Amounts:
    """Return the amounts of everything charged.

    structures: the structure of each compound by its path; a compound without one has no molar mass.
    """
    substances = charged_rows(record)
    substrate_mol = _moles(record.substrate, structures.get(("substrate",)), None)
    rows = tuple(
        _row(path, role, substance, structures.get(path), substrate_mol) for path, role, substance in substances
    )
    volume = _solvent_volume(record)
    concentration = None
    if record.concentration is not None:
        concentration = record.concentration.magnitude
    elif volume and substrate_mol is not None:
        concentration = substrate_mol / volume
    return Amounts(rows, volume, concentration)


def moles_from(kind: str, substance: Charged, structure: Structure | None, substrate_mol: float | None) -> float | None:
    """Return the moles that one typed quantity (`kind`) of a substance stands for, None if it cannot tell.

    A volume counts with a molar strength as a solution, else with the density as a liquid; purity and a strength
    in percent by mass apply to whatever was weighed or measured as a liquid.
    """
    typed = getattr(substance, kind)
    if typed is None:
        return None
    if kind == "amount":
        return float(typed.magnitude)
    if kind == "equivalents":
        return None if substrate_mol is None else float(typed) * substrate_mol
    if kind == "volume" and _is_molar(substance):
        return float(typed.magnitude) * _strength(substance)
    mass_g = _mass_of(kind, substance)
    if mass_g is None or structure is None:
        return None
    return mass_g * _content(substance) / structure.mass


_FACTORS = {"mass": ("purity", "strength"), "volume": ("density", "purity", "strength")}
"""What an amount is worked out with, beside the quantity itself."""


def rounding_of(substance: Charged, kind: str | None = None) -> float:
    """Return by how much honest rounding may put an amount off, relative.

    Half a unit in the last typed digit of the quantity of this kind, else of the one in use, and of the purity,
    strength and density with which it is worked out.
    """
    kind = kind or _typed(substance) or "mass"
    typed = getattr(substance, kind)
    if isinstance(typed, Quantity):
        factors: list[Quantity | None] = [getattr(substance, each) for each in _FACTORS.get(kind, ())]
        return typed.half_digit + sum(factor.half_digit for factor in factors if factor is not None)
    return half_unit(typed) / float(typed) if typed else 0.0


def _moles(substance: Charged, structure: Structure | None, substrate_mol: float | None) -> float | None:
    typed = _typed(substance)
    return moles_from(typed, substance, structure, substrate_mol) if typed else None


def _row(
    path: Path, role: Role, substance: Charged, structure: Structure | None, substrate_mol: float | None
) -> AmountRow:
    molar_mass = structure.mass if structure else None
    moles = substrate_mol if role is Role.SUBSTRATE else _moles(substance, structure, substrate_mol)
    mass_g = _mass_of("mass", substance) if substance.mass else _mass_of("volume", substance)
    if mass_g is None and moles is not None and molar_mass and not _is_molar(substance):
        mass_g = moles * molar_mass / _content(substance)
    volume_l = substance.volume.magnitude if substance.volume else None
    if volume_l is None and moles is not None and _is_molar(substance):
        volume_l = moles / _strength(substance)
    if volume_l is None and mass_g is not None and substance.density:
        volume_l = mass_g / (substance.density.magnitude * 1000.0)
    ratio = moles / substrate_mol if moles is not None and substrate_mol else None
    use = str(getattr(substance, "use", "") or "")
    typed = _typed(substance)
    return AmountRow(path, substance.name, role, use, typed, molar_mass, mass_g, moles, volume_l, ratio)


def _typed(substance: Charged) -> str:
    return next((kind for kind in QUANTITY_ORDER if getattr(substance, kind) is not None), "")


def _mass_of(kind: str, substance: Charged) -> float | None:
    if kind == "mass" and substance.mass:
        return substance.mass.magnitude
    if kind == "volume" and substance.volume and substance.density:
        return substance.volume.magnitude * 1000.0 * substance.density.magnitude
    return None


def _is_molar(substance: Charged) -> bool:
    return substance.strength is not None and substance.strength.dimension is Dimension.CONCENTRATION


def _strength(substance: Charged) -> float:
    return substance.strength.magnitude if substance.strength else 0.0


def _content(substance: Charged) -> float:
    """Return the mass fraction of the substance in what was weighed."""
    content = substance.purity.magnitude / 100.0 if substance.purity else 1.0
    if substance.strength is not None and substance.strength.dimension is Dimension.FRACTION:
        content *= substance.strength.magnitude / 100.0
    return content


def _solvent_volume(record: Record) -> float | None:
    volumes = [solvent.volume.magnitude for solvent in record.solvents if solvent.volume]
    return sum(volumes) if volumes and len(volumes) == len(record.solvents) else None
