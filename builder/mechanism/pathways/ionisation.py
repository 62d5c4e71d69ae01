"""Ionisation, and what becomes of the cation: capture (SN1) or loss of a proton (E1), before or after 1,2-shifts."""

import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from functools import cached_property, partial

from builder.chemistry.perception import Degree, ReactiveSite, SiteStereo
from builder.chemistry.settling import hydrated_nitrilium
from builder.chemistry.structure import AtomId, Structure
from builder.chemistry.transform import (
    Cation,
    Edit,
    StereoEffect,
    allylic_forms,
    capture,
    fragment,
    ionise,
    ionise_with_shift,
    lose_proton,
    shift_12,
)
from builder.mechanism.cations import MAX_SHIFTS, Nature, Shift, Station, cation_terms, nature_of, stations
from builder.mechanism.departure import Departure
from builder.mechanism.faces import exo_only, trans_to_acyloxy
from builder.mechanism.flask import ENOUGH_M, NEUTRAL_PKA, Attacker, Flask
from builder.mechanism.ionising_power import Scale
from builder.mechanism.log_rate import REFERENCE_K, LogRate
from builder.mechanism.pathways.pathway import Outcome, Pathway, alone, merged_outcomes
from builder.mechanism.pathways.substitution import ambident_terms
from builder.mechanism.rate_terms import Parameters, Term
from builder.mechanism.rules import closing_gates
from builder.mechanism.skeleton import Skeleton, skeleton_of
from builder.records.vocabulary import Course, Mechanism

__all__ = ["Reception", "ionisation_pathways", "receive", "sni_pathways"]

HOPELESS = -17.0
"""log10 k at 25 °C, 1/s, below which an ionisation is not worth a search for shifts."""
_BEST_ASSISTANCE = 5.0
HOT_K = 323.15
_LEAST_WEIGHT = 3e-3
_HALIDES = frozenset({"chloride", "bromide", "iodide", "fluoride"})
_RETURNING = frozenset({"pyridine", "amine, tertiary", "amidine", "azole, N-substituted", "sulfide"})
"""Kinds whose capture of a cation gives an onium ion that gives it back; they count where nothing else is there."""
_NEUTRAL_GROUPS = frozenset({"sulfonium", "ammonium", "diazonium", "water", "protonated ether", "trialkyloxonium"})
_CARBOXYLIC = ("acetic acid", "formic acid", "trifluoroacetic acid")
_BRANCHES = ("primary", "secondary", "tertiary")
_LEAVES_BY_ACID = frozenset(
    {"water", "protonated ether", "protonated ester", "protonated epoxide", "protonated oxetane", "none"}
)
"""Groups whose loss acid undoes as well, so that the alkene is the way out in the heat; none: a protonated alkene."""
_MOST_GAIN = 10.0
_ALL = 12.0
"""log10 of a ratio beyond which all goes one way."""
_RACEMISED = 0.1
"""Net inversion below which the course is called racemisation."""
_INVERTED = 0.9
"""Net inversion above which it is called inversion."""


