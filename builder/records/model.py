"""The record: typed, frozen models of what a chemist writes.

Field by field this is record format 1; `records.schema` makes the JSON Schema from it. No chemistry here: a SMILES
is text, a class is a word. Absent keys are None or empty, and never enter the digest.
"""

import datetime as dt
from typing import Annotated, ClassVar, Literal, Self

from pydantic import BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag, model_validator

from builder.records.fields import (
    Amount,
    CasNumber,
    Concentration,
    Count,
    Date,
    Density,
    EntryId,
    Equivalents,
    Flag,
    FormatNumber,
    Label,
    LabelledRatio,
    Labels,
    Line,
    Mass,
    NumberRatio,
    OneOrMany,
    Order,
    PersonCode,
    Point,
    Pressure,
    Purity,
    RateConstantValue,
    Ratio,
    RelativePath,
    RxnComponent,
    Sha256,
    Share,
    SmilesText,
    Strength,
    Time,
    TypedPercent,
    TypedTemperature,
    Volume,
    faulty,
)
from builder.records.quantities import Percent
from builder.records.vocabulary import (
    Course,
    Disclosure,
    Mechanism,
    NucleophileWord,
    ProductUse,
    ReagentUse,
    Result,
    Status,
    StereoKind,
    Thermometer,
    Vessel,
    YieldKind,
)
from builder.rule import Path

__all__ = [
    "KINDS_OF_MEASUREMENT",
    "QUANTITIES_OF_SUBSTRATE",
    "STRUCTURES",
    "UNION_TAGS",
    "Acceptance",
    "Charged",
    "Claim",
    "EvidenceFile",
    "Failure",
    "Measurement",
    "Nucleophile",
    "Outcome",
    "Performed",
    "Product",
    "RateConstant",
    "Reagent",
    "Record",
    "Reviewed",
    "RxnFile",
    "SafetyReview",
    "Solvent",
    "Sought",
    "Stage",
    "Substrate",
    "Superseded",
    "TimeCourse",
    "Withdrawn",
]


class Part(BaseModel):
    """Base of every part of a record: frozen, and closed to unknown keys."""

    model_config: ClassVar[ConfigDict] = ConfigDict(
        frozen=True,
        extra="forbid",
        arbitrary_types_allowed=True,
        hide_input_in_errors=True,
    )


# --- who and when -----------------------------------------------------------------------------------------


class Performed(Part):
    """The experiment: day, people by their codes, number of runs under these conditions."""

    date: Date
    by: OneOrMany[PersonCode]
    runs: Count | None = None


class Reviewed(Part):
    """The review stamp; a date of the version control system is none."""

    by: PersonCode
    date: Date
    due: Date | None = None


class SafetyReview(Part):
    """Who looked at the hazards, and for what scope."""

    by: PersonCode
    date: Date
    scope: Line


class Superseded(Part):
    """Why another entry stands in this one's place."""

    by: EntryId
    date: Date
    because: Line


class Withdrawn(Part):
    """Why this entry no longer holds."""

    date: Date
    because: Line
    by: PersonCode


class Acceptance(Part):
    """A reviewed disagreement with one rule; it never lifts an error."""

    finding: Line
    because: Line
    by: PersonCode


# --- what was charged -------------------------------------------------------------------------------------


STRUCTURES = ("smiles", "inchi", "from_rxn")
QUANTITIES_OF_SUBSTRATE = ("mass", "amount", "volume")


class Compound(Part):
    """A named structure: from SMILES, InChI or a component of the record's RXN file."""

    name: Line
    smiles: SmilesText | None = None
    inchi: SmilesText | None = None
    from_rxn: RxnComponent | None = None
    cas: CasNumber | None = None

    @property
    def has_structure(self) -> bool:
        """Say whether the record gives a structure for this compound."""
        return any(getattr(self, key) is not None for key in STRUCTURES)


