"""When conditions are near-same, and when outcomes contradict: each tolerance from both sides, either way round."""

from dataclasses import replace
from functools import cache
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from builder.checks import comparison
from builder.checks.comparison import (
    DECISIVE,
    Disagreement,
    are_near_same,
    differences,
    disagreements,
    is_near,
    is_one_experiment,
    seen_by_quantity,
    telling_difference,
)
from builder.checks.group import outcomes_contradict
from builder.checks.seen import Seen
from builder.checks.standing import Charge, Standing, Variable, standing_of
from builder.records.specimen import with_example
from builder.records.vocabulary import YieldKind
from tests.publish.handmade import case_of

H = 3600.0


@cache
def _standing(example: str = "") -> Standing:
    return standing_of(case_of(with_example(example)))


def _disagreements(one: Standing, other: Standing) -> tuple[Disagreement, ...]:
    return disagreements(seen_by_quantity(one), seen_by_quantity(other))


def _changed(**fields: Any) -> Standing:
    return replace(_standing(), **fields)


# --- conditions -----------------------------------------------------------------------------------------------------
# The specimen: 60 °C, 16 h, DMF, 1.5 equiv of azide, 0.5 mol/L, 99 % conversion.

NEAR_OR_NOT: list[tuple[str, dict[str, Any], bool]] = [
    ("nothing changed", {}, True),
    ("10 K hotter", {"temperature_c": 70.0}, True),
    ("10.5 K hotter", {"temperature_c": 70.5}, False),
    ("3 K colder and under way", {"temperature_c": 57.0, "conversion": 80.0}, True),
    ("5 K colder and under way", {"temperature_c": 55.0, "conversion": 80.0}, False),
    ("5 K hotter and under way for all that", {"temperature_c": 65.0, "conversion": 80.0}, True),
    ("a factor 3 longer", {"time_s": 48 * H}, True),
    ("more than a factor 3 longer", {"time_s": 49 * H}, False),
    ("shorter and complete", {"time_s": 8 * H}, True),
    ("shorter by 1.5 and under way", {"time_s": 16 * H / 1.5, "conversion": 94.0}, True),
    ("shorter by more and under way", {"time_s": 10 * H, "conversion": 94.0}, False),
    ("longer and under way for all that", {"time_s": 32 * H, "conversion": 40.0}, True),
    ("1.25 times the azide", {"nucleophiles": (Charge("[N-]=[N+]=[N-].[Na+]", 1.875),)}, True),
    ("1.3 times the azide", {"nucleophiles": (Charge("[N-]=[N+]=[N-].[Na+]", 1.95),)}, False),
    ("potassium azide", {"nucleophiles": (Charge("[K+].[N-]=[N+]=[N-]", 1.5),)}, True),
    ("twice as concentrated", {"concentration": 1.0}, True),
    ("more than twice", {"concentration": 1.05}, False),
    ("concentration not known", {"concentration": None}, True),
    ("10 % of water", {"solvents": ("DMF", "water"), "volumes": (90.0, 10.0)}, True),
    ("12 % of water", {"solvents": ("DMF", "water"), "volumes": (88.0, 12.0)}, False),
    ("DMSO", {"solvents": ("DMSO",), "volumes": (100.0,)}, False),
    ("neat", {"solvents": (), "volumes": ()}, False),
    ("shares not known", {"solvents": ("DMF", "water"), "volumes": None}, False),
    ("in flow", {"is_flow": True}, False),
    ("two equivalents of base", {"bases": (Charge("O=C([O-])[O-].[K+].[K+]", 2.0),)}, True),
    ("a hundred times the scale", {"scale": 1.0}, True),
    ("another reaction", {"key": "another"}, False),
    ("a reaction nobody could read", {"key": ""}, False),
]


@pytest.mark.parametrize(("changed", "near"), [pytest.param(c, n, id=name) for name, c, n in NEAR_OR_NOT])
def test_near_same(changed: dict[str, Any], near: bool) -> None:
    one, other = _standing(), _changed(**changed)
    assert are_near_same(one, other) is near
    assert are_near_same(other, one) is near