def ionisation_pathways(
    departure: Departure,
    flask: Flask,
    parameters: Parameters,
    temperature_k: float,
    floor: float | None = None,
) -> Iterator[Pathway]:
    """Yield SN1 and E1 of a site, which share one ionisation; nothing where the cation cannot form.

    floor: log10 k, 1/s, that even with the help of a shift must be reached; None asks for every ionisation.
    """
    site, structure, leaving = departure.site, departure.structure, departure.site.leaving_atom
    if leaving is None or closing_gates(Mechanism.SN1, departure.situation):
        return
    if departure.group == "chlorosulfite" and not flask.has_base:
        return
    bare = skeleton_of(structure).without_bond(site.alpha_carbon, leaving)
    if site.in_strained_ring:  # the group stays beside the cation but is no acceptor to it: it has only just left
        for near in list(bare.neighbours(leaving)):
            bare = bare.without_bond(near, leaving)
    stability = cation_terms(structure, bare, site.alpha_carbon, parameters)
    terms = [parameters.term("sn1.zero"), *stability, *departure.terms, *departure.pull]
    terms.append(parameters.term(f"sn1.leave.{departure.group}"))
    terms += _power_terms(departure, flask, parameters, is_held=nature_of(bare, site.alpha_carbon).is_stabilised)
    if site.leaving_ring_size is not None and not site.in_strained_ring:
        terms.append(parameters.term("sn1.returns"))
    terms.append(parameters.term("model.ionisation"))
    if math.fsum(t.contribution for t in terms) < HOPELESS - _BEST_ASSISTANCE:
        return
    power = max(0.0, flask.medium.power().value)
    entropy = (parameters.term("sn1.entropy"), parameters.term("sn1.entropy.power", power))
    if floor is not None and LogRate(tuple(terms), entropy).log10_k(temperature_k) + _BEST_ASSISTANCE < floor:
        return
    inverts = departure.group.startswith("protonated") and site.in_strained_ring and bool(flask.attackers)
    if site.in_strained_ring and not inverts:
        bare = skeleton_of(structure).without_bond(site.alpha_carbon, leaving)
    reached = stations(structure, bare, site.alpha_carbon, parameters, 0 if inverts else MAX_SHIFTS)
    assistance = _assistance(reached, parameters)
    terms += assistance
    if math.fsum(t.contribution for t in terms) < HOPELESS:
        return
    reception = receive(
        reached,
        flask,
        parameters,
        temperature_k,
        group=departure.group,
        is_concerted=bool(assistance) and site.degree is Degree.PRIMARY,
        can_eliminate=not closing_gates(Mechanism.E1, departure.situation),
    )
    for mechanism, share, outcomes in (
        (Mechanism.SN1, reception.captured, partial(_captured, reception, departure, inverts=inverts)),
        (Mechanism.E1, reception.eliminated, partial(_eliminated, reception, departure)),
    ):
        if share < 1e-6:
            continue
        is_captured = mechanism is Mechanism.SN1
        split = math.log10(share) + math.log10(site.multiplicity)
        yield alone(
            mechanism,
            departure,
            LogRate(tuple(terms), entropy, split, reception.spreads(not is_captured)),
            f"{departure.group} leaves, the cation {'is captured' if is_captured else 'loses a proton'}",
            outcomes,
            returns=is_captured and not reception.attackers,
        )


def _power_terms(departure: Departure, flask: Flask, parameters: Parameters, *, is_held: bool) -> Iterator[Term]:
    """Yield m times the ionising power, on the scale of the leaving group; nothing for one that leaves uncharged.

    Halides at a carbon that aryl, vinyl or a lone pair holds are on the scale of 1-adamantyl chloride (YCl), where no
    solvent pushes from behind; alkyl halides are on that of tert-butyl chloride. The scales are never mixed.
    """
    family = departure.family
    if family == "onium":
        return
    scale, key = Scale.Y, f"sn1.power.{family}"
    if family == "sulfonate":
        scale = Scale.YOTS
    elif family == "halide" and is_held:
        scale, key = Scale.YCL, "sn1.power.halide.stabilised"
    power = flask.medium.power(scale)
    yield parameters.term(key, power.value)
    yield Term("ionising power", parameters.value(key), 0.0, power.error, f"{scale} of the solvent", power.source)


def _assistance(reached: list[Station], parameters: Parameters) -> tuple[Term, ...]:
    """Return what a shift that goes with the ionisation lowers its barrier by: a part of what the shift gains.

    Aryl groups bridge instead (see participation), unless a lone pair awaits them: that shift ends at a carbonyl group.
    """
    first = reached[0]
    if not first.nature.is_plain or first.nature.alkyl >= 3:
        return ()
    one_step = (s for s in reached if len(s.path) == 1 and (s.nature.has_donor or not _moves_aryl(s, first)))
    best = max(one_step, key=lambda s: s.energy, default=None)
    if best is None or best.energy <= first.energy + 0.5:
        return ()
    degree = "primary" if first.nature.alkyl < 2 else "secondary"
    if best.path[0].opens is not None:
        degree = "opening"
    return (parameters.term(f"cation.assistance.{degree}", best.energy - first.energy),)


