"""JSON Schema 2020-12 of the record format, generated from the models for editors and forms."""

from collections.abc import Iterable
from typing import Any

from pydantic import BaseModel
from pydantic.json_schema import GenerateJsonSchema, JsonSchemaValue

from builder.records.model import Record
from builder.records.settings import Settings

__all__ = ["record_schema", "settings_schema"]

_DRAFT = "https://json-schema.org/draft/2020-12/schema"


class _Generator(GenerateJsonSchema):
    """Pydantic's generator, without nulls (a record leaves out what it does not know) and without noise titles."""

    def nullable_schema(self, schema: Any) -> JsonSchemaValue:
        return self.generate_inner(schema["schema"])

    def field_title_should_be_set(self, schema: Any) -> bool:  # noqa: ARG002 - the signature is pydantic's
        return False


def record_schema(classes: Iterable[str], leaving_groups: Iterable[str]) -> dict[str, Any]:
    """Return the schema of a record; the two closed lists come from the pattern tables."""
    schema = _schema_of(Record, "A record of the condition handbook, format 1")
    substrate = schema["$defs"]["Substrate"]["properties"]
    one_class = {"type": "string", "enum": sorted(classes)}
    substrate["class"] = {"anyOf": [one_class, {"type": "array", "items": one_class, "minItems": 1}]}
    substrate["leaving_group"] = {"type": "string", "enum": sorted({*leaving_groups, "none"})}
    schema["anyOf"] = [{"required": ["nucleophile"]}, {"required": ["base"]}]
    schema["oneOf"] = [{"required": ["solvent"]}, {"required": ["neat"]}]
    return schema


def settings_schema() -> dict[str, Any]:
    """Return the schema of `entries/handbook.yml`."""
    return _schema_of(Settings, "Settings of a condition handbook")


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
