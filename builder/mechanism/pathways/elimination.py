"""Bimolecular elimination: E2 along every path to a beta hydrogen, and E1cB beside an acceptor."""

import math
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache, partial

from builder.chemistry.geometry import Relation, Ring, perceive_rings
from builder.chemistry.perception import (
    BetaCarbon,
    Degree,
    Hybridisation,
    ReactiveSite,
    leaving_groups,
    neighbouring_groups,
)
from builder.chemistry.structure import AtomId, Structure
from builder.chemistry.transform import Edit, StereoEffect, eliminate
from builder.mechanism.chairs import axial_cost_kj
from builder.mechanism.departure import Departure
from builder.mechanism.flask import NEUTRAL_PKA, Attacker, Flask, has_long_branches
from builder.mechanism.kinds import BaseFamily
from builder.mechanism.medium import Medium
from builder.mechanism.pathways.pathway import Outcome, Pathway, attack, merged_outcomes
from builder.mechanism.pathways.substitution import hydrogen_bonding, two_phase_terms
from builder.mechanism.polarity import polarity_of
from builder.mechanism.rate_terms import Parameters, Term
from builder.mechanism.rules import closing_gates
from builder.mechanism.skeleton import LARGE_RING
from builder.records.vocabulary import Course, Mechanism

__all__ = ["e1cb_pathways", "e2_pathways", "trans_weight"]

SMALLEST_ALKYNE_RING = 8
"""Members of the smallest ring that holds a triple bond: cyclooctyne. Arynes are outside this book."""
_REFERENCE_PKA = 15.9
_STRONGEST_PKA = 32.0
"""Beyond it a stronger base is not faster: encounter and aggregates decide."""
_WEAKEST_PKA = 0.0
_WEAK_BASES = frozenset({BaseFamily.HALIDE, BaseFamily.CARBOXYLATE})
"""Families that eliminate late, towards the more stable alkene, in aprotic solvents (E2C)."""
_SULFONATE_LIKE = frozenset(
    {"tosylate", "mesylate", "brosylate", "nosylate", "benzenesulfonate", "triflate", "sulfonate"}
)


def e2_pathways(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Pathway]:
    """Yield E2 of every base in the flask along every path to a beta hydrogen."""
    if closing_gates(Mechanism.E2, departure.situation):
        return
    ways = beta_ways(departure.structure, departure.site)
    if not ways:
        return
    for base in flask.attackers:
        if base.base is None or not base.is_usual_atom or base.pka < _WEAKEST_PKA:
            continue
        for way in ways:
            terms = [*departure.terms, *_way_terms(departure, way, parameters)]
            terms += _base_terms(departure, way, base, flask, parameters)
            terms += two_phase_terms(departure.structure, base, flask, parameters)
            event = f"{base.name} takes a proton as {departure.group} leaves"
            outcomes = partial(_outcomes, departure.structure, departure.site, way, base, parameters)
            yield attack(Mechanism.E2, departure, base, terms, parameters, event, outcomes)


@dataclass(frozen=True, slots=True)
class BetaWay:
    """One way to a beta hydrogen: the carbon, and how the hydrogen stands to the leaving group.

    is_anti: False where only a syn hydrogen is in reach. axial_cost_kj: of putting the leaving group axial.
    keys: weights of the terms of what the carbon bears.
    """

    beta: BetaCarbon
    is_anti: bool
    axial_cost_kj: float
    in_ring: bool
    keys: tuple[tuple[str, float], ...]


@lru_cache(maxsize=512)
def beta_ways(structure: Structure, site: ReactiveSite) -> tuple[BetaWay, ...]:
    """Return the ways to the beta hydrogens of a site; ring carbons without a hydrogen in reach are left out."""
    found = []
    if site.hybridisation is not Hybridisation.SP3 and min(site.ring_sizes, default=LARGE_RING) < SMALLEST_ALKYNE_RING:
        return ()
    for beta in site.beta_with_hydrogen:
        stands = _stands(structure, site, beta)
        if stands is None:
            continue
        is_anti, cost = stands
        found.append(BetaWay(beta, is_anti, cost, beta.in_common_ring, tuple(_beta_keys(structure, site, beta))))
    return tuple(found)


