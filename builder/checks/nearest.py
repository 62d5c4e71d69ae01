"""Which entries come nearest to a reaction: by the class of its site, then the attacking atom, then the substrate."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.chemistry.likeness import similarity
from builder.chemistry.perception import attacking_atoms
from builder.chemistry.structure import Structure
from builder.mechanism.solvents import structure_of
from builder.records.vocabulary import NucleophileWord

__all__ = ["Likeness", "attacker_of", "likeness_of", "nearest"]

BASE = "base"
"""In place of an attacking atom where only a proton is to be taken."""


@dataclass(frozen=True, slots=True)
class Likeness:
    """What two reactions are compared by.

    classes: words for the reacting carbon. attacker: symbol of the attacking atom, `base` where there is no
    nucleophile, `internal` where the substrate has its own.
    """

    substrate: Structure
    classes: frozenset[str]
    attacker: str

    def distance(self, other: "Likeness") -> tuple[int, bool, float]:
        """Return how far another reaction is: class words not in common, another attacking atom, unlike substrate."""
        unlike = 1.0 - similarity(self.substrate, other.substrate)
        return len(self.classes ^ other.classes), self.attacker != other.attacker, unlike

    def resembles(self, other: "Likeness") -> bool:
        """Say whether another reaction has a word for the class and the attacking atom in common with this one."""
        return bool(self.classes & other.classes) and self.attacker == other.attacker


def attacker_of(nucleophile: Structure | NucleophileWord | None, solvents: Iterable[Structure]) -> str:
    """Return what attacks, as `Likeness.attacker` has it; nothing where no atom of it is known to attack."""
    match nucleophile:
        case None | NucleophileWord.NONE:
            return BASE
        case NucleophileWord.INTERNAL:
            return NucleophileWord.INTERNAL.value
        case NucleophileWord.SOLVENT:
            found = [atom for solvent in solvents for atom in attacking_atoms(solvent)]
        case _:
            found = list(attacking_atoms(nucleophile))
    return found[0].symbol if found else ""


def likeness_of(case: Case) -> Likeness | None:
    """Return what a record is compared by; None where the site or the nucleophile is not known."""
    if not case.sites:
        return None
    nucleophile: Structure | NucleophileWord | None
    if isinstance(case.record.nucleophile, NucleophileWord):
        nucleophile = case.record.nucleophile
    elif case.record.nucleophiles:
        nucleophile = case.structures.get(("nucleophile", 0))
        if nucleophile is None:
            return None
    else:
        nucleophile = None
    return Likeness(
        substrate=case.sites[0].on,
        classes=frozenset(word for each in case.sites for word in each.site.classes),
        attacker=attacker_of(nucleophile, _solvents(case)),
    )


def nearest(asked: Likeness, cases: Iterable[Case]) -> tuple[tuple[Case, Likeness], ...]:
    """Return the cases that can be compared, with what by, nearest first; identifiers decide between equals."""
    known = [(case, like) for case in cases if (like := likeness_of(case)) is not None]
    return tuple(sorted(known, key=lambda each: (asked.distance(each[1]), each[0].record.entry)))


def _solvents(case: Case) -> Iterator[Structure]:
    for place, solvent in enumerate(case.record.solvents):
        structure = structure_of(solvent.name, case.structures.get(("solvent", place)))
        if structure is not None:
            yield structure