class Charged(Compound):
    """A compound with the quantity charged; the first of mass, amount, volume, equivalents is used."""

    mass: Mass | None = None
    amount: Amount | None = None
    volume: Volume | None = None
    equivalents: Equivalents | None = None
    purity: Purity | None = None
    form: Line | None = None
    density: Density | None = None
    strength: Strength | None = None

    @property
    def has_quantity(self) -> bool:
        """Say whether any of the four quantities is typed."""
        return any(q is not None for q in (self.mass, self.amount, self.volume, self.equivalents))


class Substrate(Charged):
    """The molecule that bears the leaving group; its amount is the measure of all equivalents."""

    stereo: StereoKind | None = None
    ee: TypedPercent | None = None
    er: NumberRatio | None = None
    dr: NumberRatio | None = None
    classes: OneOrMany[Line] = Field(alias="class")
    leaving_group: Line

    @model_validator(mode="after")
    def _needs_structure_and_quantity(self) -> Self:
        if not self.has_structure:
            raise faulty("key-missing", "the substrate has no structure", "add smiles: '…'")
        if all(getattr(self, key) is None for key in QUANTITIES_OF_SUBSTRATE):
            raise faulty("key-missing", "the substrate has no quantity", "add mass, amount or volume")
        return self


class Nucleophile(Charged):
    """A species that attacks carbon or takes a proton."""


class Reagent(Charged):
    """Whatever else went in, with the use it had."""

    use: ReagentUse


class Solvent(Charged):
    """One solvent by volume, or by its fraction of the solvent volume."""

    fraction: Share | None = None


class RxnFile(Part):
    """A CTfile RXN beside the record that holds the structures; named with its SHA-256, never followed outside."""

    path: RelativePath
    sha256: Sha256


# --- how it was run ---------------------------------------------------------------------------------------


class Formed(Compound):
    """The compound that a stage gives, isolated or not."""

    smiles: SmilesText
    isolated: Flag | None = None
    stereo: StereoKind | None = None


class Stage(Part):
    """One stage of the procedure: what is added, at which temperature, for how long, in which vessel."""

    add: OneOrMany[Line] | None = None
    over: Time | None = None
    temperature: TypedTemperature
    measured: Thermometer | None = None
    time: Time
    vessel: Vessel | None = None
    atmosphere: Line | None = None
    pressure: Pressure | None = None
    vessel_volume: Volume | None = None
    end_point: Line | None = None
    gives: Formed | None = None
    note: Line | None = None


# --- what came out ----------------------------------------------------------------------------------------


class Claim(Part):
    """What the writer holds happened, and on which evidence."""

    mechanism: Mechanism
    course: Course | None = None
    basis: OneOrMany[Line] | None = None


class Product(Compound):
    """One product under its label."""

    label: Label
    smiles: SmilesText | None = None
    use: ProductUse | None = None
    stereo: StereoKind | None = None
    course: Course | None = None

    @model_validator(mode="after")
    def _needs_structure(self) -> Self:
        if not self.has_structure:
            raise faulty("key-missing", f"product {self.label} has no structure", "add smiles: '…'")
        return self


class Sought(Compound):
    """The product that a failed reaction was meant to give."""


def _sought(value: object) -> object:
    return {"name": value, "smiles": value} if isinstance(value, str) else value


KINDS_OF_MEASUREMENT = ("yield", "conversion", "recovered", "ee", "er", "dr", "ratio")


