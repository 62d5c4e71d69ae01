"""Write a file whole or not at all, and several all or none: readers see the old or the new, never a part."""

import os
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from stat import S_IMODE
from typing import TextIO

__all__ = ["write_all", "written_new", "written_whole"]


@contextmanager
def written_whole(path: Path) -> Iterator[TextIO]:
    """Open a file beside `path` for UTF-8 text with plain line ends, and put it in its place at the end.

    Where the body raises, or is interrupted, `path` stays as it was. A link is followed, and a file that is replaced
    keeps its permissions.
    Raises OSError where the folder is missing or may not be written, or `path` is something other than a file.
    """
    target = path.resolve()
    if target.exists() and not target.is_file():
        raise IsADirectoryError(21, "is not a file that can be replaced", str(path))
    beside = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        with beside.open("w", encoding="utf-8", newline="\n") as file:
            if target.exists():
                beside.chmod(S_IMODE(target.stat().st_mode))
            yield file
        beside.replace(target)
    finally:
        beside.unlink(missing_ok=True)


def write_all(texts: Mapping[Path, str]) -> None:
    """Write several files of UTF-8 text, all or none; folders that are missing are made.

    Where one of them cannot be written, or the work is interrupted, every file is as it was before.
    Raises OSError as `written_whole` does.
    """
    before = {path: path.read_bytes() if path.exists() else None for path in texts}
    made: list[Path] = []
    try:
        for folder in dict.fromkeys(path.parent for path in texts):
            missing = [each for each in (folder, *folder.parents) if not each.exists()]
            for each in reversed(missing):
                each.mkdir()
                made.append(each)
        for path, text in texts.items():
            with written_whole(path) as file:
                file.write(text)
    except BaseException:
        for path, data in before.items():
            if data is None:
                path.unlink(missing_ok=True)
            elif path.read_bytes() != data:
                path.write_bytes(data)
        for folder in reversed(made):
            folder.rmdir()
        raise


@contextmanager
def written_new(path: Path) -> Iterator[TextIO]:
    """Open a file beside `path` for UTF-8 text with plain line ends, and put it in its place at the end, if it is free.

    Where the body raises, or is interrupted, nothing is left. Raises FileExistsError where something stands at `path`,
    which stays as it is; OSError where the folder may not be written.
    """
    if os.path.lexists(path):
        raise FileExistsError(17, "is there already and is never overwritten", str(path))
    beside = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        with beside.open("x", encoding="utf-8", newline="\n") as file:
            yield file
        _put_without_replacing(beside, path)
    finally:
        beside.unlink(missing_ok=True)


def _put_without_replacing(beside: Path, path: Path) -> None:
    """Give a file its name if nothing bears it.

    Where the file system knows no hard links, an empty file takes the name first: a reader may meet that one for a
    moment, and it is left if the machine stops there, but never a part of the text.
    """
    try:
        path.hardlink_to(beside)
    except FileExistsError:
        raise
    except OSError:
        path.touch(exist_ok=False)
        try:
            beside.replace(path)
        except BaseException:
            path.unlink()
            raise
