"""Kinds of substance that a text names: a line of the work-up, a note, the scope of a safety review.

A text is read once for all kinds. What it denies ("no acid") does not count, nor what stands in another vessel (the
bleach of a scrubber), nor a warning in brackets ("kept basic (hydrogen sulfide with acid)").
"""

import re
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import cache, lru_cache

from builder.checks.hazards.kinds import SubstanceKind, load_substance_kinds

__all__ = ["Mention", "Named", "ScopeWords", "is_denied", "kinds_named_in", "read_scope"]

_PH = re.compile(r"\bpH\s*(?:of|to|is|about|around|below|ca\.?|[=~≈<≤>≥])?\s*(\d+(?:\.\d+)?)")
_DENIAL = re.compile(
    r"\b(?:no|not|non|never|without|avoid|avoiding|free of|free from|instead of|rather than)\b", re.IGNORECASE
)
_STOP = re.compile(r",(?!\s(?:and )?then (?!\w*(?:ed|ify)\b))|[;:()]|\.\s")
"""What ends a clause; ", then bleach" goes on with the same vessel, ", then acidified" does not."""
_CLAUSE_END = re.compile(rf"{_STOP.pattern}|\bbut\b|\bthen\b")
_THOUGHT = re.compile(r"\bwould\b")  # "acid would set it free"
_REACH_OF_DENIAL = 4  # words: "never let it touch copper"
_PARTING = re.compile(
    r"\b(?:apart|away) from(?:(?:\s[\w-]+){0,4}|(?:\s[\w-]+){1,3}(?:,(?:\s[\w-]+){1,3})+\s(?:and|or))\s$", re.IGNORECASE
)
"""Text before a name that is to be kept apart, the last of a list too: "apart from amines, amide solvents and acid"."""
_DEED = re.compile(r"acidif|pH|.*\b(?:with|into|to|then)\b", re.IGNORECASE)  # "kept away from light and acidified"
_START_OF_NAME = re.compile(r"(?<![A-Za-z0-9·•])[A-Za-z0-9]+")
_END_OF_NAME = re.compile(r"(?![A-Za-z0-9]|-free)")
_OTHER_VESSEL = re.compile(
    r"\b(?:scrubb(?:er|ers|ed|ing)|traps?|(?:gas )?wash(?:ing)?[ -]bottles?|bubblers?|absorbers?|"
    r"off-gas|exhaust|outlet|vent(?:ed)? through|gas(?:es)? through)\b",
    re.IGNORECASE,
)
"""What says that a substance named in the same clause stands behind the flask and meets only its gas."""
_WHEREVER = frozenset({"heavy metal", "silver or copper salt"})
"""Kinds that count in the other vessel too: vapour of hydrazoic acid, or acetylene, makes explosives of the metal."""
_KEPT_BASIC = re.compile(
    r"\bkept (?:basic|alkaline|wet|apart)\b|\bnever into\b|\babove pH\b|\bpH above\b", re.IGNORECASE
)


@dataclass(frozen=True, slots=True)
class Named:
    """What a text names: kinds in the mixture itself, and kinds in a scrubber or trap that only gas reaches."""

    here: frozenset[str]
    in_scrubber: frozenset[str]


@lru_cache(maxsize=512)
def kinds_named_in(text: str) -> Named:
    """Return the kinds a text names; "no acid", "acid-free" and "Lewis acid" name no acid."""
    here: set[str] = set()
    behind: set[str] = set()
    found = list(_names_in(text))
    for name, start, end in found:
        kinds = _vocabulary().kinds_by_word.get(name, frozenset()) - here
        if not kinds or is_denied(text, start) or _is_warning(text, start):
            continue
        inside = [other for other, low, high in found if low <= start and end <= high]
        masked = frozenset().union(*(_vocabulary().kinds_masked.get(other, frozenset()) for other in inside))
        is_behind = _OTHER_VESSEL.search(_clause_at(text, start)) is not None
        here |= (kinds - masked) & (_WHEREVER if is_behind else kinds)
        behind |= (kinds - masked) - _WHEREVER if is_behind else frozenset()
    values = list(_stated_ph(text))
    for kind in load_substance_kinds().values() if values else ():
        if any(low <= value < high for low, high in kind.ph_ranges for value in values):
            here.add(kind.name)
    return Named(frozenset(here), frozenset(behind))


@dataclass(frozen=True, slots=True)
class Mention:
    """A name in a text that the text does not deny: where it starts and ends, and the kinds that it stands for."""

    start: int
    end: int
    kinds: frozenset[str]


@dataclass(frozen=True, slots=True)
class ScopeWords:
    """What the scope of a safety review names, kinds and the words themselves, and the kinds it excludes.

    mentions: the names in their order, of names inside each other the longest only.
    """

    named: frozenset[str]
    words: tuple[str, ...]
    excluded: frozenset[str]
    mentions: tuple[Mention, ...]


