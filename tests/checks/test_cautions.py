"""Cautions: every row of the table fires on its example and not on its near miss; records get them in their place."""

import datetime as dt
import re
from pathlib import Path

import pytest
from chemicals import Carcinogen

from builder.checks.case import Case, open_case
from builder.checks.hazards.cautions import Caution, CautionKind, Setting, Severity, load_cautions
from builder.checks.hazards.formed import load_formations
from builder.checks.hazards.kinds import load_substance_kinds
from builder.checks.hazards.meetings import Present, Whereabouts, by_meeting, find_hazards
from builder.checks.hazards.mutagens import load_mutagen_alerts
from builder.checks.hazards.presents import presents_of
from builder.checks.hazards.rules import HAZARD_CHECKS
from builder.checks.hazards.screens import SCREEN_CHECKS
from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import parse_smiles
from builder.finding import Level
from builder.records.reader import read_bytes
from builder.records.settings import Settings
from builder.records.specimen import SPECIMEN_FILE, specimen_text, with_example
from builder.rule import Fault, Rule
from tests.specimens import findings_of

GOOD = Path(__file__).parents[1] / "data" / "records" / "good"
RULES = {check.id: check for check in (*HAZARD_CHECKS, *SCREEN_CHECKS)}
ROOM_TEMPERATURE_C = 20.0


def case_of(text: str) -> Case:
    reading = read_bytes(text.encode(), SPECIMEN_FILE)
    assert reading.record is not None, reading.findings
    return open_case(reading.record, SPECIMEN_FILE, Settings(format=1, title="test"), dt.date(2026, 12, 1))


def faults(rule_id: str, text: str) -> list[Fault]:
    look = RULES[rule_id].look
    assert look is not None
    return list(look(case_of(text)))


def experiment(example: str) -> tuple[tuple[Present, ...], Setting]:
    """Read an example of the table: SMILES, "lines of the work-up" and what begins with @, joined by ++."""
    presents: list[Present] = []
    hottest_c, is_closed, base = ROOM_TEMPERATURE_C, False, ""
    for index, part in enumerate(example.split(" ++ ")):
        if part == "@closed":
            is_closed = True
        elif part.startswith("@eliminates"):
            base = part
        elif part.startswith("@"):
            hottest_c = float(part[1:])
        elif part.startswith('"'):
            presents.append(Present(("work_up", index), part.strip('"'), Whereabouts.WORK_UP))
        else:
            presents.append(Present(("reagents", index), part, Whereabouts.FLASK, parse_smiles(part)))
    return tuple(presents), Setting(
        hottest_c, is_closed, base == "@eliminates", base in {"@eliminates", "@eliminates-weakly"}
    )


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
    assert (caution.second is None) == (caution.kind in {CautionKind.SPECIES, CautionKind.CHARGED})
    assert "local rules" not in caution.precaution  # the finding adds it, once


