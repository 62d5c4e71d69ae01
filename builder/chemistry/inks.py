"""The inks of drawings, for light and for dark paper, and how they reach an SVG."""

import re
from collections.abc import Mapping
from dataclasses import dataclass

__all__ = ["PALETTE", "PAPER", "Ink", "element_paint", "paint", "palette_css", "resolve_colours", "standalone"]


@dataclass(frozen=True, slots=True)
class Ink:
    """One ink for light and for dark paper, as #rrggbb."""

    light: str
    dark: str


PAPER = Ink("#ffffff", "#1b1e24")
PALETTE: Mapping[str, Ink] = {
    "ink": Ink("#1c2024", "#e6e8eb"),
    "n": Ink("#1f55a8", "#8ab6ff"),
    "o": Ink("#b0253a", "#ff8f9c"),
    "s": Ink("#7a5c00", "#e0bd4a"),
    "p": Ink("#96460a", "#f5a66a"),
    "f": Ink("#0a6e66", "#58cfc0"),
    "cl": Ink("#2c6e1f", "#86d272"),
    "br": Ink("#8c3f22", "#eda184"),
    "i": Ink("#6c2f9c", "#cda0f2"),
    "b": Ink("#8a3f5f", "#efa0c0"),
    "si": Ink("#47616e", "#a5bfcc"),
    "leaves": Ink("#b0461e", "#f59a72"),
    "arrives": Ink("#1b6a52", "#62cfa8"),
    "points": Ink("#5b4aa8", "#b3a6ff"),
}
"""Our own inks; each has the contrast that text needs, 4.5:1, on its paper (WCAG 2.2, 1.4.3)."""

_VARIABLE = re.compile(r"var\(--hb-([a-z]+), *#[0-9a-f]{6}\)")


def paint(name: str) -> str:
    """Return the paint for a palette name: a CSS variable that falls back to the ink for light paper."""
    return f"var(--hb-{name}, {PALETTE[name].light})"


def element_paint(symbol: str) -> str:
    """Return the paint for the letters of an element; carbon and all without an ink are in the colour of text."""
    name = symbol.lower()
    return paint(name) if name in PALETTE else "currentColor"


def palette_css() -> str:
    """Return the inks as custom properties, each for both papers, for the style sheet of a page."""
    inks = ((name, ink) for name, ink in PALETTE.items() if name != "ink")
    return "".join(f"--hb-{name}:light-dark({ink.light},{ink.dark});" for name, ink in inks)


def resolve_colours(svg: str, *, dark: bool = False) -> str:
    """Return the drawing with variables and `currentColor` replaced, for converters that know neither."""

    def fixed(match: re.Match[str]) -> str:
        return _shade(PALETTE[match.group(1)], dark)

    return _VARIABLE.sub(fixed, svg).replace('"currentColor"', f'"{_shade(PALETTE["ink"], dark)}"')


def standalone(svg: str) -> str:
    """Return the drawing as a file of its own, which follows the reader's preference for light or dark.

    Only a file gets a <style>; a drawing inside a page takes its colours from the page.
    """
    ink = PALETTE["ink"]
    dark = "".join(f"--hb-{name}:{other.dark};" for name, other in PALETTE.items() if other is not ink)
    style = (
        f"<style>:root{{color-scheme:light dark;color:{ink.light}}}@media (prefers-color-scheme:dark)"
        f"{{:root{{background:{PAPER.dark};color:{ink.dark};{dark}}}}}</style>"
    )
    return svg.replace("<title", style + "<title", 1)


def _shade(ink: Ink, dark: bool) -> str:
    return ink.dark if dark else ink.light
