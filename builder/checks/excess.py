"""Enantiomeric and diastereomeric excess against the drawings, the words for stereo, and each other."""

import re
from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.checks.measured import Span, exactly, excess_of_substrate, excess_span
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.amounts import Role, charged_rows
from builder.records.fields import Ratio
from builder.records.model import Measurement, Substrate
from builder.records.quantities import Percent
from builder.records.specimen import outcome_example
from builder.records.vocabulary import StereoKind
from builder.rule import Fault, Path, rule

__all__ = ["EXCESS_CHECKS"]

RACEMIC_BELOW = 2.0
"""Points of ee that chromatography does not tell from none; common practice, no source."""
RISE_POINTS = 1.0
DISAGREE_POINTS = 1.0
_ENRICHES = re.compile(r"crystalli[sz]|triturat|sublim|chiral|resolution|resolved", re.IGNORECASE)
_NAMES_LIMIT = re.compile(r"\b(limit|detect|LOD)", re.IGNORECASE)
_UNNAMED = {StereoKind.UNKNOWN_ENANTIOMER, StereoKind.NOT_DETERMINED}

_CHIRAL = (
    "substrate: {name: (S)-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, ee: 97 %,"
    " class: secondary, leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
)
_AZIDE = "{label: A, name: (R)-2-azidobutane, smiles: 'CC[C@@H](C)N=[N+]=[N-]', use: desired}"
_YIELD = "{yield: 81 %, of: A, kind: assay}"


def _outcome(line: str, product: str = _AZIDE) -> str:
    return _CHIRAL + outcome_example(_YIELD, line, products=product)


def _with_word(word: str, smiles: str = "CC[C@@H](C)N=[N+]=[N-]") -> str:
    return f"{{label: A, name: 2-azidobutane, smiles: '{smiles}', use: desired, stereo: {word}}}"


def _excesses(case: Case) -> Iterator[tuple[Path, Measurement, Span]]:
    """Yield the lines of ee and er with their paths and the excess they state."""
    for index, line in enumerate(case.record.outcome.measured):
        span = excess_span(line.ee, line.er)
        if span is not None:
            yield ("outcome", "measured", index, line.what), line, span


@rule(
    id="ee-above-100",
    title="An ee above 100 %",
    source="iupac-gold",
    fires_on=(_outcome("{ee: 104 %, of: A, by: chiral HPLC}").replace("ee: 97 %", "dr: '98:2'"),),
    silent_on=(_outcome("{ee: 96 %, of: A, by: chiral HPLC}"),),
)
def ee_is_above_100(case: Case) -> Iterator[Fault]:
    """An ee lies between -100 and 100 %.

    It is a difference of two fractions that add up to one; more is a slip of the keyboard.
    """
    measured = enumerate(case.record.outcome.measured)
    typed: list[tuple[Path, Percent | None]] = [(("outcome", "measured", i, "ee"), line.ee) for i, line in measured]
    for at, ee in (*typed, (("substrate", "ee"), case.record.substrate.ee)):
        if ee is not None and abs(ee.magnitude) > 100.0:
            yield Fault(at=at, message=f"an ee of {ee}", mend="correct the number")


@rule(
    id="ee-above-substrate",
    title="The ee rose on the way",
    source="common-practice",
    needs=("ee-above-100",),
    fires_on=(
        _outcome("{ee: 99.5 %, of: A, by: chiral HPLC}"),
        _outcome("{ee: '> 99 %', of: A, by: chiral HPLC}").replace("ee: 97 %", "er: '97.5:2.5'"),
    ),
    silent_on=(
        _outcome("{ee: 96 %, of: A, by: chiral HPLC}"),
        _outcome("{ee: 98 %, of: A, by: chiral HPLC}"),
        _outcome("{ee: 99.5 %, of: A, by: chiral HPLC}").replace("ee: 97 %", "ee: '> 97 %'"),
    ),
)
def ee_is_above_substrate(case: Case) -> Iterator[Fault]:
    """The product's ee does not exceed the substrate's by more than 1 point, unless the work-up enriches it.

    Displacement at one centre cannot make it purer; a crystallisation can, and then it stands in the work-up. With
    something chiral in the flask one enantiomer may react faster: then this is a query.
    """
    start = excess_of_substrate(case.record.substrate)
    if start is None or _ENRICHES.search(" ".join(case.record.work_up or ())):
        return
    for path, line, span in _excesses(case):
        if line.of != ("substrate",) and span.is_above(start, RISE_POINTS):
            found = f"{line.ee} ee" if line.ee is not None else f"{line.er}, {span.stated:.3g} % ee,"
            yield Fault(
                at=path,
                message=f"{found} from a substrate of {start.stated:.3g} % ee",
                mend="correct one of them, or name the crystallisation in work_up",
                level=Level.QUERY if _has_chiral_help(case) else None,
            )


