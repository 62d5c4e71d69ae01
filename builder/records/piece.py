"""One value of a record, read by itself as the record would read it: for whoever asks before there is a record."""

from typing import TypeVar

from pydantic import TypeAdapter, ValidationError

from builder.records.fields import Amount, Mass, Time, TypedTemperature, Volume
from builder.records.quantities import Quantity, QuantityError, Temperature

__all__ = ["AMOUNT", "MASS", "TEMPERATURE", "TIME", "VOLUME", "read_piece"]

AMOUNT: TypeAdapter[Quantity] = TypeAdapter(Amount)
MASS: TypeAdapter[Quantity] = TypeAdapter(Mass)
VOLUME: TypeAdapter[Quantity] = TypeAdapter(Volume)
TIME: TypeAdapter[Quantity] = TypeAdapter(Time)
TEMPERATURE: TypeAdapter[Temperature] = TypeAdapter(TypedTemperature)

Value = TypeVar("Value", Quantity, Temperature)


def read_piece(kind: TypeAdapter[Value], text: str) -> Value:
    """Return a text as a key of this kind takes it, bounds included.

    Raises QuantityError for what the record would refuse, in the same words.
    """
    try:
        return kind.validate_python(text)
    except ValidationError as error:
        (first, *_) = error.errors(include_url=False)
        said = first["ctx"]
        raise QuantityError(first["type"], said["message"], said["mend"], said["fix"]) from None
