"""Field types of the record: how one typed value is read, refused with a mend, and described in the JSON Schema."""

import datetime as dt
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from decimal import Decimal
from functools import partial
from typing import Annotated, Any, Literal, TypeVar

from pydantic import (
    AfterValidator,
    BeforeValidator,
    Field,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    WithJsonSchema,
)
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from builder.records.identifiers import IDENTIFIER_PATTERN, is_identifier, mend_identifier
from builder.records.quantities import (
    Dimension,
    Percent,
    Quantity,
    QuantityError,
    Temperature,
    is_beyond_measure,
    parse_percent,
    parse_quantity,
    parse_temperature,
    quantity_pattern,
    temperature_pattern,
    units_of,
)
from builder.rule import Path

__all__ = [
    "MARKUP",
    "Amount",
    "AmountOrMass",
    "CasNumber",
    "Concentration",
    "Count",
    "Date",
    "Density",
    "EntryId",
    "Equivalents",
    "Flag",
    "FormatNumber",
    "HeatCapacity",
    "InchiText",
    "Label",
    "LabelledRatio",
    "Labels",
    "Line",
    "Mass",
    "MolarEnthalpy",
    "NumberRatio",
    "OneOrMany",
    "Order",
    "PersonCode",
    "Point",
    "Pressure",
    "Purity",
    "RateConstantValue",
    "Ratio",
    "RelativePath",
    "RxnComponent",
    "Sha256",
    "Shape",
    "Share",
    "SmilesText",
    "Strength",
    "Time",
    "TypedPercent",
    "TypedTemperature",
    "Volume",
    "faulty",
]

T = TypeVar("T")
Q = TypeVar("Q", Quantity, Percent, Temperature)

_NUMBER_WITH_EQUIV = re.compile(
    r"([+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)\s*(?:equiv\.?|eq\.?|equivalents?)?"
)
_DAY = re.compile(r"[0-9]{4}-[0-9]{2}-[0-9]{2}")
_LABEL = r"[A-Za-z0-9]"
_PART = rf"{_LABEL}+(?:\+{_LABEL}+)*"
_RATIO_LABELS = rf"{_PART}(?::{_PART})+"
_RATIO_NUMBERS = r"(?=.*[1-9])[0-9]+(?:\.[0-9]+)?(?::[0-9]+(?:\.[0-9]+)?)+"
_RATIO_OF_TWO = r"(?=.*[1-9])[0-9]+(?:\.[0-9]+)?:[0-9]+(?:\.[0-9]+)?"
_CAS = re.compile(r"([0-9]{2,7})-([0-9]{2})-([0-9])")
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029]")


def faulty(
    rule: str, message: str, mend: str, fix: str | None = None, *, at: Path = (), is_sure: bool = False
) -> PydanticCustomError:
    """Return the error by which a field names the reading rule it broke, with its exact mend.

    at: the way from the value that is validated to the one at fault. is_sure: as in Fault.
    """
    context: dict[str, Any] = {"mend": mend, "fix": fix, "message": message, "at": at, "is_sure": is_sure}
    return PydanticCustomError(rule, "{message}", context)


# --- quantities -------------------------------------------------------------------------------------------


def _quantity(
    parse: Callable[[object], Q], least: float | None, most: float | None, *, open_below: bool, value: object
) -> Q:
    try:
        quantity = parse(value)
    except QuantityError as error:
        raise faulty(error.rule, error.message, error.mend, error.fix, is_sure=error.is_sure) from None
    low, high, unit = _bounds(quantity)
    if least is not None and (low < least or (open_below and low == least)):
        bound = "more than" if open_below else "at least"
        mend = f"write {bound} {least:g} {unit}" if least else "write a value above zero"
        raise faulty("quantity-out-of-range", f'"{value}" is impossible', mend)
    if most is not None and high > most:
        raise faulty("quantity-out-of-range", f'"{value}" is impossible', f"write at most {most:,.10g} {unit}")
    return quantity


def _bounds(quantity: Quantity | Percent | Temperature) -> tuple[float, float, str]:
    """Return the lowest and the highest value, and the canonical unit they are in."""
    if isinstance(quantity, Temperature):
        return quantity.lowest_c, quantity.highest_c, "°C"
    one = quantity.quantity if isinstance(quantity, Percent) else quantity
    return one.magnitude, one.magnitude, units_of(one.dimension)[0]


