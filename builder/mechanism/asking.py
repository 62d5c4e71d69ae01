"""From names and SMILES to a question: what chemists type, read exactly or refused with the nearest known name."""

import math
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

from builder.chemistry.perception import attacking_atoms
from builder.chemistry.structure import Structure, StructureError, parse_smiles
from builder.mechanism.nucleophiles import (
    find_nucleophile_and_counter_ion,
    nearest_nucleophiles,
    nucleophile_by_structure,
)
from builder.mechanism.question import CONCENTRATION_M, EQUIVALENTS, TIME_S, Ingredient, Question
from builder.mechanism.reagents import Dose, Reagent, Role, find_reagent, nearest_reagents, reagent_by_structure
from builder.mechanism.solvents import Solvent, find_solvent, nearest_solvents
from builder.records.quantities import Dimension, QuantityError, parse_quantity, parse_temperature
from builder.records.vocabulary import Mechanism

__all__ = [
    "INTERNAL",
    "MOST_TEMPERATURE_C",
    "AskingError",
    "Read",
    "Reading",
    "Wish",
    "question_from_line",
    "question_from_words",
    "read_question",
    "read_wish",
]

INTERNAL = "none (internal nucleophile)"
_INTERNAL_WORDS = frozenset({INTERNAL, "none", "internal", "none (intramolecular)"})
_SOLVENT_WORDS = frozenset({"solvent", "none (solvent)", "none (solvolysis)"})
NEAT = "neat"
ABSOLUTE_ZERO_C = -273.15
MOST_TEMPERATURE_C = 500.0
"""Above it no organic liquid is left to speak of; a larger number is a slip."""
MOST_MOLAR = 100.0
"""No liquid holds more of anything: water is 55 mol/L."""
MOST_EQUIVALENTS = 1e4
MOST_TIME_H = 24 * 366 * 10.0
LEAST = 1e-9
"""Smallest concentration, number of equivalents or time (h) that is taken at its word."""


class AskingError(ValueError):
    """Something in a question that cannot be read: what, and how to mend it."""

    def __init__(self, what: str, mend: str) -> None:
        super().__init__(f"{what}; {mend}")
        self.what = what
        self.mend = mend


class Reading(NamedTuple):
    """A word of a question: what it stands for (substrate, nucleophile, ...), as typed, and what it was taken for."""

    role: str
    typed: str
    taken: str


@dataclass(frozen=True, slots=True)
class Read:
    """A question, how each of its words was read, and what nobody stated: concentration, equivalents, time."""

    question: Question
    readings: tuple[Reading, ...]
    assumed: frozenset[str] = frozenset()


def read_question(  # noqa: PLR0913 - a keyword for each thing a chemist states
    *,
    substrate: str,
    nucleophile: str | None,
    nucleophile_smiles: str | None = None,
    base: str | None = None,
    additives: Iterable[str] = (),
    solvent: Sequence[tuple[str, float]] = (),
    temperature_c: float,
    concentration_m: float | None = None,
    equivalents: float | None = None,
    time_h: float | None = None,
) -> Read:
    """Return the question that names, SMILES and numbers describe.

    A name is looked up exactly (name or synonym), then read as SMILES. Raises AskingError for what cannot be read or
    cannot be: an unknown name, a broken structure, a temperature below absolute zero, a concentration that is not
    positive.
    """
    structure = _structure(substrate, "substrate")
    readings = [Reading("substrate", substrate, structure.smiles)]
    brought: list[Dose] = []
    ingredient = _nucleophile(nucleophile, nucleophile_smiles, readings, brought)
    doses = [*brought, *_doses(additives, readings)]
    added_base = None if base is None else _base(base, readings, doses)
    parts = _solvents(solvent, readings)
    question = Question(
        substrate=structure,
        nucleophile=ingredient,
        base=added_base,
        additives=tuple(doses),
        solvent=parts,
        temperature_k=_kelvin(temperature_c),
        concentration_m=_positive(concentration_m, "concentration", CONCENTRATION_M, MOST_MOLAR),
        equivalents=None if equivalents is None else _equivalents(equivalents),
        time_s=_positive(time_h, "time", TIME_S / 3600, MOST_TIME_H) * 3600,
    )
    stated = {"concentration": concentration_m, "equivalents": equivalents, "time": time_h}
    return Read(question, tuple(readings), frozenset(what for what, value in stated.items() if value is None))


