"""Which products follow from a substrate and what is in the flask, and by which transformations.

No rates here: a route says that a product can be made by substitution, elimination, shift, transposition, ring
closure or opening, or addition, in at most two such events after each other.
"""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from enum import StrEnum
from functools import lru_cache
from itertools import islice

from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import (
    Nucleophile,
    ReactiveSite,
    attacking_atoms,
    neighbouring_groups,
    perceive_sites,
)
from builder.chemistry.structure import Atom, AtomId, Structure
from builder.chemistry.transform import (
    Cation,
    Edit,
    StereoEffect,
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
from builder.mechanism.reaction import SiteInPlay
from builder.mechanism.rules import Situation, closing_gates
from builder.records.vocabulary import Mechanism

__all__ = ["Event", "Route", "routes_to"]

MAX_SHIFTS = 3
MAX_CATIONS = 60  # of one ionisation; a steroid's skeleton has no more within three shifts
MAX_INTERMEDIATES = 40  # products of the first event that may react once more
_ELIMINATIONS = (StereoEffect.ANTI, StereoEffect.SYN, StereoEffect.NOT_DETERMINED)
HALOGENS = frozenset({"BrBr", "ClCl", "II"})


class Event(StrEnum):
    """One step of a route."""

    SUBSTITUTION = "substitution"
    TRANSPOSITION = "allylic transposition"
    RING_CLOSURE = "ring closure"
    ELIMINATION = "elimination"
    IONISATION = "ionisation"
    SHIFT = "1,2-shift"
    ADDITION = "addition"


@dataclass(frozen=True, slots=True)
class Route:
    """One way to a product.

    start: the molecule the first event starts from. site: where it starts.
    effect: what the last event does to the configuration.
    arrives: atoms of the product that came with the nucleophile of the last event.
    """

    start: Structure
    site: ReactiveSite
    events: tuple[Event, ...]
    product: Structure
    effect: StereoEffect
    arrives: frozenset[AtomId] = frozenset()

    @property
    def eliminates(self) -> bool:
        """Say whether the route ends in an elimination."""
        return self.events[-1] is Event.ELIMINATION

    @property
    def rearranges(self) -> bool:
        """Say whether the skeleton or the place of the new bond changes on the way."""
        return Event.SHIFT in self.events or Event.TRANSPOSITION in self.events


def _stages(sites: tuple[SiteInPlay, ...], flask: tuple[Structure, ...]) -> Iterator[Iterator[Route]]:
    """Yield the routes stage by stage, each stage longer and dearer than the one before.

    flask: everything charged beside the substrate; what the first event sets free attacks in the second.
    """
    first = [made for each in sites for made in _from_site(each.on, each.site, flask)]
    yield (route for route, _ in first)
    yield (route for each in sites if _ionises(each) for route in _through_cations(each.on, each.site, flask))
    intermediates: dict[Structure, tuple[Route, tuple[Structure, ...]]] = {}
    for route, freed in first:
        intermediates.setdefault(route.product, (route, freed))
    yield (
        further
        for route, freed in islice(intermediates.values(), MAX_INTERMEDIATES)
        for further in _second_events(route, (*flask, *freed), sites)
    )


@lru_cache(maxsize=128)
def routes_to(
    products: tuple[Structure, ...], sites: tuple[SiteInPlay, ...], flask: tuple[Structure, ...]
) -> tuple[tuple[Route, ...], ...]:
    """Return, for each product, the routes of the shortest kind that give its constitution; empty where none does.

    Salts and free compounds are one, configurations are left to the caller. Each of the three stages (one event,
    through a cation, two events) is only entered while a product is still without a route.
    """
    wanted = [_constitutions(product) for product in products]
    found: list[list[Route]] = [[] for _ in products]
    for stage in _stages(sites, flask):
        open_places = [place for place, routes in enumerate(found) if not routes]
        if not open_places:
            break
        for route in stage:
            made = _constitution(route.product)
            for place in open_places:
                if made in wanted[place]:
                    found[place].append(route)
    return tuple(tuple(routes) for routes in found)


def _constitution(structure: Structure) -> str:
    return neutral_form(structure).flat_smiles


def _constitutions(product: Structure) -> set[str]:
    """Return the flat SMILES of a recorded product and of each of its pieces."""
    return {_constitution(piece) for piece in product.fragments} | {_constitution(product)}


# --- one event --------------------------------------------------------------------------------------------


def _from_site(
    start: Structure, site: ReactiveSite, species: tuple[Structure, ...]
) -> Iterator[tuple[Route, tuple[Structure, ...]]]:
    if site.is_addition:
        yield from _additions(start, site, species)
        return
    has_stereo = start.stereocentres.specified > 0
    for nucleophile in _attackers(species):
        for inversion in (True, False) if has_stereo else (True,):
            edit = substitute(start, site, nucleophile, inversion=inversion)
            yield from _products_of(start, site, (Event.SUBSTITUTION,), edit)
        for edit in transpose_allylic(start, site, nucleophile):
            yield from _products_of(start, site, (Event.TRANSPOSITION,), edit)
    out_of_reach = {site.alpha_carbon, *(atom for atom, _ in start.atoms[site.alpha_carbon].neighbours)}
    for group in neighbouring_groups(start):
        if group.atom not in out_of_reach:
            edit = cyclise(start, site, group)
            yield from _products_of(start, site, (Event.RING_CLOSURE,), edit)
    for beta in site.beta_with_hydrogen:
        for effect in _ELIMINATIONS if has_stereo or site.ring_sizes else _ELIMINATIONS[:1]:
            for edit in eliminate(start, site, beta.atom, effect=effect):
                yield from _products_of(start, site, (Event.ELIMINATION,), edit)


def _additions(
    start: Structure, site: ReactiveSite, species: tuple[Structure, ...]
) -> Iterator[tuple[Route, tuple[Structure, ...]]]:
    for nucleophile in _attackers(species):
        for edit in add_hx(start, site, nucleophile):
            yield from _products_of(start, site, (Event.ADDITION,), edit)
    for molecule in species:
        if molecule.smiles in HALOGENS:
            for edit in add_x2(start, site, molecule):
                yield from _products_of(start, site, (Event.ADDITION,), edit)


def _can_add(species: Iterable[Structure]) -> bool:
    """Say whether something charged adds to a multiple bond by itself: a hydrogen halide or a halogen."""
    return any(each.smiles in HALOGENS for each in species) or any(
        nucleophile.kind == "hydrogen halide" for nucleophile in _attackers(species)
    )


def _attackers(species: Iterable[Structure]) -> Iterator[Nucleophile]:
    seen: set[tuple[Structure, int]] = set()
    for each in species:
        for nucleophile in attacking_atoms(each):
            key = (nucleophile.species, nucleophile.atom)
            if key not in seen:
                seen.add(key)
                yield nucleophile


def _products_of(
    start: Structure, site: ReactiveSite, events: tuple[Event, ...], edit: Edit
) -> Iterator[tuple[Route, tuple[Structure, ...]]]:
    """Yield the route to the product of an edit, and those to the carbon-bearing pieces that leave.

    A leaving piece can be the product sought: the phenol of an ether cleavage, the acid of an ester.
    """
    arrives = frozenset(edit.from_nucleophile.values())
    yield Route(start, site, events, edit.product, edit.effect, arrives), edit.others
    for piece in edit.others:
        if any(atom.symbol == "C" for atom in piece.atoms):
            yield Route(start, site, events, piece, StereoEffect.NOT_APPLICABLE), (edit.product,)


# --- through a cation -------------------------------------------------------------------------------------


def _ionises(each: SiteInPlay) -> bool:
    return not closing_gates(Mechanism.SN1, Situation(each.site, each.is_activated))


def _through_cations(start: Structure, site: ReactiveSite, species: tuple[Structure, ...]) -> Iterator[Route]:
    first = protonate(start, site) if site.is_addition else ionise(start, site)
    attackers = tuple(_attackers(species))
    for cation, events in _cations(first):
        if not _is_stable(cation):
            continue  # a primary cation only hands its charge on
        for nucleophile in attackers:
            for edit in capture(cation, nucleophile):
                yield from (route for route, _ in _products_of(start, site, (*events, Event.SUBSTITUTION), edit))
        for atom in _neighbours(cation):
            for edit in lose_proton(cation, atom):
                yield from (route for route, _ in _products_of(start, site, (*events, Event.ELIMINATION), edit))


def _cations(first: Cation) -> Iterator[tuple[Cation, tuple[Event, ...]]]:
    """Yield the cation and what up to three 1,2-shifts and allylic resonance make of it, breadth first."""
    level: list[tuple[Cation, tuple[Event, ...]]] = [(first, (Event.IONISATION,))]
    seen = {first.structure}
    for _ in range(MAX_SHIFTS + 1):
        following: list[tuple[Cation, tuple[Event, ...]]] = []
        for cation, events in level:
            yield cation, events
            shifted = ((shift_12(cation, origin, moving), Event.SHIFT) for origin, moving in migrating_groups(cation))
            resonant = ((form, Event.TRANSPOSITION) for form in allylic_forms(cation))
            opened = ((fragment(cation, near, far), Event.SHIFT) for near, far in _small_ring_bonds(cation))
            for made, event in (*resonant, *shifted, *opened):
                if made.structure not in seen and len(seen) < MAX_CATIONS and _is_stable(made):
                    seen.add(made.structure)
                    following.append((made, (*events, event)))
        level = following


def _is_stable(cation: Cation) -> bool:
    """Say whether the centre has two carbons, or a neighbour that shares electrons with it."""
    centre = cation.structure.atoms[cation.centre]
    neighbours = [cation.structure.atoms[atom] for atom, _ in centre.neighbours]
    shares = any(
        n.aromatic or n.symbol in {"N", "O", "S"} or 3 in n.ring_sizes or _is_unsaturated(n) for n in neighbours
    )
    return len(neighbours) >= 2 or shares


def _small_ring_bonds(cation: Cation) -> Iterator[tuple[int, int]]:
    """Yield the bonds of a three-membered ring next to the centre: cyclopropylmethyl opens to homoallyl."""
    atoms = cation.structure.atoms
    around = {atom for atom, _ in atoms[cation.centre].neighbours}
    for near in sorted(around):
        if 3 in atoms[near].ring_sizes:
            beyond = {atom for atom, _ in atoms[near].neighbours if 3 in atoms[atom].ring_sizes}
            yield from ((near, far) for far in sorted(beyond - around - {cation.centre}))


def _is_unsaturated(atom: Atom) -> bool:
    return any(order > 1.0 for _, order in atom.neighbours)


def _neighbours(cation: Cation) -> tuple[int, ...]:
    return tuple(atom for atom, _ in cation.structure.atoms[cation.centre].neighbours)


# --- a second event ---------------------------------------------------------------------------------------


def _second_events(route: Route, species: tuple[Structure, ...], in_play: tuple[SiteInPlay, ...]) -> Iterator[Route]:
    intermediate = route.product
    for site in perceive_sites(intermediate):
        if site.is_addition and not _can_add(species):
            continue
        for further, _ in _from_site(intermediate, site, species):
            yield replace(further, start=route.start, site=route.site, events=(*route.events, *further.events))
    for each in in_play:  # the product attacks another molecule of substrate
        for nucleophile in attacking_atoms(intermediate):
            if not each.site.is_addition:
                edit = substitute(each.on, each.site, nucleophile)
                yield Route(route.start, route.site, (*route.events, Event.SUBSTITUTION), edit.product, edit.effect)
