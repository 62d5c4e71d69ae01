"""Which products follow from what was charged: textbook transformations, and near misses that do not."""

import pytest

from builder.chemistry.perception import sites_of
from builder.chemistry.structure import parse_smiles
from builder.mechanism.products import Event, routes_to
from builder.mechanism.reaction import SiteInPlay

AZIDE = "[Na+].[N-]=[N+]=[N-]"
ETHOXIDE = "[Na+].CC[O-]"

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
]
DOES_NOT_FOLLOW = [
    ("CCC(C)Br", "bromide", [AZIDE], "CCCCN=[N+]=[N-]"),
    ("CCC(C)Br", "bromide", [AZIDE], "CCC(C)O"),
    ("CCCCBr", "bromide", [ETHOXIDE], "CC(C)=C"),
    ("CCCCBr", "bromide", [AZIDE], "CCC(C)N=[N+]=[N-]"),
    ("OCCCCBr", "bromide", ["[Na+].[OH-]"], "CC1CCO1"),
    ("ClC12CCC(CC1)C2", "chloride", ["O"], "C1CC2CCC1C2"),
]


def _routes(substrate: str, group: str, flask: list[str], product: str) -> tuple[Event, ...]:
    structure = parse_smiles(substrate)
    sites = tuple(SiteInPlay(structure, site) for site in sites_of(structure, group))
    species = tuple(parse_smiles(each) for each in flask)
    (routes,) = routes_to((parse_smiles(product),), sites, species)
    return tuple(route.events[-1] for route in routes)


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