@lru_cache(maxsize=512)
def read_scope(text: str) -> ScopeWords:
    """Return what the scope of a safety review names and excludes ("no acid").

    Besides their words kinds are named by what reviewers call them: azide, hydride, alkylator.
    """
    vocabulary = _vocabulary()
    excluded: set[str] = set()
    spans: dict[tuple[int, int], frozenset[str]] = {}
    found = list(_names_in(text))
    for name, start, end in found:
        kinds = vocabulary.kinds_by_word.get(name, frozenset()) | vocabulary.kinds_by_scope_word.get(name, frozenset())
        inside = [other for other, low, high in found if low <= start and end <= high]
        kinds -= frozenset().union(*(vocabulary.kinds_masked.get(other, frozenset()) for other in inside))
        if is_denied(text, start):
            excluded |= kinds
        elif kinds:
            spans[start, end] = spans.get((start, end), frozenset()) | kinds
    named = frozenset().union(*spans.values())
    longest = [(a, b) for a, b in spans if not any(c <= a and b <= d and (a, b) != (c, d) for c, d in spans)]
    words = tuple(dict.fromkeys(text[start:end] for start, end in longest))
    mentions = tuple(Mention(start, end, spans[start, end]) for start, end in sorted(longest))
    return ScopeWords(named, words, frozenset(excluded - named), mentions)


def _names_in(text: str) -> Iterator[tuple[str, int, int]]:
    """Yield (word of the table, start, end) for every name in a text, names inside longer ones too."""
    for token in _START_OF_NAME.finditer(text):
        start = token.start()
        for word in _vocabulary().by_first_token.get(token[0].lower(), ()):
            end = start + len(word)
            typed = text[start:end]
            if (typed == word or (word.islower() and typed.lower() == word)) and _END_OF_NAME.match(text, end):
                yield word, start, end


@dataclass(frozen=True, slots=True)
class _Vocabulary:
    """The words of all kinds, laid out so that a text is read once.

    by_first_token: words by the letters and digits they begin with, in lower case.
    kinds_by_word, kinds_by_scope_word, kinds_masked: the kinds a word names, those it names in a scope only, and those
    of which it is another thing.
    """

    by_first_token: Mapping[str, tuple[str, ...]]
    kinds_by_word: Mapping[str, frozenset[str]]
    kinds_by_scope_word: Mapping[str, frozenset[str]]
    kinds_masked: Mapping[str, frozenset[str]]


@cache
def _vocabulary() -> _Vocabulary:
    kinds = load_substance_kinds().values()
    named = [(word, kind.name) for kind in kinds for word in kind.words]
    in_scope = [(word, kind.name) for kind in kinds for word in _scope_words(kind)]
    masked = [(word, kind.name) for kind in kinds for word in kind.other_things]
    by_first_token: dict[str, dict[str, None]] = {}
    for word, _ in (*named, *in_scope, *masked):
        token = _START_OF_NAME.match(word)
        if token is None:
            raise ValueError(f"substance_kinds.tsv: {word} must begin with a letter or a digit")
        by_first_token.setdefault(token[0].lower(), {})[word] = None
    return _Vocabulary(
        by_first_token={token: tuple(words) for token, words in by_first_token.items()},
        kinds_by_word=_gathered(named),
        kinds_by_scope_word=_gathered(in_scope),
        kinds_masked=_gathered(masked),
    )


def _scope_words(kind: SubstanceKind) -> tuple[str, ...]:
    return (kind.name, f"{kind.name}s", *kind.scope_words)


def _gathered(pairs: Iterable[tuple[str, str]]) -> dict[str, frozenset[str]]:
    found: dict[str, set[str]] = {}
    for key, value in pairs:
        found.setdefault(key, set()).add(value)
    return {key: frozenset(values) for key, values in found.items()}


def is_denied(text: str, start: int) -> bool:
    """Answer whether what is named at `start` is said to be absent, kept apart, or only thought of ("would")."""
    before = text[:start]
    clause = _CLAUSE_END.split(before)[-1]
    if _THOUGHT.search(_clause_at(text, start)):
        return True
    denials = list(_DENIAL.finditer(clause))
    if denials and len(clause[denials[-1].end() :].split()) <= _REACH_OF_DENIAL:
        return True
    parting = _PARTING.search(before)
    return parting is not None and not _DEED.match(text, start) and not _DEED.match(parting[0])


def _is_warning(text: str, start: int) -> bool:
    """Answer whether what is named at `start` stands in brackets behind "kept basic": why, not what is done."""
    opened = text.rfind("(", 0, start)
    is_in_brackets = opened >= 0 and ")" not in text[opened:start]
    return is_in_brackets and _KEPT_BASIC.search(text[:opened]) is not None


def _clause_at(text: str, start: int) -> str:
    """Return what stands around `start` between commas, semicolons, colons, brackets and full stops."""
    begins = max((match.end() for match in _STOP.finditer(text[:start])), default=0)
    ends = _STOP.search(text, start)
    return text[begins : ends.start() if ends else len(text)]


def _stated_ph(text: str) -> Iterator[float]:
    """Yield the pH values a line names; one that must not be reached ("not below pH 5") is none."""
    for match in _PH.finditer(text):
        if not is_denied(text, match.start()):
            yield float(match[1])
