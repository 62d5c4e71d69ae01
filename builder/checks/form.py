"""The record on its own: names, dates, labels, quantities that must be there."""

import datetime as dt
from collections import Counter
from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import Role, charged_rows
from builder.records.model import Record, Solvent
from builder.records.specimen import ONE_PRODUCT, TWO_PRODUCTS, outcome_example
from builder.rule import Fault, Path, rule

__all__ = ["FORM_CHECKS"]

_ASSAY = "{yield: 81 %, of: A, kind: assay}"
_WITH_COURSE = ONE_PRODUCT.replace("}", ", course: not determined}")


def _two_products(label: str, asked: str) -> str:
    """Return an outcome whose second product has one label while its ratio asks for another."""
    products = TWO_PRODUCTS.replace("label: B", f"label: {label}")
    return outcome_example(_ASSAY, f"{{ratio: 'A:{asked} = 90:10', by: GC, calibrated: true}}", products=products)


@rule(
    id="course-twice",
    title="The course stands in two places",
    source="record-format",
    fires_on=(outcome_example(_ASSAY, products=_WITH_COURSE, more="claim: {mechanism: SN2, course: not determined}"),),
    silent_on=(outcome_example(_ASSAY, products=_WITH_COURSE, more="claim: {mechanism: SN2}"),),
)
def course_stands_twice(case: Case) -> Iterator[Fault]:
    """The course stands in the claim, or on each product where they differ, never both.

    Two places could contradict each other, and nobody could say which one was meant.
    """
    outcome = case.record.outcome
    if outcome.claim is None or outcome.claim.course is None:
        return
    for index, product in enumerate(outcome.products):
        if product.course is not None:
            yield Fault(
                at=("outcome", "products", index, "course"),
                message=f"product {product.label} has a course, and so has the claim",
                mend="keep it in one place: in the claim if it holds for all, else on the products",
            )


@rule(
    id="dates-out-of-order",
    title="Dates that cannot follow each other",
    source="common-practice",
    fires_on=(
        "reviewed: {by: bench-1, date: 2026-01-20}",
        "performed: {date: 2126-03-14, by: [bench-2]}",
        "status: withdrawn\nwithdrawn: {date: 2026-02-01, because: another structure, by: bench-1}",
        "safety_review: {by: safety-1, date: 2026-03-16, scope: azide at 10 mmol}",
    ),
    silent_on=(
        "reviewed: {by: bench-1, date: 2026-03-14, due: 2027-03-14}",
        "status: withdrawn\nwithdrawn: {date: 2026-06-01, because: another structure, by: bench-1}",
        "safety_review: {by: safety-1, date: 2026-03-14, scope: azide at 10 mmol}",
    ),
)
def dates_are_out_of_order(case: Case) -> Iterator[Fault]:
    """An experiment is performed before it is reviewed, reviewed before the next review is due, and all before today.

    A slipped digit in a year is the usual cause, and it would sort the entry into the wrong place. It is superseded or
    withdrawn after it was performed. Its hazards are reviewed before it is run: a later review is a query.
    """
    performed = case.record.performed.date
    for path, day in _dates(case.record):
        if day > case.today + dt.timedelta(days=1):  # it may be tomorrow already where the writer is
            yield Fault(at=path, message=f"{path[0]} on {day}, after today, {case.today}", mend="correct the date")
        elif day < performed and path[0] in {"reviewed", "superseded", "withdrawn"}:
            yield Fault(
                at=path,
                message=f"{path[0]} on {day}, before it was performed on {performed}",
                mend="correct one of the two dates",
            )
    reviewed, safety = case.record.reviewed, case.record.safety_review
    if reviewed is not None and reviewed.due is not None and reviewed.due <= reviewed.date:
        yield Fault(
            at=("reviewed", "due"),
            message=f"due again on {reviewed.due}, not after the review on {reviewed.date}",
            mend="give a later day",
        )
    if safety is not None and safety.date > performed:
        yield Fault(
            at=("safety_review", "date"),
            message=f"the hazards were reviewed on {safety.date}, after the run on {performed}",
            mend="correct one of the two dates, or accept this with the reason",
            level=Level.QUERY,
        )


