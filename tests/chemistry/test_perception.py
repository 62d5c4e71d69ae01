"""Where structures react: tables written by hand in textbook words (March's Advanced Organic Chemistry)."""

import pytest

from builder.chemistry.perception import (
    Hybridisation,
    SiteStereo,
    attacking_atoms,
    expected_class_names,
    leaving_group_names,
    leaving_groups,
    neighbouring_groups,
    perceive_sites,
    site_class_meanings,
    site_class_names,
    sites_of,
    stem_of,
)
from builder.chemistry.structure import name_atom, parse_smiles

# substrate, leaving group, the class words a careful writer would give for all its sites
SITES = [
    ("CBr", "bromide", "methyl"),
    ("CI", "iodide", "methyl"),
    ("CCCCCl", "chloride", "primary"),
    ("CC(C)CBr", "bromide", "primary"),
    ("CC(C)(C)CBr", "bromide", "primary neopentyl"),
    ("CC(C)Br", "bromide", "secondary"),
    ("CCC(C)I", "iodide", "secondary"),
    ("CC(C)(C)C(C)Cl", "chloride", "secondary neopentyl"),
    ("CC(C)(C)Cl", "chloride", "tertiary"),
    ("CC(C)(C)C(C)(C)Cl", "chloride", "tertiary"),
    ("CC1(Cl)CCCCC1", "chloride", "tertiary"),
    ("C=CCBr", "bromide", "primary allylic"),
    ("C=CC(C)(C)Cl", "chloride", "tertiary allylic"),
    ("BrC1CCCC=C1", "bromide", "secondary allylic"),
    ("ClCc1ccccc1", "chloride", "primary benzylic"),
    ("CC(Br)c1ccccc1", "bromide", "secondary benzylic"),
    ("ClC(c1ccccc1)(c1ccccc1)c1ccccc1", "chloride", "tertiary benzylic"),
    ("ClCc1ccncc1", "chloride", "primary benzylic"),
    ("ClCc1ccsc1", "chloride", "primary benzylic"),
    ("C=CC(Cl)c1ccccc1", "chloride", "secondary allylic benzylic"),
    ("C#CCBr", "bromide", "primary propargylic"),
    ("CC(Cl)C#CC", "chloride", "secondary propargylic"),
    ("CC(=O)CCl", "chloride", "primary alpha-carbonyl"),
    ("CCOC(=O)C(C)Br", "bromide", "secondary alpha-carbonyl"),
    ("CC(Br)C(=O)[O-]", "bromide", "secondary alpha-carbonyl"),
    ("NC(=O)CCl", "chloride", "primary alpha-carbonyl"),
    ("N#CCCl", "chloride", "primary alpha-nitrile"),
    ("COCCl", "chloride", "primary alpha-alkoxy"),
    ("ClC1CCCCO1", "chloride", "secondary alpha-alkoxy"),
    ("CN(C)CCl", "chloride", "primary alpha-amino"),
    ("CSCCl", "chloride", "primary alpha-thio"),
    ("BrCC1CC1", "bromide", "primary cyclopropylmethyl"),
    ("BrC1CC1", "bromide", "secondary"),
    ("C1CC1C(C)(C)Cl", "chloride", "tertiary cyclopropylmethyl"),
    ("BrC=C", "bromide", "vinylic"),
    ("CC(Cl)=CC", "chloride", "vinylic"),
    ("Brc1ccccc1", "bromide", "aryl"),
    ("Clc1ccncc1", "chloride", "aryl"),
    ("CC#CBr", "bromide", "alkynyl"),
    ("CC(=O)Cl", "chloride", "acyl"),
    ("O=C(Cl)c1ccccc1", "chloride", "acyl"),
    ("BrC12CC3CC(CC(C3)C1)C2", "bromide", "tertiary bridgehead"),
    ("ClC12CCC(CC1)C2", "chloride", "tertiary bridgehead"),
    ("BrC12CCC(CC1)CC2", "bromide", "tertiary bridgehead"),
    ("BrC12C3C4C1C5C2C3C45", "bromide", "tertiary bridgehead"),
    ("BrC1CC2CCC1C2", "bromide", "secondary"),
    ("BrC1CCC2CCCCC2C1", "bromide", "secondary"),
    ("ClC12CCCCC1CCCC2", "chloride", "tertiary"),
    ("CCCCCCF", "fluoride", "primary"),
    ("CCCC", None, ""),
    ("FC(F)(F)c1ccccc1", None, ""),
    ("CCOS(=O)(=O)c1ccc(C)cc1", "tosylate", "primary"),
    ("CCOS(=O)(=O)c1cccc(C)c1", "sulfonate", "primary"),
    ("CCOS(=O)(=O)c1ccc(Br)cc1", "brosylate", "primary"),
    ("CCOS(=O)(=O)c1ccc([N+](=O)[O-])cc1", "nosylate", "primary"),
    ("CCOS(=O)(=O)c1ccccc1[N+](=O)[O-]", "nosylate", "primary"),
    ("CCOS(=O)(=O)c1ccccc1", "benzenesulfonate", "primary"),
    ("CC(C)OS(C)(=O)=O", "mesylate", "secondary"),
    ("CCOS(=O)(=O)CC", "sulfonate", "primary"),
    ("O=S1(=O)CCCO1", "sulfonate", "primary"),
    ("CCOS(=O)(=O)C(F)(F)F", "triflate", "primary"),
    ("CCOS(=O)(=O)C(F)(F)C(F)(F)C(F)(F)C(F)(F)F", "nonaflate", "primary"),
    ("CCOS(=O)(=O)CC(F)(F)F", "tresylate", "primary"),
    ("C=C(C)OS(=O)(=O)C(F)(F)F", "triflate", "vinylic"),
    ("O=S(=O)(Oc1ccccc1)C(F)(F)F", "triflate", "aryl"),
    ("COS(=O)(=O)OC", "alkyl sulfate", "methyl"),
    ("CCOS(=O)(=O)[O-]", "alkyl sulfate", "primary"),
    ("CC1COS(=O)(=O)O1", "cyclic sulfate", "primary secondary"),
    ("C=CCOP(=O)(OCC)OCC", "phosphate", "primary allylic"),
    ("CCO[P+](c1ccccc1)(c1ccccc1)c1ccccc1", "alkoxyphosphonium", "primary"),
    ("CCOS(=O)Cl", "chlorosulfite", "primary"),
    ("CC(C)(C)OC(=O)C(F)(F)F", "trifluoroacetate", "tertiary"),
    ("CC(C)(C)OC(=O)c1ccc([N+](=O)[O-])cc1", "4-nitrobenzoate", "tertiary"),
    ("CC(=O)OC(C)(C)C", "carboxylate", "tertiary"),
    ("COC(=O)c1ccccc1", "carboxylate", "methyl"),
    ("O=COCC", "carboxylate", "primary"),
    ("C=CCOC(=O)OC", "carbonate", "primary allylic methyl"),
    ("CC(C)(C)OC(=O)NC", "carbamate", "tertiary"),
    ("CC(OC(=N)C(Cl)(Cl)Cl)c1ccccc1", "trichloroacetimidate", "secondary benzylic"),
    ("C[OH2+]", "water", "methyl"),
    ("CC[OH+]CC", "protonated ether", "primary"),
    ("C[O+](C)C", "trialkyloxonium", "methyl"),
    ("CC1CO1", "epoxide", "primary secondary"),
    ("c1ccc(C2CO2)cc1", "epoxide", "primary secondary benzylic"),
    ("CC1(C)CO1", "epoxide", "primary tertiary"),
    ("C=CC1CO1", "epoxide", "primary secondary allylic"),
    ("C1CC2OC2C1", "epoxide", "secondary"),
    ("CC1C[OH+]1", "epoxide", "primary secondary"),
    ("CC1CN1", "aziridine", "primary secondary"),
    ("CC1C[N+]1(C)C", "aziridinium", "primary secondary"),
    ("CC1CS1", "thiirane", "primary secondary"),
    ("CC1C[S+]1C", "episulfonium", "primary secondary"),
    ("CC1C[Br+]1", "halonium", "primary secondary"),
    ("CC1=[O+]C2CCCCC2O1", "acyloxonium", "secondary"),
    ("CC1CC12C=CC=C[CH+]2", "phenonium", "primary secondary"),
    ("C1COC1", "oxetane", "primary"),
    ("CC[N+](C)(C)C", "ammonium", "primary methyl"),
    ("C[N+](C)(C)c1ccccc1", "ammonium", "methyl aryl"),
    ("C[n+]1ccccc1", "ammonium", "methyl"),
    ("C[NH3+]", "ammonium", "methyl"),
    ("CC[S+](C)C", "sulfonium", "primary methyl"),
    ("CCCC[N+]#N", "diazonium", "primary"),
    ("N#[N+]c1ccccc1", "diazonium", "aryl"),
    ("C[I+]c1ccccc1", "iodonium", "methyl aryl"),
    ("CCN=[N+]=[N-]", "azide", "primary"),
    ("CCC#N", "cyanide", "primary"),
    ("CC[N+](=O)[O-]", "nitro", "primary"),
    ("CCS(=O)(=O)c1ccccc1", "sulfone", "primary aryl"),
    ("CC[N+](C)(C)[O-]", "amine oxide", "primary methyl"),
    ("CCO", "hydroxyl", "primary"),
    ("Oc1ccccc1", "hydroxyl", "aryl"),
    ("CC(O)O", "hydroxyl", "secondary alpha-alkoxy"),
    ("CCOCC", "ether", "primary"),
    ("COc1ccccc1", "phenoxide", "methyl"),
    ("CCOc1ccc([N+](=O)[O-])cc1[N+](=O)[O-]", "2,4-dinitrophenoxide", "primary"),
    ("CCO[Si](C)(C)C", "silyl ether", "primary"),
    ("CCS", "thiol", "primary"),
    ("CCSCC", "sulfide", "primary"),
    ("CCN", "amine", "primary"),
]


