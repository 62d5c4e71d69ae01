"""What a good record has and a first draft may lack, with a score."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.chemistry.perception import NO_LEAVING_GROUP
from builder.finding import Level
from builder.records.model import Record
from builder.rule import Fault, rule

__all__ = ["COMPLETENESS_CHECKS", "Completeness", "completeness"]

# What trade practice holds mandatory beyond the required keys: label, and whether the record has it.
_AMOUNTS = {"yield", "recovered"}
_EXPECTED: tuple[tuple[str, Callable[[Record], bool]], ...] = (
    ("notebook", lambda record: record.notebook is not None),
    ("number of runs (performed.runs)", lambda record: record.performed.runs is not None),
    ("substrate.stereo", lambda record: record.substrate.stereo is not None),
    ("order of addition (stages.add)", lambda record: any(stage.add for stage in record.stages)),
    ("where the temperature was measured", lambda record: all(stage.measured for stage in record.stages)),
    ("vessel of every stage", lambda record: all(stage.vessel for stage in record.stages)),
    ("atmosphere", lambda record: any(stage.atmosphere for stage in record.stages)),
    ("end point of the last stage", lambda record: record.stages[-1].end_point is not None),
    ("work_up with its quench", lambda record: record.work_up is not None),
    ("claim of mechanism and course", lambda record: record.outcome.claim is not None or not _is_covered(record)),
    ("conversion", lambda record: any(line.what == "conversion" for line in record.outcome.measured)),
    ("yield, or what was recovered", lambda record: any(line.what in _AMOUNTS for line in record.outcome.measured)),
    ("cause of the failure", lambda record: record.outcome.failure is not None or not _is_failure(record)),
    ("evidence", lambda record: bool(record.evidence)),
    ("review", lambda record: record.reviewed is not None),
    ("take_away", lambda record: record.take_away is not None),
)


@dataclass(frozen=True, slots=True)
class Completeness:
    """How much of what is expected a record has: the score in whole per cent, and the names of the gaps."""

    percent: int
    missing: tuple[str, ...]


def completeness(record: Record) -> Completeness:
    """Return the completeness of a record."""
    missing = tuple(label for label, has_it in _EXPECTED if not has_it(record))
    return Completeness(round(100 * (len(_EXPECTED) - len(missing)) / len(_EXPECTED)), missing)


@rule(
    id="record-incomplete",
    title="What a complete record would add",
    level=Level.REMARK,
    source="common-practice",
    fires_on=("# without notebook",),
    silent_on=("take_away: '81 % in 16 h; no alkene seen'",),
)
def record_is_incomplete(case: Case) -> Iterator[Fault]:
    """A complete record says everything the next person needs to repeat the experiment.

    A first draft may lack it: this is a remark, and the score shows how far the record has come.
    """
    found = completeness(case.record)
    if found.missing:
        yield Fault(
            at=(),
            message=f"{found.percent} % complete; missing: {', '.join(found.missing)}",
            mend="add what is known",
            data={"percent": found.percent, "missing": list(found.missing)},
        )


COMPLETENESS_CHECKS = (record_is_incomplete,)


def _is_covered(record: Record) -> bool:
    return record.substrate.leaving_group != NO_LEAVING_GROUP


def _is_failure(record: Record) -> bool:
    return any(not result.gives_products for result in record.outcome.result)
