"""Amounts over time, against integrated rate laws and SciPy's integrators; temperature, against SciPy's constants."""

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants, integrate, stats

from builder.mechanism.kinetics import DEPTH, Flow, Kinetics, curve
from builder.mechanism.log_rate import GAS_CONSTANT, REFERENCE_K, LogRate, log10_eyring_factor
from builder.mechanism.rate_terms import Term

REPRODUCIBLE = 1e-6  # what another program agrees with; 1e-4 is asked for

SAME_EACH_TIME = settings(derandomize=True, deadline=None, max_examples=60)

S0 = 0.5  # mol/L
TIMES_IN_HALF_LIVES = (0.01, 0.3, 1.0, 2.5, 6.0)


def term(value: float, factor: float = 1.0, error: float = 0.1, key: str = "term") -> Term:
    return Term(key, factor, value, error, "for this test", "estimated-here")


def rate_of(at_25: float, entropy: float) -> LogRate:
    return LogRate((term(at_25),), (term(entropy, key="entropy"),))


# --- integrated rate laws -------------------------------------------------------------------------------------


@pytest.mark.parametrize("half_lives", TIMES_IN_HALF_LIVES)
def test_first_order(half_lives: float) -> None:
    k = 3.7e-5
    reaction = Kinetics(S0, {}, (Flow(0.6 * k, None), Flow(0.4 * k, None)))
    time = half_lives * math.log(2) / k
    assert reaction.conversion_at(time) == pytest.approx(1 - 0.5**half_lives, abs=1e-12)
    assert reaction.yields_at(time) == pytest.approx((0.6 * (1 - 0.5**half_lives), 0.4 * (1 - 0.5**half_lives)))


@pytest.mark.parametrize("half_lives", TIMES_IN_HALF_LIVES)
def test_second_order_with_one_equivalent(half_lives: float) -> None:
    # kct/(1 + kct); each further half-life is twice as long as all before it together
    k = 2e-3
    reaction = Kinetics(S0, {"Nu": S0}, (Flow(k, "Nu"),))
    kct = half_lives
    assert reaction.conversion_at(kct / (k * S0)) == pytest.approx(kct / (1 + kct), abs=REPRODUCIBLE)
    assert reaction.time_to(0.5) == pytest.approx(1 / (k * S0), rel=REPRODUCIBLE)
    assert reaction.time_to(0.75) == pytest.approx(3 / (k * S0), rel=REPRODUCIBLE)


@pytest.mark.parametrize("half_lives", TIMES_IN_HALF_LIVES)
@pytest.mark.parametrize("equivalents", [0.9, 0.99, 1.5, 5.0])
def test_second_order_with_unlike_amounts(equivalents: float, half_lives: float) -> None:
    # ln(b/a) = ln(b0/a0) + (b0 - a0) k t
    k, b0 = 2e-3, equivalents * S0
    time = half_lives / (k * b0)
    ratio = equivalents * math.exp((b0 - S0) * k * time)
    expected = (ratio * S0 - b0) / (ratio - 1) / S0
    assert Kinetics(S0, {"Nu": b0}, (Flow(k, "Nu"),)).conversion_at(time) == pytest.approx(expected, abs=REPRODUCIBLE)


@pytest.mark.parametrize("equivalents", [0.25, 0.4])
def test_second_order_with_a_reagent_in_short_supply(equivalents: float) -> None:
    b0, time = equivalents * S0, 2.5
    ratio = equivalents * math.exp((b0 - S0) / b0 * time)
    expected = (ratio * S0 - b0) / (ratio - 1) / S0
    found = Kinetics(S0, {"Nu": b0}, (Flow(1 / b0, "Nu"),)).conversion_at(time)
    assert found == pytest.approx(expected, abs=REPRODUCIBLE)


@pytest.mark.parametrize("excess", [1e3, 1e5])
def test_a_large_excess_is_pseudo_first_order(excess: float) -> None:
    k, b0 = 1e-3, excess * S0
    half_life = Kinetics(S0, {"Nu": b0}, (Flow(k, "Nu"),)).time_to(0.5)
    assert half_life == pytest.approx(math.log(2) / (k * b0), rel=1 / excess)


def test_a_half_life_of_first_order_sets_the_later_times() -> None:
    reaction = Kinetics(S0, {}, (Flow(1e-4, None),))
    half, most, nearly_all = (reaction.time_to(x) for x in (0.5, 0.95, 0.99))
    assert most / half == pytest.approx(math.log(20) / math.log(2))
    assert nearly_all / half == pytest.approx(math.log(100) / math.log(2))


