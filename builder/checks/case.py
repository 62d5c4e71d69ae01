"""Case: a record with everything the checks look at, computed once."""

import datetime as dt
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from builder.chemistry.structure import Structure, StructureError, parse_inchi, parse_smiles
from builder.mechanism.amounts import Amounts, charged_rows, derive_amounts
from builder.records.model import Compound, Record
from builder.records.settings import Settings
from builder.rule import Path

__all__ = ["Case", "compounds_of", "open_case"]


@dataclass(frozen=True, slots=True)
class Case:
    """One record under examination.

    file: as findings show it. today: the date of the build, from which "in the future" is judged.
    structures: by path of the compound, for all that could be read; unreadable holds the rest with the reason.
    """

    record: Record
    file: str
    settings: Settings
    today: dt.date
    structures: Mapping[Path, Structure]
    unreadable: Mapping[Path, StructureError]
    amounts: Amounts

    @property
    def substrate(self) -> Structure:
        """Return the structure of the substrate.

        Raises KeyError where it could not be read; checks that use it need `structure-unreadable` to be silent.
        """
        return self.structures[("substrate",)]


def open_case(record: Record, file: str, settings: Settings, today: dt.date) -> Case:
    """Read the structures of a record and derive its amounts."""
    structures: dict[Path, Structure] = {}
    unreadable: dict[Path, StructureError] = {}
    for path, compound in compounds_of(record):
        try:
            if compound.smiles:
                structures[path] = parse_smiles(compound.smiles)
            elif compound.inchi:
                structures[path] = parse_inchi(compound.inchi)
        except StructureError as error:
            unreadable[path] = error
    return Case(record, file, settings, today, structures, unreadable, derive_amounts(record, structures))


def compounds_of(record: Record) -> Iterator[tuple[Path, Compound]]:
    """Yield every compound of a record with its path: charged, formed in a stage, obtained, sought."""
    for path, _, substance in charged_rows(record):
        yield path, substance
    for index, stage in enumerate(record.stages):
        if stage.gives is not None:
            yield ("stages", index, "gives"), stage.gives
    for index, product in enumerate(record.outcome.products):
        yield ("outcome", "products", index), product
    if record.outcome.sought is not None:
        yield ("outcome", "sought"), record.outcome.sought
