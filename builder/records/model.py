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
    HeatCapacity,
    InchiText,
    Label,
    LabelledRatio,
    Labels,
    Line,
    Mass,
    MolarEnthalpy,
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
    "CHARGED_KEYS",
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
    "Onset",
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
    "Thermal",
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

    date: Date = Field(description="day the reaction was started")
    by: OneOrMany[PersonCode] = Field(description="codes of those who ran it")
    runs: Count | None = Field(default=None, description="number of runs under these conditions")


class Reviewed(Part):
    """The review stamp; a date of the version control system is none."""

    by: PersonCode = Field(description="code of the reviewer")
    date: Date = Field(description="day of the review")
    due: Date | None = Field(default=None, description="day on which it wants another look")


class SafetyReview(Part):
    """Who looked at the hazards, and for what scope."""

    by: PersonCode = Field(description="code of who looked at the hazards")
    date: Date = Field(description="day of that look")
    scope: Line = Field(description="what it covers: hazard and scale")


class Superseded(Part):
    """Why another entry stands in this one's place."""

    by: EntryId = Field(description="identifier of the entry that takes this one's place")
    date: Date = Field(description="day it took its place")
    because: Line = Field(description="what is better there")


class Withdrawn(Part):
    """Why this entry no longer holds."""

    date: Date = Field(description="day of the withdrawal")
    because: Line = Field(description="what turned out to be wrong")
    by: PersonCode = Field(description="code of who withdrew it")


class Acceptance(Part):
    """A reviewed disagreement with one rule; it never lifts an error."""

    finding: Line = Field(description="id of the rule that is disagreed with")
    because: Line = Field(description="why the record is right all the same")
    by: PersonCode = Field(description="code of the reviewer who accepts it")


# --- what was charged -------------------------------------------------------------------------------------


STRUCTURES = ("smiles", "inchi", "from_rxn")
QUANTITIES_OF_SUBSTRATE = ("mass", "amount", "volume")
CHARGED_KEYS = ("substrate", "nucleophile", "base", "reagents", "solvent")
"""The keys under which a record lists what was charged."""


class Compound(Part):
    """A named structure: from SMILES, InChI or a component of the record's RXN file."""

    name: Line = Field(description="name a colleague would search for")
    smiles: SmilesText | None = Field(default=None, description="structure, counter-ions included")
    inchi: InchiText | None = Field(default=None, description="structure, in place of a SMILES")
    from_rxn: RxnComponent | None = Field(default=None, description="component of the RXN file, in place of a SMILES")
    cas: CasNumber | None = Field(default=None, description="CAS number of what was in the bottle")

    @property
    def has_structure(self) -> bool:
        """Say whether the record gives a structure for this compound."""
        return any(getattr(self, key) is not None for key in STRUCTURES)


class Charged(Compound):
    """A compound with the quantity charged; the first of mass, amount, volume, equivalents is used."""

    mass: Mass | None = Field(default=None, description="mass weighed, as it came out of the bottle")
    amount: Amount | None = Field(default=None, description="amount of substance")
    volume: Volume | None = Field(default=None, description="volume measured; a liquid by volume wants its density too")
    equivalents: Equivalents | None = Field(default=None, description="per mole of substrate")
    purity: Purity | None = Field(default=None, description="content of the bottle by mass")
    form: Line | None = Field(default=None, description="as bought: 60 % in oil, pellets, monohydrate")
    density: Density | None = Field(default=None, description="of the liquid as measured")
    strength: Strength | None = Field(default=None, description="of a solution: concentration, or percent by mass")

    @property
    def has_quantity(self) -> bool:
        """Say whether any of the four quantities is typed."""
        return any(q is not None for q in (self.mass, self.amount, self.volume, self.equivalents))


class Substrate(Charged):
    """The molecule that bears the leaving group; its amount is the measure of all equivalents."""

    stereo: StereoKind | None = Field(default=None, description="what the bottle holds, whatever is drawn")
    ee: TypedPercent | None = Field(default=None, description="enantiomeric excess")
    er: NumberRatio | None = Field(default=None, description="enantiomer ratio")
    dr: NumberRatio | None = Field(default=None, description="diastereomer ratio")
    classes: OneOrMany[Line] = Field(
        alias="class", description="kind of the reacting carbon; several where several apply"
    )
    leaving_group: Line = Field(description="group that leaves; none for an addition")

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

    use: ReagentUse = Field(description="why it is in the flask")


class Solvent(Charged):
    """One solvent by volume, or by its fraction of the solvent volume."""

    fraction: Share | None = Field(default=None, description="share of the solvent volume, in place of a volume")


class RxnFile(Part):
    """A CTfile RXN beside the record that holds the structures; named with its SHA-256, never followed outside."""

    path: RelativePath = Field(description="file beside the record")
    sha256: Sha256 = Field(description="SHA-256 of that file")


# --- how it was run ---------------------------------------------------------------------------------------


