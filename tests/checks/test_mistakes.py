"""Two hundred mistakes are caught where they stand; two hundred honest records, rounded as one rounds, stay silent."""

from collections import Counter

import pytest

from tests.honest_records import COUNT, honest_records
from tests.mistakes import MISTAKES, MISTAKES_EACH, RECORDS, Mistaken, complaints, found_instead, mistaken_records

SEED = 20261201
SHARE = 20


@pytest.fixture(scope="module")
def all_mistaken() -> list[Mistaken]:
    return list(mistaken_records(SEED))


@pytest.mark.parametrize("entry", RECORDS)
def test_mistakes_are_caught_where_they_stand(entry: str, all_mistaken: list[Mistaken]) -> None:
    made = [mistaken for mistaken in all_mistaken if mistaken.entry == entry]
    assert len(made) == MISTAKES_EACH
    missed = {each.mistake.name: instead for each in made if (instead := found_instead(each)) is not None}
    assert missed == {}


def test_every_kind_of_mistake_was_made(all_mistaken: list[Mistaken]) -> None:
    made = Counter(mistaken.mistake.name for mistaken in all_mistaken)
    assert {mistake.name for mistake in MISTAKES if made[mistake.name] < 3} == set()


@pytest.mark.parametrize("first", range(0, COUNT, SHARE))
def test_honest_records_stay_silent(first: int) -> None:
    records = honest_records(SEED, range(first, first + SHARE))
    assert [complaint for honest in records for complaint in complaints(honest)] == []
