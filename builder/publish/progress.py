"""A progress bar for long work, on a terminal only."""

import sys
from collections.abc import Iterable
from typing import TypeVar

import click

__all__ = ["watched"]

T = TypeVar("T")


def watched(items: tuple[T, ...]) -> Iterable[T]:
    """Yield the items, with a bar on the terminal while they are worked on."""
    with click.progressbar(items, label="reading records", file=sys.stderr, hidden=not sys.stderr.isatty()) as bar:
        yield from bar