def _beta_keys(structure: Structure, site: ReactiveSite, beta: BetaCarbon) -> Iterator[tuple[str, float]]:
    atoms = structure.atoms
    in_reach = 1.0 if beta.in_common_ring else float(beta.hydrogens)  # of two on a ring carbon one is anti
    hydrogens = math.log10(in_reach) - math.log10(3.0)
    if hydrogens:
        yield "e2.hydrogens", hydrogens
    if beta.hydrogens == len(beta.hydrogen_isotopes):
        yield "e2.deuterium", 1.0
    seen = set()
    for near, order in atoms[beta.atom].neighbours:
        if near == site.alpha_carbon or atoms[near].symbol == "H" or order != 1.0:
            continue
        word = _beta_word(structure, near, beta.atom)
        if word == "alkyl" or word not in seen:
            seen.add(word)
            yield (f"e2.{word}" if word == "alkyl" else f"e2.beta.{word}"), 1.0
    if site.degree is Degree.TERTIARY and any(
        atoms[n].symbol == "C" and sum(atoms[m].symbol != "H" for m, _ in atoms[n].neighbours) == 4
        for n, _ in atoms[beta.atom].neighbours
        if n != site.alpha_carbon
    ):
        yield "e2.crowded", 1.0


def _beta_word(structure: Structure, near: AtomId, beta: AtomId) -> str:
    atoms = structure.atoms
    atom = atoms[near]
    if atom.symbol in {"F", "Cl", "Br", "I"}:
        return "halogen"
    if atom.symbol in {"N", "P", "S"} and (atom.charge > 0 or any(o == 2.0 for _, o in atom.neighbours)):
        return "carbonyl"
    if atom.symbol != "C":
        return "oxygen"
    if atom.aromatic:
        return "aryl"
    for far, order in atom.neighbours:
        if far != beta and order > 1.0:
            return "vinyl" if atoms[far].symbol == "C" else "carbonyl"
    return "alkyl"


def _way_terms(departure: Departure, way: BetaWay, parameters: Parameters) -> Iterator[Term]:
    site = departure.site
    yield parameters.term("e2.zero")
    yield parameters.term(f"e2.leave.{departure.group}")
    if site.hybridisation is not Hybridisation.SP3:
        yield from _vinylic_terms(departure, way, parameters)
        return
    if site.degree in {Degree.SECONDARY, Degree.TERTIARY}:
        yield parameters.term(f"e2.alpha.{site.degree.value}")
        chains = sum(1 for b in site.beta if b.hybridisation == "sp3" and b.branches - b.in_common_ring >= 1)
        if chains:
            yield parameters.term("e2.alpha.chain", chains)
    for word, name in (("benzylic", "aryl"), ("allylic", "vinyl"), ("geminal", "halogen")):
        if word in site.classes:
            yield parameters.term(f"e2.alpha.{name}")
    for key, factor in way.keys:
        yield parameters.term(key, factor)
    ring = min(site.ring_sizes, default=0)
    if way.in_ring and ring in {3, 4}:
        yield parameters.term("e2.four ring")
    if not way.is_anti:
        yield parameters.term("e2.syn")
    elif way.in_ring and ring >= 5:
        yield parameters.term("e2.ring")
    if way.axial_cost_kj:
        yield parameters.term("e2.axial", -way.axial_cost_kj)


def _vinylic_terms(departure: Departure, way: BetaWay, parameters: Parameters) -> Iterator[Term]:
    """Yield the terms of a leaving group on a double bond, on the way to an alkyne or an allene."""
    yield parameters.term("e2.vinylic")
    for key, factor in way.keys:
        if key == "e2.beta.aryl":
            yield parameters.term("e2.vinylic.aryl", factor)
    atoms = departure.structure.atoms
    if any(atoms[near].aromatic for near, _ in atoms[departure.site.alpha_carbon].neighbours):
        yield parameters.term("e2.vinylic.aryl")


def _base_terms(
    departure: Departure, way: BetaWay, base: Attacker, flask: Flask, parameters: Parameters
) -> Iterator[Term]:
    pka = min(base.pka, _STRONGEST_PKA)
    yield parameters.term("e2.base", pka - _REFERENCE_PKA)
    if base.is_anion:
        bonding = hydrogen_bonding(flask, parameters)
        bare = max(0.0, 1.0 - bonding / polarity_of("methanol").alpha)
        yield parameters.term("e2.base.aprotic", bare * max(0.0, min(base.pka_dmso, _STRONGEST_PKA) - pka))
        yield parameters.term("e2.medium", bonding - polarity_of("ethanol").alpha if flask.medium.is_protic else 0.0)
    yield from _family_terms(departure.site, base, flask.medium, parameters)
    if base.is_solvent:
        yield parameters.term("e2.family.solvent")
    if base.is_sparingly_soluble:
        yield parameters.term("sn2.solid salt")
    if departure.site.hybridisation is Hybridisation.SP3:
        yield from _orientation_terms(departure, way, base, flask.medium, parameters)


