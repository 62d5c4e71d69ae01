"""The smallest changes that would mend a reaction: kinds and directions, not numbers, against what every bench knows.

Sources from memory: march-2013 (ch. 10 for solvents and leaving groups in SN2, ch. 17 for elimination against
substitution); whatever has no source beside it is common practice, no source.
"""

from collections.abc import Callable
from functools import cache

import pytest

from builder.chemistry.structure import StructureError, parse_smiles
from builder.mechanism import improve
from builder.mechanism.asking import read_question
from builder.mechanism.engine import predict
from builder.mechanism.forecast import Forecast
from builder.mechanism.improve import (
    BUDGET,
    EFFORT,
    LEAST_CONVERSION,
    LEAST_GAIN,
    ChangeKind,
    Improvement,
    improvements,
)
from builder.mechanism.question import Question
from builder.records.vocabulary import Mechanism

MANY = 30


def _question(substrate: str, nucleophile: str | None, solvent: str, temperature_c: float) -> Question:
    return read_question(
        substrate=substrate, nucleophile=nucleophile, solvent=[(solvent, 1.0)], temperature_c=temperature_c
    ).question


@cache
def _advice(question: Question, wanted: str | Mechanism, share: float) -> tuple[Improvement, ...]:
    if isinstance(wanted, Mechanism):
        return improvements(question, mechanism=wanted, share=share, limit=MANY)
    return improvements(question, product=wanted, share=share, limit=MANY)


def _of(found: tuple[Improvement, ...], kind: ChangeKind) -> list[Improvement]:
    return [each for each in found if each.what is kind]


def _brings(kind: ChangeKind, *words: str) -> Callable[[Question, tuple[Improvement, ...]], bool]:
    """Return a check that a change of this kind to one of these is named and suffices."""
    return lambda _, found: any(
        i.reaches and any(w in i.change.split(" in place of")[0] for w in words) for i in _of(found, kind)
    )


def _warms(question: Question, found: tuple[Improvement, ...]) -> bool:
    warmer = [i.question.temperature_k > question.temperature_k for i in _of(found, ChangeKind.TEMPERATURE)]
    return bool(warmer) and all(warmer)


def _cools(question: Question, found: tuple[Improvement, ...]) -> bool:
    cooler = [i.question.temperature_k < question.temperature_k for i in _of(found, ChangeKind.TEMPERATURE)]
    return bool(cooler) and all(cooler)


def _neither_changes_base_nor_only_warms(_: Question, found: tuple[Improvement, ...]) -> bool:
    kinds = [{i.what, *i.also} for i in found]
    return not any(ChangeKind.BASE in each or each == {ChangeKind.TEMPERATURE} for each in kinds)


def _no_dial_suffices(_: Question, found: tuple[Improvement, ...]) -> bool:
    return not any(i.reaches and i.effort <= 1 for i in found)


SLOW_CYANIDE = _question("CCCCCl", "NaCN", "ethanol", 25)
WILLIAMSON = _question("CCCCBr", "phenol", "acetone", 25)
SEC_BUTYL = _question("CCC(C)Br", "NaOEt", "ethanol", 25)
ISOPROPYL = _question("CC(C)Br", "NaOEt", "ethanol", 25)
CASES = [
    # question, product or mechanism wanted, share, what must hold
    # march-2013: anions are far more reactive in dipolar aprotic solvents, chloride leaves slowest
    (SLOW_CYANIDE, "CCCCC#N", 0.9, _brings(ChangeKind.SOLVENT, "DMSO", "DMF", "acetonitrile", "acetone")),
    (SLOW_CYANIDE, "CCCCC#N", 0.9, _brings(ChangeKind.LEAVING_GROUP, "iodide", "bromide", "mesylate", "tosylate")),
    (SLOW_CYANIDE, "CCCCC#N", 0.9, _warms),
    # march-2013: crowded bases eliminate and turn to the less crowded hydrogen; 53 % 1-butene in brown-moritani-1953
    (SEC_BUTYL, Mechanism.E2, 0.95, _brings(ChangeKind.BASE, "tert-butoxide", "DBU")),
    (SEC_BUTYL, "CCC=C", 0.45, _brings(ChangeKind.BASE, "tert-butoxide")),
    # heat and crowded bases favour elimination, so neither is advice for an ether
    (ISOPROPYL, "CCOC(C)C", 0.9, _neither_changes_base_nor_only_warms),
    # march-2013, ch. 17: elimination gains on SN1 when heated
    (_question("CC(C)(C)Br", "methanol", "methanol", 64), "COC(C)(C)C", 0.75, _cools),
    # a phenol needs a base, and carbonate in acetone is the usual one
    (WILLIAMSON, "CCCCOc1ccccc1", 0.9, _brings(ChangeKind.BASE, "potassium carbonate")),
    # march-2013: neopentyl halides are slower than ethyl by five powers of ten
    (_question("CC(C)(C)CBr", "NaOEt", "ethanol", 25), "CCOCC(C)(C)C", 0.9, _no_dial_suffices),
    # fluoride does not leave in SN2
    (_question("CCCCF", "NaN3", "DMF", 25), "CCCCN=[N+]=[N-]", 0.9, _no_dial_suffices),
]


