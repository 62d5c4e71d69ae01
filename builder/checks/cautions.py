"""Cautions: hazards of single substances and of pairs that must not meet, work-up and quench included.

Two tables hold the facts: substance_kinds.tsv says what counts as an azide salt or an acid, cautions.tsv which of them
are hazardous alone or together. What is charged is judged by its structure; the work-up and the notes are free text and
are searched for names. It is a screen, never a clearance: local rules and qualified people decide.
"""

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from functools import cache, lru_cache
from textwrap import shorten

from builder.checks.case import Case, compounds_of
from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure, parse_smiles
from builder.finding import Level
from builder.mechanism.solvents import find_solvent
from builder.records.model import Compound
from builder.rule import Fault, Path, rule
from builder.sources import load_sources
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "CAUTION_CHECKS",
    "WHO_DECIDES",
    "Caution",
    "CautionKind",
    "Hazard",
    "Present",
    "Severity",
    "SubstanceKind",
    "Whereabouts",
    "by_meeting",
    "find_hazards",
    "load_cautions",
    "load_substance_kinds",
    "presents_of",
]

WHO_DECIDES = "local rules and qualified people decide"


class Severity(StrEnum):
    """A curator's grade, heaviest first; the header of cautions.tsv explains it."""

    STOP = "stop"
    WARN = "warn"
    NOTE = "note"

    @property
    def weight(self) -> int:
        """Return 2 for stop down to 0 for note."""
        return {"stop": 2, "warn": 1, "note": 0}[self.value]

    @property
    def level(self) -> Level:
        """Return the level at which it is reported once a `stop` has its safety review."""
        return Level.REMARK if self is Severity.NOTE else Level.CAUTION


class CautionKind(StrEnum):
    """Whether one substance is meant or two, and where; the header of cautions.tsv explains each."""

    SPECIES = "species"
    CHARGED = "charged"
    PAIR = "pair"
    SOLUTION = "solution"
    QUENCH = "quench"


_OF_ONE = frozenset({CautionKind.SPECIES, CautionKind.CHARGED})


class Measure(StrEnum):
    """What a condition of cautions.tsv measures."""

    TEMPERATURE = "temperature"
    HEAVY_ATOMS = "heavy atoms"
    CARBON_RATIO = "carbon ratio"


class Whereabouts(StrEnum):
    """Where in a record something stands: charged or formed on the way, obtained or sought, named in free text."""

    FLASK = "flask"
    PRODUCT = "product"
    WORK_UP = "work-up"
    NOTE = "note"


_TEXT = frozenset({Whereabouts.WORK_UP, Whereabouts.NOTE})


@dataclass(frozen=True, slots=True)
class Present:
    """Something in an experiment that may be hazardous: a substance with its structure or name, or a line of text."""

    path: Path
    name: str
    whereabouts: Whereabouts
    structure: Structure | None = None

    @property
    def shown(self) -> str:
        """Return the name; a line of text is shortened and put in quotes."""
        return f'"{shorten(self.name, 80, placeholder=" …")}"' if self.whereabouts in _TEXT else self.name

    @property
    def kinds(self) -> frozenset[str]:
        """Return the names of the kinds it belongs to, or which the text names without denying them."""
        return _kinds_of(self.structure) if self.structure is not None else _kinds_named_in(self.name)


@dataclass(frozen=True, slots=True)
class SubstanceKind:
    """One row of substance_kinds.tsv; other_things are names inside which its words do not count."""

    name: str
    fragments: tuple[Fragment, ...]
    words: tuple[str, ...]
    other_things: tuple[str, ...]
    ph_ranges: tuple[tuple[float, float], ...]
    note: str


