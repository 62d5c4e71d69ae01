"""Thermal screen of a reaction: adiabatic rise, MTSR, severity and criticality, from given data only.

A screening estimate, not a safety assessment; local safety review decides. What is missing is named, never assumed.
Source: Stoessel, Thermal Safety of Chemical Processes, Wiley-VCH, 2008, ch. 3 and 5 (from memory).
"""

from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum

from builder.chemistry.structure import Structure
from builder.mechanism.amounts import AmountRow, Amounts, Role
from builder.mechanism.solvents import solvent_of
from builder.records.model import Record
from builder.rule import Path

__all__ = [
    "LOW_BELOW_K",
    "SCREEN_ONLY",
    "THERMAL_SOURCE",
    "CriticalityClass",
    "ThermalScreen",
    "ThermalSeverity",
    "adiabatic_rise_k",
    "criticality_class",
    "mtsr_c",
    "reaction_mass_g",
    "thermal_screen",
    "thermal_severity",
]

LOW_BELOW_K, MEDIUM_UP_TO_K, CRITICAL_UP_TO_K = 50.0, 200.0, 400.0
"""Limits of the severity classes. Source: as above."""

SCREEN_ONLY = "screening estimate, not a safety assessment; local safety review decides"
THERMAL_SOURCE = "stoessel-2008"


class ThermalSeverity(StrEnum):
    """What a runaway would do, by its adiabatic rise: limits 50 K, 200 K and 400 K."""

    LOW = "low"
    MEDIUM = "medium"
    CRITICAL = "critical"
    CATASTROPHIC = "catastrophic"


class CriticalityClass(StrEnum):
    """Order of process temperature, MTSR, MTT and T_D24, mildest first."""

    ONE = "1"
    TWO = "2"
    THREE = "3"
    FOUR = "4"
    FIVE = "5"


def adiabatic_rise_k(enthalpy_kj_per_mol: float, amount_mol: float, mass_g: float, heat_capacity: float) -> float:
    """Return the temperature rise in K if no heat is taken away; negative where heat is taken up.

    enthalpy_kj_per_mol: of reaction, negative where heat is given off. heat_capacity: J/(g K) of the reaction mass.

    >>> round(adiabatic_rise_k(-100.0, 1.0, 1000.0, 1.8), 1)
    55.6
    """
    return -1000.0 * enthalpy_kj_per_mol * amount_mol / (mass_g * heat_capacity)


def mtsr_c(process_c: float, accumulation: float, rise_k: float, mass_ratio: float = 1.0) -> float:
    """Return the maximum temperature of the synthesis reaction, °C.

    accumulation: unreacted share, 0 to 1; 1 for a batch. mass_ratio: final to current mass of a dosed reaction.

    >>> round(mtsr_c(60.0, 0.40, 55.6), 1)
    82.2
    """
    return process_c + accumulation * rise_k * mass_ratio


def thermal_severity(rise_k: float, *, forms_gas: bool = False) -> ThermalSeverity:
    """Return the class of an adiabatic rise: medium from 50 K, critical above 200 K, catastrophic above 400 K.

    forms_gas: then nothing is low, since pressure does the damage.
    """
    if rise_k > CRITICAL_UP_TO_K:
        return ThermalSeverity.CATASTROPHIC
    if rise_k > MEDIUM_UP_TO_K:
        return ThermalSeverity.CRITICAL
    return ThermalSeverity.MEDIUM if rise_k >= LOW_BELOW_K or forms_gas else ThermalSeverity.LOW


def criticality_class(mtsr: float, mtt: float, td24: float) -> CriticalityClass:
    """Return the criticality class of a process from measured temperatures, °C.

    mtt: maximum temperature for technical reasons. td24: where decomposition takes 24 h to its maximum rate. The two
    taken as equal count as the graver case.
    """
    if mtsr < min(mtt, td24):
        return CriticalityClass.ONE if mtt < td24 else CriticalityClass.TWO
    if mtsr < td24:
        return CriticalityClass.THREE
    return CriticalityClass.FOUR if mtt < td24 else CriticalityClass.FIVE


