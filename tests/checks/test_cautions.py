"""Cautions: every row of the table fires on its example and not on its near miss; records get them in their place."""

import datetime as dt
import re
from pathlib import Path

import pytest

from builder.checks.case import Case, open_case
from builder.checks.cautions import (
    CAUTION_CHECKS,
    Caution,
    CautionKind,
    Present,
    Role,
    Severity,
    find_hazards,
    load_cautions,
    load_substance_kinds,
    presents_of,
)
from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import parse_smiles
from builder.finding import Level
from builder.records.reader import read_bytes
from builder.records.settings import Settings
from builder.records.specimen import SPECIMEN_FILE, specimen_text, with_example
from builder.rule import Fault, Rule

GOOD = Path(__file__).parents[1] / "data" / "records" / "good"
RULES = {check.id: check for check in CAUTION_CHECKS}
ROOM_TEMPERATURE_C = 20.0


def case_of(text: str) -> Case:
    reading = read_bytes(text.encode(), SPECIMEN_FILE)
    assert reading.record is not None, reading.findings
    return open_case(reading.record, SPECIMEN_FILE, Settings(format=1, title="test"), dt.date(2026, 12, 1))


def faults(rule_id: str, text: str) -> list[Fault]:
    look = RULES[rule_id].look
    assert look is not None
    return list(look(case_of(text)))


def experiment(example: str) -> tuple[tuple[Present, ...], float]:
    """Read an example of the table: SMILES, "lines of the work-up" and @temperature, joined by ++."""
    presents: list[Present] = []
    hottest_c = ROOM_TEMPERATURE_C
    for index, part in enumerate(example.split(" ++ ")):
        if part.startswith("@"):
            hottest_c = float(part[1:])
        elif part.startswith('"'):
            presents.append(Present(("work_up", index), part.strip('"'), Role.WORK_UP))
        else:
            presents.append(Present(("reagents", index), part, Role.FLASK, parse_smiles(part)))
    return tuple(presents), hottest_c


def ids_of(example: str) -> set[str]:
    return {hazard.caution.id for hazard in find_hazards(*experiment(example))}


def by_id(caution: Caution) -> str:
    return caution.id


@pytest.mark.parametrize("caution", load_cautions(), ids=by_id)
def test_row_fires_on_its_example_alone(caution: Caution) -> None:
    assert caution.id in ids_of(caution.fires)
    assert caution.id not in ids_of(caution.near_miss)


@pytest.mark.parametrize("caution", load_cautions(), ids=by_id)
def test_row_reads_well(caution: Caution) -> None:
    assert re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", caution.id)
    assert caution.hazard.rstrip(".") == caution.hazard
    assert caution.how in {"looked up", "from memory", "common practice"}
    assert (caution.second is None) == (caution.kind is CautionKind.SPECIES)


def test_every_kind_of_substance_is_used() -> None:
    used = {kind.name for caution in load_cautions() for kind in (caution.first, caution.second) if kind}
    assert used | {"basic amine"} == set(load_substance_kinds())


SODIUM_AZIDE = "[Na+].[N-]=[N+]=[N-]"
POTASSIUM_CYANIDE = "[K+].[C-]#N"

