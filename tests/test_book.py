"""A book is the same however its records are shared out."""

import multiprocessing
import shutil
from pathlib import Path

import pytest

from builder import book as book_module
from builder.book import open_book
from builder.checks.case import Case
from tests.browser.built import GOOD, RECORDS
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
