"""`handbook export`: the records of a book as one table, in CSV or JSON Lines, from which they can be imported again.

Every value is as it was typed. Comments of the YAML files are not in it, and neither are frozen revisions.
"""

import csv
import io
import json
from collections.abc import Collection, Iterable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

from builder.records.digest import digest
from builder.records.flat import column_order, flatten, guarded
from builder.records.model import Record
from builder.records.reader import read_record
from builder.records.vocabulary import Disclosure, Status
from builder.records.yaml_text import read_plain

__all__ = ["BYTE_ORDER_MARK", "CLEARED_FOR", "Exported", "csv_text", "exported_records", "jsonl_text", "within"]

BYTE_ORDER_MARK = "\ufeff"
"""Begins a CSV file, for by it spreadsheet programs know UTF-8."""

CLEARED_FOR: Mapping[str, frozenset[Disclosure]] = {
    "cleared": frozenset({Disclosure.CLEARED, Disclosure.PUBLISHED}),
    "published": frozenset({Disclosure.PUBLISHED}),
}
"""What `--only` lets out; a record without disclosure is internal."""
_REFERENCES = ("related", "preceded_by")


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


def within(records: Iterable[Exported], only: str | None, statuses: Collection[Status]) -> tuple[Exported, ...]:
    """Return the records that may go out: by what is cleared, and by status; None and no status let all of them out.

    Where some are kept back for their disclosure, the others no longer name them as related or preceding.
    """
    all_of_them = tuple(records)
    kept = [
        each
        for each in all_of_them
        if (only is None or each.record.disclosure in CLEARED_FOR[only])
        and (not statuses or each.record.status in statuses)
    ]
    if only is None:
        return tuple(kept)
    known = {each.record.entry for each in kept}
    return tuple(Exported(each.record, each.digest, dict(_without_references(each, known))) for each in kept)


def _without_references(exported: Exported, known: Collection[str]) -> Iterator[tuple[str, str]]:
    for name, text in exported.cells.items():
        if name in _REFERENCES:
            text = "; ".join(entry for entry in text.split("; ") if entry in known)  # noqa: PLW2901 - the same cell
        if text:
            yield name, text


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
