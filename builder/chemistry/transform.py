"""Transformations: what becomes of a structure, as edits that carry stereochemistry and keep the balance.

Every function is pure: structures in, structures out, canonical, sanitised, without duplicates. Products keep
undrawn stereochemistry undrawn; a racemate is treated as the structure drawn. Atoms of inputs and products are
linked by AtomId. `UnbalancedTransformation` is raised where atoms or charge would be lost: our fault.
"""

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from enum import StrEnum
from functools import lru_cache

from rdkit import Chem

from builder.chemistry.ledger import GAP, HYDROGEN, Alkene, Centre, Piece, UnbalancedTransformation, Workbench
from builder.chemistry.patterns import Electrons, load_activations
from builder.chemistry.perception import Nucleophile, ReactiveSite, moved_azole
from builder.chemistry.structure import SMALLEST_TRANS_RING, AtomId, Structure, bonds_of, parse_smiles

__all__ = [
    "Cation",
    "Edit",
    "StereoEffect",
    "UnbalancedTransformation",
    "activate_hydroxyl",
    "activation_groups",
    "add_hx",
    "add_x2",
    "allylic_forms",
    "capture",
    "carbocations",
    "course_between",
    "cyclise",
    "derivatise_hydroxyl",
    "diazotise",
    "eliminate",
    "fragment",
    "ionise",
    "ionise_with_shift",
    "keto_form",
    "lose_proton",
    "migrating_groups",
    "protonate",
    "shift_12",
    "substitute",
    "transpose_allylic",
    "violates_bredt",
]

REMEMBERED = 512
"""Edits kept of each sort: the search for products and the engine ask for the same ones."""


class StereoEffect(StrEnum):
    """What an edit does to configuration; the words are those of `course` in a record."""

    INVERSION = "inversion"
    RETENTION = "retention"
    RACEMISATION = "racemisation"
    ANTI = "anti"
    SYN = "syn"
    NOT_APPLICABLE = "not applicable"
    NOT_DETERMINED = "not determined"


@dataclass(frozen=True, slots=True, kw_only=True)
class Edit:
    """One transformation carried out.

    product: the species that holds the reacting carbon.
    others: every other species formed, the leaving group first of all; sorted.
    protons_released: protons given to the surroundings; negative where protons were taken up.
    effect: inversion or retention at the carbon, anti or syn for an elimination or addition.
    geometry: E or Z of a double bond the edit has made, where it has one.
    from_substrate, from_nucleophile: atom of the input -> atom of `product`, for atoms that are in it; never changed,
    for edits are remembered.
    """

    product: Structure
    others: tuple[Structure, ...]
    protons_released: int
    effect: StereoEffect
    geometry: str | None
    from_substrate: dict[AtomId, AtomId]
    from_nucleophile: dict[AtomId, AtomId]


@dataclass(frozen=True, slots=True, kw_only=True)
class Cation:
    """A carbocation, and how it came about.

    centre: the electron-deficient carbon.
    others, protons_released: species and protons set free so far.
    memory: the face the departed group left, as a stereocentre with a gap; None if the centre never had one.
    from_substrate: atom of the substrate -> atom of `structure`.
    """

    structure: Structure
    centre: AtomId
    others: tuple[Structure, ...]
    protons_released: int
    memory: Centre | None
    from_substrate: dict[AtomId, AtomId]


@lru_cache(maxsize=REMEMBERED)
def substitute(substrate: Structure, site: ReactiveSite, nucleophile: Nucleophile, *, inversion: bool = True) -> Edit:
    """Return the substitution of the leaving group of a site by the nucleophile.

    A group that stays bonded to the product (epoxide, aziridine, oxetane) is given a proton where it would be
    alkoxide or amide; a sulfate or carboxylate stays charged. inversion: attack from behind; else retention.
    """
    bench = Workbench(substrate, _drawn_for_attack(nucleophile))
    alpha, leaving = site.alpha_carbon, _leaving_atom(site)
    _depart(bench, alpha, leaving)
    _attack(bench, alpha, nucleophile, 1, inverted=inversion)
    effect = StereoEffect.NOT_APPLICABLE
    if alpha in bench.centres:
        effect = StereoEffect.INVERSION if inversion else StereoEffect.RETENTION
    return _edit(bench, alpha, effect)


def cyclise(substrate: Structure, site: ReactiveSite, group: Nucleophile, *, inversion: bool = True) -> Edit:
    """Return the ring a group of the same molecule closes by displacing the leaving group of a site.

    group: one of `neighbouring_groups(substrate)`; onium, acyloxonium and phenonium ions come out as ions.
    Raises ValueError if the group belongs to another structure.
    """
    if group.species != substrate:
        raise ValueError(f"the neighbouring group belongs to {group.species}, not to {substrate}")
    bench = Workbench(_drawn_for_attack(group))
    alpha = site.alpha_carbon
    _depart(bench, alpha, _leaving_atom(site))
    _attack(bench, alpha, group, 0, inverted=inversion)
    effect = StereoEffect.NOT_APPLICABLE
    if alpha in bench.centres:
        effect = StereoEffect.INVERSION if inversion else StereoEffect.RETENTION
    return _edit(bench, alpha, effect)


