"""Names and forms against drawings; molar masses as suppliers print them."""

import pytest

from builder.finding import Finding, Level
from tests.specimens import play

NOTHING_HAPPENED = (
    "\nstages: [{temperature: 60 °C, time: 16 h}]\n"
    "outcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate, by: GC}]}"
)


def _found(substance: str) -> list[Finding]:
    findings = play(f"nucleophile: {{{substance}}}{NOTHING_HAPPENED}")
    return [finding for finding in findings if finding.rule == "form-not-drawn"]


@pytest.mark.parametrize(
    ("substance", "level", "words"),
    [
        ("name: sodium azide, smiles: 'N=[N+]=[N-]', mass: 0.975 g", Level.ERROR, "65.01 g/mol"),
        ("name: sodium azide, smiles: 'N=[N+]=[N-]', amount: 15 mmol", Level.QUERY, "65.01 g/mol"),
        ("name: dipotassium carbonate, smiles: 'OC(=O)O', amount: 15 mmol", Level.QUERY, "correct the word"),
        ("name: cesium acetate, smiles: 'CC(=O)O', mass: 2.88 g", Level.ERROR, "191.95 g/mol"),
        ("name: methylamine, form: hydrochloride, smiles: CN, mass: 1.01 g", Level.ERROR, "67.52 g/mol"),
        ("name: 2-chloroethylamine hydrochloride, smiles: NCCCl, mass: 1.16 g", Level.ERROR, "115.99"),
        ("name: lithium iodide dihydrate, smiles: '[Li+].[I-]', mass: 2.5 g", Level.ERROR, "169.88 g/mol"),
        ("name: lithium iodide trihydrate, smiles: '[Li+].[I-].O.O', mass: 2.5 g", Level.ERROR, "187.8"),
        ("name: lithium iodide, form: anhydrous, smiles: '[Li+].[I-].O.O', mass: 2.5 g", Level.ERROR, "133.8"),
        ("name: methylamine, form: free base, smiles: CN.Cl, mass: 1.01 g", Level.ERROR, "31.06 g/mol"),
    ],
)
def test_what_is_not_drawn(substance: str, level: Level, words: str) -> None:
    (finding,) = _found(substance)
    assert finding.level is level
    assert words in finding.mend


@pytest.mark.parametrize(
    "substance",
    [
        "name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g",
        "name: sodium, smiles: '[Na]', mass: 0.23 g",
        "name: methylamine, form: hydrochloride, smiles: 'C[NH3+].[Cl-]', mass: 1.01 g",
        "name: lithium iodide dihydrate, smiles: '[Li+].[I-].O.O', mass: 2.5 g",
        "name: sodium hydroxide, form: solution in water, smiles: '[Na+].[OH-]', volume: 10 mL, strength: 1.0 mol/L",
        "name: phenol, form: set free in the flask from sodium phenoxide, smiles: Oc1ccccc1, amount: 15 mmol",
        "name: morpholine, form: anhydrous, smiles: C1COCCN1, mass: 1.0 g",
        "name: Rongalite, smiles: 'OCS(=O)[O-].[Na+].O.O', form: dihydrate, mass: 1.0 g",
    ],
)
def test_what_is_drawn(substance: str) -> None:
    assert _found(substance) == []
