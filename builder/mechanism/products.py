"""Which products follow from a substrate and what is in the flask, and by which transformations.

No rates here: a route says that a product can be made by substitution, elimination, shift, transposition, ring
closure or opening, addition or fragmentation, in at most two such events after each other; nitrogen, sulfur and
phosphorus are alkylated up to four times.
"""

from collections.abc import Container, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from functools import lru_cache, partial
from itertools import islice
from typing import TypeVar

from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import (
    Nucleophile,
    ReactiveSite,
    attacking_atoms,
    neighbouring_groups,
    perceive_sites,
)
from builder.chemistry.rewrites import ActsOn, load_rewrites, rewritten
from builder.chemistry.structure import Atom, AtomId, Structure, StructureError
from builder.chemistry.transform import (
    Cation,
    Edit,
    StereoEffect,
    UnbalancedTransformation,
    add_hx,
    add_x2,
    allylic_forms,
    capture,
    cyclise,
    eliminate,
    fragment,
    ionise,
    lose_proton,
    migrating_groups,
    protonate,
    shift_12,
    substitute,
    transpose_allylic,
)
from builder.mechanism.flask_roles import FlaskRole, roles_in
from builder.mechanism.reaction import SiteInPlay
from builder.mechanism.rules import Gate, closing_gates
from builder.mechanism.screen import Screen, screen_for
from builder.records.vocabulary import Mechanism

__all__ = ["MEET_IN_ONE_PRODUCT", "Event", "Route", "Search", "search_routes"]

MEET_IN_ONE_PRODUCT = 4
"""How many molecules of one reagent at most end up in one molecule of product: a quaternary ammonium takes four."""

MAX_SHIFTS = 3
MAX_CATIONS = 60  # of one ionisation; a steroid's skeleton has no more within three shifts
MAX_INTERMEDIATES = 40  # products of the first event that may react once more
MAX_REPEATED = 12  # products of the second alkylation, and of the third, that may be alkylated once more
_ELIMINATIONS = (StereoEffect.ANTI, StereoEffect.SYN, StereoEffect.NOT_DETERMINED)
HALOGENS = frozenset({"BrBr", "ClCl", "II"})

T = TypeVar("T")

BUDGET = 20_000
"""Heavy atoms that the edits of one search may touch: about a second, or 1,000 edits of an ordinary molecule."""


class Event(StrEnum):
    """One step of a route."""

    SUBSTITUTION = "substitution"
    TRANSPOSITION = "allylic transposition"
    RING_CLOSURE = "ring closure"
    ELIMINATION = "elimination"
    IONISATION = "ionisation"
    SHIFT = "1,2-shift"
    ADDITION = "addition"
    FRAGMENTATION = "fragmentation"
    HYDROLYSIS = "hydrolysis"


_MECHANISMS = {
    Event.SUBSTITUTION: (Mechanism.SN2, Mechanism.SN1),
    Event.TRANSPOSITION: (Mechanism.SN2_PRIME, Mechanism.SN1),
    Event.RING_CLOSURE: (Mechanism.NGP, Mechanism.SN1),
    Event.ELIMINATION: (Mechanism.E2, Mechanism.E1, Mechanism.E1CB),
    Event.ADDITION: (Mechanism.ADE,),
}
"""The mechanisms by which a first event can go; it is closed where the gates close them all."""


@dataclass(frozen=True, slots=True)
class Route:
    """One way to a product.

    start: the molecule the first event starts from. site: where it starts.
    effect: what the last event does to the configuration.
    arrives: atoms of the product that came with the nucleophile of the last event.
    closed_by: gates that close every mechanism of one of its events; empty for a route that is open.
    """

    start: Structure
    site: ReactiveSite
    events: tuple[Event, ...]
    product: Structure
    effect: StereoEffect
    arrives: frozenset[AtomId] = frozenset()
    closed_by: tuple[Gate, ...] = ()

    @property
    def eliminates(self) -> bool:
        """Say whether the route ends in an elimination."""
        return self.events[-1] is Event.ELIMINATION


class _BudgetSpentError(Exception):
    """The search has cost what a search may cost."""


@dataclass(slots=True)
class _Budget:
    """Work that a search may still do, in heavy atoms edited."""

    left: int

    def spend(self, cost: int) -> None:
        """Take off what an edit costs.

        Raises _BudgetSpentError once nothing is left.
        """
        self.left -= cost
        if self.left < 0:
            raise _BudgetSpentError


