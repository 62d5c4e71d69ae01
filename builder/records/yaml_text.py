"""YAML text -> plain values, with the place of every one.

libyaml composes the node graph; our own constructor gives it YAML 1.2 core meaning (PyYAML's is 1.1), keeps the
typed digits of numbers, refuses tags and repeated keys, bounds depth and aliases, and notes line and column of
every key and value. Where the text is no YAML for a reason with one exact mend (an unquoted SMILES, say),
`mended_text` applies it in memory and reading goes on, so that one run reports everything.
"""

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from decimal import Decimal

import yaml
from yaml.cyaml import CParser  # type: ignore[attr-defined]  # the stubs leave out the re-export

from builder.finding import Finding, Place
from builder.records.mended_text import STRUCTURE_KEYS, GluedPair, MendedText, Span, quoted
from builder.records.quantities import comma_error, is_beyond_measure
from builder.records.repeated_keys import repeated_pair_edits
from builder.records.rules import reading_rule
from builder.records.specimen import GAP
from builder.rule import Fault
from builder.rule import Path as ValuePath

__all__ = ["Places", "Plain", "Plainly", "is_read_alike", "leaves", "read_plain"]

MAX_DEPTH = 16
MAX_VALUES = 20_000
MAX_MENDS = 25
_MOST_PLACES = 6
"""Of a number that is still easier to read in full than as a power of ten."""

Plain = str | int | Decimal | bool | None | list["Plain"] | dict[str, "Plain"]

_TEXT_KEYS = frozenset(
    {"add", "atmosphere", "basis", "because", "by", "cause", "end_point", "evidence", "finding", "form", "name"}
    | {"note", "notebook", "procedure", "scale_limit", "scope", "source", "take_away", "title", "what", "work_up"}
    | {"code", "contact", "group", "house_rules", "licence", "notice", "shown_as"}
    | {"banned_solvents", "instead", "required", "reviewers", "rule"}
)
"""Of record and settings; a test holds them to the models, which the text is read without."""

_INTEGER = re.compile(r"[-+]?[0-9]+")
_FLOAT = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
_ALTERED_NUMBER = re.compile(r"[-+]?0\d+(\.\d*)?|0o[0-7]+|0x[0-9a-fA-F]+|[-+]?\.(inf|Inf|INF)|\.(nan|NaN|NAN)")
# What a YAML 1.1 reader takes for a boolean, a number to base 60, a number with underscores, or (1e-4) for text.
_OTHERWISE_IN_1_1 = re.compile(
    r"y|Y|yes|Yes|YES|n|N|no|No|NO|on|On|ON|off|Off|OFF|=|[-+]?\d[\d_]*(:[0-5]?\d)+(\.\d*)?|[-+]?\d+_[\d_]*"
    r"|[-+]?\d+[eE][-+]?\d+|[-+]?\d*\.\d*[eE]\d+"
)
_WORDS = {"": None, "null": None, "Null": None, "NULL": None, "~": None}
_BOOLEANS = {"true": True, "True": True, "TRUE": True, "false": False, "False": False, "FALSE": False}


_FIRST_CHARACTER = Span(1, 1, 2)


@dataclass(frozen=True, slots=True)
class Places:
    """Where every key and value of one file stands; spans, of which a place is made when it is asked for.

    whole: what is shown for the whole, as where a key of the top level is missing.
    """

    file: str
    values: Mapping[ValuePath, Span] = field(default_factory=dict)
    keys: Mapping[ValuePath, Span] = field(default_factory=dict)
    whole: Span = _FIRST_CHARACTER

    def of(self, path: ValuePath, *, on_key: bool = False) -> Place:
        """Return the place of the value at `path`, or of the key of its nearest existing parent.

        A list of one may be written without its dash, so an index that is not in the file is passed over.
        """
        path = self._as_written(path)
        if path in self.values and not on_key:
            return Place(self.file, *self.values[path])
        while path:
            span = self.keys.get(path) or self.values.get(path)
            if span is not None:
                return Place(self.file, *span)
            path = path[:-1]
        return Place(self.file, *self.whole)

    def _as_written(self, path: ValuePath) -> ValuePath:
        written: ValuePath = ()
        for step in path:
            if step != 0 or (*written, step) in self.values:
                written = (*written, step)
        return written