def _moves_aryl(station: Station, first: Station) -> bool:
    moved = station.path[0].migrating
    return moved is not None and first.skeleton.is_aromatic(moved)


# --- what becomes of the cation -------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Fate:
    """One cation: how much of all passes through it, and what part of that loses a proton."""

    station: Station
    weight: float
    loses_proton: float
    terms: tuple[Term, ...]


@dataclass(frozen=True)
class Reception:
    """What receives the cation: its stations with weights, and the attackers with theirs."""

    fates: tuple[Fate, ...]
    attackers: tuple[tuple[Attacker, float], ...]
    flask: Flask
    parameters: Parameters
    is_reversible: bool

    @cached_property
    def captured(self) -> float:
        """Return the share that is captured, by what has left where there is nothing else."""
        return sum(f.weight * (1 - f.loses_proton) for f in self.fates)

    @cached_property
    def eliminated(self) -> float:
        """Return the share that loses a proton."""
        return sum(f.weight * f.loses_proton for f in self.fates)

    def spreads(self, of_elimination: bool) -> tuple[tuple[str, float, float], ...]:
        """Return the slopes of log10 of the share on the terms that decide between capture and loss of a proton."""
        share = self.eliminated if of_elimination else self.captured
        sign = 1.0 if of_elimination else -1.0
        found: dict[str, tuple[float, float]] = {}
        for fate in self.fates:
            lean = sign * fate.weight * fate.loses_proton * (1 - fate.loses_proton) / share
            for term in fate.terms:
                found[term.key] = (found.get(term.key, (0.0, 0.0))[0] + lean * term.factor, term.error)
        return tuple((key, slope, error) for key, (slope, error) in found.items())


def receive(
    reached: list[Station],
    flask: Flask,
    parameters: Parameters,
    temperature_k: float,
    *,
    group: str,
    is_concerted: bool = False,
    can_eliminate: bool = True,
) -> Reception:
    """Return what becomes of a cation in a flask.

    group: what left, for a protonated alcohol is not remade by water. is_concerted: the first cation never exists.
    """
    attackers = [a for a in flask.attackers if not (group == "water" and a.kind.name == "water")]
    returning = _RETURNING | _HALIDES if _is_held_for_long(reached[0]) else _RETURNING
    lasting = [a for a in attackers if a.kind.name not in returning]
    weighted = [
        (a, capture_weight(a, flask, parameters, "stabilised" if reached[0].nature.is_stabilised else "plain"))
        for a in lasting or attackers
        if a.molar > 0
    ]
    total = sum(weight for _, weight in weighted)
    shares = tuple((a, w / total) for a, w in weighted if total and w / total > _LEAST_WEIGHT)
    is_hot_acid = _is_hot_acid(flask, group, temperature_k)
    weights = _visits(reached, flask, parameters, is_persistent=is_hot_acid, is_concerted=is_concerted)
    whole = sum(w for _, w in weights)
    fates = []
    for station, weight in weights:
        if weight / whole < _LEAST_WEIGHT:
            continue
        terms = tuple(_proton_loss_terms(station, flask, parameters, temperature_k, group, is_hot_acid=is_hot_acid))
        ratio = 10 ** min(_ALL, math.fsum(t.contribution for t in terms))
        loses = ratio / (1 + ratio)
        protons = _has_proton_to_lose(station) and (can_eliminate or bool(station.path))
        if not protons:
            loses = 0.0
        elif not shares:
            loses = 1.0
        if _hydroxyl_beside(station) is not None:
            loses = 1.0
        fates.append(Fate(station, weight / whole, loses, terms))
    reversible = flask.is_bronsted_acid and any(a.kind.name in _HALIDES for a, _ in shares)
    kept = sum(f.weight for f in fates)
    scaled = tuple(Fate(f.station, f.weight / kept, f.loses_proton, f.terms) for f in fates)
    if not shares:
        scaled = tuple(f for f in scaled if f.loses_proton > 0) or scaled
    return Reception(scaled, shares, flask, parameters, reversible)


