"""The inks of drawings, for light and for dark paper, and how they reach an SVG."""

import re
from collections.abc import Mapping
from dataclasses import dataclass

__all__ = [
    "LEAST_CONTRAST",
    "PALETTE",
    "PAPER",
    "Ink",
    "contrast",
    "element_paint",
    "legible",
    "paint",
    "palette_css",
    "resolve_colours",
    "standalone",
]


@dataclass(frozen=True, slots=True)
class Ink:
    """One ink for light and for dark paper, as #rrggbb."""

    light: str
    dark: str


LEAST_CONTRAST = 4.5
"""Of text on its paper (WCAG 2.2, 1.4.3)."""
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
"""Our own inks; each has the contrast that text needs on its paper."""

_MIDDLE_GREY = 0.18
"""Luminance at which black and white have the same contrast, about."""
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


def contrast(one: str, other: str) -> float:
    """Return the contrast ratio of two colours as #rrggbb, from 1 to 21.

    Source: WCAG 2.2, definitions of contrast ratio and of relative luminance.

    >>> contrast("#ffffff", "#000000")
    21.0
    """
    low, high = sorted((_luminance(one), _luminance(other)))
    return (high + 0.05) / (low + 0.05)


def legible(colour: str, paper: str) -> str:
    """Return the colour, mixed with just as much black or white as makes it text on this paper; all as #rrggbb."""
    end = 0 if _luminance(paper) > _MIDDLE_GREY else 255
    mixed = (
        "#" + "".join(f"{channel + (end - channel) * share // 100:02x}" for channel in _channels(colour))
        for share in range(101)
    )
    return next(each for each in mixed if contrast(each, paper) >= LEAST_CONTRAST)


def _channels(colour: str) -> tuple[int, int, int]:
    red, green, blue = bytes.fromhex(colour.removeprefix("#"))
    return red, green, blue


def _luminance(colour: str) -> float:
    linear = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in (n / 255 for n in _channels(colour)))
    return sum(weight * channel for weight, channel in zip((0.2126, 0.7152, 0.0722), linear, strict=True))


def _shade(ink: Ink, dark: bool) -> str:
    return ink.dark if dark else ink.light