def _family_terms(site: ReactiveSite, base: Attacker, medium: Medium, parameters: Parameters) -> Iterator[Term]:
    """Yield what a family of bases adds beyond its basicity."""
    family = base.base
    if family is BaseFamily.BULKY_ALKOXIDE:
        if medium.is_protic or medium.is_apolar:
            yield parameters.term("e2.family.bulky alkoxide")
    elif family in _WEAK_BASES:
        if site.degree in {Degree.SECONDARY, Degree.TERTIARY} and not medium.is_protic:
            yield parameters.term("e2.family.halide")
    elif family is BaseFamily.AMIDE:
        yield parameters.term("e2.family.amide" if base.is_hindered else "e2.family.amide.small")
    elif family is BaseFamily.SOFT:
        bare = "cyanide" if base.kind.name == "cyanide" else "soft"
        yield parameters.term("e2.family.soft" if medium.is_protic else f"e2.family.{bare}.aprotic")
    elif family not in {BaseFamily.OXYGEN, None}:
        yield parameters.term(f"e2.family.{family}")


def _orientation_terms(
    departure: Departure, way: BetaWay, base: Attacker, medium: Medium, parameters: Parameters
) -> Iterator[Term]:
    """Yield how the alkyl groups on the beta carbon count with this leaving group and this base (Saytzeff, Hofmann)."""
    alkyl = sum(factor for key, factor in way.keys if key == "e2.alkyl")
    if not alkyl:
        return
    is_tertiary = departure.site.degree is Degree.TERTIARY
    if is_tertiary:
        yield parameters.term("e2.alkyl.tertiary", alkyl)
    group = "sulfonate" if departure.group in _SULFONATE_LIKE else departure.group
    if f"e2.alkyl.{group}" in parameters:
        yield parameters.term(f"e2.alkyl.{group}", alkyl)
    if base.base in _WEAK_BASES and not medium.is_protic:
        yield parameters.term("e2.alkyl.weak base", alkyl)
    if base.is_hindered:
        yield parameters.term("e2.alkyl.bulky.aprotic" if medium.is_dipolar_aprotic else "e2.alkyl.bulky", alkyl)
        if is_tertiary:
            yield parameters.term("e2.alkyl.bulky.tertiary", alkyl)
        if has_long_branches(base.nucleophile):
            yield parameters.term("e2.alkyl.bulky.more", alkyl)


# --- products -------------------------------------------------------------------------------------------------


def _outcomes(
    structure: Structure, site: ReactiveSite, way: BetaWay, base: Attacker, parameters: Parameters
) -> tuple[Outcome, ...]:
    effect = StereoEffect.ANTI if way.is_anti else StereoEffect.SYN
    edits = eliminate(structure, site, way.beta.atom, effect=effect)
    if not edits and way.is_anti:
        edits = eliminate(structure, site, way.beta.atom, effect=StereoEffect.SYN)
        effect = StereoEffect.SYN
    found = []
    for edit in edits:
        weight = trans_weight(edit, structure, site, way.beta.atom, parameters, is_bulky=base.is_hindered)
        course = Course.NOT_APPLICABLE
        if site.stereo.value == "specified":
            course = Course.ANTI if effect is StereoEffect.ANTI else Course.SYN
        found.append(Outcome(edit.product, weight, course, False, ("elimination",)))
    return merged_outcomes(found) if found else ()


def trans_weight(
    edit: Edit, structure: Structure, site: ReactiveSite, beta: AtomId, parameters: Parameters, *, is_bulky: bool
) -> float:
    """Return the weight of an alkene by its geometry: 1 for Z or none, more for E."""
    if edit.geometry != "E":
        return 1.0
    weight = parameters.value("e2.trans")
    if is_bulky:
        weight += parameters.value("e2.trans.bulky")
    ends = {beta: site.alpha_carbon, site.alpha_carbon: beta}
    wide = any(
        _is_wide(structure, n) for end, other in ends.items() for n, _ in structure.atoms[end].neighbours if n != other
    )
    if wide:
        weight += parameters.value("e2.trans.branched")
    return float(10**weight)


def _is_wide(structure: Structure, atom: AtomId) -> bool:
    atoms = structure.atoms
    heavy = sum(atoms[n].symbol != "H" for n, _ in atoms[atom].neighbours)
    return atoms[atom].symbol == "C" and (atoms[atom].aromatic or heavy >= 3)


# --- how the hydrogen stands ----------------------------------------------------------------------------------


