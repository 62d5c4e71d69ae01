"""What cautions look at in a record: its substances, and the lines of text that may name others."""

from collections.abc import Iterable, Iterator

from builder.checks.case import Case, compounds_of
from builder.checks.conditions import CLOSED_VESSELS
from builder.checks.hazards.cautions import Setting
from builder.checks.hazards.meetings import Hazard, Present, Whereabouts, find_hazards
from builder.mechanism.solvents import structure_of
from builder.records.model import Compound
from builder.records.vocabulary import Result
from builder.rule import Path

__all__ = ["hazards_of", "presents_of"]


def hazards_of(case: Case, also: Iterable[Present] = ()) -> tuple[Hazard, ...]:
    """Return the hazards of a record, in the order of the table of cautions.

    also: what is present besides, such as products that are forecast; what the record has already counts once.
    """
    stages = case.record.stages
    setting = Setting(
        hottest_c=max(stage.temperature.highest_c for stage in stages),
        is_closed=any(stage.vessel in CLOSED_VESSELS for stage in stages),
        eliminates=Result.ELIMINATION in case.record.outcome.result and not case.record.bases,
    )
    presents = presents_of(case)
    known = {present.structure.smiles for present in presents if present.structure is not None}
    more = (each for each in also if each.structure is None or each.structure.smiles not in known)
    return find_hazards((*presents, *more), setting)


def presents_of(case: Case) -> tuple[Present, ...]:
    """Return everything in a record that cautions look at, in its order.

    A solvent without a structure takes it from the table of solvents; whatever has none is judged by its name.
    """
    substances = (
        _substance(case, path, compound, Whereabouts.PRODUCT if path[0] == "outcome" else Whereabouts.FLASK)
        for path, compound in compounds_of(case.record)
    )
    return (*substances, *_texts(case))


def _texts(case: Case) -> Iterator[Present]:
    for index, line in enumerate(case.record.work_up or ()):
        yield Present(("work_up", index), line, Whereabouts.WORK_UP)
    for index, stage in enumerate(case.record.stages):
        for key, text in (("atmosphere", stage.atmosphere), ("note", stage.note)):
            if text:
                yield Present(("stages", index, key), text, Whereabouts.NOTE)
    if case.record.procedure:
        yield Present(("procedure",), case.record.procedure, Whereabouts.NOTE)


def _substance(case: Case, path: Path, compound: Compound, whereabouts: Whereabouts) -> Present:
    return Present(path, compound.name, whereabouts, structure_of(compound.name, case.structures.get(path)))
