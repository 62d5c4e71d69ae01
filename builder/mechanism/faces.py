"""Faces a cation is captured from: the open one of norbornane, and the one trans to an acyloxy group beside it."""

from collections.abc import Iterable
from functools import lru_cache

from builder.chemistry.geometry import Relation, perceive_rings
from builder.chemistry.structure import AtomId, Structure
from builder.chemistry.transform import Edit
from builder.mechanism.cations import Station

__all__ = ["exo_face", "exo_only", "shifting_bond", "trans_to_acyloxy"]


@lru_cache(maxsize=512)
def shifting_bond(structure: Structure, carbon: AtomId) -> tuple[AtomId, AtomId] | None:
    """Return the bridgehead beside a norbornyl C2, and the carbon beyond it whose bond can take part (C1 and C6).

    None unless the carbon is a saturated C2 of a bicyclo[2.2.1]heptane.
    """
    five = [r for r in perceive_rings(structure) if len(r.atoms) == 5]
    for ring in five:
        if carbon not in ring.atoms or carbon in structure.bridgeheads:
            continue
        for other in five:
            if other is ring or carbon in other.atoms or len(set(ring.atoms) & set(other.atoms)) != 3:
                continue
            place = ring.atoms.index(carbon)
            for head in (ring.atoms[place - 1], ring.atoms[(place + 1) % 5]):
                if head not in structure.bridgeheads or head not in other.atoms:
                    continue
                beyond = [n for n, _ in structure.atoms[head].neighbours if n in other.atoms and n not in ring.atoms]
                if beyond and structure.atoms[head].symbol == "C":
                    return head, beyond[0]
    return None


def exo_face(structure: Structure, carbon: AtomId, substituent: AtomId) -> bool | None:
    """Say whether a substituent of a norbornyl C2 is exo, so anti to the C1-C6 bond; None where that is not drawn."""
    bond = shifting_bond(structure, carbon)
    if bond is None:
        return None
    head, beyond = bond
    for ring in perceive_rings(structure):
        if len(ring.atoms) == 5 and carbon in ring.atoms and head in ring.atoms and beyond not in ring.atoms:
            relation = ring.relation((carbon, substituent), (head, beyond))
            return None if relation is None else relation is Relation.TRANS
    return None


def exo_only(edits: Iterable[Edit], carbon: AtomId) -> tuple[Edit, ...]:
    """Return the captures of a norbornyl cation from its open face; others as they are."""
    edits = tuple(edits)
    kept = []
    for edit in edits:
        place, bound = _new_bond(edit, carbon)
        if place is None:
            return edits
        if bound is None or exo_face(edit.product, place, bound) is not False:
            kept.append(edit)
    return tuple(kept) or edits


def trans_to_acyloxy(edits: tuple[Edit, ...], station: Station, carbon: AtomId) -> tuple[Edit, ...]:
    """Return the captures trans to an acyloxy group on the neighbouring ring carbon, which guards the other face.

    It bridges to a cation that oxygen holds, as in glycosides; other cations, and those without such a group, give
    their edits back as they are.
    """
    if station.path or not station.nature.oxygen or len(edits) < 2:
        return edits
    kept = []
    for edit in edits:
        place, bound = _new_bond(edit, carbon)
        if place is None:
            return edits
        if bound is not None and _relation_to_acyloxy(edit.product, place, bound) is Relation.TRANS:
            kept.append(edit)
    return tuple(kept) or edits


def _new_bond(edit: Edit, carbon: AtomId) -> tuple[AtomId | None, AtomId | None]:
    """Return where a carbon of the substrate is in a product, and the atom of the nucleophile it is bound to now."""
    place = edit.from_substrate.get(carbon)
    if place is None:
        return None, None
    new = set(edit.from_nucleophile.values())
    return place, next((n for n, _ in edit.product.atoms[place].neighbours if n in new), None)


def _relation_to_acyloxy(product: Structure, place: AtomId, bound: AtomId) -> Relation | None:
    atoms = product.atoms
    for ring in perceive_rings(product):
        if place not in ring.atoms:
            continue
        for near, _ in atoms[place].neighbours:
            if near not in ring.atoms:
                continue
            for oxygen, _ in atoms[near].neighbours:
                if atoms[oxygen].symbol == "O" and oxygen not in ring.atoms and _bears_acyl(product, oxygen, near):
                    return ring.relation((place, bound), (near, oxygen))
    return None


def _bears_acyl(product: Structure, oxygen: AtomId, carbon: AtomId) -> bool:
    atoms = product.atoms
    return any(
        n != carbon and any(o == 2.0 and atoms[m].symbol == "O" for m, o in atoms[n].neighbours)
        for n, _ in atoms[oxygen].neighbours
    )
