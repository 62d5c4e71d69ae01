"""Gas from the flask: volumes against printed molar volumes, moles against reaction equations."""

import pytest
from chemicals import Tb

from builder.chemistry.structure import parse_smiles
from builder.mechanism.gas import (
    GasFormed,
    InFlask,
    closed_vessel_bar,
    gas_volume_l,
    gases_from,
    gases_of_record,
    load_gases,
)
from builder.records.specimen import outcome_example, with_example
from tests.specimens import examine_text

LAST_PRINTED_DIGIT = 0.005


@pytest.mark.parametrize(
    ("temperature_c", "pressure_bar", "litres"),
    [
        # Molar volume of an ideal gas, CODATA 2018: 22.710 954 L at 0 °C and 1 bar. The other two as group practice
        # prints them (24.47 at 25 °C and 1 atm, 24.79 at 25 °C and 1 bar).
        (25.0, 1.01325, 24.47),
        (25.0, 1.0, 24.79),
        (0.0, 1.0, 22.71),
    ],
)
def test_molar_volume(temperature_c: float, pressure_bar: float, litres: float) -> None:
    assert gas_volume_l(1.0, temperature_c, pressure_bar) == pytest.approx(litres, abs=LAST_PRINTED_DIGIT)


def test_pressure_in_a_closed_vessel() -> None:
    # THF at 80 °C: 1.56 bar of vapour (group practice); air shut in at 25 °C, 1.01325 × 353.15/298.15 = 1.200 bar.
    assert closed_vessel_bar(80.0, 1.56) == pytest.approx(2.76, abs=LAST_PRINTED_DIGIT)
    # 10 mmol of gas in 20 mL at 25 °C: 0.24790 bar L over 0.020 L is 12.39 bar more.
    assert closed_vessel_bar(25.0, 0.0, gas_moles=0.01, headspace_l=0.02) == pytest.approx(
        13.41, abs=LAST_PRINTED_DIGIT
    )


def test_a_gas_needs_a_headspace() -> None:
    with pytest.raises(ValueError, match="headspace"):
        closed_vessel_bar(25.0, 0.0, gas_moles=0.01)


def _flask(*charged: tuple[str, float | None]) -> list[InFlask]:
    return [InFlask(("reagents", i), parse_smiles(smiles), moles) for i, (smiles, moles) in enumerate(charged)]


def _by_formula(formed: tuple[GasFormed, ...]) -> dict[str, float | None]:
    return {each.gas.formula: each.moles for each in formed}


CARBONATE, HYDROGENCARBONATE = "[K+].[K+].[O-]C([O-])=O", "[Na+].OC([O-])=O"
ACETIC, SODIUM_HYDRIDE, PYRIDINE = "CC(=O)O", "[Na+].[H-]", "c1ccncc1"


@pytest.mark.parametrize(
    ("charged", "gases"),
    [
        # By hand, from the equations: each acid proton first makes hydrogencarbonate of carbonate, then carbon dioxide.
        ([(CARBONATE, 2.0), (ACETIC, 2.0)], {}),
        ([(CARBONATE, 2.0), (ACETIC, 3.0)], {"CO2": 1.0}),
        ([(CARBONATE, 2.0), (ACETIC, 9.0)], {"CO2": 2.0}),
        ([(HYDROGENCARBONATE, 2.0), (ACETIC, 1.0)], {"CO2": 1.0}),
        ([(HYDROGENCARBONATE, 2.0), (ACETIC, 1.0), ("CCN(CC)CC", 1.0)], {}),
        ([(HYDROGENCARBONATE, 2.0), ("OS(=O)(=O)O", 1.0)], {"CO2": 2.0}),
        ([(HYDROGENCARBONATE, None), (ACETIC, 1.0)], {"CO2": None}),
        ([(CARBONATE, 2.0), ("Oc1ccccc1", 2.0)], {}),
        ([(SODIUM_HYDRIDE, 1.2), ("CCO", 1.0)], {"H2": 1.0}),
        ([(SODIUM_HYDRIDE, 1.2), ("CCOC(=O)CC(=O)OCC", 2.0)], {"H2": 1.2}),
        ([(SODIUM_HYDRIDE, 1.2), ("C1CCOC1", 50.0)], {}),
        ([("[Na+].[BH4-]", 1.0), (ACETIC, 8.0)], {"H2": 4.0}),
        ([("O=S(Cl)Cl", 1.5), ("CCCCO", 1.0)], {"SO2": 1.0, "HCl": 1.0}),
        ([("O=S(Cl)Cl", 1.5), ("CCCCO", 1.0), (PYRIDINE, 1.0)], {"SO2": 1.0}),
        ([("CS(=O)(=O)Cl", 1.1), ("CCCCO", 1.0)], {"HCl": 1.0}),
        ([("CS(=O)(=O)Cl", 1.1), ("CCCCO", 1.0), ("CCN(CC)CC", 1.5)], {}),
        ([("CC(C)(C)OC(=O)NCCBr", 1.0), ("OC(=O)C(F)(F)F", 0.1)], {"CO2": 1.0, "i-C4H8": 1.0}),
        ([("CC(C)(C)OC(=O)NCCBr", 1.0), (ACETIC, 5.0)], {}),
        ([("[Na+].[O-]N=O", 1.2), ("CCCCN", 1.0), ("Cl", 3.0)], {"N2": 1.0}),
        ([("[Na+].[O-]N=O", 1.2), ("CCCCN", 1.0)], {}),
        ([("N#[N+]c1ccccc1.F[B-](F)(F)F", 1.0)], {"N2": 1.0}),
        # 2 NaN3 + 2 HNO2 -> 3 N2 + 2 NO + 2 NaOH (Prudent Practices in the Laboratory, 2011)
        ([("[Na+].[N-]=[N+]=[N-]", 1.0), ("[Na+].[O-]N=O", 1.0), ("Cl", 1.0)], {"N2": 1.5, "NO": 1.0, "HN3": 1.0}),
        ([("[K+].[C-]#N", 1.0), ("CCCBr", 1.0)], {}),
        ([("[Na+].[N-]=[N+]=[N-]", 1.0), ("CCCBr", 1.0)], {}),
    ],
)
def test_moles_of_gas(charged: list[tuple[str, float | None]], gases: dict[str, float | None]) -> None:
    assert _by_formula(gases_from(_flask(*charged))) == pytest.approx(gases)