@lru_cache(maxsize=REMEMBERED)
def eliminate(
    substrate: Structure, site: ReactiveSite, beta_carbon: AtomId, *, effect: StereoEffect = StereoEffect.ANTI
) -> tuple[Edit, ...]:
    """Return the alkenes (from a vinylic site: alkyne or allene) of loss of H and leaving group, by SMILES.

    effect: ANTI or SYN decides E or Z wherever both carbons have a drawn configuration, and in small rings
    whether a hydrogen is there to take; NOT_DETERMINED gives every geometry (E1cB, E1). Where the beta carbon
    has two hydrogens, or a configuration is undrawn, E and Z come out both. An enol is written as its ketone
    or aldehyde. Empty if no hydrogen stands right,
    if there is none, or if the double bond would break Bredt's rule.
    """
    probe = Workbench(substrate)
    labelled = [n for n in probe.neighbours(beta_carbon) if _is_hydrogen(probe, n)]
    choices = ([HYDROGEN] if probe.hydrogens(beta_carbon) else []) + labelled
    found = [e for h in choices for e in _eliminate_one(substrate, site, beta_carbon, h, effect)]
    return _distinct(map(_as_ketone, found))


def _eliminate_one(
    substrate: Structure, site: ReactiveSite, beta: AtomId, hydrogen: int, effect: StereoEffect
) -> Iterable[Edit]:
    alpha, leaving = site.alpha_carbon, _leaving_atom(site)
    bench = Workbench(substrate)
    order = bench.order(alpha, beta)
    if order not in {1, 2} or substrate.atoms[alpha].aromatic:
        return
    ends = (bench.centres.get(alpha), bench.centres.get(beta))
    ring = _common_small_ring(bench, alpha, beta, leaving)
    references = ring or (_reference(bench, alpha, beta, leaving), _reference(bench, beta, alpha, hydrogen))
    cis = _cis_after_loss(ends, (alpha, beta), (leaving, hydrogen), references, effect)
    if ring and cis is False:
        return
    _depart(bench, alpha, leaving)
    if hydrogen == HYDROGEN:
        bench.release_proton(beta)
    else:
        bench.cut(beta, hydrogen)
        bench.add_charge(hydrogen, 1)
    bench.set_order(alpha, beta, order + 1)
    what = effect if order == 1 else StereoEffect.NOT_DETERMINED
    yield from _with_geometries(bench, (alpha, beta), None if ring else references, cis, what)


def ionise(substrate: Structure, site: ReactiveSite) -> Cation:
    """Return the carbocation left when the leaving group of a site departs with its pair."""
    bench = Workbench(substrate)
    alpha = site.alpha_carbon
    _depart(bench, alpha, _leaving_atom(site))
    bench.add_charge(alpha, 1)
    return _cation(bench, alpha, None)


def ionise_with_shift(substrate: Structure, site: ReactiveSite, origin: AtomId, migrating: AtomId | None) -> Cation:
    """Return the carbocation left when the leaving group departs as a neighbour moves in behind it.

    origin: the carbon that loses the migrating group and becomes the centre.
    migrating: the atom that moves; None for an unlabelled hydrogen. The alpha carbon is inverted.
    """
    bench = Workbench(substrate)
    alpha = site.alpha_carbon
    _depart(bench, alpha, _leaving_atom(site))
    _migrate(bench, origin, alpha, migrating, inverted=True)
    bench.add_charge(origin, 1)
    return _cation(bench, origin, None)


def migrating_groups(cation: Cation) -> tuple[tuple[AtomId, AtomId | None], ...]:
    """Return every (origin, migrating atom) of a 1,2-shift to the centre; None stands for an unlabelled hydrogen.

    Origins are saturated carbons next to the centre; a group that already is the centre's neighbour stays.
    """
    atoms = cation.structure.atoms
    found: list[tuple[AtomId, AtomId | None]] = []
    for origin, order in atoms[cation.centre].neighbours:
        if atoms[origin].symbol != "C" or order != 1.0 or any(o > 1.0 for _, o in atoms[origin].neighbours):
            continue
        if atoms[origin].hydrogens:
            found.append((origin, None))
        near = {n for n, _ in atoms[cation.centre].neighbours}
        found += [
            (origin, n)
            for n, _ in atoms[origin].neighbours
            if n != cation.centre and n not in near and atoms[n].symbol in {"C", "H", "Si"}
        ]
    return tuple(found)


def shift_12(cation: Cation, origin: AtomId, migrating: AtomId | None = None) -> Cation:
    """Return the cation after a group of `origin`, a neighbour of the centre, has moved to the centre.

    migrating: the atom that moves, with its configuration; None for an unlabelled hydrogen. Ring expansion and
    contraction are shifts of ring bonds. The old centre becomes a stereocentre without drawn configuration; the
    new one remembers the face the group left.
    """
    bench = Workbench(cation.structure)
    bench.add_charge(cation.centre, -1)
    _migrate(bench, origin, cation.centre, migrating, inverted=False)
    bench.add_charge(origin, 1)
    return _cation(bench, origin, cation)


