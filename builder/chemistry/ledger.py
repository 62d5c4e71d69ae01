"""The workbench for edits: a molecule whose stereochemistry is kept in a ledger while bonds come and go.

RDKit's chiral tags refer to the order of an atom's bonds, which every edit disturbs. So before an edit each drawn
stereocentre is entered as its four neighbours in order with a sign, +1 if they run anticlockwise seen from the
first. Leaving puts a gap in the place of the atom that leaves, attaching fills the gap and flips the sign for
inversion, migration swaps one neighbour for another. Tags are written back once, at the end, by the parity of
the permutation between ledger and bonds. Drawn double bonds are entered as two reference atoms, cis or trans.
"""

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache

from rdkit import Chem

from builder.chemistry.structure import AtomId, Structure, atoms_of, bonds_of, output_order, parse_smiles

__all__ = ["GAP", "HYDROGEN", "Alkene", "Centre", "Piece", "UnbalancedTransformation", "Workbench", "drawn_centres"]

HYDROGEN = -1
"""Place of the one implicit hydrogen among a centre's neighbours; RDKit counts it last."""
GAP = -2
"""Place of a neighbour that has left and not been replaced."""
LONE_PAIR = -3
"""Place of the lone pair of a sulfonium, sulfoxide or phosphine centre."""

_CLOCKWISE = Chem.ChiralType.CHI_TETRAHEDRAL_CW
_ANTICLOCKWISE = Chem.ChiralType.CHI_TETRAHEDRAL_CCW
_ORIGIN = "_origin"


class UnbalancedTransformation(RuntimeError):  # noqa: N818 - named for what happened
    """An edit lost atoms or charge, or left an impossible valence: our fault, never the record's."""


@dataclass(frozen=True, slots=True)
class Centre:
    """A stereocentre in the ledger: four neighbours in order, and +1 if anticlockwise seen from the first."""

    neighbours: tuple[int, ...]
    sign: int

    def replaced(self, old: int, new: int) -> "Centre":
        """Return the centre with one neighbour swapped for another, configuration kept."""
        return Centre(tuple(new if n == old else n for n in self.neighbours), self.sign)

    def inverted(self) -> "Centre":
        """Return the mirror image of the centre."""
        return Centre(self.neighbours, -self.sign)

    def seen_from(self, *first: int) -> tuple[tuple[int, ...], int]:
        """Return the neighbours reordered to start with `first`, and the sign that goes with that order."""
        order = (*first, *(n for n in self.neighbours if n not in first))
        return order, self.sign * _parity(self.neighbours, order)


@dataclass(frozen=True, slots=True)
class Alkene:
    """A double bond in the ledger: one reference neighbour at each end, and whether they are cis."""

    ends: tuple[int, int]
    references: tuple[int, int]
    cis: bool


@dataclass(frozen=True, slots=True)
class Piece:
    """One species left on the bench at the end; atoms maps bench atoms to the AtomIds of the structure."""

    structure: Structure
    atoms: dict[int, AtomId]


def _parity(one: tuple[int, ...], other: tuple[int, ...]) -> int:
    """Return +1 if an even number of swaps turns one order into the other, else -1."""
    places = [one.index(n) for n in other]
    swaps = sum(a > b for i, a in enumerate(places) for b in places[i + 1 :])
    return -1 if swaps % 2 else 1


@lru_cache(maxsize=512)
def _laid_out(structure: Structure) -> tuple[Chem.Mol, dict[int, Centre], dict[frozenset[int], Alkene]]:
    return _lay_out(structure.mol)


def drawn_centres(structure: Structure) -> dict[AtomId, Centre]:
    """Return the ledger entries of the drawn stereocentres of a structure, by AtomId."""
    return dict(_laid_out(structure)[1])


def _lay_out(source: Chem.Mol) -> tuple[Chem.Mol, dict[int, Centre], dict[frozenset[int], Alkene]]:
    """Return the molecule with every hydrogen counted and no aromatic flag, and its ledger entries."""
    mol = Chem.Mol(source)
    Chem.Kekulize(mol, clearAromaticFlags=True)
    centres: dict[int, Centre] = {}
    for atom in atoms_of(mol):
        hydrogens = atom.GetTotalNumHs()
        atom.SetNoImplicit(True)
        atom.SetNumExplicitHs(hydrogens)
        tag = atom.GetChiralTag()
        if tag in {_CLOCKWISE, _ANTICLOCKWISE}:
            order = _neighbour_order(atom)
            if len(order) == 4:
                centres[atom.GetIdx()] = Centre(order, 1 if tag == _ANTICLOCKWISE else -1)
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    alkenes: dict[frozenset[int], Alkene] = {}
    for bond in bonds_of(mol):
        if bond.GetStereo() in _CIS or bond.GetStereo() in _TRANS:
            ends = (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx())
            first, second = bond.GetStereoAtoms()
            alkenes[frozenset(ends)] = Alkene(ends, (first, second), bond.GetStereo() in _CIS)
            bond.SetStereo(Chem.BondStereo.STEREONONE)
        bond.SetBondDir(Chem.BondDir.NONE)
    return mol, centres, alkenes


