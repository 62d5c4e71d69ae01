"""Typed numbers against each other: amounts, yields, ratios, ee, rates."""

import math
from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import Role, charged_rows, moles_from
from builder.records.fields import Ratio
from builder.records.model import Charged, Measurement
from builder.records.quantities import Quantity
from builder.records.specimen import TWO_PRODUCTS, outcome_example
from builder.records.vocabulary import StereoKind, Vessel, YieldKind
from builder.rule import Fault, Path, rule

__all__ = ["NUMBER_CHECKS"]

QUERY_ABOVE = 0.02  # relative disagreement; common practice, no source
ERROR_ABOVE = 0.05
_KINDS = ("mass", "amount", "volume", "equivalents")
_SECONDS = {"s": 1.0, "min": 60.0, "h": 3600.0, "d": 86400.0}


# --- amounts ----------------------------------------------------------------------------------------------


@rule(
    id="amount-not-derivable",
    title="A volume that stands for no amount",
    source="record-format",
    needs=("structure-unreadable", "quantity-missing"),
    fires_on=(
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, volume: 1 mL}",
    ),
    silent_on=(
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, volume: 1 mL,"
        " density: 1.26 g/mL}",
    ),
)
def amount_cannot_be_derived(case: Case) -> Iterator[Fault]:
    """The amount of every substance but a solvent follows from what is typed.

    A volume needs the density of the liquid or the strength of the solution, a mass needs the structure.
    """
    for row in case.amounts.rows:
        if row.role is not Role.SOLVENT and row.amount_mol is None and row.typed and row.typed != "equivalents":
            wanted = "density: 1.26 g/mL or strength: 2.5 mol/L" if row.typed == "volume" else "smiles: '…'"
            yield Fault(
                at=(*row.path, row.typed), message=f"no amount of {row.name} follows from this", mend=f"add {wanted}"
            )


@rule(
    id="quantities-disagree",
    title="Two quantities of one substance disagree",
    level=Level.QUERY,
    source="common-practice",
    needs=("structure-unreadable",),
    fires_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g, equivalents: 1.8}",
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 975 g, amount: 15.0 mmol}",
        "concentration: 0.8 mol/L",
    ),
    silent_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g, equivalents: 1.5}",
        "concentration: 0.5 mol/L",
    ),
)
def quantities_disagree(case: Case) -> Iterator[Fault]:
    """Quantities typed as cross-checks agree within 2 %, honest rounding apart; beyond 5 % one of them is wrong.

    The first of mass, amount, volume, equivalents is used for everything; the others only check it. A factor of
    1000 is a slipped prefix, a factor of the purity a forgotten one.
    """
    substrate_mol = case.amounts.substrate.amount_mol
    for path, role, substance in charged_rows(case.record):
        structure = case.structures.get(path)
        moles = {
            kind: moles_from(kind, substance, structure, substrate_mol)
            for kind in _KINDS
            if not (role is Role.SUBSTRATE and kind == "equivalents")
        }
        known = {kind: value for kind, value in moles.items() if value}
        used = next(iter(known), None)
        if used is None:
            continue
        for kind, value in known.items():
            if kind != used:
                yield from _disagreement(path, substance, used, kind, value / known[used])
    yield from _concentration_disagreement(case)


def _disagreement(path: Path, substance: Charged, used: str, kind: str, ratio: float) -> Iterator[Fault]:
    rounding = sum(_rounding(substance, each) for each in (used, kind))
    off = abs(ratio - 1.0)
    if off <= max(QUERY_ABOVE, rounding):
        return
    yield Fault(
        at=(*path, kind),
        message=f"{kind} and {used} of {substance.name} differ by {_factor_words(ratio)}",
        mend=_factor_mend(ratio, substance),
        level=Level.ERROR if off > max(ERROR_ABOVE, rounding) else None,
        data={"ratio": round(ratio, 4)},
    )


def _rounding(substance: Charged, kind: str) -> float:
    typed = getattr(substance, kind)
    if isinstance(typed, Quantity):
        return typed.half_digit
    exponent = typed.as_tuple().exponent if typed is not None else 0
    return 0.5 * 10.0**exponent / float(typed) if typed and isinstance(exponent, int) else 0.0


