"""The engine: a question in, a forecast out.

Gates decide which pathways are open, the log-rate model how fast each runs, the kinetics what is left and what has
formed in the stated time. Products are built for the pathways that matter only.
"""

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace
from itertools import islice

from builder.chemistry.perception import Hybridisation, ReactiveSite, perceive_sites
from builder.chemistry.structure import Structure
from builder.mechanism.departure import Departure, departures
from builder.mechanism.flask import Flask, fill_flask
from builder.mechanism.forecast import Z90, Contribution, Forecast, Forecasted, PathwayReport, Reason
from builder.mechanism.kinetics import Flow, Kinetics
from builder.mechanism.log_rate import combined, root_of_squares
from builder.mechanism.pathways.addition import addition_pathways
from builder.mechanism.pathways.elimination import e1cb_pathways, e2_pathways
from builder.mechanism.pathways.ionisation import ionisation_pathways, sni_pathways
from builder.mechanism.pathways.participation import participation_pathways
from builder.mechanism.pathways.pathway import Outcome, Pathway
from builder.mechanism.pathways.substitution import sn2_pathways
from builder.mechanism.question import Question
from builder.mechanism.rate_terms import Parameters, fitted_parameters
from builder.mechanism.rules import closing_gates
from builder.records.vocabulary import Course, Mechanism

__all__ = ["NEGLIGIBLE", "SLOWEST_CONVERSION", "open_pathways", "predict"]

SLOWEST_CONVERSION = 0.05
"""Conversion in the stated time below which the answer is `none`."""
NEGLIGIBLE = 3e-3
"""Share of converted substrate below which a pathway's products are not built."""
HALF_USED = 0.5
"""Part of a reagent that a second step finds on average, where the first has used the other."""
TOO_SLOW = 4.0
"""log10 units below the fastest pathway at which an ionisation is not worth the search for its cation's shifts."""
_NO_FLOW = 1e-9
"""Share of all flow below which a pathway is dropped before the kinetics."""
_LN10 = math.log(10.0)


def predict(question: Question, parameters: Parameters | None = None) -> Forecast:
    """Return the forecast for a question; parameters: the fitted ones unless others are given."""
    terms = fitted_parameters() if parameters is None else parameters
    flask = fill_flask(question, terms)
    structure = question.substrate
    reason = _why_not_covered(structure, flask)
    if reason is not None:
        return _not_covered(reason)
    found = open_pathways(structure, flask, terms, question.temperature_k, all_of_them=False)
    pathways = [pathway for pathway in found if not pathway.returns]
    if not pathways:
        return _closed(structure, flask, terms)
    return _weighed(question, flask, pathways, terms)


def open_pathways(
    structure: Structure, flask: Flask, parameters: Parameters, temperature_k: float, *, all_of_them: bool = True
) -> Iterator[Pathway]:
    """Yield every pathway that no gate closes.

    all_of_them: False leaves out ionisations that are too slow to matter beside what has been found at any site.
    """
    found: list[Pathway] = []
    ways = [d for d in departures(structure, flask, parameters) if "acyl" not in d.site.classes]
    for departure in ways:
        found += sn2_pathways(departure, flask, parameters)
        found += e2_pathways(departure, flask, parameters)
        found += e1cb_pathways(departure, flask, parameters)
        found += sni_pathways(departure, flask, parameters)
        found += participation_pathways(departure, flask, parameters)
    floor = None if all_of_them else _floor(found, flask, temperature_k)
    for departure in ways:
        found += ionisation_pathways(departure, flask, parameters, temperature_k, floor)
    found += addition_pathways(structure, flask, parameters, temperature_k)
    yield from found


def _floor(pathways: Sequence[Pathway], flask: Flask, temperature_k: float) -> float | None:
    """Return log10 of the flow, 1/s, below which a further pathway would not matter; None without any flow."""
    flows = [p.rate.log10_k(temperature_k) + math.log10(max(1e-30, flask.on_hand(p.pool))) for p in pathways]
    return max(flows) - TOO_SLOW if flows else None


