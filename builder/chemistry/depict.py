"""One structure -> a drawn fragment: SVG markup around an origin, and the room it takes.

RDKit gives coordinates and picks the bonds that carry wedges; everything drawn is our own. Only the plain
coordinate code of RDKit is used, which needs no X libraries. Stereo follows the IUPAC recommendations for
graphical representation (Pure Appl. Chem. 2006, 78, 1897; 2008, 80, 277): plain wedges with the narrow end at
the stereocentre, no stereo at other atoms, an undefined centre drawn plain, a double bond by its geometry, an
undefined double bond with one wavy single bond.
"""

import math
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

from rdkit import Chem
from rdkit.Chem import rdDepictor
from rdkit.Geometry import Point3D

from builder.chemistry.lettering import CAP_HEIGHT_EM, text_width
from builder.chemistry.structure import AtomId, Structure

__all__ = [
    "BOND_LENGTH",
    "LINE",
    "PALETTE",
    "PAPER",
    "Box",
    "Colour",
    "Fragment",
    "Marks",
    "depict",
    "format_number",
    "ink",
    "palette_css",
    "resolve_colours",
    "to_mol_block",
]

BOND_LENGTH = 26.0
"""px; every bond of every scheme, unless a scheme is shrunk to fit."""
LABEL_SIZE = 14.0
SMALL_SIZE = 10.0
LINE = 1.5
_SPACING = 4.6  # between the two lines of a double bond
_WEDGE = 6.6  # width of the wide end
_MARGIN = 2.4  # between a label and a bond that meets it


# --- colours ----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Colour:
    """One ink for light and for dark paper, as #rrggbb."""

    light: str
    dark: str


PALETTE: Mapping[str, Colour] = {
    "ink": Colour("#1c2024", "#e6e8eb"),
    "n": Colour("#1f55a8", "#8ab6ff"),
    "o": Colour("#b0253a", "#ff8f9c"),
    "s": Colour("#7a5c00", "#e0bd4a"),
    "p": Colour("#96460a", "#f5a66a"),
    "f": Colour("#0a6e66", "#58cfc0"),
    "cl": Colour("#2c6e1f", "#86d272"),
    "br": Colour("#8c3f22", "#eda184"),
    "i": Colour("#6c2f9c", "#cda0f2"),
    "b": Colour("#8a3f5f", "#efa0c0"),
    "si": Colour("#47616e", "#a5bfcc"),
    "leaves": Colour("#b0461e", "#f59a72"),
    "arrives": Colour("#1b6a52", "#62cfa8"),
    "points": Colour("#5b4aa8", "#b3a6ff"),
}
"""Our own inks: text contrast of 4.5:1 or more, each on its paper (white, #1b1e24)."""

PAPER = Colour("#ffffff", "#1b1e24")

_VARIABLE = re.compile(r"var\(--hb-([a-z]+), *#[0-9a-f]{6}\)")


def ink(name: str) -> str:
    """Return the paint for a palette name: a CSS variable that falls back to the ink for light paper."""
    return f"var(--hb-{name}, {PALETTE[name].light})"


def palette_css(*, dark: bool = False) -> str:
    """Return the custom properties of one palette, as CSS declarations for a style sheet."""
    return "".join(f"--hb-{name}:{c.dark if dark else c.light};" for name, c in PALETTE.items() if name != "ink")


def resolve_colours(svg: str, *, dark: bool = False) -> str:
    """Return the drawing with its variables and `currentColor` replaced, for converters that know neither."""

    def fixed(match: re.Match[str]) -> str:
        colour = PALETTE[match.group(1)]
        return colour.dark if dark else colour.light

    text = PALETTE["ink"].dark if dark else PALETTE["ink"].light
    return _VARIABLE.sub(fixed, svg).replace('"currentColor"', f'"{text}"')


def _element_ink(symbol: str) -> str:
    name = symbol.lower()
    return ink(name) if name in PALETTE else "currentColor"


# --- plane geometry ---------------------------------------------------------------------------------------

