"""Page and Asset: what the publishing rooms hand over, and all that a site generator needs to know of it."""

import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal

__all__ = ["Asset", "Heading", "Page", "Written", "headings_of", "menu_of"]

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
    section: path of the page in the menu under which this one belongs, where that is another.
    source: file behind the page, below the book's folder, for the edit link.
    menu: label under which the page stands in the menu; none keeps it out.
    indexed: whether search engines may list it.
    assets: files that belong to the page.
    styles, scripts: what it loads beyond the frame's own, paths below the site's root; scripts in their order.
    """

    path: str
    title: str
    write: Callable[[], Written]
    description: str
    kind: Literal["entry", "front", "guide", "list", "rule"]
    section: str = ""
    source: str | None = None
    menu: str = ""
    indexed: bool = True
    assets: tuple[Asset, ...] = field(default=())
    styles: tuple[str, ...] = ()
    scripts: tuple[str, ...] = ()

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


def menu_of(pages: Iterable[Page], instead: Mapping[str, str] = MappingProxyType({})) -> list[dict[str, str]]:
    """Return the menu of the pages that want to stand in one, in the order given: label and file of each.

    instead: files that stand in place of some of the pages, by the file of the page.
    """
    return [{page.menu: instead.get(page.file, page.file)} for page in pages if page.menu]
