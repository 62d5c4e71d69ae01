"""The thermal screen: golden values by hand, classes by table, and nothing assessed from what is missing."""

import pytest

from builder.mechanism.thermal import (
    CriticalityClass,
    ThermalSeverity,
    adiabatic_rise_k,
    criticality_class,
    mass_ratio,
    mtsr_c,
    reaction_mass_g,
    thermal_screen,
    thermal_severity,
)
from builder.records.specimen import with_example
from tests.checks.test_cautions import case_of

LAST_PRINTED_DIGIT = 0.05
ALL = "thermal: {reaction_enthalpy: -100 kJ/mol, heat_capacity: 1.8 J/(g*K), accumulation: 40 %, source: RC1 run 12"


def test_adiabatic_rise() -> None:
    # By hand: 1 mol/kg, -100 kJ/mol, 1.8 J/(g K): 100000/(1000 · 1.8) = 55.6 K.
    assert adiabatic_rise_k(-100.0, 1.0, 1000.0, 1.8) == pytest.approx(55.6, abs=LAST_PRINTED_DIGIT)
    assert adiabatic_rise_k(20.0, 1.0, 1000.0, 1.8) < 0


def test_mtsr() -> None:
    # By hand: 60 °C + 0.40 · 55.6 K = 82.2 °C; a batch accumulates all of it.
    assert mtsr_c(60.0, 0.40, 55.6) == pytest.approx(82.2, abs=LAST_PRINTED_DIGIT)
    assert mtsr_c(60.0, 1.0, 55.6) == pytest.approx(115.6, abs=LAST_PRINTED_DIGIT)


@pytest.mark.parametrize(
    ("rise", "severity"),
    [
        # Stoessel, Thermal Safety of Chemical Processes (from memory): limits 50, 200 and 400 K.
        (-10.0, ThermalSeverity.LOW),
        (49.9, ThermalSeverity.LOW),
        (50.0, ThermalSeverity.MEDIUM),
        (200.0, ThermalSeverity.MEDIUM),
        (201.0, ThermalSeverity.CRITICAL),
        (401.0, ThermalSeverity.CATASTROPHIC),
    ],
)
def test_severity(rise: float, severity: ThermalSeverity) -> None:
    assert thermal_severity(rise) is severity


def test_nothing_is_low_where_gas_forms() -> None:
    assert thermal_severity(10.0, forms_gas=True) is ThermalSeverity.MEDIUM


@pytest.mark.parametrize(
    ("mtsr", "mtt", "td24", "found"),
    [
        # Stoessel, as above. 1: MTSR < MTT < T_D24; 2: MTSR < T_D24 < MTT; 3: MTT < MTSR < T_D24;
        # 4: MTT < T_D24 < MTSR; 5: T_D24 < MTSR and T_D24 < MTT.
        (80, 100, 150, CriticalityClass.ONE),
        (80, 150, 100, CriticalityClass.TWO),
        (120, 100, 150, CriticalityClass.THREE),
        (160, 100, 150, CriticalityClass.FOUR),
        (120, 150, 100, CriticalityClass.FIVE),
        (160, 150, 100, CriticalityClass.FIVE),
        (100, 100, 150, CriticalityClass.THREE),
        (150, 100, 150, CriticalityClass.FOUR),
    ],
)
def test_criticality(mtsr: float, mtt: float, td24: float, found: CriticalityClass) -> None:
    assert criticality_class(mtsr, mtt, td24) is found


def screen_of(thermal: str):
    case = case_of(with_example(thermal) if thermal else with_example("notebook: BK2/112"))
    return thermal_screen(case.record, case.structures, case.amounts)