@pytest.mark.parametrize(("smiles", "group", "words"), SITES)
def test_leaving_group_and_classes_have_their_textbook_names(smiles: str, group: str | None, words: str) -> None:
    sites = [s for s in perceive_sites(parse_smiles(smiles)) if not s.is_addition]
    if group is None:
        assert sites == []
        return
    named = [s for s in sites if s.leaving_group == group]
    assert named, [s.leaving_group for s in sites]
    found = frozenset().union(*(s.classes for s in named)) & expected_class_names()
    assert found == set(words.split())


def test_the_closed_lists_agree_with_what_is_perceived() -> None:
    for smiles, _, _ in SITES:
        for site in perceive_sites(parse_smiles(smiles)):
            assert site.leaving_group in leaving_group_names()
            assert site.classes <= set(site_class_names())
    assert set(site_class_meanings()) == set(site_class_names())


def test_every_leaving_group_of_the_list_is_perceived_somewhere() -> None:
    groups = {group for _, group, _ in SITES if group} | {"perchlorate", "phosphonium", "sulfoxide"}
    groups |= {"fluorosulfonate", "iodonium", "cyclic sulfate", "selenoxide", "xanthate"}
    extra = {"CCOCl(=O)(=O)=O": "perchlorate", "CC[P+](C)(C)C": "phosphonium"}
    extra |= {"CC[Se](=O)c1ccccc1": "selenoxide", "CCC(C)OC(=S)SC": "xanthate"}
    extra |= {"CCS(C)=O": "sulfoxide", "CCOS(=O)(=O)F": "fluorosulfonate"}
    for smiles, group in extra.items():
        if group != "perchlorate":
            assert sites_of(parse_smiles(smiles), group), group
    assert groups == set(leaving_groups())