def question_from_words(  # noqa: PLR0913 - a keyword for each thing a chemist states
    *,
    substrate: str,
    nucleophile: str | None = None,
    base: str | None = None,
    additives: Iterable[str] = (),
    solvent: Iterable[str] = (),
    temperature: str,
    concentration: str | None = None,
    equivalents: float | None = None,
    time: str | None = None,
) -> Read:
    """Return the question of what stands on a command line: quantities with their units, "DMF" or "ethanol:0.8".

    Raises AskingError as `read_question` does, for a quantity that cannot be read, and for a ramp of temperature.
    """
    try:
        warm = parse_temperature(temperature)
        molar = None if concentration is None else parse_quantity(concentration, Dimension.CONCENTRATION).magnitude
        seconds = None if time is None else parse_quantity(time, Dimension.TIME).magnitude
    except QuantityError as fault:
        raise AskingError(fault.message, fault.mend) from fault
    if warm.start != warm.end:
        raise AskingError(f"{warm} is more than one temperature", "ask for each by itself")
    return read_question(
        substrate=substrate,
        nucleophile=nucleophile,
        base=base,
        additives=additives,
        solvent=_with_fractions(solvent),
        temperature_c=warm.start.magnitude,
        concentration_m=molar,
        equivalents=equivalents,
        time_h=None if seconds is None else seconds / 3600,
    )


def _with_fractions(texts: Iterable[str]) -> list[tuple[str, float]]:
    """Return (name, fraction by volume) for "ethanol:0.8", "ethanol:80%" or "ethanol"; equal parts where none says."""
    parts = [_name_and_fraction(text) for text in texts]
    if len({fraction is None for _, fraction in parts}) > 1:
        raise AskingError("some solvents have a fraction and others have none", "give each its fraction, or none")
    return [(name, 1.0 / len(parts) if fraction is None else fraction) for name, fraction in parts]


def _name_and_fraction(text: str) -> tuple[str, float | None]:
    match = _FRACTION.fullmatch(text)
    if match is None:
        return text, None
    return match["name"], float(match["number"]) / (100.0 if match["percent"] else 1.0)


_FRACTION = re.compile(r"(?P<name>.*\S)\s*:\s*(?P<number>[+-]?\d+(?:\.\d*)?|[+-]?\.\d+)\s*(?P<percent>%?)\s*")


@dataclass(frozen=True, slots=True)
class Wish:
    """What somebody wants of a reaction: a product or a mechanism, and the share it is to have, above 0 and up to 1."""

    product: Structure | None
    mechanism: Mechanism | None
    share: float


USUAL_SHARE = 0.9


def read_wish(text: str) -> Wish:
    """Return the wish that "E2", "E2:0.95" or "CCC=C:80%" stands for.

    Raises AskingError for what is neither mechanism nor SMILES, and for a share that is none.
    """
    what, fraction = _name_and_fraction(text)
    share = USUAL_SHARE if fraction is None else fraction
    if not 0 < share <= 1:
        raise AskingError(f"a share of {share:g} is not above 0 and up to 1", "write one like E2:0.9")
    by_name = {mechanism.value.lower(): mechanism for mechanism in Mechanism if mechanism is not Mechanism.NONE}
    mechanism = by_name.get(what.strip().lower())
    if mechanism is not None:
        return Wish(None, mechanism, share)
    try:
        return Wish(parse_smiles(what.strip()), None, share)
    except StructureError as fault:
        mend = f"give the SMILES of the product, or one of {', '.join(m.value for m in by_name.values())}"
        raise AskingError(f"{_shown(what)} is no mechanism and no structure", mend) from fault


