"""Quantities: what is read, what is refused and with which mend, and that nothing is lost on the way."""

from decimal import Decimal

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from builder.records.quantities import (
    Dimension,
    QuantityError,
    parse_percent,
    parse_quantity,
    parse_temperature,
    units_of,
)

READ = [
    # dimension, typed, shown, canonical
    (Dimension.MASS, "2.083 g", "2.083 g", "2.083 g"),
    (Dimension.MASS, "2083 mg", "2083 mg", "2.083 g"),
    (Dimension.MASS, "1.50 kg", "1.50 kg", "1500 g"),
    (Dimension.MASS, "5 \u03bcg", "5 µg", "0.000005 g"),
    (Dimension.MASS, "5 \u00b5g", "5 µg", "0.000005 g"),
    (Dimension.VOLUME, "20\u2009mL", "20 mL", "0.020 L"),
    (Dimension.VOLUME, "20\u00a0ml", "20 mL", "0.020 L"),
    (Dimension.AMOUNT, "10.0 mmol", "10.0 mmol", "0.0100 mol"),
    (Dimension.TIME, "20 min", "20 min", "1200 s"),
    (Dimension.TIME, "16 h", "16 h", "57600 s"),
    (Dimension.CONCENTRATION, "0.5 M", "0.5 mol/L", "0.5 mol/L"),
    (Dimension.DENSITY, "1.26 g/cm³", "1.26 g/mL", "1.26 g/mL"),
    (Dimension.PRESSURE, "1 atm", "1 atm", "1.01325 bar"),
    (Dimension.FRACTION, "0.10 %", "0.10 %", "0.10 %"),
    (Dimension.RATE_CONSTANT_1, "9.2e-6 s⁻¹", "9.2e-6 1/s", "0.0000092 1/s"),
    (Dimension.RATE_CONSTANT_1, "0.033 1/h", "0.033 1/h", "0.033 1/h"),
    (Dimension.RATE_CONSTANT_2, "1.4e-3 M-1 s-1", "0.0014 L/(mol s)", "0.0014 L/(mol s)"),
]


@pytest.mark.parametrize(("dimension", "typed", "shown", "canonical"), READ, ids=[row[1] for row in READ])
def test_reads(dimension: Dimension, typed: str, shown: str, canonical: str) -> None:
    quantity = parse_quantity(typed, dimension)
    assert (str(quantity), quantity.canonical) == (shown, canonical)


TEMPERATURES = [
    ("60 °C", 60.0, 60.0),
    ("60ºC", 60.0, 60.0),
    ("60 ℃", 60.0, 60.0),
    ("60 C", 60.0, 60.0),
    ("\u221278 °C", -78.0, -78.0),
    ("\u201378 °C", -78.0, -78.0),
    ("333.15 K", 60.0, 60.0),
    ("0 °C to 25 °C", 0.0, 25.0),
    ("0 to 25 °C", 0.0, 25.0),
    ("-78 °C to -20 °C", -78.0, -20.0),
    ("20–25 °C", 20.0, 25.0),
    ("3.0e-1 °C", 0.3, 0.3),
    ("1.5e1-2.5e1 °C", 15.0, 25.0),
    ("0 °C TO 25 °C", 0.0, 25.0),
    ("0 °C – 25 °C", 0.0, 25.0),
    ("273.15 K–25 °C", 0.0, 25.0),
    ("-78–-20 °C", -78.0, -20.0),
]


@pytest.mark.parametrize(("typed", "low", "high"), TEMPERATURES, ids=[row[0] for row in TEMPERATURES])
def test_reads_temperatures(typed: str, low: float, high: float) -> None:
    temperature = parse_temperature(typed)
    assert (temperature.lowest_c, temperature.highest_c) == pytest.approx((low, high))


@pytest.mark.parametrize("typed", ["60 °C", "0 °C to 25 °C", "20–25 °C", "273.15 K – 25 °C"])
def test_temperatures_are_shown_as_typed(typed: str) -> None:
    assert str(parse_temperature(typed)) == typed


def test_kelvin_agrees_with_pint(registry: pint.UnitRegistry) -> None:
    expected = registry.Quantity(Decimal("333.15"), "kelvin").to("degC").magnitude
    assert parse_quantity("333.15 K", Dimension.TEMPERATURE).value == expected