@dataclass(frozen=True, slots=True)
class Condition:
    """A further demand of a caution: a measure below (or from) a limit; units in the header of cautions.tsv."""

    measure: Measure
    sign: str
    limit: float

    def holds(self, first: Present, hottest_c: float) -> bool:
        """Answer whether it is met; a size or ratio is never met where the structure is unknown."""
        value = hottest_c if self.measure is Measure.TEMPERATURE else _size(self.measure, first.structure)
        if value is None:
            return False
        return {"<": value < self.limit, "<=": value <= self.limit, ">=": value >= self.limit}[self.sign]


@dataclass(frozen=True, slots=True)
class Caution:
    """One row of cautions.tsv; second, condition and company are None where the row has none.

    company: a kind that must be there too.
    """

    id: str
    kind: CautionKind
    severity: Severity
    first: SubstanceKind
    second: SubstanceKind | None
    condition: Condition | None
    company: SubstanceKind | None
    hazard: str
    precaution: str
    source: str
    fires: str
    near_miss: str

    @property
    def how(self) -> str:
        """Return how its source is known, a word of the bibliography."""
        return load_sources()[self.source].how


@dataclass(frozen=True, slots=True)
class Hazard:
    """A caution that applies: where it shows, and what it meets there (nothing for a single substance)."""

    caution: Caution
    at: Present
    others: tuple[Present, ...] = ()

    @property
    def message(self) -> str:
        """Return who meets whom, and what comes of it."""
        if not self.others:
            return f"{self.at.shown}: {self.caution.hazard}"
        met = " and ".join(dict.fromkeys(other.shown for other in self.others))
        return f"{met} with {self.at.shown}: {self.caution.hazard}"

    @property
    def data(self) -> dict[str, object]:
        """Return what stands behind the message, JSON-ready."""
        caution = self.caution
        return {"caution": caution.id, "severity": caution.severity.value, "source": caution.source, "how": caution.how}


# --- what is in a record ----------------------------------------------------------------------------------------


def presents_of(case: Case) -> tuple[Present, ...]:
    """Return everything in a record that cautions look at, in its order.

    A solvent without a structure takes it from the table of solvents; whatever has none is judged by its name.
    """
    substances = (
        _substance(case, path, compound, Whereabouts.PRODUCT if path[0] == "outcome" else Whereabouts.FLASK)
        for path, compound in compounds_of(case.record)
    )
    return (*substances, *_texts(case))


def _texts(case: Case) -> Iterator[Present]:
    for index, line in enumerate(case.record.work_up or ()):
        yield Present(("work_up", index), line, Whereabouts.WORK_UP)
    for index, stage in enumerate(case.record.stages):
        if stage.note:
            yield Present(("stages", index, "note"), stage.note, Whereabouts.NOTE)
    if case.record.procedure:
        yield Present(("procedure",), case.record.procedure, Whereabouts.NOTE)


def _substance(case: Case, path: Path, compound: Compound, whereabouts: Whereabouts) -> Present:
    structure = case.structures.get(path)
    if structure is None:
        solvent = find_solvent(compound.name)
        structure = parse_smiles(solvent.smiles) if solvent else None
    return Present(path, compound.name, whereabouts, structure)


# --- which cautions apply ---------------------------------------------------------------------------------------


@lru_cache(maxsize=256)
def find_hazards(presents: tuple[Present, ...], hottest_c: float) -> tuple[Hazard, ...]:
    """Return the hazards among what is present, in table order; a pair once for each place where it shows.

    hottest_c: highest temperature of any stage, °C. A pair shows at the line of text that names a partner, else at
    the second partner.
    """
    by_kind: dict[str, list[Present]] = {}
    for present in presents:
        for kind in present.kinds:
            by_kind.setdefault(kind, []).append(present)
    asked = (caution for caution in load_cautions() if caution.first.name in by_kind)
    return tuple(hazard for caution in asked for hazard in _hazards_of(caution, by_kind, hottest_c))


