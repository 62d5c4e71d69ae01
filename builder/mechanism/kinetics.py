"""Rates to amounts: competing pathways of first and second order with depletion, by one scheme.

Substrate S is used up by pathways of first order, k1 in all, and by pathways of second order with reagents j, kj in all
for each, which are used up one to one. With τ = ∫ S dt each reagent is N_j(τ) = N_j0 exp(-k_j τ), and

    S(τ) = S0 - k1 τ - Σ N_j0 (1 - exp(-k_j τ))

so the yield of every pathway is a closed form in τ. With y = -ln(S/S0) time is ∫ dy / (k1 + Σ k_j N_j(τ(y))), a smooth
integrand: Simpson's rule over steps of STEP in y up to DEPTH, and over the rest of a step where a time falls within.
τ(y) is found by Newton's method from below, which converges because S(τ) is convex and falls. With pathways of first
order only, t = y / k1 exactly. Another program gets the same numbers to better than 1e-6.
Source: the time transformation of competing second-order reactions, as in Frost and Pearson, Kinetics and Mechanism
(from memory).
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

__all__ = ["DEPTH", "Flow", "Kinetics", "curve"]

STEP = 0.1
DEPTH = 7.0
"""-ln of the share of substrate at which the grid ends: 99.9 % conversion."""
_PRECISION = 1e-12


@dataclass(frozen=True, slots=True)
class Flow:
    """One pathway: its rate constant, 1/s for first order (pool None), else 1/(M s), and what it draws on."""

    rate_constant: float
    pool: str | None


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

    @cached_property
    def _reagents(self) -> tuple[tuple[str, float, float], ...]:
        """Return (name, concentration, sum of second-order rate constants) of each reagent that reacts at all."""
        found = []
        for name, molar in self.pools.items():
            total = math.fsum(f.rate_constant for f in self.flows if f.pool == name)
            if total > 0 and molar > 0:
                found.append((name, molar, total))
        return tuple(found)

    def _substrate(self, tau: float) -> float:
        used = math.fsum(-molar * math.expm1(-k * tau) for _, molar, k in self._reagents)
        return self.substrate_m - self.first_order_per_s * tau - used

    def _speed(self, tau: float) -> float:
        """Return the pseudo-first-order rate constant at τ, 1/s."""
        return self.first_order_per_s + math.fsum(k * molar * math.exp(-k * tau) for _, molar, k in self._reagents)

    def _tau(self, y: float, start: float) -> float | None:
        """Return τ at a depth y, sought from a τ below it; None where the reagents run out before."""
        goal = self.substrate_m * math.exp(-y)
        tau = start
        for _ in range(200):
            excess = self._substrate(tau) - goal
            if excess <= _PRECISION * self.substrate_m:
                return tau
            speed = self._speed(tau)
            if speed <= 0:
                return None
            step = excess / speed
            if step <= 1e-15 * tau:
                return tau
            tau += step
            if not math.isfinite(tau):
                return None
        return tau if self._substrate(tau) - goal < 1e-6 * self.substrate_m else None

    @cached_property
    def _grid(self) -> tuple[tuple[float, float, float], ...]:
        """Return (y, τ, t) at the grid points that can be reached."""
        points = [(0.0, 0.0, 0.0)]
        if self.initial_rate_per_s <= 0:
            return tuple(points)
        tau, time = 0.0, 0.0
        for place in range(round(DEPTH / STEP)):
            y = place * STEP
            middle = self._tau(y + STEP / 2, tau)
            end = None if middle is None else self._tau(y + STEP, middle)
            if middle is None or end is None:
                break
            time += _simpson(STEP, self._speed(tau), self._speed(middle), self._speed(end))
            tau = end
            if not math.isfinite(time):
                break
            points.append((y + STEP, tau, time))
        return tuple(points)

    @cached_property
    def initial_rate_per_s(self) -> float:
        """Return the pseudo-first-order rate constant at the start, 1/s."""
        return self._speed(0.0)

    def time_to(self, conversion: float) -> float:
        """Return the time to a conversion (0 to 1), in s; infinite where the reagents run out before.

        Raises ValueError for a conversion outside 0 to 1, 1 excluded.
        """
        if not 0 <= conversion < 1:
            raise ValueError("a conversion lies between 0 and 1")
        y = -math.log1p(-conversion)
        if self.initial_rate_per_s <= 0:
            return math.inf
        if not self._reagents:
            return y / self.first_order_per_s
        below = [p for p in self._grid if p[0] <= y]
        start = below[-1]
        return start[2] + self._piece(start, y)

    def _piece(self, start: tuple[float, float, float], y: float) -> float:
        """Return the time from a grid point to a depth within the next step."""
        width = y - start[0]
        if width <= 0:
            return 0.0
        middle = self._tau(start[0] + width / 2, start[1])
        end = None if middle is None else self._tau(y, middle)
        if middle is None or end is None:
            return math.inf
        return _simpson(width, self._speed(start[1]), self._speed(middle), self._speed(end))

    def depth_at(self, time_s: float) -> float:
        """Return -ln of the share of substrate left at a time, at most DEPTH where reagents are used up."""
        if self.initial_rate_per_s <= 0 or time_s <= 0:
            return 0.0
        if not self._reagents:
            return self.first_order_per_s * time_s
        start = max((p for p in self._grid if p[2] <= time_s), key=lambda p: p[0])
        low, high = start[0], start[0] + STEP
        if self._piece(start, high) <= time_s - start[2]:
            return high if start[0] < DEPTH - STEP / 2 else DEPTH
        for _ in range(40):
            middle = (low + high) / 2
            if start[2] + self._piece(start, middle) <= time_s:
                low = middle
            else:
                high = middle
        return low

    def conversion_at(self, time_s: float) -> float:
        """Return the conversion at a time, 0 to 1."""
        return -math.expm1(-self.depth_at(time_s))

    def yields_at(self, time_s: float) -> tuple[float, ...]:
        """Return what each pathway has given at a time, as a share of the substrate charged."""
        depth = self.depth_at(time_s)
        if not self._reagents:
            total = -math.expm1(-depth)
            whole = self.first_order_per_s
            return tuple(total * f.rate_constant / whole if whole > 0 else 0.0 for f in self.flows)
        start = max((p for p in self._grid if p[0] <= depth), key=lambda p: p[0])
        tau = self._tau(depth, start[1])
        tau = start[1] if tau is None else tau
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


def curve(kinetics: Kinetics, times_s: Sequence[float]) -> tuple[float, ...]:
    """Return the conversion at each time, for a graph."""
    return tuple(kinetics.conversion_at(time) for time in times_s)


def _simpson(width: float, speed: float, middle: float, end: float) -> float:
    """Return the integral of 1/speed over a step; infinite where the speed has run down to nothing."""
    if min(speed, middle, end) <= 0:
        return math.inf
    return width / 6 * (1 / speed + 4 / middle + 1 / end)
