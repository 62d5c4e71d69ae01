"""The table of a book: what goes out, in which shape, and what stays inside."""

import csv
import io
import json
from pathlib import Path

import pytest

from builder.book import record_files
from builder.publish.export import Exported, csv_text, exported_records, jsonl_text, within
from builder.records.specimen import with_example
from builder.records.vocabulary import Status

INTERNAL, CLEARED, PUBLISHED, UNDER_FILING = "NS4T9XQ2N", "NS7K3QFMC", "NS3V6TDMZ", "NS2H8WDRW"


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
    assert [each.record.entry for each in within(_exported(book), only, statuses)] == entries


def test_what_is_kept_back_is_not_even_named(book: Path) -> None:
    records = within(_exported(book), "cleared", ())
    for text in (csv_text(records), jsonl_text(records)):
        assert INTERNAL not in text
        assert UNDER_FILING not in text
    cleared = next(each for each in records if each.record.entry == CLEARED)
    assert cleared.cells["related"] == PUBLISHED


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