def test_a_limit_of_detection_is_no_number() -> None:
    limit = parse_percent("< 2 %")
    assert limit.is_limit
    assert str(limit) == "< 2 %"
    assert not parse_percent("2 %").is_limit


REFUSED = [
    # dimension, typed, rule, part of the mend
    (Dimension.TEMPERATURE, 60, "quantity-without-unit", '"60 °C" or "333 K"'),
    (Dimension.MASS, Decimal("2.5"), "quantity-without-unit", '"2.5 g" or "2.5 mg"'),
    (Dimension.TIME, "16", "quantity-without-unit", '"16 s" or "16 min"'),
    (Dimension.MASS, "2,083 g", "quantity-decimal-comma", "2.083 g"),
    (Dimension.TIME, "2*8 h", "quantity-arithmetic", "the result"),
    (Dimension.MASS, "2.0 g + 0.1 g", "quantity-arithmetic", "the result"),
    (Dimension.TIME, "16 hours", "quantity-unknown-unit", '"16 h"'),
    (Dimension.TIME, "16 H", "quantity-unknown-unit", '"16 h"'),
    (Dimension.TEMPERATURE, "140 °F", "quantity-unknown-unit", "60.0 °C"),
    (Dimension.MASS, "5 lb", "quantity-unknown-unit", "g, mg, µg, kg"),
    (Dimension.VOLUME, "20 g", "quantity-wrong-dimension", "L, mL, µL"),
    (Dimension.TEMPERATURE, "rt", "quantity-vague", "20 °C to 25 °C"),
    (Dimension.TIME, "overnight", "quantity-vague", "16 h"),
    (Dimension.TEMPERATURE, "~60 °C", "quantity-vague", "60 °C"),
    (Dimension.TEMPERATURE, "0 °C -25 °C", "quantity-arithmetic", '"0–25 °C" for a band, "0 °C to 25 °C" for a ramp'),
    (Dimension.FRACTION, "80–85 %", "quantity-arithmetic", '"80 %" or "85 %"'),
    (Dimension.TIME, "1 h - 2 h", "quantity-arithmetic", '"1 h" or "2 h"'),
    (Dimension.RATE_CONSTANT_1, "9.2 × 10⁻⁶ 1/s", "quantity-unreadable", '"9.2e-6 1/s"'),
    (Dimension.RATE_CONSTANT_2, "1.4*10^-3 M-1 s-1", "quantity-unreadable", '"1.4e-3 M-1 s-1"'),
    (Dimension.MASS, "9" * 41 + " g", "quantity-out-of-range", "measured"),
    (Dimension.MASS, "1e31 g", "quantity-out-of-range", "measured"),
    (Dimension.MASS, "1e" + "9" * 5000, "quantity-out-of-range", "measured"),
    (Dimension.MASS, "some", "quantity-unreadable", "1.5 g"),
    (Dimension.MASS, ["2 g"], "quantity-unreadable", "1.5 g"),
    (Dimension.MASS, True, "quantity-unreadable", "1.5 g"),
]


EXACTLY = [
    # dimension, typed, mend, fix
    (Dimension.FRACTION, Decimal("0.98"), 'write "98 %" or "0.98 %"', None),
    (Dimension.FRACTION, "0.880", 'write "88.0 %" or "0.880 %"', None),
    (Dimension.FRACTION, 88, 'write "88 %"', "88 %"),
    (Dimension.FRACTION, "88,5 %", 'write "88.5 %"', "88.5 %"),
    (Dimension.FRACTION, "85-90 %", 'write the one that was measured, "85 %" or "90 %"', None),
    (Dimension.TIME, "16 h 30 min", 'write "16.5 h"', "16.5 h"),
    (Dimension.TIME, "16h20min", 'write "980 min"', "980 min"),
    (Dimension.TIME, "1 d 4 h", 'write "28 h"', "28 h"),
    (Dimension.MASS, "2 083 mg", 'write "2083 mg"', "2083 mg"),
    (Dimension.MASS, "1 234,5 mg", 'write "1234.5 mg"', "1234.5 mg"),
    (Dimension.MASS, "1'234 mg", 'write "1234 mg"', "1234 mg"),
    (Dimension.MASS, "2,083 mg", 'write "2.083 mg" or "2083 mg"', None),
    (Dimension.MASS, "1,234,567 g", 'write "1234567 g"', "1234567 g"),
    (Dimension.MASS, "1,234.5 g", 'write "1234.5 g"', "1234.5 g"),
    (Dimension.TEMPERATURE, "0 °C to rt", 'write what the thermometer showed, such as "0 °C to 25 °C"', None),
    (Dimension.TEMPERATURE, "rt to 60 °C", 'write what the thermometer showed, such as "25 °C to 60 °C"', None),
    (Dimension.TEMPERATURE, "0 °C to 25", 'write "0 °C to 25 °C" or "0 °C to 298 K"', None),
    (Dimension.TEMPERATURE, "0 °C to 25,5 °C", 'write "0 °C to 25.5 °C"', "0 °C to 25.5 °C"),
]


