"""handbook predict and handbook calibrate at their edges: exit codes, text and JSON, files whole or not at all."""

import json
from collections.abc import Callable
from pathlib import Path

import pytest

from builder import cli
from builder.mechanism.calibration import Calibration, Residual
from builder.mechanism.rate_terms import load_rate_terms
from tests.test_cli import Run, run

__all__ = ["run"]  # the fixture of the other commands

SINGLE = ("predict", "--solvent", "DMF", "--temperature", "60 °C")
MESYLATE = "CCCCCC[C@H](C)OS(C)(=O)=O"
GOOD = '{"id": "a", "substrate": "CBr", "nucleophile": "NaI", "solvent": [["acetone", 1]], "temperature_C": 25}'


def test_the_text_says_first_what_happens(run: Run) -> None:
    ran = run(*SINGLE, "--substrate", MESYLATE, "--nucleophile", "sodium azide", "--time", "16 h")
    assert (ran.code, ran.err) == (0, "")
    first, second, *rest = ran.out.splitlines()
    # azide inverts a secondary sulfonate in DMF: common practice, no source
    assert first.startswith("SN2 at the secondary carbon, with inversion; ")
    assert second == "A forecast from a rule engine, not a measurement."
    text = "\n".join(rest)
    assert "sodium azide, read as azide with [Na+]" in text
    assert "60 °C, 0.5 mol/L substrate (default), 1.50 equivalents (default), 16 h\n" in text
    assert "CCCCCC[C@@H](C)N=[N+]=[N-]  SN2, inversion" in text
    assert "local rules and qualified people decide" in text
    assert len(ran.out.splitlines()) <= 50
    assert max(map(len, ran.out.splitlines())) <= 120


def test_json_carries_the_contract_the_readings_and_what_was_assumed(run: Run) -> None:
    ran = run(*SINGLE, "--substrate", MESYLATE, "--nucleophile", "NaN3", "--equivalents", "2", "--json")
    plain = json.loads(ran.out)
    assert (ran.code, plain["mechanism"], plain["stereo"]) == (0, "SN2", "inversion")
    assert {"role": "nucleophile", "typed": "NaN3", "taken": "azide with [Na+]"} in plain["read"]
    assert plain["assumed"] == ["concentration", "time"]
    assert plain["cautions"]


@pytest.mark.parametrize("substrate", ["CC(=O)Cl", "CCCC"])
def test_what_is_not_covered_is_an_answer(run: Run, substrate: str) -> None:
    ran = run(*SINGLE, "--substrate", substrate, "--nucleophile", "NaN3")
    assert ran.code == 0
    assert ran.out.startswith("Not covered: ")


def test_a_flask_that_must_not_be_has_its_stop(run: Run) -> None:
    ran = run("predict", "--substrate", "CCBr", "--nucleophile", "NaN3", "--solvent", "DCM", "--temperature", "25 °C")
    assert "STOP: azide with dichloromethane: diazidomethane forms" in ran.out


def test_a_wish_is_answered_with_changes(run: Run) -> None:
    words = ("--substrate", "CCC(C)Br", "--nucleophile", "sodium ethoxide", "--want", "SN2:0.9")
    ran = run(*SINGLE, *words, "--json")
    assert all(change["what"] and change["change"] for change in json.loads(ran.out)["changes"])
    assert "What would bring it about" in run(*SINGLE, *words).out


def test_a_wish_that_is_met_already_is_told_from_one_that_nothing_meets(run: Run) -> None:
    azide = ("--substrate", "CCCCBr", "--nucleophile", "NaN3", "--want")
    assert "nothing needs to change" in run(*SINGLE, *azide, "SN2").out
    assert json.loads(run(*SINGLE, *azide, "SN2", "--json").out)["as_wanted"] is True
    assert "nothing that was tried helps" in run(*SINGLE, *azide, "E1").out


MISUSE = [
    # arguments, what the message says
    (("--temperature", "25 °C", "--solvent", "DMF"), "--substrate is missing"),
    (("--substrate", "CBr", "--solvent", "DMF"), "--temperature is missing"),
    (("--substrate", "CBr", "--temperature", "25 °C"), "--solvent is missing"),
    (("--substrate", "CBr", "--temperature", "25", "--solvent", "DMF"), 'write "25 °C"'),
    (("--substrate", "CBr", "--temperature", "0 K", "--solvent", "DMF"), "not above absolute zero"),
    (("--substrate", "CBr", "--temperature", "25 °C", "--solvent", "DFM"), 'did you mean "DMF"?'),
    (("--substrate", "C(", "--temperature", "25 °C", "--solvent", "DMF"), "substrate 'C('"),
    (("--substrate", "CBr", "--temperature", "25 °C", "--solvent", "DMF", "--want", "E3"), "no mechanism"),
    (("--output", "x.jsonl"), "go with --batch"),
]


@pytest.mark.parametrize(("arguments", "what"), MISUSE, ids=lambda value: " ".join(value)[:50])
def test_misuse_ends_with_two_and_says_how_to_mend_it(run: Run, arguments: tuple[str, ...], what: str) -> None:
    ran = run("predict", *arguments)
    assert (ran.code, ran.out) == (2, "")
    assert what in ran.err
    assert "Traceback" not in ran.err