def _schema(
    pattern: str, *examples: str, measures: Sequence[Dimension], bounds: tuple[float, float], open_below: bool = True
) -> WithJsonSchema:
    """Return the schema of a quantity; what no keyword of JSON Schema says stands under keywords of our own, x-….

    bounds: the least and the most, in the canonical unit of each dimension.
    """
    return WithJsonSchema(
        {
            "type": "string",
            "pattern": rf"^\s*({pattern})\s*$",
            "examples": list(examples),
            "x-measures": [str(dimension) for dimension in measures],
            "x-units": [unit for dimension in measures for unit in units_of(dimension)],
            "x-bounds": {"above" if open_below else "least": bounds[0], "most": bounds[1]},
        }
    )


_MOST = {
    Dimension.MASS: 1e7,
    Dimension.AMOUNT: 1e6,
    Dimension.VOLUME: 1e5,
    Dimension.TIME: 3.2e8,
    Dimension.CONCENTRATION: 150.0,
    Dimension.DENSITY: 25.0,
    Dimension.PRESSURE: 1e5,
    Dimension.FRACTION: 100.0,
    Dimension.RATE_CONSTANT_1: 1e15,
    Dimension.RATE_CONSTANT_2: 1e15,
    Dimension.MOLAR_ENTHALPY: 1e4,
    Dimension.HEAT_CAPACITY: 20.0,
}
"""In canonical units: ten tonnes, ten years, just above the densest metal (22.6 g/mL), faster than any vibration,
more heat than any step gives off, more than liquid hydrogen holds (10 J/(g K)).

Wide of anything real, so that only slips and hostile numbers meet them; from memory."""


def _measure(dimension: Dimension, example: str) -> tuple[BeforeValidator, WithJsonSchema]:
    parse = partial(parse_quantity, dimension=dimension)
    check = partial(_reader, parse, 0.0, _MOST[dimension], True)
    pattern = quantity_pattern(dimension, is_positive=True)
    return BeforeValidator(check), _schema(pattern, example, measures=[dimension], bounds=(0.0, _MOST[dimension]))


def _reader(
    parse: Callable[[object], Q], least: float | None, most: float | None, open_below: bool, value: object
) -> Q:
    if isinstance(value, (Quantity, Percent, Temperature)):
        return value  # type: ignore[return-value]  # a model built in Python hands over parsed values
    return _quantity(parse, least, most, open_below=open_below, value=value)


_mass, _amount, _volume = (
    _measure(Dimension.MASS, "2.083 g"),
    _measure(Dimension.AMOUNT, "10 mmol"),
    _measure(Dimension.VOLUME, "20 mL"),
)
_time, _pressure, _density = (
    _measure(Dimension.TIME, "16 h"),
    _measure(Dimension.PRESSURE, "3 bar"),
    _measure(Dimension.DENSITY, "1.26 g/mL"),
)
_concentration = _measure(Dimension.CONCENTRATION, "0.5 mol/L")
_share = _measure(Dimension.FRACTION, "80 %")
_purity = _measure(Dimension.FRACTION, "98 %")

_heat_capacity = _measure(Dimension.HEAT_CAPACITY, "1.8 J/(g K)")

Mass = Annotated[Quantity, *_mass]
Amount = Annotated[Quantity, *_amount]
Volume = Annotated[Quantity, *_volume]
Time = Annotated[Quantity, *_time]
Pressure = Annotated[Quantity, *_pressure]
Density = Annotated[Quantity, *_density]
Concentration = Annotated[Quantity, *_concentration]
Share = Annotated[Quantity, *_share]
Purity = Annotated[Quantity, *_purity]
HeatCapacity = Annotated[Quantity, *_heat_capacity]
_ENTHALPIES = (-_MOST[Dimension.MOLAR_ENTHALPY], _MOST[Dimension.MOLAR_ENTHALPY])
MolarEnthalpy = Annotated[
    Quantity,
    BeforeValidator(partial(_reader, partial(parse_quantity, dimension=Dimension.MOLAR_ENTHALPY), *_ENTHALPIES, False)),
    _schema(
        quantity_pattern(Dimension.MOLAR_ENTHALPY, is_positive=False),
        "-100 kJ/mol",
        measures=[Dimension.MOLAR_ENTHALPY],
        bounds=_ENTHALPIES,
        open_below=False,
    ),
]
"""Signed: negative where heat is given off."""
_TEMPERATURES = (-273.15, 1500.0)
_PERCENTAGES = (-100.0, 1000.0)
TypedTemperature = Annotated[
    Temperature,
    BeforeValidator(partial(_reader, parse_temperature, *_TEMPERATURES, True)),
    _schema(temperature_pattern(), "60 °C", measures=[Dimension.TEMPERATURE], bounds=_TEMPERATURES),
]
TypedPercent = Annotated[
    Percent,
    BeforeValidator(partial(_reader, parse_percent, *_PERCENTAGES, False)),
    _schema(
        rf"([<>≤≥]\s*)?{quantity_pattern(Dimension.FRACTION, is_positive=False)}",
        "88 %",
        measures=[Dimension.FRACTION],
        bounds=_PERCENTAGES,
        open_below=False,
    ),
]


