"""`handbook import`: rows of a sheet -> records, one a row, again and again without duplicates.

What a row says is laid out as the plain values of a record and read by the very reader of record files, so that a cell
is refused for the reasons, and in the words, in which a record would be. Which entry a row makes follows from the key
of the row alone; what became of that entry since is told by a mark that the record itself carries.
"""

import hashlib
import json
import os
import re
import unicodedata
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from enum import StrEnum
from pathlib import Path

from builder.authoring.column_map import DEFAULTS, IGNORED, ColumnMap, Target, likely_column, target_of, tidy
from builder.authoring.sheet import Cell, Row, Sheet, SheetError, bytes_of, read_csv, read_jsonl
from builder.authoring.whole_file import write_all
from builder.authoring.workbook import read_workbook
from builder.book import record_files
from builder.checks.structures import structure_is_unreadable
from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import StructureError, parse_inchi, parse_smiles
from builder.finding import Finding, Level, Place
from builder.records.digest import digest
from builder.records.flat import (
    Scalar,
    Unflattened,
    canonical_name,
    column_order,
    flatten,
    name_of,
    shape_at,
    unflatten,
)
from builder.records.identifiers import mint_identifier
from builder.records.model import Record
from builder.records.quantities import comma_error
from builder.records.reader import read_bytes, read_record, read_values
from builder.records.rules import reading_rule
from builder.records.settings import Settings
from builder.records.specimen import GAP
from builder.records.vocabulary import Status
from builder.records.yaml_text import Places, Plainly, read_plain
from builder.records.yaml_writing import record_yaml
from builder.rule import Fault
from builder.rule import Path as ValuePath

__all__ = [
    "CellFinding",
    "Difference",
    "Import",
    "NoKeyError",
    "RowResult",
    "State",
    "open_sheet",
    "plan_import",
    "write_import",
]

_DATES = frozenset({"date", "due"})
_BARE_NUMBER = re.compile(
    r"[<>≤≥]?\s*[-+\u2010-\u2013\u2212]?[\d.,]*\d[\d.,]*(?:[eE][-+]?\d+)?(?:\s*(?:[-\u2010-\u2013\u2212]|to)\s*[-+\u2212]?[\d.,]+)?"
)
_LONGEST_NUMBER = 60
_GAP = re.compile(r"\{([a-z_0-9.]+)\}")
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
class CellFinding:
    """A finding at its cell.

    where: as it is shown, "runs.xlsx!Sheet1:D17". row: 0 for what stands in the map. heading, value: as in the sheet.
    """

    where: str
    row: int
    column: int | None
    heading: str
    value: str
    finding: Finding


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


