"""The fields by which readers filter: substrate class, leaving group, nucleophile, solvent, mechanism, result."""

import hashlib
import re
import unicodedata
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass

from builder.book import Entry
from builder.chemistry.perception import leaving_group_names, nucleophile_kinds, site_class_names
from builder.publish.portrait import Portrait
from builder.records.vocabulary import Mechanism, Result

__all__ = ["FACETS", "Facet", "FacetIndex", "FacetValue", "facet_indexes", "facet_values", "slug_of"]


@dataclass(frozen=True, slots=True)
class Facet:
    """One field: its address and titles, and how to read the values of an entry.

    key: part of the address. title: heading of its list. known: the closed list its values come from, if there is one.
    """

    key: str
    title: str
    values_of: Callable[[Entry[Portrait]], tuple[str, ...]]
    known: Callable[[], tuple[str, ...]] | None = None


@dataclass(frozen=True, slots=True)
class FacetValue:
    """One value of a facet with the entries that have it, in the book's order; slug is its address."""

    value: str
    slug: str
    entries: tuple[Entry[Portrait], ...]


@dataclass(frozen=True, slots=True)
class FacetIndex:
    """A facet over all entries of a book, with its values in alphabetical order."""

    facet: Facet
    values: tuple[FacetValue, ...]


def facet_indexes(entries: Sequence[Entry[Portrait]]) -> tuple[FacetIndex, ...]:
    """Return every facet with the values that occur."""
    return tuple(FacetIndex(facet, facet_values(facet, entries)) for facet in FACETS)


def facet_values(facet: Facet, entries: Iterable[Entry[Portrait]]) -> tuple[FacetValue, ...]:
    """Return the values that occur, in alphabetical order; spellings that differ in case alone are one value."""
    found: dict[str, dict[str, Entry[Portrait]]] = {}
    spellings: dict[str, set[str]] = {}
    for entry in entries:
        for value in facet.values_of(entry):
            key = value.casefold()
            spellings.setdefault(key, set()).add(value)
            found.setdefault(key, {})[entry.id] = entry
    labels = {key: min(spellings[key]) for key in found}
    slugs = _slugs(labels.values())
    return tuple(FacetValue(labels[key], slugs[labels[key]], tuple(found[key].values())) for key in sorted(found))


def slug_of(text: str) -> str:
    """Return `text` as part of an address: lower-case ASCII letters and digits joined by hyphens.

    Empty where nothing of the text can be kept.
    """
    plain = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode()
    return re.sub(r"[^a-z0-9]+", "-", plain.casefold()).strip("-")[:60].strip("-")


def _slugs(values: Iterable[str]) -> Mapping[str, str]:
    """Give each value an address of its own; those that would share one, or have none, carry a hash as well."""
    by_slug: dict[str, list[str]] = {}
    for value in values:
        by_slug.setdefault(slug_of(value), []).append(value)
    return {
        value: slug if slug and len(sharing) == 1 else f"{slug}-{_hash(value)}".strip("-")
        for slug, sharing in by_slug.items()
        for value in sharing
    }


def _hash(value: str) -> str:
    return hashlib.sha256(value.encode()).hexdigest()[:8]


def _mechanism(entry: Entry[Portrait]) -> tuple[str, ...]:
    claim = entry.record.outcome.claim
    return (str(claim.mechanism),) if claim else ("no claim",)


FACETS: tuple[Facet, ...] = (
    Facet("class", "Substrate class", lambda entry: entry.record.substrate.classes, site_class_names),
    Facet("leaving-group", "Leaving group", lambda entry: (entry.record.substrate.leaving_group,), leaving_group_names),
    Facet("nucleophile", "Nucleophile or base", lambda entry: entry.kept.attackers, nucleophile_kinds),
    Facet(
        "solvent",
        "Solvent",
        lambda entry: tuple(solvent.name for solvent in entry.record.solvents) or ("neat",),
    ),
    Facet("mechanism", "Mechanism claimed", _mechanism, lambda: tuple(map(str, Mechanism))),
    Facet(
        "result", "Result", lambda entry: tuple(map(str, entry.record.outcome.result)), lambda: tuple(map(str, Result))
    ),
    Facet("verdict", "Verdict", lambda entry: () if entry.record.status.is_retired else (str(entry.verdict),)),
)
