"""Numbers as a reader wants to see them; expected texts by hand."""

import pytest

from builder.publish.facets import slug_of
from builder.publish.figures import (
    amount_text,
    equivalents_text,
    formula_parts,
    mass_text,
    quantity_text,
    significant,
    volume_text,
)
from builder.records.quantities import Dimension, parse_quantity


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (9.996, "10.0"),
        (0.0500, "0.0500"),
        (0.00099996, "0.00100"),
        (12345.6, "12300"),
        (9.2e-6, "9.20 × 10⁻⁶"),
        (-1.5, "-1.50"),
        (3.2e7, "3.20 × 10⁷"),
    ],
)
def test_three_significant_digits(value: float, text: str) -> None:
    assert significant(value) == text


@pytest.mark.parametrize(
    ("text_of", "value", "text"),
    [
        (mass_text, 0.975, "0.975 g"),
        (mass_text, 0.0123, "12.3 mg"),
        (mass_text, 2500.0, "2.50 kg"),
        (amount_text, 0.010, "10.0 mmol"),
        (amount_text, 12.0, "12.0 mol"),
        (amount_text, 2e-6, "2.00 µmol"),
        (volume_text, 0.040, "40.0 mL"),
        (volume_text, 12.5, "12.5 L"),
        (volume_text, 5e-5, "50.0 µL"),
        (equivalents_text, 1.5, "1.50"),
        (equivalents_text, 0.05, "0.0500"),
    ],
)
def test_derived_quantities_choose_a_readable_unit(text_of, value: float, text: str) -> None:
    assert text_of(value) == text


@pytest.mark.parametrize(
    ("typed", "dimension", "text"),
    [
        ("2.083 g", Dimension.MASS, "2.083 g"),
        ("10.0 mmol", Dimension.AMOUNT, "10.0 mmol"),
        ("9.2e-6 1/s", Dimension.RATE_CONSTANT_1, "9.2 × 10⁻⁶ s⁻¹"),
        ("1.40e-3 L/(mol s)", Dimension.RATE_CONSTANT_2, "0.00140 L mol⁻¹ s⁻¹"),
    ],
)
def test_typed_quantities_keep_their_digits(typed: str, dimension: Dimension, text: str) -> None:
    assert quantity_text(parse_quantity(typed, dimension)) == text


@pytest.mark.parametrize(
    ("formula", "parts"),
    [
        ("C8H17N3", (("C", "8"), ("H", "17"), ("N", "3"))),
        ("C2H5O-", (("C", "2"), ("H", "5"), ("O", ""), ("-", ""))),
        ("H4N+", (("H", "4"), ("N", ""), ("+", ""))),
        ("C4H4O4-2", (("C", "4"), ("H", "4"), ("O", "4"), ("-2", ""))),
    ],
)
def test_formulae_are_split_for_subscripts(formula: str, parts: tuple[tuple[str, str], ...]) -> None:
    assert formula_parts(formula) == parts


@pytest.mark.parametrize(
    ("text", "slug"),
    [("sodium azide", "sodium-azide"), ("SN2'", "sn2"), ("../../x", "x"), ("Ω", ""), ("tert-butanol", "tert-butanol")],
)
def test_slugs_are_plain(text: str, slug: str) -> None:
    assert slug_of(text) == slug
