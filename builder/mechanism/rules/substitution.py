"""Gates of substitution and of ionisation."""

from builder.chemistry.patterns import Electrons
from builder.chemistry.perception import Activation, Degree, Hybridisation, Nucleophile, neighbouring_groups
from builder.mechanism.rules.gate import Situation, gate
from builder.records.vocabulary import Mechanism

__all__ = ["SUBSTITUTION_GATES"]

_IONISING = (Mechanism.SN1, Mechanism.E1)
_FROM_BEHIND = (Mechanism.SN2, Mechanism.NGP)


@gate(
    id="fluoride-stays",
    title="Fluoride stays in substitution",
    closes=(Mechanism.SN2, Mechanism.SN2_PRIME, Mechanism.SN1, Mechanism.E1, Mechanism.NGP),
    source="march-2013",
    fires_on=("CCCCF", "CC(C)(C)F"),
    silent_on=("CCCCBr", "CCCCO"),
)
def fluoride_stays(situation: Situation) -> bool:
    """The bond to fluorine holds it against nucleophiles and ionising solvents.

    Acid, a silylium ion or a Lewis acid takes it away. A strong base still gives the alkene when heated: E2 stays open.
    """
    return situation.leaving_group == "fluoride" and not situation.group_leaves


@gate(
    id="leaving-group-stays",
    title="A leaving group that stays put",
    closes=(Mechanism.SN2, Mechanism.SN2_PRIME, Mechanism.SN1, Mechanism.E2, Mechanism.E1, Mechanism.NGP),
    source="march-2013",
    fires_on=("CCCCO", "CCOCC", "CCCC#N", "CCCCN"),
    silent_on=("CCCCBr", "CCCCF", "CC1CO1", "CCCC[OH2+]", "COC(=O)c1ccccc1"),
)
def leaving_group_stays(situation: Situation) -> bool:
    """Hydroxide, alkoxide and amide are too basic to leave.

    Cyanide, nitro and azide stay although their acids are stronger: the bond to carbon holds them. Fluoride has a rule
    of its own.
    Protonation, a sulfonyl chloride, a phosphorus reagent or the strain of a small ring helps oxygen and fluoride.
    Acid does not help cyanide, nitro, a sulfone, an amine, a sulfide, a thiol or phosphonium; an amine leaves once it
    is diazotised or quaternised, a sulfide once it is alkylated. E1cB stays open. Esters pass: a carboxylate leaves
    when iodide or thiolate takes the alkyl group, or when that ionises; so do aryl methyl ethers, which thiolates
    demethylate.
    """
    dealkylated = situation.leaving_group == "phenoxide" and situation.site.degree is Degree.METHYL
    passed = dealkylated or situation.leaving_group in {"carboxylate", "fluoride"}
    return not situation.group_leaves and not passed


@gate(
    id="ngp-without-neighbour",
    title="No neighbouring group that can reach the carbon",
    closes=(Mechanism.NGP,),
    source="iupac-gold",
    fires_on=("CCCCBr", "C=CCBr", "BrCC(=O)c1ccccc1", "C1COC1", "CC(C)OS(=O)(=O)c1ccc(C)cc1", "C#CCCl"),
    silent_on=("OCCBr", "CSCCCl", "BrCCc1ccccc1", "CC(=O)OCCBr", "C=CCCOS(C)(=O)=O", "CC(Br)C(=O)[O-]"),
)
def neighbour_is_lacking(situation: Situation) -> bool:
    """Nothing in the molecule can reach the carbon from behind.

    Lone pairs, carbanions, π bonds and aryl rings count, at any distance that closes a ring. Participation of C–C and
    C–H σ bonds is counted as SN1, and the leaving group does not help itself.
    """
    distances = situation.distances()
    return not any(_reaches(situation, n, distances.get(n.atom, 0)) for n in neighbouring_groups(situation.structure))


