"""Roles of species in the flask; the pKaH values are from memory (Bordwell's DMSO scale, and water for alkoxides)."""

import pytest

from builder.chemistry.structure import parse_smiles
from builder.mechanism.flask_roles import FlaskRole, roles_in

ROLES = [
    ("[Na+].[H-]", "strong base"),  # pKaH 35
    ("[Li+].CC(C)[N-]C(C)C", "strong base"),  # 36
    ("[Na+].C[Si](C)(C)[N-][Si](C)(C)C", "strong base"),  # 26
    ("[Li]CCCC", "strong base"),  # 50
    ("C[Mg]Br", "strong base"),  # 48
    ("[K+].CC(C)(C)[O-]", "strong base"),  # 19 in water
    ("[Na+].C[S](=O)[CH2-]", "strong base"),  # 35
    ("[Na+].CC[O-]", ""),  # 16 in water
    ("[K+].[K+].[O-]C([O-])=O", ""),  # 10
    ("[Na+].[C-]#N", ""),
    ("[Na+].O=C1[N-]C(=O)c2ccccc21", ""),  # phthalimide, 8
    ("[Na+].[N-]=[N+]=[N-]", ""),
    ("[Na+].[BH4-]", ""),
    ("[Na+].[OH-]", "water"),
    ("O", "water"),
    ("[Zn]", "two-electron donor"),
    ("CC(C)(C)OOC(C)(C)C", "radical initiator"),
    ("CC(C)(C#N)N=NC(C)(C)C#N", "radical initiator"),
    ("CC(C)=O", ""),
    ("C1CCOC1", ""),
]


@pytest.mark.parametrize(("smiles", "word"), ROLES, ids=[row[0] for row in ROLES])
def test_roles(smiles: str, word: str) -> None:
    expected = {FlaskRole(word)} if word else set()
    assert roles_in([parse_smiles(smiles)]) - {FlaskRole.HEAT_OF_ADDITION} == expected


@pytest.mark.parametrize(
    ("smiles", "is_hot"),
    [
        ("[Na+].[H-]", True),
        ("[Li+].CC(C)[N-]C(C)C", True),
        ("[Li]CCCC", True),
        ("CS(=O)(=O)Cl", True),
        ("O=S(Cl)Cl", True),
        ("CC(=O)Cl", True),
        ("BrP(Br)Br", True),
        ("OS(=O)(=O)O", True),
        ("COS(=O)(=O)OC", True),
        ("COS(C)(=O)=O", False),
        ("CC(=O)OC(C)=O", False),
        ("[Na+].CC[O-]", False),
        ("[Na+].[N-]=[N+]=[N-]", False),
        ("CCBr", False),
    ],
)
def test_heat_of_addition(smiles: str, *, is_hot: bool) -> None:
    assert (FlaskRole.HEAT_OF_ADDITION in roles_in([parse_smiles(smiles)])) == is_hot
