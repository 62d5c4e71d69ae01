"""Neighbouring groups: one displaces the leaving group from within; a ring stays, a bridged ion opens again."""

import math
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache, partial

from builder.chemistry.geometry import Relation, perceive_rings
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import (
    Degree,
    Nucleophile,
    ReactiveSite,
    SiteStereo,
    neighbouring_groups,
    perceive_sites,
)
from builder.chemistry.settling import hydrated_acyloxonium
from builder.chemistry.structure import AtomId, Structure
from builder.chemistry.transform import UnbalancedTransformation, capture, cyclise, ionise_with_shift, substitute
from builder.mechanism.cations import aryl_character
from builder.mechanism.departure import Departure
from builder.mechanism.faces import exo_face, exo_only, shifting_bond
from builder.mechanism.flask import NEUTRAL_PKA, Attacker, Flask
from builder.mechanism.ionising_power import Scale
from builder.mechanism.kinds import Kind, load_kinds
from builder.mechanism.log_rate import LogRate
from builder.mechanism.nucleophiles import nucleophile_by_structure
from builder.mechanism.pathways.ionisation import capture_weight
from builder.mechanism.pathways.pathway import Outcome, Pathway, alone, merged_outcomes
from builder.mechanism.pathways.substitution import hydrogen_bonding, site_features
from builder.mechanism.polarity import polarity_of
from builder.mechanism.rate_terms import Parameters, Term
from builder.mechanism.rules import closing_gates
from builder.mechanism.skeleton import skeleton_of
from builder.records.vocabulary import Course, Mechanism

__all__ = ["participation_pathways"]

LARGEST_RING = 8
_LEAST_WEIGHT = 0.02
"""Share of the capture of a bridged ion below which a nucleophile is left out."""
_LEAST_IONISED = -9.0
"""log10 of the share of the anion below which a neighbour counts as not ionised."""
_OPENED_FIRST = (
    "aziridinium",
    "episulfonium",
    "acyloxonium",
    "phenonium",
    "halonium",
    "trialkyloxonium",
    "carboxylate",
)
_TRANSIENT = frozenset(_OPENED_FIRST)
_ONIUM_RINGS = frozenset({"aziridinium", "episulfonium", "trialkyloxonium"})
"""Rings opened by attack from behind alone, which choose among nucleophiles as an alkyl halide does."""
_ONLY_AS_ANIONS = frozenset({"carbon acid", "carbon acid, weak", "alkyne", "imide", "sulfonamide", "dithioacetal"})
_HALIDES = frozenset({"chloride", "bromide", "iodide"})
_BRIDGES = frozenset({"arene", "alkene", "organohalide"})
"""Neighbours whose bridged ion, if it is symmetrical, has forgotten from where it came."""


def participation_pathways(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Pathway]:
    """Yield each way a group of the same molecule can displace the leaving group."""
    site, structure = departure.site, departure.structure
    if site.leaving_atom is None:
        return
    yield from _sigma(departure, flask, parameters)
    if closing_gates(Mechanism.NGP, departure.situation):
        return
    for group, size in reachable_groups(structure, site):
        terms = _rate_terms(departure, group, size, flask, parameters)
        if terms is None:
            continue
        event = f"{group.kind} of the same molecule displaces {departure.group}"
        outcomes = partial(_outcomes, departure, group, flask, parameters)
        yield _pathway(departure, terms, "ngp.entropy", parameters, event, outcomes)


def _pathway(
    departure: Departure,
    terms: Iterable[Term],
    entropy: str,
    parameters: Parameters,
    event: str,
    outcomes: Callable[[], tuple[Outcome, ...]],
) -> Pathway:
    split = math.log10(departure.site.multiplicity)
    rate = LogRate((*terms, parameters.term("model.NGP")), (parameters.term(entropy),), split)
    return alone(Mechanism.NGP, departure, rate, event, outcomes)


# --- which groups reach the carbon ----------------------------------------------------------------------------


@lru_cache(maxsize=512)
def reachable_groups(structure: Structure, site: ReactiveSite) -> tuple[tuple[Nucleophile, int], ...]:
    """Return the groups that can come round to the back of the carbon, each with the ring they close."""
    distances = _distances(structure, site)
    found = []
    for group in neighbouring_groups(structure):
        distance = distances.get(group.atom)
        if distance is None or group.atom in {site.leaving_atom, site.alpha_carbon}:
            continue
        size = distance + 1
        if not _closes(structure, site, group, size) or not _can_stand_behind(structure, site, group):
            continue
        found.append((group, size))
    return tuple(found)