# --- batches --------------------------------------------------------------------------------------------------


@pytest.fixture
def batch(tmp_path: Path) -> Callable[..., Path]:
    def write(*lines: str) -> Path:
        path = tmp_path / "cases.jsonl"
        path.write_text("\n".join(lines) + "\n", "utf-8")
        return path

    return write


def test_a_batch_is_answered_line_by_line(run: Run, batch: Callable[..., Path], tmp_path: Path) -> None:
    cases, results = batch(GOOD, GOOD.replace('"a"', '"b"')), tmp_path / "results.jsonl"
    ran = run("predict", "--batch", cases, "--output", results)
    assert (ran.code, ran.out) == (0, "")
    found = [json.loads(line) for line in results.read_text("utf-8").splitlines()]
    assert [(each["id"], each["mechanism"]) for each in found] == [("a", "SN2"), ("b", "SN2")]
    assert sorted(path.name for path in tmp_path.iterdir()) == ["cases.jsonl", "results.jsonl"]


def test_bad_lines_end_with_one_and_the_others_are_answered(
    run: Run, batch: Callable[..., Path], tmp_path: Path
) -> None:
    cases, results = batch("{", GOOD, '{"id": "c"}'), tmp_path / "results.jsonl"
    ran = run("predict", "--batch", cases, "--output", results)
    assert ran.code == 1
    assert "3 lines answered" in ran.err
    assert "2 of them with an error" in ran.err
    found = [json.loads(line) for line in results.read_text("utf-8").splitlines()]
    assert ["error" in each for each in found] == [True, False, True]


def test_an_empty_batch_gives_an_empty_file(run: Run, batch: Callable[..., Path], tmp_path: Path) -> None:
    assert run("predict", "--batch", batch(), "--output", tmp_path / "results.jsonl").code == 0
    assert (tmp_path / "results.jsonl").read_bytes() == b""


def test_a_batch_that_fails_leaves_the_former_results(
    run: Run, batch: Callable[..., Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    results = tmp_path / "results.jsonl"
    results.write_text("former\n", "utf-8")

    def failing(*_: object) -> object:
        yield from ()
        raise RuntimeError("in the middle")

    monkeypatch.setattr(cli, "answers", failing)
    assert run("predict", "--batch", batch(GOOD), "--output", results).code == 3
    assert results.read_text("utf-8") == "former\n"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["cases.jsonl", "results.jsonl"]


def test_a_batch_is_misused_in_words(run: Run, batch: Callable[..., Path], tmp_path: Path) -> None:
    cases = batch(GOOD)
    assert "needs --output" in run("predict", "--batch", cases).err
    assert "is the batch itself" in run("predict", "--batch", cases, "--output", cases).err
    mixed = run("predict", "--batch", cases, "--output", tmp_path / "r", "--substrate", "CBr")
    assert "--substrate belongs to a single question" in mixed.err
    lost = run("predict", "--batch", cases, "--output", tmp_path / "no" / "r")
    assert (lost.code, "No such file" in lost.err) == (2, True)
    assert cases.read_text("utf-8") == f"{GOOD}\n"


# --- calibration ----------------------------------------------------------------------------------------------


@pytest.fixture
def fit(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Path:
    """Replace the fit, which takes minutes, by one made by hand, and the package by an empty folder."""
    term = next(iter(load_rate_terms().values()))
    row = Residual("r001", "SN2", -7.19, -7.21, 0.02, 0.7, True)
    monkeypatch.setattr(cli, "calibration_of", lambda _: Calibration((term,), (row,), ("r010",)))
    folder = tmp_path / "mechanism"
    folder.mkdir()
    monkeypatch.setattr(cli, "files", lambda _: folder)
    return folder


def test_calibrate_reports_and_writes_nothing_unasked(run: Run, fit: Path, tmp_path: Path) -> None:
    ran = run("calibrate")
    assert ran.code == 0
    assert "Rates, predicted without the row: 1 observation" in ran.out
    assert list(fit.iterdir()) == []
    run("calibrate", "--report", tmp_path / "rows.tsv")
    assert "r001\tSN2\t-7.190" in (tmp_path / "rows.tsv").read_text("utf-8")
    assert list(fit.iterdir()) == []


def test_calibrate_writes_the_same_bytes_twice(run: Run, fit: Path) -> None:
    texts = []
    for _ in range(2):
        assert run("calibrate", "--write").code == 0
        texts.append({path.name: path.read_bytes() for path in sorted(fit.iterdir())})
    assert texts[0] == texts[1]
    assert list(texts[0]) == ["fit_residuals.tsv", "rate_terms_fitted.tsv"]


def test_calibrate_does_not_write_into_an_installed_package(
    run: Run, fit: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli.os, "access", lambda *_: False)
    ran = run("calibrate", "--write")
    assert (ran.code, "cannot be written" in ran.err) == (2, True)
    assert list(fit.iterdir()) == []
