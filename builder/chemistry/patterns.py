"""The pattern tables, compiled once: leaving groups, classes of reactive carbon, attacking atoms, activations.

Every pattern is a row of a TSV table beside this module; a fault in a table is ours and raises ValueError.
"""

from dataclasses import dataclass
from enum import StrEnum
from functools import cache
from math import isfinite

from builder.chemistry.query import Query
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "Activation",
    "ActivationPattern",
    "ArylPattern",
    "AttackPattern",
    "ClassKind",
    "ClassPattern",
    "Electrons",
    "LeavingGroupPattern",
    "Reach",
    "load_activations",
    "load_aryl_substituents",
    "load_attack_patterns",
    "load_class_patterns",
    "load_leaving_groups",
    "parse_attack_patterns",
    "parse_class_patterns",
    "parse_leaving_groups",
]


class ClassKind(StrEnum):
    """What a class word speaks of: the substitution, the surroundings, or a multiple bond that takes up HX."""

    DEGREE = "degree"
    SITE = "site"
    ADDITION = "addition"


class Electrons(StrEnum):
    """Where an attacking atom finds the pair for its new bond; the table's header explains each."""

    LONE_PAIR = "lone pair"
    SHIFT = "shift"
    PI_BOND = "pi bond"
    PROTON_LOST = "proton lost"
    PROTON_MOVES = "proton moves"
    CHARGE_MOVES = "charge moves"
    RING_CARBON = "ring carbon"
    METAL_BOND = "metal bond"
    HYDRIDE_TRANSFER = "hydride transfer"


class Activation(StrEnum):
    """What helps a leaving group to go as it stands; the table's header explains each."""

    ACID = "acid"
    SILVER = "silver"


class Reach(StrEnum):
    """Which carbon an attacking atom can reach, and when; the table's header explains each."""

    ANY = "any"
    INSIDE = "inside"
    STRONG_BASE = "strong base"


@dataclass(frozen=True)
class LeavingGroupPattern:
    """One row of leaving_groups.tsv; conjugate_acid_pka is in water, None where the table gives no value."""

    name: str
    abbreviation: str
    conjugate_acid: str | None
    conjugate_acid_pka: float | None
    needs_activation: bool
    activated_by: frozenset[Activation]
    note: str
    source: str
    query: Query


@dataclass(frozen=True)
class ClassPattern:
    """One row of site_classes.tsv; query is None where code decides."""

    name: str
    kind: ClassKind
    expected: bool
    meaning: str
    source: str
    query: Query | None


@dataclass(frozen=True)
class AttackPattern:
    """One row of attacking_atoms.tsv."""

    kind: str
    preference: int
    electrons: Electrons
    reach: Reach
    note: str
    source: str
    query: Query


@dataclass(frozen=True)
class ActivationPattern:
    """One row of activations.tsv: what a hydroxyl group becomes, and with which reagent."""

    group: str
    reagent_name: str
    reagent: str
    query: Query
    source: str


@dataclass(frozen=True)
class ArylPattern:
    """One row of aryl_substituents.tsv."""

    name: str
    source: str
    query: Query


def _compile(name: str, smarts: str, numbers: set[int]) -> Query:
    """Return the compiled SMARTS, which must mark the atoms with these numbers."""
    try:
        query = Query.from_smarts(smarts)
    except ValueError as fault:
        raise ValueError(f"{name}: {fault}") from fault
    if not numbers <= query.places.keys():
        raise ValueError(f"{name}: {smarts} must mark atoms {sorted(numbers)}")
    return query


def _finite(name: str, number: str) -> float:
    value = float(number)
    if not isfinite(value):
        raise ValueError(f"{name}: {number} is no finite number")
    return value


def _yes_or_no(name: str, word: str) -> bool:
    if word not in {"yes", "no"}:
        raise ValueError(f"{name}: {word} is neither yes nor no")
    return word == "yes"


@cache
def load_leaving_groups() -> tuple[LeavingGroupPattern, ...]:
    """Return the leaving groups in table order: of two rows that fit, the first names the group."""
    return parse_leaving_groups(table_text("builder.chemistry", "leaving_groups.tsv"))


