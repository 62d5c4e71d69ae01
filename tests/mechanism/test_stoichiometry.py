"""Molecules of substrate and reagent in a product, by hand from the equations."""

import pytest

from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import parse_smiles
from builder.mechanism.stoichiometry import Supply, proton_capacity, staying_elements, supply_of


@pytest.mark.parametrize(
    ("substrate", "product", "reagent", "supply"),
    [
        ("CCC(C)Br", "CCC(C)N=[N+]=[N-]", "[Na+].[N-]=[N+]=[N-]", Supply(1, 1.0)),
        ("CCC(C)OS(C)(=O)=O", "CCC(C)OC(C)=O", "[Na+].CC([O-])=O", Supply(1, 1.0)),
        ("CCCCBr", "CCCCSCCCC", "[Na+].[Na+].[S-2]", Supply(2, 1.0)),  # 2 RBr + Na2S
        ("CCCCBr", "CCCCN(CCCC)CCCC", "N", Supply(3, 1.0)),
        ("CCCCO", "CCCCBr", "BrP(Br)Br", Supply(1, 3.0)),  # 3 ROH + PBr3
        ("CCBr", "CCC(C(=O)OCC)C(=O)OCC", "CCOC(=O)CC(=O)OCC", Supply(1, 1.0)),
        ("CCBr", "CCC(CC)(C(=O)OCC)C(=O)OCC", "CCOC(=O)CC(=O)OCC", Supply(2, 1.0)),
        ("C1CO1", "OCCNCCO", "N", Supply(2, 1.0)),
        ("CCC(C)Br", "CCC(C)N=[N+]=[N-]", "[K+].[K+].[O-]C([O-])=O", None),
        ("CCC(C)Br", "CC=CC", "[K+].CC[O-]", None),
    ],
)
def test_supply(substrate: str, product: str, reagent: str, supply: Supply | None) -> None:
    on = parse_smiles(substrate)
    site = next(s for s in perceive_sites(on) if s.leaving_atom is not None)
    found = supply_of(parse_smiles(product), staying_elements(on, site), parse_smiles(reagent))
    assert (found and Supply(found.substrates, found.per_molecule)) == supply


@pytest.mark.parametrize(
    ("smiles", "protons"),
    [
        ("[K+].[K+].[O-]C([O-])=O", 2),
        ("[Na+].OC([O-])=O", 1),
        ("[Na+].[OH-]", 1),
        ("[K+].CC(C)(C)[O-]", 1),
        ("CCN(CC)CC", 1),
        ("C1CCC2=NCCCN2CC1", 1),  # DBU: the amidine takes one
        ("[Na+].[H-]", 1),
        ("[Li]CCCC", 1),
        ("[Na+].[Br-]", 0),
        ("[Na+].[N-]=[N+]=[N-]", 0),
        ("CN(C)C=O", 0),
        ("CCBr", 0),
    ],
)
def test_protons_that_a_base_takes(smiles: str, protons: int) -> None:
    assert proton_capacity(parse_smiles(smiles)) == protons