class Formed(Compound):
    """The compound that a stage gives, isolated or not."""

    smiles: SmilesText = Field(description="structure of what the stage gives")
    isolated: Flag | None = Field(default=None, description="whether it was isolated before the next stage")
    stereo: StereoKind | None = Field(default=None, description="what is held after the stage")


class Stage(Part):
    """One stage of the procedure: what is added, at which temperature, for how long, in which vessel."""

    add: OneOrMany[Line] | None = Field(default=None, description="what goes in, by the names above, in that order")
    over: Time | None = Field(default=None, description="time the addition took")
    temperature: TypedTemperature = Field(description="as read; 0 °C to 25 °C for a ramp, 20–25 °C for a band")
    measured: Thermometer | None = Field(default=None, description="where the temperature was read")
    time: Time = Field(description="time held, the addition apart")
    vessel: Vessel | None = Field(default=None, description="how it was contained")
    atmosphere: Line | None = Field(default=None, description="gas above it: nitrogen, argon, air")
    pressure: Pressure | None = Field(default=None, description="pressure in the vessel")
    vessel_volume: Volume | None = Field(default=None, description="inner volume of the vessel")
    end_point: Line | None = Field(default=None, description="how the end was recognised")
    gives: Formed | None = Field(default=None, description="what is formed before the next stage")
    note: Line | None = Field(default=None, description="anything else the next person must know")


# --- what came out ----------------------------------------------------------------------------------------


class Claim(Part):
    """What the writer holds happened, and on which evidence."""

    mechanism: Mechanism = Field(description="mechanism you hold for the main product")
    course: Course | None = Field(default=None, description="stereochemical course, if one holds for all products")
    basis: OneOrMany[Line] | None = Field(default=None, description="the evidence it rests on")


class Product(Compound):
    """One product under its label."""

    label: Label = Field(description="short label by which measurements name it")
    smiles: SmilesText | None = Field(default=None, description="structure")
    use: ProductUse | None = Field(default=None, description="wanted or not")
    stereo: StereoKind | None = Field(default=None, description="what was found, whatever is drawn")
    course: Course | None = Field(default=None, description="stereochemical course, where products differ in it")

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

    yield_: TypedPercent | None = Field(default=None, alias="yield", description="of theory")
    conversion: TypedPercent | None = Field(default=None, description="of substrate consumed")
    recovered: TypedPercent | None = Field(default=None, description="of substrate found again")
    ee: TypedPercent | None = Field(default=None, description="enantiomeric excess; negative for the other enantiomer")
    er: NumberRatio | None = Field(default=None, description="enantiomer ratio")
    dr: NumberRatio | None = Field(default=None, description="diastereomer ratio")
    ratio: LabelledRatio | None = Field(default=None, description="labels, then numbers")
    of: Labels | None = Field(default=None, description="label of the product; substrate where that was measured")
    kind: YieldKind | None = Field(default=None, description="weighed, measured against a standard, or bare area")
    by: Line | None = Field(default=None, description="method")
    mass: Mass | None = Field(default=None, description="mass isolated")
    purity: Purity | None = Field(default=None, description="content of the isolated product by mass")
    calibrated: Flag | None = Field(default=None, description="whether responses were calibrated")
    spread: TypedPercent | None = Field(default=None, description="standard deviation over the runs", examples=["3 %"])
    n: Count | None = Field(default=None, description="number of measurements")
    note: Line | None = Field(default=None, description="anything else about this number")

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

    follows: Literal["conversion", "yield", "recovered", "ee"] = Field(description="what was followed")
    of: Labels | None = Field(default=None, description="label of what was followed")
    by: Line | None = Field(default=None, description="method")
    time_unit: Literal["s", "min", "h", "d"] = Field(description="unit of the times")
    points: Annotated[tuple[Point, ...], Field(min_length=2, max_length=1000)] = Field(description="time and percent")

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

    order: Order = Field(description="overall order")
    value: RateConstantValue = Field(description="rate constant")
    spread: RateConstantValue | None = Field(default=None, description="standard deviation")
    n: Count | None = Field(default=None, description="number of runs")
    temperature: TypedTemperature = Field(description="temperature it was measured at")
    of: Line | None = Field(default=None, description="what it is the rate constant of")
    by: Line | None = Field(default=None, description="method")


class Failure(Part):
    """Why a reaction failed, and how sure one is."""

    cause: Line = Field(description="suspected cause")
    basis: Line | None = Field(default=None, description="what the suspicion rests on")
    repeated: Flag | None = Field(default=None, description="whether it failed again")


def _require_products(outcome: "Outcome") -> None:
    if not any(result.gives_products for result in outcome.result):
        return
    if not outcome.products:
        raise faulty("key-missing", "a reaction that went has products", "add products: with label, name, smiles")
    if not (outcome.measured or outcome.rate_constant or outcome.time_course):
        raise faulty("key-missing", "a reaction that went has a measurement", "add measured: with one line")


