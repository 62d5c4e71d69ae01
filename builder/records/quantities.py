"""Quantities as chemists type them: "60 °C", "2.083 g", "< 2 %", "0 °C to 25 °C".

Own grammar and a closed list of units; pint converts and never parses. The typed digits are kept as decimals, so
significant figures survive and no number passes through a float on its way into the digest.
"""

import re
from dataclasses import dataclass
from decimal import Decimal
from enum import StrEnum
from functools import cache

import pint

__all__ = [
    "Dimension",
    "Percent",
    "Quantity",
    "QuantityError",
    "Temperature",
    "comma_error",
    "decimal_text",
    "half_unit",
    "is_beyond_measure",
    "is_unit",
    "number_text",
    "parse_percent",
    "parse_quantity",
    "parse_temperature",
    "quantity_pattern",
    "temperature_pattern",
    "units_of",
    "writing_aids",
]


class Dimension(StrEnum):
    """What a field measures; the value is the word used in messages."""

    MASS = "mass"
    AMOUNT = "amount"
    VOLUME = "volume"
    TIME = "time"
    TEMPERATURE = "temperature"
    CONCENTRATION = "concentration"
    DENSITY = "density"
    PRESSURE = "pressure"
    FRACTION = "percentage"
    RATE_CONSTANT_1 = "first-order rate constant"
    RATE_CONSTANT_2 = "second-order rate constant"
    MOLAR_ENTHALPY = "molar enthalpy"
    HEAT_CAPACITY = "specific heat capacity"


@dataclass(frozen=True, slots=True)
class _Unit:
    """One permitted unit: how we write it, pint's name, the spellings accepted."""

    symbol: str
    pint: str
    spellings: tuple[str, ...]


# Dimension -> permitted units; the first is the canonical one, in which digests and comparisons are made.
# Rate constants have no exact decimal factor between hours and seconds, so the digest keeps their typed unit.
_UNITS: dict[Dimension, tuple[_Unit, ...]] = {
    Dimension.MASS: (
        _Unit("g", "gram", ("g",)),
        _Unit("mg", "milligram", ("mg",)),
        _Unit("µg", "microgram", ("µg", "ug")),
        _Unit("kg", "kilogram", ("kg",)),
    ),
    Dimension.AMOUNT: (
        _Unit("mol", "mole", ("mol",)),
        _Unit("mmol", "millimole", ("mmol",)),
        _Unit("µmol", "micromole", ("µmol", "umol")),
    ),
    Dimension.VOLUME: (
        _Unit("L", "liter", ("L", "l")),
        _Unit("mL", "milliliter", ("mL", "ml", "cm3", "cm³")),
        _Unit("µL", "microliter", ("µL", "µl", "uL", "ul")),
    ),
    Dimension.TIME: (
        _Unit("s", "second", ("s",)),
        _Unit("min", "minute", ("min",)),
        _Unit("h", "hour", ("h",)),
        _Unit("d", "day", ("d",)),
    ),
    Dimension.TEMPERATURE: (
        _Unit("°C", "degC", ("°C", "ºC", "℃", "C", "° C")),
        _Unit("K", "kelvin", ("K",)),
    ),
    Dimension.CONCENTRATION: (
        _Unit("mol/L", "mole/liter", ("mol/L", "mol/l", "M")),
        _Unit("mmol/L", "millimole/liter", ("mmol/L", "mmol/l", "mM")),
    ),
    Dimension.DENSITY: (
        _Unit("g/mL", "gram/milliliter", ("g/mL", "g/ml", "g/cm3", "g/cm³", "kg/L")),
        _Unit("kg/m³", "kilogram/meter**3", ("kg/m³", "kg/m3", "g/L")),
    ),
    Dimension.PRESSURE: (
        _Unit("bar", "bar", ("bar",)),
        _Unit("mbar", "millibar", ("mbar", "hPa")),
        _Unit("kPa", "kilopascal", ("kPa",)),
        _Unit("MPa", "megapascal", ("MPa",)),
        _Unit("Pa", "pascal", ("Pa",)),
        _Unit("atm", "atm", ("atm",)),
    ),
    Dimension.FRACTION: (_Unit("%", "percent", ("%",)),),
    Dimension.RATE_CONSTANT_1: (
        _Unit("1/s", "1/second", ("1/s", "s-1", "s^-1", "s⁻¹", "/s")),
        _Unit("1/min", "1/minute", ("1/min", "min-1", "min^-1", "min⁻¹", "/min")),
        _Unit("1/h", "1/hour", ("1/h", "h-1", "h^-1", "h⁻¹", "/h")),
    ),
    Dimension.RATE_CONSTANT_2: (
        _Unit(
            "L/(mol s)",
            "liter/mole/second",
            ("L/(mol s)", "L/mol/s", "L mol-1 s-1", "L mol⁻¹ s⁻¹", "1/(M s)", "M-1 s-1", "M⁻¹ s⁻¹"),
        ),
        _Unit("L/(mol min)", "liter/mole/minute", ("L/(mol min)", "L/mol/min", "M-1 min-1", "M⁻¹ min⁻¹")),
        _Unit("L/(mol h)", "liter/mole/hour", ("L/(mol h)", "L/mol/h", "M-1 h-1", "M⁻¹ h⁻¹")),
    ),
    Dimension.MOLAR_ENTHALPY: (_Unit("kJ/mol", "kilojoule/mole", ("kJ/mol", "kJ mol-1", "kJ mol⁻¹")),),
    Dimension.HEAT_CAPACITY: (
        _Unit(
            "J/(g K)",
            "joule/gram/kelvin",
            ("J/(g K)", "J/(g*K)", "J/(g·K)", "J/g/K", "J g-1 K-1", "kJ/(kg K)", "kJ/(kg*K)", "kJ/(kg·K)"),
        ),
    ),
}
_BY_SPELLING = {
    dimension: {spelling: unit for unit in units for spelling in unit.spellings} for dimension, units in _UNITS.items()
}
_KEEPS_ITS_UNIT = {Dimension.RATE_CONSTANT_1, Dimension.RATE_CONSTANT_2}

