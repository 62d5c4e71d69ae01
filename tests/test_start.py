"""`handbook start`: a book of one's own, whole or not at all, from the package alone."""

import hashlib
import json
import os
import re
import shlex
import shutil
import subprocess
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from zipfile import ZipFile

import click
import jsonschema
import pytest
import yaml

from builder import cli
from builder.authoring import start
from builder.authoring.schema import schemas
from builder.checks.house import tool_version
from builder.records.identifiers import is_identifier
from builder.records.reader import read_settings
from builder.records.specimen import with_example
from tests.publish.handmade import asked_of_other_hosts
from tests.test_cli import Run, run

__all__ = ["run"]  # the fixture of the other commands

ROOT = Path(__file__).parents[1]
WHEEL = f"condition_handbook-{tool_version()}-py3-none-any.whl"
FILES = {
    ".editorconfig",
    ".gitattributes",
    ".github/pull_request_template.md",
    ".github/workflows/handbook.yml",
    ".gitignore",
    ".vscode/settings.json",
    "README.md",
    "entries/handbook.yml",
    "entries/schema/handbook-1.json",
    "entries/schema/record-1.json",
    "mkdocs.yml",
    "requirements.txt",
}


@pytest.fixture
def book(run: Run, tmp_path: Path) -> Path:
    """Return a book as started with nothing said."""
    folder = tmp_path / "book"
    assert run("start", folder).code == 0
    return folder


def _files(folder: Path) -> set[str]:
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()}


def _text(path: Path) -> str:
    return path.read_bytes().decode()


def test_a_book_is_started_with_one_sample(book: Path) -> None:
    (sample,) = _files(book) - FILES
    assert _files(book) > FILES
    assert is_identifier(Path(sample).stem)
    assert sorted(each.name for each in book.parent.iterdir()) == ["book"]


def test_every_file_is_plain_text_and_filled_in(book: Path) -> None:
    for name in _files(book):
        text = _text(book / name)
        assert "\r" not in text
        assert "<<" not in text, name
        assert text.endswith("\n")


def test_a_started_book_is_clean(run: Run, book: Path) -> None:
    ran = run("check", "--book", book / "entries", "--fail-on", "query", "--json")
    assert ran.code == 0
    found = {finding["rule"] for finding in json.loads(ran.out)["findings"]}
    assert found == {"hazard-species", "record-incomplete"}  # what the sample shows: a caution, and what is missing


def test_every_sample_has_an_identifier_of_its_own(run: Run, tmp_path: Path) -> None:
    for name in ("one", "two"):
        run("start", tmp_path / name)
    assert not _files(tmp_path / "one" / "entries") <= _files(tmp_path / "two" / "entries")


def test_it_says_what_to_do_next(run: Run, tmp_path: Path) -> None:
    ran = run("start", tmp_path / "our book")
    assert f'cd "{tmp_path / "our book"}"\n  handbook check\n  handbook build' in ran.out
    assert f"CI installs tools/{WHEEL}: put it there." in ran.out
    assert ran.err == ""


NAMES = [
    # --title, --group
    ("Conditions that worked", "Building blocks"),
    ("It's #1: α & ω, 'quoted' \"twice\"", "- [not a list] {nor: a mapping}"),
    ("  two  \n lines ", "@home"),
]


@pytest.mark.parametrize(("title", "group"), NAMES)
def test_title_and_group_arrive_as_typed(run: Run, tmp_path: Path, title: str, group: str) -> None:
    assert run("start", tmp_path / "book", "--title", title, "--group", group).code == 0
    settings, findings, _ = read_settings(tmp_path / "book" / "entries" / "handbook.yml", "handbook.yml")
    assert findings == ()
    assert settings is not None
    assert (settings.title, settings.group) == (" ".join(title.split()), group)
    assert yaml.safe_load(_text(tmp_path / "book" / "mkdocs.yml"))["site_name"] == settings.title
    assert settings.engine == tool_version()
    assert not settings.invented


def test_every_line_of_the_settings_that_can_be_switched_on_is_right(book: Path) -> None:
    path = book / "entries" / "handbook.yml"
    text, switched = re.subn(r"^( *)# (?!group)(\w+: \S)", r"\1\2", _text(path), flags=re.MULTILINE)
    assert switched >= 8
    path.write_text(text, "utf-8")
    settings, findings, _ = read_settings(path, "handbook.yml")
    assert [finding.message for finding in findings] == []
    assert settings is not None
    assert None not in {settings.accent, settings.logo, settings.site_address, settings.edit_address, settings.notice}
    jsonschema.validate(yaml.safe_load(text), schemas()["handbook-1.json"])