@dataclass(frozen=True, slots=True)
class _Flask:
    """Everything charged beside the substrate, and the budget of the search that carries out edits with it.

    screen: says which edits are carried out at all; None carries out every one.
    """

    species: tuple[Structure, ...]
    budget: _Budget
    screen: Screen | None = None

    def with_more(self, freed: Iterable[Structure]) -> "_Flask":
        """Return the flask after something has been set free in it; the budget is shared."""
        return replace(self, species=(*self.species, *freed))

    def lets_attack(self, nucleophile: Nucleophile) -> bool:
        """Say whether a nucleophile acts in this flask: a weak carbon acid only does beside a strong base."""
        return not nucleophile.needs_strong_base or FlaskRole.STRONG_BASE in roles_in(self.species)

    def one(self, edit: "partial[T]") -> tuple[T, ...]:
        """Return what an edit makes; nothing where it would lose atoms or outgrow all bounds: that is no way at all."""
        if self.screen is not None and not self.screen(edit):
            return ()
        changed = edit.args[0]
        self.budget.spend((changed.structure if isinstance(changed, Cation) else changed).heavy_atom_count)
        try:
            return (edit(),)
        except (UnbalancedTransformation, StructureError):
            return ()

    def several(self, edits: "partial[tuple[T, ...]]") -> tuple[T, ...]:
        """Return what a family of edits makes, as `one` does."""
        return tuple(each for made in self.one(edits) for each in made)


_Step = tuple[Route, tuple[Structure, ...]]
"""A route, and what its last event sets free."""


def _rounds(sites: tuple[SiteInPlay, ...], flask: _Flask) -> Iterator[Iterator[Route]]:
    """Yield the routes round by round, each round longer and dearer than the one before.

    What the first event sets free attacks in the second.
    """
    first: list[_Step] = []
    yield _kept(first, (made for each in sites for made in _from_site(each, flask)))
    yield (route for each in sites if _ionises(each) for route in _through_cations(each.on, each.site, flask))
    intermediates: dict[Structure, _Step] = {}
    for route, freed in first:
        if not route.closed_by:
            intermediates.setdefault(route.product, (route, freed))
    kept = list(islice(intermediates.values(), MAX_INTERMEDIATES))
    yield _alkylated_again([route for route, _ in kept], flask, sites)
    yield (further for route, freed in kept for further in _second_events(route, flask.with_more(freed), sites))


def _kept(steps: list[_Step], made: Iterable[_Step]) -> Iterator[Route]:
    """Yield routes as they are made, and keep them with what they set free."""
    for step in made:
        steps.append(step)
        yield step[0]


@dataclass(frozen=True, slots=True)
class Search:
    """The routes found to each product; was_cut says that the budget ended before every way had been tried."""

    routes: tuple[tuple[Route, ...], ...]
    was_cut: bool


@lru_cache(maxsize=128)
def search_routes(
    products: tuple[Structure, ...], sites: tuple[SiteInPlay, ...], species: tuple[Structure, ...]
) -> Search:
    """Return, for each product, the routes of the shortest kind that give its constitution; empty where none does.

    species: everything charged beside the substrate. Salts and free compounds are one, configurations are left to
    the caller. Each round (one event, through a cation, alkylation over again, two events) is only entered while a
    product is still without an open route; closed ones are given only where there is no open one. The budget counts
    work, not time, so that a search ends alike on every machine.
    """
    neutral = [_with_pieces(product) for product in products]
    wanted = [{each.flat_smiles for each in structures} for structures in neutral]
    screen = screen_for(each for structures in neutral for each in structures)
    near = _found(wanted, islice(_rounds(sites, _Flask(species, _Budget(BUDGET), screen)), 1))
    if all(routes and not routes[0].closed_by for routes in near.routes):
        return near  # most products take one event, and few of the edits can give their atoms
    return _found(wanted, _rounds(sites, _Flask(species, _Budget(BUDGET))))


def _found(wanted: Sequence[Container[str]], rounds: Iterable[Iterator[Route]]) -> Search:
    """Return the routes to each of the constitutions wanted, entering a round only where one is still needed."""
    found: list[list[Route]] = [[] for _ in wanted]
    was_cut = False
    try:
        for one_round in rounds:
            open_places = [place for place, routes in enumerate(found) if all(route.closed_by for route in routes)]
            if not open_places:
                break
            for route in one_round:
                made = neutral_form(route.product).flat_smiles
                for place in open_places:
                    if made in wanted[place]:
                        found[place].append(route)
    except _BudgetSpentError:
        was_cut = True
    return Search(tuple(tuple(r for r in routes if not r.closed_by) or tuple(routes) for routes in found), was_cut)


