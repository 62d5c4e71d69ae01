"""What the book holds of the same reaction: entries that contradict one, repeat it, or vary it.

Observations stand side by side as they were made; nothing is averaged.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from builder.book import Book
from builder.checks.comparison import Difference, Disagreement, is_near
from builder.checks.group import outcomes_contradict
from builder.checks.kinship import GO_ALONG, VARIED, Kin, Relation, families
from builder.checks.standing import NOT_STATED, Standing, Variable
from builder.publish.figures import capital, joined
from builder.publish.portrait import Portrait
from builder.publish.summary import Summary, newest_first

__all__ = [
    "CONTRADICTION_RULE",
    "ComparedRow",
    "ContradictionPair",
    "ContradictionView",
    "Kindred",
    "Relatives",
    "Series",
    "SeriesRow",
    "contradicting_pairs",
    "relatives_of",
    "view_kindred",
]

CONTRADICTION_RULE = outcomes_contradict.id
MOST_IN_SERIES = 7
"""Other entries that a series on a page lists."""

_SEVERAL = "several at once"
_REPEATS = "repeats"
_ALWAYS_SHOWN = (Variable.SCALE, Variable.RUNS)
"""Stand beside every outcome, the same or not."""
_NOTHING_SAID = frozenset({NOT_STATED, "none"})
_REPEAT_SAYS = (Variable.DATE, Variable.BY)


@dataclass(frozen=True, slots=True)
class ComparedRow:
    """A quantity or variable of two entries.

    mark: contradicts, differs, near-same or same. stands_out: it disagrees, or may be why the outcomes do.
    """

    label: str
    here: str
    there: str
    mark: str
    stands_out: bool


@dataclass(frozen=True, slots=True)
class ContradictionView:
    """Another entry that contradicts this one.

    words: the number that is furthest apart. telling: what most likely makes the difference; empty where nothing does.
    same: what both have in common. reason_here, reason_there: as accepted in the records; empty where open.
    """

    summary: Summary
    words: str
    telling: str
    rows: tuple[ComparedRow, ...]
    same: str
    reason_here: str
    reason_there: str

    @property
    def is_open(self) -> bool:
        """Say whether a reason is still wanted in one of the two."""
        return not (self.reason_here and self.reason_there)


@dataclass(frozen=True, slots=True)
class SeriesRow:
    """One entry of a series: the value it has of what is varied, what goes along with it, what came of it."""

    summary: Summary
    value: str
    detail: str
    outcome: str
    is_here: bool


@dataclass(frozen=True, slots=True)
class Series:
    """Entries of one transformation that differ in one thing, this entry first; further: how many are not listed."""

    key: str
    title: str
    heading: str
    rows: tuple[SeriesRow, ...]
    further: int


@dataclass(frozen=True, slots=True)
class Kindred:
    """What the book holds of the same reaction, as an entry's page shows it.

    relations: what each of them is to this entry, by identifier.
    """

    contradictions: tuple[ContradictionView, ...]
    series: tuple[Series, ...]
    relations: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class ContradictionPair:
    """Two entries that contradict each other, as a list shows them."""

    one: Summary
    other: Summary
    words: str
    telling: str
    is_open: bool


@dataclass(frozen=True, slots=True)
class Relatives:
    """What is needed of a book to tell the kin of an entry: of entries in force, by identifier.

    near_same: what the second of two is to the first, by both, where they ran near-same; either way round.
    reasons: why an entry accepts that it is contradicted.
    """

    standings: Mapping[str, Standing]
    families: Mapping[str, tuple[str, ...]]
    near_same: Mapping[tuple[str, str], Kin]
    reasons: Mapping[str, str]

    def kin(self, here: str, there: str) -> Kin:
        """Return what an entry is to another of its family."""
        if (here, there) in self.near_same:
            return self.near_same[here, there]
        if (there, here) in self.near_same:
            return self.near_same[there, here].mirrored
        return Kin(Relation.VARIANT, self.standings[here], self.standings[there])


def relatives_of(book: Book[Portrait]) -> Relatives:
    """Return what is needed to tell the kin of any entry; what no longer holds has none."""
    in_force = [entry for entry in book.entries if not entry.record.status.is_retired]
    standings = {entry.id: entry.standing for entry in in_force}
    reasons = {
        entry.id: finding.accepted
        for entry in in_force
        for finding in entry.findings
        if finding.rule == CONTRADICTION_RULE and finding.accepted
    }
    near_same = {(one, other): kin for one, other, kin in book.near_same}
    return Relatives(standings, families(standings.items()), near_same, reasons)


def contradicting_pairs(relatives: Relatives, summaries: Mapping[str, Summary]) -> tuple[ContradictionPair, ...]:
    """Return every two entries that contradict each other, those first of which one still wants a reason."""
    pairs = [
        ContradictionPair(
            summaries[one],
            summaries[other],
            _words(kin, f"in {one}", f"in {other}"),
            kin.telling.text(f"in {one}", f"in {other}") if kin.telling else "",
            is_open=not {one, other} <= relatives.reasons.keys(),
        )
        for (one, other), kin in relatives.near_same.items()
        if kin.relation is Relation.CONTRADICTS
    ]
    return tuple(sorted(pairs, key=lambda pair: not pair.is_open))


def view_kindred(entry_id: str, relatives: Relatives, summaries: Mapping[str, Summary]) -> Kindred:
    """Return what the book holds of the reaction of an entry."""
    kin = {other: relatives.kin(entry_id, other) for other in relatives.families.get(entry_id, ())}
    against = sorted(
        ((other, each) for other, each in kin.items() if each.relation is Relation.CONTRADICTS),
        key=lambda pair: (-pair[1].disagreements[0].weight, pair[0]),
    )
    return Kindred(
        contradictions=tuple(_contradiction(entry_id, other, each, relatives, summaries) for other, each in against),
        series=_all_series(entry_id, kin, summaries),
        relations={other: str(each.relation) for other, each in kin.items()},
    )


# --- contradictions -----------------------------------------------------------------------------------------


def _contradiction(
    here: str, other: str, kin: Kin, relatives: Relatives, summaries: Mapping[str, Summary]
) -> ContradictionView:
    differing = kin.differences
    named = {each.variable for each in differing}
    shown = [variable for variable in _ALWAYS_SHOWN if variable not in named]
    telling = kin.telling
    return ContradictionView(
        summary=summaries[other],
        words=_words(kin, "here", f"in {other}"),
        telling=telling.text() if telling else "",
        rows=(
            *(_number(each) for each in kin.disagreements),
            *(_condition(each) for each in differing),
            *(ComparedRow(str(v), kin.here.words[v], kin.there.words[v], "same", stands_out=False) for v in shown),
        ),
        same=joined(
            (
                f"{variable} {text}"
                for variable, text in kin.here.words.items()
                if variable not in {*named, *shown} and text not in _NOTHING_SAID
            ),
            "; ",
        ),
        reason_here=relatives.reasons.get(here, ""),
        reason_there=relatives.reasons.get(other, ""),
    )


def _words(kin: Kin, here: str, there: str) -> str:
    """Return the numbers that are furthest apart, each with its scale and runs; here, there: what to call the two."""
    return kin.disagreements[0].text(f"({_basis(kin.here)}) {here}", f"({_basis(kin.there)}) {there}")


def _basis(standing: Standing) -> str:
    return joined(standing.words[variable] for variable in _ALWAYS_SHOWN)


def _number(each: Disagreement) -> ComparedRow:
    return ComparedRow(each.here.label, each.here.text, each.there.text, "contradicts", stands_out=True)


def _condition(each: Difference) -> ComparedRow:
    mark = "near-same" if each.is_near else "differs"
    return ComparedRow(str(each.variable), each.here, each.there, mark, stands_out=each.may_explain)


# --- repeats and series -------------------------------------------------------------------------------------


def _all_series(here: str, kin: Mapping[str, Kin], summaries: Mapping[str, Summary]) -> tuple[Series, ...]:
    """Return the repeats, a series for each variable that is varied alone, and what varies in several at once."""
    groups: dict[str, dict[str, Kin]] = {_REPEATS: {}, **{str(variable): {} for variable in Variable}, _SEVERAL: {}}
    for other, each in kin.items():
        if each.relation is Relation.VARIANT:
            varied = each.varied
            groups[str(varied[0]) if len(varied) == 1 else _SEVERAL][other] = each
        elif each.relation is not Relation.CONTRADICTS:
            groups[_REPEATS][other] = each
    return tuple(_series(name, here, group, summaries) for name, group in groups.items() if group)


def _series(name: str, here: str, group: Mapping[str, Kin], summaries: Mapping[str, Summary]) -> Series:
    listed = newest_first(summaries[other] for other in group)[:MOST_IN_SERIES]
    varied = tuple(v for v in (*VARIED, *GO_ALONG) if any(v in each.varied for each in group.values()))
    said = _REPEAT_SAYS if name == _REPEATS else varied
    standing = next(iter(group.values())).here
    return Series(
        key=name.replace(" ", "-"),
        title={_REPEATS: "Repeated under near-same conditions", _SEVERAL: "Several things varied at once"}.get(
            name, f"{capital(name)} varied"
        ),
        heading={_REPEATS: "Run", _SEVERAL: "What differs"}.get(name, capital(name)),
        rows=(
            SeriesRow(summaries[here], _value(standing, said), "", _outcome(standing), is_here=True),
            *(_row(each, group[each.id], said if name != _SEVERAL else group[each.id].varied) for each in listed),
        ),
        further=len(group) - len(listed),
    )


def _row(summary: Summary, kin: Kin, said: Sequence[Variable]) -> SeriesRow:
    along = (v for v in GO_ALONG if v not in said and not is_near(v, kin.here, kin.there))
    detail = joined(f"{v} {text}" for v in along if (text := kin.there.words[v]) not in _NOTHING_SAID)
    return SeriesRow(summary, _value(kin.there, said), detail, _outcome(kin.there), is_here=False)


def _outcome(standing: Standing) -> str:
    """Return yield and ee of what was wanted, else how far it went, with scale and runs."""
    about = [f"{what} {key}" for what in ("yield", "ee") for key in standing.wanted]
    found = [seen.text for what in about for seen in standing.seen if seen.what == what and not seen.is_sum]
    numbers = found or [seen.text for seen in standing.seen if not seen.is_sum][:1] or ["no number"]
    return f"{joined(numbers)} ({_basis(standing)})"


def _value(standing: Standing, said: Sequence[Variable]) -> str:
    """Return one variable as it stands, several with their names; without any, only the drawing differs."""
    if not said:
        return "structures drawn otherwise"
    if len(said) == 1 or said == _REPEAT_SAYS:
        return joined(standing.words[variable] for variable in said)
    return joined((f"{variable} {standing.words[variable]}" for variable in said), "; ")
