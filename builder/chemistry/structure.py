"""Structure: one chemical structure, read from text, in an atom order that depends on the structure alone.

Atoms are numbered by their place in the canonical SMILES (`AtomId`). However the author ordered the atoms,
the same structure has the same numbering, so results may be cached by structure, and a site, an edit and a
drawing speak of the same atom. `Structure.typed_order` leads back to the author's own order, for messages.
"""

import logging
import re
from collections import Counter
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cached_property, lru_cache

from rdkit import Chem, rdBase
from rdkit.Chem import rdinchi

__all__ = [
    "MAX_CHARACTERS",
    "MAX_HEAVY_ATOMS",
    "MAX_RINGS",
    "MAX_STEREO_ELEMENTS",
    "SMALLEST_TRANS_RING",
    "Atom",
    "AtomId",
    "Stereocentres",
    "Structure",
    "StructureError",
    "atoms_of",
    "bonds_of",
    "bridgeheads_of",
    "name_atom",
    "output_order",
    "parse_inchi",
    "parse_rxn",
    "parse_smiles",
    "stereo_key",
]

AtomId = int
"""Place of an atom in the canonical SMILES of its structure, from 0."""

MAX_CHARACTERS = 2_000
"""Longest text read; protects the readers themselves, which take linear time."""
MAX_HEAVY_ATOMS = 200
"""Protects everything that grows with size: canonical ranking, InChI, coordinates."""
MAX_RINGS = 40
"""Independent rings (bonds - atoms + pieces); protects ring perception, which explodes on dense cages."""
MAX_STEREO_ELEMENTS = 60
"""Stereocentres and stereo double bonds as written; protects canonical ranking and stereo perception."""

SMALLEST_TRANS_RING = 8
"""Members of the smallest ring that holds a trans double bond, and so a bridgehead double bond: cyclooctene.

Source: iupac-gold, Bredt's rule; trans-cyclooctene is the smallest isolable trans-cycloalkene (march-2013).
"""

_INORGANIC_CATIONS = frozenset({"Li", "Na", "K", "Rb", "Cs", "Mg", "Ca", "Ba", "Ag", "Cu", "Zn", "Tl", "Hg", "Cd"})
_INORGANIC_ANIONS = frozenset(
    {"[F-]", "[Cl-]", "[Br-]", "[I-]", "[OH-]", "O=[N+]([O-])[O-]", "O=S(=O)([O-])O", "O=S(=O)([O-])[O-]"}
    | {"F[B-](F)(F)F", "F[P-](F)(F)(F)(F)F", "F[Sb-](F)(F)(F)(F)F", "[O-][Cl+3]([O-])([O-])[O-]"}
    | {"O=C([O-])O", "O=C([O-])[O-]", "O=P([O-])(O)O"}
)


class StructureError(ValueError):
    """Text that is no structure we can work with.

    reason: what is wrong, in a chemist's words.
    position: character of the text it stands at, from 0; None if unknown.
    mend: how to put it right.
    """

    def __init__(self, reason: str, mend: str, position: int | None = None) -> None:
        super().__init__(reason if position is None else f"{reason} (character {position + 1})")
        self.reason = reason
        self.mend = mend
        self.position = position

    def __reduce__(self) -> tuple[type["StructureError"], tuple[str, str, int | None]]:
        return (type(self), (self.reason, self.mend, self.position))


@dataclass(frozen=True, slots=True)
class Stereocentres:
    """How many tetrahedral stereocentres have a drawn configuration, and how many have not."""

    specified: int
    unspecified: int

    @property
    def total(self) -> int:
        """Return all stereocentres, drawn or not."""
        return self.specified + self.unspecified


@dataclass(frozen=True, slots=True)
class Atom:
    """One atom as the rest of the handbook sees it, with no RDKit in it.

    neighbours: (atom, bond order) in ascending atom order; 1.5 is an aromatic bond.
    ring_sizes: sizes of the smallest rings through the atom, ascending.
    """

    id: AtomId
    symbol: str
    charge: int
    hydrogens: int
    isotope: int
    aromatic: bool
    hybridisation: str
    neighbours: tuple[tuple[AtomId, float], ...]
    ring_sizes: tuple[int, ...]


