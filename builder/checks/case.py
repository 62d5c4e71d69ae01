"""Case: a record with everything the checks look at, computed once."""

import datetime as dt
import hashlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from builder.chemistry.structure import Structure, StructureError, parse_inchi, parse_rxn, parse_smiles
from builder.mechanism.amounts import Amounts, charged_rows, derive_amounts
from builder.mechanism.reaction import SiteInPlay, has_undrawn_species, in_play, species_in_flask
from builder.records.model import Compound, Record
from builder.records.settings import Settings
from builder.rule import Path

__all__ = ["Case", "compounds_of", "open_case"]


@dataclass(frozen=True, slots=True)
class Case:
    """One record under examination.

    file: as findings show it. today: the date of the build, from which "in the future" is judged.
    structures: by path of the compound, for all that could be read; unreadable holds the rest with the reason.
    sites: that bear the declared leaving group; empty where it or the substrate could not be read.
    flask: everything charged but the substrate, as far as has_undrawn_species leaves it known.
    rxn_fault: why the RXN file that the record names cannot be used; None where it can, or none is named.
    """

    record: Record
    file: str
    settings: Settings
    today: dt.date
    structures: Mapping[Path, Structure]
    unreadable: Mapping[Path, StructureError]
    amounts: Amounts
    sites: tuple[SiteInPlay, ...]
    flask: tuple[Structure, ...]
    has_undrawn_species: bool
    rxn_fault: StructureError | None = None

    @property
    def substrate(self) -> Structure:
        """Return the structure of the substrate.

        Raises KeyError where it could not be read; checks that use it need `structure-unreadable` to be silent.
        """
        return self.structures[("substrate",)]


def open_case(record: Record, file: str, settings: Settings, today: dt.date, rxn: bytes | None = None) -> Case:
    """Read the structures of a record and derive its amounts, the sites in play and what is in the flask.

    rxn: content of the RXN file that the record names; None where there is none inside the book.
    """
    drawn, rxn_fault = _components(record, rxn)
    structures: dict[Path, Structure] = {}
    unreadable: dict[Path, StructureError] = {}
    for path, compound in compounds_of(record):
        try:
            if compound.smiles:
                structures[path] = parse_smiles(compound.smiles)
            elif compound.inchi:
                structures[path] = parse_inchi(compound.inchi)
            elif compound.from_rxn and rxn_fault is None:
                structures[path] = _component(compound.from_rxn, drawn)
        except StructureError as error:
            unreadable[path] = error
    return Case(
        record=record,
        file=file,
        settings=settings,
        today=today,
        structures=structures,
        unreadable=unreadable,
        amounts=derive_amounts(record, structures),
        sites=in_play(record, structures),
        flask=tuple(species_in_flask(record, structures)),
        has_undrawn_species=has_undrawn_species(record, structures),
        rxn_fault=rxn_fault,
    )


def _components(record: Record, rxn: bytes | None) -> tuple[dict[str, Structure], StructureError | None]:
    """Return the components of the record's RXN file by name ("reactant 1"), or why there are none."""
    if record.rxn_file is None:
        asks = any(compound.from_rxn for _, compound in compounds_of(record))
        return {}, StructureError("no rxn_file is named", "add rxn_file: with path and sha256") if asks else None
    if rxn is None:
        mend = "put it beside the record; it may not lie outside the book nor have more than 256 kB"
        return {}, StructureError("this file is missing, outside the book, or too large", mend)
    found = hashlib.sha256(rxn).hexdigest()
    if found != record.rxn_file.sha256:
        return {}, StructureError("the file is not the one whose SHA-256 is given", f"its SHA-256 is {found}")
    try:
        reactants, products = parse_rxn(rxn.decode("utf-8", errors="replace"))
    except StructureError as error:
        return {}, error
    sides = {"reactant": reactants, "product": products}
    return {f"{side} {n}": each for side, all_of in sides.items() for n, each in enumerate(all_of, start=1)}, None


def _component(name: str, drawn: Mapping[str, Structure]) -> Structure:
    if name not in drawn:
        raise StructureError(f"the RXN file has no {name}", f"it has {', '.join(drawn)}")
    return drawn[name]


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
