"""What was seen against what the engine forecasts: product, course, yields, ratios, whether it reacts at all.

An isolated yield is a lower bound of conversion times share, so only what lies above the upper end of an interval is
contrary. A long stated time is never contrary. Where the engine has no say, nothing is asked.
"""

import math
from collections.abc import Callable, Container, Iterable, Iterator
from dataclasses import dataclass
from functools import lru_cache

from builder.checks.agreement import AGREEMENT_READS, claimed_courses, course_path
from builder.checks.case import Case
from builder.checks.derivation import SOUGHT, is_desired, routes_by_product
from builder.chemistry.neutral import neutral_form
from builder.chemistry.structure import Structure
from builder.chemistry.transform import StereoEffect
from builder.finding import Level
from builder.mechanism.forecast import Forecast, Forecasted
from builder.mechanism.outlook import OUT_OF_QUESTION, expected_text
from builder.mechanism.products import Event, Route
from builder.records.model import Measurement
from builder.records.specimen import TWO_PRODUCTS, outcome_example
from builder.records.vocabulary import ELIMINATIONS, SUBSTITUTIONS, Course, Mechanism, Result, YieldKind
from builder.rule import Fault, Path, rule

__all__ = ["FORECAST_CHECKS", "Bounds", "is_same_product", "share_bounds"]

PARTITION_ODDS = 5.0
"""Factor in the odds of its products by which the division of one mechanism among them may be off; estimated here."""
MARGIN_PERCENT = 3.0
"""By how much a yield may exceed a bound: weighing and calibration; common practice, no source."""
SURE_CONVERSION = 0.5
"""Lower end of the conversion above which `no reaction` is questioned."""
HARDLY_ANY_CONVERSION = 0.2
"""Upper end of the conversion below which full conversion is questioned."""
FULL_CONVERSION_PERCENT = 90.0

_COMES_FROM = (
    *("structure-unreadable", "solvent-unknown", "amount-not-derivable", "quantities-disagree"),
    *("temperature-looks-kelvin", "temperature-above-boiling", "temperature-below-freezing"),
)
"""Rules that must be silent before a question is worth asking."""
_READ = (*AGREEMENT_READS, *_COMES_FROM, "mechanism-contrary")
_MEASURED = (
    *_READ,
    *("claim-against-product", "product-not-reachable", "product-not-forecast", "conversion-above-forecast"),
    *("yield-above-100", "yield-above-conversion", "yield-mass-disagrees"),
    *("course-contradicts-structure", "course-not-forecast", "stereo-contradicts-structure"),
)


# --- what the engine can defend -------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Bounds:
    """A share of converted substrate with the interval that can be defended, all 0 to 1."""

    share: float
    low: float
    high: float


def share_bounds(
    forecast: Forecast, counts: Callable[[Forecasted], bool], may_give: Container[Mechanism] = frozenset(Mechanism)
) -> Bounds:
    """Return the share of the products that count, with an interval.

    may_give: the mechanisms that can give what counts at all. The engine builds no products of pathways that hardly
    run; those of these mechanisms may count.
    The interval of each mechanism is the forecast's own; how one mechanism divides among its products may be off by
    PARTITION_ODDS. Both ends are also taken from what does not count, and the narrower one holds.
    """
    share = low = high = rest_low = rest_high = 0.0
    for mechanism, whole in forecast.shares.items():
        least, most = forecast.intervals[mechanism]
        made = [product for product in forecast.products if product.mechanism is mechanism]
        part = math.fsum(product.share for product in made if counts(product))
        not_built = max(0.0, whole - math.fsum(product.share for product in made)) if mechanism in may_give else 0.0
        fewest, largest = min(1.0, part / whole), min(1.0, (part + not_built) / whole)
        share += part
        low += least * _moved(fewest, 1 / PARTITION_ODDS)
        high += most * _moved(largest, PARTITION_ODDS)
        rest_low += least * _moved(1 - largest, 1 / PARTITION_ODDS)
        rest_high += most * _moved(1 - fewest, PARTITION_ODDS)
    low, high = max(low, 1 - rest_high), min(high, 1 - rest_low)
    return Bounds(min(1.0, share), max(0.0, low), min(1.0, max(low, high)))


