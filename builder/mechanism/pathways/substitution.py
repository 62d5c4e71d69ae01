"""Bimolecular substitution: SN2 at the carbon that bears the leaving group, SN2' at the far end of a double bond."""

from collections.abc import Iterator
from functools import lru_cache, partial

from builder.chemistry.geometry import perceive_rings
from builder.chemistry.perception import Degree, Nucleophile, ReactiveSite, SiteStereo
from builder.chemistry.settling import dealkylated_phosphonium
from builder.chemistry.structure import AtomId, Structure, parse_smiles
from builder.chemistry.transform import StereoEffect, substitute, transpose_allylic
from builder.mechanism.chairs import is_axial
from builder.mechanism.departure import Departure
from builder.mechanism.flask import Attacker, Flask
from builder.mechanism.kinds import BaseFamily
from builder.mechanism.pathways.pathway import Outcome, Pathway, attack, merged_outcomes
from builder.mechanism.polarity import polarity_of
from builder.mechanism.rate_terms import Parameters, Term
from builder.mechanism.rules import closing_gates
from builder.mechanism.skeleton import LARGE_RING, skeleton_of
from builder.mechanism.solvents import SolventKind
from builder.records.vocabulary import Course, Mechanism

__all__ = ["ambident_terms", "nucleophile_terms", "sn2_pathways", "substitution_course"]

_ALL_WATER = 0.95
"""Share of water above which nothing else in it dissolves an oil."""
_OILY = 8
_CARRIED = 4
"""Carbons that one oxygen or nitrogen carries into water."""
_HARD_LEAVING_GROUP = 1.5
"""Second term of a leaving group from which it counts as hard for ambident nucleophiles."""
_STRONGLY_SOLVATING = frozenset({"DMSO", "HMPA", "DMPU", "NMP", "DMF", "DMAc"})
_PROTIC_ATTACK = frozenset({"water", "alcohol", "carboxylic acid", "phenol"})
_BRINGS_METAL = frozenset({"hydride", "organometallic", "carbanion"})
_ACCEPTORS = frozenset({"ketone", "nitrile", "ester", "amide", "acid", "carboxylate"})
_HALIDE_IONS = {"iodide": "[I-]", "bromide": "[Br-]", "chloride": "[Cl-]"}
_POWER_ZERO = -2.0
"""Ionising power from which the borderline terms grow: about that of ethanol."""


def sn2_pathways(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Pathway]:
    """Yield SN2 and SN2' of every attacker at a site, unless a gate closes them."""
    situation = departure.situation
    open_sn2 = not closing_gates(Mechanism.SN2, situation)
    open_prime = not closing_gates(Mechanism.SN2_PRIME, situation)
    if not (open_sn2 or open_prime) or _collapses_by_itself(departure, flask):
        return
    features = site_features(departure.structure, departure.site)
    for attacker in flask.attackers:
        if departure.group == "water" == attacker.kind.name:
            continue  # water for water
        if open_sn2 and not _is_cation_like_epoxide(departure):
            yield _sn2(departure, attacker, flask, parameters, features)
        if open_prime and attacker.is_usual_atom:
            yield from _sn2_prime(departure, attacker, flask, parameters)


def _collapses_by_itself(departure: Departure, flask: Flask) -> bool:
    """Say whether a chlorosulfite has no free chloride to wait for: without a base it is bound as hydrogen chloride."""
    stabilised = departure.site.degree in {Degree.SECONDARY, Degree.TERTIARY} or "benzylic" in departure.site.classes
    return departure.group == "chlorosulfite" and not flask.has_base and stabilised


def _is_cation_like_epoxide(departure: Departure) -> bool:
    """Say whether an acid-activated ring opens at this carbon as a cation would, which is called SN1."""
    return (
        departure.group.startswith("protonated")
        and departure.site.in_strained_ring
        and (departure.site.degree is Degree.TERTIARY or not departure.site.classes.isdisjoint({"benzylic", "allylic"}))
    )


