"""Numbers of an outcome: rounding that must not be called a fault, and what a wrong one is explained by."""

from decimal import Decimal
from importlib import resources

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from builder.checks.copies import SAMPLE_MASSES
from builder.checks.excess import DISAGREE_POINTS
from builder.checks.measured import exactly, excess_span, percent_span
from builder.records.fields import Ratio
from builder.records.quantities import half_unit, parse_percent
from builder.records.specimen import TWO_PRODUCTS, outcome_example
from tests.specimens import play


def _er(text: str) -> Ratio:
    return Ratio((), tuple(Decimal(number) for number in text.split(":")))


@pytest.mark.parametrize(
    ("er", "ee"), [("97.5:2.5", 95.0), ("98:2", 96.0), ("2:98", 96.0), ("3:1", 50.0), ("1:1", 0.0), ("49:1", 96.0)]
)
def test_ee_follows_from_er_by_its_definition(er: str, ee: float) -> None:
    # IUPAC Gold Book, enantiomer excess: ee = |F(+) - F(-)|, the difference of the mole fractions.
    span = excess_span(None, _er(er))
    assert span is not None
    assert span.stated == pytest.approx(ee)


@pytest.mark.parametrize(("number", "half"), [("88", 0.5), ("97.5", 0.05), ("0.10", 0.005), ("1E+2", 50.0)])
def test_half_a_unit_in_the_last_typed_digit(number: str, half: float) -> None:
    assert half_unit(Decimal(number)) == pytest.approx(half)


@pytest.mark.parametrize(
    ("one", "other", "points", "above"),
    [
        ("103 %", "100 %", 2.0, True),
        ("102 %", "100 %", 2.0, False),
        ("< 2 %", "0 %", 0.0, False),
        ("> 99 %", "97 %", 1.0, True),
        ("96 %", "> 90 %", 1.0, False),
        ("12 %", "11 %", 0.5, False),  # 11.5 each, rounded to whole per cent
    ],
)
def test_a_span_is_above_another_only_beyond_tolerance_and_rounding(
    one: str, other: str, points: float, above: bool
) -> None:
    assert percent_span(parse_percent(one)).is_above(percent_span(parse_percent(other)), points) is above


def test_a_number_that_was_not_measured_leaves_nothing_open() -> None:
    assert exactly(100.0).half == 0.0


SCALE = "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, amount: 10 mmol"
AMINE = "{label: A, name: N-butan-2-ylbenzylamine, smiles: 'CCC(C)NCc1ccccc1', use: desired}"
ACID = "{label: A, name: 4-(sec-butyloxy)benzoic acid, smiles: 'CCC(C)Oc1ccc(cc1)C(=O)O', use: desired}"


def _mend(yield_: str, mass: str, more: str = "", product: str | None = None, substrate: str = SCALE + "}") -> str:
    """Return the mend of yield-mass-disagrees for one isolated yield of 2-azidobutane, 99.14 g/mol, or of `product`."""
    line = f"{{yield: {yield_}, of: A, kind: isolated, mass: {mass}{more}}}"
    outcome = outcome_example(line, products=product) if product else outcome_example(line)
    found = [finding for finding in play(f"{substrate}\n{outcome}") if finding.rule == "yield-mass-disagrees"]
    return found[0].mend if found else ""


@pytest.mark.parametrize(
    ("yield_", "mass", "more", "product", "named"),
    [
        ("81 %", "803 g", "", None, "factor of 1000"),
        ("81 %", "0.803 mg", "", None, "factor of 1000"),
        # 2-azidobutane: 10 mmol x 99.14 g/mol x 0.81 = 0.803 g; of 15 mmol azide 1.205 g
        ("81 %", "1.205 g", "", None, "sodium azide as the measure"),
        ("81 %", "0.803 g", ", purity: 90 %", None, "without its purity of 90 %"),
        # C11H17N 163.26, its hydrochloride 199.72 g/mol: 10 mmol x 0.80
        ("80 %", "1.598 g", "", AMINE, "hydrochloride of the product, 199.7 g/mol"),
        # C11H14O3 194.23, monohydrate 212.24, sodium salt 216.21 g/mol: 10 mmol x 0.80
        ("80 %", "1.698 g", "", ACID, "monohydrate of the product, 212.2 g/mol"),
        ("80 %", "1.730 g", "", ACID, "sodium salt of the product, 216.2 g/mol"),
        ("81 %", "0.55 g", "", None, "correct mass, yield or purity"),
        # honest rounding
        ("81 %", "0.803 g", "", None, ""),
        ("81 %", "0.8 g", "", None, ""),
        ("81.0 %", "0.803 g", "", None, ""),
        ("79 %", "0.803 g", "", None, ""),
        ("83 %", "803 mg", "", None, ""),
    ],
)
def test_a_yield_that_its_mass_does_not_give_is_explained(
    yield_: str, mass: str, more: str, product: str | None, named: str
) -> None:
    found = _mend(yield_, mass, more, product)
    assert named in found
    assert bool(named) == bool(found)