def _factor_words(ratio: float) -> str:
    return f"a factor of {ratio:.3g}" if ratio > 1.5 or ratio < 1 / 1.5 else f"{100 * abs(ratio - 1):.1f} %"


def _factor_mend(ratio: float, substance: Charged) -> str:
    for factor in (1000.0, 0.001):
        if abs(ratio / factor - 1.0) < ERROR_ABOVE:
            return "a factor of 1000: look for mg against g, mmol against mol, µL against mL"
    if substance.purity and abs(ratio * substance.purity.magnitude / 100.0 - 1.0) < QUERY_ABOVE:
        return "the factor is the purity: it counts for the mass"
    return "correct one of them; the first of mass, amount, volume, equivalents is used"


def _concentration_disagreement(case: Case) -> Iterator[Fault]:
    typed, volume = case.record.concentration, case.amounts.solvent_volume_l
    moles = case.amounts.substrate.amount_mol
    if typed is None or volume is None or moles is None:
        return
    ratio = typed.magnitude / (moles / volume)
    if abs(ratio - 1.0) > max(QUERY_ABOVE, typed.half_digit):
        yield Fault(
            at=("concentration",),
            message=f"{typed} typed, {moles / volume:.3g} mol/L from amount and solvent volume",
            mend="correct it, or drop it: with volumes given it is derived",
            level=Level.ERROR if abs(ratio - 1.0) > ERROR_ABOVE else None,
        )


@rule(
    id="vessel-overfilled",
    title="A vessel filled beyond two thirds",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("stages: [{temperature: 60 °C, time: 16 h, vessel: sealed, vessel_volume: 25 mL}]",),
    silent_on=("stages: [{temperature: 60 °C, time: 16 h, vessel: sealed, vessel_volume: 50 mL}]",),
)
def vessel_is_overfilled(case: Case) -> Iterator[Fault]:
    """A vessel is filled to at most two thirds; in a sealed one more is an error.

    A liquid that expands or boils needs the room, and a full sealed vessel bursts.
    """
    solvent = case.amounts.solvent_volume_l
    for index, stage in enumerate(case.record.stages):
        if stage.vessel_volume is None or solvent is None:
            continue
        share = solvent / stage.vessel_volume.magnitude
        if share > 2 / 3 * 1.001:
            yield Fault(
                at=("stages", index, "vessel_volume"),
                message=f"{solvent * 1000:.3g} mL of solvent fill {100 * share:.0f} % of the vessel",
                mend="use a larger vessel, or correct its volume",
                level=Level.ERROR if stage.vessel in {Vessel.SEALED, Vessel.MICROWAVE} else None,
            )


# --- yields and the balance -------------------------------------------------------------------------------


def _lines(case: Case, what: str) -> Iterator[tuple[Path, Measurement, float]]:
    """Yield the measurements of one kind with path and number; limits of detection are no numbers."""
    for index, line in enumerate(case.record.outcome.measured):
        if line.what == what and not isinstance(line.value, Ratio) and not line.value.is_limit:
            yield ("outcome", "measured", index), line, line.value.magnitude


def _yields_by_label(case: Case) -> dict[tuple[str, ...], float]:
    """Return the best yield of each label or group of labels: isolated before assay; area shares are none."""
    found: dict[tuple[str, ...], float] = {}
    for kind in (YieldKind.ASSAY, YieldKind.ISOLATED):
        for _, line, value in _lines(case, "yield"):
            if line.kind is kind and line.of:
                found[line.of] = value
    return found


def _total_yield(case: Case) -> float:
    groups = _yields_by_label(case)
    inside = {label for group in groups if len(group) > 1 for label in group}
    return sum(value for group, value in groups.items() if len(group) > 1 or group[0] not in inside)


