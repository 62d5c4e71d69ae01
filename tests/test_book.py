"""A book is the same however its records are shared out; what has not changed is not read again."""

import hashlib
import multiprocessing
import shutil
from pathlib import Path

import pytest

from builder import book as book_module
from builder.book import Book, Memory, open_book, read_shelf
from builder.checks.case import Case
from builder.records.specimen import with_example
from tests.browser.built import GOOD, RECORDS
from tests.checks.test_rxn_file import RECORD, RXN
from tests.specimens import TODAY


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    entries = tmp_path / "entries"
    entries.mkdir()
    (entries / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    for name in RECORDS:
        shutil.copy(GOOD / f"{name}.yml", entries)
    return entries


def _name(case: Case) -> str:
    return case.record.substrate.name


@pytest.mark.parametrize("method", ["fork", "spawn"])
def test_processes_change_nothing(folder: Path, method: str, monkeypatch: pytest.MonkeyPatch) -> None:
    if method not in multiprocessing.get_all_start_methods():
        pytest.skip(f"this system does not {method}")
    alone = open_book(folder, today=TODAY, keep=_name)
    monkeypatch.setattr(book_module, "SHARE", 1)
    monkeypatch.setattr(book_module, "get_context", lambda: multiprocessing.get_context(method))
    assert open_book(folder, today=TODAY, keep=_name, processes=2) == alone
    assert [entry.id for entry in alone.entries] == sorted(RECORDS)


class _Counting:
    """Keeps the name of the substrate, and notes which records it was asked for."""

    def __init__(self) -> None:
        self.seen: list[str] = []

    def __call__(self, case: Case) -> str:
        self.seen.append(case.record.entry)
        return _name(case)


def test_only_what_changed_is_read_again(folder: Path) -> None:
    memory = Memory()
    keep = _Counting()

    def read() -> tuple[list[str], Book[str]]:
        keep.seen.clear()
        opened = open_book(folder, today=TODAY, keep=keep, memory=memory)
        return sorted(keep.seen), opened

    assert read()[0] == sorted(RECORDS)
    assert read()[0] == []
    changed = folder / f"{RECORDS[0]}.yml"
    changed.write_text(changed.read_text("utf-8") + "take_away: Another one.\n", "utf-8")
    seen, opened = read()
    assert seen == [RECORDS[0]]
    assert opened == open_book(folder, today=TODAY, keep=_name)
    (folder / "handbook.yml").write_text("format: 1\ntitle: Another title\n", "utf-8")
    assert read()[0] == sorted(RECORDS)


def test_a_record_that_names_a_file_is_read_again_with_it(folder: Path) -> None:
    sha = hashlib.sha256(RXN.encode()).hexdigest()
    drawn = folder / "scheme.rxn"
    drawn.write_text(RXN, "utf-8", newline="\n")
    (folder / "NS4T9XQ2N.yml").write_text(
        with_example(RECORD.format(path=drawn.name, sha=sha, product="product 1")),
        "utf-8",
    )
    memory = Memory()
    before = open_book(folder, today=TODAY, keep=_name, memory=memory)
    drawn.write_text("no longer what it was", "utf-8")
    after = open_book(folder, today=TODAY, keep=_name, memory=memory)
    assert "NS4T9XQ2N" in {entry.id for entry in before.entries}
    assert "NS4T9XQ2N" not in {entry.id for entry in after.entries}


def test_a_shelf_holds_what_can_be_read_and_opens_it_when_asked(folder: Path) -> None:
    (folder / "NS4T9XQ2N.yml").write_text(with_example("status: finished"), "utf-8")
    shelf = read_shelf(folder, TODAY)
    assert sorted(shelf.records) == sorted(RECORDS)
    for entry, (record, path) in shelf.records.items():
        case = shelf.case(entry)
        assert case.record == record
        assert case.file == f"entries/{path.name}"
        assert ("substrate",) in case.structures
    with pytest.raises(KeyError):
        shelf.case("NS4T9XQ2N")