def allylic_forms(cation: Cation) -> tuple[Cation, ...]:
    """Return the cations drawn with the charge at the far end of a double bond next to the centre, by SMILES.

    Both geometries of the new double bond come out where it can have two.
    """
    found: dict[str, Cation] = {}
    atoms = cation.structure.atoms
    for near, order in atoms[cation.centre].neighbours:
        if order != 1.0 or atoms[near].aromatic:
            continue
        for far, far_order in atoms[near].neighbours:
            if far_order != 2.0 or atoms[far].symbol != "C":
                continue
            for cis in (None, True, False):
                bench = Workbench(cation.structure)
                bench.set_order(near, far, 1)
                bench.set_order(cation.centre, near, 2)
                bench.add_charge(cation.centre, -1)
                bench.add_charge(far, 1)
                if cis is not None and not _set_geometry(bench, (cation.centre, near), cis):
                    continue
                form = _cation(bench, far, cation)
                found.setdefault(form.structure.smiles, form)
    drawn = {form.structure.flat_smiles for form in found.values() if _has_drawn_alkene(form.structure)}
    kept = [f for f in found.values() if f.structure.flat_smiles not in drawn or _has_drawn_alkene(f.structure)]
    return tuple(sorted(kept, key=lambda f: f.structure.smiles))


def fragment(cation: Cation, near: AtomId, far: AtomId, *, cis: bool | None = None) -> Cation:
    """Return the cation after the bond between a neighbour of the centre and the next atom has broken.

    centre(+)-near-far becomes centre=near and far(+): cyclopropyl to allyl, cyclopropylmethyl to homoallyl.
    The new double bond is drawn cis or trans where it is asked for and can be either, else without geometry.
    Raises ValueError if the atoms do not lie in that order.
    """
    bench = Workbench(cation.structure)
    if bench.order(cation.centre, near) != 1 or bench.order(near, far) != 1:
        raise ValueError("only a chain of two single bonds from the centre can fragment")
    bench.cut(near, far)
    bench.set_order(cation.centre, near, 2)
    bench.add_charge(cation.centre, -1)
    bench.add_charge(far, 1)
    if cis is not None:
        _set_geometry(bench, (cation.centre, near), cis)
    return _cation(bench, far, cation)


def capture(cation: Cation, nucleophile: Nucleophile) -> tuple[Edit, ...]:
    """Return the products of capture of a cation by a nucleophile, both faces where they differ.

    With a memory of the departed group the two faces are INVERSION and RETENTION. Without one, both are drawn
    only where another drawn stereocentre makes them diastereomers; else the new centre stays undrawn.
    """
    faces: tuple[bool | None, ...] = (True, False)
    around = [n for n, _ in cation.structure.atoms[cation.centre].neighbours]
    hydrogens = cation.structure.atoms[cation.centre].hydrogens
    drawn_elsewhere = cation.structure.stereocentres.specified > 0
    if cation.memory is None and not (drawn_elsewhere and len(around) + min(hydrogens, 1) == 3):
        faces = (None,)
    found = []
    for inverted in faces:
        bench = Workbench(cation.structure, _drawn_for_attack(nucleophile))
        bench.add_charge(cation.centre, -1)
        effect = StereoEffect.NOT_APPLICABLE
        if inverted is not None:
            blank = Centre((GAP, *around, *([HYDROGEN] if hydrogens else [])), 1)
            bench.centres[cation.centre] = cation.memory or blank
            effect = StereoEffect.NOT_DETERMINED
        if cation.memory is not None:
            effect = StereoEffect.INVERSION if inverted else StereoEffect.RETENTION
        _attack(bench, cation.centre, nucleophile, 1, inverted=bool(inverted))
        found.append(_after_cation(_edit(bench, cation.centre, effect), cation))
    if len(found) == 2 and found[0].product == found[1].product:
        found = [replace(found[0], effect=StereoEffect.NOT_APPLICABLE)]
    return tuple(found)


def lose_proton(cation: Cation, neighbour: AtomId) -> tuple[Edit, ...]:
    """Return the alkenes (from an O-H neighbour: the carbonyl compound) of loss of a proton, E and Z, by SMILES.

    Empty if the neighbour has no hydrogen, or if the double bond would break Bredt's rule.
    """
    found = []
    probe = Workbench(cation.structure)
    labelled = [n for n in probe.neighbours(neighbour) if _is_hydrogen(probe, n)]
    for hydrogen in ([HYDROGEN] if probe.hydrogens(neighbour) else []) + labelled:
        bench = Workbench(cation.structure)
        centre = cation.centre
        order = bench.order(centre, neighbour)
        if order not in {1, 2}:
            continue
        ring = _common_small_ring(bench, centre, neighbour, None)
        references = (_reference(bench, centre, neighbour, None), _reference(bench, neighbour, centre, hydrogen))
        bench.add_charge(centre, -1)
        if hydrogen == HYDROGEN:
            bench.release_proton(neighbour)
        else:
            bench.cut(neighbour, hydrogen)
            bench.add_charge(hydrogen, 1)
        bench.set_order(centre, neighbour, order + 1)
        pair = (centre, neighbour)
        effect = StereoEffect.NOT_APPLICABLE
        found += list(_with_geometries(bench, pair, None if ring else references, None, effect))
    return tuple(_after_cation(edit, cation) for edit in _distinct(map(_as_ketone, found)))


