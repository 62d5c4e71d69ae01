"""A progress bar for long work, on a terminal only."""

import sys
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import TypeVar

import click

__all__ = ["counted", "stepped", "watched"]

T = TypeVar("T")


def watched(done: Iterator[T], length: int) -> Iterable[T]:
    """Yield what is done, of `length` in all, with a bar on the terminal meanwhile."""
    with click.progressbar(
        done, length=length, label="reading records", file=sys.stderr, hidden=not sys.stderr.isatty()
    ) as bar:
        yield from bar


@contextmanager
def counted(label: str, length: int) -> Iterator[Callable[[int], None]]:
    """Give a function to call with each further part done of `length`, with a bar on the terminal."""
    with click.progressbar(
        length=length, label=label, file=sys.stderr, hidden=not sys.stderr.isatty(), show_pos=False
    ) as bar:
        yield bar.update


@contextmanager
def stepped(label: str) -> Iterator[Callable[[int, int], None]]:
    """Give a function to call with (steps done, steps in all), with a bar on the terminal."""
    with click.progressbar(length=1, label=label, file=sys.stderr, hidden=not sys.stderr.isatty()) as bar:

        def told(done: int, in_all: int) -> None:
            bar.length = in_all
            bar.update(done - bar.pos)

        yield told
