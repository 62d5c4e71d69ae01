"""Sketch: a structure on paper as plain data: atoms, bonds, places, wedges. The only RDKit of the drawings.

Only the coordinate code of RDKit is used, none of its drawing code, so no X libraries are needed. Stereo follows
the IUPAC recommendations for graphical representation (Pure Appl. Chem. 2006, 78, 1897; 2008, 80, 277): plain
wedges with the narrow end at the stereocentre, no stereo at other atoms, an undefined centre drawn plain, a
double bond by its geometry, an undefined double bond with one wavy single bond.
"""

from cmath import phase
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from functools import lru_cache
from itertools import combinations, pairwise
from math import pi, tau
from typing import NamedTuple

from rdkit import Chem
from rdkit.Chem import rdCoordGen, rdDepictor
from rdkit.Geometry import Point3D

from builder.chemistry.plane import Point
from builder.chemistry.structure import SMALLEST_TRANS_RING, AtomId, Structure, atoms_of, bonds_of, parse_smiles

__all__ = ["Line", "Sketch", "SketchAtom", "SketchBond", "connected", "load_ring_templates", "mol_block", "sketch"]

_RDKIT_BOND_LENGTH = 1.5


class Line(StrEnum):
    """How a bond is drawn; wedges and hashes start at the first atom of the bond."""

    PLAIN = "plain"
    WEDGE = "wedge"
    HASH = "hash"
    WAVY = "wavy"


class SketchAtom(NamedTuple):
    """One atom: what its letters are made of."""

    symbol: str
    charge: int
    isotope: int
    hydrogens: int
    radicals: int
    neighbours: tuple[int, ...]
    piece: int


class SketchBond(NamedTuple):
    """One bond. ring: the atoms of the ring into which a double bond leans; empty outside rings."""

    a: int
    b: int
    order: int
    line: Line
    ring: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Sketch:
    """A structure on paper. Atoms are in the structure's order, then the hydrogens that carry wedges.

    places: in bond lengths, y upwards.
    """

    atoms: tuple[SketchAtom, ...]
    bonds: tuple[SketchBond, ...]
    places: tuple[Point, ...]


@lru_cache(maxsize=128)
def sketch(structure: Structure, model: Structure | None = None) -> Sketch:
    """Return the structure on paper; with a `model`, turned so that the carbon skeleton they share lies alike."""
    mol = _laid_out(structure) if model is None or model == structure else _turned_like(structure, model)
    places = _complex_places(mol)
    wavy = _wavy_bonds(mol)
    wedges = _wedges(mol, places)
    pieces = {atom: number for number, piece in enumerate(Chem.GetMolFrags(mol)) for atom in piece}
    rings = [(frozenset(ring), ring) for ring in mol.GetRingInfo().AtomRings()]
    neighbours = _neighbours(mol)
    ends = []
    for bond in bonds_of(mol):
        a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        line = Line.WAVY if bond.GetIdx() in wavy else Line.PLAIN
        if bond.GetIdx() in wedges:
            a, line = wedges[bond.GetIdx()]
            b = bond.GetOtherAtomIdx(a)
        ends.append((a, b, _ORDERS.get(bond.GetBondType(), 1), line))
    doubles = [frozenset((a, b)) for a, b, order, _ in ends if order == 2]
    atoms = tuple(
        SketchAtom(
            symbol=atom.GetSymbol(),
            charge=atom.GetFormalCharge(),
            isotope=atom.GetIsotope(),
            hydrogens=atom.GetTotalNumHs(),
            radicals=atom.GetNumRadicalElectrons(),
            neighbours=tuple(neighbours[index]),
            piece=pieces[index],
        )
        for index, atom in enumerate(atoms_of(mol))
    )
    bonds = tuple(
        SketchBond(a, b, order, line, _ring_to_lean_into(a, b, rings, doubles) if order == 2 else ())
        for a, b, order, line in ends
    )
    return Sketch(atoms, bonds, tuple((z.real / _RDKIT_BOND_LENGTH, z.imag / _RDKIT_BOND_LENGTH) for z in places))


