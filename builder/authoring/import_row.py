"""One row of a sheet, read as a record: the reader of record files says what is wrong, and it is told at the cell.

A row is first its cells by column of the flat record, with the constants of the map and what follows from the SMILES,
and then the plain values of a record whose places are cells.
"""

import hashlib
import json
import re
import unicodedata
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path

from builder.authoring.column_map import DEFAULTS, IN_BRACES, ColumnMap, Target, iso_date, tidy
from builder.authoring.sheet import Cell, Row, Sheet
from builder.checks.structures import structure_is_unreadable
from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import StructureError, parse_inchi, parse_smiles
from builder.finding import Finding, Level, Place
from builder.records.flat import Scalar, Unflattened, canonical_name, name_of, shape_at, unflatten
from builder.records.identifiers import mint_identifier
from builder.records.mended_text import Span
from builder.records.model import Record
from builder.records.quantities import comma_error
from builder.records.reader import read_values
from builder.records.rules import reading_rule
from builder.records.specimen import GAP
from builder.records.yaml_text import Places, Plainly
from builder.rule import Fault
from builder.rule import Path as ValuePath

__all__ = ["CellFinding", "Desk", "RowContent", "RowReading", "at_cell", "own_finding", "read_row", "row_finding"]

_DATES = frozenset({"date", "due"})
_RATIOS = frozenset({"er", "dr"})
_TIME_OF_DAY = re.compile(r"(\d+):(\d\d):\d\d")
_AS_TEXT = "format the column as text and type it again"
_BARE_NUMBER = re.compile(
    r"[<>≤≥]?\s*[-+\u2010-\u2013\u2212]?[\d.,]*\d[\d.,]*(?:[eE][-+]?\d+)?(?:\s*(?:[-\u2010-\u2013\u2212]|to)\s*[-+\u2212]?[\d.,]+)?"
)
_LONGEST_NUMBER = 60


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
class Desk:
    """All that a row is read with, and held against.

    targets: by column. map_places: where the map has its constants. files: of the book, by identifier.
    book, into: its folder, and the one for new records; both absolute.
    """

    sheet: Sheet
    column_map: ColumnMap
    map_places: Places
    targets: Mapping[int, Target]
    key: tuple[int, ...]
    files: Mapping[str, Path]
    retired: frozenset[str]
    into: Path
    book: Path
    may_update: bool


@dataclass(slots=True)
class _Spots:
    """Where the values of one row come from; a place is a number here until the reader has done with it.

    A spot is a column of the sheet, a constant of the map, or (for what is missing) the name of a part of the record.
    """

    row: int
    known: list[tuple[int | None, str | None, str]] = field(default_factory=list)

    def add(self, *, column: int | None = None, constant: str | None = None, part: str = "") -> Span:
        """Return the span that stands for a spot."""
        self.known.append((column, constant, part))
        return Span(self.row, len(self.known), len(self.known) + 1)


@dataclass(frozen=True, slots=True)
class RowContent:
    """What a row says, by flat column: the text, and the column of the sheet it comes from.

    constants: the flat columns that the map fills, as they are called there. perceived: what follows from the SMILES.
    """

    cells: dict[str, str]
    column_of: dict[str, int]
    constants: Mapping[str, str]
    perceived: frozenset[str]


@dataclass(frozen=True, slots=True)
class RowReading:
    """What came of reading a row: its entry (None where nothing tells which), the record, and the faults of its cells.

    record: None where there is a fault.
    """

    entry: str | None
    content: RowContent
    unflattened: Unflattened
    record: Record | None
    findings: tuple[CellFinding, ...]


