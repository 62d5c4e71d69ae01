"""open_book(folder) -> Book: records, verdicts, findings. The one place where the parts are wired up."""

import datetime as dt
import gc
import hashlib
import re
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, field
from enum import StrEnum
from multiprocessing import get_context
from pathlib import Path
from typing import Any, Generic, TypeVar, overload

from builder.checks.agreement import CONTRARY_RULES, is_covered
from builder.checks.case import Case, open_case
from builder.checks.group import Gathering, Member
from builder.checks.house import House, tool_version
from builder.checks.kinship import Kin
from builder.checks.run import check_group, check_record, check_settings, settle
from builder.checks.standing import Standing, standing_of
from builder.chemistry.sketch import load_ring_templates
from builder.finding import Finding, Level, Place
from builder.records.digest import digest
from builder.records.model import Record
from builder.records.reader import (
    MAX_BYTES,
    Reading,
    gaps_as_one,
    read_bytes,
    read_record,
    read_settings,
    read_settings_bytes,
)
from builder.records.rules import reading_rule
from builder.records.settings import SETTINGS_FILE, Settings
from builder.records.yaml_text import Places
from builder.rule import Fault

__all__ = [
    "Book",
    "Entry",
    "Examined",
    "Memory",
    "Shelf",
    "Verdict",
    "examine",
    "examined_again",
    "is_aside",
    "judge",
    "open_book",
    "read_shelf",
    "record_files",
    "whole",
]

Kept = TypeVar("Kept")
Progress = Callable[[Iterator["Examined[Any]"], int], Iterable["Examined[Any]"]]
"""Passes on what is done, given how much there will be."""

SHARE = 128
"""Records that one process reads; fewer are not worth starting one."""
_CHUNK = 8
"""Records that a process takes at a time, so that none waits long for the slowest."""
_RECORD_NAME = re.compile(r"NS[^/]*\.yml")
_ASIDE = {"archive", "schema"}  # folders that hold frozen revisions and the JSON Schema, no current records


class Verdict(StrEnum):
    """How an entry stands to the engine."""

    IN_LINE = "in line"
    CONTRARY = "contrary"
    EXPLAINED = "explained"
    NOT_COVERED = "not covered"

    @property
    def key(self) -> str:
        """Return the verdict as a word of addresses and style sheets."""
        return self.replace(" ", "-")


def whole(case: Case) -> Case:
    """Keep a case as it is."""
    return case


def _unwatched(done: Iterator["Examined[Any]"], _: int) -> Iterable["Examined[Any]"]:
    return done


@dataclass(frozen=True, slots=True)
class Entry(Generic[Kept]):
    """One publishable record with all that is known about it.

    file: as findings show it, the name of the book's folder first, with forward slashes. text: its YAML as written.
    digest: SHA-256 of its scientific content, hexadecimal. standing: what of it is held against other entries.
    kept: what `open_book` was asked to keep of its case.
    """

    record: Record
    file: str
    text: str
    digest: str
    findings: tuple[Finding, ...]
    verdict: Verdict
    standing: Standing
    kept: Kept

    @property
    def id(self) -> str:
        """Return the identifier."""
        return self.record.entry


@dataclass(frozen=True, slots=True)
class Book(Generic[Kept]):
    """A whole book, read and checked.

    folder: absolute. entries: in order of identifier; only records without errors are among them.
    findings: of all files, sorted by place. files: absolute paths of every record read.
    near_same: every two entries in force of one reaction under near-same conditions, by their identifiers in order,
    with what the second is to the first.
    """

    folder: Path
    settings: Settings
    today: dt.date
    entries: tuple[Entry[Kept], ...]
    findings: tuple[Finding, ...]
    files: tuple[Path, ...]
    near_same: tuple[tuple[str, str, Kin], ...]

    @property
    def by_id(self) -> Mapping[str, Entry[Kept]]:
        """Return the entries by identifier."""
        return {entry.id: entry for entry in self.entries}

    def count(self, level: Level) -> int:
        """Return how many open findings of this level the book has."""
        return sum(finding.level is level and finding.accepted is None for finding in self.findings)


@dataclass(frozen=True, slots=True)
class Examined(Generic[Kept]):
    """One file as read and checked on its own, and what was kept of its case; None where no record could be made of it.

    unasked: ids of the checks that could not be asked. is_covered: whether the engine has a say in it.
    standing: what of it is held against other records; None likewise.
    """

    reading: Reading
    findings: tuple[Finding, ...]
    unasked: frozenset[str] = frozenset()
    is_covered: bool = False
    standing: Standing | None = None
    kept: Kept | None = None


