"""Layout of a reaction scheme, and its SVG text: compounds, plus signs, arrows, conditions, labels.

Plain data in, text out; what a record is, this module does not know. Inline SVG carries presentation attributes
only, no <style> and no style="…", so that a strict Content-Security-Policy may forbid inline styles.
"""

import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import zip_longest
from typing import Literal, NamedTuple

from builder.chemistry.depict import LINE_WIDTH, Fragment, Marks, depict
from builder.chemistry.lettering import CAP_HEIGHT_EM, FONT, svg_text, text_width, wrap
from builder.chemistry.plane import Box, svg_number
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
    "legend",
]

MEANING_OF_OUTLINES = {
    "leaves": "a dashed outline marks what leaves",
    "arrives": "a solid outline marks what arrives",
    "points": "a dotted outline marks the atoms in question",
}
"""The legend, in words; the descriptions of drawings use it, pages may show it."""

TEXT_SIZE = 13.0
LINE_HEIGHT = 16.0
_DESCENT = 0.22 * TEXT_SIZE
_LABEL_GAP = 6.0
_DEFAULT_WIDTH = {"wide": 760.0, "tall": 340.0}
_ARROW_TEXT_WIDTHS = (176.0, 230.0, 290.0)  # conditions wrap at the first of these that leaves few lines
_FEW_LINES = 4
_CAPTION_WIDTH = 140.0  # captions wrap here, or at the structure's own width
_WIDEST_WORD = 190.0  # a caption makes room for a word up to this
_SHORTEST_ARROW = 64.0
_GAP = 16.0  # beside plus signs and arrows
_ROW_GAP = 24.0
_PADDING = 4.0
_SHRINK_TO_ONE_ROW = (1.0, 0.92, 0.84)
_SMALLEST_SCALE = 0.6
_MOST_ROWS_BESIDE_AN_ARROW = 2

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
    described = ". ".join(filter(None, [description.rstrip(". "), legend(steps)]))
    desc = f'<desc id="{ident}-desc">{svg_text(described)}.</desc>' if described else ""
    refers = f' aria-describedby="{ident}-desc"' if described else ""
    width, height = svg_number(area.width), svg_number(area.height)
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" id="{ident}" class="hb-drawing hb-{layout}" role="img" '
        f'aria-labelledby="{ident}-title"{refers} width="{width}" height="{height}" '
        f'viewBox="{svg_number(area.left)} {svg_number(area.top)} {width} {height}" fill="none" '
        f'stroke="currentColor" stroke-width="{LINE_WIDTH}" stroke-linejoin="round" stroke-linecap="round" '
        f'font-family="{FONT}"><title id="{ident}-title">{svg_text(name)}</title>{desc}'
        + "".join(item.markup() for item in placed)
        + "</svg>\n"
    )


# --- what stands where ------------------------------------------------------------------------------------


class Placed(NamedTuple):
    """Something drawn at (x, y): a structure, a line of words, a plus sign or an arrow.

    body: markup around the origin. box: the room it takes, in px.
    """

    kind: Literal["structure", "words", "plus", "arrow"]
    body: str
    box: Box
    x: float = 0.0
    y: float = 0.0
    scale: float = 1.0

    def markup(self) -> str:
        """Return the SVG of this thing at its place."""
        at = f"{svg_number(self.x)} {svg_number(self.y)}"
        if self.kind == "words":
            x, y = at.split(" ")
            return f'<text x="{x}" y="{y}"{self.body}</text>'
        scale = f" scale({self.scale:.2f})" if self.scale != 1 else ""
        return f'<g transform="translate({at}){scale}">{self.body}</g>'


class _Block(NamedTuple):
    """Things laid out together; y = 0 is the line on which arrows and plus signs stand."""

    box: Box
    parts: "tuple[tuple[float, float, _Block | Placed], ...]"

    def items(self, dx: float = 0.0, dy: float = 0.0) -> Iterator[Placed]:
        """Yield everything in the block, at its place on the paper."""
        for x, y, part in self.parts:
            if isinstance(part, _Block):
                yield from part.items(dx + x, dy + y)
            else:
                right, down = dx + x, dy + y
                box = part.box.moved(right, down)
                yield Placed(part.kind, part.body, box, part.x + right, part.y + down, part.scale)


