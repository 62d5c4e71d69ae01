"""EntryView: everything an entry's page shows, computed once into plain text and numbers.

Views hold no record, no structure and no path: they can be pickled, cached by the digest of what they came from, and
rendered in another process. Texts are plain, not escaped; the templates escape.
"""

import datetime as dt
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import partial

from markupsafe import Markup

from builder.book import Book, Entry, Verdict
from builder.checks.case import compounds_of
from builder.finding import Finding, Level
from builder.publish.charges import AmountView, StageView, amounts_note, view_amounts, view_stages
from builder.publish.expected import expected_facts, why_nothing_is_expected
from builder.publish.figures import formula_parts, joined, molar_mass_text
from builder.publish.measured import MeasuredLine, measured_lines, rate_constant_text
from builder.publish.schemes import entry_scheme
from builder.publish.summary import Fact, Summary, conditions_strip, scale_mol, summarise
from builder.records.model import Compound, EvidenceFile, Record
from builder.records.settings import Settings
from builder.records.vocabulary import Status
from builder.rule import Path, Rule
from builder.sources import source_text

__all__ = ["EntryView", "Link", "Surroundings", "next_review", "role_of", "surroundings_of", "view_entry"]

DIGEST_SHOWN = 12
"""Hexadecimal digits of a digest that citations and printed pages carry."""

_GRAVITY = ("stop", "warn", "note")
_STANDING = {
    Verdict.IN_LINE: "What was seen and what the engine expects agree.",
    Verdict.CONTRARY: "What was seen and what the engine expects differ, and no reason has been accepted yet.",
    Verdict.EXPLAINED: "What was seen differs from what the engine expects; a reviewer has accepted the reason.",
    Verdict.NOT_COVERED: "The engine has no say in this reaction.",
}


@dataclass(frozen=True, slots=True)
class Link:
    """A link to another entry: identifier, title (empty where the book does not hold it), what it is to this one."""

    id: str
    title: str
    relation: str


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What an entry's page needs to know of the rest of the book; plain data, so that pages can be made apart.

    folder: name of the book's folder, with which the files of its entries begin.
    titles: of every entry by identifier. rules: title by id, of those that have a page.
    links: to the entries that name this one, by its identifier.
    """

    folder: str
    settings: Settings
    today: dt.date
    titles: Mapping[str, str]
    rules: Mapping[str, str]
    links: Mapping[str, tuple[Link, ...]]


@dataclass(frozen=True, slots=True)
class ProductView:
    """One product with its measurements that speak of it alone."""

    label: str
    name: str
    use: str
    stereo: str
    course: str
    measured: tuple[MeasuredLine, ...]


@dataclass(frozen=True, slots=True)
class CompoundView:
    """Identifiers of one compound."""

    name: str
    role: str
    formula: tuple[tuple[str, str], ...]
    molar_mass: str
    cas: str
    inchikey: str
    smiles: str


@dataclass(frozen=True, slots=True)
class FindingView:
    """One finding; rule_page says whether the book has a page for its rule."""

    level: str
    rule: str
    title: str
    rule_page: bool
    message: str
    why: str
    mend: str
    source: str
    accepted: str
    accepted_by: str


@dataclass(frozen=True, slots=True)
class Tombstone:
    """Why an entry no longer holds."""

    word: str
    date: str
    because: str
    by: str
    successor: Link | None


@dataclass(frozen=True, slots=True)
class EntryView:
    """Everything an entry's page shows."""

    summary: Summary
    revision: int
    tombstone: Tombstone | None
    cautions: tuple[FindingView, ...]
    scheme_wide: Markup
    scheme_tall: Markup
    scheme_legend: str
    scheme_file: bytes
    strip: tuple[Fact, ...]
    claim: tuple[Fact, ...]
    standing: str
    expected: tuple[Fact, ...]
    nothing_expected: str
    failure: tuple[Fact, ...]
    sought: str
    products: tuple[ProductView, ...]
    has_courses: bool
    other_measurements: tuple[MeasuredLine, ...]
    rate_constant: str
    time_course_title: str
    time_course: tuple[tuple[str, str], ...]
    queries: tuple[FindingView, ...]
    accepted: tuple[FindingView, ...]
    remarks: tuple[FindingView, ...]
    amounts: tuple[AmountView, ...]
    amounts_note: str
    stages: tuple[StageView, ...]
    work_up: tuple[str, ...]
    procedure: str
    scale_limit: str
    evidence: tuple[Fact, ...]
    compounds: tuple[CompoundView, ...]
    stamp: tuple[Fact, ...]
    review: str
    review_overdue: bool
    links: tuple[Link, ...]
    citation: str
    printed: str