def _first_that_reads(value: object, *dimensions: Dimension) -> Quantity:
    errors = []
    for dimension in dimensions:
        try:
            return _reader(partial(parse_quantity, dimension=dimension), 0.0, _MOST[dimension], True, value)
        except PydanticCustomError as error:
            errors.append(error)
    # "20 g" is of the wrong dimension for one and for the other; a slip within one of them says more.
    raise next((error for error in errors if error.type != "quantity-wrong-dimension"), errors[0])


def _strength(value: object) -> Quantity:
    return _first_that_reads(value, Dimension.CONCENTRATION, Dimension.FRACTION)


def _rate_constant(value: object) -> Quantity:
    return _first_that_reads(value, Dimension.RATE_CONSTANT_1, Dimension.RATE_CONSTANT_2)


def _either(first: Dimension, second: Dimension, *examples: str) -> WithJsonSchema:
    patterns = (quantity_pattern(dimension, is_positive=True) for dimension in (first, second))
    bounds = (0.0, max(_MOST[first], _MOST[second]))
    return _schema("|".join(patterns), *examples, measures=[first, second], bounds=bounds)


Strength = Annotated[
    Quantity,
    BeforeValidator(_strength),
    _either(Dimension.CONCENTRATION, Dimension.FRACTION, "2.5 mol/L", "48 %"),
]
"""Of a solution: concentration, or percentage by mass."""


def _amount_or_mass(value: object) -> Quantity:
    return _first_that_reads(value, Dimension.AMOUNT, Dimension.MASS)


AmountOrMass = Annotated[
    Quantity, BeforeValidator(_amount_or_mass), _either(Dimension.AMOUNT, Dimension.MASS, "10 mmol", "5 g")
]

RateConstantValue = Annotated[
    Quantity,
    BeforeValidator(_rate_constant),
    _either(Dimension.RATE_CONSTANT_1, Dimension.RATE_CONSTANT_2, "9.2e-6 1/s", "1.4e-3 L/(mol s)"),
]


# --- plain values -----------------------------------------------------------------------------------------


def _text(value: object) -> str:
    if isinstance(value, str):
        return value
    if isinstance(value, (int, Decimal)) and not isinstance(value, bool):
        is_as_typed = "E" not in str(value)
        mend = f"write '{value}'"
        raise faulty("value-wrong-type", f"{value} is read as a number", mend, f"'{value}'", is_sure=is_as_typed)
    if isinstance(value, bool):
        raise faulty("value-wrong-type", "a text is wanted", f"write '{str(value).lower()}'")
    raise faulty("value-wrong-type", "a text is wanted here, not a list or mapping", "write one text, quoted")


def _smiles(value: object) -> str:
    if isinstance(value, (list, dict)):
        raise faulty("smiles-unquoted", "YAML reads this SMILES as a list", "put it in single quotes")
    return _text(value)


MARKUP = re.compile(
    r"</?(?:a|b|base|body|br|button|code|div|em|embed|font|form|frame|h[1-6]|head|hr|html|i|iframe|img|input|link|math"
    r"|meta|object|p|pre|script|select|small|span|strong|style|sub|sup|svg|table|td|template|textarea|tr|u)\b[^<>]*>?"
    r"|\bjavascript:",
    re.IGNORECASE,
)
"""Elements of HTML, and addresses that run a script. Pages escape every text; this asks what was meant."""


