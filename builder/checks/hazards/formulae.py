"""What a formula says of an azide: the carbon to nitrogen ratio, the rule of six, the oxygen balance."""

from functools import cache

from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure

__all__ = ["RULE_OF_SIX", "carbon_ratio", "carbons_per_azide", "one_decimal", "oxygen_balance_percent"]

RULE_OF_SIX = 6
"""Carbon atoms, or atoms of their size, that each azide group wants: the second opinion. Source: azide-guideline."""


def carbon_ratio(structure: Structure) -> float | None:
    """Return (N_C + N_O)/N_N without counter-ions; None without nitrogen. Source: azide-guideline.

    2-Azidobutane, C4H9N3, has 4/3.
    """
    counts = structure.without_counter_ions.elements
    nitrogens = counts.get("N", 0)
    return (counts.get("C", 0) + counts.get("O", 0)) / nitrogens if nitrogens else None


def carbons_per_azide(structure: Structure) -> float:
    """Return the heavy atoms outside the azide groups for each of them; the rule of six wants at least six.

    Raises ZeroDivisionError for what holds no azide.
    """
    plain = structure.without_counter_ions
    groups = max(fragment.count_in(plain) for fragment in _azide_groups())
    return (plain.heavy_atom_count - 3 * groups) / groups


@cache
def _azide_groups() -> tuple[Fragment, ...]:
    return tuple(map(Fragment.from_smarts, ("[#6]-[NX2]=[N+]=[N-]", "[#6]-[N-]-[N+]#N")))


def oxygen_balance_percent(structure: Structure) -> float:
    """Return -1600 (2x + y/2 - z)/M in percent for CxHyOz with any nitrogen; M in g/mol.

    A weak indicator for azides; shown beside the carbon ratio, never instead of it. 2-Azidobutane: -201.7.
    Source: Lothrop and Handrick, Chem. Rev. 1949, 44, 419 (from memory).
    """
    plain = structure.without_counter_ions
    counts = plain.elements
    hydrogens = sum(atom.hydrogens for atom in plain.atoms)
    return -1600.0 * (2 * counts.get("C", 0) + hydrogens / 2 - counts.get("O", 0)) / plain.mass


def one_decimal(value: float) -> str:
    """Return a number with one decimal and, below zero, the true minus.

    >>> one_decimal(-219.16)
    '−219.2'
    """
    return f"{value:.1f}".replace("-", "−")
