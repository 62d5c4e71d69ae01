"""House rules: how they are written, what they find in a record, and where a broken or accepted one is named."""

import json
from pathlib import Path

import jsonschema
import pytest

from builder.book import open_book
from builder.checks.case import Case
from builder.checks.house import House
from builder.checks.report import summary
from builder.checks.run import check_settings
from builder.finding import Finding, Level
from builder.records.house_rules import HouseRule, is_like
from builder.records.reader import read_into
from builder.records.schema import settings_schema
from builder.records.settings import Settings
from builder.records.specimen import SPECIMEN_FILE, outcome_example, with_example
from builder.records.yaml_text import read_plain
from tests.specimens import TODAY, TOOL, examine_text, judge


def _settings(rules: str, more: str = "") -> Settings:
    text = f"format: 1\ntitle: A book for tests\n{more}house_rules:\n{rules}"
    settings, findings, _ = read_into(Settings, text, "handbook.yml")
    assert settings is not None, findings
    return settings


def _found(rules: str, example: str, more: str = "") -> list[Finding]:
    settings = _settings(rules, more)
    examined = [examine_text(with_example(example), settings=settings)]
    return [each for each in judge(examined, settings)[SPECIMEN_FILE] if each.rule.startswith("house-")]


DMF = "solvent: [{name: DMF, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]"
NO_DMF = "  - banned_solvents: [dimethylformamide]\n    because: toxic for reproduction\n"
FAILED = "outcome:\n  result: [no reaction]\n  sought: CCC(C)N=[N+]=[N-]\n  failure: {cause: cold}"


def _plain(text: str) -> object:
    """Return YAML as a JSON Schema sees it."""
    value = read_plain(text, "").value
    return json.loads(json.dumps(value, default=float))


def test_a_finding_names_the_rule_and_its_reason() -> None:
    (found,) = _found(NO_DMF, DMF)
    assert found.message == "DMF is used; house rule: no dimethylformamide – toxic for reproduction"
    assert (found.rule, found.level) == ("house-solvent-banned", Level.QUERY)
    assert found.mend == "use another solvent, or accept this with the reason"
    assert found.data == {"house_rule": "no dimethylformamide", "because": "toxic for reproduction"}


def test_a_rule_in_its_own_words_is_named_so() -> None:
    (found,) = _found(f"{NO_DMF}    rule: no amide solvents\n    instead: take DMSO\n    level: error\n", DMF)
    assert found.message.endswith("house rule: no amide solvents – toxic for reproduction")
    assert (found.level, found.mend) == (Level.ERROR, "the house says: take DMSO")


NO_DCM = "  - banned_solvents: [dichloromethane]\n    because: agreed\n"
WORK_UPS = {
    "extracted with DCM": True,
    "diluted with water, then DCM": True,
    "never DCM": False,
    "avoid any DCM": False,
    "extracted with ethyl acetate rather than DCM": False,
    "extracted without any DCM": False,
}


@pytest.mark.parametrize(("line", "is_used"), WORK_UPS.items())
def test_a_denied_solvent_of_the_work_up_is_not_used(line: str, is_used: bool) -> None:
    assert bool(_found(NO_DCM, f"work_up: ['{line}']")) is is_used


ACCEPTED = DMF + "\naccepted: [{finding: house-solvent-banned, because: 'DMSO oxidises it', by: bench-1}]"


def test_a_query_is_accepted_and_an_error_is_not() -> None:
    (found,) = _found(NO_DMF, ACCEPTED)
    assert found.accepted == "DMSO oxidises it"
    settings = _settings(f"{NO_DMF}    level: error\n")
    findings = judge([examine_text(with_example(ACCEPTED), settings=settings)], settings)[SPECIMEN_FILE]
    assert {each.rule for each in findings if each.level is Level.ERROR} == {
        "house-solvent-banned",
        "acceptance-of-error",
    }


EXEMPT = [
    # what the rule or the record says, whether it still binds
    ("    since: 2026-03-14\n", "", True),
    ("    since: 2026-03-15\n", "", False),
    ("", "status: draft", True),
    ("", "status: withdrawn\nwithdrawn: {date: 2026-04-01, because: wrong bottle, by: bench-1}", False),
]


@pytest.mark.parametrize(("more", "example", "binds"), EXEMPT)
def test_who_is_exempt(more: str, example: str, binds: bool) -> None:
    assert bool(_found(NO_DMF + more, f"{DMF}\n{example}")) == binds


ACETONITRILE = "solvent: [{name: acetonitrile, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]"
WORK_UP = [
    # a line, whether it names the solvent
    ("extracted with DMF", True),
    ("washed with dimethylformamide, then water", True),
    ("distilled without DMF", False),
    ("DMF-free filtrate concentrated", False),
    ("residue in DMAc", False),
]


@pytest.mark.parametrize(("line", "is_named"), WORK_UP, ids=[row[0] for row in WORK_UP])
def test_solvents_are_found_in_the_work_up(line: str, is_named: bool) -> None:
    example = f"{ACETONITRILE}\nwork_up: ['{line}']"
    found = _found(NO_DMF, example)
    assert bool(found) == is_named
    if found:
        assert found[0].place.line == with_example(example).splitlines().index(f"work_up: ['{line}']") + 1