def _moved(fraction: float, odds: float) -> float:
    """Return a fraction after its odds are multiplied; none stays none and all stays all."""
    return fraction * odds / (fraction * odds + 1 - fraction)


@lru_cache(maxsize=512)
def _forms(structure: Structure) -> tuple[Structure, ...]:
    """Return the uncharged pieces of a drawn product, itself as a whole first."""
    return tuple(dict.fromkeys((neutral_form(structure), *map(neutral_form, structure.fragments))))


def _is_isomer(drawn: Structure, forecasted: Structure) -> bool:
    """Say whether two structures agree apart from stereochemistry."""
    flat = neutral_form(forecasted).flat_smiles
    return any(form.flat_smiles == flat for form in _forms(drawn))


def is_same_product(drawn: Structure, forecasted: Structure) -> bool:
    """Say whether two structures agree, mirror images taken as one and what is not drawn as standing for all."""
    other = neutral_form(forecasted)
    return any(_agree(form, other) for form in _forms(drawn))


@lru_cache(maxsize=512)
def _agree(one: Structure, other: Structure) -> bool:
    if one.flat_smiles != other.flat_smiles:
        return False
    shapes = {s.without_stereocentres.smiles for s in (one, other)}
    if len(shapes) > 1 and one.flat_smiles not in shapes:
        return False
    if one.stereocentres.unspecified or other.stereocentres.unspecified:
        return True
    centres = (one, one.mirror_image) if len(shapes) == 1 else ()
    return other in centres or len(shapes) > 1


# --- rules ----------------------------------------------------------------------------------------------------

_AT_60 = "stages: [{temperature: 60 °C, time: 16 h}]\n"
_BUTYL = "substrate: {name: 1-bromobutane, smiles: CCCCBr, class: primary, leaving_group: bromide, amount: 10 mmol}\n"
_NEOPENTYL = (
    "substrate: {name: neopentyl bromide, smiles: 'CC(C)(C)CBr', class: [primary, neopentyl], leaving_group: bromide,"
    " amount: 10 mmol}\nstages: [{temperature: 25 °C, time: 2 h}]\n"
)
_NO_REACTION = (
    "outcome:\n  result: [no reaction]\n  sought: '{sought}'\n"
    "  measured: [{{conversion: < 2 %, by: GC}}, {{recovered: 95 %, of: substrate, by: GC}}]"
)


def _one(smiles: str, *measured: str) -> str:
    product = f"{{label: A, name: the product, smiles: '{smiles}', use: desired}}"
    return outcome_example(*(measured or ("{yield: 81 %, of: A, kind: assay}",)), products=product)


@rule(
    id="product-not-forecast",
    title="A wanted product that the engine does not expect",
    level=Level.QUERY,
    source="estimated-here",
    needs=(*_READ, "claim-against-product", "product-not-reachable"),
    fires_on=(_AT_60 + _BUTYL + _one("C=CCC"),),
    silent_on=(_AT_60 + _BUTYL + _one("CCCCN=[N+]=[N-]"),),
)
def product_is_not_forecast(case: Case) -> Iterator[Fault]:
    """Each wanted product is among those the engine expects, however small its share.

    Compared without configuration, salts as their free bases and acids. Asked are products that form in one
    displacement, elimination or addition; what a further step makes of them is no matter of the forecast.
    """
    forecast = case.forecast
    if forecast is None or not forecast.products:
        return
    for path, routes in routes_by_product(case).items():
        if path == SOUGHT or not is_desired(case, path) or not _is_in_reach(routes):
            continue
        if not any(_is_isomer(case.structures[path], each.structure) for each in forecast.products):
            yield Fault(
                at=(*path, "smiles"),
                message=f"the record gives {_label(case, path)}; the engine expects {_main_of(forecast)}",
                mend=_mend("product-not-forecast"),
                data={"expected": [each.structure.smiles for each in forecast.products]},
            )


