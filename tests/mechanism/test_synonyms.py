"""Every name of a structure, from all tables together."""

import pytest

from builder.chemistry.structure import parse_smiles
from builder.mechanism.nucleophiles import salt_names
from builder.mechanism.synonyms import _read_synonyms, cas_of, names_of, structure_named

HEADER = "names\tsmiles\tsource\n"


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("[Na+].[N-]=[N+]=[N-]", {"sodium azide", "NaN3", "azide", "N3-"}),
        ("[K+].CC(C)(C)[O-]", {"potassium tert-butoxide", "KOtBu", "tBuOK"}),
        ("[K+].[K+].[O-]C([O-])=O", {"potassium carbonate", "K2CO3"}),
        ("[Ba+2].[OH-].[OH-]", {"Ba(OH)2"}),
        ("[Li+].CC(C)[N-]C(C)C", {"LDA", "lithium diisopropylamide"}),
        ("CN(C)C=O", {"DMF", "N,N-dimethylformamide"}),
        ("CC(C)OC(=O)/N=N/C(=O)OC(C)C", {"DIAD"}),  # the table draws no double-bond configuration
        ("c1ccc([C@H]2CO2)cc1", {"styrene oxide", "2-phenyloxirane"}),  # nor one at this carbon
    ],
)
def test_a_structure_has_the_names_of_every_table(smiles: str, expected: set[str]) -> None:
    assert expected <= set(names_of(parse_smiles(smiles)))


def test_a_structure_of_no_table_has_no_names() -> None:
    assert names_of(parse_smiles("CCCCCC[C@H](C)OS(C)(=O)=O")) == ()


@pytest.mark.parametrize("smiles", ["CO", "[Na+]", "[Na+].[K+].[O-]C([O-])=O", "[Na+].c1ccccc1C(=O)CC([O-])=O"])
def test_what_is_no_salt_of_two_known_ions_gets_no_salt_name(smiles: str) -> None:
    assert salt_names(parse_smiles(smiles).smiles) == ()


def test_a_salt_of_one_cation_is_not_called_after_two() -> None:
    assert not any(name.startswith(("di", "mono")) for name in salt_names(parse_smiles("[Na+].[N-]=[N+]=[N-]").smiles))


@pytest.mark.parametrize(
    ("name", "smiles"),
    [
        ("THF", "C1CCOC1"),
        ("conc. H2SO4", "O=S(=O)(O)O"),
        ("potassium azide", "[K+].[N-]=[N+]=[N-]"),
        ("azide", "[N-]=[N+]=[N-]"),
        ("Nafion", None),
        ("somethingol", None),
    ],
)
def test_names_give_structures(name: str, smiles: str | None) -> None:
    found = structure_named(name)
    assert (found.smiles if found else None) == (parse_smiles(smiles).smiles if smiles else None)


def test_a_solvent_has_its_cas_number() -> None:
    # supplier data: N,N-dimethylformamide 68-12-2
    assert cas_of(parse_smiles("CN(C)C=O")) == "68-12-2"
    assert cas_of(parse_smiles("CCC(C)Br")) == ""


@pytest.mark.parametrize(
    ("rows", "complaint"),
    [
        ("benzyl bromide\tc1ccccc1CBr\tcommon-practice\n", "not canonical"),
        ("a\tBrCc1ccccc1\tcommon-practice\nb\tBrCc1ccccc1\tcommon-practice\n", "given twice"),
        ("a\tBrCc1ccccc1\tnobody\n", "unknown source"),
    ],
)
def test_the_table_is_held_to_its_form(rows: str, complaint: str) -> None:
    with pytest.raises(ValueError, match=complaint):
        _read_synonyms(HEADER + rows)
