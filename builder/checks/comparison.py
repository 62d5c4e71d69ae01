"""When two entries were run under near-same conditions, in what they differ, and when their outcomes contradict.

The tolerances stand below; they are common practice and have no source. `outcomes-contradict` states them to readers.

Everything here is symmetric: what holds of one entry against another holds the other way round.
"""

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product

from builder.checks.seen import Seen
from builder.checks.standing import NOT_STATED, Charge, Standing, Variable
from builder.records.vocabulary import YieldKind

__all__ = [
    "DECISIVE",
    "Difference",
    "Disagreement",
    "are_near_same",
    "differences",
    "disagreements",
    "is_near",
    "is_one_experiment",
    "seen_by_quantity",
    "telling_difference",
]

NEAR_K = 10.0
"""Between the hottest stages: a rate doubles or trebles."""
NEAR_K_UNDER_WAY = 3.0
"""The same, where the colder run had not come to its end: the hotter one was simply further on."""
NEAR_VOLUME_POINTS = 10.0
"""Of the solvent volume, for each solvent; one that is absent counts as 0, so that a little water is near-same."""
NEAR_EQUIVALENTS = 1.25
"""Factor between the equivalents of what attacks, and between those of a base or reagent."""
NEAR_CONCENTRATION = 2.0
"""Factor between the concentrations of the substrate."""
NEAR_TIME = 3.0
"""Factor between the times at the highest temperature; once all has reacted, waiting adds little."""
NEAR_TIME_UNDER_WAY = 1.5
"""The same, where the shorter run had not come to its end."""
COMPLETE_PERCENT = 95.0
"""Conversion from which a run counts as come to its end."""
NEAR_SCALE = 3.0
"""Factor between the amounts of substrate; up to it the same flask and stirrer serve."""

YIELD_POINTS = 10.0
"""Yields, conversions and shares further apart than this contradict; trade practice, no source."""
EE_POINTS = 3.0
"""Enantiomeric excesses further apart than this contradict; trade practice, no source."""
LEAST_YIELD_POINTS = 5.0
"""However small the stated spreads: two weighings and two columns differ by as much. Common practice, no source."""
LEAST_EE_POINTS = 1.0
"""However small the stated spreads: what two integrations of one chromatogram differ by. Common practice, no source."""
SAME_SCALE = 1.05
"""Factor between the amounts of substrate of what may be one experiment typed twice."""

_ROUNDING = 1e-9


@dataclass(frozen=True, slots=True)
class Difference:
    """A variable that is not the same in two entries, in words; is_near: within its tolerance all the same."""

    variable: Variable
    here: str
    there: str
    is_near: bool

    @property
    def may_explain(self) -> bool:
        """Say whether it could be the reason of another outcome; who ran it, and when, explains nothing by itself."""
        return not self.is_near and self.variable not in _BYSTANDERS

    def text(self, here: str = "here", there: str = "there") -> str:
        """Return it as part of a sentence; here, there: what to call the two."""
        return f"{self.variable}: {self.here} {here}, {self.there} {there}"


@dataclass(frozen=True, slots=True)
class Disagreement:
    """A number of two outcomes that cannot both be the rule: by how many points they are apart, and how many may be."""

    here: Seen
    there: Seen
    apart: float
    allowed: float

    @property
    def weight(self) -> float:
        """Return how many times the allowed distance they are apart."""
        return self.apart / self.allowed

    @property
    def rank(self) -> tuple[float, list[str]]:
        """Order by weight; among equals by what was seen, whichever entry it stands in."""
        return (self.weight, sorted((self.here.text, self.there.text)))

    def text(self, here: str, there: str) -> str:
        """Return it as part of a sentence; here, there: what to call the two, with what belongs to each number."""
        seen = f"{self.here.text} {here}, {self.there.text} {there}"
        return seen if self.here.label in self.here.text else f"{self.here.label}: {seen}"


# --- conditions ---------------------------------------------------------------------------------------------


def are_near_same(one: Standing, other: Standing) -> bool:
    """Say whether two entries ran the same reaction under near-same conditions, base and reagents apart."""
    if abs(one.temperature_c - other.temperature_c) > NEAR_K + _ROUNDING:
        return False  # the cheapest first: in a book of many runs of one reaction most pairs end here
    if not one.key or one.key != other.key or one.is_flow != other.is_flow:
        return False
    return all(is_near(each, one, other) for each in DECISIVE)


def is_near(variable: Variable, one: Standing, other: Standing) -> bool:
    """Say whether a variable is within its tolerance; one without a tolerance only where the words are the same."""
    judge = _NEAR.get(variable)
    if judge is not None:
        return judge(one, other)
    return one.words[variable] == other.words[variable]


