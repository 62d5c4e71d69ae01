"""A compound is read by name first, then as SMILES; what is neither is refused with the nearest name or the place."""

import pytest

from builder.mechanism.asking import AskingError
from builder.mechanism.compounds import identify

READ = [
    # typed, name, SMILES
    ("2-bromobutane", "2-bromobutane", "CCC(C)Br"),
    ("  benzyl   bromide ", "benzyl bromide", "BrCc1ccccc1"),
    ("NaN3", "NaN3", "[N-]=[N+]=[N-].[Na+]"),
    ("K2CO3", "K2CO3", "O=C([O-])[O-].[K+].[K+]"),
    ("HBr (48% aq)", "HBr (48% aq)", "Br"),
    ("BrCCc1ccccc1", "phenethyl bromide", "BrCCc1ccccc1"),
    ("BrCCCC1CCCC1", "", "BrCCCC1CCCC1"),
    ("PEG-400", "PEG-400", ""),
]


@pytest.mark.parametrize(("typed", "name", "smiles"), READ, ids=[typed for typed, _, _ in READ])
def test_names_go_before_smiles(typed: str, name: str, smiles: str) -> None:
    found = identify(typed, "nucleophile")
    assert (found.name, found.smiles) == (name, smiles)
    assert (found.structure is None) == (not smiles)


UNKNOWN = "the tables do not know this name: give its SMILES"
REFUSED = [
    # typed, what is said
    ("sodium azid", 'unknown nucleophile "sodium azid"; did you mean "sodium azide"?'),
    ("benzyl bromid", 'unknown nucleophile "benzyl bromid"; did you mean "benzyl bromide"?'),
    ("DFM", 'unknown nucleophile "DFM"; did you mean "DMF"?'),
    ("my favourite thiol", 'unknown nucleophile "my favourite thiol"; the tables do not know this name: give its'),
    # other compounds, not other spellings: 1-bromooctane, 2-bromobutane, K10, butan-1-ol, butyl bromide are known
    ("2-bromooctane", f'unknown nucleophile "2-bromooctane"; {UNKNOWN}'),
    ("2-bromooctan", f'unknown nucleophile "2-bromooctan"; {UNKNOWN}'),
    ("3-bromobutan", f'unknown nucleophile "3-bromobutan"; {UNKNOWN}'),
    ("(S)-2-bromooctane", f'unknown nucleophile "(S)-2-bromooctane"; {UNKNOWN}'),
    ("(2S,3R)-2-bromobutan-3-ol", f'unknown nucleophile "(2S,3R)-2-bromobutan-3-ol"; {UNKNOWN}'),
    ("(R)-butan-2-ol", f'unknown nucleophile "(R)-butan-2-ol"; {UNKNOWN}'),
    ("t-butyl bromid", f'unknown nucleophile "t-butyl bromid"; {UNKNOWN}'),
    ("10", f'unknown nucleophile "10"; {UNKNOWN}'),
    # other spellings
    ("1,4-dioxan", 'unknown nucleophile "1,4-dioxan"; did you mean "1,4-dioxane"?'),
    ("2-brombutane", 'unknown nucleophile "2-brombutane"; did you mean "2-bromobutane"?'),
    ("tert-butyl bromid", 'unknown nucleophile "tert-butyl bromid"; did you mean "tert-butyl bromide"?'),
    ("K2C03", 'unknown nucleophile "K2C03"; did you mean "K2CO3"?'),
    # no names
    ("c1ccncc", 'nucleophile "c1ccncc": unclosed ring 1 (character 2)'),
    ("CCC(C", 'nucleophile "CCC(C": branch that is not closed (character 4)'),
    ("C1CC", 'nucleophile "C1CC": unclosed ring 1 (character 2); write 1 at its second atom too'),
    ("CCX", "nucleophile \"CCX\": character 'X' is no SMILES (character 3); write a definite atom or bond"),
    ("", 'nucleophile "": no structure'),
]


@pytest.mark.parametrize(("typed", "said"), REFUSED, ids=[typed or "nothing" for typed, _ in REFUSED])
def test_what_is_neither_is_refused_with_its_mend(typed: str, said: str) -> None:
    with pytest.raises(AskingError) as refusal:
        identify(typed, "nucleophile")
    assert str(refusal.value).startswith(said)
