"""From a record to a question: what was charged, the stage in which it reacts, at which temperature and how long.

The engine knows one flask with one nucleophile and one base at one temperature. What a record holds beyond that is
either without weight for the answer (an additive that does nothing here) or a reason not to ask.
"""

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

from builder.chemistry.perception import attacking_atoms
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.amounts import Amounts, present_solvents
from builder.mechanism.asking import ABSOLUTE_ZERO_C, AskingError
from builder.mechanism.nucleophiles import find_nucleophile_and_counter_ion
from builder.mechanism.question import CONCENTRATION_M, Ingredient, Question
from builder.mechanism.reaction import SiteInPlay
from builder.mechanism.reagents import (
    MOST_CATALYST_MOL_PERCENT,
    Dose,
    Role,
    find_reagent,
    reagent_by_structure,
)
from builder.mechanism.solvents import Solvent, find_solvent
from builder.records.model import Charged, Record
from builder.records.quantities import Dimension, Temperature
from builder.records.vocabulary import ReagentUse
from builder.rule import Path

__all__ = ["COMPARABLE_K", "question_from_record"]

COMPARABLE_K = 10.0
"""Stages no further than this below the hottest add to the time; common practice, no source."""
_NEEDED_USES = frozenset({ReagentUse.ACTIVATOR, ReagentUse.ACID})
_USED_UP_USES = frozenset({ReagentUse.ACTIVATOR, ReagentUse.BASE})
_MEDIUM = re.compile(r"\bin (?P<medium>[\w ,-]+)$")


def question_from_record(
    record: Record, structures: Mapping[Path, Structure], amounts: Amounts, sites: Sequence[SiteInPlay]
) -> Question:
    """Return what a record asks of the engine.

    structures: by path of the compound. sites: that bear the declared leaving group, as `reaction.in_play` gives them.
    Raises AskingError where the record holds more, or less, than one question.
    """
    return _Asker(record, structures, amounts, sites).question()


