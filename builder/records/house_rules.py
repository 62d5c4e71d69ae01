"""A house rule: what one group has agreed on beyond the format, in words that its lead can write without reading code.

A line of text is shown only. A rule with one demand is checked, and always says why:

    - banned_solvents: [DMF, NMP]
      because: toxic for reproduction
      level: error
      since: 2026-04-01
"""

import re
from typing import Annotated, Literal, Self

from pydantic import AfterValidator, Discriminator, Field, Tag, WithJsonSchema, model_validator

from builder.finding import Level
from builder.records.fields import AmountOrMass, Count, Date, Flag, Line, OneOrMany, PersonCode, Shape, faulty
from builder.records.model import Part
from builder.records.vocabulary import Thermometer, YieldKind

__all__ = ["DEMANDS", "HouseRule", "HouseRuleLine", "is_like"]

Likeness = Annotated[
    str,
    Shape(
        r"^(?=.)[^*]*(\*[^*]*){0,3}$",
        "is no likeness",
        "write a number as # and any text as *, three times at most: 'BK#/#', '* of *'",
    ),
]
"""A text in which # stands for any whole number and * for any text."""


def _agreed(value: bool) -> bool:
    if not value:
        raise faulty("value-not-permitted", "false demands nothing", "write true, or take the rule out")
    return value


Agreed = Annotated[Flag, AfterValidator(_agreed), WithJsonSchema({"const": True})]

_IN_WORDS = {
    "banned_solvents": "no {either}",
    "at_most": "at most {either} of {of}",
    "yield_kinds": "a yield that is {either}",
    "required": "{both} stated",
    "measured": "temperature measured: {either}",
    "title_like": "a title like “{either}”",
    "title_at_most": "a title of at most {either} characters",
    "notebook_like": "a notebook page like “{either}”",
    "codes_like": "person codes like “{either}”",
    "codes_listed": "every person code stands under people",
    "reviewers": "reviewed by {either}",
    "reviewed_by_another": "reviewed by somebody who did not run it",
}
"""What a house rule can demand, one in a rule, and how that is said where it has no words of its own."""

DEMANDS = tuple(_IN_WORDS)


class HouseRule(Part):
    """One agreement of the group: in words (rule), as one demand that is checked, or both; always with its reason.

    banned_solvents: names as the solvent table knows them; charged or named in the work-up.
    at_most, of: amount or mass in one experiment, of the substrate or of substances of these kinds, charged or made.
    yield_kinds: an experiment that gave products has a yield of one of these kinds.
    required: keys beyond the format, with the way to them: evidence, stages.atmosphere.
    measured: every temperature was read there.
    title_like, notebook_like, codes_like: # stands for any number, * for any text.
    codes_listed: every person stands under people. reviewers: who may review. reviewed_by_another: nobody reviews a
    run of their own.
    level: query, which a record may accept with a reason, or error. since: experiments before that day are exempt.
    instead: what to do, where that is not plain.
    """

    rule: Line | None = None
    banned_solvents: OneOrMany[Line] | None = None
    at_most: AmountOrMass | None = None
    of: OneOrMany[Line] | None = None
    yield_kinds: OneOrMany[YieldKind] | None = None
    required: OneOrMany[Line] | None = None
    measured: OneOrMany[Thermometer] | None = None
    title_like: Likeness | None = None
    title_at_most: Count | None = None
    notebook_like: Likeness | None = None
    codes_like: Likeness | None = None
    codes_listed: Agreed | None = None
    reviewers: OneOrMany[PersonCode] | None = None
    reviewed_by_another: Agreed | None = None
    because: Annotated[Line, Field(max_length=300)]
    instead: Annotated[Line, Field(max_length=300)] | None = None
    level: Literal["error", "query"] = "query"
    since: Date | None = None

    @model_validator(mode="after")
    def _demands_one_thing(self) -> Self:
        given = self._demands()
        if len(given) > 1:
            message = f"one demand a rule; this one has {' and '.join(given)}"
            raise faulty("house-rule-not-one", message, "make a rule of each, with its own reason")
        if not given and self.rule is None:
            mend = f"add rule: with a sentence, or one of {', '.join(DEMANDS)}"
            raise faulty("house-rule-not-one", "this house rule demands nothing", mend)
        if self.of is not None and self.at_most is None:
            raise faulty("house-rule-not-one", "of goes with at_most", "add at_most: 10 mmol, or drop of", at=("of",))
        return self

    @property
    def demand(self) -> str:
        """Return which demand is checked; empty for a rule in words only."""
        return next(iter(self._demands()), "")

    def _demands(self) -> list[str]:
        return [demand for demand in DEMANDS if getattr(self, demand) is not None]

    @property
    def weight(self) -> Level:
        """Return the level of its findings."""
        return Level(self.level)

    @property
    def statement(self) -> str:
        """Return the rule in a few words: its own, or those that its demand comes to."""
        if self.rule is not None:
            return self.rule
        value = getattr(self, self.demand)
        of = _joined(self.of, "or") if self.of else "substrate"
        return _IN_WORDS[self.demand].format(either=_joined(value, "or"), both=_joined(value, "and"), of=of)


def is_like(text: str, likeness: str) -> bool:
    """Say whether a text is like 'BK#/#', where # stands for any whole number and * for any text."""
    parts = {"#": "[0-9]+", "*": ".*"}
    return re.fullmatch("".join(parts.get(sign) or re.escape(sign) for sign in likeness), text) is not None


def _joined(value: object, word: str) -> str:
    *others, last = map(str, value if isinstance(value, tuple) else (value,))
    return f"{', '.join(others)} {word} {last}" if others else last


def _line_or_rule(value: object) -> str:
    return "<more>" if isinstance(value, (dict, HouseRule)) else "<text>"


HouseRuleLine = Annotated[
    Annotated[Line, Tag("<text>")] | Annotated[HouseRule, Tag("<more>")],
    Discriminator(_line_or_rule),
]
"""A house rule as settings hold it: a line that is shown only, or a rule with its keys."""
