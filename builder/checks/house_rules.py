"""What a group has agreed on beyond the format: its house rules, asked of each record, each named with its reason.

Entries that no longer hold are exempt, and experiments from before the day a rule came in force. A finding is a query
or an error, as the rule says; a query can be accepted like any other.
"""

import re
from collections.abc import Collection, Iterator
from difflib import get_close_matches
from functools import cache

from builder.checks.case import Case
from builder.checks.group import person_codes
from builder.checks.hazards.kinds import load_substance_kinds
from builder.checks.hazards.meetings import Whereabouts
from builder.checks.hazards.presents import presents_of
from builder.checks.hazards.words import is_denied
from builder.checks.house import House
from builder.finding import Level
from builder.mechanism.amounts import charged_rows
from builder.mechanism.solvents import Solvent, find_solvent, load_solvents, nearest_solvents, solvent_of
from builder.records.house_rules import HouseRule, is_like
from builder.records.model import Part, Record
from builder.records.quantities import Dimension, Quantity
from builder.records.reader import key_paths
from builder.rule import Fault, Path, rule

__all__ = ["HOUSE_RULE_CHECKS", "house_rule_is_unclear"]

TOLERANCE = 0.02
"""By which an amount may be above its limit: that of amounts against each other."""

_DMF = "banned_solvents: [DMF, NMP], because: toxic for reproduction"
_LATER = "banned_solvents: [DMF], because: agreed, since: 2026-04-01"
_OTHER = "solvent: [{name: acetonitrile, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]"


def _under(keys: str, example: str = "") -> str:
    """Return an example of a record in a book with one house rule."""
    return f"# house: {{{keys}}}\n{example}".rstrip()


@rule(
    id="house-solvent-banned",
    title="A solvent that the house does not use",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(
        _under(_DMF, "solvent: [{name: dimethylformamide, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]"),
        _under(_DMF, _OTHER + "\nwork_up: [dissolved in DMF, poured on ice]"),
    ),
    silent_on=(
        _under(_DMF, _OTHER + "\nwork_up: [washed with brine without NMP]"),
        _under(_DMF, _OTHER + "\nwork_up: [extracted with ethyl acetate rather than any DMF]"),
        _under(_LATER, "solvent: [{name: DMF, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]"),
    ),
)
def solvent_is_banned(case: Case) -> Iterator[Fault]:
    """A solvent that the house has banned is not charged, under any of its names, nor used in the work-up.

    Names in the work-up count unless they are denied, as in "without DMF" or "avoid any DMF".
    """
    for each in _in_force(case, "banned_solvents"):
        banned = {known.name for name in each.banned_solvents or () if (known := find_solvent(name))}
        for path, name, solvent in _solvents(case):
            if solvent in banned:
                instead = f"the house says: {each.instead}" if each.instead else "use another solvent"
                yield _fault(each, path, f"{name} is used", instead)


@rule(
    id="house-scale-exceeded",
    title="A larger scale than the house allows",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(
        _under("at_most: 5 mmol, of: azide salt, because: agreed with the safety reviewer"),
        _under("at_most: 500 mg, because: this is the discovery book"),
    ),
    silent_on=(_under("at_most: 50 mmol, of: [azide salt, organic azide], because: agreed with the safety reviewer"),),
)
def scale_is_exceeded(case: Case) -> Iterator[Fault]:
    """What is run at once stays below the limit of the house: of the substrate, or of a kind of substance.

    Of such a kind counts what is charged, and what is made as if all of the substrate became it. An amount is above
    its limit by more than 2 %, the tolerance of amounts against each other.
    """
    for each in _in_force(case, "at_most"):
        assert each.at_most is not None  # noqa: S101 - that is the demand
        for path, name, found in _amounts(case, each.of, each.at_most):
            limit = each.at_most.magnitude
            if found > limit * (1 + TOLERANCE):
                yield _fault(
                    each,
                    path,
                    f"{_in_unit_of(each.at_most, found)} of {name}",
                    each.instead or f"next time run it at {each.at_most} or below; accept this with what was agreed",
                )