@dataclass(frozen=True, slots=True)
class Plainly:
    """A file's plain values (None where it is no YAML at all), their places and the faults of its text."""

    value: Plain
    places: Places
    findings: tuple[Finding, ...]


def leaves(plain: Plain, path: ValuePath = ()) -> dict[ValuePath, tuple[str, str]]:
    """Return every single value of a file by its path, with its kind; numbers with every digit that was typed."""
    if isinstance(plain, dict) and plain:
        return {at: leaf for key, value in plain.items() for at, leaf in leaves(value, (*path, key)).items()}
    if isinstance(plain, list) and plain:
        return {at: leaf for index, value in enumerate(plain) for at, leaf in leaves(value, (*path, index)).items()}
    typed = plain.as_tuple() if isinstance(plain, Decimal) else plain
    return {path: (type(plain).__name__, str(typed))}


def read_plain(text: str, file: str) -> Plainly:
    """Read one YAML document; faults are returned, never raised."""
    mended = MendedText(text, file)
    findings = mended.mend_margins()
    for _ in range(MAX_MENDS):
        try:
            node = _Loader(mended.text).get_single_node()
        except yaml.MarkedYAMLError as error:
            finding, is_mended = mended.explain(error)
            findings.append(finding)
            if is_mended:
                continue
            return Plainly(None, Places(file), tuple(findings))
        return _construct(node, mended, findings)
    return Plainly(None, Places(file), tuple(findings))


def _construct(node: yaml.Node | None, mended: MendedText, findings: list[Finding]) -> Plainly:
    if node is None:
        fault = Fault(at=(), message="the file is empty", mend="start one with `handbook new`")
        findings.append(reading_rule("yaml-unreadable").finding(fault, Place(mended.file, 1, 1, 2)))
        return Plainly(None, Places(mended.file), tuple(findings))
    constructor = _Constructor(mended)
    try:
        value = constructor.construct(node, ())
    except _TooMuchError as stop:
        value = None
        constructor.report(stop.rule, node if stop.node is None else stop.node, str(stop), stop.mend)
    places = Places(mended.file, constructor.values, constructor.keys)
    return Plainly(value, places, (*findings, *constructor.findings))


class _Loader(CParser):
    """libyaml's composer without implicit types: every plain scalar stays text for our own constructor."""

    def resolve(self, kind: type[yaml.Node], value: str | None, implicit: object) -> str:  # noqa: ARG002
        """Give every node without a tag the same one; nobody reads it."""
        return ""

    def descend_resolver(self, parent: yaml.Node | None, index: object) -> None:
        """Do nothing: no type depends on where a node stands."""

    def ascend_resolver(self) -> None:
        """Do nothing, as above."""


class _TooMuchError(Exception):
    """Reading stops: the file would cost more than a record may."""

    def __init__(self, rule: str, message: str, mend: str, node: yaml.Node | None) -> None:
        super().__init__(message)
        self.rule, self.mend, self.node = rule, mend, node