def mol_block(drawn: Sketch, title: str = "") -> str:
    """Return a sketch as a V2000 mol block: places in bond lengths, wedges and wavy bonds as drawn."""
    lines = [title, "  handbook          2D", ""]
    lines.append(f"{len(drawn.atoms):3d}{len(drawn.bonds):3d}  0  0  1  0  0  0  0  0999 V2000")
    lines += [
        f"{x:10.4f}{y:10.4f}{0:10.4f} {atom.symbol:<3} 0  0  0  0  0  0  0  0  0  0  0  0"
        for atom, (x, y) in zip(drawn.atoms, drawn.places, strict=True)
    ]
    lines += [f"{b.a + 1:3d}{b.b + 1:3d}{b.order:3d}{_MOL_BLOCK_STEREO[b.line]:3d}" for b in drawn.bonds]
    for tag, field in (("CHG", "charge"), ("ISO", "isotope"), ("RAD", "radicals")):
        lines += [
            f"M  {tag}  1 {index:3d} {getattr(atom, field) + (tag == 'RAD'):3d}"
            for index, atom in enumerate(drawn.atoms, start=1)
            if getattr(atom, field)
        ]
    return "\n".join([*lines, "M  END", ""])


_MOL_BLOCK_STEREO = {Line.PLAIN: 0, Line.WEDGE: 1, Line.HASH: 6, Line.WAVY: 4}
_ORDERS = {Chem.BondType.DOUBLE: 2, Chem.BondType.TRIPLE: 3}


def _ring_to_lean_into(
    a: int, b: int, rings: Iterable[tuple[frozenset[int], tuple[int, ...]]], doubles: Sequence[frozenset[int]]
) -> tuple[int, ...]:
    """Return the ring through a double bond with most double bonds, then the smallest; none of nine or more."""
    mine = [(members, ring) for members, ring in rings if a in members and b in members and len(ring) < 9]
    return min(
        mine, key=lambda m: (-sum(double <= m[0] for double in doubles), len(m[1]), m[1]), default=(frozenset(), ())
    )[1]


# --- coordinates ------------------------------------------------------------------------------------------


def load_ring_templates() -> None:
    """Let RDKit load its layouts of ring systems: some 50 MB, which processes forked afterwards share."""
    sketch(parse_smiles("C1CC2CCC1C2"))


@lru_cache(maxsize=128)
def _laid_out(structure: Structure) -> Chem.Mol:
    """Return a kekulised copy with 2D coordinates, bonds straightened.

    A stereocentre whose three neighbours all stand in rings gets its hydrogen drawn, so that the wedge need not
    lie in a ring.
    """
    mol = Chem.Mol(structure.mol)
    fused = [
        atom.GetIdx()
        for atom in atoms_of(mol)
        if atom.GetChiralTag() != _NOT_CHIRAL
        and atom.GetTotalNumHs() == 1
        and atom.GetDegree() == 3
        and all(bond.IsInRing() for bond in atom.GetBonds())
    ]
    if fused:
        mol = Chem.AddHs(mol, onlyOnAtoms=fused)
    Chem.Kekulize(mol, clearAromaticFlags=True)
    _set_places(mol)
    rdDepictor.StraightenDepiction(mol)
    _turn_as_is_customary(mol)
    return mol


def _set_places(mol: Chem.Mol) -> None:
    """Give the molecule coordinates: the first of three methods that crowds nothing, else the least crowded."""
    methods = (
        lambda: rdDepictor.Compute2DCoords(mol, canonOrient=True, useRingTemplates=True),
        lambda: rdDepictor.Compute2DCoords(mol, canonOrient=True),
        lambda: rdCoordGen.AddCoords(mol),
    )
    tried: list[tuple[int, int, Chem.Conformer]] = []
    for method in methods:
        method()
        rdDepictor.NormalizeDepiction(mol, scaleFactor=-1.0)
        tried.append((_crowding(mol), len(tried), Chem.Conformer(mol.GetConformer())))
        if not tried[-1][0]:
            return
    best = min(tried, key=lambda attempt: attempt[:2])[2]
    mol.RemoveAllConformers()
    mol.AddConformer(best)