REFUSED = [
    # folder, options, what is said
    ("full", (), "full is not empty; name a new folder, or an empty one"),
    ("file.txt", (), "file.txt is a file"),
    ("nowhere/book", (), "to start book in; make it first"),
    ("book", ("--title", "x" * 81), "--title: the text has 81 characters; shorten it to 80"),
    ("book", ("--title", "a <b>bold</b> book"), "--title: <b> looks like HTML"),
    ("book", ("--title", " "), "--title: the text is empty"),
    ("book", ("--title", "a bell \x07"), "--title holds a character that cannot be shown"),
    ("book", ("--title", "not UTF-8 \udcff"), "--title holds a character that cannot be shown"),
    ("book", ("--group", "x" * 81), "--group: the text has 81 characters"),
]


@pytest.mark.parametrize(("folder", "options", "said"), REFUSED, ids=[row[2] for row in REFUSED])
def test_a_refusal_is_one_message_and_changes_nothing(
    run: Run, tmp_path: Path, folder: str, options: tuple[str, ...], said: str
) -> None:
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "report.txt").write_text("years of work", "utf-8")
    (tmp_path / "file.txt").write_text("years of work", "utf-8")
    before = sorted(tmp_path.rglob("*"))
    ran = run("start", tmp_path / folder, *options)
    assert (ran.code, ran.out) == (2, "")
    assert ran.err.count("Error:") == 1
    assert said in ran.err
    assert sorted(tmp_path.rglob("*")) == before


@pytest.mark.parametrize("exists", [False, True], ids=["new", "empty"])
def test_a_start_that_breaks_off_leaves_nothing(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, exists: bool
) -> None:
    folder = tmp_path / "book"
    if exists:
        folder.mkdir()
    write, written = Path.write_bytes, []

    def full_disk(path: Path, data: bytes) -> int:
        if len(written) == 7:
            raise OSError(28, "No space left on device", str(path))
        written.append(path)
        return write(path, data)

    monkeypatch.setattr(Path, "write_bytes", full_disk)
    ran = run("start", folder)
    assert (ran.code, ran.out) == (2, "")
    assert "No space left on device" in ran.err
    assert [path for path in tmp_path.rglob("*") if path != folder] == []
    assert folder.exists() is exists


