"""Layout of a reaction scheme, and its SVG text: compounds, plus signs, arrows, conditions, labels.

Plain data in, text out; what a record is, this module does not know. Inline SVG carries presentation attributes
only, no <style> and no style="…", so that a strict Content-Security-Policy may forbid inline styles.
"""

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from itertools import zip_longest
from typing import Literal

from builder.chemistry.depict import LINE, PALETTE, PAPER, Box, Fragment, Marks, depict, format_number, palette_css
from builder.chemistry.lettering import CAP_HEIGHT_EM, FONT, svg_text, text_width, wrap
from builder.chemistry.structure import AtomId, Structure

__all__ = [
    "MEANING_OF_OUTLINES",
    "Arrow",
    "DrawnCompound",
    "Placed",
    "SchemeLayout",
    "draw_scheme",
    "draw_structure",
    "lay_out",
    "standalone",
]

MEANING_OF_OUTLINES = {
    "leaves": "a dashed outline marks what leaves",
    "arrives": "a solid outline marks what arrives",
    "points": "a dotted outline marks the atoms in question",
}
"""The legend, in words; the descriptions of drawings use it, pages may show it."""

TEXT_SIZE = 13.0
LINE_HEIGHT = 16.0
_DEFAULT_WIDTH = {"wide": 760.0, "tall": 340.0}
_ARROW_TEXT_WIDTH = 176.0  # conditions wrap here
_CAPTION_WIDTH = 124.0  # captions wrap here, or at the structure's own width
_SHORTEST_ARROW = 64.0
_GAP = 16.0  # beside plus signs and arrows
_ROW_GAP = 24.0
_PADDING = 4.0
_SHRINK_TO_ONE_ROW = (1.0, 0.92, 0.84)
_SMALLEST_SCALE = 0.6

SchemeLayout = Literal["wide", "tall"]
"""wide: rows, arrows to the right. tall: one column for a phone, arrows downwards."""


@dataclass(frozen=True, slots=True)
class DrawnCompound:
    r"""A compound of a scheme.

    label: set in bold under the structure ("A"). caption: follows it ("88 % isolated"), wrapped, "\n" breaks.
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


def draw_scheme(  # noqa: PLR0913 - all but the first by keyword
    steps: Sequence[Sequence[DrawnCompound] | Arrow],
    *,
    name: str,
    ident: str,
    description: str = "",
    layout: SchemeLayout = "wide",
    max_width: float | None = None,
) -> str:
    """Return the SVG of compounds and arrows in turn: [[substrate], Arrow(…), [A, B]].

    name: the reaction in words, its accessible name. description: more of it; what the outlines mean is added.
    ident: prefix of every id, unique on the page.
    max_width: px to stay within where the structures allow; 760 for wide, 340 for tall.
    The last step may be an arrow. Raises ValueError if compounds and arrows do not alternate, or for an `ident`
    that is no id.
    """
    if not _IDENT.fullmatch(ident):
        raise ValueError(f"{ident!r} cannot stand in an id")
    placed = lay_out(steps, layout=layout, max_width=max_width)
    area = Box.around(item.box for item in placed).grown(_PADDING)
    described = ". ".join(filter(None, [description.rstrip(". "), _legend(steps)]))
    desc = f'<desc id="{ident}-desc">{svg_text(described)}.</desc>' if described else ""
    refers = f' aria-describedby="{ident}-desc"' if described else ""
    width, height = format_number(area.width), format_number(area.height)
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" id="{ident}" class="hb-drawing hb-{layout}" role="img" '
        f'aria-labelledby="{ident}-title"{refers} width="{width}" height="{height}" '
        f'viewBox="{format_number(area.left)} {format_number(area.top)} {width} {height}" fill="none" '
        f'stroke="currentColor" stroke-width="{LINE}" stroke-linejoin="round" stroke-linecap="round" '
        f'font-family="{FONT}"><title id="{ident}-title">{svg_text(name)}</title>{desc}'
        + "".join(item.markup() for item in placed)
        + "</svg>\n"
    )


def standalone(svg: str) -> str:
    """Return the drawing as a file of its own, which follows the reader's preference for light or dark."""
    ident = re.search(r' id="([^"]+)"', svg)
    scope = f"#{ident.group(1)}" if ident else "svg"
    dark = f"color:{PALETTE['ink'].dark};{palette_css(dark=True)}"
    style = (
        f"<style>{scope}{{color-scheme:light dark;color:{PALETTE['ink'].light}}}"
        f"@media (prefers-color-scheme:dark){{{scope}{{background:{PAPER.dark};{dark}}}}}</style>"
    )
    return svg.replace("<title", style + "<title", 1)


