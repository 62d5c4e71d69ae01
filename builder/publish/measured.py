"""Measurements in words: a number never stands without its kind, its product, its scale and its runs."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from builder.publish.figures import joined
from builder.records.fields import Ratio
from builder.records.figures import amount_text, quantity_text
from builder.records.model import Measurement, Outcome, Performed, RateConstant, Record
from builder.records.quantities import Percent
from builder.records.vocabulary import ProductUse

__all__ = [
    "MeasuredLine",
    "measured_line",
    "measured_lines",
    "outcome_headline",
    "rate_constant_text",
    "runs_text",
    "yield_caption",
]


@dataclass(frozen=True, slots=True)
class MeasuredLine:
    """One measurement as shown.

    what: yield, conversion, recovered, ee, er, dr or ratio. text: the number with its kind, "88 % isolated yield".
    of: labels it speaks of. names: of the one product, or of several with their labels.
    basis: scale, runs, method and the like.
    """

    what: str
    text: str
    of: tuple[str, ...]
    names: str
    basis: str

    @property
    def brief(self) -> str:
        """Return number, kind and what it is of: "88 % isolated yield of (R)-2-azidooctane"."""
        return joined((self.text, f"of {self.names}" if self.names else ""), " ")


def measured_lines(record: Record, scale_mol: float | None) -> tuple[MeasuredLine, ...]:
    """Return every measurement of a record in its own order; scale_mol is the amount of substrate."""
    return tuple(measured_line(line, record, scale_mol) for line in record.outcome.measured)


def measured_line(line: Measurement, record: Record, scale_mol: float | None) -> MeasuredLine:
    """Return one measurement as shown."""
    of = line.of or ()
    names = {product.label: product.name for product in record.outcome.products}
    basis = joined(
        (
            _scale_text(scale_mol) if line.what == "yield" else "",
            f"n = {line.n}" if line.n else (runs_text(record.performed) if line.what == "yield" else ""),
            f"spread {line.spread}" if line.spread else "",
            f"{quantity_text(line.mass)} weighed" if line.mass else "",
            f"purity {quantity_text(line.purity)}" if line.purity else "",
            f"by {line.by}" if line.by else "",
            {True: "calibrated", False: "not calibrated", None: ""}[line.calibrated],
            line.note or "",
        )
    )
    return MeasuredLine(line.what, _text(line), of, _named(of, names), basis)


def outcome_headline(record: Record, lines: Sequence[MeasuredLine]) -> str:
    """Return the outcome in one line: what happened, and the number that says how well.

    lines: every measurement of the record as shown.
    Yields of the desired products come first, then ratios, conversion, what was recovered, the rate constant.
    """
    outcome = record.outcome
    wanted = {product.label for product in record.desired}
    yields = [line for line in lines if line.what == "yield" and wanted & set(line.of)]
    chosen = [f"{line.brief} ({line.basis})" for line in yields[:2]]
    if not chosen or len(yields[0].of) > 1:
        chosen += [line.brief for line in lines if line.what == "ratio"][:1]
    if not chosen:
        chosen = [line.brief for line in lines if line.what in {"conversion", "recovered"}][:2]
    if not chosen and outcome.rate_constant:
        chosen = [rate_constant_text(outcome.rate_constant)]
    return joined((joined(outcome.result, " and "), joined(chosen, "; ")), ": ")


def rate_constant_text(rate: RateConstant) -> str:
    """Return a rate constant with order, temperature, spread and runs."""
    order = {1: "first", 2: "second"}[rate.order]
    details = joined(
        (
            f"{order} order",
            f"spread {quantity_text(rate.spread)}" if rate.spread else "",
            f"n = {rate.n}" if rate.n else "n not stated",
            f"by {rate.by}" if rate.by else "",
        )
    )
    return f"k = {quantity_text(rate.value)} at {rate.temperature} ({details})"


def runs_text(performed: Performed) -> str:
    """Return the number of runs, or that it is not stated."""
    return f"n = {performed.runs}" if performed.runs else "n not stated"


def yield_caption(outcome: Outcome, label: str) -> str:
    """Return what stands below a drawn product: its own yield with the kind, or its use."""
    for line in outcome.measured:
        if line.what == "yield" and line.of == (label,):
            return f"{line.value} {line.kind}"
    used = next((product.use for product in outcome.products if product.label == label), None)
    return str(ProductUse.BY_PRODUCT) if used is ProductUse.BY_PRODUCT else ""


def _named(of: tuple[str, ...], names: Mapping[str, str]) -> str:
    if len(of) == 1:
        return names.get(of[0], of[0])
    return " + ".join(f"{label} ({names[label]})" if label in names else label for label in of)


def _scale_text(scale_mol: float | None) -> str:
    return f"{amount_text(scale_mol)} scale" if scale_mol is not None else "scale not known"


def _text(line: Measurement) -> str:
    value = line.value
    if isinstance(value, Ratio):
        return str(value) if line.what == "ratio" else f"{line.what} {value}"
    return _percent_text(value, line)


def _percent_text(value: Percent, line: Measurement) -> str:
    match line.what:
        case "yield":
            kind = "area share" if line.kind == "area" else f"{line.kind} yield"
            return f"{value} {kind}"
        case "recovered":
            return f"{value} recovered"
        case what:
            return f"{value} {what}"