def _crowding(mol: Chem.Mol) -> int:
    """Return how many atoms, labels, or bonds at one atom lie nearly on each other; a bond cut short counts too."""
    places = _complex_places(mol)
    neighbours = _neighbours(mol)
    crowded = 0
    for a, b in _close_pairs(mol):
        apart = abs(places[a] - places[b])
        if b in neighbours[a]:
            crowded += apart < _SHORT
        else:
            lettered = all(mol.GetAtomWithIdx(i).GetAtomicNum() != 6 for i in (a, b))
            crowded += apart < _NEAR or lettered
    for here, others in zip(places, neighbours, strict=True):
        rays = [places[other] - here for other in others]
        crowded += sum(abs(phase(a / b)) < _NARROW for a, b in combinations(rays, 2) if b)
    return crowded


def _close_pairs(mol: Chem.Mol) -> list[tuple[int, int]]:
    """Return the pairs of atoms nearer than `_NEAR_LETTERS`, found in one step over all pairs."""
    places = mol.GetConformer().GetPositions()
    apart = ((places[:, None] - places[None]) ** 2).sum(axis=-1)
    return [
        (a, b) for a, b in zip(*(side.tolist() for side in (apart < _NEAR_LETTERS**2).nonzero()), strict=True) if a < b
    ]


def _neighbours(mol: Chem.Mol) -> list[list[int]]:
    """Return, for each atom, its neighbours in the order of its bonds, on which chirality tags rest."""
    neighbours: list[list[int]] = [[] for _ in range(mol.GetNumAtoms())]
    for bond in bonds_of(mol):
        a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        neighbours[a].append(b)
        neighbours[b].append(a)
    return neighbours


_SHORT = 0.7 * _RDKIT_BOND_LENGTH
_NEAR = 0.5 * _RDKIT_BOND_LENGTH
_NEAR_LETTERS = 0.9 * _RDKIT_BOND_LENGTH
_NARROW = 0.4  # radian
_NOT_CHIRAL = Chem.ChiralType.CHI_UNSPECIFIED
_GONANE = Chem.MolFromSmarts(
    "[#6]1~[#6]~[#6]~[#6]2~[#6](~[#6]~1)~[#6]~[#6]~[#6]1~[#6]~2~[#6]~[#6]~[#6]2~[#6]~[#6]~[#6]~[#6]~1~2"
)
_GONANE_C10, _GONANE_C5, _GONANE_C13 = 3, 4, 12


def _turn_as_is_customary(mol: Chem.Mol) -> None:
    """Turn a steroid skeleton so that ring A lies lower left and ring D upper right, C10 above C5."""
    if mol.GetRingInfo().NumRings() < 4:
        return
    match = mol.GetSubstructMatch(_GONANE)
    if not match:
        return
    at = _complex_places(mol)
    up = at[match[_GONANE_C10]] - at[match[_GONANE_C5]]
    along = at[match[_GONANE_C13]] - at[match[_GONANE_C10]]
    flip = (up.conjugate() * along).imag > 0
    _turn(mol, 0j, flip, 1j / (up.conjugate() if flip else up) * abs(up))


def _turned_like(structure: Structure, model: Structure) -> Chem.Mol:
    """Return the laid-out structure turned, and if need be flipped, onto the skeleton shared with `model`.

    Of ways that fit equally well, as in a ring with a mirror plane, the one whose bystanding wedges are those of the
    model: what changes, say from cis to trans, then shows where it happens.
    """
    mol, ideal = _laid_out(structure), _laid_out(model)
    mine, theirs = _complex_places(mol), _complex_places(ideal)
    fits = [
        (*_fit([mine[i] for i, _ in pairs], [theirs[j] for _, j in pairs], flip), flip, pairs)
        for pairs in _shared_atoms(structure, model)
        for flip in (False, True)
    ]
    if not fits:
        return mol
    least = min(fit[0] for fit in fits)
    equal = [fit for fit in fits if fit[0] < least + _EQUALLY_WELL]
    if not (_has_stereocentre(mol) and _has_stereocentre(ideal)):
        del equal[1:]
    ways = []
    for _, turn, centre, flip, pairs in equal:
        turned = Chem.Mol(mol)
        _turn(turned, centre, flip, turn)
        ways.append((turned, pairs))
    best = ways[0][0]
    if len(ways) > 1:
        wanted = _wedges_within(ideal, {j: j for j in range(len(theirs))})
        best = max(ways, key=lambda way: len(_wedges_within(way[0], dict(way[1])) & wanted))[0]
    rdDepictor.StraightenDepiction(best)
    return best