def by_meeting(hazards: Iterable[Hazard]) -> tuple[tuple[Hazard, ...], ...]:
    """Return the hazards of the same substances in the same place together, the gravest first."""
    meetings: dict[tuple[Path, frozenset[Path]], list[Hazard]] = {}
    for hazard in hazards:
        partners = frozenset(other.path for other in hazard.others)
        meetings.setdefault((hazard.at.path, partners), []).append(hazard)
    return tuple(tuple(sorted(each, key=lambda h: -h.caution.severity.weight)) for each in meetings.values())


def _hazards_of(caution: Caution, by_kind: Mapping[str, Sequence[Present]], hottest_c: float) -> Iterator[Hazard]:
    if caution.company is not None and caution.company.name not in by_kind:
        return
    firsts = [
        present
        for present in by_kind[caution.first.name]
        if caution.condition is None or caution.condition.holds(present, hottest_c)
    ]
    if caution.second is None:
        places = (
            (Whereabouts.FLASK,) if caution.kind is CautionKind.CHARGED else (Whereabouts.FLASK, Whereabouts.PRODUCT)
        )
        yield from (Hazard(caution, present) for present in _in(firsts, *places))
        return
    seconds: Sequence[Present] = by_kind.get(caution.second.name, ())
    if caution.kind is CautionKind.QUENCH:
        seconds = _before_it_is_destroyed(seconds, by_kind)
    if not firsts or not seconds:
        return
    meetings: dict[Present, list[Present]] = {}
    for at, other in _meetings(caution, firsts, seconds):
        meetings.setdefault(at, []).append(other)
    yield from (Hazard(caution, at, tuple(others)) for at, others in meetings.items())


def _meetings(
    caution: Caution, firsts: Sequence[Present], seconds: Sequence[Present]
) -> Iterator[tuple[Present, Present]]:
    """Yield (where it shows, what it meets there) for a pair.

    What was charged counts first, then the work-up, every line of it for a `stop` and the first for others. A note
    counts only where nothing else shows the pair; two lines of text only for a `stop` of which nothing was charged.
    """
    charged = [
        (second, first) for first in _in(firsts, Whereabouts.FLASK) for second in _in(seconds, Whereabouts.FLASK)
    ]
    charged = [(at, other) for at, other in charged if at is not other]
    yield from charged
    if caution.kind is CautionKind.SOLUTION:
        return
    is_grave = caution.severity is Severity.STOP
    named = list(_named(firsts, seconds, Whereabouts.WORK_UP))
    if not charged and not named:
        named = list(_named(firsts, seconds, Whereabouts.NOTE))
    if not charged and not named and is_grave:
        named = [(at, other) for other in _in(firsts, *_TEXT) for at in _in(seconds, *_TEXT)]
    yield from (named if is_grave else [(at, other) for at, other in named if at is named[0][0]])


def _before_it_is_destroyed(presents: Sequence[Present], by_kind: Mapping[str, Sequence[Present]]) -> list[Present]:
    """Leave out the lines of the work-up below the first that names water, an alcohol or an acid."""
    destroying = [*by_kind.get("water or alcohol", ()), *by_kind.get("acid", ())]
    last = min((present.path for present in _in(destroying, Whereabouts.WORK_UP)), default=None)
    return [p for p in presents if p.whereabouts is not Whereabouts.WORK_UP or last is None or p.path <= last]


def _named(
    firsts: Sequence[Present], seconds: Sequence[Present], whereabouts: Whereabouts
) -> Iterator[tuple[Present, Present]]:
    """Yield the pairs of which one partner is charged and the other named in a text that stands there."""
    yield from ((at, other) for other in _in(firsts, Whereabouts.FLASK) for at in _in(seconds, whereabouts))
    if not _in(firsts, Whereabouts.FLASK):
        yield from ((at, other) for other in _in(seconds, Whereabouts.FLASK) for at in _in(firsts, whereabouts))


def _in(presents: Sequence[Present], *places: Whereabouts) -> list[Present]:
    return [present for present in presents if present.whereabouts in places]


