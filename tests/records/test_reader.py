"""Reading a file: the traps of YAML with their exact mends, hostile files, and the place of every value."""

from collections.abc import Callable
from pathlib import Path

import pytest

from builder.finding import Finding, Level
from builder.records.reader import Reading, read_bytes, read_record
from builder.records.specimen import specimen_text, with_example


def _read(text: str | bytes) -> Reading:
    return read_bytes(text if isinstance(text, bytes) else text.encode(), "entries/NS4T9XQ2N.yml")


def _one_error(reading: Reading) -> Finding:
    errors = [finding for finding in reading.findings if finding.level is Level.ERROR]
    assert [finding.rule for finding in errors] == [errors[0].rule], [finding.message for finding in errors]
    assert reading.record is None
    return errors[0]


TRAPS = [
    # example, rule, quoted value the finding points at, exact fix
    ("nucleophile: {name: x, smiles: [OH-], equivalents: 1}", "smiles-unquoted", "[OH-]", "'[OH-]'"),
    (
        "nucleophile:\n  name: x\n  smiles: [Na+].[OH-]\n  equivalents: 1",
        "smiles-unquoted",
        "[Na+].[OH-]",
        "'[Na+].[OH-]'",
    ),
    (
        "nucleophile: {name: x, smiles: [Na+].[N-]=[N+]=[N-], equivalents: 1}",
        "smiles-unquoted",
        "[Na+].[N-]=[N+]=[N-]",
        "'[Na+].[N-]=[N+]=[N-]'",
    ),
    ("nucleophile:\n  name: x\n  smiles: *CC\n  equivalents: 1", "smiles-unquoted", "*CC", "'*CC'"),
    (
        'nucleophile:\n  name: x\n  smiles: "C\\C=C\\C"\n  equivalents: 1',
        "smiles-unquoted",
        '"C\\C=C\\C"',
        "'C\\C=C\\C'",
    ),
    ("title: a: b", "yaml-unreadable", "a: b", "'a: b'"),
    ("title: @home", "yaml-unreadable", "@home", "'@home'"),
    ("take_away: >20:1 selectivity", "yaml-unreadable", ">20:1 selectivity", "'>20:1 selectivity'"),
    ("notebook: 0042", "number-altered", "0042", "'0042'"),
    ("solvent: [{name: 1,4-dioxane, volume: 20 mL}]", "text-split-at-comma", "1", "'1,4-dioxane'"),
    (
        "stages: [{add: [2,2-dimethylpropan-1-ol, DMF], temperature: 60 °C, time: 1 h}]",
        "text-split-at-comma",
        "2,2-dimethylpropan-1-ol",
        "'2,2-dimethylpropan-1-ol'",
    ),
    (
        "safety_review: {by: safety-1, date: 2026-03-12, scope: azide at 15 mmol, no acid, no metal}",
        "text-split-at-comma",
        "azide at 15 mmol",
        "'azide at 15 mmol, no acid, no metal'",
    ),
    ("neat: no\n# without solvent", "boolean-word", "no", "false"),
    ("performed: {date: 05.03.2026, by: [bench-2]}", "value-not-permitted", "05.03.2026", "2026-03-05"),
    ("performed: {date: 14.03.2026, by: [bench-2]}", "value-not-permitted", "14.03.2026", "2026-03-14"),
    ("status: curent", "value-not-permitted", "curent", "current"),
    ("related: [ns7k3qfmc]", "value-not-permitted", "ns7k3qfmc", "NS7K3QFMC"),
    ("title: 42", "value-wrong-type", "42", "'42'"),
    (
        "nucleophile: {name: x, smiles: '[OH-]', equivalents: '1,5'}",
        "quantity-decimal-comma",
        "'1,5'",
        "1.5",
    ),
    ("nucleophile: {name: x, smiles: '[OH-]', equivalents: 1.5 equiv}", "value-wrong-type", "1.5 equiv", "1.5"),
]


