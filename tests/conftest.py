"""Options and fixtures of the whole suite."""

import os
from collections.abc import Callable
from pathlib import Path

import pytest

os.environ["XDG_CACHE_HOME"] = os.devnull  # builds remember nothing, unless a test says where

GOLDEN = Path(__file__).parent / "golden"


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--update-golden", action="store_true", help="write golden files anew; read the diff like code")
    parser.addoption("--screenshots", metavar="DIR", help="write a picture of every template, paper and width there")


@pytest.fixture
def golden(request: pytest.FixtureRequest) -> Callable[[str, str], None]:
    """Compare text with the file of that name under tests/golden, or write it with --update-golden."""

    def compare(name: str, text: str) -> None:
        path = GOLDEN / name
        if request.config.getoption("--update-golden"):
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text, encoding="utf-8", newline="\n")
        assert path.exists(), f"no {path}; run pytest --update-golden and read what it wrote"
        assert text == path.read_text(encoding="utf-8")

    return compare
