"""What the search box looks in, as scripts of plain data: compounds under all their names, entries, other pages.

A compound stands there once, and entries refer to it by the role it plays in them. Names stay as they were typed:
`site_overrides/assets/search.js` alone knows which spellings are the same. Columns in place of objects keep the file
small, and a browser reads them fastest.
"""

import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cache

from builder.book import Entry
from builder.chemistry.patterns import load_leaving_groups
from builder.mechanism.naming import name_key
from builder.publish.facets import FACETS
from builder.publish.page import Asset, Page
from builder.publish.participants import Identity
from builder.publish.portrait import Portrait, summarise
from builder.records.model import Record
from builder.records.vocabulary import Status

__all__ = ["Listed", "as_script", "listed_of", "search_assets", "search_data", "search_notes"]

_BY_COMPOUND = {"solvent"}
"""Facets left to the compounds, which know every synonym."""
_UNSAFE = {"<": "\\u003c", "\u2028": "\\u2028", "\u2029": "\\u2029"}
"""What may not stand in a script as it is: the way out of its element, and two ends of line."""


@dataclass(frozen=True, slots=True)
class Listed:
    """A page beside the entries that the search may offer.

    path: its address below the site's root. text: what it is about, in a sentence. key: the one word that means it.
    """

    path: str
    title: str
    text: str
    key: str = ""


@dataclass(slots=True)
class _Names:
    """The texts under which one compound is found; dicts as sets that keep their order."""

    place: int
    identity: Identity | None
    typed: dict[str, None] = field(default_factory=dict)
    cas: dict[str, None] = field(default_factory=dict)
    smiles: dict[str, None] = field(default_factory=dict)


class _Words:
    """Texts that recur, each stored once and referred to by its place."""

    def __init__(self) -> None:
        self.places: dict[tuple[str | int, ...], int] = {}

    def place(self, *word: str | int) -> int:
        return self.places.setdefault(word, len(self.places))

    @property
    def listed(self) -> list[tuple[str | int, ...]]:
        return list(self.places)


def listed_of(page: Page) -> Listed | None:
    """Return a page of ours as the search offers it; None for entries, which stand in it apart, and the front page.

    A rule is meant by its id.
    """
    if page.kind in {"entry", "front"}:
        return None
    key = page.path.removeprefix("rules/").rstrip("/") if page.kind == "rule" else ""
    return Listed(page.path, page.title, page.description, key)


def search_assets(entries: Sequence[Entry[Portrait]], listed: Iterable[Listed]) -> tuple[Asset, Asset]:
    """Return the script the search needs, and the one with long texts, which may come later.

    The same book gives the same bytes.
    """
    return (
        Asset("assets/search-data.js", as_script("handbookSearch", search_data(entries, listed)).encode()),
        Asset("assets/search-notes.js", as_script("handbookNotes", search_notes(entries)).encode()),
    )


def as_script(name: str, data: object) -> str:
    """Return a classic script that puts plain data into a global variable; pages opened from a folder may load it."""
    text = json.dumps(data, ensure_ascii=False, separators=(",", ":"))
    for character, escaped in _UNSAFE.items():
        text = text.replace(character, escaped)
    return f"globalThis.{name}={text};\n"


def search_data(entries: Sequence[Entry[Portrait]], listed: Iterable[Listed]) -> dict[str, object]:
    """Return the columns of the index.

    entries: columns by field, one item an entry. participants: compound, role, compound, role …; facets: places in
    the list of facets. compounds: columns whose items hold several texts, a line each (names, synonyms) or a word each.
    roles: words and weight, the heavier the more an entry is about a compound in that role. facets: field, value,
    abbreviation. pages: those in `listed`.
    """
    compounds: dict[str, _Names] = {}
    roles, facets, verdicts, statuses = _Words(), _Words(), _Words(), _Words()
    participants = [_participants(entry, compounds, roles) for entry in entries]
    shown = [summarise(entry) for entry in entries]
    others = tuple(listed)
    return {
        "format": 1,
        "entries": {
            "id": [entry.id for entry in entries],
            "title": [_line(summary.title) for summary in shown],
            "date": [summary.date for summary in shown],
            "notebook": [_line(entry.record.notebook or "") for entry in entries],
            "conditions": [_line(summary.conditions) for summary in shown],
            "outcome": [_line(summary.outcome) for summary in shown],
            "take_away": [_line(summary.take_away) for summary in shown],
            "verdict": [verdicts.place(summary.verdict) for summary in shown],
            "status": [statuses.place(summary.status) for summary in shown],
            "facets": [_facets(entry, facets) for entry in entries],
            "participants": participants,
        },
        "compounds": _compound_columns(compounds.values()),
        "roles": roles.listed,
        "facets": facets.listed,
        "verdicts": [verdict for (verdict,) in verdicts.listed],
        "statuses": [status for (status,) in statuses.listed],
        "retired": [Status.SUPERSEDED, Status.WITHDRAWN],
        "pages": {
            "title": [_line(page.title) for page in others],
            "path": [page.path for page in others],
            "text": [_line(page.text) for page in others],
            "key": [page.key for page in others],
        },
    }