# The pairs the trade flags anywhere in the sequence, as safety letters and reviews name them (common practice).
MUST_FLAG = [
    (SODIUM_AZIDE, "ClCCl"),
    (SODIUM_AZIDE, "ClC(Cl)Cl"),
    (SODIUM_AZIDE, "OS(=O)(=O)O"),
    (SODIUM_AZIDE, "Cl"),
    (SODIUM_AZIDE, "OC(=O)C(F)(F)F"),
    (SODIUM_AZIDE, "[H+].[Cl-]"),
    (SODIUM_AZIDE, "OP(=O)([O-])O.[K+]"),
    (SODIUM_AZIDE, "O=C(O)CBr"),
    (SODIUM_AZIDE, "S=C=S"),
    (SODIUM_AZIDE, "[Cu]I"),
    (SODIUM_AZIDE, "CC(=O)O[Pb]OC(C)=O"),
    (SODIUM_AZIDE, "Cl[Hg]Cl"),
    ("[N-][N+]#N.[Na+]", "CC(=O)O"),
    ("C[Si](C)(C)N=[N+]=[N-]", "CC(=O)O"),
    (POTASSIUM_CYANIDE, "CC(=O)O"),
    (POTASSIUM_CYANIDE, "[O-]Cl.[Na+]"),
    ("[Na+].[O-]N=O", "C1CCNC1"),
    ("[Na+].[O-]N=O", "CN(C)C=O"),
    ("CC(C)(C)ON=O", "CC(=O)N(C)C"),
    ("[Na+].[H-]", "CN(C)C=O"),
    ("[NaH]", "CC(=O)N(C)C"),
    ("[Na+].[H-]", "CS(C)=O"),
    ("[Na+].[H-]", "CN1CCCC1=O"),
    ("CS(C)=O", "CS(=O)(=O)O"),
    ("CS(C)=O", "CC(=O)Cl"),
    ("CO", "CS(=O)(=O)O"),
    ("CC(C)O", "Cc1ccc(S(=O)(=O)O)cc1"),
    ("CCO", "Cl"),
    ("CC(C)(C)Br", "OS(=O)(=O)O"),
    ("COC(C)(C)C", "OS(=O)(=O)O"),
    ("[Na+].[S-]CC", "CC(=O)O"),
    ("[Na+].[Na+].[S-2]", "Cl"),
    ("CS(=O)(=O)Cl", "c1ccncc1"),
    ("ClCC1CO1", "CCNCC"),
    ("ClC(Cl)Cl", "[Na+].[OH-]"),
    ("CC(C)=O", "[K+].[OH-]"),
    ("CC#N", "[Na+].[NH2-]"),
    ("C1CCNC1", "ClCCl"),
    ("[K+].[I-]", "OO"),
]


@pytest.mark.parametrize(("first", "second"), MUST_FLAG)
def test_pair_is_flagged_whichever_is_listed_first(first: str, second: str) -> None:
    for example in (f"{first} ++ {second}", f"{second} ++ {first}"):
        hazards = find_hazards(*experiment(example))
        assert any(hazard.others for hazard in hazards), example


@pytest.mark.parametrize(
    ("first", "second"),
    [
        (SODIUM_AZIDE, "CCO"),
        (SODIUM_AZIDE, "O"),
        (SODIUM_AZIDE, "CCC(C)Br"),
        (SODIUM_AZIDE, "CCCCCC[C@H](C)OS(C)(=O)=O"),
        (SODIUM_AZIDE, "OC(=O)[O-].[Na+]"),
        (SODIUM_AZIDE, "CN(C)C=O"),
        (SODIUM_AZIDE, "CCN(CC)CC"),
        ("CCCCN=[N+]=[N-]", "CC(=O)O"),
        ("CCC#N", "Cl"),
        ("[C-]#[N+]C(C)C", "Cl"),
        ("[K+].CC[O-]", "CCO"),
        ("CCN(CC)CC", "CC1CCCO1"),
        ("[O-][N+](=O)c1ccccc1", "CCNCC"),
        ("CC(C)(C)Cl", "O"),
        ("[Na+].[I-]", "CC(C)=O"),
    ],
)
def test_ordinary_pair_is_not_flagged(first: str, second: str) -> None:
    assert not [hazard for hazard in find_hazards(*experiment(f"{first} ++ {second}")) if hazard.others]


