"""Rows into records: every unreadable cell named, the rest the same after export and another import."""

import csv
import datetime as dt
import io
import json
import re
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook

from builder import cli
from builder.authoring.column_map import ColumnMap, likely_column, split_unit
from builder.authoring.import_sheet import plan_import, write_import
from builder.authoring.sheet import read_csv
from builder.authoring.workbook import number_as_shown
from builder.records.digest import digest
from builder.records.identifiers import is_identifier
from builder.records.reader import read_record
from builder.records.yaml_text import Places
from tests.authoring.messy_sheet import MAP, SEEDED, SEEDED_ROWS, messy_workbook

Run = Callable[..., tuple[int, str]]

SOUND = {
    # a whole record in columns that need no map
    "notebook": "XB1/001",
    "title": "Azide displacement of 1-bromobutane",
    "performed.date": "2026-03-14",
    "performed.by": "bench-2",
    "substrate.name": "1-bromobutane",
    "substrate.smiles": "CCCCBr",
    "substrate.mass": "1.37 g",
    "nucleophile.name": "sodium azide",
    "nucleophile.smiles": "[Na+].[N-]=[N+]=[N-]",
    "nucleophile.equivalents": "1.50",
    "solvent.name": "DMF",
    "solvent.volume": "20 mL",
    "stages.temperature": "60 °C",
    "stages.time": "16 h",
    "outcome.result": "substitution",
    "outcome.products.label": "A",
    "outcome.products.name": "1-azidobutane",
    "outcome.products.smiles": "CCCCN=[N+]=[N-]",
    "outcome.measured.yield": "88 %",
    "outcome.measured.of": "A",
    "outcome.measured.kind": "isolated",
}


@pytest.fixture
def book(tmp_path: Path) -> Path:
    return _new_book(tmp_path / "entries")


def _new_book(folder: Path) -> Path:
    folder.mkdir()
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    return folder


@pytest.fixture
def run(capsysbinary: pytest.CaptureFixture[bytes]) -> Run:
    def call(*arguments: str | Path) -> tuple[int, str]:
        with pytest.raises(SystemExit) as stop:
            cli.main([str(argument) for argument in arguments])
        out, err = capsysbinary.readouterr()
        return int(stop.value.code or 0), (out + err).decode()

    return call


def _csv(path: Path, *rows: dict[str, str], delimiter: str = ",", encoding: str = "utf-8") -> Path:
    names = list(dict.fromkeys(name for row in rows for name in row))
    table = io.StringIO()
    writer = csv.DictWriter(table, names, delimiter=delimiter, restval="")
    writer.writeheader()
    writer.writerows(rows)
    path.write_bytes(table.getvalue().encode(encoding))
    return path


def _records(book: Path) -> dict[str, Path]:
    return {path.stem: path for path in sorted(book.rglob("NS*.yml"))}


# --- the messy sheet ----------------------------------------------------------------------------------------------


@pytest.fixture
def messy(tmp_path: Path) -> tuple[Path, Path]:
    sheet, column_map = tmp_path / "messy.xlsx", tmp_path / "messy.yml"
    messy_workbook().save(sheet)
    column_map.write_text(MAP, "utf-8")
    return sheet, column_map


def test_every_unreadable_cell_is_named_and_nothing_is_written(run: Run, book: Path, messy: tuple[Path, Path]) -> None:
    sheet, column_map = messy
    report = book.parent / "cells.csv"
    code, out = run("import", sheet, "--map", column_map, "--book", book, "--report", report)
    with report.open(encoding="utf-8-sig", newline="") as file:
        named = {(row["where"].removeprefix("messy.xlsx!Runs:"), row["rule"]) for row in csv.DictReader(file)}
    wanted = {(cell, rule) for cell, (_, rule) in SEEDED.items()}
    assert named == wanted | {(str(row), rule) for row, (_, rule) in SEEDED_ROWS.items()}
    assert 'messy.xlsx!Runs:N6: error quantity-without-unit: Time "16": the time has no unit\n' in out
    assert out.endswith(
        "50 rows: 24 new, 26 refused\n"
        "nothing written: mend the cells above and import again, or --sound-rows writes the other 24\n"
    )
    assert (code, _records(book)) == (1, {})


@pytest.mark.parametrize("form", ["csv", "jsonl", "xlsx"])
def test_the_rest_is_identical_after_export_and_import(
    run: Run, book: Path, messy: tuple[Path, Path], form: str
) -> None:
    sheet, column_map = messy
    run("import", sheet, "--map", column_map, "--book", book, "--sound-rows", "--into", book / "messy")
    first = _records(book)
    assert len(first) == 24
    table, other = book.parent / f"table.{form}", _new_book(book.parent / "other")
    if form == "xlsx":
        _as_workbook(run("export", "--book", book, "--format", "jsonl")[1], table)
    else:
        assert run("export", "--book", book, "--format", form, "--output", table)[0] == 0
    assert run("import", table, "--book", other)[0] == 0
    second = _records(other)
    assert second.keys() == first.keys()
    for entry, path in first.items():
        before, after = read_record(path, path.name), read_record(second[entry], path.name)
        assert before.record is not None
        assert after.record == before.record
        assert digest(after.record) == digest(before.record)