def question_from_line(line: Mapping[str, Any]) -> Read:
    """Return the question of one line of a batch; keys as the command's help lists them, others are ignored.

    Raises AskingError for a missing key, a value of the wrong type, or what `read_question` refuses.
    """
    for key in ("substrate", "solvent", "temperature_C"):
        if line.get(key) is None:
            raise AskingError(f"no {key}", "every line needs substrate, solvent and temperature_C")
    solvent = line["solvent"]
    if not isinstance(solvent, list) or not all(_is_pair(part) for part in solvent):
        raise AskingError("solvent is no list of [name, fraction]", 'write [["ethanol", 0.8], ["water", 0.2]]')
    additives = line.get("additives") or []
    if not isinstance(additives, list) or not all(isinstance(additive, str) for additive in additives):
        raise AskingError("additives is no list of names", 'write ["H2SO4"], or leave additives out')
    return read_question(
        substrate=_text(line, "substrate") or "",
        nucleophile=_text(line, "nucleophile"),
        nucleophile_smiles=_text(line, "nucleophile_smiles"),
        base=_text(line, "base"),
        additives=additives,
        solvent=[(name, _number(fraction, "solvent fraction")) for name, fraction in solvent],
        temperature_c=_number(line["temperature_C"], "temperature_C"),
        concentration_m=_optional_number(line, "concentration"),
        equivalents=_optional_number(line, "equivalents"),
        time_h=_optional_number(line, "time_h"),
    )


def _is_pair(part: object) -> bool:
    return isinstance(part, list) and len(part) == 2 and isinstance(part[0], str)


def _text(line: Mapping[str, Any], key: str) -> str | None:
    value = line.get(key)
    if value is None or value == "":
        return None
    if not isinstance(value, str):
        raise AskingError(f"{key} is no text", "write it in quotes")
    return value


def _optional_number(line: Mapping[str, Any], key: str) -> float | None:
    return None if line.get(key) is None else _number(line[key], key)


def _number(value: object, what: str) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise AskingError(f"{what} {_shown(value)} is no number", "write a plain number")
    if not -_BEYOND < value < _BEYOND:  # not-a-number too, and whole numbers that no float holds
        raise AskingError(f"{what} is beyond any number that was measured", "write a plain number")
    return float(value)


_BEYOND = 1e30


def _shown(value: object) -> str:
    """Return a value as it is quoted in a message, not longer than a name."""
    text = repr(value)
    return text if len(text) <= LONGEST_QUOTED else f"{text[: LONGEST_QUOTED - 1]}…"


LONGEST_QUOTED = 60


def _kelvin(temperature_c: float) -> float:
    if not temperature_c > ABSOLUTE_ZERO_C:
        raise AskingError(f"{temperature_c:g} °C is not above absolute zero", "give the temperature it was run at")
    if temperature_c > MOST_TEMPERATURE_C:
        raise AskingError(f"{temperature_c:g} °C is beyond any flask", "give the temperature in °C; is it in kelvin?")
    return temperature_c - ABSOLUTE_ZERO_C


def _equivalents(value: float) -> float:
    return _positive(value, "equivalents", EQUIVALENTS, MOST_EQUIVALENTS)


def _positive(value: float | None, what: str, default: float, most: float) -> float:
    if value is None:
        return default
    if not value > 0:
        raise AskingError(f"{what} {value:g} is not positive", f"leave {what} out, or give a positive number")
    if not LEAST <= value <= most:
        raise AskingError(f"{what} {value:g} is out of range", f"give one from {LEAST:g} to {most:g}")
    return value


def _structure(text: str, what: str) -> Structure:
    try:
        return parse_smiles(text.strip())
    except StructureError as fault:
        raise AskingError(f"{what} {_shown(text)}: {fault.reason}", fault.mend) from fault


