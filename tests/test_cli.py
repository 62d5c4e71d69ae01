"""The command at its edges: exit codes, JSON, help with examples, nothing half-written."""

import json
import re
import shutil
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import click
import pytest

from builder import cli
from builder.records.identifiers import is_identifier
from builder.records.reader import read_record
from builder.records.specimen import specimen_text, with_example

GOOD = Path(__file__).parent / "data" / "records" / "good"


@dataclass(frozen=True)
class Ran:
    """What one call of the command did."""

    code: int
    out: str
    err: str


Run = Callable[..., Ran]


@pytest.fixture
def book(tmp_path: Path) -> Path:
    folder = tmp_path / "entries"
    (folder / "azides").mkdir(parents=True)
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    (folder / "azides" / "NS4T9XQ2N.yml").write_text(specimen_text(), "utf-8")
    return folder


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Run:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1796083200")  # 2026-12-01

    def call(*arguments: str | Path) -> Ran:
        with pytest.raises(SystemExit) as stop:
            cli.main([str(argument) for argument in arguments])
        out, err = capsys.readouterr()
        return Ran(int(stop.value.code or 0), out, err)

    return call


def _break(book: Path, example: str) -> None:
    (book / "azides" / "NS4T9XQ2N.yml").write_text(with_example(example), "utf-8")


def test_a_clean_book_is_quiet(run: Run, book: Path) -> None:
    ran = run("check", "--book", book)
    assert ran.out.startswith("1 record checked: ")
    assert ran.out.count("\n") == 1
    assert "error" not in ran.out
    assert (ran.code, ran.err) == (0, "")


LEVELS = [
    # fault, --fail-on, exit code
    ("status: finished", "error", 1),
    ("take_away: fine", "error", 0),
    ("accepted: [{finding: mechanism-contrary, because: 'for the test', by: bench-1}]", "error", 0),
    ("accepted: [{finding: mechanism-contrary, because: 'for the test', by: bench-1}]", "query", 1),
    ("take_away: fine", "caution", 1),
]


@pytest.mark.parametrize(("fault", "fail_on", "code"), LEVELS)
def test_exit_code_follows_the_failing_level(run: Run, book: Path, fault: str, fail_on: str, code: int) -> None:
    _break(book, fault)
    assert run("check", "--book", book, "--fail-on", fail_on).code == code


def test_one_bad_record_does_not_hide_another(run: Run, book: Path) -> None:
    _break(book, "status: finished")
    second = "entry: NS7K3QFMC\ntitle: Another\nnotebook: BK2/113\nstages: [{temperature: 60, time: 16 h}]"
    (book / "NS7K3QFMC.yml").write_text(with_example(second), "utf-8")
    ran = run("check", "--book", book)
    assert "value-not-permitted" in ran.out
    assert "quantity-without-unit" in ran.out
    assert ran.code == 1


def test_a_reference_to_an_unreadable_record_is_no_second_fault(run: Run, book: Path) -> None:
    _break(book, "status: finished")
    second = "entry: NS7K3QFMC\ntitle: Another\nnotebook: BK2/113\nrelated: [NS4T9XQ2N]"
    (book / "NS7K3QFMC.yml").write_text(with_example(second), "utf-8")
    assert "reference-unknown" not in run("check", "--book", book).out


def test_a_typo_is_shown_with_its_line(run: Run, book: Path) -> None:
    _break(book, "stages: [{temperature: 60, time: 16 h}]")
    ran = run("check", "--book", book)
    line = (
        with_example("stages: [{temperature: 60, time: 16 h}]")
        .splitlines()
        .index("stages: [{temperature: 60, time: 16 h}]")
    )
    assert ran.out == (
        f"entries/azides/NS4T9XQ2N.yml:{line + 1}:24: error quantity-without-unit: the temperature has no unit\n"
        f"     {line + 1} | stages: [{{temperature: 60, time: 16 h}}]\n"
        "        |                        ^^\n"
        "  why:  Every quantity carries its unit.\n"
        '  fix:  write "60 °C" or "333 K"\n'
        "  more: handbook rule quantity-without-unit\n\n"
        "1 record checked: 1 error\n"
    )


