"""Outcome cases as a guard against falling back, and their scoring against cases scored by hand."""

from pathlib import Path
from statistics import fmean

import pytest

from builder.table import NOTHING, rows_of
from tests.outcomes import Asked, Case, CaseSet, answer_to, load_cases, score, scores_of, tally

FLOORS = Path(__file__).parents[1] / "data" / "outcome-floors.tsv"
COLUMNS = ("set", *(question.value for question in Asked), "found", "alarms", "elimination")
SLOW = {CaseSet.FRESH, CaseSet.HELD_OUT, CaseSet.THIRD, CaseSet.FOURTH}


def floors() -> dict[str, dict[str, str]]:
    return {row["set"]: row for row in rows_of(FLOORS.name, FLOORS.read_text("utf-8"), COLUMNS)}


@pytest.mark.parametrize("which", [pytest.param(s, marks=pytest.mark.slow if s in SLOW else ()) for s in CaseSet])
def test_scores_do_not_fall(which: CaseSet) -> None:
    floor, scored = floors()[which], scores_of(load_cases(which))
    found = tally(scored)
    missed = {each.id: each.misses for each in scored if each.misses}
    for question in Asked:
        assert found.percent(question) >= float(floor[question]), missed
    assert found.found >= float(floor["found"]), missed
    assert found.false_alarms <= float(floor["alarms"]), missed
    if floor["elimination"] != NOTHING:
        assert fmean(found.elimination_errors) <= float(floor["elimination"])


def test_cases_say_where_they_come_from_and_are_told_apart() -> None:
    ids = [case["id"] for which in CaseSet for case in load_cases(which)]
    assert len(set(ids)) == len(ids)
    for which in CaseSet:
        asked = [_asked(case) for case in load_cases(which)]
        assert len(set(asked)) == len(asked), "the same flask twice"
        for case in load_cases(which):
            assert case["source"].strip(), case["id"]
            assert case["how"] in {"looked_up", "memory", "common_practice"}, case["id"]


def _asked(case: Case) -> tuple[str, ...]:
    keys = ("substrate", "nucleophile_smiles", "nucleophile", "base", "additives", "solvent", "temperature_C")
    return tuple(str(case.get(key)) for key in (*keys, "equivalents", "time_h", "concentration"))


# --- the scoring ----------------------------------------------------------------------------------------------

CASE: Case = {
    "id": "here",
    "title": "a case",
    "substrate": "C[C@H](Cl)c1ccccc1",
    "solvent": [["acetone", 0.8], ["water", 0.2]],
    "tags": ["benzylic"],
    "expected": {
        "dominant": "SN1",
        "acceptable": ["E1"],
        "elimination_percent": 10,
        "major_product": "C[C@@H](O)c1ccccc1",
        "other_products": ["C=Cc1ccccc1"],
        "rearranged": False,
        "stereo": "racemisation",
    },
}
ANSWER = {
    "mechanism": "SN1",
    "shares": {"SN1": 0.8, "E1": 0.2},
    "products": [{"smiles": "C[C@@H](O)c1ccccc1"}],
    "stereo": "racemisation",
    "rearranged": False,
}


def expecting(**changed: object) -> Case:
    return {**CASE, "expected": {**CASE["expected"], **changed}}


@pytest.mark.parametrize(
    ("case", "said", "question", "is_right"),
    [
        (CASE, {}, Asked.MECHANISM, True),
        (CASE, {"mechanism": "E1"}, Asked.MECHANISM, True),  # accepted beside the main one
        (CASE, {"mechanism": "SN2"}, Asked.MECHANISM, False),
        (CASE, {"mechanism": "AdE"}, Asked.MECHANISM, True),  # an addition through a cation
        (CASE, {"stereo": "partial_inversion"}, Asked.COURSE, True),
        (CASE, {"stereo": "inversion"}, Asked.COURSE, False),
        (expecting(stereo="retention"), {"stereo": "double_inversion"}, Asked.COURSE, True),
        (expecting(stereo="inversion"), {"stereo": "retention"}, Asked.COURSE, False),
        (CASE, {"rearranged": True}, Asked.REARRANGED, False),
        (CASE, {"products": [{"smiles": "C[C@H](O)c1ccccc1"}]}, Asked.PRODUCT, True),  # a racemate, either drawn
        (CASE, {"products": [{"smiles": "CC(O)c1ccccc1"}]}, Asked.PRODUCT, True),
        (CASE, {"products": [{"smiles": "C=Cc1ccccc1"}]}, Asked.PRODUCT, True),  # aqueous: named among the others
        (CASE, {"products": [{"smiles": "CC(Cl)c1ccccc1"}]}, Asked.PRODUCT, False),
        (CASE, {"products": []}, Asked.PRODUCT, False),
        (expecting(stereo="inversion"), {"products": [{"smiles": "C[C@H](O)c1ccccc1"}]}, Asked.PRODUCT, False),
        (expecting(stereo="inversion"), {"products": [{"smiles": "CC(O)c1ccccc1"}]}, Asked.PRODUCT, False),
    ],
)
def test_what_counts_as_right(case: Case, said: dict[str, object], question: Asked, is_right: bool) -> None:
    scored = score(case, ANSWER | said)
    assert scored.right[question] is is_right
    assert any(miss.startswith(question) for miss in scored.misses) is not is_right


def test_what_a_case_does_not_ask_is_not_scored() -> None:
    silent = score(expecting(dominant="none", stereo="not_applicable", rearranged=None), {"mechanism": "none"})
    assert silent.right == {Asked.MECHANISM: True}
    assert silent.elimination_error is None


def test_scores_add_up() -> None:
    moved = expecting(rearranged=True)
    found = tally(
        [
            score(CASE, ANSWER),
            score(moved, ANSWER),
            score(moved, ANSWER | {"rearranged": True}),
            score(CASE, ANSWER | {"rearranged": True, "mechanism": "SN2", "shares": {"SN2": 1.0}}),
        ]
    )
    assert (found.rearrangements, found.found, found.false_alarms) == (2, 1, 1)
    assert found.percent(Asked.MECHANISM) == 75
    assert found.missed(Asked.REARRANGED) == 2
    assert found.by_tag == {"benzylic": (3, 4)}
    assert found.elimination_errors == pytest.approx((10, 10, 10, 10))


def test_a_question_that_cannot_be_read_is_wrong_and_says_so() -> None:
    case = {**CASE, "nucleophile": "unobtainium", "temperature_C": 25}
    scored = score(case, answer_to(case))
    assert not scored.right[Asked.MECHANISM]
    assert "unobtainium" in scored.misses[-1]
