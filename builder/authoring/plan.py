"""What a new record is to hold, before anything was run; and the trial record by which the engine is asked about it."""

import datetime as dt
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from decimal import Decimal
from typing import Any

from builder.checks.case import Case, open_case
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.compounds import Identified
from builder.mechanism.solvents import find_solvent
from builder.records.model import Record
from builder.records.quantities import Dimension, parse_quantity
from builder.records.settings import Settings
from builder.records.vocabulary import NucleophileWord, ReagentUse, Result, StereoKind

__all__ = ["NEAT", "Plan", "PlannedReagent", "PlannedSolvent", "PlannedStage", "moles_of", "safety_case", "trial_case"]

NEAT = "neat"


@dataclass(frozen=True, slots=True)
class PlannedSolvent:
    """A solvent with what is known of its quantity, as typed; both empty where nothing is."""

    name: str
    volume: str = ""
    fraction: str = ""

    @property
    def structure(self) -> Structure | None:
        """Return its structure, if the table of solvents has it."""
        row = find_solvent(self.name)
        return None if row is None else parse_smiles(row.smiles)


@dataclass(frozen=True, slots=True)
class PlannedReagent:
    """Whatever else goes in, with its use."""

    compound: Identified
    use: ReagentUse


@dataclass(frozen=True, slots=True)
class PlannedStage:
    """One stage, as typed; what is empty stays open.

    add: names of substances in the order they go in. was: what the entry it was taken from said, which is no plan.
    """

    temperature: str = ""
    time: str = ""
    add: tuple[str, ...] = ()
    over: str = ""
    measured: str = ""
    vessel: str = ""
    atmosphere: str = ""
    pressure: str = ""
    was: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """A reaction that is to be recorded: what is empty or None stays open.

    nucleophile: a compound, or the word that stands in its place.
    quantity: key and text of the substrate's quantity ("mass", "1.37 g").
    equivalents: of the nucleophile, or else of the base; base_equivalents: of a base beside a nucleophile.
    solvents: empty and is_neat for a reaction without.
    origin: the entry that stages, solvents, equivalents and work-up were taken from. nearest: the nearest entry.
    products: drawn in an RXN file, the one that was wanted first.
    """

    substrate: Identified
    classes: tuple[str, ...] = ()
    leaving_group: str = ""
    stereo: StereoKind | None = None
    nucleophile: Identified | NucleophileWord | None = None
    base: Identified | None = None
    reagents: tuple[PlannedReagent, ...] = ()
    quantity: tuple[str, str] | None = None
    equivalents: Decimal | None = None
    base_equivalents: Decimal | None = None
    solvents: tuple[PlannedSolvent, ...] = ()
    is_neat: bool = False
    stages: tuple[PlannedStage, ...] = (PlannedStage(),)
    work_up: tuple[str, ...] = ()
    origin: str = ""
    nearest: str = ""
    title: str = ""
    person: str = ""
    date: dt.date
    products: tuple[Structure, ...] = field(default=())

    @property
    def molecule(self) -> Structure:
        """Return the structure of the substrate, which is known from the start."""
        assert self.substrate.structure is not None  # noqa: S101 - `new` refuses a substrate without one
        return self.substrate.structure

    @property
    def attacks_or_takes_protons(self) -> bool:
        """Say whether there is a nucleophile, a word in its place, or a base."""
        return self.nucleophile is not None or self.base is not None


def moles_of(plan: Plan) -> float | None:
    """Return the moles of substrate that its quantity stands for; None where that cannot be told."""
    if plan.quantity is None:
        return None
    key, text = plan.quantity
    if key == "amount":
        return parse_quantity(text, Dimension.AMOUNT).magnitude
    return parse_quantity(text, Dimension.MASS).magnitude / plan.molecule.mass


# --- the trial ------------------------------------------------------------------------------------------------

_AMOUNT = "10 mmol"
_VOLUME_ML = 20.0
"""With the amount above 0.5 mol/L, which is what the engine takes where nothing is stated."""
_EQUIVALENTS = Decimal("1.5")
_CATALYST = Decimal("0.1")
_TIME = "24 h"
_ROOM = "25 °C"