def surroundings_of(book: Book, rules: Iterable[Rule[object, object]]) -> Surroundings:
    """Return what every entry's page needs to know of the book."""
    links: dict[str, list[Link]] = {}
    for entry in book.entries:
        for other, relation in _backward(entry.record):
            links.setdefault(other, []).append(Link(entry.id, entry.record.title, relation))
    return Surroundings(
        folder=book.folder.name,
        settings=book.settings,
        today=book.today,
        titles={entry.id: entry.record.title for entry in book.entries},
        rules={rule.id: rule.title for rule in rules},
        links={other: tuple(found) for other, found in links.items()},
    )


def view_entry(entry: Entry, around: Surroundings) -> EntryView:
    """Return everything the page of `entry` shows."""
    record, settings = entry.record, around.settings
    lines = measured_lines(record, scale_mol(entry))
    own = {product.label: _own_lines(product.label, lines) for product in record.outcome.products}
    shown = {id(line) for product_lines in own.values() for line in product_lines}
    findings = [_finding(finding, record, around) for finding in entry.findings]
    of_level = partial(_of_level, findings)
    scheme = entry_scheme(entry.case)
    rate, course = record.outcome.rate_constant, record.outcome.time_course
    return EntryView(
        summary=summarise(entry),
        revision=record.revision,
        tombstone=_tombstone(record, around),
        cautions=tuple(_finding(finding, record, around) for finding in _gravest_first(entry.findings)),
        scheme_wide=scheme.wide if scheme else Markup(),
        scheme_tall=scheme.tall if scheme else Markup(),
        scheme_legend=scheme.legend if scheme else "",
        scheme_file=scheme.file if scheme else b"",
        strip=conditions_strip(entry),
        claim=_claim(record),
        standing=_STANDING[entry.verdict],
        expected=expected_facts(entry.case),
        nothing_expected=why_nothing_is_expected(entry.case),
        failure=_failure(record),
        sought=record.outcome.sought.name if record.outcome.sought else "",
        products=tuple(
            ProductView(
                label=product.label,
                name=product.name,
                use=str(product.use or "not stated"),
                stereo=str(product.stereo or "not stated"),
                course=str(product.course or ""),
                measured=own[product.label],
            )
            for product in record.outcome.products
        ),
        has_courses=any(product.course for product in record.outcome.products),
        other_measurements=tuple(line for line in lines if id(line) not in shown),
        rate_constant=rate_constant_text(rate) if rate else "",
        time_course_title=joined((course.follows, f"by {course.by}" if course.by else ""), " ") if course else "",
        time_course=tuple((f"{t} {course.time_unit}", f"{y} % {course.follows}") for t, y in course.points)
        if course
        else (),
        queries=tuple(finding for finding in of_level(Level.QUERY) if not finding.accepted),
        accepted=tuple(finding for finding in findings if finding.accepted),
        remarks=of_level(Level.REMARK),
        amounts=view_amounts(entry),
        amounts_note=amounts_note(entry),
        stages=view_stages(entry),
        work_up=record.work_up or (),
        procedure=record.procedure or "",
        scale_limit=record.scale_limit or "",
        evidence=tuple(_evidence(item) for item in record.evidence),
        compounds=_compounds(entry),
        stamp=_stamp(entry, settings),
        review=_review(record, settings),
        review_overdue=_is_overdue(record, settings, around.today),
        links=_links(record, around),
        citation=_citation(entry, settings),
        printed=f"{entry.id} · revision {record.revision} · {entry.digest[:DIGEST_SHOWN]} · {around.today.isoformat()}",
    )


