"""A batch: every line has its answer in its place, whatever its neighbours do and however many processes work."""

import io
import json
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from builder.mechanism import batch
from builder.mechanism.batch import MAX_LINE_BYTES, Line, answer_line, answers, lines_of
from builder.mechanism.forecast import Forecast
from builder.mechanism.question import Question

CASES = Path(__file__).parents[1] / "data" / "cases-open.jsonl"
GOOD = '{"id": 7, "substrate": "CBr", "nucleophile": "NaI", "solvent": [["acetone", 1]], "temperature_C": 25}'
Cautions = tuple[dict[str, str], ...]


def no_cautions(question: Question, forecast: Forecast) -> Cautions:
    return ()


def deadly(question: Question, forecast: Forecast) -> Cautions:
    """End the process over ethyl bromide, as a crash in a library would."""
    if question.substrate.smiles == "CCBr":
        os._exit(1)
    return ()


def answered(text: str | bytes) -> dict[str, Any]:
    raw = text.encode() if isinstance(text, str) else text
    answer = answer_line(Line(3, raw, len(raw)), no_cautions)
    plain: dict[str, Any] = json.loads(answer.text)
    assert answer.is_error == ("error" in plain)
    assert "\n" not in answer.text
    return plain


def test_a_good_line_keeps_its_id_and_the_contract() -> None:
    plain = answered(GOOD)
    assert plain["id"] == 7
    # the keys of the contract (design of the command line), all of them, whatever else there is
    assert plain.keys() >= {
        *("mechanism", "shares", "share_intervals", "log_k", "half_life_s", "products", "course", "stereo"),
        *("rearranged", "covered", "reasons", "cautions"),
    }
    assert plain["products"][0].keys() == {"smiles", "share", "mechanism", "course", "rearranged", "path"}
    assert plain["reasons"][0].keys() == {"rule", "text", "value", "error", "source"}
    assert (plain["mechanism"], plain["products"][0]["smiles"]) == ("SN2", "CI")
    assert sum(plain["shares"].values()) == pytest.approx(1.0, abs=1e-5)


BAD = [
    ("not json", "line 3 is no JSON"),
    ("[1, 2]", "line 3 is no JSON object"),
    ('{"id": 1', "line 3 is no JSON"),
    ("[" * 50_000, "line 3 is no JSON"),
    (b'{"id": "\xff"}', "line 3 is not UTF-8"),
    ('{"id": 1}', "no substrate"),
    (GOOD.replace("CBr", "C(C)(C)(C)(C)C"), "valence"),
    (GOOD.replace('"CBr"', "12"), "substrate is no text"),
    (GOOD.replace("acetone", "acetome"), 'did you mean "acetone"?'),
    (GOOD.replace('"temperature_C": 25', '"temperature_C": NaN'), "beyond any number"),
    (GOOD.replace('"temperature_C": 25', '"temperature_C": 1e999'), "beyond any number"),
    (f'{{"id": "{"x" * MAX_LINE_BYTES}"}}', "line 3 is longer than"),
]


@pytest.mark.parametrize(("text", "what"), BAD, ids=lambda value: str(value)[:30])
def test_a_bad_line_gives_its_error(text: str | bytes, what: str) -> None:
    plain = answered(text)
    assert plain.keys() == {"id", "error"}
    assert what in plain["error"]
    assert "our fault" not in plain["error"]


# Outside substitution and elimination at saturated carbon, or without anything to leave: an answer, never a guess.
NOT_COVERED = ["CCCC", "CC(=O)Cl", "CC(=O)OC(C)=O", "c1ccccc1", "CC(C)=O", "C"]


@pytest.mark.parametrize("substrate", NOT_COVERED)
def test_what_is_not_covered_says_so(substrate: str) -> None:
    plain = answered(GOOD.replace("CBr", substrate))
    assert (plain["covered"], plain["mechanism"], plain["shares"], plain["products"]) == (False, "none", {}, [])
    (reason,) = plain["reasons"]
    assert reason["text"].startswith("not covered: ")
    assert plain["half_life_s"] is None


@pytest.mark.parametrize("substrate", ["Brc1ccccc1", "C=CBr", "CCCCO"])
def test_what_the_gates_close_is_none_with_its_reason(substrate: str) -> None:
    plain = answered(GOOD.replace("CBr", substrate))
    assert (plain["covered"], plain["mechanism"], plain["products"]) == (True, "none", [])
    assert plain["reasons"]


def test_a_fault_of_ours_is_named_and_kept_to_its_line(monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(question: Question) -> Forecast:
        raise ZeroDivisionError("by zero")

    monkeypatch.setattr(batch, "predict", broken)
    assert answered(GOOD) == {"id": 7, "error": "our fault: ZeroDivisionError: by zero"}


def test_an_id_that_cannot_be_written_is_left_out() -> None:
    plain = answered(GOOD.replace('"id": 7', '"id": "\\ud800"'))
    assert plain["id"] is None
    assert "line 3" in plain["error"]


def test_lines_are_numbered_as_an_editor_does() -> None:
    text = b'\xef\xbb\xbf{"a": 1}\r\n\r\n   \n{"b": 2}'
    found = list(lines_of(io.BytesIO(text)))
    assert [(line.number, line.text.strip()) for line in found] == [(1, b'{"a": 1}'), (4, b'{"b": 2}')]
    assert sum(line.size for line in found) == len(text)


def test_no_more_than_the_beginning_of_a_long_line_is_kept() -> None:
    text = b"x" * (5 * MAX_LINE_BYTES) + b"\n" + GOOD.encode() + b"\n"
    first, second = lines_of(io.BytesIO(text))
    assert len(first.text) <= MAX_LINE_BYTES + 1
    assert (second.number, second.text.strip()) == (2, GOOD.encode())
    assert first.size + second.size == len(text)


def mixed_lines() -> list[Line]:
    """Return 48 lines, every fifth of them bad, as three chunks."""
    cases = [line for line in CASES.read_bytes().splitlines() if line][:48]
    return [Line(n, b"nonsense" if n % 5 == 0 else text, len(text)) for n, text in enumerate(cases, start=1)]


def test_answers_are_the_same_for_any_number_of_processes() -> None:
    alone = [answer.text for answer in answers(mixed_lines(), 1, no_cautions)]
    together = [answer.text for answer in answers(mixed_lines(), 2, no_cautions)]
    assert together == alone
    ids = [json.loads(text)["id"] for text in alone]
    assert [identifier for identifier in ids if identifier] == [f"open-{n:03}" for n in range(1, 49) if n % 5]


def test_the_input_is_read_as_it_is_needed() -> None:
    read = 0

    def endless() -> Iterator[Line]:
        nonlocal read
        while True:
            read += 1
            yield Line(read, b"nonsense", 8)

    for processes in (1, 2):
        read, found = 0, answers(endless(), processes, no_cautions)
        assert next(found).is_error
        found.close()  # type: ignore[attr-defined]
        assert read <= batch.CHUNK * (batch.AHEAD * processes + 2)


def test_a_process_that_dies_costs_one_line() -> None:
    texts = [GOOD.encode()] * 20 + [GOOD.replace("CBr", "CCBr").encode()] + [GOOD.encode()] * 12
    found = [json.loads(a.text) for a in answers([Line(n, t, 1) for n, t in enumerate(texts, 1)], 2, deadly)]
    assert [n for n, plain in enumerate(found, 1) if "error" in plain] == [21]
    assert found[20]["error"] == "our fault: the process that worked on line 21 died"