# --- what is not covered, and what is closed ------------------------------------------------------------------


def _why_not_covered(structure: Structure, flask: Flask) -> Reason | None:
    sites = perceive_sites(structure)
    leaving = [s for s in sites if not s.is_addition]
    adds = any(s.is_addition for s in sites)
    convention = "record-format"
    if not leaving and not (adds and flask.is_bronsted_acid):
        what = "no leaving group, and no multiple bond beside an acid" if adds else "no leaving group"
        return Reason("not-covered", f"not covered: the substrate has {what}", None, None, convention)
    if leaving and all("acyl" in s.classes for s in leaving) and not adds:
        text = "not covered: substitution at an acyl carbon goes by addition and loss, outside this book"
        return Reason("not-covered", text, None, None, convention)
    if flask.has_peroxide and adds and flask.is_bronsted_acid and not leaving:
        text = "not covered: with a peroxide hydrogen bromide adds by a radical chain, outside this book"
        return Reason("not-covered", text, None, None, convention)
    return None


def _not_covered(reason: Reason) -> Forecast:
    return Forecast(
        is_covered=False,
        mechanism=Mechanism.NONE,
        shares={},
        intervals={},
        log_k={},
        log_k_errors={},
        half_life_s=None,
        t95_s=None,
        t99_s=None,
        conversion=0.0,
        conversion_interval=(0.0, 0.0),
        products=(),
        pathways=(),
        reasons=(reason,),
    )


def _closed(structure: Structure, flask: Flask, parameters: Parameters) -> Forecast:
    """Return the answer where gates close everything, or nothing in the flask can act."""
    found = list(_gate_reasons(departures(structure, flask, parameters)))
    if not found:
        found = [Reason("nothing-acts", "nothing in the flask attacks or takes a proton", None, None, "record-format")]
    return replace(_not_covered(found[0]), is_covered=True, reasons=tuple(found))


def _gate_reasons(found: Iterable[Departure]) -> Iterator[Reason]:
    seen: set[str] = set()
    for departure in found:
        for mechanism in Mechanism:
            for gate in closing_gates(mechanism, departure.situation):
                if gate.rule.id not in seen:
                    seen.add(gate.rule.id)
                    text = f"{mechanism.value} at {departure.site.leaving_group}: {gate.rule.title}"
                    yield Reason(gate.rule.id, text, None, None, gate.rule.source)


# --- weighing -------------------------------------------------------------------------------------------------


def _weighed(question: Question, flask: Flask, pathways: list[Pathway], parameters: Parameters) -> Forecast:
    temperature = question.temperature_k
    constants = [10 ** max(-300.0, min(60.0, p.rate.log10_k(temperature))) for p in pathways]
    flows = [k * flask.on_hand(p.pool) for p, k in zip(pathways, constants, strict=True)]
    total = math.fsum(flows)
    kept = [place for place, flow in enumerate(flows) if total > 0 and flow > _NO_FLOW * total]
    if not kept:
        return _closed(question.substrate, flask, parameters)
    chosen = [pathways[place] for place in kept]
    kinetics = Kinetics(
        question.concentration_m,
        flask.pools,
        tuple(Flow(constants[place], pathways[place].pool) for place in kept),
    )
    conversion = kinetics.conversion_at(question.time_s)
    yields = kinetics.yields_at(question.time_s)
    whole = math.fsum(yields)
    weights = [y / whole for y in yields] if whole > 0 else [flows[place] / total for place in kept]
    shares = _by_mechanism(chosen, weights)
    mechanism = max(shares, key=lambda m: shares[m]) if conversion >= SLOWEST_CONVERSION else Mechanism.NONE
    slopes = [p.rate.slopes(temperature) if w > 1e-4 else {} for p, w in zip(chosen, weights, strict=True)]
    intervals = {m: _interval(m, chosen, weights, slopes) for m in shares}
    spread = root_of_squares(s * e for s, e in combined(zip(weights, slopes, strict=True)).values())
    factor = 10 ** (Z90 * spread)
    log_k, errors = _log_k(chosen, [constants[place] for place in kept], weights, temperature)
    drawn_as = question.substrate if flask.is_achiral else None
    products = () if mechanism is Mechanism.NONE else _products(drawn_as, chosen, weights, mechanism)
    if products:
        products = _second_steps(products, question, flask, parameters)
    return Forecast(
        is_covered=True,
        mechanism=mechanism,
        shares=shares,
        intervals=intervals,
        log_k=log_k,
        log_k_errors=errors,
        half_life_s=kinetics.time_to(0.5),
        t95_s=kinetics.time_to(0.95),
        t99_s=kinetics.time_to(0.99),
        conversion=conversion,
        conversion_interval=(
            kinetics.conversion_at(question.time_s / factor),
            kinetics.conversion_at(question.time_s * factor),
        ),
        products=products,
        pathways=_reports(chosen, weights, temperature),
        reasons=_reasons(question, flask, chosen, weights, parameters),
    )


