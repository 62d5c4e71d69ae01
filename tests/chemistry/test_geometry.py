"""Faces of rings, positions on benzene rings, and likeness."""

import pytest
from rdkit import Chem
from rdkit.Chem import rdDistGeom
from rdkit.Geometry import Point3D

from builder.chemistry.geometry import ArylPosition, Relation, aryl_substituent_names, aryl_substituents, perceive_rings
from builder.chemistry.likeness import similarity
from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import parse_smiles


@pytest.mark.parametrize(
    ("smiles", "relation"),
    [
        ("Cl[C@H]1CCCC[C@@H]1C", Relation.TRANS),
        ("Cl[C@H]1CCCC[C@H]1C", Relation.CIS),
        ("C[C@H]1CC[C@@H](Cl)CC1", Relation.CIS),
        ("C[C@H]1CC[C@H](Cl)CC1", Relation.TRANS),
        ("C[C@@H]1C[C@H]1Cl", Relation.TRANS),
        ("CC1CCCCC1Cl", None),
    ],
)
def test_chlorine_and_methyl_are_cis_or_trans_as_in_space(smiles: str, relation: Relation | None) -> None:
    structure = parse_smiles(smiles)
    (ring,) = perceive_rings(structure)
    pairs = [(at, n) for at in ring.atoms for n, _ in structure.atoms[at].neighbours if n not in ring.atoms]
    found = ring.relation(*pairs)
    assert found == relation
    if relation is None:
        return
    # Outside check: in an embedded ring, the side of the mean plane each substituent leans to.
    mol = Chem.AddHs(structure.mol)
    assert rdDistGeom.EmbedMolecule(mol, randomSeed=5) == 0
    place = mol.GetConformer().GetAtomPosition
    normal = _ring_normal([place(at) for at in ring.atoms])
    sides = []
    for at, substituent in pairs:
        (hydrogen,) = [n.GetIdx() for n in mol.GetAtomWithIdx(at).GetNeighbors() if n.GetAtomicNum() == 1]
        sides.append((place(substituent) - place(hydrogen)).DotProduct(normal) > 0)
    assert (sides[0] == sides[1]) is (relation is Relation.CIS)


def _ring_normal(points: list[Point3D]) -> Point3D:
    centre = sum(points[1:], points[0]) / len(points)
    parts = [(points[k - 1] - centre).CrossProduct(points[k] - centre) for k in range(len(points))]
    return sum(parts[1:], parts[0])


def test_hydrogen_has_a_face_too() -> None:
    structure = parse_smiles("Cl[C@H]1CCCC[C@@H]1C")
    (ring,) = perceive_rings(structure)
    for at in ring.atoms:
        sides = {other: side for atom, other, side in ring.faces if atom == at}
        if sides:
            assert sorted(sides.values()) == [-1, 1]
            assert None in sides


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("ClCc1ccccc1", []),
        ("ClCc1ccc(OC)cc1", [("para", "OMe")]),
        ("ClCc1cccc([N+](=O)[O-])c1", [("meta", "NO2")]),
        ("ClCc1ccccc1C", [("ortho", "Me")]),
        ("ClCc1cc(C)c(C(F)(F)F)cc1Br", [("ortho", "Br"), ("meta", "Me"), ("para", "CF3")]),
        ("ClCc1ccc(N(C)C)cc1", [("para", "NMe2")]),
        ("ClCc1ccc(C(C)(C)C)cc1", [("para", "tBu")]),
        ("ClCc1ccc(-c2ccccc2)cc1", [("para", "Ph")]),
        ("ClCc1ccc(C(=O)OCC)cc1", [("para", "CO2Et")]),
        ("ClCc1ccc(OC(C)C)cc1", [("para", "OR")]),
        ("ClCc1ccc2ccccc2c1", [("meta", None), ("para", None)]),
        ("ClCc1ccncc1", []),
    ],
)
def test_substituents_are_named_by_position(smiles: str, expected: list[tuple[str, str | None]]) -> None:
    structure = parse_smiles(smiles)
    site = next(s for s in perceive_sites(structure) if s.leaving_group == "chloride")
    ipso = site.beta[0].atom
    found = aryl_substituents(structure, ipso)
    assert [(s.position, s.name) for s in found] == [(ArylPosition(p), n) for p, n in expected]
    assert {s.name for s in found} <= {*aryl_substituent_names(), None}


def test_likeness_runs_from_nothing_to_everything() -> None:
    mesylate = parse_smiles("CCCCCC[C@H](C)OS(C)(=O)=O")
    assert similarity(mesylate, mesylate.mirror_image) == 1.0
    assert similarity(mesylate, parse_smiles("[Na+].[Cl-]")) == 0.0
    near, far = parse_smiles("CCCCC[C@H](C)OS(C)(=O)=O"), parse_smiles("Clc1ccccc1")
    assert similarity(mesylate, near) > similarity(mesylate, far)