STEMS = [
    # substrate, leaving group, what stays with its alpha carbon marked
    ("CCCCBr", "bromide", "CCC[CH2:1]"),
    ("CCCCOS(=O)(=O)c1ccc(C)cc1", "tosylate", "CCC[CH2:1]"),
    ("CC[C@H](C)OS(C)(=O)=O", "mesylate", "CC[CH:1]C"),
    ("CC[C@@H](C)Br", "bromide", "CC[CH:1]C"),
    ("CCCC[N+](C)(C)C.[I-]", "ammonium", "CCC[CH2:1]"),
    ("CC1CO1", "epoxide", "CC1O[CH2:1]1"),
    ("CC1=CCCCC1", "none", "CC1=[CH:1]CCCC1"),
]


@pytest.mark.parametrize(("smiles", "group", "stem"), STEMS)
def test_a_stem_is_the_same_whatever_leaves(smiles: str, group: str, stem: str) -> None:
    substrate = parse_smiles(smiles)
    assert stem in {stem_of(substrate, site) for site in sites_of(substrate, group)}


@pytest.mark.parametrize(
    ("smiles", "alphas"),
    [
        ("CC1CO1", 2),
        ("C1CO1", 1),
        ("C[C@@H]1O[C@H]1C", 1),  # (R,R)/(S,S): the axis makes the carbons alike
        ("C[C@@H]1O[C@@H]1C", 2),  # meso: attack at one carbon gives the mirror image of attack at the other
        ("BrCCBr", 1),
        ("CC(Br)CBr", 2),
        ("ClC(Cl)Cl", 1),
        ("C[C@H](Br)C[C@@H](C)Br", 2),
    ],
)
def test_sites_are_merged_exactly_where_symmetry_makes_them_alike(smiles: str, alphas: int) -> None:
    assert len([s for s in perceive_sites(parse_smiles(smiles)) if not s.is_addition]) == alphas