class _Complaints(logging.Handler):
    """Keeps the last lines RDKit would have printed to the terminal."""

    def __init__(self) -> None:
        super().__init__()
        self.lines: list[str] = []

    def emit(self, record: logging.LogRecord) -> None:
        self.lines.append(record.getMessage())
        del self.lines[:-8]


_complaints = _Complaints()
rdBase.LogToPythonLogger()
_rdkit_log = logging.getLogger("rdkit")
_rdkit_log.handlers[:] = [_complaints]
_rdkit_log.propagate = False


@contextmanager
def _heard_complaints() -> Iterator[list[str]]:
    _complaints.lines.clear()
    yield _complaints.lines


@dataclass(frozen=True, eq=False)
class Structure:
    """A chemical structure: equal, hashed and pickled by its canonical isomeric SMILES.

    smiles: canonical isomeric SMILES; its atom order is the numbering of this structure.
    typed: the text it was read from, as given.
    typed_order: for each atom of the typed text, its AtomId; explicit hydrogens are not counted.
    mol: the RDKit molecule, atoms in canonical order; for the chemistry room only, never changed in place.
    """

    smiles: str
    typed: str = field(repr=False)
    typed_order: tuple[AtomId, ...] = field(repr=False)
    mol: Chem.Mol = field(repr=False)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Structure) and self.smiles == other.smiles

    def __hash__(self) -> int:
        return hash(self.smiles)

    def __lt__(self, other: "Structure") -> bool:
        return self.smiles < other.smiles

    def __str__(self) -> str:
        return self.smiles

    def __reduce__(self) -> tuple[object, tuple[str, str, tuple[AtomId, ...]]]:
        return (_restore, (self.smiles, self.typed, self.typed_order))

    @cached_property
    def flat_smiles(self) -> str:
        """Return the canonical SMILES without stereochemistry; isotopes stay."""
        flat = Chem.Mol(self.mol)
        Chem.RemoveStereochemistry(flat)
        return Chem.MolToSmiles(flat)

    @cached_property
    def flat(self) -> "Structure":
        """Return the same structure without stereochemistry."""
        return parse_smiles(self.flat_smiles)

    @cached_property
    def inchi(self) -> str:
        """Return the standard InChI; empty where InChI cannot express the structure."""
        return str(rdinchi.MolToInchi(self.mol)[0])

    @cached_property
    def inchikey(self) -> str:
        """Return the standard InChIKey; empty where InChI cannot express the structure."""
        return rdinchi.InchiToInchiKey(self.inchi) if self.inchi else ""

    @cached_property
    def formula(self) -> str:
        """Return the molecular formula in Hill order, charge last ("C2H3O2-"); isotopes are not separated.

        Source: Hill, J. Am. Chem. Soc. 1900, 22, 478 (from memory): carbon, hydrogen, then the alphabet; without
        carbon all by the alphabet. (RDKit puts hydrogen first even then.)
        """
        count = Counter(atom.symbol for atom in self.atoms)
        count["H"] += sum(atom.hydrogens for atom in self.atoms)
        first = ["C", "H"] if count["C"] else []
        order = [*first, *sorted(count.keys() - set(first))]
        size = abs(self.charge)
        sign = ("-" if self.charge < 0 else "+") + (str(size) if size > 1 else "") if size else ""
        return "".join(f"{e}{count[e] if count[e] > 1 else ''}" for e in order if count[e]) + sign

    @cached_property
    def mass(self) -> float:
        """Return the average molar mass in g/mol; the mass of the isotope for a labelled atom."""
        return sum(a.GetMass() + a.GetTotalNumHs() * _MASS_OF_H for a in atoms_of(self.mol))

    @cached_property
    def charge(self) -> int:
        """Return the formal charge, in elementary charges."""
        return Chem.GetFormalCharge(self.mol)

    @cached_property
    def heavy_atom_count(self) -> int:
        """Return the number of atoms other than hydrogen and its isotopes."""
        return self.mol.GetNumHeavyAtoms()

    @cached_property
    def radical_electrons(self) -> int:
        """Return the number of unpaired electrons, most often a bracket atom that lacks its hydrogens."""
        return sum(atom.GetNumRadicalElectrons() for atom in atoms_of(self.mol))

    @cached_property
    def atoms(self) -> tuple[Atom, ...]:
        """Return the atoms by AtomId, as plain values."""
        neighbours: list[list[tuple[AtomId, float]]] = [[] for _ in range(self.mol.GetNumAtoms())]
        for bond in bonds_of(self.mol):
            begin, end, order = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx(), bond.GetBondTypeAsDouble()
            neighbours[begin].append((end, order))
            neighbours[end].append((begin, order))
        ring_sizes: list[list[int]] = [[] for _ in neighbours]
        for ring in self.mol.GetRingInfo().AtomRings():
            for at in ring:
                ring_sizes[at].append(len(ring))
        return tuple(
            Atom(
                id=at,
                symbol=atom.GetSymbol(),
                charge=atom.GetFormalCharge(),
                hydrogens=atom.GetTotalNumHs(),
                isotope=atom.GetIsotope(),
                aromatic=atom.GetIsAromatic(),
                hybridisation=atom.GetHybridization().name.lower(),
                neighbours=tuple(sorted(neighbours[at])),
                ring_sizes=tuple(sorted(ring_sizes[at])),
            )
            for at, atom in enumerate(atoms_of(self.mol))
        )

    @cached_property
    def elements(self) -> Mapping[str, int]:
        """Return how many atoms of each element there are, by symbol, hydrogen and its isotopes left out."""
        return Counter(atom.GetSymbol() for atom in atoms_of(self.mol) if atom.GetAtomicNum() != 1)

    @cached_property
    def signs(self) -> frozenset[int]:
        """Return the signs of the formal charges in it, +1 and -1."""
        charges = (atom.GetFormalCharge() for atom in atoms_of(self.mol))
        return frozenset(1 if charge > 0 else -1 for charge in charges if charge)

    @cached_property
    def symmetry_classes(self) -> tuple[int, ...]:
        """Return one number per atom; atoms that symmetry makes equivalent share it."""
        return tuple(Chem.CanonicalRankAtoms(self.mol, breakTies=False))

    @cached_property
    def without_stereocentres(self) -> "Structure":
        """Return the structure with no tetrahedral configuration drawn; double bonds keep theirs."""
        if "@" not in self.smiles:
            return self
        plain = Chem.Mol(self.mol)
        for atom in atoms_of(plain):
            atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
        return parse_smiles(Chem.MolToSmiles(plain))

    @cached_property
    def fragments(self) -> tuple["Structure", ...]:
        """Return the separate species, carbon-bearing ones first, then larger first, then by SMILES."""
        if "." not in self.smiles:
            return (self,)
        pieces = [parse_smiles(piece) for piece in self.smiles.split(".")]
        return tuple(sorted(pieces, key=lambda s: (not _has_carbon(s), -s.heavy_atom_count, s.smiles)))

    @cached_property
    def without_counter_ions(self) -> "Structure":
        """Return the structure with inorganic counter-ions dropped; itself if nothing else would be left."""
        kept = [s for s in self.fragments if not _is_inorganic_counter_ion(s)]
        if not kept or len(kept) == len(self.fragments):
            return self
        return parse_smiles(".".join(sorted(s.smiles for s in kept)))

    @cached_property
    def without_isotopes(self) -> "Structure":
        """Return the structure with every isotope label taken off."""
        plain = Chem.Mol(self.mol)
        for atom in atoms_of(plain):
            atom.SetIsotope(0)
        return parse_smiles(Chem.MolToSmiles(Chem.RemoveHs(plain)))

    @cached_property
    def mirror_image(self) -> "Structure":
        """Return the enantiomer; undrawn stereocentres stay undrawn."""
        if "@" not in self.smiles:
            return self
        mirrored = Chem.Mol(self.mol)
        for atom in atoms_of(mirrored):
            if atom.GetChiralTag() in _TETRAHEDRAL:
                atom.InvertChirality()
        return parse_smiles(Chem.MolToSmiles(mirrored))

    @cached_property
    def is_achiral(self) -> bool:
        """Answer whether every stereocentre is drawn and it equals its mirror image, as meso compounds do."""
        return self.stereocentres.unspecified == 0 and self.mirror_image == self

    @cached_property
    def stereocentres(self) -> Stereocentres:
        """Return the count of tetrahedral stereocentres, para-stereocentres included."""
        marks = [s.specified for s in self._stereo if s.type == Chem.StereoType.Atom_Tetrahedral]
        drawn = sum(mark == Chem.StereoSpecified.Specified for mark in marks)
        return Stereocentres(drawn, len(marks) - drawn)

    @cached_property
    def stereocentre_marks(self) -> dict[AtomId, bool]:
        """Return, for each tetrahedral stereocentre, whether its configuration is drawn."""
        return {
            s.centeredOn: s.specified == Chem.StereoSpecified.Specified
            for s in self._stereo
            if s.type == Chem.StereoType.Atom_Tetrahedral
        }

    @cached_property
    def bridgeheads(self) -> frozenset[AtomId]:
        """Return the atoms where two smallest rings meet that share three or more atoms, and those of small cages.

        Such an atom cannot be attacked from behind, and in small bicycles cannot become flat.
        """
        return bridgeheads_of(self.mol)

    @cached_property
    def _stereo(self) -> tuple[Chem.StereoInfo, ...]:
        found = Chem.FindPotentialStereo(Chem.Mol(self.mol), cleanIt=False, flagPossible=True)
        return tuple(s for s in found if not (self._is_held_by_a_cage(s) or self._inverts(s)))

    def _inverts(self, info: Chem.StereoInfo) -> bool:
        """Answer whether a centre is an amine nitrogen that turns inside out, and is drawn without configuration.

        RDKit takes the nitrogen of an aziridine for a possible stereocentre.
        """
        if info.type != Chem.StereoType.Atom_Tetrahedral or info.specified != Chem.StereoSpecified.Unspecified:
            return False
        atom = self.mol.GetAtomWithIdx(info.centeredOn)
        is_amine = atom.GetAtomicNum() == _NITROGEN and atom.GetFormalCharge() == 0
        return is_amine and self.mol.GetRingInfo().NumAtomRings(info.centeredOn) == 1

    def _is_held_by_a_cage(self, info: Chem.StereoInfo) -> bool:
        """Answer whether a centre has like neighbours that rings tie together, so that it has no second form.

        RDKit takes C1 of adamantane and C1 of norbornan-7-one for possible stereocentres.
        """
        if info.type != Chem.StereoType.Atom_Tetrahedral or info.centeredOn not in self.bridgeheads:
            return False
        ranks = self.symmetry_classes
        around = [ranks[n.GetIdx()] for n in self.mol.GetAtomWithIdx(info.centeredOn).GetNeighbors()]
        return len(set(around)) < len(around)


