"""What becomes of structures: textbook outcomes written by hand, each with where it can be looked up."""

import pytest
from rdkit import Chem
from rdkit.Chem import rdCIPLabeler

from builder.chemistry.perception import (
    Nucleophile,
    ReactiveSite,
    attacking_atoms,
    leaving_group_names,
    neighbouring_groups,
    perceive_sites,
    sites_of,
)
from builder.chemistry.structure import Structure, parse_smiles
from builder.chemistry.transform import (
    Cation,
    Edit,
    StereoEffect,
    activate_hydroxyl,
    activation_groups,
    add_hx,
    add_x2,
    allylic_forms,
    capture,
    carbocations,
    course_between,
    cyclise,
    diazotise,
    eliminate,
    fragment,
    ionise,
    ionise_with_shift,
    keto_form,
    lose_proton,
    migrating_groups,
    protonate,
    shift_12,
    substitute,
    transpose_allylic,
    violates_bredt,
)


def _site(structure: Structure, group: str | None = None, degree: str | None = None) -> ReactiveSite:
    sites = perceive_sites(structure) if group is None else sites_of(structure, group)
    return next(s for s in sites if degree in {None, s.degree})


def _nucleophile(smiles: str, symbol: str | None = None) -> Nucleophile:
    return next(n for n in attacking_atoms(parse_smiles(smiles)) if symbol in {None, n.symbol})


def _canonical(*smiles: str) -> list[str]:
    return sorted(parse_smiles(s).smiles for s in smiles)


def _products(edits: tuple[Edit, ...]) -> list[str]:
    return sorted(e.product.smiles for e in edits)