# --- compounds and their roles --------------------------------------------------------------------------------


def _participants(entry: Entry[Portrait], compounds: dict[str, _Names], roles: _Words) -> list[int]:
    """Return compound and role, by their places, of all that takes part in an entry."""
    found: dict[tuple[int, int], None] = {}
    for participant in entry.kept.participants:
        identity = participant.identity
        key = identity.smiles if identity is not None else name_key(participant.name)
        names = compounds.setdefault(key, _Names(len(compounds), identity))
        names.typed[_line(participant.name)] = None
        if participant.cas:
            names.cas[participant.cas] = None
        if participant.smiles:
            names.smiles[participant.smiles] = None
        found[names.place, roles.place(participant.role, participant.weight)] = None
    return [place for pair in found for place in pair]


def _compound_columns(compounds: Iterable[_Names]) -> dict[str, list[str]]:
    rows = [_compound_row(names) for names in compounds]
    return {column: [row[column] for row in rows] for column in _COLUMNS}


_COLUMNS = ("names", "synonyms", "formulas", "cas", "inchikey", "smiles", "variants")


def _compound_row(names: _Names) -> dict[str, str]:
    """Return the texts of one compound; formulas, cas, smiles and variants hold no spaces and are parted by them."""
    identity = names.identity
    if identity is None:
        return dict.fromkeys(_COLUMNS, "") | {"names": "\t".join(names.typed), "cas": " ".join(names.cas)}
    typed = {name.casefold() for name in names.typed}
    smiles = dict.fromkeys((*names.smiles, identity.smiles))
    return {
        "names": "\t".join(names.typed),
        "synonyms": "\t".join(name for name in identity.synonyms if name.casefold() not in typed),
        "formulas": " ".join(identity.formulas),
        "cas": " ".join(dict.fromkeys((*names.cas, *filter(None, (identity.cas,))))),
        "inchikey": identity.inchikey,
        "smiles": " ".join(smiles),
        "variants": " ".join(each for each in identity.variants if each not in smiles),
    }


# --- entries --------------------------------------------------------------------------------------------------


def _facets(entry: Entry[Portrait], facets: _Words) -> list[int]:
    """Return the words an entry is filed under: what the lists have, its course and its status."""
    record = entry.record
    filed = [
        (facet.title.lower(), value, _abbreviations().get(value, "") if facet.key == "leaving-group" else "")
        for facet in FACETS
        if facet.key not in _BY_COMPOUND
        for value in facet.values_of(entry)
    ]
    claimed = record.outcome.claim.course if record.outcome.claim else None
    courses = dict.fromkeys(str(c) for c in (claimed, *(p.course for p in record.outcome.products)) if c)
    filed += [("course", course, "") for course in courses]
    filed.append(("status", str(record.status), ""))
    return [facets.place(*word) for word in filed]


@cache
def _abbreviations() -> Mapping[str, str]:
    return {group.name: group.abbreviation for group in load_leaving_groups()}


def search_notes(entries: Sequence[Entry[Portrait]]) -> list[str]:
    """Return, for each entry, what else its record says in words: procedure, work-up, evidence, cause of failure."""
    return [_notes(entry.record) for entry in entries]


def _notes(record: Record) -> str:
    outcome = record.outcome
    said = (
        *(text for stage in record.stages for text in (stage.end_point, stage.note, stage.atmosphere)),
        *(record.work_up or ()),
        record.procedure,
        *(item if isinstance(item, str) else item.what for item in record.evidence),
        *((outcome.failure.cause, outcome.failure.basis) if outcome.failure else ()),
        record.scale_limit,
    )
    return " · ".join(dict.fromkeys(_line(text) for text in said if text))


def _line(text: str) -> str:
    """Return a text on one line and without tabs: the search counts lines, and tabs part names."""
    return " ".join(text.split())