def test_the_rule_tells_readers_the_tolerances() -> None:
    told = outcomes_contradict.reason
    names = [name for name in vars(comparison) if name.startswith("NEAR_") and name != "NEAR_SCALE"]
    assert len(names) == 7
    for name in (*names, "COMPLETE_PERCENT", "YIELD_POINTS", "EE_POINTS", "LEAST_YIELD_POINTS", "LEAST_EE_POINTS"):
        assert f"{getattr(comparison, name):g}" in told, name


# --- what differs ---------------------------------------------------------------------------------------------------

CARBONATE = "base: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', equivalents: 2.0}\n"
HOTTER = "stages: [{add: [2-bromobutane, sodium azide, DMF], temperature: 65 °C, measured: internal, time: 16 h}]\n"
OLD_BOTTLE = (
    "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.5, form: opened in 2019}\n"
)
OTHER_HANDS = "performed: {date: 2026-03-18, by: [bench-3], runs: 2}\n"

TELLING: list[tuple[str, str, str | None]] = [
    ("a base", CARBONATE, "base: none here, potassium carbonate, 2.00 equiv there"),
    (
        "a base before all else",
        CARBONATE + OLD_BOTTLE + OTHER_HANDS,
        "base: none here, potassium carbonate, 2.00 equiv",
    ),
    ("an old bottle", OLD_BOTTLE, "form and purity: not stated here, sodium azide: opened in 2019 there"),
    ("a little hotter explains nothing", HOTTER.replace("65", "64").replace("16 h}", "16 h, vessel: open}"), "atmos"),
    ("other hands explain nothing by themselves", OTHER_HANDS, None),
    ("nothing", "", None),
]


@pytest.mark.parametrize(("example", "said"), [pytest.param(e, s, id=name) for name, e, s in TELLING])
def test_the_most_telling_difference(example: str, said: str | None) -> None:
    found = telling_difference(_standing(), _standing(example))
    assert (found is None) is (said is None)
    assert found is None or found.text().startswith(str(said))


def test_differences_are_marked_where_they_are_near_same() -> None:
    found = {each.variable: each for each in differences(_standing(), _standing(HOTTER))}
    assert (found[Variable.TEMPERATURE].here, found[Variable.TEMPERATURE].there) == ("60 °C", "65 °C")
    assert found[Variable.TEMPERATURE].is_near
    assert not found[Variable.ATMOSPHERE].is_near


# --- outcomes -------------------------------------------------------------------------------------------------------


def _yield(
    low: float, kind: YieldKind | None = YieldKind.ISOLATED, high: float | None = None, spread: float | None = None
) -> Seen:
    upper = low if high is None else high
    return Seen("yield A", "yield of A", kind, low, upper, spread, f"{low:g} to {upper:g} % {kind}", ("outcome",))


def _ee(value: float, spread: float | None = None) -> Seen:
    return Seen("ee A", "ee of A", None, value, value, spread, f"{value:g} % ee", ("outcome",))


