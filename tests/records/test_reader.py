"""Reading a file: the traps of YAML with their exact mends, hostile files, and the place of every value."""

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any, get_args, get_origin, get_type_hints

import pytest
from pydantic import AfterValidator, BaseModel, BeforeValidator

from builder.finding import Finding, Level
from builder.records.fields import Line
from builder.records.model import Record
from builder.records.reader import Reading, gaps_as_one, read_bytes, read_record, read_settings
from builder.records.settings import Settings
from builder.records.specimen import outcome_example, specimen_text, with_example
from builder.records.yaml_text import read_plain


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
    ("solvent: [{name: 1,4-dioxane, volume: 20 mL}]", "text-split-at-comma", "1,4-dioxane", "'1,4-dioxane'"),
    (
        "stages: [{add: [2,2-dimethylpropan-1-ol, DMF], temperature: 60 °C, time: 1 h}]",
        "text-split-at-comma",
        "2,2-dimethylpropan-1-ol",
        "'2,2-dimethylpropan-1-ol'",
    ),
    (
        "safety_review: {by: safety-1, date: 2026-03-12, scope: azide at 15 mmol, no acid, no metal}",
        "text-split-at-comma",
        "azide at 15 mmol, no acid, no metal",
        "'azide at 15 mmol, no acid, no metal'",
    ),
    (outcome_example("{yield: 88,5 %, of: A, kind: assay}"), "quantity-decimal-comma", "88,5 %", "88.5 %"),
    ("nucleophile: {name: x, smiles: '[OH-]', equivalents: 1,5}", "quantity-decimal-comma", "1,5", "1.5"),
    ("nucleophile: {name: x, smiles: '[OH-]', mass: 2,083 mg}", "quantity-decimal-comma", "2,083 mg", None),
    ("nucleophile: {name: x, smiles: '[OH-]', form: 1,5 x 2 cm}", "text-split-at-comma", "1,5 x 2 cm", "'1,5 x 2 cm'"),
    ("neat: no\n# without solvent", "boolean-word", "no", "false"),
    ("performed: {date: 05.03.2026, by: [bench-2]}", "value-not-permitted", "05.03.2026", "2026-03-05"),
    ("performed: {date: 14.03.2026, by: [bench-2]}", "value-not-permitted", "14.03.2026", "2026-03-14"),
    ("status: curent", "value-not-permitted", "curent", "current"),
    ("status: Draft", "value-not-permitted", "Draft", "draft"),
    (outcome_example("{conversion: 5 %}", more="claim: {mechanism: sn2'}"), "value-not-permitted", "sn2'", "SN2'"),
    (outcome_example("{conversion: 5 %}", more="claim: {mechanism: e1CB}"), "value-not-permitted", "e1CB", "E1cB"),
    ("related: [ns7k3qfmc]", "value-not-permitted", "ns7k3qfmc", "NS7K3QFMC"),
    ("title: 42", "value-wrong-type", "42", "'42'"),
    (
        "nucleophile: {name: x, smiles: '[OH-]', equivalents: '1,5'}",
        "quantity-decimal-comma",
        "'1,5'",
        "1.5",
    ),
    ("nucleophile: {name: x, smiles: '[OH-]', equivalents: 1.5 equiv}", "value-wrong-type", "1.5 equiv", "1.5"),
    ("nucleophile: {name: x, smiles: '[OH-]', equivalents: 1e-2 equiv}", "value-wrong-type", "1e-2 equiv", "1e-2"),
    ("stages: [{temperature: 60 °C, time: 9 × 10² s}]", "quantity-unreadable", "9 × 10² s", "9e2 s"),
    (f"rxn_file: {{path: a.rxn, sha256: {'1234' * 16}}}", "number-altered", "1234" * 16, f"'{'1234' * 16}'"),
    (
        f"rxn_file: {{path: a.rxn, sha256: 1e{'1234567' * 8}123456}}",
        "number-altered",
        f"1e{'1234567' * 8}123456",
        f"'1e{'1234567' * 8}123456'",
    ),
    (f"rxn_file: {{path: a.rxn, sha256: {'AB' * 32}}}", "value-not-permitted", "AB" * 32, f"'{'ab' * 32}'"),
    (outcome_example("{er: '97/3'}"), "ratio-unreadable", "'97/3'", "'97:3'"),
    (outcome_example("{ratio: 'A:B=65:35'}"), "ratio-unreadable", "'A:B=65:35'", "'A:B = 65:35'"),
]


