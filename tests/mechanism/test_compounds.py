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


REFUSED = [
    # typed, what is said
    ("sodium azid", 'unknown nucleophile "sodium azid"; did you mean "sodium azide"?'),
    ("benzyl bromid", 'unknown nucleophile "benzyl bromid"; did you mean "benzyl bromide"?'),
    ("DFM", 'unknown nucleophile "DFM"; did you mean "DMF"?'),
    ("my favourite thiol", 'unknown nucleophile "my favourite thiol"; give a name of the tables, or its SMILES'),
    ("C1CC", 'nucleophile "C1CC": unclosed ring 1 (character 2); write 1 at its second atom too'),
    ("CCX", "nucleophile \"CCX\": character 'X' is no SMILES (character 3); write a definite atom or bond"),
    ("", 'nucleophile "": no structure'),
]


@pytest.mark.parametrize(("typed", "said"), REFUSED, ids=[typed or "nothing" for typed, _ in REFUSED])
def test_what_is_neither_is_refused_with_its_mend(typed: str, said: str) -> None:
    with pytest.raises(AskingError) as refusal:
        identify(typed, "nucleophile")
    assert str(refusal.value).startswith(said)
