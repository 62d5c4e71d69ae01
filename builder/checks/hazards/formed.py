"""What forms where a caution applies: hydrazoic acid, nitrosamines, alkyl halides ...; loads formed_species.tsv."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from itertools import product as combinations_of

from builder.checks.hazards.cautions import load_cautions
from builder.checks.hazards.kinds import hazard_table, load_substance_kinds
from builder.checks.hazards.meetings import Hazard, Present, Whereabouts
from builder.chemistry.combination import Combination
from builder.chemistry.structure import Structure, parse_smiles
from builder.table import NOTHING

__all__ = ["Formation", "FormedSpecies", "formed_by", "load_formations"]

MOST_FORMED = 12
"""Species that are named for one record; a mixture that makes more has worse to say than their names."""


@dataclass(frozen=True)
class Formation:
    """One row of formed_species.tsv: what forms where a caution applies; name is that of the species or its class."""

    caution: str
    of: tuple[str, ...]
    change: Combination | None
    species: Structure | None
    name: str


@dataclass(frozen=True, slots=True)
class FormedSpecies:
    """A species that can form, and why: the caution and the substances it comes from.

    structure: None where only the class is known.
    """

    name: str
    structure: Structure | None
    caution: str
    origins: tuple[str, ...]

    @property
    def shown(self) -> str:
        """Return its name, with the SMILES where a class is named."""
        return self.name if self.structure is None else f"{self.name} {self.structure.smiles}"

    @property
    def present(self) -> Present:
        """Return it as something that cautions of single substances can be asked of."""
        return Present(("formed", self.name), self.name, Whereabouts.FLASK, self.structure)


@cache
def load_formations() -> tuple[Formation, ...]:
    """Return the rows of the table; ValueError for unknown cautions or kinds, and for a change that does not fit."""
    known, kinds = {caution.id for caution in load_cautions()}, load_substance_kinds()
    found = []
    for row in hazard_table("formed_species.tsv", ("caution", "of", "change", "species", "name")):
        formation = Formation(
            caution=row["caution"],
            of=() if row["of"] == NOTHING else tuple(row["of"].split(" + ")),
            change=None if row["change"] == NOTHING else Combination.from_smarts(row["change"]),
            species=None if row["species"] == NOTHING else parse_smiles(row["species"]),
            name=row["name"],
        )
        takes = formation.change.reactants if formation.change else len(formation.of)
        if formation.caution not in known or not kinds.keys() >= set(formation.of) or takes != len(formation.of):
            raise ValueError(f"formed_species.tsv: {formation.caution}: unknown caution or kind, or a change of others")
        found.append(formation)
    return tuple(found)


@cache
def _by_caution() -> dict[str, tuple[Formation, ...]]:
    found: dict[str, list[Formation]] = {}
    for formation in load_formations():
        found.setdefault(formation.caution, []).append(formation)
    return {caution: tuple(rows) for caution, rows in found.items()}


def formed_by(hazards: Sequence[Hazard], presents: Sequence[Present]) -> tuple[FormedSpecies, ...]:
    """Return the species that can form where cautions apply, each once, in the order of the table of cautions.

    presents: everything in the experiment. What a change needs beside the partners of a caution is looked for among
    what is charged.
    """
    found: dict[str, FormedSpecies] = {}
    for hazard in hazards:
        for formation in _by_caution().get(hazard.caution.id, ()):
            for species in _species_of(formation, hazard, presents):
                found.setdefault(species.shown, species)
    return tuple(found.values())[:MOST_FORMED]


def _species_of(formation: Formation, hazard: Hazard, presents: Sequence[Present]) -> Iterator[FormedSpecies]:
    partners = tuple(dict.fromkeys(each.shown for each in (*hazard.others, hazard.at)))
    if formation.change is None:
        if formation.of and not any(formation.of[0] in each.kinds for each in (hazard.at, *hazard.others)):
            return
        yield FormedSpecies(formation.name, formation.species, hazard.caution.id, partners)
        return
    met = [each for each in (hazard.at, *hazard.others) if each.structure is not None]
    charged = [each for each in presents if each.structure is not None and each.whereabouts is Whereabouts.FLASK]
    reactants = [
        [each for each in met if kind in each.kinds] or [each for each in charged if kind in each.kinds]
        for kind in formation.of
    ]
    for chosen in combinations_of(*reactants):
        pieces = [_piece_of(each, kind) for each, kind in zip(chosen, formation.of, strict=True)]
        for made in formation.change.outcomes(pieces):
            origins = tuple(each.shown for each in chosen)
            yield FormedSpecies(formation.name, made, hazard.caution.id, origins)


def _piece_of(present: Present, kind: str) -> Structure:
    """Return the piece of a substance that belongs to a kind: of a salt, the ion."""
    assert present.structure is not None  # noqa: S101 - the caller takes only what has a structure
    fragments = load_substance_kinds()[kind].fragments
    pieces = present.structure.fragments
    return next((piece for piece in pieces if any(f.is_in(piece) for f in fragments)), present.structure)
