"""Polarity of solvents and of their mixtures, from polarity.tsv; every value carries a key into the bibliography."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cache
from types import MappingProxyType

from builder.mechanism.solvents import find_solvent, load_solvents
from builder.mechanism.sourced import Ranges, sourced_numbers, sources_of
from builder.table import refuse_twice, rows_of, table_text

__all__ = ["Polarity", "load_polarities", "mixed_polarity", "polarity_of"]

_TABLE = "polarity.tsv"
_RANGES: Ranges = {
    "alpha": (0.0, 2.0),
    "beta": (0.0, 1.1),
    "pi_star": (-0.15, 1.15),
    "donor_number": (0.0, 65.0),
    "etn": (0.0, 1.1),
}
_COLUMNS = ("name", *(c for quantity in _RANGES for c in (quantity, f"{quantity}_source")), "error", "note")
_MIXED = "estimated-here"


@dataclass(frozen=True, slots=True)
class Polarity:
    """Polarity of a solvent or mixture at 25 °C; None where no value is published.

    alpha, beta, pi_star: Kamlet-Taft, dimensionless, each with the standard error `error`. donor_number: kcal/mol.
    etn: normalised Reichardt scale, dimensionless. sources: bibliography key by name of the quantity.
    """

    name: str
    alpha: float
    beta: float
    pi_star: float
    donor_number: float | None
    etn: float | None
    error: float
    sources: Mapping[str, str] = field(compare=False, hash=False)


@cache
def load_polarities() -> tuple[Polarity, ...]:
    """Return the polarity of every solvent of solvents.tsv, in that order.

    Raises ValueError for a wrong header, blank cells, numbers out of range, values without a source, names given
    twice or unknown, and solvents that are missing.
    """
    return _read_polarities(table_text("builder.mechanism", _TABLE))


def polarity_of(solvent_name: str) -> Polarity:
    """Return the polarity of a solvent by any of its names. Raises KeyError for an unknown solvent."""
    solvent = find_solvent(solvent_name)
    if solvent is None:
        raise KeyError(solvent_name)
    return _by_name()[solvent.name]


def mixed_polarity(parts: Sequence[tuple[str, float]]) -> Polarity:
    """Return the polarity of a mixture: the mean of its components, weighted by volume.

    parts: names of solvents with their share by volume, in any unit.
    An approximation: the component that solvates best gathers round a solute, so real mixtures are more polar than
    this towards ions. The error grows by a tenth of the range of alpha for that.
    A quantity that one component lacks is None.
    Raises KeyError for an unknown solvent, ValueError if no part has a positive share.
    """
    shares: dict[Polarity, float] = {}
    for name, share in parts:
        if share > 0:
            shares[polarity_of(name)] = shares.get(polarity_of(name), 0.0) + share
    total = sum(shares.values())
    if not 0 < total < math.inf:
        raise ValueError("a solvent mixture needs at least one part with a positive share")
    if len(shares) == 1:
        return next(iter(shares))
    weighted = [(each, share / total) for each, share in shares.items()]
    spread = max(each.alpha for each in shares) - min(each.alpha for each in shares)
    return Polarity(
        name=" / ".join(f"{100 * share:g} % {each.name}" for each, share in weighted),
        alpha=sum(each.alpha * share for each, share in weighted),
        beta=sum(each.beta * share for each, share in weighted),
        pi_star=sum(each.pi_star * share for each, share in weighted),
        donor_number=_mean([(each.donor_number, share) for each, share in weighted]),
        etn=_mean([(each.etn, share) for each, share in weighted]),
        error=math.hypot(sum(each.error * share for each, share in weighted), spread / 10),
        sources=MappingProxyType(dict.fromkeys(_RANGES, _MIXED)),
    )


def _mean(weighted: Sequence[tuple[float | None, float]]) -> float | None:
    known = [value * share for value, share in weighted if value is not None]
    return sum(known) if len(known) == len(weighted) else None


@cache
def _by_name() -> dict[str, Polarity]:
    return {each.name: each for each in load_polarities()}


def _read_polarities(text: str) -> tuple[Polarity, ...]:
    found = tuple(_polarity(row) for row in rows_of(_TABLE, text, _COLUMNS))
    refuse_twice(_TABLE, "name", [each.name for each in found])
    solvents = {solvent.name for solvent in load_solvents()}
    wrong = sorted(solvents ^ {each.name for each in found})
    if wrong:
        raise ValueError(f"{_TABLE}: not in both this table and solvents.tsv: {', '.join(wrong)}")
    return found


def _polarity(row: Mapping[str, str]) -> Polarity:
    numbers = sourced_numbers(_TABLE, row, _RANGES)
    alpha, beta, pi_star = (numbers[quantity] for quantity in ("alpha", "beta", "pi_star"))
    if alpha is None or beta is None or pi_star is None:
        raise ValueError(f"{_TABLE}: {row['name']}: alpha, beta and pi_star are needed")
    return Polarity(
        name=row["name"],
        alpha=alpha,
        beta=beta,
        pi_star=pi_star,
        donor_number=numbers["donor_number"],
        etn=numbers["etn"],
        error=float(row["error"]),
        sources=sources_of(row, _RANGES),
    )