class _Constructor:
    """Builds plain values from nodes, noting places and lexical faults on the way."""

    def __init__(self, mended: MendedText) -> None:
        self.mended = mended
        self.text = mended.text
        self.values: dict[ValuePath, Span] = {}
        self.keys: dict[ValuePath, Span] = {}
        self.findings: list[Finding] = []
        self._count = 0

    def report(
        self,
        rule: str,
        node: yaml.Node,
        message: str,
        mend: str,
        fix: str | None = None,
        until: yaml.Node | None = None,
    ) -> None:
        """Add a finding of a reading rule at `node`."""
        fault = Fault(at=(), message=message, mend=mend, fix=fix, is_sure=fix is not None)
        self.findings.append(reading_rule(rule).finding(fault, Place(self.mended.file, *self._span(node, until))))

    def construct(self, node: yaml.Node, path: ValuePath) -> Plain:
        """Return the plain value of `node`.

        Raises _TooMuchError beyond the bounds of depth and number of values.
        """
        self._count += 1
        if self._count > MAX_VALUES:
            message, mend = f"more than {MAX_VALUES:,} values", "keep data in a file beside the record, and name it"
            raise _TooMuchError("alias-overgrown", message, mend, None)
        if len(path) > MAX_DEPTH:
            raise _TooMuchError("nesting-too-deep", f"more than {MAX_DEPTH} levels", "close the brackets earlier", node)
        self.values[path] = self._span(node)
        self._refuse_tag(node)
        if path and path[-1] in STRUCTURE_KEYS and self._is_bare_collection(node, path):
            return self._unquoted_smiles(node)
        if isinstance(node, yaml.MappingNode):
            return self._mapping(node, path)
        if isinstance(node, yaml.SequenceNode):
            return [
                self._joined(run, (*path, index)) if len(run) > 1 else self.construct(run[0], (*path, index))
                for index, run in enumerate(self._whole_names(node))
            ]
        assert isinstance(node, yaml.ScalarNode)  # noqa: S101 - the composer makes three kinds of node
        return self._scalar(node, path)

    # scalars

    def _scalar(self, node: yaml.ScalarNode, path: ValuePath) -> Plain:
        text: str = node.value
        if GAP in text:
            self.report("gap-left-open", node, "this is still to fill in", "write the value, or drop the key")
            return text
        if node.style in {"'", '"', "|", ">"}:
            return text
        if text in _WORDS:
            at_end = (
                "; YAML reads what follows # as a comment" if self._rest_of_line(node).lstrip().startswith("#") else ""
            )
            self.report(
                "empty-value",
                node,
                f"{_named(path)} has no value{at_end}",
                "write it in quotes, or drop the key",
            )
            return None
        if text in _BOOLEANS:
            return _BOOLEANS[text]
        if _FLOAT.fullmatch(text) and is_beyond_measure(text):
            message = f"{_named(path)} is read as a number beyond any measurement"
            self.report("number-altered", node, message, "put it in quotes if it is none", quoted(text))
            return text
        if _ALTERED_NUMBER.fullmatch(text):
            self.report(
                "number-altered",
                node,
                f"{text} is read as another number",
                f"write {quoted(text)}",
                quoted(text),
            )
            return text
        if _OTHERWISE_IN_1_1.fullmatch(text):
            return self._otherwise(node, text)
        if _INTEGER.fullmatch(text):
            return int(text)
        if _FLOAT.fullmatch(text):
            return Decimal(text)
        self._remark_on_comment(node, path)
        return text

    def _remark_on_comment(self, node: yaml.ScalarNode, path: ValuePath) -> None:
        """Remark on a text that goes on behind " #3", where YAML reads a comment; "# so" is one."""
        cut = self._rest_of_line(node).partition(" # ")[0].rstrip()
        if not re.match(r" +#[^\s#]", cut):
            return
        key = next((step for step in reversed(path) if isinstance(step, str)), "")
        start, end = node.start_mark, node.end_mark
        if key not in _TEXT_KEYS or start.line != end.line:
            return
        whole = quoted(node.value + cut)
        message = f'{key} is read as "{node.value}", and what follows # as a comment'
        fault = Fault(at=(), message=message, mend=f"write {whole}", fix=whole)
        place = self.mended.place(start.line, start.column, end.column + len(cut))
        self.findings.append(reading_rule("text-cut-by-comment").finding(fault, place))

    def _otherwise(self, node: yaml.ScalarNode, text: str) -> Plain:
        number = Decimal(text) if _FLOAT.fullmatch(text) else None
        fix = quoted(text)
        if number is not None:
            fix = _for_every_reader(number)
        self.report("yaml-1-1-reads-otherwise", node, f"an older reader alters {text}", f"write {fix}", fix)
        return text if number is None else number

    def _unquoted_smiles(self, node: yaml.Node) -> str:
        source = self.text[node.start_mark.index : node.end_mark.index]
        self.report(
            "smiles-unquoted",
            node,
            f"YAML reads {source} as a list",
            f"write {quoted(source)}",
            quoted(source),
        )
        return source

    def _is_bare_collection(self, node: yaml.Node, path: ValuePath) -> bool:
        may_be_mapping = path[-1] == "sought"
        return isinstance(node, yaml.SequenceNode) or (isinstance(node, yaml.MappingNode) and not may_be_mapping)

    # collections

    def _mapping(self, node: yaml.MappingNode, path: ValuePath) -> Plain:
        made: dict[str, Plain] = {}
        last = ""
        for key_node, typed_node in node.value:
            value_node = typed_node
            self._refuse_tag(key_node)
            if not isinstance(key_node, yaml.ScalarNode):
                self.report("value-wrong-type", key_node, "a key is a word", "write one word and a colon")
                continue
            key: str = key_node.value
            if self._is_without_colon(node, key_node, value_node):
                glued = GluedPair.of(key)
                if glued is None and last:
                    self._join(made, last, key_node, path)
                    continue
                if glued:
                    key, value_node = self._taken_apart(glued, key_node)
            key_path = (*path, key)
            if key in made:
                first, *_ = self.keys[key_path]
                is_same = leaves(made[key]) == leaves(self._read_aside(value_node, key_path))
                mend = "take this one out, it says the same" if is_same else "keep one of them"
                fault = Fault(at=(), message=f'"{key}" stands again; first on line {first}', mend=mend)
                found = reading_rule("duplicate-key").finding(fault, Place(self.mended.file, *self._span(key_node)))
                edits = repeated_pair_edits(self.mended, node, key_node, value_node, is_same=is_same)
                self.findings.append(replace(found, edits=edits, is_sure=is_same and bool(edits)))
                continue
            self.keys[key_path] = self._span(key_node)
            made[key] = self.construct(value_node, key_path)
            last = key
        return made

    def _read_aside(self, node: yaml.Node, path: ValuePath) -> Plain:
        """Return the value of a node that is no part of the record, counted towards the bounds as any other."""
        aside = _Constructor(self.mended)
        aside._count = self._count
        value = aside.construct(node, path)
        self._count = aside._count
        return value

    def _is_without_colon(self, node: yaml.MappingNode, key: yaml.ScalarNode, value: yaml.Node) -> bool:
        """Say whether a "key" of a flow mapping is none: the rest of a text split at its comma, or "class:primary"."""
        is_bare = (
            isinstance(value, yaml.ScalarNode) and value.start_mark.index == value.end_mark.index and not value.style
        )
        if not (node.flow_style and is_bare) or key.style:
            return False
        return not self.text[key.end_mark.index :].lstrip().startswith(":")

    def _taken_apart(self, glued: GluedPair, node: yaml.ScalarNode) -> tuple[str, yaml.Node]:
        self.report("yaml-unreadable", node, glued.message, f"write {glued.fix}", glued.fix)
        return glued.key, yaml.ScalarNode("", glued.value, node.start_mark, node.end_mark)

    def _join(self, made: dict[str, Plain], last: str, rest: yaml.ScalarNode, path: ValuePath) -> None:
        begun, end = self.values[(*path, last)], self._span(rest)
        on_one_line = end.line == begun.line
        span = begun._replace(end_column=end.end_column) if on_one_line else begun._replace(goes_on=True)
        self.values[(*path, last)] = span
        place = Place(self.mended.file, *span)
        space = self.text[rest.start_mark.index - 1]
        whole = f"{made[last]},{space if space.isspace() else ''}{rest.value}"
        made[last] = whole
        self.findings = [f for f in self.findings if f.place != Place(self.mended.file, *begun)]
        comma = comma_error(whole, is_bare=last == "equivalents")
        if comma:
            fault = Fault(at=(), message=comma.message, mend=comma.mend, fix=comma.fix, is_sure=comma.is_sure)
            self.findings.append(reading_rule(comma.rule).finding(fault, place))
            return
        message, mend = f"{last} is split at its comma", f"write {quoted(whole)}"
        fault = Fault(at=(), message=message, mend=mend, fix=quoted(whole), is_sure=True)
        self.findings.append(reading_rule("text-split-at-comma").finding(fault, place))

    def _whole_names(self, node: yaml.SequenceNode) -> Iterator[list[yaml.Node]]:
        """Group the items of a flow sequence so that a name split at its commas is one group."""
        runs: list[list[yaml.Node]] = []
        for item in node.value:
            glued = bool(node.flow_style and runs) and self.text[item.start_mark.index - 1] == ","
            if glued and isinstance(item, yaml.ScalarNode) and not item.style and _is_locant(runs[-1][-1]):
                runs[-1].append(item)
            else:
                runs.append([item])
        for run in runs:
            if len(run) > 1 and _begins_with_locant(run[-1]):
                yield run
            else:
                yield from ([item] for item in run)

    def _joined(self, run: Sequence[yaml.Node], path: ValuePath) -> str:
        whole = ",".join(str(item.value) for item in run)
        self.values[path] = self._span(run[0], run[-1])
        message = f"{whole} is read as {len(run)} values"
        self.report("text-split-at-comma", run[0], message, f"write {quoted(whole)}", quoted(whole), until=run[-1])
        return whole

    def _refuse_tag(self, node: yaml.Node) -> None:
        start = node.start_mark.index
        if self.text[start : start + 1] not in {"!", "&"}:
            return
        head = self.text[start : start + 200]
        if re.match(r"(&\S+\s+)?!", head):
            self.report(
                "tag-refused",
                node,
                f"{head.split()[0]} is a YAML tag",
                "drop it, or quote a text that begins with !",
            )

    def _span(self, node: yaml.Node, until: yaml.Node | None = None) -> Span:
        end = (until or node).end_mark
        start = node.start_mark
        goes_on = end.line != start.line
        end_column = start.column + 1 if goes_on else end.column
        return self.mended.span(start.line, start.column, max(end_column, start.column + 1), goes_on=goes_on)

    def _rest_of_line(self, node: yaml.Node) -> str:
        start = node.end_mark.index
        end = self.text.find("\n", start)
        return self.text[start:] if end < 0 else self.text[start:end]