Point = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Box:
    """A rectangle in px; y grows downwards."""

    left: float
    top: float
    right: float
    bottom: float

    @property
    def width(self) -> float:
        """Return the width in px."""
        return self.right - self.left

    @property
    def height(self) -> float:
        """Return the height in px."""
        return self.bottom - self.top

    def moved(self, dx: float, dy: float, scale: float = 1.0) -> "Box":
        """Return the box scaled about the origin, then moved."""
        left, top, right, bottom = (edge * scale for edge in (self.left, self.top, self.right, self.bottom))
        return Box(left + dx, top + dy, right + dx, bottom + dy)

    def grown(self, by: float) -> "Box":
        """Return the box with a border of `by` px on every side."""
        return Box(self.left - by, self.top - by, self.right + by, self.bottom + by)

    def overlaps(self, other: "Box") -> bool:
        """Answer whether the two share area; touching edges do not count."""
        return (
            self.left < other.right and other.left < self.right and self.top < other.bottom and other.top < self.bottom
        )

    @staticmethod
    def around(boxes: Iterable["Box"]) -> "Box":
        """Return the smallest box that holds all."""
        every = list(boxes)
        return Box(
            min(b.left for b in every),
            min(b.top for b in every),
            max(b.right for b in every),
            max(b.bottom for b in every),
        )


def _toward(start: Point, end: Point) -> tuple[float, float, float]:
    """Return the unit vector from start to end, and the distance."""
    dx, dy = end[0] - start[0], end[1] - start[1]
    length = math.hypot(dx, dy) or 1.0
    return dx / length, dy / length, length


def _exit_distance(box: Box, start: Point, direction: Point) -> float:
    """Return how far a ray from `start` runs until it has left the box for good; 0 if it never meets it."""
    near, far = -math.inf, math.inf
    for at, step, low, high in (
        (start[0], direction[0], box.left, box.right),
        (start[1], direction[1], box.top, box.bottom),
    ):
        if abs(step) < 1e-9:
            if not low <= at <= high:
                return 0.0
            continue
        a, b = sorted(((low - at) / step, (high - at) / step))
        near, far = max(near, a), min(far, b)
    return far if far > max(near, 0.0) else 0.0


def format_number(value: float) -> str:
    """Return a length in px to one decimal, in the shortest form."""
    text = f"{value:.1f}"
    return "0" if text == "-0.0" else text.removesuffix(".0")


def _at(point: Point) -> str:
    return f"{format_number(point[0])} {format_number(point[1])}"


# --- coordinates ------------------------------------------------------------------------------------------


@lru_cache(maxsize=4096)
def _laid_out(structure: Structure) -> Chem.Mol:
    """Return a kekulised copy with 2D coordinates, its bonds straightened; its first atoms are those of the structure.

    A stereocentre whose three neighbours all stand in rings gets its hydrogen drawn, so that the wedge need not
    lie in a ring.
    """
    mol = Chem.Mol(structure.mol)
    fused = [
        atom.GetIdx()
        for atom in mol.GetAtoms()
        if atom.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED
        and atom.GetTotalNumHs() == 1
        and atom.GetDegree() == 3
        and all(bond.IsInRing() for bond in atom.GetBonds())
    ]
    if fused:
        mol = Chem.AddHs(mol, onlyOnAtoms=fused)
    Chem.Kekulize(mol, clearAromaticFlags=True)
    rdDepictor.Compute2DCoords(mol, canonOrient=True, useRingTemplates=True)
    rdDepictor.NormalizeDepiction(mol, scaleFactor=-1.0)
    rdDepictor.StraightenDepiction(mol)
    return mol


def _fitted(structure: Structure, model: Structure) -> Chem.Mol:
    """Return the laid-out structure turned, and if need be flipped, so that it lies like `model`."""
    mol, ideal = _laid_out(structure), _laid_out(model)
    pairs = _common_atoms(structure, model)
    if len(pairs) < 2:
        return mol
    places = mol.GetConformer().GetPositions()
    targets = ideal.GetConformer().GetPositions()
    moved = [complex(places[i][0], places[i][1]) for i, _ in pairs]
    fixed = [complex(targets[j][0], targets[j][1]) for _, j in pairs]
    centre, goal = sum(moved) / len(moved), sum(fixed) / len(fixed)
    best: tuple[float, complex, bool] | None = None
    for flip in (False, True):
        around = [(z - centre).conjugate() if flip else z - centre for z in moved]
        turn = sum((g - goal) * z.conjugate() for z, g in zip(around, fixed, strict=True))
        turn = turn / abs(turn) if abs(turn) > 1e-6 else 1 + 0j
        error = sum(abs(z * turn - (g - goal)) ** 2 for z, g in zip(around, fixed, strict=True))
        if best is None or error < best[0] - 1e-3:
            best = (error, turn, flip)
    assert best is not None  # noqa: S101 - two passes have been made
    _, turn, flip = best
    turned = Chem.Mol(mol)
    conformer = turned.GetConformer()
    for index, place in enumerate(places):
        z = complex(place[0], place[1]) - centre
        z = (z.conjugate() if flip else z) * turn
        conformer.SetAtomPosition(index, Point3D(z.real, z.imag, 0.0))
    rdDepictor.StraightenDepiction(turned)
    return turned


