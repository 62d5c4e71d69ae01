"""Screens with numbers: azides, mutagenic impurities, solvents, heat, gas; and the tables they read."""

import pytest
from chemicals import Carcinogen

from builder.checks.hazards.azides import azide_limit, load_azide_limits
from builder.checks.hazards.formed import formed_by, load_formations
from builder.checks.hazards.formulae import carbon_ratio, carbons_per_azide, oxygen_balance_percent
from builder.checks.hazards.ghs import labelled, load_ghs, load_statements
from builder.checks.hazards.meetings import find_hazards
from builder.checks.hazards.mutagens import alert_of, load_intake_limits
from builder.checks.hazards.screens import mutagenic_species
from builder.checks.hazards.solvent_limits import load_residual_limits, load_restrictions
from builder.chemistry.structure import parse_smiles
from builder.mechanism.solvents import load_solvents
from builder.publish.safety import view_safety
from builder.records.specimen import with_example
from tests.checks.test_cautions import case_of, experiment, faults

LAST_PRINTED_DIGIT = 0.05


@pytest.mark.parametrize(
    ("smiles", "ratio", "carbons", "most_g"),
    [
        # Rule (N_C + N_O)/N_N of university azide guidelines; all by hand.
        ("CCC(C)N=[N+]=[N-]", 4 / 3, 4, 5),  # 2-azidobutane
        ("CCCCCC[C@@H](C)N=[N+]=[N-]", 8 / 3, 8, 5),
        ("CCN=[N+]=[N-]", 2 / 3, 2, 0),
        ("CCCN=[N+]=[N-]", 1, 3, 5),
        ("CCCCCCCCCN=[N+]=[N-]", 3, 9, 20),
        ("[N-]=[N+]=NCCCCCCN=[N+]=[N-]", 1, 3, 5),
        ("OCC(c1ccccc1)N=[N+]=[N-]", 3, 9, 20),
    ],
)
def test_an_azide_is_judged_by_its_carbon(smiles: str, ratio: float, carbons: float, most_g: float) -> None:
    structure = parse_smiles(smiles)
    assert carbon_ratio(structure) == pytest.approx(ratio)
    assert carbons_per_azide(structure) == carbons
    assert azide_limit(ratio).most_g == most_g


def test_oxygen_balance_of_2_azidobutane() -> None:
    # By hand for C4H9N3, 99.14 g/mol: -1600 (2 · 4 + 9/2)/99.14 = -201.7 %.
    balance = oxygen_balance_percent(parse_smiles("CCC(C)N=[N+]=[N-]"))
    assert balance == pytest.approx(-201.7, abs=LAST_PRINTED_DIGIT)


def test_the_ranges_of_azides_meet_and_each_says_when_it_was_read() -> None:
    assert [limit.ratio_from for limit in load_azide_limits()] == [0, 1, 3]
    assert all(limit.read for limit in load_azide_limits())


TWO_AZIDES = """\
substrate: {{name: 2-bromopentane, smiles: 'CCCC(C)Br', class: secondary, leaving_group: bromide, amount: {amount}}}
nucleophile: {{name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.3}}
outcome:
  result: [substitution, rearrangement]
  products:
    - {{label: A, name: 2-azidopentane, smiles: 'CCCC(C)N=[N+]=[N-]', use: desired}}
    - {{label: B, name: 3-azidopentane, smiles: 'CCC(CC)N=[N+]=[N-]', use: by-product}}
  measured: [{measured}]
safety_review: {{by: safety-1, date: 2026-03-12, scope: '{scope}'}}
"""


@pytest.mark.parametrize(
    ("measured", "masses"),
    [
        # 437 mmol of azidopentane, 113.16 g/mol, weigh 49.4 g; 85 % are 42.0 g; both may be isolated up to 5 g.
        ("{yield: 85 %, of: [A, B], kind: isolated, mass: 42 g}", ["at most 42 g", "at most 42 g"]),
        ("{yield: 85 %, of: [A, B], kind: isolated}", ["at most 42 g", "at most 42 g"]),
        ("{yield: 85 %, of: [A, B], kind: assay, mass: 42 g}", []),
        # Of one alone, its own number counts: 2 % of 49.4 g are 1 g.
        ("{yield: 85 %, of: [A, B], kind: isolated, mass: 42 g}, {yield: 2 %, of: B, kind: assay}", ["at most 42 g"]),
        ("{yield: 80 %, of: A, kind: isolated, mass: 39.5 g}", ["39.5 g"]),
    ],
)
def test_azides_weighed_together_are_each_at_most_that(measured: str, masses: list[str]) -> None:
    text = TWO_AZIDES.format(amount="437 mmol", measured=measured, scope="azide at 600 mmol")
    found = faults("azide-over-limit", with_example(text))
    assert [fault.message.split(": ")[1].split(", and")[0] for fault in found] == masses


