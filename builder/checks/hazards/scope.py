"""What the scope of a safety review covers: the hazards it names, up to the amounts it states."""

from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.checks.hazards.cautions import Severity
from builder.checks.hazards.kinds import load_substance_kinds
from builder.checks.hazards.meetings import Hazard, Present, Whereabouts
from builder.checks.hazards.presents import presents_of
from builder.checks.hazards.scope_amounts import Bound, Charge, bounds_of
from builder.checks.hazards.words import read_scope
from builder.mechanism.amounts import AmountRow, Role

__all__ = ["Excess", "excesses", "is_covered", "is_mass_reviewed", "scope_lacks"]

TOLERANCE = 1.05
"""A record may exceed an amount of its scope by the rounding of either; common practice, no source."""

_SUBSTANCES = frozenset({Whereabouts.FLASK, Whereabouts.PRODUCT})


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
        if present.whereabouts in _SUBSTANCES and hazard.caution.first.name in present.kinds:
            yield present


def _word_of(kind: str) -> str:
    """Return the word by which a reviewer names a kind."""
    scope_words = load_substance_kinds()[kind].scope_words
    return scope_words[0] if scope_words else kind


# --- amounts ----------------------------------------------------------------------------------------------------


def excesses(case: Case, presents: tuple[Present, ...]) -> Iterator[Excess]:
    """Yield the substances of which a record charges more than the scope states, each once.

    Moles may be meant of the substance or of the substrate, the scale of the run: the smaller counts. A mass or volume
    is that of the substance as charged. Where no amount of a scope is tied to anything it names ("lachrymator at 10
    mmol"), they are the scale of the run and hold for the substrate: so people write it, and a scope that states a size
    never covers a larger run. Beside a tied amount they bind nothing ("hydrogen up to 20 mmol"), and lift nothing.
    """
    bounds, rows = _bounds(case), {row.path: row for row in case.amounts.rows}
    is_scale = not any(bound.is_tied for bound in bounds)
    for present in presents:
        row = rows.get(present.path)
        if row is None or row.role is Role.SOLVENT:
            continue
        is_meant = is_scale and row.role is Role.SUBSTRATE
        speaking = [bound for bound in bounds if bound.unit != "L"] if is_meant else _bounds_on(bounds, present)
        for unit in ("mol", "g", "L"):
            most = _most(speaking, unit)
            held = _held(row, unit, case.amounts.substrate.amount_mol)
            if most is not None and held is not None and held > most.value * TOLERANCE:
                yield Excess(present, _shown(held, unit), most.typed)
                break


def is_mass_reviewed(case: Case, present: Present, mass_g: float) -> bool:
    """Answer whether the scope states a mass of a substance that is as large as this, in g."""
    most = _most(_bounds_on(_bounds(case), present), "g")
    return most is not None and mass_g <= most.value * TOLERANCE


def _bounds(case: Case) -> tuple[Bound, ...]:
    review = case.record.safety_review
    if review is None:
        return ()
    presents = [present for present in presents_of(case) if present.whereabouts in _SUBSTANCES]
    solvents = [present for present in presents if present.path[0] == "solvent"]
    others = [present for present in presents if present.path[0] != "solvent"]
    return bounds_of(review.scope, Charge(*_kinds_and_names(others), *_kinds_and_names(solvents)))


def _kinds_and_names(presents: list[Present]) -> tuple[frozenset[str], frozenset[str]]:
    kinds = frozenset().union(*(present.kinds for present in presents))
    return kinds, frozenset(present.name.casefold() for present in presents)


def _bounds_on(bounds: tuple[Bound, ...], present: Present) -> list[Bound]:
    """Return the bounds that speak of a substance by its name, else those that speak of its kind."""
    by_name = [bound for bound in bounds if present.name.casefold() in bound.names]
    return by_name or [bound for bound in bounds if bound.kinds & present.kinds]


def _most(bounds: list[Bound], unit: str) -> Bound | None:
    """Return the largest bound in a unit: "cyanide at 30 mmol, hydrogen cyanide up to 19 mmol" allows 30 mmol."""
    return max((bound for bound in bounds if bound.unit == unit), key=lambda bound: bound.value, default=None)


def _held(row: AmountRow, unit: str, scale_mol: float | None) -> float | None:
    if unit != "mol":
        return row.mass_g if unit == "g" else row.volume_l
    return row.amount_mol if scale_mol is None or row.amount_mol is None else min(scale_mol, row.amount_mol)


def _shown(value: float, unit: str) -> str:
    if unit == "g" or value >= 1.0:
        return f"{value:.3g} {unit}"
    return f"{1e3 * value:.3g} m{unit}"