_HYDROGEN_HALIDES = frozenset({"Cl", "Br", "I"})


@lru_cache(maxsize=512)
def _kinds_of(structure: Structure) -> frozenset[str]:
    """Return the kinds a structure belongs to; an amine drawn beside HCl is its hydrochloride."""
    pieces = {piece.smiles: _kinds_of_piece(piece) for piece in structure.fragments}
    if _HYDROGEN_HALIDES & pieces.keys() and any("basic amine" in kinds for kinds in pieces.values()):
        pieces = {smiles: kinds for smiles, kinds in pieces.items() if smiles not in _HYDROGEN_HALIDES}
        pieces["hydrochloride"] = frozenset({"alkylammonium salt"})
    return frozenset().union(*pieces.values())


@lru_cache(maxsize=512)
def _kinds_of_piece(piece: Structure) -> frozenset[str]:
    return frozenset().union(*(kinds for fragment, kinds in _kinds_by_fragment().items() if fragment.is_in(piece)))


@cache
def _kinds_by_fragment() -> dict[Fragment, frozenset[str]]:
    """Return the kinds that ask for a fragment, so that each is looked for once though several ask for it."""
    found: dict[Fragment, set[str]] = {}
    for kind in load_substance_kinds().values():
        for fragment in kind.fragments:
            found.setdefault(fragment, set()).add(kind.name)
    return {fragment: frozenset(kinds) for fragment, kinds in found.items()}


def _size(measure: Measure, structure: Structure | None) -> float | None:
    if structure is None:
        return None
    plain = structure.without_counter_ions
    if measure is Measure.HEAVY_ATOMS:
        return float(plain.heavy_atom_count)
    symbols = [atom.symbol for atom in plain.atoms]
    nitrogens = symbols.count("N")
    return (symbols.count("C") + symbols.count("O")) / nitrogens if nitrogens else None


# --- words ------------------------------------------------------------------------------------------------------

_PH_RANGE = re.compile(r"pH (\d+)-(\d+)")
_PH = re.compile(r"\bpH\s*(?:of|to|is|about|around|ca\.?|[=~≈<≤>≥])?\s*(\d+(?:\.\d+)?)")
_DENIAL = re.compile(
    r"\b(?:no|not|non|never|without|avoid|avoiding|free of|free from|instead of|rather than)\b", re.IGNORECASE
)
_CLAUSE_END = re.compile(r"[,;:()]|\.\s|\bbut\b|\bthen\b")
_REACH_OF_DENIAL = 4  # words: "never let it touch copper"
_PARTING = re.compile(
    r"\b(?:apart|away) from(?:(?:\s[\w-]+){0,4}|(?:\s[\w-]+){1,3}(?:,(?:\s[\w-]+){1,3})+\s(?:and|or))\s$", re.IGNORECASE
)
"""Text before a name that is to be kept apart, the last of a list too: "apart from amines, amide solvents and acid"."""
_DEED = re.compile(r"acidif|pH|.*\b(?:with|into|to|then)\b", re.IGNORECASE)  # "kept away from light and acidified"
_START_OF_NAME = re.compile(r"(?<![A-Za-z0-9·•])[A-Za-z0-9]+")
_END_OF_NAME = re.compile(r"(?![A-Za-z0-9]|-free)")