_TOLD = {
    Course.INVERSION: {Course.INVERSION, Course.PARTIAL_INVERSION},
    Course.PARTIAL_INVERSION: {Course.PARTIAL_INVERSION, Course.INVERSION, Course.RACEMISATION},
    Course.RACEMISATION: {Course.RACEMISATION, Course.PARTIAL_INVERSION},
    Course.RETENTION: {Course.RETENTION, Course.DOUBLE_INVERSION},
    Course.DOUBLE_INVERSION: {Course.RETENTION, Course.DOUBLE_INVERSION},
    Course.ANTI: {Course.ANTI},
    Course.SYN: {Course.SYN},
}
"""Each course that says something, and those of a forecast it may be seen as."""

_STILBENE = (
    "substrate: {name: the bromide, smiles: 'C[C@H](c1ccccc1)[C@@H](Br)c1ccccc1', stereo: racemate,"
    " class: [secondary, benzylic], leaving_group: bromide, amount: 10 mmol}\n# without nucleophile\n"
    "base: {name: sodium ethoxide, smiles: '[Na+].CC[O-]', equivalents: 2.0}\n"
    "solvent: [{name: ethanol, volume: 40 mL}]\nstages: [{temperature: 50 °C, time: 5 h}]\n"
    "outcome:\n  result: [elimination]\n  claim: {mechanism: E2, course: COURSE}\n"
    "  products: [{label: A, name: the alkene, smiles: 'ALKENE', use: desired}]\n"
    "  measured: [{conversion: 99 %, by: GC}]"
)


@rule(
    id="course-not-forecast",
    title="A course that the engine does not expect",
    level=Level.QUERY,
    source="estimated-here",
    needs=(*_READ, "course-against-mechanism", "course-contradicts-structure", "course-without-stereocentre"),
    fires_on=(_STILBENE.replace("COURSE", "syn").replace("ALKENE", "C/C(=C\\c1ccccc1)c1ccccc1"),),
    silent_on=(_STILBENE.replace("COURSE", "anti").replace("ALKENE", "C/C(=C/c1ccccc1)c1ccccc1"),),
)
def course_is_not_forecast(case: Case) -> Iterator[Fault]:
    """The course stated for a product is one by which the engine can have it form, to 5 % at least.

    Partial inversion goes with inversion and with racemisation: how much is kept, a forecast cannot tell so closely.
    Double inversion is retention. Where nothing could show a course, none is forecast and none is asked.
    """
    forecast = case.forecast
    if forecast is None:
        return
    for path, course in claimed_courses(case):
        if course not in _TOLD:
            continue
        drawn = case.structures[path]
        made = [each for each in forecast.products if _is_isomer(drawn, each.structure) and each.course in _TOLD]
        defended = _share_by(forecast, made, _TOLD[course])
        if made and defended.high < OUT_OF_QUESTION:
            main = max(made, key=lambda each: each.share)
            bounds = _share_by(forecast, made, {main.course})
            yield Fault(
                at=course_path(case, path),
                message=f"the record gives {course}; the engine expects {main.course} by {main.mechanism}"
                f" for {_text(bounds)} of what reacts",
                mend=_mend("course-not-forecast"),
            )


@rule(
    id="yield-above-forecast",
    title="More of a product than the engine can explain",
    level=Level.QUERY,
    source="estimated-here",
    needs=_MEASURED,
    fires_on=(_NEOPENTYL + _one("CC(C)(C)CN=[N+]=[N-]"),),
    silent_on=(_AT_60 + _BUTYL + _one("CCCCN=[N+]=[N-]"),),
)
def yield_is_above_the_forecast(case: Case) -> Iterator[Fault]:
    """A yield is no larger than conversion times share, at the upper ends of their intervals.

    A yield is a lower bound of that product, because something is always lost: a low yield is never contrary. Areas of
    a chromatogram are no yields and are not asked.
    """
    yield from _yields_above(case, "yield-above-forecast", wanted=True)


