"""Calibration: the terms of the model fitted to the observations by regularised least squares.

Each observation is a rate (log10) or a share (logit). The terms are moved by Gauss-Newton steps from where they stand
in rate_terms.tsv, each held there by its own standard error as by one more observation (ridge, or a Gaussian prior);
residuals beyond HUBER standard errors count less (Huber 1964). Leave-one-out residuals come from the leverage of each
row, r / (1 - h), with no second fit. What the terms leave unexplained in a family of pathways is estimated from those
residuals and enters the errors of every forecast. Order of rows and of terms is that of the tables, so one machine
always writes the same. A sum taken in another order may change the last digit written: what a pathway leaves out below
its least weight comes and goes in steps.
Sources: Hoerl and Kennard, Technometrics 1970, 12, 55; Huber, Ann. Math. Stat. 1964, 35, 73 (from memory).
"""

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from builder.mechanism.forecast import Z90
from builder.mechanism.observations.tables import ShareKind, load_rates, load_shares
from builder.mechanism.observing import Seen, SilentError, observed_logit, see_rate, see_share
from builder.mechanism.rate_terms import Parameters, RateTerm, load_rate_terms

__all__ = ["Calibration", "Residual", "calibrate"]

ROUNDS = 3
HUBER = 2.5
_MODEL = "model."
_DIGITS = 3
_PARTITION = ("e1.", "shift.", "capture.", "e2.trans")
_MODEL_OF_CHANNEL = {
    "SN2": "model.SN2",
    "SN2 solvent": "model.SN2",
    "ionisation": "model.ionisation",
    "solvolysis": "model.ionisation",
    "E2": "model.E2",
    "NGP": "model.NGP",
    "opening": "model.SN2",
}


@dataclass(frozen=True, slots=True)
class Residual:
    """One observation beside the fit: log10 for rates, logit for shares.

    leave_one_out: observed less predicted by a fit without this row. error: standard error of that difference.
    is_supported: at least two rows bear on every term it depends on.
    """

    id: str
    kind: str
    observed: float
    fitted: float
    leave_one_out: float
    error: float
    is_supported: bool

    @property
    def is_inside(self) -> bool:
        """Say whether the observation lies within the 90 % interval of the prediction made without it."""
        return abs(self.leave_one_out) <= Z90 * self.error


@dataclass(frozen=True, slots=True)
class Calibration:
    """The fitted terms, the residuals, and the observations the engine has nothing to say to."""

    terms: tuple[RateTerm, ...]
    residuals: tuple[Residual, ...]
    silent: tuple[str, ...]

    def of_rates(self) -> tuple[Residual, ...]:
        """Return the residuals of rate constants that support every term they rest on."""
        return tuple(r for r in self.residuals if r.kind in _MODEL_OF_CHANNEL and r.is_supported)


@dataclass(frozen=True, slots=True)
class _Row:
    id: str
    kind: str
    observed: float
    error: float
    model: str | None
    see: Callable[[Parameters], Seen]


def calibrate(progress: Callable[[int, int], None] | None = None) -> Calibration:
    """Return the fit of the terms to all observations. progress: told (steps done, steps in all)."""
    prior = load_rate_terms()
    parameters = Parameters(prior)
    rows, silent = _answered(list(_rows(tuple(k for k in prior if k.startswith(_PARTITION)))), parameters)
    scatter = {key: term.error for key, term in prior.items() if key.startswith(_MODEL)}
    keys: list[str] = []

    def look(turn: int) -> list[Seen]:
        seen = []
        for place, row in enumerate(rows):
            seen.append(row.see(parameters))
            if progress is not None:
                progress(turn * len(rows) + place + 1, (ROUNDS + 1) * len(rows))
        return seen

    for turn in range(ROUNDS):
        seen = look(turn)
        keys = [k for k in prior if not k.startswith(_MODEL) and any(k in s.slopes and s.slopes[k][0] for s in seen)]
        fit = _Fit(rows, seen, keys, prior, parameters, scatter)
        scatter = scatter | fit.scatter()
        fit = _Fit(rows, seen, keys, prior, parameters, scatter)
        parameters = parameters.with_values(dict(zip(keys, fit.values, strict=True)))
    fit = _Fit(rows, look(ROUNDS), keys, prior, parameters, scatter)
    return Calibration(tuple(_terms(fit, prior, scatter)), tuple(fit.residuals()), tuple(silent))


def _rows(partition: tuple[str, ...]) -> Iterator[_Row]:
    rates = {rate.id: rate for rate in load_rates()}
    for rate in rates.values():
        if rate.is_reference or "+]" in (rate.nucleophile or ""):
            continue
        reference = rates[rate.relative_to] if rate.relative_to else None
        see = partial(see_rate, rate, reference=reference)
        yield _Row(rate.id, rate.channel.value, rate.value, rate.error, _MODEL_OF_CHANNEL[rate.channel], see)
    for share in load_shares():
        if "+]" in (share.nucleophile or ""):
            continue
        observed, error = observed_logit(share)
        keys = () if share.kind is ShareKind.ELIMINATION and share.nucleophile is not None else partition
        yield _Row(share.id, share.kind.value, observed, error, None, partial(see_share, share, partition_keys=keys))


