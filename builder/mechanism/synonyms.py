"""Every name the tables have for a structure: those of solvents, reagents, nucleophiles and salts, and synonyms.tsv."""

import math
from collections.abc import Mapping
from functools import cache, lru_cache

from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.naming import NameIndex, name_key, names_in
from builder.mechanism.nucleophiles import (
    find_nucleophile_and_counter_ion,
    nearest_nucleophiles,
    nucleophile_by_structure,
    salt_names,
)
from builder.mechanism.reagents import find_reagent, nearest_reagents, reagent_by_structure
from builder.mechanism.solvents import find_solvent, nearest_solvents
from builder.table import refuse_twice, rows_of, table_text

__all__ = ["cas_of", "names_of", "nearest_names", "structure_named"]

_TABLE = "synonyms.tsv"


@lru_cache(maxsize=1024)
def names_of(structure: Structure) -> tuple[str, ...]:
    """Return every name, abbreviation and line formula the tables have for a structure, each once.

    A salt has the names of its anion too: who asks for azide means sodium azide as well. Where the tables draw no
    configuration, theirs are the names of each stereoisomer.
    """
    rows = (
        find_solvent("", structure.smiles),
        reagent_by_structure(structure.smiles),
        nucleophile_by_structure(structure.smiles),
    )
    named = (name for row in rows if row is not None for name in (row.name, *row.synonyms))
    drawn = dict.fromkeys((structure.smiles, structure.flat_smiles))
    listed = (name for smiles in drawn for name in _synonyms().get(smiles, ()))
    return tuple(dict.fromkeys((*salt_names(structure.smiles), *named, *listed)))


def structure_named(name: str) -> Structure | None:
    """Return the structure that the tables have for a name; None where they have none, or no one structure.

    Solvents first, then reagents, then nucleophiles and bases with their counter-ions, then synonyms.tsv.
    """
    solvent = find_solvent(name)
    if solvent is not None:
        return parse_smiles(solvent.smiles)
    dose = find_reagent(name)
    if dose is not None and dose.reagent.smiles is not None:
        return parse_smiles(dose.reagent.smiles)
    found = find_nucleophile_and_counter_ion(name)
    if found is None:
        listed = _synonym_index().find(name)
        return None if listed is None else parse_smiles(listed)
    species, counter_ion = found
    return parse_smiles(species.smiles) if counter_ion is None else _salt(counter_ion, species.smiles)


def nearest_names(name: str) -> tuple[str, ...]:
    """Return names of the tables that `name` may be a slip of, nearest first within each; empty if it is known."""
    if structure_named(name) is not None:
        return ()
    near = (*nearest_nucleophiles(name), *_synonym_index().nearest(name), *nearest_reagents(name))
    return tuple(dict.fromkeys((*near, *nearest_solvents(name))))


def _salt(cation: str, anion: str) -> Structure | None:
    """Return the uncharged salt of two ions; None where they have not charges of either sign."""
    plus, minus = parse_smiles(cation).charge, -parse_smiles(anion).charge
    if plus <= 0 or minus <= 0:
        return None
    most = math.lcm(plus, minus)
    return parse_smiles(".".join([cation] * (most // plus) + [anion] * (most // minus)))


def cas_of(structure: Structure) -> str:
    """Return the CAS number that the table of solvents has for a structure; empty where it has none."""
    solvent = find_solvent("", structure.smiles)
    return "" if solvent is None else solvent.cas


@cache
def _synonym_index() -> NameIndex[str]:
    """Return the canonical SMILES of synonyms.tsv by each of their names."""
    spelled = ((smiles, {name_key(name): name for name in names}) for smiles, names in _synonyms().items())
    return NameIndex(_TABLE, [(smiles, tuple(names.values())) for smiles, names in spelled])


@cache
def _synonyms() -> Mapping[str, tuple[str, ...]]:
    return _read_synonyms(table_text("builder.mechanism", _TABLE))


def _read_synonyms(text: str) -> Mapping[str, tuple[str, ...]]:
    rows = tuple(rows_of(_TABLE, text, ("names", "smiles", "source")))
    refuse_twice(_TABLE, "structure", [row["smiles"] for row in rows])
    for row in rows:
        if parse_smiles(row["smiles"]).smiles != row["smiles"]:
            raise ValueError(f"{_TABLE}: {row['names']}: {row['smiles']} is not canonical")
    return {row["smiles"]: names_in(row["names"]) for row in rows}
