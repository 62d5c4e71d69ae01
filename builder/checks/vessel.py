"""The vessel: how full it is, what gas it has to hold, and under which pressure."""

from collections.abc import Iterator, Sequence

from builder.checks.case import Case
from builder.checks.conditions import CLOSED_VESSELS
from builder.finding import Level
from builder.mechanism.amounts import Role, charged_rows, present_rows
from builder.mechanism.gas import (
    GasFormed,
    closed_vessel_bar,
    gas_volume_l,
    gases_of_record,
    present_in,
)
from builder.mechanism.solvents import Solvent, solvent_of
from builder.mechanism.vapour_pressure import mixture_bar
from builder.mechanism.volatiles import Volatile, find_volatile
from builder.records.figures import volume_text
from builder.records.vocabulary import Vessel
from builder.rule import Fault, rule

__all__ = ["VESSEL_CHECKS"]

FULL = 2 / 3
HEADSPACE_OF_LIQUID = 0.10  # where no vessel size is given; group practice
RATED_ABOVE_BAR = 10.0  # ordinary pressure tubes end about here; common practice, no source
PRESSURE_MARGIN = 1.25  # an ideal mixture, a pressure gauge; common practice, no source
GAUGE_BAR = 1.2  # what a gauge pressure, or one of the vapour alone, leaves out: 1 atm of gas, warmed
COOL_K = 50.0
_SENSOR = ("fibre", "fiber", "infrared", "probe", "sensor", "surface", "pyromet", "thermocouple")


def _sealed(more: str) -> str:
    return f"stages: [{{temperature: 60 °C, time: 16 h, vessel: sealed{more}}}]"


_CARBONATE_AND_ACID = (
    "reagents: [{name: sodium hydrogencarbonate, smiles: '[Na+].OC([O-])=O', use: buffer, amount: 20 mmol},"
    " {name: acetic acid, smiles: 'CC(=O)O', use: acid, amount: 10 mmol}]\n"
    "safety_review: {by: safety-1, date: 2026-03-12, scope: azide with acetic acid}\n"
)


@rule(
    id="vessel-overfilled",
    title="A vessel filled beyond two thirds",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        _sealed(", vessel_volume: 25 mL"),
        "base: {name: sodium hydroxide, smiles: '[Na+].[OH-]', volume: 15 mL, strength: 1.0 mol/L}\n"
        + _sealed(", vessel_volume: 50 mL"),
    ),
    silent_on=(_sealed(", vessel_volume: 50 mL"),),
)
def vessel_is_overfilled(case: Case) -> Iterator[Fault]:
    """A vessel is filled to at most two thirds; in a sealed one more is an error.

    A liquid that expands or boils needs the room, and a full sealed vessel bursts. All liquids count whose volume is
    typed, or follows from mass and density or amount and strength; a volume nobody can tell counts as zero, so that the
    vessel is at least as full as the message says.
    """
    for index, stage in enumerate(case.record.stages):
        liquid = _liquid_l(case, index)
        if stage.vessel_volume is None or liquid is None:
            continue
        share = liquid / stage.vessel_volume.magnitude
        if share > FULL * 1.001:
            yield Fault(
                at=("stages", index, "vessel_volume"),
                message=f"{volume_text(liquid)} of liquid fill at least {100 * share:.0f} % of the vessel",
                mend="use a larger vessel, or correct its volume",
                level=Level.ERROR if stage.vessel in CLOSED_VESSELS else None,
            )