@gate(
    id="sn1-closed-bridgehead",
    title="No cation at the bridgehead of a small bicycle",
    closes=_IONISING,
    source="march-2013",
    fires_on=("ClC12CCC(CC1)C2", "BrC12c3ccccc3C(c3ccccc31)c1ccccc12", "BrC12C3C4C1C1C2C3C41"),
    silent_on=("BrC12CC3CC(CC(C3)C1)C2", "CC1(Cl)CC2CCC1C2", "ClC12CCCC(CC1)C2"),
)
def bridgehead_cation_is_impossible(situation: Situation) -> bool:
    """A bridgehead carbon of a small bicycle cannot become planar, so it does not ionise.

    Small means a bicycle whose rings through this carbon have at most five atoms; larger ones ionise, slowly at
    first. 1-Triptycyl stays shut in spite of its size: its three aryl groups only draw electrons, for their π systems
    stand across the empty orbital.
    """
    largest = max(situation.site.ring_sizes, default=9)
    return situation.site.is_bridgehead and (largest <= 5 or situation.is_any("benzylic"))


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
    fires_on=("CCCCBr", "CCCCOS(C)(=O)=O", "FC(F)(F)COS(C)(=O)=O", "C1COC1"),
    silent_on=("C=CCBr", "ClCc1ccccc1", "CC(C)(C)CBr", "COCCl", "BrCC1CC1", "CC(C)CBr"),
)
def primary_cation_is_impossible(situation: Situation) -> bool:
    """A primary carbon without a neighbour that helps does not ionise.

    Allyl, benzyl, propargyl and donors on the carbon stabilise the cation; a neighbour with two more carbons
    (isobutyl, neopentyl, cyclopropylmethyl) lets a shift go with the ionisation. Silver, a Lewis acid on a halide, or
    nitrogen as leaving group lift the gate; a protonated primary alcohol reacts by SN2.
    """
    if situation.site.degree is not Degree.PRIMARY or situation.is_helped_by(Activation.SILVER):
        return False
    stabilised = situation.is_any("allylic", "benzylic", "propargylic") or _has_donor(situation)
    return not (stabilised or situation.can_shift or situation.leaving_group == "diazonium")


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

    The empty orbital would lie in the plane, out of reach of the π system. Only dinitrogen leaves an aryl cation
    behind. Alkenyliodonium salts and α-aryl or α-cyclopropyl vinyl triflates do ionise: accept with evidence.
    """
    planar = situation.site.hybridisation is not Hybridisation.SP3
    return planar and not situation.site.is_addition and situation.leaving_group != "diazonium"


@gate(
    id="sn2-closed-bridgehead",
    title="No backside attack at a bridgehead",
    closes=_FROM_BEHIND,
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
    id="sn2-closed-cyclopropyl",
    title="No backside attack at a cyclopropyl carbon",
    closes=(Mechanism.SN2,),
    source="march-2013",
    fires_on=("BrC1CC1", "CC1(Cl)CC1"),
    silent_on=("BrCC1CC1", "CC1CO1", "BrC1CCC1"),
)
def cyclopropyl_carbon_is_held(situation: Situation) -> bool:
    """A cyclopropyl carbon cannot widen its angle to 120°; it ionises with ring opening to allyl instead.

    A three-membered ring that holds the leaving group, such as an epoxide, opens and is another matter.
    """
    return situation.site.hybridisation is Hybridisation.SP3 and 3 in situation.site.ring_sizes


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
    nitrile, alkyne) on the carbon, lifts the gate. Of an epoxide, base opens at the other carbon, acid is called SN1.
    """
    accepting = situation.is_any("alpha-carbonyl", "alpha-nitrile", "propargylic", "alpha-nitro")
    return situation.site.degree is Degree.TERTIARY and not accepting and not situation.is_strained


@gate(
    id="sn2-closed-trihalomethyl",
    title="No backside attack at a carbon with three halogens",
    closes=(Mechanism.SN2,),
    source="march-2013",
    fires_on=("ClC(Cl)Cl", "ClC(Cl)(Cl)Cl"),
    silent_on=("ClCCl", "ClC(Cl)c1ccccc1", "OCC(F)(F)F"),
)
def trihalomethyl_carbon_is_shielded(situation: Situation) -> bool:
    """Three halogens shield the carbon with their lone pairs and hold the leaving group fast.

    Chloroform gives a carbene with base, tetrachloromethane a halogen to soft nucleophiles, and benzotrichloride
    ionises.
    """
    return situation.halogens >= 3


@gate(
    id="sn2-closed-unsaturated",
    title="No backside attack at an sp2 or sp carbon",
    closes=_FROM_BEHIND,
    source="march-2013",
    fires_on=("Clc1ccccc1", "CC=CBr", "CC#CBr", "CC(=O)Cl"),
    silent_on=("C=CCBr", "ClCc1ccccc1", "BrCC#C"),
)
def unsaturated_carbon_is_shielded(situation: Situation) -> bool:
    """The back of an aryl, vinyl or alkynyl carbon lies in the ring or along the multiple bond.

    An acyl carbon is attacked at the π* orbital. Substitution there goes by addition and loss, outside this book.
    """
    return situation.site.hybridisation is not Hybridisation.SP3 and not situation.site.is_addition


@gate(
    id="sn2prime-without-multiple-bond",
    title="No allylic shift without a multiple bond",
    closes=(Mechanism.SN2_PRIME,),
    source="iupac-gold",
    fires_on=("CCCCBr", "ClCc1ccccc1", "BrCC#N"),
    silent_on=("C=CCBr", "C#CCBr", "C=CC1CO1", "C=C=CBr"),
)
def allylic_shift_has_no_multiple_bond(situation: Situation) -> bool:
    """An allylic shift needs a double or triple bond next to the carbon that bears the leaving group.

    A benzene ring does not serve: the shift would cost its aromaticity.
    """
    return not situation.has_multiple_bond_beside


SUBSTITUTION_GATES = (
    fluoride_stays,
    leaving_group_stays,
    neighbour_is_lacking,
    bridgehead_cation_is_impossible,
    methyl_cation_is_impossible,
    primary_cation_is_impossible,
    unsaturated_cation_is_impossible,
    bridgehead_is_shielded,
    cyclopropyl_carbon_is_held,
    tertiary_carbon_is_shielded,
    trihalomethyl_carbon_is_shielded,
    unsaturated_carbon_is_shielded,
    allylic_shift_has_no_multiple_bond,
)


def _has_donor(situation: Situation) -> bool:
    return situation.is_any("alpha-alkoxy", "alpha-amino", "alpha-thio", "alpha-amido")


def _reaches(situation: Situation, neighbour: Nucleophile, distance: int) -> bool:
    """Say whether a group closes a ring on the back of the carbon.

    Nothing does across an sp carbon next to it. A lone pair does at any distance from two bonds on, so that α-lactones
    count; a π bond, or an oxygen that needs one to shift, closes no four-membered ring and no ring with an sp2 carbon
    next to the alpha carbon.
    """
    if distance < 2 or neighbour.atom == situation.site.leaving_atom:
        return False
    around = {atom for atom, _ in situation.structure.atoms[neighbour.atom].neighbours}
    beside = {beta.hybridisation for beta in situation.site.beta if beta.atom in around}
    if neighbour.electrons in {Electrons.PI_BOND, Electrons.SHIFT}:
        return distance != 3 and beside <= {"sp3"}
    return "sp" not in beside
