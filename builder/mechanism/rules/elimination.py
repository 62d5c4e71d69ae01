"""Gates of elimination."""

from builder.mechanism.rules.gate import Situation, gate
from builder.records.vocabulary import Mechanism

__all__ = ["ELIMINATION_GATES"]


@gate(
    id="elimination-without-beta-hydrogen",
    title="No elimination without a β-hydrogen",
    closes=(Mechanism.E1, Mechanism.E1CB, Mechanism.E2),
    source="iupac-gold",
    fires_on=("CC(C)(C)CBr", "CI", "ClCc1ccccc1"),
    silent_on=("CCBr", "CC(C)(C)Br", "BrCCc1ccccc1"),
)
def beta_hydrogen_is_lacking(situation: Situation) -> bool:
    """A β-elimination takes a hydrogen from a carbon next to the one that bears the leaving group.

    Neopentyl, methyl and benzyl substrates have none. A shift of the skeleton can give one; then the claim is a
    rearrangement.
    """
    return not situation.site.is_addition and not situation.site.beta_with_hydrogen


ELIMINATION_GATES = (beta_hydrogen_is_lacking,)