def is_read_alike(text: str) -> bool:
    """Say whether every YAML reader takes the bare scalar `text` for a text, as far as its characters permit that."""
    return not (
        text in _WORDS
        or text.casefold() in {word.casefold() for word in _BOOLEANS}
        or _FLOAT.fullmatch(text)
        or _ALTERED_NUMBER.fullmatch(text)
        or _OTHERWISE_IN_1_1.fullmatch(text)
    )


def _named(path: ValuePath) -> str:
    return next((f'"{step}"' for step in reversed(path) if isinstance(step, str)), "the file")


def _for_every_reader(number: Decimal) -> str:
    """Return a number with a power of ten so that YAML 1.1 reads it as one as well, its digits kept."""
    exponent = number.as_tuple().exponent
    if isinstance(exponent, int) and -_MOST_PLACES <= exponent <= 0:
        return format(number, "f")
    mantissa, _, power = f"{number:E}".partition("E")
    return f"{mantissa}{'' if '.' in mantissa else '.'}e{int(power):+d}"


def _is_locant(node: yaml.Node) -> bool:
    return (
        isinstance(node, yaml.ScalarNode)
        and not node.style
        and bool(re.search(r"(^|[^A-Za-z])(\d+'?|[NOSP])$", node.value))
    )


def _begins_with_locant(node: yaml.Node) -> bool:
    return bool(re.match(r"(\d+'?|[NOSP])-\S", str(node.value)))
