"""The rules about hazards: what stops a record, what it is warned of, and what its safety review must name."""

from collections.abc import Iterable, Iterator

from builder.checks.case import Case
from builder.checks.hazards.cautions import WHO_DECIDES, Severity
from builder.checks.hazards.meetings import Hazard, by_meeting
from builder.checks.hazards.presents import hazards_of, presents_of
from builder.checks.hazards.scope import excesses, is_covered, scope_lacks
from builder.finding import Level
from builder.rule import Fault, rule

__all__ = ["HAZARD_CHECKS"]


@rule(
    id="hazard-unreviewed",
    title="A grave hazard without a safety review",
    source="prudent-practices-2011",
    fires_on=(
        "# without safety_review\nsolvent: [{name: dichloromethane, volume: 20 mL}]",
        "# without safety_review\nwork_up: ['quench with 1 M HCl']",
        "# without safety_review\nwork_up: ['extract with 3 × 20 mL CH2Cl2']",
        "# without safety_review\n"
        "reagents: [{name: ammonium chloride, smiles: '[NH4+].[Cl-]', use: buffer, amount: 20 mmol}]",
    ),
    silent_on=(
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 10 mmol, extracted with dichloromethane'}\n"
        "work_up: ['extract with 3 × 20 mL CH2Cl2']",
        "# without safety_review\nwork_up: ['quench with water, no acid', 'extract with ethyl acetate']",
    ),
)
def hazard_is_unreviewed(case: Case) -> Iterator[Fault]:
    """What can kill or destroy a laboratory is recorded only with the safety review it had.

    It holds for what is charged, formed, obtained or sought, and for what the work-up names: azide with acid or with
    dichloromethane, cyanide with acid, sodium hydride in DMF or DMSO, and so on down the table of cautions. The check
    knows structures and names, not amounts or skill; it cannot say that anything is safe. An acid is what has a pKa of
    up to 9.5 for azide, cyanide and sulfide, ammonium salts included, and the words that name one.
    """
    if case.record.safety_review is None:
        for hazard in _uncovered(case):
            yield Fault(
                at=hazard.at.path,
                message=f"{hazard.message}; the record has no safety_review",
                mend=f"{hazard.caution.precaution}; otherwise add the safety_review it had; {WHO_DECIDES}",
                data=hazard.data,
                source=hazard.caution.source,
            )


@rule(
    id="hazard-out-of-scope",
    title="A grave hazard that the safety review does not name",
    source="prudent-practices-2011",
    fires_on=(
        "reagents: [{name: potassium cyanide, smiles: '[K+].[C-]#N', use: additive, amount: 1 mmol}]\n"
        "work_up: ['acidify with 2 mol/L HCl']",
        "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 12 mmol}]",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 10 mmol, no acid'}\n"
        "work_up: ['quench with 1 mol/L hydrochloric acid']",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: azide at 10 mmol}\n"
        "work_up: ['quench with 1 mol/L hydrochloric acid']",
    ),
    silent_on=(
        "safety_review: {by: safety-1, date: 2026-03-12, scope: azide at 10 mmol with hydrochloric acid}\n"
        "work_up: ['quench with 1 mol/L hydrochloric acid']",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 10 mmol, sodium hydride in DMF at 12 mmol'}\n"
        "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 12 mmol}]",
    ),
)
def hazard_is_out_of_scope(case: Case) -> Iterator[Fault]:
    """A safety review lifts the hazards that its scope names, and no others.

    A scope names a hazard by the kind of substance (azide, cyanide, hydride) or by the name in the record, and both
    partners of a pair. "Azide at 10 mmol" covers what an azide does by itself; it covers neither a cyanide nor azide
    with acid, and "no acid" or "basic quench" takes acid out. Who signs for one hazard has not looked at the other.
    """
    review = case.record.safety_review
    if review is None:
        return
    for hazard in _uncovered(case):
        lacks = scope_lacks(review.scope, hazard)
        yield Fault(
            at=hazard.at.path,
            message=f"{hazard.message}; the safety review {lacks}",
            mend=f"{hazard.caution.precaution}; otherwise have it reviewed and named in the scope of safety_review; "
            f"{WHO_DECIDES}",
            data={**hazard.data, "scope": review.scope},
            source=hazard.caution.source,
        )


def _uncovered(case: Case) -> Iterator[Hazard]:
    return (hazard for hazard in hazards_of(case) if not is_covered(case, hazard))


