"""Amounts that the scope of a safety review states, each tied to what it speaks of: "azide (up to 5 mmol)".

An amount speaks of what is named right behind it ("5 mmol of azide"), else of the nearest thing named before it, across
commas and brackets; names joined by "and", "or" or "with" share one. A name speaks of one amount of each unit, so that
"azide at 5 mmol, hydrogen up to 20 mmol" never lifts azide to 20 mmol. None speaks of a medium ("in DMF", or a
solvent of the record).
"""

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

from builder.checks.hazards.words import Mention, is_denied, read_scope

__all__ = ["Bound", "Charge", "bounds_of"]

_SPELLINGS = {
    "mol": {"kmol": 1e3, "mol": 1.0, "mole": 1.0, "mmol": 1e-3, "millimol": 1e-3, "millimole": 1e-3}
    | {"µmol": 1e-6, "umol": 1e-6},
    "g": {"kg": 1e3, "kilogram": 1e3, "g": 1.0, "gram": 1.0, "mg": 1e-3, "milligram": 1e-3, "µg": 1e-6, "ug": 1e-6},
    "L": {"l": 1.0, "litre": 1.0, "liter": 1.0, "ml": 1e-3, "µl": 1e-6, "ul": 1e-6},
}
_UNITS = {spelling: (factor, unit) for unit, spellings in _SPELLINGS.items() for spelling, factor in spellings.items()}
_AMOUNT = re.compile(
    r"(?<![\d.])(?<!\d,)"
    r"(?P<number>(?:\d{1,3}(?:[ \u00a0\u2009\u202f]\d{3})+|\d+)(?:[.,]\d+)?(?:[eE][-+]?\d+)?)"
    rf"\s*(?P<unit>{'|'.join(sorted(_UNITS, key=len, reverse=True))})s?\b"
    r"(?!\s*(?:[/·*%]|-%|per (?:[mµu]?[Ll]|lit(?:re|er)|[kmµ]?g|m?mol|min|h|hour|minute)\b"
    r"|(?:[mµu]?[Ll]|g|mol|min|h)\s?(?:\^?-1|⁻¹)))",
    re.IGNORECASE,
)
"""A number with a unit, in English or with a decimal comma; no concentration, rate, ratio or percentage of moles."""
_AT = re.compile(r"\s*(?:at|up to|at most|max\.?|not over|below|under|about|ca\.?|[:=≤<~])?\s*")
_OF = re.compile(
    r"\s+(?:each\s+)?(?:of\s+)?(?:(?:an?|the|any|dry|solid|liquid|gaseous|aqueous|pure|neat|crude|fresh|total)\s+)*"
)
_RANGE = re.compile(r"\s*(?:to|or|[-–])\s*")
_JOINT = re.compile(r"\s*(?:,?\s*(?:and|or|with|plus)\b|[/&+])\s*(?:(?:an?|the|any)\s+)?")
_LIST = re.compile(r"\s*,\s*")
_MEDIUM = re.compile(r"\b(?:in|into|under)\s+(?:[a-z]+\s+)?$")
_CHOICE = re.compile(r"\s*(?:or\b|/)\s*")
_IN = re.compile(r"\bin\s+(?:at most\s+|about\s+)?$")
_SOLUTION = re.compile(r"\s*(?:of (?:an?|the)\b|(?:[^\s,;()]+\s+){0,3}solution\b)")


@dataclass(frozen=True, slots=True)
class Bound:
    """An amount that a scope states: of which kinds, or of which substances by name (folded); in mol, g or L; as typed.

    One that is tied to neither speaks of nothing the scope names.
    """

    kinds: frozenset[str]
    names: frozenset[str]
    value: float
    unit: str
    typed: str

    @property
    def is_tied(self) -> bool:
        """Say whether it speaks of something that the scope names."""
        return bool(self.kinds or self.names)


@dataclass(frozen=True, slots=True)
class _Subject:
    """What one amount may speak of: a name, or several that are joined."""

    start: int
    end: int
    kinds: frozenset[str]
    names: frozenset[str]


@dataclass(frozen=True, slots=True)
class Charge:
    """What a record has: the kinds of its solvents and of all else, and the names of both, folded."""

    kinds: frozenset[str]
    names: frozenset[str]
    solvent_kinds: frozenset[str] = frozenset()
    solvent_names: frozenset[str] = frozenset()

    def is_solvent(self, kinds: frozenset[str], names: frozenset[str]) -> bool:
        """Answer whether kinds and names are those of a solvent and of nothing else that is here."""
        is_other = kinds & self.kinds or names & self.names
        return not is_other and bool(kinds & self.solvent_kinds or names & self.solvent_names)