_CIS = frozenset({Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS})
_TRANS = frozenset({Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOTRANS})
_ORDERS = {
    1: Chem.BondType.SINGLE,
    2: Chem.BondType.DOUBLE,
    3: Chem.BondType.TRIPLE,
}


def _neighbour_order(atom: Chem.Atom) -> tuple[int, ...]:
    order = [bond.GetOtherAtomIdx(atom.GetIdx()) for bond in atom.GetBonds()]
    if len(order) == 3:
        order.append(HYDROGEN if atom.GetTotalNumHs() == 1 else LONE_PAIR)
    return tuple(order)


class Workbench:
    """Structures put side by side, to be edited in place by the verbs of a mechanism.

    Bench atoms are numbered through all structures in order; `place` finds an atom of one of them. Atoms are
    never deleted, only cut off, and every hydrogen and charge is written down, so that nothing can be lost.
    `rings` are the smallest rings before the edit.
    """

    def __init__(self, *structures: Structure | tuple[Structure, Chem.Mol]) -> None:
        """Lay out the structures; one given with a molecule uses that drawing of it (a resonance form)."""
        self.mol = Chem.RWMol()
        self.centres: dict[int, Centre] = {}
        self.alkenes: dict[frozenset[int], Alkene] = {}
        self.rings: list[tuple[int, ...]] = []
        self.offsets: list[int] = []
        self.protons_released = 0
        self._inputs: list[Structure] = []
        for given in structures:
            structure, laid_out = (
                (given, _laid_out(given)) if isinstance(given, Structure) else (given[0], _lay_out(given[1]))
            )
            offset = self.mol.GetNumAtoms()
            self.offsets.append(offset)
            self._inputs.append(structure)
            mol, centres, alkenes = laid_out
            self.mol.InsertMol(mol)
            rings = structure.mol.GetRingInfo().AtomRings()
            self.rings += [tuple(at + offset for at in ring) for ring in rings]
            for at, centre in centres.items():
                around = tuple(n + offset if n >= 0 else n for n in centre.neighbours)
                self.centres[at + offset] = Centre(around, centre.sign)
            for alkene in alkenes.values():
                (b, c), (rb, rc) = alkene.ends, alkene.references
                ends = (b + offset, c + offset)
                self.alkenes[frozenset(ends)] = Alkene(ends, (rb + offset, rc + offset), alkene.cis)

    def place(self, atom: AtomId, structure: int = 0) -> int:
        """Return the bench atom for an atom of the n-th structure."""
        return atom + self.offsets[structure]

    def atom(self, at: int) -> Chem.Atom:
        """Return the RDKit atom at a bench place."""
        return self.mol.GetAtomWithIdx(at)

    def order(self, one: int, other: int) -> int:
        """Return the order of the bond between two atoms, 0 if there is none."""
        bond: Chem.Bond | None = self.mol.GetBondBetweenAtoms(one, other)
        return 0 if bond is None else int(bond.GetBondTypeAsDouble())

    def neighbours(self, at: int) -> list[int]:
        """Return the bench atoms bonded to an atom, in bond order."""
        return [bond.GetOtherAtomIdx(at) for bond in self.atom(at).GetBonds()]

    def cut(self, one: int, other: int) -> None:
        """Break a bond; each stereocentre keeps a gap where the other atom was."""
        self.mol.RemoveBond(one, other)
        self._refer_elsewhere(one, other)
        self._refer_elsewhere(other, one)
        self._swap(one, other, GAP)
        self._swap(other, one, GAP)

    def join(self, at: int, new: int, *, inverted: bool = False) -> None:
        """Make a single bond; `new` fills the gap at a stereocentre `at`, from the other side if inverted."""
        self.mol.AddBond(at, new, Chem.BondType.SINGLE)
        self._swap(at, GAP, new, inverted=inverted)
        self._swap(new, LONE_PAIR, at)

    def set_order(self, one: int, other: int, order: int) -> None:
        """Set the order of an existing bond; what becomes flat, or free to turn, is struck from the ledger."""
        self.mol.GetBondBetweenAtoms(one, other).SetBondType(_ORDERS[order])
        self.alkenes.pop(frozenset((one, other)), None)
        if order > 1:
            self.flatten(one)
            self.flatten(other)

    def add_charge(self, at: int, change: int) -> None:
        """Add to the formal charge of an atom."""
        atom = self.atom(at)
        atom.SetFormalCharge(atom.GetFormalCharge() + change)

    def charge(self, at: int) -> int:
        """Return the formal charge of an atom."""
        return self.atom(at).GetFormalCharge()

    def hydrogens(self, at: int) -> int:
        """Return the unlabelled hydrogens on an atom."""
        return self.atom(at).GetNumExplicitHs()

    def take_hydrogen(self, at: int) -> None:
        """Take an unlabelled hydrogen off an atom; its stereocentre keeps a gap.

        Raises UnbalancedTransformation if there is none.
        """
        atom = self.atom(at)
        if not atom.GetNumExplicitHs():
            raise UnbalancedTransformation(f"no hydrogen to take from {atom.GetSymbol()} in {self._given()}")
        atom.SetNumExplicitHs(atom.GetNumExplicitHs() - 1)
        self._swap(at, HYDROGEN, GAP)

    def give_hydrogen(self, at: int, *, inverted: bool = False) -> None:
        """Put a hydrogen on an atom; it fills the gap at a stereocentre."""
        atom = self.atom(at)
        atom.SetNumExplicitHs(atom.GetNumExplicitHs() + 1)
        self._swap(at, GAP, HYDROGEN, inverted=inverted)

    def release_proton(self, at: int) -> None:
        """Let an atom lose a proton; its charge is the caller's business."""
        self.take_hydrogen(at)
        self.protons_released += 1

    def accept_proton(self, at: int) -> None:
        """Let an atom take up a proton from the surroundings; its charge is the caller's business."""
        self.give_hydrogen(at)
        self.protons_released -= 1

    def flatten(self, at: int) -> None:
        """Strike a stereocentre from the ledger."""
        self.centres.pop(at, None)

    def set_alkene(self, alkene: Alkene) -> None:
        """Enter the geometry of a double bond."""
        self.alkenes[frozenset(alkene.ends)] = alkene

    def in_one_piece(self, one: int, other: int) -> bool:
        """Answer whether two atoms belong to the same species."""
        return any(one in piece and other in piece for piece in Chem.GetMolFrags(self.mol))

    def _refer_elsewhere(self, end: int, lost: int) -> None:
        """Let a double bond whose reference has left refer to the other neighbour at that end, if there is one."""
        for key, alkene in list(self.alkenes.items()):
            if end not in alkene.ends or lost not in alkene.references:
                continue
            here = alkene.ends.index(end)
            if alkene.references[here] != lost:
                continue
            del self.alkenes[key]
            others = [n for n in self.neighbours(end) if n not in alkene.ends]
            if others:
                there = alkene.references[1 - here]
                references = (others[0], there) if here == 0 else (there, others[0])
                self.alkenes[key] = Alkene(alkene.ends, references, not alkene.cis)

    def _swap(self, at: int, old: int, new: int, *, inverted: bool = False) -> None:
        centre = self.centres.get(at)
        if centre is None or old not in centre.neighbours:
            return
        swapped = centre.replaced(old, new)
        self.centres[at] = swapped.inverted() if inverted else swapped

    def settle(self) -> list[Piece]:
        """Return the species now on the bench, sanitised, canonical and checked for balance.

        Raises UnbalancedTransformation if atoms, hydrogens or charge do not add up, or a valence is impossible.
        """
        mol = Chem.RWMol(self.mol)
        atoms = list(atoms_of(mol))
        _rewrite_charges(mol, atoms)
        self._write_stereo(mol)
        for atom in atoms:
            atom.SetIntProp(_ORIGIN, atom.GetIdx())
        try:
            Chem.SanitizeMol(mol)
            Chem.SetDoubleBondNeighborDirections(mol)
            Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
        except (Chem.MolSanitizeException, RuntimeError) as fault:
            raise UnbalancedTransformation(f"{fault} in an edit of {self._given()}") from fault
        if any(a.GetAtomicNum() == 1 and not a.GetIsotope() and a.GetDegree() for a in atoms):
            mol = Chem.RWMol(Chem.RemoveHs(mol))
        pieces = [_piece(part) for part in Chem.GetMolFrags(mol, asMols=True, sanitizeFrags=False)]
        self._check_balance(piece.structure for piece in pieces)
        return sorted(pieces, key=lambda piece: piece.structure.smiles)

    def _write_stereo(self, mol: Chem.RWMol) -> None:
        for at, centre in self.centres.items():
            atom = mol.GetAtomWithIdx(at)
            order = _neighbour_order(atom)
            if len(order) == 4 and sorted(order) == sorted(centre.neighbours):
                sign = centre.sign * _parity(centre.neighbours, order)
                atom.SetChiralTag(_ANTICLOCKWISE if sign > 0 else _CLOCKWISE)
        for alkene in self.alkenes.values():
            (b, c), (rb, rc) = alkene.ends, alkene.references
            bond: Chem.Bond | None = mol.GetBondBetweenAtoms(b, c)
            if bond is None or bond.GetBondType() != Chem.BondType.DOUBLE:
                continue
            if mol.GetBondBetweenAtoms(b, rb) is None or mol.GetBondBetweenAtoms(c, rc) is None:
                continue
            if bond.GetBeginAtomIdx() != b:
                rb, rc = rc, rb
            bond.SetStereoAtoms(rb, rc)
            bond.SetStereo(Chem.BondStereo.STEREOCIS if alkene.cis else Chem.BondStereo.STEREOTRANS)

    def _check_balance(self, outputs: Iterable[Structure]) -> None:
        before, after = _inventory(self._inputs), _inventory(outputs)
        after["H"] += self.protons_released
        after["charge"] += self.protons_released
        wrong = [key for key in before.keys() | after.keys() if before[key] != after[key]]
        if wrong:
            raise UnbalancedTransformation(f"{', '.join(sorted(wrong))} not in balance: {self._given()}")

    def _given(self) -> str:
        return " + ".join(s.smiles for s in self._inputs)