def test_every_kind_of_substance_is_used() -> None:
    asked = {kind for c in load_cautions() for kind in (c.first, c.second, c.company, c.unless, c.where)}
    used = {kind.name for kind in asked if kind} | {alert.kind for alert in load_mutagen_alerts()}
    used |= {kind for formation in load_formations() for kind in formation.of}
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
    # After a chemist's review: as Bretherick and Prudent Practices have them (from memory).
    (SODIUM_AZIDE, "B(F)(F)F"),
    (SODIUM_AZIDE, "CC[O+](CC)[B-](F)(F)F"),
    (SODIUM_AZIDE, "Cl[Ti](Cl)(Cl)Cl"),
    (SODIUM_AZIDE, "[Zn+2].[Cl-].[Cl-]"),
    (SODIUM_AZIDE, "Cl[Zn]Cl"),
    (SODIUM_AZIDE, "Cl[Si](Cl)(Cl)Cl"),
    ("C[Si](C)(C)N=[N+]=[N-]", "FB(F)F"),
    (SODIUM_AZIDE, "ClP(Cl)Cl"),
    (SODIUM_AZIDE, "O=P(Cl)(Cl)Cl"),
    ("OO", "CC(C)=O"),
    ("NC(N)=O.OO", "CC(C)=O"),
    ("ON(=O)=O", "CC(C)O"),
    ("[Ag+].[O-][N+](=O)[O-]", "C#CC"),
    ("[Cu]Br", "[Na+].[C-]#C"),
    ("CS(C)=O", "CC(=O)OC(C)=O"),
    ("CS(C)=O", "Clc1nc(Cl)nc(Cl)n1"),
    ("CS(C)=O", "O=P12OP3(=O)OP(=O)(O1)OP(=O)(O2)O3"),
    ("CS(C)=O", "O=P(=O)OP(=O)=O"),
    ("[Na+].[O-]N=O", "CC(=O)[O-].[NH4+]"),
    ("[Na+].[O-]Cl", "Cl"),
    ("BrBr", "N"),
    ("CC[N+](=O)[O-]", "[K+].CC(C)(C)[O-]"),
    ("CC(C)[N+](=O)[O-]", "[Na+].[H-]"),
    ("C[Mg]Br", "CC(=O)O"),
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
        (SODIUM_AZIDE, "C[Si](C)(C)Cl"),
        (SODIUM_AZIDE, "[Na+].F[B-](F)(F)F"),
        (SODIUM_AZIDE, "CCCC[Sn](Cl)(CCCC)CCCC"),
        (SODIUM_AZIDE, "[Mg+2].[O-]S(=O)(=O)[O-]"),
        ("[Cu]I", "CC#CC"),
        ("CC(C)(C)OO", "CC(C)=O"),
        ("[Na+].[O-][N+](=O)[O-]", "CCO"),
        ("[O-][N+](=O)c1ccccc1", "[Na+].[OH-]"),
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
        "kept apart from metal, then acidified",
        "kept away from light, acidified",
        "kept away from light and acidified",
        "kept away from light, washed with water and acid",
        "wash with vinegar",
        "Lewis acid filtered off, quench with dilute acid",
        "extract with 3 × 20 mL CH₂Cl₂",
        "extract with dichlormethane",
        "quench with NH₄Cl solution",
        "neutralise with 2 mol/L H₂SO₄",
        "wash with sat. CuSO₄",
        "wash with 1N hydrochloric",
        "stir with Amberlyst 15 (H+ form)",
        "Dowex 50W (H+) added, filtered",
        "pour onto dry ice",
        "neutralise, extract with MTBE",
        "neutralised with ice cooling",
        "thioacetic acid added",
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
        "kept apart from heavy metals, amines and acid",
        "azide water, never into acid",
        "amino acid stays in the aqueous layer",
        "neutralise the mixture with NaHCO3",
        "cooled with dry ice",
        "filtered through acid-washed sand",
        "fatty acid esters stay behind",
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


@pytest.mark.parametrize(
    ("line", "kind"),
    [
        ("the Lewis acid goes in last", "Lewis acid"),
        ("LEWIS ACID removed", None),
        ("excess acid chloride destroyed", "acid chloride"),
        ("cooled in an acetone bath", None),
        ("iodide water apart from bleach and other oxidisers", None),
        ("nitrite water apart from amines, amide solvents and acid (nitrosamines)", None),
    ],
)
def test_longer_names_and_denied_names_are_no_acid_acetone_or_bleach(line: str, kind: str | None) -> None:
    kinds = Present(("work_up", 0), line, Whereabouts.WORK_UP).kinds
    assert not kinds & {"acid", "acetone", "hypochlorite"}
    assert kind is None or kind in kinds


