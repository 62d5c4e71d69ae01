"""What came of an import, as text, as JSON, and as a table of cells to be mended."""

import csv
import io
from collections.abc import Mapping, Sequence
from typing import Any

from builder.authoring.import_row import CellFinding
from builder.authoring.import_sheet import Import, RowResult, State
from builder.records.flat import guarded

__all__ = ["as_plain", "cell_table", "import_text"]

MOST_SHOWN = 200
"""Faults that a terminal is shown; --report has them all."""

_SAID = {
    State.NEW: "new",
    State.UNCHANGED: "unchanged",
    State.UPDATED: "follows the sheet",
    State.DIFFERS: "differs from the book",
    State.REFUSED: "refused",
}


def import_text(planned: Import, written: Sequence[RowResult], *, is_dry: bool) -> str:
    """Return the findings by cell, the differences by column, and the counts at the end."""
    lines = [f"note: {note}" for note in planned.sheet.notes]
    alike: dict[tuple[str, ...], list[CellFinding]] = {}
    for each in planned.findings:
        alike.setdefault((each.heading, each.value, each.finding.rule, each.finding.message), []).append(each)
    for cells in list(alike.values())[:MOST_SHOWN]:
        lines += _finding_lines(planned, cells)
    if len(alike) > MOST_SHOWN:
        lines.append(f"{len(alike) - MOST_SHOWN} more; --report FILE.csv lists all")
    for result in planned.of(State.DIFFERS):
        lines += _difference_lines(planned, result)
    return "\n".join([*lines, _counts(planned), _end(planned, written, is_dry=is_dry)])


def _finding_lines(planned: Import, cells: Sequence[CellFinding]) -> list[str]:
    """Return what is said of cells that hold the same under the same heading; each of them is named."""
    first, *others = cells
    what = f'{first.heading} "{first.value}": ' if first.heading and first.value != first.heading else ""
    where = ", ".join([first.where, *(each.where.removeprefix(f"{planned.sheet.shown_as}:") for each in others)])
    said = first.finding
    return [f"{where}: {said.level} {said.rule}: {what}{said.message}", f"  fix:  {said.mend}"]


def _difference_lines(planned: Import, result: RowResult) -> list[str]:
    why = "edited since its import, never overwritten" if result.is_edited else "--update lets a draft follow the sheet"
    lines = [f"{planned.sheet.place(result.row, None)}: {result.entry} differs ({why})"]
    for each in result.differences:
        sheet, book = (f'"{text}"' if text is not None else "nothing" for text in (each.sheet, each.book))
        lines.append(f"  {each.where}: {each.name}: {sheet} in the sheet, {book} in the book")
    return lines


def _counts(planned: Import) -> str:
    counts = [f"{len(planned.of(state))} {said}" for state, said in _SAID.items() if planned.of(state)]
    rows = len(planned.results)
    return f"{rows} {'row' if rows == 1 else 'rows'}: {', '.join(counts)}"


def _end(planned: Import, written: Sequence[RowResult], *, is_dry: bool) -> str:
    sound = len(planned.of(State.NEW)) + len(planned.of(State.UPDATED))
    if is_dry:
        return "nothing written: --dry-run"
    if written:
        files = "1 record" if len(written) == 1 else f"{len(written)} records"
        return f"{files} written; now `handbook check`"
    if planned.findings and sound:
        sure = "" if planned.blocks_all else f", or --sound-rows writes the other {sound}"
        return f"nothing written: mend the cells above and import again{sure}"
    return "nothing written"


def as_plain(planned: Import, written: Sequence[RowResult]) -> dict[str, Any]:
    """Return the same as plain data with stable keys."""
    return {
        "rows": len(planned.results),
        **{str(state): len(planned.of(state)) for state in State},
        "written": [result.entry for result in written],
        "notes": list(planned.sheet.notes),
        "findings": [_plain_finding(each) for each in planned.findings],
        "differences": [
            {
                "row": result.row,
                "entry": result.entry,
                "edited": result.is_edited,
                "columns": [
                    {"name": each.name, "where": each.where, "sheet": each.sheet, "book": each.book}
                    for each in result.differences
                ],
            }
            for result in planned.of(State.DIFFERS)
        ],
    }


def _plain_finding(each: CellFinding) -> Mapping[str, object]:
    return {
        "where": each.where,
        "row": each.row,
        "column": None if each.column is None else each.column + 1,
        "heading": each.heading,
        "value": each.value,
        "rule": each.finding.rule,
        "message": each.finding.message,
        "mend": each.finding.mend,
        "fix": each.finding.fix,
    }


def cell_table(planned: Import) -> str:
    """Return the findings as CSV, one cell a line, for whoever mends the sheet."""
    columns = ("where", "row", "column", "heading", "value", "rule", "message", "mend")
    table = io.StringIO()
    table.write("\ufeff")
    writer = csv.writer(table, lineterminator="\r\n")
    writer.writerow(columns)
    for each in planned.findings:
        plain = _plain_finding(each)
        writer.writerow([guarded("" if plain[name] is None else str(plain[name])) for name in columns])
    return table.getvalue()
