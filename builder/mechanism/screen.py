"""Which constitutions an edit can give, told from the atoms that go into it before it is carried out.

None but hydrogen comes from elsewhere, and every atom ends up in one piece or another: one holds the substrate
without what leaves, and with it the atom that attacks; the others hold what leaves and the rest of the reagent.
"""

from collections import Counter
from collections.abc import Callable, Iterable, Mapping
from functools import lru_cache, partial
from typing import Any

from builder.chemistry.patterns import Electrons
from builder.chemistry.perception import Nucleophile, ReactiveSite, atoms_that_stay
from builder.chemistry.structure import Structure
from builder.chemistry.transform import cyclise

__all__ = ["Screen", "screen_for"]

Screen = Callable[["partial[Any]"], bool]
"""Says whether an edit (of a structure, at a site, with what attacks) can give what is sought."""


def screen_for(sought: Iterable[Structure]) -> Screen:
    """Return the screen that lets through the edits that can give one of these constitutions, and few others."""
    wanted = {tuple(sorted(each.elements.items())): each.elements for each in sought}.values()
    return lambda edit: any(_can_give(edit, elements) for elements in wanted)


def _can_give(edit: "partial[Any]", sought: Mapping[str, int]) -> bool:
    start, site, *reagents = edit.args
    leaves, stays = _parted(start, site)
    brought, attached = Counter[str](), Counter(stays)
    if edit.func is cyclise:  # the group that attacks comes with the substrate, or with what would leave
        return _within(sought, leaves) or (_within(stays, sought) and _within(sought, stays + leaves))
    for reagent in reagents:
        if isinstance(reagent, Structure):
            brought.update(reagent.elements)
        elif isinstance(reagent, Nucleophile):
            brought.update(reagent.species.elements)
            attached[reagent.symbol] += reagent.electrons is not Electrons.HYDRIDE_TRANSFER
    return (_within(attached, sought) and _within(sought, stays + brought)) or _within(sought, leaves + brought)


def _within(part: Mapping[str, int], whole: Mapping[str, int]) -> bool:
    return all(number <= whole.get(element, 0) for element, number in part.items())


@lru_cache(maxsize=256)
def _parted(start: Structure, site: ReactiveSite) -> tuple["Counter[str]", "Counter[str]"]:
    """Return the atoms of a substrate that leave, counter-ions among them, and those that stay, by element."""
    kept = (start.atoms[at].symbol for at in atoms_that_stay(start, site))
    stays = Counter(symbol for symbol in kept if symbol != "H")
    return Counter(start.elements) - stays, stays
