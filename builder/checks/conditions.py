"""Temperature against the solvent and the vessel, and solvents against the table."""

from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import present_solvents
from builder.mechanism.solvents import (
    Solvent,
    boiling_point_c,
    find_solvent,
    freezing_point_c,
    nearest_solvents,
)
from builder.records.model import Stage
from builder.records.quantities import Quantity
from builder.records.vocabulary import Vessel
from builder.rule import Fault, rule

__all__ = ["CONDITION_CHECKS"]

MARGIN_K = 3.0  # a thermometer's honest error; common practice, no source
REFLUX_MARGIN_K = 5.0
_UNDER_PRESSURE = {Vessel.SEALED, Vessel.MICROWAVE, Vessel.FLOW}


@rule(
    id="temperature-above-boiling",
    title="Hotter than the solvent boils",
    source="solvent-table",
    fires_on=("stages: [{temperature: 190 °C, time: 16 h, vessel: open}]",),
    silent_on=(
        "stages: [{temperature: 150 °C, time: 16 h, vessel: open}]",
        "stages: [{temperature: 190 °C, time: 16 h, vessel: sealed}]",
    ),
)
def temperature_is_above_boiling(case: Case) -> Iterator[Fault]:
    """In an open vessel the mixture is no hotter than its solvent boils.

    A bath may be; then `measured: bath` says so. A sealed vessel, a microwave, a flow reactor or a stated pressure
    lifts the limit, because the boiling point holds at 1 atm only. A mixture is allowed its highest-boiling part.
    """
    for index, stage in enumerate(case.record.stages):
        boiling = _boiling(case, index)
        if boiling is None or stage.vessel in _UNDER_PRESSURE or stage.pressure is not None or _is_bath(stage):
            continue
        if stage.temperature.highest_c > boiling[1] + MARGIN_K:
            yield Fault(
                at=("stages", index, "temperature"),
                message=f"{stage.temperature} is above the boiling point, {boiling[1]:.0f} °C",
                mend="give the internal temperature, say measured: bath, or name the sealed vessel",
                data={"boiling_point_c": boiling[1]},
            )


@rule(
    id="reflux-off-boiling",
    title="Reflux at another temperature than the boiling point",
    level=Level.QUERY,
    source="solvent-table",
    needs=("temperature-above-boiling",),
    fires_on=("solvent: [{name: ethanol, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h, vessel: reflux}]",),
    silent_on=(
        "solvent: [{name: ethanol, volume: 20 mL}]\nstages: [{temperature: 78 °C, time: 16 h, vessel: reflux}]",
    ),
)
def reflux_is_off_the_boiling_point(case: Case) -> Iterator[Fault]:
    """A mixture under reflux is within 5 K of where its solvent boils.

    Between the lowest and the highest boiling point of a solvent mixture everything is believed; azeotropes and
    dissolved salts shift it by a few kelvin.
    """
    for index, stage in enumerate(case.record.stages):
        boiling = _boiling(case, index)
        if boiling is None or stage.vessel is not Vessel.REFLUX or stage.pressure is not None or _is_bath(stage):
            continue
        low, high = boiling
        if not low - REFLUX_MARGIN_K <= stage.temperature.highest_c <= high + REFLUX_MARGIN_K:
            yield Fault(
                at=("stages", index, "temperature"),
                message=f"reflux at {stage.temperature}, while the solvent boils at {_span(low, high)} °C",
                mend="correct the temperature, or the vessel",
            )


@rule(
    id="temperature-below-freezing",
    title="Colder than the solvent freezes",
    level=Level.QUERY,
    source="solvent-table",
    fires_on=("solvent: [{name: DMSO, volume: 20 mL}]\nstages: [{temperature: 0 °C, time: 16 h}]",),
    silent_on=("solvent: [{name: DMSO, volume: 20 mL}]\nstages: [{temperature: 25 °C, time: 16 h}]",),
)
def temperature_is_below_freezing(case: Case) -> Iterator[Fault]:
    """The mixture is liquid: it is warmer than its solvent freezes.

    DMSO (18.5 °C), tert-butanol (26 °C) and 1,4-dioxane (12 °C) freeze close to the temperature of the room. A
    solution freezes lower than its solvent, so this is a query.
    """
    for index, stage in enumerate(case.record.stages):
        freezing = _freezing(case, index)
        if freezing is not None and stage.temperature.lowest_c < freezing - MARGIN_K:
            yield Fault(
                at=("stages", index, "temperature"),
                message=f"{stage.temperature} is below the freezing point, {freezing:.0f} °C",
                mend="correct the temperature or the solvent, or accept this with what was seen",
            )