# --- any mixture, against an integrator -----------------------------------------------------------------------

amounts = st.floats(0.02, 20.0).map(lambda x: round(x, 4))
speeds = st.floats(-2.0, 2.0).map(lambda x: round(10**x, 5))


@st.composite
def mixtures(draw: st.DrawFn, least_equivalents: float = 0.02) -> Kinetics:
    """Return up to three reagents and four pathways."""
    substrate_m = draw(amounts)
    equivalents = st.floats(least_equivalents, 20.0).map(lambda x: round(x, 3))
    pools = {name: substrate_m * draw(equivalents) for name in draw(st.sampled_from(["", "a", "ab", "abc"]))}
    kinds = st.sampled_from([None, *pools])
    flows = draw(st.lists(st.builds(Flow, speeds, kinds), min_size=1, max_size=4))
    return Kinetics(substrate_m, pools, tuple(flows))


def integrated(reaction: Kinetics, time: float) -> tuple[float, ...]:
    """Return the yield of each pathway by SciPy's stiff solver."""
    names = list(reaction.pools)

    def speed(_: float, state: np.ndarray) -> list[float]:
        substrate, left = state[0], dict(zip(names, state[1 : 1 + len(names)], strict=True))
        flows = [f.rate_constant * substrate * (1.0 if f.pool is None else left[f.pool]) for f in reaction.flows]
        used = [sum(v for v, f in zip(flows, reaction.flows, strict=True) if f.pool == name) for name in names]
        return [-sum(flows), *(-u for u in used), *flows]

    start = [reaction.substrate_m, *reaction.pools.values(), *(0.0 for _ in reaction.flows)]
    found = integrate.solve_ivp(speed, (0.0, time), start, method="LSODA", rtol=1e-9, atol=1e-12)
    return tuple(float(y) / reaction.substrate_m for y in found.y[1 + len(names) :, -1])


def assert_integrates(reaction: Kinetics, lifetimes: float) -> None:
    time = lifetimes / reaction.initial_rate_per_s
    expected = integrated(reaction, time)
    # Beyond the end of the grid the scheme stops, by its own account.
    tolerance = REPRODUCIBLE if sum(expected) < 1 - math.exp(-DEPTH) else math.exp(-DEPTH)
    assert reaction.conversion_at(time) == pytest.approx(sum(expected), abs=tolerance)
    assert reaction.yields_at(time) == pytest.approx(expected, abs=tolerance)


@SAME_EACH_TIME
@given(mixtures(least_equivalents=1.2), st.floats(0.05, 6.0))
def test_competing_pathways_agree_with_an_integrator(reaction: Kinetics, lifetimes: float) -> None:
    assert_integrates(reaction, lifetimes)


@SAME_EACH_TIME
@given(mixtures(), st.floats(0.05, 6.0))
def test_reagents_that_run_out_agree_with_an_integrator(reaction: Kinetics, lifetimes: float) -> None:
    assert_integrates(reaction, lifetimes)


@SAME_EACH_TIME
@given(mixtures(), st.floats(0.01, 0.99))
def test_the_time_to_a_conversion_gives_that_conversion(reaction: Kinetics, conversion: float) -> None:
    time = reaction.time_to(conversion)
    if math.isfinite(time):
        assert reaction.conversion_at(time) == pytest.approx(conversion, abs=REPRODUCIBLE)
    else:
        reagents = {f.pool for f in reaction.flows}
        assert None not in reagents
        assert sum(reaction.pools[name] for name in reagents if name) <= conversion * reaction.substrate_m * (1 + 1e-6)


@SAME_EACH_TIME
@given(mixtures())
def test_a_curve_rises_and_never_passes_one(reaction: Kinetics) -> None:
    times = [0.0, *(10**x / max(reaction.initial_rate_per_s, 1e-9) for x in np.linspace(-3, 3, 25))]
    found = curve(reaction, times)
    assert found[0] == 0
    assert all(later >= earlier - REPRODUCIBLE / 10 for earlier, later in pairwise(found))
    assert found[-1] <= 1


def test_a_reagent_in_short_supply_ends_the_reaction() -> None:
    reaction = Kinetics(1.0, {"Nu": 0.3}, (Flow(1.0, "Nu"),))
    assert reaction.conversion_at(1e6) == pytest.approx(0.3, abs=REPRODUCIBLE)
    assert reaction.time_to(0.5) == math.inf