@lru_cache(maxsize=4096)
def _common_atoms(structure: Structure, model: Structure) -> tuple[tuple[AtomId, AtomId], ...]:
    """Return pairs (atom of structure, atom of model) of the largest carbon skeleton they share; empty if none."""
    degrees = [atom.GetDegree() for atom in structure.mol.GetAtoms()]
    for skeleton in _carbon_skeletons(model):
        matches = structure.mol.GetSubstructMatches(_skeleton_query(model, skeleton), uniquify=False, maxMatches=64)
        if matches:
            wanted = [model.mol.GetAtomWithIdx(j).GetDegree() for j in skeleton]
            best = min(matches, key=lambda m: (sum(abs(degrees[i] - d) for i, d in zip(m, wanted, strict=True)), m))
            return tuple(zip(best, skeleton, strict=True))
    return ()


@lru_cache(maxsize=1024)
def _carbon_skeletons(structure: Structure) -> tuple[tuple[AtomId, ...], ...]:
    """Return the sets of two or more carbons joined by carbon-carbon bonds, largest first."""
    left = {atom.GetIdx() for atom in structure.mol.GetAtoms() if atom.GetAtomicNum() == 6}
    found = []
    while left:
        piece = _connected(structure.mol, min(left), left)
        left -= piece
        found.append(tuple(sorted(piece)))
    return tuple(sorted((f for f in found if len(f) > 1), key=lambda f: (-len(f), f)))


def _skeleton_query(structure: Structure, atoms: tuple[AtomId, ...]) -> Chem.Mol:
    query = Chem.RWMol()
    place = {}
    for atom in atoms:
        place[atom] = query.AddAtom(Chem.AtomFromSmarts("[#6]"))
    for bond in structure.mol.GetBonds():
        a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        if a in place and b in place:
            query.AddBond(place[a], place[b], Chem.BondType.UNSPECIFIED)
            query.ReplaceBond(query.GetNumBonds() - 1, _ANY_BOND)
    return query.GetMol()


_ANY_BOND = Chem.MolFromSmarts("*~*").GetBondWithIdx(0)


def _connected(mol: Chem.Mol, start: AtomId, within: Iterable[AtomId]) -> set[AtomId]:
    allowed, seen, waiting = set(within), {start}, [start]
    while waiting:
        for neighbour in mol.GetAtomWithIdx(waiting.pop()).GetNeighbors():
            index = neighbour.GetIdx()
            if index in allowed and index not in seen:
                seen.add(index)
                waiting.append(index)
    return seen


def to_mol_block(structure: Structure, model: Structure | None = None) -> str:
    """Return the coordinates and wedges as drawn, as a V2000 mol block."""
    mol = _laid_out(structure) if model is None else _fitted(structure, model)
    return Chem.MolToMolBlock(mol, kekulize=False)


# --- one fragment -----------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Marks:
    """Atoms to outline: those that leave (dashes), those that arrive (a solid line), those pointed at (dots)."""

    leaves: frozenset[AtomId] = frozenset()
    arrives: frozenset[AtomId] = frozenset()
    points: frozenset[AtomId] = frozenset()


@dataclass(frozen=True, slots=True)
class Fragment:
    """A drawn structure: SVG markup, its box around the origin, and the boxes of its atom labels."""

    markup: str
    box: Box
    labels: tuple[Box, ...]


@dataclass(frozen=True, slots=True)
class _Run:
    """A run of letters centred on (x, y) relative to its atom."""

    text: str
    x: float
    y: float
    size: float

    def box(self, at: Point) -> Box:
        half, tall = text_width(self.text, self.size) / 2, CAP_HEIGHT_EM * self.size / 2
        return Box(at[0] + self.x - half, at[1] + self.y - tall, at[0] + self.x + half, at[1] + self.y + tall)