# substrate, leaving group, degree of the site, nucleophile, attacking element, product of attack from behind
SUBSTITUTIONS = [
    ("CCCCBr", "bromide", None, "[N-]=[N+]=[N-]", None, "CCCCN=[N+]=[N-]"),
    ("CC[C@H](C)Br", "bromide", None, "[N-]=[N+]=[N-]", None, "CC[C@@H](C)N=[N+]=[N-]"),
    ("CCCCCC[C@H](C)OS(C)(=O)=O", "mesylate", None, "CC(=O)[O-]", None, "CCCCCC[C@@H](C)OC(C)=O"),
    ("C[C@@H](Br)c1ccccc1", "bromide", None, "[C-]#N", "C", "C[C@H](C#N)c1ccccc1"),
    ("CCI", "iodide", None, "[C-]#N", "N", "[C-]#[N+]CC"),
    ("CCBr", "bromide", None, "[S-]C#N", "S", "CCSC#N"),
    ("CCBr", "bromide", None, "[S-]C#N", "N", "CCN=C=S"),
    ("CCBr", "bromide", None, "[O-]C#N", "N", "CCN=C=O"),
    ("CCBr", "bromide", None, "[O-]N=O", "N", "CC[N+](=O)[O-]"),
    ("CCBr", "bromide", None, "[O-]N=O", "O", "CCON=O"),
    ("CCBr", "bromide", None, "[O-]S(=O)c1ccccc1", "S", "CCS(=O)(=O)c1ccccc1"),
    ("CCBr", "bromide", None, "[O-]S(=O)c1ccccc1", "O", "CCOS(=O)c1ccccc1"),
    ("CCBr", "bromide", None, "[O-]S(=O)[O-]", "S", "CCS(=O)(=O)[O-]"),
    ("CCBr", "bromide", None, "[O-]S(=O)(=O)[S-]", "S", "CCSS(=O)(=O)[O-]"),
    ("CCBr", "bromide", None, "C=C(C)[O-]", "C", "CCCC(C)=O"),
    ("CCBr", "bromide", None, "C=C(C)[O-]", "O", "C=C(C)OCC"),
    ("CCBr", "bromide", None, "[CH2-]C(C)=O", "O", "C=C(C)OCC"),
    ("CCBr", "bromide", None, "CCOC(=O)[CH-]C(=O)OCC", "C", "CCOC(=O)C(CC)C(=O)OCC"),
    ("CCBr", "bromide", None, "CCOC(=O)CC(=O)OCC", "C", "CCOC(=O)C(CC)C(=O)OCC"),
    ("C=CCBr", "bromide", None, "[O-]c1ccccc1", "O", "C=CCOc1ccccc1"),
    ("C=CCBr", "bromide", None, "[O-]c1ccccc1", "C", "C=CCc1ccccc1O"),
    ("CCBr", "bromide", None, "c1nnc[n-]1", "N", "CCn1cncn1"),
    ("CCBr", "bromide", None, "c1c[nH]cn1", "N", "CCn1ccnc1"),
    ("CCBr", "bromide", None, "Cn1ccnc1", "N", "CC[n+]1ccn(C)c1"),
    ("CCBr", "bromide", None, "O=C1[N-]C(=O)c2ccccc21", "N", "CCN1C(=O)c2ccccc2C1=O"),
    ("CCBr", "bromide", None, "N", None, "CCN"),
    ("CCBr", "bromide", None, "CCNCC", None, "CCN(CC)CC"),
    ("CI", "iodide", None, "CCN(CC)CC", None, "CC[N+](C)(CC)CC"),
    ("CI", "iodide", None, "c1ccncc1", None, "C[n+]1ccccc1"),
    ("CI", "iodide", None, "CSC", None, "C[S+](C)C"),
    ("CI", "iodide", None, "CS(C)=O", None, "CO[S+](C)C"),
    ("CI", "iodide", None, "NC(N)=S", None, "CSC(N)=[NH2+]"),
    ("CI", "iodide", None, "CP(C)C", None, "C[P+](C)(C)C"),
    ("CI", "iodide", None, "COP(OC)OC", None, "CO[P+](C)(OC)OC"),
    ("CO[P+](C)(OC)OC", "alkoxyphosphonium", None, "[I-]", None, "CI"),  # second step of Michaelis-Arbuzov
    ("CCBr", "bromide", None, "O", None, "CCO"),
    ("CCBr", "bromide", None, "CO", None, "CCOC"),
    ("CCBr", "bromide", None, "CC(=O)O", None, "CCOC(C)=O"),
    ("CCBr", "bromide", None, "C[Mg]Br", None, "CCC"),
    ("CCBr", "bromide", None, "C[Cu-]C", None, "CCC"),
    ("CC(C)Br", "bromide", None, "[AlH4-].[Li+]", None, "CCC"),
    ("CC[C@H](C)Br", "bromide", None, "[2H-]", None, "CC[C@@H](C)[2H]"),
    ("CC[C@H](C)Br", "bromide", None, "[2H][Al-]([2H])([2H])[2H]", None, "CC[C@@H](C)[2H]"),
    ("CCBr", "bromide", None, "[C-]#CC", None, "CCC#CC"),
    ("CCCCO", "hydroxyl", None, "[Br-]", None, "CCCCBr"),
    ("CCC[OH2+]", "water", None, "[Br-]", None, "CCCBr"),
    ("CC[N+](C)(C)C", "ammonium", "methyl", "[S-]c1ccccc1", None, "CSc1ccccc1"),
    ("C[N+]#N", "diazonium", None, "CC(=O)O", None, "COC(C)=O"),
    ("COC(=O)c1ccccc1", "carboxylate", None, "[I-]", None, "CI"),
    ("C[C@@H]1CO1", "epoxide", "primary", "C[O-]", None, "COC[C@@H](C)O"),
    ("c1ccc([C@@H]2CO2)cc1", "epoxide", "secondary", "[N-]=[N+]=[N-]", None, "OC[C@H](c1ccccc1)N=[N+]=[N-]"),
    ("C[C@@H]1O[C@H]1C", "epoxide", None, "N", None, "C[C@H](O)[C@@H](C)N"),
    ("CC[N+]1(CC)CC1", "aziridinium", None, "[N-]=[N+]=[N-]", None, "CCN(CC)CCN=[N+]=[N-]"),
    ("C1COS(=O)(=O)O1", "cyclic sulfate", None, "[F-]", None, "O=S(=O)([O-])OCCF"),
    ("O=C1CCO1", "carboxylate", None, "[Cl-]", None, "O=C([O-])CCCl"),
    ("C1COC1", "oxetane", None, "C[S-]", None, "CSCCCO"),
]


@pytest.mark.parametrize(("smiles", "group", "degree", "nucleophile", "symbol", "product"), SUBSTITUTIONS)
def test_substitution(
    smiles: str, group: str, degree: str | None, nucleophile: str, symbol: str | None, product: str
) -> None:
    substrate = parse_smiles(smiles)
    edit = substitute(substrate, _site(substrate, group, degree), _nucleophile(nucleophile, symbol))
    assert edit.product == parse_smiles(product)


def _letter(structure: Structure) -> str:
    mol = Chem.Mol(structure.mol)
    rdCIPLabeler.AssignCIPLabels(mol)
    (letter,) = [a.GetProp("_CIPCode") for a in mol.GetAtoms() if a.HasProp("_CIPCode")]
    return str(letter)


