"""Carbocations: how stable one is, as terms, and where it goes by 1,2-shifts.

Stability is on the scale of log10 of ionisation rates, tert-butyl = 0. The search for shifts runs on adjacency alone;
nothing is built until a product is wanted.
"""

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import lru_cache

from builder.chemistry.geometry import ArylSubstituent, aryl_substituents
from builder.chemistry.structure import AtomId, Structure
from builder.mechanism.constants import ring_strain_kj, sigma_plus
from builder.mechanism.rate_terms import Parameters, Term
from builder.mechanism.skeleton import LARGE_RING, Skeleton

__all__ = ["MAX_SHIFTS", "Nature", "Shift", "Station", "cation_terms", "is_bridgehead", "nature_of", "stations"]

MAX_SHIFTS = 3
MAX_STATIONS = 60
_ACCEPTORS_BY_BOND = {("C", "O"), ("C", "N"), ("C", "S")}
_ELECTRONEGATIVE = frozenset({"O", "N", "F", "Cl", "Br", "I", "S"})
_HALOGENS = frozenset({"F", "Cl", "Br", "I"})


@dataclass(frozen=True, slots=True)
class Nature:
    """What surrounds a cationic carbon.

    allyl_ends: alkyl groups on the two ends of an allyl cation together; allyl_aryl: aryl groups there.
    """

    alkyl: int
    aryl: int
    vinyl: int
    cyclopropyl: int
    alkynyl: int
    oxygen: int
    nitrogen: int
    amide: int
    acyloxy: int
    sulfur: int
    halogen: int
    acceptors: int
    is_saturated: bool

    @property
    def is_plain(self) -> bool:
        """Say whether only alkyl groups hold the cation."""
        return not (self.aryl or self.vinyl or self.cyclopropyl or self.alkynyl or self.has_donor) and self.is_saturated

    @property
    def has_donor(self) -> bool:
        """Say whether a lone pair next to it holds the cation."""
        return bool(self.oxygen or self.nitrogen or self.amide or self.sulfur)

    @property
    def is_stabilised(self) -> bool:
        """Say whether a π system or a lone pair holds the cation."""
        return bool(self.aryl or self.vinyl) or self.has_donor


def nature_of(skeleton: Skeleton, centre: AtomId) -> Nature:
    """Return what surrounds a carbon, its leaving group taken off already."""
    count = dict.fromkeys(
        (
            "alkyl",
            "aryl",
            "vinyl",
            "cyclopropyl",
            "alkynyl",
            "oxygen",
            "nitrogen",
            "amide",
            "acyloxy",
            "sulfur",
            "halogen",
        ),
        0,
    )
    acceptors = 0
    for near, order in skeleton.neighbours(centre).items():
        if order != 1.0 and not skeleton.is_aromatic(centre):
            continue
        word = _neighbour_word(skeleton, near, centre)
        if word == "acceptor":
            acceptors += 1
        elif word is not None:
            count[word] += 1
    return Nature(**count, acceptors=acceptors, is_saturated=skeleton.is_saturated(centre))


def _neighbour_word(skeleton: Skeleton, near: AtomId, centre: AtomId) -> str | None:
    symbol = skeleton.symbol(near)
    if symbol in _HALOGENS:
        return "halogen"
    if symbol in {"O", "N", "S"}:
        if skeleton.charge(near) > 0:
            return "acceptor"
        acylated = any(_is_acyl(skeleton, n) for n in skeleton.neighbours(near) if n != centre)
        if symbol == "S":
            oxidised = any(o == 2.0 for o in skeleton.neighbours(near).values())
            return "acceptor" if oxidised else "sulfur"
        return {"O": ("oxygen", "acyloxy"), "N": ("nitrogen", "amide")}[symbol][acylated]
    if symbol == "P":
        return "acceptor"
    if symbol != "C":
        return None
    if skeleton.is_aromatic(near):
        return "aryl"
    orders = {n: o for n, o in skeleton.neighbours(near).items() if n != centre and o > 1.0}
    if orders:
        far, order = next(iter(orders.items()))
        if (symbol, skeleton.symbol(far)) in _ACCEPTORS_BY_BOND:
            return "acceptor"
        return "alkynyl" if order == 3.0 else "vinyl"
    if sum(skeleton.symbol(n) == "F" for n in skeleton.neighbours(near)) >= 2:
        return "acceptor"
    if _is_cyclopropyl(skeleton, near, centre):
        return "cyclopropyl"
    return "alkyl"


