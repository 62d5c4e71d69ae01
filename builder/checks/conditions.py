"""Temperature against the solvent and the vessel, and solvents against the table."""

from collections.abc import Iterator, Sequence

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import Role, charged_rows, present_rows, present_solvents
from builder.mechanism.flask_roles import FlaskRole, roles_in
from builder.mechanism.gas import ATMOSPHERE_BAR
from builder.mechanism.solvents import Solvent, freezing_point_c, nearest_solvents, solvent_of
from builder.mechanism.vapour_pressure import boiling_range_c, bubble_point_c
from builder.mechanism.volatiles import find_volatile
from builder.records.model import Stage
from builder.records.quantities import Quantity
from builder.records.vocabulary import Thermometer, Vessel
from builder.rule import Fault, rule

__all__ = ["CLOSED_VESSELS", "CONDITION_CHECKS"]

MARGIN_K = 3.0  # a thermometer's honest error; common practice, no source
REFLUX_MARGIN_K = 5.0
ROOM_C = 35.0  # a gas stirred into a solvent at the temperature of the room is a matter of solubility
MIXTURE_MARGIN_K = 10.0  # how far Raoult's law is trusted above the bubble point; common practice, no source
_VAPOUR = "vapour-pressure-tables"
CLOSED_VESSELS = frozenset({Vessel.SEALED, Vessel.MICROWAVE})


@rule(
    id="temperature-above-boiling",
    title="Hotter than the solvent boils",
    source="solvent-table",
    fires_on=(
        "stages: [{temperature: 190 °C, time: 16 h, vessel: open}]",
        "stages: [{temperature: 100 °C, time: 16 h, vessel: open, pressure: 20 mbar}]",
        "solvent: [{name: diethyl ether, volume: 10 mL}, {name: DMF, volume: 10 mL}]\n"
        "stages: [{temperature: 90 °C, time: 16 h, vessel: open}]",
    ),
    silent_on=(
        "stages: [{temperature: 150 °C, time: 16 h, vessel: open}]",
        "stages: [{temperature: 190 °C, time: 16 h, vessel: sealed}]",
        "stages: [{temperature: 170 °C, time: 16 h, vessel: open, pressure: 2 bar}]",
        "solvent: [{name: diethyl ether, volume: 10 mL}, {name: DMF, volume: 10 mL}]\n"
        "stages: [{temperature: 35 °C, time: 16 h, vessel: open}]",
    ),
)
def temperature_is_above_boiling(case: Case) -> Iterator[Fault]:
    """In a vessel that is not closed the mixture is no hotter than its solvent boils at the pressure there.

    A bath may be; then `measured: bath` says so. Without a stated `pressure` it is 1 atm; under vacuum, at altitude or
    above 1 atm the boiling point follows from vapour pressures, where the library has a correlation for the solvent. A
    mixture is allowed its highest-boiling part with 7 K for an azeotrope; above the bubble point of the ideal mixture
    it is a query, because solvents are not ideal. In a flow reactor with a stated pressure too it is a query: gas and
    liquid may both run through. A sealed vessel and a microwave have no limit here.
    """
    for index, stage in enumerate(case.record.stages):
        parts, pressure = _parts(case, index), _pressure_bar(stage)
        flows_freely = stage.vessel is Vessel.FLOW and stage.pressure is None
        if parts is None or flows_freely or stage.vessel in CLOSED_VESSELS or _is_bath(stage):
            continue
        hottest = stage.temperature.highest_c
        boiling = boiling_range_c(parts, pressure) if hottest > _cool_enough_c(parts, pressure) else None
        if boiling is None:
            continue
        ideal = bubble_point_c(tuple(parts), pressure) if len(parts) > 1 else None
        if hottest > boiling[1] + MARGIN_K:
            limit, what, source = boiling[1], "the boiling point", _source(stage)
            level = Level.QUERY if stage.vessel is Vessel.FLOW else None
        elif ideal is not None and hottest > ideal + MIXTURE_MARGIN_K:
            limit, what, source = ideal, "where this mixture, taken as ideal, begins to boil", _VAPOUR
            level = Level.QUERY
        else:
            continue
        yield Fault(
            at=("stages", index, "temperature"),
            message=f"{stage.temperature} is above {what}, {limit:.0f} °C{_at_pressure(stage)}",
            mend="give the internal temperature, say measured: bath, or name the sealed vessel or the pressure",
            level=level,
            source=source,
            data={"boiling_point_c": round(limit, 1)},
        )


