"""`handbook start`: lay down a group's own book, to which nothing but the installed tool belongs."""

import datetime as dt
import hashlib
import json
import os
import re
import shutil
from collections.abc import Mapping
from dataclasses import dataclass
from importlib.metadata import distribution
from importlib.resources import files
from pathlib import Path
from urllib.parse import urlsplit
from urllib.request import url2pathname

from builder.authoring.schema import schema_texts
from builder.checks.house import DISTRIBUTION, tool_version
from builder.records.identifiers import mint_identifier
from builder.records.mended_text import quoted
from builder.records.reader import read_into
from builder.records.settings import SETTINGS_FILE, Settings

__all__ = ["StartError", "Started", "Wheel", "book_files", "start_book"]

_STARTER = Path(str(files("builder.authoring"))) / "starter"
_GAP = re.compile(r"<<([a-z]+)>>")


class StartError(Exception):
    """No book can be started there, or under that name; nothing was written."""


@dataclass(frozen=True, slots=True)
class Wheel:
    """The file from which a tool was installed: its name, and its bytes where they are still to be had."""

    name: str
    data: bytes | None


@dataclass(frozen=True, slots=True)
class Started:
    """A book as it was laid down: its folder, the identifier of its sample entry, the wheel its CI installs."""

    folder: Path
    sample: str
    wheel: Wheel


def start_book(folder: Path, *, title: str, group: str | None, date: dt.date) -> Started:
    """Write a new book into `folder`, which is new or empty: all of it, or nothing.

    Raises StartError for a folder that holds something, and for a title or group that settings do not take.
    """
    target = folder.resolve()
    if target.is_dir() and any(target.iterdir()):
        raise StartError(f"{folder} is not empty; name a new folder, or an empty one")
    if target.exists() and not target.is_dir():
        raise StartError(f"{folder} is a file; name a new folder, or an empty one")
    if not target.parent.is_dir():
        raise StartError(f"there is no folder {folder.parent} to start {folder.name} in; make it first")
    sample, wheel = mint_identifier(), _own_wheel()
    contents = book_files(title=title, group=group, sample=sample, date=date, wheel=wheel)
    if target.exists():
        _fill(target, contents)
    else:
        _make(target, contents)
    return Started(folder, sample, wheel)


def book_files(*, title: str, group: str | None, sample: str, date: dt.date, wheel: Wheel) -> dict[str, bytes]:
    """Return the files of a new book, by their path with forward slashes; text is UTF-8 with plain line ends.

    sample: identifier of its sample entry, which bears `date`.
    Raises StartError as `start_book` does.
    """
    title, group = _one_line("--title", title), _one_line("--group", group) if group is not None else None
    version = tool_version()
    values = {
        "title": quoted(title),
        "heading": title,
        "group": f"group: {quoted(group)}" if group is not None else "# group: shown beside the title",
        "engine": quoted(version),
        "version": version,
        "entry": sample,
        "date": date.isoformat(),
        "wheel": wheel.name,
    }
    texts = {
        _place(path.relative_to(_STARTER), sample): _GAP.sub(lambda gap: values[gap[1]], path.read_text("utf-8"))
        for path in sorted(_STARTER.rglob("*"))
        if path.is_file()
    }
    _refuse_what_settings_refuse(texts[f"entries/{SETTINGS_FILE}"])
    texts |= {f"entries/schema/{name}": text for name, text in schema_texts().items()}
    contents = {name: text.encode() for name, text in texts.items()}
    return contents if wheel.data is None else {**contents, f"tools/{wheel.name}": wheel.data}


def _place(template: Path, sample: str) -> str:
    """Return where a file of the starter goes; its dot-files bear names that mean nothing to git and editors here."""
    parts = [re.sub("^dot-", ".", part) for part in template.parts]
    return "/".join(parts).replace("entries/sample.yml", f"entries/{sample}.yml")


def _one_line(option: str, text: str) -> str:
    line = " ".join(text.split())
    if not line.isprintable():
        raise StartError(f"{option} holds a character that cannot be shown; type it anew")
    return line


def _refuse_what_settings_refuse(text: str) -> None:
    _, findings, _ = read_into(Settings, text, SETTINGS_FILE)
    for finding in findings:
        key = text.splitlines()[finding.place.line - 1].partition(":")[0]
        raise StartError(f"--{key}: {finding.message}; {finding.mend}")


def _own_wheel() -> Wheel:
    """Return the wheel that this tool was installed from, as the installer noted it (PEP 610).

    The bytes are None where it was installed otherwise, or the file is gone or has changed since.
    """
    usual = Wheel(f"{DISTRIBUTION.replace('-', '_')}-{tool_version()}-py3-none-any.whl", None)
    noted = json.loads(distribution(DISTRIBUTION).read_text("direct_url.json") or "{}")
    address = urlsplit(noted.get("url", ""))
    path = Path(url2pathname(address.path))
    if address.scheme != "file" or path.suffix != ".whl" or not path.is_file():
        return usual
    data = path.read_bytes()
    is_same = hashlib.sha256(data).hexdigest() == noted.get("archive_info", {}).get("hashes", {}).get("sha256")
    return Wheel(path.name, data) if is_same else usual


def _make(folder: Path, contents: Mapping[str, bytes]) -> None:
    """Write the files beside `folder`, which does not exist, and give them its name at the end."""
    beside = folder.with_name(f".{folder.name}.{os.getpid()}.part")
    try:
        _write(beside, contents)
        beside.rename(folder)
    finally:
        shutil.rmtree(beside, ignore_errors=True)


def _fill(folder: Path, contents: Mapping[str, bytes]) -> None:
    """Write the files into `folder`, which may be somebody's working folder; take them out again where that fails."""
    try:
        _write(folder, contents)
    except BaseException:
        for made in {folder / name.partition("/")[0] for name in contents}:
            shutil.rmtree(made) if made.is_dir() else made.unlink(missing_ok=True)
        raise


def _write(folder: Path, contents: Mapping[str, bytes]) -> None:
    for name, data in contents.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(data)