@pytest.mark.parametrize(
    ("smiles", "nucleophile", "before", "after"),
    [
        # Inversion by geometry; the letter follows the priorities, which may change rank (common practice).
        ("CC[C@H](C)Br", "[N-]=[N+]=[N-]", "S", "R"),
        ("CCOC(=O)[C@H](C)Br", "[C-]#N", "S", "S"),
    ],
)
def test_inversion_is_no_matter_of_letters(smiles: str, nucleophile: str, before: str, after: str) -> None:
    substrate = parse_smiles(smiles)
    site = _site(substrate, "bromide")
    edit = substitute(substrate, site, _nucleophile(nucleophile))
    assert (_letter(substrate), _letter(edit.product)) == (before, after)
    assert edit.effect is StereoEffect.INVERSION
    assert course_between(substrate, edit.product, site, _nucleophile(nucleophile)) is StereoEffect.INVERSION


@pytest.mark.parametrize(
    ("product", "course"),
    [
        ("CCCCCC[C@@H](C)N=[N+]=[N-]", StereoEffect.INVERSION),
        ("CCCCCC[C@H](C)N=[N+]=[N-]", StereoEffect.RETENTION),
        ("CCCCCCC(C)N=[N+]=[N-]", StereoEffect.NOT_DETERMINED),
        ("CCCCCCCCN=[N+]=[N-]", None),
        ("CCCCCC[C@H](C)Cl", None),
    ],
)
def test_the_course_is_read_off_a_recorded_product(product: str, course: StereoEffect | None) -> None:
    mesylate = parse_smiles("CCCCCC[C@H](C)OS(C)(=O)=O")
    azide = _nucleophile("[Na+].[N-]=[N+]=[N-]")
    assert course_between(mesylate, parse_smiles(product), _site(mesylate), azide) == course


def test_an_achiral_carbon_has_no_course() -> None:
    butyl = parse_smiles("CCCCBr")
    azide = _nucleophile("[N-]=[N+]=[N-]")
    product = parse_smiles("CCCCN=[N+]=[N-]")
    assert course_between(butyl, product, _site(butyl), azide) is StereoEffect.NOT_APPLICABLE


def test_undrawn_configuration_stays_undrawn() -> None:
    substrate = parse_smiles("CCC(C)Br")
    edit = substitute(substrate, _site(substrate), _nucleophile("[N-]=[N+]=[N-]"))
    assert edit.product.smiles == parse_smiles("CCC(C)N=[N+]=[N-]").smiles
    assert edit.effect is StereoEffect.NOT_APPLICABLE


def test_atoms_are_followed_into_the_product() -> None:
    substrate = parse_smiles("CC[C@H](C)OS(C)(=O)=O")
    site = _site(substrate)
    azide = _nucleophile("[N-]=[N+]=[N-]")
    edit = substitute(substrate, site, azide)
    alpha, attacker = edit.from_substrate[site.alpha_carbon], edit.from_nucleophile[azide.atom]
    assert attacker in dict(edit.product.atoms[alpha].neighbours)
    assert site.leaving_atom not in edit.from_substrate
    assert [s.smiles for s in edit.others] == _canonical("CS(=O)(=O)[O-]")


# substrate, group, product, without regard to which group attacks
RINGS = [
    ("OCCCCCl", "chloride", "tetrahydrofuran", "C1CCOC1", "alcohol"),
    ("O[C@@H]1CCCC[C@H]1Cl", "chloride", "epoxide", "C1CC[C@H]2O[C@H]2C1", "alcohol"),
    ("CCSCCCl", "chloride", "episulfonium", "CC[S+]1CC1", "sulfide"),
    ("CCN(CC)CCCl", "chloride", "aziridinium", "CC[N+]1(CC)CC1", "amine, tertiary"),
    ("C[C@H](Br)C(=O)[O-]", "bromide", "alpha-lactone", "C[C@H]1OC1=O", "carboxylate"),
    ("C[C@H](O)[C@@H](C)[OH2+]", "water", "epoxide", "C[C@@H]1O[C@H]1C", "alcohol"),
    # Erythro closes to trans: Winstein and Lucas, J. Am. Chem. Soc. 1939, 61, 1576 (from memory).
    ("C[C@H](Br)[C@@H](C)[OH2+]", "water", "bromonium", "C[C@@H]1[Br+][C@H]1C", "organohalide"),
    (
        "CC(=O)O[C@@H]1CCCC[C@H]1OS(C)(=O)=O",
        "mesylate",
        "acetoxonium",
        "CC1=[O+][C@@H]2CCCC[C@@H]2O1",
        "ester carbonyl",
    ),
]