_RINGS = {"arene": {3}, "alkene": {3}, "ether": {5, 6}, "organohalide": {3, 5}, "ester carbonyl": {5, 6}}
"""Rings that some kinds of neighbour close at all; any other kind closes those of three to LARGEST_RING."""


def _closes(structure: Structure, site: ReactiveSite, group: Nucleophile, size: int) -> bool:
    """Say whether a group closes a ring of this size; rings of three and four need a saturated carbon between."""
    if not 3 <= size <= LARGEST_RING or size not in _RINGS.get(group.kind, {size}):
        return False
    if size > 4 or group.kind in {"carboxylate", "carboxylic acid"}:
        return True
    beside = _beside(structure, group)
    return all(b.hybridisation == "sp3" for b in site.beta if b.atom in beside)


def _beside(structure: Structure, group: Nucleophile) -> set[AtomId]:
    return {n for n, _ in structure.atoms[group.atom].neighbours}


def _distances(structure: Structure, site: ReactiveSite) -> dict[AtomId, int]:
    found = {site.alpha_carbon: 0}
    frontier = [site.alpha_carbon]
    for here in frontier:
        for near, _ in structure.atoms[here].neighbours:
            if near not in found and (here, near) != (site.alpha_carbon, site.leaving_atom):
                found[near] = found[here] + 1
                frontier.append(near)
    return found


def _can_stand_behind(structure: Structure, site: ReactiveSite, group: Nucleophile) -> bool:
    """Say whether the group can stand anti to the leaving group: in a common ring, on the other face."""
    for ring in perceive_rings(structure):
        if site.alpha_carbon not in ring.atoms or len(ring.atoms) < 5:
            continue
        if group.atom in ring.atoms:
            continue
        holder = _holder(structure, site, group, set(ring.atoms))
        if holder is None:
            continue
        relation = ring.relation((site.alpha_carbon, site.leaving_atom), holder)
        if relation is Relation.CIS:
            return False
    return True


def _holder(
    structure: Structure, site: ReactiveSite, group: Nucleophile, ring: set[AtomId]
) -> tuple[AtomId, AtomId | None] | None:
    """Return the ring atom that bears the chain to the group, and the first atom of that chain."""
    before = {group.atom: group.atom}
    frontier = [group.atom]
    for here in frontier:
        for near, _ in structure.atoms[here].neighbours:
            if near in ring:
                return (near, here) if near != site.alpha_carbon else None
            if near not in before:
                before[near] = here
                frontier.append(near)
    return None


# --- rates ----------------------------------------------------------------------------------------------------


def _rate_terms(
    departure: Departure, group: Nucleophile, size: int, flask: Flask, parameters: Parameters
) -> list[Term] | None:
    """Return the terms of one participation, log10 k in 1/s; None where the group does not act in this flask."""
    site = departure.site
    if group.kind in {"arene", "alkene", "organohalide"}:
        return _bridging_terms(departure, group, flask, parameters)
    acting = _acting(departure, group, size, flask, parameters)
    if acting is None:
        return None
    kind, cost = acting
    if kind.element is None or (flask.is_bronsted_acid and kind.pka > 2.0):  # a proton has taken its lone pair
        return None
    element = kind.element
    terms = [parameters.term(key, factor) for key, factor in _features_within(departure.structure, site, size)]
    terms += departure.terms
    terms.append(parameters.term(f"sn2.leave.{departure.group}"))
    hard = f"sn2.hard.{departure.group}"
    if hard in parameters and kind.hardness:
        terms.append(parameters.term(hard, kind.hardness))
    if group.kind == "ester carbonyl":
        terms.append(parameters.term("ngp.acyloxy"))
    else:
        terms.append(Term(f"n of {kind.name}", 1.0, kind.n, kind.error, "Swain-Scott n of the neighbour", kind.source))
    terms.append(parameters.term(f"ngp.ring.{size}.{element}"))
    if element == "carbon" and size <= 5 and _carbonyl_in_ring(departure.structure, site, group):
        terms.append(parameters.term("ngp.enolendo"))
    terms += cost
    if kind.desolvation and (group.charge < 0 or cost):
        given_up = polarity_of("methanol").alpha - hydrogen_bonding(flask, parameters)
        terms.append(parameters.term("sn2.transfer.anion", kind.desolvation * given_up))
    if flask.has_silver and departure.family == "halide":
        terms.append(parameters.term("ngp.silver"))
    return terms


