"""A pathway: one mechanism at one site, its rate, and the products it leads to, built only when asked for."""

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from builder.chemistry.perception import ReactiveSite
from builder.chemistry.structure import Structure
from builder.mechanism.departure import Departure
from builder.mechanism.flask import Attacker
from builder.mechanism.log_rate import LogRate
from builder.mechanism.rate_terms import Parameters, Term
from builder.records.vocabulary import Course, Mechanism

__all__ = ["Outcome", "Pathway", "alone", "attack", "merged_outcomes"]


@dataclass(frozen=True, slots=True)
class Outcome:
    """One product of a pathway.

    share: of the pathway. rearranged: skeleton changed, or the new bond is not at the carbon that bore the group.
    path: the events that led there, in words.
    """

    product: Structure
    share: float
    course: Course
    rearranged: bool
    path: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Pathway:
    """One mechanism at one site with one partner.

    label: the name of its rate constant in an answer ("SN2", "SN2 solvent", ...).
    partner: name of the species that attacks or takes the proton; None for a unimolecular pathway.
    pool: what the partner is drawn from; None where the rate constant is of first order (solvent, unimolecular).
    leaving_group: as it leaves, activation counted. event: what happens, in a few words.
    returns: whether only the group that left can come back, so that nothing is formed.
    """

    mechanism: Mechanism
    label: str
    site: ReactiveSite
    leaving_group: str
    partner: str | None
    pool: str | None
    rate: LogRate
    event: str
    outcomes: Callable[[], tuple[Outcome, ...]]
    returns: bool = False


def attack(
    mechanism: Mechanism,
    departure: Departure,
    attacker: Attacker,
    terms: Iterable[Term],
    parameters: Parameters,
    event: str,
    outcomes: Callable[[], tuple[Outcome, ...]],
) -> Pathway:
    """Return a bimolecular pathway: by its partner, solvents at their molarity, equivalent sites counted.

    Its entropy is that of the family, SN2 for SN2' too.
    """
    family = Mechanism.SN2 if mechanism is Mechanism.SN2_PRIME else mechanism
    return Pathway(
        mechanism=mechanism,
        label=f"{mechanism.value} solvent" if attacker.is_solvent else mechanism.value,
        site=departure.site,
        leaving_group=departure.group,
        partner=attacker.name,
        pool=attacker.pool,
        rate=LogRate(
            terms=(*terms, parameters.term(f"model.{mechanism.value}")),
            entropy=(parameters.term(f"{family.value.lower()}.entropy"),),
            split=math.log10(departure.site.multiplicity) + attacker.log_activity,
        ),
        event=event,
        outcomes=outcomes,
    )


def alone(
    mechanism: Mechanism,
    departure: Departure,
    rate: LogRate,
    event: str,
    outcomes: Callable[[], tuple[Outcome, ...]],
    *,
    returns: bool = False,
) -> Pathway:
    """Return a pathway of first order, by the substrate alone."""
    return Pathway(
        mechanism=mechanism,
        label=mechanism.value,
        site=departure.site,
        leaving_group=departure.group,
        partner=None,
        pool=None,
        rate=rate,
        event=event,
        outcomes=outcomes,
        returns=returns,
    )


def merged_outcomes(outcomes: list[Outcome]) -> tuple[Outcome, ...]:
    """Return the outcomes with shares added up product by product and scaled to one, largest first.

    A product counts as rearranged only where every way to it is.
    """
    total = sum(o.share for o in outcomes)
    found: dict[str, Outcome] = {}
    for o in outcomes:
        known = found.get(o.product.smiles)
        if known is None:
            found[o.product.smiles] = o
            continue
        direct = known if not known.rearranged or o.rearranged else o
        found[o.product.smiles] = Outcome(
            direct.product, known.share + o.share, direct.course, known.rearranged and o.rearranged, direct.path
        )
    scaled = [Outcome(o.product, o.share / total, o.course, o.rearranged, o.path) for o in found.values()]
    return tuple(sorted(scaled, key=lambda o: (-o.share, o.product.smiles)))
