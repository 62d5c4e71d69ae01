"""What a calibration found, as text: the table of fitted terms, the table of residuals, and a report in words.

Pure functions of the calibration; the same calibration gives the same bytes.
"""

import math
from collections import Counter
from collections.abc import Iterable, Sequence
from functools import cache
from importlib import resources

from builder.mechanism.calibration import Calibration, Residual
from builder.mechanism.observations.tables import Channel
from builder.mechanism.rate_terms import RateTerm, load_rate_terms
from builder.table import refuse_twice, rows_of, table_text

__all__ = [
    "RESIDUALS_TABLE",
    "fit_report",
    "fitted_table",
    "load_fit_residuals",
    "residuals_table",
]

RESIDUALS_TABLE = "fit_residuals.tsv"
_FITTED_COLUMNS = ("key", "value", "error", "rows")
_RESIDUAL_COLUMNS = ("id", "kind", "observed", "fitted", "leave_one_out", "error", "is_supported", "is_inside")
MOST_MOVED = 10
_FITTED_HEADER = """\
# quantity: terms of the log-rate model as the observations make them; those no observation bears on stand in
#   rate_terms.tsv only
# unit: as in rate_terms.tsv, mostly log10 of a rate constant; error is one standard error; rows: observations that bear
#   on the term. model.*: what the terms leave unexplained in a family of pathways
# made: by `handbook calibrate --write` from rate_terms.tsv and the tables of observations; not to be edited by hand
# range: that of rate_terms.tsv
"""
_RESIDUALS_HEADER = """\
# quantity: every observation beside the fit of all, and beside a fit without it
# unit: log10 of a rate constant or of a ratio for rates, logit (base e) for shares; leave_one_out: observed less
#   predicted without the row; error: one standard error of that difference
# is_supported: yes where at least two rows bear on every term the row rests on
# is_inside: yes where the row lies within the 90 % interval of the prediction made without it
# made: by `handbook calibrate --write`, with rate_terms_fitted.tsv; not to be edited by hand
# range: ids are those of rates.tsv and shares.tsv; rows the engine has no pathway for are left out
"""


# --- tables -----------------------------------------------------------------------------------------------------------


def fitted_table(calibration: Calibration) -> str:
    """Return the text of rate_terms_fitted.tsv."""
    rows = ((t.key, f"{t.value:g}", f"{t.error:g}", str(t.rows)) for t in calibration.terms)
    return _table(_FITTED_HEADER, _FITTED_COLUMNS, rows)


def residuals_table(calibration: Calibration) -> str:
    """Return the text of fit_residuals.tsv."""
    return _table(_RESIDUALS_HEADER, _RESIDUAL_COLUMNS, map(_residual_cells, calibration.residuals))


def _residual_cells(residual: Residual) -> tuple[str, ...]:
    numbers = (residual.observed, residual.fitted, residual.leave_one_out, residual.error)
    words = (residual.is_supported, residual.is_inside)
    return (
        residual.id,
        residual.kind,
        *(_fixed(number) for number in numbers),
        *("yes" if word else "no" for word in words),
    )


def _fixed(number: float) -> str:
    return f"{round(float(number), 3) + 0.0:.3f}"