def _acting(
    departure: Departure, group: Nucleophile, size: int, flask: Flask, parameters: Parameters
) -> tuple[Kind, list[Term]] | None:
    """Return the kind a group acts as, its anion where the flask makes one, and what that costs; None if it cannot."""
    kind = load_kinds()[group.kind]
    if kind.anion is None or group.charge < 0:
        return kind, []
    made = _ionised(group, kind, flask, parameters)
    if made is not None:
        return made
    if group.kind in _ONLY_AS_ANIONS or (group.kind == "amide" and group.symbol == "N"):
        return None
    if group.kind == "carboxylic acid" and departure.group == "diazonium":
        return kind, [parameters.term("ngp.carboxyl.diazonium")]
    if group.loses_proton and departure.group == "diazonium" and size == 3:
        return None  # a shift to the carbonyl compound is faster
    return kind, [parameters.term("ngp.uncharged")] if group.loses_proton and size <= 4 else []


def _carbonyl_in_ring(structure: Structure, site: ReactiveSite, group: Nucleophile) -> bool:
    """Say whether the carbonyl carbon of an enolate would lie in the ring it closes, against Baldwin's rules."""
    atoms = structure.atoms
    path = skeleton_of(structure).path(group.atom, site.alpha_carbon, -1)
    return any(
        atoms[a].symbol == "C" and any(o == 2.0 and atoms[n].symbol == "O" for n, o in atoms[a].neighbours)
        for a in path
    )


def _features_within(structure: Structure, site: ReactiveSite, size: int) -> Iterator[tuple[str, float]]:
    """Yield key and weight of the terms of a site attacked from within.

    The neighbour itself acts instead of being in the way, so that a beta carbon counts one branch less. Alkyl groups
    on the carbon between hold the ends of a three-membered ring together and help.
    """
    for key, factor in site_features(structure, site):
        if key in {"sn2.beta.oxygen", "sn2.beta.halogen"} or key.startswith("sn2.ring."):
            continue
        branches = key.removeprefix("sn2.beta.")
        if not branches.isdigit():
            yield key, factor
        elif int(branches) > 1:
            further = int(branches) - 1
            yield ("ngp.beta alkyl", factor * further) if size == 3 else (f"sn2.beta.{further}", factor)


def _bridging_terms(
    departure: Departure, group: Nucleophile, flask: Flask, parameters: Parameters
) -> list[Term] | None:
    """Return the terms of a bridging π bond or halogen, on the scale of ionisation."""
    site = departure.site
    degree = site.degree
    if degree not in {Degree.PRIMARY, Degree.SECONDARY} or not site.classes.isdisjoint(
        {"benzylic", "allylic", "alpha-carbonyl", "alpha-alkoxy"}
    ):
        return None
    terms = list(_ionising_terms(departure, flask, parameters))
    structure = departure.structure
    if group.kind == "arene":
        terms.append(parameters.term(f"ngp.aryl.{degree.value}"))
        _, sigma = aryl_character(structure, group.atom)
        if sigma:
            terms.append(parameters.term("ngp.aryl.rho", sigma))
        beta = next((b for b in site.beta if any(n == group.atom for n, _ in structure.atoms[b.atom].neighbours)), None)
        if beta is None or any(structure.atoms[n].symbol == "O" for n, _ in structure.atoms[beta.atom].neighbours):
            return None  # beside oxygen the aryl group moves over and leaves a carbonyl group (semipinacol)
        if beta.branches > 1:
            terms.append(parameters.term("ngp.aryl.beta alkyl", beta.branches - 1))
        return terms
    if group.kind == "alkene":
        held = all(
            n in structure.bridgeheads
            for n, _ in structure.atoms[site.alpha_carbon].neighbours
            if n != site.leaving_atom
        )
        terms.append(parameters.term("ngp.alkene.bridge" if held else "ngp.alkene"))
        return terms
    symbol = {"I": "iodide", "Br": "bromide", "Cl": "chloride"}[group.symbol]
    terms.append(parameters.term(f"ngp.halogen.{symbol}"))
    if degree is Degree.PRIMARY:
        terms.append(parameters.term("ngp.halogen.primary"))
    return terms


def _ionising_terms(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Term]:
    """Yield what a bridged ion shares with an open cation: the leaving group, its help, the ionising power."""
    yield parameters.term("sn1.zero")
    yield parameters.term(f"sn1.leave.{departure.group}")
    yield from departure.terms
    yield from departure.pull
    if departure.family != "onium":
        scale = Scale.YOTS if departure.family == "sulfonate" else Scale.Y
        yield parameters.term(f"sn1.power.{departure.family}", flask.medium.power(scale).value)