def test_the_working_folder_will_do(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    assert run("start", ".").code == 0
    assert run("check").code == 0
    assert _files(tmp_path) > FILES


def _written_by_windows(path: Path) -> None:
    path.write_bytes(b"\xef\xbb\xbf" + path.read_bytes().replace(b"\n", b"\r\n"))


def test_line_ends_and_byte_order_marks_of_windows_are_read(run: Run, book: Path) -> None:
    before = run("check", "--book", book / "entries", "--json")
    assert json.loads(before.out)["findings"]
    for path in (book / "entries").glob("*.yml"):
        _written_by_windows(path)
    assert run("check", "--book", book / "entries", "--json") == before


# --- what the files say holds ------------------------------------------------------------------------------


def _commands(text: str) -> Iterator[list[str]]:
    """Give the calls of `handbook` in a document or workflow: lines of code, and code inside a sentence."""
    for call in re.findall(r"(?:^(?:.*run:)? *|`)(handbook [a-z]+[^`\n]*)", text, re.MULTILINE):
        yield shlex.split(call, comments=True)


NAMING = ["README.md", ".github/workflows/handbook.yml", ".github/pull_request_template.md", ROOT / "README.md"]


@pytest.mark.parametrize("name", NAMING, ids=["its README", "workflow", "pull request", "our README"])
def test_the_commands_that_are_named_exist(book: Path, name: str | Path) -> None:
    called = list(_commands(_text(book / name)))
    assert called
    for _, command, *arguments in called:
        known = cli.handbook.commands[command]
        known.make_parser(click.Context(known)).parse_args(arguments)  # raises for an option that is not there


ATTRIBUTES = [
    # file, whether git may change its line ends, and to which
    ("entries/azides/NS4T9XQ2N.yml", "auto", "lf"),
    ("requirements.txt", "auto", "lf"),
    ("entries/azides/scheme.rxn", "unset", "lf"),
    ("entries/azides/data/spectrum.txt", "unset", "lf"),
    (f"tools/{WHEEL}", "unset", "lf"),
]


def test_git_leaves_alone_what_is_named_with_its_hash(book: Path) -> None:
    def git(*arguments: str) -> str:
        return subprocess.run(["git", *arguments], cwd=book, capture_output=True, text=True, check=True).stdout

    git("init", "--quiet")
    for file, text, eol in ATTRIBUTES:
        assert git("check-attr", "text", "eol", "--", file) == f"{file}: text: {text}\n{file}: eol: {eol}\n"
    assert git("status", "--porcelain", "--ignored", "--untracked-files=all").count("!!") == 0
    (book / "site").mkdir()
    (book / "site" / "index.html").touch()
    assert "!! site/" in git("status", "--porcelain", "--ignored")


def test_ci_checks_and_builds_every_pull_request(book: Path) -> None:
    workflow = yaml.safe_load(_text(book / ".github/workflows/handbook.yml"))
    triggers = workflow[True]  # YAML 1.1 reads the key `on` as true
    assert "pull_request" in triggers
    assert workflow["permissions"] == {"contents": "read"}
    (job,) = workflow["jobs"].values()
    runs = [step["run"] for step in job["steps"] if "run" in step]
    assert runs[-2:] == ["handbook check --fail-on query", "handbook build"]
    assert runs[-3] == "python -m pip install --requirement requirements.txt"
    assert job["steps"][-1]["with"]["path"] == "site"


def test_mkdocs_is_asked_for_what_the_demonstration_book_asks(book: Path) -> None:
    ours, theirs = (yaml.safe_load(_text(folder / "mkdocs.yml")) for folder in (ROOT, book))
    assert theirs["theme"] == {"name": "material", "font": False}
    assert theirs["plugins"] == ["handbook"]
    assert theirs.keys() == ours.keys()
    for key in ours.keys() - {"site_name", "theme", "plugins"}:
        assert theirs[key] == ours[key]


def test_editors_find_the_schemas(book: Path) -> None:
    bound = json.loads(_text(book / ".vscode" / "settings.json"))["yaml.schemas"]
    assert {(book / schema).exists() for schema in bound} == {True}
    (sample,) = (book / "entries").glob("NS*.yml")
    for schema, glob in bound.items():
        assert list(book.glob(glob)) == [sample if "record" in schema else book / "entries" / "handbook.yml"]
    for path in (book / "entries").glob("*.yml"):
        modeline = _text(path).splitlines()[0].partition("$schema=")[2]
        assert bound[(path.parent / modeline).relative_to(book).as_posix()]


# --- the wheel ---------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Distribution:
    """An installed package that only knows where it came from."""

    origin: str | None

    def read_text(self, name: str) -> str | None:
        assert name == "direct_url.json"
        return self.origin


def _noted(path: Path, **more: Any) -> str:
    return json.dumps({"url": path.as_uri(), **more})


def _hashes(data: bytes) -> dict[str, Any]:
    return {"archive_info": {"hashes": {"sha256": hashlib.sha256(data).hexdigest()}}}


ORIGINS: dict[str, tuple[bool, Callable[[Path], str | None]]] = {
    # whether the wheel comes along, what the installer noted
    "the same file": (True, lambda path: _noted(path, **_hashes(b"a wheel"))),
    "another by now": (False, lambda path: _noted(path, **_hashes(b"an older wheel"))),
    "no hash": (False, lambda path: _noted(path, archive_info={})),
    "gone": (False, lambda path: _noted(path.with_name("gone.whl"), **_hashes(b"a wheel"))),
    "a checkout": (False, lambda path: _noted(path.parent, dir_info={"editable": True})),
    "elsewhere": (
        False,
        lambda path: json.dumps({"url": f"https://packages.example.org{path}", **_hashes(b"a wheel")}),
    ),
    "an index": (False, lambda path: None),
}


@pytest.mark.parametrize(("comes", "noted"), ORIGINS.values(), ids=ORIGINS.keys())
def test_the_wheel_comes_along_where_it_is_still_the_same(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, comes: bool, noted: Callable[[Path], str | None]
) -> None:
    wheel = tmp_path / "down loads" / WHEEL
    wheel.parent.mkdir()
    wheel.write_bytes(b"a wheel")
    monkeypatch.setattr(start, "distribution", lambda name: _Distribution(noted(wheel)))
    ran = run("start", tmp_path / "book")
    kept = tmp_path / "book" / "tools" / WHEEL
    assert kept.exists() is comes
    assert not comes or kept.read_bytes() == b"a wheel"
    assert f"CI installs tools/{WHEEL}{', which is there.' if comes else ': put it there.'}" in ran.out
    required = _text(tmp_path / "book" / "requirements.txt").splitlines()
    assert [line for line in required if not line.startswith("#")] == [f"./tools/{WHEEL}"]


@dataclass(frozen=True)
class Installed:
    """The tool installed from a wheel, with no checkout in reach."""

    wheel: Path
    folder: Path

    def __call__(self, *command: str, cwd: Path) -> subprocess.CompletedProcess[str]:
        environment = {name: value for name, value in os.environ.items() if not name.startswith("PYTHON")}
        environment |= {"SOURCE_DATE_EPOCH": "1796083200", "PYTHONIOENCODING": "utf-8"}  # 2026-12-01
        program = next(self.folder.glob(f"*/{command[0]}"))
        return subprocess.run(
            [program, *command[1:]], cwd=cwd, env=environment, capture_output=True, encoding="utf-8", check=False
        )


@pytest.fixture(scope="module")
def installed(tmp_path_factory: pytest.TempPathFactory) -> Installed:
    """Build the wheel and install it into an environment that borrows what it needs, but not the tool, from ours."""
    source = tmp_path_factory.mktemp("source")
    for folder in ("builder", "site_overrides"):
        shutil.copytree(ROOT / folder, source / folder, ignore=shutil.ignore_patterns("__pycache__"))
    for file in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(ROOT / file, source)
    pip = [sys.executable, "-m", "pip", "--quiet", "--disable-pip-version-check"]
    built, environment = tmp_path_factory.mktemp("dist"), tmp_path_factory.mktemp("environment")
    offline = ["--no-index", "--no-deps"]
    building = [*pip, "wheel", *offline, "--no-build-isolation", "--wheel-dir", str(built), str(source)]
    subprocess.run(building, check=True, cwd=built)
    (wheel,) = built.iterdir()
    subprocess.run([sys.executable, "-m", "venv", "--without-pip", str(environment)], check=True)
    interpreter = next(environment.glob("*/python"))
    subprocess.run([*pip, "--python", str(interpreter), "install", *offline, str(wheel)], check=True, cwd=built)
    # Our folder of packages is named only now, so that pip did not find the tool installed already. Nothing of its own
    # .pth files is read, and so nothing of the checkout.
    (own,) = environment.glob("[Ll]ib/**/site-packages")
    (own / "borrowed.pth").write_text(f"{Path(click.__file__).parents[1]}\n", "utf-8")
    return Installed(wheel, environment)


def _tree(folder: Path) -> set[str]:
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()}


