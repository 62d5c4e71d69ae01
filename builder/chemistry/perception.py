"""Perception: where a structure reacts, and with which atom a nucleophile attacks.

All patterns are rows of the tables that `patterns` loads. Every answer is in AtomIds, sorted, and the same
however the author ordered the atoms.
"""

from dataclasses import dataclass, replace
from enum import StrEnum
from functools import cache, lru_cache

from rdkit import Chem

from builder.chemistry.patterns import (
    Activation,
    ClassKind,
    ClassPattern,
    Electrons,
    LeavingGroupPattern,
    Reach,
    load_attack_patterns,
    load_class_patterns,
    load_leaving_groups,
)
from builder.chemistry.structure import AtomId, Structure

__all__ = [
    "NO_LEAVING_GROUP",
    "Activation",
    "BetaCarbon",
    "Degree",
    "Hybridisation",
    "LeavingGroup",
    "Nucleophile",
    "ReactiveSite",
    "SiteStereo",
    "atoms_that_stay",
    "attacking_atoms",
    "expected_class_names",
    "leaving_group_names",
    "leaving_groups",
    "neighbouring_groups",
    "nucleophile_kinds",
    "perceive_sites",
    "site_class_meanings",
    "site_class_names",
    "sites_of",
    "stem_of",
]

NO_LEAVING_GROUP = "none"
"""The leaving group of an addition to an alkene or alkyne."""

STRAINED_RING_SIZES = (3, 4)


class Hybridisation(StrEnum):
    """Hybridisation of the alpha carbon."""

    SP3 = "sp3"
    SP2 = "sp2"
    SP = "sp"


class Degree(StrEnum):
    """Substituents (C, N, O, S, P, Si, B) on an sp3 alpha carbon besides the leaving group: none to three."""

    METHYL = "methyl"
    PRIMARY = "primary"
    SECONDARY = "secondary"
    TERTIARY = "tertiary"


class SiteStereo(StrEnum):
    """Whether the alpha carbon is a stereocentre, and whether its configuration is drawn."""

    SPECIFIED = "specified"
    UNSPECIFIED = "unspecified"
    NONE = "none"


@dataclass(frozen=True, slots=True)
class LeavingGroup:
    """A leaving group of the closed list; conjugate_acid_pka is in water, None where no value is known."""

    name: str
    abbreviation: str
    conjugate_acid: str | None
    conjugate_acid_pka: float | None
    needs_activation: bool
    activated_by: frozenset[Activation]
    note: str
    source: str


