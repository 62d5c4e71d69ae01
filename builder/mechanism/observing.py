"""What the engine says where an observation speaks: its value and its slope on every term."""

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.engine import open_pathways
from builder.mechanism.flask import Flask, fill_flask
from builder.mechanism.log_rate import combined
from builder.mechanism.observations.tables import Channel, Mixture, Rate, Share, ShareKind
from builder.mechanism.pathways.pathway import Outcome, Pathway
from builder.mechanism.question import Ingredient, Question
from builder.mechanism.rate_terms import Parameters
from builder.records.vocabulary import ELIMINATIONS, Course

__all__ = ["Seen", "SilentError", "observed_logit", "see_channel", "see_rate", "see_share", "see_share_value"]

LABELS = {
    Channel.SN2: ("SN2",),
    Channel.SN2_SOLVENT: ("SN2 solvent",),
    Channel.IONISATION: ("SN1", "E1", "NGP"),
    Channel.E2: ("E2",),
    Channel.SOLVOLYSIS: ("SN2 solvent", "SN1", "E1", "NGP", "E2 solvent", "SN2' solvent"),
    Channel.NGP: ("NGP",),
    Channel.OPENING: ("SN2", "SN2 solvent", "SN1"),
}
SECOND_ORDER_ONLY = "second-order part only"
FLOOR = 0.005
"""Share below which, and above one minus which, a share is taken as this: no more can be measured."""


class SilentError(LookupError):
    """The engine has no pathway where an observation has one."""


@dataclass(frozen=True, slots=True)
class Seen:
    """A value the engine gives, and its slope on each term with that term's standard error."""

    value: float
    slopes: dict[str, tuple[float, float]]


def see_rate(rate: Rate, parameters: Parameters, reference: Rate | None = None) -> Seen:
    """Return log10 of the rate constant, or of its ratio to that of the reference."""
    seen = see_channel(rate.substrate, rate.nucleophile, rate.solvent, rate.temperature_c, rate.channel, parameters)
    if reference is None or rate.is_reference:
        return seen
    other = see_rate(reference, parameters)
    return Seen(seen.value - other.value, combined([(1.0, seen.slopes), (-1.0, other.slopes)]))


def see_channel(
    substrate: str,
    nucleophile: str | None,
    solvent: Mixture,
    temperature_c: float,
    channel: Channel,
    parameters: Parameters,
) -> Seen:
    """Return log10 of the sum of the rate constants of a channel.

    Raises SilentError where no pathway of the channel is open.
    """
    question = _question(substrate, nucleophile, solvent, temperature_c, None)
    flask = fill_flask(question, parameters)
    pathways = [
        p
        for p in open_pathways(question.substrate, flask, parameters, question.temperature_k)
        if p.label in LABELS[channel] and _is_by(p, nucleophile, flask)
    ]
    if not pathways:
        raise SilentError(f"no pathway of {channel} for {substrate}")
    logs = [p.rate.log10_k(question.temperature_k) for p in pathways]
    top = max(logs)
    total = math.fsum(10 ** (log - top) for log in logs)
    weights = [10 ** (log - top) / total for log in logs]
    slopes = combined((w, p.rate.slopes(question.temperature_k)) for w, p in zip(weights, pathways, strict=True))
    return Seen(top + math.log10(total), slopes)


def _is_by(pathway: Pathway, nucleophile: str | None, flask: Flask) -> bool:
    """Say whether a second-order pathway is that of the species named."""
    if pathway.pool is None or nucleophile is None:
        return True
    return any(a.name == pathway.partner and a.nucleophile.species.smiles == nucleophile for a in flask.attackers)


def _question(
    substrate: str, nucleophile: str | None, solvent: Mixture, temperature_c: float, molar: float | None
) -> Question:
    names = {part.smiles for part, _ in solvent}
    pieces = set() if nucleophile is None else set(nucleophile.split("."))
    added = None if nucleophile is None or pieces <= names else Ingredient(nucleophile, parse_smiles(nucleophile))
    question = Question(
        substrate=parse_smiles(substrate),
        nucleophile=added,
        solvent=solvent,
        temperature_k=temperature_c + 273.15,
        equivalents=1.0,
        concentration_m=1.0,
    )
    return question if molar is None else replace(question, equivalents=molar)


# --- shares ---------------------------------------------------------------------------------------------------


def see_share_value(share: Share, parameters: Parameters) -> float:
    """Return the fraction the engine gives for a share, 0 to 1. Raises SilentError where it has no such products."""
    part, rest, _ = _flows(share, parameters)
    return math.fsum(part) / (math.fsum(part) + math.fsum(rest))


def see_share(share: Share, parameters: Parameters, partition_keys: Iterable[str]) -> Seen:
    """Return the logit (base e) of a share, and its slopes; those on the terms of partition by difference.

    partition_keys: terms that decide within a pathway (proton loss, shifts, faces), which slopes of rates do not show.
    """
    part, rest, pathways = _flows(share, parameters)
    temperature = share.temperature_c + 273.15
    total_part, total_rest = math.fsum(part), math.fsum(rest)
    slopes = [p.rate.slopes(temperature) for p in pathways]
    scale = math.log(10.0)
    weighted = [
        (scale * ((a / total_part if total_part else 0.0) - (b / total_rest if total_rest else 0.0)), s)
        for a, b, s in zip(part, rest, slopes, strict=True)
    ]
    found = combined(weighted)
    value = logit(total_part / (total_part + total_rest))
    for key in partition_keys:
        step = 0.05
        moved = parameters.with_values({key: parameters.value(key) + step})
        change = logit(see_share_value(share, moved)) - value
        if change:
            found[key] = (change / step, parameters[key].error)
    return Seen(value, found)