# What pint needs for the units above, and no more: its own file of definitions takes half a second to read.
# SI brochure, 9th edition (2019), tables 4, 7 and 8; standard atmosphere: 10th CGPM (1954), resolution 4.
_DEFINITIONS = """
milli- = 1e-3
micro- = 1e-6
kilo- = 1e3
mega- = 1e6
gram = [mass]
mole = [substance]
meter = [length]
second = [time]
minute = 60 * second
hour = 60 * minute
day = 24 * hour
kelvin = [temperature]; offset: 0
degC = kelvin; offset: 273.15
liter = 1e-3 * meter ** 3
pascal = kilogram / meter / second ** 2
joule = kilogram * meter ** 2 / second ** 2
bar = 1e5 * pascal
atm = 101325 * pascal
"""

_MAX_NUMBER_LENGTH = 40
_MAX_EXPONENT = 30

_UNSIGNED = r"(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_NUMBER = rf"[+-]?{_UNSIGNED}"
_QUANTITY = re.compile(rf"(?P<number>{_NUMBER})\s*(?P<unit>\S.*)?")
_SPACES = re.compile(r"[\s\u00a0\u2000-\u200a\u202f\u205f]+")
_LOOKALIKES = str.maketrans({"\u2212": "-", "\u2012": "-", "\u2013": "-", "\u03bc": "µ", "\u2010": "-", "\u2011": "-"})
_RAMP = re.compile(r" [tT][oO] ")
_LOW = rf"(?P<low>(?>{_NUMBER}))(?P<low_unit> ?[^\s\d+-](?:[^-]*[^\s-])?)?"
_BAND = re.compile(rf"{_LOW}(?:-| - )(?P<high>{_NUMBER} ?\D.*)")
_RANGE = re.compile(rf"{_LOW} ?- ?(?P<high>{_UNSIGNED}) ?(?P<unit>\D.*)")
_POWER_OF_TEN = re.compile(
    r"(?P<factor>[+-]?[0-9.]+) ?[×x*·] ?10 ?\^? ?(?P<power>[⁺⁻]?[⁰¹²³⁴⁵⁶⁷⁸⁹]+|[+-]?[0-9]+) ?(?P<unit>\S.*)"
)
_RAISED = str.maketrans("⁺⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "+-0123456789")
_COMMA = re.compile(r"\d,\d")
_GROUPS_OF_THREE = re.compile(
    r"(?P<digits>[+-]?[1-9][0-9]{0,2}(?:(?P<sign>[,' ’])[0-9]{3})+)(?P<rest>(?:\.[0-9]+)? ?[^\s\d].*|)"
)
_COMMA_AND_UNIT = re.compile(r"[+-]?\d+(?:,\d+)+(?P<unit> ?[^\s\d,].*|)")
_ONE_OF_SEVERAL = re.compile(rf"(?P<number>(?>{_UNSIGNED})) ?(?P<unit>[^\s\d.,+-]+)")
_SEVERAL = re.compile(rf"(?:(?>{_UNSIGNED}) ?[^\s\d.,+-]+ ?){{2,}}")  # atomic: a hostile "1e1e1e1…" stays linear
_ARITHMETIC = re.compile(r"\d\s*[*×x/+]\s*\d|\d\s+-\s+\d")
_ABOUT = re.compile(r"^(~|≈|ca\.?|circa|about|approx\.?)\s*", re.IGNORECASE)
_VAGUE = {
    **dict.fromkeys(
        ("rt", "r.t.", "room temperature", "ambient"), 'what the thermometer showed, such as "20 °C to 25 °C"'
    ),
    "reflux": 'the temperature it boiled at, such as "78 °C", and vessel: reflux',
    **dict.fromkeys(("overnight", "o/n"), 'the time it was, such as "16 h"'),
    "weekend": 'the time it was, such as "64 h"',
    "excess": "the number of equivalents",
    "catalytic": "the number of equivalents",
}
_SPELLED_OUT = {
    **dict.fromkeys(("hours", "hour", "hr", "hrs"), "h"),
    **dict.fromkeys(("mins", "minutes", "minute"), "min"),
    **dict.fromkeys(("sec", "secs", "seconds", "second"), "s"),
    **dict.fromkeys(("days", "day"), "d"),
    **dict.fromkeys(("grams", "gram", "gr"), "g"),
    **dict.fromkeys(("milligrams", "milligram"), "mg"),
    **dict.fromkeys(("kilograms", "kilogram"), "kg"),
    **dict.fromkeys(("mols", "moles", "mole"), "mol"),
    **dict.fromkeys(("millimoles", "millimole", "mmols"), "mmol"),
    **dict.fromkeys(("litres", "litre", "liters", "liter"), "L"),
    **dict.fromkeys(("millilitres", "millilitre", "milliliters", "milliliter"), "mL"),
    **dict.fromkeys(("microlitres", "microlitre", "microliters", "microliter"), "µL"),
    **dict.fromkeys(("degc", "celsius", "deg c", "degrees c"), "°C"),
    **dict.fromkeys(("percent", "pct", "per cent"), "%"),
    "kelvin": "K",
    "cc": "mL",
}


class QuantityError(ValueError):
    """A text that is no quantity of the wanted dimension; carries the rule it breaks and the exact mend.

    is_sure: `fix` is the only thing that can be meant.
    """

    def __init__(self, rule: str, message: str, mend: str, fix: str | None = None, *, is_sure: bool = False) -> None:
        super().__init__(message)
        self.rule, self.message, self.mend, self.fix, self.is_sure = rule, message, mend, fix, is_sure

    def within(self, before: str, after: str) -> "QuantityError":
        """Return the same error of a longer text: what it offers keeps what stands before and after."""
        mend = re.sub(r'"(?:[^"]+ to )?([^"]*)"', lambda offer: f'"{before}{offer[1]}{after}"', self.mend)
        fix = None if self.fix is None else f"{before}{self.fix}{after}"
        return QuantityError(self.rule, self.message, mend, fix, is_sure=self.is_sure)


def half_unit(number: Decimal) -> float:
    """Return half a unit in the last typed digit of a number, in the unit of the number; 0 for one without digits."""
    exponent = number.as_tuple().exponent
    return float(Decimal(5).scaleb(exponent - 1)) if isinstance(exponent, int) else 0.0


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number with its unit, as typed and in the canonical unit of its dimension.

    number: the typed decimal, digits kept. unit: our symbol for the typed unit.
    value: in the canonical unit of the dimension (g, mol, L, s, °C, mol/L, g/mL, bar, %, 1/s, L/(mol s), kJ/mol,
    J/(g K)).
    """

    dimension: Dimension
    number: Decimal
    unit: str
    value: Decimal

    @property
    def magnitude(self) -> float:
        """Return the value in the canonical unit, for arithmetic."""
        return float(self.value)

    @property
    def half_digit(self) -> float:
        """Return half a unit in the last typed digit, relative to the value: the width of honest rounding."""
        size = abs(float(self.number))
        return half_unit(self.number) / size if size else 0.0

    @property
    def canonical(self) -> str:
        """Return decimal text with the canonical unit, as it enters the digest."""
        if self.dimension in _KEEPS_ITS_UNIT:
            return f"{decimal_text(self.number)} {self.unit}"
        return f"{decimal_text(self.value)} {_UNITS[self.dimension][0].symbol}"

    def __str__(self) -> str:
        return f"{number_text(self.number)} {self.unit}"


@dataclass(frozen=True, slots=True)
class Temperature:
    """A temperature, a ramp ("0 °C to 25 °C") or a band ("20–25 °C"); one value stands twice."""

    start: Quantity
    end: Quantity
    is_band: bool = False

    @property
    def lowest_c(self) -> float:
        """Return the lower end in °C."""
        return min(self.start.magnitude, self.end.magnitude)

    @property
    def highest_c(self) -> float:
        """Return the upper end in °C."""
        return max(self.start.magnitude, self.end.magnitude)

    @property
    def canonical(self) -> str:
        """Return the text that enters the digest."""
        if self.start == self.end:
            return self.start.canonical
        return f"{self.start.canonical} {'..' if self.is_band else 'to'} {self.end.canonical}"

    def __str__(self) -> str:
        if self.start == self.end:
            return str(self.start)
        if self.is_band and self.start.unit == self.end.unit:
            return f"{number_text(self.start.number)}–{self.end}"
        return f"{self.start} {'–' if self.is_band else 'to'} {self.end}"


@dataclass(frozen=True, slots=True)
class Percent:
    """A measured percentage, or a limit of detection ("< 2 %")."""

    quantity: Quantity
    relation: str = ""

    @property
    def magnitude(self) -> float:
        """Return the number of percent."""
        return self.quantity.magnitude

    @property
    def is_limit(self) -> bool:
        """Say whether the value is a bound rather than a measured number."""
        return bool(self.relation)

    @property
    def is_upper_limit(self) -> bool:
        """Say whether no more than this was found, as in "< 2 %"."""
        return self.relation in {"<", "≤"}

    @property
    def canonical(self) -> str:
        """Return the text that enters the digest."""
        return f"{self.relation} {self.quantity.canonical}".strip()

    def __str__(self) -> str:
        return f"{self.relation} {self.quantity}".strip()


def units_of(dimension: Dimension) -> tuple[str, ...]:
    """Return the symbols of the permitted units, canonical first."""
    return tuple(unit.symbol for unit in _UNITS[dimension])


def is_unit(text: str) -> bool:
    """Say whether `text` is a spelling of a permitted unit of any dimension."""
    return any(text in spellings for spellings in _BY_SPELLING.values())


def is_beyond_measure(number: str) -> bool:
    """Say whether a number is longer, or its power of ten larger, than any measurement; safe for hostile text."""
    _, _, exponent = number.lower().partition("e")
    return len(number) > _MAX_NUMBER_LENGTH or (bool(exponent) and abs(int(exponent)) > _MAX_EXPONENT)


def writing_aids() -> dict[str, object]:
    """Return as plain data what a mend at the keyboard needs: units with their spellings, and words that are no unit.

    units: by dimension; value × factor + offset is in the first unit of the dimension. vague: word -> what to write.
    spelled_out: word -> unit. longest, most_exponent: of a number.
    """
    return {
        "units": {str(dimension): [_unit_aid(unit, units[0]) for unit in units] for dimension, units in _UNITS.items()},
        "vague": _VAGUE,
        "spelled_out": _SPELLED_OUT,
        "longest": _MAX_NUMBER_LENGTH,
        "most_exponent": _MAX_EXPONENT,
    }


def _unit_aid(unit: _Unit, canonical: _Unit) -> dict[str, object]:
    if unit.pint == "kelvin":
        return {"symbol": unit.symbol, "spellings": unit.spellings, "factor": 1.0, "offset": -273.15}
    factor = 1.0 if unit is canonical else float(_factor(unit.pint, canonical.pint))
    return {"symbol": unit.symbol, "spellings": unit.spellings, "factor": factor, "offset": 0.0}


def quantity_pattern(dimension: Dimension, *, is_positive: bool) -> str:
    """Return a regular expression, without anchors, for what `parse_quantity` reads, for the JSON Schema.

    It keeps to what Python and ECMAScript share.
    """
    number = _AS_TYPED_POSITIVE if is_positive else _AS_TYPED
    return rf"{number}\s*({_units_as_typed(dimension)})"


def temperature_pattern() -> str:
    """Return a regular expression, without anchors, for what `parse_temperature` reads."""
    units = _units_as_typed(Dimension.TEMPERATURE)
    joint = rf"\s+[tT][oO]\s+|\s*{_DASH_AS_TYPED}\s*"
    return rf"({_AS_TYPED}\s*({units})?({joint}))?{_AS_TYPED}\s*({units})"


_DASH_AS_TYPED = r"[-\u2010-\u2013\u2212]"
_UNSIGNED_AS_TYPED = _UNSIGNED.replace("[+-]", r"[+\-\u2010-\u2013\u2212]")
_AS_TYPED = rf"(\+|{_DASH_AS_TYPED})?{_UNSIGNED_AS_TYPED}"
_AS_TYPED_POSITIVE = rf"\+?(?=[0-9.]*[1-9]){_UNSIGNED_AS_TYPED}"


def _units_as_typed(dimension: Dimension) -> str:
    classes = {"-": _DASH_AS_TYPED, "µ": r"[\u00b5\u03bc]", " ": r"\s+"}
    return "|".join(
        "".join(classes.get(sign) or re.escape(sign) for sign in spelling) for spelling in _BY_SPELLING[dimension]
    )


def parse_quantity(text: object, dimension: Dimension) -> Quantity:
    """Read a quantity of `dimension`.

    Raises QuantityError for a missing, unknown or unfit unit, a decimal comma, arithmetic, or a vague word.
    """
    if isinstance(text, (int, Decimal)) and not isinstance(text, bool):
        raise _no_unit(str(text), dimension)
    if not isinstance(text, str):
        raise QuantityError(
            "quantity-unreadable",
            f"{dimension} is not a number with a unit",
            f'write one like "{_example(dimension)}"',
        )
    tidy = _tidy(text)
    match = _QUANTITY.fullmatch(tidy)
    if match and is_beyond_measure(match["number"]):
        raise QuantityError(
            "quantity-out-of-range", f'"{text:.40}" is beyond any {dimension}', "write the number that was measured"
        )
    spelling = (match["unit"] or "").strip() if match else ""
    if match and spelling in _BY_SPELLING[dimension]:
        return _quantity(Decimal(match["number"]), _BY_SPELLING[dimension][spelling], dimension)
    raise _quantity_error(text, tidy, match["number"] if match else None, spelling, dimension)


def parse_temperature(text: object) -> Temperature:
    """Read a temperature, a ramp or a band.

    Raises QuantityError as `parse_quantity` does.
    """
    if isinstance(text, str):
        tidy = _tidy(text)
        start, *rest = _RAMP.split(tidy)
        if len(rest) == 1:
            return _span(start, " to ", rest[0])
        band = _BAND.fullmatch(tidy)
        if band:
            return _span(band["low"] + (band["low_unit"] or ""), "–", band["high"])
    value = parse_quantity(text, Dimension.TEMPERATURE)
    return Temperature(value, value)


def _span(start: str, joint: str, end: str) -> Temperature:
    """Return the temperature between two texts, the first of which may leave its unit to the second."""
    last = _part_of(f"{start}{joint}", end, "", Dimension.TEMPERATURE)
    first = f"{start} {last.unit}" if re.fullmatch(_NUMBER, start) else start
    return Temperature(_part_of("", first, f"{joint}{end}", Dimension.TEMPERATURE), last, is_band=joint == "–")


def _part_of(before: str, text: str, after: str, dimension: Dimension) -> Quantity:
    try:
        return parse_quantity(text, dimension)
    except QuantityError as error:
        raise error.within(before, after) from None


def parse_percent(text: object) -> Percent:
    """Read a percentage or a detection limit.

    Raises QuantityError as `parse_quantity` does, or for a value outside the relation signs <, >, ≤, ≥.
    """
    if isinstance(text, str):
        match = re.fullmatch(r"\s*(?P<relation>[<>≤≥])\s*(?P<rest>.*)", text)
        if match:
            relation = match["relation"]
            return Percent(_part_of(f"{relation} ", match["rest"], "", Dimension.FRACTION), relation)
    return Percent(parse_quantity(text, Dimension.FRACTION))


def decimal_text(number: Decimal) -> str:
    """Return plain decimal text, all digits kept and no exponent."""
    return format(number, "f")


def number_text(number: Decimal) -> str:
    """Return the number for reading: plain from 0.001 to 99999, else with a power of ten."""
    if not number or Decimal("0.001") <= abs(number) < Decimal(100000):
        return format(number, "f")
    mantissa, _, exponent = f"{number:E}".partition("E")
    return f"{mantissa}e{int(exponent)}"


def _tidy(text: str) -> str:
    return _SPACES.sub(" ", text.strip().translate(_LOOKALIKES))


def _quantity(number: Decimal, unit: _Unit, dimension: Dimension) -> Quantity:
    canonical = _UNITS[dimension][0]
    if unit is canonical or dimension is Dimension.FRACTION:
        return Quantity(dimension, number, unit.symbol, number)
    if dimension is Dimension.TEMPERATURE:
        return Quantity(dimension, number, unit.symbol, _registry().Quantity(number, unit.pint).to("degC").magnitude)
    return Quantity(dimension, number, unit.symbol, number * _factor(unit.pint, canonical.pint))


@cache
def _registry() -> "pint.UnitRegistry[Decimal]":
    registry: pint.UnitRegistry[Decimal] = pint.UnitRegistry(None, non_int_type=Decimal)
    registry.load_definitions(_DEFINITIONS.splitlines())
    return registry


@cache
def _factor(unit: str, canonical: str) -> Decimal:
    magnitude: Decimal = _registry().Quantity(Decimal(1), unit).to(canonical).magnitude
    return magnitude.normalize()


def _a(dimension: Dimension) -> str:
    return f"an {dimension}" if dimension is Dimension.AMOUNT else f"a {dimension}"


def _example(dimension: Dimension) -> str:
    number = {Dimension.TEMPERATURE: "60", Dimension.TIME: "16", Dimension.FRACTION: "88"}.get(dimension, "1.5")
    return f"{number} {_UNITS[dimension][0].symbol}" if dimension is not Dimension.TIME else "16 h"


def _no_unit(number: str, dimension: Dimension) -> QuantityError:
    units = units_of(dimension)
    offers = [f'"{number} {units[0]}"']
    # 0.98 is as likely a share of one as a percentage, so both are offered and neither is put in.
    is_share = dimension is Dimension.FRACTION and 0 < abs(Decimal(number)) <= 1
    if is_share:
        offers.insert(0, f'"{format(Decimal(number).scaleb(2), "f")} %"')
    elif dimension is Dimension.TEMPERATURE:
        offers.append(f'"{round(Decimal(number) + 273)} K"')
    elif len(units) > 1:
        offers.append(f'"{number} {units[1]}"')
    fix = offers[0] if dimension is Dimension.FRACTION and not is_share else None
    return QuantityError(
        "quantity-without-unit",
        f"the {dimension} has no unit",
        f"write {' or '.join(offers)}",
        fix=fix.strip('"') if fix else None,
        is_sure=fix is not None,
    )


def _quantity_error(text: str, tidy: str, number: str | None, spelling: str, dimension: Dimension) -> QuantityError:
    word = tidy.casefold()
    if word in _VAGUE:
        return QuantityError("quantity-vague", f'"{text}" is not a measured {dimension}', f"write {_VAGUE[word]}")
    if _ABOUT.match(tidy):
        rest = _ABOUT.sub("", tidy)
        return QuantityError("quantity-vague", f'"{text}" says "about"', f'write "{rest}"', fix=rest)
    if _COMMA.search(tidy) or _GROUPS_OF_THREE.fullmatch(tidy):
        return _grouped_error(text, tidy)
    if number is not None and not spelling:
        return _no_unit(number, dimension)
    for find in (_power_of_ten_error, _range_error, _several_error):
        mended = find(text, tidy, dimension)
        if mended:
            return mended
    if number is not None:
        return _unit_error(text, number, spelling, dimension)
    if _ARITHMETIC.search(tidy):
        return QuantityError(
            "quantity-arithmetic", f'"{text}" is a sum, not a number', "write the result, with its unit"
        )
    return QuantityError(
        "quantity-unreadable", f'"{text}" is not {_a(dimension)}', f'write one like "{_example(dimension)}"'
    )


def comma_error(text: str, *, is_bare: bool) -> QuantityError | None:
    """Return the error of a number with a comma and a unit we know; None for any other text.

    is_bare: the number stands without a unit.
    """
    tidy = _tidy(text)
    match = _COMMA_AND_UNIT.fullmatch(tidy)
    if match is None:
        return None
    unit = match["unit"].strip()
    is_known = any(unit in spellings for spellings in _BY_SPELLING.values())
    return _grouped_error(text, tidy) if is_known or (is_bare and not unit) else None


def _grouped_error(text: str, tidy: str) -> QuantityError:
    """Return the error of a number with a comma inside, or with its thousands set apart."""
    groups = _GROUPS_OF_THREE.fullmatch(tidy)
    said = f'"{text}" has a comma inside the number'
    offers = [tidy.replace(",", ".")]
    if groups and groups["sign"] == ",":
        whole = re.sub(",", "", groups["digits"]) + groups["rest"]
        offers = [*offers, whole] if tidy.count(",") == 1 and "." not in tidy else [whole]
    elif groups:
        said = f'"{text}" has its thousands set apart'
        offers = [re.sub(r"[^+\-0-9]", "", groups["digits"]) + groups["rest"].replace(",", ".")]
    mend = "write " + " or ".join(f'"{offer}"' for offer in offers)
    return QuantityError(
        "quantity-decimal-comma", said, mend, fix=offers[0] if len(offers) == 1 else None, is_sure=True
    )


def _several_error(text: str, tidy: str, dimension: Dimension) -> QuantityError | None:
    """Return the error of a quantity in several units, "16 h 30 min", with its exact sum."""
    if dimension is Dimension.TEMPERATURE or not _SEVERAL.fullmatch(tidy):
        return None
    parts = [(part["number"], part["unit"]) for part in _ONE_OF_SEVERAL.finditer(tidy)]
    known = _BY_SPELLING[dimension]
    if any(unit not in known or is_beyond_measure(number) for number, unit in parts):
        return None
    total = sum(_quantity(Decimal(number), known[unit], dimension).value for number, unit in parts)
    symbols = dict.fromkeys(known[unit] for _, unit in parts)
    sums = [(total / _factor(unit.pint, _UNITS[dimension][0].pint), unit.symbol) for unit in symbols]
    exact = [(number, symbol) for number, symbol in sums if number == round(number, 2)]
    if not exact:
        return None
    number, symbol = exact[0]
    fix = f"{format(number.normalize(), 'f')} {symbol}"
    return QuantityError("quantity-arithmetic", f'"{text}" is a sum, not a number', f'write "{fix}"', fix, is_sure=True)


def _power_of_ten_error(text: str, tidy: str, dimension: Dimension) -> QuantityError | None:
    match = _POWER_OF_TEN.fullmatch(tidy)
    if match is None or match["unit"] not in _BY_SPELLING[dimension]:
        return None
    fix = f"{match['factor']}e{match['power'].translate(_RAISED)} {match['unit']}"
    said = f'the power of ten in "{text}" is written out'
    return QuantityError("quantity-unreadable", said, f'write "{fix}"', fix, is_sure=True)


def _range_error(text: str, tidy: str, dimension: Dimension) -> QuantityError | None:
    match = _RANGE.fullmatch(tidy)
    if match is None or match["unit"] not in _BY_SPELLING[dimension] or is_beyond_measure(match["high"]):
        return None
    low, high, unit = Decimal(match["low"]), Decimal(match["high"]), match["unit"]
    if low >= high:
        return None
    mend = (
        f'write "{low}–{high} {unit}" for a band, "{low} {unit} to {high} {unit}" for a ramp'
        if dimension is Dimension.TEMPERATURE
        else f'write the one that was measured, "{low} {unit}" or "{high} {unit}"'
    )
    return QuantityError("quantity-arithmetic", f'"{text}" is a range, not a number', mend)


def _unit_error(text: str, number: str, spelling: str, dimension: Dimension) -> QuantityError:
    if _ARITHMETIC.search(f"{number} {spelling}") or re.search(r"^[*×+/]|[*×+]\s*\d", spelling):
        return QuantityError(
            "quantity-arithmetic", f'"{text}" is a sum, not a number', "write the result, with its unit"
        )
    permitted = ", ".join(units_of(dimension))
    for other, spellings in _BY_SPELLING.items():
        if spelling in spellings:
            return QuantityError(
                "quantity-wrong-dimension",
                f'"{text}" is {_a(other)}, and {_a(dimension)} is wanted',
                f"use one of: {permitted}",
            )
    folded = {known.casefold(): unit.symbol for known, unit in _BY_SPELLING[dimension].items()}
    spelled_out = _SPELLED_OUT.get(spelling.casefold())
    likely = folded.get(spelling.casefold()) or spelled_out
    if likely and likely in units_of(dimension):
        fixed = f"{number} {likely}"
        return QuantityError(
            "quantity-unknown-unit",
            f'unknown unit "{spelling}"; did you mean "{likely}"?',
            f'write "{fixed}"',
            fix=fixed,
            is_sure=likely == spelled_out,  # where capitals alone differ, MPa may stand for mPa
        )
    mend = f"use one of: {permitted}"
    if spelling in {"°F", "F"}:
        celsius = round((Decimal(number) - 32) * 5 / 9, 1)
        mend = f'write "{celsius} °C"'
    return QuantityError("quantity-unknown-unit", f'unknown unit "{spelling}" for {_a(dimension)}', mend)