@lru_cache(maxsize=4096)
def depict(structure: Structure, marks: Marks = Marks(), model: Structure | None = None) -> Fragment:
    """Return the drawing of a structure; with a `model`, turned so that the skeleton they share lies alike."""
    mol = Chem.Mol(_laid_out(structure) if model is None or model == structure else _fitted(structure, model))
    Chem.WedgeMolBonds(mol, mol.GetConformer())
    wavy = _wavy_bonds(structure, mol)
    places = _places(mol)
    runs = {atom.GetIdx(): _label(atom, places) for atom in mol.GetAtoms()}
    places = _pieces_in_a_row(mol, places, runs)
    boxes = {i: [run.box(places[i]) for run in label] for i, label in runs.items() if label}
    pen = _Pen(places, boxes)
    for bond in mol.GetBonds():
        _draw_bond(pen, mol, bond, bond.GetIdx() in wavy)
    outlines, outline_boxes = _outlines(mol, places, boxes, marks)
    markup = "".join([*outlines, *pen.markup(), *_letters(mol, places, runs)])
    dots = [Box(x, y, x, y).grown(LINE) for x, y in places]
    labels = tuple(box for group in boxes.values() for box in group)
    return Fragment(markup, Box.around([*dots, *labels, *outline_boxes]).grown(1), labels)


def _places(mol: Chem.Mol) -> list[Point]:
    """Return the places in px, y downwards. RDKit's own bond length, after normalising, is 1.5."""
    scale = BOND_LENGTH / 1.5
    return [(x * scale, -y * scale) for x, y, _ in mol.GetConformer().GetPositions().tolist()]


def _pieces_in_a_row(mol: Chem.Mol, places: list[Point], runs: Mapping[int, Sequence[_Run]]) -> list[Point]:
    """Return the places with the separate species of a salt side by side, middles on one line; centred on (0, 0)."""
    moved = list(places)
    edge = 0.0
    for piece in Chem.GetMolFrags(mol):
        box = Box.around(
            [Box(*places[i], *places[i]) for i in piece] + [r.box(places[i]) for i in piece for r in runs[i]]
        )
        dx, dy = edge - box.left, -(box.top + box.bottom) / 2
        for i in piece:
            moved[i] = (places[i][0] + dx, places[i][1] + dy)
        edge += box.width + 0.45 * BOND_LENGTH
    middle = (edge - 0.45 * BOND_LENGTH) / 2
    return [(x - middle, y) for x, y in moved]


def _wavy_bonds(structure: Structure, mol: Chem.Mol) -> set[int]:
    """Return one single bond for each double bond that could be E or Z and is neither."""
    wavy: set[int] = set()
    if not any(bond.GetBondType() == Chem.BondType.DOUBLE for bond in mol.GetBonds()):
        return wavy
    for info in Chem.FindPotentialStereo(Chem.Mol(structure.mol), cleanIt=False, flagPossible=True):
        if info.type != Chem.StereoType.Bond_Double or info.specified == Chem.StereoSpecified.Specified:
            continue
        ends = structure.mol.GetBondWithIdx(info.centeredOn)
        chosen = _single_bond_at(mol, ends.GetBeginAtomIdx(), ends.GetEndAtomIdx())
        if chosen is not None:
            wavy.add(chosen)
    return wavy


def _single_bond_at(mol: Chem.Mol, a: int, b: int) -> int | None:
    """Return the least busy single bond beside the double bond a=b: to a small neighbour, outside rings."""
    candidates = [
        (bond.IsInRing(), bond.GetOtherAtom(end).GetDegree(), bond.GetIdx())
        for end, other in ((mol.GetAtomWithIdx(a), b), (mol.GetAtomWithIdx(b), a))
        for bond in end.GetBonds()
        if bond.GetOtherAtomIdx(end.GetIdx()) != other
        and bond.GetBondType() == Chem.BondType.SINGLE
        and bond.GetBondDir() not in (Chem.BondDir.BEGINWEDGE, Chem.BondDir.BEGINDASH)
    ]
    return min(candidates)[-1] if candidates else None


# --- letters ----------------------------------------------------------------------------------------------

_NAMED_ISOTOPES = {(1, 2): "D", (1, 3): "T"}


