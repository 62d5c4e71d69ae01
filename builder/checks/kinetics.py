"""Rate constants against what was followed."""

import math
from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.records.specimen import outcome_example
from builder.rule import Fault, rule

__all__ = ["KINETIC_CHECKS"]

_SECONDS = {"s": 1.0, "min": 60.0, "h": 3600.0, "d": 86400.0}
_FOLLOWED = "time_course: {follows: conversion, time_unit: h, points: [[0, 0], [4, 12.4], [24, 54.8]]}\n"
_CONSTANT = "rate_constant: {order: 1, value: %s, temperature: 60 °C}"


@rule(
    id="time-course-off-rate",
    title="The time course does not follow the rate constant",
    level=Level.QUERY,
    source="iupac-gold",
    needs=("rate-constant-order",),
    fires_on=(outcome_example(more=_FOLLOWED + _CONSTANT % "9.2e-5 1/s"),),
    silent_on=(outcome_example(more=_FOLLOWED + _CONSTANT % "9.2e-6 1/s"),),
)
def time_course_is_off_the_rate(case: Case) -> Iterator[Fault]:
    """Observed conversion and the one from the first-order rate constant agree within a factor of 3 in time.

    1 − x = exp(−kt), asked between 5 and 95 % conversion, where both can be told.
    """
    course, constant = case.record.outcome.time_course, case.record.outcome.rate_constant
    if course is None or constant is None or constant.order != 1 or course.follows != "conversion":
        return
    k = constant.value.magnitude
    for index, (time, percent) in enumerate(course.points):
        x = float(percent) / 100.0
        seconds = float(time) * _SECONDS[course.time_unit]
        if seconds <= 0 or not 0.05 < x < 0.95:
            continue
        factor = k * seconds / -math.log1p(-x)
        if not 1 / 3 < factor < 3:
            expected = -100.0 * math.expm1(-k * seconds)
            yield Fault(
                at=("outcome", "time_course", "points", index),
                message=f"at {time} {course.time_unit} k gives {expected:.1f} %, the record {percent} %",
                mend="check k, its unit and the time unit",
                data={"factor": round(factor, 2)},
            )
            return


KINETIC_CHECKS = (time_course_is_off_the_rate,)
