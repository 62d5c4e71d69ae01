"""A file is written whole or not at all."""

import os
from pathlib import Path

import pytest

from builder.authoring.whole_file import write_all, written_new, written_whole


def test_the_file_changes_at_the_end_only(tmp_path: Path) -> None:
    path = tmp_path / "table.tsv"
    path.write_text("old", "utf-8")
    with written_whole(path) as file:
        file.write("α\n")
        file.flush()
        assert path.read_text("utf-8") == "old"
    assert path.read_bytes() == "α\n".encode()
    assert list(tmp_path.iterdir()) == [path]


@pytest.mark.parametrize("fault", [ValueError, KeyboardInterrupt])
def test_what_fails_leaves_nothing_behind(tmp_path: Path, fault: type[BaseException]) -> None:
    def write_half() -> None:
        with written_whole(tmp_path / "table.tsv") as file:
            file.write("half a ta")
            raise fault

    with pytest.raises(fault):
        write_half()
    assert list(tmp_path.iterdir()) == []


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    target, link = tmp_path / "there.tsv", tmp_path / "here.tsv"
    target.write_text("old", "utf-8")
    link.symlink_to(target)
    with written_whole(link) as file:
        file.write("new")
    assert link.is_symlink()
    assert target.read_text("utf-8") == "new"


def test_a_file_that_is_replaced_keeps_its_permissions(tmp_path: Path) -> None:
    one, other = tmp_path / "one.yml", tmp_path / "other.yml"
    for path, mode in ((one, 0o600), (other, 0o444)):
        path.write_text("old", "utf-8")
        path.chmod(mode)
    with written_whole(one) as file:
        file.write("new")
    write_all({other: "new"})
    assert [path.stat().st_mode & 0o777 for path in (one, other)] == [0o600, 0o444]
    assert [path.read_text("utf-8") for path in (one, other)] == ["new", "new"]


def test_what_is_no_file_is_not_replaced(tmp_path: Path) -> None:
    with pytest.raises(OSError, match="is not a file"), written_whole(tmp_path):
        pass
    assert tmp_path.is_dir()


def test_a_new_file_is_put_in_its_place_at_the_end(tmp_path: Path) -> None:
    path = tmp_path / "new.yml"
    with written_new(path) as file:
        file.write("é\n")
        assert not path.exists()
    assert path.read_bytes() == "é\n".encode()
    assert list(tmp_path.iterdir()) == [path]


def test_a_new_file_takes_no_place_that_was_taken_meanwhile(tmp_path: Path) -> None:
    path = tmp_path / "new.yml"

    def write_while_another_does() -> None:
        with written_new(path) as file:
            file.write("mine")
            path.write_text("theirs", "utf-8")

    with pytest.raises(FileExistsError):
        write_while_another_does()
    assert path.read_text("utf-8") == "theirs"
    assert list(tmp_path.iterdir()) == [path]


def test_an_interrupted_new_file_leaves_nothing(tmp_path: Path) -> None:
    def write_half() -> None:
        with written_new(tmp_path / "new.yml") as file:
            file.write("half")
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        write_half()
    assert list(tmp_path.iterdir()) == []


def test_a_link_that_leads_nowhere_is_not_followed(tmp_path: Path) -> None:
    (tmp_path / "new.yml").symlink_to(tmp_path / "elsewhere")
    with pytest.raises(FileExistsError), written_new(tmp_path / "new.yml"):
        pass
    assert not (tmp_path / "elsewhere").exists()


def test_a_new_file_needs_no_hard_links(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object) -> None:
        raise PermissionError(1, "no links here")

    monkeypatch.setattr(Path, "hardlink_to", refuse)
    path = tmp_path / "new.yml"
    with written_new(path) as file:
        file.write("whole")
        written = os.fstat(file.fileno())
    assert path.read_text("utf-8") == "whole"
    assert os.path.samestat(path.stat(), written)  # moved, not copied: nobody can meet a part
    with pytest.raises(FileExistsError), written_new(path) as file:
        file.write("again")
    assert list(tmp_path.iterdir()) == [path]