def parse_leaving_groups(text: str) -> tuple[LeavingGroupPattern, ...]:
    """Return the rows of a leaving-group table.

    Raises ValueError for any fault in it.
    """
    columns = ("name", "abbreviation", "smarts", "conjugate_acid", "conjugate_acid_pka", "needs_activation")
    found = []
    for row in rows_of("leaving_groups.tsv", text, (*columns, "activated_by", "source", "note")):
        pka = row["conjugate_acid_pka"]
        activated_by = () if row["activated_by"] == NOTHING else row["activated_by"].split(", ")
        found.append(
            LeavingGroupPattern(
                name=row["name"],
                abbreviation=row["abbreviation"],
                conjugate_acid=None if row["conjugate_acid"] == NOTHING else row["conjugate_acid"],
                conjugate_acid_pka=None if pka == NOTHING else _finite(row["name"], pka),
                needs_activation=_yes_or_no(row["name"], row["needs_activation"]),
                activated_by=frozenset(map(Activation, activated_by)),
                note="" if row["note"] == NOTHING else row["note"],
                source=row["source"],
                query=_compile(row["name"], row["smarts"], {1, 2}),
            )
        )
    refuse_twice("leaving_groups.tsv", "name", [row.name for row in found])
    return tuple(found)


@cache
def load_class_patterns() -> tuple[ClassPattern, ...]:
    """Return the classes of reactive carbon in table order."""
    return parse_class_patterns(table_text("builder.chemistry", "site_classes.tsv"))


def parse_class_patterns(text: str) -> tuple[ClassPattern, ...]:
    """Return the rows of a table of site classes.

    Raises ValueError for any fault in it.
    """
    found = []
    for row in rows_of("site_classes.tsv", text, ("name", "kind", "smarts", "expected", "meaning", "source")):
        computed = row["smarts"] == "computed"
        found.append(
            ClassPattern(
                name=row["name"],
                kind=ClassKind(row["kind"]),
                expected=_yes_or_no(row["name"], row["expected"]),
                meaning=row["meaning"],
                source=row["source"],
                query=None if computed else _compile(row["name"], row["smarts"], {1}),
            )
        )
    refuse_twice("site_classes.tsv", "name", [row.name for row in found])
    return tuple(found)


@cache
def load_attack_patterns() -> tuple[AttackPattern, ...]:
    """Return the attacking atoms in table order, which is the order in which they attack."""
    return parse_attack_patterns(table_text("builder.chemistry", "attacking_atoms.tsv"))


def parse_attack_patterns(text: str) -> tuple[AttackPattern, ...]:
    """Return the rows of a table of attacking atoms.

    Raises ValueError for any fault in it.
    """
    needed = {
        Electrons.SHIFT: {1, 2, 3},
        Electrons.PI_BOND: {1, 2},
        Electrons.PROTON_MOVES: {1, 4},
        Electrons.CHARGE_MOVES: {1, 3},
        Electrons.RING_CARBON: {1, 2, 3},
        Electrons.METAL_BOND: {1, 4},
        Electrons.HYDRIDE_TRANSFER: {4},
    }
    found, smarts = [], []
    columns = ("kind", "preference", "smarts", "electrons", "reach", "note", "source")
    for row in rows_of("attacking_atoms.tsv", text, columns):
        electrons = Electrons(row["electrons"])
        smarts.append(row["smarts"])
        found.append(
            AttackPattern(
                kind=row["kind"],
                preference=int(row["preference"]),
                electrons=electrons,
                reach=Reach(row["reach"]),
                note="" if row["note"] == NOTHING else row["note"],
                source=row["source"],
                query=_compile(row["kind"], row["smarts"], needed.get(electrons, {1})),
            )
        )
    refuse_twice("attacking_atoms.tsv", "SMARTS", smarts)
    return tuple(found)


@cache
def load_activations() -> dict[str, ActivationPattern]:
    """Return, by leaving group, the reagent that puts it on a hydroxyl oxygen."""
    found: dict[str, ActivationPattern] = {}
    columns = ("group", "reagent_name", "reagent", "smarts", "source")
    for row in rows_of("activations.tsv", table_text("builder.chemistry", "activations.tsv"), columns):
        if row["group"] in found:
            raise ValueError(f"activations.tsv: given twice: {row['group']}")
        found[row["group"]] = ActivationPattern(
            group=row["group"],
            reagent_name=row["reagent_name"],
            reagent=row["reagent"],
            query=_compile(row["group"], row["smarts"], {1, 2}),
            source=row["source"],
        )
    return found


@cache
def load_aryl_substituents() -> tuple[ArylPattern, ...]:
    """Return the named substituents of benzene rings; of two rows that fit, the first names the substituent."""
    table = "aryl_substituents.tsv"
    found = tuple(
        ArylPattern(row["name"], row["source"], _compile(row["name"], row["smarts"], {1, 2}))
        for row in rows_of(table, table_text("builder.chemistry", table), ("name", "smarts", "source"))
    )
    refuse_twice(table, "name", [row.name for row in found])
    return found