@dataclass(slots=True)
class Memory:
    """What became of each file the last time it was examined: by its name, a key of all that has a say, and what came.

    A record that names an RXN file is never held: that file has a say as well. has_changed: since it was made.
    """

    held: dict[str, tuple[str, "Examined[Any]"]] = field(default_factory=dict)
    has_changed: bool = False


@dataclass(frozen=True, slots=True)
class _Desk(Generic[Kept]):
    """Where the records of one book are examined; can be sent to another process if `keep` can."""

    folder: Path
    settings: Settings
    today: dt.date
    keep: Callable[[Case], Kept]

    def name(self, path: Path) -> str:
        """Return a file's name as findings show it."""
        return _shown(path, self.folder)

    def keys(self, files: Iterable[Path]) -> dict[Path, str]:
        """Return for each file a key of all that has a say in what becomes of it, this tool apart."""
        keep = getattr(self.keep, "__qualname__", type(self.keep).__qualname__)
        about = hashlib.sha256(repr((self.settings.model_dump_json(), self.today, keep)).encode())
        found = {}
        for path in files:
            key = about.copy()
            key.update(self.name(path).encode() + b"\0" + path.read_bytes())
            found[path] = key.hexdigest()
        return found

    def examine(self, path: Path) -> Examined[Kept]:
        """Read and check one file on its own."""
        return self.examine_reading(read_record(path, self.name(path)), path)

    def examine_reading(self, reading: Reading, path: Path) -> Examined[Kept]:
        """Check what was read as the file at `path`."""
        return examine(reading, self.settings, self.today, self.rxn(reading.record, path), keep=self.keep)

    def rxn(self, record: Record | None, path: Path) -> bytes | None:
        """Return the content of the RXN file that a record names, if it may be read."""
        named = record.rxn_file if record else None
        return _attachment(path.parent / named.path, self.folder) if named else None


@overload
def open_book(folder: Path, *, today: dt.date, progress: Progress = ...) -> Book[Case]: ...
@overload
def open_book(
    folder: Path,
    *,
    today: dt.date,
    keep: Callable[[Case], Kept],
    progress: Progress = ...,
    processes: int = ...,
    memory: Memory | None = ...,
) -> Book[Kept]: ...
def open_book(
    folder: Path,
    *,
    today: dt.date,
    keep: Callable[[Case], Any] = whole,
    progress: Progress = _unwatched,
    processes: int = 1,
    memory: Memory | None = None,
) -> Book[Any]:
    """Read, check and judge every record below `folder`.

    today: the date of the build; nothing here asks the clock.
    keep: what to keep of each case, for whoever needs more of an entry than its record and findings.
    progress: wraps the files as they are done, for a progress bar.
    processes: over how many the records are spread; what `keep` returns must then be plain data.
    memory: what became of each file the last time; what has not changed is not examined again. It is kept up to date.
    Nothing a file holds raises; OSError passes for a folder that cannot be read.
    """
    folder = folder.resolve()
    settings, findings = _open_settings(folder)
    files, misnamed = record_files(folder)
    desk = _Desk(folder, settings, today, keep)
    examined = list(
        progress(_in_order(desk, files, processes), len(files))
        if memory is None
        else _recalled(desk, files, processes, progress, memory)
    )
    gathering = _gathering(examined, settings)
    settled = _settled(examined, gathering)
    entries = [
        Entry(
            record=each.reading.record,
            file=each.reading.file,
            text=each.reading.text,
            digest=digest(each.reading.record),
            findings=settled[each.reading.file],
            verdict=_verdict(settled[each.reading.file], is_covered=each.is_covered),
            standing=each.standing,
            kept=each.kept,
        )
        for each in examined
        if each.reading.record is not None and each.standing is not None
    ]
    publishable = [entry for entry in entries if not _has_error(entry.findings)]
    everything = [*findings, *misnamed, *(finding for each in settled.values() for finding in each)]
    return Book(
        folder=folder,
        settings=settings,
        today=today,
        entries=tuple(sorted(publishable, key=lambda entry: entry.id)),
        findings=tuple(sorted(everything, key=lambda finding: finding.sort_key)),
        files=files,
        near_same=_between(publishable, gathering),
    )


def _between(entries: Iterable[Entry[Any]], gathering: Gathering) -> tuple[tuple[str, str, Kin], ...]:
    """Return the pairs of a gathering of which both are among these entries, the lower identifier first, in order."""
    listed = {entry.id for entry in entries}
    pairs = ((one.record.entry, other.record.entry, kin) for one, other, kin in gathering.near_same)
    turned = ((a, b, kin) if a < b else (b, a, kin.mirrored) for a, b, kin in pairs if {a, b} <= listed)
    return tuple(sorted(turned, key=lambda pair: pair[:2]))


