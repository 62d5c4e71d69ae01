"""Lists of entries: all of them, by each value of each facet, the sequences they make, those that contradict."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from builder.book import Book, Verdict
from builder.publish.facets import Facet, FacetIndex, FacetValue
from builder.publish.figures import how_many, joined
from builder.publish.kindred import ContradictionPair
from builder.publish.neighbours import SequenceView
from builder.publish.page import Page
from builder.publish.portrait import Portrait
from builder.publish.summary import Summary, newest_first
from builder.publish.templating import deferred

__all__ = ["Tally", "list_pages", "tally"]


@dataclass(frozen=True, slots=True)
class Tally:
    """What a list holds, in numbers of entries; lately is the take-away of the newest that has one."""

    entries: int
    in_line: int
    differ: int
    not_covered: int
    failed: int
    retired: int
    lately: str

    @property
    def words(self) -> str:
        """Return the numbers in words, those that are none left out; empty where nothing can be said."""
        numbers = (self.in_line, self.differ, self.not_covered, self.failed, self.retired)
        words = ("in line", "contrary or explained", "not covered", "failed", "superseded or withdrawn")
        return joined(f"{number} {word}" for number, word in zip(numbers, words, strict=True) if number)


@dataclass(frozen=True, slots=True)
class _Row:
    """A value of a facet as its index lists it."""

    value: FacetValue
    tally: Tally


def tally(summaries: Iterable[Summary]) -> Tally:
    """Return the numbers of a list; contrary and explained ones differ, what is retired has no verdict."""
    listed = newest_first(summaries)
    verdicts = [summary.verdict for summary in listed if not summary.is_retired]
    return Tally(
        entries=len(listed),
        in_line=verdicts.count(Verdict.IN_LINE),
        differ=verdicts.count(Verdict.CONTRARY) + verdicts.count(Verdict.EXPLAINED),
        not_covered=verdicts.count(Verdict.NOT_COVERED),
        failed=sum(summary.is_failure for summary in listed),
        retired=sum(summary.is_retired for summary in listed),
        lately=next((summary.take_away for summary in listed if summary.take_away), ""),
    )


def list_pages(
    book: Book[Portrait],
    summaries: Mapping[str, Summary],
    indexes: Sequence[FacetIndex],
    sequences: Sequence[SequenceView],
    pairs: Sequence[ContradictionPair],
) -> tuple[Page, ...]:
    """Return the pages of all entries, of sequences and of contradictions, per facet an index and a page per value."""
    everything = newest_first(summaries.values())
    pages = [
        Page(
            kind="list",
            path="lists/",
            title="Entries",
            description=f"{how_many(len(book.entries), 'entry', 'entries')}, and the lists by which to find them.",
            write=deferred(
                "lists.html",
                indexes=indexes,
                summaries=everything,
                tally=tally(everything),
                sequences=len(sequences),
                contradictions=len(pairs),
                root="../",
            ),
            menu="Entries",
        ),
        Page(
            kind="list",
            path="lists/sequences/",
            title="Sequences",
            description="Runs of entries in which each makes the substrate of the next.",
            write=deferred("sequences.html", sequences=sequences, root="../../"),
            section="lists/",
        ),
        Page(
            kind="list",
            path="lists/contradictions/",
            title="Contradictions",
            description="Pairs of entries that ran one reaction under near-same conditions with another outcome.",
            write=deferred("contradictions.html", pairs=pairs, root="../../"),
            section="lists/",
        ),
    ]
    for index in indexes:
        pages.append(_index_page(index, summaries))
        pages += [_value_page(index.facet, value, summaries) for value in index.values]
    return tuple(pages)


def _index_page(index: FacetIndex, summaries: Mapping[str, Summary]) -> Page:
    facet = index.facet
    rows = [_Row(value, tally(summaries[entry.id] for entry in value.entries)) for value in index.values]
    return Page(
        kind="list",
        path=f"lists/{facet.key}/",
        title=f"By {facet.title.lower()}",
        description=f"Entries by {facet.title.lower()}, with the number of each.",
        write=deferred("facet.html", facet=facet, rows=rows, root="../../"),
        section="lists/",
    )


def _value_page(facet: Facet, value: FacetValue, summaries: Mapping[str, Summary]) -> Page:
    rows = newest_first([summaries[entry.id] for entry in value.entries])
    return Page(
        kind="list",
        path=f"lists/{facet.key}/{value.slug}/",
        title=f"{facet.title}: {value.value}",
        description=f"{how_many(len(rows), 'entry', 'entries')} with {facet.title.lower()} {value.value}.",
        write=deferred(
            "facet_value.html", facet=facet, value=value.value, summaries=rows, tally=tally(rows), root="../../../"
        ),
        section="lists/",
    )