def _ionised(group: Nucleophile, kind: Kind, flask: Flask, parameters: Parameters) -> tuple[Kind, list[Term]] | None:
    """Return the anion a base of the flask makes of a group, with log10 of the share ionised; None without one."""
    if kind.anion is None or kind.acid_pka is None:
        return None
    row = nucleophile_by_structure(group.species.smiles)
    acid_pka = kind.acid_pka if row is None or row.pka_acid is None else row.pka_acid
    best: float | None = None
    for base in flask.attackers:
        if not base.is_usual_atom or base.pka < NEUTRAL_PKA:
            continue
        share = min(0.0, base.pka - acid_pka + math.log10(max(base.molar, 1e-6)))
        best = share if best is None else max(best, share)
    if best is None or best < _LEAST_IONISED:
        return None
    anion = load_kinds()[kind.anion]
    term = Term(
        "share of the anion",
        1.0,
        best,
        parameters["ngp.ionised"].error,
        "ionised by the base, by difference of pKa",
        kind.source,
    )
    return anion, [term]


# --- products -------------------------------------------------------------------------------------------------


def _kept_by_alkene(departure: Departure, flask: Flask, parameters: Parameters) -> tuple[Outcome, ...]:
    """Return the capture from the side the group left, as the double bond holds the other one."""
    site = departure.site
    course = Course.RETENTION if site.stereo is SiteStereo.SPECIFIED else Course.NOT_APPLICABLE
    found = []
    for attacker in flask.attackers:
        weight = capture_weight(attacker, flask, parameters, "stabilised")
        if attacker.is_usual_atom:
            edit = substitute(departure.structure, site, attacker.nucleophile, inversion=False)
            found.append(Outcome(edit.product, weight, course, False, ("double bond takes part", "capture")))
    return merged_outcomes(found) if found else ()


@dataclass(frozen=True, slots=True)
class _Opening:
    """One carbon of a bridged ion, opened by one attacker."""

    product: Structure
    weight: float
    at_alpha: bool
    is_specified: bool


def _outcomes(departure: Departure, group: Nucleophile, flask: Flask, parameters: Parameters) -> tuple[Outcome, ...]:
    structure, site = departure.structure, departure.site
    if group.kind == "alkene":
        return _kept_by_alkene(departure, flask, parameters)
    try:
        closed = cyclise(structure, site, group)
    except UnbalancedTransformation:
        return ()
    centre = closed.from_substrate.get(site.alpha_carbon)
    if centre is None:
        return ()
    ring = neutral_form(closed.product) if group.kind == "amide" else closed.product
    inverted = Course.INVERSION if site.stereo is SiteStereo.SPECIFIED else Course.NOT_APPLICABLE
    stays = (Outcome(ring, 1.0, inverted, False, ("ring closure by the neighbouring group",)),)
    if group.kind == "amide" or not _is_transient(ring, centre):
        return stays
    told = f"{group.kind} displaces {departure.group}"
    if group.kind == "ester carbonyl" and any(a.kind.name == "water" for a in flask.attackers):
        opened = hydrated_acyloxonium(ring)
        words = (told, "water attacks the acyl carbon of the ion")
        return merged_outcomes([Outcome(p, 1.0, inverted, False, words) for p in opened]) if opened else stays
    openings = list(_openings(ring, centre, flask, parameters))
    if group.kind == "carboxylic acid" and flask.is_bronsted_acid:
        openings = [replace(o, product=neutral_form(o.product)) for o in openings]
    found = _opened_outcomes(site, group, openings, (told, "opening of the bridged ion"))
    return merged_outcomes(found) if found else stays


def _opened_outcomes(
    site: ReactiveSite, group: Nucleophile, openings: Sequence[_Opening], words: tuple[str, ...]
) -> list[Outcome]:
    """Return the openings of a bridged ion as outcomes: two inversions at the carbon of the group, one beside it.

    A carbon or halogen bridge with two like ends makes a racemate; in a ring the relation to the rest is kept.
    """
    kept = {o.product for o in openings if o.at_alpha}
    mirrors = {product.mirror_image for product in kept} - kept
    in_ring_by_halogen = bool(site.ring_sizes) and group.kind == "organohalide"
    racemic = group.kind in _BRIDGES and not in_ring_by_halogen and any(o.product in mirrors for o in openings)
    found = []
    for opening in openings:
        course = Course.NOT_APPLICABLE
        if site.stereo is SiteStereo.SPECIFIED:
            course = Course.RACEMISATION if racemic else Course.RETENTION
        elif not opening.at_alpha and opening.is_specified:
            course = Course.INVERSION
        moved = not opening.at_alpha and opening.product not in kept | mirrors
        found.append(Outcome(opening.product, opening.weight, course, moved, words))
    return found


