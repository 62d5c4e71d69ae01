"""Rewrites keep every atom, and the charge but for what a two-electron donor pays."""

from collections import Counter

import pytest

from builder.chemistry.rewrites import Rewrite, load_rewrites, rewritten
from builder.chemistry.structure import Structure, parse_smiles

# intermediate, row, what comes of it (March's Advanced Organic Chemistry, 7th ed., ch. 16 and 17, from memory)
REWRITES = [
    ("CC(Br)C(C)Br", "dehalogenation", "CC=CC.[Br-].[Br-]"),
    ("CN1CC[CH+]CC1", "Grob fragmentation", "C=CCC[N+](=C)C"),
    ("CC(O)C[CH+]C", "Grob fragmentation", "C=CC.CC=[OH+]"),
    ("CC(C)(C)[N+]#CC", "nitrilium hydration", "CC(=O)NC(C)(C)C"),
    ("C=CCC1CCCCC1=[N+]1CCCC1", "iminium hydrolysis", "C=CCC1CCCCC1=O.C1CCNC1"),
    ("CCCCOC=[N+](C)C", "imidate hydrolysis", "CCCCOC=O.CNC"),
    ("CCCCSC(N)=[NH2+]", "isothiouronium hydrolysis", "CCCCS.NC(N)=O"),
    ("OC(Cl)c1ccccc1", "collapse of a halohydrin", "O=Cc1ccccc1.[Cl-]"),
    ("O=C(CO[S+](C)C)c1ccccc1", "Kornblum oxidation", "O=CC(=O)c1ccccc1.CSC"),
    ("CC(C)=[N+]([O-])OCc1ccccc1", "Hass-Bender oxidation", "O=Cc1ccccc1.CC(C)=NO"),
    ("CCOC(=O)C(CC)C(=O)O", "decarboxylation", "CCCC(=O)OCC.O=C=O"),
    ("CCOC(=O)C(CC)C(=O)[O-]", "decarboxylation", "CCCC(=O)OCC.O=C=O"),
]


def _atoms(structures: list[Structure]) -> Counter[str]:
    atoms = [atom for structure in structures for atom in structure.atoms]
    return Counter(atom.symbol for atom in atoms if atom.symbol != "H")


@pytest.mark.parametrize(("start", "name", "outcome"), REWRITES, ids=[f"{row[1]}-{row[0]}" for row in REWRITES])
def test_a_rewrite_gives_the_textbook_product_and_loses_no_atom(start: str, name: str, outcome: str) -> None:
    rows: list[Rewrite] = [row for row in load_rewrites() if row.name == name]
    before = parse_smiles(start)
    made = [(row, product) for row in rows for product in rewritten(before, row)]
    assert [product for _, product in made] == [parse_smiles(outcome)]
    ((row, after),) = made
    taken = [row.adds] if row.adds else []
    assert _atoms([before, *taken]) == _atoms([after])
    paid = 2 if row.role == "two-electron donor" else 0
    protons_released = before.charge - paid - after.charge
    assert protons_released in {-1, 0, 1}


def test_every_row_is_tried_here() -> None:
    assert {row.name for row in load_rewrites()} == {row[1] for row in REWRITES}
