"""Which products follow from what was charged: textbook transformations, and near misses that do not."""

import pytest

from builder.chemistry.perception import sites_of
from builder.chemistry.structure import parse_smiles
from builder.chemistry.transform import UnbalancedTransformation
from builder.mechanism import products
from builder.mechanism.products import Event, Route, search_routes
from builder.mechanism.reaction import SiteInPlay, with_halides_set_free

AZIDE = "[Na+].[N-]=[N+]=[N-]"
ETHOXIDE = "[Na+].CC[O-]"
LDA = "[Li+].CC(C)[N-]C(C)C"
SILVER = "[Ag+].[O-][N+](=O)[O-]"

# substrate, leaving group, flask, product, last event. Textbook chemistry (March's Advanced Organic Chemistry,
# 7th ed., ch. 10, 15, 17 and 18, from memory).
FOLLOWS = [
    ("CCC(C)Br", "bromide", [AZIDE], "CCC(C)N=[N+]=[N-]", Event.SUBSTITUTION),
    ("CCC(C)Br", "bromide", [ETHOXIDE], "CC=CC", Event.ELIMINATION),
    ("CCC(C)Br", "bromide", [ETHOXIDE], "C=CCC", Event.ELIMINATION),
    ("CC(C)(C)Cl", "chloride", ["O", "CCO"], "CC(C)(C)OCC", Event.SUBSTITUTION),
    ("C=CC(C)Cl", "chloride", ["CC(=O)[O-].[Na+]"], "CC(=O)OCC=CC", Event.TRANSPOSITION),
    ("CC(C)(C)CBr", "bromide", ["O"], "CCC(C)(C)O", Event.SUBSTITUTION),  # 1,2-methyl shift
    ("CC(C)(C)CBr", "bromide", ["O"], "CC=C(C)C", Event.ELIMINATION),
    ("CC1(CBr)CCC1", "bromide", ["O"], "CC1(O)CCCC1", Event.SUBSTITUTION),  # ring expansion
    ("C1CO1", "epoxide", [AZIDE], "OCCN=[N+]=[N-]", Event.SUBSTITUTION),
    ("OCCCCBr", "bromide", ["[Na+].[OH-]"], "C1CCOC1", Event.RING_CLOSURE),
    ("ClCC(C)O", "chloride", ["[Na+].[OH-]"], "CC1CO1", Event.RING_CLOSURE),
    ("CCBr", "bromide", ["NCc1ccccc1"], "CCN(CC)Cc1ccccc1", Event.SUBSTITUTION),  # over-alkylation
    ("CCBr", "bromide", ["NCc1ccccc1"], "CC[NH2+]Cc1ccccc1.[Br-]", Event.SUBSTITUTION),  # as the salt
    ("BrCCBr", "bromide", ["[K+].[OH-]"], "C=CBr", Event.ELIMINATION),
    ("CC(Br)C(C)Br", "bromide", ["[K+].[OH-]"], "CC#CC", Event.ELIMINATION),  # two after each other
    ("CC=C(C)C", "none", ["Br"], "CCC(C)(C)Br", Event.ADDITION),
    ("CC=CC", "none", ["BrBr"], "CC(Br)C(C)Br", Event.ADDITION),
    ("CC(C)C=C", "none", ["Cl"], "CCC(C)(C)Cl", Event.SUBSTITUTION),  # protonation and hydride shift
    ("CCCCCl", "chloride", ["CCOC(=O)CC(=O)OCC", ETHOXIDE], "CCCCC(C(=O)OCC)C(=O)OCC", Event.SUBSTITUTION),
    ("CI", "iodide", ["[Na+].[O-]N=O"], "C[N+](=O)[O-]", Event.SUBSTITUTION),
    ("CI", "iodide", ["[Na+].[O-]N=O"], "CON=O", Event.SUBSTITUTION),
    ("CI", "iodide", ["[Ag]C#N"], "C[N+]#[C-]", Event.SUBSTITUTION),
    ("CI", "iodide", ["[Ag]C#N"], "CC#N", Event.SUBSTITUTION),
    ("BrCc1ccccc1", "bromide", ["N"], "C(N(Cc1ccccc1)Cc1ccccc1)c1ccccc1", Event.SUBSTITUTION),  # three times
    ("CI", "iodide", ["NCc1ccccc1"], "C[N+](C)(C)Cc1ccccc1.[I-]", Event.SUBSTITUTION),  # exhaustive methylation
    ("CI", "iodide", ["N"], "C[N+](C)(C)C.[I-]", Event.SUBSTITUTION),  # four times
    ("BrCC1CC1", "bromide", ["O"], "OCCC=C", Event.SUBSTITUTION),  # cyclopropylmethyl to homoallyl
    ("BrCC1CC1", "bromide", ["O"], "OC1CCC1", Event.SUBSTITUTION),
    ("BrC1CCC1", "bromide", ["O"], "OCC1CC1", Event.SUBSTITUTION),
    ("BrC1CC1", "bromide", ["O", SILVER], "C=CCO", Event.SUBSTITUTION),  # cyclopropyl to allyl
    ("CC(O)C1CC1", "hydroxyl", ["Br"], "CC=CCCBr", Event.SUBSTITUTION),
    ("CN1CCC(Cl)CC1", "chloride", ["O"], "C=CCC[N+](C)=C", Event.FRAGMENTATION),  # Grob
    ("CC(Br)CC(C)(C)O", "bromide", ["O"], "CC(C)=O", Event.FRAGMENTATION),
    ("CC(Br)C(C)Br", "bromide", ["[Zn]"], "CC=CC", Event.ELIMINATION),
    ("BrC(c1ccccc1)C(Br)c1ccccc1", "bromide", ["[Na+].[I-]"], "C(=Cc1ccccc1)c1ccccc1", Event.ELIMINATION),
    ("CC(C)(C)O", "hydroxyl", ["CC#N", "O=S(=O)(O)O", "O"], "CC(=O)NC(C)(C)C", Event.HYDROLYSIS),  # Ritter
    ("C=CCBr", "bromide", ["C1CCN(C1)C1=CCCCC1", "O"], "C=CCC1CCCCC1=O", Event.HYDROLYSIS),  # Stork
    ("CCCCBr", "bromide", ["NC(N)=S", "[Na+].[OH-]"], "CCCCS", Event.HYDROLYSIS),
    ("CCCCBr", "bromide", ["CN(C)C=O"], "CCCCOC=O", Event.HYDROLYSIS),
    ("ClC(Cl)c1ccccc1", "chloride", ["O"], "O=Cc1ccccc1", Event.FRAGMENTATION),
    ("BrCC(=O)c1ccccc1", "bromide", ["CS(C)=O"], "O=CC(=O)c1ccccc1", Event.FRAGMENTATION),  # Kornblum
    ("BrCc1ccccc1", "bromide", ["[Na+].CC(C)=[N+]([O-])[O-]"], "O=Cc1ccccc1", Event.FRAGMENTATION),  # Hass-Bender
    ("CCOC(=O)C(CC)C(=O)OCC", "carboxylate", ["[Na+].[Cl-]", "O"], "CCCC(=O)OCC", Event.FRAGMENTATION),  # Krapcho
    ("CI", "iodide", ["O=C1CCCCC1", LDA], "CC1CCCCC1=O", Event.SUBSTITUTION),
    ("CI", "iodide", ["CS(C)(=O)=O", "[Li]CCCC"], "CCS(C)(=O)=O", Event.SUBSTITUTION),
    ("C=CCCC", "none", ["Br"], "CCCC(C)Br", Event.ADDITION),
    ("C=CCCC", "none", ["Br", "CC(C)(C)OOC(C)(C)C"], "CCCCCBr", Event.ADDITION),  # peroxide turns it round
    ("CCC=CC", "none", ["Br"], "CCCC(C)Br", Event.ADDITION),  # either end of a like pair
    ("CCC=CC", "none", ["Br"], "CCC(Br)CC", Event.ADDITION),
    ("C=CC(=O)OC", "none", ["Br"], "BrCCC(=O)OC", Event.ADDITION),  # away from the acceptor
    ("ClCCCC(C)=O", "chloride", ["[Na+].[OH-]"], "CC(=O)C1CC1", Event.RING_CLOSURE),
]
DOES_NOT_FOLLOW = [
    ("CCC(C)Br", "bromide", [AZIDE], "CCCCN=[N+]=[N-]"),
    ("CCC(C)Br", "bromide", [AZIDE], "CCC(C)O"),
    ("CCCCBr", "bromide", [ETHOXIDE], "CC(C)=C"),
    ("CCCCBr", "bromide", [AZIDE], "CCC(C)N=[N+]=[N-]"),
    ("OCCCCBr", "bromide", ["[Na+].[OH-]"], "CC1CCO1"),
    ("ClC12CCC(CC1)C2", "chloride", ["O"], "C1CC2CCC1C2"),
    ("CCCCBr", "bromide", [AZIDE, "CC(C)=O"], "CCCCCC(C)=O"),  # acetone as a mere solvent
    ("CCCCBr", "bromide", [AZIDE, "CC#N"], "CCCCCC#N"),
    ("CCCCBr", "bromide", [ETHOXIDE, "CCOC(C)=O"], "CCCCCC(=O)OCC"),
    ("CCCCBr", "bromide", [AZIDE, "C1CCOC1"], "CCCCOCCCCN=[N+]=[N-]"),  # THF opened
    ("C=CCCC", "none", ["Br"], "CCCCCBr"),
    ("C=CCCC", "none", ["SCc1ccccc1"], "CCCCCSCc1ccccc1"),
    ("CC(Br)C(C)Br", "bromide", [AZIDE], "CC=CC"),
    ("CC(C)(C)Br", "bromide", ["CC#N"], "CC(=O)NC(C)(C)C"),  # no water yet
]
# substrate, group, flask, product, a gate that stands on every way to it
CLOSED = [
    ("Clc1ccccc1", "chloride", [AZIDE], "[N-]=[N+]=Nc1ccccc1", "sn2-closed-unsaturated"),
    ("CCCCF", "fluoride", [AZIDE], "CCCCN=[N+]=[N-]", "fluoride-stays"),
    ("CCCCO", "hydroxyl", [AZIDE], "CCCCN=[N+]=[N-]", "leaving-group-stays"),
    ("ClC12CCC(CC1)C2", "chloride", ["O"], "OC12CCC(CC1)C2", "sn2-closed-bridgehead"),
    ("ClC(Cl)Cl", "chloride", [AZIDE], "ClC(Cl)N=[N+]=[N-]", "sn2-closed-trihalomethyl"),
    ("BrC1CC1", "bromide", [AZIDE], "[N-]=[N+]=NC1CC1", "sn2-closed-cyclopropyl"),
    ("OCCCCF", "fluoride", ["[Na+].[OH-]"], "C1CCOC1", "fluoride-stays"),
    # ammonia takes up side chains but no ring, whether that comes last or between them
    ("BrCCc1ccc(Br)cc1", "bromide", ["N"], "BrCCc1ccc(NCCc2ccc(Br)cc2)cc1", "sn2-closed-unsaturated"),
    ("BrCc1ccc(Br)cc1", "bromide", ["N"], "BrCc1ccc(N(Cc2ccc(Br)cc2)Cc2ccc(Br)cc2)cc1", "sn2-closed-unsaturated"),
]


