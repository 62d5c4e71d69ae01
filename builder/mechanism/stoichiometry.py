"""How many molecules of substrate and reagent one molecule of product holds, by counting atoms."""

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import product as pairs

from builder.chemistry.fragments import Fragment
from builder.chemistry.perception import ReactiveSite, atoms_that_stay
from builder.chemistry.structure import Structure

__all__ = ["Supply", "proton_capacity", "staying_elements", "supply_of"]

MOST_SUBSTRATES = MOST_REAGENTS = 4  # a quaternary ammonium takes four
_TAKES_A_PROTON = Fragment.from_smarts(
    "[$([O-;X1;!$([O-][N+]);!$([O-]S(=O)(=O));!$([O-][S,P,N;+])]),$([OH-]),$([N-;!$([N-]=[N+]=[N-])]),$([C-;!$(C#[O+])]),"
    "$([S-;X1]),$([S-2]),$([H-]),$([F-]),$([NX3;+0;!$(N-[C,S,P]=[O,S,N]);!$(N-c);!$(N~[N,O])]),$([nX2]),"
    "$([NX2;+0]=[C,P]),$([#6,#7]-[Li,Na,K,Mg]),$([O]-[Li,Na,K])]"
)


@dataclass(frozen=True, slots=True)
class Supply:
    """What one reagent is to a product.

    substrates: molecules of substrate in one molecule of product. per_molecule: molecules of product that one of the
    reagent can serve: 3 for phosphorus tribromide and an alkyl bromide, 0.5 where two end up in one product.
    left_over: atoms of both, hydrogen apart, that the product does not hold.
    """

    substrates: int
    per_molecule: float
    left_over: int = 0


def staying_elements(on: Structure, site: ReactiveSite) -> Mapping[str, int]:
    """Return how many atoms of each element stay with the alpha carbon when the group has left; hydrogen apart."""
    symbols = (on.atoms[atom].symbol for atom in atoms_that_stay(on, site))
    return Counter(symbol for symbol in symbols if symbol != "H")


def supply_of(product: Structure, staying: Mapping[str, int], reagent: Structure) -> Supply | None:
    """Return how a reagent supplies what a product has beyond its substrate; None where it supplies nothing it needs.

    staying: atoms of the substrate without the group that leaves. The numbers of molecules are those that leave the
    fewest atoms over; hydrogen is not counted.
    """
    wanted, offered = Counter(product.elements), Counter(reagent.without_counter_ions.elements)
    best: tuple[int, int, int] | None = None
    for substrates, reagents in pairs(range(1, MOST_SUBSTRATES + 1), range(1, MOST_REAGENTS + 1)):
        have = Counter({element: substrates * number for element, number in staying.items()})
        for element, number in offered.items():
            have[element] += reagents * number
        if all(have[element] >= number for element, number in wanted.items()):
            left = have.total() - wanted.total()
            best = min(best or (left, substrates, reagents), (left, substrates, reagents))
    if best is None:
        return None
    left, substrates, reagents = best
    needed = wanted - Counter({element: substrates * number for element, number in staying.items()})
    if not needed:
        return None
    served = min(reagents * offered[element] // number for element, number in needed.items())
    return Supply(substrates, max(served, 1) / reagents, left)


def proton_capacity(structure: Structure) -> int:
    """Return how many protons a species can take: 1 for hydroxide or an amine, 2 for carbonate, 0 for bromide or azide.

    An upper bound: how strong a base it is does not count.
    """
    return _TAKES_A_PROTON.count_in(structure)
