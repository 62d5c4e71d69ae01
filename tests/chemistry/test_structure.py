"""Reading structures, and what a structure knows of itself."""

import pickle
import random
import time
from contextlib import nullcontext

import pytest
from rdkit import Chem
from rdkit.Chem import rdDepictor

from builder.chemistry.perception import neighbouring_groups, perceive_sites
from builder.chemistry.structure import (
    MAX_HEAVY_ATOMS,
    StructureError,
    name_atom,
    parse_inchi,
    parse_rxn,
    parse_smiles,
    stereo_key,
)

REFUSED = [
    ("", "no structure", None),
    ("C1CC", "unclosed ring 1", 1),
    ("C%12CC", "unclosed ring 12", 1),
    ("CC(C", "branch that is not closed", 2),
    ("CC)C", "branch closed that was never opened", 2),
    ("C[Na", "bracket that is not closed", 1),
    ("CC[Xx]", "unknown atom [Xx]", 2),
    ("CQC", "character 'Q' is no SMILES", 1),
    ("C==C", "'=' where SMILES allows none", 2),
    ("CC(C)(C)(C)C", "valence of C at atom 2 exceeded", 1),
    ("CCN(C)(C)(C)C", "valence of N at atom 3 exceeded", 2),
    ("Cc1cccc1", "aromatic ring without alternating double bonds", 1),
    ("CC*", "wildcard atom", 2),
    ("\u0421CCBr", "character 'С' in a SMILES", 0),  # Cyrillic
    ("‘CCBr’", "character '‘' in a SMILES", 0),
    ("CCBr\ufeff", "character '\\ufeff' in a SMILES", 4),
    ("C:C(C)Br", "aromatic bond outside a ring", None),
    ("C[*]", "wildcard atom", 2),
    ("CBr>>CI", "reaction arrow", 3),
    ("C~C", "bond of any order", 1),
    ("[#6]C", "search pattern [#6] in a SMILES", 0),
    ("C[C;H2]C", "search pattern [C;H2] in a SMILES", 1),
    ("C[R1]", "search pattern [R1] in a SMILES", 1),
    ("CBr methyl bromide", "space in a SMILES", 3),
    ("CC[C@H](C)Br |&1:2|", "CXSMILES extension", 12),
]


@pytest.mark.parametrize(("text", "reason", "position"), REFUSED)
def test_refusals_say_what_where_and_how_to_mend(text: str, reason: str, position: int | None) -> None:
    with pytest.raises(StructureError) as refusal:
        parse_smiles(text)
    assert refusal.value.reason == reason
    assert refusal.value.position == position
    assert refusal.value.mend


def test_refusals_leave_the_terminal_clean(capfd: pytest.CaptureFixture[str]) -> None:
    for text, _, _ in REFUSED:
        with pytest.raises(StructureError):
            parse_smiles(text)
    assert parse_smiles("C[C@@H](Br)F").inchikey
    assert capfd.readouterr() == ("", "")


def _cubic_cage(atoms: int, seed: int) -> str:
    """Return a random cage in which every carbon has three neighbours, the worst case for ring perception."""
    draw = random.Random(seed)
    while True:
        stubs = [at for at in range(atoms) for _ in range(3)]
        draw.shuffle(stubs)
        bonds = {tuple(sorted(stubs[at : at + 2])) for at in range(0, 3 * atoms, 2)}
        if len(bonds) == 3 * atoms // 2 and all(a != b for a, b in bonds):
            break
    mol = Chem.RWMol()
    for _ in range(atoms):
        mol.AddAtom(Chem.Atom(6))
    for one, other in bonds:
        mol.AddBond(one, other, Chem.BondType.SINGLE)
    return Chem.MolToSmiles(mol)


HOSTILE = {
    "too long": "C" * 2001,
    "too many atoms": "C" * (MAX_HEAVY_ATOMS + 1),
    "open branches": "(" * 1900,
    "nested branches": "C(" * 600 + "C" + ")" * 600,
    "too many stereocentres": "[C@H](F)" * 100,
    "too many double bonds": "/C=C/" * 150,
    "fullerene": "c12c3c4c5c1c1c6c7c2c2c8c3c3c9c4c4c%10c5c5c1c1c6c6c%11c7c2c2c7c8c3c3c8c9c4c4c9c%10c5c5c1c1c6c6"
    "c%11c2c2c7c3c3c8c4c4c9c5c1c1c6c2c3c41",
    "cage": _cubic_cage(76, 1),
    "too many rings": _cubic_cage(120, 2),
    "long bromide": "C(Br)" * 100,
    "polyether": "OCC" * 66,
    "inositols": ".".join(["OC1C(O)C(O)C(O)C(O)C1O"] * 16),
    "drawn inositols": ".".join(["O[C@H]1[C@H](O)[C@@H](O)[C@H](O)[C@H](O)[C@@H]1O"] * 10),
    "salts": ".".join(["[Na+].[Cl-]"] * 100),
    "hydrogens": ".".join(["[H][H]"] * 150),
    "cubanes": ".".join(["BrC12C3C4C1C5C2C3C45"] * 8),
}


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_structures_are_answered_within_a_second(name: str) -> None:
    started = time.perf_counter()
    refused = name.startswith(("too", "open", "nested"))
    with pytest.raises(StructureError) if refused else nullcontext():
        structure = parse_smiles(HOSTILE[name])
        assert structure.stereocentres.total >= 0
        assert structure.is_achiral in {True, False}
        assert len(perceive_sites(structure)) <= structure.heavy_atom_count
        assert len(neighbouring_groups(structure)) <= structure.heavy_atom_count
    assert time.perf_counter() - started < 1.0