def trial_case(plan: Plan) -> Case | None:
    """Return the plan as the checks would look at it, everything open filled with what is usual.

    None where site, partner, solvent or temperature are not known: then there is nothing to ask the engine.
    """
    is_open = not plan.leaving_group or not plan.classes or not plan.attacks_or_takes_protons
    if is_open or not (plan.solvents or plan.is_neat) or not any(stage.temperature for stage in plan.stages):
        return None
    return _opened(plan)


def safety_case(plan: Plan) -> Case:
    """Return the plan as the checks of hazards would look at it, its work-up included, however much is still open."""
    partner = plan.nucleophile if plan.attacks_or_takes_protons else NucleophileWord.NONE
    warm = any(stage.temperature for stage in plan.stages)
    return _opened(
        replace(
            plan,
            classes=plan.classes or ("primary",),
            leaving_group=plan.leaving_group or "none",
            nucleophile=partner,
            is_neat=plan.is_neat or not plan.solvents,
            stages=plan.stages if warm else (PlannedStage(_ROOM),),
        )
    )


def _opened(plan: Plan) -> Case:
    record = Record.model_validate(_trial(plan))
    return open_case(record, "", Settings(format=1, title="Trial"), plan.date)


def _trial(plan: Plan) -> dict[str, Any]:
    has_volumes = all(solvent.volume for solvent in plan.solvents) and plan.quantity is not None
    key, text = plan.quantity if has_volumes and plan.quantity else ("amount", _AMOUNT)
    substrate = {"class": list(plan.classes), "leaving_group": plan.leaving_group, key: text}
    if plan.stereo is not None and plan.stereo is not StereoKind.MIXTURE:
        substrate["stereo"] = plan.stereo.value
    found: dict[str, Any] = {
        "format": 1,
        "entry": "NS4T9XQ2N",
        "revision": 1,
        "status": "draft",
        "title": "Trial",
        "performed": {"date": plan.date.isoformat(), "by": ["nobody"]},
        "substrate": {**_drawn(plan.substrate, "the substrate"), **substrate},
        "stages": [_trial_stage(stage) for stage in plan.stages if stage.temperature],
        "outcome": {"result": [Result.NO_REACTION.value]},
    }
    if isinstance(plan.nucleophile, NucleophileWord):
        found["nucleophile"] = plan.nucleophile.value
    elif plan.nucleophile is not None:
        ratio = {"equivalents": plan.equivalents or _EQUIVALENTS}
        found["nucleophile"] = {**_drawn(plan.nucleophile, "the nucleophile"), **ratio}
    if plan.base is not None:
        ratio = {"equivalents": plan.base_equivalents or plan.equivalents or _EQUIVALENTS}
        found["base"] = {**_drawn(plan.base, "the base"), **ratio}
    if plan.reagents:
        found["reagents"] = [_trial_reagent(reagent) for reagent in plan.reagents]
    if plan.work_up:
        found["work_up"] = list(plan.work_up)
    if plan.is_neat:
        return {**found, "neat": True}
    if any(solvent.fraction for solvent in plan.solvents):
        found["concentration"] = "0.5 mol/L"
    return {**found, "solvent": list(_trial_solvents(plan, has_volumes=has_volumes))}


def _drawn(compound: Identified, otherwise: str) -> dict[str, str]:
    drawn = {"smiles": compound.smiles} if compound.smiles else {}
    return {"name": compound.name or otherwise, **drawn}


def _trial_stage(stage: PlannedStage) -> dict[str, Any]:
    held = {"temperature": stage.temperature, "time": stage.time or _TIME}
    known = {"vessel": stage.vessel, "atmosphere": stage.atmosphere}
    return {**held, **{key: text for key, text in known.items() if text}}


def _trial_reagent(reagent: PlannedReagent) -> dict[str, Any]:
    is_little = reagent.use in {ReagentUse.CATALYST, ReagentUse.ADDITIVE}
    ratio = _CATALYST if is_little else _EQUIVALENTS
    return {**_drawn(reagent.compound, "reagent"), "use": reagent.use.value, "equivalents": ratio}


def _trial_solvents(plan: Plan, *, has_volumes: bool) -> Iterator[dict[str, str]]:
    for solvent in plan.solvents:
        if solvent.fraction:
            yield {"name": solvent.name, "fraction": solvent.fraction}
        else:
            share = f"{_VOLUME_ML / len(plan.solvents):.1f} mL"
            yield {"name": solvent.name, "volume": solvent.volume if has_volumes else share}
