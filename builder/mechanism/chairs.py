"""The two chairs of a six-membered ring, weighed by the A values of its drawn substituents."""

from collections.abc import Callable

from builder.chemistry.geometry import Ring
from builder.chemistry.structure import AtomId, Structure
from builder.mechanism.constants import conformational_energy_kj

__all__ = ["axial_cost_kj", "is_axial"]

_NO_CHOICE_KJ = 3.0
"""Difference of the two chairs below which the ring counts as free to flip."""


def axial_cost_kj(structure: Structure, ring: Ring, atom: AtomId, substituent: AtomId) -> float:
    """Return what it costs to put a substituent axial, kJ/mol, over the better chair: sums of A values.

    0 where its configuration is not drawn.
    """
    energies, place = _chairs(structure, ring, atom, substituent)
    return 0.0 if place is None else max(0.0, energies[place] - min(energies.values()))


def is_axial(structure: Structure, ring: Ring, atom: AtomId, substituent: AtomId) -> bool | None:
    """Say whether a substituent is axial in the chair that the others hold; None where they do not hold one.

    Its two ring neighbours' own exocyclic heteroatoms are left out: after the opening of an epoxide they are what
    is asked about.
    """
    energies, place = _chairs(structure, ring, atom, substituent, _is_carbon)
    if place is None or abs(energies[True] - energies[False]) < _NO_CHOICE_KJ:
        return None
    return energies[place] < energies[not place]


def _any_element(_: str) -> bool:
    return True


def _is_carbon(symbol: str) -> bool:
    return symbol == "C"


def _chairs(
    structure: Structure,
    ring: Ring,
    atom: AtomId,
    substituent: AtomId,
    counted: Callable[[str], bool] = _any_element,
) -> tuple[dict[bool, float], bool | None]:
    """Return the energy of axial substituents in each chair, and in which one the substituent asked about is axial."""
    place = {each: i for i, each in enumerate(ring.atoms)}
    energies = {True: 0.0, False: 0.0}
    asked: bool | None = None
    for holder, other, face in ring.faces:
        if other is None or other in place:
            continue
        # In one chair even places have their upper substituent axial, in the other chair the odd ones.
        axial_in_first = (place[holder] % 2 == 0) == (face > 0)
        if holder == atom and other == substituent:
            asked = axial_in_first
        if counted(structure.atoms[other].symbol):
            energies[axial_in_first] += _a_value(structure, other, holder)
    return energies, asked


def _a_value(structure: Structure, atom: AtomId, ring_atom: AtomId) -> float:
    symbol = structure.atoms[atom].symbol
    branches = sum(structure.atoms[n].symbol != "H" for n, _ in structure.atoms[atom].neighbours if n != ring_atom)
    return conformational_energy_kj(symbol, min(branches, 3)) if symbol != "H" else 0.0