@rule(
    id="house-yield-missing",
    title="No yield of the kind that the house asks for",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(_under("yield_kinds: area, because: this book screens"),),
    silent_on=(_under("yield_kinds: [isolated, assay], because: area is no yield"),),
)
def yield_is_missing(case: Case) -> Iterator[Fault]:
    """An experiment that gave products has a yield of a kind that the house asks for.

    A run without products, or with nothing but decomposition, has none to give.
    """
    outcome = case.record.outcome
    if not any(result.gives_products for result in outcome.result):
        return
    has = {line.kind for line in outcome.measured if line.what == "yield"}
    for each in _in_force(case, "yield_kinds"):
        if has.isdisjoint(each.yield_kinds or ()):
            wanted = " or ".join(each.yield_kinds or ())
            yield _fault(
                each, ("outcome", "measured"), f"no yield is {wanted}", each.instead or f"measure one that is {wanted}"
            )


@rule(
    id="house-key-missing",
    title="A key that the house requires is missing",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(
        _under("required: stages.end_point, because: the next run needs it", "stages: {temperature: 60 °C, time: 1 h}"),
        _under("required: [evidence, procedure], because: a reviewer wants to see it"),
    ),
    silent_on=(_under("required: [notebook, solvent.volume, performed.runs], because: agreed"),),
)
def key_is_missing(case: Case) -> Iterator[Fault]:
    """The keys stand in the record that the house requires beyond the format.

    Where a list stands on the way, such as stages.atmosphere, each of its items has the key.
    """
    for each in _in_force(case, "required"):
        for keys in each.required or ():
            if keys not in key_paths(Record):
                continue  # house-rule-unclear tells
            for path in _lacking(case.record, keys.split("."), ()):
                yield _fault(each, path, f"{keys} is not stated", f"add {path[-1]}: …")


@rule(
    id="house-thermometer",
    title="A temperature read elsewhere than the house wants",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(
        _under(
            "measured: internal, because: the bath says little",
            "stages: [{temperature: 60 °C, time: 16 h, measured: bath}]",
        ),
        _under("measured: internal, because: the bath says little", "stages: [{temperature: 60 °C, time: 16 h}]"),
    ),
    silent_on=(
        _under(
            "measured: [internal, jacket], because: the bath says little",
            "stages: [{temperature: 60 °C, time: 16 h, measured: jacket}]",
        ),
    ),
)
def thermometer_is_another(case: Case) -> Iterator[Fault]:
    """Every stage says where its temperature was read, and it was read where the house wants it.

    A bath can be ten kelvin from what it heats.
    """
    for each in _in_force(case, "measured"):
        for index, stage in enumerate(case.record.stages):
            if stage.measured not in (each.measured or ()):
                where = f"read in the {stage.measured}" if stage.measured else "nobody says where it was read"
                mend = each.instead or "say where it was read: measured"
                yield _fault(each, ("stages", index, "measured"), f"{stage.temperature}: {where}", mend)


@rule(
    id="house-naming",
    title="A title or notebook page in another form than the house's",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(
        _under("notebook_like: 'BK#/#', because: so the archive finds it", "notebook: book 2"),
        _under("title_at_most: 20, because: lists are narrow"),
        _under("title_like: '* with *', because: lists are sorted by it", "title: Azide displacement"),
    ),
    silent_on=(_under("notebook_like: 'BK#/#', because: so the archive finds it"),),
)
def name_is_of_another_form(case: Case) -> Iterator[Fault]:
    """Titles and notebook pages have the form and length that the house has agreed on.

    In a form # stands for any whole number and * for any text. A record without a notebook page breaks no form.
    """
    record = case.record
    for each in _in_force(case, "title_like"):
        if each.title_like and not is_like(record.title, each.title_like):
            yield _fault(each, ("title",), f"“{record.title}” is another form", f"write it like “{each.title_like}”")
    for each in _in_force(case, "title_at_most"):
        if len(record.title) > (each.title_at_most or 0):
            mend = f"shorten it to {each.title_at_most} characters"
            yield _fault(each, ("title",), f"the title has {len(record.title)} characters", mend)
    for each in _in_force(case, "notebook_like"):
        page = record.notebook
        if page and each.notebook_like and not is_like(page, each.notebook_like):
            yield _fault(each, ("notebook",), f"“{page}” is another form", f"write it like “{each.notebook_like}”")


