"""The terms of the log-rate model as data: rate_terms.tsv before the fit, rate_terms_fitted.tsv after it.

No number of the model stands in code. A term is asked for by key; one that is not in the table is our fault and
raises. `Parameters` can be varied, so that fitting, perturbing and leaving out run through the same engine.
"""

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cache
from importlib import resources
from typing import NamedTuple

from builder.table import refuse_twice, rows_of, table_text

__all__ = ["FITTED_TABLE", "Parameters", "RateTerm", "Term", "fitted_parameters", "load_rate_terms"]

FITTED_TABLE = "rate_terms_fitted.tsv"


@dataclass(frozen=True, slots=True)
class RateTerm:
    """One term of the model.

    value, error: in the unit its table names, mostly log10 of a rate constant; error is one standard error.
    rows: observations that bear on the value; 0 for one that stands as it was estimated.
    """

    key: str
    value: float
    error: float
    meaning: str
    source: str
    rows: int = 0


class Term(NamedTuple):
    """A term at work in one rate: factor times value."""

    key: str
    factor: float
    value: float
    error: float
    meaning: str
    source: str

    @property
    def contribution(self) -> float:
        """Return what the term adds."""
        return self.factor * self.value


class Parameters:
    """The terms by key, as `Term`s ready to be weighted; immutable."""

    def __init__(self, terms: Mapping[str, RateTerm]) -> None:
        self._terms = dict(terms)

    def __contains__(self, key: str) -> bool:
        return key in self._terms

    def __getitem__(self, key: str) -> RateTerm:
        return self._terms[key]

    def value(self, key: str) -> float:
        """Return the value of a term. Raises KeyError if the table lacks it."""
        return self._terms[key].value

    def term(self, key: str, factor: float = 1.0) -> Term:
        """Return a term with its weight. Raises KeyError if the table lacks it."""
        row = self._terms[key]
        return Term(key, factor, row.value, row.error, row.meaning, row.source)

    def with_values(self, values: Mapping[str, float]) -> "Parameters":
        """Return the same terms, some with other values. Raises KeyError for an unknown key."""
        changed = {key: replace(self._terms[key], value=value) for key, value in values.items()}
        return Parameters(self._terms | changed)

    def without(self, key: str) -> "Parameters":
        """Return the parameters with one term set to zero, error too."""
        return Parameters(self._terms | {key: replace(self._terms[key], value=0.0, error=0.0)})


@cache
def load_rate_terms() -> dict[str, RateTerm]:
    """Return the terms as estimated or published, before the fit.

    Raises ValueError for a wrong header, a key given twice, or a value that is not finite or has no positive error.
    """
    name = "rate_terms.tsv"
    rows = list(rows_of(name, _text(name), ("key", "value", "error", "meaning", "source")))
    refuse_twice(name, "key", [row["key"] for row in rows])
    terms = {
        row["key"]: RateTerm(row["key"], float(row["value"]), float(row["error"]), row["meaning"], row["source"])
        for row in rows
    }
    for term in terms.values():
        if not math.isfinite(term.value) or not 0 < term.error < math.inf:
            raise ValueError(f"{name}: {term.key}: needs a finite value and a positive error")
    return terms


@cache
def fitted_parameters() -> Parameters:
    """Return the parameters the engine works with: fitted where data bear on them, else as estimated.

    Raises ValueError if the fitted table names a term that is not in rate_terms.tsv.
    """
    terms = dict(load_rate_terms())
    for row in rows_of(FITTED_TABLE, _text(FITTED_TABLE), ("key", "value", "error", "rows")):
        before = terms.get(row["key"])
        if before is None:
            raise ValueError(f"{FITTED_TABLE}: {row['key']}: not in rate_terms.tsv; run `handbook calibrate`")
        terms[row["key"]] = replace(before, value=float(row["value"]), error=float(row["error"]), rows=int(row["rows"]))
    return Parameters(terms)


def _text(name: str) -> str:
    return (
        table_text("builder.mechanism", name) if resources.files("builder.mechanism").joinpath(name).is_file() else ""
    )
