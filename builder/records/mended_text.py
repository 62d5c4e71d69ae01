"""Text that is no YAML: the reason in the writer's words and, where there is one exact mend, the text as mended.

Reading goes on with the mended text, so that one run reports everything; places stay those of the file as written.
"""

import re
from dataclasses import dataclass
from itertools import takewhile
from typing import NamedTuple, Self

import yaml

from builder.finding import Finding, Place
from builder.records.rules import reading_rule
from builder.rule import Fault

__all__ = ["STRUCTURE_KEYS", "GluedPair", "MendedText", "Span", "quoted"]


class Span(NamedTuple):
    """What a Place holds beside its file; a record has a hundred and more, few of which anyone asks for."""

    line: int
    column: int
    end_column: int
    goes_on: bool = False


_LONGEST_LINE = 8_000
"""Twice the longest text a record may hold; beyond it no slip of a writer is looked for."""

_FARTHEST_LINE = 300
"""How far above a line it is looked for what that line goes on with; a long record has as many lines in all."""

STRUCTURE_KEYS = frozenset({"smiles", "inchi", "sought"})

_KEY = r"[A-Za-z_]+"
_QUOTED = r"(?>'(?:[^']|'')*'|\"(?:[^\"\\]|\\.)*\")"  # atomic: 'it''s' is one text, not two
_KEY_AND_VALUE = re.compile(rf"^(?P<head>\s*(?:- +)*(?P<key>{_KEY}): +)(?P<value>\S.*?)(?P<tail>\s+#.*)?\s*$")
_ITEM = re.compile(rf"^(?P<head>\s*(?:- +)+)(?!{_KEY}:\s)(?P<value>\S.*?)(?P<tail>\s+#.*)?\s*$")
_FLOW_SMILES = re.compile(r"(?P<key>smiles|inchi|sought): +(?P<value>[^\s'\"{,][^\s,}]*|\"[^\"]*\")")
_FLOW_TEXTS = (
    # 'fast' azide, and Run #3 of azide, as one value among several
    re.compile(rf"{_KEY}: +(?P<value>{_QUOTED} *[^\s,\]}}#][^,\]}}]*)"),
    re.compile(rf"{_KEY}: +(?P<value>[^\s'\"\[{{,#][^'\"\[\]{{}},#]* #[^\s#][^,\]}}]*)(?=[,\]}}])"),
)
_WIDE_SPACES = "\u00a0\u1680\u2000-\u200a\u202f\u205f\u3000"
_GLUED = re.compile(rf"(?P<key>[a-z_]{{2,}}):[{_WIDE_SPACES}]*(?P<value>[^\s:/].*)")
_CONTENT = re.compile(r"^\s*(?:- +)*(?P<content>\S.*?)(?:\s+#.*)?\s*$")
_WIDE_MARGIN = re.compile(rf"^ *(?P<wide>[{_WIDE_SPACES}][ {_WIDE_SPACES}]*)(?=- |{_KEY}:(?: |$))")

_SAID = {
    # what libyaml says -> the same at the bench, and what to do
    "mapping values are not allowed in this context": (
        "a colon with a space behind it, inside a text",
        "put the text in quotes, or begin the line where the keys above begin",
    ),
    "could not find expected ':'": ("a line without key and colon", "write key: value"),
    "did not find expected key": ("no key begins here", "write key: value"),
    "did not find expected '-' indicator": ("a list item begins with a dash", "begin the line with - "),
    "did not find expected ',' or ']'": ("a comma or ] is wanted here", "set it, or put the text in quotes"),
    "did not find expected ',' or '}'": ("a comma or } is wanted here", "set it, or put the text in quotes"),
    "found undefined alias": ("YAML reads what begins with * as an alias", "put the text in quotes"),
    "found unknown escape character": ("a backslash inside double quotes", "use single quotes"),
    "found character that cannot start any token": ("no text begins with this character", "put it in quotes"),
}


def quoted(text: str) -> str:
    """Return `text` as a single-quoted YAML scalar."""
    return "'" + text.replace("'", "''") + "'"


