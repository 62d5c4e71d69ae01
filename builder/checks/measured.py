"""What the lines of `measured` say as numbers, with what honest rounding leaves open."""

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.records.fields import Ratio
from builder.records.model import Measurement, Substrate
from builder.records.quantities import Percent, half_unit
from builder.rule import Path

__all__ = [
    "METHOD_POINTS",
    "Span",
    "analysis_in",
    "exactly",
    "excess_of_substrate",
    "excess_span",
    "is_chromatography",
    "is_nmr",
    "lines_of",
    "percent_span",
]

METHOD_POINTS = 3.0
"""What two methods may differ by, in per cent of substrate; common practice, no source."""

_CHROMATOGRAPHY = re.compile(r"\b(?:GC|HPLC|UPLC|LC|SFC)\b")
_NMR = re.compile(r"q?NMR\b")
_ANALYSIS = re.compile(rf"{_CHROMATOGRAPHY.pattern}|{_NMR.pattern}|\btitration\b")


def is_chromatography(method: str | None) -> bool:
    """Say whether a method, as typed under `by`, is one of chromatography."""
    return _CHROMATOGRAPHY.search(method or "") is not None


def is_nmr(method: str | None) -> bool:
    """Say whether a method, as typed under `by`, is NMR."""
    return _NMR.search(method or "") is not None


def analysis_in(method: str | None) -> str:
    """Return what a method determines an amount by without a balance ("GC", "qNMR"); empty where it names nothing."""
    found = _ANALYSIS.search(method or "")
    return found[0] if found else ""


@dataclass(frozen=True, slots=True)
class Span:
    """Between which percentages a measured value lies, and what its typed digits leave open besides.

    low, high: a plain number is both; "< 2 %" begins at 0, "> 98 %" has no upper end.
    half: half a unit in the last typed digit, in points.
    """

    low: float
    high: float
    half: float

    @property
    def stated(self) -> float:
        """Return the number to count with: as typed, 0 for an upper limit."""
        return self.low

    def __add__(self, other: "Span") -> "Span":
        return Span(self.low + other.low, self.high + other.high, self.half + other.half)

    def is_above(self, other: "Span", points: float) -> bool:
        """Say whether this exceeds another by more than `points`, or by more than rounding where that is wider."""
        return self.low - other.high > max(points, self.half + other.half)


def exactly(percent: float) -> Span:
    """Return the span of a number that was not measured, such as the 100 % of a whole."""
    return Span(percent, percent, 0.0)


def percent_span(percent: Percent) -> Span:
    """Return the span of "88 %", "< 2 %" or "> 98 %"."""
    half = half_unit(percent.quantity.number)
    if percent.is_upper_limit:
        return Span(0.0, percent.magnitude, half)
    return Span(percent.magnitude, math.inf if percent.is_limit else percent.magnitude, half)


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
        if ee.is_limit or span.low >= 0:
            return Span(span.low, min(100.0, span.high), span.half)
        return Span(-span.low, -span.low, span.half)
    if er is None:
        return None
    total, halves = float(sum(er.numbers)), sum(map(half_unit, er.numbers))
    return Span(er.excess_percent, er.excess_percent, 100.0 * halves / total)


def excess_of_substrate(substrate: Substrate) -> Span | None:
    """Return the enantiomeric excess of the substrate as typed; None where neither ee nor er is."""
    return excess_span(substrate.ee, substrate.er)