@pytest.mark.parametrize(("smiles", "group", "ring", "product", "kind"), RINGS)
def test_neighbouring_groups_close_rings_from_behind(
    smiles: str, group: str, ring: str, product: str, kind: str
) -> None:
    # Capon and McManus, Neighboring Group Participation, 1976 (from memory).
    substrate = parse_smiles(smiles)
    participant = next(n for n in neighbouring_groups(substrate) if n.kind == kind)
    assert cyclise(substrate, _site(substrate, group), participant).product == parse_smiles(product), ring


def test_a_phenonium_ion_is_a_spiro_cation() -> None:
    substrate = parse_smiles("C[C@H](OS(C)(=O)=O)[C@@H](C)c1ccccc1")
    arene = next(n for n in neighbouring_groups(substrate) if n.kind == "arene")
    ion = cyclise(substrate, _site(substrate, "mesylate"), arene).product
    assert ion.charge == 1
    assert ion.flat == parse_smiles("CC1C(C)C12C=CC=C[CH+]2").flat
    assert ion.stereocentres.specified >= 2


def test_a_foreign_group_closes_no_ring() -> None:
    chloride = parse_smiles("OCCCCCl")
    with pytest.raises(ValueError, match="belongs to"):
        cyclise(chloride, _site(chloride, "chloride"), _nucleophile("CO"))


# substrate, leaving group, course, every alkene over all beta carbons
ELIMINATIONS = [
    ("CC(C)(C)Br", "bromide", "anti", ["C=C(C)C"]),
    ("CCC(C)Br", "bromide", "anti", ["C/C=C/C", "C/C=C\\C", "C=CCC"]),
    # McMurry, Organic Chemistry, E2 section: meso-1,2-dibromo-1,2-diphenylethane gives only the E alkene.
    (
        "Br[C@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "bromide",
        "anti",
        ["Br/C(=C/c1ccccc1)c1ccccc1"],
    ),
    # Cram, Greene and DePuy, J. Am. Chem. Soc. 1956, 78, 790: the erythro bromide gives the cis-phenyl alkene.
    (
        "C[C@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "bromide",
        "anti",
        ["C/C(=C/c1ccccc1)c1ccccc1"],
    ),
    # ... and the chiral dibromide the other bromostilbene (Pfeiffer, Z. Phys. Chem. 1904, 48, 58; from memory).
    (
        "Br[C@@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "bromide",
        "anti",
        ["Br/C(=C\\c1ccccc1)c1ccccc1"],
    ),
    (
        "Br[C@@H](c1ccccc1)[C@@H](Br)c1ccccc1",
        "bromide",
        "syn",
        ["Br/C(=C/c1ccccc1)c1ccccc1"],
    ),
    # Hughes, Ingold and Rose, J. Chem. Soc. 1953, 3839 (from memory): menthyl chloride gives 2-menthene alone,
    # neomenthyl chloride both menthenes.
    (
        "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1Cl",
        "chloride",
        "anti",
        ["CC(C)[C@H]1C=C[C@H](C)CC1"],
    ),
    (
        "CC(C)[C@@H]1CC[C@@H](C)C[C@@H]1Cl",
        "chloride",
        "anti",
        ["CC(C)[C@H]1C=C[C@H](C)CC1", "CC(C)C1=CC[C@H](C)CC1"],
    ),
    # Bredt's rule: no double bond at the bridgehead of a small bicycle.
    ("ClC12CCC(CC1)C2", "chloride", "anti", []),
    ("BrC1CC2CCC1C2", "bromide", "anti", ["C1=CC2CCC1C2"]),
    ("BrC1CCCCCCC1", "bromide", "anti", ["C1=C\\CCCCCC/1", "C1=C/CCCCCC/1"]),
    ("BrC1CCCCC1", "bromide", "anti", ["C1=CCCCC1"]),
    # Second elimination of a dihalide.
    ("Br/C(=C/c1ccccc1)c1ccccc1", "bromide", "anti", ["C(#Cc1ccccc1)c1ccccc1"]),
    ("CC(Br)=CC", "bromide", "anti", ["CC#CC"]),
    ("BrC1=CCCCC1", "bromide", "anti", []),  # no cyclohexyne
    ("Brc1ccccc1", "bromide", "anti", []),
    ("CC[N+](C)(C)C", "ammonium", "anti", ["C=C"]),
    ("CC1CO1", "epoxide", "anti", ["C=CCO"]),
]