@rule(
    id="house-person",
    title="A person who may not stand there",
    level=Level.QUERY,
    source="house-rules",
    fires_on=(
        _under("codes_like: 'bench-#', because: names stay out of the book", "performed: {date: 2026-03-14, by: Ann}"),
        _under(
            "reviewed_by_another: true, because: four eyes",
            "performed: {date: 2026-03-14, by: [bench-2]}\nreviewed: {by: bench-2, date: 2026-03-20}",
        ),
        _under("reviewers: [bench-7], because: agreed", "reviewed: {by: bench-1, date: 2026-03-20}"),
        "# people: bench-7\n"
        + _under("codes_listed: true, because: citations name people", "performed: {date: 2026-03-14, by: bench-9}"),
    ),
    silent_on=(
        _under(
            "reviewed_by_another: true, because: four eyes",
            "performed: {date: 2026-03-14, by: [bench-2]}\nreviewed: {by: bench-1, date: 2026-03-20}",
        ),
    ),
)
def person_may_not_stand_there(case: Case) -> Iterator[Fault]:
    """Codes of people have the form of the house and are listed, and a review is by somebody who may give it.

    A review by the one who ran the experiment is none.
    """
    record, review = case.record, case.record.reviewed
    listed = {person.code for person in case.settings.people}
    for path, code in person_codes(record):
        for each in _in_force(case, "codes_like"):
            if each.codes_like and not is_like(code, each.codes_like):
                yield _fault(each, path, f"{code} is another form", f"write it like “{each.codes_like}”")
        for each in _in_force(case, "codes_listed"):
            if code not in listed:
                yield _fault(each, path, f"{code} is not listed", "correct it, or add it to people: in handbook.yml")
    if review is None:
        return
    for each in _in_force(case, "reviewers"):
        if review.by not in (each.reviewers or ()):
            yield _fault(each, ("reviewed", "by"), f"{review.by} reviewed it", "ask one of them for a review")
    for each in _in_force(case, "reviewed_by_another"):
        if review.by in record.performed.by:
            yield _fault(each, ("reviewed", "by"), f"{review.by} ran it as well", "ask somebody else for a review")


HOUSE_RULE_CHECKS = (
    key_is_missing,
    name_is_of_another_form,
    person_may_not_stand_there,
    scale_is_exceeded,
    solvent_is_banned,
    thermometer_is_another,
    yield_is_missing,
)


@rule(
    id="house-rule-unclear",
    title="A house rule that speaks of what nobody knows",
    source="house-rules",
    fires_on=(
        "# handbook.yml\nhouse_rules: [{banned_solvents: [DMFF], because: toxic for reproduction}]",
        "# handbook.yml\nhouse_rules: [{at_most: 10 mmol, of: azide salts, because: agreed}]",
        "# handbook.yml\nhouse_rules: [{required: atmosphere, because: agreed}]",
        "# handbook.yml\npeople: [{code: a, shown_as: one}]\nhouse_rules: [{reviewers: b, because: agreed}]",
    ),
    silent_on=(
        "# handbook.yml\nhouse_rules: [{banned_solvents: [dimethylformamide], because: toxic for reproduction}]",
        "# handbook.yml\nhouse_rules: [{required: stages.atmosphere, because: agreed}]",
    ),
)
def house_rule_is_unclear(house: House) -> Iterator[Fault]:
    """What a house rule names is known: solvents and kinds of substance to the tables, keys to the format.

    A reviewer is known where the settings list people. A rule about a misspelt solvent would be kept by everybody, and
    nobody would notice.
    """
    people = {person.code for person in house.settings.people}
    for index, each in house.settings.checked_rules:
        at: Path = ("house_rules", index)
        for place, name in enumerate(each.banned_solvents or ()):
            if find_solvent(name) is None:
                mend = "use a name of the solvent table, or write the rule as a sentence"
                yield _unknown((*at, "banned_solvents", place), "solvent", name, nearest_solvents(name), mend)
        for place, name in enumerate(each.of or ()):
            if name not in _kinds():
                yield _unclear((*at, "of", place), "kind of substance", name, _kinds())
        for place, name in enumerate(each.required or ()):
            if name not in key_paths(Record):
                yield _unclear((*at, "required", place), "key", name, key_paths(Record))
        for place, name in enumerate(each.reviewers or ()):
            if people and name not in people:
                yield _unclear((*at, "reviewers", place), "person", name, people)


def _unclear(at: Path, what: str, name: str, known: Collection[str]) -> Fault:
    ends = sorted(each for each in known if each.endswith(f".{name}"))
    near = ends or get_close_matches(name, sorted(known), n=1, cutoff=0.6)
    return _unknown(at, what, name, near, "" if what == "key" else f"known are: {', '.join(sorted(known))}")