def test_json_has_stable_keys(run: Run, book: Path) -> None:
    _break(book, "status: finished")
    ran = run("check", "--book", book, "--json")
    (finding,) = json.loads(ran.out)["findings"]
    wanted = {"rule", "level", "message", "why", "mend", "fix", "source", "file", "line", "column", "accepted", "data"}
    assert wanted <= set(finding)
    assert (finding["rule"], finding["level"], finding["column"]) == ("value-not-permitted", "error", 9)
    assert ran.code == 1


def test_what_can_be_mended_is_shown_then_done(run: Run, book: Path) -> None:
    _break(book, "notebook: 0042  # lot\nstatus: Current\ntitle: one\ntitle: two")
    path = book / "azides" / "NS4T9XQ2N.yml"
    before = path.read_text("utf-8")
    ran = run("check", "--book", book)
    assert "  fix:  write '0042'  [--fix]\n" in ran.out
    assert "  fix:  keep one of them  [--fix --offered duplicate-key]\n" in ran.out
    assert ran.out.endswith("\n2 of these can be mended: `handbook check --diff` shows how, --fix does it\n")

    ran = run("check", "--book", book, "--diff")
    assert ran.code == 1
    changed = [line for line in ran.out.splitlines() if re.match(r"[-+](?![-+])", line)]
    assert changed == ["-notebook: 0042  # lot", "-status: Current", "+notebook: '0042'  # lot", "+status: current"]
    assert path.read_text("utf-8") == before

    ran = run("check", "--book", book, "--fix")
    assert ran.code == 1
    assert re.search(r"NS4T9XQ2N.yml:\d+:11: mended number-altered: 0042 is read as another number\n", ran.out)
    assert ran.out.endswith("1 record checked: 1 error\n")
    after = before.replace("0042", "'0042'").replace("Current", "current")
    assert path.read_text("utf-8") == after

    assert run("check", "--book", book, "--diff").code == 0
    ran = run("check", "--book", book, "--fix", "--diff", "--offered", "duplicate-key")
    assert "-title: two\n+# also typed: title: two\n" in ran.out
    assert ran.code == 0
    assert path.read_text("utf-8") == after.replace("title: two", "# also typed: title: two")


def test_json_carries_the_edits(run: Run, book: Path) -> None:
    _break(book, "solvent: [{name: DMF, volume: '1,5 mL'}]")
    ran = run("check", "--book", book, "--json")
    (finding,) = (each for each in json.loads(ran.out)["findings"] if each["rule"] == "quantity-decimal-comma")
    line = finding["line"]
    place = {"line": line, "column": 31, "end_line": line, "end_column": 39}
    assert (finding["fix"], finding["is_sure"], finding["edits"]) == ("1.5 mL", True, [{**place, "text": "'1.5 mL'"}])
    told = json.loads(run("check", "--book", book, "--fix", "--json").out)
    assert [each["rule"] for each in told["mended"]] == ["quantity-decimal-comma"]
    assert not [each for each in told["findings"] if each["level"] == "error"]


def test_only_the_named_files_are_mended(run: Run, book: Path) -> None:
    _break(book, "notebook: 0042")
    second = book / "NS7K3QFMC.yml"
    second.write_text(with_example("entry: NS7K3QFMC\ntitle: Another\nnotebook: 0043"), "utf-8")
    run("check", second, "--book", book, "--fix")
    assert "notebook: '0043'\n" in second.read_text("utf-8")
    assert "notebook: 0042\n" in (book / "azides" / "NS4T9XQ2N.yml").read_text("utf-8")


def test_a_folder_counts_its_records(run: Run, book: Path) -> None:
    (book / "NS7K3QFMC.yml").write_text(with_example("entry: NS7K3QFMC\ntitle: Another\nnotebook: BK2/113"), "utf-8")
    (book / "azides" / "NS3V6TDMZ.yml").write_text(
        with_example("entry: NS3V6TDMZ\ntitle: Third\nnotebook: BK2/114"), "utf-8"
    )
    assert run("check", book / "azides", "--book", book).out.splitlines()[-1].startswith("2 records checked")
    assert run("check", book / "handbook.yml", "--book", book).out == "0 records checked: nothing found\n"


def test_a_misnamed_record_can_be_asked_by_name(run: Run, book: Path) -> None:
    (book / "foo.yml").write_text(specimen_text(), "utf-8")
    ran = run("check", book / "foo.yml", "--book", book)
    assert ran.code == 1
    assert "file-misnamed" in ran.out


