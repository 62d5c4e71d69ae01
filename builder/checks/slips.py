"""Why two quantities of one substance differ: the slip whose factor fits, in a chemist's words."""

from collections.abc import Iterator
from dataclasses import dataclass
from math import log, log1p, log10

from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.forms import forms_that_fit
from builder.records.model import Charged
from builder.records.quantities import Dimension, Quantity

__all__ = [
    "ERROR_ABOVE",
    "QUERY_ABOVE",
    "Mismatch",
    "explained",
    "is_saline_hydride",
    "level_of",
    "typed_text",
]

QUERY_ABOVE = 0.02  # relative disagreement; common practice, no source
ERROR_ABOVE = 0.05
DISPERSION = 0.60  # the usual content of sodium hydride in oil; common practice, no source
_SALINE_HYDRIDE = Fragment.from_smarts("[$([H-]),$([Li,Na,K,Ca;!h0])]")
_WEIGHED = {"mass", "volume"}
_SMALLER = {"kg": "g", "g": "mg", "mg": "µg", "mol": "mmol", "mmol": "µmol", "L": "mL", "mL": "µL"}
_LARGER = {small: large for large, small in _SMALLER.items()}


@dataclass(frozen=True, slots=True)
class Mismatch:
    """Two typed quantities of one substance and the moles that each stands for; `used` is the one believed.

    usual_mol: about how much of it one would expect in this flask, by which a slipped prefix is told.
    rounding: by how much rounding may put the two apart, relative.
    """

    substance: Charged
    structure: Structure | None
    used: str
    used_mol: float
    other: str
    other_mol: float
    usual_mol: float
    rounding: float

    @property
    def tolerance(self) -> float:
        """Return how closely a slip must fit: 2 %, or honest rounding where that is wider."""
        return max(QUERY_ABOVE, self.rounding)

    def fits(self, ratio: float, factor: float) -> bool:
        """Say whether a ratio of moles is that factor within the tolerance."""
        return abs(ratio / factor - 1.0) <= self.tolerance


def level_of(ratio: float, rounding: float) -> Level | None:
    """Return how much a disagreement weighs; None if honest rounding, or the tolerance, explains it.

    rounding: half a unit in the last typed digits, relative, of all numbers that enter.
    """
    off = abs(log(ratio))
    rounded = -log1p(-min(rounding, 0.99))  # 18 mmol may stand for 17.5, of which half a mmol is more than of 18
    if off <= max(log1p(QUERY_ABOVE), rounded):
        return None
    return Level.ERROR if off > max(log1p(ERROR_ABOVE), rounded) else Level.QUERY


def explained(told: Mismatch) -> str:
    """Return which slip fits the difference, the likeliest first; a plain word where none does."""
    return next(_slips(told), "no common slip fits")


def typed_text(substance: Charged, kind: str) -> str:
    """Return a quantity as typed, with its unit."""
    typed = getattr(substance, kind)
    return f"{typed} equivalents" if kind == "equivalents" else str(typed)


def is_saline_hydride(structure: Structure) -> bool:
    """Say whether this is sodium hydride or its like, which is sold in oil."""
    return _SALINE_HYDRIDE.is_in(structure)


def _slips(told: Mismatch) -> Iterator[str]:
    yield from _prefix(told)
    yield from _mol_percent(told)
    for weighed, ratio in _weighed_sides(told):
        yield from _content(told, weighed, ratio)
        yield from _density(told, weighed, ratio)
        yield from _form(told, weighed, ratio)


def _prefix(told: Mismatch) -> Iterator[str]:
    """Yield the quantity whose unit is a thousand off: the one that is farther from a usual amount."""
    ratio = told.other_mol / told.used_mol
    if not (told.fits(ratio, 1000.0) or told.fits(ratio, 0.001)):
        return
    sides = {told.used: told.used_mol, told.other: told.other_mol}
    suspect = max(sides, key=lambda kind: abs(log10(sides[kind] / told.usual_mol)))
    is_too_large = (told.other_mol > told.used_mol) == (suspect == told.other)
    typed = getattr(told.substance, suspect)
    units = _SMALLER if is_too_large else _LARGER
    if isinstance(typed, Quantity) and typed.unit in units:
        yield f"a factor of 1000 fits: {suspect} {typed} was probably meant in {units[typed.unit]}"
    else:
        yield f"a factor of 1000 fits: look at the unit of {told.used} and {told.other}"


def _mol_percent(told: Mismatch) -> Iterator[str]:
    if told.other == "equivalents" and told.fits(told.other_mol / told.used_mol, 100.0):
        share = told.substance.equivalents
        yield f"a factor of 100 fits: {share} mol% is {share / 100 if share else 0} equivalents"


def _weighed_sides(told: Mismatch) -> Iterator[tuple[str, float]]:
    """Yield each weighed or measured quantity with the ratio of the other's moles to its own."""
    if told.used in _WEIGHED and not _is_solution(told, told.used):
        yield told.used, told.other_mol / told.used_mol
    elif told.other in _WEIGHED and not _is_solution(told, told.other):
        yield told.other, told.used_mol / told.other_mol


def _is_solution(told: Mismatch, kind: str) -> bool:
    strength = told.substance.strength
    return kind == "volume" and strength is not None and strength.dimension is Dimension.CONCENTRATION


def _content(told: Mismatch, weighed: str, ratio: float) -> Iterator[str]:
    """Yield a purity left out: the other number is that of all that was weighed, or of a dispersion."""
    for word, content in (("purity", told.substance.purity), ("strength", told.substance.strength)):
        if content is not None and content.dimension is Dimension.FRACTION:
            share = content.magnitude / 100.0
            if abs(share - 1.0) > told.tolerance and told.fits(ratio, 1.0 / share):
                yield f"the {word} fits: {_against(told, weighed)} holds if {content} were 100 %"
    is_bare_hydride = told.structure is not None and is_saline_hydride(told.structure) and not told.substance.purity
    if is_bare_hydride and told.fits(ratio, DISPERSION):
        yield f"the {weighed} fits a 60 % dispersion in oil: add purity: 60 %"


def _against(told: Mismatch, weighed: str) -> str:
    """Return the quantity that stands against the weighed one."""
    return typed_text(told.substance, told.other if weighed == told.used else told.used)


def _density(told: Mismatch, weighed: str, ratio: float) -> Iterator[str]:
    density = told.substance.density
    tells = weighed == "volume" and density is not None and abs(density.magnitude - 1.0) > told.tolerance
    if tells and density is not None and told.fits(ratio, 1.0 / density.magnitude):
        yield f"the density fits: {_against(told, weighed)} holds if 1 mL weighed 1 g instead of {density}"


def _form(told: Mismatch, weighed: str, ratio: float) -> Iterator[str]:
    """Yield the form of the substance whose molar mass the weighed quantity and the other moles would need."""
    if told.structure is None:
        return
    needed = told.structure.mass / ratio
    fits = forms_that_fit(told.structure, needed, told.tolerance)
    if fits:
        names = " or ".join(f"{form.name} ({form.molar_mass:.2f} g/mol)" for form in fits[:2])
        yield f"the {weighed} fits {names}, not what is drawn ({told.structure.mass:.2f} g/mol)"
