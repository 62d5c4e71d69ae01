"""Yields, conversion and recovered substrate against each other: the mass balance of a record."""

from collections import Counter
from collections.abc import Iterator, Mapping
from functools import reduce
from itertools import combinations
from operator import add

from builder.checks.case import Case
from builder.checks.measured import METHOD_POINTS, Span, exactly, lines_of
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.records.specimen import outcome_example
from builder.records.vocabulary import YieldKind
from builder.rule import Fault, rule

__all__ = ["BALANCE_CHECKS"]

SURPLUS_POINTS = 5.0
OPEN_POINTS = 10.0
_WHOLE = exactly(100.0)


def _yields(case: Case) -> dict[frozenset[str], Span]:
    """Return the yield of each label or group of labels: isolated before assay; area shares are none."""
    found: dict[frozenset[str], Span] = {}
    for kind in (YieldKind.ASSAY, YieldKind.ISOLATED):
        for _, line, span in lines_of(case, "yield"):
            if line.kind is kind and line.of:
                found[frozenset(line.of)] = span
    return found


def _counted(case: Case) -> dict[frozenset[str], Span]:
    """Return the yields that each took a molecule of substrate of its own: of two halves of one, the larger."""
    yields = _yields(case)
    for one, other in combinations(sorted(yields, key=sorted), 2):
        if one in yields and other in yields and _are_halves(case, one, other):
            del yields[min(one, other, key=lambda each: yields[each].low)]
    return yields


def _are_halves(case: Case, one: frozenset[str], other: frozenset[str]) -> bool:
    """Say whether two products are made together of one molecule of substrate, as phenol and sulfide of an anisole.

    Then their atoms, hydrogen apart, are those of the substrate and of nothing, or of one species of the flask.
    """
    drawn = [case.structures[path] for path in case.product_paths((*one, *other)) if path in case.structures]
    substrate = case.structures.get(("substrate",))
    if substrate is None or len(one) != 1 or len(other) != 1 or len(drawn) != 2:
        return False
    atoms = _atoms(drawn[0]) + _atoms(drawn[1])
    partners = (piece for species in case.flask for piece in species.fragments)
    return any(atoms == _atoms(substrate) + partner for partner in (Counter(), *map(_atoms, partners)))


def _atoms(structure: Structure) -> Counter[str]:
    return Counter(structure.without_counter_ions.elements)


def _total(groups: Mapping[frozenset[str], Span]) -> Span | None:
    """Return the sum of yields, a group counting once for its labels; None where groups overlap in part."""
    outer = {group: span for group, span in groups.items() if not any(group < other for other in groups)}
    if any(one & other for one, other in combinations(outer, 2)):
        return None
    return reduce(add, outer.values(), exactly(0.0))


def _highest(case: Case, what: str) -> Span | None:
    """Return the highest measurement of a kind: several methods are checks of each other."""
    return max((span for _, _, span in lines_of(case, what)), key=lambda span: (span.high, span.low), default=None)


_ANISOLE = (
    "substrate: {name: 4-methylanisole, smiles: 'COc1ccc(C)cc1', class: methyl, leaving_group: phenoxide,"
    " amount: 10 mmol}\nnucleophile: {name: sodium dodecane-1-thiolate, smiles: '[Na+].CCCCCCCCCCCC[S-]',"
    " equivalents: 2.0}\nstages: [{temperature: 140 °C, time: 10 h}]\n"
) + outcome_example(
    "{yield: 92 %, of: A, kind: isolated}, {yield: 94 %, of: B, kind: assay, by: GC}",
    products="{label: A, name: 4-cresol, smiles: 'Oc1ccc(C)cc1', use: desired},"
    " {label: B, name: dodecyl methyl sulfide, smiles: CCCCCCCCCCCCSC, use: by-product}",
)


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
        _ANISOLE,
    ),
)
def balance_is_above_100(case: Case) -> Iterator[Fault]:
    """Yields and recovered substrate add up to at most 105 %, honest rounding apart.

    Every mole of product took one of substrate; more than that is a wet product, an uncalibrated detector or a slip.
    Area shares of a chromatogram are no yields and are left out; of two products that are the halves of one molecule of
    substrate the larger counts.
    """
    yielded = _total(_counted(case))
    if yielded is None:
        return
    total = yielded + (_highest(case, "recovered") or exactly(0.0))
    if total.is_above(_WHOLE, SURPLUS_POINTS):
        yield Fault(
            at=("outcome", "measured"),
            message=f"yields and recovered substrate add up to {total.stated:g} %",
            mend="correct the yields, or their purity",
            data={"total_percent": round(total.stated, 1)},
        )


