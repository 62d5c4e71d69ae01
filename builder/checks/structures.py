"""Declared against perceived: structures, salts, stereo, classes, leaving groups."""

from collections.abc import Iterator
from difflib import get_close_matches

from builder.checks.case import Case, compounds_of
from builder.chemistry.perception import (
    NO_LEAVING_GROUP,
    expected_class_names,
    leaving_group_names,
    leaving_groups,
    site_class_names,
)
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.amounts import charged_rows
from builder.mechanism.reaction import groups_formed
from builder.records.model import Formed, Product, Substrate
from builder.records.vocabulary import StereoKind
from builder.rule import Fault, Path, rule

__all__ = ["STRUCTURE_CHECKS"]


def _substrate(smiles: str, classes: str = "secondary", group: str = "bromide", more: str = "") -> str:
    return (
        f"substrate: {{name: the substrate, smiles: '{smiles}', class: {classes}, leaving_group: {group},"
        f" amount: 10 mmol{more}}}\nstages: [{{temperature: 60 °C, time: 16 h}}]\n"
        "outcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate}]}"
    )


@rule(
    id="rxn-file-unusable",
    title="An RXN file that cannot be used",
    source="ctfile",
    fires_on=(f"rxn_file: {{path: scheme.rxn, sha256: {'f' * 64}}}",),
    silent_on=("notebook: BK2/112",),
)
def rxn_file_is_unusable(case: Case) -> Iterator[Fault]:
    """The RXN file that a record names lies beside it, has the SHA-256 that is given, and can be read.

    It is never looked for outside the book, and its hash keeps a changed drawing from changing an entry unseen.
    """
    if case.rxn_fault is not None:
        at = ("rxn_file", "path") if case.record.rxn_file is not None else ()
        yield Fault(at=at, message=case.rxn_fault.reason, mend=case.rxn_fault.mend)


@rule(
    id="structure-unreadable",
    title="A structure that cannot be read",
    source="opensmiles",
    needs=("rxn-file-unusable",),
    fires_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-', equivalents: 1.5}",
        "nucleophile: {name: sodium azide, smiles: 'C1CC', equivalents: 1.5}",
    ),
    silent_on=("nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.5}",),
)
def structure_is_unreadable(case: Case) -> Iterator[Fault]:
    """Every structure can be read: a SMILES or InChI of one real molecule or salt, with sound valences.

    No wildcards and no patterns: a record is about what was in the flask.
    """
    paths = dict(compounds_of(case.record))
    for path, error in case.unreadable.items():
        compound = paths[path]
        key = "smiles" if compound.smiles else "inchi" if compound.inchi else "from_rxn"
        where = f" at character {error.position + 1}" if error.position is not None else ""
        yield Fault(at=(*path, key), message=f"{compound.name}: {error.reason}{where}", mend=error.mend)


@rule(
    id="salt-without-counter-ion",
    title="An ion without its counter-ion",
    source="common-practice",
    fires_on=("nucleophile: {name: sodium azide, smiles: '[N-]=[N+]=[N-]', mass: 0.975 g}",),
    silent_on=("nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g}",),
)
def salt_lacks_its_counter_ion(case: Case) -> Iterator[Fault]:
    """What was weighed is drawn as it was weighed: the ion with its counter-ion, the hydrate with its water.

    Otherwise the molar mass, and every amount derived from it, is of something else. Without a mass it is a query.
    """
    for path, _, substance in charged_rows(case.record):
        structure = case.structures.get(path)
        if structure is not None and structure.charge:
            yield Fault(
                at=(*path, "smiles"),
                message=f"{substance.name} is drawn with a charge of {structure.charge:+d}",
                mend="add the counter-ion, '[Na+].' for sodium",
                level=None if substance.mass is not None else Level.QUERY,
            )