def _is_transient(ring: Structure, centre: AtomId) -> bool:
    """Say whether the closed ring opens again by itself: a bridged ion, an acyloxonium ion, an α-lactone."""
    for site in perceive_sites(ring):
        if centre not in site.equivalent or site.leaving_group not in _TRANSIENT:
            continue
        small = site.leaving_ring_size == 3
        if site.leaving_group == "carboxylate" and not small:
            continue
        if small or site.leaving_group in {"trialkyloxonium", "acyloxonium"}:
            return True
    return False


def _openings(ring: Structure, centre: AtomId, flask: Flask, parameters: Parameters) -> Iterator[_Opening]:
    """Yield every opening of a bridged ion; halide in acid, which returns, ends at the more substituted carbon."""
    sites = [s for s in perceive_sites(ring) if s.leaving_group in _TRANSIENT and s.leaving_ring_size is not None]
    life = "onium" if any(s.leaving_group in _ONIUM_RINGS for s in sites) else "stabilised"
    weighted = [(a, capture_weight(a, flask, parameters, life)) for a in flask.attackers if a.is_usual_atom]
    total = sum(w for _, w in weighted)
    sites = [s for s in sites if s.leaving_ring_size == 3 or s.leaving_group != "carboxylate"]
    ranks = ring.symmetry_classes
    for site in sites:
        at_alpha = ranks[site.alpha_carbon] == ranks[centre]
        for attacker, weight in weighted:
            if weight < _LEAST_WEIGHT * total:
                continue
            reversible = attacker.kind.name in _HALIDES or site.leaving_group == "halonium"
            log = _opening_log(site, attacker, parameters, reversible=reversible)
            edit = substitute(ring, site, attacker.nucleophile)
            yield _Opening(
                edit.product,
                weight / total * 10**log * site.multiplicity,
                at_alpha,
                site.stereo is SiteStereo.SPECIFIED,
            )


def _opening_log(site: ReactiveSite, attacker: Attacker, parameters: Parameters, *, reversible: bool) -> float:
    degree = (site.degree or Degree.TERTIARY).value
    charged = site.leaving_group in {"phenonium", "halonium", "episulfonium"}
    if reversible or (attacker.is_solvent and charged) or site.leaving_group in {"phenonium", "halonium"}:
        return parameters.value(f"ngp.opening.{degree}") if degree in {"secondary", "tertiary"} else 0.0
    if degree == "methyl":
        return 0.0
    return parameters.value(f"sn2.alpha.strained.{degree}")


# --- σ participation ------------------------------------------------------------------------------------------


def _sigma(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Pathway]:
    """Yield the ionisation of an exo norbornyl group, helped by the C1-C6 bond behind it."""
    structure, site = departure.structure, departure.site
    if site.degree is not Degree.SECONDARY or site.leaving_atom is None:
        return
    bond = shifting_bond(structure, site.alpha_carbon)
    if bond is None or exo_face(structure, site.alpha_carbon, site.leaving_atom) is not True:
        return
    terms = list(_ionising_terms(departure, flask, parameters))
    terms += [parameters.term(f"cation.{word}") for word in ("secondary", "ring.5", "norbornyl")]
    event = f"the bond behind {departure.group} takes part as it leaves"
    outcomes = partial(_sigma_outcomes, departure, bond, flask, parameters)
    yield _pathway(departure, terms, "sn1.entropy", parameters, event, outcomes)


def _sigma_outcomes(
    departure: Departure, bond: tuple[AtomId, AtomId], flask: Flask, parameters: Parameters
) -> tuple[Outcome, ...]:
    structure, site = departure.structure, departure.site
    weighted = [(a, capture_weight(a, flask, parameters, "stabilised")) for a in flask.attackers if a.is_usual_atom]
    total = sum(w for _, w in weighted)
    found = []
    for attacker, weight in weighted:
        if weight < _LEAST_WEIGHT * total:
            continue
        direct = substitute(structure, site, attacker.nucleophile, inversion=False)
        shifted = capture(ionise_with_shift(structure, site, *bond), attacker.nucleophile)
        moved = [e.product for e in exo_only(shifted, bond[0])]
        mirrored = direct.product.mirror_image in moved
        course = Course.NOT_APPLICABLE
        if site.stereo is SiteStereo.SPECIFIED:
            course = Course.RACEMISATION if mirrored else Course.RETENTION
        words = ("σ bond displaces the leaving group", "capture at the exo face")
        found.append(Outcome(direct.product, weight / total, course, False, words))
        if mirrored:
            found.append(Outcome(direct.product.mirror_image, weight / total, course, False, words))
    return merged_outcomes(found) if found else ()
