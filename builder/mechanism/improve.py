"""The smallest changes that bring a wanted product or mechanism above a wanted share, or make a reaction run.

Single changes are tried first; only where none suffices, pairs of the kind that helps most with the others that help.
What is tried comes from improvements.tsv, which also says what is never proposed. One call makes at most `BUDGET`
forecasts of a few milliseconds each; the usual one makes 25 to 45.
"""

import math
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from functools import cache

from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import Degree, Hybridisation, ReactiveSite, attacking_atoms, perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.chemistry.transform import substitute
from builder.mechanism.asking import ABSOLUTE_ZERO_C
from builder.mechanism.departure import HALIDES
from builder.mechanism.engine import predict
from builder.mechanism.forecast import Forecast
from builder.mechanism.kinds import load_kinds
from builder.mechanism.nucleophiles import find_nucleophile_and_counter_ion, nucleophile_by_structure
from builder.mechanism.question import Ingredient, Question
from builder.mechanism.rate_terms import Parameters
from builder.mechanism.reagents import Role
from builder.mechanism.solvents import Solvent, SolventKind, boiling_point_c, find_solvent, freezing_point_c
from builder.records.vocabulary import ELIMINATIONS, Mechanism
from builder.table import refuse_twice, rows_of, table_text

__all__ = ["BUDGET", "EFFORT", "LEAST_CONVERSION", "ChangeKind", "Improvement", "improvements", "is_as_wanted"]

BUDGET = 60
"""Forecasts one call may make, that of the question itself included."""
LEAST_CONVERSION = 0.5
"""Conversion within the time from which a reaction counts as running."""
LEAST_GAIN = 0.05
"""What a change must add to the share to be worth naming where none reaches it."""
FEW = 3
"""Changes named of one kind, and of all kinds where none suffices; also how many of a kind are tried in pairs."""

_TEMPERATURES_C = (-78, -40, -20, 0, 25, 40, 60, 80, 100, 120)
_TIMES_H = (1.0, 2.0, 4.0, 8.0, 16.0, 24.0, 48.0, 72.0)
_EQUIVALENTS = (1.1, 2.0, 3.0, 5.0)
_CONCENTRATIONS_M = (0.05, 0.1, 0.2, 0.5, 1.0, 2.0)
_NEAT_C = (0.0, 100.0)
"""Where a reaction without solvent is taken to be liquid; nothing is known about it."""
_AMINE_TAKES_PKA = 8.0
"""Up to which pKa in water an acid gives its proton to an amine in organic solvents; common practice, no source."""
_MOST_STEPS = 4
_FOREMOST = 0.5
"""Share from which a mechanism is the foremost."""
_STEP_K = 5.0
"""Temperatures nearer than this count as the same."""
_WEAK_BASE = "potassium carbonate"
_NO_POISON_GAS = 3
"""Heavy atoms up to which the acid of a nucleophile (HCN, HN3, H2S) is a poisonous gas, and so not proposed."""
_OTHER_SULFONATES = frozenset({"benzenesulfonate", "brosylate", "nosylate", "triflate"})


Parts = tuple[tuple[Solvent, float], ...]
"""Solvents with their share by volume."""


class ChangeKind(StrEnum):
    """What is changed about a reaction."""

    TEMPERATURE = "temperature"
    EQUIVALENTS = "equivalents"
    TIME = "time"
    CONCENTRATION = "concentration"
    SOLVENT = "solvent"
    BASE = "base"
    NUCLEOPHILE = "nucleophile"
    LEAVING_GROUP = "leaving group"