def _line(text: str) -> str:
    if not text.strip():
        raise faulty("empty-value", "the text is empty", "write it, or leave the key out")
    if _CONTROL.search(text):
        raise faulty("file-not-text", "the text holds a control character", "delete it")
    markup = MARKUP.search(text)
    if markup:
        mend = "write plain text: ¹³C, H₂O, 5 < 7 with spaces; it is shown as it is typed"
        raise faulty("markup-in-text", f"{markup[0]} looks like HTML", mend)
    return text


def _form(name: str, *examples: str) -> Any:
    """Say in the JSON Schema, by its keyword `format`, what a text stands for beyond its pattern."""
    return Field(json_schema_extra={"format": name, "examples": list(examples)})


Line = Annotated[
    str,
    BeforeValidator(_text),
    AfterValidator(_line),
    Field(min_length=1, max_length=4000),
]
"""Free text; escaped wherever it is shown."""

_StructureText = Annotated[str, BeforeValidator(_smiles), AfterValidator(_line), Field(min_length=1, max_length=2000)]
SmilesText = Annotated[_StructureText, _form("smiles", "CCC(C)Br")]
InchiText = Annotated[_StructureText, _form("inchi", "InChI=1S/CH4/h1H4")]


@dataclass(frozen=True, slots=True)
class Shape:
    """A text of one shape: refused in the writer's words, and the same pattern in the JSON Schema.

    pattern: of the whole text, in what Python and ECMAScript share.
    refusal: goes on where the quoted text stops. form: what the text stands for, the schema's `format`.
    """

    pattern: str
    refusal: str
    mend: str
    form: str = ""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_before_validator_function(self._read, handler(source))

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        return {"type": "string", "pattern": self.pattern} | ({"format": self.form} if self.form else {})

    def _read(self, value: object) -> str:
        text = _text(value)
        if re.fullmatch(self.pattern, text):
            return text
        likely = (text.strip(), text.strip().lower())
        fix = next((f"'{tidy}'" for tidy in likely if re.fullmatch(self.pattern, tidy)), None)
        mend = f"write {fix}" if fix else self.mend
        raise faulty("value-not-permitted", f'"{text:.80}" {self.refusal}', mend, fix, is_sure=True)


Sha256 = Annotated[
    str, Shape(r"^[0-9a-f]{64}$", "is not a SHA-256", "copy the 64 characters 0-9 and a-f that `sha256sum FILE` prints")
]
RxnComponent = Annotated[
    str,
    Shape(r"^(reactant|product) [1-9][0-9]?$", "is not a component of the RXN file", "write reactant 1, or product 2"),
]
RelativePath = Annotated[
    str,
    Shape(
        r"^(?!~)(?!\.\.([/\\]|$))[^:/\\]+([/\\](?!\.\.([/\\]|$))[^:/\\]+)*$",
        "leads out of the book",
        "name a file beside the record, such as data/spectrum.zip",
    ),
]
Label = Annotated[
    str, Shape(rf"^{_LABEL}{{1,12}}$", "is not a label", "write at most 12 letters and digits, such as A", "label")
]


def _date(value: object) -> dt.date:
    if isinstance(value, dt.date):
        return value
    if isinstance(value, str) and _DAY.fullmatch(value):
        try:
            return dt.date.fromisoformat(value)
        except ValueError:
            raise faulty("value-not-permitted", f"{value} is no day of the calendar", "correct the date") from None
    fix = _iso_date(str(value))
    is_sure = fix is not None and int(fix[-2:]) > 12  # or the month may have been meant first
    mend = f"write {fix or 'it like 2026-03-14'}"
    raise faulty("value-not-permitted", f'"{value}" is not a date', mend, fix, is_sure=is_sure)


def _iso_date(text: str) -> str | None:
    try:
        day, month, year = (int(number) for number in text.split("."))
        return dt.date(year, month, day).isoformat()
    except (ValueError, OverflowError):
        return None


Date = Annotated[
    dt.date,
    BeforeValidator(_date),
    WithJsonSchema({"type": "string", "format": "date", "pattern": f"^{_DAY.pattern}$", "examples": ["2026-03-14"]}),
]


def _entry_id(value: object) -> str:
    text = _text(value)
    if is_identifier(text):
        return text
    mended = mend_identifier(text)
    hint = f'did you mean "{mended}"?' if mended else "take one from `handbook new`"
    raise faulty("value-not-permitted", f'"{text}" is not an entry identifier', hint, mended)


