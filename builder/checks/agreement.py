"""The record against what its structures allow: atoms, products, course, mechanism."""

import re
from collections import Counter
from collections.abc import Iterator, Sequence

from builder.checks.case import Case
from builder.checks.derivation import SOUGHT, expected_product, is_desired, product_paths, routes_by_product, search
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import NO_LEAVING_GROUP
from builder.chemistry.structure import Structure
from builder.chemistry.transform import StereoEffect
from builder.finding import Level
from builder.mechanism.outlook import OUT_OF_QUESTION, expected_text
from builder.mechanism.products import MEET_IN_ONE_PRODUCT, Event, Route
from builder.mechanism.rules import Gate, closing_gates
from builder.records.specimen import outcome_example
from builder.records.vocabulary import ELIMINATIONS, SUBSTITUTIONS, Course, Mechanism, Result, StereoKind
from builder.rule import Fault, Path, rule

__all__ = [
    "AGREEMENT_CHECKS",
    "AGREEMENT_READS",
    "CONTRARY_RULES",
    "claimed_courses",
    "course_path",
    "is_covered",
]

CONTRARY_RULES = frozenset(
    {
        "by-product-outside-forecast",
        "claim-against-product",
        "conversion-above-forecast",
        "course-against-mechanism",
        "course-not-forecast",
        "mechanism-contrary",
        "no-reaction-against-forecast",
        "product-not-forecast",
        "product-not-reachable",
        "rate-constant-against-forecast",
        "ratio-against-forecast",
        "rearrangement-not-named",
        "yield-above-forecast",
    }
)
"""Rules whose findings mean that record and engine disagree; the verdict of an entry follows from them."""

AGREEMENT_READS = ("structure-unreadable", "leaving-group-not-found", "leaving-group-unknown")
"""Rules that must be silent before a record is compared with what its structures allow."""


_NOT_BY_SN2 = {
    Course.RETENTION: "which inverts: two inversions are NGP or two exchanges, an ion pair is SN1",
    Course.RACEMISATION: "which inverts: racemisation is SN1, exchange or epimerisation afterwards",
    Course.PARTIAL_INVERSION: "and the basis does not say where the rest was lost",
}
_CAUSE_OF_LOSS = re.compile(
    r"\b(exchang\w*|epimeri\w*|racemi\w*|ioni[sz]\w*|ion[- ]pair\w*|ee\b.*\b(time|conversion|fall\w*|fell|drop\w*))"
)
"""How a basis names what took the configuration: the cause, or that the ee falls as the reaction runs."""
_NET = {
    Course.INVERSION: {"inversion"},
    Course.RETENTION: {"retention"},
    Course.DOUBLE_INVERSION: {"retention"},
    Course.ANTI: {"anti"},
    Course.SYN: {"syn"},
}
"""What the drawings show under each course."""


def _chiral(product: str, course: str, mechanism: str = "SN2") -> str:
    return (
        "substrate: {name: (S)-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, class: secondary,"
        " leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\noutcome:\n"
        f"  result: [substitution]\n  claim: {{mechanism: {mechanism}, course: {course}}}\n"
        f"  products: [{{label: A, name: 2-azidobutane, smiles: '{product}', use: desired}}]\n"
        "  measured: [{yield: 81 %, of: A, kind: assay}]"
    )


def _product(smiles: str, more: str = "") -> str:
    product = f"{{label: A, name: the product, smiles: '{smiles}', use: desired}}"
    return outcome_example("{yield: 81 %, of: A, kind: assay}", products=product, more=more)


_PENTYL = (
    "substrate: {name: 2-bromopentane, smiles: 'CCCC(C)Br', class: secondary, leaving_group: bromide, mass: 1.51 g}\n"
    "stages: [{temperature: 60 °C, time: 16 h}]\n"
)
_PRIMARY = (
    "substrate: {name: 1-bromobutane, smiles: CCCCBr, class: primary, leaving_group: bromide, amount: 10 mmol}\n"
    "stages: [{temperature: 60 °C, time: 16 h}]\n"
)


_BRIDGEHEAD = (
    "substrate: {name: 1-bromonorbornane, smiles: BrC12CCC(CC1)C2, class: [tertiary, bridgehead],"
    " leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
    + _product("[N-]=[N+]=NC12CCC(CC1)C2")
)