def _by_mechanism(pathways: Sequence[Pathway], weights: Sequence[float]) -> dict[Mechanism, float]:
    shares: dict[Mechanism, float] = {}
    for pathway, weight in zip(pathways, weights, strict=True):
        shares[pathway.mechanism] = shares.get(pathway.mechanism, 0.0) + weight
    whole = math.fsum(shares.values())
    ordered = sorted(shares.items(), key=lambda item: (-item[1], item[0].value))
    return {m: share / whole for m, share in ordered if share / whole >= 1e-6 or m is ordered[0][0]}


def _interval(
    mechanism: Mechanism,
    pathways: Sequence[Pathway],
    weights: Sequence[float],
    slopes: Sequence[dict[str, tuple[float, float]]],
) -> tuple[float, float]:
    """Return the 90 % interval of a share: the errors of all terms carried to its logit, where they are symmetric."""
    mine = math.fsum(w for p, w in zip(pathways, weights, strict=True) if p.mechanism is mechanism)
    if mine <= 0 or mine >= 1:
        return (mine, mine) if mine <= 0 else (1.0, 1.0)
    weighted = [
        (w / mine if p.mechanism is mechanism else -w / (1 - mine), s)
        for p, w, s in zip(pathways, weights, slopes, strict=True)
    ]
    error = _LN10 * root_of_squares(slope * e for slope, e in combined(weighted).values())
    logit = math.log(mine / (1 - mine))
    return _logistic(logit - Z90 * error), _logistic(logit + Z90 * error)


def _logistic(x: float) -> float:
    return 1 / (1 + math.exp(-x)) if x > -700 else 0.0


def _log_k(
    pathways: Sequence[Pathway], constants: Sequence[float], weights: Sequence[float], temperature_k: float
) -> tuple[dict[str, float], dict[str, float]]:
    """Return log10 k by label, of the partner with the largest flow, ways and sites added up; and standard errors."""
    by_label: dict[str, dict[str | None, list[int]]] = {}
    for place, pathway in enumerate(pathways):
        by_label.setdefault(pathway.label, {}).setdefault(pathway.partner, []).append(place)
    values, errors = {}, {}
    for label, partners in by_label.items():
        solvent_like = label.endswith("solvent") or None in partners
        flow = {partner: math.fsum(weights[i] for i in places) for partner, places in partners.items()}
        best = max(flow, key=lambda partner: (flow[partner], str(partner)))
        places = [i for each in partners.values() for i in each] if solvent_like else partners[best]
        values[label] = math.log10(math.fsum(constants[i] for i in places))
        main = max(places, key=lambda i: constants[i])
        errors[label] = pathways[main].rate.error(temperature_k)
    return dict(sorted(values.items())), dict(sorted(errors.items()))


