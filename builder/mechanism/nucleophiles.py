"""Nucleophiles and bases by name and by structure, from nucleophiles.tsv; salts are read with counter_ions.tsv.

Every value carries a key into the bibliography. The tables' headers define the quantities.
"""

import re
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from enum import StrEnum
from functools import cache
from types import MappingProxyType

from builder.chemistry.structure import parse_smiles
from builder.mechanism.naming import NameIndex, name_key, names_in
from builder.mechanism.solvents import find_solvent
from builder.mechanism.sourced import Ranges, sourced_numbers, sources_of
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "Bulk",
    "Reactivity",
    "find_nucleophile",
    "find_nucleophile_and_counter_ion",
    "load_nucleophiles",
    "nearest_nucleophiles",
    "nucleophile_by_structure",
    "salt_names",
]

_TABLE = "nucleophiles.tsv"
_RANGES: Ranges = {
    "n": (-6.0, 12.0),
    "pka_water": (-12.0, 55.0),
    "pka_dmso": (-2.0, 57.0),
    "pka_acid": (-12.0, 55.0),
    "mayr_n": (-5.0, 30.0),
    "mayr_sn": (0.3, 1.2),
}
_COLUMNS = (
    *("name", "synonyms", "named_salts", "smiles", "drawn_as", "n", "n_error", "n_source"),
    *("pka_water", "pka_water_source", "pka_dmso", "pka_dmso_source", "pka_acid", "pka_acid_source"),
    *("mayr_n", "mayr_n_source", "mayr_sn", "mayr_sn_source", "mayr_solvent", "bulk", "note"),
)
_GRADES = re.compile(
    r"^(?:anhydrous|dry|aqueous|aq\.?|excess|liquid|solid|powdered|molten)\s+"
    r"|\s*\((?:anhydrous|dry|aqueous|aq\.?|excess|liquid|solid|neat|solvent|base|counter-?ion|ion|anion)\)$"
    r"|[\s·]+(?:\w*hydrate|\d*\s*h2o|ion)$"
)


class Bulk(StrEnum):
    """How much room a species needs behind a carbon: our judgement."""

    SMALL = "small"
    NORMAL = "normal"
    HINDERED = "hindered"


@dataclass(frozen=True, slots=True, kw_only=True)
class Reactivity:
    """What is known of one nucleophile or base; None where no value is published.

    smiles: canonical, without counter-ion. n, n_error: log10 relative to methanol, towards iodomethane in methanol at
    25 °C. pka_water, pka_dmso: of the conjugate acid. pka_acid: of the species itself. mayr_n, mayr_sn: in
    mayr_solvent, 20 °C. sources: bibliography key by name of the quantity.
    """

    name: str
    synonyms: tuple[str, ...]
    smiles: str
    charge: int
    n: float | None
    n_error: float | None
    pka_water: float | None
    pka_dmso: float | None
    pka_acid: float | None
    mayr_n: float | None
    mayr_sn: float | None
    mayr_solvent: str | None
    bulk: Bulk
    note: str
    sources: Mapping[str, str] = field(compare=False, hash=False)


@cache
def load_nucleophiles() -> tuple[Reactivity, ...]:
    """Return the nucleophiles and bases in table order.

    Raises ValueError for a wrong header, blank cells, numbers out of range, values without a source or an error,
    SMILES that are not canonical, and names or structures given twice.
    """
    return _table().species


def find_nucleophile(name: str) -> Reactivity | None:
    """Return the nucleophile or base of that name, synonym or salt ("LDA", "NaN3", "sodium azide")."""
    found = find_nucleophile_and_counter_ion(name)
    return found[0] if found else None


def find_nucleophile_and_counter_ion(name: str) -> tuple[Reactivity, str | None] | None:
    """Return the species of that name and the SMILES of its counter-ion; None for the latter where none is named."""
    plain = _GRADES.sub("", name.strip().lower())
    for text in (name, plain):
        direct = _names().find(text)
        if direct is not None:
            return direct
    return next(_salts(name_key(plain)), None)


def nucleophile_by_structure(smiles: str) -> Reactivity | None:
    """Return the species of a canonical SMILES (`Structure.smiles`), drawn alone or with known counter-ions."""
    by_smiles = _table().by_smiles
    if smiles in by_smiles:
        return by_smiles[smiles]
    pieces = set(smiles.split(".")) - _cations()
    return by_smiles.get(pieces.pop()) if len(pieces) == 1 else None


