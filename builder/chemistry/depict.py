"""One structure -> a drawn fragment: SVG markup around an origin, and the room it takes.

House style: bonds in the colour of text, letters in the ink of their element, carbons as corners, hydrogens of
labelled atoms spelled out, counter-ions beside their ion, cations first. What leaves stands in a dashed outline,
what arrives in a solid one, atoms a page points at in a dotted one, so that colour alone never tells.
"""

import math
from collections.abc import Iterator, Mapping, Sequence
from functools import lru_cache
from itertools import pairwise
from typing import NamedTuple

from builder.chemistry.inks import element_paint, paint
from builder.chemistry.lettering import CAP_HEIGHT_EM, svg_text, text_width
from builder.chemistry.plane import (
    Box,
    Point,
    convex_hull,
    exit_distance,
    is_inside,
    svg_number,
    svg_point,
    toward,
)
from builder.chemistry.sketch import Line, Sketch, SketchAtom, SketchBond, connected, sketch
from builder.chemistry.structure import AtomId, Structure

__all__ = ["BOND_LENGTH", "LINE_WIDTH", "Fragment", "Marks", "depict"]

BOND_LENGTH = 26.0
"""px; every bond of every scheme, unless a scheme is shrunk to fit."""
LINE_WIDTH = 1.5
LABEL_SIZE = 14.0
SMALL_SIZE = 10.0
_DOUBLE_SPACING = 4.6
_TRIPLE_SPACING = 4.1
_INNER_CUT = 2.9  # by which the inner line of a double bond stops short of a corner
_WEDGE_WIDTH = 6.6
_LABEL_MARGIN = 2.4  # between a label and a bond that meets it
_SMALL_MARGIN = 1.0  # between a raised or lowered sign and a bond
_SHORTEST_BOND = 3.0  # what is left of a bond between two wide labels
_ION_GAP = 11.0
_ABOVE, _BELOW = -12.4, 12.4  # a hydrogen over or under its atom
_RAISED, _LOWERED = -5.2, 4.2  # superscripts and subscripts


class Marks(NamedTuple):
    """Atoms to outline: those that leave, those that arrive, those a page points at."""

    leaves: frozenset[AtomId] = frozenset()
    arrives: frozenset[AtomId] = frozenset()
    points: frozenset[AtomId] = frozenset()


class Fragment(NamedTuple):
    """A drawn structure: SVG markup, the box it takes, and the boxes of its letters."""

    markup: str
    box: Box
    letters: tuple[Box, ...]


_NO_MARKS = Marks()


@lru_cache(maxsize=128)
def depict(structure: Structure, marks: Marks = _NO_MARKS, model: Structure | None = None) -> Fragment:
    """Return the drawing of a structure; with a `model`, turned so that the skeleton they share lies alike."""
    drawn = sketch(structure, model)
    places = [(x * BOND_LENGTH, -y * BOND_LENGTH) for x, y in drawn.places]
    labels = [_label(atom, i, drawn, places) for i, atom in enumerate(drawn.atoms)]
    _set_pieces_in_a_row(drawn.atoms, places, labels)
    boxes = {i: [run.box(places[i]) for run in label] for i, label in enumerate(labels) if label}
    outlines, room = _outlines(drawn, places, boxes, marks)
    bonds = _bonds(drawn.bonds, _Pen(drawn, places, boxes))
    letters = tuple(box for group in boxes.values() for box in group)
    corners = [Box(x, y, x, y).grown(LINE_WIDTH) for x, y in places]
    markup = "".join([*outlines, *bonds, *_letters(drawn.atoms, places, labels)])
    return Fragment(markup, Box.around([*corners, *letters, *room]).grown(1), letters)


# --- letters ----------------------------------------------------------------------------------------------


class _Run(NamedTuple):
    """Letters centred on (x, y) relative to their atom."""

    text: str
    x: float
    y: float
    size: float

    def box(self, at: Point) -> Box:
        x, y = at[0] + self.x, at[1] + self.y
        half, tall = text_width(self.text, self.size) / 2, CAP_HEIGHT_EM * self.size / 2
        return Box(x - half, y - tall, x + half, y + tall)


_NAMED_ISOTOPES = {("H", 2): "D", ("H", 3): "T"}
_HYDROGEN_FIRST = frozenset({"O", "S", "Se", "F", "Cl", "Br", "I"})
"""Where a lone atom is written after its hydrogens: H₂O and HBr, but NH₃ and CH₄."""


