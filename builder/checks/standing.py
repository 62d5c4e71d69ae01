"""Standing: what of a case is held against the other entries of the book, as plain data.

It is worked out where the case is, so that the records of a book can be compared where no structure ever comes.
"""

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum

from builder.checks.case import Case
from builder.checks.reaction_key import attacking_role, reaction_key, transformation_key, wanted_products
from builder.checks.seen import Seen, seen_in
from builder.mechanism.amounts import AmountRow, Role, charged_rows
from builder.mechanism.from_record import COMPARABLE_K
from builder.mechanism.solvents import solvent_of
from builder.records.figures import amount_text, concentration_text, equivalents_text
from builder.records.model import Record, Stage
from builder.records.vocabulary import NucleophileWord, Vessel

__all__ = ["NOT_STATED", "Charge", "Standing", "Variable", "standing_of"]

NOT_STATED = "not stated"


class Variable(StrEnum):
    """What may differ between two runs, the most telling first.

    Base, solvent with its water, and order of addition explain most alkylations that do not repeat (common practice).
    """

    BASE = "base"
    REAGENTS = "reagents"
    SOLVENT = "solvent"
    NUCLEOPHILE = "nucleophile"
    LEAVING_GROUP = "leaving group"
    SUBSTRATE = "substrate"
    ORDER = "order of addition"
    EQUIVALENTS = "equivalents"
    TEMPERATURE = "temperature"
    CONCENTRATION = "concentration"
    TIME = "time"
    QUALITY = "form and purity"
    VESSEL = "vessel"
    ATMOSPHERE = "atmosphere"
    THERMOMETER = "thermometer"
    SCALE = "scale"
    RUNS = "runs"
    BY = "run by"
    DATE = "run on"


@dataclass(frozen=True, slots=True)
class Charge:
    """What a substance is, with its counter-ion (canonical SMILES, else its name), and how much of it was charged."""

    what: str
    equivalents: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Standing:
    """What of a case is held against other entries.

    key: the reaction key; empty where the substrate could not be read. transformation: what stays of the substrate and
    what is wanted, whatever the leaving group and whoever attacks; empty likewise. wanted: keys of the wanted products.
    temperature_c: of the hottest stage, in °C. time_s: of the stages about as hot, in s. volumes: of each solvent, in
    per cent of them all, None where the record cannot tell. concentration in mol/L, scale in mol.
    attacks: Variable.BASE where the base is what attacks. weighed: masses of substrate and product as typed.
    qualities: form, purity and strength of each substance that has any. words: each variable as a reader sees it.
    """

    key: str
    transformation: str
    wanted: tuple[str, ...]
    attacks: Variable
    nucleophiles: tuple[Charge, ...]
    bases: tuple[Charge, ...]
    reagents: tuple[Charge, ...]
    temperature_c: float
    time_s: float
    solvents: tuple[str, ...]
    volumes: tuple[float, ...] | None
    concentration: float | None
    scale: float | None
    is_flow: bool
    conversion: float | None
    seen: tuple[Seen, ...]
    weighed: tuple[str, ...]
    qualities: tuple[str, ...]
    words: Mapping[Variable, str]


def standing_of(case: Case) -> Standing:
    """Return what of a case is held against other entries."""
    record, amounts = case.record, case.amounts
    hottest, time_s = _heat(record.stages)
    solvents, volumes = _solvents(case)
    seen = seen_in(case)
    return Standing(
        key=reaction_key(case),
        transformation=transformation_key(case),
        wanted=tuple(sorted(wanted_products(case))),
        attacks=Variable.BASE if attacking_role(record) is Role.BASE else Variable.NUCLEOPHILE,
        nucleophiles=_charges(case, Role.NUCLEOPHILE),
        bases=_charges(case, Role.BASE),
        reagents=_charges(case, Role.REAGENT),
        temperature_c=hottest,
        time_s=time_s,
        solvents=solvents,
        volumes=volumes,
        concentration=amounts.concentration_mol_per_l,
        scale=amounts.substrate.amount_mol,
        is_flow=any(stage.vessel is Vessel.FLOW for stage in record.stages),
        conversion=next((each.low for each in seen if each.what == "conversion"), None),
        seen=seen,
        weighed=_weighed(record),
        qualities=_qualities(record),
        words=_words(case, solvents, volumes),
    )


# --- conditions ---------------------------------------------------------------------------------------------


def _heat(stages: Sequence[Stage]) -> tuple[float, float]:
    """Return the temperature of the hottest stage, in °C, and the time spent at no more than COMPARABLE_K below it."""
    hottest = max(stage.temperature.highest_c for stage in stages)
    as_hot = [stage for stage in stages if stage.temperature.highest_c >= hottest - COMPARABLE_K]
    return hottest, sum(stage.time.magnitude for stage in as_hot)


def _solvents(case: Case) -> tuple[tuple[str, ...], tuple[float, ...] | None]:
    """Return the solvents by their names in the table, sorted, and their shares of the volume in per cent.

    A drawn solvent is what is drawn, whatever is on its bottle: one that the table lacks goes by its SMILES.
    """
    names = _solvent_names(case)
    typed = [solvent.volume or solvent.fraction for solvent in case.record.solvents]
    parts: defaultdict[str, float] = defaultdict(float)
    for name, quantity in zip(names, typed, strict=True):
        parts[name] += quantity.magnitude if quantity is not None else 0.0
    in_order = tuple(sorted(parts))
    if len(in_order) == 1:
        return in_order, (100.0,)
    alike = len({quantity.dimension for quantity in typed if quantity is not None}) == 1 and None not in typed
    total = sum(parts.values())
    return in_order, tuple(100.0 * parts[name] / total for name in in_order) if alike and total else None