@rule(
    id="temperature-looks-kelvin",
    title="A temperature that looks like kelvin",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("stages: [{temperature: 298 °C, time: 16 h, vessel: sealed}]",),
    silent_on=("stages: [{temperature: 180 °C, time: 16 h, vessel: sealed}]",),
)
def temperature_looks_like_kelvin(case: Case) -> Iterator[Fault]:
    """A value from 273 to 373 with °C behind it is usually in kelvin.

    298 K is a room; at 298 °C hardly any solvent of this book is stable.
    """
    for index, stage in enumerate(case.record.stages):
        for value in {stage.temperature.start, stage.temperature.end}:
            if value.unit == "°C" and 273.0 <= value.magnitude <= 373.2:
                yield Fault(
                    at=("stages", index, "temperature"),
                    message=f"{value}: was it kelvin?",
                    mend=f'write "{value.number} K", or accept this with the reason',
                    fix=_in_kelvin(value) if stage.temperature.start == stage.temperature.end else None,
                )


@rule(
    id="solvent-unknown",
    title="A solvent outside the table",
    level=Level.REMARK,
    source="solvent-table",
    fires_on=("solvent: [{name: DFM, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]",),
    silent_on=(
        "solvent: [{name: 'N,N-dimethylformamide', volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]",
    ),
)
def solvent_is_unknown(case: Case) -> Iterator[Fault]:
    """A solvent is found in the solvent table, by name, synonym or structure.

    Otherwise neither its boiling point nor its effect on the rate can be checked. A near miss is a slip of the pen and
    a query; a solvent the table does not have is a remark.
    """
    for index, solvent in enumerate(case.record.solvents):
        if _row(case, index) is None:
            near = nearest_solvents(solvent.name)
            hint = f'; did you mean "{near[0]}"?' if near else ""
            yield Fault(
                at=("solvent", index, "name"),
                level=Level.QUERY if near else None,
                message=f'unknown solvent "{solvent.name}"{hint}',
                mend="correct the name, add its smiles, or add it to the solvent table with sources",
                fix=near[0] if near else None,
            )


CONDITION_CHECKS = (
    reflux_is_off_the_boiling_point,
    solvent_is_unknown,
    temperature_is_above_boiling,
    temperature_is_below_freezing,
    temperature_looks_like_kelvin,
)


def _row(case: Case, index: int) -> Solvent | None:
    structure = case.structures.get(("solvent", index))
    return find_solvent(case.record.solvents[index].name, structure.smiles if structure else None)


def _parts(case: Case, stage: int) -> list[tuple[Solvent, float]] | None:
    """Return the solvents present in a stage with their volumes; None where one is unknown."""
    parts: list[tuple[Solvent, float]] = []
    for index in present_solvents(case.record, stage):
        row = _row(case, index)
        if row is None:
            return None
        solvent = case.record.solvents[index]
        quantity = solvent.volume or solvent.fraction
        parts.append((row, quantity.magnitude if quantity else 1.0))
    return parts or None


def _boiling(case: Case, stage: int) -> tuple[float, float] | None:
    parts = _parts(case, stage)
    return boiling_point_c(parts) if parts else None


def _freezing(case: Case, stage: int) -> float | None:
    parts = _parts(case, stage)
    return freezing_point_c(parts)[0] if parts else None


def _is_bath(stage: Stage) -> bool:
    return stage.measured is not None and stage.measured.value in {"bath", "jacket"}


def _span(low: float, high: float) -> str:
    return f"{low:.0f}" if high - low < 1.0 else f"{low:.0f} to {high:.0f}"


def _in_kelvin(value: Quantity) -> str:
    return f"{value.number} K"