_EQUALLY_WELL = 0.05  # sum of squared distances, in RDKit's units


def _fit(moved: Sequence[complex], fixed: Sequence[complex], flip: bool) -> tuple[float, complex, complex]:
    """Return error, turn and centre of the rotation that brings `moved` best onto `fixed`."""
    centre, goal = sum(moved) / len(moved), sum(fixed) / len(fixed)
    around = [(z - centre).conjugate() if flip else z - centre for z in moved]
    turn = sum((g - goal) * z.conjugate() for z, g in zip(around, fixed, strict=True))
    turn = turn / abs(turn) if abs(turn) > 1e-6 else 1 + 0j
    error = sum(abs(z * turn - (g - goal)) ** 2 for z, g in zip(around, fixed, strict=True))
    return round(error, 3), turn, centre


def _has_stereocentre(mol: Chem.Mol) -> bool:
    return any(atom.GetChiralTag() in _TETRAHEDRAL for atom in atoms_of(mol))


def _wedges_within(mol: Chem.Mol, name: Mapping[int, int]) -> set[tuple[int, int, Line]]:
    """Return the wedges between named atoms, under those names."""
    found = set()
    for index, (start, line) in _wedges(mol, _complex_places(mol)).items():
        end = mol.GetBondWithIdx(index).GetOtherAtomIdx(start)
        if start in name and end in name:
            found.add((name[start], name[end], line))
    return found


def _complex_places(mol: Chem.Mol) -> list[complex]:
    return [complex(x, y) for x, y, _ in mol.GetConformer().GetPositions().tolist()]


def _turn(mol: Chem.Mol, centre: complex, flip: bool, turn: complex) -> None:
    """Move `centre` to the origin, mirror the paper about the x axis if asked, then turn."""
    conformer = mol.GetConformer()
    for index, place in enumerate(_complex_places(mol)):
        z = (place - centre).conjugate() if flip else place - centre
        z *= turn
        conformer.SetAtomPosition(index, Point3D(z.real, z.imag, 0.0))


@lru_cache(maxsize=128)
def _shared_atoms(structure: Structure, model: Structure) -> tuple[tuple[tuple[AtomId, AtomId], ...], ...]:
    """Return ways to pair atoms of both over the largest carbon skeleton of the model that the structure has too.

    Only those pairings that keep most branches where they are; several where the skeleton is symmetric.
    """
    for skeleton, query, wanted in _carbon_skeletons(model):
        matches = structure.mol.GetSubstructMatches(query, uniquify=False, maxMatches=64)
        if matches:
            degrees = [atom.GetDegree() for atom in atoms_of(structure.mol)]
            scored = sorted((sum(abs(degrees[i] - d) for i, d in zip(m, wanted, strict=True)), m) for m in matches)
            best = [match for score, match in scored if score == scored[0][0]]
            return tuple(tuple(zip(match, skeleton, strict=True)) for match in best[:_MOST_PAIRINGS])
    return ()


_MOST_PAIRINGS = 12