def _as_workbook(lines: str, path: Path) -> None:
    """Save exported records as a workbook, every cell as text, as somebody does who takes care."""
    records = [json.loads(line) for line in lines.splitlines() if line.startswith("{")]
    names = list(dict.fromkeys(name for record in records for name in record))
    workbook = Workbook()
    sheet = workbook.active
    assert sheet is not None
    for row in (names, *([record.get(name) for name in names] for record in records)):
        sheet.append(row)
    workbook.save(path)


def test_significant_digits_survive_the_workbook(run: Run, book: Path, messy: tuple[Path, Path]) -> None:
    sheet, column_map = messy
    run("import", sheet, "--map", column_map, "--book", book, "--sound-rows")
    assert all("amount: 10.0 mmol" in path.read_text("utf-8") for path in _records(book).values())


def test_an_import_again_finds_what_it_made(run: Run, book: Path, messy: tuple[Path, Path]) -> None:
    sheet, column_map = messy
    run("import", sheet, "--map", column_map, "--book", book, "--sound-rows")
    before = {path: path.read_bytes() for path in _records(book).values()}
    _, out = run("import", sheet, "--map", column_map, "--book", book, "--sound-rows")
    assert out.endswith("50 rows: 24 unchanged, 26 refused\nnothing written\n")
    assert {path: path.read_bytes() for path in _records(book).values()} == before


# --- the demonstration book -----------------------------------------------------------------------------------------


@pytest.mark.slow
@pytest.mark.parametrize("form", ["csv", "jsonl"])
def test_the_whole_demonstration_book_survives(run: Run, book: Path, form: str) -> None:
    demo = Path(__file__).parents[2] / "entries"
    table = book.parent / f"table.{form}"
    assert run("export", "--book", demo, "--format", form, "--output", table)[0] == 0
    assert run("import", table, "--book", book)[0] == 0
    made = _records(book)
    there = {path.stem: path for path in demo.rglob("NS*.yml")}
    assert made.keys() == there.keys()
    for entry, path in there.items():
        before, after = read_record(path, path.name).record, read_record(made[entry], path.name).record
        assert before is not None
        assert after == before
        assert digest(after) == digest(before)


# --- rows and the entries they made ---------------------------------------------------------------------------------


def test_a_row_makes_the_same_entry_in_every_book(run: Run, book: Path) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND)
    assert run("import", sheet, "--book", book)[0] == 0
    (entry,) = _records(book)
    # Frozen on 2026-12-01: were it another, every sheet imported before would be imported twice.
    assert (entry, is_identifier(entry)) == ("NS6C1ZHV2", True)


def test_class_and_leaving_group_follow_from_the_smiles(run: Run, book: Path) -> None:
    run("import", _csv(book.parent / "a.csv", SOUND), "--book", book)
    (path,) = _records(book).values()
    assert "  class: primary  # perceived from the SMILES\n" in path.read_text("utf-8")
    assert "  leaving_group: bromide  # perceived from the SMILES\n" in path.read_text("utf-8")


CHANGED = SOUND | {"outcome.measured.yield": "84 %"}


def test_a_changed_cell_is_told_and_not_written(run: Run, book: Path) -> None:
    run("import", _csv(book.parent / "a.csv", SOUND), "--book", book)
    (path,) = _records(book).values()
    before = path.read_bytes()
    code, out = run("import", _csv(book.parent / "a.csv", CHANGED), "--book", book)
    assert 'a.csv:S2: outcome.measured.1.yield: "84 %" in the sheet, "88 %" in the book' in out
    assert (code, path.read_bytes()) == (1, before)


def test_a_draft_follows_the_sheet_when_told_to(run: Run, book: Path) -> None:
    run("import", _csv(book.parent / "a.csv", SOUND), "--book", book)
    sheet = _csv(book.parent / "a.csv", CHANGED)
    (path,) = _records(book).values()
    (book / "moved").mkdir()
    path = path.rename(book / "moved" / path.name)
    assert run("import", sheet, "--book", book, "--update")[0] == 0
    assert "yield: 84 %" in path.read_text("utf-8")
    assert path.read_text("utf-8").startswith("# yaml-language-server: $schema=../schema/record-1.json\n")
    assert list(_records(book).values()) == [path]
    assert run("import", sheet, "--book", book)[1].endswith("1 row: 1 unchanged\nnothing written\n")


EDITS = {
    # what a person did to the record since -> what a changed sheet may do with --update
    "another value": ("20 mL", "25 mL"),
    "a status": ("status: draft", "status: current"),
    "a comment": ("performed:", "# run twice\nperformed:"),
}


@pytest.mark.parametrize(("old", "new"), EDITS.values(), ids=EDITS.keys())
def test_a_record_edited_by_hand_is_never_overwritten(run: Run, book: Path, old: str, new: str) -> None:
    run("import", _csv(book.parent / "a.csv", SOUND), "--book", book)
    (path,) = _records(book).values()
    path.write_text(path.read_text("utf-8").replace(old, new), "utf-8")
    edited = path.read_bytes()
    code, out = run("import", _csv(book.parent / "a.csv", CHANGED), "--book", book, "--update")
    assert "edited since its import, never overwritten" in out
    assert (code, path.read_bytes()) == (1, edited)


def test_what_a_person_added_is_no_difference(run: Run, book: Path) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND)
    run("import", sheet, "--book", book)
    (path,) = _records(book).values()
    text = path.read_text("utf-8").replace("status: draft", "status: current")
    path.write_text(text + "# a comment\nevidence: [1H NMR]\n", "utf-8")
    assert run("import", sheet, "--book", book) == (0, "1 row: 1 unchanged\nnothing written\n")