def atoms_of(mol: Chem.Mol) -> "map[Chem.Atom]":
    """Return the atoms of an RDKit molecule one by one; for this room only.

    RDKit's own iterator counts the atoms at every step.
    """
    return map(mol.GetAtomWithIdx, range(mol.GetNumAtoms()))


def bonds_of(mol: Chem.Mol) -> "map[Chem.Bond]":
    """Return the bonds of an RDKit molecule one by one; for this room only."""
    return map(mol.GetBondWithIdx, range(mol.GetNumBonds()))


def bridgeheads_of(mol: Chem.Mol) -> frozenset[int]:
    """Return the bridgehead atoms of an RDKit molecule with ring information; for this room only."""
    info = mol.GetRingInfo()
    if info.NumRings() < 2:
        return frozenset()
    rings = [frozenset(ring) for ring in info.AtomRings()]
    shared = [one & other for place, one in enumerate(rings) for other in rings[:place]]
    found = {a for common in shared if len(common) >= 3 for a in common if _ring_bonds(mol, a) >= 3}
    small = [ring for ring in rings if len(ring) <= 5]
    return frozenset(found | {a for a in frozenset().union(*small) if sum(a in ring for ring in small) >= 3})


def _ring_bonds(mol: Chem.Mol, atom: int) -> int:
    return sum(1 for bond in mol.GetAtomWithIdx(atom).GetBonds() if bond.IsInRing())


