"""Which slip is named where two quantities of one substance disagree; every number by hand from molar masses."""

import pytest

from builder.finding import Finding
from tests.specimens import play

SUBSTRATE = (  # 137.02 g/mol
    "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, %s}"
)
AZIDE = "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', %s}"  # 65.01 g/mol
ACETATE = "nucleophile: {name: sodium acetate, smiles: '[Na+].CC([O-])=O', %s}"  # 82.03; trihydrate 136.08
AMINE = "nucleophile: {name: benzylamine, smiles: NCc1ccccc1, %s}"  # 107.16; hydrochloride 143.61; 0.981 g/mL
TBAF = "nucleophile: {name: TBAF, smiles: 'CCCC[N+](CCCC)(CCCC)CCCC.[F-].O.O.O', %s}"  # 315.51; anhydrous 261.46
HYDRIDE = "base: {name: sodium hydride, smiles: '[Na+].[H-]', %s}"  # 24.00
IODIDE = "reagents: [{name: sodium iodide, smiles: '[Na+].[I-]', use: additive, %s}]"  # 149.89


def _found(example: str, rule: str = "quantities-disagree") -> list[Finding]:
    return [finding for finding in play(example) if finding.rule == rule]


@pytest.mark.parametrize(
    ("example", "words"),
    [
        (AZIDE % "mass: 975 g, amount: 15.0 mmol", "a factor of 1000 fits: mass 975 g was probably meant in mg"),
        (
            AZIDE % "mass: 0.975 g, amount: 15.0 mol",
            "a factor of 1000 fits: amount 15.0 mol was probably meant in mmol",
        ),
        (SUBSTRATE % "mass: 1.370 kg, amount: 10.0 mmol", "mass 1.370 kg was probably meant in g"),
        (SUBSTRATE % "mass: 1.370 g, amount: 10.0 mol", "amount 10.0 mol was probably meant in mmol"),
        (AZIDE % "mass: 0.975 mg, equivalents: 1.5", "mass 0.975 mg was probably meant in g"),
        (AZIDE % "mass: 975 mg, equivalents: 1.8", "no common slip fits"),
        (
            AZIDE % "mass: 0.975 g, purity: 92 %, amount: 15.0 mmol",
            "the purity fits: 15.0 mmol holds if 92 % were",
        ),
        (AZIDE % "mass: 0.630 g, amount: 15.0 mmol", "the mass fits the anion alone (42.02 g/mol)"),
        (ACETATE % "mass: 2.041 g, amount: 15.0 mmol", "the mass fits the trihydrate (136.08 g/mol)"),
        (AMINE % "mass: 2.154 g, amount: 15.0 mmol", "the mass fits the hydrochloride (143.62 g/mol), not"),
        (TBAF % "mass: 3.922 g, amount: 15.0 mmol", "the mass fits the anhydrous form (261.47 g/mol), not"),
        (HYDRIDE % "mass: 0.600 g, amount: 15.0 mmol", "the mass fits a 60 % dispersion in oil: add purity: 60 %"),
        (IODIDE % "mass: 150 mg, equivalents: 10", "a factor of 100 fits: 10 mol% is 0.1 equivalents"),
        # 1.65 mL taken as 1.65 g are 15.0 mmol (110.18 g/mol); at 1.078 g/mL they weigh 1.779 g, 16.1 mmol.
        (
            "nucleophile: {name: PhSH, smiles: Sc1ccccc1, volume: 1.65 mL, density: 1.078 g/mL, amount: 15.0 mmol}",
            "the density fits: 15.0 mmol holds if 1 mL weighed 1 g instead of 1.078 g/mL",
        ),
    ],
)
def test_the_slip_is_named(example: str, words: str) -> None:
    (finding,) = _found(example)
    assert words in finding.mend
    assert "believed" in finding.mend


@pytest.mark.parametrize(
    ("example", "words"),
    [
        ("concentration: 0.5 mmol/L", "1000"),
        # 10 mmol in 20 mL DMF and 10 mL of solution: 0.333 mol/L in all liquids, 0.5 mol/L in the solvent.
        (
            "concentration: 0.333 mol/L\n"
            "base: {name: sodium hydroxide, smiles: '[Na+].[OH-]', volume: 10 mL, strength: 1.0 mol/L}",
            "fits the total of all liquids, 30.0 mL",
        ),
    ],
)
def test_the_basis_of_a_concentration_is_named(example: str, words: str) -> None:
    (finding,) = _found(example)
    assert words in finding.mend


@pytest.mark.parametrize(
    "example",
    [
        # Honest rounding: each pair agrees within half a unit in the last digits typed.
        AZIDE % "mass: 1.0 g, equivalents: 1.5",  # 15.4 mmol against 15.0, half a digit of 1.0 is 5 %
        AZIDE % "mass: 0.98 g, amount: 15 mmol",
        AZIDE % "mass: 0.975 g, amount: 15 mmol, equivalents: 1.5",
        AZIDE % "mass: 0.985 g, purity: 99 %, amount: 15.0 mmol",
        ACETATE % "mass: 1.23 g, amount: 15.0 mmol",
        AMINE % "volume: 1.64 mL, density: 0.981 g/mL, amount: 15.0 mmol",
    ],
)
def test_honest_rounding_is_silent(example: str) -> None:
    assert _found(example) == []