@rule(
    id="safety-scope-exceeded",
    title="More than the safety review allows",
    source="prudent-practices-2011",
    fires_on=(
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 5 mmol'}",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'sodium azide up to 0.5 g'}",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide in DMF (at most 5 mmol)'}",
    ),
    silent_on=(
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 10 mmol'}",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide, 20 mL of a solution'}",
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 20 mmol and nitrite at 1 mmol'}",
    ),
)
def safety_scope_is_exceeded(case: Case) -> Iterator[Fault]:
    """Nothing is charged in a larger amount than the scope of the safety review states.

    An amount speaks of what is named right behind it, else of the nearest thing named before it, by kind or by its name
    in the record, and once of each; what names several has the largest. Moles may be those of the substance or of the
    substrate, the scale of the run; a mass or volume is that of the substance as charged. Where a scope ties no amount
    to anything it names, the amount is the scale of the run. A larger run needs a review of its own: heat and gas grow
    with the mass, cooling with the surface.
    """
    for excess in excesses(case, presents_of(case)):
        yield Fault(
            at=excess.present.path,
            message=f"{excess.present.name}: {excess.held}, and the safety review covers {excess.allowed}",
            mend=f"correct the amount, or have {excess.held} reviewed; {WHO_DECIDES}",
            data={"held": excess.held, "allowed": excess.allowed},
        )


@rule(
    id="hazard-pair",
    title="Two substances that should not meet unseen",
    level=Level.CAUTION,
    source="bretherick-2017",
    fires_on=(
        "safety_review: {by: safety-1, date: 2026-03-12, scope: 'azide at 10 mmol, extracted with dichloromethane'}\n"
        "work_up: ['extract with 3 × 20 mL CH2Cl2']",
        "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 12 mmol}]\nwork_up: ['quench with methanol']",
        "reagents: [{name: methanesulfonyl chloride, smiles: 'CS(=O)(=O)Cl', use: activator, amount: 12 mmol}]",
    ),
    silent_on=("work_up: ['quench: 60 mL water, keep above pH 9', 'extract with 3 × 20 mL ethyl acetate']",),
)
def hazard_of_a_pair(case: Case) -> Iterator[Fault]:
    """Two substances of this experiment are hazardous together.

    Some pairs are hazardous wherever they meet, quench and cleaning included; others only in one solution. A pair
    graded `stop` stands here once a safety review names it, and as `hazard-unreviewed` or `hazard-out-of-scope` before.
    Of several milder hazards of the same substances in one place the gravest is shown and the others are listed in its
    data; the same mild hazard in several places is shown at the first. One graded `note` is a remark.
    """
    pairs = [hazard for hazard in hazards_of(case) if hazard.caution.second is not None]
    for hazard in pairs:
        if hazard.caution.severity is Severity.STOP and is_covered(case, hazard):
            yield _fault([hazard])
    milder = (hazard for hazard in pairs if hazard.caution.severity is not Severity.STOP)
    seen: set[str] = set()
    for hazards in by_meeting(milder):
        if hazards[0].caution.id not in seen:
            yield _fault(hazards)
        seen.add(hazards[0].caution.id)


_HARMLESS = """\
substrate: {name: cyclohexanol, smiles: 'OC1CCCCC1', class: secondary, leaving_group: hydroxyl, amount: 10 mmol}
nucleophile: none
reagents: [{name: phosphoric acid, smiles: 'OP(O)(O)=O', use: acid, amount: 2 mmol}]
solvent: [{name: toluene, volume: 20 mL}]
stages: [{temperature: 100 °C, time: 6 h}]
work_up: [wash with 10 mL water]
outcome:
  result: [elimination]
  products: [{label: A, name: cyclohexene, smiles: 'C1CCC=CC1'}]
  measured: [{yield: 81 %, of: A, kind: assay, by: GC}]
"""


@rule(
    id="hazard-species",
    title="A substance that is hazardous by itself",
    level=Level.CAUTION,
    source="prudent-practices-2011",
    fires_on=(
        "substrate: {name: iodomethane, smiles: CI, class: methyl, leaving_group: iodide, amount: 10 mmol}",
        "base: [{name: potassium cyanide, smiles: '[K+].[C-]#N', amount: 1 mmol}]",
    ),
    silent_on=(_HARMLESS,),
)
def hazard_of_a_species(case: Case) -> Iterator[Fault]:
    """A substance charged, formed, obtained or sought belongs to a class with a known hazard.

    Each substance has one such finding, the gravest; the others are listed in its data. Alkylating agents are named by
    class where they are charged or formed on the way, since every good leaving group on carbon makes one; as products
    only those that are a known danger. Organic azides are judged by the number of carbon and oxygen atoms for each
    nitrogen atom. What is only good to know is a remark. Corrosive, flammable and merely harmful substances are left to
    their data sheets.
    """
    of_one = (hazard for hazard in hazards_of(case) if hazard.caution.second is None)
    for hazards in by_meeting(of_one):
        if all(is_covered(case, hazard) for hazard in hazards):
            yield _fault(hazards)


def _fault(hazards: Iterable[Hazard]) -> Fault:
    """Return the fault for the first and gravest of several hazards in one place; the others are listed in its data."""
    gravest, *others = hazards
    caution = gravest.caution
    return Fault(
        at=gravest.at.path,
        message=gravest.message,
        mend=f"{caution.precaution}; {WHO_DECIDES}",
        data={**gravest.data, "others": [other.caution.id for other in others]},
        level=caution.severity.level,
        source=caution.source,
    )


HAZARD_CHECKS = (
    hazard_is_out_of_scope,
    hazard_is_unreviewed,
    hazard_of_a_pair,
    hazard_of_a_species,
    safety_scope_is_exceeded,
)