ISOLATED, ASSAY, AREA = YieldKind.ISOLATED, YieldKind.ASSAY, YieldKind.AREA
CONTRADICTING_OR_NOT = [
    ("isolated, 10 points apart", _yield(80), _yield(70), False),
    ("isolated, 11 points apart", _yield(80), _yield(69), True),
    ("isolated as a lower bound of assay", _yield(60), _yield(80, ASSAY), False),
    ("isolated above assay", _yield(80), _yield(60, ASSAY), True),
    ("an area share is no yield", _yield(90, AREA), _yield(40, ASSAY), False),
    ("area shares among themselves", _yield(90, AREA), _yield(40, AREA), True),
    ("sought and not found, against some", _yield(0, None), _yield(11, ASSAY), True),
    ("sought and not found, against next to nothing", _yield(0, None), _yield(9), False),
    ("sought and not found, against an area share", _yield(0, None), _yield(50, AREA), True),
    ("below a limit of detection", _yield(0, ASSAY, high=2), _yield(4, ASSAY), False),
    ("far above a limit of detection", _yield(0, ASSAY, high=2), _yield(35, ASSAY), True),
    ("two limits that leave room", _yield(0, ASSAY, high=20), _yield(15, ASSAY, high=100), False),
    ("spreads that do not meet", _yield(88, spread=2), _yield(80, spread=2), True),
    ("spreads that meet", _yield(88, spread=5), _yield(80, spread=4), False),
    ("wide spreads that meet", _yield(80, spread=12), _yield(60, spread=10), False),
    ("one spread alone narrows nothing", _yield(88, spread=1), _yield(80), False),
    ("5 points are always allowed", _yield(90, spread=0.5), _yield(85, spread=0.5), False),
    ("ee 3 apart", _ee(98), _ee(95), False),
    ("ee 4 apart", _ee(98), _ee(94), True),
    ("ee beyond the spreads", _ee(98, 0.5), _ee(96, 0.5), True),
    ("ee within a point", _ee(98, 0.2), _ee(97, 0.2), False),
    ("other quantities", _ee(98), _yield(20), False),
]
LOST_ON_THE_COLUMN = (_yield(60), _yield(82, ASSAY))


@pytest.mark.parametrize(
    ("here", "there", "contradict"), [pytest.param(a, b, c, id=name) for name, a, b, c in CONTRADICTING_OR_NOT]
)
def test_contradiction(here: Seen, there: Seen, contradict: bool) -> None:
    one, other = _changed(seen=(here,)), _changed(seen=(there,))
    assert bool(_disagreements(one, other)) is contradict
    assert bool(_disagreements(other, one)) is contradict


def test_one_kind_is_compared_with_the_same_kind_where_both_have_it() -> None:
    assert _disagreements(_changed(seen=LOST_ON_THE_COLUMN), _changed(seen=(_yield(85),)))
    assert not _disagreements(_changed(seen=LOST_ON_THE_COLUMN), _changed(seen=(_yield(85, ASSAY),)))


def test_two_numbers_for_one_quantity_are_a_range() -> None:
    assert not _disagreements(_changed(seen=(_ee(98), _ee(80))), _changed(seen=(_ee(90),)))


def test_the_furthest_apart_comes_first() -> None:
    found = _disagreements(_changed(seen=(_yield(80), _ee(98))), _changed(seen=(_yield(60), _ee(80))))
    assert [each.here.label for each in found] == ["ee of A", "yield of A"]  # 18 points of 3, 20 of 10


OCTENES = """\
substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', stereo: racemate, class: secondary, leaving_group: bromide, amount: 10 mmol}
outcome:
  result: [substitution, elimination]
  products:
    - {label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired, stereo: racemate}
    - {label: B, name: but-1-ene, smiles: 'CCC=C', use: by-product}
    - {label: C, name: but-2-enes, smiles: 'CC=CC', use: by-product}
  measured: [{yield: 60 %, of: A, kind: isolated}, {yield: 30 %, of: [B, C], kind: assay}, {ratio: 'B:C = 1:2', by: GC}]
"""  # noqa: E501 - one part of a record a line, as in the specimen
BUTENE = OCTENES.replace("{yield: 30 %, of: [B, C], kind: assay}, {ratio: 'B:C = 1:2', by: GC}", "").replace(
    "    - {label: C, name: but-2-enes, smiles: 'CC=CC', use: by-product}\n", ""
)


def test_a_joint_yield_is_shared_out_by_the_ratio() -> None:
    said = {seen.label: seen.text for seen in _standing(OCTENES).seen}
    assert said["yield of but-1-ene"] == "10 % assay yield (by the ratio)"
    assert said["yield of all C4H8"] == "30 % assay yield in all"


def test_sums_over_a_formula_are_compared_where_products_are_not() -> None:
    one_alkene = BUTENE.replace("isolated}, ", "isolated}, {yield: 4 %, of: B, kind: assay}")
    found = _disagreements(_standing(OCTENES), _standing(one_alkene))
    assert [each.here.label for each in found] == ["yield of all C4H8"]


