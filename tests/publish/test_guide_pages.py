"""How to add lists the whole format: every part and every key, held to the models the reader reads with."""

import datetime as dt
import inspect
from collections.abc import Iterator
from typing import Any, get_args, get_origin

import pytest
from pydantic import BaseModel

from builder.book import examine
from builder.chemistry.perception import leaving_group_names, site_class_names
from builder.finding import Level
from builder.publish.guide_pages import FormatPart, format_parts
from builder.records.model import Nucleophile, Record
from builder.records.reader import read_bytes
from builder.records.schema import record_schema
from builder.records.settings import Settings
from builder.records.specimen import SPECIMEN_FILE, sample_text
from tests.publish.handmade import Markup

SCHEMA = record_schema(site_class_names(), leaving_group_names())
PARTS = {part.meaning: part for part in format_parts(SCHEMA)}
TAKES = [
    # where the part stands, key, what it takes
    ((), "nucleophile", "solvent | internal | none or keys of its own, or a list"),
    ((), "solvent", "keys of its own, or a list"),
    ((), "reagents", "a list: keys of its own"),
    ((), "work_up", "text, or a list"),
    ((), "evidence", "a list: text or keys of its own"),
    (("substrate",), "class", f"one of {len(site_class_names())} words, listed below, or a list"),
    (("outcome",), "sought", "text or keys of its own"),
    (("outcome.measured",), "kind", "isolated | assay | area"),
    (("outcome.time_course",), "points", "a list: [a number, a number]"),
]


def _models_in(annotation: Any) -> Iterator[type[BaseModel]]:
    if get_origin(annotation) is None and isinstance(annotation, type) and issubclass(annotation, BaseModel):
        yield annotation
    for below in get_args(annotation):
        yield from _models_in(below)


def _models_below(model: type[BaseModel]) -> dict[type[BaseModel], None]:
    found = {model: None}
    for field in model.model_fields.values():
        for below in _models_in(field.annotation):
            found |= _models_below(below)
    return found


def _part_of(model: type[BaseModel]) -> FormatPart:
    return PARTS[" ".join(str(inspect.getdoc(model)).split())]


def test_every_part_of_the_schema_is_listed_once() -> None:
    described = [part["description"] for part in SCHEMA["$defs"].values() if "properties" in part]
    assert sorted(PARTS) == sorted([SCHEMA["description"], *described])
    assert len(PARTS) == len(format_parts(SCHEMA))


def test_every_key_has_a_meaning_of_its_own() -> None:
    for part in (SCHEMA, *SCHEMA["$defs"].values()):
        said = {key: node.get("description", "") for key, node in part.get("properties", {}).items()}
        assert all(said.values()), [key for key, text in said.items() if not text]
        twice = [key for key, text in said.items() if list(said.values()).count(text) > 1]
        assert twice == [], part["title"]


@pytest.mark.parametrize("model", _models_below(Record), ids=lambda model: model.__name__)
def test_a_part_lists_every_key_of_its_model(model: type[BaseModel]) -> None:
    part = _part_of(model)
    beyond = _part_of(Nucleophile).rows if part.beyond else ()
    fields = {field.alias or name: field for name, field in model.model_fields.items()}
    assert sorted(row.key for row in (*part.rows, *beyond)) == sorted(fields)
    for row in part.rows:
        field = fields[row.key]
        assert row.required == field.is_required(), row.key
        assert ("keys of its own" in row.takes) == any(_models_in(field.annotation)), row.key


@pytest.mark.parametrize(("places", "key", "takes"), TAKES, ids=[row[1] for row in TAKES])
def test_what_a_key_takes(places: tuple[str, ...], key: str, takes: str) -> None:
    (part,) = (part for part in PARTS.values() if part.places == places)
    assert {row.key: row.takes for row in part.rows}[key] == takes


def test_a_part_stands_under_each_of_its_keys(markup: dict[str, Markup]) -> None:
    assert _part_of(Nucleophile).places == ("nucleophile", "base")
    assert "nucleophile, base" in markup["how-to-add/"].values("aria-label")


def test_the_record_that_is_shown_is_sound_and_harmless() -> None:
    reading = read_bytes(sample_text().encode(), SPECIMEN_FILE)
    found = examine(reading, Settings(format=1, title="A book"), dt.date(2026, 12, 1)).findings
    assert {(finding.level, finding.rule) for finding in found} <= {(Level.CAUTION, "hazard-species")}
    assert not any("explosive" in finding.message for finding in found)