def salt_names(smiles: str) -> tuple[str, ...]:
    """Return what chemists call a salt of one known cation and one known anion; empty for anything else.

    "sodium azide" and "NaN3"; both orders of a line formula ("KOtBu", "tBuOK"), numbers where the charges ask for them
    ("K2CO3", "Ba(OH)2"), and the names that do not spell out the cation ("LDA").
    smiles: canonical (`Structure.smiles`).
    """
    pieces = Counter(smiles.split("."))
    cations = [piece for piece in pieces if piece in _cations()]
    anions = [piece for piece in pieces if piece not in _cations()]
    species = _table().by_smiles.get(anions[0]) if len(cations) == len(anions) == 1 else None
    if species is None or species.charge >= 0:
        return ()
    cation, anion = cations[0], anions[0]
    names = next(_cation_names(row) for row in _counter_ion_rows() if row["smiles"] == cation)
    spelled = [name for name in (species.name, *species.synonyms) if not name.endswith(("-", " ion"))]
    symbols = [name.removesuffix("-") for name in species.synonyms if name.endswith("-")]
    return (
        *(f"{name} {other}" for name in names if _is_word(name) for other in spelled),
        *(
            formula
            for name in names
            if name[0].isupper()
            for symbol in symbols
            for formula in _line_formulas((name, pieces[cation]), (symbol, pieces[anion]))
        ),
        *(name for name, ion in _table().salts[species.name] if ion == cation),
    )


def _is_word(name: str) -> bool:
    return name[0].islower() and not name.startswith(("mono", "di"))


def _line_formulas(cation: tuple[str, int], anion: tuple[str, int]) -> tuple[str, str]:
    first, second = _repeated(*cation), _repeated(*anion)
    return f"{first}{second}", f"{second}{first}"


def _repeated(symbol: str, count: int) -> str:
    if count == 1:
        return symbol
    is_one_element = re.fullmatch(r"[A-Z][a-z]?", symbol) is not None
    return f"{symbol}{count}" if is_one_element else f"({symbol}){count}"


def nearest_nucleophiles(name: str) -> tuple[str, ...]:
    """Return known names that `name` may be a slip of, nearest first; empty if it is known.

    A salt keeps its counter-ion: "sodium azid" gives "sodium azide". A slip may be in the counter-ion too.
    """
    if find_nucleophile(name) is not None:
        return ()
    cation, _, rest = name.strip().partition(" ")
    if not rest:
        return _names().nearest(name)
    if _counter_ions().find(cation) is None:
        cation = next(iter(_counter_ions().nearest(cation)), "")
    anions = (rest,) if _anions().find(rest) is not None else _anions().nearest(rest)
    return tuple(f"{cation} {anion}" for anion in anions) if cation else _names().nearest(name)


# --- names of salts ---------------------------------------------------------------------------------------------------


def _salts(key: str) -> Iterator[tuple[Reactivity, str]]:
    """Yield each way to read a key as counter-ion and anion: name first, as sodiumazide, nan3, tbuok, k2co3."""
    for cation, smiles in _spelled_cations():
        if key.startswith(cation):
            rest = key.removeprefix(cation)
        elif key.endswith(cation):
            rest = key.removesuffix(cation)
        elif key.endswith(f"{cation}salt"):
            rest = key.removesuffix(f"{cation}salt")
        else:
            continue
        for anion in (rest, f"{rest}anion", rest[1:] if rest[:1] in {"2", "3"} else "", rest.removesuffix("2")):
            found = _anions().find(anion)
            if found is not None:
                yield found, smiles


@cache
def _spelled_cations() -> tuple[tuple[str, str], ...]:
    """Return the key of every spelling of a counter-ion with its SMILES, longest first."""
    spelled = ((name_key(name), row["smiles"]) for row in _counter_ion_rows() for name in _cation_names(row))
    return tuple(sorted(spelled, key=lambda each: (-len(each[0]), each[0])))


@cache
def _counter_ions() -> NameIndex[str]:
    return NameIndex("counter_ions.tsv", [(row["smiles"], _cation_names(row)) for row in _counter_ion_rows()])


@cache
def _cations() -> frozenset[str]:
    return frozenset(row["smiles"] for row in _counter_ion_rows())


