"""Which entries belong together: those that contradict or repeat each other, and those of one series.

Every relation is derived from the standings, none is typed; each holds both ways.
"""

from collections import defaultdict
from collections.abc import Callable, Hashable, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from functools import cached_property
from itertools import combinations
from typing import TypeVar

from builder.checks.comparison import (
    Difference,
    Disagreement,
    are_near_same,
    differences,
    disagreements,
    is_near,
    is_one_experiment,
    seen_by_quantity,
    telling_difference,
)
from builder.checks.standing import Standing, Variable

__all__ = ["GO_ALONG", "VARIED", "Kin", "Relation", "families", "near_same_kin"]

T = TypeVar("T", bound=Hashable)


class Relation(StrEnum):
    """What one entry is to another."""

    CONTRADICTS = "contradicts"
    REPEATS = "repeats"
    DUPLICATES = "same experiment twice"
    VARIANT = "variant of"


VARIED = (
    Variable.SOLVENT,
    Variable.TEMPERATURE,
    Variable.LEAVING_GROUP,
    Variable.NUCLEOPHILE,
    Variable.BASE,
    Variable.REAGENTS,
    Variable.EQUIVALENTS,
    Variable.SUBSTRATE,
    Variable.SCALE,
)
"""What series are made of."""
GO_ALONG = (Variable.TIME, Variable.CONCENTRATION, Variable.VESSEL)
"""What is changed along with the rest, and makes a series only where nothing else differs."""


@dataclass(frozen=True)
class Kin:
    """What another entry (there) is to an entry (here).

    disagreements: the numbers that cannot both be the rule, the furthest apart first.
    """

    relation: Relation
    here: Standing
    there: Standing
    disagreements: tuple[Disagreement, ...] = ()

    @property
    def mirrored(self) -> "Kin":
        """Return what the entry here is to the other."""
        turned = tuple(replace(each, here=each.there, there=each.here) for each in self.disagreements)
        return Kin(self.relation, self.there, self.here, turned)

    @property
    def differences(self) -> tuple[Difference, ...]:
        """Return what differs in the conditions, the most telling first."""
        return tuple(differences(self.here, self.there))

    @property
    def telling(self) -> Difference | None:
        """Return what most likely makes the difference; None where nothing that matters does."""
        return telling_difference(self.here, self.there)

    @cached_property
    def varied(self) -> tuple[Variable, ...]:
        """Return the variables in which the other is a variant of this one; empty where only the drawing differs."""
        return self._apart(VARIED) or self._apart(GO_ALONG)

    def _apart(self, variables: Sequence[Variable]) -> tuple[Variable, ...]:
        return tuple(variable for variable in variables if not is_near(variable, self.here, self.there))


def near_same_kin(items: Iterable[tuple[T, Standing]]) -> Iterator[tuple[T, T, Kin]]:
    """Yield every pair that ran one reaction under near-same conditions, with what the second is to the first.

    Only entries with one reaction key are compared, each with each: a book takes time in proportion to its length as
    long as few entries share a key, and for n of one key in proportion to n².
    """
    for sharing in _by((item for item in items if item[1].key), lambda standing: standing.key):
        seen = [(name, standing, seen_by_quantity(standing)) for name, standing in sharing]
        for (one, mine, mine_seen), (other, theirs, theirs_seen) in combinations(seen, 2):
            if are_near_same(mine, theirs):
                yield one, other, _near_same_kin(mine, theirs, disagreements(mine_seen, theirs_seen))


def _near_same_kin(one: Standing, other: Standing, apart: tuple[Disagreement, ...]) -> Kin:
    if apart:
        return Kin(Relation.CONTRADICTS, one, other, apart)
    if is_one_experiment(one, other):
        return Kin(Relation.DUPLICATES, one, other)
    is_variant = not all(is_near(variable, one, other) for variable in VARIED)
    return Kin(Relation.VARIANT if is_variant else Relation.REPEATS, one, other)


def families(items: Iterable[tuple[T, Standing]]) -> dict[T, tuple[T, ...]]:
    """Return with each entry the others of its transformation, in the order given."""
    found: dict[T, tuple[T, ...]] = {}
    for sharing in _by((item for item in items if item[1].transformation), lambda standing: standing.transformation):
        for one, _ in sharing:
            found[one] = tuple(other for other, _ in sharing if other != one)
    return found


def _by(items: Iterable[tuple[T, Standing]], key: Callable[[Standing], str]) -> Iterable[list[tuple[T, Standing]]]:
    sharing: defaultdict[str, list[tuple[T, Standing]]] = defaultdict(list)
    for item in items:
        sharing[key(item[1])].append(item)
    return sharing.values()
