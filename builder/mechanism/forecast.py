"""A forecast: what the engine answers, as plain values."""

from dataclasses import dataclass

from builder.chemistry.structure import Structure
from builder.mechanism.rate_terms import Term
from builder.records.vocabulary import Course, Mechanism

__all__ = ["Z90", "Contribution", "Forecast", "Forecasted", "PathwayReport", "Reason"]


Z90 = 1.6448536269514722
"""Half width of a 90 % interval in standard errors of a normal distribution."""


@dataclass(frozen=True, slots=True)
class Reason:
    """One reason for an answer. value and error: in log10 units, None where the reason is no number."""

    rule: str
    text: str
    value: float | None
    error: float | None
    source: str


@dataclass(frozen=True, slots=True)
class Contribution:
    """One term of a rate: what it adds to log10 k at 25 °C, and its standard error."""

    key: str
    text: str
    value: float
    error: float
    source: str

    @classmethod
    def of(cls, term: Term) -> "Contribution":
        """Return a term as a contribution."""
        return cls(term.key, term.meaning, term.contribution, abs(term.factor) * term.error, term.source)


@dataclass(frozen=True, slots=True, kw_only=True)
class PathwayReport:
    """One pathway that matters: its rate, its share of converted substrate, what its rate is made of."""

    mechanism: Mechanism
    label: str
    event: str
    leaving_group: str
    partner: str | None
    log10_k: float
    error: float
    share: float
    contributions: tuple[Contribution, ...]


@dataclass(frozen=True, slots=True)
class Forecasted:
    """One product: share of converted substrate, mechanism and course."""

    structure: Structure
    share: float
    mechanism: Mechanism
    course: Course
    rearranged: bool
    path: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Forecast:
    """What is to be expected.

    mechanism: NONE where less than 5 % would react in the time, or every pathway is closed.
    shares, intervals: of converted substrate by mechanism, adding up to 1; 5 to 95 %.
    log_k: log10 of rate constants at the temperature by label, of first (1/s) or second (1/(M s)) order.
    half_life_s, t95_s, t99_s: under the stated conditions; None where no rate can be computed, infinite where reagents
    run out before. conversion: within the stated time. conversion_interval: 5 to 95 %.
    """

    is_covered: bool
    mechanism: Mechanism
    shares: dict[Mechanism, float]
    intervals: dict[Mechanism, tuple[float, float]]
    log_k: dict[str, float]
    log_k_errors: dict[str, float]
    half_life_s: float | None
    t95_s: float | None
    t99_s: float | None
    conversion: float
    conversion_interval: tuple[float, float]
    products: tuple[Forecasted, ...]
    pathways: tuple[PathwayReport, ...]
    reasons: tuple[Reason, ...]

    @property
    def course(self) -> Course:
        """Return the course of the main product; not applicable without one."""
        return self.products[0].course if self.products else Course.NOT_APPLICABLE

    @property
    def rearranged(self) -> bool:
        """Say whether the main product is rearranged."""
        return bool(self.products) and self.products[0].rearranged