@rule(
    id="by-product-outside-forecast",
    title="More of a by-product than the engine can explain",
    level=Level.QUERY,
    source="estimated-here",
    needs=_MEASURED,
    fires_on=(
        _AT_60
        + _BUTYL
        + outcome_example(
            "{yield: 71 %, of: A, kind: assay}, {yield: 22 %, of: B, kind: assay}",
            products=TWO_PRODUCTS.replace("CCC(C)N", "CCCCN"),
        ),
    ),
    silent_on=(
        _AT_60
        + _BUTYL
        + outcome_example(
            "{yield: 91 %, of: A, kind: assay}, {yield: 2 %, of: B, kind: assay}",
            products=TWO_PRODUCTS.replace("CCC(C)N", "CCCCN"),
        ),
    ),
)
def by_product_is_outside_the_forecast(case: Case) -> Iterator[Fault]:
    """A by-product stays within its own interval.

    Below 5 % nothing is asked: the engine does not build pathways so small, and traces have many sources.
    """
    yield from _yields_above(case, "by-product-outside-forecast", wanted=False)


_STYRENE_OXIDE = (
    "substrate: {name: styrene oxide, smiles: 'C1OC1c1ccccc1', stereo: racemate, class: [primary, secondary, benzylic],"
    " leaving_group: epoxide, amount: 10 mmol}\nnucleophile: solvent\nsolvent: [{name: methanol, volume: 20 mL}]\n"
    "reagents: [{name: methanesulfonic acid, smiles: 'CS(=O)(=O)O', use: acid, equivalents: 0.05}]\n"
    "stages: [{temperature: 20 °C, time: 2 h}]\n"
    "outcome:\n  result: [ring opening]\n"
    "  products: [{label: A, name: 2-methoxy-2-phenylethanol, smiles: 'COC(CO)c1ccccc1', use: desired},"
    " {label: B, name: 2-methoxy-1-phenylethanol, smiles: 'COCC(O)c1ccccc1', use: by-product}]\n"
    "  measured: [{ratio: 'A:B = NUMBERS', by: 1H NMR}]"
)


@rule(
    id="ratio-against-forecast",
    title="Another main isomer than the engine expects",
    level=Level.QUERY,
    source="estimated-here",
    needs=_MEASURED,
    fires_on=(_STYRENE_OXIDE.replace("NUMBERS", "6:94"),),
    silent_on=(_STYRENE_OXIDE.replace("NUMBERS", "94:6"), _STYRENE_OXIDE.replace("NUMBERS", "70:30")),
)
def ratio_is_against_the_forecast(case: Case) -> Iterator[Fault]:
    """The main part of a ratio is not one that the engine places below another by more than a factor of five.

    The intervals of competing mechanisms are counted besides. Closer ratios are within what a forecast of isomers is
    worth, and are not asked.
    """
    forecast = case.forecast
    if forecast is None or not forecast.products:
        return
    paths = _weighable(case, forecast)
    for index, line in enumerate(case.record.outcome.measured):
        if line.ratio is None or not all(label in paths for part in line.ratio.parts for label in part):
            continue
        parts = [[paths[label] for label in part] for part in line.ratio.parts]
        expected = [_bounds_of(case, forecast, part) for part in parts]
        main = max(range(len(parts)), key=line.ratio.percentages.__getitem__)
        above = max(range(len(parts)), key=lambda place: expected[place].low)
        if above != main and expected[above].low > expected[main].high:
            names = ["+".join(part) for part in line.ratio.parts]
            yield Fault(
                at=("outcome", "measured", index, "ratio"),
                message=f"the record gives {line.ratio}; the engine expects {_text(expected[above])} of {names[above]}"
                f" and {_text(expected[main])} of {names[main]}",
                mend=_mend("ratio-against-forecast"),
            )


