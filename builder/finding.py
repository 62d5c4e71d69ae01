"""What went wrong, and where: the one currency in which every check reports."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum

__all__ = ["Edit", "Finding", "Level", "Place"]


class Level(StrEnum):
    """How much a finding weighs, heaviest first.

    An error cannot be published. A query needs a fix or an accepted reason. A caution is a hazard to know.
    A remark is a suggestion.
    """

    ERROR = "error"
    QUERY = "query"
    CAUTION = "caution"
    REMARK = "remark"

    @property
    def weight(self) -> int:
        """Return 3 for an error down to 0 for a remark."""
        return {"error": 3, "query": 2, "caution": 1, "remark": 0}[self.value]


@dataclass(frozen=True, slots=True, order=True)
class Place:
    """A position in a file; line and columns count characters from 1, end_column is exclusive.

    goes_on: what stands there runs over further lines, and end_column is only that of its first character.
    """

    file: str
    line: int
    column: int
    end_column: int
    goes_on: bool = False

    def __str__(self) -> str:
        return f"{self.file}:{self.line}:{self.column}"


@dataclass(frozen=True, slots=True, order=True)
class Edit:
    """New text for a stretch of a file; lines and columns count from 1, and the end is exclusive.

    The start of the line behind the last one is the end of the file.
    """

    line: int
    column: int
    end_line: int
    end_column: int
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing to know about a record: what, where, why it matters and how to mend it.

    rule: slug id of the rule that found it.
    source: key into the bibliography.
    fix: the exact text that would replace what stands at `place`, where one exists.
    edits: the exact edits of the file that mend it, where that is more than `fix` at `place`.
    is_sure: fix and edits leave what the file says as it is, or as it can only be meant; nobody need be asked.
    data: the quantities behind the message, JSON-ready.
    accepted: the reviewer's reason, where the record accepts this query.
    """

    rule: str
    level: Level
    message: str
    why: str
    mend: str
    source: str
    place: Place
    fix: str | None = None
    edits: tuple[Edit, ...] = ()
    is_sure: bool = False
    data: Mapping[str, object] = field(default_factory=dict)
    accepted: str | None = None

    @property
    def sort_key(self) -> tuple[Place, str, str]:
        """Order findings by place, then rule, so that every run prints them alike."""
        return (self.place, self.rule, self.message)
