"""`handbook check --fix`: mends put into the text of a file, every other byte of which stays as it was.

A mend is kept only if the file, read again, says so: its finding is gone, no error came, and every value outside the
edited stretches reads as before, digit for digit. All mends of a file are tried together; where that fails, the
halves are, until those that do not hold are left out.
"""

import re
import sys
from bisect import bisect_right, insort
from collections import Counter
from collections.abc import Callable, Collection, Iterable, Sequence
from dataclasses import dataclass, replace
from difflib import unified_diff
from functools import lru_cache
from itertools import accumulate
from pathlib import Path
from typing import Any

from builder.authoring.whole_file import written_whole
from builder.book import Book, examined_again
from builder.finding import Edit, Finding, Level
from builder.records.mended_text import STRUCTURE_KEYS, quoted
from builder.records.reader import read_bytes
from builder.records.rules import READING_RULES
from builder.records.settings import SETTINGS_FILE
from builder.records.yaml_text import Plainly, leaves, read_plain
from builder.records.yaml_writing import is_bare

__all__ = ["Mended", "diff_of", "exact_edits", "mend", "mended_files", "with_exact_edits", "write_mended"]

Look = Callable[[str], Sequence[Finding]]
"""What is found in a text."""

MOST_ROUNDS = 20
"""A mend may bring another to light; files that are not at rest after this many rounds are left alone."""

