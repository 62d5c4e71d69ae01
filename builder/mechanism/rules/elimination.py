"""Gates of elimination."""

from builder.chemistry.perception import Hybridisation, neighbouring_groups
from builder.chemistry.transform import violates_bredt
from builder.mechanism.rules.gate import Situation, gate
from builder.records.vocabulary import Mechanism

__all__ = ["ELIMINATION_GATES"]

_CARBON_ACIDS = frozenset({"carbon acid", "carbon acid, weak"})


@gate(
    id="e1-without-beta-hydrogen",
    title="No E1 where no proton can be lost",
    closes=(Mechanism.E1,),
    source="iupac-gold",
    fires_on=("CI", "ClCc1ccccc1", "ClC(c1ccccc1)c1ccccc1"),
    silent_on=("CC(C)(C)CBr", "CC(C)(C)Br", "CC(Cl)c1ccccc1"),
)
def cation_has_no_proton_to_lose(situation: Situation) -> bool:
    """A carbocation loses a proton from a neighbouring carbon, its own or that of the cation it shifts to.

    Methyl and simple benzyl (ArCH2X) have none. Neopentyl finds one after a methyl shift, so it stays open.
    """
    return _beta_hydrogen_is_lacking(situation) and not situation.can_shift


@gate(
    id="e1cb-without-acceptor",
    title="No carbanion without an acceptor",
    closes=(Mechanism.E1CB,),
    source="march-2013",
    fires_on=("CCCCBr", "CC(O)CC", "CC(=O)C(C)Br", "CC(F)CCC(C)=O"),
    silent_on=("CC(O)CC(C)=O", "FCCC(C)=O", "OCC[N+](=O)[O-]", "FCCS(=O)(=O)C", "FC(F)C(F)(F)Cl", "C=CBr"),
)
def carbanion_has_no_acceptor(situation: Situation) -> bool:
    """E1cB needs a β-hydrogen acidic enough to leave first.

    An acceptor on its carbon does that: a carbonyl group, cyano, nitro, sulfonyl, sulfonium or phosphonium; so do
    several halogens there, or a ring that the anion makes aromatic. A hydrogen α to the acceptor and the leaving group
    alike does not count: it is not β.
    """
    if situation.site.hybridisation is not Hybridisation.SP3:
        return False
    ranks = situation.structure.symmetry_classes
    acidic = {ranks[n.atom] for n in neighbouring_groups(situation.structure) if n.kind in _CARBON_ACIDS}
    return acidic.isdisjoint(ranks[beta.atom] for beta in situation.site.beta_with_hydrogen)


@gate(
    id="elimination-against-bredt",
    title="No double bond at a small bridgehead",
    closes=(Mechanism.E1, Mechanism.E2),
    source="iupac-gold",
    fires_on=("BrC12CC3CC(CC(C3)C1)C2", "ClC12CCC(CC1)C2"),
    silent_on=("BrC1CC2CCC1C2", "CC1(Cl)CCCCC1", "CI"),
)
def every_alkene_breaks_bredt(situation: Situation) -> bool:
    """Every alkene that loss of a β-hydrogen could give has its double bond at a bridgehead, against Bredt's rule.

    The two p orbitals stand at an angle there and hardly overlap. Rings of eight members and more hold such a bond.
    """
    site = situation.site
    ends = [beta.atom for beta in site.beta_with_hydrogen]
    return bool(ends) and all(violates_bredt(situation.structure, site.alpha_carbon, end) for end in ends)


@gate(
    id="elimination-without-beta-hydrogen",
    title="No elimination without a β-hydrogen",
    closes=(Mechanism.E1CB, Mechanism.E2),
    source="iupac-gold",
    fires_on=("CC(C)(C)CBr", "CI", "ClCc1ccccc1"),
    silent_on=("CCBr", "CC(C)(C)Br", "BrCCc1ccccc1"),
)
def beta_hydrogen_is_lacking(situation: Situation) -> bool:
    """A β-elimination takes a hydrogen from a carbon next to the one that bears the leaving group.

    Neopentyl, methyl and simple benzyl (ArCH2X) substrates have none. A shift of the skeleton can give one; then the
    alkene comes of E1.
    """
    return _beta_hydrogen_is_lacking(situation)


ELIMINATION_GATES = (
    cation_has_no_proton_to_lose,
    carbanion_has_no_acceptor,
    every_alkene_breaks_bredt,
    beta_hydrogen_is_lacking,
)


def _beta_hydrogen_is_lacking(situation: Situation) -> bool:
    return not situation.site.is_addition and not situation.site.beta_with_hydrogen
