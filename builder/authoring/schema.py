"""`handbook schema`: write the JSON Schemas that editors bind to."""

import json
import os
from pathlib import Path, PurePath
from typing import Any

from builder.authoring.whole_file import write_all
from builder.chemistry.perception import leaving_group_names, site_class_names
from builder.records.schema import RECORD_SCHEMA, SETTINGS_SCHEMA, record_schema, settings_schema

__all__ = ["schema_seen_from", "schema_texts", "schemas", "write_schemas"]


def schemas() -> dict[str, dict[str, Any]]:
    """Return the schemas by file name."""
    return {
        RECORD_SCHEMA.name: record_schema(site_class_names(), leaving_group_names()),
        SETTINGS_SCHEMA.name: settings_schema(),
    }


def schema_texts() -> dict[str, str]:
    """Return the schemas as text by file name."""
    return {name: json.dumps(schema, ensure_ascii=False, indent=2) + "\n" for name, schema in schemas().items()}


def write_schemas(book: Path) -> tuple[Path, ...]:
    """Write the schemas into the book, both or none; return the files."""
    texts = {book / RECORD_SCHEMA.parent / name: text for name, text in schema_texts().items()}
    write_all(texts)
    return tuple(texts)


def schema_seen_from(folder: Path, book: Path) -> PurePath:
    """Return the path to the schema of records from a folder of their book."""
    return PurePath(os.path.relpath((book / RECORD_SCHEMA).resolve(), folder.resolve()))