def _label(atom: SketchAtom, index: int, drawn: Sketch, places: Sequence[Point]) -> list[_Run]:
    """Return the letters at an atom; none for a carbon that a corner shows."""
    if atom.symbol == "C" and not (atom.charge or atom.isotope or atom.radicals or _needs_letter(index, drawn)):
        return []
    symbol = _NAMED_ISOTOPES.get((atom.symbol, atom.isotope), atom.symbol)
    isotope = str(atom.isotope) if atom.isotope and symbol == atom.symbol else ""
    rays = [toward(places[index], places[other])[:2] for other in atom.neighbours]
    runs = [_Run(symbol, 0, 0, LABEL_SIZE)]
    right = left = text_width(symbol, LABEL_SIZE) / 2
    if isotope:
        width = text_width(isotope, SMALL_SIZE)
        runs.append(_Run(isotope, -left - width / 2, _RAISED, SMALL_SIZE))
        left += width
    side = ""
    if atom.hydrogens:
        side = _hydrogen_side(rays) if rays else "left" if symbol in _HYDROGEN_FIRST else "right"
        hydrogens = _hydrogens(atom.hydrogens, side, left, right)
        runs += hydrogens
        if side == "right":
            right = hydrogens[-1].x + text_width(hydrogens[-1].text, hydrogens[-1].size) / 2
    if sign := _sign(atom.charge) + "•" * atom.radicals:
        x, y = _sign_place(text_width(sign, SMALL_SIZE), rays, left, right, side)
        runs.append(_Run(sign, x, y, SMALL_SIZE))
    return runs


def _needs_letter(index: int, drawn: Sketch) -> bool:
    """Answer for a carbon that no corner would show: alone, in a piece of two, or between two double bonds."""
    atom = drawn.atoms[index]
    if not atom.neighbours:
        return True
    if len(atom.neighbours) == 1:
        return len(drawn.atoms[atom.neighbours[0]].neighbours) == 1
    return sum(bond.order == 2 for bond in drawn.bonds if index in (bond.a, bond.b)) == 2 == len(atom.neighbours)


def _hydrogen_side(rays: Sequence[Point]) -> str:
    """Return the side on which hydrogens stand, away from the bonds; right or left if either has room."""
    room = {side: _room(ray, rays) for side, ray in _SIDES.items()}
    if max(room["right"], room["left"]) > 1.0:
        return "right" if room["right"] >= room["left"] - 0.05 else "left"
    return "up" if room["up"] >= room["down"] - 0.05 else "down"


_SIDES: Mapping[str, Point] = {"right": (1, 0), "left": (-1, 0), "up": (0, -1), "down": (0, 1)}


def _room(ray: Point, rays: Sequence[Point]) -> float:
    """Return the angle, in radian, between a direction and the nearest bond."""
    return min((math.acos(max(-1.0, min(1.0, ray[0] * x + ray[1] * y))) for x, y in rays), default=math.pi)


def _hydrogens(count: int, side: str, left: float, right: float) -> list[_Run]:
    wide = text_width("H", LABEL_SIZE)
    number = str(count) if count > 1 else ""
    narrow = text_width(number, SMALL_SIZE)
    x, y = {
        "right": (right + wide / 2, 0.0),
        "left": (-left - narrow - wide / 2, 0.0),
        "up": (0.0, _ABOVE),
        "down": (0.0, _BELOW),
    }[side]
    runs = [_Run("H", x, y, LABEL_SIZE)]
    if number:
        runs.append(_Run(number, x + (wide + narrow) / 2, y + _LOWERED, SMALL_SIZE))
    return runs


def _sign(charge: int) -> str:
    if not charge:
        return ""
    size = str(abs(charge)) if abs(charge) > 1 else ""
    return size + ("+" if charge > 0 else "−")


def _sign_place(width: float, rays: Sequence[Point], left: float, right: float, hydrogens: str) -> Point:
    """Return the corner of a label at which the bonds leave room for a charge; upper right if there is the choice."""
    after, before = right + width / 2 - 0.5, -left - width / 2 + 0.5
    corners = [(after, _RAISED), (after, -_RAISED)]
    if hydrogens == "right" or not rays:
        return corners[0]
    if hydrogens != "left":
        corners += [(before, _RAISED), (before, -_RAISED)]
    if hydrogens != "up":
        corners.append((0.0, -11.5))
    if hydrogens != "down":
        corners.append((0.0, 11.5))

    def room(corner: Point) -> float:
        return _room(toward((0, 0), corner)[:2], rays)

    return next((corner for corner in corners if room(corner) > 0.85), max(corners, key=room))


