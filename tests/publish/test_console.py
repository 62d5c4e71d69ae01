"""Consoles and pipes without the characters of the trade: nothing crashes, and what they have they show."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from builder.publish.console import put_up_with_any_console
from builder.records.specimen import with_example

DAY = "1796083200"  # 2026-12-01
FAULTY = "title: Azide → α-chloride at ≥ 60 °C\nstages: [{temperature: 60, time: 16 h}]"


def _handbook(encoding: str, *arguments: str) -> tuple[int, bytes, bytes]:
    environment = {**os.environ, "PYTHONIOENCODING": encoding, "PYTHONUTF8": "0", "SOURCE_DATE_EPOCH": DAY}
    program = "from builder.cli import main; main()"
    ran = subprocess.run(
        [sys.executable, "-c", program, *arguments],
        env=environment,
        capture_output=True,
        check=False,
        stdin=subprocess.DEVNULL,
    )
    return ran.returncode, ran.stdout, ran.stderr


@pytest.fixture
def book(tmp_path: Path) -> Path:
    folder = tmp_path / "Bücher α" / "entries"
    folder.mkdir(parents=True)
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    (folder / "NS4T9XQ2N.yml").write_text(with_example(FAULTY), "utf-8")
    return folder


def test_windows_shows_degrees_and_a_likeness_of_the_rest(book: Path) -> None:
    code, out, err = _handbook("cp1252", "check", "--book", str(book), "--show", "remark")
    assert (code, err) == (1, b"")
    text = out.decode("cp1252")
    assert 'write "60 °C" or "333 K"' in text
    code, out, _ = _handbook(
        "cp1252",
        "predict",
        "--substrate",
        "CCBr",
        "--nucleophile",
        "NaN3",
        "--solvent",
        "DMF",
        "--temperature",
        "60 °C",
    )
    text = out.decode("cp1252")
    assert code == 0
    assert "60 °C" in text
    assert "M-1 s-1" in text
    assert "\\u" not in text


@pytest.mark.parametrize("encoding", ["cp1252", "cp437", "latin-1", "ascii", "utf-8"])
def test_json_is_the_same_for_every_encoding(book: Path, encoding: str) -> None:
    code, out, err = _handbook(encoding, "check", "--book", str(book), "--json")
    assert (code, err) == (1, b"")
    found = [finding["mend"] for finding in json.loads(out.decode("ascii"))["findings"]]
    assert 'write "60 °C" or "333 K"' in found


@pytest.mark.parametrize("encoding", ["cp1252", "cp437", "latin-1", "ascii", "utf-8"])
def test_no_encoding_makes_it_fail(tmp_path: Path, encoding: str) -> None:
    code, out, err = _handbook(encoding, "start", str(tmp_path / "→ Bücher α ☃"))
    assert (code, err) == (0, b"")
    assert b"a new book" in out


LIKENESSES = [
    # character, what is written for it where it is lacking
    ("°", "deg"),
    ("⁻", "-"),
    ("¹", "1"),
    ("₂", "2"),
    ("−", "-"),
    ("≥", ">="),
    ("→", "->"),
    ("α", "alpha"),
    ("Δ", "delta"),
    ("µ", "u"),
    ("é", "e"),
    ("…", "..."),
    ("☃", "\\u2603"),
    ("\udcff", "\\udcff"),
]


@pytest.mark.parametrize(("character", "likeness"), LIKENESSES)
def test_a_character_that_is_lacking_has_a_likeness(character: str, likeness: str) -> None:
    put_up_with_any_console()
    assert character.encode("ascii", "handbook-readable").decode() == likeness
