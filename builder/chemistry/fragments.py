"""Fragment: a substructure that can be asked for, so that rooms above chemistry need no RDKit."""

from dataclasses import dataclass

from rdkit import Chem

from builder.chemistry.query import Query
from builder.chemistry.structure import Structure

__all__ = ["MAX_MATCHES", "Fragment"]

MAX_MATCHES = 1_000
"""Matches counted at most. With at most 200 atoms in a structure and 40 in a fragment this bounds the time."""
_MAX_QUERY_ATOMS = 40


@dataclass(frozen=True, slots=True)
class Fragment:
    """A connected substructure, equal by its SMARTS."""

    query: Query

    @classmethod
    def from_smarts(cls, text: str) -> "Fragment":
        """Return the fragment a SMARTS describes.

        Raises ValueError for text that is no SMARTS, is in several pieces, or has more than 40 atoms.
        """
        query = Query.from_smarts(text)
        if len(Chem.GetMolFrags(query.mol)) > 1:
            raise ValueError(f"{text!r} is in several pieces; ask for each by itself")
        if query.mol.GetNumAtoms() > _MAX_QUERY_ATOMS:
            raise ValueError(f"{text!r} has more than {_MAX_QUERY_ATOMS} atoms")
        query.mol.UpdatePropertyCache(strict=False)
        return cls(query)

    def is_in(self, structure: Structure) -> bool:
        """Answer whether the structure holds the fragment."""
        return self.query.is_in(structure)

    def count_in(self, structure: Structure) -> int:
        """Return how many different sets of atoms of the structure match, at most `MAX_MATCHES`."""
        return len(structure.mol.GetSubstructMatches(self.query.mol, uniquify=True, maxMatches=MAX_MATCHES))
