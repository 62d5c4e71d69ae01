"""The demonstration book: free of errors and open queries, wide enough, and read alike by a second toolkit."""

from functools import cache
from pathlib import Path

import pytest
from indigo import Indigo
from indigo.inchi import IndigoInchi

from builder.book import Book, Entry, Verdict, open_book
from builder.checks.case import Case
from builder.chemistry.perception import attacking_atoms
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.records.vocabulary import Mechanism, Result
from tests.specimens import TODAY

ENTRIES = Path(__file__).parents[1] / "entries"


@cache
def _book() -> Book[Case]:
    return open_book(ENTRIES, today=TODAY)


@cache
def _indigo() -> tuple[Indigo, IndigoInchi]:
    indigo = Indigo()
    return indigo, IndigoInchi(indigo)


def _products(entry: Entry[Case]) -> list[Structure]:
    return [
        entry.kept.structures[("outcome", "products", index)] for index in range(len(entry.record.outcome.products))
    ]


def test_it_has_no_error_and_no_open_query() -> None:
    heavy = [f for f in _book().findings if f.accepted is None and f.level in {Level.ERROR, Level.QUERY}]
    assert [(finding.rule, str(finding.place)) for finding in heavy] == []


def test_every_file_is_an_entry() -> None:
    assert len(_book().entries) == len(_book().files) >= 20


def test_it_is_marked_as_invented() -> None:
    settings = _book().settings
    assert settings.invented
    assert settings.notice is not None
    assert "invented" in settings.notice


def test_it_spans_the_field() -> None:
    records = [entry.record for entry in _book().entries]
    mechanisms = {record.outcome.claim.mechanism for record in records if record.outcome.claim}
    results = {result for record in records for result in record.outcome.result}
    classes = {name for record in records for name in record.substrate.classes}
    kinds = {
        nucleophile.kind
        for entry in _book().entries
        for index in range(len(entry.record.nucleophiles))
        for nucleophile in attacking_atoms(entry.kept.structures[("nucleophile", index)])[:1]
    }
    assert mechanisms >= set(Mechanism)
    assert results >= set(Result) - {Result.DECOMPOSITION}
    assert classes >= {"methyl", "primary", "secondary", "tertiary", "allylic", "benzylic", "neopentyl", "alkene"}
    assert len({record.substrate.leaving_group for record in records}) >= 12
    assert len(kinds) >= 15
    assert any(record.outcome.failure for record in records)
    assert any(record.outcome.rate_constant and record.outcome.time_course for record in records)
    assert any(len(record.stages) == 2 for record in records)


def test_an_explained_contrary_entry_shows_that_observation_outranks_theory() -> None:
    assert [entry.verdict for entry in _book().entries].count(Verdict.EXPLAINED) >= 1
    assert [entry.verdict for entry in _book().entries].count(Verdict.CONTRARY) == 0


# Outside reference: epam-indigo (PyPI), an independent toolkit with its own stereo perception and InChI binding.
@pytest.mark.parametrize("entry", _book().entries, ids=lambda entry: entry.id)
def test_a_second_toolkit_reads_every_product_alike(entry: Entry[Case]) -> None:
    indigo, inchi = _indigo()
    for product in _products(entry):
        read = indigo.loadMolecule(product.typed)
        assert inchi.getInchi(read) == product.inchi
        assert indigo.loadMolecule(product.typed).countStereocenters() == product.stereocentres.specified
