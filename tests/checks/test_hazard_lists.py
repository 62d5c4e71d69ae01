"""The group's two lists of hazards, row by row: each is covered by a caution or a rule that fires where it should."""

from pathlib import Path

import pytest

from builder.checks.hazards.cautions import Severity, load_cautions
from builder.checks.register import all_rules
from builder.table import rows_of
from tests.checks.test_cautions import ids_of

DATA = Path(__file__).parents[1] / "data"
CAUTIONS = {caution.id: caution for caution in load_cautions()}


def _rows(name: str, *columns: str) -> list[dict[str, str]]:
    return list(rows_of(name, (DATA / name).read_text("utf-8"), columns))


COVERED = _rows("cautions_covered.tsv", "row", "ids", "why")
PAIRS = _rows("pairs_flagged.tsv", "pair", "fires", "caution", "near_miss")

# Grades of the group's list, read 2026-12-01: rows that it marks "stop".
STOP = {*range(1, 6), 7, 10, *range(12, 16), 18, 19, *range(21, 24), 25, 26, 29, 32, 33, 35, 39, 42, *range(47, 50), 51}


def test_every_row_of_the_list_is_there() -> None:
    assert [row["row"] for row in COVERED] == [f"C{number:02}" for number in range(1, 57)]


@pytest.mark.parametrize("row", COVERED, ids=lambda row: row["row"])
def test_row_is_covered(row: dict[str, str]) -> None:
    ids = row["ids"].split()
    assert not [each for each in ids if each not in CAUTIONS and each not in all_rules()]
    if int(row["row"][1:]) in STOP and row["why"] == "-":
        grades = [CAUTIONS[each].severity for each in ids if each in CAUTIONS]
        assert Severity.STOP in grades, "a milder grade needs its reason"


@pytest.mark.parametrize("row", PAIRS, ids=lambda row: row["pair"])
def test_pair_fires_and_its_near_miss_does_not(row: dict[str, str]) -> None:
    assert row["caution"] in ids_of(row["fires"])
    assert row["caution"] not in ids_of(row["near_miss"])