def _sn2(
    departure: Departure,
    attacker: Attacker,
    flask: Flask,
    parameters: Parameters,
    features: tuple[tuple[str, float], ...],
) -> Pathway:
    terms = [parameters.term(key, factor) for key, factor in features]
    terms += departure.terms
    terms += _leaving_terms(departure, attacker, parameters)
    terms += nucleophile_terms(attacker, flask, parameters)
    terms += _bulk_terms(attacker, departure.site, parameters)
    terms += ambident_terms(attacker, departure.group, flask, parameters, departure.site)
    terms += _borderline_terms(departure, attacker, flask, parameters)
    terms += two_phase_terms(departure.structure, attacker, flask, parameters)
    if flask.has_silver and departure.family == "halide":
        terms.append(parameters.term("sn2.metal.silver"))
    site = departure.site
    brings_metal = attacker.kind.name in _BRINGS_METAL
    if departure.group == "epoxide" and brings_metal:
        terms.append(parameters.term("sn2.leave.epoxide.metal"))
    elif departure.group in {"epoxide", "aziridine"} and not flask.medium.is_protic:
        terms.append(parameters.term("sn2.leave.ring.aprotic"))
    if departure.site.in_strained_ring and 6 in site.ring_sizes:
        diaxial = opens_diaxially(departure.structure, site, attacker)
        if diaxial is not None:
            terms.append(parameters.term("sn2.diaxial", 1.0 if diaxial else -1.0))
    event = f"{attacker.name} displaces {departure.group} with inversion"
    outcomes = partial(_sn2_outcomes, departure.structure, site, attacker, _HALIDE_IONS.get(departure.group))
    return attack(Mechanism.SN2, departure, attacker, terms, parameters, event, outcomes)


def _sn2_outcomes(
    structure: Structure, site: ReactiveSite, attacker: Attacker, halide: str | None
) -> tuple[Outcome, ...]:
    edit = substitute(structure, site, attacker.nucleophile)
    course = substitution_course(site, edit.effect)
    product = edit.product
    path: tuple[str, ...] = ("substitution",)
    if attacker.kind.name == "phosphite" and halide is not None:
        product, path = dealkylated_phosphonium(product, parse_smiles(halide)), ("substitution", "Arbuzov dealkylation")
    return (Outcome(product, 1.0, course, False, path),)


def substitution_course(site: ReactiveSite, effect: StereoEffect) -> Course:
    """Return the course of one substitution in the words of a record."""
    if site.stereo is not SiteStereo.SPECIFIED:
        return Course.NOT_APPLICABLE
    return {
        StereoEffect.INVERSION: Course.INVERSION,
        StereoEffect.RETENTION: Course.RETENTION,
    }.get(effect, Course.NOT_APPLICABLE)


# --- terms of the site ----------------------------------------------------------------------------------------


@lru_cache(maxsize=512)
def site_features(structure: Structure, site: ReactiveSite) -> tuple[tuple[str, float], ...]:
    """Return key and weight of the terms of a site in SN2: substitution, branching, neighbours, ring."""
    degree = (site.degree or Degree.TERTIARY).value
    found: list[tuple[str, float]] = [("sn2.zero", 1.0)]
    if site.in_strained_ring and degree != "methyl":
        found.append((f"sn2.alpha.strained.{degree}", 1.0))
    else:
        found.append((f"sn2.alpha.{degree}", 1.0))
    place = "primary" if degree in {"methyl", "primary"} else "secondary"
    found += [(f"sn2.activation.{name}.{place}", 1.0) for name in _activating(structure, site)]
    ring = min(site.ring_sizes, default=None)
    if ring is not None and not site.in_strained_ring:
        found.append((f"sn2.ring.{min(ring, LARGE_RING)}", 1.0))
    for beta in site.beta:
        if beta.hybridisation != "sp3":
            continue
        branches = min(3, beta.branches - (1 if beta.in_common_ring else 0))
        if branches > 0:
            found.append((f"sn2.beta.{branches}", 1.0))
        around = {structure.atoms[n].symbol for n, _ in structure.atoms[beta.atom].neighbours if n != site.leaving_atom}
        if any(_activating_name(structure, n, beta.atom) == "ketone" for n, _ in structure.atoms[beta.atom].neighbours):
            found.append(("sn2.beta.ketone", 1.0))
        if around & {"F", "Cl", "Br", "I"}:
            found.append(("sn2.beta.halogen", 1.0))
        elif "O" in around:
            found.append(("sn2.beta.oxygen", 1.0))
    return tuple(found)