@pytest.mark.parametrize(("smiles", "group", "effect", "alkenes"), ELIMINATIONS)
def test_elimination(smiles: str, group: str, effect: str, alkenes: list[str]) -> None:
    substrate = parse_smiles(smiles)
    found = {
        edit.product.smiles
        for site in sites_of(substrate, group)
        for beta in site.beta_with_hydrogen
        for edit in eliminate(substrate, site, beta.atom, effect=StereoEffect(effect))
    }
    assert sorted(found) == _canonical(*alkenes)


def test_loss_of_deuterium_and_of_hydrogen_lead_to_opposite_geometry() -> None:
    # Skell and Allen, J. Am. Chem. Soc. 1959, 81, 5383 (from memory): anti loss of HBr and DBr from one
    # diastereomer of 3-deuterio-2-bromobutane gives one 2-butene with and the other without deuterium.
    for smiles in ("C[C@H](Br)[C@H](C)[2H]", "C[C@H](Br)[C@@H](C)[2H]"):
        substrate = parse_smiles(smiles)
        (site,) = perceive_sites(substrate)
        beta = next(b for b in site.beta if b.hydrogen_isotopes)
        labelled = {
            ("[2H]" in edit.product.smiles): edit.geometry
            for edit in eliminate(substrate, site, beta.atom)
            if edit.product.flat_smiles in {"CC=CC", "[2H]C(C)=CC"}
        }
        assert set(labelled.values()) == {"E", "Z"}, labelled


def test_the_geometry_made_is_named() -> None:
    substrate = parse_smiles("CCC(C)Br")
    (site,) = perceive_sites(substrate)
    named = {
        edit.product.smiles: edit.geometry
        for beta in site.beta_with_hydrogen
        for edit in eliminate(substrate, site, beta.atom)
    }
    assert named == {"C/C=C/C": "E", "C/C=C\\C": "Z", "C=CCC": None}


def _cation(smiles: str, group: str | None = None) -> Cation:
    substrate = parse_smiles(smiles)
    return ionise(substrate, _site(substrate, group))


def test_capture_takes_both_faces_of_what_was_a_stereocentre() -> None:
    edits = capture(_cation("C[C@@H](Cl)c1ccccc1"), _nucleophile("O"))
    by_effect = {e.effect: e.product for e in edits}
    assert by_effect[StereoEffect.INVERSION] == parse_smiles("C[C@H](O)c1ccccc1")
    assert by_effect[StereoEffect.RETENTION] == parse_smiles("C[C@@H](O)c1ccccc1")


def test_capture_leaves_a_lone_new_stereocentre_undrawn_and_draws_diastereomers() -> None:
    assert _products(capture(_cation("CCC(C)Br"), _nucleophile("O"))) == _canonical("CCC(C)O")
    assert _products(capture(_cation("CC(C)(C)Cl"), _nucleophile("O"))) == _canonical("CC(C)(C)O")
    beside_a_centre = capture(_cation("CC(Cl)[C@H](C)CC"), _nucleophile("O"))
    assert _products(beside_a_centre) == _canonical("C[C@@H](O)[C@H](C)CC", "C[C@H](O)[C@H](C)CC")


@pytest.mark.parametrize(
    ("smiles", "cation"),
    [
        ("CC(C)C(C)Br", "CC[C+](C)C"),
        ("CC(O)C(C)(C)C", "CC(C)[C+](C)C"),
        ("OC(C)C1CCC1", "CC1CCC[CH+]1"),
        ("OC1CCCCC1", "[CH2+]C1CCCC1"),
        ("CC(C)(c1ccccc1)CBr", "C[C+](C)Cc1ccccc1"),
        ("CC1(C)C2CCC1(C)C(Cl)C2", "C[C+]1C2CCC(C2)C1(C)C"),  # isobornyl to camphenyl
    ],
)
def test_shifts_of_hydride_alkyl_and_aryl(smiles: str, cation: str) -> None:
    # Carey and Sundberg, Part A, ch. 4.4 (from memory).
    first = _cation(smiles)
    found = {shift_12(first, *move).structure.flat_smiles for move in migrating_groups(first)}
    assert parse_smiles(cation).smiles in found


def test_a_migrating_group_keeps_its_configuration() -> None:
    # Retention in the migrating group of a 1,2-shift (March, ch. 18; from memory).
    first = _cation("CC[C@](C)([2H])C(C)(C)C(C)Br")
    moves = [m for m in migrating_groups(first) if m[1] is not None]
    moved = {shift_12(first, *m).structure.smiles for m in moves}
    assert parse_smiles("CC[C@](C)([2H])C(C)[C+](C)C").smiles in moved