def logit(fraction: float) -> float:
    """Return ln(f/(1-f)), f held between FLOOR and 1 - FLOOR."""
    held = min(1 - FLOOR, max(FLOOR, fraction))
    return math.log(held / (1 - held))


def _flows(share: Share, parameters: Parameters) -> tuple[list[float], list[float], list[Pathway]]:
    """Return, for each pathway, what flows into the products counted and into those they are a share of."""
    question = _question(
        share.substrate, _uncatalysed(share.nucleophile), share.solvent, share.temperature_c, share.concentration_m
    )
    flask = fill_flask(question, parameters)
    pathways = list(open_pathways(question.substrate, flask, parameters, question.temperature_k))
    if share.note.startswith(SECOND_ORDER_ONLY):
        pathways = [p for p in pathways if p.pool is not None]
    rates = [10 ** p.rate.log10_k(question.temperature_k) * flask.on_hand(p.pool) for p in pathways]
    total = math.fsum(rates)
    kept = [(p, r) for p, r in zip(pathways, rates, strict=True) if total and r > 1e-6 * total]
    part, rest, used = [], [], []
    counts = _COUNTS[share.kind]
    for pathway, rate in kept:
        inside, outside = counts(share, pathway)
        if inside or outside:
            part.append(rate * inside)
            rest.append(rate * outside)
            used.append(pathway)
    if math.fsum(part) + math.fsum(rest) <= 0:
        raise SilentError(f"{share.id}: the engine gives no such products")
    return part, rest, used


def _uncatalysed(nucleophile: str | None) -> str | None:
    return None if nucleophile is None else nucleophile.split(".")[0]


_Count = Callable[[Share, Pathway], tuple[float, float]]
"""How much of what a pathway gives lies inside a share, and how much in the rest it is a share of."""


def _elimination(share: Share, pathway: Pathway) -> tuple[float, float]:
    return (1.0, 0.0) if _is_elimination(share, pathway) else (0.0, 1.0)


def _among(keep: Callable[[Share, Pathway], bool], test: Callable[[Share, Outcome], bool | None]) -> _Count:
    def count(share: Share, pathway: Pathway) -> tuple[float, float]:
        if not keep(share, pathway):
            return 0.0, 0.0
        inside = outside = 0.0
        for outcome in pathway.outcomes():
            verdict = test(share, outcome)
            if verdict is True:
                inside += outcome.share
            elif verdict is False:
                outside += outcome.share
        return inside, outside

    return count


def _is_elimination(_: Share, pathway: Pathway) -> bool:
    return pathway.mechanism in ELIMINATIONS


def _is_substitution(share: Share, pathway: Pathway) -> bool:
    return not _is_elimination(share, pathway)


def _any(_: Share, __: Pathway) -> bool:
    return True


def _is_product(share: Share, outcome: Outcome) -> bool:
    return same_product(outcome.product, share.product or "")


def same_product(product: Structure, wanted: str) -> bool:
    """Say whether a product is the one wanted; one drawn without configuration stands for all."""
    target = parse_smiles(wanted)
    if target.smiles == target.flat_smiles:
        return product.flat_smiles == target.flat_smiles
    return product in (target, target.mirror_image)


def _is_trans(share: Share, outcome: Outcome) -> bool | None:
    wanted = parse_smiles(share.product or "")
    if outcome.product.flat_smiles != wanted.flat_smiles:
        return None
    return outcome.product == wanted


def _is_rearranged(share: Share, outcome: Outcome) -> bool:
    return outcome.rearranged if share.product is None else _is_product(share, outcome)


def _is_transposed(_: Share, outcome: Outcome) -> bool:
    return outcome.rearranged


def _is_inverted(share: Share, outcome: Outcome) -> bool | None:
    wanted = parse_smiles(share.product or "")
    if outcome.product.flat_smiles != wanted.flat_smiles:
        return None
    if parse_smiles(share.substrate).is_achiral or outcome.course is Course.NOT_APPLICABLE:
        return same_product(outcome.product, wanted.smiles)
    return outcome.product == wanted


_COUNTS: dict[ShareKind, _Count] = {
    ShareKind.ELIMINATION: _elimination,
    ShareKind.ALKENE: _among(_is_elimination, _is_product),
    ShareKind.TRANS_CIS: _among(_is_elimination, _is_trans),
    ShareKind.REARRANGED: _among(_is_substitution, _is_rearranged),
    ShareKind.TRANSPOSED: _among(_is_substitution, _is_transposed),
    ShareKind.SITE: _among(_any, _is_product),
    ShareKind.INVERSION: _among(_is_substitution, _is_inverted),
}


def observed_logit(share: Share) -> tuple[float, float]:
    """Return the logit of an observed share and its standard error."""
    held = min(1 - 2 * FLOOR, max(2 * FLOOR, share.value))
    return logit(held), max(0.15, share.error / (held * (1 - held)))