@pytest.mark.parametrize(("dimension", "typed", "mend", "fix"), EXACTLY, ids=[str(row[1]) for row in EXACTLY])
def test_offers_what_can_be_meant_and_puts_in_what_must_be(
    dimension: Dimension, typed: object, mend: str, fix: str | None
) -> None:
    read = parse_temperature if dimension is Dimension.TEMPERATURE else lambda text: parse_quantity(text, dimension)
    with pytest.raises(QuantityError) as caught:
        read(typed)
    assert (caught.value.mend, caught.value.fix) == (mend, fix)
    if fix is not None:
        read(fix)


def test_a_mended_limit_stays_a_limit() -> None:
    with pytest.raises(QuantityError) as caught:
        parse_percent("< 2")
    assert caught.value.fix == "< 2 %"


@pytest.mark.parametrize(
    ("dimension", "typed", "rule", "mend"),
    REFUSED,
    ids=[f"{row[1]:.40}" if isinstance(row[1], str) else str(row[1]) for row in REFUSED],
)
def test_refuses_with_a_mend(dimension: Dimension, typed: object, rule: str, mend: str) -> None:
    read = parse_temperature if dimension is Dimension.TEMPERATURE else lambda text: parse_quantity(text, dimension)
    with pytest.raises(QuantityError) as caught:
        read(typed)
    assert caught.value.rule == rule
    assert mend in caught.value.mend


# The unit library pint, version of the lock file, is the outside reference for every factor.
PINT_NAMES = {
    "µg": "microgram",
    "µmol": "micromole",
    "mL": "milliliter",
    "µL": "microliter",
    "d": "day",
    "h": "hour",
    "kg/m³": "kg/m**3",
    "L": "liter",
    "%": "percent",
}
CONVERTED = [
    (dimension, unit)
    for dimension in Dimension
    if dimension not in {Dimension.TEMPERATURE, Dimension.RATE_CONSTANT_1, Dimension.RATE_CONSTANT_2}
    for unit in units_of(dimension)
]


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry:
    return pint.UnitRegistry(non_int_type=Decimal)  # with its own file of definitions, where the builder has ours


@pytest.mark.parametrize(("dimension", "unit"), CONVERTED, ids=[unit for _, unit in CONVERTED])
def test_factors_agree_with_pint(dimension: Dimension, unit: str, registry: pint.UnitRegistry) -> None:
    canonical = units_of(dimension)[0]
    typed = registry.Quantity(Decimal("2.5"), PINT_NAMES.get(unit, unit))
    assert parse_quantity(f"2.5 {unit}", dimension).value == typed.to(PINT_NAMES.get(canonical, canonical)).magnitude


@given(st.decimals(min_value="0.0001", max_value="9999", places=4), st.sampled_from(["g", "mg", "kg"]))
def test_typed_digits_survive(number: Decimal, unit: str) -> None:
    quantity = parse_quantity(f"{number} {unit}", Dimension.MASS)
    again = parse_quantity(quantity.canonical, Dimension.MASS)
    assert quantity.number == number
    assert len(quantity.number.as_tuple().digits) == len(number.as_tuple().digits)
    assert again.value == quantity.value


@pytest.mark.parametrize(("typed", "half_digit"), [("10 mmol", 0.05), ("10.0 mmol", 0.005), ("2.083 g", 0.00024)])
def test_half_a_unit_in_the_last_digit(typed: str, half_digit: float) -> None:
    dimension = Dimension.AMOUNT if typed.endswith("mol") else Dimension.MASS
    assert parse_quantity(typed, dimension).half_digit == pytest.approx(half_digit, rel=0.01)
