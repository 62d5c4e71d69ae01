"""Hazards that keep an entry back until a safety review names them: what is done, and which caution must block it.

Played on the specimen record, sodium azide in DMF. The pairs are those of the issue and of the handbooks that the
cautions name as their sources.
"""

from dataclasses import dataclass

from builder.finding import Level
from builder.records.specimen import with_example
from tests.specimens import findings_of

NO_REVIEW = "# without safety_review\n"
_RULES = {"hazard-unreviewed", "hazard-out-of-scope"}


@dataclass(frozen=True, slots=True)
class Blocking:
    """What is done to the specimen, as an example of a rule; the caution that blocks it; a scope that lifts it."""

    done: str
    example: str
    caution: str
    scope: str


BLOCKING = (
    Blocking(
        "azide in dichloromethane",
        "solvent: [{name: dichloromethane, volume: 20 mL}]",
        "azide-dichloromethane",
        "azide at 10 mmol in dichloromethane",
    ),
    Blocking(
        "hydride in DMF",
        "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 10 mmol}]",
        "hydride-amide-solvent",
        "azide and hydride at 10 mmol in DMF",
    ),
    Blocking(
        "nitrite in DMF",
        "reagents: [{name: sodium nitrite, smiles: '[Na+].[O-]N=O', use: additive, amount: 1 mmol}]",
        "nitrite-amide-solvent",
        "azide at 10 mmol, nitrite with DMF",
    ),
    Blocking(
        "cyanide, then acid",
        "reagents: [{name: potassium cyanide, smiles: '[K+].[C-]#N', use: additive, amount: 1 mmol}]\n"
        "work_up: ['acidify with 2 mol/L HCl']",
        "cyanide-acid",
        "azide at 10 mmol, cyanide at 1 mmol, acid last",
    ),
    Blocking(
        "azide quenched with acid",
        "work_up: ['quench with 1 mol/L hydrochloric acid']",
        "azide-acid",
        "azide at 10 mmol with acid",
    ),
    Blocking(
        "azide destroyed with nitrite, in DMF",
        "work_up: ['azide destroyed with sodium nitrite, acid last']",
        "nitrite-amide-solvent",
        "azide at 10 mmol, nitrite in DMF, acid last",
    ),
    Blocking(
        "azide extracted with dichloromethane",
        "work_up: ['extract with 3 × 20 mL dichloromethane']",
        "azide-dichloromethane",
        "azide at 10 mmol, dichloromethane",
    ),
    Blocking(
        "azide on a copper spatula",
        "work_up: ['transferred with a copper spatula']",
        "azide-heavy-metal",
        "azide at 10 mmol, copper",
    ),
)


def blocked(example: str) -> set[str]:
    """Return the cautions that keep the specimen with an example back."""
    found = findings_of(with_example(example))
    return {str(each.data["caution"]) for each in found if each.rule in _RULES and each.level is Level.ERROR}


def signed(text: str) -> str:
    """Return a safety review with this scope, as part of an example."""
    return f"safety_review: {{by: safety-1, date: 2026-03-12, scope: '{text}'}}\n"


def blocking_table() -> str:
    """Return, as a table, what blocks while unsigned, signed for something else, and signed for by its scope."""
    lines = [f"{'what is done':<40}{'unsigned':<12}{'other scope':<14}signed"]
    for each in BLOCKING:
        looks = (NO_REVIEW, signed("lasers in hood 3"), signed(each.scope))
        blocks = ["blocked" if each.caution in blocked(look + each.example) else "free" for look in looks]
        lines.append(f"{each.done:<40}{blocks[0]:<12}{blocks[1]:<14}{blocks[2]}")
    return "\n".join(lines) + "\n"