@lru_cache(maxsize=512)
def _kinds_named_in(text: str) -> frozenset[str]:
    """Return the kinds a text names; "no acid", "acid-free" and "Lewis acid" name no acid."""
    named: set[str] = set()
    found = list(_names_in(text))
    for name, start, end in found:
        kinds = _vocabulary().kinds_by_word.get(name, frozenset()) - named
        if kinds and not _is_denied(text, start):
            inside = [other for other, low, high in found if low <= start and end <= high]
            masked = frozenset().union(*(_vocabulary().kinds_masked.get(other, frozenset()) for other in inside))
            named |= kinds - masked
    values = list(_stated_ph(text))
    for kind in load_substance_kinds().values() if values else ():
        if any(low <= value < high for low, high in kind.ph_ranges for value in values):
            named.add(kind.name)
    return frozenset(named)


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
    kinds_by_word, kinds_masked: the kinds a word names, and those of which it is another thing.
    """

    by_first_token: Mapping[str, tuple[str, ...]]
    kinds_by_word: Mapping[str, frozenset[str]]
    kinds_masked: Mapping[str, frozenset[str]]


@cache
def _vocabulary() -> _Vocabulary:
    kinds = load_substance_kinds().values()
    named = [(word, kind.name) for kind in kinds for word in kind.words]
    masked = [(word, kind.name) for kind in kinds for word in kind.other_things]
    by_first_token: dict[str, dict[str, None]] = {}
    for word, _ in (*named, *masked):
        token = _START_OF_NAME.match(word)
        if token is None:
            raise ValueError(f"substance_kinds.tsv: {word} must begin with a letter or a digit")
        by_first_token.setdefault(token[0].lower(), {})[word] = None
    return _Vocabulary(
        by_first_token={token: tuple(words) for token, words in by_first_token.items()},
        kinds_by_word=_gathered(named),
        kinds_masked=_gathered(masked),
    )


def _gathered(pairs: Iterable[tuple[str, str]]) -> dict[str, frozenset[str]]:
    found: dict[str, set[str]] = {}
    for key, value in pairs:
        found.setdefault(key, set()).add(value)
    return {key: frozenset(values) for key, values in found.items()}


def _is_denied(text: str, start: int) -> bool:
    """Answer whether what is named at `start` is said to be absent or kept apart."""
    before = text[:start]
    clause = _CLAUSE_END.split(before)[-1]
    denials = list(_DENIAL.finditer(clause))
    if denials and len(clause[denials[-1].end() :].split()) <= _REACH_OF_DENIAL:
        return True
    parting = _PARTING.search(before)
    return parting is not None and not _DEED.match(text, start) and not _DEED.match(parting[0])


def _stated_ph(text: str) -> Iterator[float]:
    """Yield the pH values a line names; one that must not be reached ("not below pH 5") is none."""
    for match in _PH.finditer(text):
        if not _is_denied(text, match.start()):
            yield float(match[1])


# --- the tables -------------------------------------------------------------------------------------------------


@cache
def load_substance_kinds() -> dict[str, SubstanceKind]:
    """Return the kinds of substance by name, in table order.

    Raises ValueError for blanks, names given twice, bad SMARTS, and rows with neither SMARTS nor words.
    """
    found: dict[str, SubstanceKind] = {}
    for row in _table("substance_kinds.tsv", ("name", "smarts", "words", "note")):
        words = () if row["words"] == NOTHING else tuple(row["words"].split("|"))
        ranges = [match for word in words if (match := _PH_RANGE.fullmatch(word))]
        kind = SubstanceKind(
            name=row["name"],
            fragments=() if row["smarts"] == NOTHING else tuple(map(Fragment.from_smarts, row["smarts"].split())),
            words=tuple(word for word in words if not word.startswith("!") and not _PH_RANGE.fullmatch(word)),
            other_things=tuple(word[1:] for word in words if word.startswith("!")),
            ph_ranges=tuple((float(match[1]), float(match[2])) for match in ranges),
            note="" if row["note"] == NOTHING else row["note"],
        )
        if kind.name in found or not (kind.fragments or kind.words):
            raise ValueError(f"substance_kinds.tsv: {kind.name}: given twice, or without SMARTS and words")
        found[kind.name] = kind
    return found


@cache
def load_cautions() -> tuple[Caution, ...]:
    """Return the cautions in table order.

    Raises ValueError for blanks, ids given twice, unknown kinds, severities, conditions and sources.
    """
    columns = ("id", "kind", "severity", "first", "second", "condition", "hazard", "precaution", "source")
    found = tuple(_caution(row) for row in _table("cautions.tsv", (*columns, "fires", "near_miss")))
    refuse_twice("cautions.tsv", "id", [caution.id for caution in found])
    return found


def _caution(row: dict[str, str]) -> Caution:
    kind, kinds = CautionKind(row["kind"]), load_substance_kinds()
    is_of_one = kind in _OF_ONE
    company = row["condition"].removeprefix("with ") if row["condition"].startswith("with ") else None
    wanted = [row["first"], *([] if is_of_one else [row["second"]]), *([company] if company else [])]
    if unknown := [name for name in wanted if name not in kinds]:
        raise ValueError(f"cautions.tsv: {row['id']}: unknown kind of substance {unknown[0]}")
    return Caution(
        id=row["id"],
        kind=kind,
        severity=Severity(row["severity"]),
        first=kinds[row["first"]],
        second=None if is_of_one else kinds[row["second"]],
        condition=None if company or row["condition"] == NOTHING else _condition(row["condition"]),
        company=kinds[company] if company else None,
        hazard=row["hazard"],
        precaution=row["precaution"],
        source=row["source"],
        fires=row["fires"],
        near_miss=row["near_miss"],
    )


def _condition(text: str) -> Condition:
    match = re.fullmatch(r"(.+) (<=|<|>=) (\d+(?:\.\d+)?)", text)
    if match is None:
        raise ValueError(f"cautions.tsv: {text} is no condition; write: heavy atoms <= 9")
    return Condition(Measure(match[1]), match[2], float(match[3]))


def _table(name: str, columns: tuple[str, ...]) -> Iterator[dict[str, str]]:
    return rows_of(name, table_text("builder.checks", name), columns)


# --- the rules --------------------------------------------------------------------------------------------------


def _hazards(case: Case) -> tuple[Hazard, ...]:
    hottest_c = max(stage.temperature.highest_c for stage in case.record.stages)
    return find_hazards(presents_of(case), hottest_c)


def _is_unreviewed(case: Case, hazard: Hazard) -> bool:
    return hazard.caution.severity is Severity.STOP and case.record.safety_review is None


@rule(
    id="hazard-unreviewed",
    title="A grave hazard without a safety review",
    source="prudent-practices-2011",
    fires_on=(
        "# without safety_review\nsolvent: [{name: dichloromethane, volume: 20 mL}]",
        "# without safety_review\nwork_up: ['quench with 1 M HCl']",
        "# without safety_review\nwork_up: ['extract with 3 × 20 mL CH2Cl2']",
        "# without safety_review\n"
        "reagents: [{name: ammonium chloride, smiles: '[NH4+].[Cl-]', use: buffer, amount: 20 mmol}]",
    ),
    silent_on=(
        "work_up: ['extract with 3 × 20 mL CH2Cl2']",
        "# without safety_review\nwork_up: ['quench with water, no acid', 'extract with ethyl acetate']",
    ),
)
def hazard_is_unreviewed(case: Case) -> Iterator[Fault]:
    """What can kill or destroy a laboratory is recorded only with the safety review it had.

    It holds for what is charged, formed, obtained or sought, and for what the work-up names: azide with acid or with
    dichloromethane, cyanide with acid, sodium hydride in DMF or DMSO, and so on down the table of cautions. The check
    knows structures and names, not amounts or skill; it cannot say that anything is safe. An acid is what has a pKa of
    up to 9.5 for azide, cyanide and sulfide, ammonium salts included, and the words that name one.
    """
    for hazard in _hazards(case):
        if _is_unreviewed(case, hazard):
            yield Fault(
                at=hazard.at.path,
                message=f"{hazard.message}; the record has no safety_review",
                mend=f"{hazard.caution.precaution}; otherwise add the safety_review it had; {WHO_DECIDES}",
                data=hazard.data,
                source=hazard.caution.source,
            )


@rule(
    id="hazard-pair",
    title="Two substances that should not meet unseen",
    level=Level.CAUTION,
    source="bretherick-2017",
    fires_on=(
        "work_up: ['extract with 3 × 20 mL CH2Cl2']",
        "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 12 mmol}]",
        "reagents: [{name: methanesulfonyl chloride, smiles: 'CS(=O)(=O)Cl', use: activator, amount: 12 mmol}]",
    ),
    silent_on=("work_up: ['quench: 60 mL water, keep above pH 9', 'extract with 3 × 20 mL ethyl acetate']",),
)
def hazard_of_a_pair(case: Case) -> Iterator[Fault]:
    """Two substances of this experiment are hazardous together.

    Some pairs are hazardous wherever they meet, quench and cleaning included; others only in one solution. A pair
    graded `stop` stands here once a safety review is recorded, and as `hazard-unreviewed` before. Of several milder
    hazards of the same substances in one place the gravest is shown and the others are listed in its data; one graded
    `note` is a remark.
    """
    pairs = [hazard for hazard in _hazards(case) if hazard.caution.second is not None]
    for hazard in pairs:
        if hazard.caution.severity is Severity.STOP and not _is_unreviewed(case, hazard):
            yield _fault([hazard])
    milder = (hazard for hazard in pairs if hazard.caution.severity is not Severity.STOP)
    yield from map(_fault, by_meeting(milder))


_HARMLESS = """\
substrate: {name: cyclohexanol, smiles: 'OC1CCCCC1', class: secondary, leaving_group: hydroxyl, amount: 10 mmol}
nucleophile: none
reagents: [{name: phosphoric acid, smiles: 'OP(O)(O)=O', use: acid, amount: 2 mmol}]
solvent: [{name: toluene, volume: 20 mL}]
stages: [{temperature: 100 °C, time: 6 h}]
work_up: [wash with 10 mL water]
outcome:
  result: [elimination]
  products: [{label: A, name: cyclohexene, smiles: 'C1CCC=CC1'}]
  measured: [{yield: 81 %, of: A, kind: assay, by: GC}]
