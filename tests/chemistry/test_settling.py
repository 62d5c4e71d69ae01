"""Ions that settle: Arbuzov dealkylation and water on acyloxonium ions, configurations kept."""

import pytest
from molmass import Formula
from rdkit import Chem

from builder.chemistry.settling import dealkylated_phosphonium, hydrated_acyloxonium
from builder.chemistry.structure import Structure, parse_smiles
from tests.space import all_neighbours, embedded, signed_volume

LAST_PRINTED_DIGIT = 0.01  # g/mol


# Michaelis-Arbuzov: Bhattacharya and Thyagarajan, Chem. Rev. 1981, 81, 415 (from memory).
@pytest.mark.parametrize(
    ("ion", "expected"),
    [
        ("CCO[P+](C)(OCC)OCC", "CCOP(C)(=O)OCC"),
        ("CCO[P+](Cc1ccccc1)(OCC)OCC", "CCOP(=O)(Cc1ccccc1)OCC"),
        ("CO[P+](CCCC)(c1ccccc1)c1ccccc1", "CCCCP(=O)(c1ccccc1)c1ccccc1"),
    ],
)
def test_an_alkoxyphosphonium_gives_its_alkyl_to_the_halide(ion: str, expected: str) -> None:
    assert dealkylated_phosphonium(parse_smiles(ion), parse_smiles("[Br-]")) == parse_smiles(expected)


@pytest.mark.parametrize(
    "other",
    [
        "C[P+](c1ccccc1)(c1ccccc1)c1ccccc1",  # no oxygen to give up its alkyl
        "C[P+](Oc1ccccc1)(Oc1ccccc1)Oc1ccccc1",  # aryl oxygen keeps its ring
        "CCOP(C)(=O)OCC",
        "CCBr",
    ],
)
def test_other_structures_stay_as_they_are(other: str) -> None:
    assert dealkylated_phosphonium(parse_smiles(other), parse_smiles("[Br-]")) == parse_smiles(other)


def test_what_the_phosphonium_loses_is_one_alkyl_group() -> None:
    ion = parse_smiles("CCO[P+](C)(OCC)OCC")
    product = dealkylated_phosphonium(ion, parse_smiles("[I-]"))
    lost = Formula(ion.formula.removesuffix("+")).mass - Formula(product.formula).mass
    assert lost == pytest.approx(Formula("C2H5").mass, abs=LAST_PRINTED_DIGIT)
    assert product.charge == 0


# Winstein and Buckles, J. Am. Chem. Soc. 1942, 64, 2787 (from memory): with water the cis hydroxy ester.
CYCLOHEXANE_CIS = "CC1=[O+][C@@H]2CCCC[C@@H]2O1"


def test_water_opens_an_acyloxonium_ion_at_the_acyl_carbon() -> None:
    ring = parse_smiles(CYCLOHEXANE_CIS)
    found = hydrated_acyloxonium(ring)
    cis, trans = parse_smiles("CC(=O)O[C@@H]1CCCC[C@@H]1O"), parse_smiles("CC(=O)O[C@@H]1CCCC[C@H]1O")
    assert found
    assert set(found) <= {cis, cis.mirror_image}
    assert not set(found) & {trans, trans.mirror_image}


def test_both_carbons_of_the_ring_keep_their_place_in_space() -> None:
    # Two stereocentres told apart by methyl and ethyl: signed volumes before and after.
    ring = parse_smiles("CC1=[O+][C@H](C)[C@@H](CC)O1")
    products = hydrated_acyloxonium(ring)
    assert len(products) == 2
    for product in products:
        for before, after in zip(_volumes(ring), _volumes(product), strict=True):
            assert before * after > 0


def _volumes(structure: Structure) -> tuple[float, float]:
    """Return the signed volume at the carbon with ethyl, and at the one with methyl."""
    mol = embedded(structure)
    with_ethyl, with_methyl = sorted(structure.stereocentre_marks, key=lambda centre: _branch_size(mol, centre))
    return signed_volume(mol, _ordered(mol, with_ethyl)), signed_volume(mol, _ordered(mol, with_methyl))


def _ordered(mol: Chem.Mol, centre: int) -> tuple[int, int, int, int]:
    """Return oxygen, hydrogen, the alkyl branch and the other carbon of the diol of a stereocentre."""
    around = {mol.GetAtomWithIdx(n).GetSymbol(): n for n in all_neighbours(mol, centre)}
    carbons = [n for n in all_neighbours(mol, centre) if mol.GetAtomWithIdx(n).GetSymbol() == "C"]
    alkyl, other = sorted(carbons, key=lambda n: "O" in {a.GetSymbol() for a in mol.GetAtomWithIdx(n).GetNeighbors()})
    return around["O"], around["H"], alkyl, other


def _branch_size(mol: Chem.Mol, centre: int) -> int:
    """Return the hydrogens on the alkyl branch of a stereocentre: three on methyl, two on ethyl."""
    alkyl = _ordered(mol, centre)[2]
    return sum(a.GetSymbol() == "H" for a in mol.GetAtomWithIdx(alkyl).GetNeighbors())


@pytest.mark.parametrize("other", ["CC(=O)OC", "CC1OCCO1", "C[O+](C)C", "CC(C)=[O+]C"])
def test_no_other_ion_takes_up_water(other: str) -> None:
    assert hydrated_acyloxonium(parse_smiles(other)) == ()


def test_water_is_all_that_is_added() -> None:
    ring = parse_smiles(CYCLOHEXANE_CIS)
    for product in hydrated_acyloxonium(ring):
        gained = Formula(product.formula).mass - Formula(ring.formula.removesuffix("+")).mass
        assert gained == pytest.approx(Formula("OH").mass, abs=LAST_PRINTED_DIGIT)
        assert product.charge == 0
