"""JSON Schema 2020-12 of the record format, generated from the models for editors and forms.

What the models say by validators rather than by types is added here by hand. Two things hold, and a test plays
both: the schema refuses nothing that the reader reads, and it refuses what the reader refuses, but for what no
schema can see (a check digit, the days of the calendar, the order of points).
"""

from collections.abc import Iterable
from pathlib import PurePath, PurePosixPath
from typing import Any

from pydantic import BaseModel
from pydantic.json_schema import GenerateJsonSchema, JsonSchemaValue

from builder.records.house_rules import DEMANDS
from builder.records.model import KINDS_OF_MEASUREMENT, QUANTITIES_OF_SUBSTRATE, STRUCTURES, Record
from builder.records.settings import Settings
from builder.records.vocabulary import Result, Status

__all__ = ["RECORD_SCHEMA", "SETTINGS_SCHEMA", "modeline", "record_schema", "settings_schema"]

RECORD_SCHEMA = PurePosixPath("schema/record-1.json")
SETTINGS_SCHEMA = PurePosixPath("schema/handbook-1.json")
"""Where the schemas lie inside a book."""

_DRAFT = "https://json-schema.org/draft/2020-12/schema"


class _Generator(GenerateJsonSchema):
    """Pydantic's generator, without nulls (a record leaves out what it does not know) and without noise titles."""

    def nullable_schema(self, schema: Any) -> JsonSchemaValue:
        return self.generate_inner(schema["schema"])

    def tagged_union_schema(self, schema: Any) -> JsonSchemaValue:
        text, more = (self.generate_inner(schema["choices"][tag]) for tag in ("<text>", "<more>"))
        return _text_or(text, more)

    def field_title_should_be_set(self, schema: Any) -> bool:  # noqa: ARG002 - the signature is pydantic's
        return False


def modeline(schema: PurePath) -> str:
    """Return the first line of a record, by which editors find its schema: a path from the folder of the record."""
    return f"# yaml-language-server: $schema={schema.as_posix()}"


def record_schema(classes: Iterable[str], leaving_groups: Iterable[str]) -> dict[str, Any]:
    """Return the schema of a record; the two closed lists come from the pattern tables."""
    schema = _schema_of(Record, "A record of the condition handbook, format 1")
    parts = schema["$defs"]
    substrate = parts["Substrate"]["properties"]
    one_class = {"type": "string", "enum": sorted(classes)}
    many_classes = {"type": "array", "items": one_class, "minItems": 1}
    _replace(substrate, "class", {"if": {"type": "array"}, "then": many_classes, "else": one_class})
    _replace(substrate, "leaving_group", {"type": "string", "enum": sorted({*leaving_groups, "none"})})
    schema["allOf"] = [_one_of("nucleophile", "base"), _SOLVENT_OR_NEAT, *map(_with_status, _STATUS_KEYS)]
    parts["Substrate"]["allOf"] = [_one_of(*STRUCTURES), _one_of(*QUANTITIES_OF_SUBSTRATE)]
    parts["Product"]["allOf"] = [_one_of(*STRUCTURES)]
    parts["Measurement"]["allOf"] = [{"oneOf": [_has(kind) for kind in KINDS_OF_MEASUREMENT]}, _YIELD_OF_A_KIND]
    _replace(parts["Outcome"]["properties"], "sought", _text_or({"type": "string"}, {"$ref": "#/$defs/Sought"}))
    parts["Outcome"]["allOf"] = [_WHAT_WENT_IS_SHOWN]
    return schema


def settings_schema() -> dict[str, Any]:
    """Return the schema of `entries/handbook.yml`."""
    schema = _schema_of(Settings, "Settings of a condition handbook")
    rule = schema["$defs"]["HouseRule"]
    rule["allOf"] = [{"oneOf": [*map(_has, DEMANDS), {"not": _one_of(*DEMANDS)}]}, _one_of("rule", *DEMANDS)]
    rule["dependentRequired"] = {"of": ["at_most"]}
    return schema


def _text_or(text: JsonSchemaValue, more: JsonSchemaValue) -> JsonSchemaValue:
    """Say what a text must be and what anything else; with anyOf an editor could not point into `more`."""
    return {"if": {"type": "string"}, "then": text, "else": more}


def _replace(properties: dict[str, Any], key: str, takes: JsonSchemaValue) -> None:
    """Put what a key takes in the place of what the models say of it; its meaning stays."""
    properties[key] = {"description": properties[key]["description"], **takes}


def _has(*keys: str) -> dict[str, Any]:
    return {"required": list(keys)}


def _one_of(*keys: str) -> dict[str, Any]:
    """Say that one or more of these keys are given."""
    return {"anyOf": [_has(key) for key in keys]}


def _filled(key: str) -> dict[str, Any]:
    return {**_has(key), "properties": {key: {"minItems": 1}}}


def _with_status(status: Status) -> dict[str, Any]:
    """Say that a status and the key of its name go together."""
    return {
        "if": {"properties": {"status": {"const": status.value}}},
        "then": _has(status.value),
        "else": {"not": _has(status.value)},
    }


_STATUS_KEYS = (Status.SUPERSEDED, Status.WITHDRAWN)
_SOLVENT_OR_NEAT = {
    "if": {"properties": {"neat": {"const": True}}, **_has("neat")},
    "then": {"not": _has("solvent")},
    "else": _has("solvent"),
}
_YIELD_OF_A_KIND = {"if": _has("yield"), "then": _has("kind", "of")}
_WENT = {"enum": [result.value for result in Result if result.gives_products]}
_WHAT_WENT_IS_SHOWN = {
    "if": {
        **_has("result"),
        "properties": {"result": {"anyOf": [_WENT, {"type": "array", "contains": _WENT}]}},
    },
    "then": {**_filled("products"), "anyOf": [_filled("measured"), _has("time_course"), _has("rate_constant")]},
}


def _schema_of(model: type[BaseModel], title: str) -> dict[str, Any]:
    schema = model.model_json_schema(by_alias=True, schema_generator=_Generator)
    return {"$schema": _DRAFT, **_without_defaults(schema), "title": title}


def _without_defaults(node: Any) -> Any:
    """Drop the defaults: they are how the reader stores an absent key, nothing a writer should type."""
    if isinstance(node, dict):
        return {
            key: _without_defaults(value) for key, value in node.items() if key != "default" or isinstance(value, dict)
        }
    return [_without_defaults(item) for item in node] if isinstance(node, list) else node
