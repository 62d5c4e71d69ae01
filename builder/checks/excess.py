"""ee, er and product ratios."""

from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import Role, charged_rows
from builder.records.model import Measurement
from builder.records.specimen import TWO_PRODUCTS, outcome_example
from builder.records.vocabulary import StereoKind
from builder.rule import Fault, rule

__all__ = ["EXCESS_CHECKS"]


def _ee_of(line: Measurement) -> float | None:
    if line.ee is not None and not line.ee.is_limit:
        return line.ee.magnitude
    return line.er.excess_percent if line.er is not None else None


def _substrate_ee(case: Case) -> float | None:
    """Return the typed ee of the substrate, or that of its er; a limit is no number."""
    substrate = case.record.substrate
    if substrate.ee is not None:
        return None if substrate.ee.is_limit else abs(substrate.ee.magnitude)
    return substrate.er.excess_percent if substrate.er is not None else None


_CHIRAL = (
    "substrate: {name: (S)-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, ee: 97 %,"
    " class: secondary, leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
)


@rule(
    id="ee-above-substrate",
    title="The ee rose on the way",
    source="common-practice",
    fires_on=(_CHIRAL + outcome_example("{yield: 81 %, of: A, kind: assay}, {ee: 99.5 %, of: A, by: chiral HPLC}"),),
    silent_on=(_CHIRAL + outcome_example("{yield: 81 %, of: A, kind: assay}, {ee: 96 %, of: A, by: chiral HPLC}"),),
)
def ee_is_above_substrate(case: Case) -> Iterator[Fault]:
    """The product's ee does not exceed the substrate's by more than 1 point, unless the work-up enriches it.

    Displacement at one centre cannot make it purer; a crystallisation can, and then it stands in the work-up. With
    something chiral in the flask one enantiomer may react faster: then this is a query.
    """
    start = _substrate_ee(case)
    work_up = " ".join(case.record.work_up or ()).casefold()
    if start is None or any(word in work_up for word in ("recrystal", "crystalli", "chiral", "resolution")):
        return
    for index, line in enumerate(case.record.outcome.measured):
        ee = _ee_of(line)
        if ee is not None and line.of != ("substrate",) and abs(ee) > start + 1.0:
            yield Fault(
                at=("outcome", "measured", index, line.what),
                message=f"{abs(ee):g} % ee from a substrate of {start:g} % ee",
                mend="correct one of them, or name the crystallisation in work_up",
                level=Level.QUERY if _has_chiral_help(case) else None,
            )


@rule(
    id="ee-er-disagree",
    title="ee and er of one product disagree",
    source="common-practice",
    fires_on=(_CHIRAL + outcome_example("{yield: 81 %, of: A, kind: assay}, {ee: 80 %, of: A}, {er: '97:3', of: A}"),),
    silent_on=(_CHIRAL + outcome_example("{yield: 81 %, of: A, kind: assay}, {ee: 94 %, of: A}, {er: '97:3', of: A}"),),
)
def ee_and_er_disagree(case: Case) -> Iterator[Fault]:
    """The ee is the difference of the two parts of er over their sum.

    97:3 is 94 % ee; a disagreement of more than 1 point means one of them was misread.
    """
    measured = case.record.outcome.measured
    ees = {line.of: line.ee.magnitude for line in measured if line.ee is not None and not line.ee.is_limit}
    for index, line in enumerate(measured):
        if line.er is not None and line.of in ees:
            from_er = _ee_of(line)
            if from_er is not None and abs(from_er - abs(ees[line.of])) > 1.0:
                yield Fault(
                    at=("outcome", "measured", index, "er"),
                    message=f"{line.er} is {from_er:g} % ee, not {ees[line.of]:g} %",
                    mend="correct one of the two",
                )


@rule(
    id="ee-from-racemate",
    title="An ee out of a racemate",
    source="common-practice",
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: assay}, {ee: 40 %, of: A, by: chiral HPLC}"),),
    silent_on=(_CHIRAL + outcome_example("{yield: 81 %, of: A, kind: assay}, {ee: 40 %, of: A, by: chiral HPLC}"),),
)
def ee_comes_from_a_racemate(case: Case) -> Iterator[Fault]:
    """A racemic substrate gives a racemic product, unless something in the flask is chiral.

    Substitution carries stereochemistry over and makes none.
    """
    if case.record.substrate.stereo is not StereoKind.RACEMATE or _has_chiral_help(case):
        return
    for index, line in enumerate(case.record.outcome.measured):
        ee = _ee_of(line)
        if ee is not None and abs(ee) > 2.0:
            yield Fault(
                at=("outcome", "measured", index, line.what),
                message=f"{abs(ee):g} % ee from a racemic substrate",
                mend="correct the substrate's stereo, or name the chiral reagent",
            )


def _has_chiral_help(case: Case) -> bool:
    return any(
        not case.structures[path].is_achiral
        for path, role, _ in charged_rows(case.record)
        if role is not Role.SUBSTRATE and path in case.structures
    )


_ASSAY = "{yield: 81 %, of: A, kind: assay}"
_RATIO = "{ratio: 'A:B = 90:10', by: GC, calibrated: %s}"


@rule(
    id="ratio-not-calibrated",
    title="A ratio from uncalibrated areas",
    level=Level.QUERY,
    source="wernerova-hudlicky-2010",
    fires_on=(outcome_example(_RATIO % "false", _ASSAY, products=TWO_PRODUCTS),),
    silent_on=(
        outcome_example(_RATIO % "true", _ASSAY, products=TWO_PRODUCTS),
        outcome_example((_RATIO % "false").replace("GC", "1H NMR"), _ASSAY, products=TWO_PRODUCTS),
    ),
)
def ratio_is_not_calibrated(case: Case) -> Iterator[Fault]:
    """A product ratio from chromatographic areas is calibrated with response factors.

    Two isomers rarely answer a detector alike: an area ratio is not a ratio of amounts. NMR integrals count nuclei and
    need no factor.
    """
    for index, line in enumerate(case.record.outcome.measured):
        if line.ratio is not None and line.calibrated is False and "NMR" not in (line.by or ""):
            yield Fault(
                at=("outcome", "measured", index, "calibrated"),
                message="this ratio is one of areas, not of amounts",
                mend="determine the response factors, or accept this query with the reason",
            )


EXCESS_CHECKS = (
    ee_is_above_substrate,
    ee_and_er_disagree,
    ee_comes_from_a_racemate,
    ratio_is_not_calibrated,
)