def _set_pieces_in_a_row(atoms: Sequence[SketchAtom], places: list[Point], labels: list[list[_Run]]) -> None:
    """Move the species of a salt side by side, cations first; like lone ions become one with a number before it."""
    pieces: dict[int, list[int]] = {}
    for index, atom in enumerate(atoms):
        pieces.setdefault(atom.piece, []).append(index)
    if len(pieces) == 1:
        return
    row = sorted(pieces.values(), key=lambda piece: (-_sign_of(sum(atoms[i].charge for i in piece)), piece))
    alike: dict[SketchAtom, list[int]] = {}
    edge = 0.0
    for piece in row:
        lone = atoms[piece[0]]._replace(piece=0)
        if len(piece) == 1 and len(alike.setdefault(lone, [])) > 0:
            labels[piece[0]] = []
            places[piece[0]] = places[alike[lone][0]]
            alike[lone].append(piece[0])
            continue
        if len(piece) == 1:
            alike[lone].append(piece[0])
            count = sum(other._replace(piece=0) == lone for other in atoms)
            if count > 1:
                labels[piece[0]].append(_multiplier(count, labels[piece[0]]))
        box = Box.around(
            [Box(*places[i], *places[i]) for i in piece] + [run.box(places[i]) for i in piece for run in labels[i]]
        )
        # Heights are taken from the atoms alone, so that letters of neighbours share a baseline.
        heights = [places[i][1] for i in piece]
        dx, dy = edge - box.left, -(min(heights) + max(heights)) / 2
        for i in piece:
            places[i] = (places[i][0] + dx, places[i][1] + dy)
        edge += box.width + _ION_GAP


def _sign_of(charge: int) -> int:
    return (charge > 0) - (charge < 0)


def _multiplier(count: int, label: Sequence[_Run]) -> _Run:
    text = str(count)
    left = min(run.box((0, 0)).left for run in label)
    return _Run(text, left - 3 - text_width(text, LABEL_SIZE) / 2, 0, LABEL_SIZE)


def _letters(atoms: Sequence[SketchAtom], places: Sequence[Point], labels: Sequence[Sequence[_Run]]) -> Iterator[str]:
    written = []
    for atom, (x, y), label in zip(atoms, places, labels, strict=True):
        colour = element_paint(atom.symbol)
        fill = "" if colour == "currentColor" else f' fill="{colour}"'
        for run in label:
            size = "" if run.size == LABEL_SIZE else f' font-size="{svg_number(run.size)}"'
            baseline = y + run.y + CAP_HEIGHT_EM * run.size / 2
            at = f'x="{svg_number(x + run.x)}" y="{svg_number(baseline)}"'
            written.append(f"<text {at}{size}{fill}>{svg_text(run.text)}</text>")
    if written:
        style = f'font-size="{svg_number(LABEL_SIZE)}" text-anchor="middle" fill="currentColor" stroke="none"'
        yield f"<g {style}>{''.join(written)}</g>"


# --- bonds ------------------------------------------------------------------------------------------------


class _Pen:
    """Collects the lines and areas of one structure, cut back where labels stand."""

    def __init__(self, drawn: Sketch, places: Sequence[Point], labels: Mapping[int, Sequence[Box]]) -> None:
        self.drawn = drawn
        self.places = places
        self.labels = labels
        self.margins = {
            atom: [box.grown(_LABEL_MARGIN if box.height > SMALL_SIZE else _SMALL_MARGIN) for box in boxes]
            for atom, boxes in labels.items()
        }
        self.strokes: list[str] = []
        self.areas: list[str] = []

    def ends(self, a: int, b: int) -> tuple[Point, Point]:
        """Return the visible ends of the bond a-b."""
        start, end = self.places[a], self.places[b]
        ux, uy, length = toward(start, end)
        cut_a, cut_b = self._cut(a, (ux, uy)), self._cut(b, (-ux, -uy))
        if cut_a + cut_b > length - _SHORTEST_BOND:
            share = (length - _SHORTEST_BOND) / (cut_a + cut_b)
            cut_a, cut_b = cut_a * share, cut_b * share
        return (start[0] + ux * cut_a, start[1] + uy * cut_a), (end[0] - ux * cut_b, end[1] - uy * cut_b)

    def _cut(self, atom: int, direction: Point) -> float:
        at = self.places[atom]
        return max((exit_distance(b, at, direction) for b in self.margins.get(atom, ())), default=0.0)

    def line(self, *points: Point) -> None:
        self.strokes.append("M" + "L".join(map(svg_point, points)))

    def area(self, *points: Point) -> None:
        self.areas.append("M" + "L".join(map(svg_point, points)) + "Z")