def _is_held_for_long(first: Station) -> bool:
    """Say whether a cation gives halide back until something else has it: beside oxygen or nitrogen, or trityl."""
    return bool(first.nature.oxygen or first.nature.nitrogen or first.nature.aryl >= 3)


def capture_weight(attacker: Attacker, flask: Flask, parameters: Parameters, life: str) -> float:
    """Return the relative rate of capture of a cation: concentration times ten to a slope on n.

    life: plain, stabilised or onium; the longer the cation lives, the more it chooses. Where halide returns in acid,
    it wins in the end.
    """
    ambident = math.fsum(t.contribution for t in ambident_terms(attacker, None, flask, parameters, on_cation=True))
    word = "reversible" if flask.is_bronsted_acid and attacker.kind.name in _HALIDES else life
    return attacker.molar * float(10 ** (parameters.value(f"capture.sensitivity.{word}") * attacker.n + ambident))


def _visits(
    reached: list[Station], flask: Flask, parameters: Parameters, *, is_persistent: bool, is_concerted: bool
) -> list[tuple[Station, float]]:
    """Return how much of all meets its fate at each cation: what comes in, less what shifts on.

    At each cation every shift competes with capture, whose rate is one. is_concerted: nothing stops at the first.
    """
    onward: dict[int, list[tuple[int, float]]] = {}
    for place, station in enumerate(reached):
        if station.parent >= 0:
            log = _shift_log(station, reached[station.parent], flask, parameters, is_persistent=is_persistent)
            onward.setdefault(station.parent, []).append((place, 10**log))
    arriving = [0.0] * len(reached)
    arriving[0] = 1.0
    found = []
    for place, station in enumerate(reached):  # a parent always comes before its children
        ways = onward.get(place, [])
        stays = 0.0 if place == 0 and is_concerted and ways else 1.0
        total = stays + sum(rate for _, rate in ways)
        for child, rate in ways:
            arriving[child] += arriving[place] * rate / total
        found.append((station, arriving[place] * stays / total))
    return found


def _shift_log(
    station: Station, before: Station, flask: Flask, parameters: Parameters, *, is_persistent: bool
) -> float:
    """Return log10 of the rate of one shift over that of capture."""
    value = parameters.value
    change = station.energy - before.energy
    found = value("shift.zero") + station.aptitude
    found += value("shift.gain") * min(change, _MOST_GAIN) if change > 0 else value("shift.loss") * change
    if before.nature.cyclopropyl and station.nature.is_plain:
        found += value("shift.cyclopropylmethyl")
    if not flask.medium.is_protic:
        found += value("shift.ion pair")
    if before.nature.is_stabilised or before.nature.alkyl >= 3:
        found += value("shift.tertiary")
    if _opens_small_ring(station.path[-1], before):
        found += value("shift.small ring")
    if is_persistent and change > 0:
        found += value("shift.persistent")
    return found


def _opens_small_ring(step: Shift, before: Station) -> bool:
    """Say whether a bond of a ring of three or four moves, so that its strain is let go."""
    if step.migrating is None or step.opens is not None:
        return False
    rings = before.skeleton.rings_through(step.origin)
    return any(len(ring) <= 4 and step.migrating in ring for ring in rings)


