"""A molecule as plain adjacency, for questions asked many times over: neighbours of a cation, rings, 1,2-shifts.

Atoms keep the AtomIds of the structure they come from, through every shift, so that a path found here can be carried
out on the structure itself.
"""

from collections import deque
from dataclasses import dataclass
from functools import lru_cache

from builder.chemistry.structure import AtomId, Structure

__all__ = ["LARGE_RING", "Bond", "Skeleton", "skeleton_of"]

LARGE_RING = 9
"""Ring size that stands for nine and more."""

Bond = tuple[AtomId, AtomId]


@dataclass(frozen=True, slots=True)
class _Fixed:
    """What no shift changes."""

    symbols: tuple[str, ...]
    aromatic: tuple[bool, ...]
    charges: tuple[int, ...]


@dataclass(slots=True)
class Skeleton:
    """Adjacency of a molecule; a shift returns a new one.

    bonds: for each atom its neighbours with bond orders. hydrogens: implicit ones on each atom.
    """

    fixed: _Fixed
    bonds: list[dict[AtomId, float]]
    hydrogens: list[int]

    def symbol(self, atom: AtomId) -> str:
        """Return the element of an atom."""
        return self.fixed.symbols[atom]

    def is_aromatic(self, atom: AtomId) -> bool:
        """Say whether an atom is aromatic."""
        return self.fixed.aromatic[atom]

    def charge(self, atom: AtomId) -> int:
        """Return the formal charge an atom had in the structure."""
        return self.fixed.charges[atom]

    def neighbours(self, atom: AtomId) -> dict[AtomId, float]:
        """Return the neighbours of an atom with bond orders."""
        return self.bonds[atom]

    def is_saturated(self, atom: AtomId) -> bool:
        """Say whether an atom has single bonds only."""
        return all(order == 1.0 for order in self.bonds[atom].values())

    def heavy_degree(self, atom: AtomId) -> int:
        """Return the neighbours of an atom that are no hydrogen."""
        return sum(self.fixed.symbols[n] != "H" for n in self.bonds[atom])

    def without_bond(self, one: AtomId, other: AtomId) -> "Skeleton":
        """Return the skeleton with a bond broken; nothing else changes."""
        bonds = list(self.bonds)
        bonds[one] = {n: o for n, o in bonds[one].items() if n != other}
        bonds[other] = {n: o for n, o in bonds[other].items() if n != one}
        return Skeleton(self.fixed, bonds, self.hydrogens)

    def shifted(self, origin: AtomId, target: AtomId, migrating: AtomId | None) -> "Skeleton":
        """Return the skeleton after a group, or for None a hydrogen, has moved from origin to target."""
        if migrating is None:
            hydrogens = list(self.hydrogens)
            hydrogens[origin] -= 1
            hydrogens[target] += 1
            return Skeleton(self.fixed, self.bonds, hydrogens)
        bonds = list(self.bonds)
        bonds[origin] = {n: o for n, o in bonds[origin].items() if n != migrating}
        bonds[migrating] = {n: o for n, o in bonds[migrating].items() if n != origin} | {target: 1.0}
        bonds[target] = bonds[target] | {migrating: 1.0}
        return Skeleton(self.fixed, bonds, self.hydrogens)

    def opened(self, centre: AtomId, near: AtomId, far: AtomId) -> "Skeleton":
        """Return the skeleton after centre(+)-near-far has become centre=near and far(+)."""
        cut = self.without_bond(near, far)
        cut.bonds[centre] = cut.bonds[centre] | {near: 2.0}
        cut.bonds[near] = cut.bonds[near] | {centre: 2.0}
        return cut

    def path(self, start: AtomId, goal: AtomId, without: AtomId) -> tuple[AtomId, ...]:
        """Return the shortest path between two atoms that avoids a third; empty if there is none."""
        before: dict[AtomId, AtomId] = {start: start}
        queue = deque([start])
        while queue:
            here = queue.popleft()
            if here == goal:
                found = [here]
                while found[-1] != start:
                    found.append(before[found[-1]])
                return tuple(found)
            for near in self.bonds[here]:
                if near != without and near not in before:
                    before[near] = here
                    queue.append(near)
        return ()

    def rings_through(self, atom: AtomId) -> list[frozenset[AtomId]]:
        """Return the smallest ring through each pair of bonds of an atom, smaller first."""
        around = [n for n in self.bonds[atom] if len(self.bonds[n]) > 1]
        found = []
        for place, one in enumerate(around):
            for other in around[place + 1 :]:
                path = self.path(one, other, atom)
                if path:
                    found.append(frozenset((*path, atom)))
        return sorted(found, key=len)

    def smallest_ring(self, atom: AtomId) -> int | None:
        """Return the size of the smallest ring through an atom, at most LARGE_RING; None outside rings."""
        rings = self.rings_through(atom)
        return min(len(rings[0]), LARGE_RING) if rings else None

    def ring_sizes(self) -> list[int]:
        """Return the sizes of a set of smallest rings, smaller first."""
        count = sum(map(len, self.bonds)) // 2 - len(self.bonds) + self._pieces()
        if count <= 0:
            return []
        rings = {
            ring for atom in range(len(self.bonds)) if len(self.bonds[atom]) > 1 for ring in self.rings_through(atom)
        }
        return sorted(map(len, rings))[:count]

    def _pieces(self) -> int:
        seen: set[AtomId] = set()
        pieces = 0
        for atom in range(len(self.bonds)):
            if atom in seen:
                continue
            pieces += 1
            stack = [atom]
            while stack:
                here = stack.pop()
                if here not in seen:
                    seen.add(here)
                    stack.extend(self.bonds[here])
        return pieces


@lru_cache(maxsize=512)
def skeleton_of(structure: Structure) -> Skeleton:
    """Return a structure as adjacency; not to be changed in place."""
    atoms = structure.atoms
    fixed = _Fixed(tuple(a.symbol for a in atoms), tuple(a.aromatic for a in atoms), tuple(a.charge for a in atoms))
    return Skeleton(fixed, [dict(a.neighbours) for a in atoms], [a.hydrogens for a in atoms])
