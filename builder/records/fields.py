"""Field types of the record: how one typed value is read, refused with a mend, and described in the JSON Schema."""

import datetime as dt
import re
from collections.abc import Callable
from dataclasses import dataclass
from decimal import Decimal
from functools import partial
from typing import Annotated, Any, TypeVar

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
    parse_percent,
    parse_quantity,
    parse_temperature,
    unit_spellings,
)

__all__ = [
    "Amount",
    "CasNumber",
    "Concentration",
    "Count",
    "Date",
    "Density",
    "EntryId",
    "Equivalents",
    "Flag",
    "Label",
    "LabelledRatio",
    "Line",
    "Mass",
    "Number",
    "NumberRatio",
    "OneOrMany",
    "PersonCode",
    "Pressure",
    "Purity",
    "RateConstantValue",
    "Ratio",
    "RelativePath",
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

_NUMBER_SHAPE = r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?"
_DAY = re.compile(r"\d{4}-\d{2}-\d{2}")
_LABEL = r"[A-Za-z0-9]+"
_RATIO = re.compile(rf"(?P<parts>{_LABEL}(?:\+{_LABEL})*(?::{_LABEL}(?:\+{_LABEL})*)+) = (?P<numbers>[\d.:]+)")
_CAS = re.compile(r"(\d{2,7})-(\d{2})-(\d)")
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f]")


def faulty(rule: str, message: str, mend: str, fix: str | None = None) -> PydanticCustomError:
    """Return the error by which a field names the reading rule it broke, with its exact mend."""
    context: dict[str, Any] = {"mend": mend, "fix": fix, "message": message}
    return PydanticCustomError(rule, "{message}", context)


# --- quantities -------------------------------------------------------------------------------------------


def _quantity(
    parse: Callable[[object], Q], least: float | None, most: float | None, *, open_below: bool, value: object
) -> Q:
    try:
        quantity = parse(value)
    except QuantityError as error:
        raise faulty(error.rule, error.message, error.mend, error.fix) from None
    low, high = _bounds(quantity)
    if least is not None and (low < least or (open_below and low == least)):
        bound = "above" if open_below else "at least"
        raise faulty("quantity-out-of-range", f'"{value}" is impossible', f"a value {bound} {least:g} is wanted")
    if most is not None and high > most:
        raise faulty("quantity-out-of-range", f'"{value}" is impossible', f"a value up to {most:g} is wanted")
    return quantity


def _bounds(quantity: Quantity | Percent | Temperature) -> tuple[float, float]:
    if isinstance(quantity, Temperature):
        return quantity.lowest_c, quantity.highest_c
    return quantity.magnitude, quantity.magnitude


def _schema(pattern_units: Dimension, *, prefix: str = "", example: str) -> WithJsonSchema:
    units = "|".join(re.escape(unit) for unit in unit_spellings(pattern_units))
    number = r"[+\-\u2212\u2013]?(\d+(\.\d*)?|\.\d+)([eE][+\-\u2212]?\d+)?"
    one = rf"{number}\s*({units})"
    if pattern_units is Dimension.TEMPERATURE:
        one = rf"{one}|{number}\s*({units})?\s+to\s+{one}|{number}\s*[-\u2013]\s*{one}"
    return WithJsonSchema({"type": "string", "pattern": rf"^\s*{prefix}({one})\s*$", "examples": [example]})


def _measure(
    dimension: Dimension,
    example: str,
    *,
    least: float | None = 0.0,
    most: float | None = None,
    open_below: bool = True,
) -> tuple[BeforeValidator, WithJsonSchema]:
    parse = partial(parse_quantity, dimension=dimension)
    check = partial(_reader, parse, least, most, open_below)
    return BeforeValidator(check), _schema(dimension, example=example)


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
_share = _measure(Dimension.FRACTION, "80 %", most=100.0)
_purity = _measure(Dimension.FRACTION, "98 %", most=100.0)

Mass = Annotated[Quantity, *_mass]
Amount = Annotated[Quantity, *_amount]
Volume = Annotated[Quantity, *_volume]
Time = Annotated[Quantity, *_time]
Pressure = Annotated[Quantity, *_pressure]
Density = Annotated[Quantity, *_density]
Concentration = Annotated[Quantity, *_concentration]
Share = Annotated[Quantity, *_share]
Purity = Annotated[Quantity, *_purity]
TypedTemperature = Annotated[
    Temperature,
    BeforeValidator(partial(_reader, parse_temperature, -273.15, 1500.0, True)),
    _schema(Dimension.TEMPERATURE, example="60 °C"),
]
TypedPercent = Annotated[
    Percent,
    BeforeValidator(partial(_reader, parse_percent, -100.0, 1000.0, False)),
    _schema(Dimension.FRACTION, prefix=r"([<>≤≥]\s*)?", example="88 %"),
]