@lru_cache(maxsize=512)
def beta_acceptors(structure: Structure, site: ReactiveSite) -> int:
    """Return how many saturated beta carbons bear an electronegative atom, the leaving one left out."""
    atoms = structure.atoms
    found = 0
    for beta in site.beta:
        around = {atoms[n].symbol for n, _ in atoms[beta.atom].neighbours if n != site.leaving_atom}
        found += beta.hybridisation == "sp3" and not around.isdisjoint({"O", "N", "F", "Cl", "Br", "I"})
    return found


def _activating(structure: Structure, site: ReactiveSite) -> Iterator[str]:
    """Yield each kind of group on the carbon that changes SN2 much, once."""
    seen: set[str] = set()
    for near, order in structure.atoms[site.alpha_carbon].neighbours:
        if near == site.leaving_atom or order != 1.0:
            continue
        name = _activating_name(structure, near, site.alpha_carbon)
        if name is not None and name not in seen:
            seen.add(name)
            yield name


def _activating_name(structure: Structure, near: AtomId, alpha: AtomId) -> str | None:
    atoms = structure.atoms
    atom = atoms[near]
    far = [(atoms[n], o) for n, o in atom.neighbours if n != alpha]
    if atom.symbol == "C":
        if atom.aromatic:
            return "aryl"
        double = {a.symbol for a, o in far if o == 2.0}
        triple = {a.symbol for a, o in far if o == 3.0}
        if triple:
            return "nitrile" if "N" in triple else "alkynyl"
        if double & {"O", "S"}:
            others = {a.symbol for a, o in far if o == 1.0}
            if any(a.charge < 0 for a, _ in far):
                return "carboxylate"
            if any(a.symbol == "O" and a.hydrogens for a, o in far if o == 1.0):
                return "acid"
            return "ester" if "O" in others else "amide" if "N" in others else "ketone"
        return "vinyl" if "C" in double else None
    acylated = any(any(o == 2.0 and atoms[m].symbol in {"O", "S", "N"} for m, o in a.neighbours) for a, _ in far)
    if atom.charge > 0:
        return None
    if atom.symbol in {"O", "N"}:
        return None if acylated else {"O": "oxygen", "N": "nitrogen"}[atom.symbol]
    if atom.symbol == "S":
        return "sulfonyl" if any(o == 2.0 for _, o in far) else "sulfur"
    return None


# --- terms of leaving group, nucleophile and medium -----------------------------------------------------------


def _leaving_terms(departure: Departure, attacker: Attacker, parameters: Parameters) -> Iterator[Term]:
    yield parameters.term(f"sn2.leave.{departure.group}")
    hard = f"sn2.hard.{departure.group}"
    if hard in parameters and attacker.kind.hardness:
        yield parameters.term(hard, attacker.kind.hardness)