# --- what stands where ------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Placed:
    """Something drawn at (x, y): a structure, a line of words, a plus sign or an arrow.

    body: for words the escaped text, else markup around the origin. box: the room it takes, in px.
    """

    kind: Literal["structure", "words", "plus", "arrow"]
    body: str
    x: float
    y: float
    box: Box
    scale: float = 1.0

    def moved(self, dx: float, dy: float) -> "Placed":
        """Return the same thing elsewhere."""
        return replace(self, x=self.x + dx, y=self.y + dy, box=self.box.moved(dx, dy))

    def markup(self) -> str:
        """Return the SVG of this thing at its place."""
        x, y = format_number(self.x), format_number(self.y)
        if self.kind == "words":
            return (
                f'<text x="{x}" y="{y}" font-size="{format_number(TEXT_SIZE)}" fill="currentColor" stroke="none"'
                f"{self.body}</text>"
            )
        scale = f" scale({self.scale:.2f})" if self.scale != 1 else ""
        return f'<g transform="translate({x} {y}){scale}">{self.body}</g>'


@dataclass(frozen=True, slots=True)
class _Block:
    """Things laid out together; y = 0 is the line on which arrows and plus signs stand."""

    items: tuple[Placed, ...]
    box: Box

    @staticmethod
    def of(items: Iterable[Placed]) -> "_Block":
        every = tuple(items)
        return _Block(every, Box.around(item.box for item in every))

    def moved(self, dx: float, dy: float) -> "_Block":
        return _Block(tuple(item.moved(dx, dy) for item in self.items), self.box.moved(dx, dy))


def _side_by_side(blocks: Sequence[_Block], gap: float = _GAP) -> _Block:
    edge, items = 0.0, []
    for block in blocks:
        items.append(block.moved(edge - block.box.left, 0))
        edge += block.box.width + gap
    return _Block.of(item for block in items for item in block.items)


def _stacked(blocks: Sequence[_Block], gap: float, *, centred: bool) -> _Block:
    """Return blocks below each other; the whole stands on y = 0 by its middle."""
    edge, moved = 0.0, []
    for block in blocks:
        dx = -(block.box.left + block.box.right) / 2 if centred else -block.box.left
        moved.append(block.moved(dx, edge - block.box.top))
        edge += block.box.height + gap
    return _Block.of(item.moved(0, -(edge - gap) / 2) for block in moved for item in block.items)


def lay_out(
    steps: Sequence[Sequence[DrawnCompound] | Arrow], *, layout: SchemeLayout = "wide", max_width: float | None = None
) -> tuple[Placed, ...]:
    """Return everything a scheme shows, with its place; no two boxes overlap. Arguments as in `draw_scheme`."""
    groups, arrows = _alternating(steps)
    width = max_width or _DEFAULT_WIDTH[layout]
    model = groups[0][0].structure
    drawn = [[_drawn(compound, model) for compound in group] for group in groups]
    if layout == "tall":
        return _tall(drawn, arrows, width).items
    return _wide(drawn, arrows, width).items


def _alternating(
    steps: Sequence[Sequence[DrawnCompound] | Arrow],
) -> tuple[list[Sequence[DrawnCompound]], list[Arrow]]:
    groups: list[Sequence[DrawnCompound]] = []
    arrows: list[Arrow] = []
    for index, step in enumerate(steps):
        if isinstance(step, Arrow):
            arrows.append(step)
        elif step:
            groups.append(step)
        if isinstance(step, Arrow) != bool(index % 2) or not (isinstance(step, Arrow) or step):
            raise ValueError("a scheme is compounds and arrows in turn, and starts with compounds")
    if not groups:
        raise ValueError("a scheme needs a compound")
    return groups, arrows


_Drawn = tuple[DrawnCompound, Fragment]


def _drawn(compound: DrawnCompound, model: Structure) -> _Drawn:
    marks = Marks(compound.leaves, compound.arrives, compound.points)
    return compound, depict(compound.structure, marks, model)