def test_bleach_in_the_work_up_meets_cyanide_and_its_solvent() -> None:
    for solvent, caution in [("CS(C)=O", "dmso-oxidant"), ("CN(C)C=O", "dmf-oxidant")]:
        ids = ids_of(f'{POTASSIUM_CYANIDE} ++ {solvent} ++ "bleach, pH 12"')
        assert {caution, "cyanide-hypochlorite-alkaline"} <= ids


@pytest.mark.parametrize(
    ("line", "is_grave"),
    [
        ("destroy with bleach", True),
        ("destroy with bleach, pH 10", True),
        ("destroy with bleach, kept below pH 11", True),
        ("into bleach at pH 11", False),
        ("into bleach, pH kept above 10.5", False),
        ("into bleach, pH >= 10.5 throughout", False),
        ("into bleach, never below pH 11", False),
        ("into bleach, pH above 9", True),
    ],
)
def test_bleach_on_cyanide_is_grave_unless_the_line_states_an_alkaline_ph(line: str, is_grave: bool) -> None:
    ids = ids_of(f'{POTASSIUM_CYANIDE} ++ "{line}"') - {"cyanide"}
    assert ids == {"cyanide-hypochlorite" if is_grave else "cyanide-hypochlorite-alkaline"}


def test_what_depends_on_the_vessel_or_the_heat_is_shown_beside_what_the_substance_is() -> None:
    presents, setting = experiment("CI ++ @closed ++ @100")
    shown = {group[0].caution.id for group in by_meeting(find_hazards(presents, setting))}
    assert shown == {"methyl-halide", "low-boiling-reagent-closed"}


@pytest.mark.parametrize("whereabouts", [Whereabouts.FLASK, Whereabouts.PRODUCT])
def test_an_organic_azide_is_not_distilled_whether_charged_or_obtained(whereabouts: Whereabouts) -> None:
    azide = Present(("x",), "butyl azide", whereabouts, parse_smiles("CCCCN=[N+]=[N-]"))
    line = Present(("work_up", 0), "distil butyl azide at 20 mbar, 60 °C", Whereabouts.WORK_UP)
    found = {h.caution.id for h in find_hazards((azide, line), Setting(ROOM_TEMPERATURE_C)) if h.others}
    assert found == {"organic-azide-distilled"}


@pytest.mark.parametrize(
    ("lines", "fires"),
    [
        ('"extract with chloroform"', True),
        ('"quench with water" ++ "extract with chloroform"', True),
        ('"acidify to pH 5" ++ "extract with chloroform"', False),
        ('"acidify to pH 5" ++ "basify with NaOH" ++ "extract with chloroform"', True),
    ],
)
def test_chloroform_is_safe_only_below_the_acid(lines: str, fires: bool) -> None:
    assert ("chloroform-strong-base" in ids_of(f"[Na+].[OH-] ++ {lines}")) is fires


@pytest.mark.parametrize(
    ("line", "caution"),
    [
        ("extract with diethyl ether, distilled to dryness", "peroxide-former-dryness"),
        ("extract with diethyl ether, to dryness", "peroxide-former-dryness"),
        ("extract with diethyl ether, evaporate to dryness", "peroxide-former-evaporated"),
    ],
)
def test_an_ether_taken_to_dryness_is_quoted_once(line: str, caution: str) -> None:
    (hazard,) = find_hazards(*experiment(f'CCO ++ "{line}"'))
    assert hazard.caution.id == caution
    assert hazard.message.startswith(f'"{line}": ')


@pytest.mark.parametrize(
    ("smiles", "caution"),
    [
        ("OCCF", "fluoroacetate"),
        ("CCOC(=O)CF", "fluoroacetate"),
        ("CC(=O)OCC(F)(F)F", None),
        ("S", "hydrogen-sulfide"),
        ("CCCO[N+](=O)[O-]", "nitrate-ester"),
        ("CS(=O)(=O)OCCNCCOS(C)(=O)=O", "mustard"),
        ("CS(=O)(=O)OCCSc1ccccc1", "beta-halo-sulfide-amine"),
        ("CS(=O)(=O)OCCCSc1ccccc1", None),
        ("CCOCCl", "alpha-halo-ether"),
        ("BrC1CCCCO1", None),
    ],
)
def test_what_kills_needs_a_review(smiles: str, caution: str | None) -> None:
    stops = {h.caution.id for h in find_hazards(*experiment(smiles)) if h.caution.severity is Severity.STOP}
    assert caution in stops if caution else not stops