_MASS_OF_H = Chem.GetPeriodicTable().GetAtomicWeight(1)
_NITROGEN = 7
_TETRAHEDRAL = (Chem.ChiralType.CHI_TETRAHEDRAL_CW, Chem.ChiralType.CHI_TETRAHEDRAL_CCW)


def name_atom(structure: Structure, atom: AtomId) -> str:
    """Return the atom as its author would point at it: "C2 in CC(Br)CC", the second atom written.

    Raises ValueError if the structure has no such atom.
    """
    if atom not in structure.typed_order:
        raise ValueError(f"{structure.smiles} has no atom {atom}")
    place = structure.typed_order.index(atom)
    return f"{structure.mol.GetAtomWithIdx(atom).GetSymbol()}{place + 1} in {structure.typed}"


def stereo_key(structure: Structure, kind: str) -> str:
    """Return InChIKey and kind of stereo, the substrate part of a reaction key.

    kind: the record's word (single enantiomer, racemate, ...), carried along so that a racemate and an
    enantiomer differ. Either mirror image, or for a single stereocentre the flat formula too, gives the same
    key for a racemate or an enantiomer not known. Counter-ions are dropped.
    """
    plain = structure.without_counter_ions
    if kind in {"racemate", "unknown enantiomer"}:
        either = (plain.flat,) if plain.stereocentres.total == 1 else (plain, plain.mirror_image)
        return f"{min(_key_or_smiles(s) for s in either)} {kind}"
    return f"{_key_or_smiles(plain)} {kind}"


