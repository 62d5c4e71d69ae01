"""`handbook import`: rows of a sheet -> records, one a row, again and again without duplicates.

What a row says is laid out as the plain values of a record and read by the very reader of record files, so that a cell
is refused for the reasons, and in the words, in which a record would be. Which entry a row makes follows from the key
of the row alone; what became of that entry since is told by a mark that the record itself carries.
"""

import hashlib
import re
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from pathlib import Path

from builder.authoring.column_map import IGNORED, ColumnMap, Target, likely_column, target_of, tidy
from builder.authoring.import_row import (
    CellFinding,
    Desk,
    RowContent,
    RowReading,
    at_cell,
    own_finding,
    read_row,
    row_finding,
)
from builder.authoring.schema import schema_seen_from
from builder.authoring.sheet import Row, Sheet, SheetError, bytes_of, read_csv, read_jsonl
from builder.authoring.whole_file import write_all
from builder.authoring.workbook import read_workbook
from builder.book import record_files
from builder.finding import Level
from builder.records.digest import digest
from builder.records.flat import column_order, flatten, name_of
from builder.records.model import Record
from builder.records.reader import read_bytes, read_record
from builder.records.schema import modeline
from builder.records.settings import Settings
from builder.records.vocabulary import Status
from builder.records.yaml_text import Places, read_plain
from builder.records.yaml_writing import record_yaml

__all__ = [
    "Difference",
    "Import",
    "NoKeyError",
    "RowResult",
    "State",
    "open_sheet",
    "plan_import",
    "write_import",
]

_MARK = re.compile(r"^# imported from .*; content ([0-9a-f]{16})$", re.MULTILINE)


class NoKeyError(Exception):
    """Nothing in the map or the sheet tells which entry a row makes."""


class State(StrEnum):
    """What becomes of a row."""

    NEW = "new"
    UNCHANGED = "unchanged"
    UPDATED = "updated"
    DIFFERS = "differs"
    REFUSED = "refused"


@dataclass(frozen=True, slots=True)
class Difference:
    """One column in which a row and its entry differ; None where one of them has nothing there."""

    name: str
    where: str
    sheet: str | None
    book: str | None


@dataclass(frozen=True, slots=True)
class RowResult:
    """What becomes of one row: its entry and file, where it has one, and the text to write for a new or changed one."""

    row: int
    state: State
    entry: str | None = None
    path: Path | None = None
    text: str = ""
    differences: tuple[Difference, ...] = ()
    is_edited: bool = False


@dataclass(frozen=True, slots=True)
class Import:
    """A whole sheet as it would be imported. findings: in the order of the sheet, those of the map first."""

    sheet: Sheet
    results: tuple[RowResult, ...]
    findings: tuple[CellFinding, ...]

    @property
    def blocks_all(self) -> bool:
        """Say whether something is wrong with the map or the headings, which every row rests on."""
        return any(each.row <= self.sheet.heading_row for each in self.findings)

    def of(self, state: State) -> tuple[RowResult, ...]:
        """Return the rows that are in a state."""
        return tuple(result for result in self.results if result.state is state)


def open_sheet(path: Path, *, sheet: str | None, heading_row: int | None) -> Sheet:
    """Read a sheet by the ending of its name.

    sheet: of a workbook. heading_row: where the headings stand; the first row that holds something if None.
    Raises SheetError for a file that cannot be read as one, OSError for one that cannot be opened.
    """
    ending = path.suffix.lower()
    if sheet is not None and not ending.startswith(".xls"):
        raise SheetError(f"{path.name} has no sheets to choose from: --sheet goes with .xlsx")
    match ending:
        case ".xlsx" | ".xlsm":
            return read_workbook(bytes_of(path), path.name, sheet=sheet, heading_row=heading_row)
        case ".csv" | ".tsv" | ".txt":
            return read_csv(bytes_of(path), path.name, heading_row)
        case ".jsonl":
            return read_jsonl(bytes_of(path), path.name)
    raise SheetError(f"{path.name} is no sheet that can be read: save it as .xlsx, or as CSV UTF-8")


# --- the sheet as a whole ---------------------------------------------------------------------------------------


def plan_import(
    sheet: Sheet,
    column_map: ColumnMap,
    map_places: Places,
    *,
    book: Path,
    settings: Settings | None,
    into: Path,
    may_update: bool = False,
    advance: Callable[[int], None] = lambda _: None,
) -> Import:
    """Read every row and say what would become of it; nothing is written.

    book: its folder, absolute. into: where new records go, the book or a folder inside it.
    may_update: a draft that nobody has edited since its import follows the sheet.
    advance: told of each row done. Raises NoKeyError where nothing tells which entry a row makes.
    """
    targets, findings = _targets(sheet, column_map)
    key, key_findings = _key(sheet, column_map, targets)
    desk = Desk(
        sheet=sheet,
        column_map=column_map,
        map_places=map_places,
        targets=targets,
        key=key,
        files={path.stem: path for path in record_files(book)[0]},
        retired=frozenset(settings.retired if settings else ()),
        into=into,
        book=book,
        may_update=may_update,
    )
    readings: list[tuple[Row, RowReading]] = []
    for row in sheet.rows:
        readings.append((row, read_row(desk, row)))
        advance(1)
    numbers: dict[str, list[int]] = {}
    for row, reading in readings:
        if reading.entry is not None:
            numbers.setdefault(reading.entry, []).append(row.number)
    results = []
    findings += key_findings
    for row, reading in readings:
        result, found = _result(desk, row, reading, numbers.get(reading.entry or "", []))
        results.append(result)
        findings += found
    return Import(sheet, tuple(results), tuple(_gathered(desk, findings)))


