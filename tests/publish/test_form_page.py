"""The data of the form: the whole format, in sections, with nothing said twice."""

import json
import re
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import pytest

from builder.chemistry.perception import leaving_group_names, site_class_names
from builder.publish.form_page import LEFT_OUT, SECTIONS, SET_BY_THE_FORM, form_data, new_file_address
from builder.publish.page import Page
from builder.records.schema import record_schema

ROOT = Path(__file__).parents[2]
SCHEMA = record_schema(site_class_names(), leaving_group_names())
DATA: Any = form_data(SCHEMA, taken=["NS7K3QFMC", "NS2H8WDRW"], people=["bench-1"])
CONTROLS = {"choice", "fixed", "integer", "list", "mixed", "number", "part", "points", "text", "word"}


def _controls(field: Mapping[str, Any]) -> Iterator[Mapping[str, Any]]:
    yield field
    below = [field.get("text"), *(field["of"] if field["is"] == "points" else [field.get("of")])]
    for each in below:
        if isinstance(each, dict):
            yield from _controls(each)


def test_every_key_of_a_record_stands_in_one_section_or_is_left_to_later() -> None:
    placed = [key for section in SECTIONS for key in section.keys]
    assert sorted([*placed, *SET_BY_THE_FORM, *LEFT_OUT]) == sorted(SCHEMA["properties"])


def test_every_part_and_key_of_the_schema_is_in_the_data() -> None:
    parts = {part["title"]: part for part in (SCHEMA, *SCHEMA["$defs"].values()) if "properties" in part}
    assert set(DATA["parts"]) == set(parts)
    for title, part in parts.items():
        left_out = set(LEFT_OUT) if part is SCHEMA else set()
        fields = {field["key"]: field for field in DATA["parts"][title]["fields"]}
        assert list(fields) == [key for key in part["properties"] if key not in left_out]
        assert {key for key in fields if fields[key].get("required")} == set(part.get("required", ())) - left_out


def test_the_script_knows_every_kind_of_control() -> None:
    fields = [field for part in DATA["parts"].values() for field in part["fields"]]
    assert {each["is"] for field in fields for each in _controls(field)} == CONTROLS


@pytest.mark.parametrize("script", ["form.js", "record.js"])
def test_the_scripts_hold_no_word_or_unit_of_the_format(script: str) -> None:
    text = (ROOT / "site_overrides" / "assets" / script).read_text("utf-8")
    written = {double or single for double, single in re.findall(r'"([^"\n]*)"|\'([^\'\n]*)\'', text)}
    words = {word for part in SCHEMA["$defs"].values() for word in map(str, part.get("enum", ()))}
    units = {unit["symbol"] for units in DATA["aids"]["units"].values() for unit in units}
    assert written & (words | units | {*site_class_names(), *leaving_group_names()}) == set()


def test_identifiers_of_the_book_are_not_drawn_again() -> None:
    assert DATA["identifier"]["taken"] == "NS2H8WDRWNS7K3QFMC"


@pytest.mark.parametrize(
    ("edit", "new"),
    [
        ("https://forge.example/book/edit/main/entries/", "https://forge.example/book/new/main/entries/"),
        ("https://forge.example/book/-/edit/main/entries/", "https://forge.example/book/-/new/main/entries/"),
        ("https://forge.example/book/_edit/main/entries/", "https://forge.example/book/_new/main/entries/"),
        ("https://forge.example/book/src/entries/", None),
        (None, None),
    ],
)
def test_where_a_forge_takes_a_new_file(edit: str | None, new: str | None) -> None:
    assert new_file_address(edit) == new


def test_the_page_brings_its_data(pages: dict[str, Page]) -> None:
    page = pages["how-to-add/form/"]
    (asset,) = page.assets
    assert asset.path in page.scripts
    text = asset.data.decode().removeprefix("globalThis.handbookFormat=").removesuffix(";\n")
    assert json.loads(text)["people"] == ["bench-2"]
