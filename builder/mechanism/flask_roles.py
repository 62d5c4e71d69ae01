"""What a species in the flask does beside attacking a carbon: the roles that flask_roles.tsv gives it."""

from collections.abc import Iterable
from enum import StrEnum
from functools import cache, lru_cache

from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure
from builder.table import rows_of, table_text

__all__ = ["FlaskRole", "roles_in"]


class FlaskRole(StrEnum):
    """One role; the table's header explains each."""

    HEAT_OF_ADDITION = "heat of addition"
    RADICAL_INITIATOR = "radical initiator"
    STRONG_BASE = "strong base"
    TWO_ELECTRON_DONOR = "two-electron donor"
    WATER = "water"


def roles_in(species: Iterable[Structure]) -> frozenset[FlaskRole]:
    """Return every role that one of the species plays."""
    return frozenset().union(*(_roles_of(each) for each in species))


@lru_cache(maxsize=512)
def _roles_of(structure: Structure) -> frozenset[FlaskRole]:
    return frozenset(role for role, fragment in _patterns() if fragment.is_in(structure))


@cache
def _patterns() -> tuple[tuple[FlaskRole, Fragment], ...]:
    name = "flask_roles.tsv"
    rows = rows_of(name, table_text("builder.mechanism", name), ("role", "smarts", "note", "source"))
    return tuple((FlaskRole(row["role"]), Fragment.from_smarts(row["smarts"])) for row in rows)
