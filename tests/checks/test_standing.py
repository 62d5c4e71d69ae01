"""The reaction key and the transformation: what they hold together and what they keep apart."""

import pickle

import pytest

from builder.checks.standing import Standing, Variable, standing_of
from builder.records.specimen import with_example
from tests.publish.handmade import case_of


def _standing(example: str = "") -> Standing:
    return standing_of(case_of(with_example(example)))


SUBSTRATE = "substrate: {{name: a, smiles: '{}', stereo: {}, class: secondary, leaving_group: {}, amount: 10 mmol}}\n"
NUCLEOPHILE = "nucleophile: {{name: a, smiles: '{}', equivalents: 1.5}}\n"
PRODUCT = """\
outcome:
  result: [substitution]
  products: [{{label: A, name: a, smiles: '{}', use: desired, stereo: {}}}]
  measured: [{{yield: 81 %, of: A, kind: assay}}]
"""
SOUGHT = "outcome: {result: [no reaction], sought: {name: a, smiles: 'CCC(C)N=[N+]=[N-]'}}\n"

SAME_KEY = {
    "either mirror image of a racemate": SUBSTRATE.format("CC[C@H](C)Br", "racemate", "bromide"),
    "another inorganic counter-ion": NUCLEOPHILE.format("[K+].[N-]=[N+]=[N-]"),
    "a quaternary counter-ion": NUCLEOPHILE.format("CCCC[N+](CCCC)(CCCC)CCCC.[N-]=[N+]=[N-]"),
    "the product sought and not found": SOUGHT,
    "a base beside the nucleophile": "base: {name: b, smiles: 'CCN(CC)CC', equivalents: 1}\n",
    "another solvent": "solvent: [{name: DMSO, volume: 20 mL}]\n",
}
OTHER_KEY = {
    "an enantiomer": SUBSTRATE.format("CC[C@H](C)Br", "single enantiomer", "bromide"),
    "another leaving group": SUBSTRATE.format("CCC(C)Cl", "racemate", "chloride"),
    "another nucleophile": NUCLEOPHILE.format("[Na+].[S-]C#N"),
    "a nucleophile that only forms the anion": NUCLEOPHILE.format("C[Si](C)(C)N=[N+]=[N-]"),
    "another product": PRODUCT.format("CCC=C", "achiral"),
}


@pytest.mark.parametrize("example", [pytest.param(text, id=name) for name, text in SAME_KEY.items()])
def test_one_reaction_has_one_key(example: str) -> None:
    assert _standing(example).key == _standing().key != ""


@pytest.mark.parametrize("example", [pytest.param(text, id=name) for name, text in OTHER_KEY.items()])
def test_another_reaction_has_another_key(example: str) -> None:
    assert _standing(example).key != _standing().key


SAME_TRANSFORMATION = {
    **SAME_KEY,
    "an enantiomer": OTHER_KEY["an enantiomer"],
    "another leaving group": OTHER_KEY["another leaving group"],
    "a tosylate": SUBSTRATE.format("CCC(C)OS(=O)(=O)c1ccc(C)cc1", "racemate", "tosylate"),
    "another form of the nucleophile": OTHER_KEY["a nucleophile that only forms the anion"],
}
OTHER_TRANSFORMATION = {
    "another product": OTHER_KEY["another product"],
    "another skeleton": SUBSTRATE.format("CCCC(C)Br", "racemate", "bromide"),
    "the group elsewhere": SUBSTRATE.format("CCCCBr", "achiral", "bromide"),
}


@pytest.mark.parametrize("example", [pytest.param(text, id=name) for name, text in SAME_TRANSFORMATION.items()])
def test_a_transformation_asks_neither_the_leaving_group_nor_who_attacks(example: str) -> None:
    assert _standing(example).transformation == _standing().transformation == "CC[CH:1]C > CCC(C)N=[N+]=[N-]"


@pytest.mark.parametrize("example", [pytest.param(text, id=name) for name, text in OTHER_TRANSFORMATION.items()])
def test_another_change_is_another_transformation(example: str) -> None:
    assert _standing(example).transformation != _standing().transformation


def test_what_nobody_can_read_has_no_key() -> None:
    broken = _standing(SUBSTRATE.format("CC(C", "racemate", "bromide"))
    assert (broken.key, broken.transformation) == ("", "")


def test_the_time_at_the_highest_temperature_counts() -> None:
    stages = (
        "stages: [{temperature: 0 °C, time: 1 h}, {temperature: 55 °C, time: 2 h}, {temperature: 60 °C, time: 3 h}]\n"
    )
    found = _standing(stages)
    assert (found.temperature_c, found.time_s) == (60.0, 5 * 3600.0)
    assert found.words[Variable.TEMPERATURE] == "0 °C → 55 °C → 60 °C"


SOLVOLYSIS = "nucleophile: solvent\n"
WITH_A_BASE = "base: {name: sodium hydrogencarbonate, smiles: '[Na+].OC([O-])=O', equivalents: 2}\n"
ATTACKS = {
    "the nucleophile": ("", Variable.NUCLEOPHILE, "1.50 equiv"),
    "the nucleophile beside a base": (WITH_A_BASE, Variable.NUCLEOPHILE, "1.50 equiv"),
    "the solvent beside a base": (SOLVOLYSIS + WITH_A_BASE, Variable.NUCLEOPHILE, "none"),
    "the base alone": ("nucleophile: none\n" + WITH_A_BASE, Variable.BASE, "2.00 equiv"),
}


@pytest.mark.parametrize(
    ("example", "attacks", "equivalents"), [pytest.param(*row, id=name) for name, row in ATTACKS.items()]
)
def test_the_equivalents_are_those_of_what_attacks(example: str, attacks: Variable, equivalents: str) -> None:
    found = _standing(example)
    assert (found.attacks, found.words[Variable.EQUIVALENTS]) == (attacks, equivalents)


def test_solvents_are_known_by_any_of_their_names() -> None:
    one = _standing("solvent: [{name: ethanol, volume: 16 mL}, {name: water, volume: 4 mL}]\n")
    other = _standing(
        "solvent: [{name: EtOH, fraction: 80 %}, {name: water, fraction: 20 %}]\nconcentration: 0.5 mol/L\n"
    )
    assert (one.solvents, one.volumes) == (other.solvents, other.volumes) == (("ethanol", "water"), (80.0, 20.0))


BOTTLES = {
    "one the table has": ("DMF (bottle 7)", "CN(C)C=O", ("DMF",), "DMF"),
    "one the table lacks": ("Cyrene, fresh", "O=C1CCC2OCC1O2", ("O=C1CCC2OCC1O2",), "Cyrene, fresh"),
    "nothing drawn": ("Cyrene, fresh", "", ("cyrene, fresh",), "Cyrene, fresh"),
}


@pytest.mark.parametrize(
    ("name", "smiles", "solvents", "words"), [pytest.param(*row, id=name) for name, row in BOTTLES.items()]
)
def test_a_drawn_solvent_is_what_is_drawn(name: str, smiles: str, solvents: tuple[str, ...], words: str) -> None:
    drawn = f", smiles: '{smiles}'" if smiles else ""
    found = _standing(f"solvent: [{{name: '{name}'{drawn}, volume: 20 mL}}]\n")
    assert (found.solvents, found.words[Variable.SOLVENT]) == (solvents, words)


def test_it_is_plain_data() -> None:
    assert pickle.loads(pickle.dumps(_standing())) == _standing()
