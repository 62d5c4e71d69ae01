"""A record file -> Record, with the place of every value and every fault of the file at once."""

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from difflib import get_close_matches
from functools import cache
from pathlib import Path
from typing import Any, TypeVar, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from builder.finding import Finding, Level, Place
from builder.records.model import UNION_TAGS, Record
from builder.records.rules import reading_rule
from builder.records.settings import Settings
from builder.records.yaml_text import Places, Plain, Plainly, read_plain
from builder.rule import Fault
from builder.rule import Path as ValuePath

__all__ = [
    "MAX_BYTES",
    "Reading",
    "gaps_as_one",
    "key_paths",
    "read_bytes",
    "read_file_into",
    "read_into",
    "read_record",
    "read_settings",
    "read_settings_bytes",
    "read_values",
]

MAX_BYTES = 256 * 1024
"""Largest file that is read: a record, or an RXN file beside it."""
# Control characters, and the line ends that libyaml counts and editors do not: U+0085, U+2028, U+2029.
_FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029\ufffe\uffff]")

_LONGEST_MESSAGE = 200

Model = TypeVar("Model", bound=BaseModel)


@dataclass(frozen=True, slots=True)
class Reading:
    """One file as read: the record if it could be made, the reader's findings, the place of every value."""

    file: str
    text: str
    record: Record | None
    findings: tuple[Finding, ...]
    places: Places


def read_record(path: Path, shown_as: str) -> Reading:
    """Read one record file; `shown_as` is the name that findings carry.

    Never raises for what the file holds; OSError passes for a file that cannot be opened.
    """
    return _reading(_text_of(path, shown_as), shown_as)


def read_bytes(data: bytes, shown_as: str) -> Reading:
    """Read a record from bytes, as `read_record` does."""
    return _reading(_decode(data, shown_as), shown_as)


def read_settings(path: Path, shown_as: str) -> tuple[Settings | None, tuple[Finding, ...], Places]:
    """Read the settings of a book by the same rules as a record."""
    return read_file_into(Settings, path, shown_as)


def read_settings_bytes(data: bytes, shown_as: str) -> tuple[Settings | None, tuple[Finding, ...], Places]:
    """Read settings from bytes, as `read_settings` does."""
    return _text_into(Settings, _decode(data, shown_as), shown_as)


def read_file_into(model: type[Model], path: Path, shown_as: str) -> tuple[Model | None, tuple[Finding, ...], Places]:
    """Read a YAML file into `model` as `read_into` does; OSError passes for one that cannot be opened."""
    return _text_into(model, _text_of(path, shown_as), shown_as)


def _text_into(
    model: type[Model], text: str | Finding, shown_as: str
) -> tuple[Model | None, tuple[Finding, ...], Places]:
    if isinstance(text, Finding):
        return None, (text,), Places(shown_as)
    return read_into(model, text, shown_as)


def read_into(model: type[Model], text: str, shown_as: str) -> tuple[Model | None, tuple[Finding, ...], Places]:
    """Read YAML text into `model`: the value (None where any error was found), findings, and places."""
    return read_values(model, read_plain(text, shown_as))


def read_values(model: type[Model], plainly: Plainly) -> tuple[Model | None, tuple[Finding, ...], Places]:
    """Read plain values into `model` as `read_into` does, wherever they and their places come from."""
    findings = list(plainly.findings)
    made = None
    if isinstance(plainly.value, dict):
        try:
            made = model.model_validate(plainly.value)
        except ValidationError as error:
            details = [detail for detail in error.errors(include_url=False) if not _is_echo(detail)]
            meant = {_meant(detail, model) for detail in details if detail["type"] == "extra_forbidden"}
            findings += [
                _form_finding(detail, plainly.value, plainly.places, model)
                for detail in details
                if not (detail["type"] == "missing" and _value_path(detail["loc"]) in meant)
            ]
    elif plainly.value is not None:
        fault = Fault(at=(), message="the file holds no keys", mend="write lines like title: …")
        findings.append(reading_rule("value-wrong-type").finding(fault, plainly.places.of(())))
    kept = tuple(sorted(_one_per_place(findings), key=lambda finding: finding.sort_key))
    return (None if any(f.level is Level.ERROR for f in kept) else made), kept, plainly.places


