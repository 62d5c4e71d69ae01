"""Portraits are made of every record that can be read, before anybody knows whether it is fit to be published."""

import pickle
from pathlib import Path

import pytest

from builder.book import Book, examine
from builder.publish.portrait import Portrait, portrait_of
from builder.records.reader import read_bytes
from tests.publish.handmade import GOOD
from tests.specimens import PLAIN, TODAY

BAD = sorted((GOOD.parent / "bad").glob("*/*.yml"))


@pytest.mark.parametrize("path", BAD, ids=[f"{path.parent.name}/{path.stem}" for path in BAD])
def test_a_fault_in_a_record_is_no_fault_of_ours(path: Path) -> None:
    examined = examine(read_bytes(path.read_bytes(), path.name), PLAIN, TODAY, keep=portrait_of)
    assert examined.reading.record is None or examined.kept is not None


def test_portraits_are_plain_data(book: Book[Portrait]) -> None:
    for entry in book.entries:
        assert pickle.loads(pickle.dumps(entry.kept)) == entry.kept
