"""Mends put into a file: what they change, that they change nothing else, and that they come to rest."""

import re
import shutil
import subprocess
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from builder.authoring.fix import Mended, diff_of, exact_edits, mend, mended_files, write_mended
from builder.book import open_book
from builder.finding import Finding
from builder.records.specimen import SPECIMEN_FILE, outcome_example, specimen_text, with_example
from builder.records.yaml_text import leaves, read_plain
from tests.keyboard_slips import ENTRIES, SLIPS, Slip, look
from tests.specimens import TODAY

BAD = sorted((Path(__file__).parents[1] / "data" / "records" / "bad").rglob("*.yml"))


def _is_sure(finding: Finding) -> bool:
    return finding.is_sure and (finding.fix is not None or bool(finding.edits))


def _is_mendable(finding: Finding) -> bool:
    return finding.fix is not None or bool(finding.edits)


SITE = "class: secondary\n  leaving_group: bromide\n  amount: 10 mmol"
SUBSTRATE = f"substrate:\n  name: 2-bromobutane\n  smiles: 'CCC(C)Br'\n  {SITE}"
WORK_UP = "work_up:\n  - brine\n  - |\n    dried\n    and filtered"
FLASK = "nucleophile:\n  name: sodium azide\n  smiles: '[Na+].[N-]=[N+]=[N-]'\n  equivalents: 1.5"

TRAPS = [
    # what was typed, what stands there afterwards: trade-practice 2.3 and the slips of a keyboard
    (f"{SUBSTRATE}\n  er: 97:3  # HPLC", f"{SUBSTRATE}\n  er: '97:3'  # HPLC"),
    (f"{SUBSTRATE}\n  dr: 20:1", f"{SUBSTRATE}\n  dr: '20:1'"),
    (f"{SUBSTRATE}\n  dr: 1:1.5", f"{SUBSTRATE}\n  dr: '1:1.5'"),
    ("notebook: NO", "notebook: 'NO'"),
    ("notebook: 0042  # lot", "notebook: '0042'  # lot"),
    (FLASK.replace("1.5", "1e-4"), FLASK.replace("1.5", "0.0001")),
    (FLASK.replace("'[Na+].[N-]=[N+]=[N-]'", "[OH-]"), FLASK.replace("'[Na+].[N-]=[N+]=[N-]'", "'[OH-]'")),
    (FLASK.replace("'[Na+].[N-]=[N+]=[N-]'", "[Na+].[OH-]"), FLASK.replace("'[Na+].[N-]=[N+]=[N-]'", "'[Na+].[OH-]'")),
    (SUBSTRATE.replace("'CCC(C)Br'", "*CC(C)Br"), SUBSTRATE.replace("'CCC(C)Br'", "'*CC(C)Br'")),
    (SUBSTRATE.replace("'CCC(C)Br'", r'"C\C=C\CBr"'), SUBSTRATE.replace("'CCC(C)Br'", r"'C\C=C\CBr'")),
    ("title: @home", "title: '@home'"),
    ("title: >20:1 for one product", "title: '>20:1 for one product'"),
    ("title: azide: the second try", "title: 'azide: the second try'"),
    ("title: 42", "title: '42'"),
    ("title: one\ntitle: one", "title: one"),
    ("title: one\ntitle: one\nstatus: nonsense", "title: one\nstatus: nonsense"),
    (f"{SUBSTRATE}\n  name: 2-bromobutane", SUBSTRATE),
    (f"{SUBSTRATE}\n  name: 2-bromobutane  # again", f"{SUBSTRATE}\n  # also typed: name: 2-bromobutane  # again"),
    (
        f"{WORK_UP}\n{WORK_UP}",
        WORK_UP,
    ),
    (SUBSTRATE.replace("  leaving", "\tleaving"), SUBSTRATE),
    ("stages:\n  - temperature: 60 °C\n\ttime: 16 h", None),  # a tab that may stand for either level
    (SUBSTRATE.replace("  leaving", "\u00a0\u00a0leaving"), SUBSTRATE),
    (SUBSTRATE.replace("class: ", "class:"), SUBSTRATE),
    (
        "solvent: [{name: 1,4-dioxane, volume: 1,5 mL}]\nrelated: []",
        "solvent: [{name: '1,4-dioxane', volume: 1.5 mL}]\nrelated: []",
    ),
    ("stages: [{temperature: 60 degC, time: 16 hours}]", "stages: [{temperature: 60 °C, time: 16 h}]"),
    ("stages: [{temperature: 60 °C, time: '16 h 30 min'}]", "stages: [{temperature: 60 °C, time: '16.5 h'}]"),
    ('stages: [{temperature: "60 celsius", time: 2*8 h}]', 'stages: [{temperature: "60 °C", time: 2*8 h}]'),
    (
        "stages: [{temperature: 60 °C, time: 16 h, masured: internal}]",
        "stages: [{temperature: 60 °C, time: 16 h, measured: internal}]",
    ),
    (
        "stages: [{temperature: 60 °C, time: 16 h, vessel: Gas-Collected}]",
        "stages: [{temperature: 60 °C, time: 16 h, vessel: gas collected}]",
    ),
    ("neat: yes\n# without solvent", "neat: true\n# without solvent"),
    ("performed: {date: 14.03.2026, by: [bench-2]}", "performed: {date: 2026-03-14, by: [bench-2]}"),
    (outcome_example("{ratio: A=1, by: GC}"), None),
    (outcome_example("{er: 97/3, of: A, by: GC}"), outcome_example("{er: '97:3', of: A, by: GC}")),
    (outcome_example("{yield: 81, of: A, kind: isolated}"), outcome_example("{yield: 81 %, of: A, kind: isolated}")),
    (
        outcome_example("{yield: 81 %, of: A, kind: isolated, of: A}"),
        outcome_example("{yield: 81 %, of: A, kind: isolated}"),
    ),
]