def _is_hot_acid(flask: Flask, group: str, temperature_k: float) -> bool:
    """Say whether a strong acid holds no nucleophile that keeps the cation, at a heat that drives the alkene out."""
    if not (flask.is_bronsted_acid or flask.is_lewis) or group not in _LEAVES_BY_ACID:
        return False
    keeps = [
        a
        for a in flask.attackers
        if a.kind.name in _HALIDES | {"alcohol", "thiol", "nitrile", "azide"} and a.molar > 1.0
    ]
    if any(a.kind.name in _HALIDES for a in flask.attackers if not a.is_solvent):
        return False
    return not keeps and temperature_k >= HOT_K


def _proton_loss_terms(
    station: Station, flask: Flask, parameters: Parameters, temperature_k: float, group: str, *, is_hot_acid: bool
) -> Iterator[Term]:
    """Yield the terms of log10 of proton loss over capture at one cation."""
    term = parameters.term
    nature, medium = station.nature, flask.medium
    yield term("e1.zero")
    yield term("e1.temperature", 1 / REFERENCE_K - 1 / temperature_k)
    bare = group in _NEUTRAL_GROUPS  # no counter-ion beside the cation to take the proton
    yield term("e1.power.neutral" if bare else "e1.power", medium.power().value)
    branched = sum(
        1
        for near in station.skeleton.neighbours(station.centre)
        if _gives_proton(station, near) and station.skeleton.heavy_degree(near) >= 2
    )
    if branched:
        yield term("e1.branched")
    if branched > 1:
        yield term("e1.branched.second", branched - 1)
    if not bare and sum(medium.share(name) for name in _CARBOXYLIC) > 0.5:
        yield term("e1.carboxylic acid")
    if nature.aryl:
        yield term("e1.aryl", nature.aryl)
    if nature.vinyl:
        yield term("e1.allyl")
    if nature.has_donor:
        yield term("e1.heteroatom")
    if nature.is_plain and nature.alkyl <= 2:
        yield term("e1.secondary")
    if is_hot_acid:
        yield term("e1.hot acid")
    elif any(a.kind.name in _HALIDES and a.molar >= ENOUGH_M and not a.is_solvent for a in flask.attackers):
        yield term("e1.anion")
    elif any(a.is_anion and a.pka > NEUTRAL_PKA and a.molar >= ENOUGH_M for a in flask.attackers):
        yield term("e1.basic anion")
    if any(a.is_solvent and a.kind.base is not None for a in flask.attackers):
        yield term("e1.basic solvent")
    yield term("model.capture")


def _gives_proton(station: Station, near: AtomId) -> bool:
    skeleton = station.skeleton
    return skeleton.symbol(near) == "C" and skeleton.is_saturated(near) and skeleton.hydrogens[near] > 0


def _has_proton_to_lose(station: Station) -> bool:
    skeleton = station.skeleton
    labelled = any(
        skeleton.symbol(m) == "H" for n in skeleton.neighbours(station.centre) for m in skeleton.neighbours(n)
    )
    near = skeleton.neighbours(station.centre)
    return labelled or any(_gives_proton(station, n) for n in near) or _hydroxyl_beside(station) is not None


def _hydroxyl_beside(station: Station) -> AtomId | None:
    """Return a hydroxyl oxygen on the cationic carbon, which becomes a carbonyl group."""
    if not station.path:
        return None
    for near in station.skeleton.neighbours(station.centre):
        if station.skeleton.symbol(near) == "O" and station.skeleton.hydrogens[near]:
            return near
    return None


# --- products -------------------------------------------------------------------------------------------------


def cation_at(structure: Structure, site: ReactiveSite, path: tuple[Shift, ...]) -> Cation:
    """Return the cation at the end of a path of shifts; the first shift goes with the ionisation, from behind."""
    if not path:
        return ionise(structure, site)
    first, *rest = path
    if first.opens is None:
        cation = ionise_with_shift(structure, site, first.origin, first.migrating)
    else:
        cation = _step(ionise(structure, site), first)
    return after_steps(cation, rest)


def after_steps(cation: Cation, steps: Iterable[Shift]) -> Cation:
    """Return the cation after further shifts, given in the atoms of the structure it came from."""
    for step in steps:
        cation = _step(cation, step)
    return cation


