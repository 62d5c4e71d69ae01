"""The screen before the search for products: it lets through every edit that gives what is sought, and few others."""

from collections.abc import Iterator
from functools import partial
from typing import Any

import pytest

from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import attacking_atoms, neighbouring_groups, perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.chemistry.transform import add_hx, add_x2, cyclise, eliminate, substitute, transpose_allylic
from builder.mechanism.screen import screen_for

# Substrates with each sort of group (salt, ring, ester, onium, none), and reagents with each way to attack.
SUBSTRATES = (
    "CCC(C)Br",
    "CCCCOS(=O)(=O)c1ccc(C)cc1",
    "C=CC(C)Cl",
    "OCCCCBr",
    "CC1CO1",
    "CC(=O)OC(C)(C)C",
    "CCCCCCC[N+](C)(C)C.[I-]",
    "BrCCBr",
    "CC=C(C)C",
)
REAGENTS = (
    "[Na+].[N-]=[N+]=[N-]",
    "NCc1ccccc1",
    "[Mg+2].[Br-].[CH3-]",
    "[Li+].[BH4-]",
    "[Na+].[O-]c1ccccc1",
    "Br",
    "BrBr",
    "O",
)


def _edits(start: Structure, reagent: Structure) -> Iterator["partial[Any]"]:
    """Yield every edit of the first round of a search."""
    for site in perceive_sites(start):
        if site.is_addition:
            yield from (partial(add_hx, start, site, nucleophile) for nucleophile in attacking_atoms(reagent))
            if reagent.smiles == "BrBr":
                yield partial(add_x2, start, site, reagent)
            continue
        for nucleophile in attacking_atoms(reagent):
            yield partial(substitute, start, site, nucleophile)
            yield partial(transpose_allylic, start, site, nucleophile)
        groups = (group for group in neighbouring_groups(start) if group.atom != site.leaving_atom)
        yield from (partial(cyclise, start, site, group) for group in groups)
        yield from (partial(eliminate, start, site, beta.atom) for beta in site.beta_with_hydrogen)


def _made(edit: "partial[Any]") -> list[Structure]:
    try:
        made = edit()
    except RuntimeError:  # no such edit of this pair
        return []
    edits = made if isinstance(made, tuple) else (made,)
    return [piece for each in edits for piece in (each.product, *each.others) if "C" in piece.elements]


@pytest.mark.parametrize("reagent", REAGENTS)
@pytest.mark.parametrize("substrate", SUBSTRATES)
def test_what_an_edit_gives_is_let_through(substrate: str, reagent: str) -> None:
    for edit in _edits(parse_smiles(substrate), parse_smiles(reagent)):
        for product in _made(edit):
            assert screen_for([neutral_form(product)])(edit), (edit.func.__name__, product.smiles)


@pytest.mark.parametrize(
    ("sought", "passed"),
    [
        ("CCC(C)N=[N+]=[N-]", {"substitute", "transpose_allylic"}),
        ("CC=CC", {"eliminate"}),
        ("CCC(C)O", set()),
        ("CCC(C)(C)N=[N+]=[N-]", set()),
    ],
)
def test_edits_without_the_atoms_of_what_is_sought_are_passed_over(sought: str, passed: set[str]) -> None:
    edits = _edits(parse_smiles("CCC(C)Br"), parse_smiles("[Na+].[N-]=[N+]=[N-]"))
    screen = screen_for([parse_smiles(sought)])
    assert {edit.func.__name__ for edit in edits if screen(edit)} == passed