def _key_or_smiles(structure: Structure) -> str:
    return structure.inchikey or structure.smiles


@lru_cache(maxsize=1024)
def parse_smiles(text: str) -> Structure:
    """Return the structure a SMILES describes. Atom-map numbers are read and dropped.

    Raises StructureError for what is no single, fully specified structure within the bounds of this module:
    empty text, wildcards, SMARTS, reaction arrows, broken syntax, impossible valences, too large.
    """
    _refuse_what_is_no_smiles(text)
    with _heard_complaints() as complaints:
        raw = _unsanitised(text)
        if raw is None:
            raise _explain_syntax(text, complaints)
        _refuse_excess(raw, _stereo_in_text(text))
        if ":" in text:
            for atom in atoms_of(raw):
                atom.SetAtomMapNum(0)
        _sanitise(raw, text)
    return _from_mol(raw, text)


def parse_inchi(text: str) -> Structure:
    """Return the structure an InChI describes.

    Raises StructureError if the text is no InChI, or is larger than the bounds of this module.
    """
    stripped = text.strip()
    if not stripped.startswith("InChI="):
        raise StructureError("not an InChI", 'an InChI starts with "InChI=1S/"', 0)
    if len(stripped) > MAX_CHARACTERS:
        raise StructureError(f"longer than {MAX_CHARACTERS} characters", "give the structure as SMILES")
    with _heard_complaints():
        raw = rdinchi.InchiToMol(stripped, False, False)[0]
        if raw is None:
            raise StructureError("InChI that cannot be read", "copy it again, or give the structure as SMILES")
        _refuse_excess(raw, _stereo_in_file(raw))
        _sanitise(raw, None)
    return _from_mol(raw, stripped)


def parse_rxn(text: str) -> tuple[tuple[Structure, ...], tuple[Structure, ...]]:
    """Return reactants and products of a CTfile RXN block (V2000 or V3000), in file order, no agents.

    Raises StructureError if the block is malformed or one of its molecules is no fully specified structure.
    """
    lines = text.splitlines()
    if not lines or not lines[0].startswith("$RXN"):
        raise StructureError("not an RXN block", 'its first line is "$RXN"', 0)
    newer = "V3000" in lines[0]
    reactants, products = _rxn_blocks_v3000(text) if newer else _rxn_blocks_v2000(text, lines)
    return tuple(map(_from_molblock, reactants)), tuple(map(_from_molblock, products))


def _rxn_blocks_v2000(text: str, lines: list[str]) -> tuple[list[str], list[str]]:
    blocks = [block.lstrip("\r").removeprefix("\n") for block in text.split("$MOL")[1:]]
    counts = re.match(r"^([ \d]{3})([ \d]{3})", lines[4] if len(lines) > 4 else "")
    if counts is None or not all(group.strip() for group in counts.groups()):
        raise StructureError("RXN block without counts of reactants and products", "write the file again")
    n_reactants, n_products = (int(group) for group in counts.groups())
    if len(blocks) < n_reactants + n_products:
        raise StructureError("RXN block with fewer molecules than it announces", "write the file again")
    return blocks[:n_reactants], blocks[n_reactants : n_reactants + n_products]


def _rxn_blocks_v3000(text: str) -> tuple[list[str], list[str]]:
    def ctabs(role: str) -> list[str]:
        part = re.search(rf"M  V30 BEGIN {role}(.*?)M  V30 END {role}", text, re.DOTALL)
        found = re.findall(r"M  V30 BEGIN CTAB.*?M  V30 END CTAB", part.group(1) if part else "", re.DOTALL)
        return [f"\n\n\n  0  0  0     0  0            999 V3000\n{ctab}\nM  END\n" for ctab in found]

    return ctabs("REACTANT"), ctabs("PRODUCT")