EntryId = Annotated[
    str,
    BeforeValidator(_entry_id),
    WithJsonSchema({"type": "string", "format": "entry", "pattern": IDENTIFIER_PATTERN, "examples": ["NS4T9XQ2N"]}),
]


def _cas(value: object) -> str:
    text = _text(value)
    match = _CAS.fullmatch(text)
    if match is None:
        raise faulty("value-not-permitted", f'"{text:.80}" is not a CAS number', "write it like 75-26-3")
    digits = [int(digit) for digit in reversed(match[1] + match[2])]
    if sum(place * digit for place, digit in enumerate(digits, start=1)) % 10 != int(match[3]):
        raise faulty("value-not-permitted", f"the check digit of CAS number {text} is wrong", "correct it, or drop it")
    return text


CasNumber = Annotated[
    str,
    BeforeValidator(_cas),
    WithJsonSchema({"type": "string", "format": "cas", "pattern": f"^{_CAS.pattern}$", "examples": ["26628-22-8"]}),
]


def _whole(value: object) -> int:
    if isinstance(value, int) and not isinstance(value, bool):
        return value
    digits = re.fullmatch(r"([0-9]{1,9})(?:\.0*)?", str(value))
    fix = digits[1] if digits else None
    typed = str(value).lower() if isinstance(value, bool) else value
    mend = f"write {fix or 'one, such as 2'}"
    raise faulty("value-wrong-type", f'"{typed}" is not a whole number', mend, fix, is_sure=True)


Count = Annotated[int, Field(ge=1, le=10_000), BeforeValidator(_whole)]
FormatNumber = Annotated[Literal[1], BeforeValidator(_whole)]
Order = Annotated[Literal[1, 2], BeforeValidator(_whole)]


def _flag(value: object) -> bool:
    if isinstance(value, bool):
        return value
    word = str(value).casefold()
    if word in {"yes", "on", "y", "no", "off", "n"}:
        fix = "true" if word in {"yes", "on", "y"} else "false"
        raise faulty("boolean-word", f'"{value}" is a word, not true or false', f"write {fix}", fix, is_sure=True)
    raise faulty("value-wrong-type", f'"{value}" is not true or false', "write true or false")


Flag = Annotated[bool, BeforeValidator(_flag)]


def _number(value: object) -> Decimal:
    if isinstance(value, bool) or not isinstance(value, (int, Decimal)):
        mend, fix = "write the bare number", None
        if isinstance(value, str) and (with_word := _NUMBER_WITH_EQUIV.fullmatch(value)):
            fix = with_word[1]
            mend = f"write {fix}, without quotes or unit"
        elif isinstance(value, str) and re.fullmatch(r"[0-9]+,[0-9]+", value):
            fix = value.replace(",", ".")
            raise faulty("quantity-decimal-comma", f'"{value}" has a decimal comma', f"write {fix}", fix, is_sure=True)
        raise faulty("value-wrong-type", f'"{value}" is not a number', mend, fix, is_sure=True)
    return Decimal(value)


Equivalents = Annotated[
    Decimal,
    BeforeValidator(_number),
    Field(gt=0, le=1000),
    WithJsonSchema({"type": "number", "exclusiveMinimum": 0, "maximum": 1000, "examples": [1.5]}),
]


def _pair(value: object) -> object:
    if isinstance(value, (list, tuple)) and len(value) == 2:
        return value
    raise faulty("value-wrong-type", "a point is a time and a percentage", "write it like [4, 12.4]")


Point = Annotated[
    tuple[
        Annotated[Decimal, BeforeValidator(_number), WithJsonSchema({"type": "number", "minimum": 0})],
        Annotated[
            Decimal, BeforeValidator(_number), WithJsonSchema({"type": "number", "minimum": -100, "maximum": 100})
        ],
    ],
    BeforeValidator(_pair),
]
"""Of a time course: time in its unit, and percent."""

PersonCode = Annotated[Line, Field(max_length=40), _form("person", "bench-2")]


