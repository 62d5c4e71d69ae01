"""Rules -> their pages: statement, reason, source, examples, and the entries each one touches."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import partial

from markupsafe import Markup

from builder.book import Book, Verdict
from builder.chemistry.scheme import DrawnCompound, draw_structure
from builder.chemistry.structure import parse_smiles
from builder.finding import Finding, Level
from builder.publish.figures import how_many
from builder.publish.page import Page
from builder.publish.portrait import Portrait
from builder.publish.templating import deferred
from builder.rule import Rule
from builder.sources import source_text

__all__ = ["RuleView", "TouchedEntry", "rule_pages"]

AnyRule = Rule[object, object]


@dataclass(frozen=True, slots=True)
class TouchedEntry:
    """An entry that a rule bears on; said is what it says of it, accepted the reviewer's reason, where there is one."""

    id: str
    title: str
    said: str
    accepted: str = ""


@dataclass(frozen=True, slots=True)
class ExampleView:
    """An example as written in the rule; drawn where it is a structure, else drawing is empty."""

    text: str
    drawing: Markup


@dataclass(frozen=True, slots=True)
class RuleView:
    """Everything a rule's page shows.

    reason: in paragraphs. touched: entries with a finding of the rule, or contrary to a gate. in_line: for a gate,
    those that it bears on and that agree with it.
    """

    id: str
    title: str
    level: str
    level_words: str
    statement: str
    reason: tuple[str, ...]
    source: str
    effect: str
    needs: tuple[str, ...]
    fires_on: tuple[ExampleView, ...]
    silent_on: tuple[ExampleView, ...]
    is_gate: bool
    touched: tuple[TouchedEntry, ...]
    in_line: tuple[TouchedEntry, ...]

    @property
    def reach(self) -> str:
        """Return in words how many entries it bears on, however often each; empty where there is none."""
        touched, in_line = ({each.id for each in listed} for listed in (self.touched, self.in_line))
        if self.is_gate and (touched or in_line):
            return f"{len(in_line)} in line, {len(touched)} contrary"
        return f"touches {how_many(len(touched), 'entry', 'entries')}" if touched else ""


_LEVEL_TITLES = {
    Level.ERROR: "Errors",
    Level.QUERY: "Queries",
    Level.CAUTION: "Cautions",
    Level.REMARK: "Remarks",
}
_LEVEL_WORDS = {
    Level.ERROR: "An error keeps the record out of the book until it is mended.",
    Level.QUERY: "A query wants a fix, or a reason that a reviewer accepts.",
    Level.CAUTION: "A caution names a hazard; it asks for care, not for a change of the record.",
    Level.REMARK: "A remark is a suggestion; nothing hangs on it.",
}


@dataclass(frozen=True, slots=True)
class _Reach:
    """What rules say of the entries of a book, by the id of the rule.

    touched: findings of a rule, or made because the gate of that name is shut.
    closed: what a gate closes in the forecast of an entry that is not contrary.
    """

    touched: Mapping[str, Sequence[TouchedEntry]]
    closed: Mapping[str, Sequence[TouchedEntry]]


def _reach_of_rules(book: Book[Portrait]) -> _Reach:
    """Return what every rule says of the entries, in the order of the entries."""
    touched: dict[str, list[TouchedEntry]] = {}
    closed: dict[str, list[TouchedEntry]] = {}
    for entry in book.entries:
        about = partial(TouchedEntry, entry.id, entry.record.title)
        for finding in entry.findings:
            for rule_id in {finding.rule, *_gates_of(finding)}:
                touched.setdefault(rule_id, []).append(about(finding.message, finding.accepted or ""))
        for gate in entry.kept.gates if entry.verdict is not Verdict.CONTRARY else ():
            closed.setdefault(gate.rule, []).append(about(gate.text))
    return _Reach(touched, closed)


def _gates_of(finding: Finding) -> list[str]:
    gates = finding.data.get("gates")
    return gates if isinstance(gates, list) else []


def _view_rule(rule: AnyRule, reach: _Reach) -> RuleView:
    """Return everything the page of `rule` shows."""
    touched = tuple(reach.touched.get(rule.id, ()))
    contrary = {each.id for each in touched}
    return RuleView(
        id=rule.id,
        title=rule.title,
        level=str(rule.level),
        level_words=_LEVEL_WORDS[rule.level],
        statement=rule.statement,
        reason=tuple(filter(None, rule.reason.split("\n\n"))),
        source=source_text(rule.source),
        effect=rule.effect,
        needs=rule.needs,
        fires_on=_examples(rule.fires_on, f"{rule.id}-fires", is_gate=bool(rule.effect)),
        silent_on=_examples(rule.silent_on, f"{rule.id}-silent", is_gate=bool(rule.effect)),
        is_gate=bool(rule.effect),
        touched=touched,
        in_line=tuple(each for each in reach.closed.get(rule.id, ()) if each.id not in contrary),
    )


def _examples(examples: tuple[str, ...], ident: str, *, is_gate: bool) -> tuple[ExampleView, ...]:
    """Return the examples: those of a gate are SMILES and are drawn, those of a check are YAML."""
    return tuple(
        ExampleView(example, _drawing(example, f"{ident}-{number}") if is_gate else Markup())
        for number, example in enumerate(examples, start=1)
    )


def _drawing(smiles: str, ident: str) -> Markup:
    return Markup(draw_structure(DrawnCompound(parse_smiles(smiles)), name=smiles, ident=ident))  # noqa: S704 - as in schemes


def rule_pages(book: Book[Portrait], rules: Sequence[AnyRule]) -> tuple[Page, ...]:
    """Return the index of rules and a page for each."""
    reach = _reach_of_rules(book)
    views = [_view_rule(rule, reach) for rule in sorted(rules, key=lambda rule: rule.id)]
    groups = [
        ("Gates of the engine", "What opens or closes a mechanism at a site.", [v for v in views if v.is_gate]),
        *(
            (_LEVEL_TITLES[level], _LEVEL_WORDS[level], [v for v in views if not v.is_gate and v.level == level])
            for level in Level
        ),
    ]
    index = Page(
        kind="rule",
        path="rules/",
        title="Rules",
        description=f"The {len(views)} rules by which records are checked, each with its reason and source.",
        write=deferred("rules.html", groups=[group for group in groups if group[2]], root="../"),
        menu="Rules",
    )
    known = {view.id for view in views}
    return (index, *(_rule_page(view, known) for view in views))


def _rule_page(view: RuleView, known: set[str]) -> Page:
    return Page(
        kind="rule",
        path=f"rules/{view.id}/",
        title=view.title,
        description=view.statement,
        write=deferred("rule.html", rule=view, known=known, root="../../"),
        section="rules/",
    )
