"""The forecast on an entry's page; expected texts by hand."""

import pytest

from builder.mechanism.outlook import expected_text, percent_text
from builder.publish.expected import ExpectedView, expected_view, why_nothing_is_expected
from builder.publish.forecast_parts import GATE_IDS
from builder.records.figures import duration_text
from tests.publish.handmade import case_of, text_of


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
    [(0.0, "< 0.1 %"), (0.00051, "0.1 %"), (0.034, "3 %"), (0.996, "99.6 %"), (0.9996, "> 99.9 %"), (0.5, "50 %")],
)
def test_percentages_near_none_and_all(fraction: float, text: str) -> None:
    assert percent_text(fraction) == text


def test_an_interval_is_shown_where_it_says_more() -> None:
    assert expected_text(0.97, (0.9, 0.985)) == "97 % (90 to 98 %)"
    assert expected_text(1.0, (1.0, 1.0)) == "> 99.9 %"


def _expected(name: str) -> ExpectedView:
    expected = expected_view(case_of(text_of(name)))
    assert expected is not None
    return expected


def test_the_main_product_is_named_as_the_record_names_it() -> None:
    expected = _expected("NSC0W7N51")
    facts = {fact.label: fact.value for fact in expected.facts}
    assert expected.sentence.startswith("SN2 at the secondary carbon, with inversion; ")
    assert facts["Main product"].startswith("(R)-2-azidooctane (A), ")
    assert set(facts) == {"Main product", "Conversion", "Half-life"}


def test_the_bar_of_a_share_lies_within_its_interval() -> None:
    shares = _expected("NSC0W7N51").shares
    assert shares[0].mechanism == "SN2"
    assert all(0 <= share.low <= share.percent <= share.high <= 100 for share in shares)


def test_the_terms_add_up_to_the_rate_constant() -> None:
    why = _expected("NSC0W7N51").why
    assert why is not None
    stated = float(why.log_k.split(" = ")[1].split(" ± ")[0].replace("−", "-"))
    terms = [float(term.value.replace("−", "-")) for term in why.terms]
    assert sum(terms) == pytest.approx(stated, abs=0.005 * (len(terms) + 1))  # each is rounded to two decimals


def test_what_is_closed_names_the_gate_that_says_why() -> None:
    expected = _expected("NS2H8WDRW")
    assert expected.closed
    assert {gate.rule for gate in expected.closed} <= GATE_IDS


def test_where_hardly_anything_reacts_no_product_is_named() -> None:
    facts = {fact.label for fact in _expected("NS2H8WDRW").facts}
    assert "Main product" not in facts
    assert "Half-life" in facts


def test_why_nothing_is_expected() -> None:
    case = case_of(text_of("NSDP0MTDW"))
    assert expected_view(case) is None
    assert why_nothing_is_expected(case) == "several nucleophiles compete"