def test_a_current_record_is_not_changed_behind_its_revision(run: Run, book: Path) -> None:
    sheet = book.parent / "a.csv"
    run("import", _csv(sheet, SOUND | {"status": "current"}), "--book", book)
    assert run("import", _csv(sheet, CHANGED | {"status": "current"}), "--book", book, "--update")[0] == 1
    retitled = SOUND | {"status": "current", "title": "Another title"}
    assert run("import", _csv(sheet, retitled), "--book", book, "--update")[0] == 0


def test_an_entry_of_another_experiment_is_left_alone(run: Run, book: Path) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND)
    run("import", sheet, "--book", book)
    (path,) = _records(book).values()
    path.write_text(path.read_text("utf-8").replace("XB1/001", "XB1/777"), "utf-8")
    code, out = run("import", sheet, "--book", book, "--update")
    assert 'error row-identity-taken: NS6C1ZHV2 is there, and is another experiment: its notebook is "XB1/777"' in out
    assert code == 1


def test_a_retired_identifier_does_not_come_back(run: Run, book: Path) -> None:
    (book / "handbook.yml").write_text("format: 1\ntitle: A book for tests\nretired: [NS6C1ZHV2]\n", "utf-8")
    code, out = run("import", _csv(book.parent / "a.csv", SOUND), "--book", book)
    assert "NS6C1ZHV2 is retired" in out
    assert (code, _records(book)) == (1, {})


# --- nothing half-written -------------------------------------------------------------------------------------------


def test_a_failure_in_the_middle_leaves_nothing(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    rows = [SOUND, SOUND | {"notebook": "XB1/002"}, SOUND | {"notebook": "XB1/003"}]
    sheet = read_csv(_csv(book.parent / "a.csv", *rows).read_bytes(), "a.csv")
    planned = plan_import(sheet, ColumnMap(), Places(""), book=book, settings=None, into=book / "new" / "deep")
    replace, done = Path.replace, []

    def fails_at_the_third(self: Path, target: Path) -> Path:
        done.append(target)
        if len(done) == 3:
            raise OSError(28, "no space left")
        return replace(self, target)

    monkeypatch.setattr(Path, "replace", fails_at_the_third)
    with pytest.raises(OSError, match="no space"):
        write_import(planned, sound_rows=False)
    assert [path.name for path in book.iterdir()] == ["handbook.yml"]


# --- maps -----------------------------------------------------------------------------------------------------------

BAD_MAPS = [
    (
        "columns:\n  Temp: stages.temprature\n",
        'map.yml:2:9: error value-not-permitted: no record has a column "stages.temprature"; '
        'did you mean "stages.1.temperature"?',
    ),
    ("columns:\n  Temp: {to: title, units: g}\n", 'map.yml:2:21: error key-unknown: unknown key "units"; did you mean'),
    ("colums: {}\n", 'map.yml:1:1: error key-unknown: unknown key "colums"; did you mean "columns"?'),
    (
        "constants:\n  title: '{substrate.name} in {typo.name}'\n",
        'map.yml:2:10: error value-not-permitted: no record has a column "typo.name"',
    ),
    (
        "constants: {title: 'In {solvent.nam}'}\n",
        'map.yml:1:20: error value-not-permitted: no record has a column "solvent.nam"; did you mean "solvent.1.name"?',
    ),
    ("constants: {title: '{Solvent}'}\n", 'map.yml:1:20: error value-not-permitted: no record has a column "Solvent"'),
    ("constants: {ignore: x}\n", 'map.yml:1:13: error value-not-permitted: no record has a column "ignore"'),
]


@pytest.mark.parametrize(("text", "said"), BAD_MAPS)
def test_a_bad_map_is_told_with_its_line(run: Run, book: Path, text: str, said: str) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text(text, "utf-8")
    code, out = run("import", _csv(book.parent / "a.csv", SOUND), "--map", column_map, "--book", book)
    assert out.startswith(said)
    assert code == 1


def test_a_bad_constant_is_told_once_in_the_map(run: Run, book: Path) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text("constants:\n  stages.vessel: bucket\n", "utf-8")
    sheet = _csv(book.parent / "a.csv", SOUND, SOUND | {"notebook": "XB1/002"})
    code, out = run("import", sheet, "--map", column_map, "--book", book, "--sound-rows")
    assert out.count('map.yml:2:18: error value-not-permitted: stages.vessel "bucket": "bucket" is not permitted') == 1
    assert "2 rows: 2 refused" in out
    assert code == 1


@pytest.mark.parametrize(
    ("order", "typed", "said"),
    [
        ("D.M.Y", "14.3.2026", "date: 2026-03-14"),
        ("M/D/Y", "3/14/2026", "date: 2026-03-14"),
        ("M/D/Y", "2026-03-14", "date: 2026-03-14"),
        ("D/M/Y", "3/14/2026", "2026-14-03 is no day of the calendar"),
        ("D.M.Y", "14.3.26", '"14.3.26" is not a date'),
    ],
)
def test_dates_in_the_order_of_the_map(run: Run, book: Path, order: str, typed: str, said: str) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text(f"columns: {{performed.date: {{to: performed.date, date: {order}}}}}\n", "utf-8")
    sheet = _csv(book.parent / "a.csv", SOUND | {"performed.date": typed})
    _, out = run("import", sheet, "--map", column_map, "--book", book)
    assert said in out + "".join(path.read_text("utf-8") for path in _records(book).values())


def test_a_decimal_comma_is_none_in_a_name(run: Run, book: Path) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text("decimal_comma: true\n", "utf-8")
    row = SOUND | {"substrate.form": "2,4", "stages.note": "2,4-isomer", "solvent.volume": "2,5 mL"}
    assert run("import", _csv(book.parent / "a.csv", row), "--map", column_map, "--book", book)[0] == 0
    (path,) = _records(book).values()
    text = path.read_text("utf-8")
    assert "form: 2,4\n" in text
    assert "note: 2,4-isomer\n" in text
    assert "volume: 2.5 mL\n" in text


def test_a_title_filled_in_too_long_is_told_at_its_row(run: Run, book: Path) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text("constants: {title: '{substrate.name} in {solvent.1.name}'}\n", "utf-8")
    short = {key: value for key, value in SOUND.items() if key != "title"}
    rows = [short, short | {"notebook": "XB1/002", "solvent.name": "x" * 200}]
    code, out = run("import", _csv(book.parent / "a.csv", *rows), "--map", column_map, "--book", book, "--sound-rows")
    assert out.startswith("a.csv:3: error value-not-permitted: title: the text has 217 characters\n")
    (path,) = _records(book).values()
    assert "title: 1-bromobutane in DMF\n" in path.read_text("utf-8")
    assert code == 1


@pytest.mark.parametrize("solvent", ["solvent.name", "solvent.1.name"])
def test_a_column_in_braces_is_named_with_its_number_or_without(run: Run, book: Path, solvent: str) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text(f"constants: {{title: '{{substrate.name}} in {{{solvent}}}'}}\n", "utf-8")
    row = {key: value for key, value in SOUND.items() if key != "title"}
    run("import", _csv(book.parent / "a.csv", row), "--map", column_map, "--book", book)
    (path,) = _records(book).values()
    assert "title: 1-bromobutane in DMF\n" in path.read_text("utf-8")


def test_what_every_row_lacks_is_told_once(run: Run, book: Path) -> None:
    rows = [{key: value for key, value in SOUND.items() if key != "title"} | {"notebook": f"XB1/{n}"} for n in range(5)]
    _, out = run("import", _csv(book.parent / "a.csv", *rows), "--book", book)
    assert out.startswith("a.csv: every row: error key-missing: title is missing\n")
    assert out.count("key-missing") == 1


def test_an_unknown_heading_stops_everything(run: Run, book: Path) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND | {"Temperatur": "60"})
    code, out = run("import", sheet, "--book", book, "--sound-rows")
    assert out.startswith("a.csv:V1: error heading-unknown: no column of a record is called so\n")
    assert "fix:  map it to stages.1.temperature, or to ignore" in out
    assert (code, _records(book)) == (1, {})