def _is_acyl(skeleton: Skeleton, atom: AtomId) -> bool:
    return skeleton.symbol(atom) in {"C", "S", "P"} and any(
        order == 2.0 and skeleton.symbol(n) in {"O", "S", "N"} for n, order in skeleton.neighbours(atom).items()
    )


def _is_cyclopropyl(skeleton: Skeleton, near: AtomId, centre: AtomId) -> bool:
    """Say whether a neighbour is a carbon of a cyclopropane the centre is no part of."""
    around = [n for n, o in skeleton.neighbours(near).items() if n != centre and skeleton.symbol(n) == "C" and o == 1.0]
    return any(
        other in skeleton.neighbours(one) and centre not in (one, other) and one not in skeleton.neighbours(centre)
        for place, one in enumerate(around)
        for other in around[place + 1 :]
    )


def is_bridgehead(skeleton: Skeleton, atom: AtomId) -> str | None:
    """Return what kind of bridgehead an atom is ("adamantyl", "six", "five", "large"); None for none.

    A bridgehead is shared by two smallest rings that have three or more atoms in common.
    """
    if len(skeleton.neighbours(atom)) < 3:
        return None
    rings = skeleton.rings_through(atom)
    if len(rings) < 3:
        return None
    first, second, third = rings[:3]
    if len(first & second) < 3 or len(third) > LARGE_RING:
        return None
    if len(third) <= 6 and len(first) <= 5:
        return "five"
    if len(third) <= 6:
        return "six" if len(first & second & third) > 1 else "adamantyl"
    return "large"


def cation_terms(structure: Structure, skeleton: Skeleton, centre: AtomId, parameters: Parameters) -> tuple[Term, ...]:
    """Return the terms that add up to the stability of a cation; its centre has lost its leaving group.

    structure: the one the skeleton's atoms are numbered by, for what stands on its aryl rings.
    """
    nature = nature_of(skeleton, centre)
    term = parameters.term
    if skeleton.is_aromatic(centre):
        return (term("cation.aryl cation"),)
    if not nature.is_saturated:
        terms = [term("cation.vinyl")]
        if nature.aryl or nature.vinyl:
            terms.append(term("cation.allyl.aryl"))
        return tuple(terms)
    terms = list(_core_terms(structure, skeleton, centre, nature, parameters))
    if nature.acceptors:
        terms.append(term("cation.acceptor", nature.acceptors))
    if nature.acyloxy:
        terms.append(term("cation.acyloxy", nature.acyloxy))
    if nature.halogen and not nature.has_donor:
        terms.append(term("cation.halogen", nature.halogen))
    beta = _beta_acceptors(skeleton, centre)
    if beta and not nature.has_donor:
        terms.append(term("cation.beta.acceptor", beta))
    if _has_beta_silicon(skeleton, centre):
        terms.append(term("cation.silicon beta"))
    return (*terms, *_frame_terms(skeleton, centre, nature, parameters))


def _frame_terms(skeleton: Skeleton, centre: AtomId, nature: Nature, parameters: Parameters) -> Iterator[Term]:
    """Yield what the ring, the bridge or the crowd around the centre costs or gains."""
    term = parameters.term
    bridgehead = is_bridgehead(skeleton, centre)
    if bridgehead is not None:
        yield term(f"cation.bridgehead.{bridgehead}")
    elif nature.is_plain:
        ring = skeleton.smallest_ring(centre)
        if ring is not None:
            yield term(f"cation.ring.{ring}")
            if _bears_tert_butyl(skeleton, centre):
                yield term("cation.crowded.ring")
        elif nature.alkyl == 3 and _is_crowded(skeleton, centre):
            yield term("cation.crowded")


