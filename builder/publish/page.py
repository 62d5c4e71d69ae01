"""Page and Asset: what the publishing rooms hand over, and all that a site generator needs to know of it."""

import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

__all__ = ["Asset", "Heading", "Menu", "Page", "Written", "headings_of", "menu_of"]

Menu = list[dict[str, "str | Menu"] | str]
"""Entries of a menu: a label with a page's source, a label with a menu below it, or a section's own page."""

_HEADING = re.compile(r'<h2 id="(?P<id>[^"]+)"[^>]*>(?P<title>[^<]+)</h2>')


@dataclass(frozen=True, slots=True)
class Asset:
    """A file to be published as it is; path below the site's root, with forward slashes."""

    path: str
    data: bytes


@dataclass(frozen=True, slots=True)
class Heading:
    """A section of a page: its anchor, and its title as HTML text (already escaped)."""

    anchor: str
    title: str


@dataclass(frozen=True, slots=True)
class Written:
    """The HTML of a page: its body, and what stands beside it."""

    body: str
    rail: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Page:
    """One page of the site.

    path: address below the site's root, ending in a slash; "" is the front page.
    title, description: plain text, not escaped.
    write: gives the HTML of the page, anew on every call, so that a large site need not be held at once; every link in
        it is relative.
    kind: what the page is (entry, list, rule, guide, front), for its style.
    section: path of the page in the menu under which this one belongs, where that is another.
    source: file behind the page, below the book's folder, for the edit link.
    menu: labels under which the page stands in the menu, outermost first; none keeps it out.
    indexed: whether search engines and the site's own search may list it.
    assets: files that belong to the page.
    """

    path: str
    title: str
    write: Callable[[], Written]
    description: str
    kind: str
    section: str = ""
    source: str | None = None
    menu: tuple[str, ...] = ()
    indexed: bool = True
    assets: tuple[Asset, ...] = field(default=())

    @property
    def file(self) -> str:
        """Return the name under which a site generator knows the page."""
        return f"{self.path}index.md"

    @property
    def body(self) -> str:
        """Return the HTML that stands inside the site generator's page."""
        return self.write().body


def headings_of(body: str) -> tuple[Heading, ...]:
    """Return the sections of a page in order."""
    return tuple(Heading(match["id"], match["title"]) for match in _HEADING.finditer(body))


def menu_of(pages: Iterable[Page]) -> Menu:
    """Return the menu of the pages that want to stand in one, in the order given."""
    menu: Menu = []
    sections: dict[tuple[str, ...], Menu] = {(): menu}
    listed = [page for page in pages if page.menu]
    with_children = {page.menu[:-1] for page in listed}
    for page in listed:
        above = sections[page.menu[:-1]]
        if page.menu in with_children:
            sections[page.menu] = [page.file]
            above.append({page.menu[-1]: sections[page.menu]})
        else:
            above.append({page.menu[-1]: page.file})
    return menu