def test_a_constant_of_an_item_holds_where_the_row_has_the_item(run: Run, book: Path) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text(
        "columns: {ee: outcome.measured.2.ee}\nconstants: {outcome.measured.2.of: A, outcome.measured.2.by: HPLC}\n",
        "utf-8",
    )
    rows = [SOUND | {"ee": "97 %"}, SOUND | {"notebook": "XB1/002", "ee": ""}]
    assert run("import", _csv(book.parent / "a.csv", *rows), "--map", column_map, "--book", book)[0] == 0
    assert sorted("by: HPLC" in path.read_text("utf-8") for path in _records(book).values()) == [False, True]


@pytest.mark.parametrize(
    ("more", "cell", "typed"),
    [
        ("decimal_comma: true\n", "1,37", "mass: 1.37 g"),
        ("words: {two: 2.0}\n", "two", "mass: 2.0 g"),
        ("", "1370 mg", "mass: 1370 mg"),
        ("empty: [-]\nconstants: {substrate.amount: 10 mmol}\n", "-", "amount: 10 mmol"),
        ("decimal_comma: true\nconstants: {substrate.form: '2,4-isomer, 3,5 %'}\n", "1", "form: 2,4-isomer, 3,5 %"),
    ],
)
def test_cells_are_read_as_the_map_says(run: Run, book: Path, more: str, cell: str, typed: str) -> None:
    column_map = book.parent / "map.yml"
    column_map.write_text("columns: {m: {to: substrate.mass, unit: g}}\n" + more, "utf-8")
    row = {key: value for key, value in SOUND.items() if key != "substrate.mass"} | {"m": cell}
    assert run("import", _csv(book.parent / "a.csv", row), "--map", column_map, "--book", book)[0] == 0
    (path,) = _records(book).values()
    assert typed in path.read_text("utf-8")


def test_a_first_map_is_read_again(run: Run, book: Path, messy: tuple[Path, Path]) -> None:
    sheet, _ = messy
    column_map = book.parent / "first.yml"
    assert run("import", sheet, "--write-map", column_map, "--book", book)[0] == 0
    text = column_map.read_text("utf-8")
    assert "'Temp / °C': {to: stages.1.temperature, unit: '°C'}  # such as 50\n" in text
    assert "'Fridge shelf': ignore" in text
    code, out = run("import", sheet, "--map", column_map, "--book", book, "--dry-run")
    assert code == 1
    assert re.findall(r"first.yml:(\d+):\d+: error gap-left-open", out)
    filled = text.replace("TO FILL IN", "isolated", 2).replace("result: isolated", "result: substitution")
    (book.parent / "filled.yml").write_text(filled, "utf-8")
    _, out = run("import", sheet, "--map", book.parent / "filled.yml", "--book", book, "--dry-run")
    assert "heading-unknown" not in out
    assert "gap-left-open" not in out
    assert run("import", sheet, "--write-map", column_map, "--book", book)[0] == 2
    assert column_map.read_text("utf-8") == text


