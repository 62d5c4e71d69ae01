"""Yields, conversion and recovered substrate against each other: the mass balance of a record."""

import math
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from itertools import combinations

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import rounding_of
from builder.records.fields import Ratio
from builder.records.model import Measurement
from builder.records.quantities import Percent
from builder.records.specimen import outcome_example
from builder.records.vocabulary import YieldKind
from builder.rule import Fault, Path, rule

__all__ = ["BALANCE_CHECKS"]

METHOD_POINTS = 3.0  # what two methods may differ by, in per cent of substrate; common practice, no source
YIELD_MASS_POINTS = 2.0
OPEN_BELOW = 90.0
FULL_ABOVE = 105.0


@dataclass(frozen=True, slots=True)
class Bounds:
    """Between which percentages a measured value lies; a plain number is both, a limit of detection one of them."""

    low: float
    high: float

    @classmethod
    def of(cls, percent: Percent) -> "Bounds":
        """Return the bounds of "88 %", "< 2 %" (from 0) or "> 98 %" (without upper end)."""
        if percent.is_upper_limit:
            return cls(0.0, percent.magnitude)
        return cls(percent.magnitude, math.inf if percent.relation else percent.magnitude)


def _lines(case: Case, what: str) -> Iterator[tuple[Path, Measurement, Bounds]]:
    """Yield the measurements of one kind, with path and bounds."""
    for index, line in enumerate(case.record.outcome.measured):
        if line.what == what and not isinstance(line.value, Ratio):
            yield ("outcome", "measured", index), line, Bounds.of(line.value)


def _yields(case: Case) -> dict[frozenset[str], float]:
    """Return the least yield of each label or group of labels: isolated before assay; area shares are none."""
    found: dict[frozenset[str], float] = {}
    for kind in (YieldKind.ASSAY, YieldKind.ISOLATED):
        for _, line, bounds in _lines(case, "yield"):
            if line.kind is kind and line.of:
                found[frozenset(line.of)] = bounds.low
    return found


def _total(groups: Mapping[frozenset[str], float]) -> float | None:
    """Return the sum of yields, a group counting once for its labels; None where groups overlap in part."""
    outer = {group: value for group, value in groups.items() if not any(group < other for other in groups)}
    if any(one & other for one, other in combinations(outer, 2)):
        return None
    return sum(outer.values())


def _recovered(case: Case) -> float | None:
    """Return the recovered substrate; of several methods the highest, which are checks of each other."""
    return _highest(bounds.low for _, _, bounds in _lines(case, "recovered"))


def _highest(values: Iterable[float]) -> float | None:
    return max(values, default=None)