def _found(substrate: str, group: str, flask: list[str], product: str) -> tuple[Route, ...]:
    structure = parse_smiles(substrate)
    species = tuple(parse_smiles(each) for each in flask)
    activated = any(each in {"Br", "O=S(=O)(O)O", SILVER} for each in flask)
    sites = tuple(SiteInPlay(structure, site, activated) for site in sites_of(structure, group))
    (routes,) = search_routes((parse_smiles(product),), sites, species).routes
    return routes


def _routes(substrate: str, group: str, flask: list[str], product: str) -> tuple[Event, ...]:
    return tuple(r.events[-1] for r in _found(substrate, group, flask, product) if not r.closed_by)


@pytest.mark.parametrize(
    ("substrate", "group", "flask", "product", "event"), FOLLOWS, ids=[f"{row[0]}-{row[3]}" for row in FOLLOWS]
)
def test_follows(substrate: str, group: str, flask: list[str], product: str, event: Event) -> None:
    assert event in _routes(substrate, group, flask, product)


@pytest.mark.parametrize(
    ("substrate", "group", "flask", "product"), DOES_NOT_FOLLOW, ids=[row[3] for row in DOES_NOT_FOLLOW]
)
def test_does_not_follow(substrate: str, group: str, flask: list[str], product: str) -> None:
    assert _routes(substrate, group, flask, product) == ()