def _dates(record: Record) -> Iterator[tuple[Path, dt.date]]:
    """Yield every date of a record that lies in the past once it is written."""
    yield ("performed", "date"), record.performed.date
    stamps = {
        "reviewed": record.reviewed,
        "safety_review": record.safety_review,
        "superseded": record.superseded,
        "withdrawn": record.withdrawn,
    }
    yield from (((key, "date"), stamp.date) for key, stamp in stamps.items() if stamp is not None)


@rule(
    id="entry-not-file-name",
    title="The file is not named after its entry",
    source="record-format",
    fires_on=("entry: NS7K3QFMC",),
    silent_on=("entry: NS4T9XQ2N",),
)
def entry_is_not_file_name(case: Case) -> Iterator[Fault]:
    """A record's file is named after its identifier.

    The name is how people, links and reviews find an entry; the identifier inside is how the book does.
    """
    name = case.file.replace("\\", "/").rsplit("/", 1)[-1]
    if name != f"{case.record.entry}.yml":
        yield Fault(
            at=("entry",),
            message=f"the file is called {name}",
            mend=f"rename it to {case.record.entry}.yml, or correct the identifier",
            fix=name.removesuffix(".yml") if name.startswith("NS") else None,
        )


@rule(
    id="fractions-not-100",
    title="Solvent fractions that do not add up",
    source="record-format",
    fires_on=(
        "solvent: [{name: ethanol, fraction: 80 %}, {name: water, fraction: 30 %}]\nconcentration: 0.5 mol/L",
        "solvent: [{name: ethanol, fraction: 80 %}, {name: water, volume: 4 mL}]",
    ),
    silent_on=(
        "solvent: [{name: ethanol, fraction: 80 %}, {name: water, fraction: 20 %}]\nconcentration: 0.5 mol/L\n"
        "stages: [{temperature: 60 °C, time: 16 h}]",
    ),
)
def fractions_do_not_add_up(case: Case) -> Iterator[Fault]:
    """Solvent fractions add up to 100 %, and stand for all solvents or for none.

    They are volumes before mixing, so a volume beside a fraction cannot be set against it.
    """
    solvents = case.record.solvents
    fractions = [solvent.fraction.magnitude for solvent in solvents if solvent.fraction is not None]
    if not fractions:
        return
    if len(fractions) != len(solvents):
        yield Fault(at=("solvent",), message="some solvents have a fraction, others none", mend="use one way for all")
    elif abs(sum(fractions) - 100.0) > 0.5:
        yield Fault(
            at=("solvent",), message=f"the fractions add up to {sum(fractions):g} %", mend="correct them to 100 %"
        )


@rule(
    id="label-twice",
    title="A product label stands twice",
    source="record-format",
    fires_on=(outcome_example(_ASSAY, products=TWO_PRODUCTS.replace("label: B", "label: A")),),
    silent_on=(_two_products("B", "B"),),
)
def label_stands_twice(case: Case) -> Iterator[Fault]:
    """Each product has a label of its own.

    Yields and ratios speak of products by their labels.
    """
    seen: Counter[str] = Counter()
    for index, product in enumerate(case.record.outcome.products):
        seen[product.label] += 1
        if seen[product.label] > 1:
            yield Fault(
                at=("outcome", "products", index, "label"),
                message=f"label {product.label} is taken",
                mend="give this product another label",
            )


@rule(
    id="label-unknown",
    title="A label that no product has",
    source="record-format",
    fires_on=(_two_products("B", "C"),),
    silent_on=(_two_products("B", "B"),),
)
def label_is_unknown(case: Case) -> Iterator[Fault]:
    """A measurement speaks of labels that products have; recovered may speak of the substrate.

    A yield of an unknown label would belong to nothing.
    """
    known = {product.label for product in case.record.outcome.products}
    for path, label in _labels_used(case):
        if label not in known:
            yield Fault(
                at=path,
                message=f'no product has the label "{label}"',
                mend=f"labels here: {', '.join(sorted(known)) or 'none yet'}",
            )