"""


@rule(
    id="hazard-species",
    title="A substance that is hazardous by itself",
    level=Level.CAUTION,
    source="prudent-practices-2011",
    fires_on=(
        "substrate: {name: iodomethane, smiles: CI, class: methyl, leaving_group: iodide, amount: 10 mmol}",
        "base: [{name: potassium cyanide, smiles: '[K+].[C-]#N', amount: 1 mmol}]",
    ),
    silent_on=(_HARMLESS,),
)
def hazard_of_a_species(case: Case) -> Iterator[Fault]:
    """A substance charged, formed, obtained or sought belongs to a class with a known hazard.

    Each substance has one such finding, the gravest; the others are listed in its data. Alkylating agents are named by
    class where they are charged or formed on the way, since every good leaving group on carbon makes one; as products
    only those that are a known danger. Organic azides are judged by the number of carbon and oxygen atoms for each
    nitrogen atom. What is only good to know is a remark. Corrosive, flammable and merely harmful substances are left to
    their data sheets.
    """
    of_one = (hazard for hazard in _hazards(case) if hazard.caution.second is None)
    for hazards in by_meeting(of_one):
        if not any(_is_unreviewed(case, hazard) for hazard in hazards):
            yield _fault(hazards)


def _fault(hazards: Iterable[Hazard]) -> Fault:
    """Return the fault for the first and gravest of several hazards in one place; the others are listed in its data."""
    gravest, *others = hazards
    caution = gravest.caution
    return Fault(
        at=gravest.at.path,
        message=gravest.message,
        mend=f"{caution.precaution}; {WHO_DECIDES}",
        data={**gravest.data, "others": [other.caution.id for other in others]},
        level=caution.severity.level,
        source=caution.source,
    )


CAUTION_CHECKS = (hazard_is_unreviewed, hazard_of_a_pair, hazard_of_a_species)
