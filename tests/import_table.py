"""What an import makes of the messy sheet, as a table: `python -m tests.import_table`, and part of `make eval`.

Every cell that was spoiled on purpose, with what names it; then how many of the sound rows are the same records after
export and another import.
"""

import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

from builder.authoring.column_map import ColumnMap
from builder.authoring.import_sheet import Import, open_sheet, plan_import, write_import
from builder.book import record_files
from builder.publish.export import Exported, csv_text, exported_records, jsonl_text
from builder.records.reader import read_into
from builder.records.yaml_text import Places
from tests.authoring.messy_sheet import MAP, SEEDED, SEEDED_ROWS, messy_workbook


def import_table() -> str:
    """Return the table."""
    with tempfile.TemporaryDirectory() as folder:
        return "\n".join(_lines(Path(folder))) + "\n"


def _lines(folder: Path) -> Iterator[str]:
    column_map, _, places = read_into(ColumnMap, MAP, "messy.yml")
    assert column_map is not None
    messy_workbook().save(folder / "messy.xlsx")
    planned = _imported(folder / "messy.xlsx", column_map, places, folder / "first")
    named = {(each.where.rpartition(":")[2], each.finding.rule): each.finding.message for each in planned.findings}
    yield f"{'cell':<6}{'what stands there':<26}{'rule':<26}said"
    wanted = {**SEEDED, **{str(row): said for row, said in SEEDED_ROWS.items()}}
    for cell, (value, rule) in wanted.items():
        yield f"{cell:<6}{value!s:<26.25}{rule:<26}{named.pop((cell, rule), 'NOT NAMED')}"
    yield f"{len(wanted)} spoiled; named besides: {len(named)}"
    first = _records(folder / "first")
    for form, text in (("csv", csv_text(first)), ("jsonl", jsonl_text(first))):
        (folder / f"table.{form}").write_bytes(text.encode())
        _imported(folder / f"table.{form}", ColumnMap(), Places(""), folder / form)
        again = _records(folder / form)
        same = sum(one.record == other.record for one, other in zip(first, again, strict=False))
        yield f"{same} of {len(first)} records are the same after {form} and back"


def _imported(path: Path, column_map: ColumnMap, places: Places, book: Path) -> Import:
    book.mkdir()
    sheet = open_sheet(path, sheet=None, heading_row=None)
    planned = plan_import(sheet, column_map, places, book=book, settings=None, into=book)
    write_import(planned, sound_rows=True)
    return planned


def _records(book: Path) -> list[Exported]:
    return [each for each in exported_records(book, record_files(book)[0]) if isinstance(each, Exported)]


if __name__ == "__main__":
    sys.stdout.write(import_table())