def _reading(text: str | Finding, file: str) -> Reading:
    if isinstance(text, Finding):
        return Reading(file, "", None, (text,), Places(file))
    record, findings, places = read_into(Record, text, file)
    return Reading(file, text, record, findings, places)


def _text_of(path: Path, file: str) -> str | Finding:
    size = path.stat().st_size
    return _decode(path.read_bytes(), file) if size <= MAX_BYTES else _too_large(size, file)


def _too_large(size: int, file: str) -> Finding:
    fault = Fault(at=(), message=f"the file has {size / 1e6:.1f} MB", mend="keep data files outside the record")
    return reading_rule("file-too-large").finding(fault, Place(file, 1, 1, 2))


def _decode(data: bytes, file: str) -> str | Finding:
    if len(data) > MAX_BYTES:
        return _too_large(len(data), file)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        before = data[: error.start].decode("utf-8", "replace")
        message = f"byte 0x{data[error.start]:02x} is not UTF-8 text"
        return _not_text(message, "save the file as UTF-8", before, len(before), file)
    bad = _FORBIDDEN.search(text)
    if bad:
        return _not_text(f"invisible control character U+{ord(bad[0]):04X}", "delete it", text, bad.start(), file)
    return text.replace("\r\n", "\n").replace("\r", "\n")


def _not_text(message: str, mend: str, text: str, index: int, file: str) -> Finding:
    line, column = text.count("\n", 0, index) + 1, index - text.rfind("\n", 0, index)
    fault = Fault(at=(), message=message, mend=mend)
    return reading_rule("file-not-text").finding(fault, Place(file, line, column, column + 1))


def _one_per_place(findings: list[Finding]) -> Iterator[Finding]:
    """Keep the first error on a value: the lexical trap explains what the form then stumbles over."""
    wrong: set[tuple[int, int]] = set()
    for finding in sorted(findings, key=lambda finding: -finding.level.weight):
        spot = (finding.place.line, finding.place.column)
        if spot not in wrong or finding.rule in {"key-missing", "key-unknown", "duplicate-key"}:
            yield finding
        if finding.level is Level.ERROR:
            wrong.add(spot)


_GAP_RULE = "gap-left-open"


def gaps_as_one(findings: Sequence[Finding]) -> tuple[Finding, ...]:
    """Return the findings with all gaps of a skeleton told at the first: a fresh one has a score of them."""
    gaps = [finding for finding in findings if finding.rule == _GAP_RULE]
    if len(gaps) < 2:
        return tuple(findings)
    lines = sorted({finding.place.line for finding in gaps})
    message = f"{len(gaps)} values are still to fill in, on lines {_runs(lines)}"
    told = replace(gaps[0], message=message, mend="write the values, or drop the keys", data={"lines": lines})
    return tuple(told if finding is gaps[0] else finding for finding in findings if finding not in gaps[1:])


def _runs(numbers: list[int]) -> str:
    """Return ascending numbers with neighbours drawn together.

    >>> _runs([6, 9, 11, 12, 13])
    '6, 9, 11 to 13'
    """
    runs: list[list[int]] = []
    for number in numbers:
        if runs and number == runs[-1][-1] + 1:
            runs[-1].append(number)
        else:
            runs.append([number])
    return ", ".join(f"{run[0]} to {run[-1]}" if len(run) > 2 else ", ".join(map(str, run)) for run in runs)


# --- pydantic's complaints in the chemist's words -----------------------------------------------------------


