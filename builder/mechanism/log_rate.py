"""A rate constant as a sum of terms, its change with temperature, and its standard error."""

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from itertools import chain

from builder.mechanism.rate_terms import Term

__all__ = ["GAS_CONSTANT", "REFERENCE_K", "LogRate", "combined", "log10_eyring_factor", "root_of_squares"]

GAS_CONSTANT = 8.314462618  # J/(mol K), CODATA 2018
BOLTZMANN_OVER_PLANCK = 2.083661912e10  # 1/(K s), CODATA 2018
REFERENCE_K = 298.15
_LN10 = math.log(10.0)


def log10_eyring_factor(temperature_k: float) -> float:
    """Return log10 of kT/h, in 1/s. Source: Eyring, J. Chem. Phys. 1935, 3, 107."""
    return math.log10(BOLTZMANN_OVER_PLANCK * temperature_k)


@dataclass(frozen=True, slots=True)
class LogRate:
    """log10 of a rate constant.

    terms: add up to log10 k at 25 °C.
    entropy: add up to the activation entropy, J/(mol K).
    split: log10 of the share of this rate that the pathway takes, where one rate feeds several.
    spreads: (key, slope, error) of what decides `split`, for the error only.
    """

    terms: tuple[Term, ...]
    entropy: tuple[Term, ...]
    split: float = 0.0
    spreads: tuple[tuple[str, float, float], ...] = ()

    @property
    def at_25(self) -> float:
        """Return log10 k at 25 °C, before the split."""
        return math.fsum(term.factor * term.value for term in self.terms)

    @property
    def entropy_j(self) -> float:
        """Return the activation entropy, J/(mol K)."""
        return math.fsum(term.factor * term.value for term in self.entropy)

    def log10_k(self, temperature_k: float) -> float:
        """Return log10 k at a temperature, by the Eyring equation with constant enthalpy and entropy.

        Where 25 °C value and entropy together ask for a negative enthalpy it is taken as zero, so that heat never
        lowers a rate constant.
        """
        at_25 = self.at_25
        if temperature_k == REFERENCE_K:
            return at_25 + self.split
        ratio = REFERENCE_K / temperature_k
        barrier = log10_eyring_factor(REFERENCE_K) - at_25  # free energy over RT ln 10, at 25 °C
        entropy = self.entropy_j / (GAS_CONSTANT * _LN10)
        if barrier + entropy < 0:  # enthalpy below zero
            return at_25 + math.log10(temperature_k / REFERENCE_K) + self.split
        return log10_eyring_factor(temperature_k) - ratio * barrier + entropy * (1 - ratio) + self.split

    def slopes(self, temperature_k: float) -> dict[str, tuple[float, float]]:
        """Return, for each term, the slope of log10 k at this temperature on it and its standard error."""
        ratio = REFERENCE_K / temperature_k
        found: dict[str, tuple[float, float]] = {}
        for key, slope, error in chain(
            ((t.key, ratio * t.factor, t.error) for t in self.terms),
            ((t.key, t.factor * (1 - ratio) / (GAS_CONSTANT * _LN10), t.error) for t in self.entropy),
            self.spreads,
        ):
            found[key] = (found.get(key, (0.0, 0.0))[0] + slope, error)
        return found

    def error(self, temperature_k: float) -> float:
        """Return one standard error of log10 k, terms taken as independent."""
        return root_of_squares(slope * error for slope, error in self.slopes(temperature_k).values())


def root_of_squares(values: Iterable[float]) -> float:
    """Return the root of the sum of squares."""
    return math.sqrt(math.fsum(value * value for value in values))


def combined(weighted: Iterable[tuple[float, Mapping[str, tuple[float, float]]]]) -> dict[str, tuple[float, float]]:
    """Return the slopes of a weighted sum of quantities, term by term."""
    found: dict[str, tuple[float, float]] = {}
    for weight, slopes in weighted:
        for key, (slope, error) in slopes.items():
            found[key] = (found.get(key, (0.0, error))[0] + weight * slope, error)
    return found
