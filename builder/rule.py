"""Rule: what any rule says about itself, and the faults it reports.

A rule is an index card: id, title, statement, reason, source and examples stand together, and its test, its page
and `handbook rule ID` are all made from them. Three kinds share the card: rules found while reading a file
(`card`), checks of a record (`rule` over a case) and gates of the mechanism engine (`rule` over a site).
"""

import inspect
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Generic, TypeVar

from builder.finding import Finding, Level, Place

__all__ = ["Fault", "Path", "Rule", "card", "rule"]

Subject_contra = TypeVar("Subject_contra", contravariant=True)
Answer_co = TypeVar("Answer_co", covariant=True)

Path = tuple[str | int, ...]
"""The way to a value inside a record: ("stages", 0, "temperature"); () is the record itself."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """What a check found, at a path inside the record; the caller knows the file and turns it into a Finding.

    at: path of the value. Where it is missing from the file, its nearest existing parent is shown.
    on_key: point at the key rather than at the value.
    fix: the exact text to stand at the place instead. is_sure: it can only be meant so, and `check --fix` puts it in
        without asking; a fix that is likely, such as the nearest known name, is only offered.
    level, source: where they differ from the rule's own.
    """

    at: Path
    message: str
    mend: str
    on_key: bool = False
    fix: str | None = None
    is_sure: bool = False
    data: Mapping[str, object] = field(default_factory=dict)
    level: Level | None = None
    source: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Rule(Generic[Subject_contra, Answer_co]):
    """One rule of the handbook.

    level: of the findings it makes; a gate reports at the level of the check that consults it.
    fires_on, silent_on: examples. For a record check each is a YAML snippet that replaces whole top-level
        keys of the specimen record; for a gate each is a SMILES.
    needs: ids of rules that must have stayed silent for this one to be asked.
    look: the function behind the rule; None where the reader itself finds the fault.
    """

    id: str
    title: str
    level: Level
    statement: str
    reason: str
    source: str
    fires_on: tuple[str, ...]
    silent_on: tuple[str, ...]
    needs: tuple[str, ...] = ()
    effect: str = ""
    look: Callable[[Subject_contra], Answer_co] | None = None

    def finding(self, fault: Fault, place: Place) -> Finding:
        """Return the finding for `fault` at `place`, with this rule's reason and source."""
        return Finding(
            rule=self.id,
            level=fault.level or self.level,
            message=fault.message,
            why=self.statement,
            mend=fault.mend,
            source=fault.source or self.source,
            place=place,
            fix=fault.fix,
            is_sure=fault.is_sure,
            data=fault.data,
        )


def card(
    *,
    id: str,  # noqa: A002 - the field is called id on the card and in every report
    title: str,
    level: Level,
    source: str,
    text: str,
    fires_on: tuple[str, ...],
    silent_on: tuple[str, ...] = (),
) -> Rule[object, object]:
    """Return a rule whose faults are found by the reader, which has no function of its own.

    text: the statement as first sentence, then the reason, as a docstring would hold them.
    """
    statement, reason = _statement_and_reason(text)
    return Rule(
        id=id,
        title=title,
        level=level,
        source=source,
        statement=statement,
        reason=reason,
        fires_on=fires_on,
        silent_on=silent_on,
    )


def rule(
    *,
    id: str,  # noqa: A002 - as in card
    title: str,
    source: str,
    fires_on: tuple[str, ...],
    silent_on: tuple[str, ...],
    level: Level = Level.ERROR,
    needs: tuple[str, ...] = (),
    effect: str = "",
) -> Callable[[Callable[[Subject_contra], Answer_co]], Rule[Subject_contra, Answer_co]]:
    """Turn a function into a rule; its docstring is the statement (first paragraph) and the reason (the rest).

    Nothing is registered: the list of rules is a tuple one can read.
    """

    def make(look: Callable[[Subject_contra], Answer_co]) -> Rule[Subject_contra, Answer_co]:
        statement, reason = _statement_and_reason(look.__doc__ or "")
        return Rule(
            id=id,
            title=title,
            level=level,
            source=source,
            statement=statement,
            reason=reason,
            fires_on=fires_on,
            silent_on=silent_on,
            needs=needs,
            effect=effect,
            look=look,
        )

    return make


def _statement_and_reason(text: str) -> tuple[str, str]:
    statement, _, reason = inspect.cleandoc(text).partition("\n\n")
    if not statement:
        raise ValueError("a rule needs a docstring: its first paragraph is the statement")
    return " ".join(statement.split()), "\n\n".join(" ".join(p.split()) for p in reason.split("\n\n") if p)