def test_a_site_describes_its_surroundings() -> None:
    menthyl = parse_smiles("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1Cl")
    (site,) = perceive_sites(menthyl)
    assert site.ring_sizes == (6,)
    assert site.leaving_ring_size is None
    assert site.stereo is SiteStereo.SPECIFIED
    assert name_atom(menthyl, site.alpha_carbon) == "C10 in CC(C)[C@@H]1CC[C@@H](C)C[C@H]1Cl"
    betas = {(b.hydrogens, b.branches, b.in_common_ring) for b in site.beta_with_hydrogen}
    assert betas == {(1, 2, True), (2, 1, True)}


def test_hydrogens_of_the_other_epoxide_carbon_are_no_beta_hydrogens() -> None:
    sites = perceive_sites(parse_smiles("CC1CO1"))
    by_degree = {str(s.degree): [b.hydrogens for b in s.beta_with_hydrogen] for s in sites}
    assert by_degree == {"secondary": [3], "primary": []}


def test_deuterium_counts_as_hydrogen_and_keeps_its_name() -> None:
    (site,) = perceive_sites(parse_smiles("[2H]C([2H])C(C)Br"))
    betas = sorted((b.hydrogens, len(b.hydrogen_isotopes), b.branches) for b in site.beta)
    assert betas == [(3, 0, 0), (3, 2, 0)]


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("C=CC", {"alkene"}),
        ("CC#C", {"alkyne"}),
        ("c1ccccc1", set()),
        ("CC=O", set()),
    ],
)
def test_multiple_bonds_are_sites_for_addition(smiles: str, words: set[str]) -> None:
    sites = [s for s in perceive_sites(parse_smiles(smiles)) if s.is_addition]
    assert set().union(*(s.classes for s in sites)) == words
    assert all(s.leaving_group == "none" for s in sites)


def test_groups_that_leave_as_they_are_come_first() -> None:
    sites = perceive_sites(parse_smiles("OCCCCl"))
    assert [s.leaving_group for s in sites] == ["chloride", "hydroxyl"]
    assert [s.needs_activation for s in sites] == [False, True]


