"""What generated records are made of: skeletons, leaving groups, and the methods that take one off the other.

Every product is a string frame: a skeleton ends at its reacting carbon, so that a group or a fragment is written
behind it and nothing need be worked out. Common laboratory chemistry, from memory; none of it was run.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from itertools import product

__all__ = ["METHODS", "Flask", "LeavingGroup", "Method", "Named", "Skeleton", "Substance", "skeletons"]


# --- what bears the leaving group ---------------------------------------------------------------------------


@dataclass(frozen=True)
class Named:
    """A compound, or a piece of one, with its name."""

    name: str
    smiles: str


@dataclass(frozen=True)
class Skeleton:
    """An alkyl group: its SMILES ends at the reacting carbon, so that whatever it bears is written behind it.

    inverted: the same with the configuration of the reacting carbon turned over, and its name; None without one.
    alkenes: what is left when it loses HX, the main one first.
    """

    kind: str
    name: str
    smiles: str
    classes: tuple[str, ...]
    stereo: str = "achiral"
    inverted: Named | None = None
    alkenes: tuple[Named, ...] = ()


_STEMS = {
    4: "but",
    5: "pent",
    6: "hex",
    7: "hept",
    8: "oct",
    9: "non",
    10: "dec",
    11: "undec",
    12: "dodec",
    13: "tridec",
}
_ALKYLS = {n: f"{stem}yl" for n, stem in _STEMS.items()}
# Substituents of a ring, and the ring written so that its side chain follows.
_RINGS = (
    Named("", "c1ccc(cc1)"),
    Named("4-methyl", "Cc1ccc(cc1)"),
    Named("3-methyl", "Cc1cccc(c1)"),
    Named("2-methyl", "Cc1ccccc1"),
    Named("4-ethyl", "CCc1ccc(cc1)"),
    Named("4-isopropyl", "CC(C)c1ccc(cc1)"),
    Named("4-tert-butyl", "CC(C)(C)c1ccc(cc1)"),
    Named("3-methoxy", "COc1cccc(c1)"),
    Named("4-fluoro", "Fc1ccc(cc1)"),
    Named("3-fluoro", "Fc1cccc(c1)"),
    Named("2-fluoro", "Fc1ccccc1"),
    Named("4-chloro", "Clc1ccc(cc1)"),
    Named("3-chloro", "Clc1cccc(c1)"),
    Named("4-trifluoromethyl", "FC(F)(F)c1ccc(cc1)"),
    Named("3-trifluoromethyl", "FC(F)(F)c1cccc(c1)"),
    Named("4-phenyl", "c1ccc(cc1)c1ccc(cc1)"),
)
_DONOR_RINGS = (
    Named("4-methoxy", "COc1ccc(cc1)"),
    Named("2-methoxy", "COc1ccccc1"),
    Named("3,4-dimethoxy", "COc1ccc(cc1OC)"),
    Named("4-ethoxy", "CCOc1ccc(cc1)"),
)
_POOR_RINGS = (Named("4-cyano", "N#Cc1ccc(cc1)"), Named("4-nitro", "[O-][N+](=O)c1ccc(cc1)"))


def _phenyl(ring: Named) -> str:
    return f"({ring.name}phenyl)" if ring.name else "phenyl"


@cache
def skeletons() -> tuple[Skeleton, ...]:
    """Return every skeleton."""
    return (*_open_chains(), *_rings_on_chains(), *_activated(), *_ionising(), *_blocked())


def _open_chains() -> Iterator[Skeleton]:
    for n, name in _ALKYLS.items():
        alkene = Named(f"{_STEMS[n]}-1-ene", f"{'C' * (n - 2)}C=C")
        yield Skeleton("primary", name, "C" * n, ("primary",), alkenes=(alkene,))
    for n in range(6, 14):
        stem, chain = _STEMS[n], "C" * (n - 2)
        alkenes = (
            Named(f"(E)-{stem}-2-ene", f"C/C=C/{chain[:-1]}"),
            Named(f"(Z)-{stem}-2-ene", f"C/C=C\\{chain[:-1]}"),
            Named(f"{stem}-1-ene", f"{chain}C=C"),
        )
        yield from _three_forms(f"{stem}an-2-yl", chain, "C", ("secondary",), alkenes)
    for name, smiles in (("cyclopentyl", "C1CCCC1"), ("cyclohexyl", "C1CCCCC1"), ("cycloheptyl", "C1CCCCCC1")):
        alkene = Named(name.replace("yl", "ene"), smiles.replace("CC", "C=C", 1))
        yield Skeleton("ring", name, smiles, ("secondary",), alkenes=(alkene,))
        yield Skeleton("beta-branched", f"{name}methyl", f"{smiles}C", ("primary",))
        yield Skeleton("primary", f"2-{name}ethyl", f"{smiles}CC", ("primary",))
    yield Skeleton("primary", "3-methylbutyl", "CC(C)CC", ("primary",))
    yield Skeleton("primary", "4-methylpentyl", "CC(C)CCC", ("primary",))
    yield Skeleton("beta-branched", "2-ethylhexyl", "CCCCC(CC)C", ("primary",), stereo="racemate")
    for n in range(4, 9):
        yield Skeleton("primary", f"{n}-ethoxy-{n}-oxo{_ALKYLS[n]}", f"CCOC(=O){'C' * (n - 1)}", ("primary",))
        yield Skeleton("primary", f"{n}-cyano{_ALKYLS[n]}", f"N#C{'C' * n}", ("primary",))


def _three_forms(
    name: str, chain: str, other: str, classes: tuple[str, ...], alkenes: tuple[Named, ...]
) -> Iterator[Skeleton]:
    """Yield the racemate and both enantiomers of chain–CH(other)–X, where X outranks chain, and chain the other."""
    s, r = f"{chain}[C@H]({other})", f"{chain}[C@@H]({other})"
    yield Skeleton("secondary", name, f"{chain}C({other})", classes, "racemate", alkenes=alkenes)
    one = "single enantiomer"
    yield Skeleton("secondary", f"(S)-{name}", s, classes, one, Named(f"(R)-{name}", r), alkenes)
    yield Skeleton("secondary", f"(R)-{name}", r, classes, one, Named(f"(S)-{name}", s), alkenes)


def _rings_on_chains() -> Iterator[Skeleton]:
    chains = ((2, "ethyl"), (3, "propyl"), (4, "butyl"))
    for ring, (n, chain) in product((*_RINGS, *_DONOR_RINGS, *_POOR_RINGS), chains):
        if n == 2:
            styrene = Named(f"{ring.name}styrene", f"{ring.smiles}C=C")
            yield Skeleton(
                "aryl-ethyl", f"2-{_phenyl(ring)}ethyl", f"{ring.smiles}CC", ("primary",), alkenes=(styrene,)
            )
        else:
            yield Skeleton("primary", f"{n}-{_phenyl(ring)}{chain}", f"{ring.smiles}{'C' * n}", ("primary",))
            oxy = f"{n}-({ring.name}phenoxy){chain}" if ring.name else f"{n}-phenoxy{chain}"
            yield Skeleton("primary", oxy, f"{ring.smiles}O{'C' * n}", ("primary",))
    for ring in _RINGS:
        alkenes = (
            Named(f"(E)-4-{_phenyl(ring)}but-2-ene", f"{ring.smiles}C/C=C/C"),
            Named(f"(Z)-4-{_phenyl(ring)}but-2-ene", f"{ring.smiles}C/C=C\\C"),
            Named(f"4-{_phenyl(ring)}but-1-ene", f"{ring.smiles}CCC=C"),
        )
        yield from _three_forms(f"4-{_phenyl(ring)}butan-2-yl", f"{ring.smiles}CC", "C", ("secondary",), alkenes)


def _activated() -> Iterator[Skeleton]:
    for ring in (*_RINGS, *_POOR_RINGS):
        yield Skeleton("benzyl", f"{ring.name}benzyl", f"{ring.smiles}C", ("primary", "benzylic"))
        cinnamyl = f"(E)-3-{_phenyl(ring)}prop-2-en-1-yl"
        yield Skeleton("allyl", cinnamyl, f"{ring.smiles}/C=C/C", ("primary", "allylic"))
        phenacyl = f"2-oxo-2-{_phenyl(ring)}ethyl"
        yield Skeleton("phenacyl", phenacyl, f"{ring.smiles}C(=O)C", ("primary", "alpha-carbonyl"))
    for n in range(1, 8):
        name = f"{_STEMS.get(n + 3, '')}-2-yn-1-yl"
        yield Skeleton("allyl", name, f"{'C' * n}C#CC", ("primary", "propargylic"))


def _ionising() -> Iterator[Skeleton]:
    for n in range(5, 12):
        stem, chain = _STEMS[n], "C" * (n - 2)
        alkenes = (
            Named(f"2-methyl{stem}-2-ene", f"{chain[:-1]}C=C(C)C"),
            Named(f"2-methyl{stem}-1-ene", f"{chain}C(C)=C"),
        )
        yield Skeleton("tertiary", f"2-methyl{stem}an-2-yl", f"{chain}C(C)(C)", ("tertiary",), alkenes=alkenes)
    for ring in (*_RINGS, *_POOR_RINGS):
        alkene = Named(f"2-{_phenyl(ring)}propene", f"{ring.smiles}C(C)=C")
        name = f"2-{_phenyl(ring)}propan-2-yl"
        yield Skeleton("cumyl", name, f"{ring.smiles}C(C)(C)", ("tertiary", "benzylic"), alkenes=(alkene,))
        name = f"phenyl{_phenyl(ring)}methyl" if ring.name else "diphenylmethyl"
        stereo = "racemate" if ring.name else "achiral"
        yield Skeleton("benzhydryl", name, f"{ring.smiles}C(c1ccccc1)", ("secondary", "benzylic"), stereo)


def _blocked() -> Iterator[Skeleton]:
    for n in range(1, 8):
        name = "neopentyl" if n == 1 else f"2,2-dimethyl{_ALKYLS[n + 2]}" if n > 1 else ""
        yield Skeleton("blocked", name, f"{'C' * n}C(C)(C)C", ("primary", "neopentyl"))
    for ring in (*_RINGS, *_DONOR_RINGS):
        yield Skeleton("blocked", f"{ring.name}phenyl", ring.smiles, ("aryl",))


@dataclass(frozen=True)
class LeavingGroup:
    """A leaving group: its word, as in "octyl bromide", and its SMILES."""

    word: str
    smiles: str


CHLORIDE, BROMIDE, IODIDE = LeavingGroup("chloride", "Cl"), LeavingGroup("bromide", "Br"), LeavingGroup("iodide", "I")
TOSYLATE = LeavingGroup("tosylate", "OS(=O)(=O)c1ccc(C)cc1")
MESYLATE = LeavingGroup("mesylate", "OS(C)(=O)=O")
# --- how it is taken off ------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Substance:
    """Something charged, with its equivalents; its use where it is neither nucleophile nor base."""

    name: str
    smiles: str
    equivalents: float
    use: str = ""


@dataclass(frozen=True)
class Flask:
    """Solvents with their per cent by volume, and the temperatures in °C it is run at, each with its hours."""

    solvents: tuple[tuple[str, int], ...]
    runs: tuple[tuple[int, int], ...]


@dataclass(frozen=True)
class Method:
    """A way to turn a skeleton with a leaving group into a product.

    word: what it gives, for titles and folders. on: which leaving groups it is used on, by the kind of skeleton.
    fragment: SMILES of what stands in place of the group, and title, the name of the product with {} for the
    skeleton; both empty for an elimination. reagent: nucleophile or, in an elimination, base; None in a solvolysis.
    yields, alkene: least and most per cent of product and, where the skeleton can lose HX, of alkene.
    """

    word: str
    mechanism: str
    on: dict[str, tuple[LeavingGroup, ...]]
    flasks: tuple[Flask, ...]
    fragment: str = ""
    title: str = ""
    reagent: Substance | None = None
    helper: Substance | None = None
    yields: tuple[int, int] = (72, 93)
    alkene: tuple[int, int] = (1, 3)
    quench: str = "60 mL water, extract with 3 × 20 mL ethyl acetate"
    waste: str = ""
    scope: str = ""
    share: int = 1


def _in(solvent: str, *runs: tuple[int, int]) -> Flask:
    return Flask(((solvent, 100),), runs)


_HALIDES, _SULFONATES = (BROMIDE, IODIDE), (TOSYLATE, MESYLATE)
_PRIMARY = {
    "primary": (*_HALIDES, *_SULFONATES),
    "aryl-ethyl": (*_HALIDES, *_SULFONATES),
    "benzyl": (CHLORIDE, BROMIDE),
    "allyl": (CHLORIDE, BROMIDE),
}
_BRANCHED = {"beta-branched": _HALIDES}
_SECONDARY = {"secondary": _SULFONATES}
_PHENACYL = {"phenacyl": (CHLORIDE, BROMIDE)}
_POTASSIUM_CARBONATE = Substance("potassium carbonate", "[K+].[K+].[O-]C([O-])=O", 1.5)


def _phenoxide(ring: str, smiles: str) -> Method:
    name = f"{ring}phenol"
    return Method(
        word="aryl ether",
        mechanism="SN2",
        on=_PRIMARY | _PHENACYL,
        flasks=(_in("acetonitrile", (70, 16), (80, 12)), _in("DMF", (60, 12), (80, 6)), _in("2-butanone", (79, 20))),
        fragment=smiles,
        title=f"{{}} {ring}phenyl ether",
        reagent=Substance(name, smiles, 1.2),
        helper=_POTASSIUM_CARBONATE,
        quench="60 mL water, extract with 3 × 20 mL tert-butyl methyl ether, wash with 20 mL 1 mol/L sodium hydroxide",
    )


def _amine(name: str, smiles: str, stem: str) -> Method:
    return Method(
        word="amine",
        mechanism="SN2",
        on=_PRIMARY | _BRANCHED,
        flasks=(_in("acetonitrile", (60, 16), (80, 10)), _in("DMF", (50, 12), (70, 6)), _in("ethanol", (78, 16))),
        fragment=smiles,
        title=f"{stem}-{{}}",
        reagent=Substance(name, smiles, 2.5),
        quench="40 mL 5 % sodium carbonate, extract with 3 × 20 mL ethyl acetate",
    )


METHODS: tuple[Method, ...] = (
    Method(
        word="azide",
        mechanism="SN2",
        on=_PRIMARY | _BRANCHED | _SECONDARY,
        flasks=(_in("DMF", (50, 16), (60, 16), (80, 8)), _in("DMSO", (40, 20), (60, 12))),
        fragment="N=[N+]=[N-]",
        title="{} azide",
        reagent=Substance("sodium azide", "[Na+].[N-]=[N+]=[N-]", 1.5),
        alkene=(1, 6),
        quench="60 mL water, kept above pH 9, extract with 3 × 20 mL tert-butyl methyl ether",
        waste="aqueous azide layer kept basic and apart, plastic tools, no chlorinated solvent",
        scope="azide at {} mmol, basic quench, no chlorinated solvent",
        share=5,
    ),
    Method(
        word="cyanide",
        mechanism="SN2",
        on={kind: _PRIMARY[kind] for kind in ("primary", "benzyl")},
        flasks=(_in("DMSO", (40, 16), (60, 8)), Flask((("ethanol", 80), ("water", 20)), ((78, 24),))),
        fragment="C#N",
        title="{} cyanide",
        reagent=Substance("sodium cyanide", "[Na+].[C-]#N", 1.3),
        quench="80 mL water with 2 mL 2 mol/L sodium hydroxide, above pH 11, extract with 3 × 20 mL ethyl acetate",
        waste="cyanide water kept above pH 11, labelled and apart, to the contractor",
        scope="cyanide at {} mmol, two people, detector, alkaline quench",
        share=2,
    ),
    Method(
        word="thiocyanate",
        mechanism="SN2",
        on=_PRIMARY | _SECONDARY,
        flasks=(_in("acetonitrile", (60, 20), (80, 12)), _in("DMF", (50, 16), (70, 10))),
        fragment="SC#N",
        title="{} thiocyanate",
        reagent=Substance("potassium thiocyanate", "[K+].[S-]C#N", 1.5),
        share=2,
    ),
    Method(
        word="iodide",
        mechanism="SN2",
        on={"primary": (CHLORIDE, BROMIDE, *_SULFONATES), "aryl-ethyl": (BROMIDE, *_SULFONATES)},
        flasks=(_in("acetone", (56, 24)), _in("2-butanone", (79, 24))),
        fragment="I",
        title="{} iodide",
        reagent=Substance("sodium iodide", "[Na+].[I-]", 2.0),
        quench="60 mL water with 1 g sodium thiosulfate, extract with 3 × 20 mL n-heptane",
        share=5,
    ),
    Method(
        word="acetate",
        mechanism="SN2",
        on=_PRIMARY | _BRANCHED | _SECONDARY | _PHENACYL,
        flasks=(_in("DMF", (70, 12), (80, 8)), _in("DMSO", (60, 12))),
        fragment="OC(C)=O",
        title="{} acetate",
        reagent=Substance("potassium acetate", "[K+].CC([O-])=O", 1.8),
        alkene=(1, 4),
        share=2,
    ),
    Method(
        word="benzoate",
        mechanism="SN2",
        on=_PRIMARY | _PHENACYL,
        flasks=(_in("DMF", (60, 12), (80, 6)), _in("DMSO", (50, 12))),
        fragment="OC(=O)c1ccccc1",
        title="{} benzoate",
        reagent=Substance("sodium benzoate", "[Na+].[O-]C(=O)c1ccccc1", 1.4),
        share=2,
    ),
    Method(
        word="thioacetate",
        mechanism="SN2",
        on=_PRIMARY | _BRANCHED | _SECONDARY | _PHENACYL,
        flasks=(_in("DMF", (25, 16), (40, 6)), _in("acetone", (40, 16), (56, 8))),
        fragment="SC(C)=O",
        title="{} thioacetate",
        reagent=Substance("potassium thioacetate", "[K+].CC([S-])=O", 1.4),
        share=3,
    ),
    Method(
        word="sulfide",
        mechanism="SN2",
        on=_PRIMARY | _BRANCHED | _SECONDARY | {"ring": (BROMIDE, TOSYLATE)},
        flasks=(_in("ethanol", (25, 12), (50, 6)), _in("DMF", (25, 4), (40, 2)), _in("THF", (40, 16), (60, 8))),
        fragment="Sc1ccccc1",
        title="{} phenyl sulfide",
        reagent=Substance("sodium thiophenoxide", "[Na+].[S-]c1ccccc1", 1.2),
        waste="water layer stirred with bleach against the stench before it goes to the waste",
        share=3,
    ),
    Method(
        word="imide",
        mechanism="SN2",
        on=_PRIMARY | _BRANCHED,
        flasks=(_in("DMF", (60, 16), (80, 6)), _in("DMSO", (50, 12))),
        fragment="N1C(=O)c2ccccc2C1=O",
        title="N-({})phthalimide",
        reagent=Substance("potassium phthalimide", "[K+].O=C1[N-]C(=O)c2ccccc12", 1.2),
        share=3,
    ),
    Method(
        word="sulfone",
        mechanism="SN2",
        on=_PRIMARY,
        flasks=(_in("DMF", (50, 16), (70, 8)),),
        fragment="S(=O)(=O)c1ccccc1",
        title="{} phenyl sulfone",
        reagent=Substance("sodium benzenesulfinate", "[Na+].[O-]S(=O)c1ccccc1", 1.3),
        yields=(62, 84),
    ),
    Method(
        word="bromide",
        mechanism="SN2",
        on={"primary": _SULFONATES, "aryl-ethyl": _SULFONATES},
        flasks=(_in("acetone", (50, 20), (56, 16)), _in("DMF", (50, 6))),
        fragment="Br",
        title="{} bromide",
        reagent=Substance("lithium bromide", "[Li+].[Br-]", 2.0),
        share=2,
    ),
    Method(
        word="methyl ether",
        mechanism="SN2",
        on={"primary": _HALIDES, "benzyl": (CHLORIDE, BROMIDE)},
        flasks=(_in("methanol", (50, 16), (64, 8)),),
        fragment="OC",
        title="{} methyl ether",
        reagent=Substance("sodium methoxide", "[Na+].C[O-]", 2.0),
        alkene=(2, 8),
        share=2,
    ),
    _phenoxide("", "Oc1ccccc1"),
    _phenoxide("4-methoxy", "Oc1ccc(OC)cc1"),
    _phenoxide("4-methyl", "Oc1ccc(C)cc1"),
    _phenoxide("4-chloro", "Oc1ccc(Cl)cc1"),
    _phenoxide("4-tert-butyl", "Oc1ccc(C(C)(C)C)cc1"),
    _amine("morpholine", "N1CCOCC1", "4"),
    _amine("piperidine", "N1CCCCC1", "1"),
    _amine("pyrrolidine", "N1CCCC1", "1"),
    Method(
        word="alkene",
        mechanism="E2",
        on={
            "aryl-ethyl": (*_HALIDES, *_SULFONATES),
            "secondary": (BROMIDE, TOSYLATE),
            "ring": (BROMIDE, TOSYLATE),
            "tertiary": (CHLORIDE, BROMIDE),
        },
        flasks=(_in("THF", (25, 12), (50, 4)), _in("DMSO", (25, 4)), _in("tert-butanol", (60, 12), (75, 5))),
        reagent=Substance("potassium tert-butoxide", "[K+].CC(C)(C)[O-]", 1.8),
        yields=(70, 90),
        quench="60 mL water below 20 °C, extract with 2 × 25 mL n-pentane",
        share=6,
    ),
    Method(
        word="solvolysis",
        mechanism="SN1",
        on={"tertiary": (CHLORIDE, BROMIDE), "cumyl": (CHLORIDE,), "benzhydryl": (CHLORIDE, BROMIDE)},
        flasks=(_in("methanol", (25, 24), (40, 16), (60, 8)),),
        fragment="OC",
        title="{} methyl ether",
        helper=Substance("2,6-lutidine", "Cc1cccc(C)n1", 1.3, use="buffer"),
        yields=(60, 80),
        alkene=(5, 15),
        share=5,
    ),
    Method(
        word="no reaction",
        mechanism="none",
        on={"blocked": (CHLORIDE, BROMIDE)},
        flasks=(_in("ethanol", (40, 24), (60, 24)), _in("methanol", (40, 24), (60, 20))),
        fragment="SC#N",
        title="{} thiocyanate",
        reagent=Substance("potassium thiocyanate", "[K+].[S-]C#N", 1.5),
        share=2,
    ),
)