@pytest.mark.parametrize(
    ("question", "wanted", "share", "holds"), CASES, ids=[f"{c[0].substrate}-{c[1]}-{n}" for n, c in enumerate(CASES)]
)
def test_advice_is_that_of_the_bench(
    question: Question,
    wanted: str | Mechanism,
    share: float,
    holds: Callable[[Question, tuple[Improvement, ...]], bool],
) -> None:
    found = _advice(question, wanted, share)
    assert holds(question, found), [i.change for i in found]
    assert len({i.reaches for i in found}) <= 1
    for each in found:
        assert each.effort == sum(EFFORT[kind] for kind in (each.what, *each.also))
        assert each.forecast == predict(each.question)
        if each.reaches:
            assert each.share_after >= share
            assert each.conversion_after >= 0.5
    if all(each.reaches for each in found):
        assert [each.effort for each in found] == sorted(each.effort for each in found)


HOPELESS = [
    # no backside attack and no cation: march-2013, ch. 10
    ("c1ccccc1Br", "NaCN", "N#Cc1ccccc1"),
    ("C1CC2CCC1(Br)C2", "NaCN", "N#CC12CCC(CC1)C2"),
    ("C=CBr", "NaN3", "C=CN=[N+]=[N-]"),
]


@pytest.mark.parametrize(("substrate", "nucleophile", "product"), HOPELESS, ids=[row[0] for row in HOPELESS])
def test_what_gates_close_no_change_of_conditions_opens(substrate: str, nucleophile: str, product: str) -> None:
    assert improvements(_question(substrate, nucleophile, "DMSO", 25), product=product) == ()


def test_nothing_is_proposed_where_all_is_well() -> None:
    question = _question("CCCCBr", "NaN3", "DMF", 25)
    assert improvements(question, product="CCCCN=[N+]=[N-]") == ()
    assert improvements(question) == ()


def test_partial_help_is_marked() -> None:
    # A tertiary azide from tert-butyl bromide: elimination always takes its part (common practice, no source).
    question = _question("CC(C)(C)Br", "NaN3", "DMF", 25)
    found = improvements(question, product="CC(C)(C)N=[N+]=[N-]", share=0.999)
    before = predict(question).conversion

    def run(conversion: float) -> float:
        return min(1.0, conversion / LEAST_CONVERSION)

    assert 0 < len(found) <= 3
    for each in found:
        assert not each.reaches
        assert each.share_after > each.share_before
        assert each.share_after * run(each.conversion_after) - each.share_before * run(before) >= LEAST_GAIN


def test_the_answer_does_not_depend_on_how_the_substrate_is_typed() -> None:
    answers = [
        [i.change for i in improvements(_question(typed, "NaCN", "ethanol", 25), product="CCCCC#N")]
        for typed in ("CCCCCl", "C(CCC)Cl")
    ]
    assert answers[0]
    assert answers[0] == answers[1]


# --- what is tried: every question the engine is asked, with an engine that says that nothing helps -------------------


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch) -> list[Question]:
    questions: list[Question] = []

    def unhelpful(question: Question, _: object = None) -> Forecast:
        questions.append(question)
        # each answer a little better than the last, so that every kind of change seems worth a pair
        return predict_once(len(questions))

    first = predict(_question("CCCCBr", "NaN3", "ethanol", 0))

    def predict_once(count: int) -> Forecast:
        return _with_conversion(first, min(0.4, 0.1 + 0.001 * count))

    monkeypatch.setattr(improve, "predict", unhelpful)
    return questions


def _with_conversion(forecast: Forecast, conversion: float) -> Forecast:
    values = {name: getattr(forecast, name) for name in Forecast.__slots__}
    return Forecast(**{**values, "conversion": conversion})


FORBIDDEN = [
    # nucleophile, solvent in use, solvents never proposed, source
    ("NaN3", "ethanol", {"dichloromethane", "chloroform", "1,2-dichloroethane"}),  # cen-azide-1993
    ("NaN3", "dichloromethane", {"dichloromethane"}),  # cen-azide-1993: nor anything that stays in it
    ("NaH", "THF", {"DMF", "DMSO", "ethanol", "acetone"}),  # sodium-hydride-2019
    ("NaBH4", "THF", {"DMF", "DMSO"}),  # the same for borohydride: bretherick-2017
    ("NaOEt", "ethanol", {"methanol", "2-propanol", "DMF", "acetone", "dichloromethane"}),  # march-2013
    ("MeLi", "THF", {"ethanol", "DMF", "acetone", "acetonitrile", "dichloromethane"}),  # march-2013
    ("benzylamine", "ethanol", {"acetone", "dichloromethane"}),  # amines-in-dcm; imine: march-2013
    ("sodium nitrite", "DMSO", {"DMF"}),  # nitrosamines-sartans
]