def _stands(structure: Structure, site: ReactiveSite, beta: BetaCarbon) -> tuple[bool, float] | None:
    """Return whether a hydrogen of the carbon stands anti, and the cost of the conformation; None if none is in reach.

    In six-membered rings the leaving group must be axial and a hydrogen on the other face; in smaller and larger rings
    a hydrogen on the other face counts as anti, one on the same face as syn.
    """
    if site.hybridisation is not Hybridisation.SP3 or not beta.in_common_ring or site.leaving_atom is None:
        return True, 0.0
    ring = next((r for r in perceive_rings(structure) if site.alpha_carbon in r.atoms and beta.atom in r.atoms), None)
    if ring is None:
        return True, 0.0
    faces = _hydrogen_faces(ring, site, beta)
    if faces is None:
        return True, 0.0
    cost = 0.0
    if len(ring.atoms) == 6:
        cost = (
            0.0 if _is_caged(structure, ring) else axial_cost_kj(structure, ring, site.alpha_carbon, site.leaving_atom)
        )
        if Relation.TRANS not in faces:
            return None if not site.is_bridgehead and not _is_caged(structure, ring) else (False, 0.0)
        return True, cost
    return Relation.TRANS in faces, 0.0


def _is_caged(structure: Structure, ring: Ring) -> bool:
    return bool(structure.bridgeheads & set(ring.atoms))


def _hydrogen_faces(ring: Ring, site: ReactiveSite, beta: BetaCarbon) -> set[Relation] | None:
    """Return how the hydrogens of a ring carbon stand to the leaving group; None where nothing is drawn."""
    if beta.hydrogens >= 2:
        return {Relation.CIS, Relation.TRANS}
    relation = ring.relation((site.alpha_carbon, site.leaving_atom), (beta.atom, None))
    return None if relation is None else {relation}


# --- E1cB -----------------------------------------------------------------------------------------------------


def e1cb_pathways(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Pathway]:
    """Yield E1cB for a poor leaving group beta to an acceptor; good groups go by E2 there."""
    group = leaving_groups().get(departure.group)
    if group is None or group.conjugate_acid_pka is None:
        return
    if not (group.needs_activation or departure.group in {"ammonium", "2,4-dinitrophenoxide"}):
        return
    if closing_gates(Mechanism.E1CB, departure.situation):
        return
    acidity = _acidic_betas(departure.structure)
    for base in flask.attackers:
        if base.base is None or not base.is_usual_atom or base.pka < NEUTRAL_PKA:
            continue
        for way in beta_ways(departure.structure, departure.site):
            word = acidity.get(departure.structure.symmetry_classes[way.beta.atom])
            if word is None:
                continue
            terms = [
                parameters.term("e1cb.zero"),
                parameters.term(
                    "e1cb.acidity", parameters.value(f"e1cb.pka.{word}") - parameters.value("e1cb.pka.ketone")
                ),
                parameters.term("e1cb.leave", max(0.0, group.conjugate_acid_pka)),
                parameters.term("e2.base", min(base.pka, _STRONGEST_PKA) - _REFERENCE_PKA),
            ]
            event = f"{base.name} takes the acidic proton, {departure.group} leaves from the carbanion"
            outcomes = partial(_e1cb_outcomes, departure.structure, departure.site, way, parameters)
            yield attack(Mechanism.E1CB, departure, base, terms, parameters, event, outcomes)


def _e1cb_outcomes(
    structure: Structure, site: ReactiveSite, way: BetaWay, parameters: Parameters
) -> tuple[Outcome, ...]:
    edits = eliminate(structure, site, way.beta.atom, effect=StereoEffect.NOT_DETERMINED)
    found = [
        Outcome(
            edit.product,
            trans_weight(edit, structure, site, way.beta.atom, parameters, is_bulky=False),
            Course.NOT_APPLICABLE,
            False,
            ("loss of a proton", "loss of the leaving group from the carbanion"),
        )
        for edit in edits
    ]
    return merged_outcomes(found) if found else ()


@lru_cache(maxsize=512)
def _acidic_betas(structure: Structure) -> dict[int, str]:
    """Return what makes a carbon acid, by symmetry class: two acceptors or nitro, a ketone, another acceptor."""
    ranks = structure.symmetry_classes
    found: dict[int, str] = {}
    for group in neighbouring_groups(structure):
        if group.kind == "carbon acid":
            found[ranks[group.atom]] = "doubly"
        elif group.kind == "carbon acid, weak":
            found[ranks[group.atom]] = _acceptor_word(structure, group.atom)
    return found


def _acceptor_word(structure: Structure, atom: AtomId) -> str:
    words = {_beta_ketone(structure, n) for n, _ in structure.atoms[atom].neighbours}
    return "ketone" if "ketone" in words else "other"


def _beta_ketone(structure: Structure, near: AtomId) -> str:
    atoms = structure.atoms
    double = any(o == 2.0 and atoms[n].symbol == "O" for n, o in atoms[near].neighbours)
    single = any(o == 1.0 and atoms[n].symbol in {"O", "N"} for n, o in atoms[near].neighbours)
    return "ketone" if atoms[near].symbol == "C" and double and not single else ""
