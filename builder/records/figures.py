"""Numbers and quantities as a reader wants to see them, in findings and on pages alike."""

import re
from math import floor, isfinite, log10

from builder.records.quantities import Quantity

__all__ = [
    "amount_text",
    "concentration_text",
    "duration_text",
    "equivalents_text",
    "mass_text",
    "molar_mass_text",
    "quantity_text",
    "significant",
    "volume_text",
]

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_POWER = re.compile(r"^(?P<mantissa>[^e ]+)e(?P<exponent>-?\d+)")
_YEAR_S = 3.156e7
_SECONDS = {"years": _YEAR_S, "d": 86400.0, "h": 3600.0, "min": 60.0, "s": 1.0}
_RATE_UNITS = {
    "1/s": "s⁻¹",
    "1/min": "min⁻¹",
    "1/h": "h⁻¹",
    "L/(mol s)": "L mol⁻¹ s⁻¹",
    "L/(mol min)": "L mol⁻¹ min⁻¹",
    "L/(mol h)": "L mol⁻¹ h⁻¹",
}


def significant(value: float, digits: int = 3) -> str:
    """Return `value` with that many significant digits: plain from 0.001 to 99999, else with a power of ten.

    >>> significant(9.996), significant(0.05), significant(12345.6), significant(9.2e-6, 2)
    ('10.0', '0.0500', '12300', '9.2 × 10⁻⁶')
    """
    if not isfinite(value):
        raise ValueError(f"{value} is no number to print")
    if value == 0:
        return "0"
    value = float(f"{value:.{digits - 1}e}")  # rounded first: 9.996 is 10.0, not 10.00
    exponent = floor(log10(abs(value)))
    if -3 <= exponent <= 4:
        return f"{value:.{max(digits - 1 - exponent, 0)}f}"
    mantissa = f"{value / 10.0**exponent:.{digits - 1}f}"
    return f"{mantissa} × 10{str(exponent).translate(_SUPERSCRIPT)}"


def quantity_text(quantity: Quantity) -> str:
    """Return a typed quantity with its digits kept, powers of ten and inverse units set as in print."""
    number = _POWER.sub(
        lambda power: f"{power['mantissa']} × 10{power['exponent'].translate(_SUPERSCRIPT)}",
        str(quantity).removesuffix(quantity.unit).strip(),
    )
    return f"{number} {_RATE_UNITS.get(quantity.unit, quantity.unit)}"


def mass_text(grams: float) -> str:
    """Return a derived mass with three digits, in mg, g or kg."""
    return _scaled(grams, ((1000.0, 1e-3, "kg"), (0.1, 1.0, "g"), (0.0, 1e3, "mg")))


def amount_text(moles: float) -> str:
    """Return a derived amount of substance with three digits, in mmol or mol."""
    return _scaled(moles, ((10.0, 1.0, "mol"), (1e-4, 1e3, "mmol"), (0.0, 1e6, "µmol")))


def volume_text(litres: float) -> str:
    """Return a derived volume with three digits, in mL or L."""
    return _scaled(litres, ((10.0, 1.0, "L"), (1e-4, 1e3, "mL"), (0.0, 1e6, "µL")))


def concentration_text(mol_per_l: float) -> str:
    """Return a derived concentration with three digits, in mol/L."""
    return f"{significant(mol_per_l)} mol/L"


def equivalents_text(equivalents: float) -> str:
    """Return derived equivalents with two decimals, three digits below 0.1 and from 100 on."""
    return f"{equivalents:.2f}" if 0.1 <= equivalents < 100 else significant(equivalents)


def duration_text(seconds: float) -> str:
    """Return a derived duration with two digits, in s, min, h, d or years.

    >>> duration_text(0.2), duration_text(5400), duration_text(3e9)
    ('< 1 s', '1.5 h', '95 years')
    """
    if seconds < 1:
        return "< 1 s"
    steps = ((1e4 * _YEAR_S, ""), (_YEAR_S, "years"), (2 * 86400.0, "d"), (5400.0, "h"), (120.0, "min"), (0.0, "s"))
    unit = next(unit for least, unit in steps if seconds >= least)
    if not unit:
        return "> 10000 years"
    return f"{significant(seconds / _SECONDS[unit], 2)} {unit}"


def molar_mass_text(g_per_mol: float) -> str:
    """Return a molar mass with two decimals, in g/mol."""
    return f"{g_per_mol:.2f} g/mol"


def _scaled(value: float, steps: tuple[tuple[float, float, str], ...]) -> str:
    fitting = (step for step in steps if abs(value) >= step[0])
    _, factor, unit = next(fitting) if value else steps[1]  # nothing has no size of its own
    return f"{significant(value * factor)} {unit}"