def _wide(groups: Sequence[Sequence[_Drawn]], arrows: Sequence[Arrow], width: float) -> _Block:
    widest = max(fragment.box.width for group in groups for _, fragment in group)
    most = max(_SMALLEST_SCALE, min(1.0, width / widest))
    arrow_blocks = [_arrow_to_the_right(arrow) for arrow in arrows]
    for scale in _SHRINK_TO_ONE_ROW:
        row = _in_one_row([_row(group, scale) for group in groups], arrow_blocks)
        if row.box.width <= width:
            return row
    rows: list[_Block] = []
    current = _compounds(groups[0], most, width, centred=False)
    for index, arrow in enumerate(arrow_blocks):
        group = groups[index + 1] if index + 1 < len(groups) else ()
        room = width - current.box.width - arrow.box.width - 2 * _GAP
        if room < 0 or (group and max(_cell(d, most).box.width for d in group) > room):
            rows.append(current)
            current = arrow
            room = width - arrow.box.width - _GAP
        else:
            current = _side_by_side([current, arrow])
        if group:
            current = _side_by_side([current, _compounds(group, most, room, centred=False)])
    return _stacked([*rows, current], _ROW_GAP, centred=False)


def _in_one_row(groups: Sequence[_Block], arrows: Sequence[_Block]) -> _Block:
    return _side_by_side([block for pair in zip_longest(groups, arrows) for block in pair if block])


def _tall(groups: Sequence[Sequence[_Drawn]], arrows: Sequence[Arrow], width: float) -> _Block:
    widest = max(fragment.box.width for group in groups for _, fragment in group)
    scale = max(_SMALLEST_SCALE, min(1.0, width / widest))
    blocks = [_compounds(group, scale, width, centred=True) for group in groups]
    downwards = [_arrow_downwards(arrow, width) for arrow in arrows]
    column = [block for pair in zip_longest(blocks, downwards) for block in pair if block]
    return _stacked(column, 14.0, centred=True)


# --- compounds --------------------------------------------------------------------------------------------


def _words(line: str, x: float, baseline: float, anchor: str, bold: str = "") -> Placed:
    """Return a line of text at its anchor ("start" or "middle"); `bold` is set before it."""
    size = TEXT_SIZE
    wide = _line_width(line, bold)
    left = x if anchor == "start" else x - wide / 2
    box = Box(left, baseline - CAP_HEIGHT_EM * size, left + wide, baseline + 0.22 * size)
    middle = ' text-anchor="middle"' if anchor == "middle" else ""
    strong = f'<tspan font-weight="700">{svg_text(bold)}</tspan>' if bold else ""
    between = " " if bold and line else ""
    return Placed("words", f"{middle}>{strong}{between}{svg_text(line)}", x, baseline, box)


def _line_width(line: str, bold: str = "") -> float:
    between = " " if bold and line else ""
    return text_width(bold, TEXT_SIZE, bold=True) + text_width(between + line, TEXT_SIZE)


def _cell(drawn: _Drawn, scale: float, captions_from: float | None = None) -> _Block:
    """Return a structure, middle on (0, 0), with label and caption below it."""
    compound, fragment = drawn
    box = fragment.box
    x, y = -(box.left + box.right) / 2 * scale, -(box.top + box.bottom) / 2 * scale
    items = [Placed("structure", fragment.markup, x, y, box.moved(x, y, scale), scale)]
    top = captions_from if captions_from is not None else box.height * scale / 2
    items += _caption(compound, max(box.width * scale, _CAPTION_WIDTH), top + 8.0)
    return _Block.of(items)


def _caption(compound: DrawnCompound, width: float, top: float) -> list[Placed]:
    lines = wrap(compound.caption, TEXT_SIZE, width)
    label = compound.label
    if lines and label and _line_width(lines[0], label) > width:
        lines.insert(0, "")
    texts = [(line, label if not index else "") for index, line in enumerate(lines or [""])]
    first = top + CAP_HEIGHT_EM * TEXT_SIZE
    return [
        _words(line, 0, first + index * LINE_HEIGHT, "middle", bold)
        for index, (line, bold) in enumerate(texts)
        if line or bold
    ]