def read_row(desk: Desk, row: Row) -> RowReading:
    """Read one row; every fault of it is found at once."""
    findings: list[CellFinding] = []
    content = _content(desk, row, findings)
    entry = content.cells.get("entry") or _identifier(desk, row)
    if entry is None:
        headings = ", ".join(tidy(desk.sheet.headings[column]) for column in desk.key) or "its entry"
        message, mend = "nothing tells which entry this row makes", f"fill in {headings}"
        findings.append(row_finding(desk, row, "row-without-key", message, mend))
    content.cells["entry"] = entry or _drawn(["a row without a key", str(row.number)])
    unflattened = unflatten(content.cells)
    for first, second in unflattened.at_odds:
        message = f"{second} cannot stand beside {first}, which the row has as well"
        column = content.column_of.get(second)
        findings.append(at_cell(desk, row, column, own_finding("column-twice", message, "empty one of them")))
    record, found = _read_record(desk, row, content, unflattened)
    findings += found
    if entry in desk.retired:
        message = f"{entry} is retired and must never come back"
        findings.append(row_finding(desk, row, "row-identity-taken", message, "give the row another key"))
    return RowReading(entry, content, unflattened, None if findings else record, tuple(findings))


def _content(desk: Desk, row: Row, findings: list[CellFinding]) -> RowContent:
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
            findings.append(at_cell(desk, row, column, own_finding("column-twice", message, "empty one of them")))
            continue
        cells[target.name] = _text(cell, target, desk.column_map)
        column_of[target.name] = column
    constants = _constants(desk, cells, column_of)
    for name, value in DEFAULTS.items():
        cells.setdefault(name, value)
    return RowContent(cells, column_of, constants, _perceive(cells))


def _text(cell: Cell, target: Target, column_map: ColumnMap) -> str:
    """Return a cell as it would be typed into a record."""
    text = target.words.get(cell.text, cell.text)
    if len(text) > _LONGEST_NUMBER:
        return text
    if target.date and not cell.is_date:
        return iso_date(text, target.date)
    if target.unit and _BARE_NUMBER.fullmatch(text):
        text = f"{text} {target.unit}"
    if column_map.decimal_comma and text.count(",") == 1 and "." not in text:
        shape = shape_at(target.name)
        is_number = comma_error(text, is_bare=shape is not None and shape.scalar is Scalar.NUMBER) is not None
        text = text.replace(",", ".") if is_number else text
    return text


def _constants(desk: Desk, cells: dict[str, str], column_of: Mapping[str, int]) -> dict[str, str]:
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
        cells[name] = " ".join(IN_BRACES.sub(lambda found: cells.get(canonical_name(found[1]), ""), value).split())
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


def _identifier(desk: Desk, row: Row) -> str | None:
    """Return the identifier that follows from the key of a row, the same in every book and on every day.

    None where the row has no key. Drawn from SHA-256 as `mint_identifier` draws from chance, check character included.
    """
    key = [unicodedata.normalize("NFC", tidy(row.cells[c].text)) if c in row.cells else "" for c in desk.key]
    return _drawn(["handbook import", *key]) if any(key) else None


def _drawn(seed: list[str]) -> str:
    draws = _draws(json.dumps(seed, ensure_ascii=False).encode())
    return mint_identifier(lambda characters: characters[next(draws) % len(characters)])


def _draws(seed: bytes) -> Iterator[int]:
    block = seed
    while True:
        block = hashlib.sha256(block).digest()
        yield from block


def _read_record(
    desk: Desk, row: Row, content: RowContent, unflattened: Unflattened
) -> tuple[Record | None, list[CellFinding]]:
    """Read the row as a record: what the reader of record files says of it, at the cells."""
    spots = _Spots(row.number)
    spans = {
        name: spots.add(column=_source_column(desk, content, name), constant=content.constants.get(name))
        for name in content.cells
    }
    values: dict[ValuePath, Span] = {path: spans[name] for path, name in unflattened.columns.items()}
    for path in tuple(values):
        for end in range(1, len(path)):
            values.setdefault(path[:end], spots.add(part=name_of(path[:end])))
    places = Places(desk.sheet.shown_as, values, whole=spots.add())
    own = (*_cell_troubles(desk, row, content, spans), *_structure_troubles(desk, content, spans))
    record, found, _ = read_values(Record, Plainly(unflattened.value, places, own))
    errors = [finding for finding in found if finding.level is Level.ERROR]
    return record, [_placed(desk, row, spots, finding) for finding in errors]