@pytest.mark.parametrize(
    "line",
    [
        "quench with hydrochloric acid",
        "acidify with 2 M HCl",
        "adjust to pH 3",
        "pH = 5.5 with citric acid",
        "wash with sat. NH4Cl",
        "wash with aq. ammonium chloride (20 mL)",
        "extract with CH2Cl2 (3 × 20 mL)",
        "extract with Dichloromethane",
        "chromatography, DCM/hexane",
        "pour into water; acidify",
        "no base was used, then acidified",
    ],
)
def test_work_up_that_endangers_an_azide(line: str) -> None:
    hazards = find_hazards(*experiment(f'{SODIUM_AZIDE} ++ "{line}"'))
    paired = [hazard for hazard in hazards if hazard.others]
    assert {hazard.caution.severity for hazard in paired} == {Severity.STOP}
    assert {hazard.at.path for hazard in paired} == {("work_up", 1)}


@pytest.mark.parametrize(
    "line",
    [
        "quench: 60 mL water, keep above pH 9",
        "wash with water, no acid",
        "do not acidify",
        "acid-free workup",
        "waste: azide water kept basic and apart from acid",
        "never let it touch copper",
        "extract with MTBE instead of dichloromethane",
        "not below pH 5",
        "extract with THF and ethyl acetate, wash with NaHCO3 and brine, dry over Na2SO4",
    ],
)
def test_work_up_that_suits_an_azide(line: str) -> None:
    assert not [hazard for hazard in find_hazards(*experiment(f'{SODIUM_AZIDE} ++ "{line}"')) if hazard.others]


@pytest.mark.parametrize("drawn", ["CNC.Cl", "C[NH2+]C.[Cl-]"])
def test_an_amine_hydrochloride_is_no_mineral_acid_however_drawn(drawn: str) -> None:
    assert {"azide-alkylammonium"} == {
        h.caution.id for h in find_hazards(*experiment(f"{SODIUM_AZIDE} ++ {drawn}")) if h.others
    }


def test_text_is_quoted_once_and_only_where_it_adds_something() -> None:
    bleach = f'{POTASSIUM_CYANIDE} ++ "cyanide water into bleach" ++ "bleach decanted"'
    assert [h.at.path for h in find_hazards(*experiment(bleach)) if h.others] == [("work_up", 1)]
    only_text = 'CCO ++ "wash with NaOH" ++ "extract with chloroform"'
    assert [h.caution.id for h in find_hazards(*experiment(only_text)) if h.others] == ["chloroform-strong-base"]
    mild = 'CCO ++ "wash with bleach" ++ "wash with KI"'
    assert not find_hazards(*experiment(mild))


@pytest.mark.parametrize(
    ("smiles", "severity"),
    [
        # The rule (N_C + N_O)/N_N of university azide guidelines; ratios by hand.
        ("[N-]=[N+]=NCN=[N+]=[N-]", Severity.STOP),  # 1/6
        ("[N-]=[N+]=NCCN=[N+]=[N-]", Severity.STOP),  # 2/6
        ("CCN=[N+]=[N-]", Severity.STOP),  # 2/3
        ("CCCN=[N+]=[N-]", Severity.WARN),  # 3/3
        ("OCC(c1ccccc1)N=[N+]=[N-]", Severity.NOTE),  # 9/3
        ("c1ccccc1CN=[N+]=[N-]", Severity.WARN),  # 7/3
    ],
)
def test_organic_azides_are_graded_by_carbon_ratio(smiles: str, severity: Severity) -> None:
    hazards = find_hazards(*experiment(smiles))
    grades = [h.caution.severity for h in hazards if h.caution.first.name == "organic azide"]
    assert max(grades, key=lambda grade: grade.weight) is severity


@pytest.mark.parametrize("check", CAUTION_CHECKS, ids=lambda check: check.id)
def test_rule_examples(check: Rule) -> None:
    for example in check.fires_on:
        assert faults(check.id, with_example(example)), example
    for example in check.silent_on:
        assert not faults(check.id, with_example(example)), example


@pytest.mark.parametrize("entry", ["NS2H8WDRW", "NS3V6TDMZ", "NS7K3QFMC", "NS9PZ4GK7", "NSC0W7N51"])
def test_real_life_records_have_no_error(entry: str) -> None:
    assert faults("hazard-unreviewed", (GOOD / f"{entry}.yml").read_text("utf-8")) == []