@rule(
    id="ee-er-disagree",
    title="ee and er of one product disagree",
    source="common-practice",
    fires_on=(
        _outcome("{ee: 80 %, of: A}, {er: '97:3', of: A}"),
        _outcome("{ee: 97 %, of: A}, {er: '97:3', of: A}"),
    ),
    silent_on=(
        _outcome("{ee: 94 %, of: A}, {er: '97:3', of: A}"),
        _outcome("{ee: 95 %, of: A}, {er: '97.5:2.5', of: A}"),
        _outcome("{ee: 95.6 %, of: A}, {er: '98:2', of: A}"),
        _outcome("{ee: 50 %, of: A}, {er: '3:1', of: A}"),
    ),
)
def ee_and_er_disagree(case: Case) -> Iterator[Fault]:
    """The ee is the difference of the two parts of er over their sum, within 1 point and what rounding leaves open.

    97:3 is 94 % ee. Parts need not add up to 100. The usual slip is the major part taken for the ee.
    """
    measured = case.record.outcome.measured
    ees = {line.of: line.ee for line in measured if line.ee is not None}
    for index, line in enumerate(measured):
        ee, from_er = ees.get(line.of), excess_span(None, line.er)
        if ee is None or from_er is None:
            continue
        typed = excess_span(ee, None)
        if typed is not None and (typed.is_above(from_er, DISAGREE_POINTS) or from_er.is_above(typed, DISAGREE_POINTS)):
            yield Fault(
                at=("outcome", "measured", index, "er"),
                message=f"{line.er} is {from_er.stated:.3g} % ee, not {ee}",
                mend="correct one of the two",
            )


@rule(
    id="ee-from-racemate",
    title="An ee out of a racemate",
    source="common-practice",
    fires_on=(outcome_example(_YIELD, "{ee: 40 %, of: A, by: chiral HPLC}"),),
    silent_on=(_outcome("{ee: 40 %, of: A, by: chiral HPLC}"), outcome_example(_YIELD, "{er: '50.5:49.5', of: A}")),
)
def ee_comes_from_a_racemate(case: Case) -> Iterator[Fault]:
    """A racemic substrate gives a racemic product, unless something in the flask is chiral.

    Substitution carries stereochemistry over and makes none.
    """
    if case.record.substrate.stereo is not StereoKind.RACEMATE or _has_chiral_help(case):
        return
    for path, line, span in _excesses(case):
        if span.is_above(exactly(0.0), RACEMIC_BELOW):
            yield Fault(
                at=path,
                message=f"{span.stated:.3g} % ee from a racemic substrate",
                mend="correct the substrate's stereo, or name the chiral reagent",
                data={"of": list(line.of or ())},
            )


def _has_chiral_help(case: Case) -> bool:
    return any(
        not case.structures[path].is_achiral
        for path, role, _ in charged_rows(case.record)
        if role is not Role.SUBSTRATE and path in case.structures
    )


