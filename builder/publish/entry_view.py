"""EntryView: everything an entry's page shows: its portrait, what the checks say, and what the rest of the book adds.

Plain text and numbers, not escaped; the templates escape.
"""

import datetime as dt
from calendar import monthrange
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial
from urllib.parse import quote

from builder.book import Book, Entry, Verdict
from builder.checks.hazards.cautions import Severity
from builder.finding import Finding, Level
from builder.publish.charges import AmountView, StageView, amounts_as_tsv
from builder.publish.expected import ExpectedView
from builder.publish.figures import capital, joined
from builder.publish.kindred import (
    CONTRADICTION_RULE,
    ContradictionView,
    Relatives,
    Series,
    relatives_of,
    view_kindred,
)
from builder.publish.measured import MeasuredLine, rate_constant_text
from builder.publish.neighbours import SequenceView, Variant, same_product, sequences, variant_of, view_sequence
from builder.publish.portrait import CompoundView, Portrait
from builder.publish.safety import SafetyView
from builder.publish.schemes import Scheme
from builder.publish.summary import Fact, Summary, newest_first
from builder.records.model import EvidenceFile, Record
from builder.records.settings import Settings
from builder.records.vocabulary import Status
from builder.rule import Rule
from builder.sources import source_text

__all__ = ["EntryView", "Link", "Surroundings", "edit_path", "next_review", "surroundings_of", "view_entry"]

DIGEST_SHOWN = 12
"""Hexadecimal digits of a digest that citations and printed pages carry."""

MOST_VARIANTS = 7
"""Other ways to the same product that a page lists."""

