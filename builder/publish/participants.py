"""Who takes part in a reaction: every compound of a record with its role, and all by which it may be looked up."""

from dataclasses import dataclass
from functools import lru_cache

from builder.checks.case import Case, compounds_of
from builder.chemistry.structure import Structure
from builder.mechanism.synonyms import cas_of, names_of, structure_named
from builder.records.model import Compound, Record
from builder.records.vocabulary import ProductUse
from builder.rule import Path

__all__ = ["Identity", "Participant", "participants_of", "role_of"]


@dataclass(frozen=True, slots=True)
class Identity:
    """What a structure is known by beside the names of a record.

    smiles: canonical. variants: without stereochemistry, and of the separate ions. formulas: of the whole and the ions.
    cas: from the tables, empty where they have none.
    """

    smiles: str
    variants: tuple[str, ...]
    formulas: tuple[str, ...]
    inchikey: str
    synonyms: tuple[str, ...]
    cas: str


@dataclass(frozen=True, slots=True)
class Participant:
    """One compound of a record.

    role: in words. weight: the heavier, the more the record is about it. cas, smiles: as typed, empty where not.
    identity: None where neither the record nor the tables have a structure.
    """

    name: str
    role: str
    weight: int
    cas: str
    smiles: str
    identity: Identity | None


def participants_of(case: Case) -> tuple[Participant, ...]:
    """Return every compound of a record in the record's order; one that plays two roles stands twice."""
    return tuple(
        _participant(path, compound, case.record, case.structures.get(path))
        for path, compound in compounds_of(case.record)
    )


def role_of(path: Path, compound: Compound, record: Record) -> str:
    """Return in words what the compound at `path` is in a record: "product A", "formed in stage 1", "solvent"."""
    match path:
        case ("outcome", "products", int(i)):
            return f"product {record.outcome.products[i].label}"
        case ("outcome", "sought"):
            return "product sought"
        case ("stages", int(i), "gives"):
            return f"formed in stage {i + 1}"
        case ("reagents", _):
            return str(getattr(compound, "use", "reagent"))
        case (str(role), *_):
            return role
    raise KeyError(path)


def _participant(path: Path, compound: Compound, record: Record, drawn: Structure | None) -> Participant:
    structure = drawn or structure_named(compound.name)
    role, weight = _role_and_weight(path, compound, record)
    return Participant(
        name=compound.name,
        role=role,
        weight=weight,
        cas=compound.cas or "",
        smiles=compound.smiles or "",
        identity=_identity(structure) if structure is not None else None,
    )


def _role_and_weight(path: Path, compound: Compound, record: Record) -> tuple[str, int]:
    """Return a role in words, and its weight: what an entry turns into what comes before what it uses for that."""
    words = role_of(path, compound, record)
    match path:
        case ("outcome", "products", int(i)):
            if record.outcome.products[i].use is ProductUse.BY_PRODUCT:
                return f"{words}, by-product", 5
            return words, 6
        case ("substrate",):
            return words, 6
        case ("outcome", "sought") | ("stages", _, "gives"):
            return words, 5
        case ("nucleophile" | "base", *_):
            return words, 4
        case ("reagents", _):
            return words, 3
    return words, 2


@lru_cache(maxsize=512)
def _identity(structure: Structure) -> Identity:
    ions = structure.fragments if len(structure.fragments) > 1 else ()
    variants = dict.fromkeys((structure.flat_smiles, *(ion.smiles for ion in ions)))
    return Identity(
        smiles=structure.smiles,
        variants=tuple(each for each in variants if each != structure.smiles),
        formulas=tuple(dict.fromkeys((structure.formula, *(ion.formula for ion in ions)))),
        inchikey=structure.inchikey,
        synonyms=names_of(structure),
        cas=cas_of(structure),
    )
