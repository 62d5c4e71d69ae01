"""Electrophilic addition through a carbocation: a Brønsted acid, an alkene or alkyne, and what captures the cation."""

import math
from collections.abc import Iterator
from dataclasses import replace
from functools import partial

from builder.chemistry.perception import ReactiveSite, perceive_sites
from builder.chemistry.structure import AtomId, Structure
from builder.chemistry.transform import Cation, add_hx, protonate
from builder.mechanism.cations import Shift, cation_terms, stations
from builder.mechanism.flask import Flask
from builder.mechanism.log_rate import LogRate
from builder.mechanism.pathways.ionisation import Reception, after_steps, captured_outcomes, receive
from builder.mechanism.pathways.pathway import Outcome, Pathway, merged_outcomes
from builder.mechanism.rate_terms import Parameters
from builder.mechanism.skeleton import Skeleton, skeleton_of
from builder.records.vocabulary import Course, Mechanism

__all__ = ["addition_pathways"]


def addition_pathways(
    structure: Structure, flask: Flask, parameters: Parameters, temperature_k: float
) -> Iterator[Pathway]:
    """Yield the addition to each end of each multiple bond, in a flask that holds a strong acid and its captor."""
    if not flask.is_bronsted_acid or flask.has_peroxide:
        return
    for site in perceive_sites(structure):
        if site.is_addition and site.partner is not None:
            yield from _addition(structure, site, flask, parameters, temperature_k)


def _addition(
    structure: Structure, site: ReactiveSite, flask: Flask, parameters: Parameters, temperature_k: float
) -> Iterator[Pathway]:
    if site.partner is None or flask.acidity is None or flask.acidity_key is None:
        return
    is_alkyne = "alkyne" in site.classes
    skeleton = protonated_skeleton(structure, site)
    probe = skeleton if not is_alkyne else _saturated(skeleton, site)
    stability = cation_terms(structure, probe, site.alpha_carbon, parameters)
    energy = math.fsum(t.contribution for t in stability) - parameters.value("cation.secondary")
    terms = [
        parameters.term("ade.zero"),
        parameters.term("ade.cation", energy),
        parameters.term("ade.acid", -flask.acidity),
        parameters.term("model.AdE"),
    ]
    if is_alkyne:
        terms.append(parameters.term("ade.alkyne"))
        outcomes = partial(_alkyne_outcomes, structure, site, flask)
    else:
        if any(
            structure.atoms[n].symbol in {"F", "Cl", "Br", "I"}
            for n, _ in structure.atoms[site.alpha_carbon].neighbours
        ):
            terms.append(parameters.term("ade.vinyl halide"))
        reached = stations(structure, skeleton, site.alpha_carbon, parameters)
        reception = receive(reached, flask, parameters, temperature_k, group="none", can_eliminate=False)
        if not reception.attackers:
            return
        kept = tuple(replace(f, loses_proton=0.0) for f in reception.fates)
        reception = Reception(kept, reception.attackers, flask, parameters, reception.is_reversible)
        outcomes = partial(_alkene_outcomes, structure, site, reception)
    yield Pathway(
        mechanism=Mechanism.ADE,
        label="AdE",
        site=site,
        leaving_group="none",
        partner=None,
        pool=None,
        rate=LogRate(tuple(terms), (parameters.term("ade.entropy"),), math.log10(site.multiplicity)),
        event="a proton adds and the cation is captured",
        outcomes=outcomes,
    )


def ends_of(site: ReactiveSite) -> tuple[AtomId, AtomId]:
    """Return the carbon that becomes cationic and the one that takes the proton.

    Raises ValueError unless the site is the end of a multiple bond.
    """
    if site.partner is None:
        raise ValueError("the site is no end of a multiple bond")
    return site.alpha_carbon, site.partner


def protonated_skeleton(structure: Structure, site: ReactiveSite) -> Skeleton:
    """Return the adjacency of the cation left when a proton adds to the partner of a site."""
    skeleton = skeleton_of(structure)
    alpha, partner = ends_of(site)
    bonds = list(skeleton.bonds)
    order = bonds[alpha][partner] - 1.0
    bonds[alpha] = bonds[alpha] | {partner: order}
    bonds[partner] = bonds[partner] | {alpha: order}
    hydrogens = list(skeleton.hydrogens)
    hydrogens[partner] += 1
    return Skeleton(skeleton.fixed, bonds, hydrogens)


def _saturated(skeleton: Skeleton, site: ReactiveSite) -> Skeleton:
    """Return a vinylic cation drawn as its saturated likeness, to rank the ends of an alkyne by."""
    alpha, partner = ends_of(site)
    bonds = list(skeleton.bonds)
    bonds[alpha] = bonds[alpha] | {partner: 1.0}
    bonds[partner] = bonds[partner] | {alpha: 1.0}
    return Skeleton(skeleton.fixed, bonds, skeleton.hydrogens)


def _alkene_outcomes(structure: Structure, site: ReactiveSite, reception: Reception) -> tuple[Outcome, ...]:
    def start(path: tuple[Shift, ...]) -> Cation:
        return after_steps(protonate(structure, site), path)

    return captured_outcomes(reception, start, site, skeleton_of(structure))


def _alkyne_outcomes(structure: Structure, site: ReactiveSite, flask: Flask) -> tuple[Outcome, ...]:
    captors = [a for a in flask.attackers if a.is_usual_atom and a.is_anion] or list(flask.attackers)
    found = [
        Outcome(edit.product, 1.0, Course.NOT_APPLICABLE, False, ("addition",))
        for attacker in captors[:1]
        for edit in add_hx(structure, site, attacker.nucleophile)
    ]
    return merged_outcomes(found) if found else ()