def test_no_precaution_leads_a_strong_base_into_dmso() -> None:
    bases = {"strong base", "saline hydride", "hydroxide, alkoxide or amide base", "alkoxide, amide or hydride base"}
    for caution in load_cautions():
        if {caution.first.name, caution.second.name if caution.second else ""} & bases:
            assert not re.search(r"\bDMSO\b|\bDMF\b|\bNMP\b", caution.precaution), caution.id


def test_n_ethylpyrrolidone_counts_as_an_amide_solvent() -> None:
    assert {"hydride-amide-solvent", "reprotoxic-amide"} <= ids_of("[Na+].[H-] ++ CCN1CCCC1=O")


def test_hydrogencarbonate_beside_cyanide_is_no_base() -> None:
    assert "cyanide-elimination" in ids_of(f"{POTASSIUM_CYANIDE} ++ @eliminates-weakly")


def test_an_organometallic_is_seen_at_its_quench() -> None:
    lines = '"quench: 20 mL half-saturated ammonium chloride" ++ "layer washed with 3 × 20 mL water"'
    at = {h.caution.id: h.at.path for h in find_hazards(*experiment(f"[Li]CCCC ++ {lines}")) if h.others}
    assert at["organometallic-protic"] == ("work_up", 1)


def test_text_is_quoted_once_and_only_where_it_adds_something() -> None:
    bleach = f'{POTASSIUM_CYANIDE} ++ "cyanide water into bleach at pH 12" ++ "bleach at pH 12 decanted"'
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
        ("OCC(c1ccccc1)N=[N+]=[N-]", Severity.WARN),  # 9/3
        ("c1ccccc1CN=[N+]=[N-]", Severity.WARN),  # 7/3
    ],
)
def test_organic_azides_are_graded_by_carbon_ratio(smiles: str, severity: Severity) -> None:
    hazards = find_hazards(*experiment(smiles))
    grades = [h.caution.severity for h in hazards if h.caution.first.name == "organic azide"]
    assert max(grades, key=lambda grade: grade.weight) is severity


@pytest.mark.parametrize("check", HAZARD_CHECKS, ids=lambda check: check.id)
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
        for smiles in ("CCC(C)Br", "CI", "CCOS(=O)(=O)C(F)(F)F", "ClCC1CO1", "COCCl")
    }
    assert graded.pop("COCCl") is Severity.STOP
    assert set(graded.values()) == {Severity.WARN}


def test_a_plain_alkylating_agent_counts_where_it_is_charged_and_not_as_product() -> None:
    bromide = parse_smiles("CCC(C)Br")
    for whereabouts, ids in [(Whereabouts.FLASK, ["alkylating-agent"]), (Whereabouts.PRODUCT, [])]:
        hazards = find_hazards((Present(("x",), "2-bromobutane", whereabouts, bromide),), Setting(ROOM_TEMPERATURE_C))
        assert [hazard.caution.id for hazard in hazards] == ids


def test_what_is_only_good_to_know_is_a_remark() -> None:
    found = faults("hazard-species", with_example("solvent: [{name: THF, volume: 20 mL}]"))
    levels = {str(fault.data["caution"]): fault.level for fault in found}
    assert levels["peroxide-former"] is Level.REMARK
    assert levels["azide-salt"] is levels["alkylating-agent"] is Level.CAUTION