def differences(one: Standing, other: Standing) -> Iterator[Difference]:
    """Yield what differs, the most telling first."""
    for variable in Variable:
        if one.words[variable] != other.words[variable]:
            here, there = _said(variable, one, other)
            if here != there:
                yield Difference(variable, here, there, is_near(variable, one, other))


def _said(variable: Variable, one: Standing, other: Standing) -> tuple[str, str]:
    """Return a variable of two entries in words; of form and purity, what they do not share."""
    if variable is not Variable.QUALITY:
        return one.words[variable], other.words[variable]
    mine, theirs = ([each for each in a.qualities if each not in b.qualities] for a, b in ((one, other), (other, one)))
    return "; ".join(mine) or NOT_STATED, "; ".join(theirs) or NOT_STATED


def telling_difference(one: Standing, other: Standing) -> Difference | None:
    """Return what most likely makes the difference, else what differs at all; None where nothing that matters does."""
    found = [each for each in differences(one, other) if each.variable not in _BYSTANDERS]
    return next((each for each in found if each.may_explain), found[0] if found else None)


def _within(factor: float, one: float | None, other: float | None) -> bool:
    """Say whether two amounts are within a factor; what a record cannot tell is held against nobody."""
    if one is None or other is None:
        return True
    low, high = sorted((one, other))
    return high <= low * factor * (1 + _ROUNDING)


def _near_charges(one: Sequence[Charge], other: Sequence[Charge]) -> bool:
    return [charge.what for charge in one] == [charge.what for charge in other] and all(
        _within(NEAR_EQUIVALENTS, a.equivalents, b.equivalents) for a, b in zip(one, other, strict=True)
    )


def _same_species(one: Sequence[Charge], other: Sequence[Charge]) -> bool:
    return [charge.what for charge in one] == [charge.what for charge in other]


def _near_equivalents(one: Standing, other: Standing) -> bool:
    """Compare what attacks, species by species; counter-ions do not matter, so they are taken in order of amount."""
    mine, theirs = (
        sorted((charge.equivalents for charge in _attackers(each) if charge.equivalents is not None), reverse=True)
        for each in (one, other)
    )
    return len(mine) != len(theirs) or all(_within(NEAR_EQUIVALENTS, a, b) for a, b in zip(mine, theirs, strict=True))


def _attack_as_bases(one: Standing, other: Standing) -> bool:
    return one.attacks is other.attacks is Variable.BASE


def _attackers(each: Standing) -> tuple[Charge, ...]:
    return each.bases if each.attacks is Variable.BASE else each.nucleophiles


def _near_solvents(one: Standing, other: Standing) -> bool:
    if one.solvents == other.solvents and one.volumes == other.volumes:
        return True
    if one.volumes is None or other.volumes is None:
        return one.solvents == other.solvents
    mine = dict(zip(one.solvents, one.volumes, strict=True))
    theirs = dict(zip(other.solvents, other.volumes, strict=True))
    if not mine or not theirs:
        return mine == theirs
    return all(
        abs(mine.get(name, 0.0) - theirs.get(name, 0.0)) <= NEAR_VOLUME_POINTS + _ROUNDING
        for name in mine.keys() | theirs
    )


def _near_time(one: Standing, other: Standing) -> bool:
    shorter = min((one, other), key=lambda each: each.time_s)
    return _within(NEAR_TIME_UNDER_WAY if _was_under_way(shorter) else NEAR_TIME, one.time_s, other.time_s)


def _near_temperature(one: Standing, other: Standing) -> bool:
    colder = min((one, other), key=lambda each: each.temperature_c)
    allowed = NEAR_K_UNDER_WAY if _was_under_way(colder) else NEAR_K
    return abs(one.temperature_c - other.temperature_c) <= allowed + _ROUNDING


def _was_under_way(each: Standing) -> bool:
    return each.conversion is not None and each.conversion < COMPLETE_PERCENT


_NEAR: Mapping[Variable, Callable[[Standing, Standing], bool]] = {
    Variable.BASE: lambda a, b: (_same_species if _attack_as_bases(a, b) else _near_charges)(a.bases, b.bases),
    Variable.REAGENTS: lambda a, b: _near_charges(a.reagents, b.reagents),
    Variable.SOLVENT: _near_solvents,
    Variable.NUCLEOPHILE: lambda a, b: (
        _same_species(a.nucleophiles, b.nucleophiles)
        if a.nucleophiles or b.nucleophiles
        else a.words[Variable.NUCLEOPHILE] == b.words[Variable.NUCLEOPHILE]
    ),
    Variable.EQUIVALENTS: _near_equivalents,
    Variable.TEMPERATURE: _near_temperature,
    Variable.CONCENTRATION: lambda a, b: _within(NEAR_CONCENTRATION, a.concentration, b.concentration),
    Variable.TIME: _near_time,
    Variable.SCALE: lambda a, b: _within(NEAR_SCALE, a.scale, b.scale),
}
DECISIVE = (Variable.SOLVENT, Variable.EQUIVALENTS, Variable.TEMPERATURE, Variable.CONCENTRATION, Variable.TIME)
"""The variables that stages must be near-same in."""
_BYSTANDERS = frozenset({Variable.RUNS, Variable.BY, Variable.DATE})
"""What is shown and explains nothing by itself."""