# --- outcome ------------------------------------------------------------------------------------------------


def _own_lines(label: str, lines: tuple[MeasuredLine, ...]) -> tuple[MeasuredLine, ...]:
    return tuple(line for line in lines if line.of == (label,))


def _claim(record: Record) -> tuple[Fact, ...]:
    claim = record.outcome.claim
    if claim is None:
        return ()
    courses = joined(f"{p.label}: {p.course}" for p in record.outcome.products if p.course)
    return (
        Fact("Mechanism", str(claim.mechanism)),
        Fact("Course", str(claim.course) if claim.course else courses or "not stated"),
        Fact("Basis", joined(claim.basis or ()) or "not stated"),
    )


def _failure(record: Record) -> tuple[Fact, ...]:
    failure = record.outcome.failure
    if failure is None:
        return ()
    repeated = {True: "yes", False: "no", None: "not stated"}[failure.repeated]
    return (
        Fact("Suspected cause", failure.cause),
        Fact("How we know", failure.basis or "not stated"),
        Fact("Repeated", repeated),
    )


def _of_level(findings: list[FindingView], level: Level) -> tuple[FindingView, ...]:
    return tuple(finding for finding in findings if finding.level == level)


def _gravest_first(findings: Iterable[Finding]) -> list[Finding]:
    """Return the cautions, those that need a safety review first; else in the order of the record."""
    cautions = [finding for finding in findings if finding.level is Level.CAUTION]
    return sorted(cautions, key=lambda finding: _GRAVITY.index(str(finding.data.get("severity", _GRAVITY[-1]))))


def _finding(finding: Finding, record: Record, around: Surroundings) -> FindingView:
    by = next((a.by for a in record.accepted if a.finding == finding.rule), "") if finding.accepted else ""
    return FindingView(
        level=str(finding.level),
        rule=finding.rule,
        title=around.rules.get(finding.rule, finding.rule),
        rule_page=finding.rule in around.rules,
        message=finding.message,
        why=finding.why,
        mend=finding.mend,
        source=source_text(str(finding.data.get("source", finding.source))),
        accepted=finding.accepted or "",
        accepted_by=_person(by, around.settings) if by else "",
    )


# --- identifiers, stamps, links ---------------------------------------------------------------------------


def _evidence(item: str | EvidenceFile) -> Fact:
    return Fact(item.what, item.file, f"SHA-256 {item.sha256}") if isinstance(item, EvidenceFile) else Fact(item, "")


def _compounds(entry: Entry) -> tuple[CompoundView, ...]:
    """Return the identifiers of every compound with a structure, each once."""
    seen: dict[tuple[str, str], CompoundView] = {}
    for path, compound in compounds_of(entry.record):
        structure = entry.case.structures.get(path)
        if structure is None:
            continue
        key = (compound.name, structure.smiles)
        seen.setdefault(
            key,
            CompoundView(
                name=compound.name,
                role=role_of(path, compound, entry.record),
                formula=formula_parts(structure.formula),
                molar_mass=molar_mass_text(structure.mass),
                cas=compound.cas or "",
                inchikey=structure.inchikey,
                smiles=compound.smiles or structure.smiles,
            ),
        )
    return tuple(seen.values())


def role_of(path: Path, compound: Compound, record: Record) -> str:
    """Return in words what the compound at `path` is in a record: "product A", "formed in stage 1", "solvent"."""
    match path:
        case ("outcome", "products", int(i)):
            return f"product {record.outcome.products[i].label}"
        case ("outcome", "sought"):
            return "product sought"
        case ("stages", int(i), "gives"):
            return f"formed in stage {i + 1}"
        case ("reagents", _):
            return str(getattr(compound, "use", "reagent"))
        case (str(role), *_):
            return role
    raise KeyError(path)


