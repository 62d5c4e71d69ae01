"""What the engine can defend of a share, and when two products are one. Expected values by hand."""

import pytest

from builder.checks.forecasts import PARTITION_ODDS, is_same_product, share_bounds
from builder.chemistry.structure import parse_smiles
from builder.mechanism.forecast import Forecast, Forecasted
from builder.records.vocabulary import Course, Mechanism

SN2, E2 = Mechanism.SN2, Mechanism.E2


def _forecast(shares: dict[Mechanism, tuple[float, float, float]], *products: tuple[str, float, Mechanism]) -> Forecast:
    """Return a forecast of shares with their intervals, and of products by SMILES."""
    return Forecast(
        is_covered=True,
        mechanism=SN2,
        shares={mechanism: share for mechanism, (share, _, _) in shares.items()},
        intervals={mechanism: (low, high) for mechanism, (_, low, high) in shares.items()},
        log_k={},
        log_k_errors={},
        half_life_s=60.0,
        t95_s=None,
        t99_s=None,
        conversion=1.0,
        conversion_interval=(0.9, 1.0),
        products=tuple(
            Forecasted(parse_smiles(smiles), share, mechanism, Course.NOT_APPLICABLE, False, ())
            for smiles, share, mechanism in products
        ),
        pathways=(),
        reasons=(),
    )


def test_a_product_of_one_mechanism_has_the_interval_of_that_mechanism() -> None:
    forecast = _forecast({SN2: (0.8, 0.5, 0.94), E2: (0.2, 0.06, 0.5)}, ("CCOC(C)CC", 0.8, SN2), ("C=CCC", 0.2, E2))
    bounds = share_bounds(forecast, lambda each: each.mechanism is SN2)
    assert (bounds.share, bounds.low, bounds.high) == pytest.approx((0.8, 0.5, 0.94))


def test_isomers_of_one_mechanism_may_be_off_in_their_odds() -> None:
    assert PARTITION_ODDS == 5.0
    forecast = _forecast({E2: (1.0, 1.0, 1.0)}, ("C=CCC", 0.25, E2), ("C/C=C/C", 0.75, E2))
    bounds = share_bounds(forecast, lambda each: each.structure.smiles == "C=CCC")
    # odds 1:3, so from 1:15 to 5:3
    assert (bounds.low, bounds.high) == pytest.approx((1 / 16, 5 / 8))


def test_what_the_engine_did_not_build_may_be_anything_of_its_mechanism() -> None:
    forecast = _forecast({SN2: (0.998, 0.9, 1.0), E2: (0.002, 0.0, 0.1)}, ("CCCCN", 0.998, SN2))
    assert share_bounds(forecast, lambda _: False, {E2}).high == pytest.approx(0.1)
    assert share_bounds(forecast, lambda _: False, {Mechanism.NGP}).high == 0.0


@pytest.mark.parametrize(
    ("drawn", "forecast", "same"),
    [
        ("CC[C@H](C)N=[N+]=[N-]", "CC[C@@H](C)N=[N+]=[N-]", True),
        ("CCC(C)N=[N+]=[N-]", "CC[C@@H](C)N=[N+]=[N-]", True),
        ("O[C@H]1CCCC[C@H]1Br", "O[C@H]1CCCC[C@@H]1Br", False),
        ("CC=CC", "C/C=C/C", True),
        ("C/C=C\\C", "C/C=C/C", False),
        ("CCC[NH3+].[Cl-]", "CCCN", True),
        ("CC(=O)[O-].[Na+]", "CC(=O)O", True),
        ("CCCCBr", "CCC(C)Br", False),
        ("C/C=C/[C@H](C)O", "C/C=C\\[C@H](C)O", False),
    ],
)
def test_when_a_drawn_product_is_a_forecast_one(drawn: str, forecast: str, same: bool) -> None:
    assert is_same_product(parse_smiles(drawn), parse_smiles(forecast)) is same