def _with_pieces(product: Structure) -> frozenset[Structure]:
    """Return the neutral form of a recorded product and of each of its pieces."""
    return frozenset(neutral_form(piece) for piece in (*product.fragments, product))


# --- one event --------------------------------------------------------------------------------------------


def _from_site(each: SiteInPlay, flask: _Flask) -> Iterator[_Step]:
    shut: dict[Event, tuple[Gate, ...]] = {}
    for route, others in _events_at(each.on, each.site, flask):
        event = route.events[-1]
        if event not in shut:
            shut[event] = _closing(each, event)
        yield replace(route, closed_by=shut[event]) if shut[event] else route, others


def _closing(each: SiteInPlay, event: Event) -> tuple[Gate, ...]:
    """Return the gates that close an event at a site; empty where one of its mechanisms is open."""
    ways = _MECHANISMS.get(event, ())
    if 3 in each.site.ring_sizes:  # a cyclopropyl cation opens before anything is captured, seen among the cations
        ways = tuple(mechanism for mechanism in ways if mechanism is not Mechanism.SN1)
    gates = [closing_gates(mechanism, each.situation) for mechanism in ways]
    return tuple(dict.fromkeys(gate for some in gates for gate in some)) if all(gates) else ()


def _events_at(start: Structure, site: ReactiveSite, flask: _Flask) -> Iterator[_Step]:
    if site.is_addition:
        yield from _additions(start, site, flask)
        return
    has_stereo = start.stereocentres.specified > 0
    for nucleophile in _attackers(flask):
        inverting = partial(substitute, start, site, nucleophile)
        for way in (inverting, partial(inverting, inversion=False)) if has_stereo else (inverting,):
            for edit in flask.one(way):
                yield from _products_of(start, site, (Event.SUBSTITUTION,), edit)
        for edit in flask.several(partial(transpose_allylic, start, site, nucleophile)):
            yield from _products_of(start, site, (Event.TRANSPOSITION,), edit)
    out_of_reach = {site.alpha_carbon, *(atom for atom, _ in start.atoms[site.alpha_carbon].neighbours)}
    for group in neighbouring_groups(start):
        if group.atom not in out_of_reach:
            for edit in flask.one(partial(cyclise, start, site, group)):
                yield from _products_of(start, site, (Event.RING_CLOSURE,), edit)
    for beta in site.beta_with_hydrogen:
        for effect in _ELIMINATIONS if has_stereo or site.ring_sizes else _ELIMINATIONS[:1]:
            for edit in flask.several(partial(eliminate, start, site, beta.atom, effect=effect)):
                yield from _products_of(start, site, (Event.ELIMINATION,), edit)
    yield from ((route, ()) for route in _rewrites(start, site, (), start, ActsOn.SUBSTRATE, flask))


def _rewrites(
    start: Structure,
    site: ReactiveSite,
    events: tuple[Event, ...],
    reached: Structure,
    acts_on: ActsOn,
    flask: _Flask,
) -> Iterator[Route]:
    """Yield the routes that end in a row of rewrites.tsv, where the flask holds what it takes."""
    for row in load_rewrites():
        if row.acts_on is acts_on and (row.role is None or row.role in roles_in(flask.species)):
            pieces = (piece for made in rewritten(reached, row) for piece in made.fragments if _has_carbon(piece))
            yield from (
                Route(start, site, (*events, Event(row.kind)), each, StereoEffect.NOT_DETERMINED) for each in pieces
            )


def _additions(start: Structure, site: ReactiveSite, flask: _Flask) -> Iterator[_Step]:
    if _is_better_cation(start, site) or FlaskRole.RADICAL_INITIATOR in roles_in(flask.species):
        for nucleophile in _attackers(flask):
            for edit in flask.several(partial(add_hx, start, site, nucleophile)):
                yield from _products_of(start, site, (Event.ADDITION,), edit)
    for molecule in flask.species:
        if molecule.smiles in HALOGENS:
            for edit in flask.several(partial(add_x2, start, site, molecule)):
                yield from _products_of(start, site, (Event.ADDITION,), edit)


