"""What must hold for every structure and every edit, checked against 3D geometry and a second toolkit."""

import random
from collections import Counter
from collections.abc import Iterator
from functools import cache

import pytest
from indigo import Indigo
from indigo.inchi import IndigoInchi
from rdkit import Chem
from rdkit.Chem import rdDistGeom, rdMolTransforms

from builder.chemistry.perception import Nucleophile, ReactiveSite, attacking_atoms, neighbouring_groups, perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.chemistry.transform import (
    Cation,
    Edit,
    activate_hydroxyl,
    activation_groups,
    add_hx,
    add_x2,
    allylic_forms,
    capture,
    cyclise,
    eliminate,
    ionise,
    lose_proton,
    migrating_groups,
    protonate,
    shift_12,
    substitute,
    transpose_allylic,
)

SUBSTRATES = (
    "CC[C@H](C)Br",
    "CC(C)(C)Cl",
    "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1Cl",
    "Cc1ccc(S(=O)(=O)O[C@@H](C)[C@H](C)c2ccccc2)cc1",
    "CC(=O)O[C@@H]1CCCC[C@H]1OS(C)(=O)=O",
    "O[C@@H]1CCCC[C@H]1Cl",
    "C[C@]12CCCC[C@H]1O2",
    "C[C@@H]1O[C@H]1C",
    "Cc1ccc(S(=O)(=O)N2[C@@H]3CCCC[C@@H]32)cc1",
    "CC1COS(=O)(=O)O1",
    "C/C=C/[C@H](C)Cl",
    "C[C@@H](Br)C#CC",
    "CC1=CCCCC1",
    "C/C=C\\C",
    "CC#C",
    "Br[C@H](c1ccccc1)[C@@H](Br)c1ccccc1",
    "CC(C)C(C)O",
    "C[C@H](Br)C(=O)[O-]",
    "CCN(CC)C[C@H](C)Cl",
    "CC[N+](C)(C)C",
    "CCCC[N+]#N",
    "[2H][C@H](C)[C@@H](C)Br",
    "Br/C=C/c1ccccc1",
    "O=S(=O)(O[C@@H]1C[C@H]2CC[C@@H]1C2)c1ccc(Br)cc1",
    "CCO[P+](c1ccccc1)(c1ccccc1)c1ccccc1",
    "COC(=O)c1ccccc1",
)
NUCLEOPHILES = (
    "[N-]=[N+]=[N-]",
    "[C-]#N",
    "[S-]C#N",
    "[O-]N=O",
    "[O-]S(=O)c1ccccc1",
    "CC(=O)[O-]",
    "[O-]c1ccccc1",
    "C=C(C)[O-]",
    "N",
    "CCN(CC)CC",
    "NC(N)=S",
    "c1nc[nH]n1",
    "O",
    "[BH4-]",
    "C[Mg]Br",
    "CCOC(=O)CC(=O)OCC",
)


_Done = tuple[str, Edit, str]


@cache
def _nucleophiles() -> tuple[Nucleophile, ...]:
    return tuple(n for smiles in NUCLEOPHILES for n in attacking_atoms(parse_smiles(smiles)))


def _cations(substrate: Structure, site: ReactiveSite) -> Iterator[Cation]:
    first = protonate(substrate, site) if site.is_addition else ionise(substrate, site)
    yield first
    yield from (shift_12(first, *move) for move in migrating_groups(first))
    yield from allylic_forms(first)


def _may_close(substrate: Structure, site: ReactiveSite, group: Nucleophile) -> bool:
    """Answer whether a group is far enough from the carbon to close a ring of three or more on it."""
    near = {n for n, _ in substrate.atoms[site.alpha_carbon].neighbours}
    return group.atom not in {site.alpha_carbon, site.leaving_atom} | near


def _additions(substrate: Structure, site: ReactiveSite, ns: tuple[Nucleophile, ...]) -> Iterator[_Done]:
    yield from (("add X2", e, "BrBr") for e in add_x2(substrate, site, parse_smiles("BrBr")))
    for n in ns:
        yield from (("add HX", e, n.species.smiles) for e in add_hx(substrate, site, n))


def _losses(substrate: Structure, site: ReactiveSite, ns: tuple[Nucleophile, ...]) -> Iterator[_Done]:
    for beta in site.beta_with_hydrogen:
        yield from (("eliminate", e, "") for e in eliminate(substrate, site, beta.atom))
    for group in neighbouring_groups(substrate):
        if _may_close(substrate, site, group):
            yield "cyclise", cyclise(substrate, site, group), ""
    for n in ns:
        for inversion in (True, False):
            yield "substitute", substitute(substrate, site, n, inversion=inversion), n.species.smiles
        yield from (("transpose", e, n.species.smiles) for e in transpose_allylic(substrate, site, n))
    if site.leaving_group == "hydroxyl":
        yield "protonate", activate_hydroxyl(substrate, site, "water"), ""