def _form_finding(detail: ErrorDetails, plain: Plain, places: Places, model: type[BaseModel]) -> Finding:
    kind, context = detail["type"], detail.get("ctx", {})
    path = _value_path(detail["loc"])
    value = _value_at(plain, path)
    if kind == "missing":
        fault = Fault(at=path[:-1], on_key=True, message=f"{path[-1]} is missing", mend=f"add {path[-1]}: …")
        return _found("key-missing", fault, places)
    if kind == "extra_forbidden":
        return _found("key-unknown", _unknown_key(_key_path(detail), model), places)
    if "mend" in context:
        at = (*path, *context["at"])
        mended = {"mend": context["mend"], "fix": context["fix"], "is_sure": context["is_sure"]}
        fault = Fault(at=at, message=context["message"], **mended)
        return _found(kind, fault, places)
    if kind in {"enum", "literal_error"}:
        return _found("value-not-permitted", _not_permitted(path, value, context), places)
    if kind in _WRONG_TYPES:
        fault = Fault(at=path, message=_WRONG_TYPES[kind], mend=_type_mend(path, model))
        return _found("value-wrong-type", fault, places)
    # Behind a validator of ours pydantic no longer knows that it measures a text.
    known_kind = f"string_{kind}" if isinstance(value, str) and kind in {"too_short", "too_long"} else kind
    message, mend = _BOUNDS.get(known_kind, ("this value does not fit here", "compare it with the specimen record"))
    length = len(value) if isinstance(value, (str, list)) else 0
    known = {"value": value, "length": length, **context}
    fault = Fault(at=path, message=message.format(**known), mend=mend.format(**known))
    return _found("value-not-permitted", fault, places)


_WRONG_TYPES = {
    "model_type": "keys and values are wanted here, not one value",
    "model_attributes_type": "keys and values are wanted here, not one value",
    "dict_type": "keys and values are wanted here, not one value",
    "tuple_type": "a list is wanted here",
    "list_type": "a list is wanted here",
    "string_type": "a text is wanted here",
}

_BOUNDS = {
    "too_short": ("too few items: {length}", "list {min_length} or more, or leave the key out"),
    "too_long": ("too many items: {length:,}", "keep at most {max_length:,}"),
    "string_too_short": ("the text is empty", "write it, or leave the key out"),
    "string_too_long": ("the text has {length:,} characters", "shorten it to {max_length:,}"),
    "greater_than": ("{value} is too small", "write a number above {gt}"),
    "greater_than_equal": ("{value} is too small", "write {ge} or more"),
    "less_than": ("{value} is too large", "write a number below {lt}"),
    "less_than_equal": ("{value} is too large", "write {le:,} at most"),
}


def _is_echo(detail: ErrorDetails) -> bool:
    """Say whether pydantic calls a list too short only because an item of it is faulty."""
    return detail["type"] == "too_short" and bool(detail.get("input"))


def _found(rule_id: str, fault: Fault, places: Places) -> Finding:
    if len(fault.message) > _LONGEST_MESSAGE:
        fault = replace(fault, message=fault.message[: _LONGEST_MESSAGE - 1] + "…")
    return reading_rule(rule_id).finding(fault, places.of(fault.at, on_key=fault.on_key))


def _value_path(loc: tuple[int | str, ...]) -> ValuePath:
    return tuple(step for step in loc if step not in UNION_TAGS)


def _key_path(detail: ErrorDetails) -> ValuePath:
    """Return the way to a key of the writer's, which may read like a tag."""
    return (*_value_path(detail["loc"][:-1]), detail["loc"][-1])


def _meant(detail: ErrorDetails, model: type[BaseModel]) -> ValuePath:
    """Return the way to the key that was mistyped: were it missing, the slip would be told twice."""
    path = _key_path(detail)
    return (*path[:-1], _unknown_key(path, model).fix or "")


def _nearest(typed: str, known: Iterable[str]) -> tuple[str, ...]:
    """Return the two known words that were most likely meant, whatever their capitals; fewer where none is near."""
    folded = {word.casefold(): word for word in known}
    near = get_close_matches(typed.casefold(), folded, n=2, cutoff=0.6)
    return tuple(folded[word] for word in near)