AS_KEPT = [
    # heading, cells, what the map says
    ("Run", ["1", "2", "3"], "ignore  # NOT KEPT: such as 1"),
    ("Runs", ["1", "2", "3"], "ignore  # NOT KEPT: such as 1"),
    ("Runs", ["2", "2", "2"], "performed.runs  # such as 2"),
    ("Product", ["CCCCN=[N+]=[N-]", "CCCC#N", "CCCCI"], "outcome.products.1.smiles  # such as CCCCN=[N+]=[N-]"),
    ("Product", ["butyl azide", "HI", "CO"], "outcome.products.1.name  # such as butyl azide"),
    ("V (mL)", ["20", "20", "10"], "{to: solvent.1.volume, unit: 'mL'}  # such as 20"),
    ("t", ["16 h", "2 h", "3 h"], "stages.1.time  # such as 16 h"),
    ("t (°C)", ["60", "60", "25"], "{to: stages.1.temperature, unit: '°C'}  # such as 60"),
    ("Shelf", ["B2", "B2", "B3"], "ignore  # NOT KEPT: such as B2"),
    ("Shelf", ["", "", ""], "ignore  # empty"),
]


@pytest.mark.parametrize(("heading", "cells", "said"), AS_KEPT)
def test_a_first_map_looks_at_the_cells_and_says_what_is_not_kept(
    run: Run, book: Path, heading: str, cells: list[str], said: str
) -> None:
    rows = [{"Exp": f"XB1/{number}", heading: cell} for number, cell in enumerate(cells)]
    column_map = book.parent / "first.yml"
    code, out = run("import", _csv(book.parent / "a.csv", *rows), "--write-map", column_map, "--book", book)
    text = column_map.read_text("utf-8")
    assert f"  '{heading}': {said}\n" in text
    assert (f"not kept, unless the map says where they go: {heading}\n" in out) == ("NOT KEPT" in said)
    assert code == 0


def test_a_first_map_says_no_fact_that_nobody_said(run: Run, book: Path) -> None:
    column_map = book.parent / "first.yml"
    run("import", _csv(book.parent / "a.csv", {"Exp": "XB1/1"}), "--write-map", column_map, "--book", book)
    text = column_map.read_text("utf-8")
    for name in ("performed.by", "outcome.result", "outcome.measured.1.kind"):
        assert f"  {name}: TO FILL IN  # " in text


HEADINGS = [
    ("Temp (°C)", "Temp", "°C", "stages.1.temperature"),
    ("Rxn time / h", "Rxn time", "h", None),
    ("Isolated yield [%]", "Isolated yield", "%", "outcome.measured.1.yield"),
    ("Notebook page", "Notebook page", None, "notebook"),
    ("substrate.mass", "substrate.mass", None, "substrate.mass"),
    ("Exp. no. (old)", "Exp. no. (old)", None, None),
]


@pytest.mark.parametrize(("heading", "bare", "unit", "column"), HEADINGS)
def test_headings(heading: str, bare: str, unit: str | None, column: str | None) -> None:
    assert split_unit(heading) == (bare, unit)
    assert likely_column(heading) == column or column is None


# --- files ----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("delimiter", "encoding", "note"),
    [
        (",", "utf-8", ""),
        (";", "utf-8-sig", "note: cells are set apart by semicolons\n"),
        ("\t", "utf-16", "note: cells are set apart by tabs\n"),
        (",", "cp1252", "note: read as Windows-1252, for it is no UTF-8: look at °, µ and accents\n"),
    ],
)
def test_csv_as_programs_write_it(run: Run, book: Path, delimiter: str, encoding: str, note: str) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND, delimiter=delimiter, encoding=encoding)
    assert run("import", sheet, "--book", book) == (0, f"{note}1 row: 1 new\n1 record written; now `handbook check`\n")
    (path,) = _records(book).values()
    assert "temperature: 60 °C" in path.read_text("utf-8")


def test_a_line_that_names_the_delimiter_is_no_heading(run: Run, book: Path) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND | {"title": "one, two, three"}, delimiter=";")
    sheet.write_bytes(b"sep=;\r\n" + sheet.read_bytes())
    assert run("import", sheet, "--book", book)[0] == 0


def test_headings_below_a_title(run: Run, book: Path) -> None:
    sheet = _csv(book.parent / "a.csv", SOUND)
    sheet.write_bytes(b"Screening of azides\r\n\r\n" + sheet.read_bytes())
    (book.parent / "map.yml").write_text("heading_row: 3\n", "utf-8")
    assert run("import", sheet, "--map", book.parent / "map.yml", "--book", book)[0] == 0


def _below_a_title(workbook: Any) -> None:
    sheet = workbook.active
    sheet.insert_rows(1, 2)
    sheet["A1"] = "Screening of azides"


