"""Slips of the keyboard put into sound records, and how many `check --fix` mends to the byte.

`python -m tests.keyboard_slips` prints the table over every entry of the book.
"""

import re
import sys
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from builder.authoring.fix import mend
from builder.finding import Finding
from builder.records.reader import read_bytes

__all__ = ["ENTRIES", "SLIPS", "Slip", "look", "table"]

ENTRIES = tuple(
    path
    for path in sorted((Path(__file__).parents[1] / "entries").rglob("NS*.yml"))
    if "archive" not in path.parent.parts
)


@dataclass(frozen=True, slots=True)
class Slip:
    """What a writer does to a sound record: what is sought in it, and what is put there."""

    name: str
    sought: str
    put: str

    def spoil(self, sound: str) -> str:
        """Return the record with the slip wherever it can be made."""
        return re.sub(self.sought, self.put, sound, flags=re.MULTILINE)


SLIPS = (
    Slip("SMILES without quotes", r"smiles: '(\[[^']*)'", r"smiles: \1"),
    Slip("ratio without quotes", r"(er|dr): '([0-9]+:[0-9]+)'", r"\1: \2"),
    Slip("line twice", r"^(title: .*\n)", r"\1\1"),
    Slip("nested line twice", r"^(    atmosphere: .*\n)", r"\1\1"),
    Slip("key mistyped", r"^    measured: ", "    masured: "),
    Slip("no-break space in the margin", r"^  class:", "\u00a0\u00a0class:"),
    Slip("no space behind the colon", r"^  class: ", "  class:"),
    Slip("unit spelled out", r"^(    time: \S+) h$", r"\1 hours"),
    Slip("decimal comma", r"^(  mass: \d+)\.(\d{1,2}) g$", r"\1,\2 g"),
    Slip("date with dots", r"date: (\d{4})-(\d\d)-(1[3-9]|[23]\d)", r"date: \3.\2.\1"),
)


def look(text: str) -> tuple[Finding, ...]:
    """Return what the reader finds."""
    return read_bytes(text.encode(), "NS.yml").findings


def table(paths: Iterable[Path] = ENTRIES) -> str:
    """Return a table of slips: how many records were spoilt, how many came back as they were."""
    sound = [path.read_text("utf-8") for path in paths]
    lines = [f"Slips put into {len(sound)} records, and mended by `check --fix` to the byte"]
    for slip in SLIPS:
        spoilt = [(text, bad) for text in sound if (bad := slip.spoil(text)) != text]
        mended = sum(mend(bad, look, lambda finding: finding.is_sure)[0] == text for text, bad in spoilt)
        lines.append(f"  {slip.name:<30}{mended:>4}/{len(spoilt)}")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    sys.stdout.write(table())