def transpose_allylic(substrate: Structure, site: ReactiveSite, nucleophile: Nucleophile) -> tuple[Edit, ...]:
    """Return the substitutions with allylic transposition: attack at the far end, the double bond moves, by SMILES.

    The new stereocentre stays undrawn; E and Z come out both. A propargylic site gives the allene. Empty if
    no multiple bond stands next to the site.
    """
    alpha, leaving = site.alpha_carbon, _leaving_atom(site)
    atoms = substrate.atoms
    found = []
    for near, order in atoms[alpha].neighbours:
        if order != 1.0 or atoms[near].aromatic or near == leaving:
            continue
        for far, far_order in atoms[near].neighbours:
            if far_order not in {2.0, 3.0} or atoms[far].symbol != "C" or atoms[near].symbol != "C":
                continue
            bench = Workbench(substrate, _drawn_for_attack(nucleophile))
            ring = _common_small_ring(bench, alpha, near, leaving)
            references = (_reference(bench, alpha, near, leaving), _reference(bench, near, alpha, far))
            if references[1] is None:
                references = (references[0], far)
            _depart(bench, alpha, leaving)
            bench.set_order(near, far, int(far_order) - 1)
            bench.set_order(alpha, near, 2)
            _attack(bench, far, nucleophile, 1, inverted=False)
            pair = (alpha, near)
            effect = StereoEffect.NOT_DETERMINED
            shown = None if ring or far_order == 3.0 else references
            found += list(_with_geometries(bench, pair, shown, None, effect))
    return _distinct(found)


def protonate(substrate: Structure, site: ReactiveSite) -> Cation:
    """Return the cation of proton uptake by a multiple bond: H to `site.partner`, charge on the alpha carbon.

    Raises ValueError unless the site is the end of a multiple bond.
    """
    alpha, partner = site.alpha_carbon, _partner(site)
    bench = Workbench(substrate)
    bench.set_order(alpha, partner, bench.order(alpha, partner) - 1)
    bench.accept_proton(partner)
    bench.add_charge(alpha, 1)
    return _cation(bench, alpha, None)


def add_hx(substrate: Structure, site: ReactiveSite, nucleophile: Nucleophile) -> tuple[Edit, ...]:
    """Return the addition of H to `site.partner` and of the nucleophile to the alpha carbon, by SMILES.

    Choosing the other end's site gives the other regioisomer. Alkynes give E and Z alkenes, with water the
    ketone. New stereocentres stay undrawn. Raises ValueError unless the site is the end of a multiple bond.
    """
    alpha, partner = site.alpha_carbon, _partner(site)
    bench = Workbench(substrate, _drawn_for_attack(nucleophile))
    order = bench.order(alpha, partner)
    bench.set_order(alpha, partner, order - 1)
    bench.accept_proton(partner)
    _attack(bench, alpha, nucleophile, 1, inverted=False)
    if order == 2:
        return (_edit(bench, alpha, StereoEffect.NOT_DETERMINED),)
    references = (bench.place(nucleophile.atom, 1), _reference(bench, partner, alpha, None))
    edits = _with_geometries(bench, (alpha, partner), references, None, StereoEffect.NOT_DETERMINED)
    return _distinct(map(_as_ketone, edits))


def add_x2(substrate: Structure, site: ReactiveSite, halogen: Structure) -> tuple[Edit, ...]:
    """Return the anti addition of a halogen (BrBr, ClCl, II) to a multiple bond, by SMILES.

    An alkene of known geometry, or in a small ring, gives the product with its relative configuration: one
    enantiomer stands for the racemate, two diastereomers come out where the substrate has stereocentres. An
    alkyne gives the trans dihalide; adding again gives the tetrahalide. Raises ValueError for anything but a
    halogen molecule, or unless the site is the end of a multiple bond.
    """
    alpha, partner = site.alpha_carbon, _partner(site)
    if len(halogen.atoms) != 2 or {a.symbol for a in halogen.atoms} - {"F", "Cl", "Br", "I"}:
        raise ValueError(f"{halogen} is no halogen molecule")
    known = Workbench(substrate).alkenes.get(frozenset((alpha, partner)))
    signs = (1, -1) if substrate.stereocentres.specified else (1,)
    found = []
    for sign in signs:
        bench = Workbench(substrate, halogen)
        order = bench.order(alpha, partner)
        ring = _common_small_ring(bench, alpha, partner, None)
        first, second = bench.place(0, 1), bench.place(1, 1)
        bench.cut(first, second)
        bench.set_order(alpha, partner, order - 1)
        if order == 2:
            _prepare_faces(bench, (alpha, partner), (ring, known), sign)
        bench.join(alpha, first)
        bench.join(partner, second)
        if order == 3:
            bench.set_alkene(Alkene((alpha, partner), (first, second), cis=False))
        found.append(_edit(bench, alpha, StereoEffect.ANTI))
    return _distinct(found)


def _prepare_faces(
    bench: Workbench,
    ends: tuple[int, int],
    known: tuple[tuple[int, int] | None, Alkene | None],
    sign: int,
) -> None:
    """Enter both ends of a former double bond as stereocentres with gaps on opposite faces.

    Seen from the gap, the other end and then the references run the same way round at both ends exactly if the
    references are cis: the reverse of an anti elimination.
    """
    ring, alkene = known
    if ring is not None:
        references, cis = ring, True
    elif alkene is not None:
        references = alkene.references if alkene.ends == ends else (alkene.references[1], alkene.references[0])
        cis = alkene.cis
    else:
        return
    for place, (end, other) in enumerate((ends, ends[::-1])):
        rest = [n for n in bench.neighbours(end) if n not in {other, references[place]}]
        if not rest and bench.hydrogens(end) == 1:
            rest = [HYDROGEN]
        if len(rest) == 1:
            way = sign if place == 0 or cis else -sign
            bench.centres[end] = Centre((GAP, other, references[place], rest[0]), way)


