"""Plain values of a record -> the YAML that a chemist would have typed.

Keys come in the order of the format, and what YAML would alter stands in quotes. SMILES and ratios always do, in single
ones; block style stands wherever a name or free text does, flow style only for codes, labels, words and quantities.
"""

import re
from collections.abc import Iterator, Mapping
from decimal import Decimal

from builder.records.flat import in_format_order
from builder.records.mended_text import quoted
from builder.records.yaml_text import Plain, is_read_alike
from builder.rule import Path

__all__ = ["is_bare", "record_yaml", "text_yaml"]

_QUOTED_KEYS = frozenset({"smiles", "inchi", "er", "dr", "ratio"})
_FREE_TEXT = frozenset({"name", "by", "note", "basis", "because", "scope", "cause", "what", "file", "path"})
"""Keys that may hold a comma; a mapping with one of them is written in block style."""
_FLOW_LISTS = frozenset({"by", "class", "of", "points", "preceded_by", "related", "result"})
_SINGLE = frozenset({"class", "of"})
"""Lists that are written without brackets where they have one item."""
_PLAIN_BREAKS = re.compile(r": |:$| #|\s$|^- |[\x00-\x1f\x7f-\x9f\u2028\u2029\ufeff]")
_BREAKS = re.compile("[\x00-\x1f\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]")


def record_yaml(record: Mapping[str, Plain], *, remarks: Mapping[Path, str] | None = None) -> str:
    """Return the text of a record file.

    remarks: comments behind the values at these paths, for values that have a line of their own.
    """
    lines = _mapping(in_format_order(record), (), "", remarks or {})
    return "".join(f"{line}\n" for line in lines)


def text_yaml(text: str) -> str:
    """Return a free text as it stands behind its key in block style."""
    return _scalar("", text, is_in_flow=False)


def _mapping(values: Mapping[str, Plain], path: Path, margin: str, remarks: Mapping[Path, str]) -> Iterator[str]:
    for key, value in values.items():
        at = (*path, key)
        said = f"  # {remarks[at]}" if at in remarks else ""
        one_line = _in_one_line(key, value, at)
        if one_line is not None:
            yield f"{margin}{key}: {one_line}{said}"
        elif isinstance(value, dict):
            yield f"{margin}{key}:{said}"
            yield from _mapping(value, at, f"{margin}  ", remarks)
        elif isinstance(value, list):
            yield f"{margin}{key}:{said}"
            for index, item in enumerate(value):
                yield from _item(key, item, (*at, index), f"{margin}  ", remarks)


def _item(key: str, item: Plain, path: Path, margin: str, remarks: Mapping[Path, str]) -> Iterator[str]:
    one_line = _in_one_line(key, item, path)
    if one_line is not None:
        yield f"{margin}- {one_line}"
    elif isinstance(item, dict):
        for number, line in enumerate(_mapping(item, path, f"{margin}  ", remarks)):
            yield line if number else f"{margin}- {line.lstrip()}"


def _in_one_line(key: str, value: Plain, path: Path) -> str | None:
    """Return a value that stands behind its key or dash; None where it wants lines of its own."""
    match value:
        case dict():
            is_short = len(path) > 1 and not _FREE_TEXT & set(value) and not any(map(_is_nested, value.values()))
            return "{" + ", ".join(f"{k}: {_flow(k, v)}" for k, v in value.items()) + "}" if is_short else None
        case list():
            return _flow(key, value) if not value or key in _FLOW_LISTS else None
        case _:
            return _scalar(key, value, is_in_flow=False)


def _is_nested(value: Plain) -> bool:
    return isinstance(value, (dict, list))


def _flow(key: str, value: Plain) -> str:
    if isinstance(value, list):
        if key in _SINGLE and len(value) == 1:
            return _flow(key, value[0])
        return "[" + ", ".join(_flow(key, item) for item in value) + "]"
    return _scalar(key, value, is_in_flow=True)


def _scalar(key: str, value: Plain, *, is_in_flow: bool) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, (int, Decimal)):
        return _number(value)
    text = str(value)
    if _BREAKS.search(text):
        return _double_quoted(text)
    return text if key not in _QUOTED_KEYS and is_bare(text, is_in_flow=is_in_flow) else quoted(text)


def _number(value: int | Decimal) -> str:
    """Return a number that every reader takes for one: with a power of ten, a point and a sign as well."""
    mantissa, e, exponent = str(value).lower().partition("e")
    if not e:
        return mantissa
    point = "" if "." in mantissa else ".0"
    return format(value, "f") if abs(int(exponent)) < 20 else f"{mantissa}{point}e{int(exponent):+d}"


def _double_quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + _BREAKS.sub(lambda found: f"\\u{ord(found[0]):04x}", escaped) + '"'


def is_bare(text: str, *, is_in_flow: bool) -> bool:
    """Say whether YAML reads `text` without quotes as it stands."""
    is_plain = bool(re.match(r"[(\w]", text)) and is_read_alike(text) and not _PLAIN_BREAKS.search(text)
    return is_plain and not (is_in_flow and re.search(r"[,\[\]{}]", text))