def _core_terms(
    structure: Structure, skeleton: Skeleton, centre: AtomId, nature: Nature, parameters: Parameters
) -> Iterator[Term]:
    term = parameters.term
    carbons = nature.alkyl + nature.aryl + nature.vinyl + nature.cyclopropyl
    if nature.has_donor:
        donor = "nitrogen" if nature.nitrogen else "oxygen" if nature.oxygen else "sulfur" if nature.sulfur else "amide"
        yield term(f"cation.{donor}")
        if carbons + nature.oxygen + nature.nitrogen + nature.sulfur - 1:
            yield term("cation.oxygen.alkyl", carbons + nature.oxygen + nature.nitrogen + nature.sulfur - 1)
        return
    if nature.vinyl:
        yield from _allyl_terms(skeleton, centre, nature, parameters)
        if nature.aryl:
            yield from _ring_terms(structure, skeleton, centre, "cation.rho.cumyl", parameters)
        if nature.cyclopropyl:
            yield term("cation.cyclopropyl.more", nature.cyclopropyl)
        return
    if nature.aryl:
        alkyl = min(nature.alkyl + nature.cyclopropyl, 3 - min(nature.aryl, 3))
        yield term(f"cation.aryl.{min(nature.aryl, 3)}.{alkyl}")
        rho = "diaryl" if nature.aryl > 1 else ("benzyl", "secondary", "cumyl")[alkyl]
        yield from _ring_terms(structure, skeleton, centre, f"cation.rho.{rho}", parameters)
        if nature.cyclopropyl:
            yield term("cation.cyclopropyl.more", nature.cyclopropyl)
        return
    if nature.cyclopropyl:
        yield term(f"cation.cyclopropyl.{min(nature.alkyl, 2)}")
        if nature.cyclopropyl > 1:
            yield term("cation.cyclopropyl.more", nature.cyclopropyl - 1)
        return
    if nature.alkynyl:
        yield term("cation.propargyl")
        if nature.alkyl:
            yield term("cation.propargyl.alkyl", nature.alkyl)
        return
    # An acceptor's carbon counts as a substituent; what it costs has a term of its own.
    degree = min(nature.alkyl + nature.acceptors + nature.acyloxy, 3)
    yield term(f"cation.{('methyl', 'primary', 'secondary', 'tertiary')[degree]}")


def _allyl_terms(skeleton: Skeleton, centre: AtomId, nature: Nature, parameters: Parameters) -> Iterator[Term]:
    """Yield the terms of an allyl cation, counted over both of its ends."""
    alkyl, aryl, donors = nature.alkyl + nature.cyclopropyl, nature.aryl + nature.vinyl - 1, 0
    central = 0
    for near, order in skeleton.neighbours(centre).items():
        if order != 1.0 or _neighbour_word(skeleton, near, centre) != "vinyl":
            continue
        far = next(n for n, o in skeleton.neighbours(near).items() if o > 1.0)
        for end in skeleton.neighbours(far):
            if end == near:
                continue
            word = _neighbour_word(skeleton, end, far)
            alkyl += word in {"alkyl", "cyclopropyl"}
            aryl += word in {"aryl", "vinyl"}
            donors += word in {"oxygen", "nitrogen", "sulfur"}
        central += sum(
            _neighbour_word(skeleton, n, near) == "alkyl" for n in skeleton.neighbours(near) if n not in (centre, far)
        )
        break
    term = parameters.term
    yield term("cation.allyl")
    if alkyl:
        yield term("cation.allyl.alkyl", min(alkyl, 2))
    if alkyl > 2:
        yield term("cation.allyl.alkyl.third", alkyl - 2)
    if central:
        yield term("cation.allyl.central", central)
    if aryl:
        yield term("cation.allyl.aryl", aryl)
    if donors:
        yield term("cation.oxygen", donors)


def _ring_terms(
    structure: Structure, skeleton: Skeleton, centre: AtomId, rho: str, parameters: Parameters
) -> Iterator[Term]:
    """Yield what the aryl rings on a cation carry, and what rings other than benzene they are."""
    total = 0.0
    for near in skeleton.neighbours(centre):
        if skeleton.symbol(near) != "C" or not skeleton.is_aromatic(near):
            continue
        kind, sigma = aryl_character(structure, near)
        total += sigma
        if kind != "phenyl":
            yield parameters.term(f"cation.{kind}")
    if total:
        yield parameters.term(rho, total)


@lru_cache(maxsize=512)
def aryl_character(structure: Structure, ipso: AtomId) -> tuple[str, float]:
    """Return what ring an aryl carbon belongs to (phenyl, naphthyl, heteroaryl ...) and the sum of σ+ on it."""
    atoms = structure.atoms
    ring = {ipso}
    stack = [ipso]
    while stack:
        for near, _ in atoms[stack.pop()].neighbours:
            if atoms[near].aromatic and near not in ring and set(atoms[near].ring_sizes) & {5, 6}:
                ring.add(near)
                stack.append(near)
    own = _own_ring(structure, ipso)
    hetero = {atoms[a].symbol for a in own if atoms[a].symbol != "C"}
    if hetero:
        five = len(own) == 5
        rich = five and not (hetero == {"N"} and sum(atoms[a].symbol == "N" for a in own) > 2)
        return ("heteroaryl electron-rich" if rich else "heteroaryl electron-poor"), 0.0
    substituents: tuple[ArylSubstituent, ...] = aryl_substituents(structure, ipso)
    fused = [s for s in substituents if atoms[s.atom].aromatic and s.name is None]
    sigma = sum(sigma_plus(s) for s in substituents)
    if fused and any(s.position.value != "para" for s in fused):
        return "naphthyl", sigma
    return "phenyl", sigma