def _is_another_spelling(typed: str, word: str) -> bool:
    """Say whether capitals, spaces, hyphens and underlines are all that sets two words apart."""
    one, other = (re.sub(r"[\s_-]", "", each.casefold()) for each in (typed, word))
    return one == other


def _unknown_key(path: ValuePath, model: type[BaseModel]) -> Fault:
    key = str(path[-1])
    known = sorted({name for owner in _models_at(model, path[:-1]) for name in _keys_of(owner)})
    near = _nearest(key, known)
    if near:
        message, mend = f'unknown key "{key}"; did you mean "{near[0]}"?', f"write {near[0]}"
        is_sure = len(near) == 1 or _is_another_spelling(key, near[0])
        return Fault(at=path, on_key=True, message=message, mend=mend, fix=near[0], is_sure=is_sure)
    return Fault(at=path, on_key=True, message=f'unknown key "{key}"', mend=f"known keys here: {', '.join(known)}")


def _not_permitted(path: ValuePath, value: Plain, context: Mapping[str, Any]) -> Fault:
    permitted = re.findall(r"'((?:[^'\\]|\\.)*)'|\"((?:[^\"\\]|\\.)*)\"|(\d+)", str(context.get("expected", "")))
    words = [next(word for word in found if word) for found in permitted]
    near = _nearest(str(value), words)
    fix = near[0] if near else None
    hint = f'; did you mean "{fix}"?' if fix else ""
    return Fault(
        at=path,
        message=f'"{value}" is not permitted here{hint}',
        mend=f"use one of: {', '.join(words)}" if len(words) > 1 else f"write {words[0]}",
        fix=fix,
        is_sure=fix is not None and _is_another_spelling(str(value), fix),
    )


def _type_mend(path: ValuePath, model: type[BaseModel]) -> str:
    keys = sorted({name for owner in _models_at(model, path) for name in _keys_of(owner)})
    return f"write it with the keys {', '.join(keys[:8])}{', …' if len(keys) > 8 else ''}" if keys else "write - items"


def _value_at(plain: Plain, path: ValuePath) -> Plain:
    for step in path:
        if isinstance(plain, dict) and isinstance(step, str):
            plain = plain.get(step)
        elif isinstance(plain, list) and isinstance(step, int) and step < len(plain):
            plain = plain[step]
    return plain


@cache
def _keys_of(model: type[BaseModel]) -> tuple[str, ...]:
    return tuple(field.alias or name for name, field in model.model_fields.items())


@cache
def key_paths(model: type[BaseModel]) -> frozenset[str]:
    """Return every key of a model with the way to it, joined by dots: stages.atmosphere."""
    below = {
        f"{info.alias or name}.{path}"
        for name, info in model.model_fields.items()
        for part in _models_in(info.annotation)
        for path in key_paths(part)
    }
    return frozenset({*_keys_of(model), *below})


def _models_at(model: type[BaseModel], path: ValuePath) -> tuple[type[BaseModel], ...]:
    """Return the models that may stand at `path`, to name the keys they have."""
    owners: tuple[type[BaseModel], ...] = (model,)
    is_free = False
    for step in path:
        if is_free:  # a key of the writer's own, below which stands what the mapping holds
            is_free = False
        elif isinstance(step, str):
            is_free = any(_is_free(owner, step) for owner in owners)
            owners = tuple(
                found
                for owner in owners
                for name, info in owner.model_fields.items()
                if (info.alias or name) == step
                for found in _models_in(info.annotation)
            )
    return owners


def _is_free(model: type[BaseModel], key: str) -> bool:
    """Say whether the keys of the mapping under `key` are the writer's own."""
    return any(
        (info.alias or name) == key and get_origin(info.annotation) is dict for name, info in model.model_fields.items()
    )


def _models_in(annotation: object) -> tuple[type[BaseModel], ...]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return (annotation,)
    return tuple(found for inner in get_args(annotation) for found in _models_in(inner))