def _bonds(bonds: Sequence[SketchBond], pen: _Pen) -> Iterator[str]:
    for bond in bonds:
        _draw_bond(pen, bond)
    if pen.strokes:
        yield f'<path d="{"".join(pen.strokes)}"/>'
    if pen.areas:
        yield f'<path d="{"".join(pen.areas)}" fill="currentColor" stroke="none"/>'


def _draw_bond(pen: _Pen, bond: SketchBond) -> None:
    start, end = pen.ends(bond.a, bond.b)
    if bond.line is Line.WAVY:
        _wave(pen, start, end)
    elif bond.line is Line.WEDGE:
        _wedge(pen, start, end)
    elif bond.line is Line.HASH:
        _hashes(pen, start, end)
    elif bond.order == 2:
        _double(pen, bond, start, end)
    else:
        pen.line(start, end)
        if bond.order == 3:
            pen.line(*_beside(start, end, _TRIPLE_SPACING))
            pen.line(*_beside(start, end, -_TRIPLE_SPACING))


def _beside(start: Point, end: Point, side: float) -> tuple[Point, Point]:
    ux, uy, _ = toward(start, end)
    nx, ny = -uy * side, ux * side
    return (start[0] + nx, start[1] + ny), (end[0] + nx, end[1] + ny)


def _wedge(pen: _Pen, start: Point, end: Point) -> None:
    tip, wide = LINE_WIDTH / 3, _WEDGE_WIDTH / 2
    narrow = (_beside(start, end, side)[0] for side in (-tip, tip))
    pen.area(*narrow, *(_beside(start, end, side)[1] for side in (wide, -wide)))


def _hashes(pen: _Pen, start: Point, end: Point) -> None:
    ux, uy, length = toward(start, end)
    count = max(3, round(length / 3.2))
    for step in range(count):
        share = (step + 0.6) / (count - 0.4)
        half = (0.12 + 0.88 * share) * _WEDGE_WIDTH / 2
        x, y = start[0] + ux * length * share, start[1] + uy * length * share
        pen.line((x - uy * half, y + ux * half), (x + uy * half, y - ux * half))


def _wave(pen: _Pen, start: Point, end: Point) -> None:
    ux, uy, length = toward(start, end)
    count = max(4, 2 * round(length / 6.5))
    parts = [f"M{svg_point(start)}"]
    for index in range(count):
        side = 4.0 if index % 2 else -4.0
        middle, stop = (index + 0.5) * length / count, (index + 1) * length / count
        crest = (start[0] + ux * middle - uy * side, start[1] + uy * middle + ux * side)
        parts.append(f"Q{svg_point(crest)} {svg_point((start[0] + ux * stop, start[1] + uy * stop))}")
    pen.strokes.append("".join(parts))


def _double(pen: _Pen, bond: SketchBond, start: Point, end: Point) -> None:
    side = _side_of_second_line(pen, bond)
    if not side:
        pen.line(*_beside(start, end, _DOUBLE_SPACING / 2))
        pen.line(*_beside(start, end, -_DOUBLE_SPACING / 2))
        return
    pen.line(start, end)
    inner_start, inner_end = _beside(start, end, side * _DOUBLE_SPACING)
    ux, uy, _ = toward(start, end)
    cut_a, cut_b = (
        _INNER_CUT if i not in pen.labels and len(pen.drawn.atoms[i].neighbours) > 1 else 0.0 for i in (bond.a, bond.b)
    )
    pen.line(
        (inner_start[0] + ux * cut_a, inner_start[1] + uy * cut_a),
        (inner_end[0] - ux * cut_b, inner_end[1] - uy * cut_b),
    )


