"""Ratios of products and of isomers: what they add up to, their digits, their calibration, the yields beside them."""

from collections.abc import Iterator, Mapping

from builder.checks.case import Case
from builder.checks.measured import METHOD_POINTS, Span, is_chromatography, is_nmr, lines_of
from builder.finding import Level
from builder.records.fields import Ratio
from builder.records.model import Measurement
from builder.records.quantities import half_unit
from builder.records.specimen import TWO_PRODUCTS, outcome_example
from builder.records.vocabulary import YieldKind
from builder.rule import Fault, Path, rule

__all__ = ["RATIO_CHECKS"]

SUM_POINTS = 0.5
_LIKE_PERCENT = (80.0, 120.0)
"""Sums between these were meant as per cent; an estimate made here."""
_TOO_FINE_PERCENT = ((is_nmr, 0.1), (is_chromatography, 0.01))
"""Method, and the last digit beyond what it can vouch for, in per cent of the whole; common practice, no source."""
_HALF = 0.51  # of that digit, with room for parts that do not add up to 100 exactly

_ASSAY = "{yield: 81 %, of: A, kind: assay}"
_RATIO = "{ratio: 'A:B = 90:10', by: GC, calibrated: %s}"
_EE = "{ee: %s, of: A, by: chiral HPLC}"
_FLAT = "{label: A, name: 2-azidobutane, smiles: 'CC[C@@H](C)N=[N+]=[N-]', use: desired}"
_CHIRAL = (
    "substrate: {name: (S)-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, class: secondary,"
    " leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
)


def _two(*lines: str) -> str:
    return outcome_example(*lines, products=TWO_PRODUCTS)


def _ratios(case: Case) -> Iterator[tuple[Path, Measurement, Ratio]]:
    """Yield every er, dr and ratio that was measured, with its path."""
    for index, line in enumerate(case.record.outcome.measured):
        if isinstance(line.value, Ratio):
            yield ("outcome", "measured", index, line.what), line, line.value


@rule(
    id="ratio-against-yields",
    title="A ratio that the yields beside it deny",
    level=Level.QUERY,
    source="common-practice",
    needs=("label-unknown", "label-twice"),
    fires_on=(
        _two(_RATIO % "true", "{yield: 60 %, of: A, kind: assay}", "{yield: 30 %, of: B, kind: assay}"),
        _two(_RATIO % "true", "{yield: 60 %, of: A, kind: isolated}", "{yield: 30 %, of: B, kind: isolated}"),
    ),
    silent_on=(
        _two(_RATIO % "true", "{yield: 82 %, of: A, kind: assay}", "{yield: 9 %, of: B, kind: assay}"),
        _two(_RATIO % "true", "{yield: 80 %, of: A, kind: isolated}", "{yield: 3 %, of: B, kind: isolated}"),
    ),
)
def ratio_is_against_the_yields(case: Case) -> Iterator[Fault]:
    """Assay yields of the parts of a ratio stand in that ratio, within 3 points; no isolated yield exceeds its part.

    The mixture holds what the ratio says; isolation loses, and may lose one isomer more than another.
    """
    kinds: Mapping[YieldKind, dict[frozenset[str], Span]] = {
        kind: {frozenset(line.of or ()): span for _, line, span in lines_of(case, "yield") if line.kind is kind}
        for kind in (YieldKind.ASSAY, YieldKind.ISOLATED)
    }
    for path, line, ratio in _ratios(case):
        if line.what != "ratio":
            continue
        parts = [frozenset(part) for part in ratio.parts]
        shares = list(_shares(ratio))
        measured = [_of_part(part, kinds[YieldKind.ASSAY]) for part in parts]
        known = [span for span in measured if span is not None]
        if len(known) == len(parts) and sum(span.stated for span in known) > 0:
            found = list(_shares_of_yields(known))
            pairs = list(zip(shares, found, strict=True))
            if any(a.is_above(b, METHOD_POINTS) or b.is_above(a, METHOD_POINTS) for a, b in pairs):
                said = ":".join(f"{span.stated:.0f}" for span in found)
                yield _against(path, f"the assay yields give {said}, the ratio is {ratio}")
                continue
        for part, share in zip(parts, shares, strict=True):
            weighed = _of_part(part, kinds[YieldKind.ISOLATED])
            if weighed is not None and weighed.is_above(share, METHOD_POINTS):
                message = (
                    f"{weighed.stated:g} % of {'+'.join(sorted(part))} was isolated, {share.stated:.3g} % is its part"
                )
                yield _against(path, message)
                break


def _against(at: Path, message: str) -> Fault:
    return Fault(at=at, message=message, mend="correct the ratio or the yields, or accept this with the reason")


def _of_part(part: frozenset[str], yields: Mapping[frozenset[str], Span]) -> Span | None:
    """Return the yield of a part of a ratio: its own, or the sum of its labels'; None where one is lacking."""
    if part in yields:
        return yields[part]
    each = [yields.get(frozenset({label})) for label in part]
    known = [span for span in each if span is not None]
    return sum(known[1:], known[0]) if known and len(known) == len(each) else None


def _shares(ratio: Ratio) -> Iterator[Span]:
    """Yield the parts of a ratio in per cent of their sum, with what rounding leaves open."""
    total = float(sum(ratio.numbers))
    for number, percent in zip(ratio.numbers, ratio.percentages, strict=True):
        yield Span(percent, percent, 100.0 * half_unit(number) / total)


