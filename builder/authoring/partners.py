"""What was typed of a reaction, as chemistry: substrate and partners, the group that leaves, the state of stereo."""

from collections.abc import Sequence
from decimal import Decimal, InvalidOperation
from difflib import get_close_matches
from enum import StrEnum

from builder.authoring.dialogue import Dialogue
from builder.authoring.drawing import leaving_sites
from builder.authoring.plan import NEAT, PlannedSolvent
from builder.chemistry.perception import (
    ReactiveSite,
    attacking_atoms,
    leaving_group_names,
    perceive_sites,
    site_class_names,
    sites_of,
)
from builder.chemistry.structure import Structure, StructureError, name_atom, parse_smiles
from builder.mechanism.asking import INTERNAL, AskingError
from builder.mechanism.compounds import Identified, identify
from builder.mechanism.reaction import precursors_of
from builder.mechanism.reagents import Role, reagent_by_structure
from builder.mechanism.solvents import find_solvent, nearest_solvents
from builder.records.piece import AMOUNT, MASS, VOLUME, read_piece
from builder.records.quantities import QuantityError
from builder.records.vocabulary import NucleophileWord, StereoKind

__all__ = [
    "is_swapped",
    "leaving_group_of",
    "read_equivalents",
    "read_nucleophile",
    "read_quantity",
    "read_solvents",
    "stereo_of",
    "word_among",
]


def word_among(words: Sequence[str], typed: str, what: str) -> str:
    """Return the word of a closed list that was typed.

    Raises AskingError with the nearest one.
    """
    word = " ".join(typed.lower().split())
    if word in words:
        return word
    near = get_close_matches(word, words, n=1)
    mend = f'did you mean "{near[0]}"?' if near else f"one of {', '.join(words)}"
    raise AskingError(f'unknown {what} "{typed:.60}"', mend)


# --- compounds ------------------------------------------------------------------------------------------------

_WORDS = {
    **{word.value: word for word in NucleophileWord},
    INTERNAL: NucleophileWord.INTERNAL,
    "none (intramolecular)": NucleophileWord.INTERNAL,
    "none (solvent)": NucleophileWord.SOLVENT,
    "none (solvolysis)": NucleophileWord.SOLVENT,
}


def read_nucleophile(text: str) -> Identified | NucleophileWord:
    """Return a nucleophile by name or SMILES, or the word that stands in its place.

    Raises AskingError as `identify` does.
    """
    return _WORDS.get(text.strip().lower()) or identify(text, "nucleophile")


def read_solvents(texts: Sequence[str]) -> tuple[tuple[PlannedSolvent, ...], bool]:
    """Return solvents from "DMF", "DMF:20 mL", "ethanol:80%" or "ethanol:0.8"; and whether it is to be neat.

    Raises AskingError for an unknown solvent, or where some have a fraction and others do not.
    """
    if [text.strip().lower() for text in texts] == [NEAT]:
        return (), True
    found = tuple(_solvent(text) for text in texts)
    if len({bool(solvent.fraction) for solvent in found}) > 1:
        raise AskingError("some solvents have a fraction and others have none", "give each its fraction, or none")
    return found, False


def _solvent(text: str) -> PlannedSolvent:
    before, colon, behind = text.rpartition(":")
    name, quantity = (before.strip(), behind.strip()) if colon else (text.strip(), "")
    row = find_solvent(name)
    if row is None:
        try:
            row = find_solvent("", parse_smiles(name).smiles)
        except StructureError:
            near = nearest_solvents(name)
            mend = f'did you mean "{near[0]}"?' if near else "give a solvent of the table, by name or SMILES"
            raise AskingError(f'unknown solvent "{name:.60}"', mend) from None
        if row is None:
            raise AskingError(f'"{name:.60}" is not in the table of solvents', "name one that is")
        name = row.name
    if not quantity:
        return PlannedSolvent(name)
    try:
        share = float(quantity.removesuffix("%")) / (100 if quantity.endswith("%") else 1)
    except ValueError:
        return PlannedSolvent(name, volume=str(read_piece(VOLUME, quantity)))
    if not 0 < share <= 1:
        raise AskingError(f"{quantity} of {name} is no share of a solvent", 'write it like "ethanol:80%"')
    return PlannedSolvent(name, fraction=f"{100 * share:.4g} %")


def is_swapped(substrate: Identified, nucleophile: Identified) -> bool:
    """Say whether what attacks was given first: it bears nothing that leaves as it stands, and the other one does.

    Where the first has no reactive carbon at all, a multiple bond of the other one counts as well.
    """
    first, second = substrate.structure, nucleophile.structure
    if first is None or second is None:
        return False
    reagent = reagent_by_structure(second.smiles)
    if reagent is not None and reagent.role in {Role.ACTIVATOR, Role.BRONSTED_ACID}:
        return False
    if not leaving_sites(first):
        return any(not site.needs_activation for site in leaving_sites(second))
    return bool(attacking_atoms(first)) and not _bears_leaving_group(first) and _bears_leaving_group(second)