@pytest.mark.parametrize(
    ("text", "formula", "mass"),
    [
        # Molar masses from the IUPAC standard atomic weights 2021, added up by hand.
        ("CCC(C)Br", "C4H9Br", 137.02),
        ("[Na+].[N-]=[N+]=[N-]", "N3Na", 65.01),
        ("CCCCCC[C@H](C)OS(C)(=O)=O", "C9H20O3S", 208.32),
        ("[NH4+].[Cl-]", "ClH4N", 53.49),
        ("[2H]Br", "BrH", 81.92),
        ("CC(=O)[O-]", "C2H3O2-", 59.04),
        ("[O-]S(=O)(=O)[S-]", "O3S2-2", 112.12),
    ],
)
def test_formula_and_molar_mass(text: str, formula: str, mass: float) -> None:
    structure = parse_smiles(text)
    assert structure.formula == formula
    assert structure.mass == pytest.approx(mass, abs=0.011)  # the tables print two decimals


def test_inchikey_of_aspirin() -> None:
    # InChIKey as published for acetylsalicylic acid on its PubChem page (CID 2244; from memory).
    assert parse_smiles("CC(=O)Oc1ccccc1C(=O)O").inchikey == "BSYNRYMUTXBXSQ-UHFFFAOYSA-N"


@pytest.mark.parametrize("smiles", ["CC[C@H](C)Br", "C/C=C\\C", "C[C@@H]1O[C@H]1C", "[2H]CBr"])
def test_inchi_brings_the_structure_back(smiles: str) -> None:
    structure = parse_smiles(smiles)
    assert parse_inchi(structure.inchi) == structure


def test_no_inchi_is_refused() -> None:
    for text in ("", "CCO", "InChI=nonsense"):
        with pytest.raises(StructureError):
            parse_inchi(text)


@pytest.mark.parametrize(
    ("smiles", "achiral"),
    [
        ("CCBr", True),
        ("C[C@H](Br)CC", False),
        ("CC(Br)CC", False),  # undrawn: not surely achiral
        ("C[C@H](Br)[C@@H](C)Br", True),  # meso
        ("C[C@H](Br)[C@H](C)Br", False),
        ("O[C@H]1CC[C@@H](C)CC1", True),  # a mirror plane through C1 and C4
        ("C1CC[C@H]2O[C@H]2C1", True),
        ("C[C@@H]1O[C@H]1C", False),
        ("BrC12CC3CC(CC(C3)C1)C2", True),
    ],
)
def test_meso_counts_as_achiral(smiles: str, achiral: bool) -> None:
    assert parse_smiles(smiles).is_achiral is achiral


def test_mirror_images_mirror_twice() -> None:
    one = parse_smiles("CC[C@H](C)Br")
    assert one.mirror_image != one
    assert one.mirror_image.mirror_image == one
    assert one.mirror_image.flat == one.flat == parse_smiles("CCC(C)Br")


@pytest.mark.parametrize(
    ("smiles", "specified", "unspecified"),
    [
        ("CCC(C)Br", 0, 1),
        ("CC[C@H](C)Br", 1, 0),
        ("C[C@H](Br)C(C)Br", 1, 1),
        ("CC1CCC(Br)CC1", 0, 2),
        ("BrC12CC3CC(CC(C3)C1)C2", 0, 0),
        ("CC1(C)C2CCC1(Cl)CC2", 0, 0),
        ("CCBr", 0, 0),
        ("CC1CN1S(C)(=O)=O", 0, 1),  # the nitrogen of an aziridine turns inside out,
        ("C1CN2CC12", 0, 2),  # that of a bicycle cannot
    ],
)
def test_stereocentres_are_counted(smiles: str, specified: int, unspecified: int) -> None:
    count = parse_smiles(smiles).stereocentres
    assert (count.specified, count.unspecified) == (specified, unspecified)


def test_salts_are_split_and_counter_ions_dropped() -> None:
    assert [s.smiles for s in parse_smiles("[Na+].CC[O-]").fragments] == ["CC[O-]", "[Na+]"]
    assert parse_smiles("CC(C)[N+](C)(C)C.[I-]").without_counter_ions == parse_smiles("CC(C)[N+](C)(C)C")
    assert parse_smiles("[Na+].[N-]=[N+]=[N-]").without_counter_ions.smiles == "[N-]=[N+]=[N-]"
    assert parse_smiles("[Na+].[Cl-]").without_counter_ions == parse_smiles("[Na+].[Cl-]")


