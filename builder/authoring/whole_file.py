"""Write a file whole or not at all: readers see the old one or the new one, never a part."""

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TextIO

__all__ = ["written_whole"]


@contextmanager
def written_whole(path: Path) -> Iterator[TextIO]:
    """Open a file beside `path` for UTF-8 text with plain line ends, and put it in its place at the end.

    Where the body raises, or is interrupted, `path` stays as it was. A link is followed.
    Raises OSError where the folder is missing or may not be written, or `path` is something other than a file.
    """
    target = path.resolve()
    if target.exists() and not target.is_file():
        raise IsADirectoryError(21, "is not a file that can be replaced", str(path))
    beside = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        with beside.open("w", encoding="utf-8", newline="\n") as file:
            yield file
        beside.replace(target)
    finally:
        beside.unlink(missing_ok=True)