@dataclass(frozen=True)
class _Asker:
    record: Record
    structures: Mapping[Path, Structure]
    amounts: Amounts
    sites: Sequence[SiteInPlay]

    def question(self) -> Question:
        if ("substrate",) not in self.structures:
            raise AskingError("the substrate could not be read", "mend its structure")
        if not self.sites:
            raise AskingError("no site bears the declared leaving group", "correct the leaving group or the structure")
        nucleophile, doses = self._nucleophile()
        base, more = self._base()
        doses = [*doses, *more]
        for path, use in self._reagents():
            dose = self._dose(path)
            if dose is not None:
                doses.append(dose)
            elif use is ReagentUse.BASE and base is None and path in self.structures:
                base = Ingredient(self._at(path).name, self.structures[path])
            elif use in _NEEDED_USES:
                what = f"what {self._at(path).name} does is not known"
                raise AskingError(what, "name it as the table of reagents does")
        parts, concentration = self._medium()
        return Question(
            substrate=self._substrate,
            nucleophile=nucleophile,
            base=base,
            additives=tuple(doses),
            solvent=parts,
            temperature_k=self._temperature_c - ABSOLUTE_ZERO_C,
            concentration_m=concentration,
            equivalents=self._equivalents(),
            time_s=self._time_s,
        )

    # --- which molecule, which stage --------------------------------------------------------------------------

    @cached_property
    def _substrate(self) -> Structure:
        """Return the molecule to be asked about: what a stage gives, where the leaving group is made and drawn."""
        first = self.sites[0]
        return self.structures[("substrate",)] if first.formed_group else first.on

    @cached_property
    def _formed_in(self) -> int | None:
        """Return the stage that gives the molecule asked about; None where it was charged."""
        if self._substrate == self.structures[("substrate",)]:
            return None
        every = range(len(self.record.stages))
        return next((i for i in every if self.structures.get(("stages", i, "gives")) == self._substrate), None)

    @cached_property
    def _stages(self) -> range:
        """Return the stages in which it reacts: from when all that is needed is there to when something is given."""
        stages, formed = self.record.stages, self._formed_in
        start = max(self._added_in(self._at(path)) for path in self._needed())
        if formed is not None:
            start = max(start, min(formed + 1, len(stages) - 1))
        given = [i for i in range(start, len(stages)) if stages[i].gives is not None and i != formed]
        end = given[0] + 1 if given else len(stages)
        solvents = {solvent.name for solvent in self.record.solvents}
        for index in range(start + 1, end):
            extra = [name for name in stages[index].add or () if name not in solvents]
            if extra:
                raise AskingError(
                    f"stage {index + 1} adds {extra[0]} while the reaction runs", "state what each stage gives"
                )
        return range(start, end)

    def _needed(self) -> Iterator[Path]:
        if self._formed_in is None:
            yield ("substrate",)
            yield from (("reagents", i) for i, r in enumerate(self.record.reagents) if r.use in _NEEDED_USES)
        yield from (("nucleophile", i) for i in range(len(self.record.nucleophiles)))
        yield from (("base", i) for i in range(len(self.record.bases)))
        if self._formed_in is not None and not self.record.nucleophiles and not self.record.bases:
            yield ("substrate",)

    def _added_in(self, substance: Charged) -> int:
        """Return the stage that first lists a substance among its additions; the first where none does."""
        return next((i for i, s in enumerate(self.record.stages) if substance.name in (s.add or ())), 0)

    def _is_used_up(self, substance: Charged) -> bool:
        """Say whether a substance went into making the molecule asked about."""
        return self._formed_in is not None and self._added_in(substance) <= self._formed_in

    def _at(self, path: Path) -> Charged:
        match path:
            case ("substrate",):
                return self.record.substrate
            case ("nucleophile", int(i)):
                return self.record.nucleophiles[i]
            case ("base", int(i)):
                return self.record.bases[i]
            case ("reagents", int(i)):
                return self.record.reagents[i]
            case ("solvent", int(i)):
                return self.record.solvents[i]
        raise KeyError(path)

    @property
    def _temperature_c(self) -> float:
        return max(_held_c(self.record.stages[i].temperature) for i in self._stages)

    @property
    def _time_s(self) -> float:
        """Return the time at the temperature asked about, stages nearly as warm included."""
        hottest = self._temperature_c
        warm = (self.record.stages[i] for i in self._stages)
        return sum(s.time.magnitude for s in warm if _held_c(s.temperature) >= hottest - COMPARABLE_K)

    # --- nucleophile and base ---------------------------------------------------------------------------------

    def _nucleophile(self) -> tuple[Ingredient | None, list[Dose]]:
        """Return the nucleophile; a hydrogen halide, or what brings one, as its anion and as a reagent besides."""
        if len(self.record.nucleophiles) > 1:
            raise AskingError("several nucleophiles compete", "the engine weighs one at a time")
        if not self.record.nucleophiles:
            return None, []
        path: Path = ("nucleophile", 0)
        dose = self._dose(path)
        if dose is not None and self._is_reagent_too(dose, path):
            anion = dose.reagent.supplies
            name = self.record.nucleophiles[0].name
            return (None if anion is None else Ingredient(name, parse_smiles(anion))), [dose]
        return self._ingredient(path), []

    def _is_reagent_too(self, dose: Dose, path: Path) -> bool:
        if dose.reagent.role is Role.BRONSTED_ACID:
            structure = self.structures.get(path)
            return structure is not None and any(n.kind == "hydrogen halide" for n in attacking_atoms(structure))
        present = {d.reagent.name for d in (self._dose(p) for p, _ in self._reagents()) if d is not None}
        return dose.reagent.role is Role.ACTIVATOR and dose.reagent.works_beside(present)

    def _bases_left(self) -> list[Path]:
        """Return the bases that did not go into making the molecule asked about."""
        return [("base", i) for i, base in enumerate(self.record.bases) if not self._is_used_up(base)]

    def _base(self) -> tuple[Ingredient | None, list[Dose]]:
        """Return the first base, and all others as reagents; silver oxide is both."""
        paths = self._bases_left()
        if not paths:
            return None, []
        first, *others = paths
        dose = self._dose(first)
        doses = [dose] if dose is not None and dose.reagent.role is Role.SILVER else []
        for path in others:
            other = self._dose(path)
            if other is None:
                raise AskingError("several bases compete", "the engine weighs one at a time")
            doses.append(other)
        return self._ingredient(first), doses

    def _ingredient(self, path: Path) -> Ingredient:
        name = self._at(path).name
        named = find_nucleophile_and_counter_ion(name)
        if path in self.structures:
            return Ingredient(name, self.structures[path], None if named is None else named[1])
        if named is None:
            raise AskingError(f"the structure of {name} is not known", "add smiles: '…'")
        return Ingredient(name, parse_smiles(named[0].smiles), named[1])

    def _equivalents(self) -> float | None:
        """Return the equivalents of what attacks; where a base must first take its proton, no more than of the base."""
        base = next(map(self._ratio, self._bases_left()), None)
        if not self.record.nucleophiles:
            return base
        charged = self._ratio(("nucleophile", 0))
        if base is None or charged is None or not self._needs_base():
            return charged
        return min(base, charged)

    def _needs_base(self) -> bool:
        """Say whether the nucleophile attacks after it has lost a proton: acids of carbon, oxygen and sulfur do."""
        structure = self.structures.get(("nucleophile", 0))
        kinds = [n.kind for n in attacking_atoms(structure)] if structure is not None else []
        return bool(kinds) and structure is not None and structure.charge == 0 and kinds[0] in _ACIDS

    def _ratio(self, path: Path) -> float | None:
        return self.amounts.at(path).equivalents

    # --- reagents ---------------------------------------------------------------------------------------------

    def _reagents(self) -> Iterator[tuple[Path, ReagentUse]]:
        """Yield the reagents in the flask while it reacts: not those used up before, nor those that come after."""
        for index, reagent in enumerate(self.record.reagents):
            used_up = reagent.use in _USED_UP_USES and self._is_used_up(reagent)
            if not used_up and self._added_in(reagent) < self._stages.stop:
                yield ("reagents", index), reagent.use

    def _dose(self, path: Path) -> Dose | None:
        """Return a substance as a reagent of the table: by name and what is said of its strength, else by structure."""
        substance = self._at(path)
        found = next((d for d in map(find_reagent, _spelled(substance)) if d is not None), None)
        if found is None and path in self.structures:
            known = reagent_by_structure(self.structures[path].smiles)
            found = None if known is None else find_reagent(_with_strength(known.name, substance))
        ratio = self._ratio(path)
        if found is not None and ratio is not None and 100 * ratio <= MOST_CATALYST_MOL_PERCENT:
            return replace(found, is_catalytic=True)
        return found

    # --- solvent ----------------------------------------------------------------------------------------------

    def _medium(self) -> tuple[tuple[tuple[Solvent, float], ...], float]:
        """Return the solvents with their shares by volume, and the substrate in mol per litre of them.

        What solutions bring with them counts: 41 mL of ethoxide in ethanol are 41 mL of ethanol.
        """
        present = present_solvents(self.record, self._stages.stop - 1)
        charged = [(self._solvent(i), self.record.solvents[i]) for i in present]
        carried = list(self._carried())
        moles = self.amounts.substrate.amount_mol
        if all(s.volume is not None for _, s in charged) and (charged or carried):
            volumes = [(solvent, s.volume.magnitude) for solvent, s in charged if s.volume is not None] + carried
            total = sum(volume for _, volume in volumes)
            return _shares(volumes), moles / total if moles is not None and total > 0 else CONCENTRATION_M
        concentration = self.amounts.concentration_mol_per_l or CONCENTRATION_M
        if len(charged) <= 1:
            return _shares([(solvent, 1.0) for solvent, _ in charged]), concentration
        if any(s.fraction is None for _, s in charged):
            raise AskingError("the share of each solvent is not stated", "give every solvent a volume or a fraction")
        fractions = [(solvent, float(s.fraction.magnitude)) for solvent, s in charged if s.fraction is not None]
        return _shares(fractions), concentration

    def _solvent(self, index: int) -> Solvent:
        structure, name = self.structures.get(("solvent", index)), self.record.solvents[index].name
        found = find_solvent(name, structure.smiles) if structure is not None else None
        found = found or find_solvent(name)
        if found is None:
            raise AskingError(f"{name} is not in the table of solvents", "name a solvent of the table")
        return found

    def _carried(self) -> Iterator[tuple[Solvent, float]]:
        """Yield the solvents, in litres, of what was charged as a solution and is there while it reacts."""
        paths: list[Path] = [p for p in self._needed() if p != ("substrate",)]
        paths += [p for p, _ in self._reagents() if p not in paths]
        for path in paths:
            substance, volume = self._at(path), self.amounts.at(path).volume_l
            if substance.strength is None or volume is None:
                continue
            said = _MEDIUM.search(substance.form or "")
            solvent = find_solvent(said["medium"].strip()) if said else None
            dose = self._dose(path)
            if solvent is None and said is None and dose is not None and dose.is_aqueous:
                solvent = find_solvent("water")
            if solvent is not None:
                yield solvent, volume