@rule(
    id="balance-above-100",
    title="More came out than went in",
    source="common-practice",
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: assay}, {recovered: 30 %, of: substrate}"),),
    silent_on=(outcome_example("{yield: 81 %, of: A, kind: assay}, {recovered: 15 %, of: substrate}"),),
)
def balance_is_above_100(case: Case) -> Iterator[Fault]:
    """Yields and recovered substrate add up to at most 105 %.

    Every mole of product took one of substrate; more than that is a wet product, an uncalibrated detector or a slip.
    """
    recovered = sum(value for _, _, value in _lines(case, "recovered"))
    total = _total_yield(case) + recovered
    if total > 105.0:
        yield Fault(
            at=("outcome", "measured"),
            message=f"yields and recovered substrate add up to {total:.0f} %",
            mend="correct the yields, or their purity",
            data={"total_percent": round(total, 1)},
        )


@rule(
    id="balance-open",
    title="Substrate unaccounted for",
    level=Level.QUERY,
    source="common-practice",
    needs=("balance-above-100",),
    fires_on=(outcome_example("{yield: 61 %, of: A, kind: assay}, {recovered: 5 %, of: substrate}"),),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: assay}, {recovered: 15 %, of: substrate}"),
        outcome_example("{yield: 61 %, of: A, kind: isolated}, {recovered: 5 %, of: substrate}"),
    ),
)
def balance_is_open(case: Case) -> Iterator[Fault]:
    """Where everything was measured in the mixture, yields and recovered substrate reach 90 %.

    Asked only where no isolated yield enters, every product has its own number, and something says what became of
    the rest of the substrate. A volatile alkene that left with the gas is the usual gap.
    """
    yields = _yields_by_label(case)
    kinds = {line.kind for _, line, _ in _lines(case, "yield")}
    labels = {label for group in yields for label in group}
    complete = labels == {product.label for product in case.record.outcome.products}
    recovered = [value for _, _, value in _lines(case, "recovered")]
    if not yields or kinds != {YieldKind.ASSAY} or not complete or not recovered:
        return
    total = _total_yield(case) + sum(recovered)
    if total < 90.0:
        yield Fault(
            at=("outcome", "measured"),
            message=f"only {total:.0f} % of the substrate is accounted for",
            mend="name what else formed, or say in a note where it went",
            data={"total_percent": round(total, 1)},
        )


_SMALL = (
    "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, amount: 0.1 mmol}\n"
)


@rule(
    id="digits-beyond-scale",
    title="More digits than the balance gives",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(_SMALL + outcome_example("{yield: 81.4 %, of: A, kind: isolated, mass: 8.1 mg}"),),
    silent_on=(_SMALL + outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 8.1 mg}"),),
)
def digits_are_beyond_scale(case: Case) -> Iterator[Fault]:
    """An isolated yield from less than 10 mg of product is not quoted to 0.1 %.

    A tenth of a milligram on the balance is already one per cent.
    """
    for path, line, _ in _lines(case, "yield"):
        typed = line.yield_
        small = line.mass is not None and line.mass.magnitude < 0.010
        if typed is not None and small and line.kind is YieldKind.ISOLATED and "." in str(typed.quantity.number):
            yield Fault(
                at=(*path, "yield"),
                message=f"{typed} from {line.mass}",
                mend="round it to whole per cent, or add a zero less",
            )


@rule(
    id="isolated-above-assay",
    title="More isolated than was there",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: assay}, {yield: 90 %, of: A, kind: isolated}"),),
    silent_on=(outcome_example("{yield: 83 %, of: A, kind: assay}, {yield: 81 %, of: A, kind: isolated}"),),
)
def isolated_is_above_assay(case: Case) -> Iterator[Fault]:
    """The isolated yield does not exceed the assay yield of the same product by more than 3 points.

    What was not in the mixture cannot be isolated from it: a wet product or a wrong response factor.
    """
    assays = {line.of: value for _, line, value in _lines(case, "yield") if line.kind is YieldKind.ASSAY}
    for path, line, value in _lines(case, "yield"):
        if line.kind is YieldKind.ISOLATED and line.of in assays and value > assays[line.of] + 3.0:
            yield Fault(
                at=(*path, "yield"),
                message=f"{value:g} % isolated, {assays[line.of]:g} % by assay",
                mend="check the dryness of the product and the calibration of the assay",
            )