@rule(
    id="claim-against-product",
    title="The claim is of another kind than the product",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*AGREEMENT_READS, "product-not-reachable", "element-from-nowhere"),
    fires_on=(_product("C=CCC", "claim: {mechanism: SN2}"),),
    silent_on=(_product("CCC(C)N=[N+]=[N-]", "claim: {mechanism: SN2}"),),
)
def claim_is_against_the_product(case: Case) -> Iterator[Fault]:
    """A substitution gives a substituted product, an elimination an alkene or alkyne.

    The desired products decide: if every way to all of them ends in the other kind of event, the claim is of
    another reaction.
    """
    claim = case.record.outcome.claim
    wanted = [routes for path, routes in routes_by_product(case).items() if is_desired(case, path) and routes]
    if claim is None or not wanted:
        return
    endings = {route.eliminates for routes in wanted for route in routes}
    kinds = {True: ELIMINATIONS, False: SUBSTITUTIONS}
    for eliminates, mechanisms in kinds.items():
        if claim.mechanism in mechanisms and endings == {not eliminates}:
            found = "an elimination" if not eliminates else "a substitution"
            yield Fault(
                at=("outcome", "claim", "mechanism"),
                message=f"{claim.mechanism} is claimed, but the desired product comes of {found}",
                mend="correct the mechanism or the product, or accept claim-against-product with a reason",
            )


@rule(
    id="course-against-mechanism",
    title="A course that the claimed mechanism does not take",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*AGREEMENT_READS, "course-twice", "course-contradicts-structure", "course-without-stereocentre"),
    fires_on=(
        _chiral("CC[C@H](C)N=[N+]=[N-]", "retention"),
        _chiral("CC[C@@H](C)N=[N+]=[N-]", "partial inversion"),
        _chiral("CCC(C)N=[N+]=[N-]", "racemisation"),
        _chiral("CC[C@@H](C)N=[N+]=[N-]", "partial inversion, basis: [see notebook, full conversion after 16 h]"),
    ),
    silent_on=(
        _chiral("CC[C@@H](C)N=[N+]=[N-]", "inversion"),
        _chiral("CC[C@H](C)N=[N+]=[N-]", "retention", "NGP"),
        _chiral("CC[C@@H](C)N=[N+]=[N-]", "partial inversion, basis: ee falls as bromide exchanges"),
    ),
)
def course_is_against_the_mechanism(case: Case) -> Iterator[Fault]:
    """SN2 inverts.

    Retention needs two inversions (NGP), ion pairs (SN1) or a second exchange. Racemisation is SN1, exchange or
    epimerisation afterwards. Partial inversion under SN2 needs its cause in the basis.
    """
    claim = case.record.outcome.claim
    if claim is None or claim.mechanism is not Mechanism.SN2 or claim.course not in _NOT_BY_SN2:
        return
    basis = " ".join(claim.basis or ()).lower()
    if claim.course is Course.PARTIAL_INVERSION and _CAUSE_OF_LOSS.search(basis):
        return
    yield Fault(
        at=("outcome", "claim", "course"),
        message=f"{claim.course} is claimed under SN2, {_NOT_BY_SN2[claim.course]}",
        mend="correct the mechanism or the course, or accept course-against-mechanism with a reason",
    )


@rule(
    id="course-contradicts-structure",
    title="The drawings show another course than the claim",
    source="iupac-gold",
    needs=(*AGREEMENT_READS, "course-twice", "stereo-contradicts-structure"),
    fires_on=(_chiral("CC[C@H](C)N=[N+]=[N-]", "inversion"), _chiral("CC[C@@H](C)N=[N+]=[N-]", "retention")),
    silent_on=(_chiral("CC[C@@H](C)N=[N+]=[N-]", "inversion"), _chiral("CC[C@H](C)N=[N+]=[N-]", "retention", "NGP")),
)
def course_contradicts_structure(case: Case) -> Iterator[Fault]:
    """The course claimed is the one that the drawn configurations of substrate and product show.

    Judged by mapped atoms and the parity of their neighbours, never by R and S: those letters depend on priorities
    and may stay the same through an inversion. Double inversion counts as retention.
    """
    for path, course in claimed_courses(case):
        structure = case.structures.get(path)
        product = case.record.outcome.products[int(path[-1])]
        if structure is None or product.stereo in {StereoKind.RACEMATE, StereoKind.NOT_DETERMINED}:
            continue
        shown = _shown_effects(structure, routes_by_product(case).get(path, ()))
        if shown and course in _NET and not shown & _NET[course]:
            words = " or ".join(sorted(shown))
            yield Fault(
                at=course_path(case, path),
                message=f"{course} is claimed, but the drawings of substrate and product {product.label} show {words}",
                mend="correct the drawing of the product, or the course",
            )