@pytest.mark.parametrize(
    ("thermal", "missing"),
    [
        ("", {"enthalpy of reaction", "heat capacity of the reaction mass"}),
        ("thermal: {reaction_enthalpy: -100 kJ/mol, source: RC1}", {"heat capacity of the reaction mass"}),
        ("thermal: {heat_capacity: 1.8 kJ/(kg K), source: RC1}", {"enthalpy of reaction"}),
    ],
)
def test_what_is_missing_is_named_and_nothing_assessed(thermal: str, missing: set[str]) -> None:
    screen = screen_of(thermal)
    assert screen.rise_k is screen.severity is screen.mtsr_c is screen.criticality is None
    assert set(screen.missing["adiabatic rise"]) == missing
    assert "T_D24 (measured)" in screen.missing["criticality"]


def test_a_record_with_its_data() -> None:
    screen = screen_of(f"{ALL}}}")
    # By hand: 10 mmol; 1.370 g bromide, 0.975 g azide, 20 mL DMF of 0.944 g/mL: 21.2 g; 1000 J/(21.2 g · 1.8) = 26.2 K.
    assert screen.mass_g == pytest.approx(21.2, abs=0.1)
    assert screen.rise_k == pytest.approx(26.2, abs=0.2)
    assert screen.mtsr_c == pytest.approx(70.5, abs=0.1)
    assert screen.criticality is None
    assert set(screen.missing) == {"criticality"}
    assert screen_of(f"{ALL}, td24: 130 °C, mtt: 153 °C}}").criticality is CriticalityClass.TWO


def test_a_solvent_without_density_is_named() -> None:
    text = with_example(
        f"{ALL}}}\nsolvent: [{{name: unknown oil, smiles: 'CCCCCCCCCCCCCC=C', volume: 20 mL}}]\n"
        "stages: [{temperature: 60 °C, time: 16 h}]"
    )
    case = case_of(text)
    screen = thermal_screen(case.record, case.structures, case.amounts)
    assert screen.mass_g is None
    assert screen.missing["adiabatic rise"] == ("the mass or density of unknown oil",)


@pytest.mark.parametrize(
    ("stages", "ratio"),
    [
        # By hand: 10 mmol 2-bromobutane 1.370 g, 20 mL toluene 17.34 g (0.867 g/mL), 50 mmol acetic acid 3.003 g, of
        # which 4/5 are not in when one equivalent is: 21.71/(21.71 - 2.40) = 1.124.
        ("stages: [{temperature: 60 °C, time: 4 h}]", 1.0),
        ("stages: [{add: [toluene, 2-bromobutane, acetic acid], temperature: 60 °C, time: 4 h}]", 1.0),
        ("stages: [{add: [toluene, 2-bromobutane, acetic acid], over: 1 h, temperature: 60 °C, time: 4 h}]", 1.124),
        ("stages: [{add: [toluene, acetic acid, 2-bromobutane], over: 1 h, temperature: 60 °C, time: 4 h}]", 1.0),
    ],
)
def test_a_dosed_reaction_is_lighter_when_most_has_accumulated(stages: str, ratio: float) -> None:
    charge = (
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide,"
        " amount: 10 mmol}\nnucleophile: {name: acetic acid, smiles: CC(=O)O, amount: 50 mmol}\n"
        f"solvent: [{{name: toluene, volume: 20 mL}}]\n{stages}"
    )
    case = case_of(with_example(charge))
    mass_g, unweighed = reaction_mass_g(case.amounts, case.structures)
    assert mass_g is not None, unweighed
    assert mass_ratio(case.record, case.structures, case.amounts, mass_g) == pytest.approx(ratio, abs=0.002)


def test_the_mtsr_of_a_dosed_run_counts_the_mass_that_is_there() -> None:
    dosed = f"{ALL}}}\nstages: [{{add: [DMF, 2-bromobutane, sodium azide], over: 1 h, temperature: 60 °C, time: 4 h}}]"
    at_once, over = (screen_of(text).mtsr_c for text in (dosed.replace(" over: 1 h,", ""), dosed))
    assert at_once is not None
    assert over is not None
    assert over > at_once
