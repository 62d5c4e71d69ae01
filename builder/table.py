"""The tables of facts: tab-separated text with `#` lines on top that state quantity, unit, source and range.

Each table stands beside its one loader, which gives the rows their types; the form of all of them is read here.
"""

from collections import Counter
from collections.abc import Iterator, Sequence
from importlib import resources

from builder.sources import load_sources

__all__ = ["NOTHING", "refuse_twice", "rows_of", "table_text"]

NOTHING = "-"
"""Stands in a cell that holds no value, so that a forgotten cell can be told from an empty one."""


def table_text(package: str, name: str) -> str:
    """Return the text of a table that lies in a package."""
    return resources.files(package).joinpath(name).read_text("utf-8")


def rows_of(name: str, text: str, columns: Sequence[str]) -> Iterator[dict[str, str]]:
    """Yield the rows of a table by column, comment lines left out.

    Raises ValueError for a wrong header, a blank or missing cell, and an unknown key in a column of sources (`source`
    or one that ends so); `name` is for the message.
    """
    lines = [line.split("\t") for line in text.splitlines() if line and not line.startswith("#")]
    if not lines or lines[0] != list(columns):
        raise ValueError(f"{name}: the header must read {' '.join(columns)}")
    for cells in lines[1:]:
        if len(cells) != len(columns) or not all(cell.strip() for cell in cells):
            raise ValueError(f"{name}: {cells[0]}: a cell is blank or missing; write {NOTHING} for no value")
        row = dict(zip(columns, cells, strict=True))
        for column, cell in row.items():
            if column.endswith("source") and cell != NOTHING and cell not in load_sources():
                raise ValueError(f"{name}: {cells[0]}: unknown source {cell}")
        yield row


def refuse_twice(name: str, what: str, keys: Sequence[str]) -> None:
    """Raise ValueError if a key that must be unique is given twice."""
    twice = sorted(key for key, count in Counter(keys).items() if count > 1)
    if twice:
        raise ValueError(f"{name}: {what} given twice: {', '.join(twice)}")
