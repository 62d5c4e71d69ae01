"""Rules -> their pages: statement, reason, source, examples, and the entries each one touches."""

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from builder.book import Book
from builder.chemistry.scheme import DrawnCompound, draw_structure
from builder.chemistry.structure import parse_smiles
from builder.finding import Finding, Level
from builder.publish.page import Page
from builder.publish.templating import render
from builder.rule import Rule
from builder.sources import source_text

__all__ = ["RuleView", "TouchedEntry", "rule_pages", "view_rule"]

AnyRule = Rule[object, object]


@dataclass(frozen=True, slots=True)
class TouchedEntry:
    """An entry that a rule has a finding on; accepted holds the reviewer's reason, where there is one."""

    id: str
    title: str
    message: str
    accepted: str


@dataclass(frozen=True, slots=True)
class ExampleView:
    """An example as written in the rule; drawn where it is a structure, else drawing is empty."""

    text: str
    drawing: Markup


@dataclass(frozen=True, slots=True)
class RuleView:
    """Everything a rule's page shows; reason is in paragraphs."""

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


def view_rule(rule: AnyRule, book: Book) -> RuleView:
    """Return everything the page of `rule` shows."""
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
        touched=tuple(
            TouchedEntry(entry.id, entry.record.title, finding.message, finding.accepted or "")
            for entry in book.entries
            for finding in entry.findings
            if _speaks_of(finding, rule.id)
        ),
    )


def _speaks_of(finding: Finding, rule_id: str) -> bool:
    """Say whether a finding is one of the rule's, or was made because the gate of that name is shut."""
    gates = finding.data.get("gates", ())
    return finding.rule == rule_id or (isinstance(gates, list) and rule_id in gates)


def _examples(examples: tuple[str, ...], ident: str, *, is_gate: bool) -> tuple[ExampleView, ...]:
    """Return the examples: those of a gate are SMILES and are drawn, those of a check are YAML."""
    return tuple(
        ExampleView(example, _drawing(example, f"{ident}-{number}") if is_gate else Markup())
        for number, example in enumerate(examples, start=1)
    )


def _drawing(smiles: str, ident: str) -> Markup:
    return Markup(draw_structure(DrawnCompound(parse_smiles(smiles)), name=smiles, ident=ident))  # noqa: S704 - as in schemes


def rule_pages(book: Book, rules: Sequence[AnyRule]) -> tuple[Page, ...]:
    """Return the index of rules and a page for each."""
    notice = book.settings.standing_notice
    views = [view_rule(rule, book) for rule in sorted(rules, key=lambda rule: rule.id)]
    groups = [
        ("Gates of the engine", "What opens or closes a mechanism at a site.", [v for v in views if v.is_gate]),
        *(
            (_LEVEL_TITLES[level], _LEVEL_WORDS[level], [v for v in views if not v.is_gate and v.level == level])
            for level in Level
        ),
    ]
    index = Page(
        path="rules/",
        title="Rules",
        description=f"The {len(views)} rules by which records are checked, each with its reason and source.",
        body=render("rules.html", groups=[group for group in groups if group[2]], notice=notice, root="../"),
        menu=("Rules",),
    )
    known = {view.id for view in views}
    return (index, *(_rule_page(view, known, notice) for view in views))


def _rule_page(view: RuleView, known: set[str], notice: str) -> Page:
    return Page(
        path=f"rules/{view.id}/",
        title=view.title,
        description=view.statement,
        body=render("rule.html", rule=view, known=known, notice=notice, root="../../"),
    )