def activation_groups() -> tuple[str, ...]:
    """Return the leaving groups that `activate_hydroxyl` can make, `water` last."""
    return (*load_activations(), "water")


def activate_hydroxyl(substrate: Structure, site: ReactiveSite, group: str) -> Edit:
    """Return the alcohol with its hydroxyl group made into a leaving group; the carbon keeps its configuration.

    group: one of `activation_groups()`. Raises ValueError for any other, or unless the site bears a hydroxyl.
    """
    if site.leaving_group != "hydroxyl":
        raise ValueError(f"a {site.leaving_group} site bears no hydroxyl group")
    if group == "water":
        oxygen = _leaving_atom(site)
        bench = Workbench(substrate)
        bench.accept_proton(oxygen)
        bench.add_charge(oxygen, 1)
        return _edit(bench, site.alpha_carbon, _kept(substrate, site))
    row = load_activations().get(group)
    if row is None:
        raise ValueError(f"{group} is made from no hydroxyl group here; known: {', '.join(activation_groups())}")
    reagent = parse_smiles(row.reagent)
    match = reagent.mol.GetSubstructMatch(row.query.mol)
    return _put_on_oxygen(substrate, site, reagent, match[row.query.places[1]], match[row.query.places[2]])


def derivatise_hydroxyl(substrate: Structure, site: ReactiveSite, reagent: Structure) -> tuple[Edit, ...]:
    """Return what a reagent makes of an alcohol: its sulfonyl, phosphorus, silyl or acyl piece on the oxygen.

    The bonds that break are those of the table of activations, whatever else the reagent bears; by SMILES. Empty if
    it has none. Raises ValueError unless the site bears a hydroxyl.
    """
    if site.leaving_group != "hydroxyl":
        raise ValueError(f"a {site.leaving_group} site bears no hydroxyl group")
    breaking = {
        (match[row.query.places[1]], match[row.query.places[2]])
        for row in load_activations().values()
        for match in reagent.mol.GetSubstructMatches(row.query.mol)
    }
    return _distinct(_put_on_oxygen(substrate, site, reagent, kept, lost) for kept, lost in sorted(breaking))


def _put_on_oxygen(substrate: Structure, site: ReactiveSite, reagent: Structure, kept: AtomId, lost: AtomId) -> Edit:
    oxygen = _leaving_atom(site)
    bench = Workbench(substrate, reagent)
    piece, departing = bench.place(kept, 1), bench.place(lost, 1)
    bench.cut(piece, departing)
    bench.add_charge(departing, -1)
    bench.release_proton(oxygen)
    bench.join(oxygen, piece)
    return _edit(bench, site.alpha_carbon, _kept(substrate, site))


def _kept(substrate: Structure, site: ReactiveSite) -> StereoEffect:
    has_centre = site.alpha_carbon in Workbench(substrate).centres
    return StereoEffect.RETENTION if has_centre else StereoEffect.NOT_APPLICABLE


def diazotise(substrate: Structure, site: ReactiveSite) -> Edit:
    """Return the diazonium ion a primary amine gives with nitrous acid and a proton, and the two waters.

    Raises ValueError unless the site bears an NH2 group.
    """
    nitrogen = _leaving_atom(site)
    if site.leaving_group != "amine" or substrate.atoms[nitrogen].hydrogens != 2:
        raise ValueError(f"a {site.leaving_group} site bears no NH2 group")
    acid = parse_smiles("O=NO")
    bench = Workbench(substrate, acid)
    central = bench.place(next(a.id for a in acid.atoms if a.symbol == "N"), 1)
    for oxygen in bench.neighbours(central):
        bench.cut(central, oxygen)
        while bench.hydrogens(oxygen) < 2:
            if bench.hydrogens(nitrogen):
                bench.take_hydrogen(nitrogen)
                bench.give_hydrogen(oxygen)
            else:
                bench.accept_proton(oxygen)
    bench.join(nitrogen, central)
    bench.set_order(nitrogen, central, 3)
    bench.add_charge(nitrogen, 1)
    effect = StereoEffect.NOT_APPLICABLE
    if site.alpha_carbon in bench.centres:
        effect = StereoEffect.RETENTION
    return _edit(bench, site.alpha_carbon, effect)


def keto_form(structure: Structure) -> Structure:
    """Return the carbonyl form of a single species that is an enol; any other as it is. Phenols stay."""
    return structure if len(structure.fragments) > 1 else _ketonised(structure)[0]


def _ketonised(structure: Structure) -> tuple[Structure, dict[AtomId, AtomId]]:
    """Return the carbonyl form and where each atom of the enol went."""
    places = {at: at for at in range(len(structure.atoms))}
    for _ in range(len(structure.atoms)):
        enol = _find_enol(structure)
        if enol is None:
            break
        oxygen, near, far = enol
        bench = Workbench(structure)
        bench.take_hydrogen(oxygen)
        bench.set_order(near, far, 1)
        bench.set_order(oxygen, near, 2)
        bench.give_hydrogen(far)
        piece = next(p for p in bench.settle() if oxygen in p.atoms)
        structure = piece.structure
        places = {old: piece.atoms[at] for old, at in places.items() if at in piece.atoms}
    return structure, places