@dataclass(frozen=True, slots=True)
class GluedPair:
    """A key and its value without the plain space between them that YAML wants."""

    key: str
    value: str

    @classmethod
    def of(cls, text: str) -> Self | None:
        """Return the pair that `text` as a whole is, such as class:primary; None for any other text."""
        glued = _GLUED.fullmatch(text)
        return cls(glued["key"], glued["value"]) if glued else None

    @property
    def message(self) -> str:
        """Return what is wrong with it."""
        return f"a space is missing after {self.key}:"

    @property
    def fix(self) -> str:
        """Return it as YAML reads it."""
        return f"{self.key}: {self.value}"


class MendedText:
    """A file's text with in-memory mends, able to say where something stood before them."""

    def __init__(self, text: str, file: str) -> None:
        self.text, self.file = text, file
        self._shifts: list[tuple[int, int, int]] = []  # line, column, characters put in before it

    def place(self, line: int, column: int, end_column: int) -> Place:
        """Return the place in the file as written of a 0-based position in the mended text."""
        return Place(self.file, *self.span(line, column, end_column))

    def is_as_written(self, first: int, last: int) -> bool:
        """Say whether the lines from `first` to `last`, counted from 0, stand in the file as they stand here."""
        return not any(first <= line <= last for line, _, _ in self._shifts)

    def span(self, line: int, column: int, end_column: int, *, goes_on: bool = False) -> Span:
        """Return that place without its file."""
        if not self._shifts:
            return Span(line + 1, column + 1, end_column + 1, goes_on)
        shift = sum(more for on, behind, more in self._shifts if on == line and behind < column)
        end_shift = sum(more for on, behind, more in self._shifts if on == line and behind < end_column)
        return Span(line + 1, column - shift + 1, max(end_column - end_shift, column - shift + 1) + 1, goes_on)

    def mend_margins(self) -> list[Finding]:
        """Put plain spaces where others indent a key; YAML would take those for a part of its name."""
        lines = self.text.split("\n")
        wide = [(number, match) for number, line in enumerate(lines) if (match := _WIDE_MARGIN.match(line))]
        return [
            self._replace(
                number,
                match.start("wide"),
                match["wide"],
                " " * len(match["wide"]),
                "yaml-unreadable",
                "a no-break space in the margin",
            )
            for number, match in wide
        ]

    def explain(self, error: yaml.MarkedYAMLError) -> tuple[Finding, bool]:
        """Return the finding for a YAML error, and whether its cause has been mended in memory."""
        mark = error.problem_mark or error.context_mark
        problem, context = error.problem or "not YAML", error.context or ""
        if "exceeded maximum" in problem:
            return self._finding(
                "nesting-too-deep", mark, "more levels than any record needs", "close the brackets"
            ), False
        for candidate in (error.problem_mark, error.context_mark):
            finding = self._mend_line(candidate.line) if candidate is not None else None
            if finding is not None:
                return finding, True
        above = self._line_above(mark.line) if mark is not None else None
        finding = self._mend_missing_space(above) if above is not None else None
        if finding is not None:
            return finding, True
        return self._unmended(problem, context, mark, error.context_mark), False

    def _unmended(self, problem: str, context: str, mark: yaml.Mark | None, opened: yaml.Mark | None) -> Finding:
        """Return the finding of a fault that has no one exact mend."""
        if "single document" in context:
            mend = "keep one record a file, without lines of ---"
            return self._finding("yaml-unreadable", mark, "more than one document", mend)
        is_quote = opened is not None and "quoted scalar" in context and "escape" not in problem
        unclosed = opened if is_quote else self._unclosed(mark, opened)
        if unclosed is not None:
            sign = self.text[unclosed.index]
            what, closing = {"[": ("bracket", "]"), "{": ("bracket", "}")}.get(sign, ("quote", sign))
            return self._finding(
                "yaml-unreadable", unclosed, f"this {what} is never closed", f"close it with {closing}"
            )
        misindented = self._misindented(mark.line) if mark is not None else None
        if misindented is not None:
            return misindented
        if opened is not None and problem == "could not find expected ':'":
            mark = opened
        said, mend = _SAID.get(problem, (problem, "indent with spaces, quote texts with : or #"))
        return self._finding("yaml-unreadable", mark, said, mend)

    # mends of one line

    def _mend_line(self, number: int) -> Finding | None:
        line = self._line(number)
        margin = line[: len(line) - len(line.lstrip())]
        if "\t" in margin:
            width = len(margin.expandtabs(2))
            indent = self._nearest_level(number, width)
            said, is_sure = "a tab in the margin", indent == width
            return self._replace(number, 0, margin, " " * indent, "yaml-unreadable", said, is_sure=is_sure)
        flow = self._flow_smiles(line)
        if flow is not None:
            return self._quote(number, flow.start("value"), flow["value"], "smiles-unquoted")
        text = _flow_text(line)
        if text is not None:
            return self._quote(number, text.start("value"), text["value"].rstrip(), "yaml-unreadable")
        whole = _KEY_AND_VALUE.match(line) or _ITEM.match(line)
        key = whole.groupdict().get("key") if whole else None
        if whole and _needs_quotes(whole["value"], is_structure=key in STRUCTURE_KEYS):
            rule = "smiles-unquoted" if key in STRUCTURE_KEYS else "yaml-unreadable"
            return self._quote(number, whole.start("value"), whole["value"], rule)
        return self._mend_missing_space(number)

    def _mend_missing_space(self, number: int) -> Finding | None:
        written = _CONTENT.match(self._line(number))
        glued = GluedPair.of(written["content"]) if written else None
        if written is None or glued is None:
            return None
        column, mend = written.start("content"), f"write {glued.fix}"
        return self._replace(number, column, written["content"], glued.fix, "yaml-unreadable", glued.message, mend)

    def _line(self, number: int) -> str:
        """Return a line to look for slips in; nothing for one that is too long to be a writer's."""
        lines = self.text.split("\n")
        return lines[number] if number < len(lines) and len(lines[number]) <= _LONGEST_LINE else ""

    def _flow_smiles(self, line: str) -> re.Match[str] | None:
        matches = _FLOW_SMILES.finditer(line)
        return next((match for match in matches if _needs_quotes(match["value"], is_structure=True)), None)

    def _quote(self, number: int, column: int, value: str, rule: str) -> Finding:
        fix = quoted(value[1:-1] if _is_one_text(value) else value)
        return self._replace(number, column, value, fix, rule, f"YAML cannot read {value}", f"write {fix}")

    def _replace(
        self,
        number: int,
        column: int,
        old: str,
        new: str,
        rule: str,
        message: str,
        mend: str = "indent with spaces",
        *,
        is_sure: bool = True,
    ) -> Finding:
        """Put `new` in the place of `old`, and return the finding that says so."""
        end = column + len(old)
        fault = Fault(at=(), message=message, mend=mend, fix=new, is_sure=is_sure)
        finding = reading_rule(rule).finding(fault, self.place(number, column, end))
        lines = self.text.split("\n")
        lines[number] = lines[number][:column] + new + lines[number][end:]
        self.text = "\n".join(lines)
        unmoved = sum(1 for _ in takewhile(lambda pair: pair[0] == pair[1], zip(old, new, strict=False)))
        self._shifts.append((number, column + unmoved, len(new) - len(old)))
        return finding

    # faults of several lines

    def _unclosed(self, mark: yaml.Mark | None, opened: yaml.Mark | None) -> yaml.Mark | None:
        """Return where the quote or bracket opens that swallowed the lines up to `mark`, if one did."""
        if mark is None:
            return None
        start: yaml.Mark
        open_brackets: list[yaml.Mark] = []
        try:
            for token in yaml.scan(self.text, yaml.CSafeLoader):
                start, end = token.start_mark, token.end_mark
                if isinstance(token, (yaml.FlowSequenceStartToken, yaml.FlowMappingStartToken)):
                    open_brackets.append(start)
                elif isinstance(token, (yaml.FlowSequenceEndToken, yaml.FlowMappingEndToken)) and open_brackets:
                    open_brackets.pop()
                is_quoted = isinstance(token, yaml.ScalarToken) and token.style in {"'", '"'}
                if is_quoted and start.line < end.line == mark.line and end.index <= mark.index:
                    return start
        except yaml.MarkedYAMLError:
            pass  # what has been seen up to here is enough
        if opened is None or opened.line == mark.line:
            return None
        return next((each for each in open_brackets if each.index == opened.index), next(iter(open_brackets), None))

    def _line_above(self, number: int) -> int | None:
        """Return the nearest line above that holds more than a comment."""
        lines = self.text.split("\n")
        return next((n for n in range(number - 1, -1, -1) if re.match(r"\s*[^\s#]", lines[n])), None)

    def _levels_above(self, number: int) -> list[int]:
        """Return the columns at which a line may begin that goes on with what stands above; empty for any column."""
        lines = self.text.split("\n")
        above = self._line_above(number)
        if above is None or lines[above].rstrip().endswith(":"):
            return []
        line = lines[number] if number < len(lines) else ""  # the text may end where something more is wanted
        is_item = line.lstrip().startswith("- ")
        levels: set[int] = set()
        lowest = len(self.text)
        for line in reversed(lines[max(0, above - _FARTHEST_LINE) : above + 1]):
            begins = re.match(r"(?P<margin> *)(?P<dashes>(?:- +)*)(?=[^\s#])", line)
            if begins is None:
                continue
            margin, key = begins.end("margin"), begins.end("dashes")
            if is_item and margin < key and margin <= lowest:
                levels.add(margin)
            if not is_item and (key < lowest or margin == key == lowest):
                levels.add(key)
            lowest = min(lowest, margin)
            if key == 0:
                break
        return sorted(levels)

    def _nearest_level(self, number: int, column: int) -> int:
        levels = self._levels_above(number)
        return min(levels, key=lambda level: (abs(level - column), -level), default=column)

    def _misindented(self, number: int) -> Finding | None:
        """Return the finding of a line that begins at no level of the lines above; None where it is in step."""
        lines = self.text.split("\n")
        levels = self._levels_above(number)
        if number >= len(lines) or not levels:
            return None
        column = len(lines[number]) - len(lines[number].lstrip(" "))
        if column in levels:
            return None
        message = f"indented by {column}; the lines above go on at {' or '.join(map(str, levels))}"
        fault = Fault(at=(), message=message, mend=f"indent it by {self._nearest_level(number, column)}")
        place = self.place(number, column, max(len(lines[number].rstrip()), column + 1))
        return reading_rule("yaml-unreadable").finding(fault, place)

    def _finding(self, rule: str, mark: yaml.Mark | None, message: str, mend: str) -> Finding:
        line, column = (mark.line, mark.column) if mark is not None else (0, 0)
        fault = Fault(at=(), message=message, mend=mend)
        return reading_rule(rule).finding(fault, self.place(line, column, column + 1))


