"""What a record says, seen as sites in play: groups that are formed in the flask."""

import pytest

from builder.mechanism.reaction import in_play
from builder.mechanism.rules import closing_gates
from builder.records.specimen import with_example
from builder.records.vocabulary import Mechanism
from tests.specimens import examine_text

# substrate, the group declared, what is in the flask, the mechanism that is open then (March's Advanced Organic
# Chemistry, 7th ed., ch. 10 and 18, from memory)
FORMED = [
    ("OCc1ccccc1", "trichloroacetimidate", "trichloroacetonitrile", "ClC(Cl)(Cl)C#N", "SN1"),
    ("NCC1(O)CCCCC1", "diazonium", "acetic acid", "CC(=O)O", "SN1"),
    ("CCC(C)O", "mesylate", "methanesulfonyl chloride", "CS(=O)(=O)Cl", "SN2"),
    ("CCCCO", "water", "sulfuric acid", "OS(=O)(=O)O", "SN2"),
]


@pytest.mark.parametrize(("smiles", "group", "name", "reagent", "mechanism"), FORMED, ids=[row[1] for row in FORMED])
def test_a_group_formed_in_the_flask_leaves(smiles: str, group: str, name: str, reagent: str, mechanism: str) -> None:
    use = "acid" if "acid" in name else "activator"
    example = (
        f"substrate: {{name: substrate, smiles: '{smiles}', class: primary, leaving_group: {group},"
        " amount: 10 mmol}\n"
        f"nucleophile: {{name: {name} itself, smiles: '{reagent}', equivalents: 1.1}}\n"
        f"reagents: [{{name: {name}, smiles: '{reagent}', use: {use}, equivalents: 1.1}}]\n"
    )
    case = examine_text(with_example(example)).kept
    assert case is not None
    sites = in_play(case.record, case.structures)
    assert [each.formed_group for each in sites] == [group]
    assert closing_gates(Mechanism(mechanism), sites[0].situation) == ()