def _row(group: Sequence[_Drawn], scale: float, *, goes_on: bool = False) -> _Block:
    """Return compounds with plus signs between; captions start at one height. goes_on: a plus sign comes first."""
    lowest = max(fragment.box.height for _, fragment in group) * scale / 2
    blocks: list[_Block] = []
    for index, drawn in enumerate(group):
        if index or goes_on:
            blocks.append(_Block.of([_PLUS]))
        blocks.append(_cell(drawn, scale, lowest))
    return _side_by_side(blocks, _GAP * 0.75)


def _compounds(group: Sequence[_Drawn], scale: float, width: float, *, centred: bool) -> _Block:
    """Return compounds in as many rows as the width asks for."""
    rows: list[list[_Drawn]] = []
    for drawn in group:
        if rows and _row([*rows[-1], drawn], scale, goes_on=len(rows) > 1).box.width <= width:
            rows[-1].append(drawn)
        else:
            rows.append([drawn])
    blocks = [_row(row, scale, goes_on=index > 0) for index, row in enumerate(rows)]
    return blocks[0] if len(blocks) == 1 else _stacked(blocks, _ROW_GAP * 0.75, centred=centred)


_PLUS = Placed("plus", '<path d="M-5 0H5M0 -5V5"/>', 0, 0, Box(-6, -6, 6, 6))


# --- arrows -----------------------------------------------------------------------------------------------

_CROSS = "M{0} {1}l10 10m0 -10l-10 10"


def _arrow_to_the_right(arrow: Arrow) -> _Block:
    above, below = (_conditions(lines, _ARROW_TEXT_WIDTH) for lines in (arrow.above, arrow.below))
    length = max([_SHORTEST_ARROW, *(text_width(line, TEXT_SIZE) + 14 for line in [*above, *below])])
    middle = length / 2
    shaft = f'<path d="M0 0H{format_number(length - 1)}"{_dashes(arrow)}/>'
    tip = format_number(length)
    head = f'<path d="M{format_number(length - 8)} -4.5L{tip} 0L{format_number(length - 8)} 4.5"/>'
    cross = f'<path d="{_CROSS.format(format_number(middle - 5), -5)}"/>' if arrow.failed else ""
    line = Placed("arrow", shaft + head + cross, 0, 0, Box(0, -6, length, 6))
    last_above = -9.0 - 0.22 * TEXT_SIZE
    first_below = 10.0 + CAP_HEIGHT_EM * TEXT_SIZE
    return _Block.of(
        [
            line,
            *(_words(t, middle, last_above - i * LINE_HEIGHT, "middle") for i, t in enumerate(reversed(above))),
            *(_words(t, middle, first_below + i * LINE_HEIGHT, "middle") for i, t in enumerate(below)),
        ]
    )


def _arrow_downwards(arrow: Arrow, width: float) -> _Block:
    lines = _conditions((*arrow.above, *arrow.below), min(width - 30, 1.4 * _ARROW_TEXT_WIDTH))
    tall = len(lines) * LINE_HEIGHT
    length = max(44.0, tall + 8)
    shaft = f'<path d="M0 0V{format_number(length - 1)}"{_dashes(arrow)}/>'
    tip, barb = format_number(length), format_number(length - 8)
    head = f'<path d="M-4.5 {barb}L0 {tip}L4.5 {barb}"/>'
    cross = f'<path d="{_CROSS.format(-5, format_number(length / 2 - 5))}"/>' if arrow.failed else ""
    line = Placed("arrow", shaft + head + cross, 0, 0, Box(-6, 0, 6, length))
    first = (length - tall) / 2 + LINE_HEIGHT / 2 + CAP_HEIGHT_EM * TEXT_SIZE / 2
    return _Block.of([line, *(_words(t, 16, first + i * LINE_HEIGHT, "start") for i, t in enumerate(lines))])


def _conditions(lines: Iterable[str], width: float) -> list[str]:
    return [piece for line in lines for piece in wrap(line, TEXT_SIZE, width)]


def _dashes(arrow: Arrow) -> str:
    return ' stroke-dasharray="6 4"' if arrow.forecast else ""


def _legend(steps: Sequence[Sequence[DrawnCompound] | Arrow]) -> str:
    compounds = [compound for step in steps if not isinstance(step, Arrow) for compound in step]
    used = [words for mark, words in MEANING_OF_OUTLINES.items() if any(getattr(c, mark) for c in compounds)]
    text = ", ".join(used)
    return text[:1].upper() + text[1:]


_IDENT = re.compile(r"[A-Za-z][A-Za-z0-9_-]*")