SITE = "class: secondary\n  leaving_group: bromide\n  amount: 10 mmol"
SUBSTRATE = f"substrate:\n  name: 2-bromobutane\n  smiles: 'CCC(C)Br'\n  {SITE}"
LAYOUT = [
    # example, what the finding points at, exact fix; the cause is mended in memory and nothing else is wrong
    ("title: 'fast' azide", "'fast' azide", "'''fast'' azide'"),
    ('title: "fast" azide', '"fast" azide', "'\"fast\" azide'"),
    ("title: 'it's late'", "'it's late'", "'it''s late'"),
    ("work_up:\n  - 'fast' filtration\n  - brine", "'fast' filtration", "'''fast'' filtration'"),
    ("solvent: [{name: 'dry' DMF, volume: 20 mL}]", "'dry' DMF", "'''dry'' DMF'"),
    ("solvent: [{name: DMF #3, volume: 20 mL}]", "DMF #3", "'DMF #3'"),
    ("solvent: [{name: 'chemist''s', form: a #1 b, volume: 20 mL}]", "a #1 b", "'a #1 b'"),
    ("title: - azide", "- azide", "'- azide'"),
    ("title: [2.2.1]bicycle", "[2.2.1]bicycle", "'[2.2.1]bicycle'"),
    (SUBSTRATE.replace("class: s", "class:s"), "class:secondary", "class: secondary"),
    (SUBSTRATE.replace("name: 2", "name:2"), "name:2-bromobutane", "name: 2-bromobutane"),
    (SUBSTRATE.replace("class: s", "class:\u00a0s"), "class:\u00a0secondary", "class: secondary"),
    (
        "substrate: {name: x, smiles: 'CCC(C)Br', class:secondary, leaving_group: bromide, amount: 10 mmol}",
        "class:secondary",
        "class: secondary",
    ),
    ("nucleophile: {name: x, smiles: '[OH-]', form:\u00a0oil, equivalents: 1}", "form:\u00a0oil", "form: oil"),
    ("title:azide", "title:azide", "title: azide"),
    (SUBSTRATE.replace("  smiles", "\u00a0\u00a0smiles"), "\u00a0\u00a0", "  "),
    (SUBSTRATE.replace("  smiles", " \u202fsmiles"), "\u202f", " "),
    (SUBSTRATE.replace("  smiles", "\t\tsmiles"), "\t\t", "  "),
    ("stages:\n  - temperature: 60 °C\n\ttime: 16 h", "\t", "    "),
]


@pytest.mark.parametrize(("example", "pointed_at", "fix"), LAYOUT, ids=[row[2] for row in LAYOUT])
def test_slips_of_layout_are_mended(example: str, pointed_at: str, fix: str) -> None:
    text = with_example(example)
    finding = _one_error(_read(text))
    lines = text.split("\n")
    line = lines[finding.place.line - 1]
    assert (finding.rule, finding.fix) == ("yaml-unreadable", fix)
    assert line[finding.place.column - 1 : finding.place.end_column - 1] == pointed_at
    lines[finding.place.line - 1] = line[: finding.place.column - 1] + fix + line[finding.place.end_column - 1 :]
    assert _read("\n".join(lines)).record is not None


UNMENDED = [
    # example, what the finding points at, message, mend
    ("title: 'open\nnotebook: 'BK2'", "'open", "this quote is never closed", "close it with '"),
    ('title: "open', '"open', "this quote is never closed", 'close it with "'),
    ("solvent: [{name: DMF}\ntitle: x", "[{name", "this bracket is never closed", "close it with ]"),
    ("solvent: [{name: DMF\ntitle: x", "{name", "this bracket is never closed", "close it with }"),
    ("evidence: [1H NMR\nrelated: [NS7K3QFMC]", "[1H", "this bracket is never closed", "close it with ]"),
    (
        SUBSTRATE.replace("  class", " class"),
        "class",
        "indented by 1; the lines above go on at 0 or 2",
        "indent it by 2",
    ),
    (
        SUBSTRATE.replace("  class", "   class"),
        "class",
        "indented by 3; the lines above go on at 0 or 2",
        "indent it by 2",
    ),
    (
        "solvent:\n  - name: DMF\n    volume: 20 mL\n   - name: water",
        "- name: water",
        "indented by 3; the lines above go on at 2",
        "indent it by 2",
    ),
    (
        "stages:\n  - temperature: 60 °C\n  time: 16 h",
        "time",
        "indented by 2; the lines above go on at 0 or 4",
        "indent it by 4",
    ),
    (
        "evidence: [\n  1H NMR,\n  {what: x}\n  {what: y}]",
        "{what: y",
        "a comma or ] is wanted here",
        "set it, or put the text in quotes",
    ),
    ("title: x\nfoo bar\nnotebook: z", "foo bar", "a line without key and colon", "write key: value"),
]