@rule(
    id="recovered-above-unconverted",
    title="More recovered than was left",
    source="common-practice",
    fires_on=(
        outcome_example("{conversion: 99 %}, {recovered: 12 %, of: substrate}, {yield: 81 %, of: A, kind: assay}"),
    ),
    silent_on=(
        outcome_example("{conversion: 90 %}, {recovered: 9 %, of: substrate}, {yield: 81 %, of: A, kind: assay}"),
    ),
)
def recovered_is_above_unconverted(case: Case) -> Iterator[Fault]:
    """Recovered substrate is what was not converted, with 3 points for the method.

    A substrate that is all gone cannot be recovered.
    """
    conversions = [value for _, _, value in _lines(case, "conversion")]
    for path, _, value in _lines(case, "recovered"):
        if conversions and value > 100.0 - max(conversions) + 3.0:
            yield Fault(
                at=(*path, "recovered"),
                message=f"{value:g} % recovered at {max(conversions):g} % conversion",
                mend="correct one of the two",
            )


@rule(
    id="yield-above-100",
    title="A yield above 100 %",
    source="common-practice",
    fires_on=(outcome_example("{yield: 104 %, of: A, kind: assay}"),),
    silent_on=(outcome_example("{yield: 101 %, of: A, kind: assay}"),),
)
def yield_is_above_100(case: Case) -> Iterator[Fault]:
    """Yield, conversion and recovered substrate are at most 100 %, with 2 points for the method, and not negative.

    Above that the product is wet or impure, or the wrong substance was taken as limiting.
    """
    for what in ("yield", "conversion", "recovered"):
        for path, _, value in _lines(case, what):
            if not 0.0 <= value <= 102.0:
                yield Fault(at=(*path, what), message=f"{what} of {value:g} %", mend="correct it, or state the purity")


@rule(
    id="yield-above-conversion",
    title="A yield above the conversion",
    source="common-practice",
    fires_on=(outcome_example("{conversion: 70 %}, {yield: 81 %, of: A, kind: assay}"),),
    silent_on=(outcome_example("{conversion: 82 %}, {yield: 81 %, of: A, kind: assay}"),),
)
def yield_is_above_conversion(case: Case) -> Iterator[Fault]:
    """The yields of all products together do not exceed the conversion, with 3 points for the methods.

    Selectivity is yield over conversion and cannot exceed one.
    """
    conversions = [value for _, _, value in _lines(case, "conversion")]
    total = _total_yield(case)
    first = next((path for path, _, _ in _lines(case, "yield")), None)
    if conversions and first is not None and total > max(conversions) + 3.0:
        yield Fault(
            at=(*first, "yield"),
            message=f"{total:g} % yield at {max(conversions):g} % conversion",
            mend="correct one of the two",
        )


@rule(
    id="yield-mass-disagrees",
    title="A yield that its mass does not give",
    source="common-practice",
    needs=("structure-unreadable", "amount-not-derivable", "label-unknown"),
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.99 g}"),),
    silent_on=(outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.803 g}"),),
)
def yield_disagrees_with_mass(case: Case) -> Iterator[Fault]:
    """A yield follows from the mass of product, its purity and the amount of substrate, within 2 points.

    yield = mass × purity / (molar mass × amount of substrate).
    """
    substrate_mol = case.amounts.substrate.amount_mol
    positions = {product.label: index for index, product in enumerate(case.record.outcome.products)}
    for path, line, value in _lines(case, "yield"):
        if line.mass is None or not line.of or len(line.of) != 1 or not substrate_mol:
            continue
        structure = case.structures.get(("outcome", "products", positions[line.of[0]]))
        if structure is None:
            continue
        purity = line.purity.magnitude / 100.0 if line.purity else 1.0
        expected = 100.0 * line.mass.magnitude * purity / (structure.mass * substrate_mol)
        rounding = expected * (line.mass.half_digit + _substrate_rounding(case))
        if abs(expected - value) > 2.0 + rounding:
            yield Fault(
                at=(*path, "mass"),
                message=f"{line.mass} is {expected:.1f} % of the theory, not {value:g} %",
                mend="correct mass, yield or purity",
                data={"expected_percent": round(expected, 1)},
            )


