"""Room that text needs in a drawing, and its safe form in SVG.

Which font a reader's system gives for `FONT` is not known. Widths are those of a wide face, so that any usual
face leaves air and nothing overlaps.
"""

import re
from functools import lru_cache
from xml.sax.saxutils import escape

__all__ = ["CAP_HEIGHT_EM", "FONT", "svg_text", "text_width", "wrap"]

FONT = "system-ui, sans-serif"
CAP_HEIGHT_EM = 0.72
"""Height of a capital over its baseline. DejaVu Sans 0.73, most other sans-serif faces 0.70 to 0.72."""

# Advance widths in em, measured on DejaVu Sans 2.37; a rounded-up group for each few hundredths.
_WIDTHS_EM = {
    0.28: "ijl'′",
    0.34: " ,.·|/:;\\IJ",
    0.40: "f()[]t!-″₀₁₂₃₄₅₆₇₈₉⁰¹²³",
    0.46: 'r"',
    0.53: "*_`°–sz⁺⁻?",
    0.60: "ckvxyγλLF•",
    0.64: "abdeghnopqu0123456789$_{}µδøβPTYEßäöüéèS",
    0.70: "αAVÄÅXZBRCK",
    0.79: "UNHDGOQ&ÜÖ",
    0.84: "w#+<=>^~−×→±≤≥≈",
    1.00: "M%m½W@—…",
}
_WIDTH_OF = {letter: width for width, letters in _WIDTHS_EM.items() for letter in letters}
_WIDEST_EM = 1.0
_BOLD = 1.13
_NOT_IN_XML = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f\ud800-\udfff\ufffe\uffff]")
_NO_BREAK = "\u00a0"


def svg_text(text: str) -> str:
    """Return text safe between tags: escaped, and without the characters XML 1.0 cannot hold."""
    return escape(_NOT_IN_XML.sub("", text))


@lru_cache(maxsize=4096)
def text_width(text: str, size: float, *, bold: bool = False) -> float:
    """Return the room text needs, in px; an upper bound for the usual system faces."""
    width = size * sum(_WIDTH_OF.get(letter, _WIDEST_EM) for letter in text.replace(_NO_BREAK, " "))
    return width * _BOLD if bold else width


def wrap(text: str, size: float, width: float) -> list[str]:
    """Return text in lines no wider than `width` px, broken at spaces, and within a word that is too long.

    A number stays with its unit: "60 °C" is never torn.
    """
    lines: list[str] = []
    for paragraph in text.split("\n"):
        line = ""
        for word in _words(paragraph):
            joined = f"{line} {word}" if line else word
            if text_width(joined, size) <= width:
                line = joined
                continue
            if line:
                lines.append(line)
            *full, line = _cut(word, size, width)
            lines.extend(full)
        if line:
            lines.append(line)
    return lines


def _words(paragraph: str) -> list[str]:
    """Split at spaces, except between a number and its unit or the sign before it."""
    return _TIGHT.sub(_NO_BREAK, paragraph).split(" ")


_TIGHT = re.compile(r"(?<=\d)\s+(?=(?:%|°|[A-Za-zµ]{1,5}(?:/|\b)))|(?<=[<>≤≥≈±~])\s+(?=\d)")


def _cut(word: str, size: float, width: float) -> list[str]:
    """Cut a name where a chemist would: before a locant or after a bracket, not between a locant and what it places."""
    pieces = [""]
    for part in _JOINT.split(word):
        for bit in [part] if text_width(part, size) <= width else list(part):
            if pieces[-1] and text_width(pieces[-1] + bit, size) > width:
                pieces.append("")
            pieces[-1] += bit
    return pieces


_JOINT = re.compile(r"(?<=[A-Za-z)\]]-)|(?<=[)\]])(?![-),\]])")
