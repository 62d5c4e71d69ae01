"""What chemists type, read exactly or refused in one sentence that says how to mend it."""

from typing import Any

import pytest

from builder.mechanism.asking import (
    INTERNAL,
    WITHOUT_EFFECT,
    AskingError,
    Read,
    question_from_line,
    question_from_words,
    read_wish,
)
from builder.mechanism.reagents import Role
from builder.records.vocabulary import Mechanism

LINE: dict[str, Any] = {
    "substrate": "CCCCBr",
    "nucleophile": "sodium azide",
    "solvent": [["DMF", 1.0]],
    "temperature_C": 25,
}
WORDS: dict[str, Any] = {
    "substrate": "CCCCBr",
    "nucleophile": "sodium azide",
    "solvent": ["DMF"],
    "temperature": "25 °C",
}


def taken(read: Read, role: str) -> list[str]:
    return [reading.taken for reading in read.readings if reading.role == role]


REFUSED_LINES = [
    # what is changed, what the message says, how to mend it
    ({"solvent": [["DFM", 1.0]]}, "unknown solvent 'DFM'", 'did you mean "DMF"?'),
    ({"solvent": [["moonshine", 1.0]]}, "unknown solvent", "by name or SMILES"),
    ({"solvent": "DMF"}, "no list of [name, fraction]", "write [["),
    ({"solvent": [["DMF"]]}, "no list of [name, fraction]", "write [["),
    ({"solvent": [["DMF", "all"]]}, "'all' is no number", "plain number"),
    ({"solvent": [["DMF", -0.5]]}, "solvent fraction -0.5", "leave that solvent out"),
    ({"solvent": None}, "no solvent", "every line needs"),
    ({"substrate": "C(C)(C)(C)(C)C"}, "valence of C", "count the bonds"),
    ({"substrate": "CC(Br"}, "substrate 'CC(Br'", ""),
    ({"substrate": ""}, "substrate", ""),
    ({"substrate": 7}, "substrate is no text", "in quotes"),
    ({"substrate": "*CBr"}, "substrate", ""),
    ({"nucleophile": "sodium azid"}, "unknown nucleophile 'sodium azid'", 'did you mean "sodium azide"?'),
    ({"nucleophile": "x" * 500}, "unknown nucleophile", "known name or a SMILES"),
    ({"base": "sodium ethoxid"}, "unknown base", 'did you mean "sodium ethoxide"?'),
    ({"additives": ["H2SO5"]}, "unknown additive 'H2SO5'", ""),
    ({"additives": "H2SO4"}, "additives is no list", 'write ["H2SO4"]'),
    ({"additives": [5]}, "additives is no list", 'write ["H2SO4"]'),
    ({"temperature_C": -273.15}, "not above absolute zero", "temperature"),
    ({"temperature_C": 3000}, "beyond any flask", "kelvin"),
    ({"temperature_C": "25"}, "temperature_C '25' is no number", "plain number"),
    ({"temperature_C": True}, "is no number", "plain number"),
    ({"temperature_C": float("nan")}, "beyond any number", "plain number"),
    ({"temperature_C": 10**400}, "beyond any number", "plain number"),
    ({"temperature_C": None}, "no temperature_C", "every line needs"),
    ({"concentration": -1}, "concentration -1 is not positive", "leave concentration out"),
    ({"concentration": 0}, "concentration 0 is not positive", "leave concentration out"),
    ({"concentration": 5000}, "concentration 5000 is out of range", "to 100"),
    ({"equivalents": -2}, "equivalents -2 is not positive", "leave equivalents out"),
    ({"time_h": 0}, "time 0 is not positive", "leave time out"),
]


@pytest.mark.parametrize(("changed", "what", "mend"), REFUSED_LINES, ids=lambda value: str(value)[:40])
def test_a_line_is_refused_in_words(changed: dict[str, Any], what: str, mend: str) -> None:
    with pytest.raises(AskingError) as refusal:
        question_from_line({**LINE, **changed})
    assert what in refusal.value.what
    assert mend in refusal.value.mend
    assert len(str(refusal.value)) < 250


