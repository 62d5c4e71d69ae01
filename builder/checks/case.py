"""Case: a record with everything the checks look at, computed once."""

import datetime as dt
import hashlib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache

from builder.chemistry.structure import Structure, StructureError, parse_inchi, parse_rxn, parse_smiles
from builder.mechanism.amounts import Amounts, charged_rows, derive_amounts
from builder.mechanism.asking import AskingError
from builder.mechanism.engine import predict
from builder.mechanism.forecast import Forecast
from builder.mechanism.from_record import question_from_record
from builder.mechanism.question import Question
from builder.mechanism.reaction import SiteInPlay, has_undrawn_species, in_play, species_in_flask
from builder.records.model import Compound, Record
from builder.records.settings import Settings
from builder.rule import Path

__all__ = ["Case", "compounds_of", "forecast_for", "open_case"]


@dataclass(frozen=True, slots=True)
class Case:
    """One record under examination.

    file: as findings show it. today: the date of the build, from which "in the future" is judged.
    structures: by path of the compound, for all that could be read; unreadable holds the rest with the reason.
    sites: that bear the declared leaving group; empty where it or the substrate could not be read.
    flask: everything charged but the substrate, as far as has_undrawn_species leaves it known.
    question: what the record asks of the engine; None where it cannot be asked, and then unasked says why.
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
    question: Question | None
    unasked: str = ""
    rxn_fault: StructureError | None = None

    @property
    def substrate(self) -> Structure:
        """Return the structure of the substrate.

        Raises KeyError where it could not be read; checks that use it need `structure-unreadable` to be silent.
        """
        return self.structures[("substrate",)]

    def product_paths(self, labels: Iterable[str] | None) -> list[Path]:
        """Return the paths of the products that bear these labels; labels that none bears are left out."""
        positions = {product.label: index for index, product in enumerate(self.record.outcome.products)}
        return [("outcome", "products", positions[label]) for label in labels or () if label in positions]

    @property
    def forecast(self) -> Forecast | None:
        """Return what the engine forecasts, asked once; None where it cannot be asked or has no say."""
        forecast = None if self.question is None else forecast_for(self.question)
        return forecast if forecast is not None and forecast.is_covered else None


@lru_cache(maxsize=64)
def forecast_for(question: Question) -> Forecast:
    """Return the forecast for a question; asked again, it is remembered."""
    return predict(question)


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
    amounts, sites = derive_amounts(record, structures), in_play(record, structures)
    question, unasked = _question(record, structures, amounts, sites)
    return Case(
        record=record,
        file=file,
        settings=settings,
        today=today,
        structures=structures,
        unreadable=unreadable,
        amounts=amounts,
        sites=sites,
        flask=tuple(species_in_flask(record, structures)),
        has_undrawn_species=has_undrawn_species(record, structures),
        question=question,
        unasked=unasked,
        rxn_fault=rxn_fault,
    )


def _question(
    record: Record, structures: Mapping[Path, Structure], amounts: Amounts, sites: tuple[SiteInPlay, ...]
) -> tuple[Question | None, str]:
    """Return the question of a record, or why there is none."""
    try:
        return question_from_record(record, structures, amounts, sites), ""
    except AskingError as error:
        return None, error.what


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
        reactants, products = parse_rxn(rxn.decode("utf-8-sig", errors="replace"))
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