@rule(
    id="no-reaction-against-forecast",
    title="No reaction where the engine expects one",
    level=Level.QUERY,
    source="estimated-here",
    needs=_READ,
    fires_on=(_AT_60 + _BUTYL + _NO_REACTION.format(sought="CCCCN=[N+]=[N-]"),),
    silent_on=(_NEOPENTYL + _NO_REACTION.format(sought="CC(C)(C)CN=[N+]=[N-]"),),
)
def no_reaction_is_against_the_forecast(case: Case) -> Iterator[Fault]:
    """`no reaction` stands where the engine does not expect more than half to have reacted.

    Asked of the lower end of its interval in the stated time: a dead reagent, a wrong solvent or a forgotten base shows
    like this.
    """
    forecast = case.forecast
    if forecast is None or Result.NO_REACTION not in case.record.outcome.result:
        return
    if forecast.conversion_interval[0] > SURE_CONVERSION:
        yield Fault(
            at=("outcome", "result"),
            message=f"the record gives no reaction; the engine expects {_conversion(forecast)}",
            mend=_mend("no-reaction-against-forecast"),
        )


@rule(
    id="conversion-above-forecast",
    title="Full conversion where the engine expects hardly any",
    level=Level.QUERY,
    source="estimated-here",
    needs=_READ,
    fires_on=(
        _NEOPENTYL + _one("CC(C)(C)CN=[N+]=[N-]", "{conversion: 99 %, by: GC}", "{yield: 81 %, of: A, kind: assay}"),
    ),
    silent_on=(
        _AT_60 + _BUTYL + _one("CCCCN=[N+]=[N-]", "{conversion: 99 %, by: GC}", "{yield: 81 %, of: A, kind: assay}"),
    ),
)
def conversion_is_above_the_forecast(case: Case) -> Iterator[Fault]:
    """Full conversion, 90 % or more, stands where the engine allows for a fifth at least in the stated time.

    A catalyst that nobody listed, or a temperature misread, shows like this. A reaction that was left for longer than
    it needs is never contrary.
    """
    forecast = case.forecast
    if forecast is None or forecast.conversion_interval[1] >= HARDLY_ANY_CONVERSION:
        return
    for index, line in enumerate(case.record.outcome.measured):
        seen = line.conversion
        if seen is not None and not seen.is_upper_limit and seen.magnitude >= FULL_CONVERSION_PERCENT:
            yield Fault(
                at=("outcome", "measured", index, "conversion"),
                message=f"the record gives {seen} conversion; the engine expects {_conversion(forecast)}",
                mend=_mend("conversion-above-forecast"),
            )


FORECAST_CHECKS = (
    by_product_is_outside_the_forecast,
    conversion_is_above_the_forecast,
    course_is_not_forecast,
    no_reaction_is_against_the_forecast,
    product_is_not_forecast,
    ratio_is_against_the_forecast,
    yield_is_above_the_forecast,
)


# --- yields ---------------------------------------------------------------------------------------------------


def _yields_above(case: Case, rule_id: str, *, wanted: bool) -> Iterator[Fault]:
    """Yield a fault for each yield above its upper bound: of products one of which was wanted, or of none."""
    forecast = case.forecast
    if forecast is None:
        return
    by_label = _weighable(case, forecast)
    for index, line in enumerate(case.record.outcome.measured):
        if not _is_a_yield(line) or not all(label in by_label for label in line.of or ()):
            continue
        paths = [by_label[label] for label in line.of or ()]
        if any(is_desired(case, path) for path in paths) is not wanted:
            continue
        bounds = _bounds_of(case, forecast, paths)
        most = 100 * bounds.high * forecast.conversion_interval[1]
        seen = line.yield_.magnitude if line.yield_ is not None else 0.0
        spread = line.spread.magnitude if line.spread is not None else 0.0
        is_little = not wanted and seen <= 100 * OUT_OF_QUESTION
        if not is_little and seen - max(MARGIN_PERCENT, spread) > most:
            yield Fault(
                at=("outcome", "measured", index, "yield"),
                message=f"the record gives {line.yield_} of {'+'.join(line.of or ())}; the engine expects"
                f" {f'{_text(bounds)} of what reacts, and ' if forecast.products else ''}{_conversion(forecast)}",
                mend=_mend(rule_id),
                data={"at_most_percent": round(most, 1)},
            )


