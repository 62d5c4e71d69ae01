"""Carbocations: which is the more stable, and where a shift leads; structures that are drawn, not rates."""

from collections.abc import Iterator

import pytest

from builder.chemistry.perception import Hybridisation, ReactiveSite, perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.cations import MAX_SHIFTS, Station, cation_terms, is_bridgehead, nature_of, stations
from builder.mechanism.pathways.ionisation import cation_at
from builder.mechanism.rate_terms import fitted_parameters
from builder.mechanism.skeleton import Skeleton, skeleton_of

PARAMETERS = fitted_parameters()


def ionised(smiles: str) -> tuple[Structure, ReactiveSite, Skeleton]:
    """Return a chloride, its site (a saturated one before others), and the adjacency without the bond to chlorine."""
    structure = parse_smiles(smiles)
    chlorides = [s for s in perceive_sites(structure) if s.leaving_group == "chloride"]
    site = min(chlorides, key=lambda s: s.hybridisation is not Hybridisation.SP3)
    assert site.leaving_atom is not None
    return structure, site, skeleton_of(structure).without_bond(site.alpha_carbon, site.leaving_atom)


def stability(smiles: str) -> float:
    structure, site, skeleton = ionised(smiles)
    return sum(t.contribution for t in cation_terms(structure, skeleton, site.alpha_carbon, PARAMETERS))


def reached(smiles: str) -> list[Station]:
    structure, site, skeleton = ionised(smiles)
    return stations(structure, skeleton, site.alpha_carbon, PARAMETERS)


def drawn(smiles: str, station: Station) -> str:
    structure, site, _ = ionised(smiles)
    return cation_at(structure, site, station.path).structure.smiles


# --- stability ------------------------------------------------------------------------------------------------


# From the least to the most stable; on the scale of ionisation rates, so strain let go on the way counts.
@pytest.mark.parametrize(
    "order",
    [
        # degree: common practice, no source
        ("CCl", "CCCl", "CC(C)Cl", "CC(C)(C)Cl"),
        # conjugation: common practice, no source
        ("CCCl", "C=CCCl", "CC=CCCl", "CC(C)=CCCl"),
        ("CCCl", "ClCc1ccccc1", "CC(Cl)c1ccccc1", "CC(C)(Cl)c1ccccc1"),
        ("ClCc1ccccc1", "ClC(c1ccccc1)c1ccccc1", "ClC(c1ccccc1)(c1ccccc1)c1ccccc1"),
        # substituents: Brown and Okamoto, J. Am. Chem. Soc. 1958, 80, 4979 (from memory)
        (
            "CC(C)(Cl)c1ccc([N+](=O)[O-])cc1",
            "CC(C)(Cl)c1ccc(Cl)cc1",
            "CC(C)(Cl)c1ccccc1",
            "Cc1ccc(C(C)(C)Cl)cc1",
            "COc1ccc(C(C)(C)Cl)cc1",
        ),
        ("COc1cccc(C(C)(C)Cl)c1", "CC(C)(Cl)c1ccccc1", "COc1ccc(C(C)(C)Cl)cc1"),
        # a lone pair beside the cation: common practice, no source
        ("CCCl", "CCSCCl", "COCCl"),
        ("CC(C)(C)Cl", "COCCl"),
        # an acceptor: common practice, no source
        ("CC(=O)C(C)Cl", "CC(C)Cl"),
        ("CC(C)(Cl)C#N", "CC(C)(C)Cl"),
        ("FC(F)(F)C(C)(Cl)c1ccccc1", "CC(C)(Cl)c1ccccc1"),
        # bridgeheads: Bartlett and Knox, J. Am. Chem. Soc. 1939, 61, 3184; Fort and Schleyer, Chem. Rev. 1964, 64, 277
        # (from memory)
        ("ClC12CCC(CC1)C2", "ClC12CCC(CC1)CC2", "ClC12CC3CC(CC(C3)C1)C2", "CC(C)(C)Cl"),
        # 1-chloro-1-methylcycloalkanes, 80 % ethanol at 25 °C, tert-butyl 1: four 0.07, six 0.35, five 44. Brown and
        # Borkowski, J. Am. Chem. Soc. 1952, 74, 1894 (from memory)
        ("CC1(Cl)CCC1", "CC1(Cl)CCCCC1", "CC(C)(C)Cl", "CC1(Cl)CCCC1"),
        # cyclopropyl beside the cation; on it: Roberts and Chambers, J. Am. Chem. Soc. 1951, 73, 5034 (from memory)
        ("CCCl", "ClCC1CC1", "CC(Cl)C1CC1"),
        ("ClC1CC1", "ClC1CCC1", "CC(C)Cl"),
        # sp2 carbon: common practice, no source
        ("C=CCl", "CC(C)Cl"),
        ("Clc1ccccc1", "CCCl"),
    ],
    ids=lambda order: order[0],
)
def test_order_of_stability(order: tuple[str, ...]) -> None:
    found = [stability(smiles) for smiles in order]
    assert found == sorted(found)
    assert len(set(found)) == len(found)