@cache
def _counter_ion_rows() -> tuple[dict[str, str], ...]:
    name = "counter_ions.tsv"
    rows = tuple(rows_of(name, table_text("builder.mechanism", name), ("name", "synonyms", "smiles", "source")))
    refuse_twice(name, "structure", [row["smiles"] for row in rows])
    for row in rows:
        _canonical(name, row["name"], row["smiles"])
    return rows


def _cation_names(row: Mapping[str, str]) -> tuple[str, ...]:
    return (row["name"], *names_in(row["synonyms"]))


# --- the table --------------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Table:
    species: tuple[Reactivity, ...]
    salts: Mapping[str, tuple[tuple[str, str], ...]]
    by_smiles: Mapping[str, Reactivity]


@cache
def _table() -> _Table:
    return _read_nucleophiles(table_text("builder.mechanism", _TABLE))


@cache
def _names() -> NameIndex[tuple[Reactivity, str | None]]:
    """Return the names of the table: the species alone, and the salts it names as such."""
    alone = (((each, None), (each.name, *each.synonyms)) for each in load_nucleophiles())
    salts = (((each, ion), (name,)) for each in load_nucleophiles() for name, ion in _table().salts[each.name])
    salt_keys = {name_key(name) for pairs in _table().salts.values() for name, _ in pairs}
    plain = ((thing, [name for name in names if name_key(name) not in salt_keys]) for thing, names in alone)
    return NameIndex[tuple[Reactivity, str | None]](_TABLE, [*plain, *salts])


@cache
def _anions() -> NameIndex[Reactivity]:
    return NameIndex(_TABLE, [(each, (each.name, *each.synonyms)) for each in load_nucleophiles() if each.charge < 0])


def _read_nucleophiles(text: str) -> _Table:
    rows = tuple(rows_of(_TABLE, text, _COLUMNS))
    species = tuple(_reactivity(row) for row in rows)
    drawn = [
        (_canonical(_TABLE, row["name"], smiles), each)
        for row, each in zip(rows, species, strict=True)
        for smiles in (row["smiles"], *names_in(row["drawn_as"]))
    ]
    refuse_twice(_TABLE, "structure", [smiles for smiles, _ in drawn])
    NameIndex(_TABLE, [(each, (each.name, *each.synonyms)) for each in species])
    salts = {row["name"]: tuple(_named_salt(cell) for cell in names_in(row["named_salts"])) for row in rows}
    return _Table(species, MappingProxyType(salts), MappingProxyType(dict(drawn)))


def _named_salt(cell: str) -> tuple[str, str]:
    name, _, smiles = cell.partition("=")
    if smiles not in _cations():
        raise ValueError(f"{_TABLE}: {name}: unknown counter-ion {smiles}")
    return name, smiles


def _reactivity(row: Mapping[str, str]) -> Reactivity:
    numbers = sourced_numbers(_TABLE, row, _RANGES)
    solvent = None if row["mayr_solvent"] == NOTHING else row["mayr_solvent"]
    if (numbers["n"] is None) != (row["n_error"] == NOTHING) or (numbers["mayr_n"] is None) != (solvent is None):
        raise ValueError(f"{_TABLE}: {row['name']}: n needs its error, and mayr_n its solvent")
    if solvent is not None and find_solvent(solvent) is None:
        raise ValueError(f"{_TABLE}: {row['name']}: unknown solvent {solvent}")
    return Reactivity(
        name=row["name"],
        synonyms=names_in(row["synonyms"]),
        smiles=row["smiles"],
        charge=parse_smiles(row["smiles"]).charge,
        n=numbers["n"],
        n_error=None if row["n_error"] == NOTHING else float(row["n_error"]),
        pka_water=numbers["pka_water"],
        pka_dmso=numbers["pka_dmso"],
        pka_acid=numbers["pka_acid"],
        mayr_n=numbers["mayr_n"],
        mayr_sn=numbers["mayr_sn"],
        mayr_solvent=solvent,
        bulk=Bulk(row["bulk"]),
        note="" if row["note"] == NOTHING else row["note"],
        sources=sources_of(row, _RANGES),
    )


def _canonical(table: str, name: str, smiles: str) -> str:
    if parse_smiles(smiles).smiles != smiles:
        raise ValueError(f"{table}: {name}: {smiles} is not canonical, {parse_smiles(smiles).smiles} is")
    return smiles