@rule(
    id="course-without-stereocentre",
    title="A course where nothing could show it",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*AGREEMENT_READS, "course-twice"),
    fires_on=(
        _PRIMARY + _product("CCCCN=[N+]=[N-]", "claim: {mechanism: SN2, course: inversion}"),
        _product("CCC(C)N=[N+]=[N-]", "claim: {mechanism: SN2, course: inversion}"),
    ),
    silent_on=(_chiral("CC[C@@H](C)N=[N+]=[N-]", "inversion"),),
)
def course_has_no_stereocentre(case: Case) -> Iterator[Fault]:
    """Inversion, retention or racemisation is claimed only where the reacting carbon is a stereocentre that shows it.

    Elsewhere the course is `not applicable`; it is `not determined` where a racemate with that one stereocentre hides
    it: both mirror images come out, whatever happened to each.
    """
    marks = {each.site.alpha_carbon in each.on.stereocentre_marks for each in case.sites}
    if not marks:
        return
    told = {Course.INVERSION, Course.RETENTION, Course.RACEMISATION, Course.PARTIAL_INVERSION, Course.DOUBLE_INVERSION}
    claim = case.record.outcome.claim
    if claim is None or claim.course not in told:
        return
    at: Path = ("outcome", "claim", "course")
    if True not in marks:
        message = f"{claim.course} is claimed, but the reacting carbon is no stereocentre"
        yield Fault(at=at, message=message, mend="write course: not applicable", fix=str(Course.NOT_APPLICABLE))
    elif _is_plain_racemate(case):
        message = f"{claim.course} is claimed of a racemate with one stereocentre, which cannot show it"
        mend = "write course: not determined, or correct stereo: of the substrate"
        yield Fault(at=at, message=message, mend=mend, fix=str(Course.NOT_DETERMINED))


def _is_plain_racemate(case: Case) -> bool:
    is_racemate = case.record.substrate.stereo is StereoKind.RACEMATE
    return is_racemate and len(case.substrate.stereocentre_marks) == 1


@rule(
    id="element-from-nowhere",
    title="A product with atoms that nobody charged",
    source="common-practice",
    needs=("structure-unreadable", "solvent-unknown"),
    fires_on=(_product("CCC(C)Cl"),),
    silent_on=(_product("CCC(C)N=[N+]=[N-]"),),
)
def element_comes_from_nowhere(case: Case) -> Iterator[Fault]:
    """Every element of a product was charged, and there is carbon enough for it.

    Atoms are conserved: a chlorine in the product was in the flask. Hydrogen is not counted, air and moisture
    are no reagents. The counter-ion of a product may come of the work-up, where there is one.
    """
    if case.has_undrawn_species:
        return
    have: Counter[str] = Counter()
    for structure in (*case.flask, case.substrate):
        for element, number in structure.elements.items():
            have[element] += MEET_IN_ONE_PRODUCT * number
    for path in product_paths(case):
        product = case.structures[path] if case.record.work_up is None else case.structures[path].without_counter_ions
        extra = Counter(product.elements) - have
        if extra:
            element = min(extra)
            absent = not have[element]
            yield Fault(
                at=(*path, "smiles"),
                message=f"{element} in the product was not charged"
                if absent
                else f"not enough {element} was charged for this",
                mend="correct the product, or list the reagent it comes from",
            )