def test_only_the_named_files_are_shown(run: Run, book: Path) -> None:
    _break(book, "status: finished")
    second = book / "NS7K3QFMC.yml"
    second.write_text(with_example("entry: NS7K3QFMC\ntitle: Another\nnotebook: BK2/113"), "utf-8")
    ran = run("check", second, "--book", book)
    assert "value-not-permitted" not in ran.out
    assert ran.code == 0


def test_nothing_but_export_needs_cairo() -> None:
    program = "import sys, builder.cli, builder.plugin; print([m for m in sys.modules if m.startswith('cairo')])"
    said = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert said.stdout == "[]\n"


MISUSE = [
    ("check", "--book", "nowhere"),
    ("check", "--fail-on", "doom"),
    ("check", "--offered", "duplicate-key"),
    ("check", "--fix", "--offered", "duplicate"),
    ("check", "--diff", "--json"),
    ("rule", "no-such-rule"),
    ("frobnicate",),
]


@pytest.mark.parametrize("arguments", MISUSE, ids=" ".join)
def test_misuse_exits_2_with_one_message(run: Run, arguments: tuple[str, ...]) -> None:
    ran = run(*arguments)
    assert ran.code == 2
    assert ran.out == ""
    assert ran.err.count("Error:") == 1


def test_our_fault_exits_3_without_a_traceback(run: Run, book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def explode(*_: object, **__: object) -> None:
        raise RuntimeError("boom")

    monkeypatch.setattr(cli, "open_book", explode)
    ran = run("check", "--book", book)
    assert ran.code == 3
    assert "our fault: RuntimeError: boom" in ran.err
    assert "Traceback" not in ran.err


@pytest.mark.parametrize("command", sorted(cli.handbook.commands))
def test_every_command_shows_an_example(run: Run, command: str) -> None:
    ran = run(command, "--help")
    assert ran.code == 0
    assert f"  Example:\n    handbook {command}" in ran.out


def test_help_of_the_group_names_the_commands(run: Run) -> None:
    out = run("--help").out
    assert all(name in out for name in ("check", "build", "serve", "new", "start", "schema", "rule"))
    assert isinstance(cli.handbook, click.Group)


def test_a_rule_explains_itself(run: Run) -> None:
    out = run("rule", "sn2-closed-tertiary").out
    assert "Three substituents block backside attack" in out
    assert "closes SN2" in out
    card = json.loads(run("rule", "sn2-closed-tertiary", "--json").out)
    assert card["fires_on"][0] == "CC(C)(C)Br"


def test_rules_can_be_listed(run: Run) -> None:
    lines = run("rule").out.splitlines()
    assert len(lines) == len({line.split()[0] for line in lines}) > 60
    assert len(json.loads(run("rule", "--json").out)["rules"]) == len(lines)


def test_a_new_record_is_a_skeleton_whose_gaps_are_found(run: Run, book: Path) -> None:
    ran = run("new", "CC[C@H](C)Br", "--nucleophile", "NaSPh", "--by", "bench-2", "--in", "sulfides", "--book", book)
    assert ran.code == 0
    (path,) = (book / "sulfides").glob("NS*.yml")
    assert is_identifier(path.stem)
    text = path.read_text("utf-8")
    assert "smiles: 'CC[C@H](C)Br'" in text
    assert "class: [secondary]" in text
    assert "leaving_group: bromide" in text
    assert "by: bench-2" in text
    gaps = re.findall(r"^[^#\n]*TO FILL IN", text, re.MULTILINE)
    assert ran.out == f"{path}: {len(gaps)} places TO FILL IN, then `handbook check {path}`\n"
    assert "nucleophile: NaSPh, SMILES [Na+].[S-]c1ccccc1" in ran.err
    reading = read_record(path, path.name)
    lines = [text.splitlines()[finding.place.line - 1] for finding in reading.findings]
    assert len(lines) == len(gaps)
    assert all("TO FILL IN" in line for line in lines)


def test_a_new_record_in_a_folder_of_the_book_finds_its_schema(run: Run, book: Path) -> None:
    run("schema", "--book", book)
    run("new", "CCBr", "--book", book / "azides")
    (path,) = set((book / "azides").glob("NS*.yml")) - {book / "azides" / "NS4T9XQ2N.yml"}
    schema = path.read_text("utf-8").splitlines()[0].partition("$schema=")[2]
    assert (path.parent / schema).resolve() == (book / "schema" / "record-1.json").resolve()


def test_a_new_record_is_printed_and_not_written(run: Run, book: Path) -> None:
    before = sorted(book.rglob("*"))
    ran = run("new", "CCBr", "--nucleophile", "NaI", "--print", "--book", book)
    assert ran.out.startswith("# yaml-language-server: $schema=schema/record-1.json\nformat: 1\n")
    assert sorted(book.rglob("*")) == before


def test_nobody_is_signed_for_unless_somebody_says_so(run: Run, book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("HANDBOOK_BY", raising=False)
    assert "  by: TO FILL IN" in run("new", "CCBr", "--print", "--book", book).out
    monkeypatch.setenv("HANDBOOK_BY", "bench-3")
    assert "  by: bench-3\n" in run("new", "CCBr", "--print", "--book", book).out


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("C1CC",), "unclosed ring 1 (character 2)"),
        (("CCBr", "--by", "a: b, c]"), "is no person code"),
        (("CCBr", "--in", "../elsewhere"), "lies outside the book"),
        (("CCBr", "--temperature", "rt"), "what the thermometer showed"),
        ((), "no substrate is given"),
    ],
    ids=["SMILES", "person", "folder", "temperature", "nothing"],
)
def test_new_refuses_what_it_cannot_read_and_writes_nothing(
    run: Run, book: Path, arguments: tuple[str, ...], message: str
) -> None:
    before = sorted(book.parent.rglob("*"))
    ran = run("new", *arguments, "--book", book)
    assert (ran.code, ran.out) == (2, "")
    assert message in ran.err
    assert sorted(book.parent.rglob("*")) == before