def _step(cation: Cation, step: Shift) -> Cation:
    place = cation.from_substrate
    if step.opens is not None:
        return fragment(cation, place[step.origin], place[step.opens])
    return shift_12(cation, place[step.origin], None if step.migrating is None else place[step.migrating])


def path_words(path: tuple[Shift, ...], skeleton: Skeleton) -> tuple[str, ...]:
    """Return the shifts of a path in words."""
    words = ["ionisation"]
    for step in path:
        if step.opens is not None:
            words.append("cyclopropyl opens to allyl")
        elif step.migrating is None:
            words.append("1,2-shift of hydrogen")
        elif skeleton.is_aromatic(step.migrating):
            words.append("1,2-shift of aryl")
        else:
            words.append("1,2-shift of alkyl")
    return tuple(words)


def _captured(reception: Reception, departure: Departure, *, inverts: bool) -> tuple[Outcome, ...]:
    start = partial(cation_at, departure.structure, departure.site)
    return captured_outcomes(reception, start, departure.site, skeleton_of(departure.structure), inverts=inverts)


def captured_outcomes(
    reception: Reception,
    start: Callable[[tuple[Shift, ...]], Cation],
    site: ReactiveSite,
    skeleton: Skeleton,
    *,
    inverts: bool = False,
) -> tuple[Outcome, ...]:
    """Return the products of capture over all stations, attackers, faces and ends of allyl cations."""
    found: list[Outcome] = []
    for fate in reception.fates:
        share = fate.weight * (1 - fate.loses_proton)
        if share < _LEAST_WEIGHT:
            continue
        cation = start(fate.station.path)
        words = path_words(fate.station.path, skeleton)
        for form, form_share, is_transposed in _forms(cation, fate.station, reception):
            for attacker, part in reception.attackers:
                edits = exo_only(capture(form, attacker.nucleophile), site.alpha_carbon)
                edits = trans_to_acyloxy(edits, fate.station, site.alpha_carbon)
                if not edits:
                    continue
                rearranged = bool(fate.station.path) or (is_transposed and not site.is_addition)
                faces = _face_shares(edits, fate.station.nature, reception.parameters, inverts=inverts)
                for edit, face in zip(edits, faces, strict=True):
                    course = _course(site, fate.station, edits, faces, is_transposed=is_transposed)
                    told = (*words, "capture at the far end" if is_transposed else "capture")
                    product = edit.product
                    if attacker.kind.name == "nitrile":
                        product, told = hydrated_nitrilium(product), (*told, "water on the nitrilium ion")
                    found.append(Outcome(product, share * form_share * part * face, course, rearranged, told))
    return merged_outcomes(found) if found else ()


def _forms(cation: Cation, station: Station, reception: Reception) -> Iterator[tuple[Cation, float, bool]]:
    """Yield the cation drawn at each of its allylic ends with its share of capture, and whether it is the far one."""
    if reception.is_reversible and station.nature.cyclopropyl and station.nature.alkyl:
        yield from _opened_cyclopropanes(cation, reception.parameters)
        return
    others = allylic_forms(cation) if station.nature.vinyl else ()
    if not others:
        yield cation, 1.0, False
        return
    forms = [(cation, False), *((form, True) for form in others)]
    parameters = reception.parameters
    trans = parameters.value("e1.trans")
    logs = []
    for form, _ in forms:
        nature = nature_of(skeleton_of(form.structure), form.centre)
        branches = nature.alkyl + nature.cyclopropyl
        if reception.is_reversible:
            log = parameters.value("capture.allyl.stable") * branches
        else:
            log = parameters.value(f"capture.allyl.{_BRANCHES[min(branches, 2)]}") if branches else 0.0
        if nature.aryl:
            log += parameters.value("capture.allyl.conjugated")
        if "/C=C\\" in form.structure.smiles or "\\C=C/" in form.structure.smiles:
            log -= trans
        logs.append(log)
    total = sum(10**log for log in logs)
    for (form, is_far), log in zip(forms, logs, strict=True):
        yield form, 10**log / total, is_far