def _block(parts: "Iterable[tuple[float, float, _Block | Placed]]") -> _Block:
    every = tuple(parts)
    return _Block(Box.around(part.box.moved(x, y) for x, y, part in every), every)


def _side_by_side(blocks: Sequence[_Block], gap: float = _GAP) -> _Block:
    edge, parts = 0.0, []
    for block in blocks:
        parts.append((edge - block.box.left, 0.0, block))
        edge += block.box.width + gap
    return _block(parts)


def _stacked(blocks: Sequence[_Block], gap: float, *, centred: bool) -> _Block:
    """Return blocks below each other; the whole stands on y = 0 by its middle."""
    edge = -(sum(block.box.height for block in blocks) + gap * (len(blocks) - 1)) / 2
    parts = []
    for block in blocks:
        dx = -block.box.middle[0] if centred else -block.box.left
        parts.append((dx, edge - block.box.top, block))
        edge += block.box.height + gap
    return _block(parts)


def lay_out(
    steps: Sequence[Sequence[DrawnCompound] | Arrow], *, layout: SchemeLayout = "wide", max_width: float | None = None
) -> tuple[Placed, ...]:
    """Return everything a scheme shows, with its place; no two boxes overlap. Arguments as in `draw_scheme`."""
    groups, arrows = _alternating(steps)
    width = max_width or _DEFAULT_WIDTH[layout]
    model = groups[0][0].structure
    drawn = [[_drawn(compound, model) for compound in group] for group in groups]
    scheme = _tall(drawn, arrows, width) if layout == "tall" else _wide(drawn, arrows, width)
    return tuple(scheme.items())


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
    """Return everything in one row if it fits, a little smaller if need be; else in rows.

    A row is broken after an arrow if the arrow still fits, else before it. Products stay beside their arrow if two
    rows of them fit there.
    """
    arrow_blocks = [_arrow_to_the_right(arrow) for arrow in arrows]
    structures = sum(fragment.box.width for group in groups for _, fragment in group)
    for scale in _SHRINK_TO_ONE_ROW:
        row = _in_one_row([_row(group, scale) for group in groups], arrow_blocks)
        if row.box.width <= width:
            return row
        if row.box.width - (1 - _SHRINK_TO_ONE_ROW[-1]) * structures > width:
            break
    scale = _scale_to_fit(groups, width)
    rows: list[_Block] = []
    current = _compounds(groups[0], scale, width, centred=False)
    for arrow, group in zip_longest(arrow_blocks, groups[1:], fillvalue=()):
        if not isinstance(arrow, _Block):
            raise AssertionError("more compounds than arrows")  # noqa: TRY004 - excluded by _alternating
        with_arrow = _side_by_side([current, arrow])
        room = width - with_arrow.box.width - _GAP
        if group and _rows_needed(group, scale, room) <= _MOST_ROWS_BESIDE_AN_ARROW:
            current = _side_by_side([with_arrow, _compounds(group, scale, room, centred=False)])
            continue
        if room <= -_GAP:
            # The arrow goes to the next row, with its compounds if they fit there.
            rows.append(current)
            room = width - arrow.box.width - _GAP
            if group and _widest_cell(group, scale) <= room:
                current = _side_by_side([arrow, _compounds(group, scale, room, centred=False)])
                continue
            with_arrow = arrow
        rows.append(with_arrow)
        current = _compounds(group, scale, width, centred=False) if group else _EMPTY
    return _stacked([row for row in [*rows, current] if row.parts], _ROW_GAP, centred=False)


_EMPTY = _Block(Box(0, 0, 0, 0), ())


def _scale_to_fit(groups: Sequence[Sequence[_Drawn]], width: float) -> float:
    widest = max(fragment.box.width for group in groups for _, fragment in group)
    return max(_SMALLEST_SCALE, min(1.0, width / widest))


def _widest_cell(group: Sequence[_Drawn], scale: float) -> float:
    return max(_cell(drawn, scale).box.width for drawn in group)


def _rows_needed(group: Sequence[_Drawn], scale: float, width: float) -> int:
    if _widest_cell(group, scale) > width:
        return len(group) + _MOST_ROWS_BESIDE_AN_ARROW
    return len(_broken_into_rows(group, scale, width))