def _label(atom: Chem.Atom, places: Sequence[Point]) -> tuple[_Run, ...]:
    """Return the letters at an atom; none for a plain carbon of a skeleton."""
    symbol = _NAMED_ISOTOPES.get((atom.GetAtomicNum(), atom.GetIsotope()), atom.GetSymbol())
    isotope = atom.GetIsotope() if symbol == atom.GetSymbol() else 0
    charge, radicals = atom.GetFormalCharge(), atom.GetNumRadicalElectrons()
    if atom.GetAtomicNum() == 6 and not (charge or isotope or radicals) and not _needs_letter(atom):
        return ()
    rays = _rays(atom, places)
    runs = [_Run(symbol, 0, 0, LABEL_SIZE)]
    right = left = text_width(symbol, LABEL_SIZE) / 2
    if isotope:
        width = text_width(str(isotope), SMALL_SIZE)
        runs.append(_Run(str(isotope), -left - width / 2, -4.5, SMALL_SIZE))
        left += width
    side = ""
    if atom.GetTotalNumHs():
        side = _hydrogen_side(rays)
        hydrogens = _hydrogens(atom.GetTotalNumHs(), side, left, right)
        runs += hydrogens
        if side == "right":
            right = hydrogens[-1].x + text_width(hydrogens[-1].text, hydrogens[-1].size) / 2
    sign = _sign(charge) + "•" * radicals
    if sign:
        runs.append(_sign_run(sign, rays, left, right, taken=side))
    return tuple(runs)


def _needs_letter(carbon: Chem.Atom) -> bool:
    """A carbon alone, or between two double bonds, where no corner would show it."""
    bonds = carbon.GetBonds()
    cumulated = len(bonds) == 2 and all(bond.GetBondType() == Chem.BondType.DOUBLE for bond in bonds)
    return not bonds or cumulated


def _rays(atom: Chem.Atom, places: Sequence[Point]) -> list[Point]:
    at = places[atom.GetIdx()]
    return [_toward(at, places[other.GetIdx()])[:2] for other in atom.GetNeighbors()]


def _hydrogen_side(rays: Sequence[Point]) -> str:
    """Return the side on which hydrogens stand, away from the bonds; right if there is the choice."""
    if not rays:
        return "right"
    room = {
        side: min(math.acos(max(-1.0, min(1.0, x * ray[0] + y * ray[1]))) for ray in rays)
        for side, (x, y) in {"right": (1, 0), "left": (-1, 0), "up": (0, -1), "down": (0, 1)}.items()
    }
    if room["right"] > 1.0 or room["left"] > 1.0:
        return "right" if room["right"] >= room["left"] - 0.05 else "left"
    return "up" if room["up"] >= room["down"] - 0.05 else "down"


def _hydrogens(count: int, side: str, left: float, right: float) -> list[_Run]:
    wide = text_width("H", LABEL_SIZE)
    number = str(count) if count > 1 else ""
    narrow = text_width(number, SMALL_SIZE)
    if side == "right":
        x, y = right + wide / 2, 0.0
    elif side == "left":
        x, y = -left - narrow - wide / 2, 0.0
    else:
        x, y = 0.0, (-12.4 if side == "up" else 12.4)
    runs = [_Run("H", x, y, LABEL_SIZE)]
    if number:
        runs.append(_Run(number, x + wide / 2 + narrow / 2, y + 4.2, SMALL_SIZE))
    return runs


def _sign(charge: int) -> str:
    if not charge:
        return ""
    size = str(abs(charge)) if abs(charge) > 1 else ""
    return size + ("+" if charge > 0 else "−")


def _sign_run(sign: str, rays: Sequence[Point], left: float, right: float, *, taken: str) -> _Run:
    """Return the charge at the corner of the label with most room."""
    half = text_width(sign, SMALL_SIZE) / 2
    # A neutral order of preference; hydrogens on a side leave only its far end or the other sides.
    corners = [(right + half - 0.5, -5.5), (right + half - 0.5, 5.5)]
    if taken != "left":
        corners += [(-left - half + 0.5, -5.5), (-left - half + 0.5, 5.5)]
    if taken != "up":
        corners.append((0.0, -11.5))
    if taken != "down":
        corners.append((0.0, 11.5))
    if taken == "right" or not rays:
        x, y = corners[0]
        return _Run(sign, x, y, SMALL_SIZE)

    def room(corner: Point) -> float:
        ux, uy, _ = _toward((0, 0), corner)
        return min(math.acos(max(-1.0, min(1.0, ux * x + uy * y))) for x, y in rays)

    x, y = next((c for c in corners if room(c) > 0.85), max(corners, key=room))
    return _Run(sign, x, y, SMALL_SIZE)