def _first_that_reads(value: object, *dimensions: Dimension) -> Quantity:
    errors = []
    for dimension in dimensions:
        try:
            return _reader(partial(parse_quantity, dimension=dimension), 0.0, None, True, value)
        except PydanticCustomError as error:
            errors.append(error)
    # "20 g" is of the wrong dimension for one and for the other; a slip within one of them says more.
    raise next((error for error in errors if error.type != "quantity-wrong-dimension"), errors[0])


def _strength(value: object) -> Quantity:
    return _first_that_reads(value, Dimension.CONCENTRATION, Dimension.FRACTION)


def _rate_constant(value: object) -> Quantity:
    return _first_that_reads(value, Dimension.RATE_CONSTANT_1, Dimension.RATE_CONSTANT_2)


Strength = Annotated[
    Quantity,
    BeforeValidator(_strength),
    WithJsonSchema({"type": "string", "examples": ["2.5 mol/L", "48 %"]}),
]
"""Of a solution: concentration, or percentage by mass."""

RateConstantValue = Annotated[
    Quantity,
    BeforeValidator(_rate_constant),
    WithJsonSchema({"type": "string", "examples": ["9.2e-6 1/s", "1.4e-3 L/(mol s)"]}),
]


# --- plain values -----------------------------------------------------------------------------------------


def _text(value: object) -> str:
    if isinstance(value, str):
        return value
    if isinstance(value, (int, Decimal)) and not isinstance(value, bool):
        raise faulty("value-wrong-type", f"{value} is read as a number", f"write '{value}'", f"'{value}'")
    if isinstance(value, bool):
        raise faulty("value-wrong-type", "a text is wanted", f"write '{str(value).lower()}'")
    raise faulty("value-wrong-type", "a text is wanted here, not a list or mapping", "write one text, quoted")


def _smiles(value: object) -> str:
    if isinstance(value, (list, dict)):
        raise faulty("smiles-unquoted", "YAML reads this SMILES as a list", "put it in single quotes")
    return _text(value)


def _line(text: str) -> str:
    if not text.strip():
        raise faulty("empty-value", "the text is empty", "write it, or leave the key out")
    if _CONTROL.search(text):
        raise faulty("file-not-text", "the text holds a control character", "delete it")
    return text


Line = Annotated[
    str,
    BeforeValidator(_text),
    AfterValidator(_line),
    Field(min_length=1, max_length=4000),
]
"""Free text; escaped wherever it is shown."""

SmilesText = Annotated[str, BeforeValidator(_smiles), AfterValidator(_line), Field(min_length=1, max_length=2000)]


def _date(value: object) -> dt.date:
    if isinstance(value, dt.date):
        return value
    if isinstance(value, str) and _DAY.fullmatch(value):
        try:
            return dt.date.fromisoformat(value)
        except ValueError:
            raise faulty("value-not-permitted", f"{value} is no day of the calendar", "correct the date") from None
    raise faulty("value-not-permitted", f'"{value}" is not a date', "write it as 2026-03-14", _iso_date(str(value)))


def _iso_date(text: str) -> str | None:
    match = re.fullmatch(r"(\d{1,2})\.(\d{1,2})\.(\d{4})", text)
    return f"{match[3]}-{int(match[2]):02}-{int(match[1]):02}" if match else None


Date = Annotated[dt.date, BeforeValidator(_date), WithJsonSchema({"type": "string", "format": "date"})]


def _entry_id(value: object) -> str:
    text = _text(value)
    if is_identifier(text):
        return text
    mended = mend_identifier(text)
    hint = f'did you mean "{mended}"?' if mended else "take one from `handbook new`"
    raise faulty("value-not-permitted", f'"{text}" is not an entry identifier', hint, mended)


EntryId = Annotated[str, BeforeValidator(_entry_id), WithJsonSchema({"type": "string", "pattern": IDENTIFIER_PATTERN})]


def _cas(value: object) -> str:
    text = _text(value)
    match = _CAS.fullmatch(text)
    if match:
        digits = [int(digit) for digit in reversed(match[1] + match[2])]
        if sum(place * digit for place, digit in enumerate(digits, start=1)) % 10 == int(match[3]):
            return text
    raise faulty("value-not-permitted", f'"{text}" is not a CAS number: its check digit fails', "correct or drop it")


CasNumber = Annotated[str, BeforeValidator(_cas), WithJsonSchema({"type": "string", "pattern": r"^\d{2,7}-\d{2}-\d$"})]


def _whole(value: object) -> int:
    if isinstance(value, int) and not isinstance(value, bool):
        return value
    raise faulty("value-wrong-type", f'"{value}" is not a whole number', "write digits only")


Count = Annotated[int, Field(ge=1, le=10_000), BeforeValidator(_whole)]