@rule(
    id="excess-against-stereo",
    title="An excess that the stereo word denies",
    source="iupac-gold",
    needs=(
        *("structure-unreadable", "label-unknown", "stereo-contradicts-structure"),
        *("ee-above-100", "ee-without-chirality", "ee-from-racemate"),
    ),
    fires_on=(
        _outcome("{ee: 96 %, of: A, by: chiral HPLC}", _with_word("racemate")),
        _outcome("{er: '50:50', of: A, by: chiral HPLC}", _with_word("single enantiomer")),
        _CHIRAL.replace("single enantiomer", "racemate"),
        "substrate: {name: 1-bromobutane, smiles: CCCCBr, stereo: achiral, er: '97:3', class: primary,"
        " leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n"
        "outcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate}]}",
    ),
    silent_on=(
        _outcome("{ee: 96 %, of: A, by: chiral HPLC}", _with_word("single enantiomer")),
        _outcome("{er: '50.5:49.5', of: A, by: chiral HPLC}", _with_word("racemate")),
        _outcome("{ee: 40 %, of: A, by: chiral HPLC}", _with_word("mixture")),
    ),
)
def excess_is_against_the_stereo_word(case: Case) -> Iterator[Fault]:
    """A racemate has no excess, a single enantiomer has one, and what is achiral cannot have any.

    Racemate, single enantiomer, unknown enantiomer and not determined are four states; searches and comparisons of
    entries rely on the word, and reports on the number. Below 2 % ee is taken for racemic.
    """
    words = {product.label: product.stereo for product in case.record.outcome.products}
    for path, line, span in _excesses(case):
        for label in line.of or ():
            problem = _denied(words.get(label), span)
            if problem:
                yield _denied_fault(path, f"product {label}", problem)
    substrate = case.record.substrate
    start = excess_of_substrate(substrate)
    if start is not None:
        problem = "what is achiral has no excess" if substrate.stereo is StereoKind.ACHIRAL else ""
        problem = problem or _denied(substrate.stereo, start)
        if problem:
            yield _denied_fault(("substrate", _typed_key(substrate)), "the substrate", problem)


def _denied(word: StereoKind | None, span: Span) -> str:
    if word is StereoKind.RACEMATE and span.is_above(exactly(0.0), RACEMIC_BELOW):
        return f"a racemate has no ee of {span.stated:.3g} %"
    if word is StereoKind.SINGLE_ENANTIOMER and span.stated <= RACEMIC_BELOW:
        return f"with {span.stated:.3g} % ee it is a racemate"
    return ""


def _denied_fault(at: Path, what: str, problem: str) -> Fault:
    return Fault(at=at, message=f"{what}: {problem}", mend="correct the number, or the word under stereo")


def _typed_key(substrate: Substrate) -> str:
    return "ee" if substrate.ee is not None else "er"


@rule(
    id="excess-without-isomer",
    title="An excess of an isomer that is not named",
    source="common-practice",
    needs=("structure-unreadable", "label-unknown", "stereo-contradicts-structure", "excess-against-stereo"),
    fires_on=(
        _outcome("{ee: 96 %, of: A, by: chiral HPLC}", "{label: A, name: azide, smiles: 'CCC(C)N=[N+]=[N-]'}"),
        _outcome("{er: '98:2', of: A, by: chiral HPLC}", _with_word("mixture", "CCC(C)N=[N+]=[N-]")),
        _CHIRAL.replace("CC[C@H](C)Br", "CCC(C)Br").replace("single enantiomer", "mixture"),
        _outcome("{er: '98:2', of: A, by: chiral HPLC}", _with_word("unknown enantiomer", "CCC(C)N=[N+]=[N-]")),
        _outcome("{ee: -96 %, of: A, by: chiral HPLC}"),
    ),
    silent_on=(
        _outcome("{ee: 96 %, of: A, by: chiral HPLC}"),
        _outcome("{ee: '< 2 %', of: A, by: chiral HPLC}", "{label: A, name: azide, smiles: 'CCC(C)N=[N+]=[N-]'}"),
    ),
)
def excess_does_not_name_its_isomer(case: Case) -> Iterator[Fault]:
    """What an ee, er or dr speaks of is drawn with the configuration of its major isomer.

    96 % ee of which enantiomer? Without it neither inversion nor retention can be told. Where it is honestly not known,
    `stereo: unknown enantiomer` or `not determined` says so, and a remark asks for what would tell the isomers apart,
    the order of the peaks. A negative ee speaks of the mirror image of what is drawn.
    """
    for each in _spoken_of(case):
        if each.is_mirrored:
            message = f"a negative ee says that the major isomer is the mirror image of the drawing of {each.name}"
            yield Fault(at=each.at, message=message, mend="draw the major isomer, and write the ee without its sign")
            continue
        if each.structure is None or not each.structure.stereocentres.unspecified:
            continue
        is_unknown = each.stereo in _UNNAMED
        if is_unknown and each.is_noted:
            continue
        yield Fault(
            at=each.at,
            message=f"the drawing of {each.name} does not say which isomer is the major one",
            mend="say in a note which peak is the major one"
            if is_unknown
            else "draw the major isomer, or write stereo: unknown enantiomer",
            level=Level.REMARK if is_unknown else None,
        )


