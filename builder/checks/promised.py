"""What a name and a form promise, against what is drawn: the cation of a salt, the acid of a hydrochloride, water."""

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from builder.checks.case import Case, compounds_of
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.amounts import charged_rows
from builder.mechanism.forms import forms_of, hydrate_waters, partner_count
from builder.records.model import Charged
from builder.records.vocabulary import StereoKind
from builder.rule import Fault, rule

__all__ = ["PROMISED_CHECKS"]

_METALS: Mapping[str, str] = {
    "lithium": "Li",
    "sodium": "Na",
    "potassium": "K",
    "caesium": "Cs",
    "cesium": "Cs",
    "silver": "Ag",
}
_HALIDES: Mapping[str, str] = {"hydrochloride": "HCl", "hydrobromide": "HBr", "hydroiodide": "HI"}
WORDS_OF_A_FORM = 3  # "sodium salt, anhydrous"; a longer text tells where it came from
_WORD = re.compile(r"[a-z]+")
_HOW_MANY = re.compile(r"^(?:di|tri)(?=[a-z])")


@dataclass(frozen=True, slots=True)
class _Lack:
    """A word of name or form, the key it stands in, what the drawing lacks, and the form that would have it."""

    word: str
    key: str
    what: str
    form: str


@rule(
    id="form-not-drawn",
    title="A name or form that speaks of what is not drawn",
    level=Level.QUERY,
    source="record-format",
    needs=("structure-unreadable", "salt-without-counter-ion"),
    fires_on=(
        "nucleophile: {name: sodium azide, smiles: 'N=[N+]=[N-]', mass: 0.975 g}",
        "nucleophile: {name: sodium azide, smiles: 'N=[N+]=[N-]', equivalents: 1.5}",
        "nucleophile: {name: methylamine hydrochloride, smiles: CN, mass: 1.01 g}",
        "nucleophile: {name: sodium acetate, smiles: '[Na+].CC([O-])=O', form: trihydrate, mass: 2.04 g}",
    ),
    silent_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g}",
        "nucleophile: {name: methylamine hydrochloride, smiles: CN.Cl, mass: 1.01 g}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n"
        "outcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate, by: GC}]}",
    ),
)
def form_is_not_drawn(case: Case) -> Iterator[Fault]:
    """What was charged is drawn in the form its name and `form` give: with cation, with acid, with water.

    A sodium salt drawn as the acid, a hydrochloride drawn as the base, a hydrate drawn dry: amounts are derived from
    the drawing, so with a typed mass, or a volume with density, this is an error. Read are the names of alkali metals
    and silver, hydrochloride, hydrobromide, hydroiodide, and hydrates by number; `anhydrous` and `free base` deny them.
    A `form` of more than three words tells how it was made, and is not read.
    """
    for path, _, substance in charged_rows(case.record):
        structure = case.structures.get(path)
        lack = _lack(substance, structure) if structure is not None else None
        if structure is None or lack is None:
            continue
        is_weighed = substance.mass is not None or (substance.volume is not None and substance.density is not None)
        masses = {form.name: form.molar_mass for form in forms_of(structure)}
        would = f", {masses[lack.form]:.2f} g/mol" if lack.form in masses else ""
        yield Fault(
            at=(*path, "smiles" if lack.key == "name" and substance.smiles else lack.key),
            message=f'"{lack.word}" stands in the {lack.key} of {substance.name}, but {lack.what}'
            f" ({structure.formula}, {structure.mass:.2f} g/mol)",
            mend=f"amounts follow from what is drawn: draw the form that was charged{would}, or correct the word",
            level=Level.ERROR if is_weighed else None,
        )


_ABSOLUTE = re.compile(r"\((?:\d*[a-z]?[RS](?:,\s?)?)+\)-")
_RACEMIC = re.compile(r"(?:\(±\)|rac|\(RS\)|DL)-")


@rule(
    id="name-against-stereo",
    title="A name of one mirror image for a racemate, or the other way round",
    level=Level.QUERY,
    source="iupac-gold",
    fires_on=(
        "substrate: {name: (S)-2-bromobutane, smiles: 'CCC(C)Br', stereo: racemate, class: secondary, leaving_group:"
        " bromide, amount: 10 mmol}",
        "substrate: {name: rac-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, class: secondary,"
        " leaving_group: bromide, amount: 10 mmol}\n"
        "outcome: {result: [substitution], products: [{label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]'}],"
        " measured: [{yield: 81 %, of: A, kind: assay}]}",
    ),
    silent_on=(
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', stereo: racemate, class: secondary, leaving_group:"
        " bromide, amount: 10 mmol}",
    ),
)
def name_is_against_stereo(case: Case) -> Iterator[Fault]:
    """A name that begins with (R)- or (S)- is of one mirror image, one with rac- or (±)- of both.

    Whoever reads the list sees the name alone. Starred descriptors, such as (2R*,3S*)-, are relative and fit both.
    """
    for path, compound in compounds_of(case.record):
        stereo = getattr(compound, "stereo", None)
        for pattern, against in ((_ABSOLUTE, StereoKind.RACEMATE), (_RACEMIC, StereoKind.SINGLE_ENANTIOMER)):
            found = pattern.match(compound.name)
            if found and stereo is against:
                yield Fault(
                    at=(*path, "name"),
                    message=f"{found[0]} in the name, and stereo: {stereo}",
                    mend="correct the name or the stereo word; the drawing goes with them",
                )


PROMISED_CHECKS = (form_is_not_drawn, name_is_against_stereo)


def _lack(substance: Charged, structure: Structure) -> _Lack | None:
    """Return the first word that the drawing does not keep; None where it keeps all."""
    form = (substance.form or "").casefold()
    texts = {"name": substance.name.casefold(), "form": form if len(form.split()) <= WORDS_OF_A_FORM else ""}
    for key, text in texts.items():
        for word in _WORD.findall(text):
            lack = _lack_of_word(word, key, structure)
            if lack is not None:
                return lack
        if "free base" in text and any(partner_count(structure, each) for each in _HALIDES):
            return _Lack("free base", key, "an acid is drawn", "the free base")
    return None


def _lack_of_word(word: str, key: str, structure: Structure) -> _Lack | None:
    metal, drawn = _HOW_MANY.sub("", word), partner_count(structure, "monohydrate")
    waters = hydrate_waters().get(word)
    if metal in _METALS and not structure.elements.get(_METALS[metal]):
        return _Lack(word, key, f"no {_METALS[metal]} is drawn", f"the {metal.replace('cesium', 'caesium')} salt")
    if word in _HALIDES and not partner_count(structure, word):
        return _Lack(word, key, f"no {_HALIDES[word]} stands beside it", f"the {word}")
    if waters is not None and (not drawn or (waters.is_integer() and drawn != waters)):
        return _Lack(word, key, f"{drawn or 'no'} H2O is drawn", f"the {word}")
    if word == "anhydrous" and drawn:
        return _Lack(word, key, f"{drawn} H2O is drawn", "the anhydrous form")
    return None