def _from_molblock(block: str) -> Structure:
    with _heard_complaints():
        try:
            raw = Chem.MolFromMolBlock(block, sanitize=False, removeHs=False)
        except RuntimeError:
            raw = None
        if raw is None:
            raise StructureError("molecule in the RXN block that cannot be read", "write the file again")
        _refuse_excess(raw, _stereo_in_file(raw))
        _sanitise(raw, None)
        if raw.GetNumConformers():
            Chem.AssignChiralTypesFromBondDirs(raw)
            Chem.DetectBondStereochemistry(raw)
        Chem.AssignStereochemistry(raw, cleanIt=True, force=True)
        return _from_mol(raw, None)


_WILDCARD, _HYDROGEN, _AROMATIC_OUTSIDE_A_RING = map(Chem.MolFromSmarts, ("[#0]", "[#1]", "*!@:*"))


def _from_mol(raw: Chem.Mol, typed: str | None) -> Structure:
    """Return the Structure of a sanitised molecule, its atoms put into canonical order."""
    if raw.HasSubstructMatch(_WILDCARD):
        raise StructureError("wildcard atom", "write a definite atom in its place")
    if raw.HasSubstructMatch(_AROMATIC_OUTSIDE_A_RING):
        raise StructureError("aromatic bond outside a ring", "write a single or double bond in place of :")
    mol = raw
    place = {at: at for at in range(raw.GetNumAtoms())}
    if raw.HasSubstructMatch(_HYDROGEN):
        for atom in atoms_of(raw):
            atom.SetIntProp("_written", atom.GetIdx())
        mol = Chem.RemoveHs(raw, sanitize=False)
        Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
        place = {a.GetIntProp("_written"): a.GetIdx() for a in atoms_of(mol)}
    text = Chem.MolToSmiles(mol)
    order = {old: new for new, old in enumerate(output_order(mol))}
    smiles, numbers, canonical = _settled(text)
    written = tuple(numbers[order[place[at]]] for at in range(raw.GetNumAtoms()) if at in place)
    return Structure(smiles, typed or smiles, written, canonical)


@lru_cache(maxsize=8192)
def _settled(text: str) -> tuple[str, tuple[AtomId, ...], Chem.Mol]:
    """Return the canonical SMILES that reading and writing RDKit's leads to, each atom's place in it, the molecule.

    Most often it is RDKit's own; another round, or two, makes a fixed point of the others. However a structure was
    typed, it shares the molecule.
    """
    smiles, mol = text, Chem.MolFromSmiles(text)
    numbers = list(range(mol.GetNumAtoms()))
    for _ in range(3):
        again = Chem.MolToSmiles(mol)
        if again == smiles:
            break
        order = {old: new for new, old in enumerate(output_order(mol))}
        numbers = [order[at] for at in numbers]
        smiles, mol = again, Chem.MolFromSmiles(again)
    return smiles, tuple(numbers), mol


def output_order(mol: Chem.Mol) -> list[int]:
    """Return the atoms of a molecule in the order of the SMILES just written of it; for this room only."""
    return [int(at) for at in mol.GetProp("_smilesAtomOutputOrder").strip("[],").split(",")]


def _restore(smiles: str, typed: str, typed_order: tuple[AtomId, ...]) -> Structure:
    same = parse_smiles(smiles)
    return Structure(same.smiles, typed, typed_order, same.mol)


_WRITE_SMILES = "write a SMILES in single quotes, such as 'CCC(C)Br'"
_SMILES_TOKEN = re.compile(
    r"(?P<atom>\[[^\[\]]*\]|Br|Cl|[BCNOPSFI]|[bcnops])|(?P<bond>->|<-|[-=#$:/\\])"
    r"|(?P<ring>%\(\d+\)|%\d\d|\d)|(?P<branch>[()])|(?P<dot>\.)"
)
_SMARTS_IN_BRACKET = re.compile(r"[;,&!$#~]|\bR\d*$|^[Aa]$|^[XxDvRr]\d")


def _unsanitised(smiles: str) -> Chem.Mol | None:
    return Chem.MolFromSmiles(smiles, sanitize=False)