@pytest.mark.parametrize(("example", "at", "message", "mend"), UNMENDED, ids=[row[0][:40] for row in UNMENDED])
def test_other_faults_of_layout_are_told_where_they_begin(example: str, at: str, message: str, mend: str) -> None:
    text = with_example(example)
    finding = _one_error(_read(text))
    assert (finding.rule, finding.message, finding.mend) == ("yaml-unreadable", message, mend)
    assert text.split("\n")[finding.place.line - 1][finding.place.column - 1 :].startswith(at)


CUT = [
    # example, what the finding points at
    ("title: Run #3 of azide", "Run #3 of azide"),
    ("notebook: BK2 #112  # copied", "BK2 #112"),
    ("take_away: 81 % in lot #3, less in #4", "81 % in lot #3, less in #4"),
    ("work_up:\n  - filter #2\n  - brine", "filter #2"),
]


@pytest.mark.parametrize(("example", "whole"), CUT, ids=[row[1] for row in CUT])
def test_a_text_cut_by_a_comment_is_remarked_on(example: str, whole: str) -> None:
    text = with_example(example)
    reading = _read(text)
    assert reading.record is not None
    (finding,) = reading.findings
    line = text.split("\n")[finding.place.line - 1]
    assert (finding.rule, finding.level, finding.fix) == ("text-cut-by-comment", Level.REMARK, f"'{whole}'")
    assert line[finding.place.column - 1 : finding.place.end_column - 1] == whole


WORDS_AND_LABELS = {"class", "leaving_group", "of"}
"""Texts to the form, but from a closed list, or the label of a product: what follows # is no part of them."""


def _fields_below(model: type[BaseModel]) -> Iterator[tuple[str, Any]]:
    for name, annotation in get_type_hints(model, include_extras=True).items():
        if name in model.model_fields:
            yield model.model_fields[name].alias or name, annotation
            for below in _annotations_in(annotation):
                if get_origin(below) is None and isinstance(below, type) and issubclass(below, BaseModel):
                    yield from _fields_below(below)


def _annotations_in(annotation: Any) -> Iterator[Any]:
    yield annotation
    for below in get_args(annotation):
        yield from _annotations_in(below)


def _is_free_text(annotation: Any) -> bool:
    """Say whether a field takes Line, bounded to some length or not."""
    as_text = [each for each in get_args(Line) if isinstance(each, (BeforeValidator, AfterValidator))]
    return any(as_text == list(get_args(each))[1 : len(as_text) + 1] for each in _annotations_in(annotation))


def test_every_free_text_is_watched_for_comments() -> None:
    fields = [*_fields_below(Record), *_fields_below(Settings)]
    watched = {
        key
        for key, _ in fields
        if "text-cut-by-comment" in {finding.rule for finding in read_plain(f"{key}: Run #3 of azide", "x").findings}
    }
    assert watched == {key for key, annotation in fields if _is_free_text(annotation)} - WORDS_AND_LABELS


@pytest.mark.parametrize("comment", ["# formed in stage 1", "#", "## formed", "#### 3"])
def test_a_comment_set_apart_is_one(comment: str) -> None:
    assert _read(with_example(f"title: Azide {comment}")).findings == ()


def test_every_gap_is_found_in_its_place_and_all_are_told_at_once() -> None:
    text = with_example(
        "title: TO FILL IN\nnotebook: 'TO FILL IN'\nsolvent: TO FILL IN\nevidence: [TO FILL IN]\n"
        "stages: [{temperature: TO FILL IN, time: 16, vessel: TO FILL IN (which)}]"
    )
    found = _read(text).findings
    assert sorted(finding.rule for finding in found) == ["gap-left-open"] * 6 + ["quantity-without-unit"]
    told = {finding.rule: finding for finding in gaps_as_one(found)}
    assert sorted(told) == ["gap-left-open", "quantity-without-unit"]
    lines = [number for number, line in enumerate(text.splitlines(), start=1) if "TO FILL IN" in line]
    gap = told["gap-left-open"]
    assert gap.message == f"6 values are still to fill in, on lines {lines[0]} to {lines[-1]}"
    assert gap.data == {"lines": lines}
    assert gap.place.line == lines[0]


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


