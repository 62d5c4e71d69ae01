"""What a record says, seen as chemistry: the sites in play, the species in the flask, whether they are activated."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cache

from builder.chemistry.fragments import Fragment
from builder.chemistry.perception import NO_LEAVING_GROUP, ReactiveSite, attacking_atoms, perceive_sites, sites_of
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.amounts import charged_rows
from builder.mechanism.rules import Situation
from builder.mechanism.solvents import structure_of
from builder.records.model import Record
from builder.records.vocabulary import ReagentUse
from builder.rule import Path
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "SiteInPlay",
    "groups_formed",
    "has_undrawn_species",
    "in_play",
    "is_activated",
    "precursors_of",
    "species_in_flask",
    "with_halides_set_free",
]

_ACID_KINDS = {"hydrogen halide"}
_ACTIVATING_USES = {ReagentUse.ACTIVATOR, ReagentUse.ACID}


@dataclass(frozen=True, slots=True)
class SiteInPlay:
    """A reactive carbon that the record speaks of, on the molecule that bears the declared leaving group.

    on: that molecule, the substrate or what a stage gives. is_activated: an acid or activator is in the flask.
    formed_group: the group that leaves, where it is made in the flask from the one that is drawn.
    """

    on: Structure
    site: ReactiveSite
    is_activated: bool = False
    formed_group: str | None = None

    @property
    def situation(self) -> Situation:
        """Return the site as the gates look at it."""
        return Situation(self.on, self.site, self.is_activated, self.formed_group)


def in_play(record: Record, structures: Mapping[Path, Structure]) -> tuple[SiteInPlay, ...]:
    """Return the sites that bear the declared leaving group, on the substrate before what the stages give.

    A group formed in the flask is found on what a stage gives; else its precursor counts, where the record lists
    a reagent that can form it.
    """
    group = record.substrate.leaving_group
    bearers = _bearers(record, structures)
    activated = is_activated(record, structures)
    found = [SiteInPlay(structure, site, activated) for structure in bearers for site in sites_of(structure, group)]
    if found:
        return tuple(found)
    return tuple(
        SiteInPlay(structure, site, is_activated=True, formed_group=group)
        for precursor, agent in _precursors().get(group, ())
        if _has_agent(agent, record, structures)
        for structure in bearers
        for site in sites_of(structure, precursor)
    )


def _has_agent(agent: str, record: Record, structures: Mapping[Path, Structure]) -> bool:
    """Say whether something in the flask can form the group: an activator, a nucleophile of that kind, anything."""
    if agent == "activator":
        return is_activated(record, structures)
    kinds = (n.kind for species in species_in_flask(record, structures) for n in attacking_atoms(species))
    return agent == "any" or agent in kinds


def groups_formed(record: Record, structures: Mapping[Path, Structure]) -> tuple[str, ...]:
    """Return the names of all leaving groups on the substrate and on what the stages give."""
    groups = (site.leaving_group for s in _bearers(record, structures) for site in perceive_sites(s))
    return tuple(dict.fromkeys(group for group in groups if group != NO_LEAVING_GROUP))


def is_activated(record: Record, structures: Mapping[Path, Structure]) -> bool:
    """Say whether an acid or an activator in the flask can make a reluctant group leave."""
    if any(reagent.use in _ACTIVATING_USES for reagent in record.reagents):
        return True
    charged = [structures[path] for path, _, _ in charged_rows(record)[1:] if path in structures]
    kinds = _kinds_of(charged)
    acting = [donor for donor in _halide_donors() if donor.activates and donor.acts_beside(kinds)]
    return bool(kinds & _ACID_KINDS) or any(donor.fragment.is_in(each) for donor in acting for each in charged)


def _kinds_of(species: Iterable[Structure]) -> frozenset[str]:
    return frozenset(nucleophile.kind for each in species for nucleophile in attacking_atoms(each))


def has_undrawn_species(record: Record, structures: Mapping[Path, Structure]) -> bool:
    """Say whether something was charged whose structure nobody knows, so that what follows from it cannot be told."""
    return any(
        path not in structures and (path[0] != "solvent" or structure_of(substance.name, None) is None)
        for path, _, substance in charged_rows(record)
    )


def species_in_flask(record: Record, structures: Mapping[Path, Structure]) -> Iterator[Structure]:
    """Yield the structure of everything charged but the substrate; solvents by their table row where undrawn."""
    charged = []
    for path, _, substance in charged_rows(record)[1:]:
        drawn = structures.get(path)
        structure = structure_of(substance.name, drawn) if path[0] == "solvent" else drawn
        if structure is not None:
            charged.append(structure)
    yield from with_halides_set_free(charged)


def with_halides_set_free(charged: Sequence[Structure]) -> Iterator[Structure]:
    """Yield what is charged, each followed by the halide ions it sets free.

    Methanesulfonyl chloride gives chloride, seen in a by-product.
    """
    kinds = _kinds_of(charged)
    donors = [donor for donor in _halide_donors() if donor.acts_beside(kinds)]
    for structure in charged:
        yield structure
        for ion in dict.fromkeys(donor.ion for donor in donors if donor.fragment.is_in(structure)):
            yield parse_smiles(ion)


@dataclass(frozen=True, slots=True)
class _HalideDonor:
    """One row of halide_donors.tsv; beside: the kind of nucleophile it acts with, None where it acts alone."""

    ion: str
    fragment: Fragment
    activates: bool
    beside: str | None

    def acts_beside(self, kinds: frozenset[str]) -> bool:
        """Say whether it sets its halide free in a flask with nucleophiles of these kinds."""
        return self.beside is None or self.beside in kinds


@cache
def _halide_donors() -> tuple[_HalideDonor, ...]:
    name = "halide_donors.tsv"
    columns = ("ion", "smarts", "activates", "beside", "note", "source")
    rows = rows_of(name, table_text("builder.mechanism", name), columns)
    return tuple(
        _HalideDonor(
            ion=row["ion"],
            fragment=Fragment.from_smarts(row["smarts"]),
            activates=row["activates"] == "yes",
            beside=None if row["beside"] == NOTHING else row["beside"],
        )
        for row in rows
    )


def _bearers(record: Record, structures: Mapping[Path, Structure]) -> tuple[Structure, ...]:
    paths: list[Path] = [("substrate",), *(("stages", index, "gives") for index in range(len(record.stages)))]
    return tuple(structures[path] for path in paths if path in structures)


def precursors_of(group: str) -> tuple[str, ...]:
    """Return the groups that can be made into this one in the flask."""
    return tuple(precursor for precursor, _ in _precursors().get(group, ()))


@cache
def _precursors() -> dict[str, tuple[tuple[str, str], ...]]:
    """Load formed_groups.tsv: group -> (precursor, agent)."""
    name = "formed_groups.tsv"
    found: dict[str, tuple[tuple[str, str], ...]] = {}
    for row in rows_of(name, table_text("builder.mechanism", name), ("group", "precursor", "agent", "source")):
        found[row["group"]] = (*found.get(row["group"], ()), (row["precursor"], row["agent"]))
    for group, pairs in found.items():
        refuse_twice(name, f"{group} from", [precursor for precursor, _ in pairs])
    return found