def _opened_cyclopropanes(cation: Cation, parameters: Parameters) -> Iterator[tuple[Cation, float, bool]]:
    """Yield the homoallylic ions of a cyclopropylmethyl cation: halide that comes and goes ends at the open chain."""
    atoms = cation.structure.atoms
    found = []
    for near, order in atoms[cation.centre].neighbours:
        if order != 1.0 or 3 not in atoms[near].ring_sizes:
            continue
        for far, far_order in atoms[near].neighbours:
            if far != cation.centre and far_order == 1.0 and 3 in atoms[far].ring_sizes:
                found.append((len(atoms[far].neighbours), near, far))
    least = min((degree for degree, _, _ in found), default=0)
    open_chains: dict[str, tuple[Cation, float]] = {}
    for cis, weight in ((False, 10 ** parameters.value("e1.trans")), (True, 1.0)):
        for degree, near, far in found:
            if degree == least:
                form = fragment(cation, near, far, cis=cis)
                open_chains.setdefault(form.structure.smiles, (form, weight))
    total = math.fsum(weight for _, weight in open_chains.values())
    for form, weight in open_chains.values():
        yield form, weight / total, True
    if not open_chains:
        yield cation, 1.0, False


def _net_inversion(nature: Nature, parameters: Parameters) -> float:
    if nature.is_stabilised or nature.cyclopropyl:
        return parameters.value("capture.inversion.stabilised")
    word = "tertiary" if nature.alkyl >= 3 else "secondary"
    return parameters.value(f"capture.inversion.{word}")


def _face_shares(
    edits: tuple[Edit, ...], nature: Nature, parameters: Parameters, *, inverts: bool
) -> tuple[float, ...]:
    effects = [edit.effect for edit in edits]
    if len(edits) != 2 or StereoEffect.INVERSION not in effects:
        return (1.0 / len(edits),) * len(edits)
    net = parameters.value("capture.inversion.opening") if inverts else _net_inversion(nature, parameters)
    return tuple((1 + net) / 2 if effect is StereoEffect.INVERSION else (1 - net) / 2 for effect in effects)


def _course(
    site: ReactiveSite, station: Station, edits: tuple[Edit, ...], faces: tuple[float, ...], *, is_transposed: bool
) -> Course:
    """Return the course at the carbon that bore the group; not applicable where it had no configuration to lose."""
    if site.stereo is not SiteStereo.SPECIFIED:
        return Course.NOT_APPLICABLE
    if station.path or is_transposed:
        return Course.NOT_APPLICABLE
    if len(edits) != 2:
        words = {StereoEffect.INVERSION: Course.INVERSION, StereoEffect.RETENTION: Course.RETENTION}
        return words.get(edits[0].effect, Course.NOT_APPLICABLE)
    net = abs(faces[0] - faces[1])
    if edits[0].effect is edits[1].effect:
        return Course.NOT_DETERMINED
    if net > _INVERTED:
        return Course.INVERSION
    return Course.RACEMISATION if net < _RACEMISED else Course.PARTIAL_INVERSION


def _eliminated(reception: Reception, departure: Departure) -> tuple[Outcome, ...]:
    start = partial(cation_at, departure.structure, departure.site)
    return eliminated_outcomes(reception, start, departure.site, skeleton_of(departure.structure))


