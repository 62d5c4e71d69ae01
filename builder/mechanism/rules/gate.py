"""A gate: a rule that closes mechanisms at a site, whatever the rates."""

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from builder.chemistry.perception import Activation, BetaCarbon, ReactiveSite, leaving_groups
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.records.vocabulary import Mechanism
from builder.rule import Rule, rule

__all__ = ["Gate", "Situation", "gate"]

_HALOGENS = frozenset({"F", "Cl", "Br", "I"})


@dataclass(frozen=True, slots=True)
class Situation:
    """What a gate may look at: the molecule, the site in it, and what is in the flask with it.

    is_activated: an acid, an activator or a catalyst is there; whether it helps is a matter of the group.
    formed_group: the leaving group made in the flask from the one that is drawn; None where the drawn one leaves.
    """

    structure: Structure
    site: ReactiveSite
    is_activated: bool = False
    formed_group: str | None = None

    @property
    def leaving_group(self) -> str:
        """Return the name of the group that leaves."""
        return self.formed_group or self.site.leaving_group

    @property
    def group_leaves(self) -> bool:
        """Say whether the group leaves as it is, or strain or activation helps it."""
        group = leaving_groups().get(self.leaving_group)
        return group is None or not group.needs_activation or self.is_strained or self.is_helped_by(*Activation)

    @property
    def is_strained(self) -> bool:
        """Say whether the leaving atom is part of a three- or four-membered ring with the carbon."""
        return self.site.in_strained_ring

    def is_helped_by(self, *kinds: Activation) -> bool:
        """Say whether the flask activates, and the group is one that activation of any of these kinds helps."""
        group = leaving_groups().get(self.leaving_group)
        return self.is_activated and group is not None and not group.activated_by.isdisjoint(kinds)

    def is_any(self, *classes: str) -> bool:
        """Say whether the carbon is of any of these classes."""
        return not self.site.classes.isdisjoint(classes)

    @property
    def halogens(self) -> int:
        """Return how many halogens the carbon bears, the leaving one included."""
        return sum(
            self._symbol(atom) in _HALOGENS for atom, _ in self.structure.atoms[self.site.alpha_carbon].neighbours
        )

    @property
    def can_shift(self) -> bool:
        """Say whether a branched sp3 neighbour can send hydrogen or carbon over, and so become the better cation."""
        return any(beta.hybridisation == "sp3" and self._carbon_branches(beta) >= 2 for beta in self.site.beta)

    @property
    def has_multiple_bond_beside(self) -> bool:
        """Say whether a carbon next to the alpha carbon has a double or triple bond to a further carbon."""
        atoms = self.structure.atoms
        return any(
            order in {2.0, 3.0} and far != self.site.alpha_carbon and self._symbol(far) == "C"
            for beta in self.site.beta
            for far, order in atoms[beta.atom].neighbours
        )

    def distances(self) -> dict[int, int]:
        """Return, for each atom that is not part of the leaving group, the bonds from it to the alpha carbon."""
        atoms = self.structure.atoms
        found = {self.site.alpha_carbon: 0}
        frontier = [self.site.alpha_carbon]
        while frontier:
            here = frontier.pop(0)
            for near, _ in atoms[here].neighbours:
                if near not in found and (here, near) != (self.site.alpha_carbon, self.site.leaving_atom):
                    found[near] = found[here] + 1
                    frontier.append(near)
        return found

    def _carbon_branches(self, beta: BetaCarbon) -> int:
        around = (atom for atom, _ in self.structure.atoms[beta.atom].neighbours)
        return sum(atom != self.site.alpha_carbon and self._symbol(atom) == "C" for atom in around)

    def _symbol(self, atom: int) -> str:
        return self.structure.atoms[atom].symbol


@dataclass(frozen=True, slots=True)
class Gate:
    """A rule over a situation, and the mechanisms it closes where it fires."""

    rule: Rule[Situation, bool]
    closes: frozenset[Mechanism]

    def fires(self, situation: Situation) -> bool:
        """Say whether the gate is shut in this situation."""
        return self.rule.look is not None and self.rule.look(situation)


def gate(
    *,
    id: str,  # noqa: A002 - as on every card
    title: str,
    closes: Iterable[Mechanism],
    source: str,
    fires_on: tuple[str, ...],
    silent_on: tuple[str, ...],
) -> Callable[[Callable[[Situation], bool]], Gate]:
    """Turn a function over a Situation into a gate; examples are SMILES of substrates."""
    shut = frozenset(closes)
    effect = "closes " + ", ".join(sorted(shut))
    make = rule(
        id=id, title=title, level=Level.QUERY, source=source, fires_on=fires_on, silent_on=silent_on, effect=effect
    )

    def build(look: Callable[[Situation], bool]) -> Gate:
        return Gate(make(look), shut)

    return build