def _own_ring(structure: Structure, ipso: AtomId) -> tuple[AtomId, ...]:
    """Return the smallest aromatic ring through an atom."""
    atoms = structure.atoms
    best: tuple[AtomId, ...] = ()
    around = [n for n, o in atoms[ipso].neighbours if o == 1.5]
    for place, one in enumerate(around):
        for other in around[place + 1 :]:
            path = _aromatic_path(structure, one, other, ipso)
            if path and (not best or len(path) + 1 < len(best)):
                best = (*path, ipso)
    return best or (ipso,)


def _aromatic_path(structure: Structure, start: AtomId, goal: AtomId, without: AtomId) -> tuple[AtomId, ...]:
    atoms = structure.atoms
    before = {start: start}
    queue = [start]
    for here in queue:
        if here == goal:
            found = [here]
            while found[-1] != start:
                found.append(before[found[-1]])
            return tuple(found)
        for near, order in atoms[here].neighbours:
            if order == 1.5 and near != without and near not in before:
                before[near] = here
                queue.append(near)
    return ()


def _beta_acceptors(skeleton: Skeleton, centre: AtomId) -> int:
    """Return how many saturated beta carbons bear an electronegative group."""
    count = 0
    for near in skeleton.neighbours(centre):
        if skeleton.symbol(near) != "C" or not skeleton.is_saturated(near):
            continue
        for far in skeleton.neighbours(near):
            if far == centre:
                continue
            acceptor = skeleton.symbol(far) in _ELECTRONEGATIVE or _neighbour_word(skeleton, far, near) == "acceptor"
            if acceptor:
                count += 1
                break
    return count


def _has_beta_silicon(skeleton: Skeleton, centre: AtomId) -> bool:
    return any(
        skeleton.symbol(far) in {"Si", "Sn"}
        for near in skeleton.neighbours(centre)
        for far in skeleton.neighbours(near)
    )


def _bears_tert_butyl(skeleton: Skeleton, centre: AtomId) -> bool:
    return any(
        skeleton.symbol(n) == "C"
        and skeleton.heavy_degree(n) == 4
        and skeleton.path(n, centre, -1) == (centre, n)
        and all(skeleton.heavy_degree(m) == 1 for m in skeleton.neighbours(n) if m != centre)
        for n in skeleton.neighbours(centre)
    )


def _is_crowded(skeleton: Skeleton, centre: AtomId) -> bool:
    """Say whether tert-butyl stands on the centre or on a beta carbon."""
    for near in skeleton.neighbours(centre):
        if skeleton.symbol(near) != "C":
            continue
        if skeleton.heavy_degree(near) == 4:
            return True
        if any(
            far != centre and skeleton.symbol(far) == "C" and skeleton.heavy_degree(far) == 4
            for far in skeleton.neighbours(near)
        ):
            return True
    return False


# --- shifts ---------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Shift:
    """One step: a group (None: a hydrogen) moves from origin to the centre, or a cyclopropane opens.

    opens: the atom whose bond to `origin` breaks, for the opening of cyclopropyl to allyl; None for a shift.
    """

    origin: AtomId
    migrating: AtomId | None
    opens: AtomId | None = None


@dataclass(slots=True)
class Station:
    """A cation that can be reached.

    energy: stability with the strain released since the first cation, log10 units.
    lowest: lowest energy on the way, itself and the first cation included.
    aptitude: migratory aptitude of the last shift. parent: place of the cation before it; -1 for the first.
    released: what the strain let go since the first cation is worth, log10 units.
    """

    skeleton: Skeleton
    centre: AtomId
    energy: float
    lowest: float
    path: tuple[Shift, ...]
    aptitude: float
    parent: int
    released: float
    nature: Nature = field(repr=False)