# Boiling points in the package chemicals 1.5.2, by CAS number; compilations differ by a kelvin or two.
@pytest.mark.parametrize(
    ("formula", "cas"),
    [
        ("H2", "1333-74-0"),
        ("N2", "7727-37-9"),
        ("CO", "630-08-0"),
        ("NO", "10102-43-9"),
        ("CH4", "74-82-8"),
        ("C2H4", "74-85-1"),
        ("HCl", "7647-01-0"),
        ("HBr", "10035-10-6"),
        ("H2S", "7783-06-4"),
        ("C3H6", "115-07-1"),
        ("NH3", "7664-41-7"),
        ("Me2O", "115-10-6"),
        ("MeCl", "74-87-3"),
        ("SO2", "7446-09-5"),
        ("i-C4H8", "115-11-7"),
        ("1-C4H8", "106-98-9"),
        ("MeNH2", "74-89-5"),
        ("C4H6", "106-99-0"),
        ("C4H10", "106-97-8"),
        ("E-C4H8", "624-64-6"),
        ("Me3N", "75-50-3"),
        ("MeBr", "74-83-9"),
        ("Z-C4H8", "590-18-1"),
        ("MeSH", "74-93-1"),
        ("Me2NH", "124-40-3"),
        ("C2H4O", "75-21-8"),
        ("EtCl", "75-00-3"),
        ("HCN", "74-90-8"),
    ],
)
def test_boiling_points_of_gases(formula: str, cas: str) -> None:
    assert load_gases()[formula].bp_c == pytest.approx(Tb(cas) - 273.15, abs=2.0)


def test_which_gases_are_permanent() -> None:
    gases = load_gases()
    permanent = {"H2", "N2", "CO", "NO", "CH4", "C2H4", "C2H2", "HCl", "HBr", "CO2", "H2S"}
    assert {formula for formula, gas in gases.items() if gas.is_permanent} == permanent


SOLVOLYSIS = (
    "substrate: {name: tert-butyl chloride, smiles: 'CC(C)(C)Cl', class: tertiary, leaving_group: chloride,"
    " amount: 10 mmol}\nnucleophile: solvent\nsolvent: [{name: ethanol, volume: 20 mL}]\n"
    "reagents: [{name: a buffer, smiles: '%s', use: buffer, equivalents: 1.5}]\n"
    "stages: [{temperature: 25 °C, time: 16 h, vessel: sealed}]"
)


@pytest.mark.parametrize(
    ("buffer", "gases"),
    [
        # R-Cl + HOEt + NaHCO3 -> R-OEt + NaCl + H2O + CO2: one for each substrate
        (HYDROGENCARBONATE, {"CO2": 0.010}),
        ("Cc1cccc(C)n1", {}),
        ("[Na+].CC([O-])=O", {}),
    ],
)
def test_a_solvolysis_sets_acid_free(buffer: str, gases: dict[str, float]) -> None:
    case = examine_text(with_example(SOLVOLYSIS % buffer)).kept
    assert case is not None
    formed = gases_of_record(case.record, case.structures, case.amounts)
    assert _by_formula(formed) == pytest.approx(gases)


def test_a_product_that_is_a_gas() -> None:
    # 78 % of 10 mmol, as the yield says
    outcome = outcome_example(
        "{yield: 78 %, of: A, kind: assay}", products="{label: A, name: isobutene, smiles: C=C(C)C, use: desired}"
    )
    case = examine_text(with_example(outcome)).kept
    assert case is not None
    formed = gases_of_record(case.record, case.structures, case.amounts)
    assert _by_formula(formed) == pytest.approx({"i-C4H8": 0.0078})
