"""A key that stands again, as edits of the file: taken out where it says the same, else kept as a comment."""

import re
from functools import lru_cache

import yaml

from builder.finding import Edit
from builder.records.mended_text import MendedText

__all__ = ["repeated_pair_edits"]

ALSO_TYPED = "# also typed: "
"""Stands before the second pair of a key where it is kept as a comment."""

_COMMENT = re.compile(r"(?:^|\s)#")


def repeated_pair_edits(
    mended: MendedText, mapping: yaml.MappingNode, key: yaml.ScalarNode, value: yaml.Node, *, is_same: bool
) -> tuple[Edit, ...]:
    """Return the edits that leave the first pair of this key alone; none where that cannot be done without a loss.

    is_same: the value is the one that stands already. Inside { } another value has no place to be kept.
    """
    first, last = key.start_mark.line, _last_line(key, value)
    if not mended.is_as_written(first, last):
        return ()
    if mapping.flow_style:
        return _out_of_braces(mended.text, key, value) if is_same else ()
    lines = _lines(mended.text)[first : last + 1]
    if is_same and not any(map(_COMMENT.search, lines)):
        return (Edit(first + 1, 1, last + 2, 1, ""),)
    column = key.start_mark.column
    begun = ((number, len(line) - len(line.lstrip(" "))) for number, line in enumerate(lines, first) if line.strip())
    margins = {number: min(column, margin) for number, margin in begun}
    return tuple(
        Edit(number + 1, margin + 1, number + 1, margin + 1, "# " if number > first else ALSO_TYPED)
        for number, margin in margins.items()
    )


@lru_cache(maxsize=1)
def _lines(text: str) -> list[str]:
    return text.split("\n")


def _out_of_braces(text: str, key: yaml.ScalarNode, value: yaml.Node) -> tuple[Edit, ...]:
    """Return the edit that takes a pair out of { } together with the comma before it, if all of it is on one line."""
    start, end = key.start_mark, value.end_mark
    line_start = start.index - start.column
    before = text[line_start : start.index].rstrip(" ")
    if start.line != end.line or not before.endswith(","):
        return ()
    return (Edit(start.line + 1, len(before), start.line + 1, end.column + 1, ""),)


def _last_line(key: yaml.ScalarNode, node: yaml.Node) -> int:
    """Return the line, counted from 0, on which a value ends; libyaml lets a block end where the next thing begins."""
    if isinstance(node, yaml.ScalarNode):
        if node.style in {"|", ">"}:
            lines = str(node.value).rstrip("\n").count("\n")
            return max(node.end_mark.line - 1, node.start_mark.line + lines)
        return node.end_mark.line if node.end_mark.index > node.start_mark.index else key.end_mark.line
    if isinstance(node, yaml.CollectionNode) and not node.flow_style and node.value:
        last = node.value[-1]
        return _last_line(*last) if isinstance(last, tuple) else _last_line(key, last)
    return int(node.end_mark.line)