@pytest.mark.parametrize(("substrate", "group", "flask", "product", "gate"), CLOSED, ids=[row[3] for row in CLOSED])
def test_a_way_that_a_gate_closes_is_shown_as_closed(
    substrate: str, group: str, flask: list[str], product: str, gate: str
) -> None:
    found = _found(substrate, group, flask, product)
    assert found
    assert all(gate in {each.rule.id for each in route.closed_by} for route in found)


def test_an_edit_that_cannot_balance_is_no_way_and_stops_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> object:
        raise UnbalancedTransformation("nothing balances here")

    monkeypatch.setattr(products, "substitute", refuse)
    monkeypatch.setattr(products, "shift_12", refuse)
    search_routes.cache_clear()
    assert _routes("CCC(C)Br", "bromide", [AZIDE], "CC=CC")
    assert _routes("CC(C)(C)Cl", "chloride", [AZIDE], "CC(C)(C)N=[N+]=[N-]")  # by capture
    assert not _routes("CCCCBr", "bromide", [AZIDE], "CCCCN=[N+]=[N-]")
    search_routes.cache_clear()


def test_tetrahalomethanes_act_only_beside_a_phosphine() -> None:
    bromine_source, phosphine = parse_smiles("BrC(Br)(Br)Br"), parse_smiles("c1ccc(P(c2ccccc2)c2ccccc2)cc1")
    assert list(with_halides_set_free([bromine_source])) == [bromine_source]
    assert parse_smiles("[Br-]") in set(with_halides_set_free([bromine_source, phosphine]))


HOSTILE = {
    # Found by a tester whose checks ran for more than twenty seconds: every atom of it can react.
    "a polyol": ("CCC(C)Br", "OC" + "C(O)" * 20 + "C"),
    "sucrose": ("CCC(C)Br", "OC[C@H]1OC(OC2(CO)OC(CO)C(O)C2O)C(O)C(O)C1O"),
    "forty bromides": ("C" + "CC(Br)" * 40, AZIDE),
    "a polyether": ("BrCC" + "OCC" * 50 + "Br", AZIDE),
    "a long amine": ("C" * 60 + "Br", "C" * 180 + "N"),
}


@pytest.mark.parametrize(("substrate", "nucleophile"), HOSTILE.values(), ids=HOSTILE.keys())
def test_a_search_ends_within_its_budget_and_says_so(substrate: str, nucleophile: str) -> None:
    structure = parse_smiles(substrate)
    sites = tuple(SiteInPlay(structure, site) for site in sites_of(structure, "bromide"))
    found = search_routes((parse_smiles("CCCCCCCCCCCCP"),), sites, (parse_smiles(nucleophile),))
    assert found.routes == ((),)
    assert found.was_cut == (nucleophile != "C" * 180 + "N")  # its products outgrow all bounds at once
