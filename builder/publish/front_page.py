"""The front page: the state of the book, and the ways in."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from builder.book import Book, Verdict
from builder.finding import Level
from builder.publish.entry_view import next_review
from builder.publish.facets import FacetIndex
from builder.publish.list_pages import newest_first
from builder.publish.page import Page
from builder.publish.summary import Summary
from builder.publish.templating import render
from builder.records.vocabulary import Status

__all__ = ["StateOfBook", "front_page", "state_of_book"]

NEWEST_SHOWN = 5


@dataclass(frozen=True, slots=True)
class StateOfBook:
    """What stands in the book today; every number counts entries, save the two of findings."""

    entries: int
    by_verdict: tuple[tuple[str, str, int], ...]
    failures: int
    drafts: int
    retired: int
    unreviewed: int
    overdue: int
    open_queries: int
    cautions: int
    on: str


def state_of_book(book: Book, summaries: Mapping[str, Summary]) -> StateOfBook:
    """Return the counts of the front page; by_verdict holds word, key and number."""
    reviews = [next_review(entry.record, book.settings) for entry in book.entries]
    statuses = [entry.record.status for entry in book.entries]
    verdicts = [entry.verdict for entry in book.entries]
    return StateOfBook(
        entries=len(book.entries),
        by_verdict=tuple(
            (str(verdict), verdict.name.lower().replace("_", "-"), verdicts.count(verdict)) for verdict in Verdict
        ),
        failures=sum(summary.is_failure for summary in summaries.values()),
        drafts=statuses.count(Status.DRAFT),
        retired=statuses.count(Status.SUPERSEDED) + statuses.count(Status.WITHDRAWN),
        unreviewed=reviews.count(None),
        overdue=sum(due is not None and due < book.today for due in reviews),
        open_queries=book.count(Level.QUERY),
        cautions=book.count(Level.CAUTION),
        on=book.today.isoformat(),
    )


def front_page(book: Book, summaries: Mapping[str, Summary], indexes: Sequence[FacetIndex]) -> Page:
    """Return the front page."""
    current = [summary for summary in newest_first(summaries.values()) if not summary.is_retired]
    contrary = [summary for summary in current if summary.verdict == Verdict.CONTRARY]
    return Page(
        path="",
        title=book.settings.title,
        description=f"{book.settings.title}: {len(book.entries)} entries of conditions, each checked and cited.",
        body=render(
            "front.html",
            settings=book.settings,
            state=state_of_book(book, summaries),
            newest=current[:NEWEST_SHOWN],
            contrary=contrary,
            failures=[summary for summary in current if summary.is_failure],
            indexes=indexes,
            notice=book.settings.standing_notice,
            root="",
        ),
        menu=("State of the book",),
    )