def test_nothing_happens_without_a_pathway() -> None:
    reaction = Kinetics(1.0, {"Nu": 1.0}, (Flow(0.0, "Nu"), Flow(1.0, "absent")))
    assert reaction.conversion_at(1e9) == 0
    assert reaction.time_to(0.01) == math.inf


@pytest.mark.parametrize("conversion", [-0.1, 1.0, 1.5])
def test_a_conversion_out_of_range_is_refused(conversion: float) -> None:
    with pytest.raises(ValueError, match="between 0 and 1"):
        Kinetics(1.0, {}, (Flow(1.0, None),)).time_to(conversion)


# --- temperature ----------------------------------------------------------------------------------------------


def test_constants_are_those_of_codata() -> None:
    assert pytest.approx(constants.R, rel=1e-9) == GAS_CONSTANT
    assert 10 ** log10_eyring_factor(REFERENCE_K) == pytest.approx(constants.k * REFERENCE_K / constants.h, rel=1e-9)


@pytest.mark.parametrize(("at_25", "entropy"), [(-5.03, -28.0), (-3.2, -60.0), (-9.0, 51.0), (-1.0, 0.0)])
def test_the_eyring_plot_gives_back_what_was_put_in(at_25: float, entropy: float) -> None:
    rate = rate_of(at_25, entropy)
    kelvin = np.linspace(273.15, 373.15, 11)
    logs = np.array([rate.log10_k(t) for t in kelvin]) * math.log(10)
    line = stats.linregress(1 / kelvin, logs - np.log(kelvin))
    free_energy = -constants.R * REFERENCE_K * math.log(10**at_25 * constants.h / (constants.k * REFERENCE_K))
    assert -line.slope * constants.R == pytest.approx(free_energy + REFERENCE_K * entropy, rel=1e-6)
    assert (line.intercept - math.log(constants.k / constants.h)) * constants.R == pytest.approx(entropy, abs=1e-3)
    assert rate.log10_k(REFERENCE_K) == at_25


def test_a_rate_doubles_every_ten_degrees_where_the_rule_of_thumb_holds() -> None:
    # ΔG‡ about 90 kJ/mol, no entropy: common practice, no source. By hand, ln(k2/k1) = ln(T2/T1) + ΔH/R (1/T1 - 1/T2):
    # 90 kJ/mol is log10 k = -2.98 at 25 °C; 0.033 + 10824 K * 1.088e-4 / K = 1.211 natural units for 25 to 35 °C.
    rate = rate_of(-2.9758, 0.0)
    assert (rate.log10_k(308.15) - rate.log10_k(298.15)) * math.log(10) == pytest.approx(1.211, abs=0.005)


@SAME_EACH_TIME
@given(
    st.lists(st.tuples(st.floats(-30, 15), st.floats(-3, 3)), min_size=1, max_size=6),
    st.floats(-250, 250),
    st.floats(200, 550),
    st.floats(0.01, 100),
)
def test_heat_never_lowers_a_rate_constant(
    values: list[tuple[float, float]], entropy: float, kelvin: float, step: float
) -> None:
    terms = tuple(term(value, factor) for value, factor in values)
    rate = LogRate(terms, (term(entropy, key="entropy"),))
    assert rate.log10_k(kelvin + step) >= rate.log10_k(kelvin) - 1e-9


@SAME_EACH_TIME
@given(st.floats(-12, 2), st.floats(-100, 60), st.floats(250, 420), st.floats(0.05, 1.5), st.floats(1, 30))
def test_the_error_is_what_moving_each_term_by_its_own_gives(
    at_25: float, entropy: float, kelvin: float, error: float, entropy_error: float
) -> None:
    def log10_k(shift: float, entropy_shift: float) -> float:
        return rate_of(at_25 + shift, entropy + entropy_shift).log10_k(kelvin)

    rate = LogRate((term(at_25, error=error),), (term(entropy, error=entropy_error, key="entropy"),))
    moved = (
        (log10_k(error, 0) - log10_k(-error, 0)) / 2,
        (log10_k(0, entropy_error) - log10_k(0, -entropy_error)) / 2,
    )
    enthalpy_over_rt = math.log(10) * (log10_eyring_factor(REFERENCE_K) - at_25) + entropy / constants.R
    if enthalpy_over_rt > 20:  # far from where an enthalpy below zero is taken as zero
        assert rate.error(kelvin) == pytest.approx(math.hypot(*moved), rel=1e-6)