@lru_cache(maxsize=256)
def bounds_of(scope: str, charge: Charge) -> tuple[Bound, ...]:
    """Return the amounts of a scope in their order, as they are to be read of what a record has."""
    scope = scope.replace("\u03bc", "µ")  # the Greek letter, which many keyboards give
    subjects = _subjects(scope, charge)
    bounds: list[Bound] = []
    spoken: set[tuple[_Subject, str]] = set()
    last: tuple[int, str, _Subject | None] = (0, "", None)
    for match in _AMOUNT.finditer(scope):
        factor, unit = _UNITS[match["unit"].lower()]
        if unit == "L" and (_IN.search(scope[: match.start()]) or _SOLUTION.match(scope, match.end())):
            continue
        subject = _spoken_of(scope, match, subjects, {each for each, of in spoken if of == unit})
        if subject is None and last[1] == unit and _RANGE.fullmatch(scope[last[0] : match.start()]):
            subject = last[2]
        if subject is not None:
            spoken.add((subject, unit))
        last = (match.end(), unit, subject)
        kinds, named = (subject.kinds, subject.names) if subject is not None else (frozenset(), frozenset())
        bounds.append(Bound(kinds, named, _number(match["number"]) * factor, unit, match[0]))
    return tuple(bounds)


def _spoken_of(
    scope: str, match: re.Match[str], subjects: Iterable[_Subject], spoken: set[_Subject]
) -> _Subject | None:
    before = [each for each in subjects if each.end <= match.start()]
    nearest = before[-1] if before and before[-1] not in spoken else None
    if nearest is not None and _AT.fullmatch(scope[nearest.end : match.start()]):
        return nearest
    behind = (each for each in subjects if each.start >= match.end() and each not in spoken)
    return next((each for each in behind if _OF.fullmatch(scope[match.end() : each.start])), nearest)


def _subjects(scope: str, charge: Charge) -> tuple[_Subject, ...]:
    """Return what a scope names, but for media, in its order; joined names together."""
    named = _named(scope, charge.names | charge.solvent_names)
    found = [each for each in _without_media(scope, named) if not charge.is_solvent(each.kinds, each.names)]
    gaps = [scope[one.end : other.start] for one, other in pairwise(found)]
    groups: list[list[_Subject]] = []
    for index, each in enumerate(found):
        if index and _is_joined(gaps[index - 1 :]):
            groups[-1].append(each)
        else:
            groups.append([each])
    return tuple(
        _Subject(
            group[0].start,
            group[-1].end,
            frozenset().union(*(each.kinds for each in group)),
            frozenset().union(*(each.names for each in group)),
        )
        for group in groups
    )


def _without_media(scope: str, named: Iterable[_Subject]) -> Iterator[_Subject]:
    """Leave out what stands behind "in", and what is given for choice with it: "in DMF or DMSO"."""
    end_of_medium = None
    for each in named:
        is_choice = end_of_medium is not None and _CHOICE.fullmatch(scope[end_of_medium : each.start])
        if is_choice or _MEDIUM.search(scope[: each.start]):
            end_of_medium = each.end
        else:
            yield each


def _is_joined(gaps: list[str]) -> bool:
    """Answer whether the first gap joins: by a word, or by a comma in a list whose last two are joined by one."""
    rest = next((gap for gap in gaps if not _LIST.fullmatch(gap)), "")
    return _JOINT.fullmatch(rest) is not None


def _named(scope: str, names: frozenset[str]) -> Iterator[_Subject]:
    """Yield what a scope names by kind or by a name of the record, in its order; of names in each other the longest."""
    spans: dict[tuple[int, int], _Subject] = {}
    for mention in read_scope(scope).mentions:
        spans[mention.start, mention.end] = _of_kind(mention)
    folded = scope.casefold()
    for name in sorted(names) if len(folded) == len(scope) else ():
        for match in re.finditer(rf"(?<!\w){re.escape(name)}(?!\w)", folded):
            if not is_denied(scope, match.start()):
                known = spans.get(match.span())
                spans[match.span()] = _Subject(*match.span(), known.kinds if known else frozenset(), frozenset({name}))
    for (start, end), subject in sorted(spans.items()):
        if not any(low <= start and end <= high and (low, high) != (start, end) for low, high in spans):
            yield subject


def _of_kind(mention: Mention) -> _Subject:
    return _Subject(mention.start, mention.end, mention.kinds, frozenset())


def _number(typed: str) -> float:
    """Return a typed number; a comma is the decimal sign, which of two readings of "5,000" is the smaller."""
    return float(re.sub(r"\s", "", typed).replace(",", "."))