def _flow_text(line: str) -> re.Match[str] | None:
    """Return the value inside [ ] or { } on this line that wants quotes as a whole."""
    found = (match for pattern in _FLOW_TEXTS for match in pattern.finditer(line))
    return next((match for match in found if re.search(r"[\[{][^\]}]*$", line[: match.start()])), None)


def _is_one_text(value: str) -> bool:
    """Say whether one pair of quotes stands around it all: around a SMILES, or 'it's late' with its apostrophe."""
    if value[0] != value[-1] or len(value) == 1:
        return False
    return (value[0] == '"' and value.count('"') == 2) or (value[0] == "'" and value.count("'") % 2 == 1)


def _needs_quotes(value: str, *, is_structure: bool) -> bool:
    """Say whether a value without quotes is one that YAML cannot read as text."""
    closed = re.match(_QUOTED, value)
    if closed and closed.end() < len(value):
        return True
    if value.startswith("'"):
        return False
    if value.startswith('"'):
        return value.endswith('"') and len(value) > 1 and "\\" in value
    if value[0] in "[{":
        is_closed = value.endswith({"[": "]", "{": "}"}[value[0]])
        is_text = "][" in value or bool(re.search(r"\][^\s,\]}]", value))
        return is_text or (is_structure and not is_closed)
    if re.fullmatch(r"[|>][-+0-9]*", value):
        return False
    return value[0] in "@`%&*!|>" or value.startswith("- ") or ": " in value or value.endswith(":")