# Outside reference: the IARC classes carried by the Python package chemicals 1.5.2, by CAS number.
@pytest.mark.parametrize(
    ("cas", "smiles", "caution"),
    [
        ("68-12-2", "CN(C)C=O", "dmf"),
        ("100-44-7", "ClCc1ccccc1", "benzyl-chloride"),
        ("106-93-4", "BrCCBr", "dibromoethane"),
        ("75-01-4", "C=CCl", "vinyl-chloride"),
        ("593-60-2", "C=CBr", "vinyl-bromide"),
        ("106-99-0", "C=CC=C", "butadiene"),
        ("78-79-5", "C=CC(C)=C", "isoprene"),
        ("106-94-5", "CCCBr", "bromopropane"),
        ("75-09-2", "ClCCl", "dichloromethane"),
        ("67-66-3", "ClC(Cl)Cl", "chloroform"),
        ("75-52-5", "C[N+](=O)[O-]", "nitromethane"),
        ("79-46-9", "CC(C)[N+](=O)[O-]", "nitropropane"),
        ("680-31-9", "CN(C)P(=O)(N(C)C)N(C)C", "hmpa"),
        ("77-78-1", "COS(=O)(=O)OC", "dialkyl-sulfate"),
        ("107-30-2", "COCCl", "halomethyl-methyl-ether"),
    ],
)
def test_classes_of_carcinogens_are_those_of_iarc(cas: str, smiles: str, caution: str) -> None:
    listed = Carcinogen(cas)["International Agency for Research on Cancer"]
    group = re.search(r"\((1|2A|2B)\)", listed)
    assert group
    hazard = next(h.caution.hazard for h in find_hazards(*experiment(smiles)) if h.caution.id == caution)
    assert re.search(rf"IARC {group[1]}\b", hazard), (listed, hazard)


def test_only_benzyl_chloride_is_said_to_be_benzyl_chloride() -> None:
    for smiles in ("C=CC(C)Cl", "BrCc1ccccc1", "CC(Cl)c1ccccc1", "C#CCBr", "CCOC(=O)CBr"):
        assert "IARC" not in " ".join(h.message for h in find_hazards(*experiment(smiles)))


def test_solvents_are_judged_by_structure_though_the_record_names_them_only() -> None:
    solvent = next(p for p in presents_of(case_of(specimen_text())) if p.path == ("solvent", 0))
    assert solvent.structure == parse_smiles("CN(C)C=O")


def test_substance_without_structure_is_judged_by_its_name() -> None:
    text = with_example(
        "# without safety_review\nreagents: [{name: conc. hydrochloric acid, use: acid, amount: 20 mmol}]"
    )
    assert [fault.at for fault in faults("hazard-unreviewed", text)] == [("reagents", 0)]


def test_a_mild_pair_that_shows_in_several_places_is_said_once() -> None:
    acids = "reagents: [{name: acetic acid, smiles: CC(=O)O, use: acid, amount: 1 mmol}]"
    nitrite = "nucleophile: {name: sodium nitrite, smiles: '[Na+].[O-]N=O', equivalents: 1.5}"
    lines = "work_up: ['acidified with 2 mol/L hydrochloric acid', 'washed with dilute acid']"
    found = faults("hazard-pair", with_example(f"{nitrite}\n{acids}\n{lines}"))
    assert [fault.data["caution"] for fault in found].count("nitrite-acid") == 1


def test_a_hazard_cannot_be_accepted_away() -> None:
    accepted = "accepted: [{finding: hazard-out-of-scope, because: 'we know it', by: bench-1}]"
    hydride = "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 12 mmol}]"
    found = findings_of(with_example(f"{hydride}\n{accepted}").encode(), SPECIMEN_FILE)
    assert {"hazard-out-of-scope", "acceptance-of-error"} <= {f.rule for f in found if f.level is Level.ERROR}


def test_levels() -> None:
    assert {check.id: check.level for check in HAZARD_CHECKS} == {
        "hazard-out-of-scope": Level.ERROR,
        "safety-scope-exceeded": Level.ERROR,
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
