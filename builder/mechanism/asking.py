"""From names and SMILES to a question: what chemists type, read exactly or refused with the nearest known name."""

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from builder.chemistry.structure import Structure, StructureError, parse_smiles
from builder.mechanism.nucleophiles import find_nucleophile_and_counter_ion, nearest_nucleophiles
from builder.mechanism.question import CONCENTRATION_M, TIME_S, Ingredient, Question
from builder.mechanism.reagents import Dose, Reagent, Role, find_reagent, nearest_reagents, reagent_by_structure
from builder.mechanism.solvents import Solvent, find_solvent, nearest_solvents

__all__ = ["INTERNAL", "AskingError", "Read", "question_from_line", "read_question"]

INTERNAL = "none (internal nucleophile)"
_INTERNAL_WORDS = frozenset({INTERNAL, "none", "internal", "none (intramolecular)"})
NEAT = "neat"
ABSOLUTE_ZERO_C = -273.15


class AskingError(ValueError):
    """Something in a question that cannot be read: what, and how to mend it."""

    def __init__(self, what: str, mend: str) -> None:
        super().__init__(f"{what}; {mend}")
        self.what = what
        self.mend = mend


@dataclass(frozen=True, slots=True)
class Read:
    """A question, and how each of its words was read: (word as typed, what it was taken for)."""

    question: Question
    readings: tuple[tuple[str, str], ...]