def _nucleophile(name: str | None, smiles: str | None, readings: list[Reading], doses: list[Dose]) -> Ingredient | None:
    """Return the nucleophile; one that is an acid or activator joins the doses, and what it supplies attacks."""
    word = "" if name is None else name.strip().lower()
    if word in _INTERNAL_WORDS:
        readings.append(Reading("nucleophile", name or "", "a group of the substrate"))
        return None
    if word in _SOLVENT_WORDS:
        readings.append(Reading("nucleophile", name or "", "the solvent"))
        return None
    if name is None and smiles is None:
        return None
    dose = _flask_maker(name, smiles)
    if dose is None:
        return _ingredient(name, smiles, readings, "nucleophile")
    doses.append(dose)
    reagent = dose.reagent
    supplied = None if reagent.supplies is None else Ingredient(reagent.supplies, parse_smiles(reagent.supplies))
    brings = "" if supplied is None else f", which brings {supplied.name}"
    readings.append(Reading("nucleophile", name or smiles or "", f"{reagent.name} ({reagent.role}){brings}"))
    return supplied


_MAKES_THE_FLASK = frozenset({Role.BRONSTED_ACID, Role.LEWIS_ACID, Role.ACTIVATOR, Role.NITROSATION})


def _flask_maker(name: str | None, smiles: str | None) -> Dose | None:
    """Return the dose of a nucleophile such as "HBr (48% aq)" or SOCl2; None for one that attacks as it stands.

    Carboxylic acids attack as they stand, and so does whatever the tables of nucleophiles and solvents know.
    """
    typed = name if smiles is None else None
    if typed is not None and (find_nucleophile_and_counter_ion(typed) or find_solvent(typed)):
        return None
    dose = None if typed is None else find_reagent(typed)
    if dose is None:
        reagent = _reagent_by_smiles(smiles or typed or "")
        dose = None if reagent is None else _undiluted(reagent)
    if dose is None or dose.reagent.role not in _MAKES_THE_FLASK:
        return None
    drawn = dose.reagent.smiles
    if drawn is not None and (nucleophile_by_structure(drawn) is not None or find_solvent("", drawn) is not None):
        return None
    is_acid = drawn is not None and any(a.kind == "carboxylic acid" for a in attacking_atoms(parse_smiles(drawn)))
    return None if is_acid else dose


def _ingredient(name: str | None, smiles: str | None, readings: list[Reading], what: str) -> Ingredient:
    found = None if name is None else find_nucleophile_and_counter_ion(name)
    if smiles is not None:
        structure = _structure(smiles, what)
        counter_ion = found[1] if found is not None else None
        readings.append(Reading(what, name or smiles, structure.smiles))
        return Ingredient(name or structure.smiles, structure, counter_ion)
    assert name is not None  # noqa: S101 - one of the two is given
    if found is not None:
        row, counter_ion = found
        readings.append(Reading(what, name, row.name if counter_ion is None else f"{row.name} with {counter_ion}"))
        return Ingredient(row.name, parse_smiles(row.smiles), counter_ion)
    solvent = find_solvent(name)
    if solvent is not None:
        readings.append(Reading(what, name, solvent.name))
        return Ingredient(solvent.name, parse_smiles(solvent.smiles))
    dose = find_reagent(name)
    if dose is not None and (dose.reagent.smiles or dose.reagent.supplies):
        readings.append(Reading(what, name, dose.reagent.name))
        return Ingredient(dose.reagent.name, parse_smiles(dose.reagent.smiles or dose.reagent.supplies or ""))
    try:
        structure = parse_smiles(name.strip())
    except StructureError as fault:
        near = (*nearest_nucleophiles(name), *nearest_reagents(name))
        raise _unknown(what, name, near, "give a known name or a SMILES") from fault
    readings.append(Reading(what, name, f"SMILES {structure.smiles}"))
    return Ingredient(structure.smiles, structure)