def test_ether_in_the_name_of_another_substance_is_not_diethyl_ether() -> None:
    rules = "  - banned_solvents: [diethyl ether]\n    because: agreed\n"
    lines = "work_up: [diluted with petroleum ether, 'tert-butyl methyl ether, 20 mL', washed with Et2O]"
    assert [each.message.split(" is ")[0] for each in _found(rules, lines)] == ["Et2O"]


SCALES = [
    # limit, of, the record, what is above it; the specimen charges 10 mmol of substrate and 15 mmol of sodium azide
    ("10 mmol", "azide salt", "", ["15 mmol of sodium azide"]),
    ("10 mmol", "", "", []),
    ("9.9 mmol", "", "", []),  # within 2 %
    ("9.5 mmol", "", "", ["10 mmol of 2-bromobutane"]),
    ("9.5 mmol", "organic azide", "", ["10 mmol of 2-azidobutane"]),
    ("0.9 g", "organic azide", "", ["0.991 g of 2-azidobutane"]),  # 10 mmol of 99.14 g/mol
    ("1.3 g", "", "", ["1.37 g of 2-bromobutane"]),  # 10 mmol of 137.02 g/mol
    ("0.000004 kg", "", "", ["0.00137 kg of 2-bromobutane"]),
    ("20 mmol", "[azide salt, organic azide]", "", []),
]


@pytest.mark.parametrize(("limit", "of", "example", "above"), SCALES)
def test_scales(limit: str, of: str, example: str, above: list[str]) -> None:
    rules = f"  - at_most: {limit}\n    because: agreed\n" + (f"    of: {of}\n" if of else "")
    one_product = outcome_example("{yield: 81 %, of: A, kind: isolated}")
    bromide = "name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide"
    substrate = f"substrate: {{{bromide}, amount: 10 mmol}}"
    found = _found(rules, f"{substrate}\n{one_product}\n{example}")
    assert [each.message.partition(";")[0] for each in found] == above


def test_a_yield_is_asked_of_what_gave_products() -> None:
    rules = "  - yield_kinds: isolated\n    because: agreed\n"
    assay = outcome_example("{yield: 81 %, of: A, kind: assay, by: GC}")
    assert [each.message.partition(";")[0] for each in _found(rules, assay)] == ["no yield is isolated"]
    assert _found(rules, FAILED) == []


def test_required_keys_are_asked_of_every_item_of_a_list() -> None:
    rules = "  - required: [stages.atmosphere, solvent.purity, nucleophile.cas, take_away]\n    because: agreed\n"
    example = (
        "stages:\n  - {temperature: 0 °C, time: 1 h, atmosphere: argon}\n  - {temperature: 60 °C, time: 16 h}\n"
        "solvent: {name: DMF, volume: 20 mL, purity: 99 %}\nnucleophile: solvent\n# without take_away"
    )
    found = _found(rules, example)
    assert [each.message.partition(" is")[0] for each in found] == ["take_away", "stages.atmosphere"]
    assert found[1].place.line == with_example(example).splitlines().index("  - {temperature: 60 °C, time: 16 h}") + 1


LIKE = [
    ("BK2/112", "BK#/#", True),
    ("BK2/112b", "BK#/#", False),
    ("xBK2/112", "BK#/#", False),
    ("azide with DMSO", "* with *", True),
    ("a.c", "a.c", True),
    ("abc", "a.c", False),
]


@pytest.mark.parametrize(("text", "likeness", "is_so"), LIKE)
def test_likeness(text: str, likeness: str, is_so: bool) -> None:
    assert is_like(text, likeness) == is_so


UNCLEAR = [
    # a house rule, what nobody knows, what may have been meant
    ("{banned_solvents: [DFM], because: x}", 'unknown solvent "DFM"', "DMF"),
    ("{banned_solvents: [unobtainol], because: x}", 'unknown solvent "unobtainol"', None),
    ("{at_most: 1 g, of: azide salts, because: x}", 'unknown kind of substance "azide salts"', "azide salt"),
    ("{required: atmosphere, because: x}", 'unknown key "atmosphere"', "stages.atmosphere"),
    ("{required: evidance, because: x}", 'unknown key "evidance"', "evidence"),
    ("{reviewers: bench-2, because: x}", 'unknown person "bench-2"', "bench-1"),
]


@pytest.mark.parametrize(("rule", "message", "fix"), UNCLEAR, ids=[row[0] for row in UNCLEAR])
def test_what_nobody_knows_is_found_in_the_settings(rule: str, message: str, fix: str | None) -> None:
    said = f'{message}; did you mean "{fix}"?' if fix else message
    text = f"format: 1\ntitle: A book\npeople: [{{code: bench-1, shown_as: one}}]\nhouse_rules:\n  - {rule}\n"
    settings, _, places = read_into(Settings, text, "handbook.yml")
    assert settings is not None
    (found,) = check_settings(House(settings, TOOL), places)
    assert (found.rule, found.level, found.message, found.fix) == ("house-rule-unclear", Level.ERROR, said, fix)
    typed = text.splitlines()[found.place.line - 1][found.place.column - 1 : found.place.end_column - 1]
    assert typed == message.split('"')[1]