def _find_enol(structure: Structure) -> tuple[AtomId, AtomId, AtomId] | None:
    atoms = structure.atoms
    for oxygen in atoms:
        if oxygen.symbol != "O" or oxygen.hydrogens != 1 or oxygen.charge:
            continue
        for near, _ in oxygen.neighbours:
            for far, order in atoms[near].neighbours:
                if order == 2.0 and atoms[near].symbol == atoms[far].symbol == "C":
                    return oxygen.id, near, far
    return None


def carbocations(structure: Structure) -> tuple[Cation, ...]:
    """Return the structure as a carbocation, once for each carbon that bears a positive charge."""
    same = {at: at for at in range(len(structure.atoms))}
    return tuple(
        Cation(
            structure=structure,
            centre=atom.id,
            others=(),
            protons_released=0,
            memory=None,
            from_substrate=same,
        )
        for atom in structure.atoms
        if atom.symbol == "C" and atom.charge == 1
    )


def course_between(
    substrate: Structure, product: Structure, site: ReactiveSite, nucleophile: Nucleophile
) -> StereoEffect | None:
    """Return what happened at the carbon, by comparing a product with both that the edit can give.

    Canonical structures are compared, never CIP letters. NOT_DETERMINED: the product is drawn without the
    configuration. NOT_APPLICABLE: the carbon has none to lose. None: this substitution cannot give the product.
    """
    found = product.without_counter_ions
    inverted = substitute(substrate, site, nucleophile, inversion=True)
    retained = substitute(substrate, site, nucleophile, inversion=False)
    if inverted.product == retained.product:
        return StereoEffect.NOT_APPLICABLE if found.flat == inverted.product.flat else None
    if found == inverted.product:
        return StereoEffect.INVERSION
    if found == retained.product:
        return StereoEffect.RETENTION
    return StereoEffect.NOT_DETERMINED if found.flat == inverted.product.flat else None


def violates_bredt(structure: Structure, one: AtomId, other: AtomId) -> bool:
    """Answer whether a multiple bond cannot be held by its rings.

    At a bridgehead, a double bond needs a ring of eight members, as a trans-cycloalkene does; a triple bond or
    an allene needs one anywhere. Rings are the smallest ones, so some isolable bicyclic alkenes with
    eight-membered outer rings (bicyclo[3.3.1]non-1-ene) are refused too.
    """
    mol = structure.mol
    rings = [len(ring) for ring in mol.GetRingInfo().AtomRings() if one in ring and other in ring]
    if not rings or max(rings) >= SMALLEST_TRANS_RING:
        return False
    orders = [sorted(o for _, o in structure.atoms[end].neighbours) for end in (one, other)]
    linear = any(o[-1] == 3.0 or o[-2:] == [2.0, 2.0] for o in orders)
    return linear or bool({one, other} & structure.bridgeheads)


def _leaving_atom(site: ReactiveSite) -> AtomId:
    if site.leaving_atom is None:
        raise ValueError("the site is the end of a multiple bond: nothing leaves")
    return site.leaving_atom


def _partner(site: ReactiveSite) -> AtomId:
    if site.partner is None:
        raise ValueError("the site is no end of a multiple bond")
    return site.partner


def _is_hydrogen(bench: Workbench, at: int) -> bool:
    return bench.atom(at).GetAtomicNum() == 1


def _depart(bench: Workbench, alpha: int, leaving: int) -> None:
    """Let the leaving group go with the bonding pair; one still tied to the carbon may take up a proton."""
    bench.cut(alpha, leaving)
    bench.add_charge(leaving, -1)
    if bench.charge(leaving) == -1 and bench.in_one_piece(alpha, leaving) and not _is_stable_anion(bench, leaving):
        bench.accept_proton(leaving)
        bench.add_charge(leaving, 1)


def _is_stable_anion(bench: Workbench, at: int) -> bool:
    """Answer whether a tethered anion stays one: oxygen on an acyl, sulfonyl or phosphoryl group, halide, carbon."""
    symbol = bench.atom(at).GetSymbol()
    if symbol not in {"O", "N", "S"}:
        return True
    if symbol == "N":
        return False
    return any(
        bench.order(n, other) == 2 and bench.atom(other).GetSymbol() in {"O", "N"}
        for n in bench.neighbours(at)
        for other in bench.neighbours(n)
    )


def _drawn_for_attack(nucleophile: Nucleophile) -> Structure | tuple[Structure, Chem.Mol]:
    """Return the nucleophile as the workbench takes it, in the resonance form or tautomer that attacks."""
    if nucleophile.electrons not in {Electrons.CHARGE_MOVES, Electrons.PROTON_MOVES}:
        return nucleophile.species
    _, charged, bearer = nucleophile.via
    form = moved_azole(nucleophile.species, nucleophile.atom, charged, bearer)
    return nucleophile.species, form