@lru_cache(maxsize=128)
def _carbon_skeletons(structure: Structure) -> tuple[tuple[tuple[AtomId, ...], Chem.Mol, tuple[int, ...]], ...]:
    """Return the sets of carbons joined by carbon-carbon bonds, largest first, as query, with their degrees."""
    mol = structure.mol
    neighbours = _neighbours(mol)
    left = {atom.GetIdx() for atom in atoms_of(mol) if atom.GetAtomicNum() == 6}
    found = []
    while left:
        piece = connected(min(left), left, neighbours)
        left -= piece
        if len(piece) > 1:
            atoms = tuple(sorted(piece))
            found.append((atoms, _skeleton_query(atoms, neighbours), tuple(len(neighbours[i]) for i in atoms)))
    return tuple(sorted(found, key=lambda f: (-len(f[0]), f[0])))


def _skeleton_query(atoms: Sequence[AtomId], neighbours: Sequence[Sequence[AtomId]]) -> Chem.Mol:
    query = Chem.RWMol()
    place = {atom: query.AddAtom(_ANY_CARBON) for atom in atoms}
    for atom in atoms:
        for other in neighbours[atom]:
            if other in place and atom < other:
                count = query.AddBond(place[atom], place[other], Chem.BondType.SINGLE)
                query.ReplaceBond(count - 1, _ANY_BOND)
    return query.GetMol()


_ANY_CARBON = Chem.AtomFromSmarts("[#6]")
_ANY_BOND = Chem.BondFromSmarts("~")


def connected(start: int, within: Iterable[int], neighbours: Sequence[Sequence[int]]) -> set[int]:
    """Return the atoms reached from `start` without leaving `within`."""
    allowed, seen, waiting = set(within), {start}, [start]
    while waiting:
        for other in neighbours[waiting.pop()]:
            if other in allowed and other not in seen:
                seen.add(other)
                waiting.append(other)
    return seen


# --- stereo -----------------------------------------------------------------------------------------------


def _wedges(mol: Chem.Mol, places: Sequence[complex]) -> dict[int, tuple[int, Line]]:
    """Return, by bond, the stereocentre at which a wedge starts, and which wedge it is."""
    centres = {atom.GetIdx(): atom for atom in atoms_of(mol) if atom.GetChiralTag() in _TETRAHEDRAL}
    chosen: dict[int, tuple[int, Line]] = {}
    options = {index: _bonds_to_wedge(atom, centres, places) for index, atom in centres.items()}
    # Those with least choice go first, so that no centre is left without a bond.
    for index in sorted(options, key=lambda i: (sum(cost < _POOR for cost, _ in options[i]), i)):
        free = [option for option in options[index] if option[1] not in chosen]
        if free:
            bond = min(free)[1]
            chosen[bond] = (index, _wedge_or_hash(centres[index], bond, places))
    return chosen


_TETRAHEDRAL = (Chem.ChiralType.CHI_TETRAHEDRAL_CW, Chem.ChiralType.CHI_TETRAHEDRAL_CCW)
_POOR = (1, 0)


def _bonds_to_wedge(
    centre: Chem.Atom, centres: Iterable[int], places: Sequence[complex]
) -> list[tuple[tuple[int, ...], int]]:
    """Return (cost, bond) for each bond at a stereocentre.

    Best is a bond to a hydrogen or a heteroatom outside rings: there the eye looks for inversion. Bad are bonds
    to another stereocentre, and bonds between two others that leave more than half the plane empty, which
    readers take for the opposite.
    """
    here = centre.GetIdx()
    arms = [(bond, bond.GetOtherAtom(centre)) for bond in centre.GetBonds()]
    rays = [places[other.GetIdx()] - places[here] for _, other in arms]
    costs: list[tuple[tuple[int, ...], int]] = []
    for place, (bond, other) in enumerate(arms):
        ambiguity = _ambiguity(rays[place], [*rays[:place], *rays[place + 1 :]])
        cost = (
            ambiguity == 2,
            other.GetIdx() in centres,
            bond.GetBondType() != Chem.BondType.SINGLE,
            bond.IsInRing(),
            ambiguity,
            other.GetAtomicNum() == 6,
            other.GetDegree(),
        )
        costs.append((cost, bond.GetIdx()))
    return costs


