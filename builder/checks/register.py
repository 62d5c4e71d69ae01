"""The register of rules: every rule the handbook knows, in order of id."""

from collections.abc import Iterable
from dataclasses import replace
from functools import cache
from typing import Any

from builder.checks.agreement import AGREEMENT_CHECKS
from builder.checks.balance import BALANCE_CHECKS
from builder.checks.case import Case
from builder.checks.charged import CHARGED_CHECKS
from builder.checks.completeness import COMPLETENESS_CHECKS
from builder.checks.conditions import CONDITION_CHECKS
from builder.checks.conserved import CONSERVED_CHECKS
from builder.checks.copies import COPY_CHECKS
from builder.checks.erosion import EROSION_CHECKS
from builder.checks.excess import EXCESS_CHECKS
from builder.checks.forecasts import FORECAST_CHECKS
from builder.checks.form import FORM_CHECKS
from builder.checks.group import GROUP_CHECKS
from builder.checks.hazards.rules import HAZARD_CHECKS
from builder.checks.hazards.screens import SCREEN_CHECKS
from builder.checks.house import HOUSE_CHECKS
from builder.checks.house_rules import HOUSE_RULE_CHECKS, house_rule_is_unclear
from builder.checks.identity import IDENTITY_CHECKS
from builder.checks.kinetics import KINETIC_CHECKS
from builder.checks.limits import LIMIT_CHECKS
from builder.checks.promised import PROMISED_CHECKS
from builder.checks.ratios import RATIO_CHECKS
from builder.checks.stages import STAGE_CHECKS
from builder.checks.structures import STRUCTURE_CHECKS
from builder.checks.vessel import VESSEL_CHECKS
from builder.checks.words import WORD_CHECKS
from builder.checks.yields import YIELD_CHECKS
from builder.finding import Level
from builder.mechanism.rules import GATES
from builder.records.rules import READING_RULES
from builder.rule import Fault, Rule, card

__all__ = ["ACCEPTANCE_RULES", "RECORD_CHECKS", "SETTINGS_CHECKS", "all_rules", "record_rules"]

RECORD_CHECKS: tuple[Rule[Case, Iterable[Fault]], ...] = tuple(
    sorted(
        (
            *AGREEMENT_CHECKS,
            *BALANCE_CHECKS,
            *HAZARD_CHECKS,
            *CHARGED_CHECKS,
            *COMPLETENESS_CHECKS,
            *CONDITION_CHECKS,
            *CONSERVED_CHECKS,
            *COPY_CHECKS,
            *EROSION_CHECKS,
            *EXCESS_CHECKS,
            *FORECAST_CHECKS,
            *FORM_CHECKS,
            *IDENTITY_CHECKS,
            *HOUSE_RULE_CHECKS,
            *KINETIC_CHECKS,
            *LIMIT_CHECKS,
            *PROMISED_CHECKS,
            *RATIO_CHECKS,
            *SCREEN_CHECKS,
            *STAGE_CHECKS,
            *STRUCTURE_CHECKS,
            *VESSEL_CHECKS,
            *WORD_CHECKS,
            *YIELD_CHECKS,
        ),
        key=lambda rule: rule.id,
    )
)

SETTINGS_CHECKS = (*HOUSE_CHECKS, house_rule_is_unclear)

_DISAGREEING = """\
substrate: {name: tert-butyl bromide, smiles: 'CC(C)(C)Br', class: tertiary, leaving_group: bromide, amount: 10 mmol}
stages: [{temperature: 60 °C, time: 16 h}]
outcome:
  result: [substitution]
  claim: {mechanism: SN2, course: not applicable}
  products: [{label: A, name: tert-butyl azide, smiles: 'CC(C)(C)N=[N+]=[N-]', use: desired, stereo: achiral}]
  measured: [{yield: 31 %, of: A, kind: assay, by: GC}]
"""

ACCEPTANCE_RULES = (
    card(
        id="acceptance-of-error",
        title="An error cannot be accepted",
        level=Level.ERROR,
        source="record-format",
        text="""`accepted` answers a query; it never lifts an error, and cautions and remarks need no answer.

        An error says that the record is unreadable, inconsistent, impossible or unsafe.""",
        fires_on=(
            "performed: {date: 2126-03-14, by: [bench-2]}\n# without reviewed\n"
            "accepted: [{finding: dates-out-of-order, because: 'we like it', by: bench-1}]",
        ),
        silent_on=(
            _DISAGREEING + "accepted: [{finding: mechanism-contrary, because: 'seen three times', by: bench-1}]",
        ),
    ),
    card(
        id="acceptance-stale",
        title="An acceptance that nothing needs",
        level=Level.QUERY,
        source="record-format",
        text="""An accepted query is still raised; an acceptance without its query is taken out.

        Otherwise it would silence the next disagreement, which nobody has looked at.""",
        fires_on=("accepted: [{finding: mechanism-contrary, because: 'seen three times', by: bench-1}]",),
        silent_on=(
            _DISAGREEING + "accepted: [{finding: mechanism-contrary, because: 'seen three times', by: bench-1}]",
        ),
    ),
    card(
        id="acceptance-unknown",
        title="An acceptance of a rule that does not exist",
        level=Level.ERROR,
        source="record-format",
        text="""`accepted` names a rule of the handbook by its id.

        `handbook rule` lists them.""",
        fires_on=("accepted: [{finding: mechanism-odd, because: 'seen three times', by: bench-1}]",),
        silent_on=(
            _DISAGREEING + "accepted: [{finding: mechanism-contrary, because: 'seen three times', by: bench-1}]",
        ),
    ),
)


@cache
def record_rules() -> tuple[Rule[object, object], ...]:
    """Return the cards of every rule that speaks about records and settings, in order of id."""
    checks: tuple[Rule[Any, object], ...] = (*RECORD_CHECKS, *GROUP_CHECKS, *SETTINGS_CHECKS)
    cards = [*READING_RULES, *ACCEPTANCE_RULES, *(_card_of(check) for check in checks)]
    return tuple(sorted(cards, key=lambda rule: rule.id))


@cache
def all_rules() -> dict[str, Rule[object, object]]:
    """Return the cards of all rules by id, gates of the engine included.

    Raises ValueError if two rules share an id.
    """
    cards = sorted((*record_rules(), *(_card_of(gate.rule) for gate in GATES)), key=lambda rule: rule.id)
    by_id = {card.id: card for card in cards}
    if len(by_id) != len(cards):
        raise ValueError("two rules share an id")
    return by_id


def _card_of(rule: Rule[Any, object]) -> Rule[object, object]:
    """Return what a rule says about itself, without its function."""
    return replace(rule, look=None)