def _substrate(more: str) -> bytes:
    return with_example(
        f"substrate: {{name: x, smiles: CCBr, amount: 1 mmol, leaving_group: bromide, {more}}}"
    ).encode()


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
    "20,001 plain values": (lambda: b"a: [" + b"x," * 20_001 + b"]", "alias-overgrown"),
    "a line of 200,000 colons": (lambda: b"a: {" + b"a: " * 66_000, "yaml-unreadable"),
    "a comment behind 200,000 blanks": (lambda: b"title: a #b" + b" " * 200_000 + b"c\n- x", "yaml-unreadable"),
    "an alias of itself": (lambda: b"a: &a [*a]", "nesting-too-deep"),
    "a tag": (lambda: with_example("title: !!python/object/apply:os.system ['true']").encode(), "tag-refused"),
    "a standard tag": (lambda: with_example("title: !!str text").encode(), "tag-refused"),
    "12 MB": (lambda: b"#" * 12_000_000, "file-too-large"),
    "binary": (lambda: bytes(range(256)), "file-not-text"),
    "UTF-16": (lambda: specimen_text().encode("utf-16"), "file-not-text"),
    "Latin-1": (lambda: with_example("title: 60 °C").encode("latin-1"), "file-not-text"),
    "an open quote": (lambda: with_example("title: 'never closed").encode(), "yaml-unreadable"),
    "an open bracket at the end": (lambda: b"title: [", "yaml-unreadable"),
    "a merge key": (lambda: with_example("<<: {title: merged}").encode(), "key-unknown"),
    "a list as key": (lambda: with_example("? [a, b]\n: c").encode(), "value-wrong-type"),
    "a tag on a key": (lambda: with_example("# without notebook\n!!str notebook: BK2/112").encode(), "tag-refused"),
    "a key like pydantic's tag": (lambda: with_example("<text>: x").encode(), "key-unknown"),
    "a key like a word": (lambda: with_example("word: x").encode(), "key-unknown"),
    "a Python name for a key": (lambda: _substrate("class: primary, classes: primary"), "key-unknown"),
    "a count of 5,000 digits": (lambda: with_example("revision: " + "9" * 5000).encode(), "number-altered"),
    "a count beyond decimals": (lambda: with_example("revision: 1e9999999999999999999999").encode(), "number-altered"),
    "a mass beyond floats": (lambda: _substrate("class: secondary, mass: 1e400 g"), "quantity-out-of-range"),
    "a mass of 30 MB": (lambda: _substrate("class: secondary, mass: 1e30000000 g"), "quantity-out-of-range"),
    "a mass of 11 t": (lambda: _substrate("class: secondary, mass: 11000 kg"), "quantity-out-of-range"),
    "a ratio of 5,000 digits": (
        lambda: with_example(outcome_example(f"{{er: '{'9' * 5000}:1'}}")).encode(),
        "ratio-unreadable",
    ),
    "a line end that editors do not count": (lambda: with_example("title: a\u2028b").encode(), "file-not-text"),
    "the next-line character": (lambda: with_example("title: a\u0085b").encode(), "file-not-text"),
    "an escaped line end": (lambda: with_example('title: "a\\u2029b"').encode(), "file-not-text"),
    "true for a number": (lambda: with_example("format: true").encode(), "value-wrong-type"),
    "a fraction for a whole number": (lambda: with_example("format: 1.0").encode(), "value-wrong-type"),
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
    assert [finding.rule for finding in read_settings(path, path.name)[1]] == ["file-too-large"]


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


@pytest.mark.parametrize("change", TOLERATED.values(), ids=TOLERATED.keys())
def test_tolerates_it_in_settings_too(tmp_path: Path, change: Callable[[str], str]) -> None:
    path = tmp_path / "handbook.yml"
    text = "format: 1\ntitle: Bücher\nhouse_rules:\n  - One rule.\n"
    path.write_bytes(change(text).encode())
    settings, findings, _ = read_settings(path, path.name)
    assert findings == ()
    assert settings is not None
    assert (settings.title, settings.house_rules) == ("Bücher", ("One rule.",))


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
    ("stages: [{temprature: 60 °C, time: 16 h}]", "temprature", "temperature"),
    ("Titel: Azide\n# without title", "Titel", "title"),
    ("STAGES: {temperature: 60 °C, time: 16 h}\n# without stages", "STAGES", "stages"),
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