_HAZARD = "hazard-"
"""Rules whose reason is the same for every hazard: what is told of one stands in its message and in what to do."""
_STANDING = {
    Verdict.IN_LINE: "Product, course, mechanism and yields lie within what the engine can defend; a time longer than"
    " forecast is not held against an entry.",
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
    summaries: of every entry by identifier. rules: title by id, of those that have a page.
    links: to the entries that name this one, by its identifier.
    sequences: those an entry is a step of. variants: every entry as a row; others: identifiers of those that were after
    the same product from another substrate, newest first. relatives: from which the kin of an entry is told.
    """

    folder: str
    settings: Settings
    today: dt.date
    summaries: Mapping[str, Summary]
    rules: Mapping[str, str]
    links: Mapping[str, tuple[Link, ...]]
    sequences: Mapping[str, tuple[SequenceView, ...]]
    variants: Mapping[str, Variant]
    others: Mapping[str, tuple[str, ...]]
    relatives: Relatives


@dataclass(frozen=True, slots=True)
class ProductView:
    """One product with the measurements that speak of it alone; qualities: use, stereochemistry, course."""

    label: str
    name: str
    qualities: str
    measured: tuple[MeasuredLine, ...]


@dataclass(frozen=True, slots=True)
class FindingView:
    """One finding; rule_page says whether the book has a page for its rule, is_grave that it is never folded away."""

    level: str
    rule: str
    title: str
    rule_page: bool
    is_grave: bool
    message: str
    why: str
    mend: str
    source: str
    accepted: str
    accepted_by: str


@dataclass(frozen=True, slots=True)
class HouseRuleView:
    """A house rule that an entry does not keep; accepted and accepted_by are empty where nobody has answered it."""

    statement: str
    because: str
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
    safety: SafetyView
    scheme: Scheme | None
    strip: tuple[Fact, ...]
    claim: tuple[Fact, ...]
    standing: str
    house_rules: tuple[HouseRuleView, ...]
    expected: ExpectedView | None
    nothing_expected: str
    results: str
    failure: tuple[Fact, ...]
    sought: str
    products: tuple[ProductView, ...]
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
    contradictions: tuple[ContradictionView, ...]
    contradiction_rule: str
    series: tuple[Series, ...]
    links: tuple[Link, ...]
    sequences: tuple[SequenceView, ...]
    variants: tuple[Variant, ...]
    further_variants: int
    amounts_table: str
    file: str
    edit_address: str
    address: str
    citation: str
    printed: str


def surroundings_of(
    book: Book[Portrait], summaries: Mapping[str, Summary], rules: Iterable[Rule[object, object]]
) -> Surroundings:
    """Return what every entry's page needs to know of the book."""
    relatives = relatives_of(book)
    links: dict[str, list[Link]] = {}
    for entry in book.entries:
        for other, relation in _backward(entry.record):
            links.setdefault(other, []).append(Link(entry.id, entry.record.title, relation))
    return Surroundings(
        folder=book.folder.name,
        settings=book.settings,
        today=book.today,
        summaries=summaries,
        rules={rule.id: rule.title for rule in rules},
        links={other: tuple(found) for other, found in links.items()},
        sequences=_sequences(book.entries, summaries),
        variants={entry.id: variant_of(entry, summaries[entry.id]) for entry in book.entries},
        others={
            entry_id: tuple(
                summary.id
                for summary in newest_first(summaries[other.id] for other in others)
                if summary.id not in relatives.families.get(entry_id, ())
            )
            for entry_id, others in same_product(book.entries).items()
        },
        relatives=relatives,
    )


def _sequences(
    entries: Sequence[Entry[Portrait]], summaries: Mapping[str, Summary]
) -> dict[str, tuple[SequenceView, ...]]:
    """Return by identifier the sequences an entry is a step of; each is drawn once."""
    found: dict[str, tuple[SequenceView, ...]] = {}
    for run in sequences(entries):
        view = view_sequence(run, summaries)
        if view is not None:
            for entry in run:
                found[entry.id] = (*found.get(entry.id, ()), view)
    return found


def edit_path(entry: Entry[Portrait], around: Surroundings) -> str:
    """Return where the record of an entry stands below the book's folder."""
    return entry.file.removeprefix(f"{around.folder}/")


def view_entry(entry: Entry[Portrait], around: Surroundings) -> EntryView:
    """Return everything the page of `entry` shows."""
    record, settings, portrait = entry.record, around.settings, entry.kept
    lines = portrait.lines
    own = {product.label: _own_lines(product.label, lines) for product in record.outcome.products}
    shown = {id(line) for product_lines in own.values() for line in product_lines}
    findings = [_finding(finding, record, around) for finding in entry.findings]
    of_level = partial(_of_level, findings)
    others = around.others.get(entry.id, ())
    kindred = view_kindred(entry.id, around.relatives, around.summaries)
    rate, course = record.outcome.rate_constant, record.outcome.time_course
    return EntryView(
        summary=around.summaries[entry.id],
        revision=record.revision,
        tombstone=_tombstone(record, around),
        cautions=tuple(_finding(finding, record, around) for finding in _gravest_first(entry.findings)),
        safety=portrait.safety,
        scheme=portrait.scheme,
        strip=portrait.strip,
        claim=_claim(record),
        standing=_STANDING[entry.verdict],
        house_rules=_house_rules(entry.findings, record, settings),
        expected=portrait.expected,
        nothing_expected=portrait.nothing_expected,
        results=_in_words(record),
        failure=_failure(record),
        sought=record.outcome.sought.name if record.outcome.sought else "",
        products=tuple(
            ProductView(
                label=product.label,
                name=product.name,
                qualities=joined(str(each or "") for each in (product.use, product.stereo, product.course)),
                measured=own[product.label],
            )
            for product in record.outcome.products
        ),
        other_measurements=tuple(line for line in lines if id(line) not in shown),
        rate_constant=rate_constant_text(rate) if rate else "",
        time_course_title=joined((course.follows, f"by {course.by}" if course.by else ""), " ") if course else "",
        time_course=tuple((f"{t} {course.time_unit}", f"{y} % {course.follows}") for t, y in course.points)
        if course
        else (),
        queries=tuple(finding for finding in of_level(Level.QUERY) if not finding.accepted),
        accepted=tuple(finding for finding in findings if finding.accepted and finding.rule != CONTRADICTION_RULE),
        remarks=of_level(Level.REMARK),
        amounts=portrait.amounts,
        amounts_note=portrait.amounts_note,
        stages=portrait.stages,
        work_up=record.work_up or (),
        procedure=record.procedure or "",
        scale_limit=record.scale_limit or "",
        evidence=tuple(_evidence(item) for item in record.evidence),
        compounds=portrait.compounds,
        stamp=_stamp(entry, settings),
        review=_review(record, settings),
        review_overdue=_is_overdue(record, settings, around.today),
        contradictions=kindred.contradictions,
        contradiction_rule=CONTRADICTION_RULE if CONTRADICTION_RULE in around.rules else "",
        series=kindred.series,
        links=_links(record, around, kindred.relations),
        sequences=around.sequences.get(entry.id, ()),
        variants=tuple(around.variants[each] for each in (entry.id, *others[:MOST_VARIANTS])) if others else (),
        further_variants=max(len(others) - MOST_VARIANTS, 0),
        amounts_table=amounts_as_tsv(portrait.amounts),
        file=entry.file,
        edit_address=f"{settings.edit_address}{quote(edit_path(entry, around))}" if settings.edit_address else "",
        address=f"{settings.site_address}e/{entry.id}/" if settings.site_address else "",
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


def _in_words(record: Record) -> str:
    results = joined(map(str, record.outcome.result), " and ")
    return f"{capital(results)}."


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
    return sorted(cautions, key=lambda finding: -_severity(finding).weight)


def _severity(finding: Finding) -> Severity:
    return Severity(str(finding.data.get("severity", Severity.NOTE)))


def _house_rules(findings: Iterable[Finding], record: Record, settings: Settings) -> tuple[HouseRuleView, ...]:
    """Return the house rules that are not kept, each once."""
    found = [
        HouseRuleView(
            statement=str(finding.data["house_rule"]),
            because=str(finding.data["because"]),
            accepted=finding.accepted or "",
            accepted_by=_person(by, settings) if (by := _accepted_by(finding, record)) else "",
        )
        for finding in findings
        if "house_rule" in finding.data
    ]
    return tuple(dict.fromkeys(found))


def _accepted_by(finding: Finding, record: Record) -> str:
    return next((a.by for a in record.accepted if a.finding == finding.rule), "") if finding.accepted else ""


def _finding(finding: Finding, record: Record, around: Surroundings) -> FindingView:
    by = _accepted_by(finding, record)
    return FindingView(
        level=str(finding.level),
        rule=finding.rule,
        title=around.rules.get(finding.rule, finding.rule),
        rule_page=finding.rule in around.rules,
        is_grave=_severity(finding) is not Severity.NOTE,
        message=finding.message,
        why="" if finding.rule.startswith(_HAZARD) else finding.why,
        mend=finding.mend,
        source=source_text(str(finding.data.get("source", finding.source))),
        accepted=finding.accepted or "",
        accepted_by=_person(by, around.settings) if by else "",
    )


# --- identifiers, stamps, links ---------------------------------------------------------------------------


def _evidence(item: str | EvidenceFile) -> Fact:
    return Fact(item.what, item.file, f"SHA-256 {item.sha256}") if isinstance(item, EvidenceFile) else Fact(item, "")


def _person(code: str, settings: Settings) -> str:
    return next((person.shown_as for person in settings.people if person.code == code), code)


def _stamp(entry: Entry[Portrait], settings: Settings) -> tuple[Fact, ...]:
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
    return dt.date(year, month, min(record.reviewed.date.day, monthrange(year, month)[1]))


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


def _links(record: Record, around: Surroundings, relations: Mapping[str, str]) -> tuple[Link, ...]:
    """Return the links to other entries, each once: those the record names, then those that name it.

    relations: what an entry is to this one, by identifier, where that can be told; it says more than "related".
    """
    named = [(entry_id, _OUTWARD[path[0]]) for path, entry_id in record.references if path[0] in _OUTWARD]
    forward = [_link(entry_id, relation, around) for entry_id, relation in named]
    found: dict[str, Link] = {}
    for link in (*forward, *around.links.get(record.entry, ())):
        if link.id not in found or found[link.id].relation == "related":  # anything else says more
            found[link.id] = link
    return tuple(
        replace(link, relation=relations.get(link.id, link.relation)) if link.relation == "related" else link
        for link in found.values()
    )


def _link(entry_id: str, relation: str, around: Surroundings) -> Link:
    known = around.summaries.get(entry_id)
    return Link(entry_id, known.title if known else "", relation)


def _tombstone(record: Record, around: Surroundings) -> Tombstone | None:
    if record.status is Status.WITHDRAWN and record.withdrawn:
        gone = record.withdrawn
        return Tombstone("Withdrawn", gone.date.isoformat(), gone.because, _person(gone.by, around.settings), None)
    if record.status is Status.SUPERSEDED and record.superseded:
        old = record.superseded
        return Tombstone("Superseded", old.date.isoformat(), old.because, "", _link(old.by, "successor", around))
    return None


def _citation(entry: Entry[Portrait], settings: Settings) -> str:
    record = entry.record
    return joined(
        (
            settings.group or settings.title,
            f"“{record.title}”",
            settings.title if settings.group else "",
            f"entry {entry.id}",
            f"revision {record.revision}",
            f"digest {entry.digest[:DIGEST_SHOWN]}",
            record.latest_date.isoformat(),
            f"{settings.site_address}e/{entry.id}/" if settings.site_address else "",
        )
    )