def _is_a_yield(line: Measurement) -> bool:
    seen = line.yield_
    return seen is not None and line.kind is not YieldKind.AREA and not seen.is_upper_limit


def _weighable(case: Case, forecast: Forecast) -> dict[str, Path]:
    """Return the paths of the products that the engine has, or could have, among its own, by label."""
    found = {}
    for path, routes in routes_by_product(case).items():
        drawn = case.structures[path]
        if path != SOUGHT and (
            _is_in_reach(routes) or any(is_same_product(drawn, each.structure) for each in forecast.products)
        ):
            found[case.record.outcome.products[int(path[-1])].label] = path
    return found


def _share_by(forecast: Forecast, made: Container[Forecasted], courses: Container[Course]) -> Bounds:
    """Return the share of some products that form by one of these courses."""
    return share_bounds(forecast, lambda each: each in made and each.course in courses, ())


def _bounds_of(case: Case, forecast: Forecast, paths: Iterable[Path]) -> Bounds:
    """Return the share of some products of the record; where none is forecast because hardly anything reacts, all."""
    if not forecast.products:
        return Bounds(1.0, 0.0, 1.0)
    drawn = {path: case.structures[path] for path in paths}
    routes = routes_by_product(case)
    may_give = {mechanism for path in drawn for route in routes[path] for mechanism in _BY_EVENT[route.events[-1]]}
    return share_bounds(
        forecast, lambda each: any(is_same_product(one, each.structure) for one in drawn.values()), may_give
    )


_BY_EVENT: dict[Event, frozenset[Mechanism]] = {
    event: {Event.ELIMINATION: ELIMINATIONS, Event.ADDITION: frozenset({Mechanism.ADE})}.get(event, SUBSTITUTIONS)
    for event in Event
}
"""The mechanisms that may lie behind the last event of a route."""
_FURTHER_STEPS = frozenset({Event.FRAGMENTATION, Event.HYDROLYSIS})
_DISPLACEMENTS = frozenset(
    {Event.SUBSTITUTION, Event.TRANSPOSITION, Event.RING_CLOSURE, Event.ELIMINATION, Event.ADDITION}
)


def _is_in_reach(routes: tuple[Route, ...]) -> bool:
    """Say whether a product forms in one displacement, elimination or addition and is not the group that leaves."""
    return any(map(_is_one_step, routes))


def _is_one_step(route: Route) -> bool:
    is_cationic = Event.IONISATION in route.events
    steps = [event for event in route.events if event in _DISPLACEMENTS]
    if is_cationic:  # the other end of an allyl cation is no further step
        steps = [event for event in steps if event is not Event.TRANSPOSITION] or steps[:1]
    is_product = is_cationic or bool(route.arrives) or route.effect is not StereoEffect.NOT_APPLICABLE
    return len(steps) == 1 and _FURTHER_STEPS.isdisjoint(route.events) and is_product


# --- words ----------------------------------------------------------------------------------------------------


def _mend(rule_id: str) -> str:
    return f"correct one of them, or accept {rule_id} with a reason"


def _text(bounds: Bounds) -> str:
    return expected_text(bounds.share, (bounds.low, bounds.high))


def _conversion(forecast: Forecast) -> str:
    return f"{expected_text(forecast.conversion, forecast.conversion_interval)} conversion in this time"


def _main_of(forecast: Forecast) -> str:
    main = forecast.products[0]
    bounds = share_bounds(forecast, lambda each: each.structure == main.structure)
    return f"{main.structure} by {main.mechanism}, {_text(bounds)} of what reacts"


def _label(case: Case, path: Path) -> str:
    product = case.record.outcome.products[int(path[-1])]
    return f"{product.name} ({product.label})"
