"""Cautions of a planned flask: the same tables as for records, over what is charged and what is forecast."""

from typing import Any

import pytest

from builder.checks.forecast_cautions import forecast_cautions
from builder.mechanism.asking import question_from_words
from builder.mechanism.engine import predict

AZIDE = {"substrate": "CCCCBr", "nucleophile": "sodium azide", "solvent": ["DMF"], "temperature": "25 °C"}

FLASKS = [
    # what is changed, the caution that must be there; hazards as in the tables of cautions, whose rows have sources
    ({"solvent": ["dichloromethane"]}, "azide-dichloromethane"),
    ({"additives": ["H2SO4"]}, "azide-acid"),
    ({"nucleophile": "NaCN", "additives": ["HCl"]}, "cyanide-acid"),
    ({"nucleophile": "NaCN", "additives": ["ammonium chloride"]}, "cyanide-weak-acid"),
]


@pytest.mark.parametrize(("changed", "caution_id"), FLASKS, ids=lambda value: str(value)[:50])
def test_a_grave_pair_is_found_wherever_its_partners_stand(changed: dict[str, Any], caution_id: str) -> None:
    assert caution_id in {caution["id"] for caution in cautions(**changed) if caution["severity"] == "stop"}


def cautions(**changed: Any) -> tuple[dict[str, str], ...]:
    question = question_from_words(**{**AZIDE, **changed}).question
    return forecast_cautions(question, predict(question))


def test_gravest_first_each_with_its_source_and_who_decides() -> None:
    found = cautions(solvent=["dichloromethane"])
    assert [caution["severity"] for caution in found] == sorted(
        (caution["severity"] for caution in found), key=["stop", "warn", "note"].index
    )
    for caution in found:
        assert caution.keys() == {"id", "severity", "text", "precaution", "source", "decides"}
        assert all(caution.values())
        assert caution["decides"] == "local rules and qualified people decide"


def test_a_product_is_judged_too() -> None:
    texts = [caution["text"] for caution in cautions()]
    assert any(text.startswith("the product CCCCN=[N+]=[N-]: carbon and oxygen to nitrogen") for text in texts)


def test_a_substance_charged_in_two_roles_is_named_once() -> None:
    found = cautions(substrate="CCCCBr", nucleophile="methanol", solvent=["methanol"])
    assert len({caution["text"] for caution in found}) == len(found)


def test_a_harmless_flask_has_none() -> None:
    assert cautions(substrate="OC1CCCCC1", nucleophile="water", solvent=["water"]) == ()