def _solvent_names(case: Case) -> list[str]:
    names = []
    for index, solvent in enumerate(case.record.solvents):
        drawn = case.structures.get(("solvent", index))
        known = solvent_of(solvent.name, drawn)
        names.append(known.name if known else drawn.smiles if drawn else solvent.name.casefold())
    return names


def _charges(case: Case, role: Role) -> tuple[Charge, ...]:
    rows = [row for row in case.amounts.rows if row.role is role]
    found = [(case.structures.get(row.path), row) for row in rows]
    charges = [
        Charge(structure.smiles if structure else row.name.casefold(), row.equivalents) for structure, row in found
    ]
    return tuple(sorted(charges, key=lambda charge: charge.what))


def _weighed(record: Record) -> tuple[str, ...]:
    """Return the masses of the substrate and of each product as typed; empty unless both were weighed."""
    products = [line.mass.canonical for line in record.outcome.measured if line.mass is not None]
    return (record.substrate.mass.canonical, *products) if record.substrate.mass is not None and products else ()


# --- conditions in words ------------------------------------------------------------------------------------


def _words(case: Case, solvents: tuple[str, ...], volumes: tuple[float, ...] | None) -> dict[Variable, str]:
    record, amounts, stages = case.record, case.amounts, case.record.stages
    people = {person.code: person.shown_as for person in case.settings.people}
    concentration, scale = amounts.concentration_mol_per_l, amounts.substrate.amount_mol
    attacking = attacking_role(record)
    return {
        Variable.BASE: _listed(case, Role.BASE, with_amounts=attacking is Role.NUCLEOPHILE),
        Variable.REAGENTS: _listed(case, Role.REAGENT, with_amounts=True),
        Variable.SOLVENT: _solvent_words(case, solvents, volumes),
        Variable.NUCLEOPHILE: str(record.nucleophile)
        if isinstance(record.nucleophile, NucleophileWord)
        else _listed(case, Role.NUCLEOPHILE, with_amounts=False),
        Variable.LEAVING_GROUP: record.substrate.leaving_group,
        Variable.SUBSTRATE: _substrate_words(case),
        Variable.ORDER: _in_order(_additions(stage, record) for stage in stages) or NOT_STATED,
        Variable.EQUIVALENTS: ", ".join(_equivalents(row) for row in amounts.rows if row.role is attacking) or "none",
        Variable.TEMPERATURE: _in_order(str(stage.temperature) for stage in stages),
        Variable.CONCENTRATION: concentration_text(concentration) if concentration is not None else "not known",
        Variable.TIME: " → ".join(str(stage.time) for stage in stages),
        Variable.QUALITY: "; ".join(_qualities(record)) or NOT_STATED,
        Variable.VESSEL: _in_order(str(stage.vessel or NOT_STATED) for stage in stages),
        Variable.ATMOSPHERE: _in_order(stage.atmosphere or NOT_STATED for stage in stages),
        Variable.THERMOMETER: _in_order(str(stage.measured or NOT_STATED) for stage in stages),
        Variable.SCALE: amount_text(scale) if scale is not None else "not known",
        Variable.RUNS: f"n = {record.performed.runs}" if record.performed.runs else "n not stated",
        Variable.BY: ", ".join(people.get(code, code) for code in record.performed.by),
        Variable.DATE: record.performed.date.isoformat(),
    }


def _listed(case: Case, role: Role, *, with_amounts: bool) -> str:
    rows = [row for row in case.amounts.rows if row.role is role]
    words = [f"{row.name}, {_equivalents(row)}" if with_amounts else row.name for row in rows]
    return "; ".join(words) or "none"


def _equivalents(row: AmountRow) -> str:
    return f"{equivalents_text(row.equivalents)} equiv" if row.equivalents is not None else "amount not known"


def _solvent_words(case: Case, solvents: tuple[str, ...], volumes: tuple[float, ...] | None) -> str:
    typed = dict(zip(_solvent_names(case), (solvent.name for solvent in case.record.solvents), strict=True))
    shown = [name if solvent_of(name, None) else typed[name] for name in solvents]
    if volumes is None or len(solvents) < 2:
        return " + ".join(shown) or "none (neat)"
    return " + ".join(f"{name} {share:.3g} vol%" for name, share in zip(shown, volumes, strict=True))


def _substrate_words(case: Case) -> str:
    substrate = case.record.substrate
    excess = f"{substrate.ee} ee" if substrate.ee else f"er {substrate.er}" if substrate.er else ""
    on = {each.on for each in case.sites}
    formed = "" if not on or case.structures[("substrate",)] in on else "leaving group made in the flask"
    drawn = str(substrate.stereo or NOT_STATED)
    return ", ".join(filter(None, (drawn, excess, f"dr {substrate.dr}" if substrate.dr else "", formed)))


def _additions(stage: Stage, record: Record) -> str:
    names = ["substrate" if name == record.substrate.name else name for name in stage.add or ()]
    slowly = f" over {stage.over}" if stage.over else ""
    return f"{', '.join(names)}{slowly}" if names else ""


def _qualities(record: Record) -> tuple[str, ...]:
    found = [
        (substance.name, [str(each) for each in (substance.purity, substance.strength, substance.form) if each])
        for _, _, substance in charged_rows(record)
    ]
    return tuple(f"{name}: {', '.join(said)}" for name, said in found if said)


def _in_order(values: Iterable[str]) -> str:
    """Return the values of the stages in order; one where all are the same."""
    listed = list(filter(None, values))
    return " → ".join(listed if len(set(listed)) > 1 else listed[:1])
