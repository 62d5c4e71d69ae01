"""The forecast on an entry's page; expected texts by hand."""

import pytest

from builder.mechanism.outlook import expected_text, percent_text
from builder.publish.expected import expected_facts, why_nothing_is_expected
from builder.publish.figures import duration_text
from tests.publish.handmade import entry_of, text_of


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (0.2, "< 1 s"),
        (90.0, "90 s"),
        (600.0, "10 min"),
        (5400.0, "1.5 h"),
        (345600.0, "4.0 d"),
        (1e13, "> 10000 years"),
    ],
)
def test_durations(seconds: float, text: str) -> None:
    assert duration_text(seconds) == text


@pytest.mark.parametrize(
    ("fraction", "text"),
    [(0.0, "< 0.1 %"), (0.00051, "0.1 %"), (0.034, "3.4 %"), (0.996, "99.6 %"), (0.9996, "> 99.9 %"), (0.5, "50 %")],
)
def test_percentages_near_none_and_all(fraction: float, text: str) -> None:
    assert percent_text(fraction) == text


def test_an_interval_is_shown_where_it_says_more() -> None:
    assert expected_text(0.97, (0.9, 0.985)) == "97 % (90 % to 98 %)"
    assert expected_text(1.0, (1.0, 1.0)) == "> 99.9 %"


def test_the_main_product_is_named_by_its_label() -> None:
    facts = {fact.label: fact.value for fact in expected_facts(entry_of(text_of("NSC0W7N51")).case)}
    assert facts["Mechanism"].startswith("SN2 ")
    assert facts["Main product"].startswith("A of the record, ")
    assert set(facts) == {"Mechanism", "Main product", "Conversion", "Half-life"}


def test_where_hardly_anything_reacts_no_product_is_named() -> None:
    facts = {fact.label for fact in expected_facts(entry_of(text_of("NS2H8WDRW")).case)}
    assert "Main product" not in facts
    assert "Half-life" in facts


def test_why_nothing_is_expected() -> None:
    case = entry_of(text_of("NSDP0MTDW")).case
    assert expected_facts(case) == ()
    assert why_nothing_is_expected(case) == "several nucleophiles compete"
