"""Structures in space, by RDKit's distance geometry: which way round a carbon is, without reading any stereo mark."""

from rdkit import Chem
from rdkit.Chem import rdDistGeom

from builder.chemistry.structure import Structure

__all__ = ["all_neighbours", "embedded", "signed_volume"]


def embedded(structure: Structure) -> Chem.Mol:
    """Return the molecule with its hydrogens and one conformer; atom numbers are those of the structure."""
    mol = Chem.AddHs(structure.mol)
    assert rdDistGeom.EmbedMolecule(mol, randomSeed=11) == 0
    return mol


def signed_volume(mol: Chem.Mol, around: tuple[int, int, int, int]) -> float:
    """Return the volume spanned by four neighbours of a carbon; its sign is the handedness of their order."""
    points = [mol.GetConformer().GetAtomPosition(at) for at in around]
    a, b, c = (p - points[3] for p in points[:3])
    return float(a.DotProduct(b.CrossProduct(c)))


def all_neighbours(mol: Chem.Mol, at: int) -> list[int]:
    """Return the neighbours of an atom, hydrogens too."""
    return [n.GetIdx() for n in mol.GetAtomWithIdx(at).GetNeighbors()]
