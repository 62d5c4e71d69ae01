"""Which entries belong together: what leads to what, and who else was after the same product."""

import datetime as dt
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import pytest

from builder.book import Entry
from builder.publish.entry_view import MOST_VARIANTS, surroundings_of, view_entry
from builder.publish.neighbours import same_product, sequences, view_sequence
from builder.publish.portrait import Portrait, summarise
from tests.publish.handmade import book_of, entry_of, text_of

AZIDATION = text_of("NSC0W7N51")
ENTRY = entry_of(AZIDATION)


def _called(name: str, entry: Entry[Portrait] = ENTRY, **changed: Any) -> Entry[Portrait]:
    """Return an entry with a short name for an identifier."""
    return replace(entry, record=entry.record.model_copy(update={"entry": name, **changed}))


def _following(before: Mapping[str, str]) -> list[Entry[Portrait]]:
    return [_called(name, preceded_by=tuple(earlier)) for name, earlier in before.items()]


RUNS = [
    # entries, each with those it names as coming before it; the runs
    ({"A": "", "B": ""}, set()),
    ({"A": "", "B": "A", "C": "B"}, {"ABC"}),
    ({"A": "", "B": "A", "C": "A"}, {"AB", "AC"}),
    ({"A": "", "B": "", "C": "BA"}, {"BC"}),  # the first that is named
    ({"A": "B", "B": "A"}, set()),  # a ring has no first step
    ({"A": "", "B": "A", "C": "D", "D": "C"}, {"AB"}),
    ({"B": "A", "C": "B", "D": "AC"}, {"BCD"}),  # A is not in the book
]


@pytest.mark.parametrize(("before", "runs"), RUNS)
def test_runs_go_from_the_first_step_to_each_last_one(before: dict[str, str], runs: set[str]) -> None:
    found = sequences(_following(before))
    assert {"".join(entry.id for entry in run) for run in found} == runs


def test_a_sequence_is_drawn_from_its_first_substrate_to_its_last_product() -> None:
    run = _following({"A": "", "B": "A"})
    view = view_sequence(run, {entry.id: summarise(entry) for entry in run})
    assert view is not None
    assert view.words == "(S)-octan-2-ol to (R)-2-azidooctane to (R)-2-azidooctane"
    assert "step 1" in view.wide
    assert "step 2" in view.tall
    assert [step.id for step in view.steps] == ["A", "B"]


def test_a_sequence_that_ends_in_nothing_drawn_is_left_out() -> None:
    start, end = _following({"A": "", "B": "A"})
    run = (start, replace(end, kept=replace(end.kept, goal=None)))
    assert view_sequence(run, {entry.id: summarise(entry) for entry in run}) is None


def test_stereochemistry_does_not_part_those_after_one_product() -> None:
    mirrored = entry_of(AZIDATION.replace("[C@@H](C)N=", "[C@H](C)N="))
    assert mirrored.kept.goal != ENTRY.kept.goal
    found = same_product([_called("A"), _called("B", mirrored), _called("C", entry_of(text_of("NS2H8WDRW")))])
    assert {name: [entry.id for entry in others] for name, others in found.items()} == {"A": ["B"], "B": ["A"], "C": []}


def test_of_many_ways_to_a_product_the_newest_are_listed_after_this_one() -> None:
    names = "ABCDEFGHIJ"[: MOST_VARIANTS + 2]
    performed = ENTRY.record.performed
    days = [performed.model_copy(update={"date": dt.date(2026, 1, day)}) for day in range(1, len(names) + 1)]
    apart = [replace(ENTRY, standing=replace(ENTRY.standing, transformation=name)) for name in names]
    entries = [_called(name, entry, performed=day) for name, entry, day in zip(names, apart, days, strict=True)]
    around = surroundings_of(book_of(*entries), {entry.id: summarise(entry) for entry in entries}, ())
    view = view_entry(entries[0], around)
    assert "".join(row.summary.id for row in view.variants) == "A" + names[:1:-1]
    assert view.further_variants == 1