@rule(
    id="reflux-off-boiling",
    title="Reflux at another temperature than the boiling point",
    level=Level.QUERY,
    source="solvent-table",
    needs=("temperature-above-boiling",),
    fires_on=(
        "solvent: [{name: ethanol, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h, vessel: reflux}]",
        "solvent: [{name: water, volume: 20 mL}]\n"
        "stages: [{temperature: 78 °C, time: 16 h, vessel: reflux, pressure: 0.80 bar}]",
        "solvent: [{name: ethanol, volume: 20 mL}]\n"
        "stages: [{temperature: 60 °C, measured: bath, time: 16 h, vessel: reflux}]",
    ),
    silent_on=(
        "solvent: [{name: ethanol, volume: 20 mL}]\nstages: [{temperature: 78 °C, time: 16 h, vessel: reflux}]",
        "solvent: [{name: water, volume: 20 mL}]\n"
        "stages: [{temperature: 93 °C, time: 16 h, vessel: reflux, pressure: 0.80 bar}]",
        "solvent: [{name: ethanol, volume: 20 mL}]\n"
        "stages: [{temperature: 95 °C, measured: bath, time: 16 h, vessel: reflux}]",
    ),
)
def reflux_is_off_the_boiling_point(case: Case) -> Iterator[Fault]:
    """A mixture under reflux is within 5 K of where its solvent boils at the pressure there; a bath is no colder.

    Between the lowest and the highest boiling point of a solvent mixture everything is believed; azeotropes and
    dissolved salts shift it by a few kelvin. At altitude water boils at 93 °C (0.80 bar): state the pressure.
    """
    for index, stage in enumerate(case.record.stages):
        parts = _parts(case, index)
        if parts is None or stage.vessel is not Vessel.REFLUX:
            continue
        boiling = boiling_range_c(parts, _pressure_bar(stage))
        if boiling is None:
            continue
        low, high = boiling
        hottest = stage.temperature.highest_c
        is_too_hot = hottest > high + REFLUX_MARGIN_K and not _is_bath(stage)
        if hottest < low - REFLUX_MARGIN_K or is_too_hot:
            where = f"a {stage.measured} at {stage.temperature}" if _is_bath(stage) else str(stage.temperature)
            yield Fault(
                at=("stages", index, "temperature"),
                message=f"reflux at {where}, while the solvent boils at {_span(low, high)} °C{_at_pressure(stage)}",
                mend="correct the temperature, or the vessel; away from 1 atm state the pressure",
                source=_source(stage),
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


@rule(
    id="exotherm-read-in-bath",
    title="An exothermic addition followed in the bath only",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        "reagents: [{name: butyllithium, smiles: '[Li]CCCC', use: base, equivalents: 1.1}]\n"
        "stages:\n  - {add: [2-bromobutane, sodium azide], temperature: 0 °C, time: 10 min}\n"
        "  - {add: butyllithium, over: 20 min, temperature: 0 °C, measured: bath, time: 1 h}",
    ),
    silent_on=(
        "reagents: [{name: butyllithium, smiles: '[Li]CCCC', use: base, equivalents: 1.1}]\n"
        "stages:\n  - {add: [2-bromobutane, sodium azide], temperature: 0 °C, time: 10 min}\n"
        "  - {add: butyllithium, over: 20 min, temperature: 0 °C, measured: internal, time: 1 h}",
        "stages: [{add: [2-bromobutane, sodium azide], over: 20 min, temperature: 60 °C, measured: bath, time: 16 h}]",
    ),
)
def exotherm_is_read_in_the_bath(case: Case) -> Iterator[Fault]:
    """Where something goes in over time because of its heat, the temperature is read inside.

    A hydride, an organometallic, an acid chloride, a sulfonyl chloride, thionyl chloride, sulfuric acid: while one of
    these runs in, the mixture can be tens of kelvin above the bath, and the record would repeat the wrong number. Asked
    only of a stage that names it under `add`, with `over`, and `measured: bath`.
    """
    for index, stage in enumerate(case.record.stages):
        if stage.over is None or stage.measured is not Thermometer.BATH:
            continue
        for path, _, substance in charged_rows(case.record):
            structure = case.structures.get(path)
            is_added = substance.name in (stage.add or ()) and structure is not None
            if is_added and FlaskRole.HEAT_OF_ADDITION in roles_in([case.structures[path]]):
                yield Fault(
                    at=("stages", index, "measured"),
                    message=f"{substance.name} goes in over {stage.over}, and only the bath at {stage.temperature}"
                    " was read",
                    mend="give the internal temperature, or accept this with how the heat was followed",
                )
                break