@pytest.mark.parametrize(("example", "rule", "quoted", "fix"), TRAPS, ids=[row[0][:40] for row in TRAPS])
def test_traps(example: str, rule: str, quoted: str, fix: str) -> None:
    text = with_example(example)
    finding = _one_error(_read(text))
    line = text.splitlines()[finding.place.line - 1]
    assert (finding.rule, finding.fix) == (rule, fix)
    assert line[finding.place.column - 1 :].startswith(quoted)
    assert line[finding.place.column - 1 : finding.place.end_column - 1] == quoted


@pytest.mark.parametrize(
    ("typed", "fix"), [("97:3", "'97:3'"), ("NO", "'NO'"), ("12:30:45", "'12:30:45'"), ("on", "'on'")]
)
def test_what_only_an_older_reader_alters_is_read_as_typed(typed: str, fix: str) -> None:
    reading = _read(with_example(f"notebook: {typed}"))
    assert reading.record is not None
    assert reading.record.notebook == typed
    assert [(f.rule, f.level, f.fix) for f in reading.findings] == [("yaml-1-1-reads-otherwise", Level.REMARK, fix)]


@pytest.mark.parametrize("typed", ["true", "True", "false"])
def test_booleans_are_true_and_false(typed: str) -> None:
    example = "outcome:\n  result: [no reaction]\n  failure: {cause: cold, repeated: %s}" % typed  # noqa: UP031
    record = _read(with_example(example)).record
    assert record is not None
    assert record.outcome.failure is not None
    assert record.outcome.failure.repeated is (typed.lower() == "true")


def test_several_faults_are_found_in_one_run() -> None:
    text = with_example(
        "nucleophile:\n  name: hydroxide\n  smiles: [Na+].[OH-]\n  equivalents: 1.5\n"
        "take_away: works: well\nsovent: x\nstages: [{temperature: 60, time: overnight}]"
    )
    found = {finding.rule for finding in _read(text).findings}
    assert found == {
        "smiles-unquoted",
        "yaml-unreadable",
        "key-unknown",
        "quantity-without-unit",
        "quantity-vague",
    }


def test_places_on_a_mended_line_are_those_of_the_file() -> None:
    text = with_example("nucleophile: {name: x, smiles: [Na+].[OH-], equivalents: two}")
    findings = {finding.rule: finding for finding in _read(text).findings}
    line = text.splitlines()[findings["value-wrong-type"].place.line - 1]
    assert line[findings["value-wrong-type"].place.column - 1 :].startswith("two")


def _nested(depth: int) -> bytes:
    return with_example("evidence: " + "[" * depth + "]" * depth).encode()


def _aliases() -> bytes:
    rows = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"]
    rows += [f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 10)}]" for n in range(1, 9)]
    return "\n".join(rows).encode()


HOSTILE: dict[str, tuple[Callable[[], bytes], str]] = {
    "nothing": (lambda: b"", "yaml-unreadable"),
    "a list": (lambda: b"- a\n- b", "value-wrong-type"),
    "a word": (lambda: b"hello", "value-wrong-type"),
    "two documents": (lambda: specimen_text().encode() + b"---\na: b\n", "yaml-unreadable"),
    "30 levels": (lambda: _nested(30), "nesting-too-deep"),
    "3,000 levels": (lambda: _nested(3000), "nesting-too-deep"),
    "100,000 levels": (lambda: b"[" * 100_000, "nesting-too-deep"),
    "3,000 indents": (lambda: b"\n".join(b" " * n + b"a:" for n in range(700)), "nesting-too-deep"),
    "an alias bomb": (_aliases, "alias-overgrown"),
    "an alias of itself": (lambda: b"a: &a [*a]", "nesting-too-deep"),
    "a tag": (lambda: with_example("title: !!python/object/apply:os.system ['true']").encode(), "tag-refused"),
    "a standard tag": (lambda: with_example("title: !!str text").encode(), "tag-refused"),
    "12 MB": (lambda: b"#" * 12_000_000, "file-too-large"),
    "binary": (lambda: bytes(range(256)), "file-not-text"),
    "UTF-16": (lambda: specimen_text().encode("utf-16"), "file-not-text"),
    "Latin-1": (lambda: with_example("title: 60 °C").encode("latin-1"), "file-not-text"),
    "an open quote": (lambda: with_example("title: 'never closed").encode(), "yaml-unreadable"),
    "a merge key": (lambda: with_example("<<: {title: merged}").encode(), "key-unknown"),
    "a list as key": (lambda: with_example("? [a, b]\n: c").encode(), "value-wrong-type"),
    "a path as identifier": (lambda: with_example("entry: ../../etc/passwd").encode(), "value-not-permitted"),
}


