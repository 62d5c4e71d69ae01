"""build_pages(book) -> the whole site as text: what the plugin hands to MkDocs, and any other host could take."""

from collections.abc import Sequence

from builder.book import Book
from builder.checks.register import all_rules
from builder.publish.caution_pages import caution_page
from builder.publish.entry_view import surroundings_of
from builder.publish.facets import facet_indexes
from builder.publish.form_page import form_page
from builder.publish.front_page import front_page
from builder.publish.guide_pages import guide_pages
from builder.publish.kindred import contradicting_pairs
from builder.publish.list_pages import list_pages
from builder.publish.page import Page
from builder.publish.portrait import Portrait, summarise
from builder.publish.record_page import entry_page
from builder.publish.rule_pages import rule_pages
from builder.rule import Rule

__all__ = ["build_pages"]


def build_pages(book: Book[Portrait], rules: Sequence[Rule[object, object]] | None = None) -> tuple[Page, ...]:
    """Return every page of the site, those of the menu in its order.

    rules: those that get a page; all of them unless said otherwise.
    """
    rules = tuple(all_rules().values()) if rules is None else rules
    summaries = {entry.id: summarise(entry) for entry in book.entries}
    indexes = facet_indexes(book.entries)
    around = surroundings_of(book, summaries, rules)
    runs = dict.fromkeys(run for entry in book.entries for run in around.sequences.get(entry.id, ()))
    pairs = contradicting_pairs(around.relatives, summaries)
    return (
        front_page(book, summaries, indexes, pairs),
        *list_pages(book, summaries, indexes, tuple(runs), pairs),
        *rule_pages(book, rules),
        caution_page(book),
        *guide_pages(book),
        form_page(book),
        *(entry_page(entry, around) for entry in book.entries),
    )
