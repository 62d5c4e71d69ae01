"""Layout of a reaction scheme, and its SVG text: compounds, plus signs, arrows, conditions, labels.

Plain data in, text out; what a record is, this module does not know. Inline SVG carries presentation attributes
only, no <style> and no style="…", so that a strict Content-Security-Policy may forbid inline styles.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from builder.chemistry.structure import AtomId, Structure

__all__ = ["Arrow", "DrawnCompound", "SchemeLayout", "draw_scheme", "draw_structure"]

SchemeLayout = Literal["wide", "tall"]
"""wide: rows, arrows to the right. tall: one column for a phone, arrows downwards."""


@dataclass(frozen=True, slots=True)
class DrawnCompound:
    """A compound of a scheme.

    label: set in bold under the structure ("A"). caption: follows it ("88 % isolated"), wrapped, "\\n" breaks.
    leaves, arrives, points: atoms to outline: what leaves (dashes), what arrives (solid line), and the atoms a
        page points at, such as the alpha carbon (dots).
    """

    structure: Structure
    label: str = ""
    caption: str = ""
    leaves: frozenset[AtomId] = frozenset()
    arrives: frozenset[AtomId] = frozenset()
    points: frozenset[AtomId] = frozenset()


@dataclass(frozen=True, slots=True)
class Arrow:
    """A reaction arrow with its lines of text. failed: crossed out. forecast: dashed, a prediction."""

    above: tuple[str, ...] = ()
    below: tuple[str, ...] = ()
    failed: bool = False
    forecast: bool = False


def draw_structure(compound: DrawnCompound, *, name: str, ident: str, description: str = "") -> str:
    """Return the SVG of one compound with its label and caption."""
    return draw_scheme([[compound]], name=name, ident=ident, description=description)


def draw_scheme(
    steps: Sequence[Sequence[DrawnCompound] | Arrow],
    *,
    name: str,
    ident: str,
    description: str = "",
    layout: SchemeLayout = "wide",
    max_width: float | None = None,
) -> str:
    """Return the SVG of compounds and arrows in turn: [[substrate], Arrow(…), [A, B]].

    name: the reaction in words, its accessible name. ident: prefix of every id, unique on the page.
    max_width: px to stay within where the structures allow; 760 for wide, 340 for tall.
    Raises ValueError if compounds and arrows do not alternate.
    """
    raise NotImplementedError
