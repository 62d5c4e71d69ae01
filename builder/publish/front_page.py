"""The front page: the state of the book, where it is thin, and the ways in."""

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from builder.book import Book, Verdict
from builder.finding import Level
from builder.publish.entry_view import next_review
from builder.publish.facets import FacetIndex
from builder.publish.figures import how_many
from builder.publish.kindred import ContradictionPair
from builder.publish.page import Page
from builder.publish.portrait import Portrait
from builder.publish.summary import Summary, newest_first
from builder.publish.templating import deferred
from builder.records.vocabulary import Status

__all__ = ["StateOfBook", "ThinSpot", "front_page", "state_of_book", "thin_spots"]

NEWEST_SHOWN = 6
SHOWN_OF_A_KIND = 6
"""Entries that the front page lists as contrary, explained, failed or contradicted; the lists hold all."""

_MEANINGS = {
    Verdict.IN_LINE: "what was seen is what the engine can defend",
    Verdict.CONTRARY: "what was seen differs from that, and no reason is accepted yet",
    Verdict.EXPLAINED: "it differs, and a reviewer has accepted the reason",
    Verdict.NOT_COVERED: "the engine has no say in this reaction",
}


@dataclass(frozen=True, slots=True)
class StateOfBook:
    """What stands in the book today; numbers count entries, save those of queries, cautions and contradictions."""

    entries: int
    by_verdict: tuple[tuple[str, str, int], ...]
    failures: int
    drafts: int
    retired: int
    unreviewed: int
    overdue: int
    single_runs: int
    open_queries: int
    cautions: int
    contradictions: int
    open_contradictions: int
    on: str


@dataclass(frozen=True, slots=True)
class ThinSpot:
    """Values of one facet on which the book has little to say: those with one entry, with its identifier, and none."""

    title: str
    once: tuple[tuple[str, str], ...]
    never: tuple[str, ...]


def state_of_book(
    book: Book[Portrait], summaries: Mapping[str, Summary], pairs: Sequence[ContradictionPair]
) -> StateOfBook:
    """Return the counts of the front page; by_verdict holds word, key and number. pairs: those that contradict."""
    reviews = [next_review(entry.record, book.settings) for entry in book.entries]
    statuses = [entry.record.status for entry in book.entries]
    verdicts = Counter(entry.verdict for entry in book.entries if not summaries[entry.id].is_retired)
    return StateOfBook(
        entries=len(book.entries),
        by_verdict=tuple((str(verdict), verdict.key, verdicts[verdict]) for verdict in Verdict),
        failures=sum(summary.is_failure for summary in summaries.values()),
        drafts=statuses.count(Status.DRAFT),
        retired=sum(status.is_retired for status in statuses),
        unreviewed=reviews.count(None),
        overdue=sum(due is not None and due < book.today for due in reviews),
        single_runs=sum((entry.record.performed.runs or 1) == 1 for entry in book.entries),
        open_queries=book.count(Level.QUERY),
        cautions=book.count(Level.CAUTION),
        contradictions=len(pairs),
        open_contradictions=sum(pair.is_open for pair in pairs),
        on=book.today.isoformat(),
    )


def thin_spots(indexes: Sequence[FacetIndex], summaries: Mapping[str, Summary]) -> tuple[ThinSpot, ...]:
    """Return the facets with a closed list of values of which some have one entry in force, or none."""
    found = []
    for index in indexes:
        if index.facet.known is None:
            continue
        in_force = {
            value.value: [entry.id for entry in value.entries if not summaries[entry.id].is_retired]
            for value in index.values
        }
        found.append(
            ThinSpot(
                index.facet.title,
                once=tuple((value, ids[0]) for value, ids in in_force.items() if len(ids) == 1),
                never=tuple(value for value in index.facet.known() if not in_force.get(value)),
            )
        )
    return tuple(spot for spot in found if spot.once or spot.never)


def front_page(
    book: Book[Portrait],
    summaries: Mapping[str, Summary],
    indexes: Sequence[FacetIndex],
    pairs: Sequence[ContradictionPair],
) -> Page:
    """Return the front page; pairs: the entries that contradict each other, those first that want a reason."""
    current = [summary for summary in newest_first(summaries.values()) if not summary.is_retired]
    by_verdict = {
        verdict: [summary for summary in current if summary.verdict == verdict]
        for verdict in (Verdict.CONTRARY, Verdict.EXPLAINED)
    }
    entries = how_many(len(book.entries), "entry", "entries")
    return Page(
        kind="front",
        path="",
        title=book.settings.title,
        description=f"{book.settings.title}: conditions in {entries}, each checked and cited.",
        write=deferred(
            "front.html",
            settings=book.settings,
            state=state_of_book(book, summaries, pairs),
            meanings=[(str(verdict), words) for verdict, words in _MEANINGS.items()],
            newest=current[:NEWEST_SHOWN],
            contrary=by_verdict[Verdict.CONTRARY][:SHOWN_OF_A_KIND],
            explained=by_verdict[Verdict.EXPLAINED][:SHOWN_OF_A_KIND],
            failures=[summary for summary in current if summary.is_failure][:SHOWN_OF_A_KIND],
            pairs=pairs[:SHOWN_OF_A_KIND],
            thin=thin_spots(indexes, summaries),
            indexes=indexes,
            root="",
        ),
        menu="State",
    )
