"""What a record asks of the engine: which molecule, in which stage, how warm, how long, with what. Expected by hand."""

import pytest

from builder.mechanism.question import Question
from builder.records.specimen import with_example
from tests.specimens import examine_text

MESYLATION = """\
substrate: {name: (S)-butan-2-ol, smiles: 'CC[C@H](C)O', class: secondary, leaving_group: mesylate, amount: 10 mmol}
reagents:
  - {name: methanesulfonyl chloride, smiles: 'CS(=O)(=O)Cl', use: activator, equivalents: 1.2}
  - {name: triethylamine, smiles: 'CCN(CC)CC', use: base, equivalents: 1.5}
stages:
  - add: [(S)-butan-2-ol, triethylamine, methanesulfonyl chloride]
    temperature: 0 °C
    time: 1 h
    gives: {name: the mesylate, smiles: 'CC[C@H](C)OS(C)(=O)=O', isolated: false}
  - {add: [sodium azide, DMF], temperature: 60 °C, time: 16 h}
"""
HYDROBROMINATION = """\
substrate: {name: 1-methylcyclohex-1-ene, smiles: 'CC1=CCCCC1', class: alkene, leaving_group: none, amount: 20 mmol}
nucleophile: {name: hydrogen bromide, smiles: 'Br', volume: 5 mL, strength: 6 mol/L, form: 33 % solution in acetic acid}
solvent: [{name: n-heptane, volume: 15 mL}]
"""
MALONATE = """\
nucleophile: {name: diethyl malonate, smiles: 'CCOC(=O)CC(=O)OCC', equivalents: 1.3}
base: {name: sodium ethoxide, smiles: '[Na+].CC[O-]', volume: 10 mL, strength: 1.1 mol/L, form: solution in ethanol}
solvent: [{name: ethanol, volume: 10 mL}]
stages:
  - {add: [ethanol, sodium ethoxide, diethyl malonate], temperature: 20–25 °C, time: 30 min}
  - {add: [2-bromobutane], temperature: 78 °C, time: 4 h}
"""
AMINE = """\
nucleophile: {name: butan-1-amine, smiles: 'CCCCN', equivalents: 3}
base: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', equivalents: 1.2}
"""


def _question(example: str) -> Question:
    case = examine_text(with_example(example)).kept
    assert case is not None
    assert case.question is not None, case.unasked
    return case.question


@pytest.mark.parametrize(
    ("stages", "temperature_c", "hours"),
    [
        ("stages: [{temperature: 60 °C, time: 16 h}]", 60.0, 16.0),
        ("stages: [{temperature: 0 °C to 40 °C, time: 3 h}]", 40.0, 3.0),
        ("stages: [{temperature: 40 °C to 0 °C, time: 3 h}]", 40.0, 3.0),
        ("stages: [{temperature: 20–25 °C, time: 90 min}]", 22.5, 1.5),
        ("stages: [{temperature: 0 °C, time: 1 h}, {temperature: 60 °C, time: 5 h}]", 60.0, 5.0),
        ("stages: [{temperature: 55 °C, time: 2 h}, {temperature: 60 °C, time: 5 h}]", 60.0, 7.0),
    ],
    ids=["one", "ramp up", "ramp down", "band", "warmed", "nearly as warm"],
)
def test_the_warmest_stage_is_asked_about(stages: str, temperature_c: float, hours: float) -> None:
    question = _question(stages)
    assert question.temperature_k - 273.15 == pytest.approx(temperature_c)
    assert question.time_s / 3600 == pytest.approx(hours)


def test_the_specimen_as_charged() -> None:
    question = _question("")
    assert question.substrate.smiles == "CCC(C)Br"
    assert question.nucleophile is not None
    assert question.nucleophile.name == "sodium azide"
    assert [(solvent.name, share) for solvent, share in question.solvent] == [("DMF", 1.0)]
    assert question.concentration_m == pytest.approx(0.5)  # 10 mmol in 20 mL
    assert question.equivalents == pytest.approx(1.5)


def test_what_a_stage_gives_is_asked_about_and_what_made_it_is_gone() -> None:
    question = _question(MESYLATION)
    assert question.substrate.smiles == "CC[C@H](C)OS(C)(=O)=O"
    assert question.additives == ()
    assert question.base is None
    assert question.time_s == pytest.approx(16 * 3600)


def test_a_hydrogen_halide_is_nucleophile_and_acid_and_brings_its_solvent() -> None:
    question = _question(HYDROBROMINATION)
    assert question.nucleophile is not None
    assert question.nucleophile.structure.smiles == "[Br-]"
    assert [(dose.reagent.name, dose.mass_percent) for dose in question.additives] == [("hydrogen bromide", 33.0)]
    assert [(solvent.name, share) for solvent, share in question.solvent] == [
        ("heptane", pytest.approx(0.75)),
        ("acetic acid", pytest.approx(0.25)),
    ]
    assert question.concentration_m == pytest.approx(1.0)  # 20 mmol in 15 mL and 5 mL


def test_an_acid_of_carbon_is_worth_no_more_than_its_base() -> None:
    question = _question(MALONATE)
    assert question.equivalents == pytest.approx(1.1)  # 11 mmol of ethoxide on 10 mmol
    assert question.concentration_m == pytest.approx(0.5)
    assert question.temperature_k - 273.15 == pytest.approx(78)
    assert question.time_s == pytest.approx(4 * 3600)


def test_an_amine_needs_no_base_to_attack() -> None:
    question = _question(AMINE)
    assert question.equivalents == pytest.approx(3)
    assert question.base is not None


def test_little_acid_is_a_catalyst() -> None:
    acid = "reagents: [{name: methanesulfonic acid, smiles: 'CS(=O)(=O)O', use: acid, equivalents: %s}]"
    assert [_question(acid % ratio).additives[0].is_catalytic for ratio in ("0.05", "1.0")] == [True, False]


@pytest.mark.parametrize(
    ("example", "reason"),
    [
        (
            "nucleophile: [{name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1},"
            " {name: sodium thiocyanate, smiles: '[Na+].[S-]C#N', equivalents: 1}]",
            "several nucleophiles compete",
        ),
        ("solvent: [{name: DMF}, {name: water}]", "the share of each solvent is not stated"),
        (
            "reagents: [{name: sodium chloride, smiles: '[Na+].[Cl-]', use: additive, equivalents: 1}]\n"
            "stages: [{add: [2-bromobutane, sodium azide, DMF], temperature: 60 °C, time: 1 h},"
            " {add: [sodium chloride], temperature: 60 °C, time: 5 h}]",
            "stage 2 adds sodium chloride while the reaction runs",
        ),
        (
            "reagents: [{name: urea, smiles: 'NC(N)=O', use: activator, equivalents: 1}]",
            "what urea does is not known",
        ),
    ],
    ids=["two nucleophiles", "shares of solvents", "added later", "unknown activator"],
)
def test_what_is_more_than_one_question_is_not_asked(example: str, reason: str) -> None:
    case = examine_text(with_example(example)).kept
    assert case is not None
    assert case.question is None
    assert case.unasked == reason
    assert case.forecast is None
