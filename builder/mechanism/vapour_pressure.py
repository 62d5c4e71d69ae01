"""Vapour pressures and boiling points away from 1 atm, by the handbook correlations of the library `chemicals`.

The only home of that library. Its tables are read from the files it brings, not through its data frames, which would
load pandas (measured: 0.38 s and 39 MB a process, against 0.06 s and 9 MB); the equations are the library's. Nothing is
read before the first question, and nothing is extrapolated: outside the range of every correlation the answer is None.
"""

import csv
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cache, lru_cache
from importlib import resources
from typing import Protocol

from builder.chemistry.structure import parse_smiles
from builder.mechanism.gas import ATMOSPHERE_BAR, ZERO_C_IN_K
from builder.mechanism.solvents import Solvent, boiling_point_c

__all__ = [
    "Boiling",
    "MixturePressure",
    "VapourPressure",
    "boiling_range_c",
    "bubble_point_c",
    "mixture_bar",
    "vapour_pressure",
]

NEAR_ATMOSPHERE = 0.02  # relative: within it the boiling points of the solvent table hold
_STEP_K = 0.05  # how fine a boiling point is solved; the correlations are no better than some tenths of a kelvin
_STRIDE_K = 10.0
_TAB = "\t"


@dataclass(frozen=True, slots=True)
class VapourPressure:
    """A vapour pressure (bar, absolute) with the correlation it comes from and where that holds (°C)."""

    bar: float
    correlation: str
    lowest_c: float
    highest_c: float


@dataclass(frozen=True, slots=True)
class MixturePressure:
    """The vapour pressure of a mixture (bar), and the names of the parts it does not hold: a lower bound then."""

    bar: float
    lacking: tuple[str, ...]


class Boiling(Protocol):
    """What has a name and a CAS number: a solvent, a volatile reagent."""

    @property
    def name(self) -> str:
        """Return the name."""

    @property
    def cas(self) -> str:
        """Return the CAS number."""


@dataclass(frozen=True, slots=True)
class _Correlation:
    """One equation with its coefficients for one substance, valid from lowest_k to highest_k."""

    name: str
    lowest_k: float
    highest_k: float
    pascal: Callable[[float], float]


def vapour_pressure(cas: str, temperature_c: float) -> VapourPressure | None:
    """Return the vapour pressure of a pure liquid; None where no correlation of the library covers it.

    cas: CAS number. Taken is the first correlation whose range holds the temperature: Wagner (McGarry; Poling,
    Prausnitz and O'Connell), Antoine (Poling), VDI Heat Atlas, Perry's table 2-8, or Antoine (Landolt-Börnstein) where
    none of these knows the substance.
    """
    kelvin = temperature_c + ZERO_C_IN_K
    for each in _correlations(cas):
        if each.lowest_k <= kelvin <= each.highest_k:
            bar = each.pascal(kelvin) / 1e5
            return VapourPressure(bar, each.name, each.lowest_k - ZERO_C_IN_K, each.highest_k - ZERO_C_IN_K)
    return None


def mixture_bar(parts: Sequence[tuple[Boiling, float]], temperature_c: float) -> MixturePressure:
    """Return the vapour pressure of an ideal mixture by Raoult's law; parts without a correlation are named.

    parts: substances with their moles, in any unit. A part that lacks a correlation at this temperature counts as not
    less than zero. Dissolved solids are not counted; water with organic solvents gives more than Raoult's law says.
    """
    total = sum(moles for _, moles in parts)
    bar, lacking = 0.0, []
    for substance, moles in parts:
        found = vapour_pressure(substance.cas, temperature_c)
        if found is None:
            lacking.append(substance.name)
        else:
            bar += moles / total * found.bar
    return MixturePressure(bar, tuple(lacking))


@lru_cache(maxsize=256)
def bubble_point_c(parts: tuple[tuple[Solvent, float], ...], pressure_bar: float = ATMOSPHERE_BAR) -> float | None:
    """Return where (°C) an ideal mixture begins to boil at a pressure (bar); None where that cannot be computed.

    parts: solvents with their share by volume, in any unit; all need a density. A part for which the library has no
    correlation is held to give no vapour, so that the point is then too high rather than too low. Sought inside the
    ranges of the correlations, from 150 K below the lowest boiling point of the table to 250 K above the highest.
    """
    moles = tuple((solvent, _moles(solvent, share)) for solvent, share in parts if share > 0)
    known = [(solvent, amount) for solvent, amount in moles if amount is not None]
    if len(known) < len(moles):
        return None
    total = sum(amount for _, amount in known)
    giving = [(solvent, amount / total) for solvent, amount in known if _correlations(solvent.cas)]
    points = [solvent.bp_c for solvent, _ in known]
    below: float | None = None
    at = min(points) - 150.0
    while at < max(points) + 250.0:
        found = _sum_bar(giving, at)
        if found is not None and found >= pressure_bar:
            return None if below is None else _solved(giving, pressure_bar, below, at)
        below = at if found is not None else None
        at += _STRIDE_K
    return None