def _source_column(desk: Desk, content: RowContent, name: str) -> int | None:
    if name in content.perceived:
        name = "substrate.smiles"
    if name == "entry" and name not in content.column_of:
        return desk.key[0] if desk.key else None
    return content.column_of.get(name)


Spans = Mapping[str, Span]


def _cell_troubles(desk: Desk, row: Row, content: RowContent, spans: Spans) -> Iterator[Finding]:
    """Yield what the kind of a cell speaks against: formulas without results, values a spreadsheet has turned."""
    for name, column in content.column_of.items():
        cell = row.cells[column]
        place = Place(desk.sheet.shown_as, *spans[name])
        if GAP in cell.text:
            fault = Fault(at=(), message="this is still to fill in", mend="write the value, or empty the cell")
            yield reading_rule("gap-left-open").finding(fault, place)
        if cell.trouble is not None:
            trouble = cell.trouble
            yield replace(own_finding(trouble.rule, trouble.message, trouble.mend), place=place)
        elif name.rpartition(".")[2] in _RATIOS and (turned := _TIME_OF_DAY.fullmatch(cell.text)):
            message = f"this is the time {cell.text}, and was perhaps the ratio {int(turned[1])}:{int(turned[2])}"
            yield replace(own_finding("cell-altered", message, _AS_TEXT), place=place)
        elif cell.is_date and name.rpartition(".")[2] not in _DATES:
            message = f"the spreadsheet turned what was typed into the date {cell.text}"
            yield replace(own_finding("cell-altered", message, _AS_TEXT), place=place)


def _structure_troubles(desk: Desk, content: RowContent, spans: Spans) -> Iterator[Finding]:
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


def own_finding(rule: str, message: str, mend: str) -> Finding:
    """Return a finding that only an import can have; its place is told beside it."""
    return Finding(
        rule=rule,
        level=Level.ERROR,
        message=message,
        why=_WHY[rule],
        mend=mend,
        source="record-format",
        place=Place("", 0, 0, 0),
    )


def row_finding(desk: Desk, row: Row, rule: str, message: str, mend: str) -> CellFinding:
    """Return a finding about a whole row."""
    return at_cell(desk, row, None, own_finding(rule, message, mend))


def at_cell(desk: Desk, row: Row, column: int | None, finding: Finding) -> CellFinding:
    """Return a finding at a cell of a row; at the whole row if column is None."""
    heading = "" if column is None else tidy(desk.sheet.headings[column])
    value = row.cells[column].text if column in row.cells else ""  # type: ignore[index]  # None is in no row
    return CellFinding(desk.sheet.place(row.number, column), row.number, column, heading, value, finding)


def _placed(desk: Desk, row: Row, spots: _Spots, finding: Finding) -> CellFinding:
    """Return a finding of the reader, whose place is the number of a spot, at its cell, constant or row."""
    column, constant, part = spots.known[finding.place.column - 1]
    if constant is not None and IN_BRACES.search(desk.column_map.constants[constant]):
        finding = replace(finding, message=f"{constant}: {finding.message}")
    elif constant is not None:
        place = desk.map_places.of(("constants", constant))
        value = desk.column_map.constants[constant]
        return CellFinding(str(place), 0, None, constant, value, finding)
    if part:
        finding = replace(finding, message=f"{part}: {finding.message}")
    if finding.rule == "quantity-without-unit":
        finding = replace(finding, mend=f"{finding.mend}, or give the column its unit in the map")
    if column is not None and column in desk.targets and desk.targets[column].name.rpartition(".")[2] in _DATES:
        finding = replace(finding, mend=f"{finding.mend}, or name the order of its dates in the map, as date: D.M.Y")
    if finding.rule == "key-missing" and column is None:
        finding = replace(finding, mend=f"{finding.mend} as a column, or under constants: in the map")
    return at_cell(desk, row, column, finding)
