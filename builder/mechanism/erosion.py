"""How much configuration a reaction keeps, and how fast an excess is lost: pure functions of what was measured.

Substrate, reaction and product can each lose configuration; which of them did, these numbers alone do not tell.
Source: common practice; the definitions are those of the IUPAC glossary (stereospecificity, racemization).
"""

import math

__all__ = ["half_life_s", "inverted_fraction", "racemisation_constant_per_s", "specificity"]


def specificity(product_ee: float, substrate_ee: float) -> float:
    """Return es = ee of product / ee of substrate, dimensionless; both excesses in the same unit.

    1 where all configuration is carried over, 0 where all is lost; negative where the signs count and differ.
    Raises ValueError for a racemic substrate, of which nothing can be carried over.
    """
    if not substrate_ee:
        raise ValueError("a racemic substrate has no excess to carry over")
    return product_ee / substrate_ee


def inverted_fraction(specificity: float) -> float:
    """Return the fraction of molecules that were inverted, (1 + es) / 2, for es counted positive for inversion."""
    return (1.0 + specificity) / 2.0


def racemisation_constant_per_s(ee_before: float, ee_after: float, time_s: float) -> float:
    """Return the first-order rate constant of ee(t) = ee0 exp(-k t), in 1/s; 0 where none was lost.

    In a degenerate exchange, where each event inverts a molecule, it is twice the rate constant of exchange (Hughes,
    Juliusburger, Masterman, Topley and Weiss, J. Chem. Soc. 1935, 1525; from memory).
    Raises ValueError unless both excesses and the time are positive.
    """
    if min(ee_before, ee_after, time_s) <= 0:
        raise ValueError("excesses and time must be positive")
    return max(0.0, math.log(ee_before / ee_after) / time_s)


def half_life_s(constant_per_s: float) -> float:
    """Return the time in which a first-order quantity halves, in s; infinite for a constant of 0."""
    return math.log(2.0) / constant_per_s if constant_per_s > 0 else math.inf
