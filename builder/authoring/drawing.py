"""A reaction drawn as a CTfile RXN: which component is the substrate, what attacks, what else is in it."""

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from builder.authoring.dialogue import Dialogue
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import ReactiveSite, atoms_that_stay, attacking_atoms, perceive_sites
from builder.chemistry.structure import Structure, StructureError, parse_rxn, parse_smiles
from builder.mechanism.asking import AskingError
from builder.mechanism.reagents import Role, reagent_by_structure
from builder.records.vocabulary import ReagentUse

__all__ = ["Drawing", "leaving_sites", "read_drawing"]


@dataclass(frozen=True, slots=True)
class Drawing:
    """The parts of a drawn reaction.

    products: those that hold what stays of the substrate, as drawn. leaving_group: empty where products do not tell it.
    """

    substrate: Structure
    nucleophile: Structure | None
    base: Structure | None
    reagents: tuple[tuple[Structure, ReagentUse], ...]
    products: tuple[Structure, ...]
    leaving_group: str


_USES = {
    Role.BRONSTED_ACID: ReagentUse.ACID,
    Role.LEWIS_ACID: ReagentUse.ACID,
    Role.BUFFER_ACID: ReagentUse.BUFFER,
    Role.ACTIVATOR: ReagentUse.ACTIVATOR,
    Role.NITROSATION: ReagentUse.ACTIVATOR,
    Role.SILVER: ReagentUse.ACTIVATOR,
    Role.CROWN: ReagentUse.CATALYST,
    Role.ONIUM: ReagentUse.CATALYST,
}
"""What reagents that attack nothing themselves are used for."""


def leaving_sites(structure: Structure) -> tuple[ReactiveSite, ...]:
    """Return the sites to think of first: with groups that leave as they stand, else with others, else to be added to.

    Carbons of multiple bonds and arenes come last among those that bear a group.
    """
    sites = perceive_sites(structure)
    bearing = [site for site in sites if not site.is_addition]
    ready = [site for site in bearing if not site.needs_activation and site.degree is not None]
    return tuple(ready or [site for site in bearing if site.degree is not None] or bearing or sites)


def read_drawing(
    text: str, dialogue: Dialogue, *, substrate: Structure | None = None, nucleophile: Structure | None = None
) -> Drawing:
    """Return the parts of an RXN block. Ions drawn apart are put together to salts.

    substrate, nucleophile: where it was stated what they are. dialogue: asked where several components may be one.
    Raises AskingError for a block that cannot be read, that holds no substrate, or where nobody says which it is.
    """
    try:
        reactants, products = parse_rxn(text)
    except StructureError as fault:
        raise AskingError(fault.reason, fault.mend) from fault
    components = _salts(reactants)
    if not components:
        raise AskingError("the RXN file has no reactant", "draw substrate and nucleophile before the arrow")
    chosen = _substrate(components, products, substrate, dialogue)
    others = [component for component in components if component is not chosen]
    site, kept = _site_that_reacted(chosen, products)
    spent = {neutral_form(piece) for other in others for piece in other.fragments}
    organic = [
        product for product in products if kept <= Counter(product.elements) and neutral_form(product) not in spent
    ]
    gained = Counter(organic[0].elements) - kept if organic else None
    if nucleophile is None:
        nucleophile = _nucleophile(others, gained, dialogue)
    base, rest = _base_and_rest([other for other in others if other != nucleophile], has_nucleophile=bool(nucleophile))
    return Drawing(
        substrate=chosen,
        nucleophile=nucleophile,
        base=base,
        reagents=tuple((structure, _use(structure)) for structure in rest),
        products=tuple(organic),
        leaving_group=site.leaving_group if site is not None and organic else "",
    )


def _salts(components: Sequence[Structure]) -> list[Structure]:
    """Return the components, ions of either sign put together until their charges cancel."""
    found = [component for component in components if not component.charge]
    cations = [component for component in components if component.charge > 0]
    for anion in (component for component in components if component.charge < 0):
        pieces = [anion]
        while cations and sum(piece.charge for piece in pieces) < 0:
            pieces.append(cations.pop(0))
        found.append(parse_smiles(".".join(piece.smiles for piece in pieces)))
    return [*found, *cations]


