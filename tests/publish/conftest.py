"""Fixtures: the handmade book, its pages, and what their HTML holds."""

from dataclasses import replace

import pytest

from builder.book import Book, Verdict
from builder.checks.register import all_rules
from builder.publish.page import Page
from builder.publish.pages import build_pages
from builder.publish.portrait import Portrait
from tests.publish.handmade import CAUTION, QUERY, REMARK, Markup, book_of, entry_of, text_of


@pytest.fixture(scope="session")
def book() -> Book[Portrait]:
    return book_of(
        entry_of(text_of("NS2H8WDRW"), CAUTION),
        entry_of(text_of("NS3V6TDMZ")),
        entry_of(text_of("NS7K3QFMC"), verdict=Verdict.NOT_COVERED),
        entry_of(text_of("NS9PZ4GK7"), replace(QUERY, accepted="seen three times"), verdict=Verdict.EXPLAINED),
        entry_of(text_of("NSC0W7N51"), CAUTION, QUERY, REMARK, verdict=Verdict.CONTRARY),
    )


@pytest.fixture(scope="session")
def pages(book: Book[Portrait]) -> dict[str, Page]:
    return {page.path: page for page in build_pages(book, tuple(all_rules().values()))}


@pytest.fixture(scope="session")
def markup(pages: dict[str, Page]) -> dict[str, Markup]:
    return {path: Markup(page.body) for path, page in pages.items()}