@pytest.mark.slow
def test_the_wheel_carries_all_that_is_no_code(installed: Installed) -> None:
    with ZipFile(installed.wheel) as wheel:
        packed = set(wheel.namelist())
    assert {name for name in packed if not name.startswith(("builder/", "condition_handbook-"))} == set()
    ours = {f"builder/site_overrides/{name}" for name in _tree(ROOT / "site_overrides")}
    package = {f"builder/{name}" for name in _tree(ROOT / "builder") if "__pycache__" not in name}
    assert {name for name in packed if name.startswith("builder/")} == ours | package


@pytest.mark.slow
def test_from_the_wheel_to_a_site_without_a_checkout(installed: Installed, tmp_path: Path) -> None:
    where = tmp_path / "Bücher der Gruppe"
    where.mkdir()
    code = installed("python", "-c", "import builder; print(builder.__file__)", cwd=where)
    assert Path(code.stdout.strip()).is_relative_to(installed.folder), code
    started = installed("handbook", "start", "unser Buch", "--title", "Unser Buch: α", cwd=where)
    assert started.returncode == 0, started
    book = where / "unser Buch"
    assert (book / "tools" / installed.wheel.name).read_bytes() == installed.wheel.read_bytes()
    (sample,) = (path.stem for path in (book / "entries").glob("NS*.yml"))

    new = installed("handbook", "new", "CCC(C)Br", cwd=book)
    assert new.returncode == 0, new
    (path,) = (path for path in (book / "entries").glob("NS*.yml") if path.stem != sample)
    assert installed("handbook", "check", cwd=book).returncode == 1  # its gaps are open
    path.write_text(with_example(f"entry: {path.stem}"), "utf-8")
    _written_by_windows(path)

    checked = installed("handbook", "check", "--fail-on", "query", cwd=book)
    assert (checked.returncode, checked.stderr) == (0, ""), checked
    built = installed("handbook", "build", cwd=book)
    assert built.returncode == 0, built
    site = book / "site"
    assert "Unser Buch: α" in (site / "index.html").read_text("utf-8")
    assert all((site / "e" / name / "index.html").is_file() for name in (sample, path.stem))
    assets = ROOT / "site_overrides" / "assets"
    assert {(site / "assets" / name).read_bytes() == (assets / name).read_bytes() for name in _tree(assets)} == {True}
    assert asked_of_other_hosts(site) == []