@dataclass(frozen=True, slots=True)
class _Desk:
    """All that a row is read with.

    targets: by column. map_places: where the map has its constants. files: of the book, by identifier.
    schema: relative path to the JSON Schema from where records go.
    """

    sheet: Sheet
    column_map: ColumnMap
    map_places: Places
    targets: Mapping[int, Target]
    key: tuple[int, ...]
    files: Mapping[str, Path]
    retired: frozenset[str]
    into: Path
    schema: str
    may_update: bool


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

    book: its folder. into: where new records go, the book or a folder inside it.
    may_update: a draft that nobody has edited since its import follows the sheet.
    advance: told of each row done. Raises NoKeyError where nothing tells which entry a row makes.
    """
    targets, findings = _targets(sheet, column_map)
    key, key_findings = _key(sheet, column_map, targets)
    desk = _Desk(
        sheet=sheet,
        column_map=column_map,
        map_places=map_places,
        targets=targets,
        key=key,
        files={path.stem: path for path in record_files(book)[0]},
        retired=frozenset(settings.retired if settings else ()),
        into=into,
        schema=Path(os.path.relpath(book / "schema" / "record-1.json", into)).as_posix(),
        may_update=may_update,
    )
    results: list[RowResult] = []
    findings += key_findings
    by_entry: dict[str, int] = {}
    for row in sheet.rows:
        result, found = _read_row(desk, row)
        if result.entry in by_entry:
            found.append(_row_finding(desk, row, "row-repeated", *_twice(result.entry, by_entry[result.entry])))
            result = RowResult(row.number, State.REFUSED, result.entry)
        elif result.entry is not None:
            by_entry[result.entry] = row.number
        results.append(result)
        findings += found
        advance(1)
    return Import(sheet, tuple(results), tuple(_gathered(desk, findings)))


def _twice(entry: str | None, first: int) -> tuple[str, str]:
    message = f"row {first} makes the same entry, {entry}"
    return message, "keep one of the rows, or name more headings as key, so that they differ"


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
    finding = _finding("heading-unknown", message, mend)
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


# --- one row ----------------------------------------------------------------------------------------------------


@dataclass(slots=True)
class _Spots:
    """Where the values of one row come from; a place is a number here until the reader has done with it.

    A spot is a column of the sheet, a constant of the map, or (for what is missing) the name of a part of the record.
    """

    row: int
    known: list[tuple[int | None, str | None, str]] = field(default_factory=list)

    def add(self, *, column: int | None = None, constant: str | None = None, part: str = "") -> tuple[int, int, int]:
        """Return the span that stands for a spot."""
        self.known.append((column, constant, part))
        return (self.row, len(self.known), len(self.known) + 1)


@dataclass(frozen=True, slots=True)
class _Content:
    """What a row says, by flat column: the text, and the column of the sheet it comes from.

    constants: the flat columns that the map fills, as they are called there. perceived: what follows from the SMILES.
    """

    cells: dict[str, str]
    column_of: dict[str, int]
    constants: Mapping[str, str]
    perceived: frozenset[str]


def _read_row(desk: _Desk, row: Row) -> tuple[RowResult, list[CellFinding]]:
    findings: list[CellFinding] = []
    content = _content(desk, row, findings)
    entry = content.cells.get("entry")
    if entry is None:
        entry = _identifier(desk, row)
        if entry is None:
            headings = ", ".join(tidy(desk.sheet.headings[column]) for column in desk.key)
            mend = f"fill in {headings}" if headings else "fill in its entry"
            findings.append(
                _row_finding(desk, row, "row-without-key", "nothing tells which entry this row makes", mend)
            )
            return RowResult(row.number, State.REFUSED), findings
        content.cells["entry"] = entry
    unflattened = unflatten(content.cells)
    for first, second in unflattened.at_odds:
        message = f"{second} cannot stand beside {first}, which the row has as well"
        findings.append(_cell_finding(desk, row, content.column_of.get(second), "column-twice", message, "empty one"))
    record, found = _read_record(desk, row, content, unflattened)
    findings += found
    if entry in desk.retired:
        message = f"{entry} is retired and must never come back"
        findings.append(_row_finding(desk, row, "row-identity-taken", message, "give the row another key"))
    if record is None or findings:
        return RowResult(row.number, State.REFUSED, entry), findings
    return _settle(desk, row, content, unflattened, record, findings), findings


def _content(desk: _Desk, row: Row, findings: list[CellFinding]) -> _Content:
    """Return what the row says; a cell that its own kind speaks against is noted as a finding, and still taken."""
    cells: dict[str, str] = {}
    column_of: dict[str, int] = {}
    empty = desk.column_map.empty or ()
    for column, target in desk.targets.items():
        cell = row.cells.get(column)
        if cell is None or cell.text in empty:
            continue
        if target.name in cells:
            message = f"{target.name} stands in the column {tidy(desk.sheet.headings[column_of[target.name]])} as well"
            findings.append(_cell_finding(desk, row, column, "column-twice", message, "empty one of them"))
            continue
        cells[target.name] = _text(cell, target, desk.column_map)
        column_of[target.name] = column
    constants = _constants(desk, cells, column_of)
    for name, value in DEFAULTS.items():
        cells.setdefault(name, value)
    return _Content(cells, column_of, constants, _perceive(cells))


def _text(cell: Cell, target: Target, column_map: ColumnMap) -> str:
    """Return a cell as it would be typed into a record."""
    text = target.words.get(cell.text, cell.text)
    if len(text) > _LONGEST_NUMBER:
        return text
    if target.unit and _BARE_NUMBER.fullmatch(text):
        text = f"{text} {target.unit}"
    if column_map.decimal_comma and text.count(",") == 1 and "." not in text:
        shape = shape_at(target.name)
        is_number = comma_error(text, is_bare=shape is not None and shape.scalar is Scalar.NUMBER) is not None
        text = text.replace(",", ".") if is_number else text
    return text


def _constants(desk: _Desk, cells: dict[str, str], column_of: Mapping[str, int]) -> dict[str, str]:
    """Add the constants of the map, and return their columns with the names they have there.

    A constant of an item that has columns of its own holds only where the row says something of that item: the label
    of a by-product is no by-product.
    """
    added: dict[str, str] = {}
    mapped = {head for target in desk.targets.values() for head in _items(target.name)}
    given = {head for name in column_of for head in _items(name)}
    for typed, value in desk.column_map.constants.items():
        name = canonical_name(typed)
        heads = set(_items(name)) & mapped
        if name in cells or not heads <= given:
            continue
        cells[name] = " ".join(_GAP.sub(lambda gap: cells.get(gap[1], ""), value).split())
        added[name] = typed
    return added


def _items(name: str) -> Iterator[str]:
    """Yield the items of lists that a column is in: "reagents.2" for "reagents.2.name"."""
    steps = name.split(".")
    yield from (".".join(steps[: place + 1]) for place, step in enumerate(steps) if step.isdecimal())


def _perceive(cells: dict[str, str]) -> frozenset[str]:
    """Fill in class and leaving group where the row names neither, as they follow from the substrate."""
    wanted = {"substrate.class", "substrate.leaving_group"} - set(cells)
    if not wanted or "substrate.smiles" not in cells:
        return frozenset()
    try:
        site = next(iter(perceive_sites(parse_smiles(cells["substrate.smiles"]))), None)
    except StructureError:
        cells.update(dict.fromkeys(wanted, "not perceived"))  # the SMILES is told of; these would be as missing
        return frozenset()
    if site is None:
        return frozenset()
    found = {
        "substrate.class": "; ".join(sorted(site.classes)),
        "substrate.leaving_group": site.leaving_group,
    }
    cells.update({name: found[name] for name in wanted if found[name]})
    return frozenset(wanted & set(cells))


def _identifier(desk: _Desk, row: Row) -> str | None:
    """Return the identifier that follows from the key of a row, the same in every book and on every day.

    None where the row has no key. Drawn from SHA-256 as `mint_identifier` draws from chance, check character included.
    """
    key = [unicodedata.normalize("NFC", tidy(row.cells[c].text)) if c in row.cells else "" for c in desk.key]
    if not any(key):
        return None
    draws = _draws(json.dumps(["handbook import", *key], ensure_ascii=False).encode())
    return mint_identifier(lambda characters: characters[next(draws) % len(characters)])


def _draws(seed: bytes) -> Iterator[int]:
    block = seed
    while True:
        block = hashlib.sha256(block).digest()
        yield from block


def _read_record(
    desk: _Desk, row: Row, content: _Content, unflattened: Unflattened
) -> tuple[Record | None, list[CellFinding]]:
    """Read the row as a record: what the reader of record files says of it, at the cells."""
    spots = _Spots(row.number)
    spans = {
        name: spots.add(column=_source_column(desk, content, name), constant=content.constants.get(name))
        for name in content.cells
    }
    values: dict[ValuePath, tuple[int, int, int]] = {path: spans[name] for path, name in unflattened.columns.items()}
    for path in tuple(values):
        for end in range(1, len(path)):
            values.setdefault(path[:end], spots.add(part=name_of(path[:end])))
    places = Places(desk.sheet.shown_as, values, whole=spots.add())
    own = (*_cell_troubles(desk, row, content, spans), *_structure_troubles(desk, content, spans))
    record, found, _ = read_values(Record, Plainly(unflattened.value, places, own))
    errors = [finding for finding in found if finding.level is Level.ERROR]
    return record, [_placed(desk, row, spots, finding) for finding in errors]


def _source_column(desk: _Desk, content: _Content, name: str) -> int | None:
    if name in content.perceived:
        name = "substrate.smiles"
    if name == "entry" and name not in content.column_of:
        return desk.key[0] if desk.key else None
    return content.column_of.get(name)


Spans = Mapping[str, tuple[int, int, int]]


def _cell_troubles(desk: _Desk, row: Row, content: _Content, spans: Spans) -> Iterator[Finding]:
    """Yield what the kind of a cell speaks against: formulas without results, values a spreadsheet has turned."""
    for name, column in content.column_of.items():
        cell = row.cells[column]
        place = Place(desk.sheet.shown_as, *spans[name])
        if GAP in cell.text:
            fault = Fault(at=(), message="this is still to fill in", mend="write the value, or empty the cell")
            yield reading_rule("gap-left-open").finding(fault, place)
        if cell.trouble is not None:
            trouble = cell.trouble
            yield replace(_finding(trouble.rule, trouble.message, trouble.mend), place=place)
        elif cell.is_date and name.rpartition(".")[2] not in _DATES:
            message = f"the spreadsheet turned what was typed into the date {cell.text}"
            yield replace(_finding("cell-altered", message, "format the column as text and type it again"), place=place)


def _structure_troubles(desk: _Desk, content: _Content, spans: Spans) -> Iterator[Finding]:
    """Yield every structure that cannot be read, also where the rest of the row is no record yet."""
    for name, text in content.cells.items():
        key = name.rpartition(".")[2]
        if key not in {"smiles", "inchi", "sought"}:
            continue
        try:
            (parse_inchi if key == "inchi" else parse_smiles)(text)
        except StructureError as error:
            where = f" at character {error.position + 1}" if error.position is not None else ""
            fault = Fault(at=(), message=f"{error.reason}{where}", mend=error.mend)
            yield structure_is_unreadable.finding(fault, Place(desk.sheet.shown_as, *spans[name]))


# --- a row and the entry it made before -----------------------------------------------------------------------------


def _settle(
    desk: _Desk,
    row: Row,
    content: _Content,
    unflattened: Unflattened,
    record: Record,
    findings: list[CellFinding],
) -> RowResult:
    """Return what becomes of a sound row: new, or held against the entry that is there."""
    assert isinstance(unflattened.value, dict)  # noqa: S101 - a row has columns
    wanted = flatten(unflattened.value)
    path = desk.files.get(record.entry)
    text = _file_text(desk, row, unflattened, content)
    written = read_bytes(text.encode(), record.entry)
    if errors := [finding for finding in written.findings if finding.level is Level.ERROR]:
        findings.append(_at_cell(desk, row, None, errors[0]))  # such as a record that is too long for a file
        return RowResult(row.number, State.REFUSED, record.entry)
    if written.record != record:
        raise AssertionError(f"what row {row.number} writes is not what it says")
    if path is None and (desk.into / f"{record.entry}.yml").exists():
        message = f"{record.entry}.yml is there, and is no record of the book"
        findings.append(_row_finding(desk, row, "row-identity-taken", message, "move it away"))
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
        findings.append(_row_finding(desk, row, "row-identity-taken", message, mend))
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


def _where(desk: _Desk, row: Row, content: _Content, name: str | None) -> str:
    return desk.sheet.place(row.number, content.column_of.get(name or ""))


def _other_key(desk: _Desk, content: _Content, has: Mapping[str, str]) -> str:
    """Return in what the key of an entry differs from that of a row; "" where it does not."""
    for column in desk.key:
        name = desk.targets[column].name
        if "entry" not in content.column_of and content.cells.get(name) != has.get(name):
            return f'{name} is "{has.get(name, "")}", not "{content.cells.get(name, "")}"'
    return ""


def _file_text(desk: _Desk, row: Row, unflattened: Unflattened, content: _Content) -> str:
    assert isinstance(unflattened.value, dict)  # noqa: S101 - a row has columns
    source = "".join(c if c.isprintable() else " " for c in tidy(desk.sheet.shown_as))
    paths = {name: at for at, name in unflattened.columns.items()}
    remarks = {paths[name]: "perceived from the SMILES" for name in content.perceived if name in paths}
    body = record_yaml(unflattened.value, remarks=remarks)
    return (
        f"# yaml-language-server: $schema={desk.schema}\n"
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


# --- findings ---------------------------------------------------------------------------------------------------

_WHY = {
    "cell-altered": "A value is what was typed; a spreadsheet program turns ratios into times and names into dates.",
    "cell-without-result": "A formula counts by the result that was saved with it.",
    "column-twice": "Each value of a record comes from one cell.",
    "heading-unknown": "Every column goes into the record, or is ignored on purpose.",
    "row-identity-taken": "An identifier belongs to one experiment for ever.",
    "row-repeated": "One experiment is one row.",
    "row-without-key": "The key of a row decides which entry it makes, so that it makes the same one every time.",
}


def _finding(rule: str, message: str, mend: str) -> Finding:
    return Finding(
        rule=rule,
        level=Level.ERROR,
        message=message,
        why=_WHY[rule],
        mend=mend,
        source="record-format",
        place=Place("", 0, 0, 0),
    )


def _row_finding(desk: _Desk, row: Row, rule: str, message: str, mend: str) -> CellFinding:
    return _cell_finding(desk, row, None, rule, message, mend)


def _cell_finding(desk: _Desk, row: Row, column: int | None, rule: str, message: str, mend: str) -> CellFinding:
    return _at_cell(desk, row, column, _finding(rule, message, mend))


def _at_cell(desk: _Desk, row: Row, column: int | None, finding: Finding) -> CellFinding:
    heading = "" if column is None else tidy(desk.sheet.headings[column])
    value = row.cells[column].text if column in row.cells else ""  # type: ignore[index]  # None is in no row
    return CellFinding(desk.sheet.place(row.number, column), row.number, column, heading, value, finding)


def _placed(desk: _Desk, row: Row, spots: _Spots, finding: Finding) -> CellFinding:
    """Return a finding of the reader, whose place is the number of a spot, at its cell, constant or row."""
    column, constant, part = spots.known[finding.place.column - 1]
    if constant is not None and _GAP.search(desk.column_map.constants[constant]):
        finding = replace(finding, message=f"{constant}: {finding.message}")
    elif constant is not None:
        place = desk.map_places.of(("constants", constant))
        value = desk.column_map.constants[constant]
        return CellFinding(str(place), 0, None, constant, value, finding)
    if part:
        finding = replace(finding, message=f"{part}: {finding.message}")
    if finding.rule == "quantity-without-unit":
        finding = replace(finding, mend=f"{finding.mend}, or give the column its unit in the map")
    if finding.rule == "key-missing" and column is None:
        finding = replace(finding, mend=f"{finding.mend} as a column, or under constants: in the map")
    return _at_cell(desk, row, column, finding)


def _gathered(desk: _Desk, findings: Sequence[CellFinding]) -> Iterator[CellFinding]:
    """Yield findings in the order of the sheet; what is said of a constant, or of every row alike, once."""
    alike = Counter((each.finding.rule, each.finding.message) for each in findings if each.column is None)
    everywhere = {said for said, times in alike.items() if times == len(desk.sheet.rows) > 1}
    told = set()
    ordered = sorted(findings, key=lambda each: (each.row, -1 if each.column is None else each.column))
    for each in ordered:
        said = (each.finding.rule, each.finding.message)
        if each.column is None and (each.row == 0 or said in everywhere):
            if (each.where if each.row == 0 else "", *said) in told:
                continue
            told.add((each.where if each.row == 0 else "", *said))
            if each.row and said in everywhere:
                yield replace(each, where=f"{desk.sheet.shown_as}: every row")
                continue
        yield each
