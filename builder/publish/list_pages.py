"""Lists of entries: all of them, and by each value of each facet."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from builder.book import Book
from builder.publish.facets import FACETS, Facet, FacetValue, facet_values
from builder.publish.page import Page
from builder.publish.summary import Summary
from builder.publish.templating import render

__all__ = ["FacetCount", "FacetCounts", "facet_counts", "list_pages", "newest_first"]


@dataclass(frozen=True, slots=True)
class FacetCount:
    """One value of a facet: its address below the facet's, and how many entries have it."""

    value: str
    slug: str
    count: int


@dataclass(frozen=True, slots=True)
class FacetCounts:
    """One facet with its values, in alphabetical order."""

    key: str
    title: str
    short: str
    values: tuple[FacetCount, ...]


def facet_counts(book: Book) -> tuple[FacetCounts, ...]:
    """Return every facet with the count of each of its values."""
    return tuple(
        FacetCounts(
            facet.key,
            facet.title,
            facet.short,
            tuple(FacetCount(v.value, v.slug, len(v.entries)) for v in facet_values(facet, book.entries)),
        )
        for facet in FACETS
    )


def list_pages(book: Book, summaries: Mapping[str, Summary]) -> tuple[Page, ...]:
    """Return the page of all entries, and per facet an index and a page per value."""
    notice = book.settings.standing_notice
    counts = facet_counts(book)
    pages = [
        Page(
            path="lists/",
            title="Entries",
            description=f"All {len(summaries)} entries, and the lists by which to find them.",
            body=render(
                "lists.html", facets=counts, summaries=newest_first(summaries.values()), notice=notice, root="../"
            ),
            menu=("Entries",),
        )
    ]
    for facet, facet_count in zip(FACETS, counts, strict=True):
        pages.append(_index_page(facet_count, notice))
        pages += [_value_page(facet, value, summaries, notice) for value in facet_values(facet, book.entries)]
    return tuple(pages)


def _index_page(facet: FacetCounts, notice: str) -> Page:
    return Page(
        path=f"lists/{facet.key}/",
        title=f"By {facet.title.lower()}",
        description=f"Entries by {facet.title.lower()}, with the number of each.",
        body=render("facet.html", facet=facet, notice=notice, root="../../"),
        menu=("Entries", facet.short),
    )


def _value_page(facet: Facet, value: FacetValue, summaries: Mapping[str, Summary], notice: str) -> Page:
    rows = newest_first([summaries[entry.id] for entry in value.entries])
    return Page(
        path=f"lists/{facet.key}/{value.slug}/",
        title=f"{facet.title}: {value.value}",
        description=f"{len(rows)} entries with {facet.title.lower()} {value.value}.",
        body=render(
            "facet_value.html", facet=facet, value=value.value, summaries=rows, notice=notice, root="../../../"
        ),
    )


def newest_first(summaries: Iterable[Summary]) -> tuple[Summary, ...]:
    """Return the newest first, those of one day by identifier; what no longer holds comes last."""
    by_id = sorted(summaries, key=lambda summary: summary.id)
    by_date = sorted(by_id, key=lambda summary: summary.date, reverse=True)
    return tuple(sorted(by_date, key=lambda summary: summary.is_retired))