COURSE = "time_course: {follows: %s, time_unit: h, points: %s}"
IN_WORDS = [
    # example, what the finding points at, message, mend
    ("work_up: []", "[]", "too few items: 0", "list 1 or more, or leave the key out"),
    ("title: ''", "''", "the text is empty", "write it, or leave the key out"),
    (f"title: {'x' * 170}", "x" * 170, "the text has 170 characters", "shorten it to 160"),
    ("revision: 0", "0", "0 is too small", "write 1 or more"),
    ("revision: 10001", "10001", "10001 is too large", "write 10,000 at most"),
    ("nucleophile: {name: x, equivalents: 0}", "0", "0 is too small", "write a number above 0"),
    ("nucleophile: {name: x, equivalents: 1001}", "1001", "1001 is too large", "write 1,000 at most"),
    (
        "stages: [{temperature: 60 °C, time: 0 h}]",
        "0 h",
        '"0 h" is impossible',
        "write a value above zero",
    ),
    (
        outcome_example("{yield: 81 %, of: [A, A], kind: assay}"),
        "A]",
        "A stands twice",
        "name each once",
    ),
    (
        outcome_example("{ratio: 'A:A = 50:50', by: GC}"),
        "'A:A = 50:50'",
        '"A:A = 50:50" names A twice',
        "name each label once",
    ),
    (
        outcome_example(more=COURSE % ("conversion", "[[0, 0], [4, 104]]")),
        "104",
        "104 % is impossible",
        "write a percentage from 0 to 100",
    ),
    (
        outcome_example(more=COURSE % ("ee", "[[0, -99], [4, -101]]")),
        "-101",
        "-101 % is impossible",
        "write a percentage from -100 to 100",
    ),
    (
        outcome_example(more=COURSE % ("yield", "[[0, 0], [4, 10], [4, 12]]")),
        "4, 12",
        "4 h does not come after 4 h",
        "start at 0 or later, and list the points in the order of time",
    ),
    (
        outcome_example(more=COURSE % ("yield", "[[-1, 0], [4, 10]]")),
        "-1",
        "-1 h does not come after the start",
        "start at 0 or later, and list the points in the order of time",
    ),
    (
        outcome_example(more=COURSE % ("yield", "[[0, 0], [4]]")),
        "[4]",
        "a point is a time and a percentage",
        "write it like [4, 12.4]",
    ),
    ("evidence: [1H NMR, {what: x}]", "{what", "file is missing", "add file: …"),
    (
        "nucleophile: {name: x, equivalents: '1.5'}",
        "'1.5'",
        '"1.5" is not a number',
        "write 1.5, without quotes or unit",
    ),
    ("format: 2", "2", '"2" is not permitted here', "write 1"),
    ("revision: 1.0", "1.0", '"1.0" is not a whole number', "write 1"),
    ("revision: true", "true", '"true" is not a whole number', "write one, such as 2"),
    ("neat: true", "format", "a reaction in a solvent is not neat", "keep solvent, or neat: true"),
    (f"status: {'x' * 999}", "xxx", '"' + "x" * 198 + "…", "use one of: draft, current, superseded, withdrawn"),
    ("performed: {date: 31.02.2026, by: x}", "31.02", '"31.02.2026" is not a date', "write it like 2026-03-14"),
    ("performed: {date: 5.3.2026, by: x}", "5.3", '"5.3.2026" is not a date', "write 2026-03-05"),
    ("evidence: [1H NMR, 7]", "7", "7 is read as a number", "write '7'"),
]


@pytest.mark.parametrize(("example", "at", "message", "mend"), IN_WORDS, ids=[row[2][:50] for row in IN_WORDS])
def test_faults_are_told_in_the_words_of_the_bench(example: str, at: str, message: str, mend: str) -> None:
    text = with_example(example)
    finding = next(finding for finding in _read(text).findings if finding.level is Level.ERROR)
    assert (finding.message, finding.mend) == (message, mend)
    line = text.splitlines()[finding.place.line - 1]
    assert line[finding.place.column - 1 :].startswith(at)


def test_an_entry_names_its_references_with_their_paths() -> None:
    example = (
        "status: superseded\nsuperseded: {by: NS2H8WDRW, date: 2026-03-14, because: better data}\n"
        "related: [NS7K3QFMC, NS2H8WDRW]\npreceded_by: NS7K3QFMC"
    )
    record = _read(with_example(example)).record
    assert record is not None
    assert record.references == (
        (("related", 0), "NS7K3QFMC"),
        (("related", 1), "NS2H8WDRW"),
        (("preceded_by", 0), "NS7K3QFMC"),
        (("superseded", "by"), "NS2H8WDRW"),
    )


def test_the_excess_of_one_part_over_the_other() -> None:
    record = _read(with_example(outcome_example("{er: '97.5:2.5'}"))).record
    assert record is not None
    er = record.outcome.measured[0].er
    assert er is not None
    assert er.excess_percent == 95.0  # IUPAC Gold Book E02070: ee = |F(+) - F(-)|