def _labels_used(case: Case) -> Iterator[tuple[Path, str]]:
    outcome = case.record.outcome
    for index, line in enumerate(outcome.measured):
        path: Path = ("outcome", "measured", index)
        if line.ratio is not None:
            yield from (((*path, "ratio"), label) for part in line.ratio.parts for label in part)
        allowed = {"substrate"} if line.what in {"recovered", "ee", "er", "dr", "conversion"} else set()
        yield from (((*path, "of"), label) for label in line.of or () if label not in allowed)
    if outcome.time_course is not None:
        yield from ((("outcome", "time_course", "of"), label) for label in outcome.time_course.of or ())


@rule(
    id="quantity-missing",
    title="A substance without a quantity",
    source="record-format",
    fires_on=("nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]'}", "solvent: [{name: DMF}]"),
    silent_on=("nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g}",),
)
def quantity_is_missing(case: Case) -> Iterator[Fault]:
    """Every substance has one quantity: mass, amount, volume or equivalents; a solvent has a volume or a fraction.

    Without it neither the stoichiometry nor the scale of the experiment is known.
    """
    solvent_names = {solvent.name for solvent in case.record.solvents}
    for path, role, substance in charged_rows(case.record):
        if isinstance(substance, Solvent):
            if substance.fraction is None and not substance.has_quantity:
                yield Fault(
                    at=path, message=f"{substance.name} has no volume", mend="add volume: 20 mL, or fraction: 80 %"
                )
        elif not substance.has_quantity and substance.name not in solvent_names:
            wanted = "mass, amount or volume" if role is Role.SUBSTRATE else "mass, amount, volume or equivalents"
            yield Fault(at=path, message=f"{substance.name} has no quantity", mend=f"add {wanted}")


@rule(
    id="spread-without-repeats",
    title="A spread from a single measurement",
    source="common-practice",
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: assay, spread: 3 %}"),),
    silent_on=(outcome_example("{yield: 81 %, of: A, kind: assay, spread: 3 %, n: 3}"),),
)
def spread_comes_from_one_measurement(case: Case) -> Iterator[Fault]:
    """A spread comes with the number of repeats behind it, two or more.

    One measurement has no spread; an error estimate of another kind belongs into a note.
    """
    outcome = case.record.outcome
    lines = [(("outcome", "measured", i), line.spread, line.n) for i, line in enumerate(outcome.measured)]
    for path, spread, n in lines:
        if spread is not None and (n is None or n < 2):
            yield _lonely_spread((*path, "spread"))
    constant = outcome.rate_constant
    if constant is not None and constant.spread is not None and (constant.n is None or constant.n < 2):
        yield _lonely_spread(("outcome", "rate_constant", "spread"))


def _lonely_spread(at: Path) -> Fault:
    return Fault(at=at, message="a spread without at least two repeats", mend="add n: 3, or drop the spread")


@rule(
    id="stage-adds-unknown",
    title="A stage adds what nobody listed",
    source="record-format",
    fires_on=("stages: [{add: [sodium azide, DFM], temperature: 60 °C, time: 16 h}]",),
    silent_on=("stages: [{add: [sodium azide, DMF], temperature: 60 °C, time: 16 h}]",),
)
def stage_adds_what_is_not_listed(case: Case) -> Iterator[Fault]:
    """What a stage adds is listed under the same name as substrate, nucleophile, base, reagent or solvent.

    There stand its structure and its amount; the stage only says when it went in.
    """
    names = {substance.name for _, _, substance in charged_rows(case.record)}
    for index, stage in enumerate(case.record.stages):
        for position, name in enumerate(stage.add or ()):
            if name not in names:
                yield Fault(
                    at=("stages", index, "add", position),
                    message=f'"{name}" is not among the substances of this record',
                    mend=f"names here: {', '.join(sorted(names))}",
                )


FORM_CHECKS = (
    course_stands_twice,
    dates_are_out_of_order,
    entry_is_not_file_name,
    fractions_do_not_add_up,
    label_stands_twice,
    label_is_unknown,
    quantity_is_missing,
    spread_comes_from_one_measurement,
    stage_adds_what_is_not_listed,
)
