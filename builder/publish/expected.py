"""The forecast of an entry in words, beside what was seen."""

import math

from builder.checks.case import Case
from builder.checks.forecasts import is_same_product, share_bounds
from builder.mechanism.forecast import Forecast
from builder.mechanism.outlook import expected_text, percent_text
from builder.publish.figures import duration_text, joined
from builder.publish.summary import Fact

__all__ = ["expected_facts", "why_nothing_is_expected"]

SHOWN = 0.01
"""Share of converted substrate from which a mechanism is named."""


def expected_facts(case: Case) -> tuple[Fact, ...]:
    """Return what the engine expects under the conditions of a record; empty where it has no say."""
    forecast = case.forecast
    if forecast is None:
        return ()
    shares = (
        f"{mechanism} {expected_text(share, forecast.intervals[mechanism])}"
        for mechanism, share in forecast.shares.items()
        if share >= SHOWN
    )
    facts = (
        Fact("Mechanism", joined(shares) or "none is open"),
        Fact("Main product", _main_product(case, forecast)),
        Fact("Conversion", f"{expected_text(forecast.conversion, forecast.conversion_interval)} in the stated time"),
        Fact("Half-life", _half_life(forecast)),
    )
    return tuple(fact for fact in facts if fact.value)


def why_nothing_is_expected(case: Case) -> str:
    """Return why there is no forecast; empty where there is one."""
    return "" if case.forecast is not None else case.unasked or "this reaction lies outside what the engine covers"


def _main_product(case: Case, forecast: Forecast) -> str:
    if not forecast.products:
        return ""
    main = max(forecast.products, key=lambda each: each.share)
    bounds = share_bounds(forecast, lambda each: each.structure == main.structure)
    labels = [
        product.label
        for index, product in enumerate(case.record.outcome.products)
        if is_same_product(case.structures[("outcome", "products", index)], main.structure)
    ]
    named = f"{labels[0]} of the record" if labels else main.structure.smiles
    share = expected_text(bounds.share, (bounds.low, bounds.high))
    return f"{named}, {share} of what reacts"


def _half_life(forecast: Forecast) -> str:
    if forecast.half_life_s is None:
        return ""
    if math.isinf(forecast.half_life_s):
        return f"never reached: a reagent runs out at {percent_text(forecast.conversion)}"
    return duration_text(forecast.half_life_s)
