"""Yields against what the reagents allow; the numbers by hand from the amounts, 10 mmol of substrate in each."""

import pytest

from builder.finding import Finding, Level
from builder.records.specimen import outcome_example
from tests.specimens import play

STAGE = "\nstages: [{temperature: 60 °C, time: 16 h}]\n"
BUTYL = "substrate: {name: 1-bromobutane, smiles: CCCCBr, class: primary, leaving_group: bromide, amount: 10 mmol}"
SULFIDE = "nucleophile: {name: sodium sulfide, smiles: '[Na+].[Na+].[S-2]', equivalents: %s}"


def _product(smiles: str, percent: float, kind: str = "assay") -> str:
    drawn = f"{{label: A, name: the product, smiles: '{smiles}', use: desired}}"
    return outcome_example(f"{{yield: {percent:g} %, of: A, kind: {kind}}}", products=drawn)


def _limits(example: str) -> list[Finding]:
    return [each for each in play(example) if each.rule in {"yield-above-reagent", "reagent-below-one"}]


@pytest.mark.parametrize(
    ("example", "rule", "most"),
    [
        # sulfide is alkylated twice: 0.4 equivalents give at most 80 % of dibutyl sulfide, counted on the bromide
        (BUTYL + "\n" + SULFIDE % "0.40" + STAGE + _product("CCCCSCCCC", 90), "yield-above-reagent", 80.0),
        (BUTYL + "\n" + SULFIDE % "0.40" + STAGE + _product("CCCCSCCCC", 70), "reagent-below-one", 80.0),
        # phosphorus tribromide gives three bromides: 0.25 equivalents, at most 75 %
        (
            "substrate: {name: butan-1-ol, smiles: CCCCO, class: primary, leaving_group: hydroxyl, amount: 10 mmol}\n"
            "nucleophile: {name: phosphorus tribromide, smiles: 'BrP(Br)Br', equivalents: 0.25}\n"
            "solvent: [{name: diethyl ether, volume: 20 mL}]\nstages: [{temperature: 20 °C, time: 16 h}]\n"
            + _product("CCCCBr", 85),
            "yield-above-reagent",
            75.0,
        ),
    ],
)
def test_what_a_reagent_allows(example: str, rule: str, most: float) -> None:
    (finding,) = _limits(example)
    assert finding.rule == rule
    assert finding.data["most_percent"] == pytest.approx(most, abs=0.1)
    assert finding.level is (Level.ERROR if rule == "yield-above-reagent" else Level.QUERY)


@pytest.mark.parametrize(
    "example",
    [
        BUTYL + "\n" + SULFIDE % "0.55" + STAGE + _product("CCCCSCCCC", 90),
        # an area share is no yield on amounts
        BUTYL + "\n" + SULFIDE % "0.50" + STAGE + _product("CCCCSCCCC", 99, "area"),
        # the carbonate is no nucleophile, and takes two protons of the phenol
        BUTYL
        + "\nnucleophile: {name: phenol, smiles: Oc1ccccc1, equivalents: 1.05}\n"
        + "base: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', equivalents: 0.6}"
        + STAGE
        + _product("CCCCOc1ccccc1", 92),
        # 10 mmol weighed as 1.4 g: honest rounding
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, mass: 1.4 g}\n"
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.65 g}"
        + STAGE
        + _product("CCC(C)N=[N+]=[N-]", 81),
    ],
)
def test_enough_reagent_is_silent(example: str) -> None:
    assert _limits(example) == []


@pytest.mark.parametrize(
    ("nucleophile", "product", "is_asked"),
    [
        ("name: benzylamine, smiles: NCc1ccccc1, equivalents: 1.0", "CCCCNCc1ccccc1", True),
        ("name: piperidine, smiles: C1CCNCC1, equivalents: 1.0", "CCCCN1CCCCC1", True),
        ("name: diethyl malonate, smiles: CCOC(=O)CC(=O)OCC, equivalents: 1.0", "CCCCC(C(=O)OCC)C(=O)OCC", True),
        ("name: benzylamine, smiles: NCc1ccccc1, equivalents: 3.0", "CCCCNCc1ccccc1", False),
        ("name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.0", "CCCCN=[N+]=[N-]", False),
        (
            "name: potassium phthalimide, smiles: '[K+].O=C1[N-]C(=O)c2ccccc21', equivalents: 1.0",
            "CCCCN1C(=O)c2ccccc2C1=O",
            False,
        ),
    ],
)
def test_order_of_addition(nucleophile: str, product: str, *, is_asked: bool) -> None:
    base = (
        "base: {name: sodium ethoxide, smiles: '[Na+].CC[O-]', equivalents: 1.0}" if "malonate" in nucleophile else ""
    )
    found = play(f"{BUTYL}\nnucleophile: {{{nucleophile}}}\n{base}{STAGE}{_product(product, 61)}")
    assert ("order-of-addition-open" in {each.rule for each in found}) == is_asked
