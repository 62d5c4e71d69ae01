"""Fragment: a substructure that can be asked for, so that rooms above chemistry need no RDKit."""

from dataclasses import dataclass, field

from rdkit import Chem

from builder.chemistry.structure import Structure

__all__ = ["MAX_MATCHES", "Fragment"]

MAX_MATCHES = 1_000
"""Matches counted at most. With at most 200 atoms in a structure and 40 in a fragment this bounds the time."""
_MAX_QUERY_ATOMS = 40


@dataclass(frozen=True, slots=True)
class Fragment:
    """A connected substructure, equal by its SMARTS."""

    smarts: str
    query: Chem.Mol = field(repr=False, compare=False)

    @classmethod
    def from_smarts(cls, text: str) -> "Fragment":
        """Return the fragment a SMARTS describes.

        Raises ValueError for text that is no SMARTS, is in several pieces, or has more than 40 atoms.
        """
        query = Chem.MolFromSmarts(text) if text.strip() else None
        if query is None:
            raise ValueError(f"{text!r} is no SMARTS")
        if len(Chem.GetMolFrags(query)) > 1:
            raise ValueError(f"{text!r} is in several pieces; ask for each by itself")
        if query.GetNumAtoms() > _MAX_QUERY_ATOMS:
            raise ValueError(f"{text!r} has more than {_MAX_QUERY_ATOMS} atoms")
        query.UpdatePropertyCache(strict=False)
        return cls(text, query)

    def is_in(self, structure: Structure) -> bool:
        """Answer whether the structure holds the fragment."""
        return bool(structure.mol.HasSubstructMatch(self.query))

    def count_in(self, structure: Structure) -> int:
        """Return how many different sets of atoms of the structure match, at most `MAX_MATCHES`."""
        return len(structure.mol.GetSubstructMatches(self.query, uniquify=True, maxMatches=MAX_MATCHES))