def _flag(value: object) -> bool:
    if isinstance(value, bool):
        return value
    word = str(value).casefold()
    if word in {"yes", "on", "y", "no", "off", "n"}:
        fix = "true" if word in {"yes", "on", "y"} else "false"
        raise faulty("boolean-word", f'"{value}" is a word, not true or false', f"write {fix}", fix)
    raise faulty("value-wrong-type", f'"{value}" is not true or false', "write true or false")


Flag = Annotated[bool, BeforeValidator(_flag)]


def _number(value: object) -> Decimal:
    if isinstance(value, bool) or not isinstance(value, (int, Decimal)):
        mend = "write the bare number"
        fix = None
        if isinstance(value, str) and re.fullmatch(rf"({_NUMBER_SHAPE})\s*(equiv\.?|eq\.?|equivalents?)", value):
            fix = value.split("e", 1)[0].strip()
            mend = f"write {fix}"
        elif isinstance(value, str) and re.fullmatch(r"\d+,\d+", value):
            fix = value.replace(",", ".")
            raise faulty("quantity-decimal-comma", f'"{value}" has a decimal comma', f"write {fix}", fix)
        raise faulty("value-wrong-type", f'"{value}" is not a number', mend, fix)
    return Decimal(value)


Equivalents = Annotated[
    Decimal,
    BeforeValidator(_number),
    Field(gt=0, le=1000),
    WithJsonSchema({"type": "number", "exclusiveMinimum": 0, "maximum": 1000}),
]
Number = Annotated[Decimal, BeforeValidator(_number), WithJsonSchema({"type": "number"})]

PersonCode = Annotated[Line, Field(max_length=40)]


def _relative_path(value: object) -> str:
    text = _text(value)
    parts = re.split(r"[/\\]", text)
    if text.startswith(("/", "\\", "~")) or ":" in text or ".." in parts or "" in parts:
        raise faulty("value-not-permitted", f'"{text}" leads out of the book', "name a file beside the record")
    return text


RelativePath = Annotated[str, BeforeValidator(_relative_path), WithJsonSchema({"type": "string"})]


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

    def __str__(self) -> str:
        labels = ":".join("+".join(part) for part in self.parts)
        numbers = ":".join(format(number, "f") for number in self.numbers)
        return f"{labels} = {numbers}" if labels else numbers


def _ratio_numbers(text: str) -> tuple[Decimal, ...] | None:
    pieces = text.split(":")
    if len(pieces) < 2 or not all(re.fullmatch(r"\d+(\.\d+)?", piece) for piece in pieces):
        return None
    numbers = tuple(Decimal(piece) for piece in pieces)
    return numbers if sum(numbers) > 0 else None


def _labelled_ratio(value: object) -> Ratio:
    if isinstance(value, Ratio):
        return value
    text = _text(value)
    match = _RATIO.fullmatch(text)
    if match:
        parts = tuple(tuple(part.split("+")) for part in match["parts"].split(":"))
        numbers = _ratio_numbers(match["numbers"])
        if numbers and len(numbers) == len(parts):
            return Ratio(parts, numbers)
        if numbers:
            raise faulty(
                "ratio-unreadable",
                f'"{text}" has {len(parts)} labels and {len(numbers)} numbers',
                "give one number a part",
            )
    raise faulty(
        "ratio-unreadable",
        f'"{text}" is not a ratio of labels',
        "write it like 'A:B = 65:35' or 'A+B:C = 82:18'",
    )


def _number_ratio(value: object) -> Ratio:
    if isinstance(value, Ratio):
        return value
    text = _text(value)
    numbers = _ratio_numbers(text)
    if numbers is None or len(numbers) != 2:
        raise faulty("ratio-unreadable", f'"{text}" is not a ratio of two numbers', "write it like '97:3'")
    return Ratio((), numbers)


LabelledRatio = Annotated[
    Ratio,
    BeforeValidator(_labelled_ratio),
    WithJsonSchema({"type": "string", "pattern": r"^[A-Za-z0-9+:]+ = [\d.:]+$", "examples": ["A:B = 65:35"]}),
]
NumberRatio = Annotated[
    Ratio,
    BeforeValidator(_number_ratio),
    WithJsonSchema({"type": "string", "pattern": r"^[\d.]+:[\d.]+$", "examples": ["97:3"]}),
]
Label = Annotated[str, BeforeValidator(_text), Field(pattern=rf"^{_LABEL}$", max_length=12)]


# --- one or many ------------------------------------------------------------------------------------------


class _Listed:
    """Reads one value as a list of one, and says so in the JSON Schema."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_before_validator_function(self._as_list, handler(source))

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        many = handler(schema)
        return {"anyOf": [many["items"], many]}

    @staticmethod
    def _as_list(value: object) -> object:
        return value if isinstance(value, (list, tuple)) else [value]


OneOrMany = Annotated[tuple[T, ...], Field(min_length=1), _Listed()]
