"""A gate: a rule that closes mechanisms at a site, whatever the rates."""

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from builder.chemistry.perception import ReactiveSite
from builder.finding import Level
from builder.records.vocabulary import Mechanism
from builder.rule import Rule, rule

__all__ = ["Gate", "Situation", "gate"]


@dataclass(frozen=True, slots=True)
class Situation:
    """What a gate may look at: the site, and what is in the flask with it.

    is_activated: an acid, an activator or a catalyst can help the group to leave.
    """

    site: ReactiveSite
    is_activated: bool = False

    @property
    def group_leaves_unaided(self) -> bool:
        """Say whether the group leaves as it is, or strain or activation helps it."""
        return not self.site.needs_activation or self.is_activated or self.is_strained

    @property
    def is_strained(self) -> bool:
        """Say whether the leaving atom is part of a three- or four-membered ring with the carbon."""
        return self.site.leaving_ring_size in {3, 4}

    def is_any(self, *classes: str) -> bool:
        """Say whether the carbon is of any of these classes."""
        return not self.site.classes.isdisjoint(classes)


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