def _refuse_what_is_no_smiles(text: str) -> None:
    if not text or not text.strip():
        raise StructureError("no structure", _WRITE_SMILES)
    if len(text) > MAX_CHARACTERS:
        raise StructureError(f"longer than {MAX_CHARACTERS} characters", "write only the species that reacts")
    extension = re.search(r"\s+\|(?P<said>[^|]*)\|?", text)
    if extension:
        raise _extended(extension["said"], extension.start())
    space = re.search(r"\s", text)
    if space:
        raise StructureError("space in a SMILES", "write the SMILES alone, its name under `name`", space.start())
    foreign = re.search(r"[^\x20-\x7e]", text)
    if foreign:  # RDKit would pass over one at either end, and a carbon typed in Cyrillic with it
        mend = "type it again in plain letters; quotes and dashes of a text processor are none"
        raise StructureError(f"character {foreign.group()!r} in a SMILES", mend, foreign.start())
    arrow = re.search(r"(?<!-)>", text)
    if arrow:
        mend = "write one structure; substrate, nucleophile and products have their own keys"
        raise StructureError("reaction arrow", mend, arrow.start())
    wildcard = text.find("*")
    if wildcard >= 0:
        raise StructureError("wildcard atom", "write a definite atom in place of *", wildcard)
    if "~" in text:
        raise StructureError("bond of any order", "write a definite bond in place of ~", text.index("~"))
    for bracket in re.finditer(r"\[([^\[\]]*)\]", text):
        if _SMARTS_IN_BRACKET.search(bracket.group(1)):
            mend = "write a definite atom, with its hydrogens and charge"
            raise StructureError(f"search pattern {bracket.group()} in a SMILES", mend, bracket.start())


_STEREO_GROUPS = {"&": "stereo: racemate", "o": "stereo: unknown enantiomer", "a": "stereo: single enantiomer"}


def _extended(said: str, position: int) -> StructureError:
    """Return the error for a CXSMILES extension, which says the stereo of a whole bottle beside the structure.

    Read on, it would be lost: a racemate written |&1:1| has the InChIKey of the enantiomer that is drawn.
    """
    words = [word for sign, word in _STEREO_GROUPS.items() if re.search(rf"(^|,){sign}\d*:", said)]
    instead = f", and {' or '.join(words)} beside it" if words else ""
    return StructureError("CXSMILES extension", f"write the SMILES alone{instead}", position)


def _refuse_excess(raw: Chem.Mol, stereo_elements: int) -> None:
    """Refuse, before any costly step, what is beyond the bounds; counting atoms and bonds is linear."""
    if raw.GetNumAtoms() == 0:
        raise StructureError("no structure", _WRITE_SMILES)
    if raw.GetNumHeavyAtoms() > MAX_HEAVY_ATOMS or raw.GetNumAtoms() > 3 * MAX_HEAVY_ATOMS:
        raise StructureError(f"more than {MAX_HEAVY_ATOMS} heavy atoms", "write only the species that reacts")
    pieces = len(Chem.GetMolFrags(raw))
    if raw.GetNumBonds() - raw.GetNumAtoms() + pieces > MAX_RINGS:
        raise StructureError(f"more than {MAX_RINGS} rings", "this handbook does not cover such cages")
    if stereo_elements > MAX_STEREO_ELEMENTS:
        mend = "this handbook does not cover such"
        raise StructureError(f"more than {MAX_STEREO_ELEMENTS} stereo elements", mend)


def _stereo_in_text(smiles: str) -> int:
    """Return stereocentres and half the direction marks of a SMILES, an upper bound of its stereo elements."""
    return len(re.findall(r"@+", smiles)) + (smiles.count("/") + smiles.count("\\")) // 2


def _stereo_in_file(raw: Chem.Mol) -> int:
    """Return the wedged and double bonds of a molecule from a file, an upper bound of its stereo elements."""
    wedged = sum(1 for bond in bonds_of(raw) if bond.GetBondDir() != Chem.BondDir.NONE)
    double = sum(1 for bond in bonds_of(raw) if bond.GetBondType() == Chem.BondType.DOUBLE)
    chiral = sum(1 for a in atoms_of(raw) if a.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED)
    return wedged + double + chiral


