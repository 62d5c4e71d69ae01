"""Gas and pressure in closed vessels, by hand: 24.47 L/mol at 25 °C and 1 atm."""

import pytest

from builder.finding import Finding, Level
from tests.specimens import play

NO_REACTION = "\noutcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate, by: GC}]}"
HYDRIDE = "base: {name: sodium hydride, smiles: '[Na+].[H-]', purity: 60 %, mass: 0.80 g}\n"  # 20.0 mmol
THF = "solvent: [{name: THF, volume: 20 mL}]\n"


def _found(example: str, rule: str) -> list[Finding]:
    return [finding for finding in play(example + NO_REACTION) if finding.rule == rule]


def test_hydrogen_in_a_closed_vessel() -> None:
    ethanol = "nucleophile: {name: ethanol, smiles: CCO, amount: 10.0 mmol}\n"
    stage = "stages: [{temperature: 60 °C, time: 16 h, vessel: sealed, vessel_volume: 100 mL}]"
    (finding,) = _found(THF + HYDRIDE + ethanol + stage, "gas-above-headspace")
    assert finding.level is Level.ERROR
    assert finding.data["gas_mol"] == pytest.approx(0.010, abs=1e-5)  # as much as there is ethanol
    assert "245 mL of gas" in finding.message  # 10.0 mmol × 24.47 L/mol
    assert "hydrogen from saline hydride" in finding.message


def test_gas_of_an_earlier_open_stage_is_gone() -> None:
    ethanol = "nucleophile: {name: ethanol, smiles: CCO, amount: 10.0 mmol}\n"
    stages = (
        "stages:\n  - {add: [THF, ethanol, sodium hydride], temperature: 0 °C, time: 1 h, vessel: open}\n"
        "  - {add: 2-bromobutane, temperature: 60 °C, time: 16 h, vessel: sealed}"
    )
    assert _found(THF + HYDRIDE + ethanol + stages, "gas-above-headspace") == []
    assert (
        len(_found(THF + HYDRIDE + ethanol + stages.replace("vessel: open", "vessel: sealed"), "gas-above-headspace"))
        == 1
    )


@pytest.mark.parametrize(
    ("pressure", "celsius", "level"),
    [
        # THF: 1.56 bar at 80 °C (Poling), 7.6 bar at 150 °C, with air of 1 atm warmed to 1.2 and 1.4 bar
        ("", 80, None),
        (", pressure: 2.8 bar", 80, None),
        (", pressure: 1.6 bar", 80, None),  # the vapour alone, or read as gauge pressure
        (", pressure: 2 bar", 150, Level.ERROR),
        (", pressure: 9 bar", 150, None),
        ("", 190, Level.QUERY),
    ],
)
def test_pressure_in_a_closed_vessel(pressure: str, celsius: int, level: Level | None) -> None:
    stage = f"stages: [{{temperature: {celsius} °C, time: 16 h, vessel: sealed{pressure}}}]"
    found = _found(THF + stage, "pressure-above-rating")
    assert [finding.level for finding in found] == ([level] if level else [])


def test_a_volatile_amine_counts_for_the_pressure() -> None:
    # Half of the liquid by moles is ammonia or so: far above 10 bar at 120 °C, while ethanol alone has 4.3 bar.
    ammonia = "nucleophile: {name: dimethylamine, smiles: CNC, amount: 300 mmol}\n"
    ethanol = "solvent: [{name: ethanol, volume: 18 mL}]\n"
    stage = "stages: [{temperature: 120 °C, time: 16 h, vessel: sealed}]"
    assert _found(ethanol + stage, "pressure-above-rating") == []
    (finding,) = _found(ethanol + ammonia + stage, "pressure-above-rating")
    assert "no pressure is stated" in finding.message


@pytest.mark.parametrize(
    ("solvent", "stage", "rule"),
    [
        # Altitude and vacuum: water boils at 93 °C at 0.80 bar, at 60 °C at 0.20 bar (CRC Handbook, from memory).
        ("water", "temperature: 93 °C, time: 4 h, vessel: reflux, pressure: 0.80 bar", None),
        ("water", "temperature: 100 °C, time: 4 h, vessel: reflux, pressure: 0.80 bar", "temperature-above-boiling"),
        ("water", "temperature: 78 °C, time: 4 h, vessel: reflux, pressure: 0.80 bar", "reflux-off-boiling"),
        ("water", "temperature: 75 °C, time: 4 h, vessel: open, pressure: 200 mbar", "temperature-above-boiling"),
        ("water", "temperature: 58 °C, time: 4 h, vessel: open, pressure: 200 mbar", None),
        # No correlation for HMPA in the library: nothing is said of vacuum; the table says that it boils at 235 °C.
        ("HMPA", "temperature: 150 °C, time: 4 h, vessel: open, pressure: 20 mbar", None),
        ("HMPA", "temperature: 250 °C, time: 4 h, vessel: open", "temperature-above-boiling"),
    ],
)
def test_boiling_at_the_stated_pressure(solvent: str, stage: str, rule: str | None) -> None:
    found = play(f"solvent: [{{name: {solvent}, volume: 20 mL}}]\nstages: [{{{stage}}}]" + NO_REACTION)
    boiling = {"temperature-above-boiling", "reflux-off-boiling"}
    assert [finding.rule for finding in found if finding.rule in boiling] == ([rule] if rule else [])