def test_a_purity_of_the_substrate_left_out_is_named() -> None:
    # 1.370 g of 80 %: 8.00 mmol, so 0.642 g of azide is 81 %; without the purity 10.0 mmol and 0.803 g
    impure = SCALE.replace("amount: 10 mmol", "mass: 1.370 g, purity: 80 %") + "}"
    assert "80 %, left out" in _mend("81 %", "0.81 g", substrate=impure)


def test_two_molecules_of_substrate_may_be_in_one_of_product() -> None:
    # 10 mmol of bromide give 5 mmol of di-sec-butyl sulfide, C8H18S 146.29 g/mol: 0.585 g is 80 %
    sulfide = (
        f"{SCALE}}}\nnucleophile: {{name: sodium sulfide, smiles: '[Na+].[Na+].[S-2]', equivalents: 0.5}}\n"
        + outcome_example(
            "{yield: 80 %, of: A, kind: isolated, mass: 0.585 g}",
            products="{label: A, name: di-sec-butyl sulfide, smiles: 'CCC(C)SC(C)CC', use: desired}",
        )
    )
    assert "yield-mass-disagrees" not in {finding.rule for finding in play(sulfide)}


def test_the_masses_of_the_sample_are_those_of_the_sample() -> None:
    sample = resources.files("builder.authoring").joinpath("starter", "entries", "sample.yml").read_text("utf-8")
    assert all(f"mass: {mass}" in sample for mass in SAMPLE_MASSES)


@settings(derandomize=True, deadline=None, max_examples=200)
@given(
    major=st.floats(50.0, 99.9),
    digits_of_er=st.integers(0, 1),
    digits_of_ee=st.integers(0, 1),
)
def test_honest_rounding_of_ee_and_er_never_disagrees(major: float, digits_of_er: int, digits_of_ee: int) -> None:
    ee = percent_span(parse_percent(f"{2 * major - 100:.{digits_of_ee}f} %"))
    from_er = excess_span(None, _er(f"{major:.{digits_of_er}f}:{100 - major:.{digits_of_er}f}"))
    assert from_er is not None
    assert not ee.is_above(from_er, DISAGREE_POINTS)
    assert not from_er.is_above(ee, DISAGREE_POINTS)


@pytest.mark.parametrize(
    ("ratio", "by", "rules"),
    [
        ("A:B = 97:3", "GC", set()),
        ("A:B = 2:1", "1H NMR", set()),
        ("A:B = 3.2:1", "1H NMR", set()),
        ("A:B = 2.45:1.00", "1H NMR", set()),
        ("A:B = 100:7", "GC", set()),
        ("A:B = 20:1", "1H NMR", set()),
        ("A:B = 66.7:33.4", "GC", set()),  # 100.1, rounded
        ("A:B = 97:2", "GC", set()),  # 97.4 and 2.4 with 0.2 of something else, rounded
        ("A:B = 96:2", "GC", {"ratio-sum-odd"}),
        ("A:B = 65:30", "1H NMR", {"ratio-sum-odd"}),
        ("A:B = 97.3:2.7", "1H NMR", {"ratio-overprecise"}),
        ("A:B = 97.31:2.69", "GC", {"ratio-overprecise"}),
        ("A:B = 97.31:2.69", "weighing", set()),
    ],
)
def test_ratios(ratio: str, by: str, rules: set[str]) -> None:
    line = f"{{ratio: '{ratio}', by: {by}, calibrated: true}}"
    found = play(outcome_example("{yield: 81 %, of: [A, B], kind: assay, by: GC}", line, products=TWO_PRODUCTS))
    asked = {"ratio-sum-odd", "ratio-overprecise", "ratio-not-calibrated", "ratio-unreadable"}
    assert {finding.rule for finding in found} & asked == rules