def eliminated_outcomes(
    reception: Reception, start: Callable[[tuple[Shift, ...]], Cation], site: ReactiveSite, skeleton: Skeleton
) -> tuple[Outcome, ...]:
    """Return the alkenes, and from a hydroxyl group beside the cation the carbonyl compound, over all stations."""
    found: list[Outcome] = []
    for fate in reception.fates:
        share = fate.weight * fate.loses_proton
        if share < _LEAST_WEIGHT:
            continue
        cation = start(fate.station.path)
        words = (*path_words(fate.station.path, skeleton), "loss of a proton")
        back = {new: old for old, new in cation.from_substrate.items()}
        moved = any(step.migrating is not None or step.opens is not None for step in fate.station.path)
        weighted = list(_proton_losses(cation, reception.parameters))
        total = sum(weight for _, _, weight in weighted)
        for edit, near, weight in weighted:
            ends = {back.get(cation.centre), back.get(near)}
            rearranged = moved or site.alpha_carbon not in ends
            found.append(Outcome(edit.product, share * weight / total, Course.NOT_APPLICABLE, rearranged, words))
    return merged_outcomes(found) if found else ()


def _proton_losses(cation: Cation, parameters: Parameters) -> Iterator[tuple[Edit, AtomId, float]]:
    """Yield each loss of a proton with its weight: more substituted and conjugated alkenes first, E before Z."""
    atoms = cation.structure.atoms
    near = [n for n, _ in atoms[cation.centre].neighbours]
    hydroxyl = [n for n in near if atoms[n].symbol == "O" and atoms[n].hydrogens]
    for n in hydroxyl or near:
        if atoms[n].symbol not in {"C", "O"} or atoms[n].aromatic:
            continue
        if atoms[n].symbol == "C" and any(o > 1.0 for _, o in atoms[n].neighbours):
            continue
        edits = lose_proton(cation, n)
        if not edits:
            continue
        around = [m for m, _ in atoms[n].neighbours if m != cation.centre and atoms[m].symbol != "H"]
        log = parameters.value("e1.saytzeff") * len(around)
        if any(atoms[m].aromatic or any(o == 2.0 for _, o in atoms[m].neighbours) for m in around):
            log += parameters.value("e1.conjugated")
        count = atoms[n].hydrogens or 1
        trans = 10 ** parameters.value("e1.trans")
        weights = [trans if edit.geometry == "E" else 1.0 for edit in edits]
        whole = sum(weights) if len(edits) > 1 else 1.0
        for edit, weight in zip(edits, weights, strict=True):
            yield edit, n, count * 10**log * weight / whole


# --- chlorosulfites without a base ----------------------------------------------------------------------------


def sni_pathways(departure: Departure, flask: Flask, parameters: Parameters) -> Iterator[Pathway]:
    """Yield the collapse of a chlorosulfite within its ion pair, which keeps the configuration; not beside a base."""
    if departure.group != "chlorosulfite" or flask.has_base or departure.site.leaving_atom is None:
        return
    if departure.site.degree in {Degree.METHYL, Degree.PRIMARY} and not departure.site.classes & {
        "benzylic",
        "allylic",
    }:
        return
    chloride = next((a for a in flask.attackers if a.kind.name == "chloride"), None)
    if chloride is None:
        return
    bare = skeleton_of(departure.structure).without_bond(departure.site.alpha_carbon, departure.site.leaving_atom)
    stability = cation_terms(departure.structure, bare, departure.site.alpha_carbon, parameters)
    lean = parameters.value("sni.cation")
    terms = [parameters.term("sni.zero")]
    terms += [Term(t.key, t.factor * lean, t.value, t.error, t.meaning, t.source) for t in stability]
    rate = LogRate((*terms, parameters.term("model.ionisation")), (parameters.term("sn1.entropy"),))
    event = "the chlorosulfite collapses within its ion pair"
    yield alone(Mechanism.SN1, departure, rate, event, partial(_kept, departure, chloride))


def _kept(departure: Departure, chloride: Attacker) -> tuple[Outcome, ...]:
    edits = capture(ionise(departure.structure, departure.site), chloride.nucleophile)
    kept = [e for e in edits if e.effect is StereoEffect.RETENTION] or list(edits)
    course = Course.RETENTION if departure.site.stereo is SiteStereo.SPECIFIED else Course.NOT_APPLICABLE
    return merged_outcomes([Outcome(e.product, 1.0, course, False, ("ion pair", "return of chloride")) for e in kept])