def test_isotopes_are_taken_off_on_request_only() -> None:
    labelled = parse_smiles("[2H]C[13CH2]Br")
    assert labelled != parse_smiles("CCBr")
    assert labelled.without_isotopes == parse_smiles("CCBr")


def test_atoms_are_named_as_their_author_wrote_them() -> None:
    for text, place in (("CC(Br)CC", 1), ("CCC(C)Br", 2), ("BrC(C)CC", 1)):
        structure = parse_smiles(text)
        (site,) = perceive_sites(structure)
        assert name_atom(structure, site.alpha_carbon) == f"C{place + 1} in {text}"
    with pytest.raises(ValueError, match="has no atom 99"):
        name_atom(parse_smiles("CC"), 99)


def test_equal_structures_share_their_numbering_but_keep_their_text() -> None:
    one, other = parse_smiles("CC(Br)CC"), parse_smiles("BrC(C)CC")
    assert one == other
    assert hash(one) == hash(other)
    assert (one.typed, other.typed) == ("CC(Br)CC", "BrC(C)CC")
    assert [a.symbol for a in one.atoms] == [a.symbol for a in other.atoms]


def test_a_structure_survives_pickling() -> None:
    one = parse_smiles("BrC(C)CC")
    back = pickle.loads(pickle.dumps(one))
    assert (back, back.typed, back.typed_order) == (one, one.typed, one.typed_order)


def test_atom_map_numbers_do_not_make_another_substance() -> None:
    assert parse_smiles("[CH3:1][CH2:2][Br:3]") == parse_smiles("CCBr")


@pytest.mark.parametrize(
    ("extension", "word"),
    [
        ("|&1:2|", "stereo: racemate"),
        ("|o1:2|", "stereo: unknown enantiomer"),
        ("|a:2|", "stereo: single enantiomer"),
        ("|$;;R;$,&1:2|", "stereo: racemate"),
    ],
)
def test_a_stereo_group_is_refused_with_the_word_for_it(extension: str, word: str) -> None:
    with pytest.raises(StructureError) as refused:
        parse_smiles(f"CC[C@H](C)Br {extension}")
    assert word in refused.value.mend


def test_stereo_key_keeps_three_states_apart_and_racemates_together() -> None:
    flat, one, other = (parse_smiles(s) for s in ("CCC(C)Br", "CC[C@H](C)Br", "CC[C@@H](C)Br"))
    racemic = {stereo_key(s, "racemate") for s in (flat, one, other)}
    assert len(racemic) == 1
    assert stereo_key(one, "single enantiomer") != stereo_key(other, "single enantiomer")
    states = {stereo_key(one, k) for k in ("racemate", "single enantiomer", "unknown enantiomer")}
    assert len(states) == 3
    threo, mirrored, erythro = (
        parse_smiles(s) for s in ("C[C@H](Br)[C@H](C)O", "C[C@@H](Br)[C@@H](C)O", "C[C@H](Br)[C@@H](C)O")
    )
    assert stereo_key(threo, "racemate") == stereo_key(mirrored, "racemate")
    assert stereo_key(threo, "racemate") != stereo_key(erythro, "racemate")


def _rxn(kind: str, *molblocks: str) -> str:
    if kind == "V2000":
        return "$RXN\n\n\n\n  1  1\n" + "".join(f"$MOL\n{block}" for block in molblocks)
    ctabs = [block.split("M  V30 BEGIN CTAB")[1].split("M  V30 END CTAB")[0] for block in molblocks]
    ctabs = [f"M  V30 BEGIN CTAB{ctab}M  V30 END CTAB\n" for ctab in ctabs]
    return (
        "$RXN V3000\n\n\n\nM  V30 COUNTS 1 1\n"
        f"M  V30 BEGIN REACTANT\n{ctabs[0]}M  V30 END REACTANT\n"
        f"M  V30 BEGIN PRODUCT\n{ctabs[1]}M  V30 END PRODUCT\nM  END\n"
    )


@pytest.mark.parametrize("kind", ["V2000", "V3000"])
def test_a_reaction_file_gives_reactants_and_products_with_their_configuration(kind: str) -> None:
    smiles = ("CC[C@H](C)Br", "C/C=C/C")
    mols = [Chem.MolFromSmiles(s) for s in smiles]
    for mol in mols:
        rdDepictor.Compute2DCoords(mol)
    blocks = [Chem.MolToV3KMolBlock(m) if kind == "V3000" else Chem.MolToMolBlock(m) for m in mols]
    reactants, products = parse_rxn(_rxn(kind, *blocks))
    assert reactants == (parse_smiles(smiles[0]),)
    assert products == (parse_smiles(smiles[1]),)


@pytest.mark.parametrize("text", ["", "CCO", "$RXN\n\n\n\n", "$RXN\n\n\n\n  1  1\n$MOL\nbroken\n"])
def test_a_broken_reaction_file_is_refused(text: str) -> None:
    with pytest.raises(StructureError):
        parse_rxn(text)