def _inventory(structures: Iterable[Structure]) -> Counter[str]:
    total: Counter[str] = Counter()
    for structure in structures:
        for key, number in _composition(structure):
            total[key] += number
    return total


@lru_cache(maxsize=512)
def _composition(structure: Structure) -> tuple[tuple[str, int], ...]:
    """Return the atoms by element and isotope, with charge and unpaired electrons, of one structure."""
    count: Counter[str] = Counter()
    for atom in atoms_of(structure.mol):
        count[f"{atom.GetIsotope() or ''}{atom.GetSymbol()}"] += 1
        count["H"] += atom.GetTotalNumHs()
    count["charge"] += structure.charge
    count["unpaired electrons"] += structure.radical_electrons
    return tuple(sorted(count.items()))


def _piece(mol: Chem.Mol) -> Piece:
    smiles = Chem.MolToSmiles(mol)
    structure = parse_smiles(smiles)
    bench = [mol.GetAtomWithIdx(at).GetIntProp(_ORIGIN) for at in output_order(mol)]
    return Piece(structure, dict(zip(bench, structure.typed_order, strict=True)))


def _rewrite_charges(mol: Chem.RWMol, atoms: list[Chem.Atom]) -> None:
    """Draw opposite charges that cancel as bonds, and the charge of a sulfinate on oxygen.

    P-O and S-O pairs become double bonds, O- on C=O+ an ester, C- beside C+ a double bond (a phenonium ion that
    opens to its arene).
    """
    for atom in atoms:
        if atom.GetFormalCharge() == 1 and atom.GetSymbol() in {"C", "O"}:
            _cancel_on_carbon(mol, atom)
    for atom in atoms:
        charge = atom.GetFormalCharge()
        if not charge or atom.GetSymbol() not in {"P", "S"}:
            continue
        for bond in atom.GetBonds():
            oxygen = mol.GetAtomWithIdx(bond.GetOtherAtomIdx(atom.GetIdx()))
            if oxygen.GetSymbol() != "O":
                continue
            single = bond.GetBondType() == Chem.BondType.SINGLE
            if charge == 1 and single and oxygen.GetFormalCharge() == -1:
                bond.SetBondType(Chem.BondType.DOUBLE)
            elif charge == -1 and bond.GetBondType() == Chem.BondType.DOUBLE:
                bond.SetBondType(Chem.BondType.SINGLE)
            else:
                continue
            atom.SetFormalCharge(0)
            oxygen.SetFormalCharge(0 if charge == 1 else -1)
            break


def _cancel_on_carbon(mol: Chem.RWMol, cation: Chem.Atom) -> None:
    for bond in cation.GetBonds():
        near = mol.GetAtomWithIdx(bond.GetOtherAtomIdx(cation.GetIdx()))
        single = bond.GetBondType() == Chem.BondType.SINGLE
        if cation.GetSymbol() == "C" and near.GetSymbol() == "C" and near.GetFormalCharge() == -1 and single:
            bond.SetBondType(Chem.BondType.DOUBLE)
            cation.SetFormalCharge(0)
            near.SetFormalCharge(0)
            return
        if cation.GetSymbol() != "O" or near.GetSymbol() != "C" or single:
            continue
        for other in near.GetBonds():
            oxygen = mol.GetAtomWithIdx(other.GetOtherAtomIdx(near.GetIdx()))
            if oxygen.GetSymbol() == "O" and oxygen.GetFormalCharge() == -1:
                other.SetBondType(Chem.BondType.DOUBLE)
                bond.SetBondType(Chem.BondType.SINGLE)
                cation.SetFormalCharge(0)
                oxygen.SetFormalCharge(0)
                return