def _recalled(
    desk: _Desk[Kept], files: Sequence[Path], processes: int, progress: Progress, memory: Memory
) -> list[Examined[Kept]]:
    """Return what becomes of each file, in the order of the files, from memory where it can be."""
    keys = desk.keys(path for path in files if path.stat().st_size <= MAX_BYTES)
    recalled = {
        path: memory.held[desk.name(path)][1]
        for path, key in keys.items()
        if memory.held.get(desk.name(path), ("",))[0] == key
    }
    fresh = [path for path in files if path not in recalled]
    found = recalled | dict(zip(fresh, progress(_in_order(desk, fresh, processes), len(fresh)), strict=True))
    names = set(memory.held)
    memory.held.clear()
    for path, key in keys.items():
        record = found[path].reading.record
        if record is None or record.rxn_file is None:
            memory.held[desk.name(path)] = (key, found[path])
    memory.has_changed |= bool(fresh) or names != set(memory.held)
    return [found[path] for path in files]


def _in_order(desk: _Desk[Kept], files: Sequence[Path], processes: int) -> Iterator[Examined[Kept]]:
    """Yield what becomes of each file, in the order of the files.

    Where processes are forked, what each would load is loaded here first, and the processes are given up after their
    shares: a book of any length takes the memory of a short one.
    """
    processes = min(processes, len(files) // SHARE)
    if processes < 2:
        yield from map(desk.examine, files)
        return
    context = get_context()
    if context.get_start_method() != "fork":
        with ProcessPoolExecutor(processes, context) as pool:
            yield from pool.map(desk.examine, files, chunksize=_CHUNK)
        return
    load_ring_templates()
    yield desk.examine(files[0])  # with all the tables that takes
    step = processes * SHARE
    for start in range(1, len(files), step):
        with _left_alone_by_the_collector(), ProcessPoolExecutor(processes, context) as pool:
            yield from pool.map(desk.examine, files[start : start + step], chunksize=_CHUNK)


@contextmanager
def _left_alone_by_the_collector() -> Iterator[None]:
    """Keep the collector off what there is: memory that nobody writes to stays shared with forked processes."""
    gc.freeze()
    try:
        yield
    finally:
        gc.unfreeze()


def _attachment(path: Path, folder: Path) -> bytes | None:
    """Return the content of a file that a record names; None unless it is a small file inside the book."""
    if not _is_inside(path, folder) or path.stat().st_size > MAX_BYTES:
        return None
    return path.read_bytes()


def _is_inside(path: Path, folder: Path) -> bool:
    """Say whether a path leads to a file of the book, links followed."""
    return path.is_file() and path.resolve().is_relative_to(folder)


@overload
def examine(reading: Reading, settings: Settings, today: dt.date, rxn: bytes | None = ...) -> Examined[Case]: ...
@overload
def examine(
    reading: Reading, settings: Settings, today: dt.date, rxn: bytes | None = ..., *, keep: Callable[[Case], Kept]
) -> Examined[Kept]: ...
def examine(
    reading: Reading,
    settings: Settings,
    today: dt.date,
    rxn: bytes | None = None,
    *,
    keep: Callable[[Case], Any] = whole,
) -> Examined[Any]:
    """Check one record on its own.

    rxn: content of the RXN file that the record names. keep: what to keep of its case.
    """
    if reading.record is None:
        return Examined(reading, gaps_as_one(reading.findings))
    case = open_case(reading.record, reading.file, settings, today, rxn)
    checked = check_record(case, reading.places)
    found = (*reading.findings, *checked.findings)
    return Examined(reading, found, checked.unasked, is_covered(case), standing_of(case), keep(case))


def examined_again(book: Book[Any], file: str, data: bytes) -> tuple[Finding, ...]:
    """Return what reading and checks would find, were `data` what a file of the book holds; the other files apart.

    file: as findings show it.
    """
    path = book.folder.parent / file
    if path == book.folder / SETTINGS_FILE:
        return tuple(_checked_settings(*read_settings_bytes(data, file), book.folder)[1])
    desk = _Desk(book.folder, book.settings, book.today, _nothing)
    return desk.examine_reading(read_bytes(data, file), path).findings


def _nothing(_: Case) -> None:
    """Keep nothing of a case."""


def judge(examined: Sequence[Examined[Any]], settings: Settings) -> dict[str, tuple[Finding, ...]]:
    """Return the final findings by file: each record's own, those against the others, acceptances applied."""
    return _settled(examined, _gathering(examined, settings))


def _gathering(examined: Sequence[Examined[Any]], settings: Settings) -> Gathering:
    members = tuple(
        Member(each.reading.file, each.reading.record, settings, each.reading.places, each.standing)
        for each in examined
        if each.reading.record is not None and each.standing is not None
    )
    unread = frozenset(Path(each.reading.file).stem for each in examined if each.reading.record is None)
    return Gathering(members, unread)


def _settled(examined: Sequence[Examined[Any]], gathering: Gathering) -> dict[str, tuple[Finding, ...]]:
    against_others = check_group(gathering)
    settled: dict[str, tuple[Finding, ...]] = {}
    for each in examined:
        reading = each.reading
        found = (*each.findings, *against_others.get(reading.file, ()))
        accepted = reading.record.accepted if reading.record is not None else None
        settled[reading.file] = found if accepted is None else settle(accepted, reading.places, found, each.unasked)
    return settled


@dataclass(frozen=True, slots=True)
class Shelf:
    """The records of a book, read and not checked; a case is opened when somebody asks for it.

    records: by identifier, in the order of the files, with the path of each.
    """

    records: Mapping[str, tuple[Record, Path]]
    _desk: _Desk[Case]

    def case(self, entry: str) -> Case:
        """Open the case of a record.

        Raises KeyError for an identifier that no readable record bears.
        """
        (record, path), desk = self.records[entry], self._desk
        return open_case(record, desk.name(path), desk.settings, desk.today, desk.rxn(record, path))

    def is_sound(self, entry: str) -> bool:
        """Say whether reading and checking a record by itself finds no error.

        Raises KeyError as `case` does.
        """
        return not _has_error(self._desk.examine(self.records[entry][1]).findings)


def read_shelf(folder: Path, today: dt.date) -> Shelf:
    """Read every record below `folder`, as far as it can be read.

    Nothing a file holds raises; OSError passes for a folder that cannot be read.
    """
    folder = folder.resolve()
    desk = _Desk(folder, _open_settings(folder)[0], today, whole)
    read = ((read_record(path, desk.name(path)).record, path) for path in record_files(folder)[0])
    return Shelf({record.entry: (record, path) for record, path in read if record is not None}, desk)


def record_files(folder: Path) -> tuple[tuple[Path, ...], list[Finding]]:
    """Return the record files below `folder` in order, and a finding for each YAML file that is not read as one."""
    files: list[Path] = []
    findings: list[Finding] = []
    for path in sorted(folder.rglob("*")):
        inside = path.relative_to(folder)
        if is_aside(inside.parent) or path.name.startswith(".") or path.suffix.lower() not in {".yml", ".yaml"}:
            continue
        if str(inside) == SETTINGS_FILE:
            continue
        if not _RECORD_NAME.fullmatch(path.name):
            fault = Fault(at=(), message="this is no record's name", mend="call it after its entry, NS….yml")
            findings.append(reading_rule("file-misnamed").finding(fault, Place(_shown(path, folder), 1, 1, 2)))
        elif not _is_inside(path, folder):
            fault = Fault(at=(), message="this is no plain file of the book", mend="put the record itself here")
            findings.append(reading_rule("file-unreachable").finding(fault, Place(_shown(path, folder), 1, 1, 2)))
        else:
            files.append(path)
    return tuple(files), findings


def is_aside(folder: Path) -> bool:
    """Say whether a folder, by its path inside a book, is one from which no current records are read."""
    return bool(_ASIDE & set(folder.parts)) or any(part.startswith(".") for part in folder.parts)


def _shown(path: Path, folder: Path) -> str:
    return (Path(folder.name) / path.relative_to(folder)).as_posix()


def _open_settings(folder: Path) -> tuple[Settings, list[Finding]]:
    path = folder / SETTINGS_FILE
    plain = Settings(format=1, title="Condition handbook")
    if not path.is_file():
        fault = Fault(at=(), message=f"the book has no {SETTINGS_FILE}", mend="start it with format: 1 and title: …")
        return plain, [reading_rule("key-missing").finding(fault, Place(_shown(path, folder), 1, 1, 2))]
    settings, findings = _checked_settings(*read_settings(path, _shown(path, folder)), folder)
    return settings or plain, findings


def _checked_settings(
    settings: Settings | None, findings: Sequence[Finding], places: Places, folder: Path
) -> tuple[Settings | None, list[Finding]]:
    """Return settings as read with the findings of their own checks."""
    if settings is None:
        return None, list(findings)
    has_logo = settings.logo is None or _is_inside(folder / settings.logo, folder)
    return settings, [*findings, *check_settings(House(settings, tool_version(), has_logo=has_logo), places)]


def _verdict(findings: tuple[Finding, ...], *, is_covered: bool) -> Verdict:
    contrary = [finding for finding in findings if finding.rule in CONTRARY_RULES]
    if any(finding.accepted is None for finding in contrary):
        return Verdict.CONTRARY
    if contrary:
        return Verdict.EXPLAINED
    return Verdict.IN_LINE if is_covered else Verdict.NOT_COVERED


def _has_error(findings: tuple[Finding, ...]) -> bool:
    return any(finding.level is Level.ERROR for finding in findings)
