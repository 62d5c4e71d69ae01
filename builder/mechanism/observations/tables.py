"""Observations: rate constants, product shares and anchors, from rates.tsv, shares.tsv and anchors.tsv.

The headers of the tables say what each column holds, in which unit, and what was left out of them and why.
"""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from enum import StrEnum
from functools import cache
from typing import TypeVar

from builder.chemistry.structure import parse_smiles
from builder.mechanism.solvents import Solvent, find_solvent
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "Anchor",
    "AnchorKind",
    "Channel",
    "Known",
    "Mixture",
    "Quantity",
    "Rate",
    "Share",
    "ShareKind",
    "ToleranceKind",
    "load_anchors",
    "load_rates",
    "load_shares",
]

Mixture = tuple[tuple[Solvent, float], ...]
"""Solvents with their fraction by volume; the fractions add up to 1."""

ABSOLUTE = "absolute"
"""Stands as the set of rate constants that are relative to nothing."""

_RATES = (
    *("id", "set", "substrate", "nucleophile", "solvent", "temperature_c", "channel", "quantity", "value"),
    *("relative_to", "error", "source", "how", "note"),
)
_SHARES = (
    *("id", "substrate", "nucleophile", "solvent", "temperature_c", "concentration_m", "kind", "product", "value"),
    *("error", "source", "how", "note"),
)
_ANCHORS = (
    *("id", "what", "substrate", "nucleophile", "solvent", "temperature_c", "concentration_m", "channel", "kind"),
    *("product", "second_substrate", "second_nucleophile", "second_solvent", "expected", "tolerance_kind"),
    *("tolerance", "source", "how"),
)


class Channel(StrEnum):
    """Which pathway a rate constant belongs to; the header of rates.tsv draws the lines."""

    SN2 = "SN2"
    SN2_SOLVENT = "SN2 solvent"
    IONISATION = "ionisation"
    E2 = "E2"
    SOLVOLYSIS = "solvolysis"
    NGP = "NGP"
    OPENING = "opening"


class Quantity(StrEnum):
    """What the value of a rate is."""

    LOG_K = "log10 k"
    LOG_RATIO = "log10 ratio"


class ShareKind(StrEnum):
    """What a share is a share of; the header of shares.tsv says it in full."""

    ELIMINATION = "elimination"
    ALKENE = "alkene"
    TRANS_CIS = "trans-cis"
    REARRANGED = "rearranged"
    TRANSPOSED = "transposed"
    SITE = "site"
    INVERSION = "inversion"


class AnchorKind(StrEnum):
    """What the expected number of an anchor is: a rate, a share, or a property of a reaction or solvent."""

    LOG_K = "log10 k"
    LOG_RATIO = "log10 ratio"
    ELIMINATION = "elimination"
    ALKENE = "alkene"
    REARRANGED = "rearranged"
    TRANSPOSED = "transposed"
    SITE = "site"
    INVERSION = "inversion"
    ACTIVATION_ENTHALPY = "activation enthalpy"
    RHO = "rho+"
    N_T = "NT"
    Y_CL = "YCl"


class ToleranceKind(StrEnum):
    """How the tolerance of an anchor is meant."""

    FACTOR = "factor"
    ABSOLUTE = "absolute"
    AT_LEAST = "at least"
    AT_MOST = "at most"


class Known(StrEnum):
    """How a number was come by: seen in its source, or recalled."""

    LOOKED_UP = "looked_up"
    MEMORY = "memory"


_PRODUCT_NAMED = frozenset({"alkene", "trans-cis", "site", "inversion"})
"""Kinds of share that say nothing without the product they count."""
_RATE_KINDS = frozenset({AnchorKind.LOG_K, AnchorKind.LOG_RATIO})


@dataclass(frozen=True, slots=True, kw_only=True)
class Rate:
    """One rate constant, or the ratio of one to that of the row `relative_to`, as log10.

    substrate: canonical SMILES. nucleophile: canonical SMILES, None for ionisation and neighbouring-group help.
    value: log10 of k (M-1 s-1 for an added nucleophile or base, else s-1) or of the ratio; error: one standard error
    of it, 0 for the reference of a set. temperature_c: °C.
    relative_to: id of the reference of the set, which names itself; None for a rate constant.
    """

    id: str
    set: str
    substrate: str
    nucleophile: str | None
    solvent: Mixture
    temperature_c: float
    channel: Channel
    quantity: Quantity
    value: float
    relative_to: str | None
    error: float
    source: str
    how: Known
    note: str

    @property
    def is_reference(self) -> bool:
        """Return whether other rows of the set are relative to this one, which then says nothing by itself."""
        return self.relative_to == self.id


