"""What the lines of `measured` say as numbers: each a span that honest rounding leaves open."""

import math
from collections.abc import Iterator
from dataclasses import dataclass
from decimal import Decimal

from builder.checks.case import Case
from builder.records.fields import Ratio
from builder.records.model import Measurement, Substrate
from builder.records.quantities import Percent
from builder.rule import Path

__all__ = ["METHOD_POINTS", "Span", "excess_of_substrate", "excess_span", "half_unit", "lines_of", "percent_span"]

METHOD_POINTS = 3.0
"""What two methods may differ by, in per cent of substrate; common practice, no source."""


@dataclass(frozen=True, slots=True)
class Span:
    """A measured percentage: what is stated, and between which values it lies once rounding is undone.

    stated: the typed number; 0 for "< 2 %", whose span begins there. low, high: half a unit in the last typed digit
    wider; high is infinite for "> 98 %".
    """

    stated: float
    low: float
    high: float

    def __add__(self, other: "Span") -> "Span":
        return Span(self.stated + other.stated, self.low + other.low, self.high + other.high)


def half_unit(number: Decimal) -> float:
    """Return half a unit in the last typed digit of a number, in the unit of the number."""
    exponent = number.as_tuple().exponent
    return 0.5 * 10.0**exponent if isinstance(exponent, int) else 0.0


def percent_span(percent: Percent) -> Span:
    """Return the span of "88 %", "< 2 %" or "> 98 %"."""
    half = half_unit(percent.quantity.number)
    if percent.is_upper_limit:
        return Span(0.0, 0.0, percent.magnitude + half)
    return Span(percent.magnitude, percent.magnitude - half, math.inf if percent.is_limit else percent.magnitude + half)


def lines_of(case: Case, what: str) -> Iterator[tuple[Path, Measurement, Span]]:
    """Yield the measurements of one kind that are percentages, with their paths and spans."""
    for index, line in enumerate(case.record.outcome.measured):
        if line.what == what and not isinstance(line.value, Ratio):
            yield ("outcome", "measured", index), line, percent_span(line.value)


def excess_span(ee: Percent | None, er: Ratio | None) -> Span | None:
    """Return the enantiomeric excess without its sign, in percent, from ee or else from er; None without either.

    ee = |a − b| / (a + b). An er of 97:3 leaves 93 to 95 % open, one of 97.0:3.0 only 93.9 to 94.1 %.
    """
    if ee is not None:
        span = percent_span(ee)
        if ee.is_limit or span.stated >= 0:
            return Span(span.stated, max(0.0, span.low), min(100.0, span.high))
        return Span(-span.stated, max(0.0, -span.high), min(100.0, -span.low))
    if er is None:
        return None
    (minor, minor_half), (major, major_half) = sorted((float(n), half_unit(n)) for n in er.numbers)
    least = _excess(max(major - major_half, 0.0), minor + minor_half)
    return Span(er.excess_percent, max(0.0, least), _excess(major + major_half, max(minor - minor_half, 0.0)))


def _excess(major: float, minor: float) -> float:
    return 100.0 * (major - minor) / (major + minor)


def excess_of_substrate(substrate: Substrate) -> Span | None:
    """Return the enantiomeric excess of the substrate as typed; None where neither ee nor er is."""
    return excess_span(substrate.ee, substrate.er)
