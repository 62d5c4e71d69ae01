"""A sheet of rows as somebody keeps it, whatever the file; CSV and JSON Lines are read here.

A cell is text, as typed or shown. What a spreadsheet program made of it is kept beside it, for there a ratio turns into
a time and a CAS number into a date without anybody being told.
"""

import csv
import io
import json
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from statistics import median

from builder.records.flat import unguarded

__all__ = [
    "MAX_COLUMNS",
    "MAX_ROWS",
    "MAX_SHEET_BYTES",
    "Cell",
    "Row",
    "Sheet",
    "SheetError",
    "Trouble",
    "bytes_of",
    "column_letters",
    "likely_heading_row",
    "read_csv",
    "read_jsonl",
    "sheet_of",
]

MAX_SHEET_BYTES = 20 * 1024 * 1024
MAX_ROWS = 20_000
MAX_COLUMNS = 1_000
LOOKED_AT = 20
"""Rows among which headings are looked for."""
_SAID_DELIMITER = re.compile(r"sep=([,;\t])[\r\n]")
_LONE_SURROGATE = re.compile("[\ud800-\udfff]")


class SheetError(Exception):
    """A file that cannot be read as a sheet at all; nothing was imported."""


@dataclass(frozen=True, slots=True)
class Trouble:
    """What speaks against a cell before its text is read: a slug of its sort, the message, and how to mend it."""

    rule: str
    message: str
    mend: str


@dataclass(frozen=True, slots=True)
class Cell:
    """One cell that holds something.

    text: as typed or shown, without spaces around it.
    trouble: why the cell cannot be taken as it stands; None where nothing is known against it.
    is_date: the cell holds a day of the calendar, and text is its ISO form.
    """

    text: str
    trouble: Trouble | None = None
    is_date: bool = False


@dataclass(frozen=True, slots=True)
class Row:
    """One row that holds something, by its number in the file; cells by column, from 0."""

    number: int
    cells: Mapping[int, Cell]


@dataclass(frozen=True, slots=True)
class Sheet:
    """Headings and rows of one sheet.

    shown_as: as findings name it, "screen.xlsx!Sheet1". headings: as typed, "" where a column has none.
    names_columns: the columns have no letters, and a place is shown by heading instead.
    notes: what a reader should know of how the file was read.
    """

    shown_as: str
    headings: tuple[str, ...]
    rows: tuple[Row, ...]
    heading_row: int = 1
    names_columns: bool = False
    notes: tuple[str, ...] = field(default=())

    def place(self, row: int, column: int | None) -> str:
        """Return a place as it is shown: "screen.xlsx!Sheet1:D17"; of a whole row "screen.xlsx!Sheet1:17"."""
        if column is None:
            return f"{self.shown_as}:{row}"
        if self.names_columns:
            return f"{self.shown_as}:{row}:{self.headings[column]}"
        return f"{self.shown_as}:{column_letters(column)}{row}"


def column_letters(column: int) -> str:
    """Return the letters of a column, counted from 0: A, B, ... Z, AA."""
    letters = ""
    number = column + 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def sheet_of(
    shown_as: str,
    rows: Iterator[tuple[int, Mapping[int, Cell]]],
    heading_row: int | None,
    notes: tuple[str, ...] = (),
) -> Sheet:
    """Return a sheet from numbered rows, the first that holds something being the headings unless one is named.

    Raises SheetError where there are no headings or no bounds are kept.
    """
    headings: tuple[str, ...] | None = None
    found_at = 0
    kept: list[Row] = []
    for number, cells in rows:
        if not cells or (heading_row is not None and number < heading_row):
            continue
        if max(cells) >= MAX_COLUMNS:
            raise SheetError(f"{shown_as} has more than {MAX_COLUMNS:,} columns: keep one experiment a row")
        if headings is None:
            headings = tuple(cells[column].text if column in cells else "" for column in range(max(cells) + 1))
            found_at = number
        elif len(kept) == MAX_ROWS:
            raise SheetError(f"{shown_as} has more than {MAX_ROWS:,} rows: import it in parts")
        else:
            kept.append(Row(number, cells))
    if headings is None or not kept:
        raise SheetError(f"{shown_as} has no rows below its headings")
    width = max(len(headings), *(max(row.cells) + 1 for row in kept))
    return Sheet(shown_as, headings + ("",) * (width - len(headings)), tuple(kept), found_at, notes=notes)


