"""An .xlsx workbook -> a Sheet; the only home of openpyxl.

A workbook comes from anybody, and is a zip of XML: what it unpacks to is bounded, a document type is refused (and with
it every entity), and nothing in it is run. Formulas count by the result that was saved with them.
"""

import datetime as dt
import io
import re
import warnings
import zipfile
import zlib
from collections.abc import Callable, Iterator, Mapping
from decimal import Decimal
from typing import Any
from xml.parsers import expat

from openpyxl import load_workbook
from openpyxl.cell.read_only import EMPTY_CELL

from builder.authoring.sheet import MAX_COLUMNS, MAX_ROWS, Cell, Sheet, SheetError, Trouble, sheet_of

__all__ = ["read_workbook"]

MAX_UNPACKED = 200 * 1024 * 1024
MAX_PARTS = 2_000
MAX_CELLS = MAX_ROWS * MAX_COLUMNS
"""Looked at in one sheet, empty ones before and between the others included."""
LAST_ROW = 1_048_576
"""Where spreadsheet programs end a sheet; from memory."""
_MEANS_SOMETHING = Decimal(10) ** 15
_BROKEN = (
    expat.ExpatError,
    ValueError,
    KeyError,
    TypeError,
    AttributeError,
    IndexError,
    OSError,
    zipfile.BadZipFile,
    zlib.error,
)
"""What openpyxl raises for a workbook that no spreadsheet program wrote."""


def read_workbook(data: bytes, name: str, *, sheet: str | None, heading_row: int | None = None) -> Sheet:
    """Read one sheet of a workbook.

    sheet: its name; the only one, or the only visible one, if None.
    Raises SheetError for a file that is no workbook, is too large unpacked, or leaves open which sheet is meant.
    """
    _refuse_bombs(data, name)
    try:
        with warnings.catch_warnings(action="ignore"):  # openpyxl warns of decoration that it does not keep
            results = load_workbook(io.BytesIO(data), read_only=True, data_only=True, keep_links=False)
            formulas = load_workbook(io.BytesIO(data), read_only=True, data_only=False, keep_links=False)
    except (*_BROKEN, SyntaxError) as error:
        raise SheetError(f"{name} is no workbook that can be read ({error}): save it anew as .xlsx") from error
    chosen = _chosen(results.worksheets, name, sheet)
    shown, typed = results[chosen], formulas[chosen]
    shown_as = f"{name}!{chosen}"
    for each in (shown, typed):
        each.reset_dimensions()  # a declared size may be wrong, or a billion cells
    try:
        with warnings.catch_warnings(action="ignore"):
            notes = _notes(data, chosen, shown_as)
            return sheet_of(shown_as, _rows(shown, typed, shown_as), heading_row, notes)
    except (*_BROKEN, SyntaxError) as error:
        raise SheetError(f"{shown_as} cannot be read ({error}): save it anew as .xlsx") from error


def _chosen(sheets: list[Any], name: str, wanted: str | None) -> str:
    titles = [str(sheet.title) for sheet in sheets]
    if wanted is not None:
        if wanted not in titles:
            raise SheetError(f'{name} has no sheet "{wanted}": it has {", ".join(titles)}')
        return wanted
    visible = [str(sheet.title) for sheet in sheets if sheet.sheet_state == "visible"] or titles
    if len(visible) != 1:
        raise SheetError(f"{name} has {len(visible)} sheets; name one by --sheet: {', '.join(visible)}")
    return visible[0]


def _refuse_bombs(data: bytes, name: str) -> None:
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as parts:
            listed = parts.infolist()
            if len(listed) > MAX_PARTS or sum(part.file_size for part in listed) > MAX_UNPACKED:
                raise SheetError(f"{name} unpacks to more than {MAX_UNPACKED // 1024**2} MB: import it in parts")
            for part in listed:
                _refuse_document_type(parts, part, name)
    except (zipfile.BadZipFile, zlib.error, NotImplementedError, RuntimeError, EOFError) as error:
        raise SheetError(f"{name} is no .xlsx workbook: save it as .xlsx or as CSV UTF-8") from error