def _is_better_cation(start: Structure, site: ReactiveSite) -> bool:
    """Say whether this end of a multiple bond bears the positive charge at least as well as the other: Markovnikov."""
    partner = site.partner
    return partner is None or _support(start, site.alpha_carbon, partner) >= _support(start, partner, site.alpha_carbon)


def _support(structure: Structure, end: AtomId, other: AtomId) -> int:
    """Return how well the neighbours of one end support a charge: donors 2, carbon 1, an acceptor -1 each."""
    atoms = structure.atoms
    return sum(_support_by(structure, atoms[near], end) for near, _ in atoms[end].neighbours if near != other)


def _support_by(structure: Structure, near: Atom, end: AtomId) -> int:
    beyond = [(structure.atoms[far].symbol, order) for far, order in near.neighbours if far != end]
    if near.symbol in {"N", "O", "S"}:
        return 2 if not near.charge else -1
    if near.symbol != "C":
        return 0
    if any(order >= 2.0 and symbol in {"O", "N"} for symbol, order in beyond) and not near.aromatic:
        return -1
    if sum(symbol in {"F", "Cl", "Br", "I"} for symbol, _ in beyond) >= 2:
        return -1
    return 2 if near.aromatic or any(order > 1.0 for _, order in beyond) else 1


def _can_add(flask: _Flask) -> bool:
    """Say whether something charged adds to a multiple bond by itself: a hydrogen halide or a halogen."""
    return any(each.smiles in HALOGENS for each in flask.species) or any(
        nucleophile.kind == "hydrogen halide" for nucleophile in _attackers(flask)
    )


def _attackers(flask: _Flask) -> Iterator[Nucleophile]:
    """Yield each atom that attacks in the flask once."""
    seen: set[tuple[Structure, int]] = set()
    for each in flask.species:
        for nucleophile in attacking_atoms(each):
            key = (nucleophile.species, nucleophile.atom)
            if key not in seen and flask.lets_attack(nucleophile):
                seen.add(key)
                yield nucleophile


def _products_of(start: Structure, site: ReactiveSite, events: tuple[Event, ...], edit: Edit) -> Iterator[_Step]:
    """Yield the route to the product of an edit, and those to the carbon-bearing pieces that leave.

    A leaving piece can be the product sought: the phenol of an ether cleavage, the acid of an ester.
    """
    arrives = frozenset(edit.from_nucleophile.values())
    yield Route(start, site, events, edit.product, edit.effect, arrives), edit.others
    for piece in edit.others:
        if _has_carbon(piece):
            yield Route(start, site, events, piece, StereoEffect.NOT_APPLICABLE), (edit.product,)


def _has_carbon(piece: Structure) -> bool:
    return any(atom.symbol == "C" for atom in piece.atoms)


# --- through a cation -------------------------------------------------------------------------------------


def _ionises(each: SiteInPlay) -> bool:
    return not closing_gates(Mechanism.SN1, each.situation)


def _through_cations(start: Structure, site: ReactiveSite, flask: _Flask) -> Iterator[Route]:
    attackers = tuple(_attackers(flask))
    for cation, events in _cations(flask.one(partial(protonate if site.is_addition else ionise, start, site)), flask):
        yield from _rewrites(start, site, events, cation.structure, ActsOn.CATION, flask)
        if not _is_stable(cation):
            continue  # a primary cation only hands its charge on
        for nucleophile in attackers:
            for edit in flask.several(partial(capture, cation, nucleophile)):
                yield from (route for route, _ in _products_of(start, site, (*events, Event.SUBSTITUTION), edit))
        for atom in _neighbours(cation):
            for edit in flask.several(partial(lose_proton, cation, atom)):
                yield from (route for route, _ in _products_of(start, site, (*events, Event.ELIMINATION), edit))


def _cations(first: tuple[Cation, ...], flask: _Flask) -> Iterator[tuple[Cation, tuple[Event, ...]]]:
    """Yield the cation and what up to three 1,2-shifts and allylic resonance make of it, breadth first."""
    level: list[tuple[Cation, tuple[Event, ...]]] = [(cation, (Event.IONISATION,)) for cation in first]
    seen = {cation.structure for cation in first}
    for _ in range(MAX_SHIFTS + 1):
        following: list[tuple[Cation, tuple[Event, ...]]] = []
        for cation, events in level:
            yield cation, events
            groups, bonds = migrating_groups(cation), _small_ring_bonds(cation)
            shifted = ((made, Event.SHIFT) for pair in groups for made in flask.one(partial(shift_12, cation, *pair)))
            opened = ((made, Event.SHIFT) for pair in bonds for made in flask.one(partial(fragment, cation, *pair)))
            resonant = ((form, Event.TRANSPOSITION) for form in flask.several(partial(allylic_forms, cation)))
            for made, event in (*resonant, *shifted, *opened):
                if made.structure not in seen and len(seen) < MAX_CATIONS and _is_stable(made):
                    seen.add(made.structure)
                    following.append((made, (*events, event)))
        level = following