@rule(
    id="volatile-in-open-vessel",
    title="A reactant that boils far below the temperature of an open vessel",
    level=Level.QUERY,
    source="crc-handbook-95",
    needs=("structure-unreadable",),
    fires_on=(
        "nucleophile: {name: methylamine, smiles: CN, equivalents: 2.0}\n"
        "stages: [{temperature: 60 °C, time: 16 h, vessel: open}]",
        "substrate: {name: iodomethane, smiles: CI, class: methyl, leaving_group: iodide, amount: 10 mmol}\n"
        "stages: [{temperature: 150 °C, time: 16 h, vessel: reflux}]",
    ),
    silent_on=(
        "nucleophile: {name: methylamine, smiles: CN, equivalents: 2.0}\n"
        "stages: [{temperature: 60 °C, time: 16 h, vessel: sealed}]",
        "nucleophile: {name: methylamine, smiles: CN, volume: 3 mL, strength: 12 mol/L}\n"
        "stages: [{temperature: 25 °C, time: 16 h, vessel: open}]",
    ),
)
def volatile_reactant_in_an_open_vessel(case: Case) -> Iterator[Fault]:
    """A reactant that boils far below the temperature does not stay in a vessel that is open.

    Asked above its boiling point by 30 K in an open vessel, by 50 K where it was charged as a solution or is fed over
    time, by 60 K under reflux, for a condenser holds something back; never below 35 °C. Vessels without a word count as
    open.
    """
    for path, role, substance in charged_rows(case.record):
        structure = case.structures.get(path)
        volatile = find_volatile(structure.smiles) if structure is not None else None
        if volatile is None or role not in {Role.SUBSTRATE, Role.NUCLEOPHILE, Role.BASE}:
            continue
        for index, stage in enumerate(case.record.stages):
            if stage.vessel not in {None, Vessel.OPEN, Vessel.REFLUX} or stage.pressure is not None:
                continue
            if substance.name not in {row.name for row in present_rows(case.record, case.amounts, index)}:
                continue
            is_held = substance.strength is not None or (stage.over is not None and substance.name in (stage.add or ()))
            margin = 60.0 if stage.vessel is Vessel.REFLUX else 50.0 if is_held else 30.0
            if stage.temperature.lowest_c > max(volatile.bp_c + margin, ROOM_C):
                yield Fault(
                    at=("stages", index, "temperature"),
                    message=f"{substance.name} boils at {volatile.bp_c:g} °C and leaves an open vessel at"
                    f" {stage.temperature}",
                    mend="name the sealed vessel (vessel: sealed) or how it was kept in, or correct the temperature",
                    data={"boiling_point_c": volatile.bp_c},
                )
                break


CONDITION_CHECKS = (
    exotherm_is_read_in_the_bath,
    reflux_is_off_the_boiling_point,
    solvent_is_unknown,
    temperature_is_above_boiling,
    temperature_is_below_freezing,
    temperature_looks_like_kelvin,
    volatile_reactant_in_an_open_vessel,
)


def _row(case: Case, index: int) -> Solvent | None:
    return solvent_of(case.record.solvents[index].name, case.structures.get(("solvent", index)))


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


def _pressure_bar(stage: Stage) -> float:
    return ATMOSPHERE_BAR if stage.pressure is None else stage.pressure.magnitude


def _source(stage: Stage) -> str | None:
    """Return where a boiling point comes from; None for the solvent table, the rules' own source."""
    return None if stage.pressure is None else _VAPOUR


def _at_pressure(stage: Stage) -> str:
    return "" if stage.pressure is None else f" at {stage.pressure}"


def _cool_enough_c(parts: Sequence[tuple[Solvent, float]], pressure_bar: float) -> float:
    """Return below which temperature (°C) no mixture of these boils, told without vapour pressures; far down in vacuum.

    An ideal mixture boils above its lowest component, and above 1 atm every liquid boils higher.
    """
    lowest = min(solvent.bp_c for solvent, _ in parts)
    return lowest if pressure_bar >= 0.98 * ATMOSPHERE_BAR else -100.0


def _freezing(case: Case, stage: int) -> float | None:
    parts = _parts(case, stage)
    return freezing_point_c(parts)[0] if parts else None


def _is_bath(stage: Stage) -> bool:
    return stage.measured is not None and stage.measured.value in {"bath", "jacket"}


def _span(low: float, high: float) -> str:
    return f"{low:.0f}" if high - low < 1.0 else f"{low:.0f} to {high:.0f}"


def _in_kelvin(value: Quantity) -> str:
    return f"{value.number} K"