def _answered(rows: Sequence[_Row], parameters: Parameters) -> tuple[list[_Row], list[str]]:
    """Return the rows the engine has a pathway for, and the ids of the others."""
    kept, silent = [], []
    for row in rows:
        try:
            row.see(parameters)
        except SilentError:
            silent.append(row.id)
        else:
            kept.append(row)
    return kept, silent


SHARE_SCATTER = {ShareKind.ALKENE: 0.15, ShareKind.TRANS_CIS: 0.15}
"""Standard error of a logit that the terms leave unexplained, for shares that only the site decides."""
OTHER_SHARE_SCATTER = 0.4
"""The same for shares that the flask decides too."""
TYPICAL = 0.5
"""Part of the scatter that a typical row has: the scatter itself is set by the poorest tenth, weights are not."""


def _share_scatter(kind: str) -> float:
    return SHARE_SCATTER.get(ShareKind(kind), OTHER_SHARE_SCATTER)


class _Fit:
    """One linearised least-squares problem around a set of values."""

    def __init__(
        self,
        rows: Sequence[_Row],
        seen: Sequence[Seen],
        keys: Sequence[str],
        prior: dict[str, RateTerm],
        at: Parameters,
        scatter: dict[str, float],
    ) -> None:
        self._rows, self.keys = rows, keys
        place = {key: i for i, key in enumerate(keys)}
        self._slopes = np.zeros((len(rows), len(keys)))
        foreign = np.zeros(len(rows))
        for i, each in enumerate(seen):
            for key, (slope, error) in each.slopes.items():
                if key in place:
                    self._slopes[i, place[key]] = slope
                elif not key.startswith(_MODEL):
                    foreign[i] += (slope * error) ** 2
        own = np.array([row.error for row in rows])
        model = np.array([scatter[row.model] if row.model else _share_scatter(row.kind) for row in rows])
        self._noise = np.sqrt(own**2 + model**2 + foreign)
        typical = np.sqrt(own**2 + (TYPICAL * model) ** 2 + foreign)
        self._measured = np.sqrt(own**2 + foreign)
        now = np.array([at.value(key) for key in keys])
        before = np.array([prior[key].value for key in keys])
        spread = np.array([prior[key].error for key in keys])
        residual = np.array([row.observed - s.value for row, s in zip(rows, seen, strict=True)])
        weight = 1.0 / typical**2 * np.minimum(1.0, HUBER / np.maximum(1e-9, np.abs(residual) / typical))
        normal = self._slopes.T @ (weight[:, None] * self._slopes) + np.diag(1.0 / spread**2)
        self._covariance: NDArray[np.float64] = np.linalg.inv(normal)
        step = self._covariance @ (self._slopes.T @ (weight * residual) + (before - now) / spread**2)
        self.values: NDArray[np.float64] = now + step
        self._residual = residual - self._slopes @ step
        variance = np.einsum("ij,jk,ik->i", self._slopes, self._covariance, self._slopes)
        self._variance = variance
        self._leverage = np.minimum(0.98, variance * weight)

    @property
    def errors(self) -> NDArray[np.float64]:
        """Return the standard error of each fitted term."""
        return np.sqrt(np.diag(self._covariance))

    def support(self) -> NDArray[np.int64]:
        """Return how many rows bear on each term."""
        return np.asarray((np.abs(self._slopes) > 0.02).sum(axis=0))

    def residuals(self) -> Iterator[Residual]:
        """Yield every row with its leave-one-out residual."""
        support = self.support()
        for i, row in enumerate(self._rows):
            bearing = np.abs(self._slopes[i]) > 0.02
            supported = bool(np.all(support[bearing] >= 2))
            free = 1 - self._leverage[i]
            error = math.sqrt(self._noise[i] ** 2 + self._variance[i] / free)
            fitted = row.observed - float(self._residual[i])
            yield Residual(row.id, row.kind, row.observed, fitted, float(self._residual[i]) / free, error, supported)

    def scatter(self) -> dict[str, float]:
        """Return what each family of pathways leaves unexplained: leave-one-out residuals less the errors of the rows.

        Such that nine in ten lie within their 90 % interval; at least 0.15.
        """
        found: dict[str, float] = {}
        for model in {row.model for row in self._rows if row.model}:
            places = [i for i, row in enumerate(self._rows) if row.model == model]
            if len(places) < 8:
                continue
            left = [
                (float(self._residual[i]) / (1 - self._leverage[i])) ** 2 - self._measured[i] ** 2 - self._variance[i]
                for i in places
            ]
            typical = float(np.quantile(left, 0.9)) / Z90**2
            found[model] = math.sqrt(max(0.15**2, typical))
        return found


def _terms(fit: _Fit, prior: dict[str, RateTerm], scatter: dict[str, float]) -> Iterator[RateTerm]:
    support = dict(zip(fit.keys, fit.support(), strict=True))
    errors = dict(zip(fit.keys, fit.errors, strict=True))
    values = dict(zip(fit.keys, fit.values, strict=True))
    for key, term in prior.items():
        if key in values and support[key]:
            value, error = round(float(values[key]), _DIGITS), max(0.001, round(float(errors[key]), _DIGITS))
            yield replace(term, value=value, error=error, rows=int(support[key]))
        elif key in scatter and abs(scatter[key] - term.error) > 1e-9:
            yield replace(term, error=round(scatter[key], _DIGITS), rows=1)
