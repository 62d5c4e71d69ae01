"""What is present in an experiment, and which cautions apply: single substances, and pairs where they meet."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from functools import lru_cache
from textwrap import shorten

from builder.checks.hazards.cautions import Caution, CautionKind, Setting, Severity, load_cautions
from builder.checks.hazards.kinds import kinds_of
from builder.checks.hazards.words import kinds_named_in
from builder.chemistry.structure import Structure
from builder.rule import Path

__all__ = ["Hazard", "Present", "Whereabouts", "by_meeting", "find_hazards"]


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
        return kinds_of(self.structure) if self.structure is not None else kinds_named_in(self.name).here

    @property
    def kinds_in_scrubber(self) -> frozenset[str]:
        """Return the kinds that a text names in a scrubber or trap, which only gas reaches."""
        return frozenset() if self.structure is not None else kinds_named_in(self.name).in_scrubber


@dataclass(frozen=True, slots=True)
class Hazard:
    """A caution that applies: where it shows, and what it meets there (nothing for a single substance)."""

    caution: Caution
    at: Present
    others: tuple[Present, ...] = ()

    @property
    def message(self) -> str:
        """Return who meets whom, and what comes of it."""
        if self.others in {(), (self.at,)}:
            return f"{self.at.shown}: {self.caution.hazard}"
        met = " and ".join(dict.fromkeys(other.shown for other in self.others))
        return f"{met} with {self.at.shown}: {self.caution.hazard}"

    @property
    def data(self) -> dict[str, object]:
        """Return what stands behind the message, JSON-ready."""
        caution = self.caution
        return {"caution": caution.id, "severity": caution.severity.value, "source": caution.source, "how": caution.how}


@lru_cache(maxsize=256)
def find_hazards(presents: tuple[Present, ...], setting: Setting) -> tuple[Hazard, ...]:
    """Return the hazards among what is present, in table order; a pair once for each place where it shows.

    A pair shows at the line of text that names a partner, else at the second partner.
    """
    by_kind: dict[str, list[Present]] = {}
    in_scrubber: dict[str, list[Present]] = {}
    for present in presents:
        for kind in present.kinds:
            by_kind.setdefault(kind, []).append(present)
        for kind in present.kinds_in_scrubber:
            in_scrubber.setdefault(kind, []).append(present)
    asked = (caution for caution in load_cautions() if caution.first.name in by_kind)
    return tuple(hazard for caution in asked for hazard in _hazards_of(caution, by_kind, in_scrubber, setting))


def by_meeting(hazards: Iterable[Hazard]) -> tuple[tuple[Hazard, ...], ...]:
    """Return the hazards of the same substances in the same place together, the gravest first.

    What depends on temperature, vessel or reaction stands for itself: no property of the substance tells it.
    """
    meetings: dict[tuple[Path, frozenset[Path], str], list[Hazard]] = {}
    for hazard in hazards:
        partners = frozenset(other.path for other in hazard.others)
        own = hazard.caution.id if hazard.caution.depends_on_setting else ""
        meetings.setdefault((hazard.at.path, partners, own), []).append(hazard)
    return tuple(tuple(sorted(each, key=lambda h: -h.caution.severity.weight)) for each in meetings.values())


def _hazards_of(
    caution: Caution,
    by_kind: Mapping[str, Sequence[Present]],
    in_scrubber: Mapping[str, Sequence[Present]],
    setting: Setting,
) -> Iterator[Hazard]:
    lacks_company = caution.company is not None and caution.company.name not in by_kind
    if lacks_company or not caution.is_open_to(setting):
        return
    firsts = [
        present
        for present in by_kind[caution.first.name]
        if caution.condition is None or caution.condition.holds(present.structure, setting)
    ]
    if caution.second is None:
        places = (
            (Whereabouts.FLASK,) if caution.kind is CautionKind.CHARGED else (Whereabouts.FLASK, Whereabouts.PRODUCT)
        )
        yield from (Hazard(caution, present) for present in _in(firsts, *places))
        return
    at_hand = in_scrubber if caution.kind is CautionKind.SCRUBBER else by_kind
    seconds: Sequence[Present] = at_hand.get(caution.second.name, ())
    if caution.kind is CautionKind.QUENCH:
        seconds = _before_it_is_destroyed(seconds, by_kind)
    if caution.kind is CautionKind.NEUTRALISED:
        seconds = _while_it_is_basic(seconds, by_kind[caution.first.name], by_kind.get("acid", ()))
    if caution.unless is not None:
        seconds = [present for present in seconds if caution.unless.name not in present.kinds]
    if caution.where is not None:
        seconds = [present for present in seconds if caution.where.name in present.kinds]
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
    Work-up: the second must be named there. Scrubber: the first goes over from the flask. Isolation: as work-up, and
    the first may be obtained or only named.
    """
    if caution.kind in {CautionKind.WORK_UP, CautionKind.SCRUBBER}:
        places = _TEXT if caution.kind is CautionKind.SCRUBBER else {Whereabouts.WORK_UP}
        yield from ((at, first) for first in _in(firsts, Whereabouts.FLASK) for at in _in(seconds, *places)[:1])
        return
    if caution.kind is CautionKind.ISOLATION:
        lines = _in(seconds, Whereabouts.WORK_UP) or _in(seconds, Whereabouts.NOTE)
        substances = _in(firsts, Whereabouts.FLASK, Whereabouts.PRODUCT)
        yield from ((at, first) for first in substances or _in(firsts, *_TEXT)[:1] for at in lines[:1])
        return
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


def _while_it_is_basic(
    presents: Sequence[Present], bases: Sequence[Present], acids: Sequence[Present]
) -> list[Present]:
    """Leave out the lines of the work-up above which an acid was the last to go in, not a base; water alone is none."""
    added_bases, added_acids = _in(bases, Whereabouts.WORK_UP), _in(acids, Whereabouts.WORK_UP)

    def is_basic_at(path: Path) -> bool:
        acid = max((each.path for each in added_acids if each.path < path), default=None)
        base = max((each.path for each in added_bases if each.path <= path), default=None)
        return acid is None or (base is not None and base >= acid)

    return [each for each in presents if each.whereabouts is not Whereabouts.WORK_UP or is_basic_at(each.path)]


def _named(
    firsts: Sequence[Present], seconds: Sequence[Present], whereabouts: Whereabouts
) -> Iterator[tuple[Present, Present]]:
    """Yield the pairs of which one partner is charged and the other named in a text that stands there."""
    yield from ((at, other) for other in _in(firsts, Whereabouts.FLASK) for at in _in(seconds, whereabouts))
    if not _in(firsts, Whereabouts.FLASK):
        yield from ((at, other) for other in _in(seconds, Whereabouts.FLASK) for at in _in(firsts, whereabouts))


def _in(presents: Sequence[Present], *places: Whereabouts) -> list[Present]:
    return [present for present in presents if present.whereabouts in places]