@dataclass(frozen=True, slots=True)
class BetaCarbon:
    """A carbon next to the alpha carbon.

    hydrogens: all of them, heavy isotopes included.
    hydrogen_isotopes: the explicit (labelled) ones among them, by AtomId.
    branches: heavy neighbours other than the alpha carbon, 0 to 3.
    bond_order: of the bond to the alpha carbon; 1.5 is aromatic.
    in_common_ring: whether a ring, other than one that holds the leaving atom, holds it and the alpha carbon.
    """

    atom: AtomId
    hydrogens: int
    hydrogen_isotopes: tuple[AtomId, ...]
    branches: int
    hybridisation: str
    bond_order: float
    in_common_ring: bool
    is_bridgehead: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class ReactiveSite:
    """One carbon where substitution, elimination or addition may happen, and everything close to it.

    leaving_atom: None for an addition, whose other end is `partner`.
    degree: None unless the carbon is sp3.
    classes: class words that hold here, degree included.
    carbon_neighbours: carbons bonded to the alpha carbon.
    ring_sizes: smallest rings through the alpha carbon that do not hold the leaving atom.
    leaving_ring_size: smallest ring that holds alpha carbon and leaving atom; None if there is none.
    equivalent: alpha carbons symmetry makes equivalent to this one, itself first.
    multiplicity: equivalent pairs of alpha carbon and leaving atom, so 3 for one carbon of CHCl3.
    """

    leaving_group: str
    alpha_carbon: AtomId
    leaving_atom: AtomId | None
    partner: AtomId | None
    hybridisation: Hybridisation
    degree: Degree | None
    classes: frozenset[str]
    carbon_neighbours: int
    alpha_hydrogens: int
    beta: tuple[BetaCarbon, ...]
    ring_sizes: tuple[int, ...]
    leaving_ring_size: int | None
    is_bridgehead: bool
    needs_activation: bool
    stereo: SiteStereo
    equivalent: tuple[AtomId, ...]
    multiplicity: int

    @property
    def in_strained_ring(self) -> bool:
        """Answer whether leaving releases the strain of a three- or four-membered ring."""
        return self.leaving_ring_size in STRAINED_RING_SIZES

    @property
    def is_addition(self) -> bool:
        """Answer whether the site is an end of a multiple bond, with nothing to leave."""
        return self.leaving_atom is None

    @property
    def beta_with_hydrogen(self) -> tuple[BetaCarbon, ...]:
        """Return the carbons whose hydrogen an elimination can take.

        sp3 carbons, and at an sp2 alpha carbon the other end of the double bond.
        """
        wanted_order = {Hybridisation.SP3: (1.0,), Hybridisation.SP2: (2.0, 1.5), Hybridisation.SP: ()}
        return tuple(
            b
            for b in self.beta
            if b.hydrogens
            and b.bond_order in wanted_order[self.hybridisation]
            and (self.hybridisation is not Hybridisation.SP3 or b.hybridisation == "sp3")
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Nucleophile:
    """One atom of a nucleophile or base that can attack.

    species: the ion or molecule that attacks, counter-ions taken off; atom ids refer to it.
    kind: what a chemist calls it (azide, thiolate, amine, primary, ...), from the table.
    atom: the attacking atom; for a hydride transfer the atom that bears the hydride.
    symbol: element of the attacking atom; H for a hydride.
    charge: of the species, which decides its nature, not that of the atom.
    preference: 1 for the usual atom of an ambident nucleophile, more for its alternatives.
    via: further atoms the electrons pass through, as the table numbers them: (2, 3, 4), None where unused.
    reach: which carbons it attacks, and whether it needs a strong base for those of another molecule.
    loses_proton: whether the product is written without the proton it sheds.
    """

    species: Structure
    kind: str
    atom: AtomId
    symbol: str
    charge: int
    preference: int
    electrons: Electrons
    via: tuple[AtomId | None, AtomId | None, AtomId | None]
    reach: Reach
    note: str

    @property
    def inside_only(self) -> bool:
        """Answer whether it attacks only a carbon of its own molecule, as a neighbouring group."""
        return self.reach is Reach.INSIDE

    @property
    def needs_strong_base(self) -> bool:
        """Answer whether another molecule is attacked only where a strong base has taken the proton first."""
        return self.reach is Reach.STRONG_BASE

    @property
    def loses_proton(self) -> bool:
        """Answer whether the attacking species gives up a proton on the way to the product."""
        return self.electrons in {Electrons.PROTON_LOST, Electrons.PROTON_MOVES}


@cache
def leaving_groups() -> dict[str, LeavingGroup]:
    """Return the closed list of leaving groups by name, in order of precedence."""
    return {
        row.name: LeavingGroup(
            row.name,
            row.abbreviation,
            row.conjugate_acid,
            row.conjugate_acid_pka,
            row.needs_activation,
            row.activated_by,
            row.note,
            row.source,
        )
        for row in load_leaving_groups()
    }


@cache
def leaving_group_names() -> tuple[str, ...]:
    """Return the words a record may use for `leaving_group`, `none` last."""
    return (*leaving_groups(), NO_LEAVING_GROUP)


@cache
def site_class_names() -> tuple[str, ...]:
    """Return the words a record may use for `class`."""
    return tuple(row.name for row in load_class_patterns())


@cache
def expected_class_names() -> frozenset[str]:
    """Return the class words a writer is expected to use wherever they apply."""
    return frozenset(row.name for row in load_class_patterns() if row.expected)


@cache
def site_class_meanings() -> dict[str, str]:
    """Return, for each class word, what it means."""
    return {row.name: row.meaning for row in load_class_patterns()}


@lru_cache(maxsize=512)
def perceive_sites(structure: Structure) -> tuple[ReactiveSite, ...]:
    """Return every reactive carbon: those with a leaving group first, then the ends of multiple bonds.

    Groups that leave without activation come first, then by place in the leaving-group table and AtomId.
    Equivalent sites are merged into the one with the lowest AtomIds. An epoxide gives one site per carbon.
    """
    pairs = _leaving_pairs(structure)
    classes = _classes(structure) if pairs else {}
    order = {row.name: place for place, row in enumerate(load_leaving_groups())}
    groups: dict[tuple[object, ...], list[ReactiveSite]] = {}
    for (alpha, leaving), row in sorted(pairs.items()):
        site = _site(structure, (alpha, leaving), row, classes)
        ranks = structure.symmetry_classes
        groups.setdefault((row.name, ranks[alpha], ranks[leaving], site.leaving_ring_size), []).append(site)
    found = [_merged(group) for group in groups.values()]
    found.sort(key=lambda s: (s.needs_activation, order[s.leaving_group], s.alpha_carbon))
    return (*found, *_addition_sites(structure))


def sites_of(structure: Structure, leaving_group: str) -> tuple[ReactiveSite, ...]:
    """Return the sites with this leaving group; `none` gives the ends of multiple bonds."""
    return tuple(s for s in perceive_sites(structure) if s.leaving_group == leaving_group)


def atoms_that_stay(structure: Structure, site: ReactiveSite) -> frozenset[AtomId]:
    """Return the atoms still tied to the alpha carbon once its bond to the leaving atom is cut."""
    alpha = site.alpha_carbon
    kept, waiting = {alpha}, [alpha]
    while waiting:
        at = waiting.pop()
        around = {near for near, _ in structure.atoms[at].neighbours} - kept
        around -= {site.leaving_atom} if at == alpha else set()
        kept |= around
        waiting += around
    return frozenset(kept)


@lru_cache(maxsize=512)
def stem_of(structure: Structure, site: ReactiveSite) -> str:
    """Return the SMILES of what stays when the group leaves: no configuration, the alpha carbon marked ([CH2:1]).

    It is the same for a bromide and a tosylate; for an addition it is the whole molecule.
    """
    stays = range(len(structure.atoms)) if site.is_addition else sorted(atoms_that_stay(structure, site))
    flat = Chem.Mol(structure.mol)
    Chem.RemoveStereochemistry(flat)
    flat.GetAtomWithIdx(site.alpha_carbon).SetAtomMapNum(1)
    return Chem.MolFragmentToSmiles(flat, atomsToUse=list(stays))


def attacking_atoms(structure: Structure) -> tuple[Nucleophile, ...]:
    """Return the atoms that can attack another molecule, the one that attacks first first; empty if none can.

    Counter-ions are taken off: of a salt the anions count, and neutral species only where no anion attacks.
    """
    return tuple(n for n in _all_attacking_atoms(structure) if not n.inside_only)


def neighbouring_groups(structure: Structure) -> tuple[Nucleophile, ...]:
    """Return the atoms that can attack a carbon of their own molecule, ester carbonyls, halogens, arenes too."""
    return tuple(sorted(_attacking_atoms_of(structure), key=_attack_order))


@lru_cache(maxsize=512)
def _all_attacking_atoms(structure: Structure) -> tuple[Nucleophile, ...]:
    species = structure.fragments
    found = [n for s in species if s.charge < 0 for n in _attacking_atoms_of(s)]
    if not found:
        found = [n for s in species if s.charge >= 0 for n in _attacking_atoms_of(s)]
    return tuple(sorted(found, key=_attack_order))


def nucleophile_kinds() -> tuple[str, ...]:
    """Return the kinds of attacking atoms that can be told apart, in the order of their table."""
    return tuple(_kind_order())


@cache
def _kind_order() -> dict[str, int]:
    kinds = [row.kind for row in load_attack_patterns()]
    return {kind: kinds.index(kind) for kind in kinds}


def _attack_order(nucleophile: Nucleophile) -> tuple[int, int, str, AtomId]:
    n = nucleophile
    return (_kind_order()[n.kind], n.preference, n.species.smiles, n.atom)


def _leaving_pairs(structure: Structure) -> dict[tuple[int, int], LeavingGroupPattern]:
    """Return each pair of alpha carbon and leaving atom; a carbon that bears a charge holds on to its groups."""
    pairs: dict[tuple[int, int], LeavingGroupPattern] = {}
    for row in load_leaving_groups():
        places = row.query.places
        for match in row.query.matches(structure):
            alpha, leaving = match[places[1]], match[places[2]]
            if not structure.mol.GetAtomWithIdx(alpha).GetFormalCharge():
                pairs.setdefault((alpha, leaving), row)
    return pairs


_Classes = dict[int, list[tuple[ClassPattern, int | None]]]
"""For each alpha carbon, the class rows that match there, each with the atom that must not be the leaving one."""


def _classes(structure: Structure) -> _Classes:
    found: _Classes = {}
    for row in load_class_patterns():
        if row.query is None or row.kind is not ClassKind.SITE:
            continue
        places = row.query.places
        for match in row.query.matches(structure):
            other = match[places[3]] if 3 in places else None
            found.setdefault(match[places[1]], []).append((row, other))
    return found


_DEGREES = (Degree.METHYL, Degree.PRIMARY, Degree.SECONDARY, Degree.TERTIARY)
_SUBSTITUENTS = frozenset({5, 6, 7, 8, 14, 15, 16, 34})


def _site(
    structure: Structure, pair: tuple[AtomId, AtomId], row: LeavingGroupPattern, classes: _Classes
) -> ReactiveSite:
    alpha, leaving = pair
    caged = structure.bridgeheads
    mol = structure.mol
    atom = mol.GetAtomWithIdx(alpha)
    hybridisation = _hybridisation(atom)
    others = [n for n in atom.GetNeighbors() if n.GetIdx() != leaving]
    words = {r.name for r, other in classes.get(alpha, ()) if other is None or other != leaving}
    degree = None
    if hybridisation is Hybridisation.SP3:
        degree = _DEGREES[min(3, sum(n.GetAtomicNum() in _SUBSTITUENTS for n in others))]
        words.add(degree.value)
    if alpha in caged:
        words.add("bridgehead")
    rings = [ring for ring in mol.GetRingInfo().AtomRings() if alpha in ring]
    leaving_rings = [len(ring) for ring in rings if leaving in ring]
    marks = structure.stereocentre_marks
    return ReactiveSite(
        leaving_group=row.name,
        alpha_carbon=alpha,
        leaving_atom=leaving,
        partner=None,
        hybridisation=hybridisation,
        degree=degree,
        classes=frozenset(words),
        carbon_neighbours=sum(n.GetAtomicNum() == 6 for n in others),
        alpha_hydrogens=_hydrogens(atom),
        beta=_beta_carbons(mol, alpha, leaving, rings, caged),
        ring_sizes=tuple(sorted(len(ring) for ring in rings if leaving not in ring)),
        leaving_ring_size=min(leaving_rings, default=None),
        is_bridgehead=alpha in caged,
        needs_activation=row.needs_activation,
        stereo=_site_stereo(marks.get(alpha)),
        equivalent=(alpha,),
        multiplicity=1,
    )


def _site_stereo(drawn: bool | None) -> SiteStereo:
    if drawn is None:
        return SiteStereo.NONE
    return SiteStereo.SPECIFIED if drawn else SiteStereo.UNSPECIFIED


def _hybridisation(atom: Chem.Atom) -> Hybridisation:
    """Return the hybridisation by its multiple bonds, so that a carbon next to a lone pair is not miscounted."""
    orders = [bond.GetBondTypeAsDouble() for bond in atom.GetBonds()]
    if 3.0 in orders or orders.count(2.0) == 2:
        return Hybridisation.SP
    return Hybridisation.SP2 if any(order > 1.0 for order in orders) else Hybridisation.SP3


def _hydrogens(atom: Chem.Atom) -> int:
    labelled = [n for n in atom.GetNeighbors() if n.GetAtomicNum() == 1]
    return atom.GetTotalNumHs() + len(labelled)


def _beta_carbons(
    mol: Chem.Mol,
    alpha: AtomId,
    leaving: AtomId | None,
    rings: list[tuple[int, ...]],
    caged: frozenset[AtomId],
) -> tuple[BetaCarbon, ...]:
    """Return the carbons next to alpha; one that is itself bonded to the leaving atom is not a beta carbon."""
    found = []
    for bond in mol.GetAtomWithIdx(alpha).GetBonds():
        at: int = bond.GetOtherAtomIdx(alpha)
        beta = mol.GetAtomWithIdx(at)
        if beta.GetAtomicNum() != 6 or at == leaving:
            continue
        if leaving is not None and mol.GetBondBetweenAtoms(at, leaving) is not None:
            continue
        labelled = [n.GetIdx() for n in beta.GetNeighbors() if n.GetAtomicNum() == 1]
        found.append(
            BetaCarbon(
                atom=at,
                hydrogens=_hydrogens(beta),
                hydrogen_isotopes=tuple(sorted(labelled)),
                branches=beta.GetDegree() - 1 - len(labelled),
                hybridisation=_hybridisation(beta).value,
                bond_order=bond.GetBondTypeAsDouble(),
                in_common_ring=any(at in ring and leaving not in ring for ring in rings),
                is_bridgehead=at in caged,
            )
        )
    return tuple(sorted(found, key=lambda b: b.atom))


def _merged(group: list[ReactiveSite]) -> ReactiveSite:
    first = group[0]
    if len(group) == 1:
        return first
    alphas = tuple(sorted({site.alpha_carbon for site in group}))
    values = {name: getattr(first, name) for name in ReactiveSite.__slots__}
    return ReactiveSite(**(values | {"equivalent": alphas, "multiplicity": len(group)}))


def _addition_sites(structure: Structure) -> list[ReactiveSite]:
    mol = structure.mol
    caged = structure.bridgeheads
    ranks = structure.symmetry_classes
    groups: dict[tuple[object, ...], list[ReactiveSite]] = {}
    for row in load_class_patterns():
        if row.kind is not ClassKind.ADDITION or row.query is None:
            continue
        for match in row.query.matches(structure):
            for alpha, partner in ((match[0], match[1]), (match[1], match[0])):
                atom = mol.GetAtomWithIdx(alpha)
                words = {row.name} | ({"bridgehead"} if alpha in caged else set())
                rings = [ring for ring in mol.GetRingInfo().AtomRings() if alpha in ring]
                site = ReactiveSite(
                    leaving_group=NO_LEAVING_GROUP,
                    alpha_carbon=alpha,
                    leaving_atom=None,
                    partner=partner,
                    hybridisation=_hybridisation(atom),
                    degree=None,
                    classes=frozenset(words),
                    carbon_neighbours=sum(n.GetAtomicNum() == 6 for n in atom.GetNeighbors()),
                    alpha_hydrogens=_hydrogens(atom),
                    beta=_beta_carbons(mol, alpha, None, rings, caged),
                    ring_sizes=tuple(sorted(len(ring) for ring in rings)),
                    leaving_ring_size=None,
                    is_bridgehead=alpha in caged,
                    needs_activation=False,
                    stereo=SiteStereo.NONE,
                    equivalent=(alpha,),
                    multiplicity=1,
                )
                known = groups.setdefault((row.name, ranks[alpha], ranks[partner]), [])
                if all((s.alpha_carbon, s.partner) != (alpha, partner) for s in known):
                    known.append(site)
    merged = [_merged(sorted(group, key=lambda s: s.alpha_carbon)) for group in groups.values()]
    return sorted(merged, key=lambda s: ("alkyne" in s.classes, s.alpha_carbon, s.partner or 0))


@lru_cache(maxsize=512)
def _attacking_atoms_of(species: Structure) -> tuple[Nucleophile, ...]:
    mol = species.mol
    ranks = species.symmetry_classes
    taken: set[object] = set()
    found = []
    for row in load_attack_patterns():
        for match in sorted(row.query.matches(species)):
            spots = {number: match[place] for number, place in row.query.places.items()}
            hydride = row.electrons is Electrons.HYDRIDE_TRANSFER
            atom = spots[4] if hydride else spots[1]
            symbol = "H" if hydride else mol.GetAtomWithIdx(atom).GetSymbol()
            # Symmetry makes two nitrogens of a diamine alike, resonance those of an imidazolide.
            marks: set[object] = {(ranks[atom], symbol)}
            if row.electrons in {Electrons.CHARGE_MOVES, Electrons.PROTON_MOVES}:
                form = moved_azole(species, atom, spots.get(3), spots.get(4))
                marks.add(Chem.MolToSmiles(form))
            elif row.kind in {"azole", "azolide"}:
                marks.add(species.smiles)
            if marks & taken:
                continue
            taken |= marks
            found.append(
                Nucleophile(
                    species=species,
                    kind=row.kind,
                    atom=atom,
                    symbol=symbol,
                    charge=species.charge,
                    preference=row.preference,
                    electrons=row.electrons,
                    via=(spots.get(2), spots.get(3), spots.get(4)),
                    reach=row.reach,
                    note=row.note,
                )
            )
    return tuple(_rebased(found, "azole") + _rebased(found, "azolide") + [n for n in found if not _is_azole(n)])


def _is_azole(nucleophile: Nucleophile) -> bool:
    return nucleophile.kind in {"azole", "azolide"}


def _rebased(found: list[Nucleophile], kind: str) -> list[Nucleophile]:
    """Return those of an azole kind with the best nitrogen the ring has as the usual one.

    The table ranks nitrogens by their neighbours, and not every ring has one of the best sort.
    """
    own = [n for n in found if n.kind == kind]
    best = min((n.preference for n in own), default=1)
    return [replace(n, preference=n.preference - best + 1) for n in own]


def moved_azole(species: Structure, to: AtomId, charged: AtomId | None, bearer: AtomId | None) -> Chem.Mol:
    """Return the azole or azolide drawn with its charge, or its N-H hydrogen, on another nitrogen.

    For this room only. charged: the nitrogen that gives up the charge; bearer: the one that gives up hydrogen.
    """
    form = Chem.RWMol(species.mol)
    target = form.GetAtomWithIdx(to)
    if charged is not None:
        target.SetFormalCharge(-1)
        form.GetAtomWithIdx(charged).SetFormalCharge(0)
    if bearer is not None:
        target.SetNumExplicitHs(1)
        form.GetAtomWithIdx(bearer).SetNumExplicitHs(0)
    form.UpdatePropertyCache(strict=False)
    return form