def _shares_of_yields(spans: list[Span]) -> Iterator[Span]:
    total = sum(span.stated for span in spans)
    for span in spans:
        yield Span(*(100.0 * each / total for each in (span.low, span.high, span.half)))


@rule(
    id="ratio-not-calibrated",
    title="A ratio from uncalibrated areas",
    level=Level.QUERY,
    source="wernerova-hudlicky-2010",
    fires_on=(_two(_RATIO % "false", _ASSAY), _two("{dr: '90:10', of: A, by: GC, calibrated: false}", _ASSAY)),
    silent_on=(
        _two(_RATIO % "true", _ASSAY),
        _two((_RATIO % "false").replace("GC", "1H NMR"), _ASSAY),
    ),
)
def ratio_is_not_calibrated(case: Case) -> Iterator[Fault]:
    """A ratio of products or diastereomers from chromatographic areas is calibrated with response factors.

    Two isomers rarely answer a detector alike: an area ratio is not a ratio of amounts. NMR integrals count nuclei and
    need no factor; two enantiomers have the same one.
    """
    for path, line, _ in _ratios(case):
        if line.what in {"ratio", "dr"} and line.calibrated is False and not is_nmr(line.by):
            yield Fault(
                at=(*path[:-1], "calibrated"),
                message="this ratio is one of areas, not of amounts",
                mend="determine the response factors, or accept this query with the reason",
            )


@rule(
    id="ratio-overprecise",
    title="More digits than the method can vouch for",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        _two("{ratio: 'A:B = 90.4:9.6', by: 1H NMR}", _ASSAY),
        _two("{ratio: 'A:B = 90.42:9.58', by: GC, calibrated: true}", _ASSAY),
        _CHIRAL + outcome_example(_ASSAY, _EE % "96.04 %", products=_FLAT),
    ),
    silent_on=(
        _two("{ratio: 'A:B = 90:10', by: 1H NMR}", _ASSAY),
        _two("{ratio: 'A:B = 9.4:1', by: 1H NMR}", _ASSAY),
        _two("{ratio: 'A:B = 90.4:9.6', by: GC, calibrated: true}", _ASSAY),
        _CHIRAL + outcome_example(_ASSAY, _EE % "96.0 %", products=_FLAT),
    ),
)
def ratio_is_overprecise(case: Case) -> Iterator[Fault]:
    """A ratio has the digits of its method: whole per cent by NMR, tenths by chromatography.

    Integrals are good to a per cent or two, areas to a tenth of one; a further digit claims what was not measured.
    """
    for index, line in enumerate(case.record.outcome.measured):
        too_fine = next((digit for method, digit in _TOO_FINE_PERCENT if method(line.by)), None)
        if too_fine is None or line.what not in {"ratio", "er", "dr", "ee"}:
            continue
        if isinstance(line.value, Ratio):
            half = max(map(half_unit, line.value.numbers)) * 100.0 / float(sum(line.value.numbers))
        else:
            half = half_unit(line.value.quantity.number)
        if half <= _HALF * too_fine:
            yield Fault(
                at=("outcome", "measured", index, line.what),
                message=f"{line.value} by {line.by}",
                mend=f"round it to {10 * too_fine:g} %",
            )


@rule(
    id="ratio-sum-odd",
    title="A ratio whose parts do not make a whole",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        _two("{ratio: 'A:B = 65:30', by: 1H NMR}", _ASSAY),
        _CHIRAL + outcome_example(_ASSAY, "{er: '95:3', of: A, by: chiral HPLC}", products=_FLAT),
    ),
    silent_on=(
        _two("{ratio: 'A:B = 65:35', by: 1H NMR}", _ASSAY),
        _two("{ratio: 'A:B = 2:1', by: 1H NMR}", _ASSAY),
        _two("{ratio: 'A:B = 100:7', by: 1H NMR}", _ASSAY),
        _two("{ratio: 'A:B = 94.6:5.3', by: GC, calibrated: true}", _ASSAY),
    ),
)
def ratio_sum_is_odd(case: Case) -> Iterator[Fault]:
    """A ratio in per cent adds up to 100 ± 0.5, rounding apart; one to 1 or to 100 needs to add up to nothing.

    65:30 leaves open whether 5 % was something else or a digit slipped.
    """
    for path, _, ratio in _ratios(case):
        total = float(sum(ratio.numbers))
        rounding = sum(half_unit(number) for number in ratio.numbers)
        is_relative = any(number in {1, 100} for number in ratio.numbers)
        low, high = _LIKE_PERCENT
        if is_relative or not low <= total <= high or abs(total - 100.0) <= max(SUM_POINTS, rounding):
            continue
        normal = ":".join(f"{percent:.0f}" for percent in ratio.percentages)
        yield Fault(
            at=path,
            message=f"{ratio} adds up to {total:g}",
            mend=f"name what the rest is, or write {normal} if nothing else was there",
            data={"sum": total},
        )


RATIO_CHECKS = (
    ratio_is_against_the_yields,
    ratio_is_not_calibrated,
    ratio_is_overprecise,
    ratio_sum_is_odd,
)