@rule(
    id="mechanism-contrary",
    title="A claimed mechanism that the engine cannot defend",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*AGREEMENT_READS, "claim-against-product"),
    fires_on=(
        "substrate: {name: tert-butyl bromide, smiles: 'CC(C)(C)Br', class: tertiary, leaving_group: bromide,"
        " amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
        + _product("CC(C)(C)N=[N+]=[N-]", "claim: {mechanism: SN2}"),
        _product("CCC(C)N=[N+]=[N-]", "claim: {mechanism: SN1}"),
    ),
    silent_on=(_product("CCC(C)N=[N+]=[N-]", "claim: {mechanism: SN2}"),),
)
def mechanism_is_contrary(case: Case) -> Iterator[Fault]:
    """The claimed mechanism is open at a carbon that bears the leaving group, and fast enough to take part.

    A closed gate is a statement about what is possible at all. Where all are open, the share that the engine forecasts
    decides: the claim is questioned if even the upper end of its 90 % interval is below 5 %. Observation outranks both:
    with good evidence the entry accepts this query, says why, and becomes one of the most valuable of the book.
    """
    claim = case.record.outcome.claim
    gates = _gates_against_the_claim(case)
    mend = "correct the claim or the structure, or accept mechanism-contrary with a reason"
    at = ("outcome", "claim", "mechanism")
    if claim is not None and gates:
        yield Fault(
            at=at,
            message=f"{claim.mechanism} is claimed, and the engine holds it closed: {_named(gates)}",
            mend=mend,
            data={"gates": sorted(gate.rule.id for gate in gates)},
        )
    elif claim is not None and claim.mechanism is not Mechanism.NONE and case.forecast is not None:
        shares = case.forecast.shares
        share = shares.get(claim.mechanism, 0.0)
        low, high = case.forecast.intervals.get(claim.mechanism, (0.0, 0.0))
        if shares and high < OUT_OF_QUESTION:
            main = max(shares, key=lambda mechanism: shares[mechanism])
            yield Fault(
                at=at,
                message=f"the record claims {claim.mechanism}; the engine expects"
                f" {main} for {expected_text(shares[main], case.forecast.intervals[main])}"
                f" and {claim.mechanism} for {expected_text(share, (low, high))}",
                mend=mend,
                data={"share": share, "expected": str(main)},
            )


def _gates_against_the_claim(case: Case) -> tuple[Gate, ...]:
    """Return the gates that close the claimed mechanism at every site in play; empty where it is open at one."""
    claim = case.record.outcome.claim
    if claim is None:
        return ()
    shut = [closing_gates(claim.mechanism, each.situation) for each in case.sites]
    return tuple(dict.fromkeys(gate for gates in shut for gate in gates)) if all(shut) else ()


def _named(gates: Sequence[Gate]) -> str:
    return "; ".join(f"{gate.rule.title} ({gate.rule.id})" for gate in gates)


@rule(
    id="product-not-reachable",
    title="A product that does not follow",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(
        *AGREEMENT_READS,
        *("element-from-nowhere", "centre-out-of-scope", "leaving-group-in-product", "nucleophile-not-in-product"),
    ),
    fires_on=(_product("CCCN=[N+]=[N-]"), _BRIDGEHEAD),
    silent_on=(_product("CCC(C)N=[N+]=[N-]"), _product("C=CCC")),
)
def product_is_not_reachable(case: Case) -> Iterator[Fault]:
    """A product follows from the substrate and what was charged, by a way that no gate closes.

    Sought in one or two events: substitution at the declared group, elimination, up to three shifts of a cation,
    allylic transposition, ring closure and opening, addition, fragmentation. A product beyond that is usually a slip
    in a SMILES; what the engine expects instead is named.

    Some last steps are known besides: Ritter, Kornblum and Hass–Bender, the hydrolysis of iminium and isothiouronium
    salts, loss of carbon dioxide. Known limits, to be accepted with a reason: any other hydrolysis or oxidation as the
    last event (acetals, orthoesters, Delépine); attack on a carbonyl group (Darzens, Favorskii, acylation); attack by
    an arene or alkene of another molecule (Friedel–Crafts) and cation–olefin cyclisation; three reagents that meet in
    one product; silyl groups that move.
    """
    if case.has_undrawn_species or not _has_partner(case):
        return
    is_contrary = bool(_gates_against_the_claim(case))
    was_cut = search(case).was_cut
    for path, routes in routes_by_product(case).items():
        if not routes and was_cut:
            yield Fault(
                at=(*path, "smiles"),
                message="too many ways to try them all: whether this product follows is not known",
                mend="draw smaller models of large groups, or leave it as it is",
                level=Level.REMARK,
            )
        elif not routes:
            yield Fault(
                at=(*path, "smiles"),
                message="this product does not follow from the substrate and what was charged"
                + (f"; {expected} would" if (expected := expected_product(case)) else ""),
                mend="correct the SMILES, list what is missing, or accept product-not-reachable with a reason",
            )
        elif routes[0].closed_by and path != SOUGHT and not is_contrary:
            yield Fault(
                at=(*path, "smiles"),
                message=f"the only way to this product is closed: {_named(routes[0].closed_by)}",
                mend="correct the SMILES or the substrate, or accept product-not-reachable with a reason",
                data={"gates": sorted(gate.rule.id for gate in routes[0].closed_by)},
            )


