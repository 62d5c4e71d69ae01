"""One entry -> its page: the view rendered as HTML, with the files a reader may take away."""

from builder.book import Entry
from builder.publish.entry_view import EntryView, Surroundings, view_entry
from builder.publish.page import Asset, Page
from builder.publish.templating import render

__all__ = ["entry_page", "render_entry"]


def entry_page(entry: Entry, around: Surroundings) -> Page:
    """Return the page of an entry with its downloads: the record as written, the scheme as drawn."""
    view = view_entry(entry, around)
    path = f"e/{entry.id}/"
    assets = [Asset(f"{path}{entry.id}.yml", entry.text.encode())]
    if view.scheme_file:
        assets.append(Asset(f"{path}{entry.id}.svg", view.scheme_file))
    return Page(
        path=path,
        title=view.summary.title,
        body=render_entry(view, around),
        description=view.summary.take_away or f"{view.summary.conditions}. {view.summary.outcome}",
        source=entry.file.removeprefix(f"{around.folder}/"),
        indexed=view.tombstone is None,
        assets=tuple(assets),
    )


def render_entry(view: EntryView, around: Surroundings) -> str:
    """Return the HTML body of an entry's page."""
    return render("entry.html", view=view, notice=around.settings.standing_notice, root="../../")
