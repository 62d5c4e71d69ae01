"""Combination: what one or two substances make by a reaction SMARTS, for tables of species that form."""

from collections.abc import Sequence
from dataclasses import dataclass

from rdkit import Chem, rdBase
from rdkit.Chem import rdChemReactions

from builder.chemistry.structure import Structure, parse_smiles

__all__ = ["Combination"]

MAX_OUTCOMES = 20


@dataclass(frozen=True)
class Combination:
    """A change over one reactant, or over two in its order."""

    smarts: str
    reaction: rdChemReactions.ChemicalReaction

    @classmethod
    def from_smarts(cls, text: str) -> "Combination":
        """Return the change that a reaction SMARTS describes; ValueError for text that is none."""
        try:
            reaction = rdChemReactions.ReactionFromSmarts(text)
        except ValueError:
            raise ValueError(f"{text} is no reaction SMARTS") from None
        with rdBase.BlockLogs():
            _, errors = reaction.Validate(silent=True)
        if errors:
            raise ValueError(f"{text} is no reaction SMARTS")
        reaction.Initialize()
        return cls(text, reaction)

    @property
    def reactants(self) -> int:
        """Return how many reactants it takes."""
        return int(self.reaction.GetNumReactantTemplates())

    def outcomes(self, reactants: Sequence[Structure]) -> tuple[Structure, ...]:
        """Return the different products, sorted by SMILES, configurations not drawn; empty where it does not apply."""
        found: dict[str, Structure] = {}
        with rdBase.BlockLogs():
            for product, *_ in self.reaction.RunReactants(tuple(each.mol for each in reactants), MAX_OUTCOMES):
                if Chem.SanitizeMol(product, catchErrors=True) == Chem.SanitizeFlags.SANITIZE_NONE:
                    smiles = Chem.MolToSmiles(product, isomericSmiles=False)
                    found.setdefault(smiles, parse_smiles(smiles))
        return tuple(found[smiles] for smiles in sorted(found))
