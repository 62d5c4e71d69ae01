"""open_book(folder) -> Book: records, verdicts, findings. The one place where the parts are wired up."""

import datetime as dt
import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from pathlib import Path

from builder.checks.agreement import CONTRARY_RULES, is_covered
from builder.checks.case import Case, open_case
from builder.checks.group import Gathering, Member
from builder.checks.run import check_group, check_record, settle
from builder.finding import Finding, Level, Place
from builder.records.digest import digest
from builder.records.model import Record
from builder.records.reader import MAX_BYTES, Reading, read_record, read_settings
from builder.records.rules import reading_rule
from builder.records.settings import SETTINGS_FILE, Settings
from builder.rule import Fault

__all__ = ["Book", "Entry", "Examined", "Verdict", "examine", "judge", "open_book", "record_files"]

Progress = Callable[[tuple[Path, ...]], Iterable[Path]]

_RECORD_NAME = re.compile(r"NS[^/]*\.yml")
_ASIDE = {"archive", "schema"}  # folders that hold frozen revisions and the JSON Schema, no current records


class Verdict(StrEnum):
    """How an entry stands to the engine."""

    IN_LINE = "in line"
    CONTRARY = "contrary"
    EXPLAINED = "explained"
    NOT_COVERED = "not covered"


@dataclass(frozen=True, slots=True)
class Entry:
    """One publishable record with all that is known about it.

    file: as findings show it, the name of the book's folder first, with forward slashes. text: its YAML as written.
    digest: SHA-256 of its scientific content, hexadecimal.
    """

    case: Case
    file: str
    text: str
    digest: str
    findings: tuple[Finding, ...]
    verdict: Verdict

    @property
    def record(self) -> Record:
        """Return the record itself."""
        return self.case.record

    @property
    def id(self) -> str:
        """Return the identifier."""
        return self.record.entry


@dataclass(frozen=True, slots=True)
class Book:
    """A whole book, read and checked.

    folder: absolute. entries: in order of identifier; only records without errors are among them.
    findings: of all files, sorted by place. files: absolute paths of every record read.
    """

    folder: Path
    settings: Settings
    today: dt.date
    entries: tuple[Entry, ...]
    findings: tuple[Finding, ...]
    files: tuple[Path, ...]

    @property
    def by_id(self) -> Mapping[str, Entry]:
        """Return the entries by identifier."""
        return {entry.id: entry for entry in self.entries}

    def count(self, level: Level) -> int:
        """Return how many open findings of this level the book has."""
        return sum(finding.level is level and finding.accepted is None for finding in self.findings)


@dataclass(frozen=True, slots=True)
class Examined:
    """One file as read and checked on its own; case is None where no record could be made of it.

    unasked: ids of the checks that could not be asked.
    """

    reading: Reading
    case: Case | None
    findings: tuple[Finding, ...]
    unasked: frozenset[str] = frozenset()


def open_book(folder: Path, *, today: dt.date, progress: Progress = tuple) -> Book:
    """Read, check and judge every record below `folder`.

    today: the date of the build; nothing here asks the clock.
    progress: wraps the files to be read, for a progress bar.
    Nothing a file holds raises; OSError passes for a folder that cannot be read.
    """
    folder = folder.resolve()
    settings, findings = _open_settings(folder)
    files, misnamed = record_files(folder)
    examined = [_examine_file(path, folder, settings, today) for path in progress(files)]
    settled = judge(examined)
    entries = [
        _entry(each.reading, each.case, settled[each.reading.file]) for each in examined if each.case is not None
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
    )


def _examine_file(path: Path, folder: Path, settings: Settings, today: dt.date) -> Examined:
    reading = read_record(path, _shown(path, folder))
    named = reading.record.rxn_file if reading.record else None
    return examine(reading, settings, today, _attachment(path.parent / named.path, folder) if named else None)