def _base(name: str, readings: list[Reading], doses: list[Dose]) -> Ingredient | None:
    """Return the base as an ingredient; silver salts named as one join the additives too."""
    if name.strip().lower() == "none":
        return None
    dose = find_reagent(name)
    if dose is not None and dose.reagent.role is Role.SILVER:
        doses.append(dose)
    return _ingredient(name, None, readings, "base")


def _doses(additives: Iterable[str], readings: list[Reading]) -> list[Dose]:
    found: list[Dose] = []
    for text in additives:
        dose = find_reagent(text)
        if dose is None:
            reagent = _reagent_by_smiles(text) or _onium_like(text)
            if reagent is None:
                readings.append(Reading("additive", text, f"{_bystander(text)}, {WITHOUT_EFFECT}"))
                continue
            dose = _undiluted(reagent)
        found.append(dose)
        readings.append(Reading("additive", text, f"{dose.reagent.name} ({dose.reagent.role})"))
    return found


WITHOUT_EFFECT = "taken as without effect"
"""Ends the reading of an additive that is known but does nothing to the flask."""


_ONIUM = re.compile(
    r"(ammonium|phosphonium)\s+(fluoride|chloride|bromide|iodide|hydrogen\s?sul(?:f|ph)ate)$", re.IGNORECASE
)


def _onium_like(text: str) -> Reagent | None:
    """Return the common phase-transfer catalyst in the place of any other quaternary salt, by the end of its name."""
    dose = find_reagent("tetrabutylammonium bromide") if _ONIUM.search(text.strip()) else None
    return None if dose is None else dose.reagent


def _bystander(text: str) -> str:
    """Return what an additive is that is no reagent of the table. Raises AskingError for what is nothing known."""
    named = find_nucleophile_and_counter_ion(text)
    if named is not None:
        return named[0].name
    solvent = find_solvent(text)
    if solvent is not None:
        return solvent.name
    try:
        structure = parse_smiles(text.strip())
    except StructureError as fault:
        raise _unknown("additive", text, nearest_reagents(text), "leave it out, or give its SMILES") from fault
    row = nucleophile_by_structure(structure.smiles)
    return f"SMILES {structure.smiles}" if row is None else row.name


def _undiluted(reagent: Reagent) -> Dose:
    return Dose(reagent, None, is_aqueous=False, is_catalytic=False, is_concentrated=False)


def _reagent_by_smiles(text: str) -> Reagent | None:
    try:
        return reagent_by_structure(parse_smiles(text.strip()).smiles)
    except StructureError:
        return None


def _solvents(parts: Sequence[tuple[str, float]], readings: list[Reading]) -> tuple[tuple[Solvent, float], ...]:
    found = [(name, _solvent(name), fraction) for name, fraction in parts if name.strip().lower() != NEAT]
    for _, _, fraction in found:
        if fraction <= 0:
            raise AskingError(f"solvent fraction {fraction:g} is not positive", "leave that solvent out")
    total = math.fsum(fraction for _, _, fraction in found)
    scaled = "" if abs(total - 1) <= ROUNDING or not found else f"; fractions add up to {total:g} and are scaled to 1"
    for name, solvent, fraction in found:
        share = "" if fraction == total else f", {100 * fraction / total:.3g} % by volume"
        readings.append(Reading("solvent", name, f"{solvent.name}{share}{scaled}"))
    return tuple((solvent, fraction) for _, solvent, fraction in found)


ROUNDING = 0.02
"""How far fractions of solvents may be from adding up to 1 by rounding."""


def _solvent(name: str) -> Solvent:
    solvent = find_solvent(name)
    if solvent is None:
        try:
            solvent = find_solvent(name, parse_smiles(name.strip()).smiles)
        except StructureError:
            solvent = None
    if solvent is None:
        otherwise = "give a solvent of the table of solvents, by name or SMILES"
        raise _unknown("solvent", name, nearest_solvents(name), otherwise)
    return solvent


def _unknown(what: str, name: str, near: Sequence[str], otherwise: str) -> AskingError:
    return AskingError(f"unknown {what} {_shown(name)}", f'did you mean "{near[0]}"?' if near else otherwise)