@pytest.mark.parametrize("ending", ["csv", "xlsx"])
def test_headings_below_a_title_are_found(run: Run, book: Path, ending: str) -> None:
    sheet, column_map = book.parent / f"a.{ending}", book.parent / "first.yml"
    if ending == "xlsx":
        _saved(sheet, _below_a_title)
    else:
        _csv(sheet, SOUND)
        sheet.write_bytes(b"Screening of azides\r\n\r\n" + sheet.read_bytes())
    said = "the headings seem to stand in row 3, below a title in row 1; "
    code, out = run("import", sheet, "--book", book)
    assert f"{said}say --heading-row 3, or heading_row: 3 in the map (or 1 if they do not)" in out
    assert (code, _records(book)) == (2, {})
    code, out = run("import", sheet, "--write-map", column_map, "--book", book)
    assert f"{said}the map says heading_row: 3" in out
    assert "\nheading_row: 3\n" in column_map.read_text("utf-8")
    assert "  'substrate.smiles': substrate.smiles  # such as CCCCBr\n" in column_map.read_text("utf-8")
    assert run("import", sheet, "--heading-row", "3", "--book", book)[0] == 0


def test_a_formula_in_a_text_is_guarded_and_comes_back(run: Run, book: Path) -> None:
    texts = ["=1+1", "+49", "-78 °C bath", "@home", "'quoted", "'=x"]
    rows = [SOUND | {"notebook": f"XB1/{n}", "take_away": text} for n, text in enumerate(texts)]
    table = book.parent / "a.jsonl"
    table.write_text("".join(json.dumps(row) + "\n" for row in rows), "utf-8")
    assert run("import", table, "--book", book)[0] == 0
    exported = book.parent / "b.csv"
    run("export", "--book", book, "--output", exported)
    with exported.open(encoding="utf-8-sig", newline="") as file:
        cells = [cell for row in list(csv.reader(file))[1:] for cell in row]
    assert not [cell for cell in cells if cell.startswith(("=", "+", "-", "@"))]
    assert run("import", exported, "--book", book)[1].endswith("6 rows: 6 unchanged\nnothing written\n")


def _saved(path: Path, change: Callable[[Any], None]) -> Path:
    workbook = Workbook()
    sheet = workbook.active
    assert sheet is not None
    sheet.append(list(SOUND))
    sheet.append(list(SOUND.values()))
    change(workbook)
    workbook.save(path)
    return path


def test_a_workbook_with_two_sheets_wants_one_named(run: Run, book: Path) -> None:
    sheet = _saved(book.parent / "a.xlsx", lambda workbook: workbook.create_sheet("Other"))
    code, out = run("import", sheet, "--book", book)
    assert "a.xlsx has 2 sheets; name one by --sheet: Sheet, Other" in out
    assert code == 2
    assert run("import", sheet, "--sheet", "Sheet", "--book", book)[0] == 0


def test_hidden_and_merged_rows_are_told(run: Run, book: Path) -> None:
    def change(workbook: Any) -> None:
        workbook.active.append([value if key != "notebook" else "XB1/002" for key, value in SOUND.items()])
        workbook.active.row_dimensions[3].hidden = True
        workbook.active.merge_cells("D2:D3")

    _, out = run("import", _saved(book.parent / "a.xlsx", change), "--book", book)
    assert "note: hidden rows are read as well: 3\n" in out
    assert "note: merged cells hold their value in their first row only: D2:D3\n" in out
    assert "a.xlsx!Sheet:3: error key-missing: performed: by is missing" in out


# by hand, as a spreadsheet program shows them
NUMBERS = [
    (1.2, "0.00", "1.20"),
    (0.88, "0%", "88 %"),
    (0.885, "0.0%", "88.5 %"),
    (4, "000", "004"),
    (2.083, "0.0", "2.083"),
    (0.1 + 0.2, "General", "0.3"),
    (1e-7, "General", "0.0000001"),
    (1e20, "0.00", "100000000000000000000"),
    (1500, '#,##0.0" mg"', "1500.0"),
]


@pytest.mark.parametrize(("value", "number_format", "text"), NUMBERS)
def test_numbers_keep_their_digits(value: float, number_format: str, text: str) -> None:
    assert number_as_shown(value, number_format) == text


ALTERED = [
    ("er", dt.time(1, 1), "into the time 1:01:00", "1:1 if it was a ratio"),
    ("er", dt.timedelta(days=4, hours=1, minutes=3), "into the time 97:03:00", "97:3 if it was a ratio"),
    ("cas", dt.datetime(2020, 10, 5), "into the date 2020-10-05", "format the column as text"),
    ("name", dt.datetime(2026, 3, 1), "into the date 2026-03-01", "format the column as text"),
]


REFUSED = [
    # columns of a row, the first finding, how many there are
    ({"take_away": "TO FILL IN"}, "a.csv:V2: error gap-left-open", 1),
    ({"work_up": "; ".join(["w"] * 40_000)}, "a.csv:2: error alias-overgrown", 1),
    ({"nucleophile": "solvent"}, "a.csv:H2: error column-twice", 3),
    ({"substrate.er": "97:03:00"}, "a.csv:V2: error cell-altered", 1),
    ({"performed.runs": "007"}, "a.csv:V2: error value-wrong-type", 1),
    ({"outcome.failure.repeated": "yes"}, "a.csv:V2: error boolean-word", 1),
    ({"stages.2.temperature": "5 °C"}, "a.csv:2: error key-missing: stages.2: time is missing", 1),
    ({"substrate.smiles": "CCCC"}, "a.csv:2: error key-missing: substrate: class is missing", 2),
    ({"substrate.smiles": "CC(C"}, "a.csv:F2: error structure-unreadable", 1),
]


