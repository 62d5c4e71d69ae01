"""Standing: what of a case is held against the other entries of the book, as plain data.

It is worked out where the case is, so that the records of a book can be compared where no structure ever comes.
"""

from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum

from builder.checks.case import Case
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import stem_of
from builder.chemistry.structure import Structure, stereo_key
from builder.mechanism.amounts import AmountRow, Role, charged_rows
from builder.mechanism.from_record import COMPARABLE_K
from builder.mechanism.solvents import find_solvent
from builder.records.fields import Ratio
from builder.records.model import Measurement, Product, Record, Stage
from builder.records.quantities import Percent
from builder.records.vocabulary import NucleophileWord, ProductUse, StereoKind, Vessel, YieldKind
from builder.rule import Path

__all__ = ["NOT_STATED", "Charge", "Seen", "Standing", "Variable", "standing_of"]

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


@dataclass(frozen=True, slots=True)
class Seen:
    """One number of an outcome, in per cent, as it can be held against that of another entry.

    what: the quantity and the structures it is of; where it is equal, two numbers speak of the same thing.
    label: the same in words. kind: of a yield; None for all else, and for a product that was sought and not found.
    low, high: between which the value lies; equal unless it is a limit. spread: as stated. text: with its kind.
    is_sum: over all products of one formula.
    """

    what: str
    label: str
    kind: YieldKind | None
    low: float
    high: float
    spread: float | None
    text: str
    at: Path
    is_sum: bool = False


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
    solvents, volumes = _solvents(record)
    seen = tuple(_Outcome(case).seen())
    return Standing(
        key=_reaction_key(case),
        transformation=_transformation(case),
        wanted=tuple(sorted(_wanted(case))),
        attacks=Variable.BASE if not record.nucleophiles and record.bases else Variable.NUCLEOPHILE,
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


# --- keys ---------------------------------------------------------------------------------------------------


def _reaction_key(case: Case) -> str:
    """Return substrate with its kind of stereo, nucleophile or base, leaving group and desired products as one text."""
    substrate, wanted = case.structures.get(("substrate",)), _wanted(case)
    if substrate is None or not wanted:
        return ""
    parts = (
        stereo_key(substrate, _stereo(case.record.substrate.stereo, substrate)),
        "+".join(_partners(case)),
        case.record.substrate.leaving_group,
        "+".join(sorted(wanted)),
    )
    return " | ".join(parts)


def _partners(case: Case) -> list[str]:
    """Return what attacks, sorted: nucleophiles without counter-ions or the word in their place, else the bases."""
    word = case.record.nucleophile
    if isinstance(word, NucleophileWord) and word is not NucleophileWord.NONE:
        return [str(word)]
    role = Role.NUCLEOPHILE if case.record.nucleophiles else Role.BASE
    rows = [row for row in case.amounts.rows if row.role is role]
    found = [(case.structures.get(row.path), row.name) for row in rows]
    return sorted(_without_cations(structure) if structure else name.casefold() for structure, name in found)


def _without_cations(structure: Structure) -> str:
    """Return a species without counter-ions as a key, those such as tetrabutylammonium among them."""
    pieces = structure.without_counter_ions.fragments
    anions = [piece for piece in pieces if piece.charge < 0]
    return ".".join(sorted(piece.smiles for piece in (anions or pieces)))


def _wanted(case: Case) -> dict[str, Structure]:
    """Return the products the entry was after, by their keys: the desired ones, else what was sought, else all."""
    outcome = case.record.outcome
    desired = [product for product in outcome.products if product.use is ProductUse.DESIRED]
    if not desired and outcome.sought is not None:
        sought = case.structures.get(("outcome", "sought"))
        return {_product_key(case, sought, None): sought} if sought is not None else {}
    found = [(product, _structure(case, product)) for product in desired or outcome.products]
    return {_product_key(case, structure, product): structure for product, structure in found if structure is not None}


def _structure(case: Case, product: Product) -> Structure | None:
    return case.structures.get(("outcome", "products", case.record.outcome.products.index(product)))


def _product_key(case: Case, structure: Structure, product: Product | None) -> str:
    """Return the key of a product as its uncharged form; of a racemate either mirror image gives the same."""
    stated = product.stereo if product is not None else None
    bare = neutral_form(structure)
    kind = str(stated or case.record.substrate.stereo) if bare.stereocentres.total else ""
    return stereo_key(bare, kind).partition(" ")[0]


def _stereo(stated: StereoKind | None, structure: Structure) -> str:
    if stated is not None:
        return str(stated)
    return str(StereoKind.NOT_DETERMINED if structure.stereocentres.total else StereoKind.ACHIRAL)


def _transformation(case: Case) -> str:
    substrate, wanted = case.structures.get(("substrate",)), _wanted(case)
    if substrate is None or not wanted:
        return ""
    stems = [stem_of(each.on, each.site) for each in case.sites]
    stem = min(stems, default=substrate.without_counter_ions.flat_smiles)
    return f"{stem} > {'+'.join(sorted({neutral_form(each).flat_smiles for each in wanted.values()}))}"


# --- conditions ---------------------------------------------------------------------------------------------


def _heat(stages: Sequence[Stage]) -> tuple[float, float]:
    """Return the temperature of the hottest stage, in °C, and the time spent at no more than COMPARABLE_K below it."""
    hottest = max(stage.temperature.highest_c for stage in stages)
    as_hot = [stage for stage in stages if stage.temperature.highest_c >= hottest - COMPARABLE_K]
    return hottest, sum(stage.time.magnitude for stage in as_hot)


def _solvents(record: Record) -> tuple[tuple[str, ...], tuple[float, ...] | None]:
    """Return the solvents by their names in the table, sorted, and their shares of the volume in per cent."""
    known = {solvent.name: find_solvent(solvent.name) for solvent in record.solvents}
    names = [row.name if (row := known[solvent.name]) else solvent.name.casefold() for solvent in record.solvents]
    typed = [solvent.volume or solvent.fraction for solvent in record.solvents]
    parts: defaultdict[str, float] = defaultdict(float)
    for name, quantity in zip(names, typed, strict=True):
        parts[name] += quantity.magnitude if quantity is not None else 0.0
    in_order = tuple(sorted(parts))
    if len(in_order) == 1:
        return in_order, (100.0,)
    alike = len({quantity.dimension for quantity in typed if quantity is not None}) == 1 and None not in typed
    total = sum(parts.values())
    return in_order, tuple(100.0 * parts[name] / total for name in in_order) if alike and total else None


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
    attacking = Role.NUCLEOPHILE if record.nucleophiles or not record.bases else Role.BASE
    return {
        Variable.BASE: _listed(case, Role.BASE, with_amounts=attacking is Role.NUCLEOPHILE),
        Variable.REAGENTS: _listed(case, Role.REAGENT, with_amounts=True),
        Variable.SOLVENT: _solvent_words(solvents, volumes),
        Variable.NUCLEOPHILE: str(record.nucleophile)
        if isinstance(record.nucleophile, NucleophileWord)
        else _listed(case, Role.NUCLEOPHILE, with_amounts=False),
        Variable.LEAVING_GROUP: record.substrate.leaving_group,
        Variable.SUBSTRATE: _substrate_words(case),
        Variable.ORDER: _in_order(_additions(stage, record) for stage in stages) or NOT_STATED,
        Variable.EQUIVALENTS: ", ".join(_equivalents(row) for row in amounts.rows if row.role is attacking) or "none",
        Variable.TEMPERATURE: _in_order(str(stage.temperature) for stage in stages),
        Variable.CONCENTRATION: f"{_three(concentration)} mol/L" if concentration is not None else "not known",
        Variable.TIME: " → ".join(str(stage.time) for stage in stages),
        Variable.QUALITY: "; ".join(_qualities(record)) or NOT_STATED,
        Variable.VESSEL: _in_order(str(stage.vessel or NOT_STATED) for stage in stages),
        Variable.ATMOSPHERE: _in_order(stage.atmosphere or NOT_STATED for stage in stages),
        Variable.THERMOMETER: _in_order(str(stage.measured or NOT_STATED) for stage in stages),
        Variable.SCALE: f"{_three(scale * 1000)} mmol" if scale is not None else "not known",
        Variable.RUNS: f"n = {record.performed.runs}" if record.performed.runs else "n not stated",
        Variable.BY: ", ".join(people.get(code, code) for code in record.performed.by),
        Variable.DATE: record.performed.date.isoformat(),
    }


def _listed(case: Case, role: Role, *, with_amounts: bool) -> str:
    rows = [row for row in case.amounts.rows if row.role is role]
    words = [f"{row.name}, {_equivalents(row)}" if with_amounts else row.name for row in rows]
    return "; ".join(words) or "none"


def _equivalents(row: AmountRow) -> str:
    return f"{_three(row.equivalents)} equiv" if row.equivalents is not None else "amount not known"


def _solvent_words(solvents: tuple[str, ...], volumes: tuple[float, ...] | None) -> str:
    if volumes is None or len(solvents) < 2:
        return " + ".join(solvents) or "none (neat)"
    return " + ".join(f"{name} {share:.3g} vol%" for name, share in zip(solvents, volumes, strict=True))


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


def _three(value: float) -> str:
    """Return a number with three significant digits."""
    return f"{value:#.3g}".rstrip(".") if value < 1000 else f"{value:.0f}"


# --- outcome ------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Outcome:
    """The outcome of a case, read product by product."""

    case: Case

    def seen(self) -> Iterator[Seen]:
        """Yield every number that can be held against another entry's; sums over a formula come last."""
        yields = [each for index, line in enumerate(self._lines) for each in self._yields(line, index)]
        yield from (each for _, each in yields)
        yield from (each for index, line in enumerate(self._lines) for each in self._others(line, index))
        yield from self._not_found({label for label, _ in yields})
        yield from self._sums([(label, each) for label, each in yields if label])

    @property
    def _lines(self) -> tuple[Measurement, ...]:
        return self.case.record.outcome.measured

    def _key(self, label: str) -> str:
        for product in self.case.record.outcome.products:
            structure = _structure(self.case, product) if product.label == label else None
            if structure is not None:
                return _product_key(self.case, structure, product)
        return label

    def _name(self, label: str) -> str:
        return next((p.name for p in self.case.record.outcome.products if p.label == label), label)

    def _yields(self, line: Measurement, index: int) -> Iterator[tuple[str, Seen]]:
        """Yield a yield with the label of its product; a joint one is shared out where a ratio says how."""
        if line.what != "yield" or line.of is None or not isinstance(line.value, Percent):
            return
        if len(line.of) == 1:
            yield line.of[0], self._yield(line, index, line.of[0], *_bounds(line.value), f"{line.value}")
            return
        shares = self._shares(line.of)
        for label, share in shares.items() if not line.value.is_limit else ():
            part = line.value.magnitude * share
            yield label, self._yield(line, index, label, part, part, f"{part:.3g} %", " (by the ratio)")
        if not shares:
            what, label = "+".join(sorted(map(self._key, line.of))), " + ".join(map(self._name, line.of))
            low, high = _bounds(line.value)
            text = f"{line.value} {line.kind} yield"
            at: Path = ("outcome", "measured", index)
            yield "", Seen(f"yield {what}", f"yield of {label}", line.kind, low, high, _spread(line), text, at)

    def _yield(
        self, line: Measurement, index: int, label: str, low: float, high: float, value: str, note: str = ""
    ) -> Seen:
        kind = "area share" if line.kind is YieldKind.AREA else f"{line.kind} yield"
        return Seen(
            f"yield {self._key(label)}",
            f"yield of {self._name(label)}",
            line.kind,
            low,
            high,
            _spread(line),
            f"{value} {kind}{note}",
            ("outcome", "measured", index),
        )

    def _shares(self, labels: Sequence[str]) -> dict[str, float]:
        """Return how a ratio of single products shares out the sum of these; empty where none does."""
        for line in self._lines:
            if isinstance(line.value, Ratio) and line.what == "ratio":
                parts = dict(zip(line.value.parts, line.value.percentages, strict=True))
                if all((label,) in parts for label in labels):
                    total = sum(parts[(label,)] for label in labels)
                    return {label: parts[(label,)] / total for label in labels} if total else {}
        return {}

    def _others(self, line: Measurement, index: int) -> Iterator[Seen]:
        """Yield what is measured beside yields: conversion, ee or er, dr, and the parts of a ratio."""
        at: Path = ("outcome", "measured", index)
        of = " + ".join(map(self._name, line.of or ()))
        keys = "+".join(sorted(map(self._key, line.of or ())))
        spread = _spread(line)
        match line.what, line.value:
            case "conversion", Percent() as value:
                yield Seen("conversion", "conversion", None, *_bounds(value), spread, f"{value} conversion", at)
            case "ee", Percent() as value if line.of != ("substrate",):
                yield Seen(f"ee {keys}", f"ee of {of}", None, *_bounds(value), spread, f"{value} ee", at)
            case "er", Ratio() as value if line.of != ("substrate",) and len(value.numbers) == 2:
                excess = value.excess_percent
                yield Seen(f"ee {keys}", f"ee of {of}", None, excess, excess, spread, f"er {value}", at)
            case "dr", Ratio() as value:
                share = max(value.percentages)
                yield Seen(f"dr {keys}", f"dr of {of}", None, share, share, spread, f"dr {value}", at)
            case "ratio", Ratio() as value:
                parts = ["+".join(sorted(map(self._key, part))) for part in value.parts]
                names = [" + ".join(map(self._name, part)) for part in value.parts]
                for key, name, share in zip(parts, names, value.percentages, strict=True):
                    what, label = f"ratio {key} of {':'.join(sorted(parts))}", f"share of {name} in the ratio"
                    yield Seen(what, label, None, share, share, spread, f"{share:.3g} % ({value})", at)

    def _not_found(self, measured: set[str]) -> Iterator[Seen]:
        """Yield a yield of nothing for a product that was sought and is not among those measured."""
        sought = self.case.record.outcome.sought
        structure = self.case.structures.get(("outcome", "sought"))
        if sought is None or structure is None:
            return
        key = _product_key(self.case, structure, None)
        if key not in {self._key(label) for label in measured}:
            text = f"no {sought.name} found"
            yield Seen(f"yield {key}", f"yield of {sought.name}", None, 0, 0, None, text, ("outcome", "sought"))

    def _sums(self, yields: Sequence[tuple[str, Seen]]) -> Iterator[Seen]:
        """Yield the sum over all products of one formula, so that one list of alkenes can be held against another."""
        by_label = dict(yields)
        families: defaultdict[str, list[str]] = defaultdict(list)
        for product in self.case.record.outcome.products:
            structure = _structure(self.case, product)
            if structure is not None:
                families[neutral_form(structure).formula].append(product.label)
        for formula, labels in families.items():
            members = [by_label[label] for label in labels if label in by_label]
            kinds = {member.kind for member in members}
            if len(members) < len(labels) or len(kinds) > 1:
                continue
            low, high = sum(member.low for member in members), sum(member.high for member in members)
            kind = "area share" if kinds == {YieldKind.AREA} else f"{members[0].kind} yield"
            text = f"{high:.3g} % {kind} in all"
            yield Seen(
                f"yield {formula}",
                f"yield of all {formula}",
                members[0].kind,
                low,
                high,
                None,
                text,
                members[0].at,
                is_sum=True,
            )


def _bounds(value: Percent) -> tuple[float, float]:
    """Return between which percentages a measured value lies."""
    if not value.is_limit:
        return value.magnitude, value.magnitude
    return (0.0, value.magnitude) if value.is_upper_limit else (value.magnitude, 100.0)


def _spread(line: Measurement) -> float | None:
    return line.spread.magnitude if line.spread is not None else None