FAILED = """\
outcome:
  result: [no reaction]
  sought: {name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]'}
  measured: [{conversion: '< 2 %', by: GC}]
"""


def test_a_failure_contradicts_a_success() -> None:
    one, other = _standing(), _standing(FAILED)
    assert are_near_same(one, other)
    assert [each.here.label for each in _disagreements(one, other)] == ["conversion", "yield of 2-azidobutane"]


# --- one experiment, or two -----------------------------------------------------------------------------------------

ONE_OR_TWO: list[tuple[str, dict[str, Any], bool]] = [
    ("same day, hands and scale", {}, True),
    ("half the scale", {"scale": 0.005}, False),
    ("another day", {"words": {**_standing().words, Variable.DATE: "2026-03-18"}}, False),
    ("other hands", {"words": {**_standing().words, Variable.BY: "bench-3"}}, False),
]


@pytest.mark.parametrize(("changed", "once"), [pytest.param(c, o, id=name) for name, c, o in ONE_OR_TWO])
def test_a_repeat_is_no_duplicate(changed: dict[str, Any], once: bool) -> None:
    assert is_one_experiment(_standing(), _changed(**changed)) is once
    assert is_one_experiment(_changed(**changed), _standing()) is once


def test_no_two_runs_weigh_alike() -> None:
    later = {"words": {**_standing().words, Variable.DATE: "2026-03-18"}}
    assert is_one_experiment(
        _changed(weighed=("2.083 g", "1.366 g")), _changed(weighed=("2.083 g", "1.366 g"), **later)
    )
    assert not is_one_experiment(
        _changed(weighed=("2.083 g", "1.366 g")), _changed(weighed=("2.083 g", "1.402 g"), **later)
    )


# --- both ways round ------------------------------------------------------------------------------------------------

_PERCENT = st.integers(0, 100).map(float)
_SEEN = st.lists(
    st.one_of(
        st.builds(
            _yield,
            _PERCENT,
            kind=st.sampled_from([None, *YieldKind]),
            high=st.none(),
            spread=st.none() | st.integers(0, 9).map(float),
        ),
        st.builds(_ee, _PERCENT, st.none() | st.integers(0, 3).map(float)),
    ),
    max_size=4,
).map(tuple)
_EQUIVALENTS = st.none() | st.sampled_from([0.1, 1.0, 1.2, 1.25, 1.5, 2.0])
_CHARGES = st.lists(st.builds(Charge, st.sampled_from("AB"), _EQUIVALENTS), max_size=2).map(tuple)
_STANDINGS = st.builds(
    _changed,
    key=st.sampled_from(["", "one", "two"]),
    attacks=st.sampled_from([Variable.BASE, Variable.NUCLEOPHILE]),
    nucleophiles=_CHARGES,
    bases=_CHARGES,
    temperature_c=st.sampled_from([50.0, 60.0, 65.0]),
    time_s=st.sampled_from([H, 1.5 * H, 3 * H, 10 * H]),
    concentration=st.none() | st.sampled_from([0.25, 0.5, 1.1]),
    conversion=st.none() | st.sampled_from([40.0, 99.0]),
    volumes=st.none() | st.just((100.0,)),
    seen=_SEEN,
)


@given(_STANDINGS, _STANDINGS)
def test_what_holds_of_one_against_another_holds_the_other_way_round(one: Standing, other: Standing) -> None:
    assert are_near_same(one, other) == are_near_same(other, one)
    for variable in (*DECISIVE, Variable.BASE, Variable.NUCLEOPHILE, Variable.SCALE):
        assert is_near(variable, one, other) == is_near(variable, other, one), variable
    there, back = _disagreements(one, other), _disagreements(other, one)
    assert [(each.here, each.there) for each in there] == [(each.there, each.here) for each in back]


@given(_STANDINGS)
def test_an_entry_is_at_one_with_itself(one: Standing) -> None:
    assert are_near_same(one, one) is bool(one.key)
    assert not list(differences(one, one))
