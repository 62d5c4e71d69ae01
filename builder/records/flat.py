"""A record as one row of a table, and back: dotted column names, and the text of every value as it was typed.

"stages.1.temperature" is the temperature of the first stage; items count from 1, and where a list has one item its
number may be left out ("solvent.name"). A list of texts is one cell, its items joined by "; "; a time course is one
cell as well, "0 0; 4 12.4". Nothing is read as a number on the way, so every digit survives.
"""

import re
import types
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from enum import Enum, auto
from functools import cache
from typing import Annotated, Any, Literal, Union, get_args, get_origin

from pydantic import BaseModel, BeforeValidator

from builder.records.model import Record
from builder.records.quantities import is_beyond_measure
from builder.records.yaml_text import Plain
from builder.rule import Path

__all__ = [
    "Scalar",
    "Shape",
    "Unflattened",
    "canonical_name",
    "column_names",
    "column_order",
    "flatten",
    "guarded",
    "in_format_order",
    "in_one_cell",
    "name_of",
    "shape_at",
    "unflatten",
    "unguarded",
]

_NUMBER = re.compile(r"[-+]?(\.[0-9]+|(0|[1-9][0-9]*)(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
_MAX_ITEMS = 1000
"""Of a numbered column; beyond it a heading is a slip, not a list."""


class Scalar(Enum):
    """What a single value of a record is in YAML."""

    TEXT = auto()
    NUMBER = auto()
    FLAG = auto()


@dataclass(frozen=True, slots=True)
class Shape:
    """What may stand at one place of a record: a single value, keys, items, or a choice of these."""

    scalar: Scalar | None = None
    keys: Mapping[str, "Shape"] = field(default_factory=dict)
    items: "Shape | None" = None

    @property
    def is_cell(self) -> bool:
        """Say whether one cell of a table can hold what stands here."""
        return self.scalar is not None or self.is_list_of_values or self.is_points

    @property
    def is_list_of_values(self) -> bool:
        """Say whether it is a list whose items are single values."""
        return self.items is not None and self.items.scalar is not None

    @property
    def is_points(self) -> bool:
        """Say whether it is a list of pairs of numbers."""
        return self.items is not None and self.items.items is not None


@dataclass(frozen=True, slots=True)
class Unflattened:
    """A row as the plain values of a record, and the column that each value came from.

    at_odds: pairs of columns that want the same place, of which the second was left out.
    """

    value: Plain
    columns: Mapping[Path, str]
    at_odds: tuple[tuple[str, str], ...] = ()


# --- what a record may hold ---------------------------------------------------------------------------------


@cache
def _record_shape() -> Shape:
    return _shape(Record)


def _shape(annotation: Any) -> Shape:
    """Return the shape of a type; a choice is all its forms laid over each other."""
    scalar, keys, items = None, {}, None
    for form in _forms(annotation):
        if isinstance(form, type) and issubclass(form, BaseModel):
            keys = {info.alias or name: _shape(info.annotation) for name, info in form.model_fields.items()}
        elif get_origin(form) is tuple:
            items = _shape(get_args(form)[0])
        elif form is not type(None):
            scalar = _scalar(form)
    return Shape(scalar, keys, items)


def _forms(annotation: Any) -> Iterator[Any]:
    origin = get_origin(annotation)
    if origin is Annotated:
        held, *about = get_args(annotation)
        typed = (each.json_schema_input_type for each in about if isinstance(each, BeforeValidator))
        yield from _forms(next((form for form in typed if get_args(form)), held))
    elif origin in {Union, types.UnionType}:
        for choice in get_args(annotation):
            yield from _forms(choice)
    else:
        yield annotation


def _scalar(form: Any) -> Scalar:
    if form is bool:
        return Scalar.FLAG
    is_number = form in {int, Decimal} or (get_origin(form) is Literal and isinstance(get_args(form)[0], int))
    return Scalar.NUMBER if is_number else Scalar.TEXT


def _step(shape: Shape, step: str) -> tuple[tuple[str | int, ...], Shape] | None:
    """Return where a part of a column name leads, and the shape there; None where it leads nowhere."""
    if step in shape.keys:
        return (step,), shape.keys[step]
    if shape.items is None:
        return None
    if re.fullmatch(r"[1-9][0-9]{0,3}", step) and int(step) <= _MAX_ITEMS and not shape.is_points:
        return (int(step) - 1,), shape.items
    if step in shape.items.keys:
        return (0, step), shape.items.keys[step]
    return None


@cache
def _way(column: str) -> tuple[Path, Shape] | None:
    path: Path = ()
    shape = _record_shape()
    for step in column.split("."):
        found = _step(shape, step)
        if found is None:
            return None
        path, shape = (*path, *found[0]), found[1]
    return path, shape


def canonical_name(column: str) -> str:
    """Return a column name with the numbers of all its items.

    Raises KeyError for a column that no record has.
    """
    way = _way(column)
    if way is None:
        raise KeyError(column)
    return name_of(way[0])


def name_of(path: Path) -> str:
    """Return the column name of a place in a record."""
    return ".".join(str(step + 1) if isinstance(step, int) else step for step in path)


def shape_at(column: str) -> Shape | None:
    """Return the shape of what stands under a column name; None where no cell of a record bears that name."""
    way = _way(column)
    return way[1] if way is not None and way[1].is_cell else None


@cache
def column_names() -> tuple[str, ...]:
    """Return every column a record can have, in the order of the format, of each list the first item."""
    return tuple(_names(_record_shape(), ""))


def _names(shape: Shape, name: str) -> Iterator[str]:
    if shape.is_cell:
        yield name
    below = f"{name}." if name else ""
    for key, inner in shape.keys.items():
        yield from _names(inner, below + key)
    if shape.items is not None and shape.items.keys:
        yield from _names(Shape(keys=shape.items.keys), f"{name}.1")


@cache
def column_order(column: str) -> tuple[int, ...]:
    """Return a key by which columns sort as the format lists its keys, and items by number; unknown ones come last."""
    order: list[int] = []
    shape = _record_shape()
    for step in column.split("."):
        found = _step(shape, step)
        if found is None:
            return (*order, len(shape.keys) + 1)
        if step in shape.keys:
            order.append(list(shape.keys).index(step))
        else:
            order += [each if isinstance(each, int) else list(shape.items.keys).index(each) for each in found[0]]  # type: ignore[union-attr]  # _step went through its items
        shape = found[1]
    return tuple(order)


# --- a record into a row ------------------------------------------------------------------------------------


def flatten(record: Plain) -> dict[str, str]:
    """Return the plain values of a record by column, in the order of the format.

    Empty lists and mappings have no column: to a record they are the same as an absent key.
    Comments, the order of keys and whether one item was typed as a list are not kept.
    """
    cells = dict(_cells(record, _record_shape(), ""))
    return {name: cells[name] for name in sorted(cells, key=column_order)}


def _cells(value: Plain, shape: Shape, name: str) -> Iterator[tuple[str, str]]:
    below = f"{name}." if name else ""
    if shape.items is not None and not isinstance(value, list) and (isinstance(value, dict) or shape.is_list_of_values):
        value = [value]
    match value:
        case dict():
            for key, inner in value.items():
                yield from _cells(inner, shape.keys.get(key, Shape(Scalar.TEXT)), below + key)
        case list() if shape.is_points:
            yield name, "; ".join(" ".join(map(_typed, point)) for point in value if isinstance(point, list))
        case list() if value and not any(isinstance(item, (dict, list)) for item in value):
            yield name, in_one_cell(map(_typed, value))
        case list():
            for number, item in enumerate(value, start=1):
                yield from _cells(item, shape.items or Shape(Scalar.TEXT), f"{below}{number}")
        case _:
            yield name, _typed(value)


def _typed(value: Plain) -> str:
    return str(value).lower() if isinstance(value, bool) else str(value)


def guarded(text: str) -> str:
    """Return a cell of a CSV file that no spreadsheet program runs as a formula: an apostrophe before = + - @.

    A text that begins with an apostrophe gets another, so that `unguarded` gives every text back.
    """
    return f"'{text}" if re.match(r"['=+\-@\t\r]", text) else text


def unguarded(text: str) -> str:
    """Return what `guarded` was given."""
    return text[1:] if re.match(r"'['=+\-@\t\r]", text) else text


def in_one_cell(items: Iterable[str]) -> str:
    r"""Return texts joined by "; "; a semicolon or backslash inside one, or a space at its edge, bears a backslash."""
    return "; ".join(_escaped(item) for item in items)


def _escaped(item: str) -> str:
    return re.sub(r"[\\;]|^\s|(?<=.)\s$", lambda found: "\\" + found[0], item)


def _apart(text: str) -> list[str]:
    """Return the items of a cell; empty ones, as after a last semicolon, are left out."""
    items = (_trimmed(part) for part in re.findall(r"(?:\\.|[^;])+", text, re.DOTALL))
    return [re.sub(r"\\([\\;\s])", r"\1", item) for item in items if item]


def _trimmed(part: str) -> str:
    """Return an item without the spaces around it, but for one that a backslash keeps."""
    bare = part.strip()
    backslashes = len(bare) - len(bare.rstrip("\\"))
    kept = len(part.rstrip()) if backslashes % 2 else len(part)
    return bare + part[kept : kept + 1]


def in_format_order(record: Mapping[str, Plain]) -> dict[str, Plain]:
    """Return a record with its keys, at every depth, in the order of the format; labels before names."""
    ordered = _ordered(dict(record), _record_shape())
    assert isinstance(ordered, dict)  # noqa: S101 - a mapping stays one
    return ordered


def _ordered(value: Plain, shape: Shape) -> Plain:
    if isinstance(value, list):
        return [_ordered(item, shape.items or Shape()) for item in value]
    if not isinstance(value, dict):
        return value
    keys = shape.keys or (shape.items.keys if shape.items else {})
    known = sorted(keys, key="label".__ne__)
    rank = {key: place for place, key in enumerate(known)}
    return {key: _ordered(value[key], keys.get(key, Shape())) for key in sorted(value, key=lambda k: rank.get(k, 99))}


# --- a row into a record ------------------------------------------------------------------------------------


def unflatten(cells: Mapping[str, str]) -> Unflattened:
    """Return the plain values of a record from cells by column; what does not read stays text, for the reader to name.

    Items are closed up: a row with products.1 and products.3 has two products.
    Raises KeyError for a column that no record has (`shape_at` tells).
    """
    columns: dict[Path, str] = {}
    values: dict[Path, Plain] = {}
    at_odds: list[tuple[str, str]] = []
    for column in sorted(cells, key=column_order):
        way = _way(column)
        if way is None or not way[1].is_cell:
            raise KeyError(column)
        path, shape = way
        if other := next((columns[path[:end]] for end in range(1, len(path) + 1) if path[:end] in columns), None):
            at_odds.append((other, column))
            continue
        values[path] = _value(cells[column], shape)
        columns[path] = column
    closed = _closed_up(values)
    root: dict[str, Plain] = {}
    for path, value in values.items():
        _put(root, closed[path], value)
    return Unflattened(root, {closed[path]: column for path, column in columns.items()}, tuple(at_odds))


def _value(text: str, shape: Shape) -> Plain:
    if shape.is_points:
        return [[_number(part) for part in re.split(r"[\s,]+", point)] for point in _apart(text)]
    if shape.is_list_of_values and shape.scalar is None:
        return list(_apart(text))
    if shape.scalar is Scalar.FLAG:
        return {"true": True, "false": False}.get(text, text)
    return _number(text) if shape.scalar is Scalar.NUMBER else text


def _number(text: str) -> Plain:
    if not _NUMBER.fullmatch(text) or is_beyond_measure(text):
        return text
    return int(text) if re.fullmatch(r"[-+]?[0-9]+", text) else Decimal(text)


def _closed_up(paths: Iterable[Path]) -> dict[Path, Path]:
    """Return each path with its items numbered without gaps."""
    known = list(paths)
    seen: dict[Path, list[int]] = {}
    for path in known:
        for place, step in enumerate(path):
            if isinstance(step, int) and step not in (numbers := seen.setdefault(path[:place], [])):
                numbers.append(step)
    rank = {head: {step: index for index, step in enumerate(sorted(numbers))} for head, numbers in seen.items()}
    return {
        path: tuple(rank[path[:place]][step] if isinstance(step, int) else step for place, step in enumerate(path))
        for path in known
    }


def _put(root: dict[str, Plain], path: Path, value: Plain) -> None:
    """Put a value into its place; paths come in order, so that items are appended one after another."""
    held: Any = root
    for step, following in zip(path, (*path[1:], None), strict=True):
        inner: Any = value if following is None else [] if isinstance(following, int) else {}
        if isinstance(held, list):
            if step == len(held):
                held.append(inner)
            held = held[step]  # type: ignore[index]  # a list is reached by numbers only
        else:
            held = held.setdefault(step, inner)
