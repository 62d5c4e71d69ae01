"""What the scope of a safety review covers: the hazards it names, up to the amounts it states."""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache

from builder.checks.case import Case
from builder.checks.hazards.cautions import Severity
from builder.checks.hazards.kinds import load_substance_kinds
from builder.checks.hazards.meetings import Hazard, Present, Whereabouts
from builder.checks.hazards.words import read_scope

__all__ = ["Excess", "allowed_g", "excesses", "is_covered", "scope_lacks"]

TOLERANCE = 1.05
"""A record may exceed an amount of its scope by the rounding of either; common practice, no source."""

_CLAUSE = re.compile(r"[,;()]")
_AMOUNT = re.compile(r"(?<![\d.])(\d+(?:\.\d+)?)\s*(mmol|mol|kg|mg|g)\b(?!/)")
_UNITS = {"mol": (1.0, "mol"), "mmol": (1e-3, "mol"), "kg": (1e3, "g"), "g": (1.0, "g"), "mg": (1e-3, "g")}


@dataclass(frozen=True, slots=True)
class Bound:
    """An amount that a scope states: the kinds it speaks of, mol or g, and as typed."""

    kinds: frozenset[str]
    value: float
    unit: str
    typed: str


@dataclass(frozen=True, slots=True)
class Excess:
    """A substance of which a record holds more than the scope of its safety review says."""

    present: Present
    held: str
    allowed: str


def is_covered(case: Case, hazard: Hazard) -> bool:
    """Answer whether a hazard may be published: it is no `stop`, or the scope of the safety review names it."""
    if hazard.caution.severity is not Severity.STOP:
        return True
    return case.record.safety_review is not None and not scope_lacks(case.record.safety_review.scope, hazard)


def scope_lacks(scope: str, hazard: Hazard) -> str:
    """Return what a scope says amiss of a hazard: "names azide, not cyanide", "excludes acid"; empty if it covers it.

    It covers what it names by kind ("azide at 10 mmol") or by the name of the substance, unless it excludes the partner
    ("no acid").
    """
    read, caution = read_scope(scope), hazard.caution
    if caution.second is not None and caution.second.name in read.excluded:
        return f"excludes {_word_of(caution.second.name)}, which is here"
    folded = scope.casefold()
    if caution.first.name in read.named or any(p.name.casefold() in folded for p in _firsts(hazard)):
        return ""
    return f"names {' and '.join(read.words) or 'no substance'}, not {_word_of(caution.first.name)}"


def _firsts(hazard: Hazard) -> Iterator[Present]:
    """Yield the substances that the first kind of the caution stands for."""
    for present in (hazard.at, *hazard.others):
        is_substance = present.whereabouts in {Whereabouts.FLASK, Whereabouts.PRODUCT}
        if is_substance and hazard.caution.first.name in present.kinds:
            yield present


def _word_of(kind: str) -> str:
    """Return the word by which a reviewer names a kind."""
    scope_words = load_substance_kinds()[kind].scope_words
    return scope_words[0] if scope_words else kind


# --- amounts ----------------------------------------------------------------------------------------------------


def excesses(case: Case, presents: tuple[Present, ...]) -> Iterator[Excess]:
    """Yield the substances of which a record charges more than the scope states.

    Moles may be meant of the substance or of the substrate, the scale of the run: the smaller counts. A mass is that of
    the substance as charged.
    """
    review = case.record.safety_review
    if review is None:
        return
    scale = case.amounts.substrate.amount_mol
    rows = {row.path: row for row in case.amounts.rows}
    for bound in _bounds(review.scope):
        for present in presents:
            row = rows.get(present.path)
            if row is None or not (bound.kinds & present.kinds) or row.role.value == "solvent":
                continue
            if bound.unit == "g":
                held = row.mass_g
            else:
                held = row.amount_mol if scale is None or row.amount_mol is None else min(scale, row.amount_mol)
            if held is not None and held > bound.value * TOLERANCE:
                yield Excess(present, _shown(held, bound.unit), bound.typed)
                break


def allowed_g(case: Case, present: Present) -> float | None:
    """Return the largest mass in g that the scope states of a kind of substance; None where it states none."""
    review = case.record.safety_review
    bounds = _bounds(review.scope) if review is not None else ()
    return max((each.value for each in bounds if each.unit == "g" and each.kinds & present.kinds), default=None)


@lru_cache(maxsize=256)
def _bounds(scope: str) -> tuple[Bound, ...]:
    found: list[Bound] = []
    for clause in _CLAUSE.split(scope):
        kinds = read_scope(clause).named
        for match in _AMOUNT.finditer(clause) if kinds else ():
            factor, unit = _UNITS[match[2]]
            found.append(Bound(kinds, float(match[1]) * factor, unit, match[0]))
    return tuple(found)


def _shown(value: float, unit: str) -> str:
    if unit == "mol" and value < 1.0:
        return f"{1e3 * value:.3g} mmol"
    return f"{value:.3g} {unit}"