def test_neopentyl_goes_straight_to_the_tertiary_cation() -> None:
    substrate = parse_smiles("CC(C)(C)CI")
    site = _site(substrate)
    quaternary = site.beta[0].atom
    methyl = next(n for n, _ in substrate.atoms[quaternary].neighbours if n != site.alpha_carbon)
    cation = ionise_with_shift(substrate, site, quaternary, methyl)
    assert cation.structure == parse_smiles("CC[C+](C)C")
    assert [s.smiles for s in cation.others] == ["[I-]"]


def test_allylic_cations_have_two_ends() -> None:
    forms = allylic_forms(_cation("CC(C)=CCCl"))
    assert [f.structure.smiles for f in forms] == _canonical("C=C[C+](C)C")
    assert [f.structure.smiles for f in allylic_forms(_cation("C=CC(C)Cl"))] == _canonical(
        "C/C=C/[CH2+]", "C/C=C\\[CH2+]"
    )


def test_cyclopropyl_cations_open() -> None:
    cation = _cation("Cc1ccc(S(=O)(=O)OC2CC2)cc1", "tosylate")
    near, far = (n for n, _ in cation.structure.atoms[cation.centre].neighbours)
    assert fragment(cation, near, far).structure == parse_smiles("C=C[CH2+]")
    assert fragment(cation, near, far, cis=True).structure == parse_smiles("C=C[CH2+]")  # neither cis nor trans
    with pytest.raises(ValueError, match="fragment"):
        fragment(_cation("C=CCBr"), *_chain(_cation("C=CCBr")))


def _chain(cation: Cation) -> tuple[int, int]:
    atoms = cation.structure.atoms
    near = atoms[cation.centre].neighbours[0][0]
    far = next(n for n, _ in atoms[near].neighbours if n != cation.centre)
    return near, far


def test_loss_of_a_proton_gives_each_alkene_once() -> None:
    cation = _cation("CCC(C)(C)O", "hydroxyl")
    found = {
        e.product.smiles
        for near, _ in cation.structure.atoms[cation.centre].neighbours
        for e in lose_proton(cation, near)
    }
    assert sorted(found) == _canonical("CC=C(C)C", "C=C(C)CC")


def test_pinacol_cations_lose_their_proton_from_oxygen() -> None:
    cation = _cation("CC(C)(O)C(C)(C)O", "hydroxyl")
    methyls = [m for m in migrating_groups(cation) if m[1] is not None]
    shifted = shift_12(cation, *next(m for m in methyls if cation.structure.atoms[m[1] or 0].symbol == "C"))
    oxygen = next(
        n for n, _ in shifted.structure.atoms[shifted.centre].neighbours if shifted.structure.atoms[n].symbol == "O"
    )
    assert _products(lose_proton(shifted, oxygen)) == _canonical("CC(=O)C(C)(C)C")


def test_allylic_transposition() -> None:
    thiolate = _nucleophile("[S-]c1ccccc1")
    tertiary = parse_smiles("C=CC(C)(C)Cl")
    assert _products(transpose_allylic(tertiary, _site(tertiary), thiolate)) == _canonical("CC(C)=CCSc1ccccc1")
    secondary = parse_smiles("C=CC(C)Cl")
    found = transpose_allylic(secondary, _site(secondary, "chloride"), _nucleophile("CCNCC"))
    assert _products(found) == _canonical("C/C=C/CN(CC)CC", "C/C=C\\CN(CC)CC")
    assert transpose_allylic(parse_smiles("CCCl"), _site(parse_smiles("CCCl")), thiolate) == ()


def test_hydrogen_halides_add_either_way_round() -> None:
    alkene = parse_smiles("CC1=CCCCC1")
    products = {e.product.smiles for s in sites_of(alkene, "none") for e in add_hx(alkene, s, _nucleophile("Br"))}
    assert sorted(products) == _canonical("CC1(Br)CCCCC1", "CC1CCCCC1Br")
    tertiary = next(s for s in sites_of(alkene, "none") if s.carbon_neighbours == 3)
    assert protonate(alkene, tertiary).structure == parse_smiles("C[C+]1CCCCC1")
    hydrate = add_hx(alkene, tertiary, _nucleophile("O"))
    assert _products(hydrate) == _canonical("CC1(O)CCCCC1")
    assert hydrate[0].protons_released == 0


def test_alkynes_add_hydrogen_halide_to_both_alkenes() -> None:
    alkyne = parse_smiles("CC#CC")
    (site,) = sites_of(alkyne, "none")
    assert _products(add_hx(alkyne, site, _nucleophile("[Cl-]"))) == _canonical("C/C=C(/C)Cl", "C/C=C(\\C)Cl")