def nucleophile_terms(attacker: Attacker, flask: Flask, parameters: Parameters) -> Iterator[Term]:
    """Yield n of the nucleophile and what its transfer from methanol to the medium brings."""
    yield Term(
        f"n of {attacker.name}", 1.0, attacker.n, attacker.n_error, "Swain-Scott n in methanol", attacker.n_source
    )
    medium, methanol = flask.medium, polarity_of("methanol")
    if attacker.is_solvent:
        return
    polarity = medium.polarity
    if not attacker.is_anion:
        yield parameters.term("sn2.transfer.neutral.pi", polarity.pi_star - methanol.pi_star)
        yield parameters.term("sn2.transfer.neutral.alpha", polarity.alpha - methanol.alpha)
        return
    given_up = methanol.alpha - hydrogen_bonding(flask, parameters)
    yield parameters.term("sn2.transfer.anion", attacker.kind.desolvation * given_up)
    for solvent, share in medium.parts:
        key = f"sn2.transfer.solvent.{solvent.name}"
        if key in parameters and (solvent.kind is SolventKind.PROTIC or not medium.is_protic):
            yield parameters.term(key, share)
    if medium.is_apolar:
        yield parameters.term("sn2.transfer.apolar")
    if attacker.is_sparingly_soluble:
        yield parameters.term("sn2.solid salt")


def hydrogen_bonding(flask: Flask, parameters: Parameters) -> float:
    """Return the Kamlet-Taft α an anion feels; in mixtures it gathers the protic solvent around itself.

    Interpolated with the share of protic solvents to the power of `sn2.transfer.preference`; an approximation.
    """
    medium = flask.medium
    if flask.is_bronsted_acid:  # the acid itself holds the anion
        return max(medium.polarity.alpha, polarity_of("methanol").alpha)
    protic = [(s, share) for s, share in medium.parts if s.kind.value == "protic"]
    share = sum(part for _, part in protic)
    if not 0 < share < 0.999:
        return medium.polarity.alpha
    inside = sum(polarity_of(s.name).alpha * part for s, part in protic) / share
    outside = sum(polarity_of(s.name).alpha * p for s, p in medium.parts if s.kind.value != "protic") / (1 - share)
    return float(outside + (inside - outside) * share ** parameters.value("sn2.transfer.preference"))


def _bulk_terms(attacker: Attacker, site: ReactiveSite, parameters: Parameters) -> Iterator[Term]:
    family = "alkoxide" if attacker.base is BaseFamily.BULKY_ALKOXIDE else "hindered"
    key = f"sn2.bulk.{family}.{(site.degree or Degree.TERTIARY).value}"
    if attacker.is_hindered and key in parameters:
        yield parameters.term(key)


def ambident_terms(
    attacker: Attacker,
    group: str | None,
    flask: Flask,
    parameters: Parameters,
    site: ReactiveSite | None = None,
    *,
    on_cation: bool = False,
) -> Iterator[Term]:
    """Yield what it costs an ambident nucleophile to attack with its second atom; nothing for the usual one."""
    if attacker.is_usual_atom:
        return
    key = f"ambident.{attacker.kind.name}.{attacker.nucleophile.symbol}"
    if key not in parameters:
        key = "ambident.other"
    yield parameters.term(key, attacker.nucleophile.preference - 1)
    hard = (
        group is not None
        and f"sn2.hard.{group}" in parameters
        and (parameters.value(f"sn2.hard.{group}") >= _HARD_LEAVING_GROUP)
    )
    polar = sum(share for s, share in flask.medium.parts if s.name in _STRONGLY_SOLVATING) > 0.5
    branched = site is not None and site.degree in {Degree.SECONDARY, Degree.TERTIARY}
    conditions = {
        "silver": flask.has_silver,
        "cation": on_cation,
        "hard": hard,
        "polar": polar,
        "protic": flask.medium.share("water") + flask.medium.share("trifluoroethanol") > 0.5,
        "branched": branched,
        "fused": _spares_fused_ring(attacker.nucleophile),
    }
    for word, holds in conditions.items():
        if holds and f"{key}.{word}" in parameters:
            yield parameters.term(f"{key}.{word}")