def _substrate(
    components: Sequence[Structure], products: Sequence[Structure], stated: Structure | None, dialogue: Dialogue
) -> Structure:
    if stated is not None:
        same = next((each for each in components if stated in (each, each.flat)), None)
        if same is None:
            drawn = ", ".join(each.smiles for each in components)
            raise AskingError(f"the RXN file has no reactant {stated.typed}", f"it has {drawn}")
        return same
    ranked = sorted({_rank(each) for each in components if leaving_sites(each)})
    if not ranked:
        raise AskingError("no reactant of the RXN file bears a leaving group or multiple bond", "name the substrate")
    found = [each for each in components if leaving_sites(each) and _rank(each) == ranked[0]]
    reacted = [each for each in found if _site_that_reacted(each, products)[0] is not None]
    found = reacted or found
    if len(found) == 1:
        return found[0]
    options = [each.smiles for each in found]
    place = dialogue.must_choose("Which reactant is the substrate?", options, "name it: handbook new SUBSTRATE --rxn …")
    return found[place]


def _rank(structure: Structure) -> tuple[bool, bool]:
    first = leaving_sites(structure)[0]
    return first.is_addition, first.needs_activation


def _site_that_reacted(substrate: Structure, products: Sequence[Structure]) -> tuple[ReactiveSite | None, Counter[str]]:
    """Return the site whose rest a product may hold, with the elements that stay; those of the first site else."""
    sites = leaving_sites(substrate)
    for site in sites:
        kept = _kept(substrate, site)
        if any(kept <= Counter(product.elements) for product in products):
            return site, kept
    return None, _kept(substrate, sites[0]) if sites else Counter(substrate.elements)


def _kept(substrate: Structure, site: ReactiveSite) -> Counter[str]:
    if site.is_addition:
        return Counter(substrate.without_counter_ions.elements)
    return Counter(substrate.atoms[atom].symbol for atom in atoms_that_stay(substrate, site))


def _nucleophile(others: Sequence[Structure], gained: Counter[str] | None, dialogue: Dialogue) -> Structure | None:
    """Return what attacked; gained: the elements a product has beyond what stayed, None if nobody drew one."""
    if gained is not None and not gained:
        return None
    attackers = [other for other in others if attacking_atoms(other)]
    fitting = [other for other in attackers if gained is None or gained <= Counter(other.elements)]
    usual = [other for other in fitting if not _is_helper(other)]
    return _one_of(usual or fitting, dialogue)


def _base_and_rest(left: Sequence[Structure], *, has_nucleophile: bool) -> tuple[Structure | None, list[Structure]]:
    """Return the base among what is left, and the others; without a nucleophile whatever attacks is the base."""
    bases = list(_bases(left))
    if not bases and not has_nucleophile:
        bases = [other for other in left if attacking_atoms(other)]
    base = bases[0] if bases else None
    return base, [other for other in left if other is not base]


def _one_of(found: Sequence[Structure], dialogue: Dialogue) -> Structure | None:
    if len(found) < 2:
        return found[0] if found else None
    options = [each.smiles for each in found]
    return found[dialogue.must_choose("Which is the nucleophile?", options, "name it with --nucleophile")]


def _is_helper(structure: Structure) -> bool:
    """Say whether a component is there for what it does to the flask."""
    reagent = reagent_by_structure(structure.smiles)
    return reagent is not None and (reagent.role is Role.BASE or reagent.role in _USES)


def _bases(found: Sequence[Structure]) -> Iterator[Structure]:
    for structure in found:
        reagent = reagent_by_structure(structure.smiles)
        if reagent is not None and reagent.role is Role.BASE:
            yield structure


def _use(structure: Structure) -> ReagentUse:
    reagent = reagent_by_structure(structure.smiles)
    return ReagentUse.ADDITIVE if reagent is None else _USES.get(reagent.role, ReagentUse.ADDITIVE)
