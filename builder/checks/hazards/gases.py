"""Gas that a record can give off, quench and work-up included, and where it must go; loads gas_outlets.tsv.

What the text of the work-up names (water, acid, hydrogencarbonate, nitrite) is taken to be there in excess, so that
every volume is an upper bound.
"""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cache

from builder.checks.case import Case
from builder.checks.hazards.kinds import hazard_table
from builder.checks.hazards.meetings import Present, Whereabouts
from builder.chemistry.structure import Structure, parse_smiles
from builder.finding import Level
from builder.mechanism.gas import Gas, GasFormed, InFlask, gas_volume_l, gases_from, gases_of_record, present_in
from builder.records.figures import amount_text, volume_text
from builder.rule import Path

__all__ = ["GasEvolved", "GasOutlet", "gases_evolved", "load_gas_outlets"]

_EXCESS_MOL = 1e6
_GIVES_GAS_WITH: Mapping[str, frozenset[str]] = {
    "acid": frozenset({"carbonate", "azide salt", "cyanide source", "sulfide salt", "complex hydride"}),
    "ammonium salt": frozenset({"strong base", "cyanide source", "sulfide salt", "azide salt"}),
    "hydrogencarbonate": frozenset({"acid"}),
    "nitrite": frozenset({"azide salt", "primary or secondary amine", "ammonium salt"}),
    "water or alcohol": frozenset(
        {"saline hydride", "complex hydride", "alkali metal", "organolithium or Grignard", "chlorinating agent"}
    ),
}
"""Kinds that what the work-up names gives gas with, asked before the table of gases, which takes longer."""
_NAMED = {
    "acid": "Cl",
    "ammonium salt": "[NH4+].[Cl-]",
    "hydrogencarbonate": "[Na+].OC([O-])=O",
    "nitrite": "[Na+].[O-]N=O",
    "water or alcohol": "O",
}
"""What stands for a kind of substance that the work-up names."""


@dataclass(frozen=True, slots=True)
class GasOutlet:
    """One row of gas_outlets.tsv."""

    hazard: str
    least_l: float
    level: Level
    outlet: str
    source: str


@dataclass(frozen=True, slots=True)
class GasEvolved:
    """A gas, at most so much of it, and why; moles is None where an amount is unknown.

    names: of the gas, or of several isomers that stand together.
    """

    gas: Gas
    names: tuple[str, ...]
    moles: float | None
    cause: str
    at: Path
    outlet: GasOutlet

    @property
    def shown(self) -> str:
        """Return the amount and its volume at 25 °C and 1 atm, in words."""
        if self.moles is None:
            return "amount unknown"
        volume = gas_volume_l(self.moles)
        return f"at most {amount_text(self.moles)}, {volume_text(volume)} at 25 °C and 1 atm"


@cache
def load_gas_outlets() -> tuple[GasOutlet, ...]:
    """Return the outlets, the gravest hazard first; ValueError for blanks, unknown levels and sources."""
    return tuple(
        GasOutlet(row["hazard"], float(row["least_l"]), Level(row["level"]), row["outlet"], row["source"])
        for row in hazard_table("gas_outlets.tsv", ("hazard", "least_l", "level", "outlet", "source"))
    )


def gases_evolved(case: Case, presents: Sequence[Present]) -> tuple[GasEvolved, ...]:
    """Return the gases of a record that are worth a word, each once with its largest amount.

    Products that are gases and of which only the sum is known stand together.
    """
    found: dict[str, GasEvolved] = {}
    for formed, at in _all_formed(case, presents):
        outlet = next((each for each in load_gas_outlets() if each.hazard in formed.gas.hazard), None)
        if outlet is None or (formed.moles is not None and gas_volume_l(formed.moles) < outlet.least_l):
            continue
        is_product = at[0] == "outcome"
        key = f"product {formed.moles}" if is_product else formed.gas.formula
        known = found.get(key)
        if known is None:
            found[key] = GasEvolved(formed.gas, (formed.gas.name,), formed.moles, formed.cause, at, outlet)
        elif is_product:
            found[key] = replace(known, names=(*known.names, formed.gas.name))
        elif (formed.moles or 0.0) > (known.moles or 0.0):
            found[key] = replace(known, moles=formed.moles, cause=formed.cause, at=at)
    return tuple(found.values())


def _all_formed(case: Case, presents: Sequence[Present]) -> Iterator[tuple[GasFormed, Path]]:
    """Yield each gas with the place it comes from: of the flask, and of each line of the work-up that adds something.

    A solvent does not count in the work-up: most of it is gone by then, and how much is not said.
    """
    for formed in gases_of_record(case.record, case.structures, case.amounts):
        yield formed, next(iter(formed.paths), ("stages",))
    charged = [
        each
        for each in present_in(case.record, case.structures, case.amounts, len(case.record.stages) - 1)
        if each.path[0] != "solvent"
    ]
    kinds = frozenset().union(*(each.kinds for each in presents if each.whereabouts is Whereabouts.FLASK))
    for line in presents:
        if line.whereabouts is not Whereabouts.WORK_UP:
            continue
        named = sorted(kind for kind in line.kinds & _NAMED.keys() if kinds & _GIVES_GAS_WITH[kind])
        added = [InFlask(line.path, _stand_in(kind), _EXCESS_MOL) for kind in named]
        for formed in gases_from((*charged, *added)) if added else ():
            if line.path in formed.paths and (formed.moles is None or formed.moles < _EXCESS_MOL / 10):
                yield formed, line.path


@cache
def _stand_in(kind: str) -> Structure:
    return parse_smiles(_NAMED[kind])