def _table(header: str, columns: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    return header + "".join("\t".join(cells) + "\n" for cells in (columns, *rows))


@cache
def load_fit_residuals() -> tuple[Residual, ...]:
    """Return the residuals of the last calibration that was written, rounded; empty where there is none.

    Raises ValueError for a wrong header, blank cells and ids given twice.
    """
    if not resources.files("builder.mechanism").joinpath(RESIDUALS_TABLE).is_file():
        return ()
    rows = list(rows_of(RESIDUALS_TABLE, table_text("builder.mechanism", RESIDUALS_TABLE), _RESIDUAL_COLUMNS))
    refuse_twice(RESIDUALS_TABLE, "id", [row["id"] for row in rows])
    return tuple(
        Residual(
            id=row["id"],
            kind=row["kind"],
            observed=float(row["observed"]),
            fitted=float(row["fitted"]),
            leave_one_out=float(row["leave_one_out"]),
            error=float(row["error"]),
            is_supported=row["is_supported"] == "yes",
        )
        for row in rows
    )


# --- the report -------------------------------------------------------------------------------------------------------


def fit_report(calibration: Calibration) -> str:
    """Return how good the fit is, in words and numbers; every error is that of a prediction made without the row."""
    blocks = (
        _rates(calibration),
        _shares(calibration),
        _moved(calibration.terms),
        _silent(calibration.silent),
    )
    return "\n\n".join("\n".join(block) for block in blocks if block) + "\n"


def _rates(calibration: Calibration) -> list[str]:
    rows = calibration.of_rates()
    if not rows:
        return ["Rates: no observation supports every term it rests on"]
    by_kind = Counter(row.kind for row in rows)
    return [
        f"Rates, predicted without the row: {len(rows)} observations of which every term has another",
        _line("all", rows),
        *(_line(kind, [row for row in rows if row.kind == kind]) for kind in by_kind),
    ]


def _line(kind: str, rows: Sequence[Residual]) -> str:
    off = [abs(row.leave_one_out) for row in rows]
    inside = sum(row.is_inside for row in rows) / len(rows)
    median, most = _quantile(off, 0.5), _quantile(off, 0.9)
    return (
        f"  {kind:<12} {len(rows):>4}  |Δ log k| median {median:.2f}, 90 % below {most:.2f}; {inside:.0%} in interval"
    )


def _shares(calibration: Calibration) -> list[str]:
    channels = frozenset(channel.value for channel in Channel)
    shares = [row for row in calibration.residuals if row.kind not in channels]
    kinds = Counter(row.kind for row in shares)
    lines = [_share_line(kind, [row for row in shares if row.kind == kind]) for kind in kinds]
    return ["Shares, predicted without the row, in points of 100", *lines] if lines else []


def _share_line(kind: str, rows: Sequence[Residual]) -> str:
    points = [100 * abs(_share(row.observed) - _share(row.observed - row.leave_one_out)) for row in rows]
    inside = sum(row.is_inside for row in rows) / len(rows)
    mean, median = math.fsum(points) / len(points), _quantile(points, 0.5)
    return f"  {kind:<12} {len(rows):>4}  mean error {mean:.1f}, median {median:.1f}; {inside:.0%} in interval"


def _share(logit: float) -> float:
    """Return the share of a logit, held from overflow."""
    return 1 / (1 + math.exp(-max(-50.0, min(50.0, logit))))


def _moved(terms: Sequence[RateTerm]) -> list[str]:
    before = load_rate_terms()
    steps = [(abs(t.value - before[t.key].value) / before[t.key].error, t) for t in terms if t.key in before]
    ranked = sorted(steps, key=lambda step: (-step[0], step[1].key))[:MOST_MOVED]
    lines = [
        f"  {term.key:<40} {before[term.key].value:+7.2f} to {term.value:+7.2f}  {step:4.1f} standard errors, "
        f"{term.rows} row{'' if term.rows == 1 else 's'}"
        for step, term in ranked
    ]
    return [f"Terms that moved most from {len(before)} in rate_terms.tsv ({len(terms)} fitted)", *lines]


def _silent(ids: Sequence[str]) -> list[str]:
    return [f"Observations the engine has no pathway for ({len(ids)}): {', '.join(ids)}"] if ids else []


def _quantile(values: Sequence[float], share: float) -> float:
    """Return the value below which that share of the values lies, by linear interpolation."""
    ordered = sorted(float(value) for value in values)
    place = share * (len(ordered) - 1)
    low = math.floor(place)
    high = min(low + 1, len(ordered) - 1)
    return ordered[low] + (place - low) * (ordered[high] - ordered[low])