_BOM = "\ufeff"
_LINE = re.compile(r"[^\r\n]*(?:\r\n|\r|\n|$)")
_READING = frozenset(rule.id for rule in READING_RULES)
_NUMBER_OR_FLAG = re.compile(r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?|true|false")
_SIGN = re.compile(r"^(?:[<≤≥] ?)?[-+−]?(?=\d)")
_PAIR = re.compile(r"[a-z_]+: .*")

Span = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Mended:
    """A file with what was mended in it; the texts with their byte-order mark and line ends.

    file: as findings show it. applied: places in the text as it was when each was mended.
    """

    file: str
    path: Path
    before: str
    after: str
    applied: tuple[Finding, ...]


def mended_files(book: Book[Any], findings: Iterable[Finding], offered: Collection[str] = ()) -> list[Mended]:
    """Return the files in which some of `findings` can be mended, with their mends; nothing is written.

    offered: rules whose mends are put in also where something else may be meant.
    A file that is a link, or lies behind one, is left alone.
    """

    def is_wanted(finding: Finding) -> bool:
        is_mendable = finding.fix is not None or bool(finding.edits)
        return is_mendable and finding.accepted is None and (finding.is_sure or finding.rule in offered)

    mended = []
    wanted = [finding for finding in findings if is_wanted(finding)]
    for file in dict.fromkeys(finding.place.file for finding in wanted):
        path = book.folder.parent / file
        if path.resolve() != path:
            continue
        before = path.read_bytes().decode("utf-8")
        needs_checks = any(each.rule not in _READING for each in wanted if each.place.file == file)
        after, applied = mend(before, _look(book, file, with_checks=needs_checks), is_wanted)
        if applied:
            mended.append(Mended(file, path, before, after, applied))
    return mended


def write_mended(mended: Mended) -> bool:
    """Write a mended file; False if it changed since it was read, and then it is left as it is."""
    if mended.path.read_bytes() != mended.before.encode():
        return False
    with written_whole(mended.path) as file:
        file.write(mended.after)
    return True


def diff_of(mended: Mended) -> str:
    """Return a unified diff of a file, as `git apply` and `patch -p1` take it."""
    before, after = (text.splitlines(keepends=True) for text in (mended.before, mended.after))
    lines = unified_diff(before, after, f"a/{mended.file}", f"b/{mended.file}")
    return "".join(line if line.endswith("\n") else f"{line}\n\\ No newline at end of file\n" for line in lines)


def with_exact_edits(book: Book[Any], findings: Iterable[Finding]) -> list[Finding]:
    """Return the findings, those that have a mend with the edits of their file."""
    texts: dict[str, str] = {}
    exact = []
    for finding in findings:
        file = finding.place.file
        if finding.fix is not None and not finding.edits and file not in texts:
            texts[file] = (book.folder.parent / file).read_bytes().decode("utf-8", "replace")
        exact.append(replace(finding, edits=exact_edits(finding, texts.get(file, ""))))
    return exact


def exact_edits(finding: Finding, text: str) -> tuple[Edit, ...]:
    """Return the edits of `text` that mend a finding; empty where it has no exact mend."""
    place, fix = finding.place, finding.fix
    if finding.edits or fix is None or place.goes_on:
        return finding.edits
    line = _lines_of(text).line(place.line)
    written = line[place.column - 1 : place.end_column - 1]
    new = _as_written(fix, written, before=line[: place.column - 1])
    return (Edit(place.line, place.column, place.line, place.end_column, new),) if new != written else ()


def mend(text: str, look: Look, is_wanted: Callable[[Finding], bool]) -> tuple[str, tuple[Finding, ...]]:
    """Return `text` with every wanted mend that holds, and the findings so mended.

    look: finds what is wrong; it is asked again after each edit. The same text comes back where there is nothing to do.
    """
    now, applied = text, list[Finding]()
    for _ in range(MOST_ROUNDS):
        trial = _Trial.of(now, look)
        held = trial.holding([finding for finding in trial.findings if is_wanted(finding)])
        if not held:
            return now, tuple(applied)
        now = trial.edited(held).text
        applied += held
    return text, ()


def _look(book: Book[Any], file: str, *, with_checks: bool) -> Look:
    """Return what looks at a text in the place of a file: the checks as well, or the reader alone, which is quick."""
    if with_checks or file.endswith(f"/{SETTINGS_FILE}"):
        return lambda text: examined_again(book, file, text.encode())
    return lambda text: read_bytes(text.encode(), file).findings


# --- one text -----------------------------------------------------------------------------------------------


class _Lines:
    """The lines of a text with any line ends; places are counted behind a byte-order mark, as the reader does."""

    def __init__(self, text: str) -> None:
        first = len(_BOM) if text.startswith(_BOM) else 0
        self._lines = _LINE.findall(text[first:])
        self.starts = list(accumulate(map(len, self._lines), initial=first))

    def line(self, number: int) -> str:
        """Return a line without its end; empty behind the last one."""
        return str(self._lines[number - 1]).rstrip("\r\n") if number <= len(self._lines) else ""

    def offset(self, line: int, column: int) -> int:
        """Return the position in the text of a place, which never lies beyond the end of its line."""
        start = self.starts[min(line, len(self.starts)) - 1]
        return start + min(column - 1, len(self.line(line)))


@lru_cache(maxsize=4)
def _lines_of(text: str) -> _Lines:
    return _Lines(text)


@dataclass(frozen=True, slots=True)
class _Edited:
    """A text after some edits, with the stretches that were edited, before and after."""

    text: str
    before: tuple[Span, ...]
    after: tuple[Span, ...]


@dataclass(frozen=True, slots=True)
class _Trial:
    """One text, what is found in it, and what it says."""

    text: str
    findings: tuple[Finding, ...]
    look: Look

    @classmethod
    def of(cls, text: str, look: Look) -> "_Trial":
        return cls(text, tuple(look(text)), look)

    def holding(self, chosen: Sequence[Finding]) -> list[Finding]:
        """Return those of `chosen` that can be mended together so that all of it holds."""
        apart = self._apart(chosen)
        if not apart:
            return []
        if self._holds(apart):
            return apart
        if len(apart) == 1:
            return []
        first, second = self.holding(apart[: len(apart) // 2]), self.holding(apart[len(apart) // 2 :])
        return [*first, *second] if not (first and second) or self._holds([*first, *second]) else first

    def edited(self, chosen: Sequence[Finding]) -> _Edited:
        """Return the text with the edits of `chosen`, which do not overlap."""
        spots = sorted((*self._span(edit), edit.text) for each in chosen for edit in exact_edits(each, self.text))
        pieces, before, after = list[str](), list[Span](), list[Span]()
        done = length = 0
        for start, end, new in spots:
            pieces += [self.text[done:start], new]
            length += start - done + len(new)
            before.append((start, end))
            after.append((length - len(new), length))
            done = end
        return _Edited("".join([*pieces, self.text[done:]]), tuple(before), tuple(after))

    def _span(self, edit: Edit) -> Span:
        lines = _lines_of(self.text)
        return lines.offset(edit.line, edit.column), lines.offset(edit.end_line, edit.end_column)

    def _apart(self, chosen: Sequence[Finding]) -> list[Finding]:
        """Return the findings whose edits do not meet those of one before them."""
        taken: list[Span] = []
        apart = []
        for finding in chosen:
            spans = [self._span(edit) for edit in exact_edits(finding, self.text)]
            if spans and not any(_meets(span, taken) for span in spans):
                for span in spans:
                    insort(taken, span)
                apart.append(finding)
        return apart

    def _holds(self, chosen: Sequence[Finding]) -> bool:
        """Say whether the text with these mends says what it said, but for what was mended."""
        edited = self.edited(chosen)
        was, now = _plainly(self.text), _plainly(edited.text)
        if was.value is None or now.value is None:
            return False
        found = self.look(edited.text)
        rules, rules_now = (Counter(each.rule for each in each_found) for each_found in (self.findings, found))
        if any(rules_now[rule] > rules[rule] - mended for rule, mended in Counter(f.rule for f in chosen).items()):
            return False
        if leaves(was.value) == leaves(now.value):
            return self._are_fewer(chosen, edited, found)
        return not self._has_new_errors(found) and _untouched(was, self.text, edited.before) == _untouched(
            now, edited.text, edited.after
        )

    def _are_fewer(self, chosen: Sequence[Finding], edited: _Edited, found: Sequence[Finding]) -> bool:
        """Say whether the errors that were mended are missing from the edited lines, and no other came there.

        Elsewhere an edit that changes no value can bring none: what is found there was hidden.
        """
        mended = sum(finding.level is Level.ERROR for finding in chosen)
        was = _errors_on(self.findings, self.text, edited.before)
        still_there = [(start, end) for start, end in edited.after if start < end]
        return _errors_on(found, edited.text, still_there) <= was - mended

    def _has_new_errors(self, found: Sequence[Finding]) -> bool:
        """Say whether there are more errors of a rule than there were.

        Where the record could not be read, its chemistry could not be checked, and what is found there is not new.
        """
        was, now = (
            Counter(each.rule for each in findings if each.level is Level.ERROR) for findings in (self.findings, found)
        )
        could_be_read = not any(rule in _READING for rule in was)
        return any(count > was[rule] for rule, count in now.items() if could_be_read or rule in _READING)


def _meets(span: Span, taken: Sequence[Span]) -> bool:
    """Say whether a stretch overlaps or touches one of `taken`, which are sorted and apart."""
    start, end = span
    at = bisect_right(taken, (end, sys.maxsize))
    return at > 0 and taken[at - 1][1] >= start


def _errors_on(findings: Iterable[Finding], text: str, edited: Sequence[Span]) -> int:
    """Return how many errors stand on lines of which a stretch was edited."""
    starts = _lines_of(text).starts
    lines = {bisect_right(starts, start) for start, _ in edited}
    return sum(each.level is Level.ERROR and each.place.line in lines for each in findings)


def _plainly(text: str) -> Plainly:
    return read_plain(text.removeprefix(_BOM).replace("\r\n", "\n").replace("\r", "\n"), "")


def _untouched(plainly: Plainly, text: str, edited: Sequence[Span]) -> dict[tuple[str | int, ...], tuple[str, str]]:
    """Return the values of a text that do not stand in an edited stretch, nor below a key that does."""
    lines = _lines_of(text)
    stretches = sorted(edited)
    starts = [start for start, _ in stretches]

    def is_edited(line: int, column: int, end_column: int) -> bool:
        start, end = lines.offset(line, column), lines.offset(line, end_column)
        nearest = bisect_right(starts, end - 1) - 1
        return nearest >= 0 and stretches[nearest][1] > start

    values, keys = plainly.places.values, plainly.places.keys
    touched = {path for path, span in keys.items() if is_edited(*span[:3])}
    kept = {}
    for path, leaf in leaves(plainly.value).items():
        is_below = any(path[:depth] in touched for depth in range(1, len(path) + 1))
        if not is_below and not (path in values and is_edited(*values[path][:3])):
            kept[path] = leaf
    return kept


def _as_written(fix: str, written: str, *, before: str) -> str:
    """Return a fix in the quotes of what it replaces, or in those it needs; YAML as it stands is left alone.

    before: the line up to it, whose last key may call for a structure.
    """
    if fix[:1] in {"'", '"'} or not fix.strip() or _NUMBER_OR_FLAG.fullmatch(fix):
        return fix
    if written[:1] == '"' and not re.search(r'["\\]', fix):
        return f'"{fix}"'
    if written[:1] in {"'", '"'}:
        return quoted(fix)
    key = re.search(r"(\w+): *$", before)
    if fix.startswith("[") and not (key and key[1] in STRUCTURE_KEYS):
        return fix
    return fix if _PAIR.fullmatch(fix) or is_bare(_SIGN.sub("", fix), is_in_flow=True) else quoted(fix)
