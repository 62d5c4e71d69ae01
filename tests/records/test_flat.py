"""A record as one row and back, and as YAML: nothing is lost, whatever stands in its texts."""

import re
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from builder.records.digest import digest
from builder.records.flat import (
    canonical_name,
    column_names,
    column_order,
    flatten,
    guarded,
    in_one_cell,
    shape_at,
    unflatten,
    unguarded,
)
from builder.records.model import Record
from builder.records.reader import read_bytes
from builder.records.specimen import GAP, specimen_text
from builder.records.yaml_text import Plain, read_plain
from builder.records.yaml_writing import record_yaml
from tests.generated_book import generated_texts

GOOD = Path(__file__).parents[1] / "data" / "records" / "good"
RECORDS = [*(path.read_text("utf-8") for path in sorted(GOOD.glob("*.yml"))), specimen_text()]


def _plain(text: str) -> Plain:
    return read_plain(text, "NS4T9XQ2N.yml").value


def _survives(plain: Plain) -> None:
    """A record is the same after it was a row, and after it was a row and a file."""
    record = Record.model_validate(plain)
    cells = flatten(plain)
    back = unflatten(cells).value
    assert isinstance(back, dict)
    assert flatten(back) == cells
    assert Record.model_validate(back) == record
    reading = read_bytes(record_yaml(back).encode(), "NS4T9XQ2N.yml")
    assert [finding for finding in reading.findings if finding.level == "error"] == []
    assert reading.record == record
    assert digest(reading.record) == digest(record)
    assert flatten(_plain(reading.text)) == cells


@pytest.mark.parametrize("text", RECORDS, ids=lambda text: re.search(r"entry: (\S+)", text)[1])  # type: ignore[index]
def test_a_good_record_survives(text: str) -> None:
    _survives(_plain(text))


def test_generated_records_survive() -> None:
    for _, text in generated_texts(60):
        _survives(_plain(text))


# any text that a record may hold: no control characters, no markup, and not blank
_TEXTS = st.text(
    st.characters(exclude_categories=["Cs", "Cc", "Zl", "Zp"], exclude_characters="<\ufffe\uffff")
    | st.sampled_from("\n\t"),
    min_size=1,
    max_size=40,
).filter(lambda text: text.strip() and GAP not in text and "javascript:" not in text.casefold())
_NUMBERS = st.builds(lambda digits, places: Decimal(digits).scaleb(-places), st.integers(100, 99999), st.integers(2, 5))


@st.composite
def _records(draw: st.DrawFn) -> dict[str, Any]:
    """Return the specimen with every kind of value drawn."""
    record: Any = _plain(specimen_text())
    record["title"] = draw(_TEXTS)
    record["notebook"] = draw(
        _TEXTS | st.sampled_from(["yes", "NO", "1e5", "007", "2026-03-14", "12:30", "~", "=", "0x1F"])
    )
    record["work_up"] = draw(st.lists(_TEXTS, min_size=1, max_size=4))
    record["evidence"] = draw(
        st.lists(
            _TEXTS | st.just({"what": "spectra; raw", "file": "data/a,b.zip", "sha256": "0" * 64}),
            min_size=1,
            max_size=3,
        )
    )
    record["nucleophile"] = draw(
        st.just("internal")
        | st.lists(
            st.fixed_dictionaries({"name": _TEXTS, "smiles": _TEXTS, "equivalents": _NUMBERS}), min_size=1, max_size=11
        )
    )
    record["outcome"]["failure"] = {"cause": draw(_TEXTS), "repeated": draw(st.booleans())}
    times = sorted(draw(st.sets(_NUMBERS, min_size=2, max_size=4)))
    record["outcome"]["time_course"] = {
        "follows": "yield",
        "of": draw(st.sampled_from(["A", ["A"], ["A", "B"]])),
        "time_unit": "h",
        "points": [[time, draw(st.integers(0, 100) | st.just(Decimal("12.40")))] for time in times],
    }
    return record


@settings(deadline=None, max_examples=60)
@given(_records())
def test_any_record_survives(record: dict[str, Any]) -> None:
    _survives(record)


@given(st.lists(st.text(min_size=1), min_size=1))
def test_any_list_fits_into_one_cell(items: list[str]) -> None:
    assert unflatten({"work_up": in_one_cell(items)}).value == {"work_up": items}


@given(st.text())
def test_a_guard_is_taken_away_again(text: str) -> None:
    assert unguarded(guarded(text)) == text
    assert not guarded(text).startswith(("=", "+", "-", "@", "\t", "\r"))


SAME_PLACE = [
    # as somebody may head a column, the name with all its numbers
    ("solvent.name", "solvent.1.name"),
    ("stages.2.gives.smiles", "stages.2.gives.smiles"),
    ("outcome.measured.yield", "outcome.measured.1.yield"),
    ("nucleophile", "nucleophile"),
]


@pytest.mark.parametrize(("typed", "name"), SAME_PLACE)
def test_the_number_of_an_only_item_may_be_left_out(typed: str, name: str) -> None:
    assert canonical_name(typed) == name


@pytest.mark.parametrize(
    "name", ["", "substrate", "stages.0.time", "stages.time.h", "solvent.1001.name", "titel", "a.b"]
)
def test_what_is_no_column(name: str) -> None:
    assert shape_at(name) is None


def test_columns_come_in_the_order_of_the_format() -> None:
    names = ["stages.10.time", "stages.2.time", "title", "entry", "stages.2.temperature", "unknown"]
    assert sorted(names, key=column_order) == [
        "entry",
        "title",
        "stages.2.temperature",
        "stages.2.time",
        "stages.10.time",
        "unknown",
    ]
    assert list(column_names()) == sorted(column_names(), key=column_order)


def test_gaps_between_items_close() -> None:
    row = unflatten({"solvent.3.name": "water", "solvent.1.name": "DMF"})
    assert row.value == {"solvent": [{"name": "DMF"}, {"name": "water"}]}
    assert row.columns[("solvent", 1, "name")] == "solvent.3.name"


def test_two_columns_for_one_place_are_at_odds() -> None:
    row = unflatten({"nucleophile": "solvent", "nucleophile.1.name": "water"})
    assert row.at_odds == (("nucleophile", "nucleophile.1.name"),)
    assert row.value == {"nucleophile": "solvent"}


def test_the_yaml_reads_like_a_record_of_the_house() -> None:
    plain = _plain(
        "outcome:\n  measured: [{ratio: 'A:B = 65:35'}, {by: GC, yield: 4 %, of: [A], kind: assay}]\n"
        "substrate: {smiles: CCBr, name: NO, class: [primary, benzylic]}\nnotebook: 'a: b'\n"
        "nucleophile: [{name: azide, equivalents: 1.50}]"
    )
    assert isinstance(plain, dict)
    assert record_yaml(plain, remarks={("substrate", "class"): "perceived"}) == (
        "notebook: 'a: b'\n"
        "substrate:\n"
        "  name: 'NO'\n"
        "  smiles: 'CCBr'\n"
        "  class: [primary, benzylic]  # perceived\n"
        "nucleophile:\n"
        "  - name: azide\n"
        "    equivalents: 1.50\n"
        "outcome:\n"
        "  measured:\n"
        "    - {ratio: 'A:B = 65:35'}\n"
        "    - yield: 4 %\n"
        "      of: A\n"
        "      kind: assay\n"
        "      by: GC\n"
    )
