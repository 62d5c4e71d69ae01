"""Vague words: what they are, and the honest uses that must not be held against anybody."""

import pytest

from builder.records.specimen import with_example
from tests.specimens import findings_of

VAGUE = {
    "stirred at rt": '"rt"',
    "warmed to room temperature": '"room temperature"',
    "r.t., then 60 °C the next day": None,  # a number in °C tells it
    "stirred overnight": '"overnight"',
    "stirred overnight (16 h)": None,
    "left over the weekend": '"over the weekend"',
    "azide in large excess": '"large excess"',
    "azide in excess, 2.5 equiv": None,
    "with excess azide": '"with excess"',
    "excess azide destroyed with nitrite": None,
    "the excess of azide goes with the water": None,
    "94 % enantiomeric excess": None,
    "a catalytic amount of iodide": '"catalytic amount"',
    "a catalytic amount of iodide (5 mol%)": None,
    "catalytic hydrogenation gives the amine": None,
    "bromide added dropwise": '"dropwise"',
    "bromide added dropwise over 20 min": None,
    "bromide dropwise at 0.5 mL/min": None,
    "in dry DMF": '"dry"',
    "in dry DMF (30 ppm water)": None,
    "cooled with dry ice and acetone": None,
    "dried over MgSO4": None,
    "dry over sodium sulfate": None,
    "dry-loaded on silica": None,
    "kept dry": None,
    "standard workup": '"standard workup"',
    "usual work-up": '"usual work-up"',
    "as usual": '"as usual"',
    "worked well": '"worked well"',
    "some alkene": '"some"',
    "some 5 % of alkene": None,
    "in some cases the salt cakes": None,
    "a little alkene": '"a little"',
    "a little faster than the chloride": None,
    'page headed "Dropwise and overnight"': None,
    "sometimes, somewhere": None,
    "quarterly report; part 2": None,
}


@pytest.mark.parametrize(("text", "word"), VAGUE.items())
def test_a_vague_word_is_quoted_and_an_honest_one_left_alone(text: str, word: str | None) -> None:
    found = [each for each in findings_of(with_example(f"take_away: '{text}'")) if each.rule == "text-vague"]
    assert [each.message.split(" leaves")[0] for each in found] == ([word] if word else [])


@pytest.mark.parametrize(("over", "is_vague"), [("", True), (", over: 15 min", False)])
def test_dropwise_is_told_by_the_duration_of_the_stage(over: str, is_vague: bool) -> None:
    stage = f"stages: [{{temperature: 60 °C, time: 16 h{over}, note: bromide added dropwise}}]"
    rules = {finding.rule for finding in findings_of(with_example(stage))}
    assert ("text-vague" in rules) is is_vague


def test_names_and_structures_are_no_prose() -> None:
    named = "solvent: [{name: dry DMF, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]"
    assert "text-vague" not in {finding.rule for finding in findings_of(with_example(named))}