@dataclass(frozen=True, slots=True)
class _SpokenOf:
    """What an excess speaks of: where the excess stands, and name, stereo word and structure of the compound.

    is_mirrored: the number is negative, so that the mirror image of the drawing is the major isomer.
    is_noted: a note may name the major isomer by other means; a substrate has no line that could carry one.
    """

    at: Path
    name: str
    stereo: StereoKind | None
    structure: Structure | None
    is_mirrored: bool
    is_noted: bool


def _spoken_of(case: Case) -> Iterator[_SpokenOf]:
    for index, line in enumerate(case.record.outcome.measured):
        if not _is_excess(line.ee, line.er, line.dr):
            continue
        for label in line.of or ():
            for path in case.product_paths((label,)):
                stereo = case.record.outcome.products[int(path[-1])].stereo
                at: Path = ("outcome", "measured", index, line.what)
                structure, is_noted = case.structures.get(path), line.note is not None
                yield _SpokenOf(at, f"product {label}", stereo, structure, _is_negative(line.ee), is_noted)
    substrate = case.record.substrate
    if _is_excess(substrate.ee, substrate.er, None):
        at = ("substrate", _typed_key(substrate))
        structure = case.structures.get(("substrate",))
        yield _SpokenOf(at, substrate.name, substrate.stereo, structure, _is_negative(substrate.ee), is_noted=True)


def _is_negative(ee: Percent | None) -> bool:
    return ee is not None and ee.magnitude < -RACEMIC_BELOW


def _is_excess(ee: Percent | None, er: Ratio | None, dr: Ratio | None) -> bool:
    span = excess_span(ee, er or dr)
    return span is not None and span.stated > RACEMIC_BELOW


@rule(
    id="excess-without-limit",
    title="A purity of isomers without its limit of detection",
    level=Level.QUERY,
    source="common-practice",
    needs=("ee-above-100",),
    fires_on=(
        _outcome("{er: '100:0', of: A, by: chiral HPLC}"),
        _outcome("{ee: 100 %, of: A, by: chiral HPLC}").replace("ee: 97 %", "ee: '> 99 %'"),
        _CHIRAL.replace("ee: 97 %", "ee: 100 %"),
    ),
    silent_on=(
        _outcome("{ee: '> 99 %', of: A, by: chiral HPLC}").replace("ee: 97 %", "ee: '> 99 %'"),
        _outcome("{er: '100:0', of: A, by: chiral HPLC, note: limit of detection 0.2 %}").replace("97 %", "'> 99 %'"),
    ),
)
def excess_has_no_limit(case: Case) -> Iterator[Fault]:
    """No method shows 100:0; what was seen is an isomer below the limit of detection.

    That limit is the number a reader needs: it is 5 % by NMR on a bad day and 0.1 % by chromatography on a good one.
    """
    substrate = case.record.substrate
    lines: list[tuple[Path, Percent | None, Ratio | None]] = [
        (("outcome", "measured", index, line.what), line.ee, line.er or line.dr)
        for index, line in enumerate(case.record.outcome.measured)
        if not _NAMES_LIMIT.search(f"{line.note or ''} {line.by or ''}")
    ]
    lines += [
        (("substrate", key), substrate.ee if key == "ee" else None, ratio) for key, ratio in _of_substrate(substrate)
    ]
    for at, ee, ratio in lines:
        if ee is not None and not ee.is_limit and abs(ee.magnitude) == 100.0:
            yield Fault(
                at=at, message=f"{ee} leaves nothing undetected", mend="write '> 99 %', with the limit you have"
            )
        elif ratio is not None and not all(ratio.numbers):
            mend = "write ee: '> 99 %' in its place, or the limit of detection in a note"
            mend = mend if at[-1] == "er" else "write the limit of detection in a note"
            yield Fault(at=at, message=f"{ratio} leaves nothing undetected", mend=mend)


def _of_substrate(substrate: Substrate) -> Iterator[tuple[str, Ratio | None]]:
    if substrate.ee is not None:
        yield "ee", None
    if substrate.er is not None:
        yield "er", substrate.er
    if substrate.dr is not None:
        yield "dr", substrate.dr


EXCESS_CHECKS = (
    ee_is_above_100,
    ee_is_above_substrate,
    ee_and_er_disagree,
    ee_comes_from_a_racemate,
    excess_is_against_the_stereo_word,
    excess_does_not_name_its_isomer,
    excess_has_no_limit,
)