@pytest.mark.parametrize(
    ("smiles", "products"),
    [
        # Anti addition of bromine (McMurry, Organic Chemistry, ch. 8; from memory).
        ("C/C=C/C", ["C[C@H](Br)[C@@H](C)Br"]),
        ("C/C=C\\C", ["C[C@@H](Br)[C@@H](C)Br"]),
        ("C1=CCCCC1", ["Br[C@@H]1CCCC[C@H]1Br"]),
        ("CC=CC", ["CC(Br)C(C)Br"]),
        ("C=CC", ["CC(Br)CBr"]),
        ("CC#CC", ["C/C(Br)=C(/C)Br"]),
        ("C/C(Br)=C(/C)Br", ["CC(Br)(Br)C(C)(Br)Br"]),
    ],
)
def test_bromine_adds_anti(smiles: str, products: list[str]) -> None:
    alkene = parse_smiles(smiles)
    found = add_x2(alkene, sites_of(alkene, "none")[0], parse_smiles("BrBr"))
    either = {frozenset({e.product.smiles, e.product.mirror_image.smiles}) for e in found}
    wanted = [parse_smiles(p) for p in products]
    assert either == {frozenset({w.smiles, w.mirror_image.smiles}) for w in wanted}


def test_every_activation_makes_the_group_it_is_named_for_and_keeps_the_configuration() -> None:
    alcohol = parse_smiles("CCCCCC[C@H](C)O")
    site = _site(alcohol, "hydroxyl")
    for group in activation_groups():
        edit = activate_hydroxyl(alcohol, site, group)
        assert group in leaving_group_names()
        (made,) = [s for s in sites_of(edit.product, group) if s.alpha_carbon == edit.from_substrate[site.alpha_carbon]]
        assert made.leaving_atom == edit.from_substrate[site.leaving_atom or 0]
        assert edit.effect is StereoEffect.RETENTION
    mesylate = activate_hydroxyl(alcohol, site, "mesylate")
    assert mesylate.product == parse_smiles("CCCCCC[C@H](C)OS(C)(=O)=O")
    with pytest.raises(ValueError, match="made from no hydroxyl"):
        activate_hydroxyl(alcohol, site, "azide")


@pytest.mark.parametrize(
    ("smiles", "ends", "violates"),
    [
        # Bredt's rule, IUPAC glossary; trans-cyclooctene is the smallest isolable trans-cycloalkene (March).
        ("C1=C2CCC(C1)C2", (0, 1), True),
        ("C1=CC2CCC1C2", (0, 1), False),
        ("C1CCCC2=C1CCCC2", (4, 5), False),
        ("C1#CCCCC1", (0, 1), True),
        ("C1#CCCCCCC1", (0, 1), False),
        ("C1=C=CCCC1", (0, 1), True),
        ("C1CCCC2CCCCCCC(=C2)C1", (11, 12), False),
    ],
)
def test_bredts_rule(smiles: str, ends: tuple[int, int], violates: bool) -> None:
    structure = parse_smiles(smiles)
    one, other = (structure.typed_order[end] for end in ends)
    assert violates_bredt(structure, one, other) is violates


def test_wrong_kinds_of_site_are_refused() -> None:
    alkene, bromide = parse_smiles("C=CC"), parse_smiles("CCBr")
    with pytest.raises(ValueError, match="nothing leaves"):
        ionise(alkene, _site(alkene))
    with pytest.raises(ValueError, match="no end of a multiple bond"):
        protonate(bromide, _site(bromide))
    with pytest.raises(ValueError, match="no halogen molecule"):
        add_x2(alkene, _site(alkene), parse_smiles("CC"))


def _opened(ion: Structure, group: str, nucleophile: str) -> list[str]:
    return _products(tuple(substitute(ion, s, _nucleophile(nucleophile)) for s in sites_of(ion, group)))