def _attack(bench: Workbench, carbon: int, nucleophile: Nucleophile, which: int, *, inverted: bool) -> None:
    """Bond the attacking atom of the n-th structure on the bench to a carbon that has lost a pair."""
    second, third, fourth = (None if v is None else bench.place(v, which) for v in nucleophile.via)
    atom = bench.place(nucleophile.atom, which)
    give = _GIVERS[nucleophile.electrons]
    give(bench, atom, second, third, fourth)
    if nucleophile.electrons is Electrons.HYDRIDE_TRANSFER:
        bench.give_hydrogen(carbon, inverted=inverted)
    else:
        bench.join(carbon, atom, inverted=inverted)


_Giver = Callable[[Workbench, int, int | None, int | None, int | None], None]


def _need(at: int | None) -> int:
    if at is None:
        raise ValueError("attacking_atoms.tsv: a marked atom is missing")
    return at


def _lone_pair(bench: Workbench, atom: int, *_: int | None) -> None:
    bench.add_charge(atom, 1)


def _proton_lost(bench: Workbench, atom: int, *_: int | None) -> None:
    bench.release_proton(atom)


def _shift(bench: Workbench, atom: int, second: int | None, third: int | None, _: int | None) -> None:
    middle, end = _need(second), _need(third)
    bench.set_order(atom, middle, bench.order(atom, middle) - 1)
    bench.set_order(middle, end, bench.order(middle, end) + 1)
    bench.add_charge(end, 1)


def _pi_bond(bench: Workbench, atom: int, second: int | None, *_: int | None) -> None:
    partner = _need(second)
    if bench.order(atom, partner) < 2:
        # The Kekulé form on the bench has this double bond of the ring on the other side.
        partner = next(n for n in bench.neighbours(atom) if bench.order(atom, n) == 2)
    bench.set_order(atom, partner, bench.order(atom, partner) - 1)
    bench.add_charge(partner, 1)


def _ring_carbon(bench: Workbench, atom: int, _: int | None, third: int | None, __: int | None) -> None:
    oxygen = _need(third)
    bench.take_hydrogen(atom)
    bench.give_hydrogen(oxygen)
    bench.add_charge(oxygen, 1)


def _metal_bond(bench: Workbench, atom: int, second: int | None, _: int | None, fourth: int | None) -> None:
    metal = _need(fourth)
    bench.cut(atom if second is None else second, metal)
    bench.add_charge(metal, 1)
    if second is not None:
        bench.add_charge(second, -1)
        bench.add_charge(atom, 1)


def _hydride_transfer(bench: Workbench, atom: int, *_: int | None) -> None:
    bench.take_hydrogen(atom)
    bench.add_charge(atom, 1)


_GIVERS: dict[Electrons, _Giver] = {
    Electrons.LONE_PAIR: _lone_pair,
    Electrons.CHARGE_MOVES: _lone_pair,
    Electrons.PROTON_LOST: _proton_lost,
    Electrons.PROTON_MOVES: _proton_lost,
    Electrons.SHIFT: _shift,
    Electrons.PI_BOND: _pi_bond,
    Electrons.RING_CARBON: _ring_carbon,
    Electrons.METAL_BOND: _metal_bond,
    Electrons.HYDRIDE_TRANSFER: _hydride_transfer,
}


def _migrate(bench: Workbench, origin: int, target: int, migrating: int | None, *, inverted: bool) -> None:
    """Move a group with its pair from origin to target; the group keeps its own configuration."""
    if migrating is None:
        bench.take_hydrogen(origin)
        bench.give_hydrogen(target, inverted=inverted)
        return
    bench.cut(origin, migrating)
    bench.join(target, migrating, inverted=inverted)
    moved = bench.centres.get(migrating)
    if moved is not None and GAP in moved.neighbours:
        bench.centres[migrating] = moved.replaced(GAP, target)


def _common_small_ring(bench: Workbench, one: int, other: int, leaving: int | None) -> tuple[int, int] | None:
    """Return the neighbours of both atoms in a ring too small for a trans double bond, as cis references.

    A ring that holds the leaving atom does not count: it opens.
    """
    for ring in sorted(bench.rings, key=lambda r: (len(r), r)):
        if one not in ring or other not in ring or leaving in ring or len(ring) >= SMALLEST_TRANS_RING:
            continue
        at = ring.index(one)
        before, after = ring[at - 1], ring[(at + 1) % len(ring)]
        mine = before if after == other else after
        at = ring.index(other)
        before, after = ring[at - 1], ring[(at + 1) % len(ring)]
        theirs = before if after == one else after
        return mine, theirs
    return None


def _reference(bench: Workbench, end: int, other: int, lost: int | None) -> int | None:
    """Return a neighbour of a double-bond end to name its geometry by; None if it bears only hydrogen."""
    around = [n for n in bench.neighbours(end) if n not in {other, lost}]
    return min(around, key=lambda n: (_is_hydrogen(bench, n), n), default=None)


def _cis_after_loss(
    ends: tuple[Centre | None, Centre | None],
    carbons: tuple[int, int],
    lost: tuple[int, int],
    references: tuple[int | None, int | None],
    effect: StereoEffect,
) -> bool | None:
    """Return whether the references end up cis; None where a configuration is undrawn or any course will do.

    From (X; b, R1, R2) and (H; a, R3, R4) of equal sign, anti loss of H and X leaves R1 and R3 cis.
    """
    first, second = ends
    if first is None or second is None or effect not in {StereoEffect.ANTI, StereoEffect.SYN}:
        return None
    if references[0] is None or references[1] is None or lost[1] not in second.neighbours:
        return None
    _, sign_a = first.seen_from(lost[0], carbons[1], references[0])
    _, sign_b = second.seen_from(lost[1], carbons[0], references[1])
    return (sign_a == sign_b) == (effect is StereoEffect.ANTI)