def _result(
    desk: Desk, row: Row, reading: RowReading, rows_of_entry: Sequence[int]
) -> tuple[RowResult, list[CellFinding]]:
    """Return what becomes of a row. Of rows that make the same entry all are refused: none is the right one."""
    findings = list(reading.findings)
    if len(rows_of_entry) > 1:
        message = f"rows {', '.join(map(str, rows_of_entry))} make the same entry, {reading.entry}"
        mend = "keep one of the rows, or name more headings as key, so that they differ"
        findings.append(row_finding(desk, row, "row-repeated", message, mend))
    if reading.record is None or findings:
        return RowResult(row.number, State.REFUSED, reading.entry), findings
    return _settle(desk, row, reading, reading.record, findings), findings


def _targets(sheet: Sheet, column_map: ColumnMap) -> tuple[dict[int, Target], list[CellFinding]]:
    """Return where each column goes, and a finding for each heading that leads nowhere."""
    targets: dict[int, Target] = {}
    findings = []
    for column, typed in enumerate(sheet.headings):
        heading = tidy(typed)
        is_used = any(column in row.cells for row in sheet.rows)
        if not heading:
            if is_used:
                message, mend = "this column has cells and no heading", "give it one, or empty it"
                findings.append(_heading_finding(sheet, column, message, mend))
            continue
        target = IGNORED if heading == "digest" else target_of(heading, column_map)
        if isinstance(target, Target):
            targets[column] = target
        elif target is None:
            near = likely_column(heading)
            mend = f"map it to {near or 'a column'}, or to {IGNORED}" + (
                "" if near else "; --write-map makes a first map"
            )
            findings.append(_heading_finding(sheet, column, "no column of a record is called so", mend))
    headings = set(map(tidy, sheet.headings))
    missing = [heading for heading in column_map.columns if tidy(heading) not in headings]
    if missing:
        message = f"the map speaks of {', '.join(missing)}, and no column is headed so"
        findings.append(_heading_finding(sheet, None, message, "correct the heading, or drop it from the map"))
    return targets, findings


def _heading_finding(sheet: Sheet, column: int | None, message: str, mend: str) -> CellFinding:
    heading = "" if column is None else tidy(sheet.headings[column])
    finding = own_finding("heading-unknown", message, mend)
    return CellFinding(sheet.place(sheet.heading_row, column), sheet.heading_row, column, heading, heading, finding)


def _key(
    sheet: Sheet, column_map: ColumnMap, targets: Mapping[int, Target]
) -> tuple[tuple[int, ...], list[CellFinding]]:
    """Return the columns that tell rows apart: those the map names, else that of the notebook."""
    headings = [tidy(heading) for heading in sheet.headings]
    findings = []
    key = []
    for wanted in column_map.key or ():
        column = headings.index(tidy(wanted)) if tidy(wanted) in headings else None
        if column is None or column not in targets:
            message = f'the key "{wanted}" is no column that goes into the record'
            findings.append(_heading_finding(sheet, column, message, "name a heading that is mapped, notebook best"))
        else:
            key.append(column)
    if not column_map.key:
        key = [column for column, target in targets.items() if target.name == "notebook"][:1]
    names = {target.name for target in targets.values()}
    if not key and not findings and "entry" not in names:
        raise NoKeyError(
            "nothing tells the rows apart: map a column to notebook, or name the headings that do as key: in the map"
            " (--write-map FILE makes a first map)"
        )
    return tuple(key), findings


# --- a row and the entry it made before -----------------------------------------------------------------------------