@rule(
    id="stereo-contradicts-structure",
    title="The stereo word contradicts the drawing",
    source="iupac-gold",
    needs=("structure-unreadable",),
    fires_on=(
        _substrate("CC[C@H](C)Br", more=", stereo: achiral"),
        _substrate("CCC(C)Br", more=", stereo: single enantiomer"),
        _substrate("CCCCBr", "primary", more=", stereo: racemate"),
        _substrate("CC[C@H](C)Br", more=", stereo: mixture"),
    ),
    silent_on=(
        _substrate("CC[C@H](C)Br", more=", stereo: single enantiomer"),
        _substrate("CCC(C)Br", more=", stereo: unknown enantiomer"),
        _substrate("CCCCBr", "primary", more=", stereo: achiral"),
        _substrate("CC[C@H](C)Br", more=", stereo: mixture, er: '80:20'"),
    ),
)
def stereo_contradicts_structure(case: Case) -> Iterator[Fault]:
    """A single enantiomer is drawn with its configuration, a racemate has something to be racemic about.

    Racemate, single enantiomer, unknown enantiomer and not determined are four states. A single enantiomer is drawn
    in full; a racemate or an unknown enantiomer may be drawn flat or with its relative configuration; meso counts as
    achiral; a mixture of the substrate is stated by its ee, er or dr.
    """
    for path, compound in compounds_of(case.record):
        stereo = compound.stereo if isinstance(compound, (Substrate, Product, Formed)) else None
        structure = case.structures.get(path)
        if stereo is None or structure is None:
            continue
        problem = _stereo_problem(stereo, structure)
        if stereo is StereoKind.MIXTURE and isinstance(compound, Substrate) and not _is_stated(compound):
            problem = "neither ee, er nor dr says which"
        if problem:
            yield Fault(
                at=(*path, "stereo"),
                message=f"{compound.name} is said to be {_a(stereo)}, but {problem}",
                mend="draw the configuration, or correct the word",
            )


def _stereo_problem(stereo: StereoKind, structure: Structure) -> str:
    centres = structure.stereocentres
    match stereo:
        case StereoKind.ACHIRAL if not structure.is_achiral:
            return "the drawing is chiral, or leaves a stereocentre open"
        case StereoKind.SINGLE_ENANTIOMER if centres.unspecified:
            return "a stereocentre is drawn without configuration"
        case StereoKind.SINGLE_ENANTIOMER if structure.is_achiral:
            return "the drawing is achiral"
        case StereoKind.RACEMATE | StereoKind.UNKNOWN_ENANTIOMER if not centres.total:
            return "the drawing has no stereocentre"
    return ""


def _is_stated(substrate: Substrate) -> bool:
    return any(number is not None for number in (substrate.ee, substrate.er, substrate.dr))


def _a(stereo: StereoKind) -> str:
    needs_article = stereo in {StereoKind.RACEMATE, StereoKind.SINGLE_ENANTIOMER, StereoKind.MIXTURE}
    return f"a {stereo}" if needs_article else str(stereo)


@rule(
    id="ee-without-chirality",
    title="An ee of an achiral product",
    source="iupac-gold",
    needs=("structure-unreadable", "label-unknown"),
    fires_on=(
        "outcome:\n  result: [elimination]\n  products: [{label: A, name: but-1-ene, smiles: 'C=CCC'}]\n"
        "  measured: [{yield: 81 %, of: A, kind: assay}, {ee: 40 %, of: A, by: chiral GC}]",
    ),
    silent_on=(
        "substrate: {name: (S)-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, class: secondary,"
        " leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\noutcome:\n"
        "  result: [substitution]\n"
        "  products: [{label: A, name: 2-azidobutane, smiles: 'CC[C@@H](C)N=[N+]=[N-]'}]\n"
        "  measured: [{yield: 81 %, of: A, kind: assay}, {ee: 40 %, of: A, by: chiral GC}]",
    ),
)
def ee_without_chirality(case: Case) -> Iterator[Fault]:
    """Only a chiral product has an ee or er.

    A meso compound or an alkene without stereocentre has no enantiomer to be in excess.
    """
    for index, line in enumerate(case.record.outcome.measured):
        if line.what not in {"ee", "er"}:
            continue
        for label in line.of or ():
            path = next(iter(case.product_paths((label,))), ("substrate",))
            structure = case.structures.get(path)
            if structure is not None and structure.is_achiral and not structure.stereocentres.unspecified:
                yield Fault(
                    at=("outcome", "measured", index, line.what),
                    message=f"{label} is achiral and has no {line.what}",
                    mend="correct the label or the structure",
                )


@rule(
    id="class-not-declared",
    title="A class that the structure has and the record does not name",
    level=Level.REMARK,
    source="record-format",
    needs=("structure-unreadable", "class-unknown", "class-not-found", "leaving-group-not-found"),
    fires_on=(_substrate("C=CCBr", "primary"),),
    silent_on=(
        _substrate("C=CCBr", "[primary, allylic]"),
        _substrate("O=C1CCCC(S(=O)(=O)c2ccccc2)C1", "[secondary, beta-carbonyl, cyclic]", "sulfone"),
    ),
)
def class_is_not_declared(case: Case) -> Iterator[Fault]:
    """A class perceived at the reacting carbon is named in the record.

    The lists of the book are built from these words. Where the group hangs on two carbons (a sulfone, an ether) the
    carbon is meant that has every class the record names.
    """
    declared = set(case.record.substrate.classes)
    meant = [each for each in case.sites if declared <= set(each.site.classes)] or case.sites
    perceived = {name for each in meant for name in each.site.classes}
    missing = sorted((perceived & expected_class_names()) - declared)
    if missing:
        words = ", ".join([*case.record.substrate.classes, *missing])
        yield Fault(
            at=("substrate", "class"),
            message=f"the carbon is {' and '.join(missing)} as well",
            mend=f"write class: [{words}]",
            fix=f"[{words}]",
        )