class Measurement(Part):
    """One measurement: exactly one of yield, conversion, recovered, ee, er, dr and ratio."""

    yield_: TypedPercent | None = Field(default=None, alias="yield")
    conversion: TypedPercent | None = None
    recovered: TypedPercent | None = None
    ee: TypedPercent | None = None
    er: NumberRatio | None = None
    dr: NumberRatio | None = None
    ratio: LabelledRatio | None = None
    of: Labels | None = None
    kind: YieldKind | None = None
    by: Line | None = None
    mass: Mass | None = None
    purity: Purity | None = None
    calibrated: Flag | None = None
    spread: TypedPercent | None = None
    n: Count | None = None
    note: Line | None = None

    @model_validator(mode="after")
    def _holds_one(self) -> Self:
        given = [kind for kind in KINDS_OF_MEASUREMENT if getattr(self, _attribute(kind)) is not None]
        if len(given) != 1:
            held = " and ".join(given) or "none"
            raise faulty("measurement-not-one", f"one measurement a line; this one has {held}", "split the line")
        if self.yield_ is not None and (self.kind is None or self.of is None):
            lacking = ["kind: isolated, assay or area"] if self.kind is None else []
            lacking += ["of: the product's label"] if self.of is None else []
            raise faulty("key-missing", "a yield needs its kind and its product", f"add {' and '.join(lacking)}")
        return self

    @property
    def what(self) -> str:
        """Return which of the kinds of measurement this line holds."""
        return next(kind for kind in KINDS_OF_MEASUREMENT if getattr(self, _attribute(kind)) is not None)

    @property
    def value(self) -> Percent | Ratio:
        """Return the measured value."""
        value = getattr(self, _attribute(self.what))
        assert isinstance(value, (Percent, Ratio))  # noqa: S101 - the validator above admits nothing else
        return value


def _attribute(kind: str) -> str:
    return "yield_" if kind == "yield" else kind


class TimeCourse(Part):
    """Points of (time, percent) followed during the reaction."""

    follows: Literal["conversion", "yield", "recovered", "ee"]
    of: Labels | None = None
    by: Line | None = None
    time_unit: Literal["s", "min", "h", "d"]
    points: Annotated[tuple[Point, ...], Field(min_length=2, max_length=1000)]

    @model_validator(mode="after")
    def _goes_forward_within_bounds(self) -> Self:
        least = -100 if self.follows == "ee" else 0
        earlier = None
        for index, (time, percent) in enumerate(self.points):
            if time < 0 or (earlier is not None and time <= earlier):
                follows = "the start" if earlier is None else f"{earlier} {self.time_unit}"
                raise faulty(
                    "value-not-permitted",
                    f"{time} {self.time_unit} does not come after {follows}",
                    "start at 0 or later, and list the points in the order of time",
                    at=("points", index, 0),
                )
            if not least <= percent <= 100:
                raise faulty(
                    "quantity-out-of-range",
                    f"{percent} % is impossible",
                    f"write a percentage from {least} to 100",
                    at=("points", index, 1),
                )
            earlier = time
        return self


class RateConstant(Part):
    """A measured rate constant with its order, spread, number of runs and temperature."""

    order: Order
    value: RateConstantValue
    spread: RateConstantValue | None = None
    n: Count | None = None
    temperature: TypedTemperature
    of: Line | None = None
    by: Line | None = None


class Failure(Part):
    """Why a reaction failed, and how sure one is."""

    cause: Line
    basis: Line | None = None
    repeated: Flag | None = None


def _require_products(outcome: "Outcome") -> None:
    if not any(result.gives_products for result in outcome.result):
        return
    if not outcome.products:
        raise faulty("key-missing", "a reaction that went has products", "add products: with label, name, smiles")
    if not (outcome.measured or outcome.rate_constant or outcome.time_course):
        raise faulty("key-missing", "a reaction that went has a measurement", "add measured: with one line")


class Outcome(Part):
    """Result, claim, products and measurements."""

    result: OneOrMany[Result]
    claim: Claim | None = None
    products: tuple[Product, ...] = ()
    sought: Annotated[Sought, BeforeValidator(_sought, json_schema_input_type=str | Sought)] | None = None
    measured: tuple[Measurement, ...] = ()
    time_course: TimeCourse | None = None
    rate_constant: RateConstant | None = None
    failure: Failure | None = None

    @model_validator(mode="after")
    def _went_or_not(self) -> Self:
        _require_products(self)
        return self


class EvidenceFile(Part):
    """A file behind the record, named by relative path and SHA-256; it is never opened."""

    what: Line
    file: RelativePath
    sha256: Sha256


# --- the record -------------------------------------------------------------------------------------------


def _text_or_more(value: object) -> str:
    return "<text>" if isinstance(value, str) else "<more>"


# Told apart before they are read, so that a fault is reported once, against what was meant.
NucleophileField = Annotated[
    Annotated[NucleophileWord, Tag("<text>")] | Annotated[OneOrMany[Nucleophile], Tag("<more>")],
    Discriminator(_text_or_more),
]


