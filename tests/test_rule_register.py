"""The register of rules guards itself, and every rule plays its own examples."""

import re
from pathlib import Path

import pytest

from builder.checks.register import RECORD_CHECKS, all_rules, record_rules
from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import parse_smiles
from builder.finding import Level
from builder.mechanism.rules import GATES, Gate, Situation
from builder.rule import Rule
from builder.sources import load_sources
from builder.table import NOTHING
from tests.specimens import play

# A matter of the file itself: tested with the reader and the command.
WITHOUT_EXAMPLE = {"file-too-large", "file-misnamed", "file-unreachable"}

AnyRule = Rule[object, object]
FIRING = [(rule, example) for rule in record_rules() for example in rule.fires_on]
SILENT = [(rule, example) for rule in record_rules() for example in rule.silent_on]


def _label(value: object) -> str:
    return value.id if isinstance(value, Rule) else re.sub(r"\W+", "-", str(value))[:40]


def test_ids_are_slugs_unique_and_in_order() -> None:
    ids = list(all_rules())
    assert ids == sorted(ids)
    assert all(re.fullmatch(r"[a-z][a-z0-9]*(-[a-z0-9]+)+", each) for each in ids)


@pytest.mark.parametrize("rule", all_rules().values(), ids=lambda rule: rule.id)
def test_a_card_is_complete(rule: AnyRule) -> None:
    assert rule.source in load_sources()
    assert rule.statement.endswith((".", "?"))
    assert rule.reason
    assert not rule.title.endswith(".")
    if rule.id not in WITHOUT_EXAMPLE:
        assert rule.fires_on
        assert rule.silent_on


def test_needs_name_rules_that_exist() -> None:
    for check in RECORD_CHECKS:
        assert set(check.needs) <= set(all_rules()), check.id


def _sources_of(table: Path) -> set[str]:
    """Return the keys in a table's columns of sources: one a row, or one a value as with the solvents."""
    lines = table.read_text("utf-8").splitlines()
    header, *rows = (line.split("\t") for line in lines if line and not line.startswith("#"))
    columns = [number for number, name in enumerate(header) if name.endswith("source")]
    return {row[column] for row in rows for column in columns} - {NOTHING}


def test_every_source_is_used_and_every_use_has_its_source() -> None:
    tables = sorted((Path(__file__).parents[1] / "builder").rglob("*.tsv"))
    assert {"solvents.tsv", "cautions.tsv", "leaving_groups.tsv"} <= {table.name for table in tables}
    used = {rule.source for rule in all_rules().values()}.union(*map(_sources_of, tables))
    assert used == load_sources().keys()


@pytest.mark.parametrize(("rule", "example"), FIRING, ids=_label)
def test_fires_on_its_examples(rule: AnyRule, example: str) -> None:
    found = play(example)
    assert rule.id in {finding.rule for finding in found}
    for finding in found:
        if finding.rule == rule.id:
            assert finding.message
            assert finding.mend


@pytest.mark.parametrize(("rule", "example"), SILENT, ids=_label)
def test_is_silent_on_its_near_misses(rule: AnyRule, example: str) -> None:
    found = play(example)
    assert rule.id not in {finding.rule for finding in found}
    assert [finding.rule for finding in found if finding.level is Level.ERROR] == []


def _shut(gate: Gate, smiles: str) -> bool:
    structure = parse_smiles(smiles)
    sites = [site for site in perceive_sites(structure) if not site.is_addition]
    assert sites, f"{smiles} has no site to judge"
    return all(gate.fires(Situation(structure, site)) for site in sites)


@pytest.mark.parametrize("gate", GATES, ids=lambda gate: gate.rule.id)
def test_a_gate_is_shut_on_its_examples_and_open_on_the_near_misses(gate: Gate) -> None:
    for smiles in gate.rule.fires_on:
        assert _shut(gate, smiles), smiles
    for smiles in gate.rule.silent_on:
        assert not _shut(gate, smiles), smiles