@pytest.mark.parametrize(("more", "said", "count"), REFUSED)
def test_refused_at_the_cell(run: Run, book: Path, more: dict[str, str], said: str, count: int) -> None:
    row = SOUND | more | ({"outcome.failure.cause": "x"} if "outcome.failure.repeated" in more else {})
    code, out = run("import", _csv(book.parent / "a.csv", row), "--book", book, "--sound-rows")
    assert out.startswith(said)
    assert out.count(": error ") == count
    assert (code, _records(book)) == (1, {})


@pytest.mark.parametrize(("key", "value", "said", "mend"), ALTERED)
def test_what_a_spreadsheet_turned_is_named(
    run: Run, book: Path, key: str, value: object, said: str, mend: str
) -> None:
    def change(workbook: Any) -> None:
        names = list(SOUND)
        column = names.index(f"substrate.{key}") + 1 if key == "name" else len(names) + 1
        workbook.active.cell(1, column, f"substrate.{key}")
        workbook.active.cell(2, column, value)

    code, out = run("import", _saved(book.parent / "a.xlsx", change), "--book", book)
    assert "error cell-altered" in out
    assert said in out
    assert mend in out
    assert code == 1


# --- files that mean harm -------------------------------------------------------------------------------------------


def _zipped(path: Path, parts: dict[str, str]) -> Path:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as file:
        for name, text in parts.items():
            file.writestr(name, text)
    return path


def _with_part(path: Path, name: str, text: str) -> Path:
    """Return a workbook with one part replaced."""
    whole = _saved(path, lambda _: None)
    with zipfile.ZipFile(whole) as file:
        parts = {each: file.read(each).decode() for each in file.namelist()}
    return _zipped(path, {**parts, name: text})


def _with_rows(path: Path, *rows: str) -> Path:
    """Return a workbook with more rows below its own, as XML."""
    with zipfile.ZipFile(_saved(path, lambda _: None)) as file:
        text = file.read("xl/worksheets/sheet1.xml").decode()
    return _with_part(path, "xl/worksheets/sheet1.xml", text.replace("</sheetData>", f"{''.join(rows)}</sheetData>"))


def _empty_row(number: int | str, column: str = "A") -> str:
    return f'<row r="{number}"><c r="{column}{number}"/></row>'


def _elsewhere(path: Path) -> Path:
    """Return a workbook whose sheet lies outside the folder of workbooks."""
    with zipfile.ZipFile(path) as file:
        parts = {each: file.read(each).decode() for each in file.namelist()}
    parts["sheets/one.xml"] = parts.pop("xl/worksheets/sheet1.xml")
    return _zipped(
        path, {name: text.replace("/xl/worksheets/sheet1.xml", "/sheets/one.xml") for name, text in parts.items()}
    )


_ENTITIES = '<!DOCTYPE x [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;&a;">]><worksheet><x>&b;</x></worksheet>'
HARM: dict[str, tuple[Callable[[Path], Path], str]] = {
    "entities": (
        lambda path: _with_part(path, "xl/worksheets/sheet1.xml", _ENTITIES),
        "declares a document type in xl/worksheets/sheet1.xml",
    ),
    "entities in a part of another name": (
        lambda path: _with_part(path, "xl/worksheets/sheet1.XML", _ENTITIES),
        "declares a document type in xl/worksheets/sheet1.XML",
    ),
    "entities in a part without an ending": (
        lambda path: _with_part(path, "xl/sheet", _ENTITIES),
        "declares a document type in xl/sheet",
    ),
    "a row where no sheet is": (lambda path: _with_rows(path, _empty_row(2_000_000_000)), "has a row beyond 1,048,576"),
    "a row further than that": (lambda path: _with_rows(path, _empty_row("9" * 400)), "has a row beyond 1,048,576"),
    "a row where no sheet is, in an unusual part": (
        lambda path: _elsewhere(_with_rows(path, _empty_row(4_000_000))),
        "has a row beyond 1,048,576",
    ),
    "many rows up to the last column": (
        lambda path: _with_rows(path, *(_empty_row(3 + n, "XFD") for n in range(1_300))),
        "spans more than 20,000,000 cells",
    ),
    "no workbook": (lambda path: _zipped(path, {"a.txt": "x"}), "is no workbook that can be read"),
    "no zip": (lambda path: path.write_bytes(b"PK\x03\x04 and no more") and path, "is no .xlsx workbook"),
    "broken": (lambda path: _with_part(path, "xl/workbook.xml", "<workbook <"), "holds broken XML in xl/workbook.xml"),
    "bomb": (
        lambda path: _with_part(path, "xl/bomb.bin", "0" * (201 * 1024**2)),
        "unpacks to more than 200 MB",
    ),
}


@pytest.mark.parametrize(("make", "said"), HARM.values(), ids=HARM.keys())
def test_a_workbook_that_means_harm_is_refused(run: Run, book: Path, make: Callable[[Path], Path], said: str) -> None:
    code, out = run("import", make(book.parent / "a.xlsx"), "--book", book)
    assert said in out
    assert (code, _records(book)) == (2, {})


def test_a_picture_in_a_workbook_is_no_broken_xml(run: Run, book: Path) -> None:
    sheet = _with_part(book.parent / "a.xlsx", "xl/media/image1.png", "\x89PNG\r\n\x1a\n\0\0\0\rIHDR")
    assert run("import", sheet, "--book", book)[0] == 0