class Outcome(Part):
    """Result, claim, products and measurements."""

    result: OneOrMany[Result] = Field(description="what was seen to happen, the most important first")
    claim: Claim | None = Field(default=None, description="what you hold happened, and why")
    products: tuple[Product, ...] = Field(default=(), description="each product under a label")
    sought: Annotated[Sought, BeforeValidator(_sought, json_schema_input_type=str | Sought)] | None = Field(
        default=None, description="product that a failed reaction was meant to give"
    )
    measured: tuple[Measurement, ...] = Field(default=(), description="one measurement a line")
    time_course: TimeCourse | None = Field(default=None, description="conversion or yield against time")
    rate_constant: RateConstant | None = Field(default=None, description="measured rate constant")
    failure: Failure | None = Field(default=None, description="why it failed, as far as one knows")

    @model_validator(mode="after")
    def _went_or_not(self) -> Self:
        _require_products(self)
        return self


class EvidenceFile(Part):
    """A file behind the record, named by relative path and SHA-256; it is never opened."""

    what: Line = Field(description="what the file holds")
    file: RelativePath = Field(description="where it lies, beside the record")
    sha256: Sha256 = Field(description="SHA-256 of the file")


class Onset(Part):
    """Where a measured decomposition of the reaction mass begins, and how it was measured."""

    temperature: TypedTemperature = Field(description="where decomposition begins")
    by: Line = Field(description="how it was measured: DSC in a closed crucible, ARC")


class Thermal(Part):
    """Thermal data as given, from which the heat of the reaction is screened; outside the digest."""

    reaction_enthalpy: MolarEnthalpy | None = Field(
        default=None, description="for each mole of substrate, negative where heat is given off"
    )
    heat_capacity: HeatCapacity | None = Field(default=None, description="of the reaction mass")
    accumulation: Share | None = Field(
        default=None, description="unreacted share at the worst moment; 100 % where all is charged at once"
    )
    onset: Onset | None = Field(default=None, description="of decomposition, as measured")
    td24: TypedTemperature | None = Field(
        default=None, description="from which decomposition takes 24 h to its maximum rate"
    )
    mtt: TypedTemperature | None = Field(
        default=None, description="maximum temperature for technical reasons: boiling point, or where the relief opens"
    )
    source: Line = Field(description="where the data come from: calorimeter and run")


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

    format: FormatNumber = Field(description="version of the record format")
    entry: EntryId = Field(description="identifier; the file is named after it")
    revision: Count = Field(description="1 for a new entry")
    status: Status = Field(description="draft until reviewed, then current")
    title: Annotated[Line, Field(max_length=160)] = Field(description="what a colleague reads in a list")
    performed: Performed = Field(description="who ran it, and when")
    reviewed: Reviewed | None = Field(default=None, description="who reviewed the record, and when")
    notebook: Line | None = Field(default=None, description="book and page")
    rxn_file: RxnFile | None = Field(default=None, description="CTfile RXN that holds the structures")
    substrate: Substrate = Field(description="molecule that bears the leaving group, or the alkene")
    nucleophile: NucleophileField | None = Field(
        default=None, description="what attacks carbon; several where they compete"
    )
    base: OneOrMany[Nucleophile] | None = Field(default=None, description="what takes a proton")
    reagents: tuple[Reagent, ...] = Field(default=(), description="whatever else went in")
    solvent: OneOrMany[Solvent] | None = Field(default=None, description="each solvent, by volume or fraction")
    neat: Flag | None = Field(default=None, description="true in place of a solvent")
    concentration: Concentration | None = Field(
        default=None, description="of substrate per solvent volume, where solvents stand by fractions"
    )
    stages: OneOrMany[Stage] = Field(description="one for a single-stage reaction")
    work_up: OneOrMany[Line] | None = Field(default=None, description="steps in order, the quench first")
    outcome: Outcome = Field(description="what came out, and how it was measured")
    evidence: tuple[Evidence, ...] = Field(
        default=(), description="methods by which the products were identified, and files behind the record"
    )
    procedure: Line | None = Field(default=None, description="the procedure in prose, if there is more to say")
    take_away: Line | None = Field(default=None, description="one sentence a colleague reads in a list")
    scale_limit: Line | None = Field(default=None, description="largest scale this is fit for, and why")
    accepted: tuple[Acceptance, ...] = Field(
        default=(), description="disagreements with a rule that a reviewer has accepted"
    )
    thermal: Thermal | None = Field(default=None, description="thermal data, from which the heat is screened")
    safety_review: SafetyReview | None = Field(
        default=None, description="who looked at the hazards, and for what scope"
    )
    related: OneOrMany[EntryId] | None = Field(default=None, description="entries that belong beside this one")
    preceded_by: OneOrMany[EntryId] | None = Field(default=None, description="entries this one starts from")
    disclosure: Disclosure | None = Field(default=None, description="who may see the entry")
    superseded: Superseded | None = Field(default=None, description="what takes its place; goes with status superseded")
    withdrawn: Withdrawn | None = Field(default=None, description="why it no longer holds; goes with status withdrawn")

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