REFUSED_WORDS = [
    ({"temperature": "25"}, "no unit", '"25 °C"'),
    ({"temperature": "0 K"}, "not above absolute zero", ""),
    ({"temperature": "0 °C to 25 °C"}, "more than one temperature", "each by itself"),
    ({"temperature": "rt"}, '"rt"', "°C"),
    ({"concentration": "0.5"}, "no unit", "mol/L"),
    ({"concentration": "0.5 g"}, "concentration is wanted", "mol/L"),
    ({"concentration": "-1 M"}, "not positive", ""),
    ({"time": "overnight"}, "overnight", "16 h"),
    ({"solvent": ["ethanol:0.8", "water"]}, "some solvents have a fraction", "none"),
    ({"solvent": ["ethanol:0", "water:1"]}, "solvent fraction 0", "leave that solvent out"),
]


@pytest.mark.parametrize(("changed", "what", "mend"), REFUSED_WORDS, ids=lambda value: str(value)[:40])
def test_words_are_refused_with_their_mend(changed: dict[str, Any], what: str, mend: str) -> None:
    with pytest.raises(AskingError) as refusal:
        question_from_words(**{**WORDS, **changed})
    assert what in refusal.value.what
    assert mend in refusal.value.mend


def test_what_nobody_states_is_assumed_and_said() -> None:
    bare = question_from_words(**WORDS)
    assert bare.assumed == {"concentration", "equivalents", "time"}
    # design of the command line: 0.5 mol/L, 1.5 equivalents, 24 h
    assert (bare.question.concentration_m, bare.question.charged_equivalents) == (0.5, 1.5)
    assert bare.question.time_s == 24 * 3600
    stated = question_from_words(**WORDS, concentration="200 mM", equivalents=3.0, time="90 min")
    assert not stated.assumed
    assert stated.question.concentration_m == pytest.approx(0.2)
    assert (stated.question.equivalents, stated.question.time_s) == (3.0, 5400.0)


TEMPERATURES = [("25 °C", 298.15), ("25 C", 298.15), ("298 K", 298.0), ("−78 °C", 195.15), ("25℃", 298.15)]


@pytest.mark.parametrize(("typed", "kelvin"), TEMPERATURES)
def test_every_spelling_of_a_temperature_is_read(typed: str, kelvin: float) -> None:
    question = question_from_words(**{**WORDS, "temperature": typed}).question
    assert question.temperature_k == pytest.approx(kelvin)


SOLVENTS = [
    (["DMF"], [("DMF", 1.0)]),
    (["ethanol:0.8", "water:0.2"], [("ethanol", 0.8), ("water", 0.2)]),
    (["ethanol:80%", "water:20 %"], [("ethanol", 0.8), ("water", 0.2)]),
    (["ethanol", "water"], [("ethanol", 0.5), ("water", 0.5)]),
    (["CN(C)C=O"], [("DMF", 1.0)]),
    (["neat"], []),
]


@pytest.mark.parametrize(("typed", "parts"), SOLVENTS, ids=lambda value: "+".join(map(str, value)))
def test_solvents_are_read_with_their_fractions(typed: list[str], parts: list[tuple[str, float]]) -> None:
    question = question_from_words(**{**WORDS, "solvent": typed}).question
    assert [(solvent.name, fraction) for solvent, fraction in question.solvent] == parts


def test_fractions_that_do_not_add_up_are_scaled_and_said() -> None:
    read = question_from_words(**{**WORDS, "solvent": ["ethanol:0.8"]})
    assert taken(read, "solvent") == ["ethanol; fractions add up to 0.8 and are scaled to 1"]


NUCLEOPHILES = [
    ("sodium azide", "[N-]=[N+]=[N-]", "azide with [Na+]"),
    ("NaN3", "[N-]=[N+]=[N-]", "azide with [Na+]"),
    ("[N-]=[N+]=[N-]", "[N-]=[N+]=[N-]", "SMILES [N-]=[N+]=[N-]"),  # a salt without its counter-ion
    ("CCCCNC", "CCCCNC", "SMILES CCCCNC"),
    ("water", "O", "water"),
]


