"""What the columns of a sheet mean: a heading -> a column of the flat record, with its unit and its words.

A heading that is a column name already needs no map, and a unit in its brackets is understood: "Yield (%)". What is
left is written down once, in a small YAML file, and read by the rules of every other file here.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from difflib import get_close_matches
from typing import Annotated, Literal

from pydantic import AfterValidator, BeforeValidator, Discriminator, Field, Tag

from builder.records.fields import Count, Flag, Line, OneOrMany, faulty
from builder.records.flat import canonical_name, column_names, shape_at
from builder.records.model import Part
from builder.records.quantities import is_unit

__all__ = [
    "DEFAULTS",
    "IGNORED",
    "IN_BRACES",
    "ColumnMap",
    "Target",
    "iso_date",
    "likely_column",
    "split_unit",
    "target_of",
    "tidy",
]

IGNORED = "ignore"
DEFAULTS = {"format": "1", "revision": "1", "status": "draft"}
"""What a row need not say."""

IN_BRACES = re.compile(r"\{([^{}]*)\}")
"""What a constant has filled in from the row: the name of a column."""
_LONGEST_HEADING = 100
"""Beyond it nothing is guessed."""
_UNIT_IN_HEADING = re.compile(
    r"(?P<bare>.*?\S)\s*(?:\((?P<round>[^()]+)\)|\[(?P<square>[^\[\]]+)\]|/\s*(?P<slash>\S.*))"
)


def _column_or_ignored(value: object) -> object:
    return value if value == IGNORED else _column_name(value)


def _column_name(value: object) -> object:
    if isinstance(value, str):
        _refuse_unknown(value, f", or {IGNORED}")
    return value


def _names_in_braces(value: str) -> str:
    for name in IN_BRACES.findall(value):
        _refuse_unknown(name, " between the braces")
    return value


def _refuse_unknown(name: str, or_else: str) -> None:
    if shape_at(name) is not None:
        return
    near = likely_column(name)
    hint = f'; did you mean "{near}"?' if near else ""
    mend = f"write {near or 'one that `handbook export` writes'}{or_else}"
    raise faulty("value-not-permitted", f'no record has a column "{name:.80}"{hint}', mend, near)


def _as_typed(value: object) -> object:
    if isinstance(value, bool):
        return str(value).lower()
    return str(value) if isinstance(value, (int, Decimal)) else value


DateOrder = Literal["D.M.Y", "D/M/Y", "M/D/Y", "D-M-Y", "Y/M/D"]
Name = Annotated[Line, BeforeValidator(_column_name)]
Goal = Annotated[Line, BeforeValidator(_column_or_ignored)]
Typed = Annotated[Line, BeforeValidator(_as_typed)]
Constant = Annotated[Typed, AfterValidator(_names_in_braces)]


class Column(Part):
    """Where one column of the sheet goes: the unit of its bare numbers, and words that stand for values.

    date: the order in which its dates are typed, where it is not 2026-03-14.
    """

    to: Goal
    unit: Line | None = None
    date: DateOrder | None = None
    words: dict[str, Typed] = Field(default_factory=dict)


def _name_or_more(value: object) -> str:
    return "<text>" if isinstance(value, str) else "<more>"


class ColumnMap(Part):
    """The map of one kind of sheet.

    sheet, heading_row: where the headings stand. key: the headings that together tell rows apart.
    columns: by heading. constants: what holds for every row, by column name; {substrate.name} is filled in.
    words, empty: whole cells that stand for a value, or for nothing, in any column.
    decimal_comma: 2,083 is read as 2.083.
    """

    sheet: Line | None = None
    heading_row: Count | None = None
    key: OneOrMany[Line] | None = None
    columns: dict[
        str,
        Annotated[Annotated[Goal, Tag("<text>")] | Annotated[Column, Tag("<more>")], Discriminator(_name_or_more)],
    ] = Field(default_factory=dict)
    constants: dict[Name, Constant] = Field(default_factory=dict)
    words: dict[str, Typed] = Field(default_factory=dict)
    empty: OneOrMany[Line] | None = None
    decimal_comma: Flag = False


@dataclass(frozen=True, slots=True)
class Target:
    """Where the cells of one column go.

    name: of the flat column, with all its numbers. unit: of bare numbers. date: the order of dates. words: by cell.
    """

    name: str
    unit: str | None = None
    date: str | None = None
    words: Mapping[str, str] = field(default_factory=dict)


def tidy(heading: str) -> str:
    """Return a heading on one line."""
    return " ".join(heading.split())


def target_of(heading: str, column_map: ColumnMap) -> Target | str | None:
    """Return where a heading leads; IGNORED where the map says so, None where nothing is known of it."""
    bare, unit = split_unit(heading)
    mapped = next((goal for named, goal in column_map.columns.items() if tidy(named) == heading), None)
    if isinstance(mapped, Column):
        if mapped.to == IGNORED:
            return IGNORED
        return Target(canonical_name(mapped.to), mapped.unit or unit, mapped.date, {**column_map.words, **mapped.words})
    name = mapped or next((each for each in (heading, bare) if shape_at(each) is not None), None)
    if name is None or name == IGNORED:
        return name
    return Target(canonical_name(name), unit, words=column_map.words)


def iso_date(text: str, order: str) -> str:
    """Return a date typed in an order such as D.M.Y as 2026-03-14; text that is none stays as it is.

    >>> iso_date("3/14/2026", "M/D/Y"), iso_date("14.3.26", "D.M.Y")
    ('2026-03-14', '14.3.26')
    """
    sign = order[1]
    typed = dict(zip(order.split(sign), (part.strip() for part in text.split(sign)), strict=False))
    if text.count(sign) != 2 or not all(map(str.isdecimal, typed.values())) or len(typed["Y"]) != 4:
        return text
    return f"{typed['Y']}-{typed['M']:0>2}-{typed['D']:0>2}"


def split_unit(heading: str) -> tuple[str, str | None]:
    """Return a heading and the unit that stands behind it, in brackets or after a slash; None where there is none.

    >>> split_unit("Temp (°C)"), split_unit("m / g"), split_unit("Exp. no. (old)")
    (('Temp', '°C'), ('m', 'g'), ('Exp. no. (old)', None))
    """
    found = _UNIT_IN_HEADING.fullmatch(heading) if len(heading) <= _LONGEST_HEADING else None
    unit = found and (found["round"] or found["square"] or found["slash"]).strip()
    return (found["bare"], unit) if found and unit and is_unit(unit) else (heading, None)


# --- guesses --------------------------------------------------------------------------------------------------

_USUAL_HEADINGS = {
    # as people head their columns, folded -> the column of a record; common practice, no source
    "entry": "entry",
    "id": "entry",
    "title": "title",
    "date": "performed.date",
    "performed": "performed.date",
    "run on": "performed.date",
    "chemist": "performed.by",
    "operator": "performed.by",
    "by": "performed.by",
    "who": "performed.by",
    "runs": "performed.runs",
    "status": "status",
    "notebook": "notebook",
    "notebook page": "notebook",
    "page": "notebook",
    "exp": "notebook",
    "exp no": "notebook",
    "experiment": "notebook",
    "experiment no": "notebook",
    "reaction no": "notebook",
    "substrate": "substrate.name",
    "starting material": "substrate.name",
    "sm": "substrate.name",
    "substrate name": "substrate.name",
    "substrate smiles": "substrate.smiles",
    "sm smiles": "substrate.smiles",
    "smiles": "substrate.smiles",
    "substrate mass": "substrate.mass",
    "mass": "substrate.mass",
    "scale": "substrate.amount",
    "amount": "substrate.amount",
    "substrate amount": "substrate.amount",
    "substrate class": "substrate.class",
    "class": "substrate.class",
    "leaving group": "substrate.leaving_group",
    "lg": "substrate.leaving_group",
    "nucleophile": "nucleophile.1.name",
    "nu": "nucleophile.1.name",
    "reagent": "nucleophile.1.name",
    "nucleophile smiles": "nucleophile.1.smiles",
    "reagent smiles": "nucleophile.1.smiles",
    "equiv": "nucleophile.1.equivalents",
    "eq": "nucleophile.1.equivalents",
    "equivalents": "nucleophile.1.equivalents",
    "nucleophile equiv": "nucleophile.1.equivalents",
    "base": "base.1.name",
    "base smiles": "base.1.smiles",
    "base equiv": "base.1.equivalents",
    "additive": "reagents.1.name",
    "additive smiles": "reagents.1.smiles",
    "additive equiv": "reagents.1.equivalents",
    "solvent": "solvent.1.name",
    "solvent volume": "solvent.1.volume",
    "volume": "solvent.1.volume",
    "co solvent": "solvent.2.name",
    "cosolvent": "solvent.2.name",
    "concentration": "concentration",
    "conc": "concentration",
    "temp": "stages.1.temperature",
    "t": "stages.1.temperature",
    "temperature": "stages.1.temperature",
    "time": "stages.1.time",
    "reaction time": "stages.1.time",
    "vessel": "stages.1.vessel",
    "atmosphere": "stages.1.atmosphere",
    "gas": "stages.1.atmosphere",
    "end point": "stages.1.end_point",
    "work up": "work_up",
    "workup": "work_up",
    "result": "outcome.result",
    "mechanism": "outcome.claim.mechanism",
    "product": "outcome.products.1.name",
    "product name": "outcome.products.1.name",
    "product smiles": "outcome.products.1.smiles",
    "yield": "outcome.measured.1.yield",
    "isolated yield": "outcome.measured.1.yield",
    "product mass": "outcome.measured.1.mass",
    "conversion": "outcome.measured.2.conversion",
    "conv": "outcome.measured.2.conversion",
    "ee": "outcome.measured.3.ee",
    "er": "outcome.measured.3.er",
    "dr": "outcome.measured.3.dr",
    "ratio": "outcome.measured.4.ratio",
    "analysis": "evidence",
    "analytics": "evidence",
    "procedure": "procedure",
    "remark": "take_away",
    "conclusion": "take_away",
    "safety": "safety_review.scope",
}


def likely_column(heading: str) -> str | None:
    """Return the column that a heading most likely means, whatever its capitals, points and unit; None for no idea."""
    if len(heading) > _LONGEST_HEADING:
        return None
    bare, _ = split_unit(heading)
    folded = re.sub(r"[\W_]+", " ", bare).strip().casefold()
    if folded in _USUAL_HEADINGS:
        return _USUAL_HEADINGS[folded]
    names = {re.sub(r"[\W_]+", " ", name).casefold(): name for name in column_names()}
    without_numbers = {re.sub(r" 1(?= |$)", "", name): column for name, column in names.items()}
    known = {**without_numbers, **names, **_USUAL_HEADINGS}
    near = get_close_matches(folded, known, n=1, cutoff=0.8)
    return known[near[0]] if near else None
