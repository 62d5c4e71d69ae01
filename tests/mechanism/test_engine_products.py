"""Products of forecasts against space, a second toolkit and a table of atomic masses."""

import random

import pytest
from indigo import Indigo
from indigo.inchi import IndigoInchi
from molmass import Formula
from rdkit import Chem

from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.asking import question_from_line, read_question
from builder.mechanism.engine import predict
from builder.mechanism.forecast import Forecast
from builder.records.vocabulary import Course, Mechanism
from tests.outcomes import CaseSet, load_cases
from tests.space import all_neighbours, embedded, signed_volume

LAST_PRINTED_DIGIT = 0.01  # g/mol


def ask(substrate: str, nucleophile: str, solvent: str, t_c: float, **more: object) -> Forecast:
    read = read_question(
        substrate=substrate, nucleophile=nucleophile, solvent=[(solvent, 1.0)], temperature_c=t_c, **more
    )
    return predict(read.question)


# --- in space -------------------------------------------------------------------------------------------------


def handedness(structure: Structure, centre: int, incoming: int) -> float:
    """Return the signed volume of the four neighbours of a carbon: the named one, then the rest by what they bear."""
    mol = embedded(structure)
    branches = {n: elements_outwards(mol, n, centre) for n in all_neighbours(mol, centre) if n != incoming}
    first, second, third = sorted(branches, key=branches.__getitem__)
    assert branches[first] < branches[second] < branches[third], "two neighbours look alike"
    return signed_volume(mol, (incoming, first, second, third))


def elements_outwards(mol: Chem.Mol, start: int, without: int) -> list[list[str]]:
    """Return the elements of a branch shell by shell; no stereo mark is looked at."""
    shells, seen, rim = [], {start, without}, {start}
    while rim:
        shells.append(sorted(mol.GetAtomWithIdx(at).GetSymbol() for at in rim))
        rim = {n for at in rim for n in all_neighbours(mol, at)} - seen
        seen |= rim
    return shells


def neighbour(structure: Structure, centre: int, symbol: str) -> int:
    (found,) = [n for n, _ in structure.atoms[centre].neighbours if structure.atoms[n].symbol == symbol]
    return found


@pytest.mark.parametrize(
    ("substrate", "nucleophile", "solvent", "bound"),
    [
        ("CCCCCC[C@H](C)Br", "sodium azide", "DMF", "N"),
        ("CCCCCC[C@@H](C)OS(C)(=O)=O", "sodium azide", "DMF", "N"),
        ("CC[C@H](C)Br", "sodium thiophenolate", "methanol", "S"),
        ("CC[C@H](C)OS(=O)(=O)c1ccc(C)cc1", "potassium thiocyanate", "acetone", "S"),
        ("CC[C@@H](C)I", "sodium iodide", "acetone", "I"),
        ("CCOC(=O)[C@H](C)Br", "sodium azide", "DMF", "N"),
        ("CCOC(=O)[C@@H](C)OS(C)(=O)=O", "sodium thiophenolate", "DMF", "S"),
        ("CC(C)C[C@H](C)OS(C)(=O)=O", "potassium thioacetate", "DMF", "S"),
    ],
)
def test_displacement_turns_the_carbon_inside_out_in_space(
    substrate: str, nucleophile: str, solvent: str, bound: str
) -> None:
    before = parse_smiles(substrate)
    site = next(s for s in perceive_sites(before) if s.stereo.value == "specified")
    forecast = ask(substrate, nucleophile, solvent, 60)
    main = forecast.products[0]
    assert (main.mechanism, main.course) == (Mechanism.SN2, Course.INVERSION)
    after = main.structure
    (centre,) = after.stereocentre_marks
    old = handedness(before, site.alpha_carbon, site.leaving_atom or 0)
    new = handedness(after, centre, neighbour(after, centre, bound))
    assert old * new < 0


# --- a second toolkit -----------------------------------------------------------------------------------------


@pytest.mark.parametrize("which", list(CaseSet))
def test_products_mean_the_same_to_another_toolkit(which: CaseSet) -> None:
    indigo = Indigo()
    inchi = IndigoInchi(indigo)
    cases = random.Random(3).sample(load_cases(which), 40)
    products = {p.structure for case in cases for p in predict(question_from_line(case).question).products}
    assert len(products) > 60
    for product in sorted(products):
        assert inchi.getInchi(indigo.loadMolecule(product.smiles)) == product.inchi, product.smiles


# --- masses ---------------------------------------------------------------------------------------------------


# What goes in and what else comes out, by formula; masses by molmass.
@pytest.mark.parametrize(
    ("substrate", "nucleophile", "solvent", "t_c", "more", "taken", "lost"),
    [
        ("CCCCBr", "sodium azide", "DMF", 60, {}, "N3", "Br"),
        ("CCCCCl", "sodium cyanide", "DMSO", 100, {}, "CN", "Cl"),
        ("CCCCCC[C@H](C)OS(C)(=O)=O", "sodium azide", "DMF", 60, {}, "N3", "CH3SO3"),
        ("ClCc1ccccc1", "diethylamine", "acetonitrile", 60, {}, "C4H11N", "HCl"),
        ("CI", "pyridine", "acetonitrile", 25, {}, "C5H5N", "I"),
        ("CC(C)(C)Cl", "water", "water", 25, {}, "H2O", "HCl"),
        ("CC(C)(C)Br", "sodium ethoxide", "ethanol", 25, {}, "", "HBr"),
        ("CC1CO1", "sodium azide", "water", 25, {}, "HN3", ""),
        ("CC(C)=C", "chloride", "dichloromethane", 25, {"additives": ["HCl"]}, "HCl", ""),
        ("OCCCCBr", "none", "DMF", 60, {"base": "sodium hydride"}, "", "HBr"),
        ("CC(C)(O)C(C)(C)O", "none", "neat", 80, {"additives": ["H2SO4"]}, "", "H2O"),
        ("CC(Br)CBr", "sodium amide", "THF", 25, {"equivalents": 2}, "", "H2Br2"),
    ],
)
def test_masses_are_in_balance(
    substrate: str, nucleophile: str, solvent: str, t_c: float, more: dict[str, object], taken: str, lost: str
) -> None:
    main = ask(substrate, nucleophile, solvent, t_c, **more).products[0].structure
    before = Formula(parse_smiles(substrate).formula).mass + (Formula(taken).mass if taken else 0)
    after = Formula(main.formula).mass + (Formula(lost).mass if lost else 0)
    assert after == pytest.approx(before, abs=LAST_PRINTED_DIGIT)
    assert main.mass == pytest.approx(Formula(main.formula).mass, abs=LAST_PRINTED_DIGIT)
