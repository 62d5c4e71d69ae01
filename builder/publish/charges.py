"""What went in, and in which order: rows of the amounts table and stages of the procedure, typed apart from derived."""

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from builder.checks.case import Case
from builder.mechanism.amounts import AmountRow
from builder.publish.figures import joined
from builder.publish.summary import Fact, concentration
from builder.records.figures import (
    amount_text,
    equivalents_text,
    mass_text,
    molar_mass_text,
    quantity_text,
    volume_text,
)
from builder.records.model import Charged, Record, Stage
from builder.rule import Path

__all__ = ["AmountView", "Cell", "StageView", "amounts_as_tsv", "amounts_note", "view_amounts", "view_stages"]


@dataclass(frozen=True, slots=True)
class Cell:
    """A quantity of the amounts table; typed in the record, or derived from what was."""

    text: str
    typed: bool


@dataclass(frozen=True, slots=True)
class AmountView:
    """One charged substance."""

    name: str
    role: str
    note: str
    molar_mass: str
    mass: Cell
    amount: Cell
    volume: Cell
    equivalents: Cell


@dataclass(frozen=True, slots=True)
class StageView:
    """One stage of the procedure; additions in their order."""

    number: int
    facts: tuple[Fact, ...]
    additions: tuple[Fact, ...]
    over: str
    gives: str
    note: str


def view_amounts(case: Case) -> tuple[AmountView, ...]:
    """Return the rows of the amounts table in the order of the record."""
    return tuple(_amount(row, _charged(case.record, row.path)) for row in case.amounts.rows)


def view_stages(case: Case) -> tuple[StageView, ...]:
    """Return the stages of the procedure in order, additions with what is weighed or measured for them."""
    return tuple(_stage(number, stage, case) for number, stage in enumerate(case.record.stages, start=1))


def amounts_as_tsv(rows: Iterable[AmountView]) -> str:
    """Return the amounts table as tab-separated text, for a spreadsheet."""
    head = ("Substance", "Role", "Equivalents", "Amount", "Mass", "Volume", "Molar mass")
    lines = [
        (row.name, row.role, row.equivalents.text, row.amount.text, row.mass.text, row.volume.text, row.molar_mass)
        for row in rows
    ]
    return "\n".join("\t".join(" ".join(cell.split()) for cell in line) for line in (head, *lines))


def _charged(record: Record, path: Path) -> Charged:
    match path:
        case ("substrate",):
            return record.substrate
        case ("nucleophile", int(i)):
            return record.nucleophiles[i]
        case ("base", int(i)):
            return record.bases[i]
        case ("reagents", int(i)):
            return record.reagents[i]
        case ("solvent", int(i)):
            return record.solvents[i]
    raise KeyError(path)


def _amount(row: AmountRow, substance: Charged) -> AmountView:
    typed_equivalents = f"{substance.equivalents:f}" if substance.equivalents is not None else ""
    fraction = getattr(substance, "fraction", None)
    return AmountView(
        name=row.name,
        role=joined((str(row.role), f"({row.use})" if row.use else ""), " "),
        note=joined(
            (
                f"purity {quantity_text(substance.purity)}" if substance.purity else "",
                f"strength {quantity_text(substance.strength)}" if substance.strength else "",
                f"density {quantity_text(substance.density)}" if substance.density else "",
                f"{quantity_text(fraction)} of the solvent" if fraction else "",
                substance.form or "",
            )
        ),
        molar_mass=molar_mass_text(row.molar_mass) if row.molar_mass is not None else "",
        mass=_cell(quantity_text(substance.mass) if substance.mass else "", row.mass_g, mass_text),
        amount=_cell(quantity_text(substance.amount) if substance.amount else "", row.amount_mol, amount_text),
        volume=_cell(quantity_text(substance.volume) if substance.volume else "", row.volume_l, volume_text),
        equivalents=_cell(typed_equivalents, row.equivalents, equivalents_text),
    )


def _cell(typed: str, derived: float | None, text_of: Callable[[float], str]) -> Cell:
    if typed:
        return Cell(typed, typed=True)
    return Cell(text_of(derived) if derived is not None else "", typed=False)


def amounts_note(case: Case) -> str:
    """Return the solvent volume in all, and the concentration in it."""
    amounts = case.amounts
    volume = amounts.solvent_volume_l
    return joined(
        (
            f"Solvent in all {volume_text(volume)}" if volume else "",
            f"substrate {concentration(case).value} in it" if amounts.concentration_mol_per_l is not None else "",
        )
    )


def _stage(number: int, stage: Stage, case: Case) -> StageView:
    by_name: dict[str, AmountRow] = {row.name: row for row in case.amounts.rows}
    facts = (
        Fact(
            "Temperature",
            str(stage.temperature),
            f"measured: {stage.measured}" if stage.measured else "not stated where",
        ),
        Fact("Time", str(stage.time)),
        Fact(
            "Vessel",
            joined(
                (str(stage.vessel or ""), f"volume {quantity_text(stage.vessel_volume)}" if stage.vessel_volume else "")
            ),
        ),
        Fact("Atmosphere", stage.atmosphere or ""),
        Fact("Pressure", quantity_text(stage.pressure) if stage.pressure else ""),
        Fact("Done when", stage.end_point or ""),
    )
    gives = stage.gives
    isolated = {True: "isolated", False: "not isolated", None: ""}[gives.isolated] if gives else ""
    return StageView(
        number=number,
        facts=tuple(fact for fact in facts if fact.value),
        additions=tuple(Fact(name, _charge_of(by_name.get(name), case.record)) for name in stage.add or ()),
        over=str(stage.over) if stage.over else "",
        gives=joined((gives.name, isolated)) if gives else "",
        note=stage.note or "",
    )


def _charge_of(row: AmountRow | None, record: Record) -> str:
    """Return what is weighed or measured at the bench: the typed quantity, else a derived mass or volume."""
    if row is None:
        return ""
    view = _amount(row, _charged(record, row.path))
    cells = (view.mass, view.volume, view.amount)
    typed = next((cell.text for cell in cells if cell.typed), "")
    return typed or next((cell.text for cell in cells if cell.text), "")
