"""The record against the rest of the book."""

from collections import defaultdict
from collections.abc import Callable, Hashable, Iterator
from dataclasses import dataclass
from functools import cached_property

from builder.checks.kinship import Kin, Relation, near_same_kin
from builder.checks.standing import Standing
from builder.finding import Level
from builder.records.model import EvidenceFile, Record
from builder.records.settings import Settings
from builder.records.yaml_text import Places
from builder.rule import Fault, Path, rule

__all__ = ["GROUP_CHECKS", "Gathering", "Member", "outcomes_contradict"]


@dataclass(frozen=True, slots=True)
class Member:
    """One record of the book: its file as findings show it, the places of its values, and how it stands to others."""

    file: str
    record: Record
    settings: Settings
    places: Places
    standing: Standing


@dataclass(frozen=True)
class Gathering:
    """All records of a book. unread: names of the files of which no record could be made."""

    members: tuple[Member, ...]
    unread: frozenset[str] = frozenset()

    @cached_property
    def in_force(self) -> tuple[Member, ...]:
        """Return the members that still hold."""
        return tuple(member for member in self.members if _is_in_force(member.record))

    @cached_property
    def near_same(self) -> tuple[tuple[Member, Member, Kin], ...]:
        """Return every two members in force of one reaction under near-same conditions, worked out once."""
        standings = [(index, member.standing) for index, member in enumerate(self.in_force)]
        return tuple((self.in_force[one], self.in_force[other], kin) for one, other, kin in near_same_kin(standings))


Found = Iterator[tuple[Member, Fault]]

_SECOND = "# file: other/NS7K3QFMC.yml\nentry: NS7K3QFMC\ntitle: Another displacement\nnotebook: BK2/113"


_ONCE_MORE = """\
---
# file: other/NS7K3QFMC.yml
entry: NS7K3QFMC
title: Another displacement
notebook: BK3/007
performed: {date: 2026-03-18, by: [bench-3]}
"""
_TWO_OF_CARBONATE = """\
base: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', equivalents: 2.0}
"""
_IN_DMSO = """\
solvent: [{name: DMSO, volume: 20 mL}]
stages: [{add: [2-bromobutane, sodium azide, DMSO], temperature: 60 °C, measured: internal, time: 16 h, vessel: open}]
"""
_HALF_OF_IT = """\
outcome:
  result: [substitution, elimination]
  claim: {mechanism: SN2, course: not determined, basis: [product structure]}
  products:
    - {label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired, stereo: racemate}
    - {label: B, name: but-1-ene, smiles: 'CCC=C', use: by-product}
  measured: [{yield: 52 %, of: A, kind: assay, by: 1H NMR}, {yield: 35 %, of: B, kind: assay, by: GC}]
"""
_SPECTRUM = "evidence: [{what: 1H NMR, file: spectra/a.jdx, sha256: " + 64 * "a" + "}]\n"
_OTHER_SPECTRUM = "evidence: [{what: 1H NMR, file: spectra/a.jdx, sha256: " + 64 * "b" + "}]\n"


@rule(
    id="duplicate-entry",
    title="One experiment in two records",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("---\n" + _SECOND,),
    silent_on=(_ONCE_MORE, _ONCE_MORE + _TWO_OF_CARBONATE + _HALF_OF_IT),
)
def entry_is_a_duplicate(book: Gathering) -> Found:
    """The same experiment stands in one record.

    Two records of one reaction under near-same conditions whose outcomes agree are one experiment typed twice where
    they were run on one day, by the same people, on one scale; or where substrate and product weigh the same to the
    last digit, which no two runs do. A run on another day or by somebody else is a repeat: it is worth having, is shown
    beside the first, and may as well be counted there under `runs`. Records that share a notebook page are left to
    notebook-page-twice.
    """
    mend = "keep one of them, correct the date or the masses, or accept this with the reason"
    for one, other, kin in book.near_same:
        shares_page = one.record.notebook == other.record.notebook is not None
        if not shares_page and kin.relation is Relation.DUPLICATES:
            for member, twin in ((one, other), (other, one)):
                message = f"{twin.record.entry} is the same reaction under near-same conditions with the same outcome"
                yield member, Fault(at=("performed", "date"), message=message, mend=mend)


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
    id="evidence-twice",
    title="One evidence file behind two records",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(_SPECTRUM + "---\n" + _SECOND + "\n" + _SPECTRUM,),
    silent_on=(_SPECTRUM + "---\n" + _SECOND + "\n" + _OTHER_SPECTRUM,),
)
def evidence_stands_twice(book: Gathering) -> Found:
    """An evidence file belongs to one experiment.

    Files are told apart by their SHA-256, not by their names. One spectrum behind two records is one experiment entered
    twice, or the wrong file behind one of them; where it shows both, as a calibration does, say so.
    """
    holders: defaultdict[str, dict[str, tuple[Member, Path]]] = defaultdict(dict)
    for member in book.in_force:
        for index, item in enumerate(member.record.evidence):
            if isinstance(item, EvidenceFile):
                holders[item.sha256].setdefault(member.file, (member, ("evidence", index, "sha256")))
    mend = "name the right file, merge the records, or accept this with the reason"
    for sharing in holders.values():
        for member, at in sharing.values():
            others = [other.record.entry for other, _ in sharing.values() if other is not member]
            if others:
                yield member, Fault(at=at, message=f"{' and '.join(others)} names this file too", mend=mend)


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
    id="outcomes-contradict",
    title="Outcomes that contradict each other",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(_ONCE_MORE + _TWO_OF_CARBONATE + _HALF_OF_IT,),
    silent_on=(_ONCE_MORE, _ONCE_MORE + _IN_DMSO + _HALF_OF_IT),
)
def outcomes_contradict(book: Gathering) -> Found:
    """The same reaction under near-same conditions gives the same outcome.

    The reaction is the same where substrate with its kind of stereo, nucleophile (or base), leaving group and desired
    products are. Stages are near-same where the hottest ones are within 10 K (3 K where the colder run stopped below
    95 % conversion), each solvent within 10 points of the volume, the equivalents of what attacks within a factor of
    1.25, the concentration within 2, the time within 3 (1.5 where the shorter run stopped below 95 %). Base, reagents,
    order of addition and all the rest are not asked: they are what may explain it, and the pages of both entries list
    them side by side.

    Outcomes contradict where yields, conversions or shares are more than 10 points apart, or an ee more than 3; where
    both state a spread, where the spreads do not meet (5 points of yield and 1 of ee are always allowed). An isolated
    yield is a lower bound of what was formed, an area share is held against area shares only, and a product that was
    sought and not found counts as none.

    Nothing is rejected and nothing averaged: both observations stand. What is wanted is the reason, in both records.
    """
    mend = "correct the one that is wrong, state in both what differs, or accept this with the reason"
    for one, other, kin in book.near_same:
        if kin.relation is Relation.CONTRADICTS:
            yield one, _contradiction(kin, other.record.entry, mend)
            yield other, _contradiction(kin.mirrored, one.record.entry, mend)


def _contradiction(kin: Kin, other: str, mend: str) -> Fault:
    most, telling = kin.disagreements[0], kin.telling
    reason = f"they differ in {telling.text()}" if telling else "the records state nothing that would explain it"
    message = f"{most.text('here', f'in {other}')}; {reason}"
    return Fault(
        at=most.here.at, message=message, mend=mend, data={"other": other, "points_apart": round(most.apart, 1)}
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
    entry_is_a_duplicate,
    entry_is_retired,
    entry_stands_twice,
    evidence_stands_twice,
    notebook_page_stands_twice,
    outcomes_contradict,
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
