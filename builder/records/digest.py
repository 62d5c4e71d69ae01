"""The digest of a record: SHA-256 over RFC 8785 canonical JSON of its scientific content.

A new revision is needed exactly when it changes. SMILES enter as typed, quantities as decimal text with their
canonical unit, numbers as decimal text; no number passes through a float, and absent keys do not enter at all.
"""

import datetime as dt
import hashlib
from decimal import Decimal
from enum import Enum

import rfc8785
from pydantic import BaseModel

from builder.records.fields import Ratio
from builder.records.model import Record
from builder.records.quantities import Percent, Quantity, Temperature, decimal_text

__all__ = ["SCIENTIFIC_KEYS", "canonical_json", "digest"]

SCIENTIFIC_KEYS = (
    "performed",
    "substrate",
    "nucleophile",
    "base",
    "reagents",
    "solvent",
    "stages",
    "work_up",
    "outcome",
    "evidence",
)

Canonical = str | int | bool | list["Canonical"] | dict[str, "Canonical"]


def canonical_json(record: Record) -> bytes:
    """Return the canonical JSON of the scientific content (RFC 8785)."""
    content = {key: _canonical(getattr(record, key)) for key in SCIENTIFIC_KEYS if _is_given(getattr(record, key))}
    return rfc8785.dumps(content)


def digest(record: Record) -> str:
    """Return the SHA-256 of `canonical_json`, 64 hexadecimal digits."""
    return hashlib.sha256(canonical_json(record)).hexdigest()


def _is_given(value: object) -> bool:
    return value is not None and value != ()


def _canonical(value: object) -> Canonical:
    match value:
        case Quantity() | Temperature() | Percent():
            return value.canonical
        case Ratio():
            return str(value)
        case BaseModel():
            fields = type(value).model_fields
            return {
                info.alias or name: _canonical(getattr(value, name))
                for name, info in fields.items()
                if _is_given(getattr(value, name))
            }
        case tuple():
            return [_canonical(item) for item in value]
        case Decimal():
            return decimal_text(value)
        case dt.date():
            return value.isoformat()
        case Enum():
            return str(value.value)
        case bool() | int() | str():
            return value
    raise TypeError(f"no canonical form for {type(value).__name__}")