def _set_geometry(bench: Workbench, ends: tuple[int, int], cis: bool) -> bool:
    one, other = (_reference(bench, end, far, None) for end, far in (ends, ends[::-1]))
    if one is None or other is None or _common_small_ring(bench, *ends, None):
        return False
    bench.set_alkene(Alkene(ends, (one, other), cis))
    return True


def _has_drawn_alkene(structure: Structure) -> bool:
    return any(bond.GetStereo() > Chem.BondStereo.STEREOANY for bond in bonds_of(structure.mol))


def _with_geometries(
    bench: Workbench,
    ends: tuple[int, int],
    references: tuple[int | None, int | None] | None,
    cis: bool | None,
    effect: StereoEffect,
) -> Iterable[Edit]:
    """Yield the edit with the new double bond cis, trans, or both where cis is None; none against Bredt."""
    one, other = references or (None, None)
    geometries: tuple[bool | None, ...] = (None,)
    if one is not None and other is not None and bench.order(*ends) == 2:
        geometries = (True, False) if cis is None else (cis,)
    for each in geometries:
        if each is not None and one is not None and other is not None:
            bench.set_alkene(Alkene(ends, (one, other), each))
        edit = _edit(bench, ends[0], effect, ends)
        place = edit.from_substrate
        if not violates_bredt(edit.product, place[ends[0]], place[ends[1]]):
            yield edit


def _edit(bench: Workbench, carbon: int, effect: StereoEffect, alkene: tuple[int, int] | None = None) -> Edit:
    pieces = bench.settle()
    main = next(piece for piece in pieces if carbon in piece.atoms)
    others = tuple(piece.structure for piece in pieces if piece is not main)
    ours, theirs = _origins(bench, main)
    geometry = None
    if alkene is not None:
        geometry = _geometry(main.structure, main.atoms[alkene[0]], main.atoms[alkene[1]])
    return Edit(
        product=main.structure,
        others=others,
        protons_released=bench.protons_released,
        effect=effect,
        geometry=geometry,
        from_substrate=ours,
        from_nucleophile=theirs,
    )


def _origins(bench: Workbench, piece: Piece) -> tuple[dict[AtomId, AtomId], dict[AtomId, AtomId]]:
    border = bench.offsets[1] if len(bench.offsets) > 1 else bench.mol.GetNumAtoms()
    ours = {at: new for at, new in sorted(piece.atoms.items()) if at < border}
    theirs = {at - border: new for at, new in sorted(piece.atoms.items()) if at >= border}
    return ours, theirs


def _geometry(structure: Structure, one: AtomId, other: AtomId) -> str | None:
    bond: Chem.Bond | None = structure.mol.GetBondBetweenAtoms(one, other)
    names = {Chem.BondStereo.STEREOE: "E", Chem.BondStereo.STEREOZ: "Z"}
    return None if bond is None else names.get(bond.GetStereo())


def _cation(bench: Workbench, centre: int, before: Cation | None) -> Cation:
    """Settle the bench into a cation; a drawn configuration of the centre becomes its memory."""
    remembered = bench.centres.pop(centre, None)
    pieces = bench.settle()
    main = next(piece for piece in pieces if centre in piece.atoms)
    memory = None
    if remembered is not None and GAP in remembered.neighbours:
        around = tuple(main.atoms[n] if n >= 0 else n for n in remembered.neighbours)
        memory = Centre(around, remembered.sign)
    others = [piece.structure for piece in pieces if piece is not main]
    ours, _ = _origins(bench, main)
    protons = bench.protons_released
    if before is not None:
        others += before.others
        protons += before.protons_released
        ours = {old: ours[mid] for old, mid in before.from_substrate.items() if mid in ours}
    return Cation(
        structure=main.structure,
        centre=main.atoms[centre],
        others=tuple(sorted(others)),
        protons_released=protons,
        memory=memory,
        from_substrate=ours,
    )


def _after_cation(edit: Edit, cation: Cation) -> Edit:
    """Return an edit of a cation as one of the substrate the cation came from."""
    through = edit.from_substrate
    return replace(
        edit,
        others=tuple(sorted((*edit.others, *cation.others))),
        protons_released=edit.protons_released + cation.protons_released,
        from_substrate={old: through[mid] for old, mid in cation.from_substrate.items() if mid in through},
    )


def _as_ketone(edit: Edit) -> Edit:
    """Return an edit whose product, if it is an enol, is written as the ketone or aldehyde it becomes."""
    product, places = _ketonised(edit.product)
    if product == edit.product:
        return edit
    return replace(
        edit,
        product=product,
        geometry=None,
        from_substrate={old: places[new] for old, new in edit.from_substrate.items()},
        from_nucleophile={old: places[new] for old, new in edit.from_nucleophile.items()},
    )


def _distinct(edits: Iterable[Edit]) -> tuple[Edit, ...]:
    found: dict[str, Edit] = {}
    for edit in edits:
        found.setdefault(edit.product.smiles, edit)
    return tuple(found[smiles] for smiles in sorted(found))
