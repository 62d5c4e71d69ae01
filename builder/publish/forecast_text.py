"""A forecast as plain text: what a chemist reads at the bench before setting up the flask."""

import math
from collections.abc import Iterable, Iterator, Sequence
from textwrap import shorten, wrap

from builder.chemistry.perception import ReactiveSite, perceive_sites
from builder.mechanism.asking import ABSOLUTE_ZERO_C, WITHOUT_EFFECT, Read, Reading
from builder.mechanism.forecast import Contribution, Forecast, Forecasted, PathwayReport, Reason
from builder.mechanism.improve import Improvement
from builder.mechanism.log_rate import REFERENCE_K
from builder.mechanism.question import Question
from builder.mechanism.rate_terms import fitted_parameters
from builder.mechanism.rules import GATES
from builder.publish.figures import equivalents_text, joined, significant
from builder.records.vocabulary import ELIMINATIONS, Course, Mechanism
from builder.sources import load_sources

__all__ = ["duration_text", "percent_text", "render_forecast", "verdict_sentence"]

WIDTH = 100
CALIBRATED_C = (0.0, 150.0)
"""Temperatures the terms were fitted between; the header of rate_terms.tsv says so."""
MOST_TERMS = 7
MOST_PRODUCTS = 6
MOST_CAUTIONS = 4
"""Cautions shown besides those graded stop, which are all shown."""
_FIRST_ORDER = frozenset({Mechanism.SN1, Mechanism.E1, Mechanism.NGP, Mechanism.ADE})
_COURSES = {
    Course.INVERSION: "with inversion",
    Course.RETENTION: "with retention",
    Course.RACEMISATION: "with racemisation",
    Course.PARTIAL_INVERSION: "with partial inversion",
    Course.DOUBLE_INVERSION: "with double inversion, which is retention",
    Course.ANTI: "anti",
    Course.SYN: "syn",
}
_SURROUNDINGS = ("neopentyl", "allylic", "benzylic", "propargylic")
_GRADES = {"stop": "STOP", "warn": "CAUTION", "note": "NOTE"}
_GATE_IDS = frozenset(gate.rule.id for gate in GATES)
_SELDOM = ("SN2' ", "E1cB ", "NGP ", "AdE ")
"""Pathways nobody misses where the substrate lacks what they need."""


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


def verdict_sentence(question: Question, forecast: Forecast) -> str:
    """Return the answer in a sentence: mechanism, where, with which course, what the mixture is made of."""
    if not forecast.is_covered:
        return _sentence(forecast.reasons[0].text)
    if not forecast.pathways:
        first = forecast.reasons[0]
        return f"No reaction is expected: {'every pathway is closed' if first.rule in _GATE_IDS else first.text}."
    if forecast.mechanism is Mechanism.NONE:
        fastest = forecast.pathways[0]
        conversion = _with_interval(forecast.conversion, forecast.conversion_interval)
        said = f"No reaction to speak of in {duration_text(question.time_s)}: conversion {conversion}"
        return f"{said}. The fastest way would be {fastest.mechanism.value}: {fastest.event}."
    main = _main_pathway(forecast)
    where = joined((forecast.mechanism.value, _where(question, main), "rearranged" if forecast.rearranged else ""), " ")
    sentence = f"{joined((where, _COURSES.get(forecast.course, '')))}; {_composition(forecast)}."
    rivals = _rivals(forecast)
    return f"{sentence} A close call: {' and '.join(rivals)} may win within the error." if rivals else sentence


# --- words and numbers ----------------------------------------------------------------------------------------


def duration_text(seconds: float | None) -> str:
    """Return a time in the unit a chemist would use, two or three digits."""
    if seconds is None:
        return "unknown"
    if not math.isfinite(seconds):
        return "never"
    if seconds < 1:
        return "less than 1 s"
    steps = ((120.0, 1.0, "s"), (7200.0, 60.0, "min"), (172_800.0, 3600.0, "h"), (6.3e7, 86_400.0, "d"))
    for below, unit_s, unit in steps:
        if seconds < below:
            return f"{seconds / unit_s:.3g} {unit}"
    years = seconds / 31_557_600.0
    return f"{significant(years, 2)} years" if years < 1000 else "more than 1000 years"


def percent_text(share: float) -> str:
    """Return a share as a percentage with the digits that mean something."""
    if share < 0.001:
        return "< 0.1 %"
    if share > 0.999:
        return "> 99.9 %"
    if share < 0.0095 or share >= 0.9905:
        return f"{100 * share:.1f} %"
    return f"{100 * share:.0f} %"