# species as named in a flask, kind, element and charge of the species; the ambident ones in full
NUCLEOPHILES = [
    ("[Na+].[N-]=[N+]=[N-]", [("azide", "N", 1)], -1),
    ("[Na+].[C-]#N", [("cyanide", "C", 1), ("cyanide", "N", 2)], -1),
    ("[K+].[S-]C#N", [("thiocyanate", "S", 1), ("thiocyanate", "N", 2)], -1),
    ("N#C[S-]", [("thiocyanate", "S", 1), ("thiocyanate", "N", 2)], -1),
    ("[N-]=C=S", [("thiocyanate", "S", 1), ("thiocyanate", "N", 2)], -1),
    ("[O-]C#N", [("cyanate", "N", 1), ("cyanate", "O", 2)], -1),
    ("[O-]N=O", [("nitrite", "N", 1), ("nitrite", "O", 2)], -1),
    ("[O-]S(=O)c1ccccc1", [("sulfinate", "S", 1), ("sulfinate", "O", 2)], -1),
    ("C=C(C)[O-]", [("enolate", "C", 1), ("enolate", "O", 2)], -1),
    ("[CH2-]C(C)=O", [("enolate", "C", 1), ("enolate", "O", 2)], -1),
    ("[O-]c1ccccc1", [("phenoxide", "O", 1), ("phenoxide", "C", 2)], -1),
    ("c1nc[n-]n1", [("azolide", "N", 1), ("azolide", "N", 2)], -1),
    ("c1nnc[n-]1", [("azolide", "N", 1), ("azolide", "N", 2)], -1),
    ("c1c[n-]cn1", [("azolide", "N", 1)], -1),
    ("CCCC[N+](CCCC)(CCCC)CCCC.[F-]", [("fluoride", "F", 1)], -1),
    ("[Na+].CC[O-]", [("alkoxide", "O", 1)], -1),
    ("CC[O-].[K+]", [("alkoxide", "O", 1)], -1),
    ("[Na]OCC", [("alkoxide", "O", 1)], 0),
    ("CC(=O)[O-]", [("carboxylate", "O", 1)], -1),
    ("C[S-]", [("thiolate", "S", 1)], -1),
    ("[S-]c1ccccc1", [("thiophenoxide", "S", 1)], -1),
    ("[O-]S(=O)(=O)[S-]", [("thiosulfate", "S", 1), ("sulfonate", "O", 1)], -2),
    ("O=C1[N-]C(=O)c2ccccc21", [("imide anion", "N", 1), ("imide anion", "O", 2)], -1),
    ("[C-]#Cc1ccccc1", [("acetylide", "C", 1)], -1),
    ("C[Mg]Br", [("organometallic", "C", 1)], 0),
    ("[BH4-]", [("hydride", "H", 1)], -1),
    ("[AlH4-].[Li+]", [("hydride", "H", 1)], -1),
    ("N", [("ammonia", "N", 1)], 0),
    ("CCN", [("amine, primary", "N", 1)], 0),
    ("CCNCC", [("amine, secondary", "N", 1)], 0),
    ("CCN(CC)CC", [("amine, tertiary", "N", 1)], 0),
    ("c1ccncc1", [("pyridine", "N", 1)], 0),
    ("O=c1cccc[nH]1", [("pyridone", "N", 1), ("pyridone", "O", 2)], 0),
    ("NC(N)=S", [("thioamide", "S", 1)], 0),
    ("CSC", [("sulfide", "S", 1)], 0),
    ("CP(C)C", [("phosphine", "P", 1)], 0),
    ("COP(OC)OC", [("phosphite", "P", 1)], 0),
    ("O", [("water", "O", 1)], 0),
    ("CO", [("alcohol", "O", 1)], 0),
    ("CC(=O)O", [("carboxylic acid", "O", 1)], 0),
    ("Oc1ccccc1", [("phenol", "O", 1)], 0),
    ("Br", [("hydrogen halide", "Br", 1)], 0),
    ("NCCO", [("amine, primary", "N", 1), ("alcohol", "O", 1)], 0),
    ("CCCC", [], None),
]


@pytest.mark.parametrize(("smiles", "expected", "charge"), NUCLEOPHILES)
def test_the_usual_atom_attacks_first(smiles: str, expected: list[tuple[str, str, int]], charge: int | None) -> None:
    found = attacking_atoms(parse_smiles(smiles))
    assert [(n.kind, n.symbol, n.preference) for n in found] == expected
    assert all(n.charge == charge for n in found)


def test_only_the_molecule_itself_is_attacked_by_its_ester_carbonyl_or_arene() -> None:
    acetate = parse_smiles("CC(=O)OC1CCCCC1OS(=O)(=O)c1ccc(C)cc1")
    assert "ester carbonyl" in {n.kind for n in neighbouring_groups(acetate)}
    assert "ester carbonyl" not in {n.kind for n in attacking_atoms(acetate)}


def test_hybridisation_is_that_of_the_alpha_carbon() -> None:
    expected = {"CBr": Hybridisation.SP3, "C=CBr": Hybridisation.SP2, "CC#CBr": Hybridisation.SP}
    found = {smiles: sites_of(parse_smiles(smiles), "bromide")[0].hybridisation for smiles in expected}
    assert found == expected
