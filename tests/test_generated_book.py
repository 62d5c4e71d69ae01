"""The generated book that the build is measured with: records that read, differ, and are the same every time."""

from pathlib import Path

from builder.book import Book, open_book
from builder.finding import Level
from builder.records.vocabulary import Mechanism, Status
from tests.generated_book import generated_texts, write_generated_book
from tests.specimens import TODAY

ENTRIES = 40
OTHER_SEED = 7


def _book(folder: Path, entries: int) -> Book:
    write_generated_book(folder, entries)
    return open_book(folder, today=TODAY)


def test_every_record_is_without_error(tmp_path: Path) -> None:
    book = _book(tmp_path / "entries", ENTRIES)
    assert [f"{f.place} {f.rule}: {f.message}" for f in book.findings if f.level is Level.ERROR] == []
    assert len(book.entries) == ENTRIES
    assert book.settings.invented


def test_the_records_differ_as_those_of_a_group_do() -> None:
    texts = [text for _, text in generated_texts(1000)]
    assert len({text.partition("title: ")[2].partition("\n")[0] for text in texts}) == len(texts)
    assert {f"mechanism: {each}" in text for text in texts for each in (Mechanism.SN2, Mechanism.E2)} == {True, False}
    for word, least in (("failure:", 20), ("preceded_by:", 10), ("related:", 100), (f"status: {Status.SUPERSEDED}", 5)):
        assert least <= sum(word in text for text in texts) < len(texts), word


def test_a_seed_gives_the_same_records_every_time() -> None:
    first = list(generated_texts(ENTRIES))
    assert first == list(generated_texts(ENTRIES))
    assert not set(first) & set(generated_texts(ENTRIES, OTHER_SEED))
