"""Forms of a substance: molar masses as the labels of bottles print them."""

import pytest

from builder.chemistry.structure import parse_smiles
from builder.mechanism.forms import forms_of, forms_that_fit, partner_count

LAST_PRINTED_DIGIT = 0.02


@pytest.mark.parametrize(
    ("smiles", "form", "molar_mass"),
    [
        # Molar masses on suppliers' labels (from memory), g/mol.
        ("CCCC[N+](CCCC)(CCCC)CCCC.[F-]", "the trihydrate", 315.51),
        ("CCCC[N+](CCCC)(CCCC)CCCC.[F-].O.O.O", "the anhydrous form", 261.46),
        ("[Li+].[I-]", "the dihydrate", 169.88),
        ("[Na+].CC(=O)[O-]", "the trihydrate", 136.08),
        ("[Na+].[Na+].[S-2]", "the nonahydrate", 240.18),
        ("CN", "the hydrochloride", 67.52),
        ("CN.Cl", "the free base", 31.06),
        ("C[NH3+].[Cl-]", "the free base", 31.06),
        ("C[NH3+].[Cl-]", "the hydrobromide", 111.97),
        ("[Na+].[N-]=[N+]=[N-]", "the anion alone", 42.02),
        ("[Na+].[N-]=[N+]=[N-]", "the free acid", 43.03),
        ("N=[N+]=[N-]", "the sodium salt", 65.01),
        ("[K+].[O-]c1ccccc1", "the sodium salt", 116.09),
        ("CC(=O)O", "the caesium salt", 191.95),
        ("NCc1ccccc1", "the trifluoroacetate", 221.18),
    ],
)
def test_molar_masses(smiles: str, form: str, molar_mass: float) -> None:
    masses = {each.name: each.molar_mass for each in forms_of(parse_smiles(smiles))}
    assert masses[form] == pytest.approx(molar_mass, abs=LAST_PRINTED_DIGIT)


def test_what_is_drawn_is_no_other_form() -> None:
    names = {form.name for form in forms_of(parse_smiles("CN.Cl"))}
    assert "the hydrochloride" not in names
    assert "the potassium salt" not in {form.name for form in forms_of(parse_smiles("[K+].[O-]c1ccccc1"))}


def test_a_neutral_halide_has_no_other_form() -> None:
    assert forms_of(parse_smiles("CCBr")) == ()


def test_the_form_that_fits() -> None:
    fits = forms_that_fit(parse_smiles("[Na+].CC(=O)[O-]"), 136.0, 0.02)
    assert [form.name for form in fits] == ["the trihydrate"]


@pytest.mark.parametrize(
    ("smiles", "name", "count"),
    [
        ("[Li+].[I-].O.O", "monohydrate", 2),
        ("O", "monohydrate", 0),
        ("CN.Cl", "hydrochloride", 1),
        ("C[N+](C)(C)C.[Cl-]", "hydrochloride", 0),
        ("[Na+].[Na+].[S-2]", "sodium salt", 2),
    ],
)
def test_partners(smiles: str, name: str, count: int) -> None:
    assert partner_count(parse_smiles(smiles), name) == count