def test_the_mass_that_the_mend_names_is_enough_in_the_scope() -> None:
    # By hand: 85 % of 64.0 mmol, 113.16 g/mol, are 6.156 g, shown as 6.16 g; of 63.97 mmol 6.153 g, shown as 6.15 g.
    for amount, shown in (("64.0 mmol", "6.16 g"), ("63.97 mmol", "6.15 g")):
        line = "{yield: 85 %, of: A, kind: isolated}"
        (fault,) = faults(
            "azide-over-limit", with_example(TWO_AZIDES.format(amount=amount, measured=line, scope="azide at 90 mmol"))
        )
        assert f"have {shown} reviewed" in fault.mend
        for allowed, is_over in ((shown, False), ("5.8 g", True)):
            text = TWO_AZIDES.format(amount=amount, measured=line, scope=f"azide at 90 mmol, azide up to {allowed}")
            assert bool(faults("azide-over-limit", with_example(text))) is is_over


def test_a_negative_balance_is_shown_with_the_true_minus() -> None:
    # By hand for C5H11N3, 113.16 g/mol: -1600 (2 · 5 + 11/2)/113.16 = -219.2 %.
    text = with_example(
        TWO_AZIDES.format(amount="64 mmol", measured="{yield: 85 %, of: A, kind: isolated}", scope="azide at 64 mmol")
    )
    (fault,) = faults("azide-over-limit", text)
    assert "oxygen balance −219.2 %" in fault.message
    assert all("oxygen balance −219.2 %" in fact.detail for fact in view_safety(case_of(text)).azides)


# --- what forms -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("example", "formed"),
    [
        # Outcomes drawn by hand.
        ("[Na+].[N-]=[N+]=[N-] ++ Cl", {"N=[N+]=[N-]"}),
        ("[K+].[C-]#N ++ Cl", {"C#N"}),
        ("[Na+].[N-]=[N+]=[N-] ++ ClCCl", {"[N-]=[N+]=NCN=[N+]=[N-]"}),
        ("CO ++ Cl", {"CCl"}),
        ("CC(C)O ++ Br", {"CC(C)Br"}),
        ("CCO ++ CS(=O)(=O)O", {"CCOS(C)(=O)=O"}),
        ("[Na+].[O-]N=O ++ CCNCC", {"CCN(CC)N=O"}),
        ("[Na+].[O-]N=O ++ CN(C)C=O", {"CN(C)N=O"}),
        ("CN(C)C=O ++ O=S(Cl)Cl", {"CN(C)C(=O)Cl"}),
        ("CS(=O)(=O)Cl ++ CCN(CC)CC ++ CCC(C)O", {"CCC(C)Cl"}),
        ("COC(C)(C)C ++ OS(=O)(=O)O", {"C=C(C)C"}),
        ("CC(=O)Cl ++ CCN(CC)CC", {"C=C=O"}),
        ("[Na+].[N-]=[N+]=[N-] ++ COS(=O)(=O)OC", {"CN=[N+]=[N-]"}),
        ("CCCCBr ++ CS(C)=O", set()),
    ],
)
def test_what_forms_has_a_structure(example: str, formed: set[str]) -> None:
    presents, setting = experiment(example)
    species = formed_by(find_hazards(presents, setting), presents)
    assert {parse_smiles(smiles) for smiles in formed} == {each.structure for each in species if each.structure}


def test_every_formed_species_has_a_name() -> None:
    assert all(formation.name for formation in load_formations())


# --- mutagenic impurities ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("smiles", "alert"),
    [
        ("CCC(C)Br", "alkyl halide"),
        ("CCOS(C)(=O)=O", "sulfonate ester"),
        ("COS(=O)(=O)OC", "dialkyl sulfate"),
        ("CC1CO1", "epoxide"),
        ("CCN(CC)N=O", "N-nitrosamine"),
        ("NN", "hydrazine or hydroxylamine"),
        ("Clc1ccccc1", None),
        ("CC(=O)Cl", None),
        ("CCO", None),
    ],
)
def test_alerts(smiles: str, alert: str | None) -> None:
    found = alert_of(parse_smiles(smiles))
    assert (found.name if found else None) == alert


def test_only_the_cohort_of_concern_has_no_threshold() -> None:
    for smiles, is_of_concern in [("CCN(CC)N=O", True), ("CCC(C)Br", False)]:
        found = alert_of(parse_smiles(smiles))
        assert found is not None
        assert found.is_of_concern is is_of_concern


def test_intake_limits_are_those_of_the_guideline() -> None:
    # ICH M7(R2), 2023 (group's digest read 2026-12): 120, 20, 10 and 1.5 µg a day; together 120, 60, 30 and 5.
    assert [limit.one for limit in load_intake_limits()] == [120, 20, 10, 1.5]
    assert [limit.several for limit in load_intake_limits()] == [120, 60, 30, 5]
    assert {limit.revision for limit in load_intake_limits()} == {"R2, 2023"}