def test_specimen_has_cautions_for_its_substances_only() -> None:
    assert faults("hazard-unreviewed", specimen_text()) == faults("hazard-pair", specimen_text()) == []


def test_a_reviewed_stop_pair_is_a_caution_and_an_error_before() -> None:
    reviewed = (GOOD / "NS9PZ4GK7.yml").read_text("utf-8")
    assert [fault.at for fault in faults("hazard-pair", reviewed)] == [("reagents", 0)]
    assert faults("hazard-pair", reviewed)[0].data["caution"] == "azide-weak-acid"
    unreviewed = re.sub(r"safety_review:\n(  .*\n)+", "", reviewed)
    assert [fault.at for fault in faults("hazard-unreviewed", unreviewed)] == [("reagents", 0)]
    assert faults("hazard-pair", unreviewed) == []


def test_one_finding_for_each_substance() -> None:
    found = faults("hazard-species", specimen_text())
    places = {("substrate",), ("nucleophile", 0), ("solvent", 0), ("outcome", "products", 0)}
    assert {fault.at for fault in found} == places
    assert len(found) == len(places)
    product = next(fault for fault in found if fault.at == ("outcome", "products", 0))
    assert product.data["caution"] == "organic-azide-carbon-below-3"
    assert product.data["others"] == ["organic-azide"]
    assert "local rules and qualified people decide" in product.mend


def test_alkylating_agents_are_graded() -> None:
    graded = {
        smiles: max((h.caution.severity for h in find_hazards(*experiment(smiles))), key=lambda s: s.weight)
        for smiles in ("CCC(C)Br", "CI", "COS(=O)(=O)OC", "CCOS(=O)(=O)C(F)(F)F", "CCCCCC[C@H](C)OS(C)(=O)=O", "COCCl")
    }
    assert graded == {
        "CCC(C)Br": Severity.NOTE,
        "CCCCCC[C@H](C)OS(C)(=O)=O": Severity.NOTE,
        "CI": Severity.WARN,
        "COS(=O)(=O)OC": Severity.WARN,
        "CCOS(=O)(=O)C(F)(F)F": Severity.WARN,
        "COCCl": Severity.STOP,
    }


def test_solvents_are_judged_by_structure_though_the_record_names_them_only() -> None:
    solvent = next(p for p in presents_of(case_of(specimen_text())) if p.path == ("solvent", 0))
    assert solvent.structure == parse_smiles("CN(C)C=O")


def test_substance_without_structure_is_judged_by_its_name() -> None:
    text = with_example(
        "# without safety_review\nreagents: [{name: conc. hydrochloric acid, use: acid, amount: 20 mmol}]"
    )
    assert [fault.at for fault in faults("hazard-unreviewed", text)] == [("reagents", 0)]


def test_levels() -> None:
    assert {check.id: check.level for check in CAUTION_CHECKS} == {
        "hazard-unreviewed": Level.ERROR,
        "hazard-pair": Level.CAUTION,
        "hazard-species": Level.CAUTION,
    }


@pytest.mark.parametrize(
    ("smarts", "smiles", "count"),
    [("[CX4][Br]", "BrCCBr", 2), ("[CX4][Br]", "Brc1ccccc1", 0), ("c1ccccc1", "c1ccc(-c2ccccc2)cc1", 2)],
)
def test_fragment(smarts: str, smiles: str, count: int) -> None:
    fragment, structure = Fragment.from_smarts(smarts), parse_smiles(smiles)
    assert fragment.count_in(structure) == count
    assert fragment.is_in(structure) is (count > 0)


@pytest.mark.parametrize("smarts", ["", "  ", "[", "C.C", "C" * 41])
def test_fragment_refuses(smarts: str) -> None:
    with pytest.raises(ValueError):
        Fragment.from_smarts(smarts)
