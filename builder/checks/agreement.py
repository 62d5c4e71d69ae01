"""The record against what its structures allow: atoms, products, course, mechanism."""

from collections import Counter
from collections.abc import Iterator, Sequence
from functools import lru_cache

from builder.checks.case import Case
from builder.checks.derivation import SOUGHT, is_desired, product_paths, routes_by_product
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import NO_LEAVING_GROUP
from builder.chemistry.structure import Structure
from builder.chemistry.transform import StereoEffect
from builder.finding import Level
from builder.mechanism.products import Route
from builder.mechanism.reaction import has_undrawn_species, in_play, species_in_flask
from builder.mechanism.rules import Situation, closing_gates
from builder.records.specimen import outcome_example
from builder.records.vocabulary import Course, Mechanism, StereoKind
from builder.rule import Fault, Path, rule

__all__ = ["AGREEMENT_CHECKS", "CONTRARY_RULES", "is_covered"]

CONTRARY_RULES = frozenset({"claim-against-product", "mechanism-contrary", "product-not-reachable"})
"""Rules whose findings mean that record and engine disagree; the verdict of an entry follows from them."""

MEET_IN_ONE_PRODUCT = 4
"""How many molecules of one reagent at most end up in one molecule of product: a quaternary ammonium takes four."""

_READABLE = ("structure-unreadable", "leaving-group-not-found", "leaving-group-unknown")
_ELIMINATIONS = {Mechanism.E1, Mechanism.E2, Mechanism.E1CB}
_SUBSTITUTIONS = {Mechanism.SN1, Mechanism.SN2, Mechanism.SN2_PRIME, Mechanism.NGP}


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


_PRIMARY = (
    "substrate: {name: 1-bromobutane, smiles: CCCCBr, class: primary, leaving_group: bromide, amount: 10 mmol}\n"
    "stages: [{temperature: 60 °C, time: 16 h}]\n"
)


@rule(
    id="claim-against-product",
    title="The claim is of another kind than the product",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*_READABLE, "product-not-reachable", "element-from-nowhere"),
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
    kinds = {True: _ELIMINATIONS, False: _SUBSTITUTIONS}
    for eliminates, mechanisms in kinds.items():
        if claim.mechanism in mechanisms and endings == {not eliminates}:
            found = "an elimination" if not eliminates else "a substitution"
            yield Fault(
                at=("outcome", "claim", "mechanism"),
                message=f"{claim.mechanism} is claimed, but the desired product comes of {found}",
                mend="correct the mechanism or the product, or accept claim-against-product with a reason",
            )


@rule(
    id="course-contradicts-structure",
    title="The drawings show another course than the claim",
    source="iupac-gold",
    needs=(*_READABLE, "course-twice", "stereo-contradicts-structure"),
    fires_on=(_chiral("CC[C@H](C)N=[N+]=[N-]", "inversion"), _chiral("CC[C@@H](C)N=[N+]=[N-]", "retention")),
    silent_on=(_chiral("CC[C@@H](C)N=[N+]=[N-]", "inversion"), _chiral("CC[C@H](C)N=[N+]=[N-]", "retention", "NGP")),
)
def course_contradicts_structure(case: Case) -> Iterator[Fault]:
    """The course claimed is the one that the drawn configurations of substrate and product show.

    Judged by mapped atoms and the parity of their neighbours, never by R and S: those letters depend on priorities
    and may stay the same through an inversion. Double inversion counts as retention.
    """
    for path, course in _claimed_courses(case):
        structure = case.structures.get(path)
        product = case.record.outcome.products[int(path[-1])]
        if structure is None or product.stereo in {StereoKind.RACEMATE, StereoKind.NOT_DETERMINED}:
            continue
        shown = _shown_effects(structure, routes_by_product(case).get(path, ()))
        if shown and course in _NET and not shown & _NET[course]:
            words = " or ".join(sorted(shown))
            yield Fault(
                at=_course_path(case, path),
                message=f"{course} is claimed, but the drawings of substrate and product {product.label} show {words}",
                mend="correct the drawing of the product, or the course",
            )


_NET = {
    Course.INVERSION: {"inversion"},
    Course.RETENTION: {"retention"},
    Course.DOUBLE_INVERSION: {"retention"},
    Course.ANTI: {"anti"},
    Course.SYN: {"syn"},
}


