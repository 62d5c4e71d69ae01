"""Cautions for a flask that is only planned: the tables of cautions over what is charged and what is forecast.

As with records it is a screen of structures, never a clearance. Quench and work-up are judged where the plan is a
record that has them; a question has none.
"""

from collections.abc import Iterable, Iterator

from builder.checks.case import Case
from builder.checks.hazards.cautions import WHO_DECIDES, Setting, Severity
from builder.checks.hazards.meetings import Hazard, Present, Whereabouts, by_meeting, find_hazards
from builder.checks.hazards.presents import hazards_of
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.asking import ABSOLUTE_ZERO_C
from builder.mechanism.forecast import Forecast
from builder.mechanism.question import Ingredient, Question
from builder.mechanism.reagents import Dose
from builder.sources import source_text

__all__ = ["MOST_CAUTIONS", "forecast_cautions", "plain_caution", "planned_hazards"]

MOST_CAUTIONS = 4
"""Cautions told besides those graded stop, which are all told."""


def forecast_cautions(question: Question, forecast: Forecast) -> tuple[dict[str, str], ...]:
    """Return the cautions for a flask and what is to be expected from it, gravest first, JSON-ready.

    Each has id, severity (stop, warn, note), text, precaution, source and decides (who does). Of several milder
    cautions for the same substances the gravest stands for all; every `stop` stands for itself.
    """
    hazards = find_hazards(_presents(question, forecast), Setting(question.temperature_k + ABSOLUTE_ZERO_C))
    return tuple(map(plain_caution, _gravest_first(hazards)))


def planned_hazards(case: Case, forecast: Forecast | None) -> tuple[Hazard, ...]:
    """Return the hazards of a record that is planned, its work-up and atmosphere included, gravest first.

    forecast: of what it is expected to give, which the record need not hold yet.
    """
    return _gravest_first(hazards_of(case, () if forecast is None else _forecast(forecast)))


def _gravest_first(hazards: Iterable[Hazard]) -> tuple[Hazard, ...]:
    shown = (hazard for group in by_meeting(hazards) for hazard in _to_show(group))
    return tuple(sorted(shown, key=lambda hazard: -hazard.caution.severity.weight))


def _to_show(group: tuple[Hazard, ...]) -> tuple[Hazard, ...]:
    stops = tuple(hazard for hazard in group if hazard.caution.severity is Severity.STOP)
    return stops or group[:1]


def plain_caution(hazard: Hazard) -> dict[str, str]:
    """Return a hazard as `forecast_cautions` gives it."""
    caution = hazard.caution
    return {
        "id": caution.id,
        "severity": caution.severity.value,
        "text": hazard.message,
        "precaution": caution.precaution,
        "source": source_text(caution.source),
        "decides": WHO_DECIDES,
    }


def _presents(question: Question, forecast: Forecast) -> tuple[Present, ...]:
    """Return what cautions look at, each structure once: as charged first, as forecast last."""
    found: dict[str, Present] = {}
    for present in (*_charged(question), *_forecast(forecast)):
        found.setdefault(present.name if present.structure is None else present.structure.smiles, present)
    return tuple(found.values())


def _charged(question: Question) -> Iterator[Present]:
    yield Present(("substrate",), "the substrate", Whereabouts.FLASK, question.substrate)
    for role, ingredient in (("nucleophile", question.nucleophile), ("base", question.base)):
        if ingredient is not None:
            yield Present((role,), ingredient.name, Whereabouts.FLASK, _as_charged(ingredient))
    for place, dose in enumerate(question.additives):
        yield Present(("additives", place), dose.reagent.name, Whereabouts.FLASK, _drawn(dose))
    for place, (solvent, _) in enumerate(question.solvent):
        yield Present(("solvent", place), solvent.name, Whereabouts.FLASK, parse_smiles(solvent.smiles))


def _forecast(forecast: Forecast) -> Iterator[Present]:
    for place, product in enumerate(forecast.products):
        name = f"the product {product.structure.smiles}"
        yield Present(("products", place), name, Whereabouts.PRODUCT, product.structure)


def _as_charged(ingredient: Ingredient) -> Structure:
    """Return an ingredient with the counter-ion its name tells: silver salts have cautions of their own."""
    if ingredient.counter_ion is None:
        return ingredient.structure
    return parse_smiles(f"{ingredient.structure.smiles}.{ingredient.counter_ion}")


def _drawn(dose: Dose) -> Structure | None:
    """Return the structure of a reagent; one without is judged by its name."""
    smiles = dose.reagent.smiles
    return None if smiles is None else parse_smiles(smiles)
