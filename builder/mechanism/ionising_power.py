"""Ionising power and nucleophilicity of solvents and mixtures, from ionising_power.tsv and ionising_lines.tsv.

The scales are logarithms of rate constants relative to 80 % ethanol; the tables' headers define them.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from functools import cache
from itertools import pairwise

from builder.chemistry.structure import parse_smiles
from builder.mechanism.solvents import Solvent, find_solvent, load_solvents
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = ["Power", "Scale", "ionising_power", "nucleophilicity_of"]

_TABLE, _LINES = "ionising_power.tsv", "ionising_lines.tsv"
_ESTIMATED = "estimated-here"

SAME_PERCENT = 0.05
"""Compositions nearer than this, in percent, are the same."""
BETWEEN_ROWS = 0.4
"""Error of a straight line between two rows, per unit of value between them, times t(1 - t) at the fraction t."""
MIXING_ERROR = 0.4
"""Standard error of the mean by moles: 0.34 over the aqueous mixtures of the table, where by volume it is 1.7."""


class Scale(StrEnum):
    """What a scale was measured with; the table's header says more."""

    Y = "Y"
    YCL = "YCl"
    YOTS = "YOTs"
    NT = "NT"
    NOTS = "NOTs"


@dataclass(frozen=True, slots=True)
class Power:
    """A value on one scale, log10 relative to 80 % ethanol at 25 °C, with its standard error.

    source: bibliography key; that of the nearer row where a value lies between two.
    is_estimate: whether it rests on anything but measurements in this solvent or in mixtures next to it.
    """

    value: float
    error: float
    scale: Scale
    source: str
    is_estimate: bool


def ionising_power(parts: Sequence[tuple[str, float]], scale: Scale = Scale.Y) -> Power:
    """Return the value of a solvent or mixture on a scale.

    parts: names of solvents with their share by volume, in any unit.
    A row of the table where there is one; between two rows of a binary mixture on a straight line; else the mean of
    the pure solvents by moles, which follows aqueous mixtures better than that by volume. YCl and YOTs that cannot be
    had so follow from Y.
    Raises KeyError for an unknown solvent, ValueError if no part has a positive share, LookupError where the scale
    says nothing of a solvent (NT and NOTs only).
    """
    shares = _shares(parts)
    found = _measured(shares, scale) or _mean_by_moles(shares, scale)
    if found is not None:
        return found
    line = _lines().get(scale)
    if line is None:
        raise LookupError(f"no {scale} of {', '.join(solvent.name for solvent in shares)}")
    return line.carry_over(ionising_power(parts, line.from_scale), scale)


def nucleophilicity_of(parts: Sequence[tuple[str, float]]) -> Power | None:
    """Return the nucleophilicity NT of a solvent or mixture; None where nothing is known of it.

    Arguments and errors as for `ionising_power`.
    """
    shares = _shares(parts)
    return _measured(shares, Scale.NT) or _mean_by_moles(shares, Scale.NT)


# --- compositions -----------------------------------------------------------------------------------------------------


def _shares(parts: Sequence[tuple[str, float]]) -> dict[Solvent, float]:
    """Return the fraction by volume of each solvent, names of the same one taken together."""
    shares: dict[Solvent, float] = {}
    for name, share in parts:
        solvent = find_solvent(name)
        if solvent is None:
            raise KeyError(name)
        if share > 0:
            shares[solvent] = shares.get(solvent, 0.0) + share
    total = sum(shares.values())
    if not 0 < total < math.inf:
        raise ValueError("a solvent mixture needs at least one part with a positive share")
    return {solvent: share / total for solvent, share in shares.items()}


def _weighted(shares: Mapping[Solvent, float], weights: Mapping[str, float]) -> dict[Solvent, float]:
    total = sum(share * weights[solvent.name] for solvent, share in shares.items())
    return {solvent: share * weights[solvent.name] / total for solvent, share in shares.items()}


@cache
def _densities() -> dict[str, float]:
    """Return g/mL by name; 1 where the table of solvents gives none."""
    return {solvent.name: solvent.density_g_ml or 1.0 for solvent in load_solvents()}


@cache
def _molarities() -> dict[str, float]:
    """Return mol/mL of the pure solvents by name."""
    return {s.name: _densities()[s.name] / parse_smiles(s.smiles).mass for s in load_solvents()}


# --- from the table to a value ----------------------------------------------------------------------------------------


def _measured(shares: Mapping[Solvent, float], scale: Scale) -> Power | None:
    names = [solvent.name for solvent in shares]
    if len(names) == 1:
        return _rows().pure.get((scale, names[0]))
    if len(names) > 2:
        return None
    for first, second in (names, reversed(names)):
        curve = _rows().curves.get((scale, first, second))
        if curve is not None:
            fractions = _weighted(shares, _densities()) if curve.basis == "w/w" else shares
            share_of = {solvent.name: share for solvent, share in fractions.items()}
            return curve.at(100 * share_of[first])
    return None