def test_empty_cells_far_to_the_right_are_no_columns(run: Run, book: Path) -> None:
    sheet = _with_rows(book.parent / "a.xlsx", _empty_row(3, "XFD"), _empty_row(1_048_576))
    assert run("import", sheet, "--book", book)[0] == 0


HARMFUL_LINES = [
    ('{"a": ' + "9" * 5_000 + "}", "a.jsonl:1 is no object of texts: quote every value, numbers too"),
    ('{"a\\ud800": "x"}', "a.jsonl:1 holds half a character"),
    ('{"a": "\\udfff"}', "a.jsonl:1 holds half a character"),
]


@pytest.mark.parametrize(("line", "said"), HARMFUL_LINES)
@pytest.mark.parametrize("writes_map", [False, True])
def test_a_line_that_is_none_is_told(run: Run, book: Path, line: str, said: str, *, writes_map: bool) -> None:
    sheet, column_map = book.parent / "a.jsonl", book.parent / "a.yml"
    sheet.write_text(line, "utf-8")
    code, out = run("import", sheet, "--book", book, *(["--write-map", column_map] if writes_map else []))
    assert said in out
    assert (code, column_map.exists()) == (2, False)


# --- what an import writes besides ----------------------------------------------------------------------------------


@pytest.mark.parametrize("option", ["--report", "--write-map"])
@pytest.mark.parametrize(
    ("target", "said"),
    [
        ("a.csv", "is the sheet itself"),
        ("map.yml", "is the map itself"),
        ("link.yml", "is the map itself"),
        ("entries/handbook.yml", "lies inside the book"),
        ("entries/new/cells.csv", "lies inside the book"),
    ],
)
def test_nothing_is_written_over_what_is_read(run: Run, book: Path, option: str, target: str, said: str) -> None:
    folder = book.parent
    (folder / "map.yml").write_text("columns: {}\n", "utf-8")
    (folder / "link.yml").symlink_to(folder / "map.yml")
    _csv(folder / "a.csv", SOUND | {"stages.temperature": "hot"})
    before = {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()}
    code, out = run("import", folder / "a.csv", "--map", folder / "map.yml", option, folder / target, "--book", book)
    assert f"{option} " in out
    assert said in out
    assert code == 2
    assert {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()} == before


def test_a_map_that_fails_leaves_nothing(run: Run, book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fails(*_: object) -> None:
        raise OSError(28, "no space left")

    monkeypatch.setattr(Path, "hardlink_to", fails)
    monkeypatch.setattr(Path, "replace", fails)
    sheet, column_map = _csv(book.parent / "a.csv", SOUND), book.parent / "a.yml"
    code, _ = run("import", sheet, "--write-map", column_map, "--book", book)
    assert (code, sorted(path.name for path in book.parent.iterdir())) == (2, ["a.csv", "entries"])


def test_an_updated_draft_keeps_its_permissions(run: Run, book: Path) -> None:
    run("import", _csv(book.parent / "a.csv", SOUND), "--book", book)
    (path,) = _records(book).values()
    path.chmod(0o640)
    run("import", _csv(book.parent / "a.csv", CHANGED), "--book", book, "--update")
    assert "yield: 84 %" in path.read_text("utf-8")
    assert path.stat().st_mode & 0o777 == 0o640


def test_a_declared_size_is_not_believed(run: Run, book: Path) -> None:
    sheet = _saved(book.parent / "a.xlsx", lambda _: None)
    with zipfile.ZipFile(sheet) as file:
        text = file.read("xl/worksheets/sheet1.xml").decode()
    assert 'ref="A1:U2"' in text
    huge = _with_part(book.parent / "b.xlsx", "xl/worksheets/sheet1.xml", text.replace("A1:U2", "A1:XFD1048576"))
    assert run("import", huge, "--book", book)[0] == 0


@pytest.mark.parametrize("entry", ["../../NS6C1ZHV2", "NS6C1ZHV2/../x", "/etc/passwd", "NS6C1ZHV3"])
def test_an_entry_is_no_path(run: Run, book: Path, entry: str) -> None:
    code, out = run("import", _csv(book.parent / "a.csv", SOUND | {"entry": entry}), "--book", book, "--sound-rows")
    assert f'entry "{entry}"' in out
    assert (code, [path.name for path in book.parent.rglob("*.yml")]) == (1, ["handbook.yml"])


@pytest.mark.parametrize(
    ("into", "said"),
    [
        ("../away", "is no folder inside the book"),
        ("archive", "no records are read from there"),
        (".git/x", "no records are read from there"),
    ],
)
def test_records_go_where_records_are_read(run: Run, book: Path, into: str, said: str) -> None:
    code, out = run("import", _csv(book.parent / "a.csv", SOUND), "--book", book, "--into", book / into)
    assert said in out
    assert code == 2


def test_json_has_stable_keys(run: Run, book: Path) -> None:
    code, out = run("import", _csv(book.parent / "a.csv", SOUND, CHANGED), "--book", book, "--json")
    told = json.loads(out)
    assert (told["rows"], told["new"], told["refused"], told["written"], code) == (2, 0, 2, [], 1)
    assert [(each["where"], each["row"]) for each in told["findings"]] == [("a.csv:2", 2), ("a.csv:3", 3)]
    assert {each["rule"] for each in told["findings"]} == {"row-repeated"}
