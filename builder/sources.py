"""The bibliography: every `source` in a rule or table is a key in `sources.toml`."""

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib import resources

__all__ = ["Source", "load_sources", "source_text"]


@dataclass(frozen=True, slots=True)
class Source:
    """One cited work, standard or stated convention.

    how: how its content reached this project: "looked up", "from memory", "convention" or "common practice".
    """

    key: str
    text: str
    how: str


@cache
def load_sources() -> dict[str, Source]:
    """Return the bibliography by key.

    Raises ValueError if an item lacks its text or says something unknown of how it is known.
    """
    raw = tomllib.loads(resources.files("builder").joinpath("sources.toml").read_text("utf-8"))
    found: dict[str, Source] = {}
    for key, item in raw.items():
        how = item.get("how", "")
        if not item.get("text") or how not in {"looked up", "from memory", "convention", "common practice"}:
            raise ValueError(f"sources.toml: {key}: needs text, and how it is known")
        found[key] = Source(key, item["text"], how)
    return found


def source_text(key: str) -> str:
    """Return the citation to print for `key`.

    Raises KeyError for a key that is not in the bibliography.
    """
    source = load_sources()[key]
    return source.text if source.how != "from memory" else f"{source.text} (from memory)"