def stations(
    structure: Structure, first: Skeleton, centre: AtomId, parameters: Parameters, depth: int = MAX_SHIFTS
) -> list[Station]:
    """Return the cations within reach, the first one first, then in the order they are found.

    A shift that costs more than a secondary cation has over a tertiary one is not followed.
    """
    start_energy = _energy(structure, first, centre, parameters)
    strain = None
    found = [Station(first, centre, start_energy, start_energy, (), 0.0, -1, 0.0, nature_of(first, centre))]
    seen = {_identity(first, centre, first)}
    worst = parameters.value("cation.secondary") - 1.5
    frontier = [0]
    for _ in range(depth):
        following: list[Station] = []
        for place in frontier:
            station = found[place]
            for step, skeleton, new_centre in _steps(station.skeleton, station.centre):
                key = _identity(skeleton, new_centre, first)
                if key in seen or len(found) + len(following) >= MAX_STATIONS:
                    continue
                seen.add(key)
                energy = _energy(structure, skeleton, new_centre, parameters)
                if _changes_rings(step, station.skeleton):
                    if strain is None:
                        strain = _strain(first)
                    released = parameters.value("cation.strain") * (strain - _strain(skeleton))
                else:
                    released = station.released
                energy += released
                if energy < min(start_energy, worst) - 0.01 and energy < start_energy + worst:
                    continue
                following.append(
                    Station(
                        skeleton,
                        new_centre,
                        energy,
                        min(station.lowest, energy),
                        (*station.path, step),
                        _aptitude(step, station.skeleton, parameters),
                        place,
                        released,
                        nature_of(skeleton, new_centre),
                    )
                )
        frontier = list(range(len(found), len(found) + len(following)))
        found += following
    return found


def _energy(structure: Structure, skeleton: Skeleton, centre: AtomId, parameters: Parameters) -> float:
    return sum(t.factor * t.value for t in cation_terms(structure, skeleton, centre, parameters))


def _strain(skeleton: Skeleton) -> float:
    return sum(map(ring_strain_kj, skeleton.ring_sizes()))


def _changes_rings(step: Shift, skeleton: Skeleton) -> bool:
    if step.opens is not None:
        return True
    moved = step.migrating
    if moved is None or (skeleton.is_aromatic(moved) and not skeleton.is_aromatic(step.origin)):
        return (
            moved is not None and bool(skeleton.path(step.origin, moved, -1)) and _in_ring(skeleton, step.origin, moved)
        )
    return _in_ring(skeleton, step.origin, moved)


def _in_ring(skeleton: Skeleton, one: AtomId, other: AtomId) -> bool:
    cut = skeleton.without_bond(one, other)
    return bool(cut.path(one, other, -1))


def _aptitude(step: Shift, skeleton: Skeleton, parameters: Parameters) -> float:
    if step.migrating is None:
        return parameters.value("shift.hydrogen")
    return parameters.value("shift.aryl") if skeleton.is_aromatic(step.migrating) else 0.0


def _identity(skeleton: Skeleton, centre: AtomId, first: Skeleton) -> tuple[object, ...]:
    """Return what tells two stations apart: centre, and bonds and hydrogens that differ from the first."""
    changed = tuple(
        (atom, tuple(sorted(bonds)), skeleton.hydrogens[atom])
        for atom, bonds in enumerate(skeleton.bonds)
        if bonds is not first.bonds[atom] or skeleton.hydrogens[atom] != first.hydrogens[atom]
    )
    return (centre, changed)


def _steps(skeleton: Skeleton, centre: AtomId) -> Iterator[tuple[Shift, Skeleton, AtomId]]:
    """Yield every 1,2-shift to the centre, and the opening of a cyclopropyl cation."""
    around = skeleton.neighbours(centre)
    for origin, order in around.items():
        if skeleton.symbol(origin) != "C" or order != 1.0 or not skeleton.is_saturated(origin):
            continue
        if skeleton.is_aromatic(origin):
            continue
        if skeleton.hydrogens[origin] and is_bridgehead(skeleton, origin) is None:
            yield Shift(origin, None), skeleton.shifted(origin, centre, None), origin
        for moved in skeleton.neighbours(origin):
            if moved == centre:
                continue
            if moved in around:  # the three of them are a cyclopropane, which opens
                yield Shift(origin, None, moved), skeleton.opened(centre, origin, moved), moved
                continue
            if skeleton.symbol(moved) not in {"C", "H"} or _neighbour_word(skeleton, moved, origin) == "acceptor":
                continue
            yield Shift(origin, moved), skeleton.shifted(origin, centre, moved), origin