def _solved(giving: Sequence[tuple[Solvent, float]], pressure_bar: float, low: float, high: float) -> float:
    while high - low > _STEP_K:
        middle = (low + high) / 2
        found = _sum_bar(giving, middle)
        low, high = (middle, high) if found is not None and found < pressure_bar else (low, middle)
    return (low + high) / 2


def _sum_bar(giving: Sequence[tuple[Solvent, float]], temperature_c: float) -> float | None:
    """Return the sum of partial pressures; None where one is out of the range of its correlation, or there is none."""
    found = mixture_bar(giving, temperature_c)
    return None if found.lacking or not giving else found.bar * sum(share for _, share in giving)


def boiling_range_c(parts: Sequence[tuple[Solvent, float]], pressure_bar: float) -> tuple[float, float] | None:
    """Return between which temperatures (°C) a mixture begins to boil at a pressure (bar).

    parts: solvents with their share by volume. At 1 atm it is that of the solvent table. At another pressure that
    interval is moved by as much as each of its pure components moves; None where a correlation is missing.
    """
    low, high = boiling_point_c(parts)
    if abs(pressure_bar / ATMOSPHERE_BAR - 1.0) < NEAR_ATMOSPHERE:
        return low, high
    shifts: list[float] = []
    for solvent, share in parts:
        if share > 0:
            point = bubble_point_c(((solvent, 1.0),), pressure_bar)
            if point is None:
                return None
            shifts.append(point - solvent.bp_c)
    return low + min(shifts), high + max(shifts)


@cache
def _molar_mass(solvent: Solvent) -> float:
    return parse_smiles(solvent.smiles).mass


def _moles(solvent: Solvent, share: float) -> float | None:
    return None if solvent.density_g_ml is None else share * solvent.density_g_ml / _molar_mass(solvent)


# --- the tables of the library --------------------------------------------------------------------------------

_WAGNER_MCGARRY = "Wagner Original McGarry.tsv"
_WAGNER_POLING = "Wagner Collection Poling.tsv"
_ANTOINE_POLING = "Antoine Collection Poling.tsv"
_VDI = "VDI PPDS Boiling temperatures at different pressures.tsv"
_PERRY = "Table 2-8 Vapor Pressure of Inorganic and Organic Liquids.tsv"
_LANDOLT = "Landolt_antoine_V20.tsv"


@cache
def _rows(name: str) -> Mapping[str, Mapping[str, str]]:
    text = (resources.files("chemicals") / "Vapor Pressure" / name).read_text("utf-8")
    return {row["CAS"]: row for row in csv.DictReader(text.splitlines(), delimiter=_TAB)}


@cache
def _correlations(cas: str) -> tuple[_Correlation, ...]:
    # Imported here: most records are run in an open flask well below the boiling point, and never ask.
    from chemicals.dippr import EQ101  # noqa: PLC0415 - lazy, see above
    from chemicals.vapor_pressure import Antoine, Wagner, Wagner_original  # noqa: PLC0415 - lazy, see above

    def numbers(row: Mapping[str, str], *columns: str) -> list[float]:
        return [float(row[column]) for column in columns]

    found: list[_Correlation] = []
    if row := _rows(_WAGNER_MCGARRY).get(cas):
        tc, pc, a, b, c, d = numbers(row, "Tc", "Pc", "A", "B", "C", "D")
        law = _closed(Wagner_original, tc, pc, a, b, c, d)
        found.append(_Correlation("Wagner equation, McGarry 1983", float(row["Tmin"]), tc, law))
    if row := _rows(_WAGNER_POLING).get(cas):
        tc, pc, a, b, c, d = numbers(row, "Tc", "Pc", "A", "B", "C", "D")
        low, high = numbers(row, "Tmin", "Tmax")
        found.append(_Correlation("Wagner equation, Poling 2001", low, high, _closed(Wagner, tc, pc, a, b, c, d)))
    if row := _rows(_ANTOINE_POLING).get(cas):
        a, b, c, low, high = numbers(row, "A", "B", "C", "Tmin", "Tmax")
        found.append(_Correlation("Antoine equation, Poling 2001", low, high, _closed(Antoine, a, b, c)))
    if row := _rows(_VDI).get(cas):
        tm, tc, pc, a, b, c, d = numbers(row, "Tm", "Tc", "Pc", "A", "B", "C", "D")
        found.append(_Correlation("Wagner equation, VDI Heat Atlas 2010", tm, tc, _closed(Wagner, tc, pc, a, b, c, d)))
    if row := _rows(_PERRY).get(cas):
        *coefficients, low, high = numbers(row, "C1", "C2", "C3", "C4", "C5", "Tmin", "Tmax")
        found.append(_Correlation("equation of Perry's table 2-8", low, high, _closed(EQ101, *coefficients)))
    if not found and (row := _rows(_LANDOLT).get(cas)):  # twenty times the size of the others
        a, b, c, low, high = numbers(row, "A", "B", "C", "Tmin", "Tmax")
        law = _closed(Antoine, a, b, c, math.e)  # the base of that table
        found.append(_Correlation("Antoine equation, Landolt-Börnstein", low, high, law))
    return tuple(found)


def _closed(equation: Callable[..., float], *coefficients: float) -> Callable[[float], float]:
    return lambda kelvin: float(equation(kelvin, *coefficients))