_ACIDS = frozenset(
    {
        *("carbon acid", "alkyne", "phenol", "thiophenol", "thiol", "thioacid", "hydrogen sulfide", "alcohol", "water"),
        *("carboxylic acid", "oxime", "imide", "sulfonamide", "azole, one nitrogen", "pyridone", "silanol"),
        *("hydrogen peroxide", "acid of phosphorus or sulfur"),
    }
)
"""Kinds of nucleophiles that are of little use before a base has taken their proton."""


def _held_c(temperature: Temperature) -> float:
    """Return the middle of a band, the upper end of a ramp: there it stays, or there it reacts most."""
    if temperature.is_band:
        return (temperature.lowest_c + temperature.highest_c) / 2
    return temperature.highest_c


def _with_strength(name: str, substance: Charged) -> str:
    strength = substance.strength
    if strength is None or strength.dimension is not Dimension.FRACTION:
        return name
    return f"{name} ({strength.magnitude:g} %)"


def _spelled(substance: Charged) -> Iterator[str]:
    """Yield how the table of reagents may know a substance, with most of what is said of it first."""
    if substance.form is not None:
        yield f"{_with_strength(substance.name, substance)} ({substance.form})"
    yield _with_strength(substance.name, substance)
    yield substance.name


def _shares(volumes: Sequence[tuple[Solvent, float]]) -> tuple[tuple[Solvent, float], ...]:
    """Return each solvent once with its share of the whole, in the order given."""
    total = sum(volume for _, volume in volumes)
    shares: dict[Solvent, float] = {}
    for solvent, volume in volumes:
        shares[solvent] = shares.get(solvent, 0.0) + volume / total
    return tuple(shares.items())