@pytest.mark.parametrize(("typed", "mended"), TRAPS, ids=[re.sub(r"\W+", "-", row[0])[-40:] for row in TRAPS])
def test_what_can_be_meant_in_one_way_is_mended(typed: str, mended: str | None) -> None:
    text = with_example(typed)
    after, applied = mend(text, look, _is_sure)
    assert after == (text if mended is None else with_example(mended))
    assert (applied == ()) == (mended is None)


OFFERED = [
    # what was typed, what stands there once its rule is named
    ("title: first\ntitle: second", "title: first\n# also typed: title: second"),
    (
        "performed:\n  date: 2026-03-14\n  by: [bench-2]\nperformed:\n  date: 2026-03-15\n\n  by: [bench-2]  # me",
        "performed:\n  date: 2026-03-14\n  by: [bench-2]\n"
        "# also typed: performed:\n#   date: 2026-03-15\n\n#   by: [bench-2]  # me",
    ),
    ("stages: [{temperature: ca. 60 °C, time: 16 h}]", "stages: [{temperature: 60 °C, time: 16 h}]"),
    ("title: Run #3 of azide", "title: 'Run #3 of azide'"),
    ("performed: {date: 04.03.2026, by: [bench-2]}", "performed: {date: 2026-03-04, by: [bench-2]}"),
    ("status: currrent", "status: current"),
    (
        "stages: [{temperature: 60 °C, time: 16 h, pressure: 3 mPa}]",
        "stages: [{temperature: 60 °C, time: 16 h, pressure: 3 MPa}]",
    ),
]


@pytest.mark.parametrize(("typed", "mended"), OFFERED, ids=[row[1][:40] for row in OFFERED])
def test_what_is_only_likely_is_offered(typed: str, mended: str) -> None:
    text = with_example(typed)
    assert mend(text, look, _is_sure) == (text, ())
    assert mend(text, look, _is_mendable)[0] == _with(mended)


def _with(example: str) -> str:
    """Return the specimen with an example whose comments may begin in the margin."""
    marked = example.replace("\n#", "\n #")
    return with_example(marked).replace("\n #", "\n#")


HELD_BACK = [
    # mends that would do harm: the true key is there already, the number is none that fits, the value goes on
    "stages: [{temprature: 60 °C, temperature: 60 °C, time: 16 h}]",
    "revision: 0x1",
    "status: cur\n  rrent",
    f"neat: true\nsovent:\n  - name: DMF\n    volume: 20 mL\n{SUBSTRATE}\n# without solvent",
    "title: 'open\nnotebook: 0042",
    outcome_example("{yield: 81 %, of: A, kind: isolated, kind: assay}"),
]


@pytest.mark.parametrize("typed", HELD_BACK)
def test_a_mend_that_does_not_hold_is_not_made(typed: str) -> None:
    text = with_example(typed)
    assert mend(text, look, _is_mendable) == (text, ())


def test_one_mend_that_does_not_hold_keeps_back_no_other() -> None:
    typed = "notebook: 0042\nstages: [{temprature: 60 °C, temperature: 60 °C, time: 16 hours}]\ntitle: 42"
    mended = typed.replace("0042", "'0042'").replace("hours", "h").replace(" 42", " '42'")
    after, applied = mend(with_example(typed), look, _is_sure)
    assert after == with_example(mended)
    assert sorted(each.rule for each in applied) == ["number-altered", "quantity-unknown-unit", "value-wrong-type"]