@pytest.mark.parametrize(
    ("nucleophile", "solvent", "never"), FORBIDDEN, ids=[f"{row[0]}-{row[1]}" for row in FORBIDDEN]
)
def test_dangerous_and_foolish_flasks_are_never_tried(
    asked: list[Question], nucleophile: str, solvent: str, never: set[str]
) -> None:
    improvements(_question("CCCCBr", nucleophile, solvent, 25))
    proposed = asked[1:]
    assert proposed
    with_it = [q for q in proposed if q.nucleophile is not None and q.nucleophile == asked[0].nucleophile]
    assert not {s.name for q in with_it for s, _ in q.solvent} & never


@pytest.mark.parametrize(
    ("solvent", "temperature_c"), [("ethanol", 0), ("ethanol", 70), ("DMSO", 75), ("tert-butanol", 30), ("THF", -40)]
)
def test_every_flask_tried_is_liquid_and_the_budget_holds(
    asked: list[Question], solvent: str, temperature_c: float
) -> None:
    # Melting and boiling points are those of the solvent table (CRC Handbook).
    improvements(_question("CCCCBr", "NaN3", solvent, temperature_c))
    assert 10 <= len(asked) <= BUDGET
    for question in asked:
        for part, _ in question.solvent:
            assert part.mp_c <= question.temperature_k - 273.15 <= part.bp_c


LEAVING_GROUPS = [
    # substrate, other substrates tried: configuration kept, nothing that cannot be kept in a bottle
    (
        "CC[C@H](C)Br",
        {"CC[C@H](C)Cl", "CC[C@H](C)I", "CC[C@H](C)OS(C)(=O)=O", "CC[C@H](C)OS(=O)(=O)c1ccc(C)cc1"},
    ),
    ("CC(C)(C)Cl", {"CC(C)(C)Br"}),
    ("CC(Cl)c1ccccc1", {"CC(Br)c1ccccc1", "CC(I)c1ccccc1"}),
    ("BrCCCCBr", set()),
    ("CCCCO", set()),
]


@pytest.mark.parametrize(("substrate", "others"), LEAVING_GROUPS, ids=[row[0] for row in LEAVING_GROUPS])
def test_other_leaving_groups_on_the_same_carbon(asked: list[Question], substrate: str, others: set[str]) -> None:
    question = _question(substrate, "NaN3", "ethanol", 25)
    improvements(question, product="CCCC")
    singles = [q for q in asked if q.solvent == question.solvent and q.substrate != question.substrate]
    assert {q.substrate for q in singles} == {parse_smiles(smiles) for smiles in others}


def test_a_less_basic_form_of_the_same_nucleophile_is_tried(asked: list[Question]) -> None:
    improvements(_question("CCCCBr", "sodium phenoxide", "acetone", 25))
    forms = {(q.nucleophile.structure.smiles, q.base and q.base.name) for q in asked if q.nucleophile}
    assert ("Oc1ccccc1", "carbonate") in forms


@pytest.mark.parametrize("nucleophile", ["NaCN", "NaN3", "sodium hydrosulfide"])
def test_no_poison_gas_is_made(asked: list[Question], nucleophile: str) -> None:
    improvements(_question("CCCCBr", nucleophile, "ethanol", 25))
    assert {q.nucleophile for q in asked} == {asked[0].nucleophile}


def test_amines_are_no_bases_for_phenols(asked: list[Question]) -> None:
    # pKa in DMSO: triethylammonium 9.0, phenol 18.0 (bordwell-1988)
    improvements(WILLIAMSON)
    assert {q.base.name for q in asked if q.base} == {"carbonate", "hydride"}


# --- misuse -----------------------------------------------------------------------------------------------------------


def test_broken_wishes_are_refused() -> None:
    with pytest.raises(StructureError):
        improvements(SLOW_CYANIDE, product="CCC(")
    with pytest.raises(ValueError, match="share"):
        improvements(SLOW_CYANIDE, share=0.0)
    with pytest.raises(ValueError, match="mechanism"):
        improvements(SLOW_CYANIDE, mechanism=Mechanism.NONE)


HEADER = "role\tname\tsmiles\tlowest_c\thighest_c\tsolvents\treason\tsource"
FAULTS = [
    ("solvent\twater\t-\t-20\t100\t-\tx\tcommon-practice", "not liquid"),
    ("solvent\tbrandy\t-\t0\t70\t-\tx\tcommon-practice", "unknown solvent"),
    ("base\tgumption\t-\t-\t-\tTHF\tx\tcommon-practice", "unknown base"),
    ("never\tdragon\t-\t-\t-\tTHF\tx\tcommon-practice", "neither a kind"),
    ("advice\tTHF\t-\t-\t-\t-\tx\tcommon-practice", "unknown role"),
    ("base\tDBU\t-\t-\t-\tTHF\tx\thearsay", "unknown source"),
    ("base\tDBU\t-\t-\t-\tTHF\tx\tcommon-practice\n" * 2, "given twice"),
]


@pytest.mark.parametrize(("rows", "message"), FAULTS, ids=[row[1] for row in FAULTS])
def test_faults_of_the_table_are_refused(rows: str, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        improve._read(f"{HEADER}\n{rows.rstrip()}\n")
