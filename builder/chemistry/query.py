"""Query: a compiled SMARTS that tells at a glance where it cannot match."""

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field

from rdkit import Chem

from builder.chemistry.structure import Structure

__all__ = ["Query"]

MAX_MATCHES = 400
"""Matches looked at per pattern; with at most 200 heavy atoms and patterns of small reach none is cut short in
ordinary structures, and a polymer of one repeated group stays fast."""


@dataclass(frozen=True, slots=True)
class Query:
    """A compiled SMARTS, equal by its text.

    places: for each atom number written in the SMARTS, its index in a match.
    elements: atoms of each element (by symbol) it cannot do without.
    signs: signs of formal charge (+1, -1) it cannot do without.
    """

    smarts: str
    mol: Chem.Mol = field(repr=False, compare=False)
    places: Mapping[int, int] = field(repr=False, compare=False)
    elements: Mapping[str, int] = field(repr=False, compare=False)
    signs: frozenset[int] = field(repr=False, compare=False)

    @classmethod
    def from_smarts(cls, text: str) -> "Query":
        """Return the query a SMARTS describes.

        Raises ValueError for text that is no SMARTS.
        """
        mol: Chem.Mol | None = Chem.MolFromSmarts(text) if text.strip() else None
        if mol is None:
            raise ValueError(f"{text!r} is no SMARTS")
        atoms = list(mol.GetAtoms())
        places = {atom.GetAtomMapNum(): atom.GetIdx() for atom in atoms if atom.GetAtomMapNum()}
        for atom in atoms:
            atom.SetAtomMapNum(0)
        # RDKit gives a query atom the atomic number 0, and no charge, where it allows several.
        elements = Counter(atom.GetSymbol() for atom in atoms if atom.GetAtomicNum() > 1)
        charges = (atom.GetFormalCharge() for atom in atoms)
        return cls(text, mol, places, elements, frozenset(1 if charge > 0 else -1 for charge in charges if charge))

    def may_match(self, structure: Structure) -> bool:
        """Answer whether a structure has the elements and charges without which nothing matches."""
        if not self.signs <= structure.signs:
            return False
        have = structure.elements
        return all(have.get(element, 0) >= number for element, number in self.elements.items())

    def is_in(self, structure: Structure) -> bool:
        """Answer whether the structure holds a match."""
        return self.may_match(structure) and bool(structure.mol.HasSubstructMatch(self.mol))

    def matches(self, structure: Structure) -> tuple[tuple[int, ...], ...]:
        """Return every match, symmetric ones too, at most MAX_MATCHES."""
        if not self.may_match(structure):
            return ()
        return tuple(structure.mol.GetSubstructMatches(self.mol, uniquify=False, maxMatches=MAX_MATCHES))
