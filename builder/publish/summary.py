"""An entry in a few facts: the conditions strip of its page, and the row that stands for it in a list."""

from collections.abc import Iterable
from dataclasses import dataclass

from builder.checks.case import Case
from builder.mechanism.amounts import AmountRow
from builder.publish.figures import joined
from builder.publish.measured import runs_text
from builder.records.figures import amount_text, concentration_text, equivalents_text, quantity_text
from builder.records.model import Record, Stage
from builder.records.vocabulary import NucleophileWord, Status

__all__ = ["Fact", "Summary", "concentration", "conditions_line", "conditions_strip", "newest_first", "scale_mol"]


@dataclass(frozen=True, slots=True)
class Fact:
    """A labelled value with a qualification below it."""

    label: str
    value: str
    detail: str = ""


@dataclass(frozen=True, slots=True)
class Summary:
    """One entry as a list shows it."""

    id: str
    title: str
    date: str
    conditions: str
    outcome: str
    verdict: str
    verdict_key: str
    take_away: str
    status: str
    is_failure: bool

    @property
    def is_retired(self) -> bool:
        """Say whether the entry is superseded or withdrawn."""
        return Status(self.status).is_retired


def newest_first(summaries: Iterable[Summary]) -> tuple[Summary, ...]:
    """Return the newest first, those of one day by identifier; what no longer holds comes last."""
    by_id = sorted(summaries, key=lambda summary: summary.id)
    by_date = sorted(by_id, key=lambda summary: summary.date, reverse=True)
    return tuple(sorted(by_date, key=lambda summary: summary.is_retired))


def scale_mol(case: Case) -> float | None:
    """Return the amount of substrate in mol, the scale of the entry."""
    return case.amounts.substrate.amount_mol


def conditions_line(strip: Iterable[Fact]) -> str:
    """Return the conditions of a strip in one line."""
    labels = {"Nucleophile", "Base", "Reagents", "Solvent", "Temperature", "Time"}
    facts = [fact for fact in strip if fact.label in labels]
    return joined(
        joined((f.value, f"({f.detail})" if f.detail and f.label == "Nucleophile" else ""), " ") for f in facts
    )


def conditions_strip(case: Case) -> tuple[Fact, ...]:
    """Return the conditions of the whole entry; a value that changes between stages lists them in order."""
    record, amounts = case.record, case.amounts
    stages = record.stages
    scale = scale_mol(case)
    facts = [
        *_reactants(case),
        _solvent(record, amounts.solvent_volume_l),
        Fact("Temperature", _in_order(str(stage.temperature) for stage in stages), _thermometers(stages)),
        Fact("Time", _in_order((str(stage.time) for stage in stages), fold=False)),
        Fact("Vessel", _in_order(str(stage.vessel or "not stated") for stage in stages)),
        Fact("Atmosphere", _in_order(stage.atmosphere or "not stated" for stage in stages)),
        concentration(case),
        Fact("Scale", amount_text(scale) if scale is not None else "not known", runs_text(record.performed)),
    ]
    return tuple(fact for fact in facts if fact.value)


def _reactants(case: Case) -> list[Fact]:
    record = case.record
    facts = []
    if isinstance(record.nucleophile, NucleophileWord):
        facts.append(Fact("Nucleophile", str(record.nucleophile)))
    for role, label in (("nucleophile", "Nucleophile"), ("base", "Base"), ("reagent", "Reagents")):
        rows = [row for row in case.amounts.rows if row.role == role]
        if rows:
            facts.append(Fact(label, joined(row.name for row in rows), joined(map(_equivalents_of, rows))))
    return facts


def _equivalents_of(row: AmountRow) -> str:
    return f"{equivalents_text(row.equivalents)} equiv" if row.equivalents is not None else ""


def _solvent(record: Record, volume_l: float | None) -> Fact:
    if record.neat:
        return Fact("Solvent", "none (neat)")
    names = joined(solvent.name for solvent in record.solvents)
    typed = [quantity for solvent in record.solvents if (quantity := solvent.volume or solvent.fraction)]
    shares = joined(map(quantity_text, typed), " + ")
    alone = len(record.solvents) == 1 and volume_l is not None
    return Fact("Solvent", names, shares if alone or len(record.solvents) > 1 else "")


def _thermometers(stages: tuple[Stage, ...]) -> str:
    where = dict.fromkeys(str(stage.measured) if stage.measured else "not stated where" for stage in stages)
    return joined(f"measured: {place}" if place != "not stated where" else place for place in where)


def _in_order(values: Iterable[str], *, fold: bool = True) -> str:
    listed = list(values)
    if fold and len(set(listed)) == 1:
        return listed[0]
    return joined(listed, " → ")


def concentration(case: Case) -> Fact:
    """Return the concentration of the substrate, and whether it was typed or derived."""
    record, amounts = case.record, case.amounts
    if record.concentration is not None:
        return Fact("Concentration", quantity_text(record.concentration), "per solvent volume, typed")
    if amounts.concentration_mol_per_l is None:
        return Fact("Concentration", "" if record.neat else "not known")
    return Fact("Concentration", concentration_text(amounts.concentration_mol_per_l), "per solvent volume, derived")
