"""The medium of a reaction as the rate model sees it: polarity, ionising power, what kind of solvent it is."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

from builder.mechanism.ionising_power import Power, Scale, ionising_power
from builder.mechanism.polarity import Polarity, mixed_polarity
from builder.mechanism.solvents import Solvent, SolventKind, find_solvent

__all__ = ["Medium", "medium_of"]

PROTIC_SHARE = 0.05
"""Share by volume of a protic solvent from which anions are held by hydrogen bonds as in it."""
WEAK_DONOR = 20.0
"""Donor number below which an aprotic solvent hardly takes alkali cations up, kcal/mol."""


@dataclass(frozen=True, slots=True)
class Medium:
    """parts: solvents with their share by volume, adding up to 1. is_neat: stands in for no solvent at all."""

    parts: tuple[tuple[Solvent, float], ...]
    polarity: Polarity
    is_neat: bool = False

    @property
    def is_protic(self) -> bool:
        """Say whether a protic solvent makes up enough of it to count."""
        return self.share_of(SolventKind.PROTIC) >= PROTIC_SHARE

    @property
    def is_dipolar_aprotic(self) -> bool:
        """Say whether it is mostly dipolar and holds no protic solvent."""
        return not self.is_protic and self.share_of(SolventKind.DIPOLAR_APROTIC) >= 0.5

    @property
    def is_apolar(self) -> bool:
        """Say whether it is neither protic nor mostly dipolar."""
        return not self.is_protic and not self.is_dipolar_aprotic

    @property
    def is_weak_donor(self) -> bool:
        """Say whether it is aprotic and binds alkali cations too weakly to dissolve most of their salts."""
        donor = self.polarity.donor_number
        return not self.is_protic and donor is not None and donor < WEAK_DONOR

    def share_of(self, kind: SolventKind) -> float:
        """Return the share by volume of solvents of a kind."""
        return sum(share for solvent, share in self.parts if solvent.kind is kind)

    def share(self, name: str) -> float:
        """Return the share by volume of one solvent."""
        return sum(share for solvent, share in self.parts if solvent.name == name)

    def power(self, scale: Scale = Scale.Y) -> Power:
        """Return the ionising power on a scale."""
        return ionising_power(tuple((solvent.name, share) for solvent, share in self.parts), scale)


@lru_cache(maxsize=1024)
def medium_of(parts: tuple[tuple[Solvent, float], ...], stand_in: str) -> Medium:
    """Return the medium of a mixture; for no solvent at all that of `stand_in`, a solvent's name.

    Raises ValueError if the shares add up to nothing.
    """
    if not parts:
        solvent = find_solvent(stand_in)
        if solvent is None:
            raise ValueError(f"{stand_in} is no solvent of the table")
        return Medium(((solvent, 1.0),), _polarity(((solvent, 1.0),)), is_neat=True)
    total = sum(share for _, share in parts)
    if total <= 0:
        raise ValueError("a solvent mixture needs at least one part with a positive share")
    scaled = tuple((solvent, share / total) for solvent, share in parts if share > 0)
    return Medium(scaled, _polarity(scaled))


def _polarity(parts: Sequence[tuple[Solvent, float]]) -> Polarity:
    return mixed_polarity([(solvent.name, share) for solvent, share in parts])