def two_phase_terms(structure: Structure, attacker: Attacker, flask: Flask, parameters: Parameters) -> Iterator[Term]:
    """Yield what it costs that an oil and an anion in water hardly meet, without a salt that carries it over."""
    if (
        (attacker.is_anion or attacker.is_solvent)
        and not flask.has_phase_helper
        and flask.medium.share("water") > _ALL_WATER
        and _is_oil(structure)
    ):
        yield parameters.term("flask.two phases")


@lru_cache(maxsize=512)
def _is_oil(structure: Structure) -> bool:
    """Say whether a molecule hardly dissolves in water: eight carbons more than its polar atoms carry with them."""
    symbols = [atom.symbol for atom in structure.atoms]
    polar = symbols.count("O") + symbols.count("N")
    return structure.charge == 0 and symbols.count("C") - _CARRIED * polar >= _OILY


def _spares_fused_ring(nucleophile: Nucleophile) -> bool:
    """Say whether a ring carbon attacks in a way that leaves a fused ring aromatic: C1 of 2-naphthoxide, not C3.

    So it does where the two ring atoms that are neither fused nor part of the new C-C=O are neighbours.
    """
    oxygen_bearing = nucleophile.via[0]
    if oxygen_bearing is None:
        return False
    skeleton = skeleton_of(nucleophile.species)
    ring = next((r for r in skeleton.rings_through(nucleophile.atom) if oxygen_bearing in r), frozenset())
    fused = {a for a in ring if sum(skeleton.is_aromatic(n) for n in skeleton.neighbours(a)) == 3}
    rest = sorted(ring - fused - {nucleophile.atom, oxygen_bearing})
    return bool(fused) and len(rest) == 2 and rest[1] in skeleton.neighbours(rest[0])


def _borderline_terms(departure: Departure, attacker: Attacker, flask: Flask, parameters: Parameters) -> Iterator[Term]:
    """Yield what a protic solvent gains as it attacks a carbon that bears some positive charge already."""
    site = departure.site
    plain = not _ACCEPTORS & set(_activating(departure.structure, site))
    if not attacker.is_solvent or attacker.nucleophile.kind not in _PROTIC_ATTACK or not plain:
        return
    degree = (site.degree or Degree.TERTIARY).value
    key = f"sn2.borderline.{'halide' if departure.family == 'ester' else departure.family}.{degree}"
    if key not in parameters or site.in_strained_ring:
        return
    yield parameters.term(key)
    if attacker.nucleophile.kind == "carboxylic acid" and degree == "secondary":
        yield parameters.term("sn2.borderline.carboxylic acid")
    acceptors = beta_acceptors(departure.structure, site)
    if acceptors:
        yield parameters.term("sn2.borderline.acceptor", acceptors)
    if f"{key}.power" in parameters:
        yield parameters.term(f"{key}.power", max(0.0, flask.medium.power().value - _POWER_ZERO))


@lru_cache(maxsize=512)
def opens_diaxially(structure: Structure, site: ReactiveSite, attacker: Attacker) -> bool | None:
    """Say whether opening of a ring on a six-membered ring at this carbon gives the diaxial product (Fürst-Plattner).

    None where the ring is free to flip, or nothing is drawn that would hold it.
    """
    edit = substitute(structure, site, attacker.nucleophile)
    place = edit.from_substrate.get(site.alpha_carbon)
    new = set(edit.from_nucleophile.values())
    if place is None:
        return None
    product = edit.product
    bound = next((n for n, _ in product.atoms[place].neighbours if n in new), None)
    ring = next((r for r in perceive_rings(product) if place in r.atoms and len(r.atoms) == 6), None)
    if bound is None or ring is None or len({n for n in ring.atoms if len(product.atoms[n].ring_sizes) > 1}) < 1:
        return None
    return is_axial(product, ring, place, bound)


# --- SN2' -----------------------------------------------------------------------------------------------------


