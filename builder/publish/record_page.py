"""One entry -> its page: the view rendered as HTML, with the files a reader may take away."""

from collections.abc import Iterator
from functools import partial

from builder.book import Entry
from builder.publish.entry_view import Surroundings, edit_path, view_entry
from builder.publish.page import Asset, Page, Written
from builder.publish.portrait import Portrait
from builder.publish.templating import render

__all__ = ["entry_page"]

ROOT = "../../"
"""From an entry's page to the site's root."""


def entry_page(entry: Entry[Portrait], around: Surroundings) -> Page:
    """Return the page of an entry with its downloads."""
    summary, path = around.summaries[entry.id], f"e/{entry.id}/"
    return Page(
        kind="entry",
        path=path,
        title=summary.title,
        write=partial(_write, entry, around),
        section="lists/",
        description=summary.take_away or f"{summary.conditions}. {summary.outcome}",
        source=edit_path(entry, around),
        indexed=not summary.is_retired,
        assets=tuple(_downloads(entry, path)),
    )


def _write(entry: Entry[Portrait], around: Surroundings) -> Written:
    view = view_entry(entry, around)
    return Written(render("entry.html", view=view, root=ROOT), rail=render("entry_rail.html", view=view, root=ROOT))


def _downloads(entry: Entry[Portrait], path: str) -> Iterator[Asset]:
    """Yield what a reader may take away: the record as written, the scheme as drawn."""
    yield Asset(f"{path}{entry.id}.yml", entry.text.encode())
    if entry.kept.scheme is not None:
        yield Asset(f"{path}{entry.id}.svg", entry.kept.scheme.file)