def read_question(
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
    readings: list[tuple[str, str]] = []
    doses, left_over = _doses(additives, readings)
    ingredient = _nucleophile(nucleophile, nucleophile_smiles, readings)
    added_base = None if base is None else _base(base, readings, doses)
    parts = _solvents(solvent, readings)
    if left_over and ingredient is None and nucleophile is None:
        raise AskingError("no nucleophile", "name one, or say none (internal nucleophile)")
    question = Question(
        substrate=_structure(substrate, "substrate"),
        nucleophile=ingredient,
        base=added_base,
        additives=tuple(doses),
        solvent=parts,
        temperature_k=_above_zero(temperature_c),
        concentration_m=_positive(concentration_m, "concentration", CONCENTRATION_M),
        equivalents=None if equivalents is None else _positive(equivalents, "equivalents", 1.0),
        time_s=_positive(time_h, "time", TIME_S / 3600) * 3600,
    )
    return Read(question, tuple(readings))


def question_from_line(line: Mapping[str, Any]) -> Read:
    """Return the question of one line of a batch; keys as the command's help lists them, others are ignored.

    Raises AskingError for a missing key, a value of the wrong type, or what `read_question` refuses.
    """
    for key in ("substrate", "solvent", "temperature_C"):
        if line.get(key) is None:
            raise AskingError(f"no {key}", "every line needs substrate, solvent and temperature_C")
    solvent = line["solvent"]
    if not isinstance(solvent, list) or not all(isinstance(p, list) and len(p) == 2 for p in solvent):
        raise AskingError("solvent is no list of [name, fraction]", 'write [["ethanol", 0.8], ["water", 0.2]]')
    return read_question(
        substrate=_text(line, "substrate") or "",
        nucleophile=_text(line, "nucleophile"),
        nucleophile_smiles=_text(line, "nucleophile_smiles"),
        base=_text(line, "base"),
        additives=[str(a) for a in line.get("additives") or ()],
        solvent=[(str(name), _number(fraction, "solvent fraction")) for name, fraction in solvent],
        temperature_c=_number(line["temperature_C"], "temperature_C"),
        concentration_m=_optional_number(line, "concentration"),
        equivalents=_optional_number(line, "equivalents"),
        time_h=_optional_number(line, "time_h"),
    )


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
    if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
        raise AskingError(f"{what} {value!r} is no number", "write a plain number")
    return float(value)


def _above_zero(temperature_c: float) -> float:
    if temperature_c <= ABSOLUTE_ZERO_C:
        raise AskingError(f"{temperature_c:g} °C is not above absolute zero", "give the temperature in °C")
    return temperature_c - ABSOLUTE_ZERO_C


def _positive(value: float | None, what: str, default: float) -> float:
    if value is None:
        return default
    if not value > 0 or not math.isfinite(value):
        raise AskingError(f"{what} {value:g} is not positive", f"leave {what} out, or give a positive number")
    return value


def _structure(text: str, what: str) -> Structure:
    try:
        return parse_smiles(text.strip())
    except StructureError as fault:
        raise AskingError(f"{what} {text!r}: {fault.reason}", fault.mend) from fault


def _nucleophile(name: str | None, smiles: str | None, readings: list[tuple[str, str]]) -> Ingredient | None:
    if name is not None and name.strip().lower() in _INTERNAL_WORDS:
        readings.append((name, "a group of the substrate"))
        return None
    if name is None and smiles is None:
        return None
    return _ingredient(name, smiles, readings, "nucleophile")


def _ingredient(name: str | None, smiles: str | None, readings: list[tuple[str, str]], what: str) -> Ingredient:
    found = None if name is None else find_nucleophile_and_counter_ion(name)
    if smiles is not None:
        structure = _structure(smiles, what)
        counter_ion = found[1] if found is not None else None
        readings.append((name or smiles, structure.smiles))
        return Ingredient(name or structure.smiles, structure, counter_ion)
    assert name is not None
    if found is not None:
        row, counter_ion = found
        readings.append((name, row.name if counter_ion is None else f"{row.name} with {counter_ion}"))
        return Ingredient(row.name, parse_smiles(row.smiles), counter_ion)
    solvent = find_solvent(name)
    if solvent is not None:
        readings.append((name, solvent.name))
        return Ingredient(solvent.name, parse_smiles(solvent.smiles))
    dose = find_reagent(name)
    if dose is not None and (dose.reagent.smiles or dose.reagent.supplies):
        readings.append((name, dose.reagent.name))
        return Ingredient(dose.reagent.name, parse_smiles(dose.reagent.smiles or dose.reagent.supplies or ""))
    try:
        structure = parse_smiles(name.strip())
    except StructureError as fault:
        near = (*nearest_nucleophiles(name), *nearest_reagents(name))
        mend = f'did you mean "{near[0]}"?' if near else "give a known name or a SMILES"
        raise AskingError(f"unknown {what} {name!r}", mend) from fault
    readings.append((name, f"SMILES {structure.smiles}"))
    return Ingredient(structure.smiles, structure)


def _base(name: str, readings: list[tuple[str, str]], doses: list[Dose]) -> Ingredient | None:
    """Return the base as an ingredient; a reagent that is no base but was named as one joins the additives."""
    dose = find_reagent(name)
    if dose is not None and dose.reagent.role in {Role.SILVER}:
        doses.append(dose)
    return _ingredient(name, None, readings, "base")


def _doses(additives: Iterable[str], readings: list[tuple[str, str]]) -> tuple[list[Dose], list[str]]:
    found: list[Dose] = []
    unread: list[str] = []
    for text in additives:
        dose = find_reagent(text)
        if dose is None:
            reagent = _reagent_by_smiles(text)
            if reagent is None:
                nucleophile = find_nucleophile_and_counter_ion(text)
                if nucleophile is None:
                    near = nearest_reagents(text)
                    mend = f'did you mean "{near[0]}"?' if near else "leave it out, or name what it does"
                    raise AskingError(f"unknown additive {text!r}", mend)
                unread.append(text)
                readings.append((text, f"{nucleophile[0].name}, taken as without effect"))
                continue
            dose = Dose(reagent, None, is_aqueous=False, is_catalytic=False, is_concentrated=False)
        found.append(dose)
        readings.append((text, f"{dose.reagent.name} ({dose.reagent.role})"))
    return found, unread


def _reagent_by_smiles(text: str) -> Reagent | None:
    try:
        return reagent_by_structure(parse_smiles(text.strip()).smiles)
    except StructureError:
        return None


def _solvents(parts: Sequence[tuple[str, float]], readings: list[tuple[str, str]]) -> tuple[tuple[Solvent, float], ...]:
    found: list[tuple[Solvent, float]] = []
    for name, fraction in parts:
        if name.strip().lower() == NEAT:
            continue
        if fraction <= 0:
            raise AskingError(f"solvent fraction {fraction:g} is not positive", "leave that solvent out")
        solvent = find_solvent(name)
        if solvent is None:
            try:
                solvent = find_solvent(name, parse_smiles(name).smiles)
            except StructureError:
                solvent = None
        if solvent is None:
            near = nearest_solvents(name)
            raise AskingError(
                f"unknown solvent {name!r}", f'did you mean "{near[0]}"?' if near else "give a solvent of the table"
            )
        readings.append((name, solvent.name))
        found.append((solvent, fraction))
    return tuple(found)