def test_a_nitrosamine_that_can_form_never_gets_the_threshold() -> None:
    text = with_example("reagents: [{name: sodium nitrite, smiles: '[Na+].[O-]N=O', use: additive, amount: 1 mmol}]")
    species = mutagenic_species(case_of(text))
    assert "can form from DMF" in {each.whence for each in species}
    (fault,) = faults("mutagenic-impurity", text)
    assert "N-nitrosodimethylamine 96 ng a day" in fault.message
    assert "in a drug substance, and only there" in fault.message
    assert "local quality unit decides" in fault.mend


# --- solvents and statements ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("smiles", "solvent_class", "most_ppm", "pde_mg"),
    [
        # ICH Q3C(R9), 24 January 2024 (group's digest read 2026-12).
        ("c1ccccc1", 1, 2, 0.02),
        ("ClCCCl", 1, 5, 0.05),
        ("CC#N", 2, 410, 4.1),
        ("ClCCl", 2, 600, 6.0),
        ("CN(C)C=O", 2, 880, 8.8),
        ("CC(C)(C)O", 2, 3500, 35.0),
        ("CC1CCCO1", 3, 5000, 50.0),
    ],
)
def test_residual_limits(smiles: str, solvent_class: int, most_ppm: float, pde_mg: float) -> None:
    limit = load_residual_limits()[parse_smiles(smiles).smiles]
    assert (limit.solvent_class, limit.most_ppm) == (solvent_class, most_ppm)
    assert limit.pde_mg == pytest.approx(pde_mg)


@pytest.mark.parametrize(
    ("smiles", "entry", "inhalation", "dermal"),
    [
        # REACH annex XVII (group's digest read 2026-12): DNEL in mg/m³ and mg/kg a day.
        ("CN1CCCC1=O", "71", "14.4", "4.8"),
        ("CN(C)C=O", "76", "6", "1.1"),
        ("CC(=O)N(C)C", "80", "13", "1.8"),
        ("CCN1CCCC1=O", "81", "4.0", "2.4"),
    ],
)
def test_restrictions(smiles: str, entry: str, inhalation: str, dermal: str) -> None:
    found = load_restrictions()[parse_smiles(smiles).smiles]
    assert (found.entry, found.inhalation, found.dermal) == (entry, inhalation, dermal)
    assert found.jurisdiction.startswith("EU")
    assert found.read


def test_every_statement_has_its_wording_and_every_wording_is_used() -> None:
    used = {statement.code for row in load_ghs().values() for statement in row.statements}
    assert used == load_statements().keys()


def test_solvents_of_limits_are_those_of_the_solvent_table() -> None:
    known = {solvent.smiles for solvent in load_solvents()} | {"CCN1CCCC1=O"}
    assert load_residual_limits().keys() <= known
    assert load_restrictions().keys() <= known


@pytest.mark.parametrize(
    ("smiles", "code"),
    [
        ("[Na+].[N-]=[N+]=[N-]", "EUH032"),
        ("[Na+].[C-]#N", "EUH032"),
        ("[K+].[C-]#N", "EUH032"),
        ("[Na+].[H-]", "H260"),
        ("CI", "H351"),
        ("CN(C)C=O", "H360D"),
        ("CCOCC", "EUH019"),
        ("O=S(Cl)Cl", "EUH029"),
    ],
)
def test_statements_that_matter_most(smiles: str, code: str) -> None:
    row = labelled(parse_smiles(smiles))
    assert row is not None
    assert code in {statement.code for statement in row.statements}


# Outside reference: the IARC groups carried by the Python package chemicals 1.5.2, by CAS number. What is carcinogenic
# to humans (group 1) has at least a statement of suspicion.
@pytest.mark.parametrize(("cas", "smiles"), [("71-43-2", "c1ccccc1"), ("75-21-8", "C1CO1")])
def test_human_carcinogens_are_labelled_so(cas: str, smiles: str) -> None:
    assert "(1)" in Carcinogen(cas)["International Agency for Research on Cancer"]
    row = labelled(parse_smiles(smiles))
    assert row is not None
    assert "H350" in {statement.code for statement in row.statements}


# --- texts ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "is_chlorine"),
    [
        ("outlet through 2 mol/L sodium hydroxide, then bleach at pH 12", False),
        ("off-gas through a bleach scrubber", False),
        ("carbon dioxide would make bleach alone acidic", False),
        ("kept basic (chlorine from bleach with acid)", False),
        ("bleach is run in", True),
        ("off-gas through a scrubber, then washed with bleach", True),
    ],
)
def test_a_scrubber_is_another_vessel(text: str, is_chlorine: bool) -> None:
    presents, setting = experiment(f'CC(=O)O ++ "{text}"')
    ids = {hazard.caution.id for hazard in find_hazards(presents, setting)}
    assert ("hypochlorite-acid" in ids) is is_chlorine