def _products(
    achiral: Structure | None, pathways: Sequence[Pathway], weights: Sequence[float], mechanism: Mechanism
) -> tuple[Forecasted, ...]:
    """Return the products, those of the main mechanism first, then by share.

    achiral: the substrate, where nothing charged is chiral, so that a chiral product is a racemate.
    """
    found: dict[tuple[str, Mechanism], Forecasted] = {}
    for pathway, weight in zip(pathways, weights, strict=True):
        if weight < NEGLIGIBLE:
            continue
        for outcome in pathway.outcomes():
            _add(found, outcome if achiral is None else _as_racemate(outcome, achiral), weight, pathway.mechanism)
    ordered = sorted(
        found.values(), key=lambda f: (f.mechanism is not mechanism, -round(f.share, 9), f.structure.smiles)
    )
    return tuple(ordered)


def _as_racemate(outcome: Outcome, substrate: Structure) -> Outcome:
    """Return what an achiral substrate gives as chemists draw it: one stereocentre flat, more as one enantiomer."""
    product = outcome.product
    if substrate.stereocentres.unspecified or not substrate.is_achiral or not product.stereocentres.specified:
        return outcome
    if product.stereocentres.total == 1:
        return replace(outcome, product=product.without_stereocentres)
    return replace(outcome, product=min(product, product.mirror_image))


def _add(found: dict[tuple[str, Mechanism], Forecasted], outcome: Outcome, weight: float, mechanism: Mechanism) -> None:
    key = (outcome.product.smiles, mechanism)
    known = found.get(key)
    share = weight * outcome.share
    if known is None:
        found[key] = Forecasted(outcome.product, share, mechanism, outcome.course, outcome.rearranged, outcome.path)
        return
    major = known if known.share >= share else replace(known, course=outcome.course, path=outcome.path)
    found[key] = replace(major, share=known.share + share, rearranged=known.rearranged and outcome.rearranged)


# --- second steps ---------------------------------------------------------------------------------------------


def _second_steps(
    products: tuple[Forecasted, ...], question: Question, flask: Flask, parameters: Parameters
) -> tuple[Forecasted, ...]:
    """Return the products after a second elimination or addition, where reagent is left and it runs in the time."""
    left = question.equivalents - 1.0 if question.equivalents is not None else 1.0
    adds = products[0].mechanism is Mechanism.ADE
    if left <= 0.05 or (adds and question.equivalents is None):
        return products
    found: list[Forecasted] = []
    for product in products:
        steps = _next_pathways(product, flask, parameters, question.temperature_k)
        if product.share < 0.05 or not steps:
            found.append(product)
            continue
        found += _gone_on(product, steps, question, flask, min(1.0, left))
    main = products[0].mechanism
    merged: dict[str, Forecasted] = {}
    for each in found:
        known = merged.get(f"{each.structure.smiles} {each.mechanism}")
        merged[f"{each.structure.smiles} {each.mechanism}"] = (
            each if known is None else replace(known, share=known.share + each.share)
        )
    return tuple(
        sorted(merged.values(), key=lambda f: (f.mechanism is not main, -round(f.share, 9), f.structure.smiles))
    )


def _next_pathways(product: Forecasted, flask: Flask, parameters: Parameters, temperature_k: float) -> list[Pathway]:
    if product.mechanism is Mechanism.E2:
        sites = perceive_sites(product.structure)
        if not any(_loses_again(site) for site in sites):
            return []
        found = departures(product.structure, flask, parameters)
        return [p for d in found if _loses_again(d.site) for p in e2_pathways(d, flask, parameters)]
    if product.mechanism is Mechanism.ADE:
        return list(addition_pathways(product.structure, flask, parameters, temperature_k))
    return []