def _sn2_prime(
    departure: Departure,
    attacker: Attacker,
    flask: Flask,
    parameters: Parameters,
) -> Iterator[Pathway]:
    structure, site = departure.structure, departure.site
    far = _far_end(structure, site)
    if far is None:
        return
    alkyl, blocked = _substituents(structure, far), _is_blocked(site)
    terms = [parameters.term(key) for key in ("sn2.zero", "sn2.alpha.primary", "sn2.activation.vinyl.primary")]
    terms += [parameters.term("sn2prime.against"), *departure.terms, *_leaving_terms(departure, attacker, parameters)]
    terms += nucleophile_terms(attacker, flask, parameters)
    if alkyl:
        terms.append(parameters.term("sn2prime.far alkyl", alkyl))
    if blocked:
        terms.append(parameters.term("sn2prime.blocked"))
    if departure.group == "epoxide" and attacker.kind.name in _BRINGS_METAL:
        terms.append(parameters.term("sn2.leave.epoxide.metal"))
    if attacker.kind.name in {"amine, secondary", "amine, primary"}:
        terms.append(parameters.term("sn2prime.amine"))
    if "Cu" in attacker.nucleophile.species.smiles:
        terms.append(parameters.term("sn2prime.cuprate"))
        if departure.family == "ester":
            terms.append(parameters.term("sn2prime.cuprate.ester"))
    if _has_acceptor_on_near_end(structure, site):
        terms.append(parameters.term("sn2prime.acceptor"))
    event = f"{attacker.name} attacks the far end of the double bond"
    outcomes = partial(_prime_outcomes, structure, site, attacker, parameters)
    yield attack(Mechanism.SN2_PRIME, departure, attacker, terms, parameters, event, outcomes)


def _prime_outcomes(
    structure: Structure, site: ReactiveSite, attacker: Attacker, parameters: Parameters
) -> tuple[Outcome, ...]:
    edits = transpose_allylic(structure, site, attacker.nucleophile)
    trans = 10 ** parameters.value("e1.trans")
    weights = [trans if edit.geometry == "E" else 1.0 for edit in edits]
    found = [
        Outcome(edit.product, weight, Course.NOT_APPLICABLE, True, ("substitution with allylic transposition",))
        for edit, weight in zip(edits, weights, strict=True)
    ]
    return merged_outcomes(found) if found else ()


def _far_end(structure: Structure, site: ReactiveSite) -> AtomId | None:
    atoms = structure.atoms
    for near, order in atoms[site.alpha_carbon].neighbours:
        if near == site.leaving_atom or order != 1.0 or atoms[near].aromatic or atoms[near].symbol != "C":
            continue
        for far, far_order in atoms[near].neighbours:
            if far_order in {2.0, 3.0} and atoms[far].symbol == "C":
                return far
    return None


def _has_acceptor_on_near_end(structure: Structure, site: ReactiveSite) -> bool:
    """Say whether the double bond is that of an acrylate or the like, so that attack at its far end is conjugate."""
    atoms = structure.atoms
    return any(
        _activating_name(structure, n, near) in _ACCEPTORS
        for near, order in atoms[site.alpha_carbon].neighbours
        if order == 1.0 and near != site.leaving_atom and any(o == 2.0 for _, o in atoms[near].neighbours)
        for n, o in atoms[near].neighbours
        if o == 1.0 and n != site.alpha_carbon
    )


def _substituents(structure: Structure, carbon: AtomId) -> int:
    atoms = structure.atoms
    return sum(1 for n, o in atoms[carbon].neighbours if o == 1.0 and atoms[n].symbol != "H")


def _is_blocked(site: ReactiveSite) -> bool:
    """Say whether the near carbon is crowded: tertiary, or beside a quaternary carbon."""
    return site.degree is Degree.TERTIARY or any(b.branches >= 3 for b in site.beta if b.hybridisation == "sp3")
