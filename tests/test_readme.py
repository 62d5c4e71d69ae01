"""The README shows a record that is good and a finding as it is printed."""

import re
from pathlib import Path

from builder.book import open_book
from builder.checks.report import render_text
from builder.finding import Level
from tests.specimens import TODAY

README = (Path(__file__).parents[1] / "README.md").read_text("utf-8")


def _block(kind: str) -> str:
    match = re.search(rf"```{kind}\n(.*?)```", README, re.DOTALL)
    assert match is not None
    return match[1]


def _findings(tmp_path: Path, record: str) -> str:
    folder = tmp_path / "entries"
    folder.mkdir()
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    (folder / "NSKF9EQ3S.yml").write_text(record, "utf-8")
    heavy = [f for f in open_book(folder, today=TODAY).findings if f.level in {Level.ERROR, Level.QUERY}]
    return render_text(heavy, folder)


def test_its_record_is_a_good_one(tmp_path: Path) -> None:
    assert _findings(tmp_path, _block("yaml")) == ""


def test_its_finding_is_what_is_printed(tmp_path: Path) -> None:
    wrong = _block("yaml").replace("temperature: 60 °C", "temperature: 60")
    assert _findings(tmp_path, wrong) == _block("text")