def _loses_again(site: ReactiveSite) -> bool:
    """Say whether a second elimination starts here: at a vinylic halide, or at an allylic one, to a diene."""
    if site.is_addition or not site.beta_with_hydrogen:
        return False
    return site.hybridisation is Hybridisation.SP2 or "allylic" in site.classes


def _gone_on(
    product: Forecasted, steps: list[Pathway], question: Question, flask: Flask, left: float
) -> Iterator[Forecasted]:
    """Yield a product and what it goes on to: as much as runs in the time and as reagent is left for."""
    rates = [
        10 ** p.rate.log10_k(question.temperature_k) * flask.on_hand(p.pool) * (HALF_USED if p.pool else 1.0)
        for p in steps
    ]
    total = math.fsum(rates)
    share = min(left, -math.expm1(-total * question.time_s))
    if share < 0.01:
        yield product
        return
    yield replace(product, share=product.share * (1 - share))
    for pathway, rate in zip(steps, rates, strict=True):
        if rate < NEGLIGIBLE * total:
            continue
        for outcome in pathway.outcomes():
            yield Forecasted(
                outcome.product,
                product.share * share * rate / total * outcome.share,
                product.mechanism,
                Course.NOT_APPLICABLE,
                product.rearranged,
                (*product.path, "second " + outcome.path[-1]),
            )


# --- reasons --------------------------------------------------------------------------------------------------


def _reports(pathways: Sequence[Pathway], weights: Sequence[float], temperature_k: float) -> tuple[PathwayReport, ...]:
    found = []
    for pathway, weight in sorted(zip(pathways, weights, strict=True), key=lambda pair: -pair[1]):
        if weight < NEGLIGIBLE:
            continue
        found.append(
            PathwayReport(
                mechanism=pathway.mechanism,
                label=pathway.label,
                event=pathway.event,
                leaving_group=pathway.leaving_group,
                partner=pathway.partner,
                log10_k=pathway.rate.log10_k(temperature_k),
                error=pathway.rate.error(temperature_k),
                share=weight,
                contributions=tuple(Contribution.of(term) for term in pathway.rate.terms),
            )
        )
    return tuple(found)


def _reasons(
    question: Question, flask: Flask, pathways: Sequence[Pathway], weights: Sequence[float], parameters: Parameters
) -> tuple[Reason, ...]:
    """Return what an answer rests on: how the flask was read, the main pathways, the gates, what is only estimated."""
    found = [
        Reason("acid-spends-nucleophile", f"the acid has taken {name}", None, None, "march-2013")
        for name in flask.spent
    ]
    left = departures(question.substrate, flask, parameters)
    found += [
        Reason("group-activated", f"{departure.site.leaving_group}: {departure.how}", None, None, "march-2013")
        for departure in left
        if departure.how
    ]
    ranked = sorted(zip(pathways, weights, strict=True), key=lambda pair: -pair[1])
    for pathway, weight in ranked[:4]:
        if weight >= 0.01:
            text = f"{pathway.mechanism.value}: {pathway.event} ({weight:.0%} of what reacts)"
            log = pathway.rate.log10_k(question.temperature_k)
            error = pathway.rate.error(question.temperature_k)
            found.append(Reason("pathway", text, log, error, "estimated-here"))
    main = ranked[0][0]
    for term in sorted(main.rate.terms, key=lambda t: -abs(t.contribution))[:6]:
        if abs(term.contribution) >= 0.05:
            found.append(Reason(term.key, term.meaning, term.contribution, abs(term.factor) * term.error, term.source))
    found += islice(_gate_reasons(left), 6)
    for attacker in flask.nucleophiles:
        if attacker.n_error > 0.35 and attacker.name == main.partner:
            text = f"{attacker.name} is placed by its class ({attacker.kind.name}), so the error is wide"
            found.append(Reason("placed-by-class", text, attacker.n, attacker.n_error, attacker.n_source))
    return tuple(found)
