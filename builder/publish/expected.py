"""The forecast of an entry, to stand beside what was seen."""

import math
from dataclasses import dataclass

from markupsafe import Markup

from builder.checks.case import Case
from builder.checks.forecasts import is_same_product, share_bounds
from builder.chemistry.scheme import DrawnCompound, draw_structure
from builder.mechanism.forecast import Z90, Forecast
from builder.mechanism.outlook import expected_text, percent_text
from builder.publish.forecast_parts import Closed, Why, closed_gates, main_pathway, verdict_sentence, why
from builder.publish.summary import Fact
from builder.records.figures import duration_text, significant

__all__ = ["ExpectedView", "ShareView", "expected_view", "why_nothing_is_expected"]

SHOWN = 0.01
"""Share of converted substrate from which a mechanism is named."""


@dataclass(frozen=True, slots=True)
class ShareView:
    """The share of one mechanism: in words, and as percent with the ends of its 90 % interval for a bar."""

    mechanism: str
    text: str
    percent: float
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class ExpectedView:
    """What the engine expects under the conditions of a record, and why.

    drawing: the main product, where the record does not name it. needless: pathways for which the substrate lacks what
    they need.
    """

    sentence: str
    drawing: Markup
    shares: tuple[ShareView, ...]
    facts: tuple[Fact, ...]
    why: Why | None
    closed: tuple[Closed, ...]
    needless: tuple[str, ...]


def expected_view(case: Case) -> ExpectedView | None:
    """Return what the engine expects under the conditions of a record; None where it has no say."""
    question, forecast = case.question, case.forecast
    if question is None or forecast is None:
        return None
    product, drawing = _main_product(case, forecast)
    facts = (
        Fact("Main product", product),
        Fact("Conversion", expected_text(forecast.conversion, forecast.conversion_interval), "in the stated time"),
        Fact("Half-life", _half_life(forecast), _within(forecast)),
    )
    closed, needless = closed_gates(forecast)
    return ExpectedView(
        sentence=verdict_sentence(question, forecast),
        drawing=drawing,
        shares=_shares(forecast),
        facts=tuple(fact for fact in facts if fact.value),
        why=why(question, forecast),
        closed=closed,
        needless=needless,
    )


def why_nothing_is_expected(case: Case) -> str:
    """Return why there is no forecast; empty where there is one."""
    return "" if case.forecast is not None else case.unasked or "this reaction lies outside what the engine covers"


def _shares(forecast: Forecast) -> tuple[ShareView, ...]:
    found = []
    for mechanism, share in forecast.shares.items():
        low, high = forecast.intervals[mechanism]
        if share >= SHOWN:
            text = expected_text(share, (low, high))
            found.append(ShareView(str(mechanism), text, *(round(100 * each, 1) for each in (share, low, high))))
    return tuple(found)


def _main_product(case: Case, forecast: Forecast) -> tuple[str, Markup]:
    """Return the main product in words, and drawn where no product of the record is it."""
    if not forecast.products:
        return "", Markup()
    main = max(forecast.products, key=lambda each: each.share)
    bounds = share_bounds(forecast, lambda each: each.structure == main.structure)
    names = [
        f"{product.name} ({product.label})"
        for index, product in enumerate(case.record.outcome.products)
        if (drawn := case.structures.get(("outcome", "products", index))) is not None
        and is_same_product(drawn, main.structure)
    ]
    share = expected_text(bounds.share, (bounds.low, bounds.high))
    if names:
        return f"{names[0]}, {share} of what reacts", Markup()
    smiles = main.structure.smiles
    svg = draw_structure(DrawnCompound(main.structure), name=smiles, ident=f"{case.record.entry}-expected")
    return f"none that the record names, {share} of what reacts: {smiles}", Markup(svg)  # noqa: S704 - as in schemes


def _within(forecast: Forecast) -> str:
    """Return how far the half-life may be off; empty where there is none."""
    if not forecast.pathways or forecast.half_life_s is None or math.isinf(forecast.half_life_s):
        return ""
    factor = 10 ** (Z90 * main_pathway(forecast).error)
    return f"within a factor of {significant(factor, 1 if factor < 10 else 2)}, nine times in ten"


def _half_life(forecast: Forecast) -> str:
    if forecast.half_life_s is None:
        return ""
    if math.isinf(forecast.half_life_s):
        return f"never reached: a reagent runs out at {percent_text(forecast.conversion)}"
    return duration_text(forecast.half_life_s)