def _letters(mol: Chem.Mol, places: Sequence[Point], runs: Mapping[int, Sequence[_Run]]) -> Iterator[str]:
    written = []
    for atom in mol.GetAtoms():
        fill = _element_ink(atom.GetSymbol())
        paint = "" if fill == "currentColor" else f' fill="{fill}"'
        x, y = places[atom.GetIdx()]
        for run in runs[atom.GetIdx()]:
            size = "" if run.size == LABEL_SIZE else f' font-size="{format_number(run.size)}"'
            baseline = y + run.y + CAP_HEIGHT_EM * run.size / 2
            written.append(
                f'<text x="{format_number(x + run.x)}" y="{format_number(baseline)}"{size}{paint}>{run.text}</text>'
            )
    if written:
        yield (
            f'<g font-size="{format_number(LABEL_SIZE)}" text-anchor="middle" fill="currentColor" stroke="none">'
            + "".join(written)
            + "</g>"
        )


# --- bonds ------------------------------------------------------------------------------------------------


class _Pen:
    """Collects the lines and areas of one structure."""

    def __init__(self, places: Sequence[Point], labels: Mapping[int, Sequence[Box]]) -> None:
        self.places = places
        self.labels = labels
        self.strokes: list[str] = []
        self.areas: list[str] = []

    def ends(self, a: int, b: int) -> tuple[Point, Point]:
        """Return the ends of the bond a-b, cut back where labels stand."""
        start, end = self.places[a], self.places[b]
        ux, uy, length = _toward(start, end)
        cut_a, cut_b = self._cut(a, (ux, uy)), self._cut(b, (-ux, -uy))
        if cut_a + cut_b > length - 3:
            excess = (length - 3) / (cut_a + cut_b)
            cut_a, cut_b = cut_a * excess, cut_b * excess
        return (
            (start[0] + ux * cut_a, start[1] + uy * cut_a),
            (end[0] - ux * cut_b, end[1] - uy * cut_b),
        )

    def _cut(self, atom: int, direction: Point) -> float:
        start = self.places[atom]
        return max((_exit_distance(b.grown(_MARGIN), start, direction) for b in self.labels.get(atom, ())), default=0)

    def line(self, *points: Point) -> None:
        self.strokes.append("M" + "L".join(_at(p) for p in points))

    def area(self, *points: Point) -> None:
        self.areas.append("M" + "L".join(_at(p) for p in points) + "Z")

    def markup(self) -> Iterator[str]:
        if self.strokes:
            yield f'<path d="{"".join(self.strokes)}"/>'
        if self.areas:
            yield f'<path d="{"".join(self.areas)}" fill="currentColor" stroke="none"/>'


def _draw_bond(pen: _Pen, mol: Chem.Mol, bond: Chem.Bond, wavy: bool) -> None:
    a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
    start, end = pen.ends(a, b)
    kind, direction = bond.GetBondType(), bond.GetBondDir()
    if wavy:
        _wave(pen, start, end)
    elif direction == Chem.BondDir.BEGINWEDGE:
        _wedge(pen, start, end)
    elif direction == Chem.BondDir.BEGINDASH:
        _hashes(pen, start, end)
    elif kind == Chem.BondType.DOUBLE:
        _double(pen, mol, bond, start, end)
    elif kind == Chem.BondType.TRIPLE:
        pen.line(start, end)
        for side in (_SPACING * 0.9, -_SPACING * 0.9):
            pen.line(*_beside(start, end, side, 0.0))
    else:
        pen.line(start, end)


def _beside(start: Point, end: Point, side: float, shorten: float) -> tuple[Point, Point]:
    ux, uy, _ = _toward(start, end)
    nx, ny = -uy * side, ux * side
    return (
        (start[0] + nx + ux * shorten, start[1] + ny + uy * shorten),
        (end[0] + nx - ux * shorten, end[1] + ny - uy * shorten),
    )


