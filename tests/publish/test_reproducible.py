"""The demonstration book built in two places, at other times and in another zone: the same bytes."""

import os
import shutil
from pathlib import Path

import pytest

from tests.browser.built import ROOT, build, files_of

pytestmark = pytest.mark.slow


def _checkout(folder: Path, *, modified: float) -> Path:
    """Copy what a build reads as one checkout would leave it, every file with this time; return the config's path."""
    for name in ("entries", "site_overrides"):
        shutil.copytree(ROOT / name, folder / name)
    shutil.copy(ROOT / "mkdocs.yml", folder)
    for path in folder.rglob("*"):
        os.utime(path, (modified, modified))
    return folder / "mkdocs.yml"


def test_two_checkouts_build_the_same_bytes(tmp_path: Path) -> None:
    one = build(_checkout(tmp_path / "one", modified=1.2e9), PYTHONHASHSEED="1", TZ="Pacific/Auckland")
    other = build(
        _checkout(tmp_path / "another place" / "with a longer path", modified=1.7e9),
        PYTHONHASHSEED="2",
        TZ="America/Anchorage",
        LC_ALL="C",
    )
    assert one.code == other.code == 0, one.out + other.out
    first, second = files_of(one.site), files_of(other.site)
    assert sorted(first) == sorted(second)
    assert [path for path in first if first[path] != second[path]] == []