def _person(code: str, settings: Settings) -> str:
    return next((person.shown_as for person in settings.people if person.code == code), code)


def _stamp(entry: Entry, settings: Settings) -> tuple[Fact, ...]:
    record = entry.record
    performed = record.performed
    safety = record.safety_review
    facts = (
        Fact("Performed", performed.date.isoformat(), joined(_person(code, settings) for code in performed.by)),
        Fact("Notebook", record.notebook or "not stated"),
        Fact("Safety review", safety.date.isoformat(), f"{_person(safety.by, settings)}: {safety.scope}")
        if safety
        else Fact("Safety review", "none on file"),
        Fact("Review", _review(record, settings)),
        Fact("Status", joined((str(record.status), f"disclosure: {record.disclosure}" if record.disclosure else ""))),
        Fact("Revision", f"{record.revision}, digest {entry.digest[:DIGEST_SHOWN]}", f"SHA-256 {entry.digest}"),
    )
    return tuple(fact for fact in facts if fact.value)


def next_review(record: Record, settings: Settings) -> dt.date | None:
    """Return when an entry wants to be looked at again; None where nobody has reviewed it yet."""
    if record.reviewed is None:
        return None
    if record.reviewed.due is not None:
        return record.reviewed.due
    months = record.reviewed.date.month - 1 + settings.review_interval_months
    year, month = record.reviewed.date.year + months // 12, months % 12 + 1
    return dt.date(year, month, min(record.reviewed.date.day, 28))


def _review(record: Record, settings: Settings) -> str:
    due = next_review(record, settings)
    if record.reviewed is None or due is None:
        return "not yet reviewed"
    by = _person(record.reviewed.by, settings)
    return f"reviewed {record.reviewed.date.isoformat()} by {by}, due again {due.isoformat()}"


def _is_overdue(record: Record, settings: Settings, today: dt.date) -> bool:
    due = next_review(record, settings)
    return due is not None and due < today


def _backward(record: Record) -> list[tuple[str, str]]:
    """Return the entries a record names, and what the record is to each of them."""
    return [(entry_id, _INWARD[path[0]]) for path, entry_id in record.references]


_INWARD: Mapping[str | int, str] = {"preceded_by": "leads to", "related": "related", "superseded": "takes the place of"}
_OUTWARD: Mapping[str | int, str] = {"preceded_by": "made from the product of", "related": "related"}


def _links(record: Record, around: Surroundings) -> tuple[Link, ...]:
    """Return the links to other entries, each once: those the record names, then those that name it."""
    named = [(entry_id, _OUTWARD[path[0]]) for path, entry_id in record.references if path[0] in _OUTWARD]
    forward = [_link(entry_id, relation, around) for entry_id, relation in named]
    return tuple(dict.fromkeys([*forward, *around.links.get(record.entry, ())]))


def _link(entry_id: str, relation: str, around: Surroundings) -> Link:
    return Link(entry_id, around.titles.get(entry_id, ""), relation)


def _tombstone(record: Record, around: Surroundings) -> Tombstone | None:
    if record.status is Status.WITHDRAWN and record.withdrawn:
        gone = record.withdrawn
        return Tombstone("Withdrawn", gone.date.isoformat(), gone.because, _person(gone.by, around.settings), None)
    if record.status is Status.SUPERSEDED and record.superseded:
        old = record.superseded
        return Tombstone("Superseded", old.date.isoformat(), old.because, "", _link(old.by, "successor", around))
    return None


def _citation(entry: Entry, settings: Settings) -> str:
    record = entry.record
    return joined(
        (
            f"{settings.group or settings.title}",
            f"“{record.title}”",
            settings.title if settings.group else "",
            f"entry {entry.id}",
            f"revision {record.revision}",
            f"digest {entry.digest[:DIGEST_SHOWN]}",
            record.latest_date.isoformat(),
            f"{settings.site_address}e/{entry.id}/" if settings.site_address else "",
        )
    )