def _substrate_rounding(case: Case) -> float:
    substrate = case.record.substrate
    typed = substrate.mass or substrate.amount or substrate.volume
    return typed.half_digit if typed else 0.0


# --- stereo numbers and ratios ----------------------------------------------------------------------------


def _ee_of(line: Measurement) -> float | None:
    if line.ee is not None and not line.ee.is_limit:
        return line.ee.magnitude
    if line.er is not None:
        first, second = line.er.percentages
        return abs(first - second)
    return None


def _substrate_ee(case: Case) -> float | None:
    substrate = case.record.substrate
    if substrate.ee is not None:
        return substrate.ee.magnitude
    if substrate.er is not None:
        first, second = substrate.er.percentages
        return abs(first - second)
    return None


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

    Displacement at one centre cannot make it purer; a crystallisation can, and then it stands in the work-up.
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
    silent_on=(outcome_example(_RATIO % "true", _ASSAY, products=TWO_PRODUCTS),),
)
def ratio_is_not_calibrated(case: Case) -> Iterator[Fault]:
    """A product ratio from chromatographic areas is calibrated with response factors.

    Two isomers rarely answer a detector alike: an area ratio is not a ratio of amounts.
    """
    for index, line in enumerate(case.record.outcome.measured):
        if line.ratio is not None and line.calibrated is False:
            yield Fault(
                at=("outcome", "measured", index, "calibrated"),
                message="this ratio is one of areas, not of amounts",
                mend="determine the response factors, or accept this query with the reason",
            )


# --- rates ------------------------------------------------------------------------------------------------

_FOLLOWED = "time_course: {follows: conversion, time_unit: h, points: [[0, 0], [4, 12.4], [24, 54.8]]}\n"
_CONSTANT = "rate_constant: {order: 1, value: %s, temperature: 60 °C}"


@rule(
    id="time-course-off-rate",
    title="The time course does not follow the rate constant",
    level=Level.QUERY,
    source="iupac-gold",
    needs=("rate-constant-order",),
    fires_on=(outcome_example(more=_FOLLOWED + _CONSTANT % "9.2e-5 1/s"),),
    silent_on=(outcome_example(more=_FOLLOWED + _CONSTANT % "9.2e-6 1/s"),),
)
def time_course_is_off_the_rate(case: Case) -> Iterator[Fault]:
    """Observed conversion and the one from the first-order rate constant agree within a factor of 3 in time.

    1 − x = exp(−kt), asked between 5 and 95 % conversion, where both can be told.
    """
    course, constant = case.record.outcome.time_course, case.record.outcome.rate_constant
    if course is None or constant is None or constant.order != 1 or course.follows != "conversion":
        return
    k = constant.value.magnitude
    for index, (time, percent) in enumerate(course.points):
        x = float(percent) / 100.0
        seconds = float(time) * _SECONDS[course.time_unit]
        if seconds <= 0 or not 0.05 < x < 0.95:
            continue
        factor = k * seconds / -math.log1p(-x)
        if not 1 / 3 < factor < 3:
            expected = -100.0 * math.expm1(-k * seconds)
            yield Fault(
                at=("outcome", "time_course", "points", index),
                message=f"at {time} {course.time_unit} k gives {expected:.1f} %, the record {percent} %",
                mend="check k, its unit and the time unit",
                data={"factor": round(factor, 2)},
            )
            return


NUMBER_CHECKS = (
    amount_cannot_be_derived,
    balance_is_above_100,
    balance_is_open,
    digits_are_beyond_scale,
    ee_is_above_substrate,
    ee_and_er_disagree,
    ee_comes_from_a_racemate,
    isolated_is_above_assay,
    quantities_disagree,
    ratio_is_not_calibrated,
    recovered_is_above_unconverted,
    time_course_is_off_the_rate,
    vessel_is_overfilled,
    yield_is_above_100,
    yield_is_above_conversion,
    yield_disagrees_with_mass,
)
