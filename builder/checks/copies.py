"""Numbers that repeat where nature would not: replicates all alike, values left from the sample."""

from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.records.specimen import outcome_example
from builder.rule import Fault, rule

__all__ = ["COPY_CHECKS", "SAMPLE_MASSES"]

SAMPLE_MASSES = ("1.991 g", "1.604 g")
"""Of substrate and product in the sample that `handbook start` lays down; a test holds them to it."""

_ASSAY = "{yield: 81 %, of: A, kind: assay, by: GC}"


@rule(
    id="repeats-alike",
    title="Repeats that are all alike",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        outcome_example("{yield: 81 %, of: A, kind: assay, spread: 0 %, n: 3}"),
        outcome_example(_ASSAY, _ASSAY),
    ),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: assay, spread: 2 %, n: 3}"),
        outcome_example(_ASSAY, "{yield: 81 %, of: A, kind: assay, by: HPLC}"),
    ),
)
def repeats_are_alike(case: Case) -> Iterator[Fault]:
    """Repeats of an experiment differ: a spread is above zero, and no measurement stands twice.

    Three runs that give the same number to the digit are one run copied twice, or a spread nobody worked out.
    """
    measured = case.record.outcome.measured
    for index, line in enumerate(measured):
        path = ("outcome", "measured", index)
        if line.spread is not None and not line.spread.is_limit and not line.spread.magnitude:
            runs = f"{line.n} repeats" if line.n else "repeats"
            yield Fault(
                at=(*path, "spread"),
                message=f"{runs} without any spread",
                mend="write the spread that was found, or '< 1 %' if it was below the last digit",
            )
        if line in measured[:index]:
            yield Fault(
                at=path, message="this measurement stands twice", mend="keep one line, with n: and spread: of the runs"
            )


@rule(
    id="sample-left-in",
    title="Numbers of the sample entry",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        "substrate: {name: 1-bromobutane, smiles: CCCCBr, class: primary, leaving_group: bromide, mass: 1.991 g}\n"
        + outcome_example("{yield: 90 %, of: A, kind: isolated, mass: 1.604 g}"),
    ),
    silent_on=(
        "substrate: {name: 1-bromobutane, smiles: CCCCBr, class: primary, leaving_group: bromide, mass: 1.370 g}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n"
        + outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.803 g}").replace("CCC(C)N", "CCCCN"),
    ),
)
def sample_is_left_in(case: Case) -> Iterator[Fault]:
    """No record keeps the masses of the sample that `handbook start` lays down.

    A record made by changing names in the sample has its structures and titles, and the sample's invented numbers.
    """
    start, weighed = SAMPLE_MASSES
    if str(case.record.substrate.mass) != start or "Sample to be deleted" in case.record.title:
        return
    for index, line in enumerate(case.record.outcome.measured):
        if line.mass is not None and str(line.mass) == weighed:
            yield Fault(
                at=("outcome", "measured", index, "mass"),
                message=f"{weighed} from {start} are the numbers of the sample",
                mend="write what was weighed",
            )


COPY_CHECKS = (
    repeats_are_alike,
    sample_is_left_in,
)
