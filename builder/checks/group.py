"""The record against the rest of the book."""

from collections import defaultdict
from collections.abc import Callable, Hashable, Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.finding import Level
from builder.records.yaml_text import Places
from builder.rule import Fault, Path, rule

__all__ = ["GROUP_CHECKS", "Gathering", "Member"]


@dataclass(frozen=True, slots=True)
class Member:
    """One record of the book, with the places of its values."""

    case: Case
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
        if member.case.record.entry in member.case.settings.retired:
            yield (
                member,
                Fault(
                    at=("entry",), message=f"{member.case.record.entry} is retired", mend="take one from `handbook new`"
                ),
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
    yield from _repeated(book, lambda case: case.record.entry, ("entry",), "the identifier stands in {0} too", mend)


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
    yield from _repeated(book, lambda case: case.record.notebook, ("notebook",), "this page stands in {0} too", mend)


@rule(
    id="reference-unknown",
    title="A reference to an entry that does not exist",
    source="record-format",
    fires_on=("related: [NS7K3QFMC]",),
    silent_on=("related: [NS7K3QFMC]\n---\n" + _SECOND,),
)
def reference_is_unknown(book: Gathering) -> Found:
    """What a record refers to is in the book.

    A link to nowhere is noticed by the reader of a report in two years, not by its writer.
    """
    known = {member.case.record.entry for member in book.members} | book.unread
    for member in book.members:
        for path, reference in _references(member.case):
            if reference not in known:
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
    yield from _repeated(book, lambda case: case.record.title.casefold(), ("title",), "{0} has this title too", mend)


GROUP_CHECKS = (
    entry_is_retired,
    entry_stands_twice,
    notebook_page_stands_twice,
    reference_is_unknown,
    title_stands_twice,
)


def _repeated(book: Gathering, key: Callable[[Case], Hashable], at: Path, message: str, mend: str) -> Found:
    """Yield a fault on every member whose key another member shares; message gets the other's file."""
    sharing: defaultdict[Hashable, list[Member]] = defaultdict(list)
    for member in book.members:
        if key(member.case) is not None:
            sharing[key(member.case)].append(member)
    for group in sharing.values():
        for member in group:
            others = [other.case.file for other in group if other is not member]
            if others:
                yield member, Fault(at=at, message=message.format(others[0]), mend=mend)


def _references(case: Case) -> Iterator[tuple[Path, str]]:
    record = case.record
    for key, ids in (("related", record.related), ("preceded_by", record.preceded_by)):
        yield from (((key, index), reference) for index, reference in enumerate(ids or ()))
    if record.superseded is not None:
        yield ("superseded", "by"), record.superseded.by