def test_a_mend_that_brings_another_to_light_is_followed_by_it() -> None:
    text = with_example(f"{SUBSTRATE}\n  ee: 99\n  ee: 99")
    after, applied = mend(text, look, _is_sure)
    assert after == with_example(f"{SUBSTRATE}\n  ee: 99 %")
    assert [each.rule for each in applied].count("duplicate-key") == 1


# --- nothing else changes ------------------------------------------------------------------------------------

KEYS = [
    ["notebook: 0042", "notebook: NO", "notebook: 12:30"],
    ["title: 42", "title: a: b", "title: @home", "title: one\ntitle: one", "title: one\ntitle: two", "title:azide"],
    [
        f"{SUBSTRATE}\n  er: 97:3",
        SUBSTRATE.replace("class: ", "clas: "),
        f"{SUBSTRATE}\n  mass: 1,37 g\n  mass: 1,37 g",
        SUBSTRATE.replace("  leaving", "\tleaving"),
    ],
    [
        "stages: [{temperature: 60 degC, time: 16 hours}]",
        "stages:\n  - temperature: rt\n    time: 16h30\n    mesured: bath\n    time: 16 h",
    ],
    [FLASK.replace("'[Na+].[N-]=[N+]=[N-]'", smiles) for smiles in ("[OH-]", "[Na+].[OH-]", "*C", r'"C\C"')],
    ["solvent: [{name: 1,4-dioxane, volume: 1,5 mL}]", "solvent:\n  - name: DMF\n    name: DMF\n    volume: 20 ml"],
]
RECORDS = st.one_of(
    st.sampled_from(BAD).map(lambda path: path.read_bytes().decode("utf-8", "replace")),
    st.tuples(*(st.sampled_from(["", *variants]) for variants in KEYS)).map(
        lambda chosen: with_example("\n".join(filter(None, chosen)))
    ),
)


@st.composite
def noted_records(draw: st.DrawFn) -> tuple[str, list[str]]:
    """Return a faulty record with line ends, byte-order mark and remarks of one's own, and the remarks."""
    lines = draw(RECORDS).removeprefix("\ufeff").splitlines()
    notes = []
    for number in sorted(draw(st.sets(st.integers(0, max(0, len(lines) - 1)), max_size=6)), reverse=True):
        note = f"# note {number:03}"
        notes.append(note)
        if draw(st.booleans()):
            lines[number] += f"  {note}"
        else:
            margin = len(lines[number]) - len(lines[number].lstrip(" "))
            lines.insert(number, " " * margin + note)
    text = draw(st.sampled_from(["\n", "\r\n"])).join([*lines, *([""] if draw(st.booleans()) else [])])
    return draw(st.sampled_from(["", "\ufeff"])) + text, notes


@settings(deadline=None, max_examples=120)
@given(noted_records(), st.booleans())
def test_whatever_is_mended_all_else_stays(noted: tuple[str, list[str]], is_offered: bool) -> None:
    text, notes = noted
    wanted = _is_mendable if is_offered else _is_sure
    after, applied = mend(text, look, wanted)
    assert mend(after, look, wanted) == (after, ()), "twice is not once"
    assert [note for note in notes if after.count(note) != 1] == []
    assert after.startswith("\ufeff") == text.startswith("\ufeff")
    if "\r\n" in text:
        assert "\n" not in after.replace("\r\n", "")
    assert (after == text) == (applied == ())
    if applied and {each.rule for each in applied} <= {"smiles-unquoted", "yaml-unreadable", "number-altered"}:
        before, now = (read_plain(each.lstrip("\ufeff").replace("\r\n", "\n"), "") for each in (text, after))
        assert leaves(before.value) == leaves(now.value)


@pytest.mark.parametrize("end", ["\n", "\r\n"], ids=["LF", "CRLF"])
@pytest.mark.parametrize("slip", SLIPS, ids=lambda slip: slip.name)
def test_a_slip_in_an_entry_of_the_book_is_mended_to_the_byte(slip: Slip, end: str) -> None:
    sound = [text for path in ENTRIES if slip.spoil(text := path.read_text("utf-8")) != text][:25]
    assert sound
    for text in sound:
        after, _ = mend(slip.spoil(text).replace("\n", end), look, _is_sure)
        assert after == text.replace("\n", end)


# --- files of a book ------------------------------------------------------------------------------------------


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    folder = tmp_path / "entries"
    folder.mkdir()
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    return folder


def _mended(folder: Path, *offered: str) -> list[Mended]:
    book = open_book(folder, today=TODAY)
    return mended_files(book, book.findings, offered)