def test_a_drawing_too_large_to_be_one_is_misuse(run: Run, book: Path, tmp_path: Path) -> None:
    (tmp_path / "big.rxn").write_text("$RXN\n" * 60_000, "utf-8")
    ran = run("new", "--rxn", tmp_path / "big.rxn", "--book", book)
    assert ran.code == 2
    assert "big.rxn has more than 256 kB" in ran.err


def test_schemas_are_written_both_or_none(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    replace, calls = Path.replace, iter(range(2))

    def fails_at_the_second(self: Path, target: Path) -> Path:
        if next(calls) == 1:
            raise OSError(28, "no space left")
        return replace(self, target)

    monkeypatch.setattr(Path, "replace", fails_at_the_second)
    assert run("schema", "--book", tmp_path).code == 2
    assert list(tmp_path.iterdir()) == []


def test_schema_is_written_and_printed(run: Run, book: Path) -> None:
    run("schema", "--book", book)
    written = json.loads((book / "schema" / "record-1.json").read_text("utf-8"))
    assert json.loads(run("schema", "--print", "--book", book).out) == written


@pytest.fixture
def built(tmp_path: Path) -> Path:
    """Return a folder that looks like a site built before."""
    site = tmp_path / "site"
    site.mkdir()
    (site / ".handbook-site").touch()
    (site / "index.html").write_text("the last good one", "utf-8")
    return site


def _config(tmp_path: Path, plugins: str = "[handbook]") -> Path:
    config = tmp_path / "mkdocs.yml"
    theme = "{name: material, font: false}"
    config.write_text(f"site_name: T\ndocs_dir: entries\ntheme: {theme}\nplugins: {plugins}\n", "utf-8")
    return config


def test_a_build_publishes_the_book(run: Run, book: Path, tmp_path: Path, built: Path) -> None:
    ran = run("build", "--config", _config(tmp_path), "--site", built)
    assert (ran.code, ran.out) == (0, f"1 entry published in {built}/\n")
    assert "2-azidobutane" in (built / "e" / "NS4T9XQ2N" / "index.html").read_text("utf-8")
    assert sorted(each.name for each in tmp_path.iterdir()) == ["entries", "mkdocs.yml", "site"]


def test_a_theme_that_calls_other_hosts_is_refused(run: Run, book: Path, tmp_path: Path, built: Path) -> None:
    config = tmp_path / "mkdocs.yml"
    config.write_text("site_name: T\ndocs_dir: entries\nplugins: [handbook]\n", "utf-8")
    assert run("build", "--config", config, "--site", built).code == 2
    assert (built / "index.html").read_text("utf-8") == "the last good one"


BROKEN = [
    # what is wrong with the record, plugins of mkdocs.yml, exit code
    ("status: finished", "[handbook]", 1),
    ("title: fine", "[no-such-plugin]", 2),
]


@pytest.mark.parametrize(("fault", "plugins", "code"), BROKEN)
def test_a_failed_build_leaves_the_last_good_site(
    run: Run, book: Path, tmp_path: Path, built: Path, fault: str, plugins: str, code: int
) -> None:
    _break(book, fault)
    assert run("build", "--config", _config(tmp_path, plugins), "--site", built).code == code
    assert (built / "index.html").read_text("utf-8") == "the last good one"
    assert sorted(each.name for each in tmp_path.iterdir()) == ["entries", "mkdocs.yml", "site"]


def test_a_folder_that_is_no_site_is_never_replaced(run: Run, book: Path, tmp_path: Path) -> None:
    precious = tmp_path / "precious"
    precious.mkdir()
    (precious / "report.txt").write_text("years of work", "utf-8")
    ran = run("build", "--config", _config(tmp_path), "--site", precious)
    assert ran.code == 2
    assert "no handbook site" in ran.err
    assert (precious / "report.txt").read_text("utf-8") == "years of work"


def test_a_site_left_aside_by_a_killed_build_comes_back(run: Run, book: Path, tmp_path: Path, built: Path) -> None:
    built.rename(tmp_path / ".site-old")
    assert run("build", "--config", _config(tmp_path, "[no-such-plugin]"), "--site", built).code == 2
    assert (built / "index.html").read_text("utf-8") == "the last good one"


def test_a_link_to_the_site_is_followed(run: Run, book: Path, tmp_path: Path, built: Path) -> None:
    link = tmp_path / "public"
    link.symlink_to(built)
    for _ in range(2):
        assert run("build", "--config", _config(tmp_path), "--site", link).code == 0
    assert link.is_symlink()
    assert (built / "e" / "NS4T9XQ2N" / "index.html").is_file()


@pytest.mark.parametrize("epoch", ["yesterday", "9" * 40])
def test_a_wrong_build_date_is_misuse(run: Run, book: Path, monkeypatch: pytest.MonkeyPatch, epoch: str) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", epoch)
    assert run("check", "--book", book).code == 2


def test_a_file_outside_the_book_is_misuse_and_not_clean(run: Run, book: Path, tmp_path: Path) -> None:
    stray = tmp_path / "NS4T9XQ2N.yml"
    stray.write_text(with_example("status: finished"), "utf-8")
    ran = run("check", stray, "--book", book)
    assert (ran.code, ran.out) == (2, "")


def test_the_book_may_be_the_working_folder(run: Run, book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    _break(book, "status: finished")
    monkeypatch.chdir(book)
    ran = run("check", "--book", ".", "azides/NS4T9XQ2N.yml")
    assert ran.code == 1
    assert "entries/azides/NS4T9XQ2N.yml:" in ran.out


def test_links_and_folders_are_no_records(run: Run, book: Path, tmp_path: Path) -> None:
    outside = tmp_path / "outside.yml"
    outside.write_text("password: 1234", "utf-8")
    (book / "NS7K3QFMC.yml").symlink_to(outside)
    (book / "NS3V6TDMZ.yml").mkdir()
    ran = run("check", "--book", book)
    assert ran.out.count("file-unreachable: ") == 2
    assert "1234" not in ran.out
    assert ran.code == 1


def test_a_stray_yaml_file_is_not_lost(run: Run, book: Path) -> None:
    shutil.copy(book / "azides" / "NS4T9XQ2N.yml", book / "entry17_final2.yaml")
    ran = run("check", "--book", book)
    assert "file-misnamed" in ran.out
    assert ran.code == 1


def test_a_book_without_settings_says_so(run: Run, book: Path) -> None:
    (book / "handbook.yml").unlink()
    ran = run("check", "--book", book)
    assert "the book has no handbook.yml" in ran.out
    assert ran.code == 1
