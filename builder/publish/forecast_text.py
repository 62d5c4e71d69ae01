"""A forecast as plain text: what a chemist reads at the bench before setting up the flask."""

import math
from collections.abc import Iterable, Iterator, Sequence
from textwrap import shorten, wrap

from builder.checks.forecast_cautions import MOST_CAUTIONS
from builder.checks.hazards.cautions import Severity
from builder.mechanism.asking import ABSOLUTE_ZERO_C, WITHOUT_EFFECT, Read, Reading
from builder.mechanism.forecast import Contribution, Forecast, Forecasted, Reason
from builder.mechanism.improve import Improvement
from builder.mechanism.outlook import expected_text, percent_text
from builder.mechanism.question import Question
from builder.mechanism.rate_terms import fitted_parameters
from builder.publish.figures import joined
from builder.publish.forecast_parts import (
    GATE_IDS,
    TermLine,
    as_sentence,
    celsius_text,
    closed_gates,
    main_pathway,
    signed,
    time_text,
    verdict_sentence,
    why,
)
from builder.records.figures import equivalents_text
from builder.records.vocabulary import Course, Mechanism

__all__ = ["render_forecast"]

WIDTH = 100
CALIBRATED_C = (0.0, 150.0)
"""Temperatures the terms were fitted between; the header of rate_terms.tsv says so."""
MOST_PRODUCTS = 6


def render_forecast(
    read: Read,
    forecast: Forecast,
    cautions: Sequence[dict[str, str]],
    changes: Sequence[Improvement] | None = None,
    *,
    is_met: bool = False,
) -> str:
    """Return a forecast for a terminal: verdict first, then what it rests on.

    cautions: as `answer_of` takes them. changes: what would bring about what is wanted; None where nobody asked.
    is_met: whether the forecast is as wanted already.
    """
    question = read.question
    blocks = [
        [*wrap(verdict_sentence(question, forecast), WIDTH), "A forecast from a rule engine, not a measurement."],
        ["Read as", *map(_reading_line, read.readings), f"  {_conditions(read)}"],
        _shares(forecast),
        _products(forecast),
        _rate(question, forecast),
        [] if changes is None else _changes(changes, is_met=is_met),
        _why(question, forecast),
        _closed(forecast),
        _notes(read, forecast),
        _cautions(cautions),
    ]
    return "\n\n".join("\n".join(block) for block in blocks if block) + "\n"


# --- blocks ---------------------------------------------------------------------------------------------------


def _reading_line(reading: Reading) -> str:
    same = reading.typed.strip() == reading.taken
    return f"  {reading.role:<12} {reading.taken if same else f'{reading.typed}, read as {reading.taken}'}"


def _conditions(read: Read) -> str:
    question = read.question
    parts = [
        celsius_text(question),
        f"{question.concentration_m:.3g} mol/L substrate{_default(read, 'concentration')}",
        time_text(question.time_s) + _default(read, "time"),
        "" if question.solvent else "neat",
    ]
    if question.nucleophile is not None or question.base is not None:
        equivalents = f"{equivalents_text(question.charged_equivalents)} equivalents"
        parts.insert(2, equivalents + _default(read, "equivalents"))
    return f"{'conditions':<12} {joined(parts)}"


def _default(read: Read, what: str) -> str:
    return " (default)" if what in read.assumed else ""


def _shares(forecast: Forecast) -> list[str]:
    shown = [
        f"  {mechanism.value:<6} {expected_text(share, forecast.intervals[mechanism])}"
        for mechanism, share in forecast.shares.items()
        if share >= 0.001 or forecast.intervals[mechanism][1] >= 0.01
    ]
    little = "the little that" if forecast.mechanism is Mechanism.NONE else "what"
    return [f"Shares of {little} reacts, by mechanism (5 to 95 %)", *shown] if shown else []


def _products(forecast: Forecast) -> list[str]:
    if not forecast.products:
        return []
    ways: dict[str, list[Forecasted]] = {}
    for product in forecast.products:
        ways.setdefault(product.structure.smiles, []).append(product)
    ranked = sorted(ways.values(), key=lambda ways: -_share(ways))
    shown = [ways for ways in ranked if _share(ways) >= 0.005][:MOST_PRODUCTS] or ranked[:1]
    rest = len(ranked) - len(shown)
    lines = [line for ways in shown for line in _product_lines(ways)]
    return ["Products, share of what reacts", *lines, *([f"  {rest} more, see --json"] if rest else [])]


def _share(ways: Sequence[Forecasted]) -> float:
    return math.fsum(way.share for way in ways)


def _product_lines(ways: Sequence[Forecasted]) -> list[str]:
    """Return the lines of one product; ways: one for each mechanism that leads to it."""
    line = f"  {percent_text(_share(ways)):>8}  {ways[0].structure.smiles}"
    told = [way for way in ways if way.share >= 0.0005] or ways[:1]
    said = [_way_text(way, shared=len(told) > 1) for way in told]
    if len(said) == 1 and len(line) + len(said[0]) < WIDTH:
        return [f"{line}  {said[0]}"]
    return [line, *(f"            {each}" for each in said)]


def _way_text(way: Forecasted, *, shared: bool) -> str:
    mechanism = f"{way.mechanism.value} {percent_text(way.share)}" if shared else way.mechanism.value
    course = "" if way.course is Course.NOT_APPLICABLE else way.course.value
    how = joined((mechanism, course, "rearranged" if way.rearranged else ""))
    return f"{how}; {' > '.join(way.path)}"