def _with_interval(value: float, interval: tuple[float, float]) -> str:
    low, high = (percent_text(end) for end in interval)
    if low == high == percent_text(value):
        return low
    return f"{percent_text(value)} ({low.removesuffix(' %')} to {high})"


def _sentence(text: str) -> str:
    return f"{text[:1].upper()}{text[1:]}{'' if text.endswith('.') else '.'}"


def _signed(value: float) -> str:
    return f"{round(value, 2) + 0.0:+.2f}".replace("-", "−")


def _celsius(question: Question) -> str:
    return f"{round(question.temperature_k + ABSOLUTE_ZERO_C, 1):g} °C"


def _source(contribution: Contribution) -> str:
    """Return where a number comes from: what it was fitted to, else its citation."""
    if contribution.key.startswith("model."):
        return "scatter of the fit"
    terms = fitted_parameters()
    rows = terms[contribution.key].rows if contribution.key in terms else 0
    if rows:
        return f"fitted, {rows} row{'s' if rows > 1 else ''}"
    if contribution.source == "estimated-here":
        return "estimated"
    return shorten(load_sources()[contribution.source].text, 30, placeholder=" …")


# --- verdict --------------------------------------------------------------------------------------------------


def _main_pathway(forecast: Forecast) -> PathwayReport:
    return next((p for p in forecast.pathways if p.mechanism is forecast.mechanism), forecast.pathways[0])


def _where(question: Question, pathway: PathwayReport) -> str:
    """Return "at the secondary benzylic carbon" where all carbons that bear the group are alike; else nothing."""
    if pathway.mechanism in {Mechanism.ADE, Mechanism.SN2_PRIME}:
        return ""
    sites = [site for site in perceive_sites(question.substrate) if not site.is_addition]
    own = [site for site in sites if site.leaving_group == pathway.leaving_group] or sites
    words = {_carbon(site) for site in own}
    return f"at the {words.pop()} carbon" if len(words) == 1 else ""


def _carbon(site: ReactiveSite) -> str:
    surroundings = [word for word in _SURROUNDINGS if word in site.classes]
    return joined((site.degree.value if site.degree else site.hybridisation.value, *surroundings), " ")


def _composition(forecast: Forecast) -> str:
    parts = {"substitution": 0.0, "elimination": 0.0, "addition": 0.0}
    for mechanism, share in forecast.shares.items():
        kind = "elimination" if mechanism in ELIMINATIONS else "substitution"
        parts["addition" if mechanism is Mechanism.ADE else kind] += share
    shown = [(kind, share) for kind, share in parts.items() if share >= 0.0005]
    return ", ".join(f"{percent_text(share)} {kind}" for kind, share in sorted(shown, key=lambda part: -part[1]))


def _rivals(forecast: Forecast) -> list[str]:
    """Return the mechanisms whose interval reaches above that of the leading one."""
    low = forecast.intervals.get(forecast.mechanism, (1.0, 1.0))[0]
    others = [m for m in forecast.shares if m is not forecast.mechanism]
    return [m.value for m in others if low < 0.5 and forecast.intervals[m][1] > max(low, 0.4)]


# --- blocks ---------------------------------------------------------------------------------------------------


def _reading_line(reading: Reading) -> str:
    same = reading.typed.strip() == reading.taken
    return f"  {reading.role:<12} {reading.taken if same else f'{reading.typed}, read as {reading.taken}'}"


