"""Every check over every record -> findings in order; applies `accepted` and reports stale acceptances."""

from collections.abc import Iterable
from dataclasses import replace
from typing import Any

from builder.checks.case import Case
from builder.checks.group import GROUP_CHECKS, Gathering
from builder.checks.register import ACCEPTANCE_RULES, RECORD_CHECKS, record_rules
from builder.finding import Finding, Level
from builder.records.yaml_text import Places
from builder.rule import Fault, Rule

__all__ = ["check_group", "check_record", "settle"]

_ACCEPTANCE = {rule.id: rule for rule in ACCEPTANCE_RULES}


def check_record(case: Case, places: Places) -> tuple[Finding, ...]:
    """Return the findings of every check over one record; acceptances are applied in `settle`."""
    findings: list[Finding] = []
    fired: set[str] = set()
    pending = list(RECORD_CHECKS)
    while pending:
        ready = [check for check in pending if not any(other.id in check.needs for other in pending)]
        if not ready:
            raise ValueError(f"rules need each other in a circle: {', '.join(check.id for check in pending)}")
        for check in ready:
            pending.remove(check)
            if fired.isdisjoint(check.needs) and check.look is not None:
                found = [_finding(check, fault, places) for fault in check.look(case)]
                findings += found
                if found:
                    fired.add(check.id)
            else:
                fired.add(check.id)  # what stands on an unasked rule is not asked either
    return tuple(findings)


def check_group(book: Gathering) -> dict[str, list[Finding]]:
    """Return the findings of the checks over the whole book, by file."""
    found: dict[str, list[Finding]] = {member.case.file: [] for member in book.members}
    for check in GROUP_CHECKS:
        if check.look is None:
            continue
        for member, fault in check.look(book):
            found[member.case.file].append(_finding(check, fault, member.places))
    return found


def settle(case: Case, places: Places, findings: Iterable[Finding]) -> tuple[Finding, ...]:
    """Apply the record's acceptances to its findings and report those that are stale, unknown or out of place."""
    settled = list(findings)
    known = {rule.id for rule in record_rules()}
    for index, acceptance in enumerate(case.record.accepted):
        at = ("accepted", index, "finding")
        touched = [finding for finding in settled if finding.rule == acceptance.finding]
        queries = [finding for finding in touched if finding.level is Level.QUERY]
        for finding in queries:
            settled[settled.index(finding)] = replace(finding, accepted=acceptance.because)
        if acceptance.finding not in known:
            message, mend = f'no rule is called "{acceptance.finding}"', "`handbook rule` lists the ids"
            settled.append(
                _finding(_ACCEPTANCE["acceptance-unknown"], Fault(at=at, message=message, mend=mend), places)
            )
        elif touched and not queries:
            message = f"{acceptance.finding} is no query here but {touched[0].level}"
            mend = "mend what it says, and drop the acceptance"
            settled.append(
                _finding(_ACCEPTANCE["acceptance-of-error"], Fault(at=at, message=message, mend=mend), places)
            )
        elif not touched:
            message, mend = f"{acceptance.finding} is not raised any more", "drop the acceptance"
            settled.append(_finding(_ACCEPTANCE["acceptance-stale"], Fault(at=at, message=message, mend=mend), places))
    return tuple(sorted(settled, key=lambda finding: finding.sort_key))


def _finding(check: Rule[Any, Any], fault: Fault, places: Places) -> Finding:
    return check.finding(fault, places.of(fault.at, on_key=fault.on_key))
