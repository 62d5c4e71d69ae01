"""What cautions look at in a record: its substances, and the lines of text that may name others."""

from collections.abc import Iterable, Iterator

from builder.checks.case import Case, compounds_of
from builder.checks.conditions import CLOSED_VESSELS
from builder.checks.hazards.cautions import Setting, Severity
from builder.checks.hazards.formed import formed_by
from builder.checks.hazards.meetings import Hazard, Present, Whereabouts, find_hazards
from builder.chemistry.structure import Structure
from builder.mechanism.solvents import structure_of
from builder.records.model import Compound, Product
from builder.records.vocabulary import ProductUse, Result
from builder.rule import Path

__all__ = ["hazards_of", "presents_of"]


def hazards_of(case: Case, also: Iterable[Present] = ()) -> tuple[Hazard, ...]:
    """Return the hazards of a record, in the order of the table of cautions.

    What is only good to know of a by-product is left out where the by-product is what the reaction is run for.
    also: what is present besides, such as products that are forecast; what the record has already counts once.
    """
    stages = case.record.stages
    forms_alkene = Result.ELIMINATION in case.record.outcome.result
    presents = presents_of(case)
    presents = (*presents, *_besides(presents, also))
    bases = [present for present in presents if present.path[0] == "base"]
    setting = Setting(
        hottest_c=max(stage.temperature.highest_c for stage in stages),
        is_closed=any(stage.vessel in CLOSED_VESSELS for stage in stages),
        eliminates=forms_alkene and not bases,
        eliminates_weakly=forms_alkene and all("hydrogencarbonate" in base.kinds for base in bases),
    )
    wanted = _wanted(case)
    found = find_hazards(presents, setting)
    return tuple(hazard for hazard in found if not _gives_only_what_is_wanted(hazard, presents, wanted))


def _besides(own: tuple[Present, ...], also: Iterable[Present]) -> Iterator[Present]:
    """Yield what is present besides, without what the record has already."""
    known = {present.structure.smiles for present in own if present.structure is not None}
    yield from (each for each in also if each.structure is None or each.structure.smiles not in known)


def _wanted(case: Case) -> frozenset[Structure]:
    """Return the structures of the products that are no by-products, and of what is sought."""
    wanted = {
        path
        for path, compound in compounds_of(case.record)
        if path == ("outcome", "sought")
        or (isinstance(compound, Product) and compound.use is not ProductUse.BY_PRODUCT)
    }
    return frozenset(case.structures[path] for path in wanted & case.structures.keys())


def _gives_only_what_is_wanted(hazard: Hazard, presents: tuple[Present, ...], wanted: frozenset[Structure]) -> bool:
    if hazard.caution.severity is not Severity.NOTE or not hazard.others:
        return False
    formed = [species.structure for species in formed_by((hazard,), presents)]
    return bool(formed) and wanted.issuperset(formed)


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
