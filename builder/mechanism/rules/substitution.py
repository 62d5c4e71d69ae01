"""Gates of substitution and of ionisation."""

from builder.chemistry.perception import Degree, Hybridisation
from builder.mechanism.rules.gate import Situation, gate
from builder.records.vocabulary import Mechanism

__all__ = ["SUBSTITUTION_GATES"]

_IONISING = (Mechanism.SN1, Mechanism.E1)


@gate(
    id="leaving-group-stays",
    title="A leaving group that stays put",
    closes=(Mechanism.SN2, Mechanism.SN2_PRIME, Mechanism.SN1, Mechanism.E2, Mechanism.E1),
    source="march-2013",
    fires_on=("CCCCO", "CCOCC", "CCCCF"),
    silent_on=("CCCCBr", "CC1CO1", "CCCC[OH2+]", "COC(=O)c1ccccc1"),
)
def leaving_group_stays(situation: Situation) -> bool:
    """Hydroxide, alkoxides, amides and fluoride do not leave an unactivated carbon.

    Their conjugate acids are too weak. Protonation, a sulfonyl chloride, a phosphorus reagent or the strain of a
    small ring helps; so does E1cB, which this gate leaves open. Esters pass: a carboxylate leaves when iodide or
    thiolate takes the alkyl group, or when that ionises.
    """
    return not situation.group_leaves_unaided and situation.site.leaving_group != "carboxylate"


@gate(
    id="sn1-closed-bridgehead",
    title="No cation at the bridgehead of a small bicycle",
    closes=_IONISING,
    source="march-2013",
    fires_on=("ClC12CCC(CC1)C2",),
    silent_on=("BrC12CC3CC(CC(C3)C1)C2", "CC1(Cl)CC2CCC1C2"),
)
def bridgehead_cation_is_impossible(situation: Situation) -> bool:
    """A bridgehead carbon of a small bicycle cannot become planar, so it does not ionise.

    Small means that a ring of five or fewer atoms passes through it; 1-adamantyl, whose rings are six-membered,
    ionises.
    """
    return situation.site.is_bridgehead and min(situation.site.ring_sizes, default=9) <= 5


@gate(
    id="sn1-closed-methyl",
    title="No methyl cation",
    closes=_IONISING,
    source="iupac-gold",
    fires_on=("CI", "COS(C)(=O)=O"),
    silent_on=("CC(C)Br", "COCCl", "ClCc1ccccc1"),
)
def methyl_cation_is_impossible(situation: Situation) -> bool:
    """A methyl cation is not formed in solution.

    A donor on the carbon (an alkoxy, amino or thio group) makes it another cation.
    """
    return situation.site.degree is Degree.METHYL and not _has_donor(situation)


@gate(
    id="sn1-closed-primary",
    title="No plain primary cation",
    closes=_IONISING,
    source="march-2013",
    fires_on=("CCCCBr", "CCCCOS(C)(=O)=O"),
    silent_on=("C=CCBr", "ClCc1ccccc1", "CC(C)(C)CBr", "COCCl", "BrCC1CC1"),
)
def primary_cation_is_impossible(situation: Situation) -> bool:
    """A primary carbon without a neighbour that helps does not ionise.

    Allyl, benzyl, propargyl and donors on the carbon stabilise the cation; a branched neighbour (isobutyl, neopentyl,
    cyclopropylmethyl) lets a shift go with the ionisation. Silver, acid or nitrogen as leaving group lift the gate.
    """
    if situation.site.degree is not Degree.PRIMARY or situation.is_activated:
        return False
    helped = ("allylic", "benzylic", "propargylic", "neopentyl", "beta-branched", "cyclopropylmethyl")
    shifting = any(beta.branches >= 2 for beta in situation.site.beta)
    in_ring = situation.site.leaving_ring_size is not None
    nitrogen = situation.site.leaving_group == "diazonium"
    return not (situation.is_any(*helped) or _has_donor(situation) or shifting or in_ring or nitrogen)


@gate(
    id="sn1-closed-unsaturated",
    title="No aryl, vinyl or alkynyl cation",
    closes=_IONISING,
    source="march-2013",
    fires_on=("Clc1ccccc1", "CC=CBr"),
    silent_on=("N#[N+]c1ccccc1", "C=CCBr"),
)
def unsaturated_cation_is_impossible(situation: Situation) -> bool:
    """An sp2 or sp carbon does not ionise under the conditions of this book.

    The empty orbital would lie in the plane, out of reach of the π system. Nitrogen leaves an aryl cation behind;
    vinyl triflates with strong donors are outside the scope.
    """
    planar = situation.site.hybridisation is not Hybridisation.SP3
    return planar and not situation.site.is_addition and situation.site.leaving_group != "diazonium"


@gate(
    id="sn2-closed-bridgehead",
    title="No backside attack at a bridgehead",
    closes=(Mechanism.SN2,),
    source="march-2013",
    fires_on=("BrC12CC3CC(CC(C3)C1)C2", "ClC12CCC(CC1)C2"),
    silent_on=("BrC1CC2CCC1C2",),
)
def bridgehead_is_shielded(situation: Situation) -> bool:
    """The back of a bridgehead carbon lies inside the cage, and the carbon cannot invert.

    A leaving group beside the bridgehead is another matter.
    """
    return situation.site.is_bridgehead


@gate(
    id="sn2-closed-tertiary",
    title="No backside attack at a plain tertiary carbon",
    closes=(Mechanism.SN2,),
    source="march-2013",
    fires_on=("CC(C)(C)Br", "CC1(Cl)CCCCC1"),
    silent_on=("CBr", "CC(C)Br", "CC1(C)CO1", "CC(C)(Br)C(C)=O"),
)
def tertiary_carbon_is_shielded(situation: Situation) -> bool:
    """Three substituents block backside attack on the carbon that bears the leaving group.

    Ionisation (SN1, E1) and E2 elimination are untouched. A strained ring that opens, or an acceptor (carbonyl,
    nitrile, alkyne) on the carbon, lifts the gate.
    """
    accepting = situation.is_any("alpha-carbonyl", "alpha-nitrile", "propargylic", "alpha-nitro")
    return situation.site.degree is Degree.TERTIARY and not accepting and not situation.is_strained


@gate(
    id="sn2-closed-unsaturated",
    title="No backside attack at an sp2 or sp carbon",
    closes=(Mechanism.SN2,),
    source="march-2013",
    fires_on=("Clc1ccccc1", "CC=CBr", "CC#CBr", "CC(=O)Cl"),
    silent_on=("C=CCBr", "ClCc1ccccc1", "BrCC#C"),
)
def unsaturated_carbon_is_shielded(situation: Situation) -> bool:
    """The back of an aryl, vinyl, alkynyl or acyl carbon is shielded by the rest of the molecule.

    Substitution there goes by addition and loss, which is outside the scope of this book.
    """
    return situation.site.hybridisation is not Hybridisation.SP3 and not situation.site.is_addition


SUBSTITUTION_GATES = (
    leaving_group_stays,
    bridgehead_cation_is_impossible,
    methyl_cation_is_impossible,
    primary_cation_is_impossible,
    unsaturated_cation_is_impossible,
    bridgehead_is_shielded,
    tertiary_carbon_is_shielded,
    unsaturated_carbon_is_shielded,
)


def _has_donor(situation: Situation) -> bool:
    return situation.is_any("alpha-alkoxy", "alpha-amino", "alpha-thio", "alpha-amido")
