"""What a new record may take from an entry: how it was run, never what came of it."""

from collections.abc import Iterable, Iterator
from dataclasses import replace
from decimal import Decimal

from builder.authoring.plan import Plan, PlannedSolvent, PlannedStage, moles_of
from builder.checks.case import Case
from builder.mechanism.compounds import Identified
from builder.records.model import Stage
from builder.rule import Path

__all__ = ["borrowed", "offer_of", "run_in"]


def borrowed(plan: Plan, case: Case) -> Plan:
    """Return the plan with stages, solvents, equivalents and work-up of an entry, as far as it says none of its own.

    Names of the entry's substances become those of the plan. A stated temperature or time stands in place of that of
    the hottest stage. Volumes are worked out for the plan's scale, and stay open without one.
    """
    record = case.record
    solvents = plan.solvents or (() if plan.is_neat else _solvents(plan, case))
    plan = replace(plan, solvents=solvents, is_neat=plan.is_neat or (not solvents and bool(record.neat)))
    hottest = max(range(len(record.stages)), key=lambda place: record.stages[place].temperature.highest_c)
    stages = tuple(_stage(stage, plan, case) for stage in record.stages)
    stated = plan.stages[0]
    stages = tuple(
        replace(stage, temperature=stated.temperature or stage.temperature, time=stated.time or stage.time)
        if place == hottest
        else stage
        for place, stage in enumerate(stages)
    )
    first: Path = ("nucleophile", 0) if isinstance(plan.nucleophile, Identified) else ("base", 0)
    return replace(
        plan,
        stages=stages,
        equivalents=plan.equivalents or _ratio(case, first),
        base_equivalents=plan.base_equivalents or _ratio(case, ("base", 0)),
        work_up=plan.work_up or tuple(record.work_up or ()),
        origin=record.entry,
    )


def run_in(plan: Plan, case: Case) -> Plan:
    """Return the plan with solvents and temperature of an entry where it has none, to see what is to be expected."""
    stages = plan.stages
    if not any(stage.temperature for stage in stages):
        stages = tuple(PlannedStage(str(stage.temperature), str(stage.time)) for stage in case.record.stages)
    if plan.solvents or plan.is_neat:
        return replace(plan, stages=stages)
    return replace(plan, stages=stages, solvents=tuple(_mixed_alike(case)), is_neat=bool(case.record.neat))


def _mixed_alike(case: Case) -> Iterator[PlannedSolvent]:
    """Yield the solvents of an entry with their shares, in equal parts where it does not tell all volumes."""
    volumes = [case.amounts.at(("solvent", place)).volume_l for place in range(len(case.record.solvents))]
    known = [volume for volume in volumes if volume is not None]
    for solvent, volume in zip(case.record.solvents, volumes, strict=True):
        if solvent.fraction is not None:
            yield PlannedSolvent(name=solvent.name, fraction=str(solvent.fraction))
        elif volume is not None and len(known) == len(volumes) > 1:
            yield PlannedSolvent(name=solvent.name, fraction=f"{100 * volume / sum(known):.4g} %")
        else:
            yield PlannedSolvent(name=solvent.name)


def offer_of(case: Case) -> str:
    """Return in a line how an entry was run: "DMF, 60 °C for 16 h"."""
    solvent = "neat" if case.record.neat else ", ".join(each.name for each in case.record.solvents)
    stages = "; then ".join(f"{stage.temperature} for {stage.time}" for stage in case.record.stages)
    return f"{solvent}, {stages}"


def _solvents(plan: Plan, case: Case) -> tuple[PlannedSolvent, ...]:
    """Return the solvents of an entry, each with as much for a mole of substrate as there."""
    theirs, ours = case.amounts.substrate.amount_mol, moles_of(plan)
    found = []
    for place, solvent in enumerate(case.record.solvents):
        volume_l = case.amounts.at(("solvent", place)).volume_l
        if solvent.fraction is not None:
            found.append(PlannedSolvent(name=solvent.name, fraction=str(solvent.fraction)))
        elif volume_l is None or theirs is None or ours is None:
            found.append(PlannedSolvent(name=solvent.name))
        else:
            found.append(PlannedSolvent(name=solvent.name, volume=f"{1000 * volume_l / theirs * ours:.3g} mL"))
    return tuple(found)


def _stage(stage: Stage, plan: Plan, case: Case) -> PlannedStage:
    was = [f"end point: {stage.end_point}"] if stage.end_point else []
    was += [f"note: {stage.note}"] if stage.note else []
    was += [f"it gave {stage.gives.name}, for the next stage"] if stage.gives else []
    ours = dict(_renamed(plan, case))
    missing = [name for name in stage.add or () if name not in ours]
    was += [f"it added {', '.join(missing)}, which is not in this record"] if missing else []
    return PlannedStage(
        temperature=str(stage.temperature),
        time=str(stage.time),
        add=tuple(_each_once(new for name in stage.add or () for new in ours.get(name, ()))),
        over=str(stage.over or ""),
        measured=str(stage.measured or ""),
        vessel=str(stage.vessel or ""),
        atmosphere=stage.atmosphere or "",
        pressure=str(stage.pressure or ""),
        was=tuple(was),
    )


def _each_once(names: Iterable[str]) -> Iterator[str]:
    """Yield each name once; open ones are as many substances as there are."""
    told: set[str] = set()
    for name in names:
        if name not in told:
            yield name
        told |= {name} - {""}


def _renamed(plan: Plan, case: Case) -> Iterator[tuple[str, tuple[str, ...]]]:
    """Yield the name of each substance of an entry with those that stand for it in the plan; an open one is empty."""
    record = case.record
    yield record.substrate.name, (plan.substrate.name,)
    if isinstance(plan.nucleophile, Identified):
        for nucleophile in record.nucleophiles:
            yield nucleophile.name, (plan.nucleophile.name,)
    if plan.base is not None:
        for base in record.bases:
            yield base.name, (plan.base.name,)
    named = {solvent.name for solvent in plan.solvents}
    for solvent in record.solvents:
        same = solvent.name in named
        yield solvent.name, (solvent.name,) if same else tuple(each.name for each in plan.solvents)


def _ratio(case: Case, path: Path) -> Decimal | None:
    """Return the equivalents of a substance of an entry; None where it has none."""
    if not (case.record.nucleophiles if path[0] == "nucleophile" else case.record.bases):
        return None
    ratio = case.amounts.at(path).equivalents
    return None if ratio is None else Decimal(f"{ratio:.3g}")