@pytest.mark.parametrize(("make", "rule"), HOSTILE.values(), ids=HOSTILE.keys())
def test_hostile_files_give_one_located_finding(make: Callable[[], bytes], rule: str) -> None:
    finding = _one_error(_read(make()))
    assert finding.rule == rule
    assert finding.place.line >= 1
    assert finding.mend


def test_a_large_file_is_not_even_read(tmp_path: Path) -> None:
    path = tmp_path / "NS4T9XQ2N.yml"
    with path.open("wb") as file:
        file.truncate(3_000_000_000)  # sparse: reading it would be noticed
    assert [finding.rule for finding in read_record(path, path.name).findings] == ["file-too-large"]


TOLERATED = {
    "CRLF": lambda text: text.replace("\n", "\r\n"),
    "old Macintosh line ends": lambda text: text.replace("\n", "\r"),
    "byte-order mark": lambda text: "\ufeff" + text,
    "no final newline": lambda text: text.rstrip("\n"),
    "a document start": lambda text: "---\n" + text,
}


@pytest.mark.parametrize("change", TOLERATED.values(), ids=TOLERATED.keys())
def test_tolerates(change: Callable[[str], str]) -> None:
    reading = _read(change(specimen_text()))
    assert reading.findings == ()
    assert reading.record is not None
    assert reading.record == _read(specimen_text()).record


def test_every_value_has_its_place() -> None:
    text = specimen_text()
    reading = _read(text)
    lines = text.splitlines()
    place = reading.places.of(("stages", 0, "temperature"))
    assert lines[place.line - 1][place.column - 1 : place.end_column - 1] == "60 °C"
    key = reading.places.of(("stages", 0, "temperature"), on_key=True)
    assert lines[key.line - 1][key.column - 1 : key.end_column - 1] == "temperature"
    for missing in [("stages", 0, "pressure"), ("stages", 3, "time")]:
        nearest = reading.places.of(missing)
        assert lines[nearest.line - 1].startswith("stages")


UNKNOWN_KEYS = [
    ("sovent: x", "sovent", "solvent"),
    ("stages: [{temprature: 60 °C, temperature: 60 °C, time: 16 h}]", "temprature", "temperature"),
    ("performed: {date: 2026-03-14, by: [bench-2], run: 2}", "run", "runs"),
    ("reviewed: {by: bench-1, date: 2026-03-20, quux: 1}", "quux", None),
]


@pytest.mark.parametrize(("example", "key", "near"), UNKNOWN_KEYS, ids=[row[1] for row in UNKNOWN_KEYS])
def test_unknown_keys_propose_the_nearest(example: str, key: str, near: str | None) -> None:
    text = with_example(example)
    finding = _one_error(_read(text))
    line = text.splitlines()[finding.place.line - 1]
    assert finding.rule == "key-unknown"
    assert finding.fix == near
    assert line[finding.place.column - 1 : finding.place.end_column - 1] == key
    assert finding.message == (f'unknown key "{key}"; did you mean "{near}"?' if near else f'unknown key "{key}"')


@pytest.mark.parametrize("left_out", ["format", "entry", "title", "performed", "substrate", "stages", "outcome"])
def test_required_keys(left_out: str) -> None:
    finding = _one_error(_read(with_example(f"# without {left_out}")))
    assert (finding.rule, finding.message) == ("key-missing", f"{left_out} is missing")