@rule(
    id="balance-open",
    title="Substrate unaccounted for",
    level=Level.QUERY,
    source="common-practice",
    needs=("balance-above-100",),
    fires_on=(
        outcome_example("{yield: 61 %, of: A, kind: assay}, {recovered: 5 %, of: substrate}"),
        outcome_example("{yield: 61 %, of: A, kind: assay}, {conversion: 99 %}"),
    ),
    silent_on=(
        outcome_example("{yield: 81 %, of: A, kind: assay}, {recovered: 15 %, of: substrate}"),
        outcome_example("{yield: 81 %, of: A, kind: assay}, {conversion: 88 %}"),
        outcome_example("{yield: 61 %, of: A, kind: isolated}, {recovered: 5 %, of: substrate}"),
        outcome_example("{yield: 61 %, of: A, kind: assay, note: much tar}, {conversion: 99 %}"),
    ),
)
def balance_is_open(case: Case) -> Iterator[Fault]:
    """Where everything was measured in the mixture, yields and the substrate left over reach 90 %.

    What is left over was recovered, or follows from the conversion. Asked only where no isolated yield enters and every
    product has its own number; elsewhere the balance stays open, and says nothing. A volatile alkene that left with the
    gas is the usual gap, and a note on one of the measurements closes it.
    """
    yields, left = _yields(case), _left_over(case)
    kinds = {line.kind for _, line, _ in lines_of(case, "yield")}
    complete = frozenset().union(*yields) == {product.label for product in case.record.outcome.products}
    yielded = _total(_counted(case))
    if kinds != {YieldKind.ASSAY} or not complete or left is None or yielded is None:
        return
    total = yielded + left
    if _WHOLE.is_above(total, OPEN_POINTS) and not any(line.note for line in case.record.outcome.measured):
        yield Fault(
            at=("outcome", "measured"),
            message=f"only {total.stated:g} % of the substrate is accounted for",
            mend="name what else formed, or say in a note where it went",
            data={"total_percent": round(total.stated, 1)},
        )


def _left_over(case: Case) -> Span | None:
    """Return the substrate that did not react: recovered, else what the conversion leaves; None if neither says."""
    recovered, conversion = _highest(case, "recovered"), _highest(case, "conversion")
    if recovered is not None or conversion is None:
        return recovered
    return Span(max(0.0, 100.0 - conversion.high), 100.0 - conversion.low, conversion.half)


@rule(
    id="recovered-above-unconverted",
    title="More recovered than was left",
    source="common-practice",
    fires_on=(
        outcome_example("{conversion: 99 %}, {recovered: 12 %, of: substrate}, {yield: 81 %, of: A, kind: assay}"),
        outcome_example("{conversion: 100 %}, {recovered: 2 %, of: substrate}, {yield: 81 %, of: A, kind: assay}"),
    ),
    silent_on=(
        outcome_example("{conversion: 90 %}, {recovered: 9 %, of: substrate}, {yield: 81 %, of: A, kind: assay}"),
        outcome_example("{conversion: 100 %}, {recovered: '< 2 %', of: substrate}, {yield: 81 %, of: A, kind: assay}"),
    ),
)
def recovered_is_above_unconverted(case: Case) -> Iterator[Fault]:
    """Recovered substrate is what was not converted, with 3 points for the method; none is left at 100 % conversion.

    A substrate that is all gone cannot be recovered. "> 98 %" leaves room for what was found; 100 % leaves none.
    """
    conversions = [span for _, _, span in lines_of(case, "conversion")]
    conversion = max(conversions, key=lambda span: span.low, default=None)
    if conversion is None:
        return
    margin = 0.0 if conversion.low >= 100.0 else METHOD_POINTS
    unconverted = Span(100.0 - conversion.low, 100.0 - conversion.low, conversion.half)
    for path, line, span in lines_of(case, "recovered"):
        if span.is_above(unconverted, margin):
            yield Fault(
                at=(*path, "recovered"),
                message=f"{line.value} recovered at {conversion.stated:g} % conversion",
                mend="correct one of the two",
            )


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
    conversions = [(span, line.value) for _, line, span in lines_of(case, "conversion")]
    total = _total(_counted(case))
    first = next((path for path, _, _ in lines_of(case, "yield")), None)
    if not conversions or first is None or total is None:
        return
    highest, typed = max(conversions, key=lambda each: each[0].high)
    if total.is_above(highest, METHOD_POINTS):
        yield Fault(
            at=(*first, "yield"),
            message=f"{total.stated:g} % yield at {typed} conversion",
            mend="correct one of the two",
        )


BALANCE_CHECKS = (
    balance_is_above_100,
    balance_is_open,
    recovered_is_above_unconverted,
    yield_is_above_conversion,
)