@pytest.mark.parametrize(("typed", "smiles", "as_what"), NUCLEOPHILES)
def test_a_nucleophile_is_a_name_first_and_then_smiles(typed: str, smiles: str, as_what: str) -> None:
    read = question_from_words(**{**WORDS, "nucleophile": typed})
    assert read.question.nucleophile is not None
    assert read.question.nucleophile.structure.smiles == smiles
    assert taken(read, "nucleophile") == [as_what]


@pytest.mark.parametrize(
    ("typed", "as_what"),
    [(INTERNAL, "a group of the substrate"), ("none", "a group of the substrate"), ("solvent", "the solvent")],
)
def test_words_that_name_no_reagent(typed: str, as_what: str) -> None:
    read = question_from_line({**LINE, "nucleophile": typed})
    assert read.question.nucleophile is None
    assert taken(read, "nucleophile") == [as_what]


def test_a_structure_beside_a_name_decides() -> None:
    read = question_from_line({**LINE, "nucleophile": "the usual thiolate", "nucleophile_smiles": "CC[S-]"})
    assert read.question.nucleophile is not None
    assert read.question.nucleophile.structure.smiles == "CC[S-]"


MAKES_THE_FLASK = [
    # as typed, what attacks, what it does to the flask
    ({"nucleophile": "HBr (48% aq)"}, "[Br-]", Role.BRONSTED_ACID),
    ({"nucleophile": None, "nucleophile_smiles": "Br"}, "[Br-]", Role.BRONSTED_ACID),
    ({"nucleophile": "conc. H2SO4"}, None, Role.BRONSTED_ACID),
    ({"nucleophile": "SOCl2"}, "[Cl-]", Role.ACTIVATOR),
    ({"nucleophile": "BBr3"}, "[Br-]", Role.LEWIS_ACID),
    ({"nucleophile": "benzoic acid"}, "O=C(O)c1ccccc1", None),
    ({"nucleophile": "acetic acid"}, "CC(=O)O", None),
    ({"nucleophile": "triphenylphosphine"}, "c1ccc(P(c2ccccc2)c2ccccc2)cc1", None),
]


@pytest.mark.parametrize(("changed", "attacks", "role"), MAKES_THE_FLASK, ids=lambda value: str(value)[:45])
def test_an_acid_named_as_nucleophile_makes_the_flask_acid(
    changed: dict[str, Any], attacks: str | None, role: Role | None
) -> None:
    question = question_from_line({**LINE, **changed}).question
    assert (question.nucleophile and question.nucleophile.structure.smiles) == attacks
    assert [dose.reagent.role for dose in question.additives] == ([] if role is None else [role])


def test_additives_are_read_by_name_strength_and_structure() -> None:
    read = question_from_line({**LINE, "additives": ["HBr (48% aq)", "OS(=O)(=O)O", "CCCCCC"]})
    first, second = read.question.additives
    assert (first.reagent.role, first.mass_percent, first.is_aqueous) == (Role.BRONSTED_ACID, 48.0, True)
    assert second.reagent.role is Role.BRONSTED_ACID
    assert taken(read, "additive")[2].endswith(WITHOUT_EFFECT)


WISHES = [
    ("E2", None, Mechanism.E2, 0.9),
    ("sn2':0.5", None, Mechanism.SN2_PRIME, 0.5),
    ("C=CCC:95%", "C=CCC", None, 0.95),
    ("C=CCC", "C=CCC", None, 0.9),
]


@pytest.mark.parametrize(("typed", "product", "mechanism", "share"), WISHES)
def test_a_wish_is_a_product_or_a_mechanism(
    typed: str, product: str | None, mechanism: Mechanism | None, share: float
) -> None:
    wish = read_wish(typed)
    assert (wish.product.smiles if wish.product else None, wish.mechanism) == (product, mechanism)
    assert wish.share == pytest.approx(share)


@pytest.mark.parametrize("typed", ["E3", "none", "E2:0", "E2:1.5", ""])
def test_a_wish_nobody_can_have_is_refused(typed: str) -> None:
    with pytest.raises(AskingError):
        read_wish(typed)