@dataclass(frozen=True, slots=True, kw_only=True)
class Share:
    """One share of product, a fraction from 0 to 1, with its standard error.

    nucleophile: what was added; None for plain solvolysis. concentration_m: mol/L of it, None where not stated.
    product: canonical SMILES of what is counted; None where the kind alone says it.
    """

    id: str
    substrate: str
    nucleophile: str | None
    solvent: Mixture
    temperature_c: float
    concentration_m: float | None
    kind: ShareKind
    product: str | None
    value: float
    error: float
    source: str
    how: Known
    note: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Anchor:
    """One number that a calibrated model should reproduce.

    The reaction is given as in `Rate` and `Share`; the second_ fields are the reaction a ratio is relative to, at the
    same temperature. Solvent scales have no substrate.
    tolerance: a factor on k or on a ratio, a distance from `expected`, or the bound itself, by tolerance_kind.
    """

    id: str
    what: str
    substrate: str | None
    nucleophile: str | None
    solvent: Mixture
    temperature_c: float
    concentration_m: float | None
    channel: Channel | None
    kind: AnchorKind
    product: str | None
    second_substrate: str | None
    second_nucleophile: str | None
    second_solvent: Mixture | None
    expected: float
    tolerance_kind: ToleranceKind
    tolerance: float
    source: str
    how: Known

    def is_met(self, computed: float) -> bool:
        """Return whether a computed number, in the unit of `expected`, lies within the tolerance."""
        if self.tolerance_kind is ToleranceKind.AT_LEAST:
            return computed >= self.tolerance
        if self.tolerance_kind is ToleranceKind.AT_MOST:
            return computed <= self.tolerance
        by_factor = self.tolerance_kind is ToleranceKind.FACTOR
        return abs(computed - self.expected) <= (math.log10(self.tolerance) if by_factor else self.tolerance)


@cache
def load_rates() -> tuple[Rate, ...]:
    """Return the rates in table order.

    Raises ValueError for a wrong header, blank cells, ids or observations given twice, unknown references, sources,
    solvents and words, numbers that are not finite, and SMILES that are not canonical.
    """
    return _read_rates(table_text(__package__, "rates.tsv"))


@cache
def load_shares() -> tuple[Share, ...]:
    """Return the shares in table order; raises ValueError as `load_rates` does."""
    return _read_shares(table_text(__package__, "shares.tsv"))


@cache
def load_anchors() -> tuple[Anchor, ...]:
    """Return the anchors in table order; raises ValueError as `load_rates` does."""
    return _read_anchors(table_text(__package__, "anchors.tsv"))


_Row = TypeVar("_Row", Rate, Share, Anchor)

# --- the tables -----------------------------------------------------------------------------------------------


def _within(table: str, row: Mapping[str, str], make: Callable[[Mapping[str, str]], _Row]) -> _Row:
    """Return the row made; what is wrong with it is said with the table and its id."""
    try:
        return make(row)
    except ValueError as error:
        raise ValueError(f"{table}: {row['id']}: {error}") from error


def _read_rates(text: str) -> tuple[Rate, ...]:
    found = tuple(_within("rates.tsv", row, _rate) for row in rows_of("rates.tsv", text, _RATES))
    refuse_twice("rates.tsv", "id", [rate.id for rate in found])
    refuse_twice("rates.tsv", "observation", [_observation(rate, rate.set, rate.channel) for rate in found])
    by_id = {rate.id: rate for rate in found}
    for rate in found:
        if rate.relative_to is not None:
            _check_reference(rate, by_id.get(rate.relative_to))
    return found


def _rate(row: Mapping[str, str]) -> Rate:
    quantity = Quantity(row["quantity"])
    relative_to = _text(row["relative_to"])
    if (relative_to is None) != (quantity is Quantity.LOG_K) or (relative_to is None) != (row["set"] == ABSOLUTE):
        raise ValueError("a ratio needs a set and a reference, a rate constant has neither")
    error = _number(row["error"])
    if error < 0 or (error == 0) != (relative_to == row["id"]):
        raise ValueError("the error must be positive, and 0 for the reference of a set only")
    return Rate(
        id=row["id"],
        set=row["set"],
        substrate=_smiles(row["substrate"]),
        nucleophile=_maybe_smiles(row["nucleophile"]),
        solvent=_mixture(row["solvent"]),
        temperature_c=_number(row["temperature_c"]),
        channel=Channel(row["channel"]),
        quantity=quantity,
        value=_number(row["value"]),
        relative_to=relative_to,
        error=error,
        source=row["source"],
        how=Known(row["how"]),
        note=_text(row["note"]) or "",
    )


def _check_reference(rate: Rate, reference: Rate | None) -> None:
    if reference is None or not reference.is_reference or reference.set != rate.set:
        raise ValueError(f"rates.tsv: {rate.id}: {rate.relative_to} is no reference of the set {rate.set}")
    if reference.value != 0 or reference.temperature_c != rate.temperature_c:
        raise ValueError(f"rates.tsv: {rate.id}: the reference must have value 0 and the same temperature")


def _read_shares(text: str) -> tuple[Share, ...]:
    found = tuple(_within("shares.tsv", row, _share) for row in rows_of("shares.tsv", text, _SHARES))
    refuse_twice("shares.tsv", "id", [share.id for share in found])
    refuse_twice(
        "shares.tsv",
        "observation",
        [_observation(share, share.kind, share.product, share.concentration_m) for share in found],
    )
    return found