def _attachment(path: Path, folder: Path) -> bytes | None:
    """Return the content of a file that a record names; None unless it is a small file inside the book."""
    real = path.resolve()
    if not real.is_relative_to(folder) or not real.is_file() or real.stat().st_size > MAX_BYTES:
        return None
    return real.read_bytes()


def examine(reading: Reading, settings: Settings, today: dt.date, rxn: bytes | None = None) -> Examined:
    """Check one record on its own.

    rxn: content of the RXN file that the record names.
    """
    if reading.record is None:
        return Examined(reading, None, reading.findings)
    case = open_case(reading.record, reading.file, settings, today, rxn)
    checked = check_record(case, reading.places)
    return Examined(reading, case, (*reading.findings, *checked.findings), checked.unasked)


def judge(examined: Sequence[Examined]) -> dict[str, tuple[Finding, ...]]:
    """Return the final findings by file: each record's own, those against the others, acceptances applied."""
    members = tuple(Member(each.case, each.reading.places) for each in examined if each.case is not None)
    unread = frozenset(Path(each.reading.file).stem for each in examined if each.case is None)
    against_others = check_group(Gathering(members, unread))
    settled: dict[str, tuple[Finding, ...]] = {}
    for each in examined:
        found = (*each.findings, *against_others.get(each.reading.file, ()))
        settled[each.reading.file] = settle(each.case, each.reading.places, found, each.unasked) if each.case else found
    return settled


def record_files(folder: Path) -> tuple[tuple[Path, ...], list[Finding]]:
    """Return the record files below `folder` in order, and a finding for each YAML file that is not read as one."""
    files: list[Path] = []
    findings: list[Finding] = []
    for path in sorted(folder.rglob("*")):
        inside = path.relative_to(folder)
        hidden = any(part.startswith(".") for part in inside.parts)
        if hidden or _ASIDE & set(inside.parts[:-1]) or path.suffix.lower() not in {".yml", ".yaml"}:
            continue
        if str(inside) == SETTINGS_FILE:
            continue
        if not _RECORD_NAME.fullmatch(path.name):
            fault = Fault(at=(), message="this is no record's name", mend="call it after its entry, NS….yml")
            findings.append(reading_rule("file-misnamed").finding(fault, Place(_shown(path, folder), 1, 1, 2)))
        elif not path.is_file() or not path.resolve().is_relative_to(folder):
            fault = Fault(at=(), message="this is no plain file of the book", mend="put the record itself here")
            findings.append(reading_rule("file-unreachable").finding(fault, Place(_shown(path, folder), 1, 1, 2)))
        else:
            files.append(path)
    return tuple(files), findings


def _shown(path: Path, folder: Path) -> str:
    return (Path(folder.name) / path.relative_to(folder)).as_posix()


def _open_settings(folder: Path) -> tuple[Settings, list[Finding]]:
    path = folder / SETTINGS_FILE
    plain = Settings(format=1, title="Condition handbook")
    if not path.is_file():
        fault = Fault(at=(), message=f"the book has no {SETTINGS_FILE}", mend="start it with format: 1 and title: …")
        return plain, [reading_rule("key-missing").finding(fault, Place(_shown(path, folder), 1, 1, 2))]
    settings, findings = read_settings(path, _shown(path, folder))
    return settings or plain, list(findings)


def _entry(reading: Reading, case: Case, findings: tuple[Finding, ...]) -> Entry:
    return Entry(case, reading.file, reading.text, digest(case.record), findings, _verdict(case, findings))


def _verdict(case: Case, findings: tuple[Finding, ...]) -> Verdict:
    contrary = [finding for finding in findings if finding.rule in CONTRARY_RULES]
    if any(finding.accepted is None for finding in contrary):
        return Verdict.CONTRARY
    if contrary:
        return Verdict.EXPLAINED
    return Verdict.IN_LINE if is_covered(case) else Verdict.NOT_COVERED


def _has_error(findings: tuple[Finding, ...]) -> bool:
    return any(finding.level is Level.ERROR for finding in findings)
