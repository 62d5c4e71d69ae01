"""Numbers as a reader wants to see them; expected texts by hand."""

import pytest

from builder.records.figures import amount_text, equivalents_text, mass_text, quantity_text, significant, volume_text
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
        (equivalents_text, 1500.0, "1500"),
        (amount_text, 0.9996, "1000 mmol"),
        (volume_text, 20.0, "20.0 L"),
        (volume_text, 0.0, "0 mL"),
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
