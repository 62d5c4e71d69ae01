"""open_book(folder) -> Book: records, verdicts, findings. The one place where the parts are wired up."""

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum
from pathlib import Path

from builder.checks.case import Case
from builder.finding import Finding, Level
from builder.records.model import Record
from builder.records.settings import Settings

__all__ = ["Book", "Entry", "Verdict"]


class Verdict(StrEnum):
    """How an entry stands to the engine."""

    IN_LINE = "in line"
    CONTRARY = "contrary"
    EXPLAINED = "explained"
    NOT_COVERED = "not covered"


@dataclass(frozen=True, slots=True)
class Entry:
    """One publishable record with all that is known about it.

    file: path below the book's folder, with forward slashes. text: its YAML as written.
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

    entries: in order of identifier; only records without errors are among them.
    findings: of all files, sorted by place.
    """

    folder: Path
    settings: Settings
    today: dt.date
    entries: tuple[Entry, ...]
    findings: tuple[Finding, ...]
    files: int

    @property
    def by_id(self) -> Mapping[str, Entry]:
        """Return the entries by identifier."""
        return {entry.id: entry for entry in self.entries}

    def count(self, level: Level) -> int:
        """Return how many open findings of this level the book has."""
        return sum(finding.level is level and finding.accepted is None for finding in self.findings)
