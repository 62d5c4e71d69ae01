"""The JSON Schema: generated from the models, in step with the files, and saying what the models say."""

import json
import re
from pathlib import Path
from typing import Any, ClassVar

import jsonschema
import pytest
import yaml

from builder.authoring.schema import schemas
from builder.records.reader import read_bytes, read_record
from builder.records.specimen import with_example

ROOT = Path(__file__).parents[2]
RECORDS = sorted((ROOT / "entries").rglob("NS*.yml")) + sorted((ROOT / "tests/data/records/good").rglob("NS*.yml"))


@pytest.fixture(scope="module")
def validator() -> jsonschema.Draft202012Validator:
    schema = schemas()["record-1.json"]
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


class _Editor(yaml.SafeLoader):
    """Reads as an editor's YAML language server does: the core schema of YAML 1.2, section 10.3."""

    yaml_implicit_resolvers: ClassVar[dict[str, Any]] = {}


for _tag, _pattern, _first in (
    ("bool", r"true|True|TRUE|false|False|FALSE", "tTfF"),
    ("int", r"[-+]?[0-9]+", "-+0123456789"),
    ("float", r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?", "-+.0123456789"),
    ("null", r"null|Null|NULL|~|", ["~", "n", "N", ""]),
):
    _Editor.add_implicit_resolver(f"tag:yaml.org,2002:{_tag}", re.compile(rf"^(?:{_pattern})$"), list(_first))


def _plain(text: str) -> Any:
    return yaml.load(text, _Editor)


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


SUBSTRATE = "substrate: {name: 2-bromobutane, class: secondary, leaving_group: bromide, %s}"
STAGE = "stages: [{temperature: %s, time: %s}]"
MEASURED = "outcome: {result: [substitution], products: [{label: A, name: x, smiles: CC}], measured: [%s]}"
OUTCOME = "outcome: {result: [substitution], products: [{label: A, name: x, smiles: CC}], %s}"
KINETICS = OUTCOME % "rate_constant: {order: %s, value: %s, temperature: 25 °C}"
FOLLOWED = OUTCOME % "time_course: {follows: %s, time_unit: h, points: %s}"
REPLACED = "superseded: {by: NS7K3QFMC, date: 2026-03-14, because: better data}"
WITHDRAWN = "withdrawn: {by: bench-1, date: 2026-03-14, because: wrong product}"
FILE = "evidence: [1H NMR, {what: raw data, file: %s, sha256: %s}]"
SHA = "0123456789abcdef" * 4

READ = [
    SUBSTRATE % "smiles: CCC(C)Br, mass: 1.37 g",
    SUBSTRATE % "inchi: InChI=1S/CH4/h1H4, amount: 10 mmol",
    SUBSTRATE % "from_rxn: reactant 1, volume: 1.1 mL, density: 1.26 g/cm³",
    SUBSTRATE % "smiles: CCC(C)Br, amount: 5 \u03bcmol",
    SUBSTRATE % "smiles: CCC(C)Br, amount: 5 \u00b5mol, er: '97:3'",
    SUBSTRATE % "smiles: CCC(C)Br, amount: +.5e\u22123 mol",
    STAGE % ("60 °C", "16 h"),
    STAGE % ("60ºC", "20\u00a0min"),
    STAGE % ("333.15 K", "1e2 s"),
    STAGE % ("\u221278 °C", "1 d"),
    STAGE % ("0 to 25 °C", "1 h"),
    STAGE % ("-78 °C TO -20 °C", "1 h"),
    STAGE % ("20–25 °C", "1 h"),
    STAGE % ("0 °C – 25 °C", "1 h"),
    STAGE % ("60 ° C", "1 h"),
    "stages: {temperature: 60 °C, time: 16 h, over: 15 min, pressure: 3 hPa, add: DMF}",
    "nucleophile: solvent",
    "nucleophile: {name: x, smiles: '[OH-]', volume: 5 mL, strength: 2.5 M}",
    "nucleophile: [{name: x, smiles: '[OH-]', mass: 5 g, strength: 48 %}, {name: y, equivalents: 1.0e-2}]",
    "base: {name: x, smiles: '[OH-]', equivalents: 2}\n# without nucleophile",
    "neat: true\n# without solvent",
    "neat: false",
    "solvent: [{name: water, fraction: 20 %}, {name: ethanol, fraction: 80 %}]\nconcentration: 0.5 mol/L",
    f"status: superseded\n{REPLACED}",
    f"status: withdrawn\n{WITHDRAWN}",
    "status: draft",
    FILE % ("data/nmr.zip", SHA),
    "evidence: []",
    MEASURED % "{yield: 81 %, of: A, kind: isolated}",
    MEASURED % "{yield: '< 2 %', of: [A, B], kind: area, spread: 0 %}",
    MEASURED % "{ee: -5 %, of: A}, {er: '97.5:2.5'}, {dr: '3:1'}, {conversion: ≥99 %}, {recovered: 5 %}",
    MEASURED % "{ratio: 'A:B+C = 65:35', calibrated: true}",
    KINETICS % (1, "9.2e-6 1/s"),
    KINETICS % (1, "0.03 min^-1"),
    KINETICS % (1, "0.03 s\u22121"),
    KINETICS % (2, "'1.4e-3 L/(mol s)'"),
    KINETICS % (2, "1.4 M-1 s-1"),
    FOLLOWED % ("conversion", "[[0, 0], [0.5, 12.4], [1.0e+1, 100]]"),
    FOLLOWED % ("ee", "[[0, -100], [1, 99.5]]"),
    "outcome: {result: no reaction, sought: CCC}",
    "outcome: {result: [no reaction, decomposition], sought: {name: x, smiles: CCC}, products: [], measured: []}",
    "related: NS7K3QFMC",
    "preceded_by: [NS7K3QFMC]",
    f"rxn_file: {{path: data/NS4T9XQ2N.rxn, sha256: {SHA}}}",
]

REFUSED = [
    "sovent: x",
    "status: finished",
    "notebook: null",
    "# without outcome",
    "# without nucleophile",
    "# without solvent",
    "neat: true",
    "neat: false\n# without solvent",
    "neat: yes\n# without solvent",
    "format: true",
    "format: 2",
    "revision: 1.5",
    "performed: {date: 2026-03-14, by: [bench-2], runs: 0}",
    "performed: {date: 2026-03-14, by: []}",
    "performed: {date: 14.03.2026, by: bench-2}",
    STAGE % ("60", "16 h"),
    STAGE % ("rt", "16 h"),
    STAGE % ("60 °C", "0 h"),
    STAGE % ("60 °C", "-1 h"),
    STAGE % ("60 °C", "1–2 h"),
    "solvent: [{name: DMF, volume: 20 g}]",
    "solvent: [{name: DMF, volume: '1,5 mL'}]",
    SUBSTRATE % "mass: 1.37 g",
    SUBSTRATE % "smiles: CCC(C)Br",
    SUBSTRATE % "smiles: CCC(C)Br, equivalents: 1",
    SUBSTRATE % "smiles: CCC(C)Br, amount: 0 mmol",
    SUBSTRATE % "smiles: CCC(C)Br, amount: 0.0e3 mmol",
    SUBSTRATE % "from_rxn: educt 1, amount: 1 mmol",
    SUBSTRATE % "smiles: CCC(C)Br, amount: 1 mmol, cas: '75263'",
    SUBSTRATE % "smiles: CCC(C)Br, amount: 1 mmol, er: '0:0'",
    "nucleophile: water",
    "nucleophile: {name: x, smiles: '[OH-]', equivalents: 0}",
    "nucleophile: {name: x, smiles: '[OH-]', equivalents: '1.5'}",
    "nucleophile: {name: x, smiles: '[OH-]', volume: 5 mL, strength: strong}",
    "nucleophile: {name: x, smiles: '[OH-]', volume: 5 mL, strength: 0 M}",
    "status: superseded",
    "status: withdrawn",
    f"status: withdrawn\n{REPLACED}",
    REPLACED,
    WITHDRAWN,
    "outcome: {result: [substitution]}",
    "outcome: {result: elimination, products: [], measured: [{conversion: 5 %}]}",
    "outcome: {result: [no reaction, addition], measured: [{conversion: 5 %}]}",
    "outcome: {result: [substitution], products: [{label: A, name: x, smiles: CC}]}",
    "outcome: {result: [substitution], products: [{label: A, name: x}], measured: [{conversion: 5 %}]}",
    "outcome: {result: [substitution], products: [{label: A B, name: x, smiles: C}], measured: [{conversion: 5 %}]}",
    MEASURED % "{by: GC}",
    MEASURED % "{conversion: 99 %, recovered: 1 %}",
    MEASURED % "{yield: 81 %, of: A}",
    MEASURED % "{yield: 81 %, kind: isolated}",
    MEASURED % "{ee: 97 %, of: [A, A]}",
    MEASURED % "{ratio: '65:35'}",
    MEASURED % "{er: '97/3'}",
    KINETICS % ("true", "9.2e-6 1/s"),
    KINETICS % (1, "fast"),
    KINETICS % (1, "9.2 × 10⁻⁶ 1/s"),
    FOLLOWED % ("conversion", "[[0, 0]]"),
    FOLLOWED % ("conversion", "[[0, 0], [1, 2, 3]]"),
    FOLLOWED % ("conversion", "[[-1, 0], [1, 2]]"),
    FOLLOWED % ("conversion", "[[0, 0], [1, 101]]"),
    FILE % ("../secret", SHA),
    FILE % ("/etc/passwd", SHA),
    FILE % ("data/nmr.zip", "none"),
    "evidence: [{what: raw data}]",
]

ONLY_THE_READER = {
    "order: 1.0 is a whole number to JSON Schema": KINETICS % ("1.0", "9.2e-6 1/s"),
    "a check character": "related: [NS0000000]",
    "a check digit": SUBSTRATE % "smiles: CCC(C)Br, amount: 1 mmol, cas: 75-26-4",
    "the days of the calendar": "performed: {date: 2026-02-30, by: bench-2}",
    "a text of blanks": "title: ' '",
    "a bound on a quantity": STAGE % ("60 °C", "1e9 h"),
    "absolute zero": STAGE % ("-300 °C", "1 h"),
    "a percentage above its bound": SUBSTRATE % "smiles: CCC(C)Br, amount: 1 mmol, purity: 101 %",
    "a number beyond any measurement": SUBSTRATE % "smiles: CCC(C)Br, mass: 1e400 g",
    "as many labels as numbers": MEASURED % "{ratio: 'A:B = 1:2:3'}",
    "a label twice in a ratio": MEASURED % "{ratio: 'A:A = 1:2'}",
    "the order of points": FOLLOWED % ("conversion", "[[1, 0], [1, 2]]"),
    "a negative conversion, where a negative ee may stand": FOLLOWED % ("conversion", "[[0, -1], [1, 2]]"),
}

ONLY_THE_SCHEMA = {
    "the lists of the pattern tables: a check refuses it": SUBSTRATE.replace("bromide", "bromine")
    % "smiles: CCBr, amount: 1 mmol",
    "the list of site classes": SUBSTRATE.replace("secondary", "prim") % "smiles: CCBr, amount: 1 mmol",
}


def _is_read(example: str) -> bool:
    return read_bytes(with_example(example).encode(), "NS4T9XQ2N.yml").record is not None


@pytest.mark.parametrize("example", READ)
def test_the_schema_refuses_nothing_that_is_read(example: str, validator: jsonschema.Draft202012Validator) -> None:
    assert _is_read(example)
    assert [error.message for error in validator.iter_errors(_plain(with_example(example)))] == []


@pytest.mark.parametrize("example", REFUSED)
def test_the_schema_refuses_what_the_reader_refuses(example: str, validator: jsonschema.Draft202012Validator) -> None:
    assert not _is_read(example)
    assert not validator.is_valid(_plain(with_example(example)))


@pytest.mark.parametrize("example", ONLY_THE_READER.values(), ids=ONLY_THE_READER.keys())
def test_what_only_the_reader_can_see(example: str, validator: jsonschema.Draft202012Validator) -> None:
    assert not _is_read(example)
    assert validator.is_valid(_plain(with_example(example)))


@pytest.mark.parametrize("example", ONLY_THE_SCHEMA.values(), ids=ONLY_THE_SCHEMA.keys())
def test_what_the_schema_knows_from_the_tables(example: str, validator: jsonschema.Draft202012Validator) -> None:
    assert _is_read(example)
    assert not validator.is_valid(_plain(with_example(example)))


POINTED_AT = [
    # example, where an editor draws its line, a word of what it says
    ("stages: [{temperature: 60 °C, time: 16 h, vesel: open}]", ("stages", 0), "vesel"),
    ("stages: [{temperature: 60 °C, time: 16}]", ("stages", 0, "time"), "16"),
    ("stages: {temperature: 60 °C, time: 16}", ("stages", "time"), "16"),
    ("solvent: [{name: DMF, volum: 20 mL}]", ("solvent", 0), "volum"),
    ("solvent: {name: DMF, volume: 20 g}", ("solvent", "volume"), "20 g"),
    ("nucleophile: [{name: x, smile: '[OH-]'}]", ("nucleophile", 0), "smile"),
    ("nucleophile: {name: x, equivalents: 1.5 equiv}", ("nucleophile", "equivalents"), "1.5 equiv"),
    ("nucleophile: water", ("nucleophile",), "water"),
    ("performed: {date: 14.03.2026, by: bench-2}", ("performed", "date"), "14.03.2026"),
    ("evidence: [1H NMR, {what: x, fil: y}]", ("evidence", 1), "fil"),
    ("outcome: {result: [no reaction], sought: {name: x, smile: CC}}", ("outcome", "sought"), "smile"),
    (SUBSTRATE.replace("secondary", "[secondary, prim]") % "smiles: CC, mass: 1 g", ("substrate", "class", 1), "prim"),
]


@pytest.mark.parametrize(("example", "path", "word"), POINTED_AT, ids=[row[0][:50] for row in POINTED_AT])
def test_an_editor_points_at_the_slip_itself(
    example: str, path: tuple[str | int, ...], word: str, validator: jsonschema.Draft202012Validator
) -> None:
    errors = list(validator.iter_errors(_plain(with_example(example))))
    assert {tuple(error.absolute_path) for error in errors} == {path}
    assert any(word in error.message for error in errors)


def test_every_key_is_described() -> None:
    schema = schemas()["record-1.json"]
    described = [name for name, part in schema["$defs"].items() if part.get("description")]
    assert len(described) == len(schema["$defs"])
