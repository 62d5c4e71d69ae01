"""Amounts against worked examples and against an independent table of atomic masses."""

import molmass
import pytest

from builder.checks.case import Case
from builder.mechanism.amounts import AmountRow
from builder.records.specimen import with_example
from tests.specimens import examine_text

SECONDARY = "class: secondary, leaving_group: bromide"


def _case(example: str) -> Case:
    case = examine_text(with_example(example + "\nstages: [{temperature: 60 °C, time: 16 h}]")).kept
    assert case is not None
    return case


def _row(case: Case, name: str) -> AmountRow:
    return next(row for row in case.amounts.rows if row.name == name)


def test_stoichiometry_from_scale() -> None:
    # Worked by hand with IUPAC standard atomic weights: 10.00 g 2-bromobutane (137.02 g/mol) are 72.98 mmol,
    # 1.30 equivalents of sodium azide (65.01 g/mol) 6.168 g, 50.0 mL of solvent make 1.460 mol/L.
    case = _case(
        f"substrate: {{name: RBr, smiles: 'CCC(C)Br', {SECONDARY}, mass: 10.00 g}}\n"
        "nucleophile: {name: NaN3, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.30}\n"
        "solvent: [{name: DMF, volume: 50.0 mL}]"
    )
    assert _row(case, "RBr").amount_mol == pytest.approx(0.07298, abs=5e-6)
    assert _row(case, "NaN3").mass_g == pytest.approx(6.168, abs=5e-4)
    assert case.amounts.concentration_mol_per_l == pytest.approx(1.460, abs=5e-4)


KINDS = [
    # what is typed, moles expected (by hand)
    ("amount: 15 mmol", 0.015),
    ("equivalents: 1.5", 0.015),
    ("mass: 0.975 g", 0.975 / 65.011),
    ("mass: 0.975 g, purity: 90 %", 0.9 * 0.975 / 65.011),
    ("volume: 7.5 mL, strength: 2.0 mol/L", 0.015),
    ("volume: 2.0 mL, density: 1.10 g/mL", 2.2 / 65.011),
    ("volume: 2.0 mL, density: 1.10 g/mL, strength: 48 %", 0.48 * 2.2 / 65.011),
    ("mass: 0.975 g, equivalents: 9", 0.975 / 65.011),
]


@pytest.mark.parametrize(("typed", "moles"), KINDS, ids=[row[0] for row in KINDS])
def test_the_first_typed_quantity_is_used(typed: str, moles: float) -> None:
    case = _case(f"nucleophile: {{name: NaN3, smiles: '[Na+].[N-]=[N+]=[N-]', {typed}}}")
    assert _row(case, "NaN3").amount_mol == pytest.approx(moles, rel=1e-4)


@pytest.mark.parametrize(
    ("smiles", "formula"),
    [("CCC(C)Br", "C4H9Br"), ("[Na+].[N-]=[N+]=[N-]", "NaN3"), ("CCCCCC[C@H](C)OS(C)(=O)=O", "C9H20O3S")],
)
def test_molar_masses_agree_with_molmass(smiles: str, formula: str) -> None:
    # molmass (PyPI) carries its own table of isotopic compositions.
    case = _case(f"nucleophile: {{name: X, smiles: '{smiles}', equivalents: 1.5}}")
    assert _row(case, "X").molar_mass == pytest.approx(molmass.Formula(formula).mass, rel=3e-5)


def test_a_solvent_without_volume_leaves_the_concentration_open() -> None:
    case = _case("solvent: [{name: ethanol, fraction: 80 %}, {name: water, fraction: 20 %}]")
    assert case.amounts.solvent_volume_l is None
    assert case.amounts.concentration_mol_per_l is None
