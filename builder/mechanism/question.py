"""What the engine is asked: a substrate, what is charged with it, and the conditions."""

from dataclasses import dataclass

from builder.chemistry.structure import Structure
from builder.mechanism.reagents import Dose
from builder.mechanism.solvents import Solvent

__all__ = ["CONCENTRATION_M", "EQUIVALENTS", "TIME_S", "Ingredient", "Question"]

CONCENTRATION_M = 0.5
"""Substrate, mol/L, where none is stated."""
EQUIVALENTS = 1.5
"""Nucleophile, and base, to one of substrate, where none is stated."""
TIME_S = 24 * 3600.0
"""Where no time is stated."""


@dataclass(frozen=True, slots=True)
class Ingredient:
    """A nucleophile or base as charged.

    structure: as read, with counter-ions if they were drawn. counter_ion: SMILES, where the name tells it.
    """

    name: str
    structure: Structure
    counter_ion: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Question:
    """Everything a forecast depends on.

    nucleophile: None where a group of the substrate itself attacks.
    solvent: parts with their share by volume; empty for a neat reaction.
    equivalents: of nucleophile and of base; None where nobody stated it.
    """

    substrate: Structure
    nucleophile: Ingredient | None
    base: Ingredient | None = None
    additives: tuple[Dose, ...] = ()
    solvent: tuple[tuple[Solvent, float], ...] = ()
    temperature_k: float = 298.15
    concentration_m: float = CONCENTRATION_M
    equivalents: float | None = None
    time_s: float = TIME_S

    @property
    def charged_equivalents(self) -> float:
        """Return the equivalents the kinetics work with."""
        return EQUIVALENTS if self.equivalents is None else self.equivalents