@dataclass(frozen=True, slots=True)
class ThermalScreen:
    """What the data of a record allow to say; None is not assessed, and then `missing` says what is wanted for it.

    process_c: highest temperature of any stage, °C. mass_g: of everything charged. onset_c: lowest measured
    temperature of decomposition. missing: by "adiabatic rise", "MTSR" and "criticality".
    """

    process_c: float
    mass_g: float | None
    rise_k: float | None
    severity: ThermalSeverity | None
    mtsr_c: float | None
    onset_c: float | None
    criticality: CriticalityClass | None
    missing: Mapping[str, tuple[str, ...]]


def thermal_screen(
    record: Record, structures: Mapping[Path, Structure], amounts: Amounts, *, forms_gas: bool = False
) -> ThermalScreen:
    """Return the thermal screen of a record, from what its `thermal` block and its amounts give.

    forms_gas: whether the flask can give off gas, which keeps the severity from being low.
    """
    given = record.thermal
    mass_g, unweighed = reaction_mass_g(amounts, structures)
    scale = amounts.substrate.amount_mol
    enthalpy = given.reaction_enthalpy if given else None
    capacity = given.heat_capacity if given else None
    process_c = max(stage.temperature.highest_c for stage in record.stages)
    wanted_for_rise = (
        *(["enthalpy of reaction"] if enthalpy is None else []),
        *(["heat capacity of the reaction mass"] if capacity is None else []),
        *(["the amount of the substrate"] if scale is None else []),
        *(f"the mass or density of {name}" for name in unweighed),
    )
    rise = None
    if enthalpy is not None and capacity is not None and scale is not None and mass_g is not None:
        rise = adiabatic_rise_k(enthalpy.magnitude, scale, mass_g, capacity.magnitude)
    accumulation = given.accumulation if given else None
    mtsr = None if rise is None or accumulation is None else mtsr_c(process_c, accumulation.magnitude / 100.0, rise)
    wanted_for_mtsr = (*wanted_for_rise, *(["accumulation"] if accumulation is None else []))
    td24, mtt = (given.td24, given.mtt) if given else (None, None)
    criticality = None
    if mtsr is not None and td24 is not None and mtt is not None:
        criticality = criticality_class(mtsr, mtt.lowest_c, td24.lowest_c)
    wanted = (
        *wanted_for_mtsr,
        *(["MTT (boiling point or relief)"] if mtt is None else []),
        *(["T_D24 (measured)"] if td24 is None else []),
    )
    missing = {"adiabatic rise": wanted_for_rise, "MTSR": wanted_for_mtsr, "criticality": wanted}
    return ThermalScreen(
        process_c=process_c,
        mass_g=mass_g,
        rise_k=rise,
        severity=None if rise is None else thermal_severity(rise, forms_gas=forms_gas),
        mtsr_c=mtsr,
        onset_c=given.onset.temperature.lowest_c if given and given.onset else None,
        criticality=criticality,
        missing={what: inputs for what, inputs in missing.items() if inputs},
    )


def reaction_mass_g(amounts: Amounts, structures: Mapping[Path, Structure]) -> tuple[float | None, tuple[str, ...]]:
    """Return the mass of everything charged in g, and the names of what cannot be weighed; None where there are any.

    A solvent given by volume is weighed with the density of the table of solvents.
    """
    masses = [(row, _mass_of(row, structures.get(row.path))) for row in amounts.rows]
    unweighed = tuple(row.name for row, mass in masses if mass is None)
    return (None if unweighed else sum(mass for _, mass in masses if mass is not None)), unweighed


def _mass_of(row: AmountRow, structure: Structure | None) -> float | None:
    if row.mass_g is not None or row.volume_l is None:
        return row.mass_g
    solvent = solvent_of(row.name, structure)
    if solvent is None or solvent.density_g_ml is None or (row.role is not Role.SOLVENT and row.typed != "volume"):
        return None
    return row.volume_l * 1000.0 * solvent.density_g_ml