def test_line_ends_mark_and_mode_of_a_file_stay(folder: Path) -> None:
    path = folder / SPECIMEN_FILE
    text = "\ufeff" + with_example("notebook: 0042  # lot").replace("\n", "\r\n")
    path.write_bytes(text.encode())
    path.chmod(0o640)
    (mended,) = _mended(folder)
    assert write_mended(mended)
    assert path.read_bytes() == text.replace("0042", "'0042'").encode()
    assert path.stat().st_mode & 0o777 == 0o640
    assert len(list(folder.iterdir())) == 2


def test_a_file_that_changed_meanwhile_is_left_alone(folder: Path) -> None:
    path = folder / SPECIMEN_FILE
    path.write_text(with_example("notebook: 0042"), "utf-8")
    (mended,) = _mended(folder)
    path.write_text(with_example("notebook: 0043"), "utf-8")
    assert not write_mended(mended)
    assert path.read_text("utf-8") == with_example("notebook: 0043")


def test_links_are_not_written_through(folder: Path) -> None:
    (folder / "aside").mkdir()
    real = folder / "aside" / "NS4T9XQ2N.txt"
    real.write_text(with_example("notebook: 0042"), "utf-8")
    (folder / SPECIMEN_FILE).symlink_to(real)
    assert _mended(folder) == []


def test_settings_are_mended_as_records_are(folder: Path) -> None:
    settings_file = folder / "handbook.yml"
    settings_file.write_text(
        "format: 1\ntitle: 2026\ninvented: yes\naccent: {light: '#f2b600', dark: '#62cfa8'}\n", "utf-8"
    )
    (mended,) = _mended(folder)
    assert "title: '2026'\ninvented: true\naccent: {light: '#f2b600'" in mended.after
    (mended,) = _mended(folder, "accent-faint")
    assert re.search(r"title: '2026'\ninvented: true\naccent: \{light: '#(?!f2b600)[0-9a-f]{6}', dark", mended.after)


def test_a_check_that_offers_is_asked_again(folder: Path) -> None:
    path = folder / SPECIMEN_FILE
    path.write_text(with_example("stages: [{temperature: 333 °C, time: 16 h, vessel: sealed}]  # bomb"), "utf-8")
    assert _mended(folder) == []
    (mended,) = _mended(folder, "temperature-looks-kelvin")
    assert "stages: [{temperature: 333 K, time: 16 h, vessel: sealed}]  # bomb\n" in mended.after


@pytest.mark.parametrize("end", ["\n", ""])
def test_a_diff_is_one_that_git_applies(folder: Path, end: str) -> None:
    git = shutil.which("git")
    if git is None:
        pytest.skip("needs git")
    path = folder / SPECIMEN_FILE
    path.write_text(with_example("notebook: 0042\ntitle: 42").rstrip("\n") + end, "utf-8")
    (mended,) = _mended(folder)
    subprocess.run([git, "apply", "-"], input=diff_of(mended), text=True, check=True, cwd=folder.parent)
    assert path.read_text("utf-8") == mended.after


WRITTEN = [
    # a fix, what it replaces, what is put there
    ("1.5 mL", "'1,5 mL'", "'1.5 mL'"),
    ("1.5 mL", '"1,5 mL"', '"1.5 mL"'),
    ("true", "'yes'", "true"),
    ("2", "'2.0'", "2"),
    ("N,N-dimethylformamide", "N,N-dimethylformamid", "'N,N-dimethylformamide'"),
    ("< 2 %", "<2 pct", "< 2 %"),
    ("-78 °C", "-78 degC", "-78 °C"),
    ("> 2 %", "'>2 pct'", "'> 2 %'"),
    ("[primary, allylic]", "primary", "[primary, allylic]"),
    ("it's", '"its"', '"it\'s"'),
]


@pytest.mark.parametrize(("fix", "typed", "put"), WRITTEN)
def test_a_fix_takes_the_quotes_of_what_it_replaces(fix: str, typed: str, put: str) -> None:
    found = look(with_example("notebook: 0042"))[0]
    text = f"key: {typed}\n"
    place = type(found.place)(SPECIMEN_FILE, 1, 6, 6 + len(typed))
    finding = Finding(
        rule=found.rule,
        level=found.level,
        message="",
        why="",
        mend="",
        source=found.source,
        place=place,
        fix=fix,
    )
    (edit,) = exact_edits(finding, text)
    assert (edit.text, edit.column, edit.end_column) == (put, 6, 6 + len(typed))


def test_a_hostile_file_does_not_take_long() -> None:
    text = specimen_text() + "title: Azide displacement\n" * 4000 + "notebook: 0042\n" * 4000
    after, applied = mend(text, look, _is_mendable)
    assert len(applied) >= 7000
    assert len(look(after)) < len(look(text))


def test_the_specimen_wants_no_mend() -> None:
    assert mend(specimen_text(), look, _is_mendable) == (specimen_text(), ())
