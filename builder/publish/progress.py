"""A progress bar for long work, on a terminal only."""

import sys
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import TypeVar

import click

__all__ = ["counted", "watched"]

T = TypeVar("T")


def watched(items: tuple[T, ...]) -> Iterable[T]:
    """Yield the items, with a bar on the terminal while they are worked on."""
    with click.progressbar(items, label="reading records", file=sys.stderr, hidden=not sys.stderr.isatty()) as bar:
        yield from bar


@contextmanager
def counted(label: str, length: int) -> Iterator[Callable[[int], None]]:
    """Give a function to call with each further part done of `length`, with a bar on the terminal."""
    with click.progressbar(
        length=length, label=label, file=sys.stderr, hidden=not sys.stderr.isatty(), show_pos=False
    ) as bar:
        yield bar.update