def _file_or_text(value: object) -> str:
    return "<more>" if isinstance(value, (dict, EvidenceFile)) else "<text>"


Evidence = Annotated[
    Annotated[Line, Tag("<text>")] | Annotated[EvidenceFile, Tag("<more>")],
    Discriminator(_file_or_text),
]
UNION_TAGS = frozenset({"<text>", "<more>"})
"""What pydantic puts into the place of a fault for a choice between two forms."""


class Record(Part):
    """One experiment, as its file holds it."""

    format: FormatNumber
    entry: EntryId
    revision: Count
    status: Status
    title: Annotated[Line, Field(max_length=160)]
    performed: Performed
    reviewed: Reviewed | None = None
    notebook: Line | None = None
    rxn_file: RxnFile | None = None
    substrate: Substrate
    nucleophile: NucleophileField | None = None
    base: OneOrMany[Nucleophile] | None = None
    reagents: tuple[Reagent, ...] = ()
    solvent: OneOrMany[Solvent] | None = None
    neat: Flag | None = None
    concentration: Concentration | None = None
    stages: OneOrMany[Stage]
    work_up: OneOrMany[Line] | None = None
    outcome: Outcome
    evidence: tuple[Evidence, ...] = ()
    procedure: Line | None = None
    take_away: Line | None = None
    scale_limit: Line | None = None
    accepted: tuple[Acceptance, ...] = ()
    safety_review: SafetyReview | None = None
    related: OneOrMany[EntryId] | None = None
    preceded_by: OneOrMany[EntryId] | None = None
    disclosure: Disclosure | None = None
    superseded: Superseded | None = None
    withdrawn: Withdrawn | None = None

    @model_validator(mode="after")
    def _hangs_together(self) -> Self:
        if self.nucleophile is None and self.base is None:
            raise faulty(
                "key-missing",
                "neither nucleophile nor base is given",
                "add one, or a word: solvent, internal, none",
            )
        if not self.neat and not self.solvent:
            raise faulty("key-missing", "no solvent is given", "add solvent: with name and volume, or neat: true")
        if self.neat and self.solvent:
            raise faulty("key-missing", "a reaction in a solvent is not neat", "keep solvent, or neat: true")
        for state, given in ((Status.SUPERSEDED, self.superseded), (Status.WITHDRAWN, self.withdrawn)):
            if (self.status is state) != (given is not None):
                add = f"add {state}: with date, because and by"
                mend = add if given is None else f"write status: {state}, or drop {state}:"
                raise faulty("key-missing", f"status and the key {state} go together", mend)
        return self

    @property
    def nucleophiles(self) -> tuple[Nucleophile, ...]:
        """Return the charged nucleophiles; empty for the words solvent, internal and none."""
        return self.nucleophile if isinstance(self.nucleophile, tuple) else ()

    @property
    def bases(self) -> tuple[Nucleophile, ...]:
        """Return the species listed under `base`."""
        return self.base or ()

    @property
    def solvents(self) -> tuple[Solvent, ...]:
        """Return the solvents; empty for a neat reaction."""
        return self.solvent or ()

    @property
    def desired(self) -> tuple[Product, ...]:
        """Return the products that were wanted; all of them where none is marked."""
        wanted = tuple(product for product in self.outcome.products if product.use is ProductUse.DESIRED)
        return wanted or self.outcome.products

    @property
    def references(self) -> tuple[tuple[Path, str], ...]:
        """Return the entries this one names, each with the path to where it does."""
        listed = (("related", self.related), ("preceded_by", self.preceded_by))
        named: list[tuple[Path, str]] = [((key, i), entry) for key, ids in listed for i, entry in enumerate(ids or ())]
        return (*named, *([(("superseded", "by"), self.superseded.by)] if self.superseded else []))

    @property
    def latest_date(self) -> dt.date:
        """Return the youngest date of the record: review, else performance."""
        return self.reviewed.date if self.reviewed else self.performed.date