def _settle(desk: Desk, row: Row, reading: RowReading, record: Record, findings: list[CellFinding]) -> RowResult:
    """Return what becomes of a sound row: new, or held against the entry that is there."""
    content, unflattened = reading.content, reading.unflattened
    assert isinstance(unflattened.value, dict)  # noqa: S101 - a row has columns
    wanted = flatten(unflattened.value)
    path = desk.files.get(record.entry)
    text = _file_text(desk, row, reading, path.parent if path is not None else desk.into)
    written = read_bytes(text.encode(), record.entry)
    if errors := [finding for finding in written.findings if finding.level is Level.ERROR]:
        findings.append(at_cell(desk, row, None, errors[0]))  # such as a record that is too long for a file
        return RowResult(row.number, State.REFUSED, record.entry)
    if written.record != record:
        raise AssertionError(f"what row {row.number} writes is not what it says")
    if path is None and (desk.into / f"{record.entry}.yml").exists():
        message = f"{record.entry}.yml is there, and is no record of the book"
        findings.append(row_finding(desk, row, "row-identity-taken", message, "move it away"))
        return RowResult(row.number, State.REFUSED, record.entry)
    if path is None:
        return RowResult(row.number, State.NEW, record.entry, desk.into / f"{record.entry}.yml", text)
    held = read_record(path, path.name)
    plain = read_plain(held.text, path.name).value
    has = flatten(plain) if isinstance(plain, dict) else {}
    typed = {name_of(at): name for at, name in unflattened.columns.items() if name in content.column_of}
    if other := _other_key(desk, content, has):
        message = f"{record.entry} is there, and is another experiment: its {other}"
        mend = "correct the key of the row, or give the row an entry of its own"
        findings.append(row_finding(desk, row, "row-identity-taken", message, mend))
        return RowResult(row.number, State.REFUSED, record.entry)
    mark = _MARK.search(held.text)
    is_edited = mark is None or mark[1] != _content_mark(held.text[mark.end() + 1 :])
    names = typed if is_edited else {**dict.fromkeys(has), **dict.fromkeys(wanted)}
    differences = tuple(
        Difference(name, _where(desk, row, content, typed.get(name)), wanted.get(name), has.get(name))
        for name in sorted(names, key=column_order)
        if wanted.get(name) != has.get(name)
    )
    result = RowResult(row.number, State.UNCHANGED, record.entry, path, differences=differences, is_edited=is_edited)
    if not differences:
        return result
    keeps_revision = held.record is not None and (
        held.record.status is Status.DRAFT or digest(held.record) == digest(record)
    )
    if desk.may_update and not is_edited and keeps_revision:
        return replace(result, state=State.UPDATED, text=text)
    return replace(result, state=State.DIFFERS)


def _where(desk: Desk, row: Row, content: RowContent, name: str | None) -> str:
    return desk.sheet.place(row.number, content.column_of.get(name or ""))


def _other_key(desk: Desk, content: RowContent, has: Mapping[str, str]) -> str:
    """Return in what the key of an entry differs from that of a row; "" where it does not."""
    for column in desk.key:
        name = desk.targets[column].name
        if "entry" not in content.column_of and content.cells.get(name) != has.get(name):
            return f'{name} is "{has.get(name, "")}", not "{content.cells.get(name, "")}"'
    return ""


def _file_text(desk: Desk, row: Row, reading: RowReading, folder: Path) -> str:
    """Return the file that a row makes in a folder."""
    content, unflattened = reading.content, reading.unflattened
    assert isinstance(unflattened.value, dict)  # noqa: S101 - a row has columns
    source = "".join(c if c.isprintable() else " " for c in tidy(desk.sheet.shown_as))
    paths = {name: at for at, name in unflattened.columns.items()}
    remarks = {paths[name]: "perceived from the SMILES" for name in content.perceived if name in paths}
    body = record_yaml(unflattened.value, remarks=remarks)
    return (
        f"{modeline(schema_seen_from(folder, desk.book))}\n"
        f"# imported from {source}, row {row.number}; content {_content_mark(body)}\n{body}"
    )


def _content_mark(body: str) -> str:
    """Return sixteen hexadecimal digits by which a record tells whether anything in it was edited, comments too."""
    return hashlib.sha256(body.encode()).hexdigest()[:16]


def write_import(planned: Import, *, sound_rows: bool) -> tuple[RowResult, ...]:
    """Write what is new or updated: all of it, or nothing. Return the rows that were written.

    sound_rows: write these although other rows are refused. Nothing is written where map or headings are at fault.
    """
    if planned.blocks_all or (planned.findings and not sound_rows):
        return ()
    written = (*planned.of(State.NEW), *planned.of(State.UPDATED))
    write_all({result.path: result.text for result in written if result.path is not None})
    return written


def _gathered(desk: Desk, findings: Sequence[CellFinding]) -> Iterator[CellFinding]:
    """Yield findings in the order of the sheet; what is said of a constant, or of every row alike, once."""
    missing = (each for each in findings if each.finding.rule == "key-missing" and each.column is None)
    alike = Counter((each.finding.rule, each.finding.message) for each in missing)
    everywhere = {said for said, times in alike.items() if times == len(desk.sheet.rows) > 1}
    told = set()
    for each in sorted(findings, key=lambda each: (each.row, -1 if each.column is None else each.column)):
        said = (each.finding.rule, each.finding.message)
        is_everywhere = each.row > 0 and each.column is None and said in everywhere
        shown = replace(each, where=f"{desk.sheet.shown_as}: every row") if is_everywhere else each
        if is_everywhere or each.row == 0:
            if (shown.where, *said) in told:
                continue
            told.add((shown.where, *said))
        yield shown
