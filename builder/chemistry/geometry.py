"""What lies on which side: faces of rings, and substituents of an aromatic ring by position."""

from dataclasses import dataclass
from enum import StrEnum
from functools import cache, lru_cache

from rdkit import Chem

from builder.chemistry.ledger import HYDROGEN, drawn_centres
from builder.chemistry.patterns import load_aryl_substituents
from builder.chemistry.structure import AtomId, Structure

__all__ = [
    "ArylPosition",
    "ArylSubstituent",
    "Relation",
    "Ring",
    "aryl_substituent_names",
    "aryl_substituents",
    "perceive_rings",
]


class Relation(StrEnum):
    """How two substituents of a ring stand to each other."""

    CIS = "cis"
    TRANS = "trans"


class ArylPosition(StrEnum):
    """Place of a substituent on a benzene ring, counted from the carbon of interest."""

    ORTHO = "ortho"
    META = "meta"
    PARA = "para"


@dataclass(frozen=True, slots=True)
class Ring:
    """A ring of the smallest set, its atoms in order around it.

    faces: for each drawn stereocentre of the ring and each substituent there (None for hydrogen), +1 or -1;
        equal signs are on the same face.
    """

    atoms: tuple[AtomId, ...]
    faces: tuple[tuple[AtomId, AtomId | None, int], ...]

    def face(self, ring_atom: AtomId, substituent: AtomId | None) -> int | None:
        """Return the face, +1 or -1, a substituent is on; None where its configuration is not drawn."""
        for atom, other, side in self.faces:
            if (atom, other) == (ring_atom, substituent):
                return side
        return None

    def relation(self, one: tuple[AtomId, AtomId | None], other: tuple[AtomId, AtomId | None]) -> Relation | None:
        """Return whether two (ring atom, substituent) pairs are cis or trans; None if either is not drawn."""
        first, second = self.face(*one), self.face(*other)
        if first is None or second is None:
            return None
        return Relation.CIS if first == second else Relation.TRANS


@dataclass(frozen=True, slots=True)
class ArylSubstituent:
    """A substituent of a benzene ring.

    name: as tables of substituent constants write it (OMe, NO2, ...); None for one the table does not know.
    atom: the substituent's atom bonded to the ring.
    """

    position: ArylPosition
    name: str | None
    atom: AtomId


@lru_cache(maxsize=512)
def perceive_rings(structure: Structure) -> tuple[Ring, ...]:
    """Return the smallest rings, smaller first, with the faces of their drawn substituents."""
    centres = drawn_centres(structure)
    found = []
    for ring in structure.mol.GetRingInfo().AtomRings():
        faces: list[tuple[AtomId, AtomId | None, int]] = []
        for place, at in enumerate(ring):
            centre = centres.get(at)
            before, after = ring[place - 1], ring[(place + 1) % len(ring)]
            if centre is None or before not in centre.neighbours or after not in centre.neighbours:
                continue
            for other in centre.neighbours:
                if other not in {before, after}:
                    # Seen from the atom before, the turn after -> substituent -> other tells the face.
                    _, sign = centre.seen_from(before, after, other)
                    faces.append((at, None if other == HYDROGEN else other, sign))
        found.append(Ring(tuple(ring), tuple(sorted(faces, key=lambda f: (f[0], f[1] is None, f[1] or 0)))))
    return tuple(sorted(found, key=lambda r: (len(r.atoms), r.atoms)))


@cache
def aryl_substituent_names() -> tuple[str, ...]:
    """Return the names `aryl_substituents` can give."""
    return tuple(row.name for row in load_aryl_substituents())


@lru_cache(maxsize=512)
def aryl_substituents(structure: Structure, ipso: AtomId) -> tuple[ArylSubstituent, ...]:
    """Return the substituents of the six-membered aromatic ring of a carbon, by position and AtomId.

    ipso: the ring carbon positions are counted from, such as the one next to a benzylic site. Fused rings count
    as unnamed substituents. Empty unless `ipso` lies in a benzene ring.
    """
    mol = structure.mol
    ring = next((r for r in mol.GetRingInfo().AtomRings() if ipso in r and _is_benzene(mol, r)), None)
    if ring is None:
        return ()
    names = _substituent_names(structure)
    start = ring.index(ipso)
    found = []
    for step, position in _STEPS.items():
        at = ring[(start + step) % 6]
        for neighbour in mol.GetAtomWithIdx(at).GetNeighbors():
            if neighbour.GetIdx() not in ring:
                other = neighbour.GetIdx()
                found.append(ArylSubstituent(position, names.get((at, other)), other))
    return tuple(sorted(found, key=lambda s: (list(ArylPosition).index(s.position), s.atom)))


_STEPS = {
    1: ArylPosition.ORTHO,
    2: ArylPosition.META,
    3: ArylPosition.PARA,
    4: ArylPosition.META,
    5: ArylPosition.ORTHO,
}


def _is_benzene(mol: Chem.Mol, ring: tuple[int, ...]) -> bool:
    atoms = [mol.GetAtomWithIdx(at) for at in ring]
    return len(ring) == 6 and all(a.GetIsAromatic() and a.GetAtomicNum() == 6 for a in atoms)


@lru_cache(maxsize=512)
def _substituent_names(structure: Structure) -> dict[tuple[AtomId, AtomId], str]:
    """Return the name of each named substituent by ring carbon and its own atom."""
    found: dict[tuple[AtomId, AtomId], str] = {}
    for row in load_aryl_substituents():
        places = row.query.places
        for match in structure.mol.GetSubstructMatches(row.query.mol, uniquify=False):
            found.setdefault((match[places[1]], match[places[2]]), row.name)
    return found