# --- outcomes -----------------------------------------------------------------------------------------------


SeenByQuantity = Mapping[str, Mapping[YieldKind | None, Seen]]
"""What was seen in one entry, by quantity and kind."""


def disagreements(mine: SeenByQuantity, theirs: SeenByQuantity) -> tuple[Disagreement, ...]:
    """Return the numbers of two outcomes that cannot both be the rule, the furthest apart first.

    mine, theirs: of `seen_by_quantity`, worked out once for each entry. Yields of one kind are compared where both have
    that kind, else across kinds. Sums over a formula are left out where a product disagrees by itself.
    """
    found = [_most_apart(mine[what], theirs[what]) for what in mine.keys() & theirs.keys()]
    kept = [each for each in found if each is not None]
    if any(each.here.what.startswith("yield") and not each.here.is_sum for each in kept):
        kept = [each for each in kept if not each.here.is_sum]
    return tuple(sorted(kept, key=lambda each: (-each.weight, each.here.what)))


def seen_by_quantity(standing: Standing) -> SeenByQuantity:
    """Return what was seen by quantity and kind; several numbers for one are taken as the range they span."""
    found: dict[str, dict[YieldKind | None, Seen]] = {}
    for each in standing.seen:
        kinds = found.setdefault(each.what, {})
        known = kinds.get(each.kind)
        kinds[each.kind] = each if known is None else _spanned(known, each)
    return found


def _spanned(one: Seen, other: Seen) -> Seen:
    low, high = min(one.low, other.low), max(one.high, other.high)
    return replace(one, low=low, high=high, text=f"{one.text} and {other.text}")


def _most_apart(mine: Mapping[YieldKind | None, Seen], theirs: Mapping[YieldKind | None, Seen]) -> Disagreement | None:
    shared = mine.keys() & theirs.keys()
    pairs = [(kind, kind) for kind in shared] or list(product(mine, theirs))
    found = [_disagreement(mine[one], theirs[other]) for one, other in pairs]
    return max((each for each in found if each is not None), key=lambda each: each.rank, default=None)


def _disagreement(one: Seen, other: Seen) -> Disagreement | None:
    if YieldKind.AREA in {one.kind, other.kind} and None not in {one.kind, other.kind} and one.kind != other.kind:
        return None  # an area share is no yield
    mine, theirs = (one, other) if one.kind == other.kind else (_as_formed(one), _as_formed(other))
    apart = max(mine.low - theirs.high, theirs.low - mine.high)
    allowed = _allowed(one, other)
    return Disagreement(one, other, apart, allowed) if apart > allowed + _ROUNDING else None


def _as_formed(seen: Seen) -> Seen:
    """Return a yield as what was formed: of what was isolated, more may have been."""
    return replace(seen, high=100.0) if seen.kind is YieldKind.ISOLATED else seen


def _allowed(one: Seen, other: Seen) -> float:
    """Return how many points apart two numbers may be: the usual, or what both stated spreads cover together."""
    is_ee = one.what.startswith("ee")
    usual, least = (EE_POINTS, LEAST_EE_POINTS) if is_ee else (YIELD_POINTS, LEAST_YIELD_POINTS)
    if one.spread is not None and other.spread is not None:
        return max(least, one.spread + other.spread)
    return max(usual, one.spread or 0.0, other.spread or 0.0)


# --- one experiment, or two ---------------------------------------------------------------------------------


def is_one_experiment(one: Standing, other: Standing) -> bool:
    """Say whether two entries that agree look like one experiment typed twice rather than a repeat.

    They were run on one day by one person on one scale, or the same masses were weighed: no two runs weigh alike.
    """
    words = ({variable: each.words[variable] for variable in (Variable.DATE, Variable.BY)} for each in (one, other))
    mine, theirs = words
    same_run = mine == theirs and one.scale is not None and other.scale is not None
    weighed_alike = bool(one.weighed) and one.weighed == other.weighed
    return weighed_alike or (same_run and _within(SAME_SCALE, one.scale, other.scale))