def _ambiguity(ray: complex, rest: Sequence[complex]) -> int:
    """Return 0 where a wedge along `ray` reads one way, 2 where it reads either way, 1 for a poor drawing.

    0: the other bonds reach round the wedge. 2: they leave half the plane empty and lie on both sides of the wedge.
    1: they leave half the plane empty and the wedge lies there.
    """
    angles = sorted(phase(z / ray) % tau for z in rest)
    beyond = tau - angles[-1] + angles[0]
    if max(b - a for a, b in pairwise(angles)) > pi + _SLACK:
        return 2
    return 1 if beyond > pi + _SLACK and len(rest) == 3 else 0


_SLACK = 0.05  # radian


def _wedge_or_hash(centre: Chem.Atom, bond: int, places: Sequence[complex]) -> Line:
    """Return the wedge that gives the centre its configuration.

    The chirality tag says how the second and later neighbours turn, seen from the first; a hydrogen that is not
    drawn counts as the last.
    """
    here = places[centre.GetIdx()]
    around = [(b.GetIdx(), places[b.GetOtherAtomIdx(centre.GetIdx())] - here) for b in centre.GetBonds()]
    ahead = next(z for index, z in around if index == bond)
    others = [(phase(z / ahead) % tau, place) for place, (index, z) in enumerate(around) if index != bond]
    first = next(place for place, (index, _) in enumerate(around) if index == bond)
    turning = [place for _, place in sorted(others)]
    # Seen from the wedge, towards the reader, the others turn anticlockwise in this order; the hydrogen that is
    # not drawn lies in the widest gap between bonds, which a wedge from an unambiguous bond leaves behind it.
    order = [first, *turning, 3] if len(around) == 3 else [first, *turning]
    anticlockwise = _is_even(order)
    wanted = centre.GetChiralTag() == Chem.ChiralType.CHI_TETRAHEDRAL_CCW
    return Line.WEDGE if anticlockwise == wanted else Line.HASH


def _is_even(order: Sequence[int]) -> bool:
    return sum(a > b for i, a in enumerate(order) for b in order[i + 1 :]) % 2 == 0


def _wavy_bonds(mol: Chem.Mol) -> set[int]:
    """Return one single bond for each double bond that could be E or Z and is neither."""
    if not any(_may_be_undefined(bond) for bond in bonds_of(mol)):
        return set()
    wavy = set()
    for info in Chem.FindPotentialStereo(Chem.Mol(mol), cleanIt=False, flagPossible=True):
        if info.type == Chem.StereoType.Bond_Double and info.specified != Chem.StereoSpecified.Specified:
            bond = mol.GetBondWithIdx(info.centeredOn)
            if _may_be_undefined(bond):
                wavy |= _single_bond_beside(bond)
    return wavy


def _may_be_undefined(bond: Chem.Bond) -> bool:
    """Answer whether a double bond has no configuration drawn and is not cumulated, as in allenes and azides."""
    if bond.GetBondType() != Chem.BondType.DOUBLE or bond.GetStereo() not in _NOT_DRAWN:
        return False
    if 0 < bond.GetOwningMol().GetRingInfo().MinBondRingSize(bond.GetIdx()) < SMALLEST_TRANS_RING:
        return False
    ends = (bond.GetBeginAtom(), bond.GetEndAtom())
    return all(
        end.GetDegree() > 1 and sum(b.GetBondType() == Chem.BondType.DOUBLE for b in end.GetBonds()) == 1
        for end in ends
    )


_NOT_DRAWN = (Chem.BondStereo.STEREONONE, Chem.BondStereo.STEREOANY)


def _single_bond_beside(double: Chem.Bond) -> set[int]:
    """Return the single bond beside a double bond that is best drawn wavy: outside rings, to a small neighbour."""
    candidates = [
        (bond.IsInRing(), bond.GetOtherAtom(end).GetDegree(), bond.GetIdx())
        for end in (double.GetBeginAtom(), double.GetEndAtom())
        for bond in end.GetBonds()
        if bond.GetBondType() == Chem.BondType.SINGLE and bond.GetOtherAtom(end).GetChiralTag() == _NOT_CHIRAL
    ]
    return {min(candidates)[-1]} if candidates else set()