def _wedge(pen: _Pen, start: Point, end: Point) -> None:
    ux, uy, _ = _toward(start, end)
    nx, ny = -uy * _WEDGE / 2, ux * _WEDGE / 2
    tip = (-uy * LINE / 3, ux * LINE / 3)
    pen.area(
        (start[0] + tip[0], start[1] + tip[1]),
        (end[0] + nx, end[1] + ny),
        (end[0] - nx, end[1] - ny),
        (start[0] - tip[0], start[1] - tip[1]),
    )


def _hashes(pen: _Pen, start: Point, end: Point) -> None:
    ux, uy, length = _toward(start, end)
    count = max(3, round(length / 3.2))
    for step in range(count):
        share = (step + 0.6) / (count - 0.4)
        half = (0.12 + 0.88 * share) * _WEDGE / 2
        x, y = start[0] + ux * length * share, start[1] + uy * length * share
        pen.line((x - uy * half, y + ux * half), (x + uy * half, y - ux * half))


def _wave(pen: _Pen, start: Point, end: Point) -> None:
    ux, uy, length = _toward(start, end)
    count = max(4, 2 * round(length / 6.5))
    step = length / count
    parts = [f"M{_at(start)}"]
    for index in range(count):
        side = 4.0 if index % 2 else -4.0
        middle, stop = (index + 0.5) * step, (index + 1) * step
        parts.append(
            f"Q{_at((start[0] + ux * middle - uy * side, start[1] + uy * middle + ux * side))} "
            f"{_at((start[0] + ux * stop, start[1] + uy * stop))}"
        )
    pen.strokes.append("".join(parts))


def _double(pen: _Pen, mol: Chem.Mol, bond: Chem.Bond, start: Point, end: Point) -> None:
    side = _inner_side(pen, mol, bond)
    if side == 0:
        for half in (_SPACING / 2, -_SPACING / 2):
            pen.line(*_beside(start, end, half, 0.0))
        return
    pen.line(start, end)
    inner_start, inner_end = _beside(start, end, side * _SPACING, 0.0)
    ux, uy, _ = _toward(start, end)
    cuts = [
        2.9 if atom.GetDegree() > 1 and atom.GetIdx() not in pen.labels else 0.0
        for atom in (bond.GetBeginAtom(), bond.GetEndAtom())
    ]
    pen.line(
        (inner_start[0] + ux * cuts[0], inner_start[1] + uy * cuts[0]),
        (inner_end[0] - ux * cuts[1], inner_end[1] - uy * cuts[1]),
    )


def _inner_side(pen: _Pen, mol: Chem.Mol, bond: Chem.Bond) -> int:
    """Return the side (+1, -1) of the second line of a double bond, or 0 for two even lines."""
    a, b = bond.GetBeginAtom(), bond.GetEndAtom()
    start, end = pen.places[a.GetIdx()], pen.places[b.GetIdx()]
    ux, uy, _ = _toward(start, end)

    def side_of(point: Point) -> int:
        across = -uy * (point[0] - start[0]) + ux * (point[1] - start[1])
        return 0 if abs(across) < 0.5 else (1 if across > 0 else -1)

    if bond.IsInRing():
        ring = _best_ring(mol, bond)
        centre = (
            sum(pen.places[i][0] for i in ring) / len(ring),
            sum(pen.places[i][1] for i in ring) / len(ring),
        )
        return side_of(centre) or 1
    others = [[side_of(pen.places[n.GetIdx()]) for n in end_.GetNeighbors()] for end_ in (a, b)]
    weights = [[s for s in sides if s] for sides in others]
    ends_open = [not w for w in weights]
    if any(ends_open):
        lone = weights[1] if ends_open[0] else weights[0]
        labelled = any(at.GetIdx() in pen.labels for at in (a, b))
        if labelled or len(lone) != 1:
            return 0
        return lone[0]
    total = sum(weights[0]) + sum(weights[1])
    if total:
        return 1 if total > 0 else -1
    if len(weights[0]) == len(weights[1]) == 2:
        return 0
    return weights[0][0]


def _best_ring(mol: Chem.Mol, bond: Chem.Bond) -> tuple[int, ...]:
    """Return the ring a double bond leans into: the one with most double bonds, then the smaller."""
    rings = mol.GetRingInfo()
    mine = [
        (ring, bonds)
        for ring, bonds in zip(rings.AtomRings(), rings.BondRings(), strict=True)
        if bond.GetIdx() in bonds
    ]

    def order(entry: tuple[tuple[int, ...], tuple[int, ...]]) -> tuple[bool, int, int, tuple[int, ...]]:
        ring, bonds = entry
        doubles = sum(mol.GetBondWithIdx(i).GetBondType() == Chem.BondType.DOUBLE for i in bonds)
        return (len(ring) > 8, -doubles, len(ring), ring)

    best: tuple[int, ...] = min(mine, key=order)[0]
    return best


