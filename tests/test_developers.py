"""The map in DEVELOPERS.md names every module, and nothing that does not exist."""

import re
import tomllib
from pathlib import Path

ROOT = Path(__file__).parents[1]
MAP = (ROOT / "DEVELOPERS.md").read_text("utf-8").split("```")[1]


def test_the_map_is_true() -> None:
    modules = {path.name for path in (ROOT / "builder").rglob("*.py")}
    named = set(re.findall(r"\b[a-z_]+\.py\b", MAP))
    assert named == modules - {"__init__.py"}


def test_every_package_is_packed() -> None:
    settings = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["tool"]["setuptools"]
    folders = [path.parent.relative_to(ROOT) for path in (ROOT / "builder").rglob("__init__.py")]
    assert settings["packages"] == sorted([".".join(folder.parts) for folder in folders] + ["builder.site_overrides"])


def test_the_tables_it_names_exist() -> None:
    tables = {path.name for path in (ROOT / "builder").rglob("*.t*") if path.suffix in {".tsv", ".toml"}}
    assert set(re.findall(r"\b[a-z_]+\.(?:tsv|toml)\b", MAP)) <= tables
