"""One entry -> its page: the view rendered as HTML, with the files a reader may take away."""

from builder.book import Entry
from builder.publish.entry_view import EntryView, Surroundings, view_entry
from builder.publish.page import Asset, Page
from builder.publish.portrait import Portrait
from builder.publish.templating import render

__all__ = ["entry_page", "render_entry"]


ROOT = "../../"
"""From an entry's page to the site's root."""


def entry_page(entry: Entry[Portrait], around: Surroundings) -> Page:
    """Return the page of an entry with its downloads: the record as written, the scheme as drawn."""
    view = view_entry(entry, around)
    path = f"e/{entry.id}/"
    assets = [Asset(f"{path}{entry.id}.yml", entry.text.encode())]
    if view.scheme:
        assets.append(Asset(f"{path}{entry.id}.svg", view.scheme.file))
    return Page(
        kind="entry",
        path=path,
        title=view.summary.title,
        body=render_entry(view),
        rail=render("entry_rail.html", view=view, root=ROOT),
        section="lists/",
        description=view.summary.take_away or f"{view.summary.conditions}. {view.summary.outcome}",
        source=entry.file.removeprefix(f"{around.folder}/"),
        indexed=view.tombstone is None,
        assets=tuple(assets),
    )


def render_entry(view: EntryView) -> str:
    """Return the HTML body of an entry's page."""
    return render("entry.html", view=view, root=ROOT)
