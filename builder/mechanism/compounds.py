"""A compound by name or SMILES, as chemists type it: read exactly, or refused with the nearest known name."""

import re
from dataclasses import dataclass

from builder.chemistry.structure import Structure, StructureError, parse_smiles
from builder.mechanism.asking import AskingError
from builder.mechanism.reagents import find_reagent
from builder.mechanism.synonyms import names_of, nearest_names, structure_named

__all__ = ["Identified", "identified", "identify"]


@dataclass(frozen=True, slots=True)
class Identified:
    """A compound that was named or drawn.

    name: as typed, else the first one the tables have; empty where they have none.
    structure: None for a reagent that has no one structure. smiles: as typed, else canonical; empty without structure.
    taken: how the text was read, in words.
    """

    name: str
    structure: Structure | None
    smiles: str
    taken: str


def identify(text: str, what: str) -> Identified:
    """Return the compound that a text names or draws: a name or synonym of the tables first, then a SMILES.

    what: the part it plays (substrate, nucleophile, ...), for messages.
    Raises AskingError for an unknown name, with the nearest known one, or a SMILES that cannot be read, with the place.
    """
    typed = " ".join(text.split())
    structure = structure_named(typed)
    if structure is not None:
        return Identified(typed, structure, structure.smiles, f"{typed}, SMILES {structure.smiles}")
    dose = find_reagent(typed)
    if dose is not None:
        return Identified(typed, None, "", f"{dose.reagent.name} ({dose.reagent.role})")
    try:
        return identified(parse_smiles(typed))
    except StructureError as fault:
        raise _refusal(typed, what, fault) from fault


def identified(structure: Structure) -> Identified:
    """Return a structure as a compound, with the name that the tables have for it."""
    name = next(iter(names_of(structure)), "")
    called = f" ({name})" if name else ""
    return Identified(name, structure, structure.typed, f"SMILES {structure.typed}{called}")


_WORD = re.compile(r"[A-Za-z]*(?:[abd-mp-rt-z][a-z]{2}|[a-z]{4})", re.ASCII)
"""Letters as in a word; aromatic atoms in a row (ccnc) are seldom four without a digit or bracket between."""

_HEAD = re.compile(r"^(?:[\d,()+±'*-]|(?:rac|meso|cis|trans|syn|anti|endo|exo|tert|sec|DL|[A-Za-z])(?=[,)-]))+")
"""Locants and stereodescriptors before the first word of a name."""


def _refusal(typed: str, what: str, fault: StructureError) -> AskingError:
    near = nearest_names(typed)
    if near:
        return AskingError(f'unknown {what} "{typed:.60}"', f'did you mean "{near[0]}"?')
    if " " in typed or _WORD.match(_HEAD.sub("", typed, count=1)) or (typed and not re.search("[A-Za-z*]", typed)):
        return AskingError(f'unknown {what} "{typed:.60}"', "the tables do not know this name: give its SMILES")
    where = "" if fault.position is None else f" (character {fault.position + 1})"
    return AskingError(f'{what} "{typed:.60}": {fault.reason}{where}', fault.mend)