def _sanitise(raw: Chem.Mol, text: str | None) -> None:
    """Sanitise in place; what RDKit objects to becomes a StructureError that points at the author's atom."""
    untouched = Chem.Mol(raw)
    problem = Chem.SanitizeMol(raw, catchErrors=True)
    if problem == Chem.SanitizeFlags.SANITIZE_NONE:
        Chem.AssignStereochemistry(raw, cleanIt=True, force=True)
        return
    for found in Chem.DetectChemistryProblems(untouched):
        if found.GetType() == "AtomValenceException":
            raise _valence_error(untouched.GetAtomWithIdx(found.GetAtomIdx()), text)
        if found.GetType() == "KekulizeException":
            at = min(found.GetAtomIndices(), default=None)
            mend = "check lower-case atoms; an aromatic N-H is written [nH]"
            raise StructureError("aromatic ring without alternating double bonds", mend, _offset(text, at))
    raise StructureError("structure that breaks the rules of valence", "check bonds, hydrogens and charges")


def _valence_error(atom: Chem.Atom, text: str | None) -> StructureError:
    at = atom.GetIdx()
    symbol = atom.GetSymbol()
    mend = f"count the bonds of this {symbol}; a charge or hydrogen may be missing in its brackets"
    return StructureError(f"valence of {symbol} at atom {at + 1} exceeded", mend, _offset(text, at))


def _offset(text: str | None, atom: int | None) -> int | None:
    """Return the character at which the n-th atom (from 0) of a SMILES is written."""
    if text is None or atom is None:
        return None
    atoms = [m.start() for m in _SMILES_TOKEN.finditer(text) if m.lastgroup == "atom"]
    return atoms[atom] if atom < len(atoms) else None


def _explain_syntax(text: str, complaints: list[str]) -> StructureError:
    """Return the error for a SMILES RDKit cannot read: our own reading first, RDKit's words last."""
    open_rings: dict[str, int] = {}
    branches: list[int] = []
    at = 0
    while at < len(text):
        token = _SMILES_TOKEN.match(text, at)
        if token is None:
            return _explain_character(text, at)
        written = token.group()
        if token.lastgroup == "ring":
            label = written.strip("%()").lstrip("0") or "0"
            if open_rings.pop(label, None) is None:
                open_rings[label] = at
        elif written == "(":
            branches.append(at)
        elif written == ")" and not branches:
            return StructureError("branch closed that was never opened", "remove the ) or add its (", at)
        elif written == ")":
            branches.pop()
        elif written.startswith("[") and _unsanitised(written) is None:
            return StructureError(f"unknown atom {written}", "write element, hydrogens, charge: [NH4+]", at)
        at = token.end()
    if open_rings:
        label, where = min(open_rings.items(), key=lambda item: item[1])
        return StructureError(f"unclosed ring {label}", f"write {label} at its second atom too", where)
    if branches:
        return StructureError("branch that is not closed", "close it with )", branches[-1])
    return _in_rdkit_words(text, complaints)


def _explain_character(text: str, at: int) -> StructureError:
    if text[at] == "[":
        return StructureError("bracket that is not closed", "close it with ]", at)
    return StructureError(f"character {text[at]!r} is no SMILES", "write a definite atom or bond", at)


def _in_rdkit_words(text: str, complaints: list[str]) -> StructureError:
    said = next((line for line in complaints if "position" in line), complaints[-1] if complaints else "")
    place = re.search(r"position (\d+)", said)
    if place:
        at = min(int(place.group(1)), len(text)) - 1
        return StructureError(f"{text[at]!r} where SMILES allows none", _WRITE_SMILES, at)
    words = re.search(r"Error: (?!Failed)(.*?)(?= for input|$)", said)
    return StructureError(words.group(1) if words else "SMILES that cannot be read", _WRITE_SMILES)


def _has_carbon(structure: Structure) -> bool:
    return any(atom.GetAtomicNum() == 6 for atom in atoms_of(structure.mol))


def _is_inorganic_counter_ion(structure: Structure) -> bool:
    if structure.mol.GetNumAtoms() == 1 and structure.charge > 0:
        symbol = structure.mol.GetAtomWithIdx(0).GetSymbol()
        return symbol in _INORGANIC_CATIONS or structure.smiles in {"[NH4+]", "[H+]", "[OH3+]"}
    return structure.smiles in _INORGANIC_ANIONS
