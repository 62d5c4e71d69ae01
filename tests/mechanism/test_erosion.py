"""Erosion of configuration and integrated rate laws, against golden numbers worked out by hand."""

import math

import pytest

from builder.mechanism.erosion import half_life_s, inverted_fraction, racemisation_constant_per_s, specificity
from builder.mechanism.kinetics import Flow, Kinetics

HOUR = 3600.0


def test_98_to_80_percent_ee_in_8_hours() -> None:
    # Process calculations of the trade, no. 8 (by hand: 80/98; ln(98/80)/28,800 s; ln 2/k).
    es = specificity(80.0, 98.0)
    constant = racemisation_constant_per_s(98.0, 80.0, 8 * HOUR)
    assert es == pytest.approx(0.816, abs=5e-4)
    assert inverted_fraction(es) == pytest.approx(0.908, abs=5e-4)
    assert constant == pytest.approx(7.05e-6, rel=1e-3)
    assert half_life_s(constant) / HOUR == pytest.approx(27.3, abs=0.05)


def test_nothing_lost_has_no_end() -> None:
    assert racemisation_constant_per_s(97.0, 97.0, HOUR) == 0.0
    assert half_life_s(0.0) == math.inf


@pytest.mark.parametrize("numbers", [(0.0, 80.0, HOUR), (98.0, 0.0, HOUR), (98.0, 80.0, 0.0)])
def test_what_has_no_logarithm_is_refused(numbers: tuple[float, float, float]) -> None:
    with pytest.raises(ValueError, match="positive"):
        racemisation_constant_per_s(*numbers)


def test_a_racemate_has_nothing_to_carry_over() -> None:
    with pytest.raises(ValueError, match="racemic"):
        specificity(5.0, 0.0)


@pytest.mark.parametrize(("conversion", "hours"), [(0.5, 1.93), (0.95, 8.32), (0.99, 12.79)])
def test_first_order_times(conversion: float, hours: float) -> None:
    # Process calculations of the trade, no. 3: k = 1.0e-4 1/s, t = -ln(1 - x)/k.
    assert Kinetics(1.0, {}, (Flow(1e-4, None),)).time_to(conversion) / HOUR == pytest.approx(hours, abs=0.006)


@pytest.mark.parametrize(
    ("equivalents", "conversion", "hours"),
    [(1.0, 0.5, 5.56), (1.0, 0.95, 105.6), (1.0, 0.99, 550.0), (1.2, 0.95, 39.6), (1.2, 0.99, 79.5)],
)
def test_second_order_times(equivalents: float, conversion: float, hours: float) -> None:
    # Process calculations of the trade, no. 4: k = 1.0e-4 L/(mol s), C0 = 0.5 mol/L; 1:1 t = x/[(1 - x)kC0], unequal
    # t = ln[(M - x)/(M(1 - x))]/[kC0(M - 1)].
    reaction = Kinetics(0.5, {"nucleophile": 0.5 * equivalents}, (Flow(1e-4, "nucleophile"),))
    assert reaction.time_to(conversion) / HOUR == pytest.approx(hours, rel=2e-3)