@rule(
    id="gas-above-headspace",
    title="More gas than a closed vessel has room for",
    source="common-practice",
    needs=("structure-unreadable", "vessel-overfilled"),
    fires_on=(
        _CARBONATE_AND_ACID + _sealed(""),
        _CARBONATE_AND_ACID + _sealed(", vessel_volume: 100 mL"),
    ),
    silent_on=(
        _CARBONATE_AND_ACID + _sealed("").replace("sealed", "gas collected"),
        _CARBONATE_AND_ACID.replace("10 mmol", "0.05 mmol") + _sealed(", vessel_volume: 50 mL"),
    ),
)
def gas_needs_more_than_the_headspace(case: Case) -> Iterator[Fault]:
    """The gas that forms in a closed vessel has, at 25 °C and 1 atm, less volume than its headspace.

    Counted from the structures charged, reacting completely (carbon dioxide of carbonate and acid, hydrogen of
    hydrides, nitrogen of diazonium ions, hydrogen chloride and sulfur dioxide of thionyl chloride), in the stage where
    they meet; gases that condense or dissolve well, isobutene among them, are not counted. Without a vessel size the
    headspace is taken as 10 % of the liquid. Twice as much gas as headspace is 2 bar on top of everything else.
    """
    for index, stage in enumerate(case.record.stages):
        liquid = _liquid_l(case, index)
        if stage.vessel not in CLOSED_VESSELS or liquid is None:
            continue
        formed = _permanent(case, index)
        volume = gas_volume_l(_total(formed))
        if stage.vessel_volume is None:
            headspace, taken_as = HEADSPACE_OF_LIQUID * liquid, " (10 % of the liquid; no vessel_volume is given)"
        else:
            headspace, taken_as = max(0.0, stage.vessel_volume.magnitude - liquid), ""
        if volume > headspace:
            causes = ", ".join(dict.fromkeys(f"{each.gas.name} from {each.cause}" for each in formed))
            yield Fault(
                at=("stages", index, "vessel"),
                message=f"up to {volume_text(volume)} of gas (25 °C, 1 atm) in a closed vessel with"
                f" {volume_text(headspace)} of headspace{taken_as}: {causes}",
                mend="let the gas out (vessel: gas collected), give the vessel's volume, or correct the amounts",
                data={"gas_mol": round(_total(formed), 6), "headspace_l": round(headspace, 6)},
            )


@rule(
    id="pressure-above-rating",
    title="More pressure than is stated for a closed vessel",
    source="vapour-pressure-tables",
    needs=("structure-unreadable", "gas-above-headspace"),
    fires_on=(
        "solvent: [{name: THF, volume: 20 mL}]\n" + _sealed(", pressure: 2 bar").replace("60 °C", "150 °C"),
        "solvent: [{name: THF, volume: 20 mL}]\n" + _sealed("").replace("60 °C", "190 °C"),
    ),
    silent_on=(
        "solvent: [{name: THF, volume: 20 mL}]\n" + _sealed(", pressure: 3 bar").replace("60 °C", "80 °C"),
        "solvent: [{name: THF, volume: 20 mL}]\n" + _sealed("").replace("60 °C", "100 °C"),
    ),
)
def pressure_is_above_the_rating(case: Case) -> Iterator[Fault]:
    """A closed vessel stands the pressure that its contents make: vapour, gas shut in at 25 °C, gas formed.

    `pressure` of a closed stage is held to be the absolute working pressure. Computed are the vapour pressure of the
    solvents and neat volatile reactants as an ideal mixture, and air or inert gas of 1 atm, warmed; liquids without a
    correlation count as zero and are named. A fault is what exceeds the stated pressure by a quarter even where that
    leaves out the atmosphere. Without a stated pressure, 10 bar and more is a query: such a reaction belongs into a
    rated vessel, and the record says which.
    """
    for index, stage in enumerate(case.record.stages):
        if stage.vessel not in CLOSED_VESSELS:
            continue
        computed = _pressure(case, index)
        if computed is None:
            continue
        bar, lacking = computed
        but = f"; {', '.join(lacking)} not counted, no correlation at this temperature" if lacking else ""
        found = f"about {bar:.2g} bar absolute at {stage.temperature} (vapour, warmed gas{but})"
        if stage.pressure is None:
            if bar > RATED_ABOVE_BAR:
                yield Fault(
                    at=("stages", index, "vessel"),
                    message=f"{found}, and no pressure is stated",
                    mend="state the working pressure of the rated vessel (pressure: 20 bar), or correct what is wrong",
                    level=Level.QUERY,
                    data={"pressure_bar": round(bar, 2)},
                )
            continue
        if bar > PRESSURE_MARGIN * (stage.pressure.magnitude + GAUGE_BAR):
            yield Fault(
                at=("stages", index, "pressure"),
                message=f"{found}, more than the {stage.pressure} stated would allow even if read as gauge pressure",
                mend="correct the pressure, the temperature or the amounts",
                data={"pressure_bar": round(bar, 2)},
            )