@rule(
    id="class-not-found",
    title="A declared class that the structure does not have",
    source="record-format",
    needs=("structure-unreadable", "class-unknown", "leaving-group-not-found"),
    fires_on=(_substrate("CCCCBr", "secondary"),),
    silent_on=(_substrate("CCCCBr", "primary"),),
)
def class_is_not_found(case: Case) -> Iterator[Fault]:
    """Every declared class is perceived at the carbon that bears the leaving group.

    If chemist and structure disagree here, the SMILES is usually of the wrong isomer.
    """
    perceived = {name for each in case.sites for name in each.site.classes}
    for index, name in enumerate(case.record.substrate.classes):
        if name not in perceived:
            yield Fault(
                at=("substrate", "class", index),
                message=f"no reacting carbon of {case.record.substrate.name} is {name}",
                mend=f"it is: {', '.join(sorted(perceived)) or 'without any class'}; correct the class or the SMILES",
            )


@rule(
    id="class-unknown",
    title="A class outside the closed list",
    source="record-format",
    fires_on=(_substrate("CCC(C)Br", "sec"),),
    silent_on=(_substrate("CCC(C)Br", "secondary"),),
)
def class_is_unknown(case: Case) -> Iterator[Fault]:
    """Substrate classes come from a closed list.

    One word for one idea, so that a list of the book holds all entries it should.
    """
    for index, name in enumerate(case.record.substrate.classes):
        if name not in site_class_names():
            yield _outside_list(("substrate", "class", index), name, site_class_names())


@rule(
    id="leaving-group-unknown",
    title="A leaving group outside the closed list",
    source="record-format",
    fires_on=(_substrate("CCC(C)Br", group="bromine"),),
    silent_on=(_substrate("CCC(C)Br", group="bromide"),),
)
def leaving_group_is_unknown(case: Case) -> Iterator[Fault]:
    """The leaving group comes from a closed list; `none` stands for an addition to an alkene or alkyne.

    It is named for what leaves: a bromide, a tosylate, an epoxide that opens.
    """
    name = case.record.substrate.leaving_group
    if name not in leaving_group_names():
        short = {group.abbreviation.casefold(): group.name for group in leaving_groups().values()}
        at: Path = ("substrate", "leaving_group")
        yield _outside_list(at, name, leaving_group_names(), meant=short.get(name.casefold().lstrip("-")))


@rule(
    id="leaving-group-not-found",
    title="A leaving group that is not there",
    source="record-format",
    needs=("structure-unreadable", "leaving-group-unknown"),
    fires_on=(_substrate("CCC(C)Br", group="chloride"),),
    silent_on=(_substrate("CCC(C)Cl", group="chloride"),),
)
def leaving_group_is_not_found(case: Case) -> Iterator[Fault]:
    """The leaving group is on the substrate, or a stage or an activator forms it there.

    What forms it is seen in a stage's `gives`, or in a reagent with use: activator or acid.
    """
    name = case.record.substrate.leaving_group
    if case.sites:
        return
    found = groups_formed(case.record, case.structures)
    had = f"it has {', '.join(found)}" if found else "it has no leaving group that we know"
    sought = "multiple bond" if name == NO_LEAVING_GROUP else name
    yield Fault(
        at=("substrate", "leaving_group"),
        message=f"no {sought} is found on {case.record.substrate.name}; {had}",
        mend="correct the group or the SMILES, or show in a stage's gives: how it is formed",
    )


def _outside_list(at: Path, name: str, permitted: tuple[str, ...], meant: str | None = None) -> Fault:
    near = [meant] if meant else get_close_matches(name, permitted, n=1, cutoff=0.5)
    hint = f'; did you mean "{near[0]}"?' if near else ""
    return Fault(
        at=at,
        message=f'"{name}" is not in the closed list{hint}',
        mend=f"use one of: {', '.join(sorted(permitted))}",
        fix=near[0] if near else None,
    )


STRUCTURE_CHECKS = (
    class_is_not_declared,
    class_is_not_found,
    class_is_unknown,
    ee_without_chirality,
    leaving_group_is_not_found,
    leaving_group_is_unknown,
    rxn_file_is_unusable,
    salt_lacks_its_counter_ion,
    stereo_contradicts_structure,
    structure_is_unreadable,
)
