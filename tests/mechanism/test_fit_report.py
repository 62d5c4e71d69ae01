"""The report of a calibration: numbers worked out by hand, tables the loaders read back."""

import math
from dataclasses import replace

import pytest

from builder.mechanism.calibration import Calibration, Residual
from builder.mechanism.fit_report import fit_report, fitted_table, load_fit_residuals, residuals_table
from builder.mechanism.observations.tables import load_rates, load_shares
from builder.mechanism.rate_terms import load_rate_terms
from builder.table import rows_of


def residual(row_id: str, kind: str, observed: float, off: float, *, supported: bool = True) -> Residual:
    return Residual(row_id, kind, observed, observed - off, off, 0.5, supported)


ZERO = load_rate_terms()["sn2.zero"]
MOVED = replace(ZERO, value=ZERO.value + 3 * ZERO.error, rows=7)
FIT = Calibration(
    terms=(MOVED,),
    residuals=(
        residual("r1", "SN2", -5.0, 0.1),
        residual("r2", "SN2", -5.0, -0.3),
        residual("r3", "E2", -5.0, 1.0),  # outside: 1.0 > 1.645 * 0.5
        residual("r4", "SN2", -5.0, 9.0, supported=False),
        residual("s1", "elimination", math.log(0.8 / 0.2), math.log(0.8 / 0.2)),  # seen 80 %, predicted 50 %
    ),
    silent=("r010",),
)
REPORTED = [
    "3 observations of which every term has another",
    "  all             3  |Δ log k| median 0.30, 90 % below 0.86; 67% in interval",
    "  SN2             2  |Δ log k| median 0.20, 90 % below 0.28; 100% in interval",
    "  elimination     1  mean error 30.0, median 30.0; 0% in interval",
    "sn2.zero",
    "3.0 standard errors, 7 rows",
    "no pathway for (1): r010",
]


@pytest.mark.parametrize("text", REPORTED)
def test_the_report_says(text: str) -> None:
    assert text in fit_report(FIT)


def test_the_tables_can_be_read_back() -> None:
    (row,) = rows_of("fitted", fitted_table(FIT), ("key", "value", "error", "rows"))
    assert (row["key"], float(row["value"]), row["rows"]) == ("sn2.zero", MOVED.value, "7")
    columns = ("id", "kind", "observed", "fitted", "leave_one_out", "error", "is_supported", "is_inside")
    rows = list(rows_of("residuals", residuals_table(FIT), columns))
    assert [(row["id"], row["is_supported"], row["is_inside"]) for row in rows] == [
        ("r1", "yes", "yes"),
        ("r2", "yes", "yes"),
        ("r3", "yes", "no"),
        ("r4", "no", "no"),
        ("s1", "yes", "no"),
    ]


def test_no_rates_is_said_and_no_crash() -> None:
    assert fit_report(Calibration((), (), ())).startswith("Rates: no observation")


def test_the_residuals_in_the_package_are_those_of_observations() -> None:
    known = {row.id for row in (*load_rates(), *load_shares())}
    assert {row.id for row in load_fit_residuals()} <= known