def _in_one_row(groups: Sequence[_Block], arrows: Sequence[_Block]) -> _Block:
    return _side_by_side([block for pair in zip_longest(groups, arrows) for block in pair if block])


def _tall(groups: Sequence[Sequence[_Drawn]], arrows: Sequence[Arrow], width: float) -> _Block:
    scale = _scale_to_fit(groups, width)
    blocks = [_compounds(group, scale, width, centred=True) for group in groups]
    downwards = [_arrow_downwards(arrow, width) for arrow in arrows]
    column = [block for pair in zip_longest(blocks, downwards) for block in pair if block]
    return _stacked(column, 14.0, centred=True)


# --- compounds --------------------------------------------------------------------------------------------


def _words(
    text: str, x: float, baseline: float, anchor: Literal["start", "middle", "end"], *, bold: bool = False
) -> Placed:
    """Return a line of text at its anchor."""
    width = text_width(text, TEXT_SIZE, bold=bold)
    left = x - width * {"start": 0.0, "middle": 0.5, "end": 1.0}[anchor]
    box = Box(left, baseline - CAP_HEIGHT_EM * TEXT_SIZE, left + width, baseline + _DESCENT)
    style = "" if anchor == "start" else f' text-anchor="{anchor}"'
    if bold:
        style += ' font-weight="700"'
    body = f' font-size="{svg_number(TEXT_SIZE)}"{style} fill="currentColor" stroke="none">{svg_text(text)}'
    return Placed("words", body, box, x, baseline)


def _cell(drawn: _Drawn, scale: float, captions_from: float | None = None) -> _Block:
    """Return a structure, middle on (0, 0), with label and caption below it."""
    compound, fragment = drawn
    box = fragment.box.scaled(scale)
    x, y = -box.middle[0], -box.middle[1]
    structure = Placed("structure", fragment.markup, box.moved(x, y), x, y, scale)
    top = captions_from if captions_from is not None else box.height / 2
    longest = max((text_width(word, TEXT_SIZE) for word in compound.caption.split()), default=0.0)
    width = max(box.width, _CAPTION_WIDTH, min(longest, _WIDEST_WORD))
    words = _caption(compound, width, top + 8.0)
    return _block((0.0, 0.0, item) for item in [structure, *words])


def _caption(compound: DrawnCompound, width: float, top: float) -> list[Placed]:
    """Return the label and, beside it if there is room, the caption; each line is centred."""
    label, lines = compound.label, wrap(compound.caption, TEXT_SIZE, width)
    wide = text_width(label, TEXT_SIZE, bold=True)
    between = _LABEL_GAP if label and lines else 0.0
    words = []
    baseline = top + CAP_HEIGHT_EM * TEXT_SIZE
    if label and lines and wide + between + text_width(lines[0], TEXT_SIZE) <= width:
        seam = (wide + between - text_width(lines[0], TEXT_SIZE)) / 2
        words += [
            _words(label, seam - between, baseline, "end", bold=True),
            _words(lines.pop(0), seam, baseline, "start"),
        ]
        baseline += LINE_HEIGHT
    elif label:
        words.append(_words(label, 0, baseline, "middle", bold=True))
        baseline += LINE_HEIGHT
    words += [_words(line, 0, baseline + i * LINE_HEIGHT, "middle") for i, line in enumerate(lines)]
    return words


def _row(group: Sequence[_Drawn], scale: float, *, goes_on: bool = False) -> _Block:
    """Return compounds with plus signs between; captions start at one height. goes_on: a plus sign comes first."""
    lowest = max(fragment.box.height for _, fragment in group) * scale / 2
    blocks: list[_Block] = []
    for index, drawn in enumerate(group):
        if index or goes_on:
            blocks.append(_PLUS)
        blocks.append(_cell(drawn, scale, lowest))
    return _side_by_side(blocks, _GAP * 0.75)


def _broken_into_rows(group: Sequence[_Drawn], scale: float, width: float) -> list[list[_Drawn]]:
    rows: list[list[_Drawn]] = []
    for drawn in group:
        if rows and _row([*rows[-1], drawn], scale, goes_on=len(rows) > 1).box.width <= width:
            rows[-1].append(drawn)
        else:
            rows.append([drawn])
    return rows


