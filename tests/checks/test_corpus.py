"""Good records stay silent, bad ones are found at the marked line: cases are data, and a new one needs no Python."""

import re
from pathlib import Path

import pytest

from builder.finding import Level
from tests.specimens import findings_of

DATA = Path(__file__).parents[1] / "data" / "records"
GOOD = sorted((DATA / "good").glob("*.yml"))
BAD = sorted((DATA / "bad").rglob("*.yml"))
_MARK = re.compile(r"# expect (?P<rule>[a-z0-9-]+) at (?:(?P<line>\d+):)?(?P<column>\d+)")


@pytest.mark.parametrize("path", GOOD, ids=lambda path: path.stem)
def test_good_records_have_no_error_and_no_query(path: Path) -> None:
    found = findings_of(path.read_bytes(), f"good/{path.name}")
    assert [(f.rule, str(f.place), f.message) for f in found if f.level in {Level.ERROR, Level.QUERY}] == []


@pytest.mark.parametrize("path", BAD, ids=lambda path: f"{path.parent.name}-{path.stem}")
def test_bad_records_are_found_where_they_are_marked(path: Path) -> None:
    data = path.read_bytes()
    text = data.decode("utf-8", errors="replace")
    expected = set()
    for number, line in enumerate(text.splitlines(), start=1):
        for mark in _MARK.finditer(line):
            expected.add((mark["rule"], int(mark["line"] or number), int(mark["column"])))
    assert expected, "the file marks nothing"
    assert path.parent.name in {rule for rule, _, _ in expected}
    found = findings_of(data, f"bad/{path.name}")
    heavy = {Level.ERROR, Level.QUERY}
    shown = {(f.rule, f.place.line, f.place.column) for f in found if f.level in heavy or f.rule == path.parent.name}
    assert shown == expected, [(f.rule, f.message) for f in found]


def test_the_corpus_is_large_enough() -> None:
    assert len(BAD) >= 60
    assert len(GOOD) >= 13
