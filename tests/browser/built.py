"""A small book, built into a site by the real plugin in a child process."""

import os
import shutil
import subprocess
import sys
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).parents[2]
GOOD = ROOT / "tests" / "data" / "records" / "good"
RECORDS = ("NS2H8WDRW", "NS3V6TDMZ", "NS7K3QFMC", "NS9PZ4GK7", "NSC0W7N51")
SETTINGS = """\
format: 1
title: A book <bx>for</bx> tests
notice: Every entry is invented.
site_address: https://handbook.example/group/book/
edit_address: https://forge.example/book/edit/main/entries/
"""
DAY = "1796083200"  # 2026-12-01


@dataclass(frozen=True)
class Build:
    """What a build left: its exit code, what it printed, the folder of the site."""

    code: int
    out: str
    site: Path


def write_book(folder: Path, texts: Iterable[tuple[str, str]], settings: str = SETTINGS) -> Path:
    """Write mkdocs.yml, settings and records (path below entries, text) into `folder`; return the config's path."""
    shutil.copy(ROOT / "mkdocs.yml", folder)
    for path, text in (("handbook.yml", settings), *texts):
        place = folder / "entries" / path
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_text(text, "utf-8")
    return folder / "mkdocs.yml"


def files_of(folder: Path) -> dict[str, bytes]:
    """Return every file below a folder by its path there."""
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def good_texts() -> list[tuple[str, str]]:
    """Return five good records with their file names."""
    return [(f"{name}.yml", (GOOD / f"{name}.yml").read_text("utf-8")) for name in RECORDS]


def build(config: Path, **environment: str) -> Build:
    """Run `mkdocs build --strict` as a user would; environment: variables that differ from the usual ones."""
    variables = {**mkdocs_environment(), **environment}
    ran = subprocess.run(mkdocs_command(config), env=variables, capture_output=True, text=True, check=False)
    return Build(ran.returncode, ran.stdout + ran.stderr, config.parent / "site")


def mkdocs_command(config: Path, *, strict: bool = True) -> list[str]:
    """Return the command that builds the site beside its mkdocs.yml."""
    how = ["--strict"] if strict else []
    return [sys.executable, "-m", "mkdocs", "build", *how, "-f", str(config), "-d", str(config.parent / "site")]


def mkdocs_environment() -> dict[str, str]:
    """Return the environment of a build on a fixed day."""
    return {
        **os.environ,
        "NO_MKDOCS_2_WARNING": "1",
        "PYTHONDONTWRITEBYTECODE": "",  # compiled once, as everywhere but in some containers
        "PYTHONHASHSEED": "0",
        "PYTHONUTF8": "1",
        "SOURCE_DATE_EPOCH": DAY,
        "XDG_CACHE_HOME": os.devnull,  # every build begins anew
    }