def _compounds(group: Sequence[_Drawn], scale: float, width: float, *, centred: bool) -> _Block:
    """Return compounds in as many rows as the width asks for, rows of about one length."""
    rows = _broken_into_rows(group, scale, width)
    if len(rows) == 1:
        return _row(rows[0], scale)
    for share in _NARROWER:
        even = _broken_into_rows(group, scale, width * share)
        if len(even) > len(rows):
            break
        rows = even
    return _stacked(
        [_row(row, scale, goes_on=index > 0) for index, row in enumerate(rows)], _ROW_GAP * 0.75, centred=centred
    )


_NARROWER = (0.9, 0.8, 0.7, 0.6, 0.5)
_PLUS = _block([(0.0, 0.0, Placed("plus", '<path d="M-5 0H5M0 -5V5"/>', Box(-6, -6, 6, 6)))])


# --- arrows -----------------------------------------------------------------------------------------------

_CROSS = "M{0} {1}l10 10m0 -10l-10 10"


def _arrow_to_the_right(arrow: Arrow) -> _Block:
    above, below = (_conditions(lines, _ARROW_TEXT_WIDTHS) for lines in (arrow.above, arrow.below))
    length = max([_SHORTEST_ARROW, *(text_width(line, TEXT_SIZE) + 14 for line in [*above, *below])])
    middle = length / 2
    shaft = f'<path d="M0 0H{svg_number(length - 1)}"{_dashes(arrow)}/>'
    tip = svg_number(length)
    head = f'<path d="M{svg_number(length - 8)} -4.5L{tip} 0L{svg_number(length - 8)} 4.5"/>'
    cross = f'<path d="{_CROSS.format(svg_number(middle - 5), -5)}"/>' if arrow.failed else ""
    line = Placed("arrow", shaft + head + cross, Box(0, -6, length, 6))
    last_above = -9.0 - _DESCENT
    first_below = 10.0 + CAP_HEIGHT_EM * TEXT_SIZE
    words = [
        *(_words(t, middle, last_above - i * LINE_HEIGHT, "middle") for i, t in enumerate(reversed(above))),
        *(_words(t, middle, first_below + i * LINE_HEIGHT, "middle") for i, t in enumerate(below)),
    ]
    return _block((0.0, 0.0, item) for item in [line, *words])


def _arrow_downwards(arrow: Arrow, width: float) -> _Block:
    lines = _conditions((*arrow.above, *arrow.below), (width - 30,))
    tall = len(lines) * LINE_HEIGHT
    length = max(44.0, tall + 8)
    shaft = f'<path d="M0 0V{svg_number(length - 1)}"{_dashes(arrow)}/>'
    tip, barb = svg_number(length), svg_number(length - 8)
    head = f'<path d="M-4.5 {barb}L0 {tip}L4.5 {barb}"/>'
    cross = f'<path d="{_CROSS.format(-5, svg_number(length / 2 - 5))}"/>' if arrow.failed else ""
    line = Placed("arrow", shaft + head + cross, Box(-6, 0, 6, length))
    first = (length - tall) / 2 + LINE_HEIGHT / 2 + CAP_HEIGHT_EM * TEXT_SIZE / 2
    words = (_words(text, 16, first + i * LINE_HEIGHT, "start") for i, text in enumerate(lines))
    return _block((0.0, 0.0, item) for item in [line, *words])


def _conditions(lines: Iterable[str], widths: Sequence[float]) -> list[str]:
    """Return the lines, wrapped at the first width that gives few enough of them, else at the last."""
    wrapped: list[str] = []
    for width in widths:
        wrapped = [piece for line in lines for piece in wrap(line, TEXT_SIZE, width)]
        if len(wrapped) <= _FEW_LINES:
            break
    return wrapped


def _dashes(arrow: Arrow) -> str:
    return ' stroke-dasharray="6 4"' if arrow.forecast else ""


def legend(steps: Sequence[Sequence[DrawnCompound] | Arrow]) -> str:
    """Return in one sentence what the outlines of a scheme mean; empty where it has none."""
    compounds = [compound for step in steps if not isinstance(step, Arrow) for compound in step]
    used = [words for mark, words in MEANING_OF_OUTLINES.items() if any(getattr(c, mark) for c in compounds)]
    text = ", ".join(used)
    return text[:1].upper() + text[1:]


_IDENT = re.compile(r"[A-Za-z][A-Za-z0-9_-]*")