def likely_heading_row(sheet: Sheet) -> int | None:
    """Return the number of the row that looks like headings where the one that was taken is only a title above them.

    A title fills less than half as many cells as rows usually do; headings fill more, differ, and are mostly words.
    """
    usual = median(len(row.cells) for row in sheet.rows)
    if sheet.names_columns or 2 * sum(map(bool, sheet.headings)) >= usual:
        return None
    for row in sheet.rows[:LOOKED_AT]:
        texts = [cell.text for cell in row.cells.values()]
        words = sum(text[0].isalpha() for text in texts)
        if 2 * len(texts) >= usual and len(set(texts)) == len(texts) and 4 * words >= 3 * len(texts):
            return row.number
    return None


# --- comma-separated ------------------------------------------------------------------------------------------


def read_csv(data: bytes, shown_as: str, heading_row: int | None = None) -> Sheet:
    """Read a CSV file, with commas, semicolons or tabs between the cells.

    An apostrophe that stands before = + - @ or another apostrophe is what `handbook export` guards formulas with, and
    is taken away. Raises SheetError for text that is no table.
    """
    text, notes = _decoded(data)
    if "\0" in text:
        raise SheetError(f"{shown_as} is no text: save the sheet as CSV UTF-8, or name the .xlsx file itself")
    delimiter = _delimiter(text)
    if delimiter != ",":
        notes += (f"cells are set apart by {'tabs' if delimiter == chr(9) else 'semicolons'}",)
    return sheet_of(shown_as, _csv_rows(text, delimiter, shown_as), heading_row, notes)


def _csv_rows(text: str, delimiter: str, shown_as: str) -> Iterator[tuple[int, Mapping[int, Cell]]]:
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    try:
        for number, row in enumerate(reader, start=1):
            is_said = number == 1 and _SAID_DELIMITER.match(text)
            cells = {column: _csv_cell(cell) for column, cell in enumerate(row) if cell.strip()}
            yield number, {} if is_said else cells
    except csv.Error as error:
        raise SheetError(f"{shown_as} line {reader.line_num} is no CSV: {error}; look at its quotes") from error


def _csv_cell(text: str) -> Cell:
    bare = unguarded(text)
    return Cell(bare if bare != text else text.strip())


def _decoded(data: bytes) -> tuple[str, tuple[str, ...]]:
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        return data.decode("utf-16", "replace"), ()
    try:
        return data.decode("utf-8-sig"), ()
    except UnicodeDecodeError:
        note = "read as Windows-1252, for it is no UTF-8: look at °, µ and accents"
        return data.decode("cp1252", "replace"), (note,)


def _delimiter(text: str) -> str:
    """Return what sets the cells of the first line that holds something apart."""
    said = _SAID_DELIMITER.match(text)
    if said:
        return said[1]
    first = next((line for line in text.splitlines() if line.strip(" ,;\t")), "")
    bare = re.sub(r'"[^"]*"', "", first)
    return max(",;\t", key=bare.count)


# --- JSON Lines -----------------------------------------------------------------------------------------------


def read_jsonl(data: bytes, shown_as: str) -> Sheet:
    """Read what `handbook export --format jsonl` writes: in each line one object of texts by column name.

    Raises SheetError for a line that is none.
    """
    text, notes = _decoded(data)
    columns: dict[str, int] = {}
    rows: list[Row] = []
    for number, line in enumerate(text.split("\n"), start=1):
        if not line.strip():
            continue
        try:
            held = json.loads(line, parse_int=float)  # any number is refused below, however long it is
        except (json.JSONDecodeError, RecursionError) as error:
            raise SheetError(f"{shown_as}:{number} is no JSON ({error}): write one object a line") from error
        if not isinstance(held, dict) or not all(isinstance(value, str) for value in held.values()):
            raise SheetError(f"{shown_as}:{number} is no object of texts: quote every value, numbers too")
        if _LONE_SURROGATE.search("".join((*held, *held.values()))):
            raise SheetError(f"{shown_as}:{number} holds half a character (\\ud800 to \\udfff): write it whole")
        cells = {columns.setdefault(name, len(columns)): Cell(value) for name, value in held.items() if value}
        if len(columns) > MAX_COLUMNS or len(rows) == MAX_ROWS:
            raise SheetError(
                f"{shown_as} has more than {MAX_ROWS:,} lines or {MAX_COLUMNS:,} names: import it in parts"
            )
        rows.append(Row(number, cells))
    if not rows:
        raise SheetError(f"{shown_as} has no lines")
    return Sheet(shown_as, tuple(columns), tuple(rows), 0, names_columns=True, notes=notes)


def bytes_of(path: Path) -> bytes:
    """Return the content of a sheet.

    Raises SheetError for one that is too large.
    """
    if path.stat().st_size > MAX_SHEET_BYTES:
        raise SheetError(f"{path.name} has more than {MAX_SHEET_BYTES // 1024**2} MB: import it in parts")
    return path.read_bytes()