@rule(
    id="balance-above-100",
    title="More came out than went in",
    source="common-practice",
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: assay}, {recovered: 30 %, of: substrate}"),),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: assay}, {recovered: 15 %, of: substrate}"),
        outcome_example(
            "{yield: 45 %, of: A, kind: assay}, {recovered: 53 %, of: substrate, by: GC},"
            " {recovered: 51 %, of: substrate, by: 1H NMR}"
        ),
    ),
)
def balance_is_above_100(case: Case) -> Iterator[Fault]:
    """Yields and recovered substrate add up to at most 105 %.

    Every mole of product took one of substrate; more than that is a wet product, an uncalibrated detector or a slip.
    """
    total = _total(_yields(case))
    if total is not None and total + (_recovered(case) or 0.0) > FULL_ABOVE:
        total += _recovered(case) or 0.0
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
    yields, recovered = _yields(case), _recovered(case)
    kinds = {line.kind for _, line, _ in _lines(case, "yield")}
    complete = frozenset().union(*yields) == {product.label for product in case.record.outcome.products}
    total = _total(yields)
    if kinds != {YieldKind.ASSAY} or not complete or recovered is None or total is None:
        return
    if total + recovered < OPEN_BELOW:
        yield Fault(
            at=("outcome", "measured"),
            message=f"only {total + recovered:.0f} % of the substrate is accounted for",
            mend="name what else formed, or say in a note where it went",
            data={"total_percent": round(total + recovered, 1)},
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
            yield Fault(at=(*path, "yield"), message=f"{typed} from {line.mass}", mend="round it to whole per cent")


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
    lines = [(path, line, bounds) for path, line, bounds in _lines(case, "yield") if line.of]
    assays = {frozenset(line.of or ()): bounds.high for _, line, bounds in lines if line.kind is YieldKind.ASSAY}
    for path, line, bounds in lines:
        assay = assays.get(frozenset(line.of or ()))
        if line.kind is YieldKind.ISOLATED and assay is not None and bounds.low > assay + METHOD_POINTS:
            yield Fault(
                at=(*path, "yield"),
                message=f"{bounds.low:g} % isolated, {assay:g} % by assay",
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
    conversion = _highest(bounds.low for _, _, bounds in _lines(case, "conversion"))
    for path, _, bounds in _lines(case, "recovered"):
        if conversion is not None and bounds.low > 100.0 - conversion + METHOD_POINTS:
            yield Fault(
                at=(*path, "recovered"),
                message=f"{bounds.low:g} % recovered at {conversion:g} % conversion",
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
        for path, line, bounds in _lines(case, what):
            if not 0.0 <= bounds.low <= 102.0 or bounds.high < 0.0:
                yield Fault(at=(*path, what), message=f"{what} of {line.value}", mend="correct it, or state the purity")


@rule(
    id="yield-above-conversion",
    title="A yield above the conversion",
    source="common-practice",
    fires_on=(
        outcome_example("{conversion: 70 %}, {yield: 81 %, of: A, kind: assay}"),
        outcome_example("{conversion: '< 2 %'}, {yield: 81 %, of: A, kind: assay}"),
    ),
    silent_on=(
        outcome_example("{conversion: 82 %}, {yield: 81 %, of: A, kind: assay}"),
        outcome_example("{conversion: '> 70 %'}, {yield: 81 %, of: A, kind: assay}"),
    ),
)
def yield_is_above_conversion(case: Case) -> Iterator[Fault]:
    """The yields of all products together do not exceed the conversion, with 3 points for the methods.

    Selectivity is yield over conversion and cannot exceed one.
    """
    conversion = _highest(bounds.high for _, _, bounds in _lines(case, "conversion"))
    total = _total(_yields(case))
    first = next((path for path, _, _ in _lines(case, "yield")), None)
    if conversion is not None and first is not None and total is not None and total > conversion + METHOD_POINTS:
        yield Fault(
            at=(*first, "yield"),
            message=f"{total:g} % yield at {conversion:g} % conversion",
            mend="correct one of the two",
        )


@rule(
    id="yield-mass-disagrees",
    title="A yield that its mass does not give",
    source="common-practice",
    needs=("structure-unreadable", "amount-not-derivable", "label-unknown"),
    fires_on=(outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.99 g}"),),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.803 g}"),
        outcome_example("{yield: '> 80 %', of: A, kind: isolated, mass: 0.94 g}"),
    ),
)
def yield_disagrees_with_mass(case: Case) -> Iterator[Fault]:
    """A yield follows from the mass of product, its purity and the amount of substrate, within 2 points.

    yield = mass × purity / (molar mass × amount of substrate). Isomers of one formula count as one product.
    """
    substrate_mol = case.amounts.substrate.amount_mol
    for path, line, bounds in _lines(case, "yield"):
        molar_mass = _molar_mass(case, line)
        if line.mass is None or molar_mass is None or not substrate_mol:
            continue
        purity = line.purity.magnitude / 100.0 if line.purity else 1.0
        expected = 100.0 * line.mass.magnitude * purity / (molar_mass * substrate_mol)
        rounding = expected * (line.mass.half_digit + rounding_of(case.record.substrate))
        off = max(bounds.low - expected, expected - bounds.high, 0.0)
        if off > YIELD_MASS_POINTS + rounding:
            factor = expected / bounds.low if bounds.low else 1.0
            slipped = any(abs(factor / each - 1.0) < 0.1 for each in (1000.0, 0.001))
            yield Fault(
                at=(*path, "mass"),
                message=f"{line.mass} is {expected:.3g} % of the theory, not {line.value}",
                mend="a factor of 1000: look for mg against g, here and at the substrate" if slipped else _MEND_MASS,
                data={"expected_percent": round(expected, 1)},
            )


_MEND_MASS = "correct mass, yield or purity"


def _molar_mass(case: Case, line: Measurement) -> float | None:
    """Return the molar mass that the products of a line share; None if they differ or one has no structure."""
    positions = {product.label: index for index, product in enumerate(case.record.outcome.products)}
    paths: list[Path] = [("outcome", "products", positions[label]) for label in line.of or () if label in positions]
    formulas = {case.structures[path].formula: case.structures[path].mass for path in paths if path in case.structures}
    complete = paths and all(path in case.structures for path in paths)
    return next(iter(formulas.values())) if complete and len(formulas) == 1 else None


BALANCE_CHECKS = (
    balance_is_above_100,
    balance_is_open,
    digits_are_beyond_scale,
    isolated_is_above_assay,
    recovered_is_above_unconverted,
    yield_is_above_100,
    yield_is_above_conversion,
    yield_disagrees_with_mass,
)