class _HasBegunError(Exception):
    """The first element was reached: no document type can follow."""


def _refuse_document_type(parts: zipfile.ZipFile, part: zipfile.ZipInfo, name: str) -> None:
    """Refuse a part with a document type, whatever it is called: what names it decides whether it is read as XML.

    A part that is no XML is refused where its name says that it should be.
    """

    def refuse(*_: object) -> None:
        raise SheetError(f"{name} declares a document type in {part.filename}, which no spreadsheet program writes")

    def stop(*_: object) -> None:
        raise _HasBegunError

    parser = expat.ParserCreate()
    parser.StartDoctypeDeclHandler, parser.StartElementHandler = refuse, stop
    with parts.open(part) as content:
        try:
            while chunk := content.read(65_536):
                parser.Parse(chunk)
        except _HasBegunError:
            return
        except expat.ExpatError as error:
            if not part.filename.lower().endswith((".xml", ".rels")):
                return
            raise SheetError(f"{name} holds broken XML in {part.filename}: save it anew") from error


def _notes(data: bytes, sheet: str, shown_as: str) -> tuple[str, ...]:
    """Return what the cells themselves do not tell: rows that are hidden, values that stand for several rows.

    Raises SheetError for a row beyond the last there can be, before anybody walks there.
    """
    hidden: list[str] = []
    merged: list[str] = []

    def look(tag: str, about: dict[str, str]) -> None:
        match tag.rpartition(":")[2]:
            case "row" if float(about.get("r", 0)) > LAST_ROW:
                raise _beyond_last_row(shown_as)
            case "row" if about.get("hidden") in {"1", "true"}:
                hidden.append(about.get("r", "?"))
            case "mergeCell" if len(set(re.findall(r"\d+", about.get("ref", "")))) > 1:
                merged.append(about["ref"])

    with zipfile.ZipFile(io.BytesIO(data)) as parts:
        part = _part_of(parts, sheet)
        if part is not None:
            _look_through(parts, part, look)
    notes = []
    if hidden:
        notes.append(f"hidden rows are read as well: {_some(hidden)}")
    if merged:
        notes.append(f"merged cells hold their value in their first row only: {_some(merged)}")
    return tuple(notes)


def _beyond_last_row(shown_as: str) -> SheetError:
    return SheetError(f"{shown_as} has a row beyond {LAST_ROW:,}, where every sheet ends: save it anew as .xlsx")


def _some(listed: list[str]) -> str:
    return ", ".join(listed[:8]) + (f" and {len(listed) - 8} more" if len(listed) > 8 else "")


def _part_of(parts: zipfile.ZipFile, sheet: str) -> str | None:
    """Return the part of a workbook that holds a sheet; None where it is not in the usual place."""
    ids: dict[str, str] = {}
    targets: dict[str, str] = {}

    def look(_: str, about: dict[str, str]) -> None:
        if "name" in about and "r:id" in about:
            ids[about["name"]] = about["r:id"]
        elif "Id" in about and "Target" in about:
            targets[about["Id"]] = about["Target"]

    for part in ("xl/workbook.xml", "xl/_rels/workbook.xml.rels"):
        if part in parts.namelist():
            _look_through(parts, part, look)
    target = targets.get(ids.get(sheet, ""), "").removeprefix("/xl/")
    return f"xl/{target}" if target and f"xl/{target}" in parts.namelist() else None


def _look_through(parts: zipfile.ZipFile, part: str, look: Callable[[str, dict[str, str]], None]) -> None:
    parser = expat.ParserCreate()
    parser.StartElementHandler = look
    with parts.open(part) as content:
        while chunk := content.read(65_536):
            parser.Parse(chunk)