@rule(
    id="rearrangement-not-named",
    title="A rearrangement that the result does not name",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*AGREEMENT_READS, "product-not-reachable", "element-from-nowhere"),
    fires_on=(_product("CCC(CC)N=[N+]=[N-]").replace("outcome:", _PENTYL + "outcome:"),),
    silent_on=(
        _product("CCCC(C)N=[N+]=[N-]").replace("outcome:", _PENTYL + "outcome:"),
        _product("CCC(CC)N=[N+]=[N-]")
        .replace("outcome:", _PENTYL + "outcome:")
        .replace("[substitution]", "[rearrangement, substitution]"),
    ),
)
def rearrangement_is_not_named(case: Case) -> Iterator[Fault]:
    """Where a product is reached only by a 1,2-shift, the result says rearrangement.

    A regioisomer drawn by mistake looks just like that: one carbon further on, and reached through a cation only.
    """
    if Result.REARRANGEMENT in case.record.outcome.result:
        return
    for path, routes in routes_by_product(case).items():
        if path != SOUGHT and routes and all(Event.SHIFT in route.events for route in routes):
            yield Fault(
                at=(*path, "smiles"),
                message="this product is reached only by a 1,2-shift of a cation",
                mend="correct the SMILES, or add rearrangement to result:",
            )


AGREEMENT_CHECKS = (
    claim_is_against_the_product,
    course_is_against_the_mechanism,
    course_contradicts_structure,
    course_has_no_stereocentre,
    element_comes_from_nowhere,
    mechanism_is_contrary,
    product_is_not_reachable,
    rearrangement_is_not_named,
)


def is_covered(case: Case) -> bool:
    """Say whether the engine has anything to say about this record: it makes a claim, and a forecast can be made."""
    return case.record.outcome.claim is not None and case.forecast is not None


def claimed_courses(case: Case) -> Iterator[tuple[Path, Course]]:
    """Yield the claimed course of each product that one is claimed for: its own, or the claim's if it is desired."""
    claim = case.record.outcome.claim
    for path in product_paths(case):
        if path == SOUGHT:
            continue
        course = case.record.outcome.products[int(path[-1])].course
        if course is None and claim is not None and is_desired(case, path):
            course = claim.course
        if course is not None:
            yield path, course


def course_path(case: Case, path: Path) -> Path:
    """Return where the course of the product at `path` is claimed."""
    own = case.record.outcome.products[int(path[-1])].course is not None
    return (*path, "course") if own else ("outcome", "claim", "course")


def _shown_effects(product: Structure, routes: Sequence[Route]) -> set[str]:
    """Return the effects of the one-event routes whose drawn configuration is the product's; empty if none is drawn."""
    shown = {neutral_form(piece).smiles for piece in product.fragments}
    effects = {
        route.effect for route in routes if len(route.events) == 1 and neutral_form(route.product).smiles in shown
    }
    told = {StereoEffect.INVERSION, StereoEffect.RETENTION, StereoEffect.ANTI, StereoEffect.SYN}
    return {str(effect) for effect in effects} if effects <= told else set()


def _has_partner(case: Case) -> bool:
    """Say whether an addition to a multiple bond has a partner among what was charged."""
    record = case.record
    is_addition = record.substrate.leaving_group == NO_LEAVING_GROUP
    return not is_addition or bool(record.nucleophiles or record.bases or record.reagents)
