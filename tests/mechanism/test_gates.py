"""Gates beyond their own examples: what activation lifts, and cases a chemist would argue about."""

import pytest

from builder.chemistry.perception import leaving_groups, perceive_sites, sites_of
from builder.chemistry.structure import parse_smiles
from builder.mechanism.rules import Situation, closing_gates
from builder.records.vocabulary import Mechanism

ALL = {Mechanism(word) for word in ("SN2", "SN2'", "SN1", "E2", "E1", "E1cB", "NGP", "AdE")}

# substrate, leaving group, an acid or activator in the flask, the mechanisms open at one site or another. Textbook
# judgement (March's Advanced Organic Chemistry, 7th ed., ch. 10 and 17, from memory), after a chemist's review.
OPEN = [
    ("CCCCBr", "bromide", False, "SN2 E2"),
    ("CCCCBr", "bromide", True, "SN2 SN1 E2 E1"),  # silver, or a Lewis acid on a halide
    ("CCCCO", "hydroxyl", False, ""),
    ("CCCCO", "hydroxyl", True, "SN2 E2"),  # a protonated primary alcohol reacts by SN2
    ("CC(C)(C)O", "hydroxyl", True, "SN1 E2 E1"),
    ("CCCC#N", "cyanide", True, ""),
    ("CCCC[N+](=O)[O-]", "nitro", True, ""),
    ("CCCCN", "amine", True, ""),
    ("CCCCS", "thiol", True, ""),
    ("CCSCC", "sulfide", True, ""),
    ("CCS(=O)(=O)CC", "sulfone", True, ""),
    ("CCCC[P+](C)(C)C", "phosphonium", True, ""),
    ("CCCC[N+](C)(C)C", "ammonium", False, "SN2 E2"),
    ("CC(C)(C)COS(C)(=O)=O", "mesylate", False, "SN2 SN1 E1"),  # E1 after a methyl shift
    ("CC(=O)COS(C)(=O)=O", "mesylate", False, "SN2 NGP"),  # C=O is no branch that shifts; NGP is Favorskii's
    ("FC(F)(F)COS(C)(=O)=O", "mesylate", False, "SN2"),
    ("C1COC1", "oxetane", False, "SN2 E2"),
    ("C1CO1", "epoxide", False, "SN2"),
    ("O=C1CCCO1", "carboxylate", False, "SN2 E2 NGP"),
    ("BrC1CC1", "bromide", False, "SN1 E2 E1"),
    ("ClC(Cl)Cl", "chloride", False, ""),
    ("ClC12CCC(CC1)C2", "chloride", False, ""),  # 1-norbornyl
    ("BrC12CC(C1)CC2", "bromide", False, ""),  # bicyclo[2.1.1]hexan-1-yl
    ("BrC12C3C4C1C1C2C3C41", "bromide", False, ""),  # cubyl
    ("CC1(C)C2CCC1(OS(=O)(=O)C(F)(F)F)C(=O)C2", "triflate", False, ""),  # camphor-1-yl
    ("BrC12c3ccccc3C(c3ccccc31)c1ccccc12", "bromide", False, ""),  # 1-triptycyl
    ("BrC12CC3CC(CC(C3)C1)C2", "bromide", False, "SN1"),  # 1-adamantyl
    ("ClC12CCCC(CC1)C2", "chloride", False, "SN1"),  # bicyclo[3.2.1]octan-1-yl
    ("BrC12CC3CC1CC(C2)C3", "bromide", False, "SN1"),  # noradamantyl
    ("ClC12CCCC(CCC1)CCC2", "chloride", False, "SN1 E2 E1"),  # manxyl: an eight-membered ring holds the alkene
    ("C=CCCl", "chloride", False, "SN2 SN2' SN1 AdE"),
    ("CC(O)CC(C)=O", "hydroxyl", False, "E1cB"),
    ("CC(Cl)CC(=O)OC", "chloride", False, "SN2 SN1 E2 E1 E1cB"),
    ("OCC[N+](=O)[O-]", "hydroxyl", False, "E1cB"),
    ("OCC1c2ccccc2-c2ccccc21", "hydroxyl", False, "E1cB"),  # 9-fluorenylmethyl
    ("CC(F)(F)C(F)F", "fluoride", False, "E2 E1cB"),  # several halogens beside the hydrogen
    ("OCCBr", "bromide", False, "SN2 E2 NGP"),
    ("CC(Br)C(=O)[O-]", "bromide", False, "SN2 SN1 E2 E1 NGP"),  # α-lactone
    ("CCOC(=O)CBr", "bromide", False, "SN2"),
    ("Clc1ccccc1CCO", "chloride", False, "E2 E1cB"),  # benzyne
]


@pytest.mark.parametrize(("smiles", "group", "activated", "words"), OPEN, ids=[f"{r[0]}-{r[2]}" for r in OPEN])
def test_mechanisms_open_at_a_site(smiles: str, group: str, activated: bool, words: str) -> None:
    structure = parse_smiles(smiles)
    situations = [Situation(structure, site, activated) for site in sites_of(structure, group)]
    assert situations
    found = {m for m in ALL if any(not closing_gates(m, each) for each in situations)}
    assert found == {Mechanism(word) for word in words.split()}


def test_an_amine_leaves_once_it_is_diazotised() -> None:
    amine = parse_smiles("NCC1(O)CCCCC1")
    (site,) = sites_of(amine, "amine")
    assert closing_gates(Mechanism.SN1, Situation(amine, site, is_activated=True))
    assert not closing_gates(Mechanism.SN1, Situation(amine, site, is_activated=True, formed_group="diazonium"))


def test_only_groups_that_leave_badly_or_bear_halogen_are_helped() -> None:
    helped = {group.name for group in leaving_groups().values() if group.activated_by}
    reluctant = {group.name for group in leaving_groups().values() if group.needs_activation}
    never = {"amine", "cyanide", "nitro", "phosphonium", "sulfide", "sulfone", "thiol"}
    assert reluctant - helped == never
    assert helped - reluctant == {"bromide", "chloride", "epoxide", "iodide"}


@pytest.mark.parametrize("smiles", ["C=CCO", "CC#CC(C)O", "c1ccccc1C=C"])
def test_nothing_closes_addition_to_a_multiple_bond(smiles: str) -> None:
    structure = parse_smiles(smiles)
    for site in perceive_sites(structure):
        assert not closing_gates(Mechanism.ADE, Situation(structure, site))
