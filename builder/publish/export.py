"""`handbook export`: the records of a book as one table, in CSV or JSON Lines, from which they can be imported again.

Every value is as it was typed. Comments of the YAML files are not in it, and neither are frozen revisions.
"""

import csv
import io
import json
from collections.abc import Collection, Iterable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path

from builder.records.digest import digest
from builder.records.flat import column_order, flatten, guarded, in_one_cell, name_of
from builder.records.model import Record
from builder.records.reader import read_record
from builder.records.vocabulary import Disclosure, Status
from builder.records.yaml_text import read_plain
from builder.rule import Path as ValuePath

__all__ = [
    "BYTE_ORDER_MARK",
    "CLEARED_FOR",
    "Exported",
    "Outgoing",
    "csv_text",
    "exported_records",
    "jsonl_text",
    "within",
]

BYTE_ORDER_MARK = "\ufeff"
"""Begins a CSV file, for by it spreadsheet programs know UTF-8."""

CLEARED_FOR: Mapping[str, frozenset[Disclosure]] = {
    "cleared": frozenset({Disclosure.CLEARED, Disclosure.PUBLISHED}),
    "published": frozenset({Disclosure.PUBLISHED}),
}
"""What `--only` lets out; a record without disclosure is internal."""


@dataclass(frozen=True, slots=True)
class Exported:
    """One record: its flat cells as typed, in the order of the format, and the digest of its scientific content."""

    record: Record
    digest: str
    cells: Mapping[str, str]


def exported_records(folder: Path, files: Iterable[Path]) -> Iterator[Exported | str]:
    """Yield the records of a book in order of identifier; of a file that cannot be read, its path below the folder."""
    for path in sorted(files, key=lambda path: path.name):
        reading = read_record(path, path.name)
        if reading.record is None:
            yield path.relative_to(folder).as_posix()
        else:
            yield Exported(reading.record, digest(reading.record), flatten(read_plain(reading.text, path.name).value))


@dataclass(frozen=True, slots=True)
class Outgoing:
    """The records that go out.

    left_out: by entry that could go out but cannot do without naming one that may not, the column in which it does.
    """

    records: tuple[Exported, ...]
    left_out: Mapping[str, str] = field(default_factory=dict)


def within(records: Iterable[Exported], only: str | None, statuses: Collection[Status]) -> Outgoing:
    """Return the records that may go out: by what is cleared, and by status; None and no status let all of them out.

    Where some are kept back for their disclosure, the others no longer name them. A list of entries is left with those
    that are exported. Where one entry is named that is not cleared, as in superseded.by, the record would not be read
    without the name: it is left out.
    """
    cleared = [each for each in records if only is None or each.record.disclosure in CLEARED_FOR[only]]
    chosen = [each for each in cleared if not statuses or each.record.status in statuses]
    if only is None:
        return Outgoing(tuple(chosen))
    may_be_named = {each.record.entry for each in cleared}
    left_out = {
        each.record.entry: name_of(path)
        for each in chosen
        for path, entry in each.record.references
        if not _is_listed(path) and entry not in may_be_named
    }
    kept = [each for each in chosen if each.record.entry not in left_out]
    known = {each.record.entry for each in kept}
    return Outgoing(tuple(replace(each, cells=_cells_naming(each, known)) for each in kept), left_out)


def _is_listed(path: ValuePath) -> bool:
    """Say whether an entry is one of several that are named together, so that the record can do without."""
    return isinstance(path[-1], int)


def _cells_naming(exported: Exported, known: Collection[str]) -> dict[str, str]:
    """Return the cells of a record whose lists of entries name known ones only."""
    lists: dict[str, list[str]] = {}
    for path, entry in exported.record.references:
        if _is_listed(path):
            lists.setdefault(name_of(path[:-1]), []).extend([entry] if entry in known else [])
    cells = {**exported.cells, **{name: in_one_cell(entries) for name, entries in lists.items()}}
    return {name: text for name, text in cells.items() if text}


def csv_text(records: Iterable[Exported]) -> str:
    """Return RFC 4180 text: a row for each record, a column for each name that any of them has.

    A cell that a spreadsheet program would run as a formula begins with an apostrophe (`records.flat.guarded`).
    """
    rows = [each.cells for each in records]
    names = sorted({name for cells in rows for name in cells}, key=column_order)
    table = io.StringIO()
    writer = csv.writer(table, lineterminator="\r\n")
    writer.writerow(names)
    writer.writerows([guarded(cells.get(name, "")) for name in names] for cells in rows)
    return table.getvalue()


def jsonl_text(records: Iterable[Exported]) -> str:
    """Return one JSON object a line: entry, digest, and the other cells by column name, all as text."""
    return "".join(
        json.dumps({"entry": each.record.entry, "digest": each.digest, **each.cells}, ensure_ascii=False) + "\n"
        for each in records
    )