def _edits(substrate: Structure, ns: tuple[Nucleophile, ...]) -> Iterator[_Done]:
    """Yield everything the room can do to a substrate: what was done, the edit, and what was used up."""
    for site in perceive_sites(substrate):
        yield from (_additions if site.is_addition else _losses)(substrate, site, ns)
        for cation in _cations(substrate, site):
            for near, _ in cation.structure.atoms[cation.centre].neighbours:
                yield from (("lose proton", e, "") for e in lose_proton(cation, near))
            for n in ns[::4]:
                yield from (("capture", e, n.species.smiles) for e in capture(cation, n))


@cache
def _indigo() -> Indigo:
    return Indigo()


@cache
def _indigo_inchi() -> IndigoInchi:
    return IndigoInchi(_indigo())


@cache
def _counted_by_indigo(smiles: str) -> tuple[tuple[str, int], ...]:
    """Return atoms (implicit hydrogens too) and charge of a SMILES, as a second toolkit counts them."""
    mol = _indigo().loadMolecule(smiles)
    mol.dearomatize()
    count: Counter[str] = Counter()
    for atom in mol.iterateAtoms():
        count[atom.symbol() if atom.isotope() == 0 else f"{atom.isotope()}{atom.symbol()}"] += 1
        count["H"] += atom.countImplicitHydrogens()
        count["charge"] += atom.charge() or 0
    return tuple(sorted(count.items()))


def _sum(smiles: list[str]) -> Counter[str]:
    total: Counter[str] = Counter()
    for each in smiles:
        total.update(dict(_counted_by_indigo(each)))
    return total


@pytest.mark.parametrize("smiles", SUBSTRATES)
def test_atoms_and_charge_are_in_balance_by_the_count_of_another_toolkit(smiles: str) -> None:
    substrate = parse_smiles(smiles)
    seen = set()
    for what, edit, used in _edits(substrate, _nucleophiles()):
        after = [edit.product.smiles, *(s.smiles for s in edit.others)]
        case = (used, tuple(after), edit.protons_released)
        if case in seen:
            continue
        seen.add(case)
        before = _sum([substrate.smiles, *([used] if used else [])])
        total = _sum(after)
        total["H"] += edit.protons_released
        total["charge"] += edit.protons_released
        assert {k: v for k, v in before.items() if v} == {k: v for k, v in total.items() if v}, (what, after)
    assert seen


@pytest.mark.parametrize("smiles", SUBSTRATES)
def test_renumbering_the_atoms_changes_nothing(smiles: str) -> None:
    draw = random.Random(smiles)
    original = parse_smiles(smiles)
    nucleophiles = _nucleophiles()[:3]
    expected = [(what, edit.product.smiles, edit.effect) for what, edit, _ in _edits(original, nucleophiles)]
    for text in Chem.MolToRandomSmilesVect(original.mol, 3, draw.randrange(1 << 30)):
        again = parse_smiles(text)
        assert again == original
        assert perceive_sites(again) == perceive_sites(original)
        assert [(w, e.product.smiles, e.effect) for w, e, _ in _edits(again, nucleophiles)] == expected
        # The numbering is that of the structure, not of the text: each atom is where its author put it.
        for place, at in enumerate(again.typed_order):
            assert Chem.MolFromSmiles(text).GetAtomWithIdx(place).GetSymbol() == again.atoms[at].symbol


def test_nucleophiles_do_not_depend_on_how_they_are_written() -> None:
    for smiles in NUCLEOPHILES:
        original = parse_smiles(smiles)
        for text in Chem.MolToRandomSmilesVect(original.mol, 3, 7):
            assert attacking_atoms(parse_smiles(text)) == attacking_atoms(original)


@pytest.mark.parametrize("smiles", SUBSTRATES)
def test_products_mean_the_same_to_another_toolkit(smiles: str) -> None:
    substrate = parse_smiles(smiles)
    indigo, inchi = _indigo(), _indigo_inchi()
    products = {edit.product for _, edit, _ in _edits(substrate, _nucleophiles()[:2])}
    for product in sorted(products):
        read = indigo.loadMolecule(product.smiles)
        assert inchi.getInchi(read) == product.inchi, product.smiles


def _signed_volume(mol: Chem.Mol, around: tuple[int, int, int, int]) -> float:
    """Return the volume spanned by four neighbours of a carbon; its sign is the handedness of their order."""
    points = [mol.GetConformer().GetAtomPosition(at) for at in around]
    a, b, c = (p - points[3] for p in points[:3])
    return float(a.DotProduct(b.CrossProduct(c)))


def _embedded(structure: Structure) -> Chem.Mol:
    mol = Chem.AddHs(structure.mol)
    assert rdDistGeom.EmbedMolecule(mol, randomSeed=11) == 0
    return mol


def _all_neighbours(mol: Chem.Mol, at: int) -> list[int]:
    return [n.GetIdx() for n in mol.GetAtomWithIdx(at).GetNeighbors()]


