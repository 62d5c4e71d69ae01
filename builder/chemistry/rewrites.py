"""Rewrites: what becomes of an intermediate, as rows of reaction SMARTS; for changes that no edit of a site makes."""

from collections.abc import Iterator
from dataclasses import dataclass
from enum import StrEnum
from functools import cache

from rdkit import Chem, rdBase
from rdkit.Chem import rdChemReactions

from builder.chemistry.structure import Structure, parse_smiles
from builder.table import NOTHING, rows_of, table_text

__all__ = ["ActsOn", "Rewrite", "load_rewrites", "rewritten"]

MAX_RESULTS = 40


class ActsOn(StrEnum):
    """What a rewrite acts on."""

    SUBSTRATE = "substrate"
    CATION = "cation"
    PRODUCT = "product"


@dataclass(frozen=True)
class Rewrite:
    """One row of rewrites.tsv.

    adds: what is taken up from the flask; None for nothing. role: what the flask must hold; None for nothing.
    kind: the word for the event.
    """

    name: str
    acts_on: ActsOn
    reaction: rdChemReactions.ChemicalReaction
    adds: Structure | None
    role: str | None
    kind: str


@cache
def load_rewrites() -> tuple[Rewrite, ...]:
    """Return the rows of the table; ValueError for a faulty one."""
    table = "rewrites.tsv"
    columns = ("name", "acts_on", "smarts", "adds", "with", "kind", "note", "source")
    return tuple(
        Rewrite(
            name=row["name"],
            acts_on=ActsOn(row["acts_on"]),
            reaction=_compiled(row["name"], row["smarts"]),
            adds=None if row["adds"] == NOTHING else parse_smiles(row["adds"]),
            role=None if row["with"] == NOTHING else row["with"],
            kind=row["kind"],
        )
        for row in rows_of(table, table_text("builder.chemistry", table), columns)
    )


def _compiled(name: str, smarts: str) -> rdChemReactions.ChemicalReaction:
    reaction = rdChemReactions.ReactionFromSmarts(smarts)
    with rdBase.BlockLogs():
        _, errors = reaction.Validate(silent=True)
    if errors:
        raise ValueError(f"{name}: {smarts} is no reaction SMARTS")
    reaction.Initialize()
    return reaction


def rewritten(structure: Structure, rewrite: Rewrite) -> Iterator[Structure]:
    """Yield each different outcome of a rewrite as one structure of all its pieces; configurations are not drawn."""
    seen: set[str] = set()
    for (outcome,) in rewrite.reaction.RunReactants((structure.mol,), MAX_RESULTS):
        with rdBase.BlockLogs():
            faulty = Chem.SanitizeMol(outcome, catchErrors=True) != Chem.SanitizeFlags.SANITIZE_NONE
        smiles = "" if faulty else Chem.MolToSmiles(outcome, isomericSmiles=False)
        if smiles and smiles not in seen:
            seen.add(smiles)
            yield parse_smiles(smiles)
