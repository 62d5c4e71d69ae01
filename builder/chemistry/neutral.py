"""The uncharged form of a species, in which a salt and its free base or acid are one compound."""

from functools import lru_cache

from rdkit import Chem, rdBase
from rdkit.Chem.MolStandardize import rdMolStandardize

from builder.chemistry.structure import Structure, parse_smiles

__all__ = ["neutral_form"]


@lru_cache(maxsize=512)
def neutral_form(structure: Structure) -> Structure:
    """Return the structure without counter-ions, each acid and base in its uncharged form.

    A quaternary ammonium, an azide and a nitro group keep their charges: no proton can take them away.
    """
    bare = structure.without_counter_ions
    if not any(atom.charge for atom in bare.atoms):
        return bare
    with rdBase.BlockLogs():
        neutral = rdMolStandardize.Uncharger(canonicalOrder=True).uncharge(Chem.Mol(bare.mol))
    return parse_smiles(Chem.MolToSmiles(Chem.RemoveHs(neutral)))