def _is_stable(cation: Cation) -> bool:
    """Say whether the centre has two carbons, or shares electrons with a neighbour or a double bond next to that.

    The last is homoallyl, another drawing of the cyclopropylmethyl cation. A centre in a three-membered ring only
    opens it.
    """
    atoms = cation.structure.atoms
    centre = atoms[cation.centre]
    if 3 in centre.ring_sizes:
        return False
    neighbours = [atoms[atom] for atom, _ in centre.neighbours]
    shares = any(
        n.aromatic or n.symbol in {"N", "O", "S"} or 3 in n.ring_sizes or _is_unsaturated(n) for n in neighbours
    )
    homoallyl = any(
        any(order == 2.0 and atoms[end].symbol == "C" for end, order in atoms[far].neighbours)
        for n in neighbours
        for far, _ in n.neighbours
    )
    return len(neighbours) >= 2 or shares or homoallyl


def _small_ring_bonds(cation: Cation) -> Iterator[tuple[int, int]]:
    """Yield the bonds of a three-membered ring beside or opposite the centre.

    Cyclopropylmethyl opens to homoallyl, cyclopropyl to allyl.
    """
    atoms = cation.structure.atoms
    around = {atom for atom, _ in atoms[cation.centre].neighbours}
    for near in sorted(around):
        if 3 in atoms[near].ring_sizes:
            beyond = {atom for atom, _ in atoms[near].neighbours if 3 in atoms[atom].ring_sizes}
            opposite = 3 in atoms[cation.centre].ring_sizes
            ends = beyond & around if opposite else beyond - around
            yield from ((near, far) for far in sorted(ends - {cation.centre}))


def _is_unsaturated(atom: Atom) -> bool:
    return any(order > 1.0 for _, order in atom.neighbours)


def _neighbours(cation: Cation) -> tuple[int, ...]:
    return tuple(atom for atom, _ in cation.structure.atoms[cation.centre].neighbours)


# --- a second event ---------------------------------------------------------------------------------------


def _second_events(route: Route, flask: _Flask, in_play: tuple[SiteInPlay, ...]) -> Iterator[Route]:
    intermediate = route.product
    activated = any(each.is_activated for each in in_play)
    for site in perceive_sites(intermediate):
        if site.is_addition and not _can_add(flask):
            continue
        for further, _ in _from_site(SiteInPlay(intermediate, site, activated), flask):
            yield replace(further, start=route.start, site=route.site, events=(*route.events, *further.events))
    yield from _rewrites(route.start, route.site, route.events, intermediate, ActsOn.PRODUCT, flask)


def _alkylated_again(level: list[Route], flask: _Flask, in_play: tuple[SiteInPlay, ...]) -> Iterator[Route]:
    """Yield what products give with further molecules of substrate; N, S and P take up to four in all.

    A product of a closed way only is yielded, but not alkylated further.
    """
    partners = [(each, _closing(each, Event.SUBSTITUTION)) for each in in_play if not each.site.is_addition]
    seen = {route.product for route in level}
    for taken in range(2, MEET_IN_ONE_PRODUCT + 1):
        following: dict[Structure, Route] = {}
        for reached, (each, gates) in ((route, partner) for route in level for partner in partners):
            for nucleophile in attacking_atoms(reached.product):
                repeats = taken == 2 or nucleophile.symbol in {"N", "S", "P"}
                if repeats and flask.lets_attack(nucleophile):
                    for edit in flask.one(partial(substitute, each.on, each.site, nucleophile)):
                        events = (*reached.events, Event.SUBSTITUTION)
                        route = Route(reached.start, reached.site, events, edit.product, edit.effect, closed_by=gates)
                        if following.setdefault(edit.product, route).closed_by:
                            following[edit.product] = route
        made = [route for product, route in following.items() if product not in seen]
        yield from made
        seen |= following.keys()
        level = [route for route in made if not route.closed_by][:MAX_REPEATED]