@rule(
    id="microwave-without-sensor",
    title="A microwave temperature without its sensor",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("stages: [{temperature: 120 °C, time: 20 min, vessel: microwave}]",),
    silent_on=(
        "stages: [{temperature: 120 °C, measured: internal, time: 20 min, vessel: microwave}]",
        "stages: [{temperature: 120 °C, time: 20 min, vessel: microwave, note: infrared sensor on the wall}]",
    ),
)
def microwave_lacks_its_sensor(case: Case) -> Iterator[Fault]:
    """A temperature under microwaves says what measured it: a probe inside, or an infrared sensor at the wall.

    The two differ by tens of kelvin while heating. `measured: internal` stands for a fibre-optic probe; for the wall
    there is no word in `measured`, a `note` says it.
    """
    for index, stage in enumerate(case.record.stages):
        note = (stage.note or "").casefold()
        says_so = stage.measured is not None or any(word in note for word in _SENSOR)
        if stage.vessel is Vessel.MICROWAVE and not says_so:
            yield Fault(
                at=("stages", index, "temperature"),
                message=f"{stage.temperature} under microwaves, and nothing says where it was read",
                mend="write measured: internal for a probe inside, or note: infrared sensor on the wall",
            )


VESSEL_CHECKS = (
    gas_needs_more_than_the_headspace,
    microwave_lacks_its_sensor,
    pressure_is_above_the_rating,
    vessel_is_overfilled,
)


def _liquid_l(case: Case, stage: int) -> float | None:
    """Return the volume of all liquids in a stage that have one; None where that of a solvent is unknown."""
    rows = present_rows(case.record, case.amounts, stage)
    solvents = [row.volume_l for row in rows if row.role is Role.SOLVENT]
    if None in solvents or not (solvents or case.record.neat):
        return None
    volumes = [row.volume_l for row in rows if row.volume_l is not None]
    return sum(volumes) if volumes else None


def _permanent(case: Case, stage: int) -> list[GasFormed]:
    formed = gases_of_record(case.record, case.structures, case.amounts, stage)
    return [each for each in formed if each.gas.is_permanent and each.moles]


def _total(formed: Sequence[GasFormed]) -> float:
    return sum(each.moles or 0.0 for each in formed)


def _pressure(case: Case, stage: int) -> tuple[float, tuple[str, ...]] | None:
    """Return the pressure (bar) in a closed vessel and the liquids it leaves out; None where it is not worth asking.

    Without a stated pressure 10 bar are asked about, and no liquid reaches them less than 50 K above its boiling point.
    """
    record, hottest = case.record.stages[stage], case.record.stages[stage].temperature.highest_c
    parts = _boiling_parts(case, stage)
    moles = _total(_permanent(case, stage))
    is_cool = not moles and all(hottest < substance.bp_c + COOL_K for substance, _ in parts)
    if not parts or (record.pressure is None and is_cool):
        return None
    liquid, headspace = _liquid_l(case, stage), None
    if record.vessel_volume is not None and liquid is not None:
        headspace = max(record.vessel_volume.magnitude - liquid, record.vessel_volume.magnitude * 0.01)
    mixture = mixture_bar(parts, hottest)
    return closed_vessel_bar(hottest, mixture.bar, moles if headspace else 0.0, headspace), mixture.lacking


def _boiling_parts(case: Case, stage: int) -> list[tuple[Solvent | Volatile, float]]:
    """Return the solvents and the neat volatile reactants with their moles; empty where those are not known.

    Solutions of gases are left out: they are anything but ideal.
    """
    present = present_in(case.record, case.structures, case.amounts, stage)
    substances = {path: substance for path, _, substance in charged_rows(case.record)}
    parts: list[tuple[Solvent | Volatile, float | None]] = []
    for each in present:
        if each.path[0] == "solvent":
            solvent = solvent_of(substances[each.path].name, each.structure)
            parts += [(solvent, each.moles)] if solvent is not None else []
        elif substances[each.path].strength is None:
            volatile = find_volatile(each.structure.smiles)
            parts += [(volatile, each.moles)] if volatile is not None else []
    if len(parts) == 1:
        return [(parts[0][0], 1.0)]
    known = [(substance, moles) for substance, moles in parts if moles is not None]
    return known if len(known) == len(parts) else []
