"""What a build remembers: only what is still true, and pages made from it are the same to the byte."""

import os
import pickle
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

import builder.book
import builder.publish.memory as memory_module
from builder.book import Book, Memory, open_book
from builder.publish.memory import load_memory, save_memory
from builder.publish.portrait import Portrait, portrait_of
from tests.browser.built import RECORDS, build, files_of, good_texts, write_book
from tests.specimens import TODAY

if TYPE_CHECKING:
    from collections.abc import Callable


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return the folder of a small book, with a cache folder of its own."""
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "cache"))
    write_book(tmp_path, good_texts())
    return tmp_path / "entries"


def _opened(folder: Path, memory: Memory) -> Book[Portrait]:
    return open_book(folder, today=TODAY, keep=portrait_of, memory=memory)


@pytest.fixture
def examined(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """List the files that are examined from now on."""
    seen: list[str] = []
    plain: Callable[..., object] = builder.book.examine

    def noted(reading: object, *others: object, **more: object) -> object:
        seen.append(Path(reading.file).stem)  # type: ignore[attr-defined]
        return plain(reading, *others, **more)

    monkeypatch.setattr(builder.book, "examine", noted)
    return seen


def test_what_has_not_changed_is_not_examined_again(folder: Path, examined: list[str]) -> None:
    first = _opened(folder, memory := Memory())
    assert sorted(examined) == sorted(RECORDS)
    save_memory(folder, memory)
    examined.clear()
    second = _opened(folder, load_memory(folder))
    assert examined == []
    assert second == first


def test_a_changed_record_is_examined_again_and_a_removed_one_forgotten(folder: Path, examined: list[str]) -> None:
    _opened(folder, memory := Memory())
    changed = folder / "NS2H8WDRW.yml"
    changed.write_text(changed.read_text("utf-8").replace("NaN3", "NaN3 ") + "\ntake_away: another\n", "utf-8")
    (folder / "NS9PZ4GK7.yml").unlink()
    examined.clear()
    book = _opened(folder, memory)
    assert examined == ["NS2H8WDRW"]
    assert book.by_id["NS2H8WDRW"].record.take_away == "another"
    assert "entries/NS9PZ4GK7.yml" not in memory.held


@pytest.mark.parametrize("line", ["people: [{code: bench-9, shown_as: somebody}]\n", "review_interval_months: 12\n"])
def test_other_settings_are_asked_of_every_record_again(folder: Path, examined: list[str], line: str) -> None:
    _opened(folder, memory := Memory())
    settings = folder / "handbook.yml"
    settings.write_text(settings.read_text("utf-8") + line, "utf-8")
    examined.clear()
    _opened(folder, memory)
    assert sorted(examined) == sorted(RECORDS)


def test_another_tool_begins_anew(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    _opened(folder, memory := Memory())
    save_memory(folder, memory)
    assert load_memory(folder).held
    monkeypatch.setattr(memory_module, "tool_identity", lambda: "another tool")
    assert load_memory(folder).held == {}


@pytest.mark.parametrize("cut", [0, 10, -10])
def test_a_spoilt_memory_is_none(folder: Path, tmp_path: Path, cut: int) -> None:
    _opened(folder, memory := Memory())
    save_memory(folder, memory)
    (place,) = (tmp_path / "cache").rglob("*.pickle")
    place.write_bytes(place.read_bytes()[:cut])
    assert load_memory(folder).held == {}


def test_a_build_goes_on_where_nothing_can_be_remembered(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("XDG_CACHE_HOME", os.devnull)
    _opened(folder, memory := Memory())
    save_memory(folder, memory)
    assert load_memory(folder).held == {}


def test_nothing_in_the_folder_of_a_book_is_taken_for_memory(folder: Path, tmp_path: Path) -> None:
    _opened(folder, memory := Memory())
    save_memory(folder, memory)
    assert not [path for path in folder.rglob("*") if path.suffix == ".pickle"]
    (place,) = (tmp_path / "cache").rglob("*.pickle")
    (folder / place.name).write_bytes(pickle.dumps("anything"))
    place.unlink()
    assert load_memory(folder).held == {}


def test_pages_made_from_memory_are_the_same_bytes(tmp_path: Path) -> None:
    config = write_book(tmp_path, good_texts())
    cache = {"XDG_CACHE_HOME": str(tmp_path / "cache")}
    first = build(config, **cache)
    assert first.code == 0, first.out
    fresh = files_of(first.site)
    assert list((tmp_path / "cache").rglob("*.pickle"))
    assert files_of(build(config, **cache).site) == fresh
