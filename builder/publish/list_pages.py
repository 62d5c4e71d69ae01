"""Lists of entries: all of them, and by each value of each facet."""

from collections.abc import Iterable, Mapping, Sequence

from builder.book import Book
from builder.publish.facets import Facet, FacetIndex, FacetValue
from builder.publish.page import Page
from builder.publish.summary import Summary
from builder.publish.templating import render

__all__ = ["list_pages", "newest_first"]


def list_pages(book: Book, summaries: Mapping[str, Summary], indexes: Sequence[FacetIndex]) -> tuple[Page, ...]:
    """Return the page of all entries, and per facet an index and a page per value."""
    notice = book.settings.standing_notice
    pages = [
        Page(
            path="lists/",
            title="Entries",
            description=f"All {len(summaries)} entries, and the lists by which to find them.",
            body=render(
                "lists.html", indexes=indexes, summaries=newest_first(summaries.values()), notice=notice, root="../"
            ),
            menu=("Entries",),
        )
    ]
    for index in indexes:
        pages.append(_index_page(index, notice))
        pages += [_value_page(index.facet, value, summaries, notice) for value in index.values]
    return tuple(pages)


def _index_page(index: FacetIndex, notice: str) -> Page:
    facet = index.facet
    return Page(
        path=f"lists/{facet.key}/",
        title=f"By {facet.title.lower()}",
        description=f"Entries by {facet.title.lower()}, with the number of each.",
        body=render("facet.html", facet=facet, values=index.values, notice=notice, root="../../"),
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