def _rate(question: Question, forecast: Forecast) -> list[str]:
    if forecast.half_life_s is None:
        return []
    if math.isinf(forecast.half_life_s):
        times = "half-life: never reached, the reagents run out before"
    elif forecast.t95_s is None or math.isinf(forecast.t95_s):
        times = f"half-life {time_text(forecast.half_life_s)}; 95 % is not reached, the reagents run out before"
    else:
        times = f"half-life {time_text(forecast.half_life_s)}, 95 % after {time_text(forecast.t95_s)}"
    conversion = expected_text(forecast.conversion, forecast.conversion_interval)
    return ["Rate", f"  {times}", f"  conversion in {time_text(question.time_s)}: {conversion}"]


def _changes(changes: Sequence[Improvement], *, is_met: bool) -> list[str]:
    lines = [line for change in changes for line in _hanging(_change_text(change))]
    nothing = "  nothing needs to change: it is forecast as wanted" if is_met else "  nothing that was tried helps"
    return ["What would bring it about", *(lines or [nothing])]


def _change_text(change: Improvement) -> str:
    shares = f"{percent_text(change.share_before)} becomes {percent_text(change.share_after)}"
    conversion = f"conversion {percent_text(change.conversion_after)}"
    return joined((f"{change.change}: {shares}", conversion, "" if change.reaches else "still not as wanted"))


def _why(question: Question, forecast: Forecast) -> list[str]:
    found = why(question, forecast)
    if found is None:
        return []
    return [*wrap(f"Why: {found.event}; {found.log_k}", WIDTH), *map(_term_line, found.terms)]


def _term_line(term: TermLine) -> str:
    error = f"± {term.error}" if term.error else ""
    text = shorten(term.text, 56, placeholder=" …")
    source = shorten(term.source, 30, placeholder=" …")
    return f"  {term.value:>7} {error:<6}  {text:<56}  {source}".rstrip()


def _closed(forecast: Forecast) -> list[str]:
    told, seldom = closed_gates(forecast)
    if not told:
        return []
    more = [f"  {', '.join(seldom)}: the substrate lacks what they need"] if seldom else []
    lines = [f"  {each.text} ({each.rule})" for each in told]
    return ["Closed (`handbook rule` with the id in brackets explains)", *lines, *more]


def _notes(read: Read, forecast: Forecast) -> list[str]:
    lines = dict.fromkeys((*_flask_notes(read, forecast), *_estimates(read.question, forecast)))
    return ["Mind", *(part for line in lines for part in _hanging(line))] if lines else []


def _flask_notes(read: Read, forecast: Forecast) -> Iterator[str]:
    for reading in read.readings:
        if reading.taken.endswith(WITHOUT_EFFECT):
            yield f"{reading.typed} is {WITHOUT_EFFECT}"
    said = {contribution.key for pathway in forecast.pathways for contribution in pathway.contributions}
    told = forecast.reasons if forecast.pathways else forecast.reasons[1:]  # the first one is the verdict
    for reason in told:
        if reason.rule not in GATE_IDS | {"pathway"} | said:
            yield _reason_text(reason)


def _reason_text(reason: Reason) -> str:
    if reason.value is None or reason.error is None:
        return reason.text
    return f"{reason.text} ({signed(reason.value)} ± {reason.error:.2f})"


def _estimates(question: Question, forecast: Forecast) -> Iterator[str]:
    """Yield what in the answer rests on an estimate that no observation bears on."""
    if not forecast.pathways:
        return
    low, high = CALIBRATED_C
    if not low - 1 <= question.temperature_k + ABSOLUTE_ZERO_C <= high + 1:
        yield f"{celsius_text(question)} lies outside the {low:g} to {high:g} °C of the data"
    guessed = [c.text for c in main_pathway(forecast).contributions if _is_guess(c)]
    if guessed:
        yield f"only estimated, no observation bears on it: {'; '.join(guessed[:4])}"


def _is_guess(contribution: Contribution) -> bool:
    if contribution.source != "estimated-here" or max(abs(contribution.value), contribution.error) < 0.3:
        return False
    terms = fitted_parameters()
    return contribution.key not in terms or terms[contribution.key].rows == 0


def _cautions(cautions: Sequence[dict[str, str]]) -> list[str]:
    end = "It is a screen, not a clearance: local rules and qualified people decide."
    if not cautions:
        return wrap(f"Cautions: none in the table for what is drawn. {end}", WIDTH)
    grave = [caution for caution in cautions if caution["severity"] == Severity.STOP]
    milder = {caution["id"]: caution for caution in reversed(cautions) if caution["severity"] != Severity.STOP}
    shown = [*grave, *[caution for caution in cautions if caution in milder.values()][:MOST_CAUTIONS]]
    lines = [line for caution in shown for line in _caution_lines(caution)]
    rest = len(cautions) - len(shown)
    return ["Cautions", *lines, *([f"  {rest} more, see --json"] if rest else []), f"  {end}"]


def _caution_lines(caution: dict[str, str]) -> Iterable[str]:
    source = shorten(caution["source"], 44, placeholder=" …")
    grade, precaution = Severity(caution["severity"]).word, as_sentence(caution["precaution"])
    return _hanging(f"{grade}: {caution['text']}. {precaution} [{source}]")


def _hanging(text: str) -> list[str]:
    return wrap(text, WIDTH, initial_indent="  ", subsequent_indent="    ")