@pytest.mark.parametrize("inversion", [True, False])
@pytest.mark.parametrize(
    "smiles",
    [
        "CC[C@H](C)Br",
        "C[C@@H](Cl)c1ccccc1",
        "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1Cl",
        "CC[C@](C)(F)Cl",
        "C[C@]12CCCC[C@H]1O2",
        "C[C@H](I)C(=O)OCC",
        "[2H][C@H](CC)OS(C)(=O)=O",
        "O[C@@H]1CCCC[C@H]1Cl",
    ],
)
def test_inversion_turns_the_carbon_inside_out_in_space(smiles: str, inversion: bool) -> None:
    # Geometry alone: the leaving atom's place taken by the nucleophile, handedness in space must change.
    substrate = parse_smiles(smiles)
    before = _embedded(substrate)
    nucleophile = attacking_atoms(parse_smiles("[N-]=[N+]=[N-]"))[0]
    for site in perceive_sites(substrate):
        if site.needs_activation or site.leaving_atom is None:
            continue
        edit = substitute(substrate, site, nucleophile, inversion=inversion)
        after = _embedded(edit.product)
        alpha = edit.from_substrate[site.alpha_carbon]
        rest = [n for n in _all_neighbours(before, site.alpha_carbon) if n != site.leaving_atom]
        image = [edit.from_substrate.get(n) for n in rest]
        (spare,) = [
            n for n in _all_neighbours(after, alpha) if n not in {*image, edit.from_nucleophile[nucleophile.atom]}
        ] or [None]
        moved = [spare if n is None else n for n in image]
        old = _signed_volume(before, (site.leaving_atom, *rest))
        new = _signed_volume(after, (edit.from_nucleophile[nucleophile.atom], *moved))
        assert (old * new < 0) is inversion


@pytest.mark.parametrize(
    "smiles",
    [
        "Br[C@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "Br[C@@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "C[C@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "CC[C@](C)(Cl)[C@H](C)c1ccccc1",
        "C[C@H](Br)[C@@H](C)[2H]",
        "COC(=O)[C@H](C)[C@@H](OS(C)(=O)=O)C(C)C",
    ],
)
def test_anti_elimination_agrees_with_the_antiperiplanar_conformer(smiles: str) -> None:
    # The substrate is turned until leaving group and hydrogen are 180° apart; which groups then face each
    # other is measured, and must be what stands cis in the product.
    substrate = parse_smiles(smiles)
    checked = 0
    for site in perceive_sites(substrate):
        alpha = site.alpha_carbon
        for beta in site.beta_with_hydrogen:
            if not substrate.stereocentre_marks.get(beta.atom) or site.needs_activation:
                continue
            for edit in eliminate(substrate, site, beta.atom):
                mol = _embedded(substrate)
                around_beta = _all_neighbours(mol, beta.atom)
                gone = [n for n in around_beta if mol.GetAtomWithIdx(n).GetAtomicNum() == 1]
                lost = next(n for n in gone if n not in edit.from_substrate)
                rdMolTransforms.SetDihedralDeg(mol.GetConformer(), site.leaving_atom, alpha, beta.atom, lost, 180.0)
                product = _embedded(edit.product)
                kept = [
                    [n for n in _all_neighbours(mol, end) if n in edit.from_substrate and n not in {alpha, beta.atom}]
                    for end in (alpha, beta.atom)
                ]
                for one in kept[0]:
                    for other in kept[1]:
                        then = rdMolTransforms.GetDihedralDeg(mol.GetConformer(), one, alpha, beta.atom, other)
                        path = [edit.from_substrate[n] for n in (one, alpha, beta.atom, other)]
                        now = rdMolTransforms.GetDihedralDeg(product.GetConformer(), *path)
                        assert (abs(then) < 90.0) == (abs(now) < 90.0)
                        checked += 1
    assert checked


def test_retained_and_activated_alcohols_are_superimposable_in_space() -> None:
    alcohol = parse_smiles("CCCCCC[C@H](C)O")
    (site,) = perceive_sites(alcohol)
    before = _embedded(alcohol)
    for group in activation_groups():
        edit = activate_hydroxyl(alcohol, site, group)
        after = _embedded(edit.product)
        heavy = [n for n in _all_neighbours(before, site.alpha_carbon) if n in edit.from_substrate]
        old = _signed_volume(before, (*heavy, site.alpha_carbon))
        new = _signed_volume(after, (*(edit.from_substrate[n] for n in (*heavy, site.alpha_carbon)),))
        assert old * new > 0


def test_a_phosphine_keeps_its_configuration_when_it_is_alkylated() -> None:
    # The lone pair becomes the new bond: Horner, Pure Appl. Chem. 1964, 9, 225 (from memory).
    phosphine = attacking_atoms(parse_smiles("C[P@](CC)c1ccccc1"))[0]
    bromide = parse_smiles("BrCc1ccccc1")
    edit = substitute(bromide, perceive_sites(bromide)[0], phosphine)
    before, after = _embedded(phosphine.species), _embedded(edit.product)
    around = _all_neighbours(before, phosphine.atom)
    image = [edit.from_nucleophile[n] for n in (*around, phosphine.atom)]
    old = _signed_volume(before, (*around, phosphine.atom))
    assert edit.product.stereocentres.specified == 1
    assert old * _signed_volume(after, tuple(image)) > 0
