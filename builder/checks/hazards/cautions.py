"""The table of cautions: what is hazardous alone or together, how grave, and what to do; loads cautions.tsv."""

import re
from dataclasses import dataclass
from enum import StrEnum
from functools import cache

from builder.checks.hazards.formulae import carbon_ratio
from builder.checks.hazards.kinds import SubstanceKind, hazard_table, load_substance_kinds
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.sources import load_sources
from builder.table import NOTHING, refuse_twice

__all__ = ["WHO_DECIDES", "Caution", "CautionKind", "Condition", "Setting", "Severity", "load_cautions"]

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
    def word(self) -> str:
        """Return it as it stands before a caution on a terminal and in a record."""
        return {"stop": "STOP", "warn": "CAUTION", "note": "NOTE"}[self.value]

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
    NEUTRALISED = "neutralised"
    ISOLATION = "isolation"
    WORK_UP = "work-up"
    SCRUBBER = "scrubber"


_OF_ONE = frozenset({CautionKind.SPECIES, CautionKind.CHARGED})


class Measure(StrEnum):
    """What a condition of cautions.tsv measures."""

    TEMPERATURE = "temperature"
    HEAVY_ATOMS = "heavy atoms"
    CARBON_RATIO = "carbon ratio"


CLOSED = "closed vessel"
ELIMINATES = "elimination without base"
ELIMINATES_WEAKLY = "elimination without strong base"


@dataclass(frozen=True, slots=True)
class Setting:
    """How an experiment is run, as far as cautions ask.

    hottest_c: highest temperature of any stage, °C. eliminates: an alkene forms and no base is charged, so that the
    nucleophile takes up the proton. eliminates_weakly: the same, or no base but hydrogencarbonate is charged.
    """

    hottest_c: float
    is_closed: bool = False
    eliminates: bool = False
    eliminates_weakly: bool = False


@dataclass(frozen=True, slots=True)
class Condition:
    """A further demand of a caution: a measure below (or from) a limit; units in the header of cautions.tsv."""

    measure: Measure
    sign: str
    limit: float

    def holds(self, first: Structure | None, setting: Setting) -> bool:
        """Answer whether it is met; a size or ratio is never met where the structure is unknown."""
        value = setting.hottest_c if self.measure is Measure.TEMPERATURE else _size(self.measure, first)
        if value is None:
            return False
        return {"<": value < self.limit, "<=": value <= self.limit, ">=": value >= self.limit}[self.sign]


@dataclass(frozen=True, slots=True)
class Caution:
    """One row of cautions.tsv; second, condition and company are None where the row has none.

    company: a kind that must be there too. unless, where: a kind that the place of the second must not, or must, belong
    to as well. in_closed_vessel, on_elimination, on_weak_elimination: holds only there, or only then.
    """

    id: str
    kind: CautionKind
    severity: Severity
    first: SubstanceKind
    second: SubstanceKind | None
    condition: Condition | None
    company: SubstanceKind | None
    unless: SubstanceKind | None
    where: SubstanceKind | None
    in_closed_vessel: bool
    on_elimination: bool
    on_weak_elimination: bool
    hazard: str
    precaution: str
    source: str
    fires: str
    near_miss: str

    def is_open_to(self, setting: Setting) -> bool:
        """Answer whether the vessel and the reaction are such that it can apply."""
        return (
            (setting.is_closed or not self.in_closed_vessel)
            and (setting.eliminates or not self.on_elimination)
            and (setting.eliminates_weakly or not self.on_weak_elimination)
        )

    @property
    def depends_on_setting(self) -> bool:
        """Say whether it holds because of how the experiment is run; a size or ratio is the substance's own."""
        is_of_temperature = self.condition is not None and self.condition.measure is Measure.TEMPERATURE
        return is_of_temperature or self.in_closed_vessel or self.on_elimination or self.on_weak_elimination

    @property
    def how(self) -> str:
        """Return how its source is known, a word of the bibliography."""
        return load_sources()[self.source].how

    @property
    def condition_text(self) -> str:
        """Return the further demand in words, empty where there is none."""
        if self.company is not None:
            return f"with {self.company.name}"
        if self.unless is not None:
            return f"unless {self.unless.name}"
        if self.where is not None:
            return f"where {self.where.name}"
        if self.in_closed_vessel:
            return f"in a {CLOSED}"
        if self.on_elimination or self.on_weak_elimination:
            return ELIMINATES if self.on_elimination else ELIMINATES_WEAKLY
        if self.condition is None:
            return ""
        unit = " °C" if self.condition.measure is Measure.TEMPERATURE else ""
        sign = {"<": "below", "<=": "up to", ">=": "from"}[self.condition.sign]
        return f"{self.condition.measure} {sign} {self.condition.limit:g}{unit}"


_PLAIN_DEMANDS = frozenset({NOTHING, CLOSED, ELIMINATES, ELIMINATES_WEAKLY})


def _size(measure: Measure, structure: Structure | None) -> float | None:
    if structure is None:
        return None
    if measure is Measure.HEAVY_ATOMS:
        return float(structure.without_counter_ions.heavy_atom_count)
    return carbon_ratio(structure)


@cache
def load_cautions() -> tuple[Caution, ...]:
    """Return the cautions in table order.

    Raises ValueError for blanks, ids given twice, unknown kinds, severities, conditions and sources.
    """
    columns = ("id", "kind", "severity", "first", "second", "condition", "hazard", "precaution", "source")
    found = tuple(_caution(row) for row in hazard_table("cautions.tsv", (*columns, "fires", "near_miss")))
    refuse_twice("cautions.tsv", "id", [caution.id for caution in found])
    return found


def _caution(row: dict[str, str]) -> Caution:
    kind, kinds = CautionKind(row["kind"]), load_substance_kinds()
    is_of_one = kind in _OF_ONE
    demand = row["condition"]
    word, _, other = demand.partition(" ")
    named = other if word in {"with", "unless", "where"} else None
    wanted = [row["first"], *([] if is_of_one else [row["second"]]), *([named] if named else [])]
    if unknown := [name for name in wanted if name not in kinds]:
        raise ValueError(f"cautions.tsv: {row['id']}: unknown kind of substance {unknown[0]}")
    return Caution(
        id=row["id"],
        kind=kind,
        severity=Severity(row["severity"]),
        first=kinds[row["first"]],
        second=None if is_of_one else kinds[row["second"]],
        condition=None if named or demand in _PLAIN_DEMANDS else _condition(demand),
        company=kinds[other] if word == "with" else None,
        unless=kinds[other] if word == "unless" else None,
        where=kinds[other] if word == "where" else None,
        in_closed_vessel=demand == CLOSED,
        on_elimination=demand == ELIMINATES,
        on_weak_elimination=demand == ELIMINATES_WEAKLY,
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
