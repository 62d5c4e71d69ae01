"""Findings -> text and JSON. A message becomes text only here, at the edge."""

import json
from collections.abc import Callable, Iterable, Sequence
from dataclasses import asdict
from functools import cache
from itertools import groupby
from pathlib import Path
from typing import Any

from builder.finding import Finding, Level
from builder.records.reader import MAX_BYTES
from builder.rule import Rule
from builder.sources import source_text

__all__ = ["render_json", "render_rule", "render_text", "summary"]

MOST_SHOWN = 50
"""Findings of one file that a terminal is shown; beyond that a file needs mending as a whole."""


def render_text(findings: Iterable[Finding], folder: Path) -> str:
    """Return findings for a terminal, one block each, quoting the lines they speak of.

    folder: the book's, below which the files of the findings lie.
    """
    line_of = _quoting(folder)
    blocks: list[str] = []
    for file, found in groupby(findings, key=lambda finding: finding.place.file):
        shown = list(found)
        blocks += [_block(each, line_of(file, each.place.line)) for each in shown[:MOST_SHOWN]]
        if len(shown) > MOST_SHOWN:
            blocks.append(f"{file}: {len(shown) - MOST_SHOWN} more; mend these first, or see --json\n")
    return "\n".join(blocks)


def _quoting(folder: Path) -> Callable[[str, int], str | None]:
    inside = folder.resolve()

    @cache
    def lines(file: str) -> list[str]:
        path = (inside.parent / file).resolve()
        if not (path.is_relative_to(inside) and path.is_file() and path.stat().st_size <= MAX_BYTES):
            return []
        return path.read_text("utf-8-sig", "replace").splitlines()

    def line_of(file: str, number: int) -> str | None:
        found = lines(file)
        return found[number - 1] if number <= len(found) else None

    return line_of


def render_json(findings: Iterable[Finding], mended: Iterable[Finding] | None = None) -> str:
    """Return `{"findings": [...]}`, and those that were "mended" where it was tried; the keys of a finding are stable.

    The edits of a finding are those that `fix` comes to, in lines and columns counted from 1, the end exclusive.
    """
    plain = {"findings": [_plain(finding) for finding in findings]}
    if mended is not None:
        plain["mended"] = [_plain(finding) for finding in mended]
    return json.dumps(plain, indent=2)


def render_rule(rule: Rule[object, object], *, as_json: bool) -> str:
    """Return one rule's card as text or JSON."""
    card: dict[str, Any] = {
        "id": rule.id,
        "title": rule.title,
        "level": str(rule.level),
        "statement": rule.statement,
        "reason": rule.reason,
        "effect": rule.effect,
        "source": source_text(rule.source),
        "fires_on": list(rule.fires_on),
        "silent_on": list(rule.silent_on),
    }
    if as_json:
        return json.dumps(card, indent=2)
    parts = [f"{rule.id} ({rule.level}): {rule.title}", "", rule.statement]
    parts += ["", rule.reason] if rule.reason else []
    parts += ["", rule.effect] if rule.effect else []
    parts += ["", f"source: {card['source']}"]
    for heading, examples in (("fires on:", rule.fires_on), ("silent on:", rule.silent_on)):
        for example in examples:
            parts += ["", heading, *(f"    {line}" for line in example.splitlines())]
    return "\n".join(parts)


def summary(findings: Sequence[Finding], records: int, *, were_mended: bool = False) -> str:
    """Return a line that says how many records and open findings of each level there are.

    A line follows for each house rule not kept, and one on what can be mended.
    were_mended: what could be mended by itself has been, so that what is left needs a person.
    """
    open_findings = [finding for finding in findings if finding.accepted is None]
    counts = [(level, sum(finding.level is level for finding in open_findings)) for level in Level]
    words = [f"{count} {_plural(level, count)}" for level, count in counts if count]
    accepted = len(findings) - len(open_findings)
    words += [f"{accepted} accepted"] if accepted else []
    checked = f"{records} record{'s' * (records != 1)} checked"
    sure = sum(finding.is_sure for finding in open_findings)
    if were_mended:
        hand = f"{sure} of these could not be mended without a change elsewhere in the file: mend by hand"
    else:
        hand = f"{sure} of these can be mended: `handbook check --diff` shows how, --fix does it"
    mends = [hand] if sure else []
    return "\n".join([f"{checked}: {', '.join(words) if words else 'nothing found'}", *_house_rules(findings), *mends])


def _house_rules(findings: Iterable[Finding]) -> list[str]:
    """Return a line for each house rule that was found not to be kept: how often, and how often that was accepted."""
    found: dict[tuple[object, object], list[Finding]] = {}
    for finding in findings:
        if "house_rule" in finding.data:
            found.setdefault((finding.data["house_rule"], finding.data["because"]), []).append(finding)
    lines = []
    for (rule, because), of_rule in found.items():
        accepted = sum(finding.accepted is not None for finding in of_rule)
        counts = [(len(of_rule) - accepted, "not kept"), (accepted, "set aside with a reason")]
        said = ", ".join(f"{said} {count} time{'s' * (count != 1)}" for count, said in counts if count)
        lines.append(f"house rule: {rule} – {because}: {said}")
    return lines


def _plural(level: Level, count: int) -> str:
    many = {Level.QUERY: "queries"}.get(level, f"{level}s")
    return str(level) if count == 1 else many


def _block(finding: Finding, line: str | None) -> str:
    place = finding.place
    parts = [f"{place}: {finding.level} {finding.rule}: {finding.message}"]
    if line is not None and line.strip():
        marks = "^" * max(1, min(place.end_column, len(line) + 1) - place.column)
        number = f"{place.line:>7} | "
        parts += [number + line, " " * (len(number) - 2) + "| " + " " * (place.column - 1) + marks]
    parts.append(f"  why:  {finding.why}")
    if finding.accepted is not None:
        parts.append(f"  accepted: {finding.accepted}")
    else:
        parts.append(f"  fix:  {finding.mend}{_how_applied(finding)}")
    parts.append(f"  more: handbook rule {finding.rule}")
    return "\n".join(parts) + "\n"


def _how_applied(finding: Finding) -> str:
    if finding.fix is None and not finding.edits:
        return ""
    return "  [--fix]" if finding.is_sure else f"  [--fix --offered {finding.rule}]"


def _plain(finding: Finding) -> dict[str, Any]:
    return {
        "rule": finding.rule,
        "level": str(finding.level),
        "message": finding.message,
        "why": finding.why,
        "mend": finding.mend,
        "fix": finding.fix,
        "edits": [asdict(edit) for edit in finding.edits],
        "is_sure": finding.is_sure,
        "source": source_text(finding.source),
        "file": finding.place.file,
        "line": finding.place.line,
        "column": finding.place.column,
        "end_column": finding.place.end_column,
        "accepted": finding.accepted,
        "data": dict(finding.data),
    }