# --- ratios -----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Ratio:
    """Parts of a product mixture, each a sum of labels, with their numbers as typed."""

    parts: tuple[tuple[str, ...], ...]
    numbers: tuple[Decimal, ...]

    @property
    def percentages(self) -> tuple[float, ...]:
        """Return the numbers normalised to a sum of 100."""
        total = float(sum(self.numbers))
        return tuple(100.0 * float(number) / total for number in self.numbers)

    @property
    def excess_percent(self) -> float:
        """Return how far one of two parts outweighs the other, |a − b|/(a + b), in percent: the ee of an er.

        Raises ValueError where there are not two.
        """
        first, second = self.numbers
        return float(100 * abs(first - second) / (first + second))

    def __str__(self) -> str:
        labels = ":".join("+".join(part) for part in self.parts)
        numbers = ":".join(format(number, "f") for number in self.numbers)
        return f"{labels} = {numbers}" if labels else numbers


def _ratio(value: object, pattern: str, refusal: str, example: str) -> Ratio:
    """Read labels and numbers of a ratio, or numbers alone."""
    if isinstance(value, Ratio):
        return value
    text = _text(value)
    if not re.fullmatch(pattern, text):
        tidy = re.sub(r"\s*=\s*", " = ", re.sub(r"\s*[:/]\s*", ":", text.strip()))
        fix = f"'{tidy}'" if re.fullmatch(pattern, tidy) else None
        raise faulty("ratio-unreadable", f'"{text:.80}" is not {refusal}', f"write {fix or example}", fix, is_sure=True)
    labels, _, typed = text.rpartition(" = ")
    parts = tuple(tuple(part.split("+")) for part in labels.split(":")) if labels else ()
    if any(is_beyond_measure(number) for number in typed.split(":")):
        raise faulty("ratio-unreadable", f'"{text:.80}" has a number beyond any measure', "write what was measured")
    return Ratio(parts, tuple(Decimal(number) for number in typed.split(":")))


def _labelled_ratio(value: object) -> Ratio:
    ratio = _ratio(
        value, f"{_RATIO_LABELS} = {_RATIO_NUMBERS}", "a ratio of labels", "it like 'A:B = 65:35' or 'A+B:C = 82:18'"
    )
    if len(ratio.parts) != len(ratio.numbers):
        count = f"{len(ratio.parts)} labels and {len(ratio.numbers)} numbers"
        raise faulty("ratio-unreadable", f'"{ratio}" has {count}', "give each label one number")
    labels = [label for part in ratio.parts for label in part]
    if twice := next((label for place, label in enumerate(labels) if label in labels[:place]), None):
        raise faulty("ratio-unreadable", f'"{ratio}" names {twice} twice', "name each label once")
    return ratio


def _number_ratio(value: object) -> Ratio:
    return _ratio(value, _RATIO_OF_TWO, "a ratio of two numbers", "it like '97:3'")


LabelledRatio = Annotated[
    Ratio,
    BeforeValidator(_labelled_ratio),
    WithJsonSchema(
        {
            "type": "string",
            "format": "ratio",
            "pattern": f"^{_RATIO_LABELS} = {_RATIO_NUMBERS}$",
            "examples": ["A:B = 65:35"],
        }
    ),
]
NumberRatio = Annotated[
    Ratio,
    BeforeValidator(_number_ratio),
    WithJsonSchema({"type": "string", "format": "ratio", "pattern": f"^{_RATIO_OF_TWO}$", "examples": ["97:3"]}),
]


# --- one or many ------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Listed:
    """Reads one value as a list of one, and says so in the JSON Schema."""

    is_distinct: bool = False

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        listed = core_schema.no_info_before_validator_function(self._as_list, handler(source))
        return core_schema.no_info_after_validator_function(_distinct, listed) if self.is_distinct else listed

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        many = handler(schema) | ({"uniqueItems": True} if self.is_distinct else {})
        # Not anyOf: an editor would then complain of the whole list where one value in it is mistyped.
        return {"if": {"type": "array"}, "then": many, "else": many["items"]}

    @staticmethod
    def _as_list(value: object) -> object:
        return value if isinstance(value, (list, tuple)) else [value]


def _distinct(values: tuple[str, ...]) -> tuple[str, ...]:
    for place, value in enumerate(values):
        if value in values[:place]:
            raise faulty("value-not-permitted", f"{value} stands twice", "name each once", at=(place,))
    return values


OneOrMany = Annotated[tuple[T, ...], Field(min_length=1), _Listed()]
Labels = Annotated[tuple[Label, ...], Field(min_length=1), _Listed(is_distinct=True)]