@rule(
    id="course-without-stereocentre",
    title="A course where nothing could show it",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*_READABLE, "course-twice"),
    fires_on=(_PRIMARY + _product("CCCCN=[N+]=[N-]", "claim: {mechanism: SN2, course: inversion}"),),
    silent_on=(_chiral("CC[C@@H](C)N=[N+]=[N-]", "inversion"),),
)
def course_has_no_stereocentre(case: Case) -> Iterator[Fault]:
    """Inversion, retention or racemisation is claimed only where the reacting carbon is a stereocentre.

    Elsewhere the course is `not applicable`, or `not determined` where a racemate hides it.
    """
    marks = {each.site.alpha_carbon in each.on.stereocentre_marks for each in in_play(case.record, case.structures)}
    if not marks or True in marks:
        return
    told = {Course.INVERSION, Course.RETENTION, Course.RACEMISATION, Course.PARTIAL_INVERSION, Course.DOUBLE_INVERSION}
    claim = case.record.outcome.claim
    if claim is not None and claim.course in told:
        yield Fault(
            at=("outcome", "claim", "course"),
            message=f"{claim.course} is claimed, but the reacting carbon is no stereocentre",
            mend="write course: not applicable",
            fix=str(Course.NOT_APPLICABLE),
        )


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
    are no reagents.
    """
    if has_undrawn_species(case.record, case.structures):
        return
    flask = species_in_flask(case.record, case.structures)
    have: Counter[str] = Counter()
    for structure in (*flask, case.substrate):
        for _ in range(MEET_IN_ONE_PRODUCT):
            have += _elements(structure)
    for path in product_paths(case):
        extra = _elements(case.structures[path]) - have
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
    title="A claimed mechanism that is closed here",
    level=Level.QUERY,
    source="iupac-gold",
    needs=_READABLE,
    fires_on=(
        "substrate: {name: tert-butyl bromide, smiles: 'CC(C)(C)Br', class: tertiary, leaving_group: bromide,"
        " amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
        + _product("CC(C)(C)N=[N+]=[N-]", "claim: {mechanism: SN2}"),
    ),
    silent_on=(_product("CCC(C)N=[N+]=[N-]", "claim: {mechanism: SN2}"),),
)
def mechanism_is_contrary(case: Case) -> Iterator[Fault]:
    """The claimed mechanism is open at a carbon that bears the leaving group.

    A closed gate is a statement about what is possible at all, not about rates. Observation outranks it: with good
    evidence the entry accepts this query, says why, and becomes one of the most valuable of the book.
    """
    claim = case.record.outcome.claim
    if claim is None:
        return
    sites = in_play(case.record, case.structures)
    shut = [closing_gates(claim.mechanism, Situation(each.site, each.is_activated)) for each in sites]
    if shut and all(shut):
        gates = {gate.rule.id: gate.rule for gates in shut for gate in gates}
        reasons = "; ".join(f"{gate.title} ({gate.id})" for gate in gates.values())
        yield Fault(
            at=("outcome", "claim", "mechanism"),
            message=f"{claim.mechanism} is claimed, and the engine holds it closed: {reasons}",
            mend="correct the claim or the structure, or accept mechanism-contrary with a reason",
            data={"gates": sorted(gates)},
        )


@rule(
    id="product-not-reachable",
    title="A product that does not follow",
    level=Level.QUERY,
    source="iupac-gold",
    needs=(*_READABLE, "element-from-nowhere"),
    fires_on=(_product("CCCN=[N+]=[N-]"),),
    silent_on=(_product("CCC(C)N=[N+]=[N-]"), _product("C=CCC")),
)
def product_is_not_reachable(case: Case) -> Iterator[Fault]:
    """A product follows from the substrate and what was charged.

    Sought in one or two events: substitution at the declared group, elimination, up to three shifts of a cation,
    allylic transposition, ring closure and opening, addition. A product beyond that is usually a slip in a SMILES.
    """
    if has_undrawn_species(case.record, case.structures) or not _has_partner(case):
        return
    for path, routes in routes_by_product(case).items():
        if not routes:
            yield Fault(
                at=(*path, "smiles"),
                message="this product does not follow from the substrate and what was charged",
                mend="correct the SMILES, list what is missing, or accept product-not-reachable with a reason",
            )


AGREEMENT_CHECKS = (
    claim_is_against_the_product,
    course_contradicts_structure,
    course_has_no_stereocentre,
    element_comes_from_nowhere,
    mechanism_is_contrary,
    product_is_not_reachable,
)


def is_covered(case: Case) -> bool:
    """Say whether the engine has anything to say about this record: it claims a mechanism at a known site."""
    return case.record.outcome.claim is not None and bool(in_play(case.record, case.structures))


def _claimed_courses(case: Case) -> Iterator[tuple[Path, Course]]:
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


def _course_path(case: Case, path: Path) -> Path:
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


@lru_cache(maxsize=4096)
def _elements_of(structure: Structure) -> tuple[tuple[str, int], ...]:
    return tuple(sorted(Counter(atom.symbol for atom in structure.atoms if atom.symbol != "H").items()))


def _elements(structure: Structure) -> Counter[str]:
    return Counter(dict(_elements_of(structure)))


def _has_partner(case: Case) -> bool:
    """Say whether an addition to a multiple bond has a partner among what was charged."""
    record = case.record
    is_addition = record.substrate.leaving_group == NO_LEAVING_GROUP
    return not is_addition or bool(record.nucleophiles or record.bases or record.reagents)
