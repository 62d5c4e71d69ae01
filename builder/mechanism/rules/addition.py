"""Gates of addition."""

from builder.chemistry.perception import perceive_sites
from builder.mechanism.rules.gate import Situation, gate
from builder.records.vocabulary import Mechanism

__all__ = ["ADDITION_GATES"]


@gate(
    id="ade-without-multiple-bond",
    title="No addition without a multiple bond",
    closes=(Mechanism.ADE,),
    source="iupac-gold",
    fires_on=("CCCCBr", "ClCc1ccccc1", "CC(=O)CCl"),
    silent_on=("C=CCBr", "C#CCCl", "C=CCCO"),
)
def multiple_bond_is_lacking(situation: Situation) -> bool:
    """Electrophilic addition needs a carbon-carbon double or triple bond.

    An aromatic ring is none: it is substituted. A carbonyl group adds nucleophiles, which is outside this book.
    """
    return not any(site.is_addition for site in perceive_sites(situation.structure))


ADDITION_GATES = (multiple_bond_is_lacking,)