# --- outlines ---------------------------------------------------------------------------------------------

_OUTLINES = (
    ("leaves", ' stroke-dasharray="4.5 3"'),
    ("arrives", ""),
    ("points", ' stroke-dasharray="0.1 3.6" stroke-linecap="round" stroke-width="2"'),
)


def _outlines(
    mol: Chem.Mol, places: Sequence[Point], boxes: Mapping[int, Sequence[Box]], marks: Marks
) -> tuple[list[str], list[Box]]:
    """Return the outlines round marked atoms, joined neighbours sharing one, and their boxes."""
    drawn: list[str] = []
    room: list[Box] = []
    for name, pattern in _OUTLINES:
        left = {i for i in getattr(marks, name) if 0 <= i < mol.GetNumAtoms()}
        while left:
            group = _connected(mol, min(left), left)
            left -= group
            for path, box in _rounded_hulls(group, places, boxes):
                drawn.append(f'<path d="{path}" stroke="{ink(name)}"{pattern}/>')
                room.append(box)
    return drawn, room


def _rounded_hulls(
    group: set[int], places: Sequence[Point], boxes: Mapping[int, Sequence[Box]]
) -> Iterator[tuple[str, Box]]:
    """Yield one outline round the group, or one for each atom where a common one would enclose a stranger."""
    hull = _hull([p for i in group for p in _corners(i, places, boxes)])
    strangers = (places[i] for i in range(len(places)) if i not in group)
    if len(group) > 1 and any(_inside(p, hull) for p in strangers):
        for atom in sorted(group):
            yield _rounded(_hull(_corners(atom, places, boxes)))
        return
    yield _rounded(hull)


_OUTLINE_RADIUS = 5.0


def _corners(atom: int, places: Sequence[Point], boxes: Mapping[int, Sequence[Box]]) -> list[Point]:
    if atom not in boxes:
        x, y = places[atom]
        return [(x + 2.5 * math.cos(k * math.pi / 4), y + 2.5 * math.sin(k * math.pi / 4)) for k in range(8)]
    return [(x, y) for b in boxes[atom] for x in (b.left, b.right) for y in (b.top, b.bottom)]


def _cross(o: Point, a: Point, b: Point) -> float:
    return (a[0] - o[0]) * (b[1] - o[1]) - (a[1] - o[1]) * (b[0] - o[0])


def _hull(points: Iterable[Point]) -> list[Point]:
    """Return the convex hull, anticlockwise in a plane with y upwards (Andrew's monotone chain)."""
    ordered = sorted(set(points))
    chains: list[list[Point]] = []
    for sequence in (ordered, ordered[::-1]):
        chain: list[Point] = []
        for point in sequence:
            while len(chain) > 1 and _cross(chain[-2], chain[-1], point) <= 1e-9:
                chain.pop()
            chain.append(point)
        chains.append(chain[:-1])
    return chains[0] + chains[1]


def _inside(point: Point, hull: Sequence[Point]) -> bool:
    return all(_cross(a, b, point) > -1e-6 for a, b in pairwise([*hull, hull[0]]))


def _rounded(hull: Sequence[Point]) -> tuple[str, Box]:
    """Return the path at `_OUTLINE_RADIUS` around a convex hull: straight edges joined by arcs."""
    r = _OUTLINE_RADIUS
    parts: list[str] = []
    for a, b in pairwise([*hull, hull[0]]):
        ux, uy, _ = _toward(a, b)
        out = (uy * r, -ux * r)
        begin, stop = (a[0] + out[0], a[1] + out[1]), (b[0] + out[0], b[1] + out[1])
        parts.append(f"A{format_number(r)} {format_number(r)} 0 0 1 {_at(begin)}" if parts else f"M{_at(begin)}")
        parts.append(f"L{_at(stop)}")
    first = parts[0].removeprefix("M")
    parts.append(f"A{format_number(r)} {format_number(r)} 0 0 1 {first}Z")
    return "".join(parts), Box.around(Box(*p, *p) for p in hull).grown(r + 1)
