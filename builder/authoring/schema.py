"""`handbook schema`: write the JSON Schemas that editors bind to."""

import json
from pathlib import Path
from typing import Any

from builder.chemistry.perception import leaving_group_names, site_class_names
from builder.records.schema import record_schema, settings_schema

__all__ = ["schema_texts", "schemas", "write_schemas"]


def schemas() -> dict[str, dict[str, Any]]:
    """Return the schemas by file name."""
    return {
        "record-1.json": record_schema(site_class_names(), leaving_group_names()),
        "handbook-1.json": settings_schema(),
    }


def schema_texts() -> dict[str, str]:
    """Return the schemas as text by file name."""
    return {name: json.dumps(schema, ensure_ascii=False, indent=2) + "\n" for name, schema in schemas().items()}


def write_schemas(book: Path) -> tuple[Path, ...]:
    """Write the schemas to `schema/` inside the book; return the files."""
    folder = book / "schema"
    folder.mkdir(parents=True, exist_ok=True)
    written = []
    for name, text in schema_texts().items():
        path = folder / name
        path.write_text(text, encoding="utf-8", newline="\n")
        written.append(path)
    return tuple(written)