def _bears_leaving_group(structure: Structure) -> bool:
    site = leaving_sites(structure)[0] if leaving_sites(structure) else None
    return site is not None and not site.is_addition and not site.needs_activation and site.degree is not None


# --- quantities -----------------------------------------------------------------------------------------------


def read_quantity(text: str) -> tuple[str, str]:
    """Return key and text of a substrate's quantity: "10 mmol" is an amount, "1.37 g" a mass.

    Raises QuantityError for what is neither.
    """
    try:
        return "amount", str(read_piece(AMOUNT, text))
    except QuantityError as fault:
        if fault.rule == "quantity-out-of-range":
            raise
        return "mass", str(read_piece(MASS, text))


def read_equivalents(text: str) -> Decimal:
    """Return a number of equivalents, above 0 and up to 1000.

    Raises AskingError for anything else.
    """
    try:
        number = Decimal(text)
    except InvalidOperation:
        raise AskingError(f'"{text:.40}" is no number of equivalents', "write the bare number, such as 1.5") from None
    if not (number.is_finite() and 0 < number <= 1000):
        raise AskingError(f"{text:.40} equivalents are out of range", "write a number above 0 and up to 1000")
    return number


# --- the site -------------------------------------------------------------------------------------------------


def leaving_group_of(structure: Structure, stated: str, dialogue: Dialogue) -> tuple[str, tuple[str, ...]]:
    """Return the group that leaves and the class words of its carbons; both empty where nothing is perceived.

    stated: the group, where somebody said it. dialogue: asked where several could leave.
    Raises AskingError for a group that is not there, or where nobody says which.
    """
    if stated:
        group = word_among(leaving_group_names(), stated, "leaving group")
        return group, _classes(structure, group) or _classes_before(structure, group, dialogue)
    groups = list(dict.fromkeys(site.leaving_group for site in leaving_sites(structure)))
    if not groups:
        said = f"no leaving group and no multiple bond is perceived in {structure.typed}"
        dialogue.tell(f"{said}: class and leaving_group stay open")
        return "", ()
    if len(groups) == 1:
        return groups[0], _classes(structure, groups[0])
    options = [_described(structure, group) for group in groups]
    mend = f'add --leaving-group "{groups[0]}", or another'
    chosen = groups[dialogue.must_choose("Which group leaves?", options, mend)]
    return chosen, _classes(structure, chosen)


def _classes_before(structure: Structure, group: str, dialogue: Dialogue) -> tuple[str, ...]:
    """Return the class words where a group is yet to be made of the one that is drawn.

    Raises AskingError where nothing drawn can become it.
    """
    found = dict.fromkeys(site.leaving_group for site in perceive_sites(structure))
    precursor = next((each for each in precursors_of(group) if each in found), None)
    if precursor is None:
        mend = f"it has {', '.join(found)}" if found else "nothing is perceived that could leave"
        raise AskingError(f"no {group} is found on {structure.typed}", mend)
    dialogue.tell(f"{group} is to be made of {precursor}: list the reagent that does it, or say what the stage gives")
    return _classes(structure, precursor)


def _classes(structure: Structure, group: str) -> tuple[str, ...]:
    words = {word for site in sites_of(structure, group) for word in site.classes}
    return tuple(word for word in site_class_names() if word in words)


def _described(structure: Structure, group: str) -> str:
    sites: tuple[ReactiveSite, ...] = sites_of(structure, group)
    carbons = ", ".join(name_atom(structure, site.alpha_carbon).partition(" ")[0] for site in sites)
    return f"{group} ({' and '.join(_classes(structure, group))}, at {carbons})"


def stereo_of(structure: Structure, stated: str, dialogue: Dialogue) -> StereoKind | None:
    """Return the kind of stereo: achiral where the drawing says so, else as stated or asked; None where open.

    Raises AskingError for a word that is none, or that the drawing contradicts.
    """
    if not stated:
        return StereoKind.ACHIRAL if structure.is_achiral else _asked(structure, dialogue)
    kind = StereoKind(word_among(_values(StereoKind), stated, "kind of stereo"))
    possible = [StereoKind.ACHIRAL] if structure.is_achiral else _possible(structure)
    if kind not in possible and kind is not StereoKind.NOT_DETERMINED:
        fitting = ", ".join(each.value for each in possible)
        raise AskingError(
            f"{kind} does not fit the drawing {structure.typed}", f"change the drawing, or write {fitting}"
        )
    return kind


def _asked(structure: Structure, dialogue: Dialogue) -> StereoKind | None:
    possible = _possible(structure)
    place = dialogue.may_choose("What is in the bottle of the substrate?", [kind.value for kind in possible])
    return None if place is None else possible[place]


def _possible(structure: Structure) -> list[StereoKind]:
    left_out = {StereoKind.ACHIRAL}
    if structure.stereocentres.unspecified:
        left_out.add(StereoKind.SINGLE_ENANTIOMER)
    return [kind for kind in StereoKind if kind not in left_out]


def _values(words: type[StrEnum]) -> tuple[str, ...]:
    return tuple(word.value for word in words)
