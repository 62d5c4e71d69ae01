"""The JSON Schema: generated from the models, in step with the files, and saying what the models say."""

import json
from pathlib import Path
from typing import Any

import jsonschema
import pytest
import yaml

from builder.authoring.schema import schemas
from builder.records.reader import read_record
from builder.records.specimen import specimen_text, with_example

ROOT = Path(__file__).parents[2]
RECORDS = sorted((ROOT / "entries").rglob("NS*.yml")) + sorted((ROOT / "tests/data/records/good").rglob("NS*.yml"))


@pytest.fixture(scope="module")
def validator() -> jsonschema.Draft202012Validator:
    schema = schemas()["record-1.json"]
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def _plain(text: str) -> Any:
    """Read as an editor's YAML language server does: core types, dates as text."""

    class Loader(yaml.SafeLoader):
        pass

    Loader.yaml_implicit_resolvers = {
        first: [(tag, pattern) for tag, pattern in resolvers if "timestamp" not in tag]
        for first, resolvers in yaml.SafeLoader.yaml_implicit_resolvers.items()
    }
    return yaml.load(text, Loader)


def test_the_files_in_the_repository_are_in_step() -> None:
    for name, schema in schemas().items():
        written = json.loads((ROOT / "entries/schema" / name).read_text("utf-8"))
        assert written == schema, "run `handbook schema`"


@pytest.mark.parametrize("path", RECORDS, ids=[path.stem for path in RECORDS])
def test_good_records_validate(path: Path, validator: jsonschema.Draft202012Validator) -> None:
    assert read_record(path, path.name).record is not None
    text = path.read_text("utf-8-sig")
    assert [error.message for error in validator.iter_errors(_plain(text))] == []


@pytest.mark.parametrize("path", RECORDS, ids=[path.stem for path in RECORDS])
def test_the_modeline_leads_to_the_schema(path: Path) -> None:
    first = path.read_text("utf-8-sig").splitlines()[0]
    if path.is_relative_to(ROOT / "entries"):
        prefix = "# yaml-language-server: $schema="
        assert first.startswith(prefix)
        assert (path.parent / first.removeprefix(prefix)).resolve() == ROOT / "entries/schema/record-1.json"


REFUSED = [
    "sovent: x",
    "status: finished",
    "stages: [{temperature: 60, time: 16 h}]",
    "stages: [{temperature: rt, time: 16 h}]",
    "solvent: [{name: DMF, volume: 20 g}]",
    "performed: {date: 2026-03-14, by: [bench-2], runs: 0}",
    "substrate: {name: x, smiles: CCBr, class: primary, leaving_group: bromine, amount: 1 mmol}",
    "substrate: {name: x, smiles: CCBr, class: prim, leaving_group: bromide, amount: 1 mmol}",
    "# without outcome",
    "# without nucleophile",
    "# without solvent",
    "notebook: null",
]


@pytest.mark.parametrize("example", REFUSED)
def test_the_schema_refuses_what_the_reader_refuses(example: str, validator: jsonschema.Draft202012Validator) -> None:
    assert not validator.is_valid(_plain(with_example(example)))
    assert validator.is_valid(_plain(specimen_text()))


def test_every_key_is_described() -> None:
    schema = schemas()["record-1.json"]
    described = [name for name, part in schema["$defs"].items() if part.get("description")]
    assert len(described) == len(schema["$defs"])
