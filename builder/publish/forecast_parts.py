"""A forecast in parts, as plain data: what the terminal and the page of an entry both say of it."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from builder.chemistry.perception import ReactiveSite, perceive_sites
from builder.mechanism.asking import ABSOLUTE_ZERO_C
from builder.mechanism.forecast import Contribution, Forecast, PathwayReport
from builder.mechanism.log_rate import REFERENCE_K
from builder.mechanism.outlook import expected_text, percent_text
from builder.mechanism.question import Question
from builder.mechanism.rate_terms import fitted_parameters
from builder.mechanism.rules import GATES
from builder.publish.figures import capital, how_many, joined
from builder.records.figures import duration_text
from builder.records.vocabulary import ELIMINATIONS, Course, Mechanism
from builder.sources import source_text

__all__ = [
    "GATE_IDS",
    "Closed",
    "TermLine",
    "Why",
    "as_sentence",
    "celsius_text",
    "closed_gates",
    "main_pathway",
    "signed",
    "time_text",
    "verdict_sentence",
    "why",
]

GATE_IDS = frozenset(gate.rule.id for gate in GATES)
MOST_TERMS = 7
LEAST_TERM = 0.02
"""Log units from which a term is named, in its value or its error."""
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
_SELDOM = ("SN2' ", "E1cB ", "NGP ", "AdE ")
"""Pathways nobody misses where the substrate lacks what they need."""


@dataclass(frozen=True, slots=True)
class TermLine:
    """One term of the rate: signed value and error in log10 units, what it stands for, where it comes from.

    The error is empty where the line sums up several terms.
    """

    value: str
    error: str
    text: str
    source: str


@dataclass(frozen=True, slots=True)
class Why:
    """What the rate of the main pathway is made of: the event with its log10 k, the terms, the largest first."""

    event: str
    log_k: str
    terms: tuple[TermLine, ...]


@dataclass(frozen=True, slots=True)
class Closed:
    """A pathway that cannot run: the reason, and the id of the gate that closes it."""

    text: str
    rule: str


# --- words and numbers ----------------------------------------------------------------------------------------


def as_sentence(text: str) -> str:
    """Return `text` with a capital and a full stop."""
    return f"{capital(text)}{'' if text.endswith('.') else '.'}"


def signed(value: float) -> str:
    """Return a number of log10 units with its sign and two decimals."""
    return f"{round(value, 2) + 0.0:+.2f}".replace("-", "−")


def celsius_text(question: Question) -> str:
    """Return the temperature of a question."""
    return f"{round(question.temperature_k + ABSOLUTE_ZERO_C, 1):g} °C"


def time_text(seconds: float | None) -> str:
    """Return a time that may be unknown or infinite."""
    if seconds is None:
        return "unknown"
    return duration_text(seconds) if math.isfinite(seconds) else "never"


# --- verdict --------------------------------------------------------------------------------------------------


def verdict_sentence(question: Question, forecast: Forecast) -> str:
    """Return the answer in a sentence: mechanism, where, with which course, what the mixture is made of."""
    if not forecast.is_covered:
        return as_sentence(forecast.reasons[0].text)
    if not forecast.pathways:
        first = forecast.reasons[0]
        return f"No reaction is expected: {'every pathway is closed' if first.rule in GATE_IDS else first.text}."
    if forecast.mechanism is Mechanism.NONE:
        fastest = forecast.pathways[0]
        conversion = expected_text(forecast.conversion, forecast.conversion_interval)
        said = f"No reaction to speak of in {time_text(question.time_s)}: conversion {conversion}"
        return f"{said}. The fastest way would be {fastest.mechanism.value}: {fastest.event}."
    main = main_pathway(forecast)
    where = joined((forecast.mechanism.value, _where(question, main), "rearranged" if forecast.rearranged else ""), " ")
    sentence = f"{joined((where, _COURSES.get(forecast.course, '')))}; {_composition(forecast)}."
    rivals = _rivals(forecast)
    return f"{sentence} A close call: {' and '.join(rivals)} may win within the error." if rivals else sentence


def main_pathway(forecast: Forecast) -> PathwayReport:
    """Return the leading pathway; a forecast without pathways has none, so ask first."""
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


# --- reasons --------------------------------------------------------------------------------------------------


def why(question: Question, forecast: Forecast) -> Why | None:
    """Return what the rate of the main pathway is made of; None where no pathway is open."""
    if not forecast.pathways:
        return None
    main = main_pathway(forecast)
    unit = "1/s" if main.mechanism in _FIRST_ORDER or _is_by_solvent(question, main) else "L/(mol s)"
    log_k = f"log k = {signed(main.log10_k)} ± {main.error:.2f}, k in {unit} at {celsius_text(question)}"
    return Why(main.event, log_k, tuple(_term_lines(question, main)))


def _term_lines(question: Question, main: PathwayReport) -> Iterator[TermLine]:
    ranked = sorted(main.contributions, key=lambda c: -max(abs(c.value), c.error))
    large = [c for c in ranked[:MOST_TERMS] if max(abs(c.value), c.error) >= LEAST_TERM]
    for contribution in large:
        yield TermLine(
            signed(contribution.value), f"{contribution.error:.2f}", contribution.text, _source(contribution)
        )
    small = [c for c in main.contributions if c not in large]
    if small:
        yield TermLine(signed(math.fsum(c.value for c in small)), "", f"smaller terms ({len(small)})", "")
    change = main.log10_k - math.fsum(c.value for c in main.contributions)
    if abs(change) >= 0.005:
        yield TermLine(signed(change), "", _last_step(question, main), "")


def _source(contribution: Contribution) -> str:
    """Return where a number comes from: what it was fitted to, else its citation."""
    if contribution.key.startswith("model."):
        return "scatter of the fit"
    terms = fitted_parameters()
    rows = terms[contribution.key].rows if contribution.key in terms else 0
    if rows:
        return f"fitted, {how_many(rows, 'row', 'rows')}"
    return "estimated" if contribution.source == "estimated-here" else source_text(contribution.source)


def _is_by_solvent(question: Question, pathway: PathwayReport) -> bool:
    return pathway.label.endswith("solvent") or pathway.partner in {solvent.name for solvent, _ in question.solvent}


def _last_step(question: Question, pathway: PathwayReport) -> str:
    """Return what turns the sum of the terms, at 25 °C and per mole of a partner, into the rate constant shown."""
    parts = (
        "" if abs(question.temperature_k - REFERENCE_K) < 0.05 else f"from 25 °C to {celsius_text(question)}",
        "molarity of the solvent" if _is_by_solvent(question, pathway) else "",
        "its part of a common step" if pathway.mechanism in _FIRST_ORDER else "",
    )
    return joined(parts) or "what the flask adds"


def closed_gates(forecast: Forecast) -> tuple[tuple[Closed, ...], tuple[str, ...]]:
    """Return the pathways that a gate closes, and apart from them the names of those nobody misses here."""
    gates = [reason for reason in forecast.reasons if reason.rule in GATE_IDS]
    told = tuple(Closed(reason.text, reason.rule) for reason in gates if not reason.text.startswith(_SELDOM))
    seldom = dict.fromkeys(reason.text.split(" ")[0] for reason in gates if reason.text.startswith(_SELDOM))
    return told, tuple(seldom)