REFUSED = [
    ("{banned_solvents: DMF}", "key-missing", "because is missing"),
    ("{banned_solvents: DMF, measured: internal, because: x}", "house-rule-not-one", "one demand a rule; this one has"),
    ("{because: x}", "house-rule-not-one", "this house rule demands nothing"),
    ("{codes_listed: false, because: x}", "value-not-permitted", "false demands nothing"),
    ("{rule: x, of: azide salt, because: x}", "house-rule-not-one", "of goes with at_most"),
    ("{banned_solvent: DMF, because: x}", "key-unknown", 'did you mean "banned_solvents"?'),
    ("{at_most: lots, because: x}", "quantity-unreadable", '"lots"'),
    ("{banned_solvents: DMF, because: x, level: caution}", "value-not-permitted", '"caution" is not permitted here'),
    ("{title_like: '*a*b*c*d*', because: x}", "value-not-permitted", "is no likeness"),
    ("{yield_kinds: weighed, because: x}", "value-not-permitted", '"weighed" is not permitted here'),
]


@pytest.mark.parametrize(("rule", "rule_id", "message"), REFUSED, ids=[row[0] for row in REFUSED])
def test_bad_rules_are_told_where_they_stand(rule: str, rule_id: str, message: str) -> None:
    text = f"format: 1\ntitle: A book\nhouse_rules:\n  - A sentence.\n  - {rule}\n"
    settings, findings, _ = read_into(Settings, text, "handbook.yml")
    assert settings is None
    assert [each.rule for each in findings] == [rule_id]
    assert message in findings[0].message
    assert findings[0].place.line == 5


@pytest.mark.parametrize("rule", [row[0] for row in REFUSED])
def test_an_editor_refuses_them_by_the_schema(rule: str) -> None:
    validator = jsonschema.Draft202012Validator(settings_schema())
    assert not validator.is_valid({"format": 1, "title": "A book", "house_rules": [_plain(rule)]})


STATEMENTS = [
    ("banned_solvents: [DMF, NMP, DMAc]", "no DMF, NMP or DMAc"),
    ("at_most: 10 mmol", "at most 10 mmol of substrate"),
    ("at_most: 5 g\n    of: [azide salt, organic azide]", "at most 5 g of azide salt or organic azide"),
    ("required: [evidence, work_up]", "evidence and work_up stated"),
    ("measured: internal", "temperature measured: internal"),
    ("title_at_most: 90", "a title of at most 90 characters"),
    ("reviewers: bench-1", "reviewed by bench-1"),
    ("reviewed_by_another: true", "reviewed by somebody who did not run it"),
]


@pytest.mark.parametrize(("keys", "statement"), STATEMENTS, ids=[row[1] for row in STATEMENTS])
def test_a_rule_says_itself_in_words(keys: str, statement: str) -> None:
    text = f"  - {keys}\n    because: agreed\n"
    ((_, rule),) = _settings(text).checked_rules
    assert rule.statement == statement
    jsonschema.validate({"format": 1, "title": "A book", "house_rules": _plain(text)}, settings_schema())


def test_settings_with_rules_can_be_remembered() -> None:
    settings = _settings("  - at_most: 10 mmol\n    because: agreed\n  - A sentence.\n")
    assert "10" in settings.model_dump_json()
    assert isinstance(settings.house_rules[0], HouseRule)
    assert settings.house_rules[1] == "A sentence."


def test_the_summary_names_each_rule_once() -> None:
    (open_one,), (accepted,) = _found(NO_DMF, DMF), _found(NO_DMF, ACCEPTED)
    assert summary([open_one, accepted, open_one], 3).splitlines()[1:] == [
        "house rule: no dimethylformamide – toxic for reproduction: not kept 2 times, set aside with a reason 1 time"
    ]


def test_a_book_with_a_broken_rule_is_checked_over_processes(tmp_path: Path) -> None:
    folder = tmp_path / "entries"
    folder.mkdir()
    (folder / "handbook.yml").write_text(f"format: 1\ntitle: A book\nhouse_rules:\n{NO_DMF}", "utf-8")
    (folder / SPECIMEN_FILE).write_text(with_example(DMF), "utf-8")
    book = open_book(folder, today=TODAY)
    assert [each.rule for each in book.findings if each.level is Level.QUERY] == ["house-solvent-banned"]
    assert isinstance(book.entries[0].kept, Case)


def test_a_key_nobody_knows_is_told_by_the_settings_and_stops_no_check() -> None:
    rule = "  - required: [stages.endpoint, work_up]\n    because: the next run needs it\n"
    assert [finding.message.partition(";")[0] for finding in _found(rule, "# without work_up")] == [
        "work_up is not stated"
    ]