EFFORT: Mapping[ChangeKind, float] = {
    ChangeKind.TEMPERATURE: 1.0,
    ChangeKind.EQUIVALENTS: 1.0,
    ChangeKind.TIME: 1.0,
    ChangeKind.CONCENTRATION: 1.0,
    ChangeKind.SOLVENT: 2.0,
    ChangeKind.BASE: 2.0,
    ChangeKind.NUCLEOPHILE: 2.0,
    ChangeKind.LEAVING_GROUP: 3.0,
}
"""What a change asks of a chemist: 1 a dial, 2 another bottle, 3 another synthesis of the substrate; pairs add up.

Our judgement, no source.
"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Improvement:
    """One change, and what it is expected to do.

    what: the kind of change. also: further kinds where several go together. change: what is done, old and new named.
    share_before, share_after: of what was wanted in the converted substrate, 0 to 1; of a product 0 where less than 5 %
    reacts. conversion_before, conversion_after: of the substrate in the time. reaches: whether both are then as wanted.
    question: the changed question. forecast: its answer.
    """

    what: ChangeKind
    also: tuple[ChangeKind, ...] = ()
    change: str
    effort: float
    share_before: float
    share_after: float
    conversion_before: float
    conversion_after: float
    reaches: bool
    question: Question
    forecast: Forecast


def improvements(
    question: Question,
    *,
    product: Structure | str | None = None,
    mechanism: Mechanism | None = None,
    share: float = 0.9,
    limit: int = 5,
    parameters: Parameters | None = None,
) -> tuple[Improvement, ...]:
    """Return changes after which what is wanted has its share and half of the substrate reacts, smallest effort first.

    product: a structure or SMILES; drawn without stereochemistry it stands for all stereoisomers. mechanism: on its own
    whatever product it gives; with a product, the product formed that way only. Neither: the mechanism foremost now is
    to stay so, and to run. Changes of equal effort come by share, then the faster first; at most three of a kind.
    Of steps along a scale (temperature, equivalents, time, concentration) only the nearest that suffices is named.
    Where nothing suffices: the three best that add at least 5 points to the share, `reaches` false; there the share
    counts in proportion where less than half of the substrate reacts. Empty where the question is not covered, where
    all is as wanted already, and where nothing helps.
    Raises StructureError for a broken SMILES, ValueError for a share outside (0, 1] and for the mechanism `none`.
    """
    if not 0 < share <= 1 or mechanism is Mechanism.NONE:
        raise ValueError("a wanted share lies above 0 and up to 1, and no reaction is no wanted mechanism")
    structure = parse_smiles(product) if isinstance(product, str) else product
    needs_nucleophile = structure is None and mechanism not in ELIMINATIONS
    before = predict(question, parameters)
    if structure is None and mechanism is None:
        mechanism, share = max(before.shares, key=lambda m: before.shares[m], default=None), min(share, _FOREMOST)
    wanted = _Wanted(structure, mechanism, share, needs_nucleophile)
    if not before.is_covered or wanted.is_met_by(before):
        return ()
    trials = _Trials(wanted, parameters)
    found = [best for ladder in _ladders(question, wanted) if (best := trials.climb(ladder))]
    if found and not any(each.reaches for each in found):
        least = max(each.promise for each in found) + LEAST_GAIN
        pairs = [best for ladder in _pairs(wanted, found, before) if (best := trials.climb(ladder))]
        found += [pair for pair in pairs if pair.reaches or pair.promise >= least]
    return tuple(
        each.improvement(wanted, before) for each in _chosen(found, wanted.promise(before) + LEAST_GAIN, limit)
    )


def is_as_wanted(
    forecast: Forecast, *, product: Structure | None = None, mechanism: Mechanism | None = None, share: float = 0.9
) -> bool:
    """Say whether a forecast gives what `improvements` is asked for as it is."""
    return _Wanted(product, mechanism, share, needs_nucleophile=False).is_met_by(forecast)


def _chosen(found: Sequence["_Trial"], least: float, limit: int) -> Sequence["_Trial"]:
    """Return what is worth naming, best first; least: the promise a change must hold that does not suffice."""
    reaching = sorted((each for each in found if each.reaches), key=_Trial.rank)
    if not reaching:
        partial = [each for each in found if each.promise >= least and each.share > 0]
        return sorted(partial, key=lambda each: (-round(each.promise, 2), each.change.effort))[: min(FEW, limit)]
    kinds = [each.change.kinds for each in reaching]
    return [each for place, each in enumerate(reaching) if kinds[:place].count(kinds[place]) < FEW][:limit]


# --- what is wanted, and how near a forecast comes --------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Wanted:
    """What is wanted; without a nucleophile of its own, a base may take the place of the one that is there."""

    product: Structure | None
    mechanism: Mechanism | None
    share: float
    needs_nucleophile: bool

    def share_in(self, forecast: Forecast) -> float:
        """Return the share of converted substrate that is as wanted."""
        if self.product is not None:
            ways = [p for p in forecast.products if self.mechanism in {None, p.mechanism}]
            return math.fsum(p.share for p in ways if _is_as_drawn(p.structure, self.product))
        if self.mechanism is not None:
            return forecast.shares.get(self.mechanism, 0.0)
        return 1.0 if forecast.shares else 0.0

    def is_met_by(self, forecast: Forecast) -> bool:
        """Say whether share and conversion are as wanted."""
        return forecast.conversion >= LEAST_CONVERSION and self.share_in(forecast) >= self.share

    def promise(self, forecast: Forecast) -> float:
        """Return the share, cut in proportion where less than half of the substrate reacts.

        Without products, which are not built where hardly anything reacts, all that does counts as the product.
        """
        share = 1.0 if self.product is not None and not forecast.products else self.share_in(forecast)
        return share * min(1.0, forecast.conversion / LEAST_CONVERSION)


def _is_as_drawn(formed: Structure, wanted: Structure) -> bool:
    """Say whether a structure is the wanted one, or a stereoisomer where no stereochemistry is drawn."""
    return formed == wanted or (wanted.smiles == wanted.flat_smiles == formed.flat_smiles)


@dataclass(frozen=True, slots=True)
class _Change:
    """One change to a question.

    kinds: what it changes, the name-giving one first. way: -1 down a scale, 1 up, else 0.
    """

    kinds: tuple[ChangeKind, ...]
    text: str
    question: Question
    way: int = 0

    @property
    def effort(self) -> float:
        """Return the effort of all kinds together."""
        return sum(EFFORT[kind] for kind in self.kinds)


Ladder = Sequence[_Change]
"""Changes of one kind in one direction, the smallest first."""


@dataclass(frozen=True, slots=True)
class _Trial:
    """One change and what came of it."""

    change: _Change
    forecast: Forecast
    share: float
    promise: float
    reaches: bool

    def rank(self) -> tuple[float, float, float]:
        """Return what sufficient changes are sorted by: effort, share in whole percent, speed."""
        half_life = self.forecast.half_life_s
        return self.change.effort, -round(self.share, 2), math.inf if half_life is None else half_life

    def improvement(self, wanted: _Wanted, before: Forecast) -> Improvement:
        """Return it as the caller sees it."""
        return Improvement(
            what=self.change.kinds[0],
            also=self.change.kinds[1:],
            change=self.change.text,
            effort=self.change.effort,
            share_before=wanted.share_in(before),
            share_after=self.share,
            conversion_before=before.conversion,
            conversion_after=self.forecast.conversion,
            reaches=self.reaches,
            question=self.change.question,
            forecast=self.forecast,
        )


class _Trials:
    """Forecasts of changes, no more than the budget allows."""

    def __init__(self, wanted: _Wanted, parameters: Parameters | None) -> None:
        self._wanted, self._parameters = wanted, parameters
        self._left = BUDGET - 1

    def climb(self, ladder: Ladder) -> _Trial | None:
        """Return the first change that suffices, else the best one; None where none was tried."""
        best: _Trial | None = None
        for change in ladder[: self._left]:
            self._left -= 1
            forecast = predict(change.question, self._parameters)
            share, promise = self._wanted.share_in(forecast), self._wanted.promise(forecast)
            tried = _Trial(change, forecast, share, promise, self._wanted.is_met_by(forecast))
            if tried.reaches:
                return tried
            if best is None or promise > best.promise:
                best = tried
        return best


# --- what is tried ----------------------------------------------------------------------------------------------------


def _ladders(question: Question, wanted: _Wanted, kinds: Iterable[ChangeKind] = tuple(ChangeKind)) -> Iterator[Ladder]:
    """Yield the ladders of these kinds without what is not sensible; empty ones are left out."""
    for kind in kinds:
        for ladder in _LADDERS[kind](question, wanted):
            kept = [change for change in ladder if _is_sensible(change.question, question)]
            if kept:
                yield kept


def _pairs(wanted: _Wanted, singles: Sequence[_Trial], before: Forecast) -> Iterator[Ladder]:
    """Yield pairs of the kind of change that helps most with each of the others that help, best first.

    Another bottle or substrate comes first and a step along a scale second, so that the new solvent sets its limits.
    """
    ranked = sorted(singles, key=lambda each: (-round(each.promise, 6), each.change.effort))
    helping = [each for each in ranked if each.promise > wanted.promise(before)]
    kinds = list(dict.fromkeys(each.change.kinds for each in helping))
    for other in kinds[1:]:
        first, second = sorted((kinds[0], other), key=lambda k: -sum(EFFORT[kind] for kind in k))
        if set(first) & set(second) or len(second) > 1:
            continue
        seconds = [each.change for each in helping if each.change.kinds == second]
        for one in [each.change for each in helping if each.change.kinds == first][:FEW]:
            for ladder in _ladders(one.question, wanted, second):
                if any(_is_alike(ladder[0], known) for known in seconds[:FEW]):
                    yield [_Change(first + c.kinds, f"{one.text}, and {c.text}", c.question) for c in ladder]


def _is_alike(change: _Change, other: _Change) -> bool:
    """Say whether two changes go the same way along a scale, or bring the same thing."""
    return change.kinds == other.kinds and change.way == other.way and (change.way != 0 or change.text == other.text)


def _temperatures(question: Question, _: _Wanted) -> Iterator[Ladder]:
    now = question.temperature_k + ABSOLUTE_ZERO_C
    low, high = _liquid_c(question.solvent)
    allowed = [float(t) for t in _TEMPERATURES_C if low <= t <= high]
    if high < max(_TEMPERATURES_C) and not any(abs(t - high) < _STEP_K for t in allowed):
        allowed.append(float(math.floor(high)))
    for way, steps in _both_ways(allowed, now, _STEP_K):
        yield [
            _step(
                ChangeKind.TEMPERATURE,
                f"{t:g} °C in place of {now:.4g} °C",
                replace(question, temperature_k=t - ABSOLUTE_ZERO_C),
                way,
            )
            for t in steps
        ]


def _equivalents(question: Question, _: _Wanted) -> Iterator[Ladder]:
    present = {solvent.smiles for solvent, _ in question.solvent}
    charged = [i for i in (question.nucleophile, question.base) if i and i.structure.smiles not in present]
    if not charged:
        return
    now = question.charged_equivalents
    what = " and of ".join(_named(ingredient) for ingredient in charged)
    for way, steps in _both_ways(_EQUIVALENTS, now, 0.05):
        yield [
            _step(
                ChangeKind.EQUIVALENTS,
                f"{e:g} equivalents of {what} in place of {now:.3g}",
                replace(question, equivalents=e),
                way,
            )
            for e in steps
        ]


def _times(question: Question, _: _Wanted) -> Iterator[Ladder]:
    now = question.time_s / 3600
    for way, steps in _both_ways(_TIMES_H, now, 0.1 * now):
        yield [
            _step(ChangeKind.TIME, f"{_hours(h)} in place of {_hours(now)}", replace(question, time_s=h * 3600), way)
            for h in steps[:2]
        ]


def _concentrations(question: Question, _: _Wanted) -> Iterator[Ladder]:
    if not question.solvent:
        return
    now = question.concentration_m
    for way, steps in _both_ways(_CONCENTRATIONS_M, now, 0.1 * now):
        yield [
            _step(
                ChangeKind.CONCENTRATION,
                f"{c:g} mol/L in place of {now:.3g} mol/L",
                replace(question, concentration_m=c),
                way,
            )
            for c in steps[:2]
        ]


def _step(kind: ChangeKind, text: str, question: Question, way: int) -> _Change:
    return _Change((kind,), text, question, way)


def _both_ways(scale: Sequence[float], now: float, same: float) -> Iterator[tuple[int, Sequence[float]]]:
    """Yield the values below (-1) and above (1) the present one, nearest first; same: what is too near to count."""
    yield -1, sorted((value for value in scale if value < now - same), reverse=True)[:_MOST_STEPS]
    yield 1, sorted(value for value in scale if value > now + same)[:_MOST_STEPS]


def _solvents(question: Question, _: _Wanted) -> Iterator[Ladder]:
    for parts in _table().ranges:
        if _recipe(parts) != _recipe(question.solvent):
            text = f"{_mixture(parts)} in place of {_mixture(question.solvent)}"
            yield [_Change((ChangeKind.SOLVENT,), text, replace(question, solvent=parts))]


def _bases(question: Question, wanted: _Wanted) -> Iterator[Ladder]:
    """Yield another base; a base for a nucleophile with a proton to give; a base instead of one, for an alkene."""
    nucleophile = question.nucleophile
    for base in _table().bases:
        new = base.ingredient
        if question.base is not None:
            if not _is_same(new, question.base) and _takes_proton(new, nucleophile):
                yield from _with_base(question, replace(question, base=new), base, _named(question.base))
        elif nucleophile is not None:
            if not base.eliminates and _can_give_proton(nucleophile) and _takes_proton(new, nucleophile):
                yield from _with_base(question, replace(question, base=new), base, None)
            if base.eliminates and not wanted.needs_nucleophile and not _is_same(new, nucleophile):
                yield from _with_base(question, replace(question, nucleophile=new), base, _named(nucleophile))


def _with_base(asked: Question, changed: Question, base: "_BenchBase", old: str | None) -> Iterator[Ladder]:
    """Yield the change, in the first of its own solvents that suits where the present one does not."""
    text = f"{base.name} added as base" if old is None else f"{base.name} in place of {old}"
    if _is_sensible(changed, asked):
        yield [_Change((ChangeKind.BASE,), text, changed)]
        return
    for solvent in base.solvents:
        moved = replace(changed, solvent=((solvent, 1.0),))
        if _is_sensible(moved, asked):
            now = _mixture(asked.solvent)
            both = f"{base.name} added as base, in {solvent.name} in place of {now}"
            if old is not None:
                both = f"{base.name} in {solvent.name} in place of {old} in {now}"
            yield [_Change((ChangeKind.BASE, ChangeKind.SOLVENT), both, moved)]
            return


def _nucleophiles(question: Question, _: _Wanted) -> Iterator[Ladder]:
    """Yield the acid of an anionic nucleophile with a weak base: the same attacking atom, less basic."""
    anion = question.nucleophile
    if anion is None or question.base is not None:
        return
    acid = neutral_form(anion.structure)
    kinds, acid_kinds = _kinds_of(anion.structure), _kinds_of(acid)
    if acid.charge or acid.heavy_atom_count <= _NO_POISON_GAS or not kinds or not acid_kinds:
        return
    if load_kinds()[acid_kinds[0]].anion != kinds[0]:
        return
    weak = next(base for base in _table().bases if base.name == _WEAK_BASE)
    new = Ingredient(acid.smiles, acid)
    text = f"{_named(new)} and {weak.name} in place of {_named(anion)}"
    yield [_Change((ChangeKind.NUCLEOPHILE,), text, replace(question, nucleophile=new, base=weak.ingredient))]


def _leaving_groups(question: Question, _: _Wanted) -> Iterator[Ladder]:
    """Yield the substrate with another group on the same carbon, configuration kept, where just one can be meant."""
    exchangeable = HALIDES | _OTHER_SULFONATES | _table().leaving_groups.keys()
    sites = [
        site
        for site in perceive_sites(question.substrate)
        if site.leaving_group in exchangeable and site.hybridisation is Hybridisation.SP3
    ]
    if len(sites) != 1 or sites[0].multiplicity != 1:
        return
    site = sites[0]
    for name, anion in _table().leaving_groups.items():
        if name != site.leaving_group and _is_stable(site, name):
            substrate = substitute(question.substrate, site, attacking_atoms(anion)[0], inversion=False).product
            text = f"{name} in place of {site.leaving_group}"
            yield [_Change((ChangeKind.LEAVING_GROUP,), text, replace(question, substrate=substrate))]


_LADDERS: Mapping[ChangeKind, Callable[[Question, _Wanted], Iterator[Ladder]]] = {
    ChangeKind.TEMPERATURE: _temperatures,
    ChangeKind.EQUIVALENTS: _equivalents,
    ChangeKind.TIME: _times,
    ChangeKind.CONCENTRATION: _concentrations,
    ChangeKind.SOLVENT: _solvents,
    ChangeKind.BASE: _bases,
    ChangeKind.NUCLEOPHILE: _nucleophiles,
    ChangeKind.LEAVING_GROUP: _leaving_groups,
}


# --- what is sensible -------------------------------------------------------------------------------------------------


def _is_sensible(changed: Question, asked: Question) -> bool:
    """Say whether a flask is liquid and holds nothing that must not meet; what was asked for is not held against it."""
    if (changed.solvent, changed.temperature_k) != (asked.solvent, asked.temperature_k):
        low, high = _liquid_c(changed.solvent)
        if not low <= changed.temperature_k + ABSOLUTE_ZERO_C <= high:
            return False
    already = set(_bad_pairs(asked))
    return not any(pair.is_never or (pair, solvent) not in already for pair, solvent in _bad_pairs(changed))


def _liquid_c(parts: Parts) -> tuple[float, float]:
    """Return from where to where (°C) a solvent is used: the range of its row, else where it is surely liquid."""
    if not parts:
        return _NEAT_C
    for known, limits in _table().ranges.items():
        if _recipe(known) == _recipe(parts):
            return limits
    return freezing_point_c(parts)[1], boiling_point_c(parts)[0]


def _bad_pairs(question: Question) -> Iterator[tuple["_BadPair", str]]:
    """Yield what must not meet and does, with the solvent."""
    charged = [i.structure for i in (question.nucleophile, question.base) if i is not None]
    doses = [dose.reagent for dose in question.additives]
    words = {kind for structure in charged for kind in _kinds_of(structure)} | {str(r.role) for r in doses}
    words |= {kind for r in doses if r.smiles for kind in _kinds_of(parse_smiles(r.smiles))}
    own_acids = {neutral_form(structure).smiles for structure in charged}
    for pair in _table().bad_pairs:
        if pair.what & words:
            for solvent, _ in question.solvent:
                if {solvent.name, str(solvent.kind)} & pair.solvents and solvent.smiles not in own_acids:
                    yield pair, solvent.name


def _is_stable(site: ReactiveSite, group: str) -> bool:
    """Say whether a chemist can have this group on this carbon in a bottle.

    Tertiary iodides and sulfonates, and sulfonates that ionise as fast (secondary benzylic; alpha to oxygen, nitrogen
    or sulfur), cannot be kept. Common practice, no source.
    """
    if site.degree is Degree.TERTIARY:
        return group in {"chloride", "bromide"}
    if group in HALIDES:
        return True
    ionises = {"alpha-alkoxy", "alpha-amino", "alpha-thio", "alpha-amido"} & site.classes
    return not ionises and not (site.degree is Degree.SECONDARY and "benzylic" in site.classes)


def _can_give_proton(ingredient: Ingredient) -> bool:
    kinds = _kinds_of(ingredient.structure)
    return bool(kinds) and load_kinds()[kinds[0]].anion is not None


def _takes_proton(base: Ingredient, nucleophile: Ingredient | None) -> bool:
    """Say whether a base is not too weak for a nucleophile; one without a proton to give is no objection.

    Charges part badly in organic solvents, so an amine takes the proton of carboxylic acids and thiophenols, not that
    of phenols (pKa in DMSO 9.0 for triethylammonium, 18.0 for phenol: bordwell-1988, from memory).
    """
    if nucleophile is None or "amine, tertiary" not in _kinds_of(base.structure) or not _can_give_proton(nucleophile):
        return True
    row = nucleophile_by_structure(nucleophile.structure.smiles)
    known = None if row is None else row.pka_acid
    pka = known if known is not None else load_kinds()[_kinds_of(nucleophile.structure)[0]].acid_pka
    return pka is None or pka <= _AMINE_TAKES_PKA


def _kinds_of(structure: Structure) -> list[str]:
    """Return the kinds a species attacks as, the usual one first."""
    return [nucleophile.kind for nucleophile in attacking_atoms(structure)]


def _is_same(one: Ingredient, other: Ingredient) -> bool:
    return one.structure.without_counter_ions == other.structure.without_counter_ions


def _recipe(parts: Parts) -> frozenset[tuple[str, int]]:
    """Return the solvents of a mixture by name, with their share in whole percent."""
    total = sum(share for _, share in parts)
    return frozenset((solvent.name, round(100 * share / total)) for solvent, share in parts)


# --- words ------------------------------------------------------------------------------------------------------------


def _named(ingredient: Ingredient) -> str:
    row = nucleophile_by_structure(ingredient.structure.smiles)
    return ingredient.name if row is None else row.name


def _mixture(parts: Parts) -> str:
    if not parts:
        return "no solvent"
    if len(parts) == 1:
        return parts[0][0].name
    total = sum(share for _, share in parts)
    return " and ".join(f"{100 * share / total:.3g} % {solvent.name}" for solvent, share in parts)


def _hours(hours: float) -> str:
    return f"{hours:.3g} h" if hours >= 1 else f"{60 * hours:.3g} min"


# --- the table --------------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _BenchBase:
    name: str
    ingredient: Ingredient
    solvents: tuple[Solvent, ...]
    eliminates: bool


@dataclass(frozen=True, slots=True)
class _BadPair:
    """what: kinds of nucleophile and roles of reagents. solvents: names, and kinds for all of a kind."""

    what: frozenset[str]
    solvents: frozenset[str]
    is_never: bool


@dataclass(frozen=True, slots=True)
class _Table:
    """ranges: bench solvents, each with its temperatures in °C. leaving_groups: their anions by name."""

    ranges: Mapping[Parts, tuple[float, float]]
    bases: tuple[_BenchBase, ...]
    leaving_groups: Mapping[str, Structure]
    bad_pairs: tuple[_BadPair, ...]


@cache
def _table() -> _Table:
    """Return the table.

    Raises ValueError for a wrong header, an unknown role, solvent, base or kind, a name given twice in one role, and a
    temperature range outside that where the solvent is liquid.
    """
    return _read(table_text("builder.mechanism", "improvements.tsv"))


_NAME = "improvements.tsv"
_COLUMNS = ("role", "name", "smiles", "lowest_c", "highest_c", "solvents", "reason", "source")
_ROLES = frozenset({"solvent", "base", "eliminating base", "leaving group", "avoid", "never"})


def _read(text: str) -> _Table:
    rows = list(rows_of(_NAME, text, _COLUMNS))
    refuse_twice(_NAME, "row", ["{role} {name} {solvents}".format(**row) for row in rows])
    if unknown := {row["role"] for row in rows} - _ROLES:
        raise ValueError(f"{_NAME}: unknown role {', '.join(sorted(unknown))}")
    return _Table(
        ranges=dict(_range(row) for row in rows if row["role"] == "solvent"),
        bases=tuple(_base(row) for row in rows if row["role"].endswith("base")),
        leaving_groups={row["name"]: parse_smiles(row["smiles"]) for row in rows if row["role"] == "leaving group"},
        bad_pairs=tuple(_bad_pair(row) for row in rows if row["role"] in {"avoid", "never"}),
    )


def _range(row: Mapping[str, str]) -> tuple[Parts, tuple[float, float]]:
    parts = []
    for cell in row["name"].split("|"):
        name, _, share = cell.rpartition(" ")
        parts.append((_solvent(name or cell), float(share) if name else 1.0))
    low, high = float(row["lowest_c"]), float(row["highest_c"])
    if not max(solvent.mp_c for solvent, _ in parts) <= low < high <= min(solvent.bp_c for solvent, _ in parts):
        raise ValueError(f"{_NAME}: {row['name']} is not liquid from {low:g} to {high:g} °C")
    return tuple(parts), (low, high)


def _base(row: Mapping[str, str]) -> _BenchBase:
    found = find_nucleophile_and_counter_ion(row["name"])
    if found is None:
        raise ValueError(f"{_NAME}: unknown base {row['name']}")
    species, counter_ion = found
    ingredient = Ingredient(species.name, parse_smiles(species.smiles), counter_ion)
    solvents = tuple(_solvent(name) for name in row["solvents"].split("|"))
    return _BenchBase(row["name"], ingredient, solvents, row["role"] == "eliminating base")


def _bad_pair(row: Mapping[str, str]) -> _BadPair:
    what, solvents = frozenset(row["name"].split("|")), frozenset(row["solvents"].split("|"))
    if unknown := what - load_kinds().keys() - set(Role):
        raise ValueError(f"{_NAME}: {', '.join(sorted(unknown))}: neither a kind of nucleophile nor a role")
    named = {name if name in set(SolventKind) else _solvent(name).name for name in solvents}
    return _BadPair(what, frozenset(named), row["role"] == "never")


def _solvent(name: str) -> Solvent:
    solvent = find_solvent(name)
    if solvent is None:
        raise ValueError(f"{_NAME}: unknown solvent {name}")
    return solvent