def _mean_by_moles(shares: Mapping[Solvent, float], scale: Scale) -> Power | None:
    weighted = [
        (_rows().pure.get((scale, solvent.name)), share) for solvent, share in _weighted(shares, _molarities()).items()
    ]
    known = [(power, share) for power, share in weighted if power is not None]
    if len(known) < len(weighted):
        return None
    return Power(
        value=sum(power.value * share for power, share in known),
        error=math.hypot(MIXING_ERROR, sum(power.error * share for power, share in known)),
        scale=scale,
        source=_ESTIMATED,
        is_estimate=True,
    )


@dataclass(frozen=True, slots=True)
class _Curve:
    """A binary mixture on one scale: values by rising percent of the first component, pure ends included."""

    basis: str
    points: tuple[tuple[float, Power], ...]

    def at(self, percent: float) -> Power | None:
        for known, power in self.points:
            if abs(percent - known) <= SAME_PERCENT:
                return power
        for (low, below), (high, above) in pairwise(self.points):
            if low < percent < high:
                return _between(below, above, (percent - low) / (high - low))
        return None


def _between(below: Power, above: Power, fraction: float) -> Power:
    step = above.value - below.value
    bend = BETWEEN_ROWS * abs(step) * fraction * (1 - fraction)
    return Power(
        value=below.value + fraction * step,
        error=math.hypot(max(below.error, above.error), bend),
        scale=below.scale,
        source=(below if fraction < 0.5 else above).source,
        is_estimate=below.is_estimate or above.is_estimate,
    )


@dataclass(frozen=True, slots=True)
class _Line:
    from_scale: Scale
    slope: float
    intercept: float
    error: float
    source: str

    def carry_over(self, power: Power, scale: Scale) -> Power:
        error = math.hypot(self.error, self.slope * power.error)
        return Power(self.slope * power.value + self.intercept, error, scale, self.source, is_estimate=True)


# --- the tables -------------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Rows:
    pure: Mapping[tuple[Scale, str], Power]
    curves: Mapping[tuple[Scale, str, str], _Curve]


@cache
def _rows() -> _Rows:
    return _read_powers(table_text("builder.mechanism", _TABLE))


def _read_powers(text: str) -> _Rows:
    columns = ("scale", "component_a", "component_b", "percent_a", "basis", "value", "error", "source", "note")
    rows = tuple(rows_of(_TABLE, text, columns))
    names = {solvent.name for solvent in load_solvents()}
    pure: dict[tuple[Scale, str], Power] = {}
    mixed: dict[tuple[Scale, str, str], list[tuple[float, Power]]] = {}
    basis_of: dict[tuple[Scale, str, str], str] = {}
    refuse_twice(_TABLE, "composition", [_composition(row) for row in rows])
    for row in rows:
        scale, first, second = Scale(row["scale"]), row["component_a"], row["component_b"]
        if not {first, second} <= names | {NOTHING}:
            raise ValueError(f"{_TABLE}: {first}, {second}: not named so in solvents.tsv")
        if second == NOTHING:
            pure[scale, first] = _power(row)
            continue
        pair, percent = (scale, first, second), float(row["percent_a"])
        if not 0 < percent < 100 or basis_of.setdefault(pair, row["basis"]) != row["basis"]:
            raise ValueError(f"{_TABLE}: {first}, {second}: needs a percentage between 0 and 100, on one basis")
        mixed.setdefault(pair, []).append((percent, _power(row)))
    return _Rows(pure, {pair: _curve(pair, basis_of[pair], points, pure) for pair, points in mixed.items()})


def _composition(row: Mapping[str, str]) -> str:
    """Return what may stand once: a mixture is the same whichever component is named first."""
    percent = float(row["percent_a"])
    parts = sorted([(row["component_a"], percent), (row["component_b"], 100 - percent)])
    return f"{row['scale']} {parts}"


def _curve(
    pair: tuple[Scale, str, str],
    basis: str,
    points: Sequence[tuple[float, Power]],
    pure: Mapping[tuple[Scale, str], Power],
) -> _Curve:
    scale, first, second = pair
    ends = [(0.0, pure.get((scale, second))), (100.0, pure.get((scale, first)))]
    whole = [*points, *((percent, power) for percent, power in ends if power is not None)]
    return _Curve(basis, tuple(sorted(whole, key=lambda point: point[0])))


def _power(row: Mapping[str, str]) -> Power:
    value, error = float(row["value"]), float(row["error"])
    if not -12 < value < 8 or not 0 < error < 3:
        raise ValueError(f"{_TABLE}: {row['component_a']}: {value} or its error {error} is out of range")
    return Power(value, error, Scale(row["scale"]), row["source"], row["source"] == _ESTIMATED)


@cache
def _lines() -> Mapping[Scale, _Line]:
    columns = ("scale", "from_scale", "slope", "intercept", "error", "source")
    rows = tuple(rows_of(_LINES, table_text("builder.mechanism", _LINES), columns))
    refuse_twice(_LINES, "scale", [row["scale"] for row in rows])
    return {
        Scale(row["scale"]): _Line(
            Scale(row["from_scale"]), float(row["slope"]), float(row["intercept"]), float(row["error"]), row["source"]
        )
        for row in rows
    }
