"""One yield at a time: its size, its kind, its digits, and the mass of product behind it."""

import re
from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.checks.derivation import routes_by_product
from builder.checks.measured import METHOD_POINTS, Span, analysis_in, exactly, lines_of
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.amounts import Role, rounding_of
from builder.mechanism.forms import forms_of
from builder.mechanism.products import Event
from builder.records.model import Measurement
from builder.records.quantities import half_unit
from builder.records.specimen import outcome_example
from builder.records.vocabulary import YieldKind
from builder.rule import Fault, Path, rule

__all__ = ["YIELD_CHECKS"]

YIELD_MASS_POINTS = 2.0
ABOVE_100_POINTS = 2.0
SUSPECT_POINTS = 1.0
"""How close an explanation must come to the typed yield to be offered; an estimate made here."""
SMALL_MASS_G = 0.010
"""Product mass below which a tenth of a milligram is a per cent."""

_SMALL = (
    "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, amount: 0.1 mmol}\n"
)


@rule(
    id="digits-beyond-scale",
    title="More digits than the balance gives",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        _SMALL + outcome_example("{yield: 81.4 %, of: A, kind: isolated, mass: 8.1 mg}"),
        _SMALL + outcome_example("{yield: 81.4 %, of: A, kind: isolated}"),
    ),
    silent_on=(
        _SMALL + outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 8.1 mg}"),
        outcome_example("{yield: 81.4 %, of: A, kind: isolated, mass: 0.807 g}"),
    ),
)
def digits_are_beyond_scale(case: Case) -> Iterator[Fault]:
    """An isolated yield from less than 10 mg of product is not quoted to 0.1 %.

    A tenth of a milligram on the balance is already one per cent. Where no mass is typed, it follows from the yield.
    """
    for path, line, span in lines_of(case, "yield"):
        mass_g = _mass_g(case, line, span)
        typed = line.yield_
        if typed is None or line.kind is not YieldKind.ISOLATED or mass_g is None or mass_g >= SMALL_MASS_G:
            continue
        if half_unit(typed.quantity.number) < 0.5:
            source = str(line.mass) if line.mass else f"some {1000 * mass_g:.2g} mg"
            whole = f"{typed.relation} {typed.magnitude:.0f} %".strip()
            yield Fault(
                at=(*path, "yield"),
                message=f"{typed} from {source}",
                mend=f"write {whole}",
                fix=f"'{whole}'" if typed.relation else whole,
            )


def _mass_g(case: Case, line: Measurement, span: Span) -> float | None:
    """Return the mass of product behind a yield, typed or derived, in g; None where neither can be."""
    if line.mass is not None:
        return line.mass.magnitude
    structure, substrate_mol = _product(case, line), case.amounts.substrate.amount_mol
    if structure is None or substrate_mol is None:
        return None
    return span.stated / 100.0 * substrate_mol * structure.mass


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
    lines = [(path, line, span) for path, line, span in lines_of(case, "yield") if line.of]
    assays = {frozenset(line.of or ()): (line, span) for _, line, span in lines if line.kind is YieldKind.ASSAY}
    for path, line, span in lines:
        by_assay, assay = assays.get(frozenset(line.of or ()), (None, None))
        if by_assay is None or assay is None or line.kind is not YieldKind.ISOLATED:
            continue
        if span.is_above(assay, METHOD_POINTS):
            yield Fault(
                at=(*path, "yield"),
                message=f"{line.value} isolated, {by_assay.value} by assay",
                mend="check the dryness of the product and the calibration of the assay",
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
        for path, line, span in lines_of(case, what):
            if span.is_above(exactly(100.0), ABOVE_100_POINTS) or min(span.low, span.high) < 0.0:
                yield Fault(at=(*path, what), message=f"{what} of {line.value}", mend="correct it, or state the purity")


_WEIGHED = re.compile(r"weigh|balance|purity", re.IGNORECASE)


@rule(
    id="yield-kind-contradicted",
    title="A yield of another kind than its line says",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        outcome_example("{yield: 81 %, of: A, kind: isolated, by: GC}"),
        outcome_example("{yield: 81 %, of: A, kind: area, by: GC, mass: 0.803 g}"),
        outcome_example("{yield: 81 %, of: A, kind: assay, by: GC, calibrated: false}"),
        outcome_example("{yield: 81 %, of: A, kind: area, by: GC, calibrated: true}"),
    ),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.803 g, purity: 99 %, by: 1H NMR}"),
        outcome_example("{yield: 81 %, of: A, kind: assay, by: GC, calibrated: true}"),
        outcome_example("{yield: 81 %, of: A, kind: area, by: GC, calibrated: false}"),
    ),
)
def yield_kind_is_contradicted(case: Case) -> Iterator[Fault]:
    """An isolated yield is weighed, an assay is measured against a standard, an area share is neither.

    An area per cent is no yield: two substances rarely answer a detector alike, and what the detector does not see is
    not counted. It is neither added up nor compared with a mass.
    """
    for path, line, _ in lines_of(case, "yield"):
        method = line.by or ""
        if line.kind is YieldKind.ISOLATED and line.mass is None:
            found = analysis_in(method)
            if found and not _WEIGHED.search(method):
                yield _other_kind(path, f"an isolated yield is weighed, this one is by {found}", "assay")
        elif line.kind is YieldKind.AREA and line.mass is not None:
            yield _other_kind(path, f"an area share has no mass, and {line.mass} was weighed", "isolated")
        elif line.kind is YieldKind.AREA and line.calibrated:
            yield _other_kind(path, "a calibrated area is an assay", "assay")
        elif line.kind is YieldKind.ASSAY and line.calibrated is False:
            yield _other_kind(path, "an assay is calibrated; without a standard it is an area share", "area")


