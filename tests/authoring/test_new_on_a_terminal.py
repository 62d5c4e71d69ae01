"""`handbook new` on a terminal: it asks, shows what it will write, and an interrupt leaves nothing."""

import os
import select
import signal
import sys
import time
from collections.abc import Sequence
from pathlib import Path

import pytest

from builder.records.specimen import specimen_text

pty = pytest.importorskip("pty", reason="pseudo-terminals are a thing of POSIX")

PATIENCE_S = 60.0
MOMENT_S = 0.3
INTERRUPT = "\x03"


def _converse(arguments: Sequence[str], script: Sequence[tuple[str, str]]) -> tuple[str, int]:
    """Run the command on a pseudo-terminal; return what it showed, and its exit code.

    script: what is waited for, and what is typed then.
    """
    child, terminal = pty.fork()
    if child == 0:
        signal.signal(signal.SIGINT, signal.SIG_DFL)  # ignored where the tests run in the background
        command = [sys.executable, "-c", "from builder.cli import main; main()", *arguments]
        mine = {name: value for name, value in os.environ.items() if name != "HANDBOOK_BY"}
        os.execve(command[0], command, {**mine, "SOURCE_DATE_EPOCH": "1796083200", "TERM": "dumb"})
    shown, waiting, seen = "", list(script), 0
    until = time.monotonic() + PATIENCE_S
    while time.monotonic() < until:
        if not select.select([terminal], [], [], PATIENCE_S)[0]:
            break
        try:
            data = os.read(terminal, 65536)
        except OSError:  # the other end is closed
            break
        if not data:
            break
        shown += data.decode("utf-8", "replace")
        if waiting and waiting[0][0] in shown[seen:]:
            _, answer = waiting.pop(0)
            seen = len(shown)
            if answer == INTERRUPT:
                time.sleep(MOMENT_S)  # nobody is as quick as to hit the moment between prompt and reading
            os.write(terminal, (answer if answer == INTERRUPT else f"{answer}\n").encode())
    os.close(terminal)
    _, status = os.waitpid(child, 0)
    assert not waiting, f"never asked {waiting[0][0]!r} in:\n{shown}"
    return shown, os.waitstatus_to_exitcode(status)


@pytest.fixture
def book(tmp_path: Path) -> Path:
    folder = tmp_path / "entries"
    folder.mkdir()
    people = "people:\n  - {code: bench-1, shown_as: one}\n  - {code: bench-2, shown_as: two}\n"
    (folder / "handbook.yml").write_text(f"format: 1\ntitle: A book\n{people}", "utf-8")
    (folder / "NS4T9XQ2N.yml").write_text(specimen_text(), "utf-8")
    return folder


SCRIPT = [
    ("Substrate (name or SMILES): ", "NaN3"),
    ("--nucleophile 'NaN3'`\r\nSubstrate (name or SMILES): ", "2-bromobutan"),
    ('did you mean "2-bromobutane"?\r\nSubstrate (name or SMILES): ', "2-bromobutane"),
    ("Nucleophile (name, SMILES, solvent or internal): ", "NaN3"),
    ("Base (name or SMILES): ", ""),
    ("Number: ", "racemate"),
    ("(10 mmol or 1.37 g): ", "10 mmol"),
    ("[y/N]: ", "y"),
    ("Number: ", "bench-2"),
]


def test_a_record_is_asked_for_shown_and_written(book: Path) -> None:
    shown, code = _converse(["new", "--book", str(book)], [*SCRIPT, ("? [Y/n]: ", "y")])
    assert code == 0
    (path,) = set(book.glob("NS*.yml")) - {book / "NS4T9XQ2N.yml"}
    text = path.read_text("utf-8")
    assert "perceived: leaving group bromide, class secondary" in shown
    assert "forecast: SN2" in shown
    assert text in shown.replace("\r\n", "\n")
    assert "  stereo: racemate" in text
    assert "  by: bench-2" in text
    assert "related: [NS4T9XQ2N]" in text


@pytest.mark.parametrize(("last", "code"), [("n", 0), (INTERRUPT, 1)], ids=["no", "interrupt"])
def test_a_record_that_is_not_wanted_is_not_written(book: Path, last: str, code: int) -> None:
    before = sorted(book.rglob("*"))
    _, ended = _converse(["new", "--book", str(book)], [*SCRIPT, ("? [Y/n]: ", last)])
    assert ended == code
    assert sorted(book.rglob("*")) == before


def test_with_yes_nothing_is_asked(book: Path) -> None:
    shown, code = _converse(["new", "CCBr", "--yes", "--book", str(book)], [])
    assert code == 0
    assert "TO FILL IN, then" in shown
    assert "[Y/n]" not in shown