# Substrate, its leaving group, the group that takes part, the bridged ion's name, nucleophile, all products.
DOUBLE_DISPLACEMENTS = [
    # Winstein, Hess and Buckles, J. Am. Chem. Soc. 1942, 64, 2796 (from memory): the trans diacetate, racemic.
    (
        "CC(=O)O[C@@H]1CCCC[C@H]1OS(C)(=O)=O",
        ("mesylate", "ester carbonyl", "acyloxonium"),
        "CC(=O)[O-]",
        ["CC(=O)O[C@@H]1CCCC[C@H]1OC(C)=O", "CC(=O)O[C@H]1CCCC[C@@H]1OC(C)=O"],
    ),
    # Cram, J. Am. Chem. Soc. 1949, 71, 3863 (from memory): threo tosylate gives racemic threo acetate.
    (
        "C[C@@H](OS(C)(=O)=O)[C@@H](C)c1ccccc1",
        ("mesylate", "arene", "phenonium"),
        "CC(=O)O",
        ["C[C@@H](OC(C)=O)[C@@H](C)c1ccccc1", "C[C@H](OC(C)=O)[C@H](C)c1ccccc1"],
    ),
    # ... and the erythro one the erythro acetate, optically active.
    (
        "C[C@H](OS(C)(=O)=O)[C@@H](C)c1ccccc1",
        ("mesylate", "arene", "phenonium"),
        "CC(=O)O",
        ["C[C@H](OC(C)=O)[C@@H](C)c1ccccc1"],
    ),
    # Winstein and Lucas, J. Am. Chem. Soc. 1939, 61, 1576 and 2845: erythro-3-bromo-2-butanol gives meso dibromide,
    # threo racemic dibromide.
    (
        "C[C@H]([OH2+])[C@@H](C)Br",
        ("water", "organohalide", "halonium"),
        "[Br-]",
        ["C[C@H](Br)[C@@H](C)Br"],
    ),
    (
        "C[C@H]([OH2+])[C@H](C)Br",
        ("water", "organohalide", "halonium"),
        "[Br-]",
        ["C[C@H](Br)[C@H](C)Br", "C[C@@H](Br)[C@@H](C)Br"],
    ),
    # Cowdrey, Hughes and Ingold, J. Chem. Soc. 1937, 1208 (from memory): retention through the alpha-lactone.
    ("C[C@H](Br)C(=O)[O-]", ("bromide", "carboxylate", "carboxylate"), "O", ["C[C@H](O)C(=O)[O-]"]),
    ("CCSC[C@H](C)Cl", ("chloride", "sulfide", "episulfonium"), "O", ["CCSC[C@H](C)O", "CCS[C@H](C)CO"]),
]


@pytest.mark.parametrize(("smiles", "groups", "nucleophile", "products"), DOUBLE_DISPLACEMENTS)
def test_two_inversions_or_the_symmetry_of_the_ion_decide_the_course(
    smiles: str, groups: tuple[str, str, str], nucleophile: str, products: list[str]
) -> None:
    leaving, kind, bridged = groups
    substrate = parse_smiles(smiles)
    participant = next(n for n in neighbouring_groups(substrate) if n.kind == kind)
    ion = cyclise(substrate, _site(substrate, leaving), participant).product
    assert sorted(set(_opened(ion, bridged, nucleophile))) == _canonical(*products)


def test_amines_become_diazonium_ions() -> None:
    amine = parse_smiles("CC[C@H](C)N")
    edit = diazotise(amine, _site(amine, "amine"))
    assert edit.product == parse_smiles("CC[C@H](C)[N+]#N")
    assert [s.smiles for s in edit.others] == ["O", "O"]
    assert (edit.protons_released, edit.effect) == (-1, StereoEffect.RETENTION)
    with pytest.raises(ValueError, match="bears no NH2"):
        diazotise(parse_smiles("CNC"), _site(parse_smiles("CNC")))


@pytest.mark.parametrize(
    ("enol", "ketone"),
    [
        ("C=C(C)O", "CC(C)=O"),
        ("OC=C", "CC=O"),
        ("OC1=CCCCC1", "O=C1CCCCC1"),
        ("Oc1ccccc1", "Oc1ccccc1"),
        ("CCO", "CCO"),
        ("OC=CO", "O=CCO"),
    ],
)
def test_enols_are_written_as_carbonyl_compounds(enol: str, ketone: str) -> None:
    assert keto_form(parse_smiles(enol)) == parse_smiles(ketone)


def test_an_enol_made_by_an_edit_comes_out_as_the_ketone() -> None:
    alkyne = parse_smiles("C#CC")
    inner = next(s for s in sites_of(alkyne, "none") if s.carbon_neighbours == 2)
    assert _products(add_hx(alkyne, inner, _nucleophile("O"))) == _canonical("CC(C)=O")


def test_a_drawn_carbocation_can_be_captured() -> None:
    (cation,) = carbocations(parse_smiles("C[C+](C)C"))
    assert _products(capture(cation, _nucleophile("O"))) == _canonical("CC(C)(C)O")
    assert carbocations(parse_smiles("CC")) == ()