def _unknown(at: Path, what: str, name: str, near: Collection[str], mend: str) -> Fault:
    first = next(iter(near), None)
    hint = f'; did you mean "{first}"?' if first else ""
    mend = f"write {first}" if first else mend or "use a key of the format, with the way to it: stages.atmosphere"
    return Fault(at=at, message=f'unknown {what} "{name}"{hint}', mend=mend, fix=first, is_sure=False)


# --- what the rules look at ----------------------------------------------------------------------------------


def _in_force(case: Case, demand: str) -> Iterator[HouseRule]:
    """Yield the house rules with this demand that bind the record."""
    record = case.record
    for _, each in case.settings.checked_rules:
        binds = each.since is None or record.performed.date >= each.since
        if each.demand == demand and binds and not record.status.is_retired:
            yield each


def _fault(each: HouseRule, at: Path, found: str, mend: str) -> Fault:
    answer = "" if each.weight is Level.ERROR else ", or accept this with the reason"
    return Fault(
        at=at,
        message=f"{found}; house rule: {each.statement} – {each.because}",
        mend=mend + answer,
        level=each.weight,
        data={"house_rule": each.statement, "because": each.because},
    )


def _solvents(case: Case) -> Iterator[tuple[Path, str, str]]:
    """Yield every use of a known solvent: path, name as typed, name in the table."""
    for path, _, substance in charged_rows(case.record):
        known = solvent_of(substance.name, case.structures.get(path))
        if known is not None:
            yield (*path, "name"), substance.name, known.name
    for index, line in enumerate(case.record.work_up or ()):
        for match in _solvent_names().finditer(line):
            known = find_solvent(match["name"])
            if known is not None and not is_denied(line, match.start()):
                yield ("work_up", index), match["name"], known.name


_AMBIGUOUS = frozenset({"ether", "glycol"})
"""Names of one solvent that stand in the names of many other substances."""


@cache
def _solvent_names() -> re.Pattern[str]:
    """Return the pattern of every name of the solvent table as a word; abbreviations count as they are written."""

    def spelled(solvent: Solvent) -> Iterator[str]:
        for name in {*solvent.names} - _AMBIGUOUS:
            yield re.escape(name) if any(map(str.isupper, name)) else f"(?i:{re.escape(name)})"

    names = sorted({each for solvent in load_solvents() for each in spelled(solvent)}, key=len, reverse=True)
    return re.compile(rf"(?<![\w-])(?P<name>{'|'.join(names)})(?![\w-])")


@cache
def _kinds() -> frozenset[str]:
    return frozenset(load_substance_kinds())


def _amounts(case: Case, kinds: tuple[str, ...] | None, limit: Quantity) -> Iterator[tuple[Path, str, float]]:
    """Yield path, name and amount (mol, or g where `limit` is a mass) of what a limit speaks of, where it is known."""
    is_amount = limit.dimension is Dimension.AMOUNT
    substrate = case.amounts.substrate
    if kinds is None:
        found = substrate.amount_mol if is_amount else substrate.mass_g
        if found is not None:
            yield ("substrate", substrate.typed or "name"), substrate.name, found
        return
    charged = {row.path: row for row in case.amounts.rows}
    for present in presents_of(case):
        if present.whereabouts not in {Whereabouts.FLASK, Whereabouts.PRODUCT} or present.kinds.isdisjoint(kinds):
            continue
        row = charged.get(present.path)
        if row is not None:
            found = row.amount_mol if is_amount else row.mass_g
        elif substrate.amount_mol is None or present.structure is None:
            found = None
        else:
            found = substrate.amount_mol * (1.0 if is_amount else present.structure.mass)
        if found is not None:
            yield present.path, present.name, found


def _in_unit_of(limit: Quantity, found: float) -> str:
    """Return an amount, in the canonical unit, with three digits in the unit of a limit."""
    rounded = float(f"{found / limit.magnitude * float(limit.number):.3g}")
    return f"{rounded:,.10g} {limit.unit}"


def _lacking(value: object, keys: list[str], path: Path) -> Iterator[Path]:
    """Yield where the last of `keys` is missing; a word that stands for a substance has no keys."""
    if value is None or value == ():
        yield path
    elif isinstance(value, tuple):
        for index, item in enumerate(value):
            yield from _lacking(item, keys, (*path, index))
    elif keys and isinstance(value, Part):
        attribute = next(name for name, info in type(value).model_fields.items() if keys[0] in {info.alias, name})
        yield from _lacking(getattr(value, attribute), keys[1:], (*path, keys[0]))
