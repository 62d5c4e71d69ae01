"""Every check over every record -> findings in order; applies `accepted` and reports stale acceptances."""

from collections.abc import Collection, Iterable, Sequence
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

from builder.checks.case import Case
from builder.checks.group import GROUP_CHECKS, Gathering
from builder.checks.house import House
from builder.checks.register import ACCEPTANCE_RULES, RECORD_CHECKS, SETTINGS_CHECKS, record_rules
from builder.finding import Finding, Level
from builder.records.model import Acceptance
from builder.records.yaml_text import Places
from builder.rule import Fault, Rule

__all__ = ["Checked", "check_group", "check_record", "check_settings", "settle"]

_ACCEPTANCE = {rule.id: rule for rule in ACCEPTANCE_RULES}


@dataclass(frozen=True, slots=True)
class Checked:
    """What the checks of one record found, and the ids of those that could not be asked."""

    findings: tuple[Finding, ...]
    unasked: frozenset[str]


def check_record(case: Case, places: Places) -> Checked:
    """Ask every check over one record; acceptances are applied in `settle`.

    A check is asked only where every rule it needs was asked and stayed silent.
    """
    findings: list[Finding] = []
    fired: set[str] = set()
    unasked: set[str] = set()
    for check in _in_order_of_need():
        if check.look is None or not (fired | unasked).isdisjoint(check.needs):
            unasked.add(check.id)
            continue
        found = [_finding(check, fault, places) for fault in check.look(case)]
        findings += found
        if found:
            fired.add(check.id)
    return Checked(tuple(findings), frozenset(unasked))


@cache
def _in_order_of_need() -> tuple[Rule[Case, Iterable[Fault]], ...]:
    """Return the checks so that each comes after those it needs.

    Raises ValueError if some need each other in a circle: our fault.
    """
    ordered: list[Rule[Case, Iterable[Fault]]] = []
    pending = list(RECORD_CHECKS)
    while pending:
        waiting = {check.id for check in pending}
        ready = [check for check in pending if waiting.isdisjoint(check.needs)]
        if not ready:
            raise ValueError(f"rules need each other in a circle: {', '.join(sorted(waiting))}")
        ordered += ready
        pending = [check for check in pending if check not in ready]
    return tuple(ordered)


def check_settings(house: House, places: Places) -> list[Finding]:
    """Return the findings of the checks over the settings of a book."""
    return [
        _finding(check, fault, places)
        for check in SETTINGS_CHECKS
        if check.look is not None
        for fault in check.look(house)
    ]


def check_group(book: Gathering) -> dict[str, list[Finding]]:
    """Return the findings of the checks over the whole book, by file."""
    found: dict[str, list[Finding]] = {member.file: [] for member in book.members}
    for check in GROUP_CHECKS:
        if check.look is None:
            continue
        for member, fault in check.look(book):
            found[member.file].append(_finding(check, fault, member.places))
    return found


def settle(
    accepted: Sequence[Acceptance],
    places: Places,
    findings: Sequence[Finding],
    unasked: frozenset[str] = frozenset(),
) -> tuple[Finding, ...]:
    """Apply what a record accepts to its findings and report those that are stale, unknown or out of place.

    unasked: rules that could not be asked; an acceptance of one of them may still be needed.
    """
    reasons: dict[str, str] = {}
    settled: list[Finding] = []
    for index, acceptance in enumerate(accepted):
        fault = _acceptance_fault(acceptance, findings, unasked)
        if fault is None:
            reasons.setdefault(acceptance.finding, acceptance.because)
        else:
            rule_id, message, mend = fault
            at = ("accepted", index, "finding")
            settled.append(_finding(_ACCEPTANCE[rule_id], Fault(at=at, message=message, mend=mend), places))
    settled += [
        replace(finding, accepted=reasons[finding.rule])
        if finding.rule in reasons and finding.level is Level.QUERY
        else finding
        for finding in findings
    ]
    return tuple(sorted(settled, key=lambda finding: finding.sort_key))


def _acceptance_fault(
    acceptance: Acceptance, findings: Sequence[Finding], unasked: Collection[str]
) -> tuple[str, str, str] | None:
    """Return rule, message and mend for an acceptance that does not stand; None for one that does."""
    wanted = acceptance.finding
    if wanted not in {rule.id for rule in record_rules()}:
        return "acceptance-unknown", f'no rule is called "{wanted}"', "`handbook rule` lists the ids"
    levels = {finding.level for finding in findings if finding.rule == wanted}
    if Level.QUERY in levels or wanted in unasked:
        return None
    if Level.ERROR in levels:
        return "acceptance-of-error", f"{wanted} is an error here", "mend what it says, and drop the acceptance"
    if levels:
        return "acceptance-stale", f"{wanted} is a {min(levels)}, which needs no answer", "drop the acceptance"
    return "acceptance-stale", f"{wanted} is not raised any more", "drop the acceptance"


def _finding(check: Rule[Any, Any], fault: Fault, places: Places) -> Finding:
    return check.finding(fault, places.of(fault.at, on_key=fault.on_key))
