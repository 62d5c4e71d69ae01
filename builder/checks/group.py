"""The record against the rest of the book."""

from collections import defaultdict
from collections.abc import Callable, Hashable, Iterator
from dataclasses import dataclass

from builder.finding import Level
from builder.records.model import Record
from builder.records.settings import Settings
from builder.records.yaml_text import Places
from builder.rule import Fault, Path, rule

__all__ = ["GROUP_CHECKS", "Gathering", "Member"]


@dataclass(frozen=True, slots=True)
class Member:
    """One record of the book, with its file as findings show it and the places of its values."""

    file: str
    record: Record
    settings: Settings
    places: Places


@dataclass(frozen=True, slots=True)
class Gathering:
    """All records of a book. unread: names of the files of which no record could be made."""

    members: tuple[Member, ...]
    unread: frozenset[str] = frozenset()


Found = Iterator[tuple[Member, Fault]]

_SECOND = "# file: other/NS7K3QFMC.yml\nentry: NS7K3QFMC\ntitle: Another displacement\nnotebook: BK2/113"


@rule(
    id="entry-retired",
    title="A retired identifier came back",
    source="record-format",
    fires_on=("# retired: NS4T9XQ2N",),
    silent_on=("# retired: NS7K3QFMC",),
)
def entry_is_retired(book: Gathering) -> Found:
    """A retired identifier never names another entry.

    Reports cite it; the citation must not lead to a different experiment.
    """
    for member in book.members:
        if member.record.entry in member.settings.retired:
            yield (
                member,
                Fault(at=("entry",), message=f"{member.record.entry} is retired", mend="take one from `handbook new`"),
            )


@rule(
    id="entry-twice",
    title="Two records with one identifier",
    source="record-format",
    fires_on=("---\n# file: other/NS4T9XQ2N.yml\ntitle: Another displacement\nnotebook: BK2/113",),
    silent_on=("---\n" + _SECOND,),
)
def entry_stands_twice(book: Gathering) -> Found:
    """An identifier belongs to one record.

    Two branches can each be right and collide when both are merged; then one of the entries takes a new identifier.
    """
    mend = "give the younger record a new one (`handbook new`)"
    yield from _repeated(book, lambda record: record.entry, ("entry",), "the identifier stands in {0} too", mend)


@rule(
    id="notebook-page-twice",
    title="Two records from one notebook page",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("---\n# file: other/NS7K3QFMC.yml\nentry: NS7K3QFMC\ntitle: Another displacement",),
    silent_on=("---\n" + _SECOND,),
)
def notebook_page_stands_twice(book: Gathering) -> Found:
    """A notebook page belongs to one record.

    The same page in two records is usually one experiment entered twice.
    """
    mend = "merge the two, correct the page, or accept this with the reason"
    yield from _repeated(
        book,
        _notebook_page,
        ("notebook",),
        "this page stands in {0} too",
        mend,
    )


@rule(
    id="person-unknown",
    title="A person code that the book does not know",
    level=Level.REMARK,
    source="record-format",
    fires_on=("# people: bench-1 bench-2 bench-3\nreviewed: {by: bench-9, date: 2026-03-20}",),
    silent_on=("# people: bench-1 bench-2 safety-1",),
)
def person_is_unknown(book: Gathering) -> Found:
    """Where the settings list the people of a group, every code in a record is among them.

    Asked only of books that list people; a code stands for a person in citations and reviews.
    """
    for member in book.members:
        if any(each.demand == "codes_listed" for _, each in member.settings.checked_rules):
            continue  # the house rule says it, with its own reason
        known = {person.code for person in member.settings.people}
        for path, code in person_codes(member.record) if known else ():
            if code not in known:
                fault = Fault(at=path, message=f"{code} is not among the people of this book", mend=_add_person(code))
                yield member, fault


def person_codes(record: Record) -> Iterator[tuple[Path, str]]:
    """Yield every code of a person in a record, with its path."""
    yield from ((("performed", "by", index), code) for index, code in enumerate(record.performed.by))
    stamps = {"reviewed": record.reviewed, "safety_review": record.safety_review, "withdrawn": record.withdrawn}
    yield from (((key, "by"), stamp.by) for key, stamp in stamps.items() if stamp is not None)
    yield from ((("accepted", index, "by"), each.by) for index, each in enumerate(record.accepted))


def _add_person(code: str) -> str:
    return f"correct it, or add it to people: in handbook.yml with code: {code}"


@rule(
    id="reference-unknown",
    title="A reference that leads nowhere",
    source="record-format",
    fires_on=("related: [NS7K3QFMC]", "related: [NS4T9XQ2N]"),
    silent_on=("related: [NS7K3QFMC]\n---\n" + _SECOND,),
)
def reference_is_unknown(book: Gathering) -> Found:
    """What a record refers to is another entry of the book.

    A link to nowhere is noticed by the reader of a report in two years, not by its writer.
    """
    known = {member.record.entry for member in book.members} | book.unread
    for member in book.members:
        for path, reference in member.record.references:
            if reference == member.record.entry:
                yield member, Fault(at=path, message=f"{reference} refers to itself", mend="name the other entry")
            elif reference not in known:
                yield member, Fault(at=path, message=f"{reference} is not in the book", mend="correct it, or drop it")


@rule(
    id="title-twice",
    title="Two records with one title",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("---\n# file: other/NS7K3QFMC.yml\nentry: NS7K3QFMC\nnotebook: BK2/113",),
    silent_on=("---\n" + _SECOND,),
)
def title_stands_twice(book: Gathering) -> Found:
    """Each entry has a title of its own.

    In a list two equal lines cannot be told apart: the difference between the runs belongs into the title.
    """
    mend = "say in the title what is different"
    yield from _repeated(
        book,
        _title,
        ("title",),
        "{0} has this title too",
        mend,
    )


GROUP_CHECKS = (
    entry_is_retired,
    entry_stands_twice,
    notebook_page_stands_twice,
    person_is_unknown,
    reference_is_unknown,
    title_stands_twice,
)


def _notebook_page(record: Record) -> str | None:
    return record.notebook if _is_in_force(record) else None


def _title(record: Record) -> str | None:
    return record.title.casefold() if _is_in_force(record) else None


def _is_in_force(record: Record) -> bool:
    """Say whether an entry still holds: its successor may well bear its title and speak of its notebook page."""
    return not record.status.is_retired


def _repeated(book: Gathering, key: Callable[[Record], Hashable], at: Path, message: str, mend: str) -> Found:
    """Yield a fault on every member whose key another member shares; message gets the other's file."""
    sharing: defaultdict[Hashable, list[Member]] = defaultdict(list)
    for member in book.members:
        if key(member.record) is not None:
            sharing[key(member.record)].append(member)
    for group in sharing.values():
        for member in group:
            others = [other.file for other in group if other is not member]
            if others:
                yield member, Fault(at=at, message=message.format(others[0]), mend=mend)
