"""The settings of a book: its pin to a version of the tool, and colours that can be read."""

import re
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from builder.book import open_book
from builder.checks.house import tool_version
from builder.chemistry.inks import LEAST_CONTRAST, PAPER, contrast, legible
from builder.finding import Finding, Level
from tests.specimens import TODAY

COLOUR = st.from_regex(r"#[0-9a-f]{6}", fullmatch=True)


def _found(tmp_path: Path, more: str) -> tuple[Finding, ...]:
    folder = tmp_path / "entries"
    folder.mkdir()
    (folder / "handbook.yml").write_text(f"format: 1\ntitle: A book for tests\n{more}\n", "utf-8")
    return open_book(folder, today=TODAY).findings


def test_a_logo_is_a_file_of_the_book(tmp_path: Path) -> None:
    (tmp_path / "elsewhere.svg").write_text("<svg/>", "utf-8")
    (missing,) = _found(tmp_path, "logo: logo.svg")
    assert (missing.rule, missing.level, str(missing.place)) == (
        "logo-missing",
        Level.ERROR,
        "entries/handbook.yml:3:7",
    )
    (tmp_path / "entries" / "logo.svg").symlink_to(tmp_path / "elsewhere.svg")
    outside = open_book(tmp_path / "entries", today=TODAY).findings
    assert [finding.rule for finding in outside] == ["logo-missing"]
    (tmp_path / "entries" / "logo.svg").unlink()
    (tmp_path / "entries" / "logo.svg").write_text("<svg/>", "utf-8")
    assert open_book(tmp_path / "entries", today=TODAY).findings == ()


def test_another_version_is_a_query_at_the_pin(tmp_path: Path) -> None:
    (finding,) = _found(tmp_path, "engine: 0.0.9")
    assert (finding.rule, finding.level) == ("engine-differs", Level.QUERY)
    assert str(finding.place) == "entries/handbook.yml:3:9"
    assert finding.message == f"the book is pinned to version 0.0.9, and {tool_version()} is running"


@pytest.mark.parametrize("engine", [f"engine: {tool_version()}", "licence: CC0-1.0"], ids=["the same", "none"])
def test_the_version_that_is_meant_is_silent(tmp_path: Path, engine: str) -> None:
    assert _found(tmp_path, engine) == ()


REFUSED = [
    # settings, rule, fix
    ("engine: 0.1", "value-wrong-type", "'0.1'"),
    ("engine: newest", "value-not-permitted", None),
    ("accent: {light: '#1B6A52', dark: '#62cfa8'}", "value-not-permitted", "'#1b6a52'"),
    ("accent: {light: green, dark: '#62cfa8'}", "value-not-permitted", None),
    ("accent:\n  light: #1b6a52\n  dark: '#62cfa8'", "empty-value", None),  # YAML takes it for a comment
    ("accent: {light: '#1b6a52'}", "key-missing", None),
]


@pytest.mark.parametrize(("more", "rule", "fix"), REFUSED, ids=[row[0] for row in REFUSED])
def test_what_is_no_version_or_colour_is_refused(tmp_path: Path, more: str, rule: str, fix: str | None) -> None:
    (finding,) = _found(tmp_path, more)
    assert (finding.rule, finding.level, finding.fix) == (rule, Level.ERROR, fix)


def test_a_faint_accent_is_mended_towards_its_paper(tmp_path: Path) -> None:
    light, dark = _found(tmp_path, "accent:\n  light: '#f2b600'\n  dark: '#1b6a52'")
    assert {light.rule, dark.rule} == {"accent-faint"}
    assert (light.place.line, dark.place.line) == (4, 5)
    assert re.search(
        r"#f2b600 on the light paper, #ffffff, has a contrast of 1\.\d\d:1; text needs 4.5:1", light.message
    )
    assert light.fix is not None
    assert dark.fix is not None
    mended = f"accent: {{light: {light.fix}, dark: {dark.fix}}}"
    (tmp_path / "again").mkdir()
    assert _found(tmp_path / "again", mended) == ()


CONTRASTS = [
    # two colours, their ratio; by hand from the formulas of WCAG 2.2
    ("#000000", "#ffffff", 21.0),
    ("#ffffff", "#ffffff", 1.0),
    ("#767676", "#ffffff", 4.54),  # the lightest grey that passes on white, and the first that does not
    ("#777777", "#ffffff", 4.48),
    ("#ff0000", "#ffffff", 4.00),
]


@pytest.mark.parametrize(("one", "other", "ratio"), CONTRASTS)
def test_contrast_is_that_of_wcag(one: str, other: str, ratio: float) -> None:
    assert contrast(one, other) == contrast(other, one) == pytest.approx(ratio, abs=0.005)


@given(COLOUR, st.sampled_from([PAPER.light, PAPER.dark]))
def test_every_colour_can_be_made_legible_and_a_legible_one_is_left_alone(colour: str, paper: str) -> None:
    mended = legible(colour, paper)
    assert contrast(mended, paper) >= LEAST_CONTRAST
    assert (mended == colour) == (contrast(colour, paper) >= LEAST_CONTRAST)