def _conditions(read: Read) -> str:
    question = read.question
    parts = [
        _celsius(question),
        f"{question.concentration_m:.3g} mol/L substrate{_default(read, 'concentration')}",
        duration_text(question.time_s) + _default(read, "time"),
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
        f"  {mechanism.value:<6} {_with_interval(share, forecast.intervals[mechanism])}"
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
        times = f"half-life {duration_text(forecast.half_life_s)}; 95 % is not reached, the reagents run out before"
    else:
        times = f"half-life {duration_text(forecast.half_life_s)}, 95 % after {duration_text(forecast.t95_s)}"
    conversion = _with_interval(forecast.conversion, forecast.conversion_interval)
    return ["Rate", f"  {times}", f"  conversion in {duration_text(question.time_s)}: {conversion}"]


def _changes(changes: Sequence[Improvement], *, is_met: bool) -> list[str]:
    lines = [line for change in changes for line in _hanging(_change_text(change))]
    nothing = "  nothing needs to change: it is forecast as wanted" if is_met else "  nothing that was tried helps"
    return ["What would bring it about", *(lines or [nothing])]


def _change_text(change: Improvement) -> str:
    shares = f"{percent_text(change.share_before)} becomes {percent_text(change.share_after)}"
    conversion = f"conversion {percent_text(change.conversion_after)}"
    return joined((f"{change.change}: {shares}", conversion, "" if change.reaches else "still not as wanted"))


def _why(question: Question, forecast: Forecast) -> list[str]:
    if not forecast.pathways:
        return []
    main = _main_pathway(forecast)
    unit = "1/s" if main.mechanism in _FIRST_ORDER or _is_by_solvent(question, main) else "L/(mol s)"
    title = f"{main.event}; log k = {_signed(main.log10_k)} ± {main.error:.2f}, k in {unit} at {_celsius(question)}"
    ranked = sorted(main.contributions, key=lambda c: -max(abs(c.value), c.error))
    large = [c for c in ranked[:MOST_TERMS] if max(abs(c.value), c.error) >= 0.02]
    lines = [
        f"  {_signed(c.value):>7} ± {c.error:.2f}  {shorten(c.text, 56, placeholder=' …'):<56}  {_source(c)}"
        for c in large
    ]
    small = [c for c in main.contributions if c not in large]
    if small:
        lines.append(f"  {_signed(math.fsum(c.value for c in small)):>7}         smaller terms ({len(small)})")
    change = main.log10_k - math.fsum(c.value for c in main.contributions)
    if abs(change) >= 0.005:
        lines.append(f"  {_signed(change):>7}         {_last_step(question, main)}")
    return [*wrap(f"Why: {title}", WIDTH), *lines]


def _is_by_solvent(question: Question, pathway: PathwayReport) -> bool:
    return pathway.label.endswith("solvent") or pathway.partner in {solvent.name for solvent, _ in question.solvent}


def _last_step(question: Question, pathway: PathwayReport) -> str:
    """Return what turns the sum of the terms, at 25 °C and per mole of a partner, into the rate constant shown."""
    parts = (
        "" if abs(question.temperature_k - REFERENCE_K) < 0.05 else f"from 25 °C to {_celsius(question)}",
        "molarity of the solvent" if _is_by_solvent(question, pathway) else "",
        "its part of a common step" if pathway.mechanism in _FIRST_ORDER else "",
    )
    return joined(parts) or "what the flask adds"


def _closed(forecast: Forecast) -> list[str]:
    gates = [reason for reason in forecast.reasons if reason.rule in _GATE_IDS]
    lines = [f"  {reason.text} ({reason.rule})" for reason in gates if not reason.text.startswith(_SELDOM)]
    if not lines:
        return []
    seldom = dict.fromkeys(reason.text.split(" ")[0] for reason in gates if reason.text.startswith(_SELDOM))
    more = [f"  {', '.join(seldom)}: the substrate lacks what they need"] if seldom else []
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
        if reason.rule not in _GATE_IDS | {"pathway"} | said:
            yield _reason_text(reason)


def _reason_text(reason: Reason) -> str:
    if reason.value is None or reason.error is None:
        return reason.text
    return f"{reason.text} ({_signed(reason.value)} ± {reason.error:.2f})"


def _estimates(question: Question, forecast: Forecast) -> Iterator[str]:
    """Yield what in the answer rests on an estimate that no observation bears on."""
    if not forecast.pathways:
        return
    low, high = CALIBRATED_C
    if not low - 1 <= question.temperature_k + ABSOLUTE_ZERO_C <= high + 1:
        yield f"{_celsius(question)} lies outside the {low:g} to {high:g} °C of the data"
    guessed = [c.text for c in _main_pathway(forecast).contributions if _is_guess(c)]
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
    grave = [caution for caution in cautions if caution["severity"] == "stop"]
    milder = {caution["id"]: caution for caution in reversed(cautions) if caution["severity"] != "stop"}
    shown = [*grave, *[caution for caution in cautions if caution in milder.values()][:MOST_CAUTIONS]]
    lines = [line for caution in shown for line in _caution_lines(caution)]
    rest = len(cautions) - len(shown)
    return ["Cautions", *lines, *([f"  {rest} more, see --json"] if rest else []), f"  {end}"]


def _caution_lines(caution: dict[str, str]) -> Iterable[str]:
    source = shorten(caution["source"], 44, placeholder=" …")
    return _hanging(f"{_GRADES[caution['severity']]}: {caution['text']}. {_sentence(caution['precaution'])} [{source}]")


def _hanging(text: str) -> list[str]:
    return wrap(text, WIDTH, initial_indent="  ", subsequent_indent="    ")