@pytest.mark.parametrize(
    ("smiles", "kind"),
    [
        ("ClC12CC3CC(CC(C3)C1)C2", "adamantyl"),
        ("ClC12CCC(CC1)CC2", "six"),
        ("ClC12CCC(CC1)C2", "five"),
        ("CC(C)(C)Cl", None),
        ("CC1(Cl)CCCCC1", None),
        ("ClC12CCCCC1CCCC2", None),  # two rings that share one bond
    ],
)
def test_bridgeheads(smiles: str, kind: str | None) -> None:
    _, site, skeleton = ionised(smiles)
    assert is_bridgehead(skeleton, site.alpha_carbon) == kind


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("CC(C)(C)Cl", {"alkyl": 3}),
        ("CC(Cl)c1ccccc1", {"alkyl": 1, "aryl": 1}),
        ("C=CC(C)Cl", {"alkyl": 1, "vinyl": 1}),
        ("CC(Cl)C#CC", {"alkyl": 1, "alkynyl": 1}),
        ("CC(Cl)C1CC1", {"alkyl": 1, "cyclopropyl": 1}),
        ("COC(C)Cl", {"alkyl": 1, "oxygen": 1}),
        ("CC(=O)OC(C)Cl", {"alkyl": 1, "acyloxy": 1}),
        ("CC(=O)NCCl", {"amide": 1}),
        ("CN(C)CCl", {"nitrogen": 1}),
        ("CSCCl", {"sulfur": 1}),
        ("CS(=O)(=O)CCl", {"acceptors": 1}),
        ("CC(=O)C(C)Cl", {"alkyl": 1, "acceptors": 1}),
        ("N#CCCl", {"acceptors": 1}),
        ("FC(F)(F)C(C)Cl", {"alkyl": 1, "acceptors": 1}),
    ],
)
def test_what_stands_around_a_cation(smiles: str, expected: dict[str, int]) -> None:
    _, site, skeleton = ionised(smiles)
    nature = nature_of(skeleton, site.alpha_carbon)
    counts = {name: getattr(nature, name) for name in type(nature).__slots__ if name != "is_saturated"}
    assert {name: count for name, count in counts.items() if count} == expected


# --- shifts ---------------------------------------------------------------------------------------------------


def best(smiles: str) -> tuple[Station, list[Station]]:
    """Return the first station, and those of one shift that are the most stable."""
    first, *rest = reached(smiles)
    single = [s for s in rest if len(s.path) == 1]
    top = max(s.energy for s in single)
    return first, [s for s in single if s.energy > top - 1e-6]


# March's Advanced Organic Chemistry, 7th ed., ch. 18 (from memory): the next cation, drawn.
@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("CC(C)(C)CCl", "CC[C+](C)C"),  # neopentyl becomes tert-pentyl by a methyl shift
        ("CC(C)C(C)Cl", "CC[C+](C)C"),  # by a hydride shift
        ("CC(C)(C)C(C)Cl", "C[C+](C)C(C)C"),  # pinacolyl, by a methyl shift
        ("ClCC1CCC1", "[CH+]1CCCC1"),  # cyclobutylcarbinyl: the ring grows and lets go of its strain
        ("CC(Cl)C1CCC1", "CC1[CH+]CCC1"),
        ("OC(C)(C)C(C)(C)Cl", "CC(C)(C)[C+](C)O"),  # pinacol: protonated pinacolone
    ],
)
def test_where_the_best_first_shift_leads(smiles: str, expected: str) -> None:
    first, found = best(smiles)
    assert found[0].energy > first.energy
    assert {drawn(smiles, station) for station in found} == {parse_smiles(expected).smiles}


# No first shift gains anything: common practice, no source.
@pytest.mark.parametrize("smiles", ["CCC(C)Cl", "CC(C)Cl", "CC(C)(C)Cl", "ClC1CCCCC1", "CC1(Cl)CCCCC1", "CCC(C)(C)Cl"])
def test_no_shift_gains_where_the_cation_is_as_good_as_its_neighbours(smiles: str) -> None:
    first, *rest = reached(smiles)
    assert all(station.energy <= first.energy + 1e-6 for station in rest if len(station.path) == 1)


def test_from_a_tertiary_cation_expansion_of_a_five_ring_competes_at_best() -> None:
    # common practice, no source: against a cyclobutyl neighbour, where strain drives it
    def gain(smiles: str, ring: int) -> float:
        first, *rest = reached(smiles)
        wider = [s for s in rest if len(s.path) == 1 and s.skeleton.smallest_ring(s.centre) == ring]
        return max(s.energy for s in wider) - first.energy

    to_six, to_five = gain("CC(C)(Cl)C1CCCC1", 6), gain("CC(C)(Cl)C1CCC1", 5)
    assert to_six < 1
    assert to_five > 3


def all_paths() -> Iterator[tuple[str, Station]]:
    for smiles in ("CC(C)(C)CCl", "ClCC1CCC1", "CC(C)(CCl)c1ccccc1", "CC(Cl)C1CC1", "C[C@H]1CC[C@@H](C(C)Cl)C1"):
        for station in reached(smiles):
            yield smiles, station


def test_a_shift_makes_and_loses_nothing() -> None:
    for smiles, station in all_paths():
        structure, _, before = ionised(smiles)
        assert len(station.path) <= MAX_SHIFTS
        assert sum(station.skeleton.hydrogens) == sum(before.hydrogens)
        if all(step.opens is None for step in station.path):
            assert sum(map(len, station.skeleton.bonds)) == sum(map(len, before.bonds))
        assert station.lowest <= station.energy + 1e-9
        cation = parse_smiles(drawn(smiles, station))
        assert cation.charge == 1
        assert cation.formula.removesuffix("+") == structure.formula.replace("Cl", "")


def test_the_adjacency_after_shifts_is_that_of_the_structure_drawn() -> None:
    for smiles, station in all_paths():
        around = station.skeleton.neighbours(station.centre)
        cation = parse_smiles(drawn(smiles, station))
        (centre,) = [a for a in cation.atoms if a.charge == 1]
        assert len(centre.neighbours) == len(around)
        assert sorted(cation.atoms[n].symbol for n, _ in centre.neighbours) == sorted(
            map(station.skeleton.symbol, around)
        )
        assert centre.hydrogens == station.skeleton.hydrogens[station.centre]
        assert (min(centre.ring_sizes, default=None)) == station.skeleton.smallest_ring(station.centre)
