"""Rate constants against their unit, what was followed, what was reached, and what the engine expects."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.agreement import AGREEMENT_READS
from builder.checks.case import Case
from builder.checks.measured import lines_of
from builder.finding import Level
from builder.mechanism.amounts import Role
from builder.mechanism.forecast import Z90, Forecast
from builder.mechanism.kinetics import Flow, Kinetics
from builder.records.model import RateConstant, TimeCourse
from builder.records.quantities import Dimension, Temperature
from builder.records.specimen import outcome_example
from builder.records.vocabulary import Mechanism, Vessel
from builder.rule import Fault, rule

__all__ = ["KINETIC_CHECKS"]

FACTOR = 3.0
"""In time: by how much a rate constant may miss what was seen."""
TOLD = (0.05, 0.95)
"""Conversions between which a time can be told; beyond them only one direction is asked."""
SAME_TEMPERATURE_K = 3.0  # a rate changes by a third or so; common practice, no source
FAR_FROM_FORECAST = 30.0
_SECONDS = {"s": 1.0, "min": 60.0, "h": 3600.0, "d": 86400.0}
_FIRST_ORDER = {Mechanism.SN1, Mechanism.E1, Mechanism.NGP, Mechanism.ADE}

_FOLLOWED = "time_course: {follows: %s, time_unit: h, points: [[0, 0], [4, 12.4], [24, 54.8]]}\n"
_CONSTANT = "rate_constant: {order: 1, value: %s, temperature: 60 °C}"
_SECOND = "rate_constant: {order: 2, value: %s L/(mol s), temperature: 60 °C}"


def _reached(conversion: str, constant: str) -> str:
    return outcome_example(f"{{conversion: {conversion}, by: GC}}", more=constant)


@rule(
    id="rate-constant-order",
    title="A rate constant whose unit is of another order",
    source="iupac-gold",
    fires_on=(outcome_example(more="rate_constant: {order: 2, value: 9.2e-6 1/s, temperature: 25.0 °C}"),),
    silent_on=(outcome_example(more="rate_constant: {order: 2, value: 9.2e-6 L/(mol s), temperature: 25.0 °C}"),),
)
def rate_constant_is_of_another_order(case: Case) -> Iterator[Fault]:
    """A first-order rate constant is in 1/s, a second-order one in L/(mol s).

    The unit is the order: if they disagree, one of them was misread.
    """
    constant = case.record.outcome.rate_constant
    if constant is None:
        return
    wanted = {1: Dimension.RATE_CONSTANT_1, 2: Dimension.RATE_CONSTANT_2}[constant.order]
    for key, quantity in (("value", constant.value), ("spread", constant.spread)):
        if quantity is not None and quantity.dimension is not wanted:
            yield Fault(
                at=("outcome", "rate_constant", key),
                message=f"{quantity} is no rate constant of order {constant.order}",
                mend="correct the unit or the order",
            )


@dataclass(frozen=True, slots=True)
class _Law:
    """The course that a rate constant predicts for the charge of a record.

    name: of the law, for messages.
    """

    name: str
    kinetics: Kinetics

    def misses(self, time_s: float, low: float, high: float) -> float | None:
        """Return the factor in time by which the law misses a conversion between low and high; None within FACTOR.

        Above 1 where the law is too fast. Where a reagent runs out before, nothing is asked.
        """
        least, most = TOLD
        if time_s <= 0:
            return None
        if low >= least:
            slow = self.kinetics.time_to(min(low, most))
            if math.isfinite(slow) and time_s * FACTOR < slow:
                return time_s / slow
        if high <= most:
            fast = self.kinetics.time_to(max(high, least))
            if math.isfinite(fast) and time_s > fast * FACTOR:
                return time_s / fast
        return None

    def percent_at(self, time_s: float) -> float:
        """Return the conversion in per cent at a time."""
        return 100.0 * self.kinetics.conversion_at(time_s)


def _law(case: Case) -> _Law | None:
    """Return the law of the record's rate constant, at the temperature of a stage; None where it cannot be followed.

    Of second order it needs the concentration and the one nucleophile or base with its equivalents.
    """
    constant = case.record.outcome.rate_constant
    if constant is None or not _stages_at(case, constant.temperature):
        return None
    k = constant.value.magnitude
    if constant.order == 1:
        return _Law("first order", Kinetics(1.0, {}, (Flow(k, None),)))
    partners = [row for row in case.amounts.rows if row.role in {Role.NUCLEOPHILE, Role.BASE}]
    concentration = case.amounts.concentration_mol_per_l
    if len(partners) != 1 or not partners[0].equivalents or not concentration:
        return None
    equivalents = partners[0].equivalents
    name = f"second order, {concentration:.3g} mol/L, {equivalents:.3g} equiv"
    return _Law(name, Kinetics(concentration, {"partner": equivalents * concentration}, (Flow(k, "partner"),)))


def _stages_at(case: Case, temperature: Temperature) -> list[int]:
    """Return the stages run at a temperature all the while."""
    wanted = temperature.lowest_c
    return [
        index
        for index, stage in enumerate(case.record.stages)
        if max(abs(stage.temperature.lowest_c - wanted), abs(stage.temperature.highest_c - wanted))
        <= SAME_TEMPERATURE_K
    ]


@rule(
    id="time-course-off-rate",
    title="The time course does not follow the rate constant",
    level=Level.QUERY,
    source="iupac-gold",
    needs=("rate-constant-order", "structure-unreadable"),
    fires_on=(
        outcome_example(more=_FOLLOWED % "conversion" + _CONSTANT % "9.2e-5 1/s"),
        outcome_example(more=_FOLLOWED % "conversion" + _SECOND % "2.0e-4"),
        outcome_example(more=_FOLLOWED % "yield" + _CONSTANT % "9.2e-7 1/s"),
    ),
    silent_on=(
        outcome_example(more=_FOLLOWED % "conversion" + _CONSTANT % "9.2e-6 1/s"),
        outcome_example(more=_FOLLOWED % "conversion" + _SECOND % "1.3e-5"),
        outcome_example(more=_FOLLOWED % "yield" + _CONSTANT % "9.2e-5 1/s"),
    ),
)
def time_course_is_off_the_rate(case: Case) -> Iterator[Fault]:
    """What was followed and what the rate constant gives agree within a factor of 3 in time.

    First order: 1 − x = exp(−kt). Second order with M equivalents at C0: kt = ln[(M − x) / (M(1 − x))] / [C0(M − 1)].
    Asked between 5 and 95 % conversion, where both can be told, of a constant at the temperature of a stage. A yield is
    the least, what was recovered the most that can have reacted.
    """
    course, law = case.record.outcome.time_course, _law(case)
    if course is None or law is None:
        return
    for index, (time, percent) in enumerate(course.points):
        between = _conversion(course, float(percent) / 100.0)
        time_s = float(time) * _SECONDS[course.time_unit]
        factor = law.misses(time_s, *between) if between is not None else None
        if factor is not None:
            yield Fault(
                at=("outcome", "time_course", "points", index),
                message=f"at {time} {course.time_unit} k gives {law.percent_at(time_s):.1f} % conversion ({law.name}),"
                f" the record {percent} % {course.follows}",
                mend="check k, its unit and the time unit",
                data={"factor": round(factor, 2)},
            )
            return


def _conversion(course: TimeCourse, fraction: float) -> tuple[float, float] | None:
    """Return between which conversions a point of a time course puts the reaction; None where it says nothing."""
    return {
        "conversion": (fraction, fraction),
        "yield": (fraction, 1.0),
        "recovered": (0.0, 1.0 - fraction),
    }.get(course.follows)


@rule(
    id="conversion-off-rate",
    title="The conversion does not follow the rate constant",
    level=Level.QUERY,
    source="iupac-gold",
    needs=("rate-constant-order", "structure-unreadable", "time-course-off-rate"),
    fires_on=(
        _reached("99 %", _CONSTANT % "1.0e-6 1/s"),
        _reached("12 %", _SECOND % "3.0e-3"),
        _reached("'< 2 %'", _CONSTANT % "1.0e-4 1/s"),
    ),
    silent_on=(
        _reached("99 %", _CONSTANT % "1.0e-4 1/s"),
        _reached("93 %", _SECOND % "1.0e-4"),
        _reached("99 %", _CONSTANT.replace("60 °C", "25 °C") % "1.0e-6 1/s"),
    ),
)
def conversion_is_off_the_rate(case: Case) -> Iterator[Fault]:
    """The conversion at the end of the reaction and the rate constant agree within a factor of 3 in time.

    Asked of one stage, run at the temperature of the constant; the laws are those of time-course-off-rate. Above 95 %
    only a constant too slow shows, below 5 % only one too fast.
    """
    law = _law(case)
    stage = case.record.stages[0]
    if law is None or len(case.record.stages) != 1 or stage.vessel is Vessel.FLOW:
        return
    time_s = stage.time.magnitude
    for path, line, span in lines_of(case, "conversion"):
        low, high = (span.low - span.half) / 100.0, min(100.0, span.high + span.half) / 100.0
        factor = law.misses(time_s, low, high)
        if factor is not None:
            yield Fault(
                at=(*path, "conversion"),
                message=f"in {stage.time} k gives {law.percent_at(time_s):.3g} % conversion ({law.name}),"
                f" the record {line.value}",
                mend="check k, its unit and the time",
                data={"factor": round(factor, 2)},
            )
            return


@rule(
    id="rate-constant-against-forecast",
    title="A rate constant far from the one the engine expects",
    level=Level.QUERY,
    source="estimated-here",
    needs=(
        *AGREEMENT_READS,
        *("rate-constant-order", "time-course-off-rate", "conversion-off-rate", "mechanism-contrary"),
    ),
    fires_on=(outcome_example(more="rate_constant: {order: 2, value: 5 L/(mol s), temperature: 60 °C}"),),
    silent_on=(outcome_example(more="rate_constant: {order: 2, value: 1.0e-3 L/(mol s), temperature: 60 °C}"),),
)
def rate_constant_is_against_the_forecast(case: Case) -> Iterator[Fault]:
    """A measured rate constant lies within the engine's 90 % interval, or at least within a factor of 30.

    Compared at one temperature and for one order: that of the mechanism the engine puts first. A constant further off
    has usually a wrong unit or power of ten; if it stands, the engine is to learn from it.
    """
    constant, forecast = case.record.outcome.rate_constant, case.forecast
    if constant is None or forecast is None or not _stages_at(case, constant.temperature):
        return
    expected = _expected_log10_k(forecast, constant)
    if expected is None:
        return
    value, error = expected
    off = math.log10(constant.value.magnitude) - value
    if abs(off) > max(Z90 * error, math.log10(FAR_FROM_FORECAST)):
        yield Fault(
            at=("outcome", "rate_constant", "value"),
            message=f"the record gives {constant.value}; the engine expects {10**value:.1e} at this temperature,"
            f" within a factor of {10 ** (Z90 * error):.0f}",
            mend="check value and unit, or accept rate-constant-against-forecast with a reason",
            data={"log10_off": round(off, 2)},
        )


def _expected_log10_k(forecast: Forecast, constant: RateConstant) -> tuple[float, float] | None:
    """Return log10 of the sum of the engine's constants of this order, and its error; None if another order leads."""
    first = {label for label in forecast.log_k if label.endswith(" solvent") or label in _FIRST_ORDER}
    leads_first = forecast.mechanism in first or (
        forecast.mechanism not in forecast.log_k and f"{forecast.mechanism} solvent" in first
    )
    labels = first if constant.order == 1 else forecast.log_k.keys() - first
    if not labels or leads_first is not (constant.order == 1):
        return None
    main = max(labels, key=lambda label: forecast.log_k[label])
    total = math.fsum(10.0 ** forecast.log_k[label] for label in labels)
    return math.log10(total), forecast.log_k_errors[main]


KINETIC_CHECKS = (
    conversion_is_off_the_rate,
    rate_constant_is_against_the_forecast,
    rate_constant_is_of_another_order,
    time_course_is_off_the_rate,
)
