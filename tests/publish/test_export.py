"""The table of a book: what goes out, in which shape, and what stays inside."""

import csv
import io
import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from builder import cli
from builder.book import record_files
from builder.publish.export import Exported, csv_text, exported_records, jsonl_text, within
from builder.records.flat import name_of
from builder.records.reader import read_bytes
from builder.records.schema import record_schema
from builder.records.specimen import with_example
from builder.records.vocabulary import Status

INTERNAL, CLEARED, PUBLISHED, UNDER_FILING = "NS4T9XQ2N", "NS7K3QFMC", "NS3V6TDMZ", "NS2H8WDRW"
OUTDATED, REPLACED = "NS6C1ZHV2", "NSC0W7N51"


@pytest.fixture
def book(tmp_path: Path) -> Path:
    for entry, words in (
        (INTERNAL, "status: draft\ntitle: Kept inside"),
        (CLEARED, f"disclosure: cleared\nrelated: [{INTERNAL}, {PUBLISHED}]\ntitle: Cleared"),
        (PUBLISHED, f"disclosure: published\npreceded_by: {INTERNAL}\ntitle: Published"),
        (UNDER_FILING, "disclosure: under filing\ntitle: Under filing"),
    ):
        (tmp_path / f"{entry}.yml").write_text(with_example(f"entry: {entry}\n{words}"), "utf-8")
    return tmp_path


def _exported(book: Path) -> list[Exported]:
    return [each for each in exported_records(book, record_files(book)[0]) if isinstance(each, Exported)]


@pytest.mark.parametrize(
    ("only", "statuses", "entries"),
    [
        (None, (), [UNDER_FILING, PUBLISHED, INTERNAL, CLEARED]),
        ("cleared", (), [PUBLISHED, CLEARED]),
        ("published", (), [PUBLISHED]),
        (None, (Status.DRAFT,), [INTERNAL]),
        ("cleared", (Status.DRAFT,), []),
    ],
)
def test_what_goes_out(book: Path, only: str | None, statuses: tuple[Status, ...], entries: list[str]) -> None:
    assert [each.record.entry for each in within(_exported(book), only, statuses).records] == entries


def test_what_is_kept_back_is_not_even_named(book: Path) -> None:
    _add_superseded(book)
    going = within(_exported(book), "cleared", ())
    records = going.records
    assert {each.record.entry for each in records} == {CLEARED, PUBLISHED, REPLACED}
    assert going.left_out == {OUTDATED: "superseded.by"}
    for text in (csv_text(records), jsonl_text(records)):
        assert INTERNAL not in text
        assert UNDER_FILING not in text
        assert OUTDATED not in text
    cleared = next(each for each in records if each.record.entry == CLEARED)
    assert cleared.cells["related"] == PUBLISHED


def _add_superseded(book: Path) -> None:
    for entry, by in ((OUTDATED, INTERNAL), (REPLACED, PUBLISHED)):
        superseded = f"superseded: {{by: {by}, date: 2026-03-14, because: better data}}\nrelated: {OUTDATED}"
        words = f"entry: {entry}\nstatus: superseded\ndisclosure: cleared\n{superseded}"
        (book / f"{entry}.yml").write_text(with_example(words), "utf-8")


def test_whoever_exports_is_told_what_is_left_out(book: Path, capsysbinary: pytest.CaptureFixture[bytes]) -> None:
    _add_superseded(book)
    with pytest.raises(SystemExit) as stop:
        cli.main(["export", "--only", "cleared", "--book", str(book)])
    out, err = capsysbinary.readouterr()
    assert OUTDATED.encode() not in out
    assert f"{OUTDATED} is left out, for its superseded.by names an entry that is kept back\n" in err.decode()
    assert "3 entries exported\n" in err.decode()
    assert not stop.value.code


def test_a_table_is_not_written_among_the_records(book: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (record, *_) = sorted(book.rglob("NS*.yml"))
    before = record.read_bytes()
    with pytest.raises(SystemExit) as ended:
        cli.main(["export", "--book", str(book), "--output", str(record)])
    assert (ended.value.code, record.read_bytes()) == (2, before)
    assert "lies inside the book" in capsys.readouterr().err


def test_a_superseded_record_may_name_what_is_cleared_and_not_chosen(book: Path) -> None:
    _add_superseded(book)
    (record,) = within(_exported(book), "cleared", [Status.SUPERSEDED]).records
    assert (record.record.entry, record.cells["superseded.by"]) == (REPLACED, PUBLISHED)


def test_every_entry_that_a_record_may_name_is_a_reference() -> None:
    """By `Record.references` an export knows what it must not name."""
    superseded = f"superseded: {{by: {INTERNAL}, date: 2026-03-14, because: better data}}"
    words = f"status: superseded\nrelated: [{CLEARED}]\npreceded_by: [{PUBLISHED}]\n{superseded}"
    record = read_bytes(with_example(words).encode(), "NS.yml").record
    assert record is not None
    named = {name_of(tuple(step for step in path if isinstance(step, str))) for path, _ in record.references}
    schema = record_schema([], [])
    assert named == set(_identifiers(schema, schema["$defs"])) - {"entry"}


def _identifiers(part: dict[str, Any], parts: dict[str, Any], name: str = "") -> Iterator[str]:
    """Yield the names under which an identifier of an entry may stand in a part of a JSON Schema."""
    if part.get("format") == "entry":
        yield name
    inner = [(name, each) for word in ("oneOf", "anyOf", "allOf") for each in part.get(word, ())]
    inner += [(name, part[word]) for word in ("if", "then", "else", "items") if isinstance(part.get(word), dict)]
    inner += [(f"{name}.{key}".lstrip("."), each) for key, each in part.get("properties", {}).items()]
    inner += [(name, parts[part["$ref"].rpartition("/")[2]])] if "$ref" in part else []
    for at, each in inner:
        yield from _identifiers(each, parts, at)


def test_csv_is_a_row_a_record_under_the_union_of_columns(book: Path) -> None:
    text = csv_text(_exported(book))
    assert text.count("\r\n") == 5
    header, *rows = csv.reader(io.StringIO(text, newline=""))
    assert header[:4] == ["format", "entry", "revision", "status"]
    assert header[-3:] == ["related", "preceded_by", "disclosure"]
    assert {len(row) for row in rows} == {len(header)}
    assert [row[header.index("disclosure")] for row in rows] == ["under filing", "published", "internal", "cleared"]


def test_json_lines_hold_texts_as_typed(book: Path) -> None:
    lines = [json.loads(line) for line in jsonl_text(_exported(book)).splitlines()]
    assert [line["entry"] for line in lines] == [UNDER_FILING, PUBLISHED, INTERNAL, CLEARED]
    assert {type(value) for line in lines for value in line.values()} == {str}
    assert {len(line["digest"]) for line in lines} == {64}
    assert lines[0]["nucleophile.1.equivalents"] == "1.5"


def test_a_file_that_cannot_be_read_is_named(book: Path) -> None:
    (book / "NSC0W7N51.yml").write_text("title: [", "utf-8")
    assert "NSC0W7N51.yml" in list(exported_records(book, record_files(book)[0]))