def _other_kind(path: Path, message: str, kind: str) -> Fault:
    return Fault(at=(*path, "kind"), message=message, mend=f"write kind: {kind}, or correct the rest of the line")


# --- a yield and its mass -------------------------------------------------------------------------------------


@rule(
    id="yield-mass-disagrees",
    title="A yield that its mass does not give",
    source="common-practice",
    needs=("structure-unreadable", "amount-not-derivable", "label-unknown"),
    fires_on=(
        outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.99 g}"),
        outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 803 g}"),
    ),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.803 g}"),
        outcome_example("{yield: '> 80 %', of: A, kind: isolated, mass: 0.94 g}"),
        outcome_example("{yield: 81 %, of: A, kind: isolated, mass: 0.8 g}"),
    ),
)
def yield_disagrees_with_mass(case: Case) -> Iterator[Fault]:
    """A yield follows from the mass of product, its purity and the amount of substrate, within 2 points.

    yield = mass × purity / (molar mass × amount of substrate / number of its molecules in one of product). Isomers of
    one formula count as one product. Where another form of the product, another limiting substance, a forgotten purity
    or a factor of 1000 would give the typed number, the finding says which.
    """
    substrate_mol = case.amounts.substrate.amount_mol
    for path, line, span in lines_of(case, "yield"):
        product = _product(case, line)
        if line.mass is None or product is None or not substrate_mol or line.kind is YieldKind.AREA:
            continue
        purity = line.purity.magnitude / 100.0 if line.purity else 1.0
        expected = 100.0 * line.mass.magnitude * purity / (product.mass * substrate_mol)
        half_digits = line.mass.half_digit + rounding_of(case.record.substrate)
        half_digits += line.purity.half_digit if line.purity else 0.0
        if any(_points_off(span, count * expected, half_digits) <= 0 for count in _substrates_in(case, line)):
            continue
        yield Fault(
            at=(*path, "mass"),
            message=f"{line.mass} is {expected:.3g} % of the theory, not {line.value}",
            mend=_explained(case, line, product, span.stated / expected, SUSPECT_POINTS / expected + half_digits),
            data={"expected_percent": round(expected, 1)},
        )


def _points_off(span: Span, expected: float, half_digits: float) -> float:
    """Return by how many points a yield lies outside the tolerance around the expected one; not above 0 if within."""
    return max(span.low - expected, expected - span.high) - YIELD_MASS_POINTS - span.half - expected * half_digits


def _product(case: Case, line: Measurement) -> Structure | None:
    """Return the structure of a line's product, or of the first of several isomers; None if formulae differ."""
    found = [case.structures.get(path) for path in case.product_paths(line.of)]
    drawn = [structure for structure in found if structure is not None]
    is_one = bool(drawn) and len(drawn) == len(found) and len({each.formula for each in drawn}) == 1
    return drawn[0] if is_one else None


def _substrates_in(case: Case, line: Measurement) -> range:
    """Return how many molecules of substrate may be in one of product: one for each substitution on the way there.

    Two bromides and one sulfide make a thioether; whether two groups of one molecule were exchanged instead, the
    events do not tell, so both are believed.
    """
    routes = routes_by_product(case)
    ways = [routes[path][0].events for path in case.product_paths(line.of) if routes.get(path)]
    return range(1, max((1, *(events.count(Event.SUBSTITUTION) for events in ways))) + 1)


@dataclass(frozen=True, slots=True)
class _Suspect:
    """What would multiply the yield that follows from a mass by `factor`, and how to say so."""

    factor: float
    words: str


def _explained(case: Case, line: Measurement, product: Structure, factor: float, tolerance: float) -> str:
    """Return the mend for a yield that is `factor` times what its mass gives."""
    suspects = [each for each in _suspects(case, line, product) if abs(each.factor - factor) <= tolerance]
    if any(abs(factor / slip - 1.0) < 0.1 for slip in (1000.0, 0.001)):
        return "a factor of 1000: look for mg against g, here and at the substrate"
    if not suspects:
        return "correct mass, yield or purity"
    best = min(suspects, key=lambda each: abs(each.factor - factor))
    return f"correct mass, yield or purity; {best.words}"


def _suspects(case: Case, line: Measurement, product: Structure) -> Iterator[_Suspect]:
    if line.purity is not None:
        words = f"the yield fits the mass without its purity of {line.purity}"
        yield _Suspect(100.0 / line.purity.magnitude, words)
    purity = case.record.substrate.purity
    if purity is not None:
        yield _Suspect(purity.magnitude / 100.0, f"the yield fits with the purity of the substrate, {purity}, left out")
    substrate_mol = case.amounts.substrate.amount_mol or 0.0
    for row in case.amounts.rows:
        if row.role not in {Role.SUBSTRATE, Role.SOLVENT} and row.amount_mol:
            words = f"the yield fits {row.name} as the measure, and yields count on the substrate"
            yield _Suspect(substrate_mol / row.amount_mol, words)
    yield _Suspect(2.0, "the yield fits two molecules of substrate in one of product")
    yield _Suspect(0.5, "the yield fits two molecules of product from one of substrate")
    for form in forms_of(product):
        words = f"the mass fits {form.name} of the product, {form.molar_mass:.1f} g/mol"
        yield _Suspect(product.mass / form.molar_mass, words)


YIELD_CHECKS = (
    digits_are_beyond_scale,
    isolated_is_above_assay,
    yield_is_above_100,
    yield_kind_is_contradicted,
    yield_disagrees_with_mass,
)