def _share(row: Mapping[str, str]) -> Share:
    kind = ShareKind(row["kind"])
    value, error = _number(row["value"]), _number(row["error"])
    if not 0 <= value <= 1 or not 0 < error < 1:
        raise ValueError("the share must lie between 0 and 1, and its error too")
    return Share(
        id=row["id"],
        substrate=_smiles(row["substrate"]),
        nucleophile=_maybe_smiles(row["nucleophile"]),
        solvent=_mixture(row["solvent"]),
        temperature_c=_number(row["temperature_c"]),
        concentration_m=_maybe_positive(row["concentration_m"]),
        kind=kind,
        product=_product(kind, row["product"]),
        value=value,
        error=error,
        source=row["source"],
        how=Known(row["how"]),
        note=_text(row["note"]) or "",
    )


def _read_anchors(text: str) -> tuple[Anchor, ...]:
    found = tuple(_within("anchors.tsv", row, _anchor) for row in rows_of("anchors.tsv", text, _ANCHORS))
    refuse_twice("anchors.tsv", "id", [anchor.id for anchor in found])
    refuse_twice("anchors.tsv", "description", [anchor.what for anchor in found])
    return found


def _anchor(row: Mapping[str, str]) -> Anchor:
    kind = AnchorKind(row["kind"])
    channel = _text(row["channel"])
    second = _maybe_smiles(row["second_substrate"])
    second_solvent = None if row["second_solvent"] == NOTHING else _mixture(row["second_solvent"])
    if kind in _RATE_KINDS and channel is None:
        raise ValueError("a rate needs its channel")
    if len({kind is AnchorKind.LOG_RATIO, second is not None, second_solvent is not None}) > 1:
        raise ValueError("a ratio, and nothing else, needs a second substrate and a second solvent")
    if (row["substrate"] == NOTHING) != (kind in {AnchorKind.N_T, AnchorKind.Y_CL}):
        raise ValueError("all but solvent scales need a substrate")
    tolerance_kind, tolerance = ToleranceKind(row["tolerance_kind"]), _number(row["tolerance"])
    if tolerance <= (1 if tolerance_kind is ToleranceKind.FACTOR else 0):
        raise ValueError("a tolerance must be positive, and a factor above 1")
    if tolerance_kind is ToleranceKind.FACTOR and kind not in _RATE_KINDS:
        raise ValueError("only rates have a factor for tolerance")
    return Anchor(
        id=row["id"],
        what=row["what"],
        substrate=_maybe_smiles(row["substrate"]),
        nucleophile=_maybe_smiles(row["nucleophile"]),
        solvent=_mixture(row["solvent"]),
        temperature_c=_number(row["temperature_c"]),
        concentration_m=_maybe_positive(row["concentration_m"]),
        channel=None if channel is None else Channel(channel),
        kind=kind,
        product=_product(kind, row["product"]),
        second_substrate=second,
        second_nucleophile=_maybe_smiles(row["second_nucleophile"]),
        second_solvent=second_solvent,
        expected=_number(row["expected"]),
        tolerance_kind=tolerance_kind,
        tolerance=tolerance,
        source=row["source"],
        how=Known(row["how"]),
    )


# --- cells ----------------------------------------------------------------------------------------------------


def _observation(row: Rate | Share, *more: object) -> str:
    """Return what is observed and by whom, to find an observation that is entered twice."""
    solvent = "+".join(f"{part.name}:{fraction:g}" for part, fraction in row.solvent)
    parts = (row.substrate, row.nucleophile, solvent, row.temperature_c, row.source, *more)
    return " ".join(str(part) for part in parts)


def _text(cell: str) -> str | None:
    return None if cell == NOTHING else cell


def _number(cell: str) -> float:
    number = float(cell)
    if not math.isfinite(number):
        raise ValueError(f"{cell} is not finite")
    return number


def _maybe_positive(cell: str) -> float | None:
    if cell == NOTHING:
        return None
    number = _number(cell)
    if number <= 0:
        raise ValueError(f"a concentration of {cell} mol/L")
    return number


def _smiles(cell: str) -> str:
    canonical = parse_smiles(cell).smiles
    if cell != canonical:
        raise ValueError(f"{cell} is not canonical; write {canonical}")
    return cell


def _maybe_smiles(cell: str) -> str | None:
    return None if cell == NOTHING else _smiles(cell)


def _product(kind: str, cell: str) -> str | None:
    if kind in _PRODUCT_NAMED and cell == NOTHING:
        raise ValueError(f"a share of kind {kind} needs the product it counts")
    return _maybe_smiles(cell)


def _mixture(cell: str) -> Mixture:
    parts = []
    for part in cell.split("+"):
        name, _, fraction = part.rpartition(":")
        solvent = find_solvent(name)
        if solvent is None or solvent.name != name:
            raise ValueError(f"{name or part} is no name in the solvent table")
        parts.append((solvent, _number(fraction)))
    if any(fraction <= 0 for _, fraction in parts) or not math.isclose(sum(fraction for _, fraction in parts), 1):
        raise ValueError(f"the fractions of {cell} must be positive and add up to 1")
    return tuple(parts)