def _rows(results: Any, formulas: Any, shown_as: str) -> Iterator[tuple[int, Mapping[int, Cell]]]:
    """Yield numbered rows, from the results and the formulas of one and the same sheet.

    Raises SheetError where a few cells, set far apart, would make a long walk.
    """
    walked = 0
    for number, (shown, typed) in enumerate(zip(results.iter_rows(), formulas.iter_rows(), strict=True), start=1):
        walked += len(shown)
        if number > LAST_ROW:
            raise _beyond_last_row(shown_as)
        if walked > MAX_CELLS:
            raise SheetError(f"{shown_as} spans more than {MAX_CELLS:,} cells: delete the empty columns on its right")
        read = (
            (column, _cell(result, formula.value))
            for column, (result, formula) in enumerate(zip(shown, typed, strict=True))
            if formula is not EMPTY_CELL
        )
        yield number, {column: cell for column, cell in read if cell is not None}


def _cell(result: Any, typed: Any) -> Cell | None:
    """Return a cell; None where it is empty."""
    value = result.value
    if value is None:
        if typed is None or not str(typed).strip():
            return None
        mend = "open the workbook, let it calculate, and save it"
        return Cell(str(typed), Trouble("cell-without-result", "the formula has no saved result", mend))
    number_format = str(result.number_format or "General")
    match value:
        case bool():
            return Cell("true" if value else "false")
        case int() | float():
            return Cell(number_as_shown(value, number_format))
        case dt.datetime() | dt.date():
            return _date(value)
        case dt.time() | dt.timedelta():
            return _time(value)
    text = str(value).replace("_x000D_", "").strip()
    if result.data_type == "e":
        trouble = Trouble("cell-without-result", f"the formula ends in {text}", "mend it, or type the value")
        return Cell(text, trouble)
    return Cell(text) if text else None


def number_as_shown(value: float, number_format: str) -> str:
    """Return a number with all its digits, and the zeros and the percent sign that its format shows besides.

    A float has 15 digits that mean something; 0.1 + 0.2 of a formula is 0.3.

    >>> number_as_shown(1.2, "0.00"), number_as_shown(0.88, "0%"), number_as_shown(4, "000")
    ('1.20', '88 %', '004')
    """
    number = Decimal(format(value, ".15g"))
    shown = re.sub(r'"[^"]*"|\[[^\]]*\]|\\.', "", number_format.partition(";")[0])
    if "%" in shown:
        number = number.scaleb(2)
    decimals = re.search(r"[0#]\.(0+)", shown)
    if decimals and "E" not in shown.upper() and abs(number) < _MEANS_SOMETHING:
        digits = max(len(decimals[1]), -int(number.as_tuple().exponent))
        number = number.quantize(Decimal(1).scaleb(-digits)) if digits < 12 else number
    text = format(number, "f")
    if re.fullmatch(r"0{2,}", shown.strip()) and text.isdecimal():
        text = text.zfill(len(shown.strip()))
    return f"{text} %" if "%" in shown else text


def _date(value: dt.date) -> Cell:
    if isinstance(value, dt.datetime) and value.time() != dt.time():
        said = f"the spreadsheet holds the date and time {value.isoformat(' ', 'minutes')}"
        trouble = Trouble("cell-altered", said, "format the column as text and type the value again")
        return Cell(value.isoformat(" ", "minutes"), trouble)
    day = value.date() if isinstance(value, dt.datetime) else value
    return Cell(day.isoformat(), is_date=True)


def _time(value: dt.time | dt.timedelta) -> Cell:
    """Return a cell that was turned into a time of the day, as ratios are: 97:3 is shown as 97:03:00."""
    whole = (
        value.hour * 3600 + value.minute * 60 + value.second
        if isinstance(value, dt.time)
        else round(value.total_seconds())
    )
    hours, minutes, seconds = whole // 3600, whole // 60 % 60, whole % 60
    shown = f"{hours}:{minutes:02}:{seconds:02}"
    ratio = f"{hours}:{minutes}" + (f":{seconds}" if seconds else "")
    mend = f"format the column as text and type it again: {ratio} if it was a ratio, with h or min if it was a time"
    return Cell(shown, Trouble("cell-altered", f"the spreadsheet turned what was typed into the time {shown}", mend))