def _side_of_second_line(pen: _Pen, bond: SketchBond) -> int:
    """Return the side (+1, -1) of the second line of a double bond, or 0 for two even lines.

    Into its ring; in a chain to the side with more neighbours; even at a label, a fork or a cumulated bond.
    """
    start = pen.places[bond.a]
    ux, uy, _ = toward(start, pen.places[bond.b])

    def side_of(point: Point) -> int:
        across = -uy * (point[0] - start[0]) + ux * (point[1] - start[1])
        return 0 if abs(across) < 0.5 else 1 if across > 0 else -1

    if bond.ring:
        corners = [pen.places[i] for i in bond.ring]
        return side_of((sum(x for x, _ in corners) / len(corners), sum(y for _, y in corners) / len(corners))) or 1
    at_a, at_b = (
        [side for n in pen.drawn.atoms[i].neighbours if (side := side_of(pen.places[n]))] for i in (bond.a, bond.b)
    )
    if not at_a or not at_b:
        beside = at_a or at_b
        labelled = bond.a in pen.labels or bond.b in pen.labels
        return 0 if labelled or len(beside) != 1 else beside[0]
    total = sum(at_a) + sum(at_b)
    if total:
        return 1 if total > 0 else -1
    return 0 if len(at_a) == len(at_b) == 2 else at_a[0]


# --- outlines ---------------------------------------------------------------------------------------------

_OUTLINE_RADIUS = 5.5
_PATTERNS = {
    "leaves": ' stroke-dasharray="4.5 3"',
    "arrives": "",
    "points": ' stroke-dasharray="0.1 3.6" stroke-width="2"',
}


def _outlines(
    drawn: Sketch, places: Sequence[Point], labels: Mapping[int, Sequence[Box]], marks: Marks
) -> tuple[list[str], list[Box]]:
    """Return the outlines round marked atoms and the room they take; joined neighbours share an outline."""
    paths: list[str] = []
    room: list[Box] = []
    taken: set[int] = set()
    neighbours = [atom.neighbours for atom in drawn.atoms]
    for name, pattern in _PATTERNS.items():
        left = {i for i in getattr(marks, name) if i < len(places)} - taken
        taken |= left
        while left:
            group = connected(min(left), left, neighbours)
            left -= group
            for hull in _hulls(group, places, labels):
                paths.append(f'<path d="{_rounded(hull)}" stroke="{paint(name)}"{pattern}/>')
                room.append(Box.around(Box(*p, *p) for p in hull).grown(_OUTLINE_RADIUS + 1))
    return paths, room


def _hulls(group: set[int], places: Sequence[Point], labels: Mapping[int, Sequence[Box]]) -> Iterator[list[Point]]:
    """Yield one hull round the group, or one for each atom where a common one would enclose a stranger."""
    hull = convex_hull(p for i in group for p in _extent(i, places, labels))
    if len(group) > 1 and any(is_inside(places[i], hull) for i in range(len(places)) if i not in group):
        for atom in sorted(group):
            yield convex_hull(_extent(atom, places, labels))
    else:
        yield hull


def _extent(atom: int, places: Sequence[Point], labels: Mapping[int, Sequence[Box]]) -> list[Point]:
    """Return points round an atom that an outline has to clear: the corners of its letters, or a small octagon."""
    if atom in labels:
        # Letters do not fill the corners of their boxes.
        boxes = [box.grown(-0.8) for box in labels[atom]]
        return [(x, y) for b in boxes for x in (b.left, b.right) for y in (b.top, b.bottom)]
    x, y = places[atom]
    return [(x + 2.5 * math.cos(k * math.pi / 4), y + 2.5 * math.sin(k * math.pi / 4)) for k in range(8)]


def _rounded(hull: Sequence[Point]) -> str:
    """Return the path that runs round a hull at a fixed distance: straight edges, joined by arcs."""
    r = _OUTLINE_RADIUS
    arc = f"A{svg_number(r)} {svg_number(r)} 0 0 1 "
    edges = []
    for a, b in pairwise([*hull, hull[0]]):
        ux, uy, _ = toward(a, b)
        edges.append(f"{svg_point((a[0] + uy * r, a[1] - ux * r))}L{svg_point((b[0] + uy * r, b[1] - ux * r))}")
    return "M" + arc.join([*edges, edges[0].split("L")[0]]) + "Z"
