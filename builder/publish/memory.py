"""What builds remember of each record from one to the next, in the reader's own cache folder.

It is never read from the book's folder: what lies there may come from anybody, and pickles run what they say.
"""

import hashlib
import pickle
from contextlib import suppress
from functools import cache
from importlib.metadata import version
from importlib.resources import files
from pathlib import Path
from tempfile import NamedTemporaryFile

from platformdirs import user_cache_path

from builder.book import Memory

__all__ = ["load_memory", "save_memory", "tool_identity"]

_LIBRARIES = ("numpy", "pydantic", "rdkit")
"""Those whose version may show in what is made of a record."""


@cache
def tool_identity() -> str:
    """Return a fingerprint of this tool: of each of its files, and of the libraries behind it."""
    found = hashlib.sha256(" ".join(f"{name} {version(name)}" for name in _LIBRARIES).encode())
    package = Path(str(files("builder")))
    for path in sorted(package.rglob("*")):
        if path.suffix in {".py", ".tsv", ".toml", ".yml"} and path.is_file():
            found.update(path.relative_to(package).as_posix().encode())
            found.update(path.read_bytes())
    return found.hexdigest()


def load_memory(book: Path) -> Memory:
    """Return what the last build of a book left; empty where there was none, or where it was of another tool."""
    try:
        with _place(book).open("rb") as file:
            if pickle.load(file) == tool_identity():  # noqa: S301 - our own file, in the user's own folder
                return Memory(pickle.load(file))  # noqa: S301
    except (OSError, EOFError, ValueError, pickle.UnpicklingError):
        return Memory()  # a build without memory takes longer, and is right
    return Memory()


def save_memory(book: Path, memory: Memory) -> None:
    """Leave what is remembered for the next build; where nothing can be written, nothing is."""
    place = _place(book)
    with suppress(OSError):
        place.parent.mkdir(parents=True, exist_ok=True)
        with NamedTemporaryFile(dir=place.parent, suffix=".part", delete=False) as file:
            pickle.dump(tool_identity(), file)
            pickle.dump(memory.held, file, protocol=pickle.HIGHEST_PROTOCOL)
        Path(file.name).replace(place)


def _place(book: Path) -> Path:
    name = hashlib.sha256(str(book.resolve()).encode()).hexdigest()[:16]
    return user_cache_path("condition-handbook", appauthor=False) / f"{name}.pickle"
