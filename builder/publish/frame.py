"""What surrounds every page: the policy that browsers enforce, and furniture that is rendered once and used often."""

from collections.abc import Callable
from dataclasses import dataclass

from markupsafe import Markup

from builder.chemistry.inks import palette_css
from builder.publish.page import Asset
from builder.records.settings import Accent

__all__ = ["CONTENT_POLICY", "INKS_STYLE", "Furniture", "MenuItem", "content_policy", "inks_style"]

CONTENT_POLICY = {
    "default-src": "'none'",
    "script-src": "'self'",
    "style-src": "'self'",
    "img-src": "'self' data:",  # icons inside the theme's style sheet
    "font-src": "'self'",
    "connect-src": "'self'",
    "manifest-src": "'self'",
    "form-action": "'self'",
    "base-uri": "'none'",
}
"""Content-Security-Policy of the site: nothing inline runs, nothing comes from or goes to another host."""


def content_policy(*, live: bool = False) -> str:
    """Return the policy as the text of its header.

    live: pages are served to their author, with the script in them by which MkDocs reloads after an edit.
    """
    relaxed = {"script-src": "'self' 'unsafe-inline'"} if live else {}
    return "; ".join(f"{name} {sources}" for name, sources in (CONTENT_POLICY | relaxed).items())


INKS_STYLE = "assets/inks.css"
"""Address of the style sheet with the inks of the drawings and the accent of the book."""


def inks_style(accent: Accent | None) -> Asset:
    """Return the style sheet from which drawings inside pages take their colours, and links the accent of the book."""
    own = f"--hb-accent:light-dark({accent.light},{accent.dark});" if accent is not None else ""
    return Asset(INKS_STYLE, f":root{{{palette_css()}{own}}}\n".encode())


@dataclass(frozen=True, slots=True)
class MenuItem:
    """One item of the menu: plain label, address as a link of the page, whether the page stands in it."""

    label: str
    href: str
    is_here: bool


class Furniture:
    """Parts of the frame that many pages share, kept under what they depend on; for `call` blocks of templates."""

    def __init__(self) -> None:
        self._kept: dict[tuple[object, ...], Markup] = {}

    def __call__(self, *depends_on: object, caller: Callable[[], str]) -> Markup:
        """Return what the block renders, from memory where all that it depends on is as before."""
        if depends_on not in self._kept:
            self._kept[depends_on] = Markup(caller())  # noqa: S704 - the theme's own markup, escaped in its template
        return self._kept[depends_on]
