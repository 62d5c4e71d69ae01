"""What a good record has and a first draft may lack, weighed, with a score."""

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.checks.measured import is_chromatography
from builder.chemistry.perception import NO_LEAVING_GROUP, attacking_atoms
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.amounts import Role
from builder.records.model import Measurement
from builder.records.specimen import outcome_example
from builder.records.vocabulary import ELIMINATIONS, Course, ReagentUse, Result, StereoKind, YieldKind
from builder.rule import Fault, rule

__all__ = ["COMPLETENESS_CHECKS", "Completeness", "completeness"]

HEAVY, PLAIN, LIGHT = 3, 2, 1
"""Weights of a gap: without it nobody can repeat the run; a reader has to ask; good to have. An estimate made here."""

Asked = bool | None
"""Whether a record has something; None where it needs none."""


@dataclass(frozen=True, slots=True)
class _Expected:
    """What trade practice holds mandatory beyond the required keys.

    label: what to add, and where. has: whether a case has it.
    """

    label: str
    weight: int
    has: Callable[[Case], Asked]


@dataclass(frozen=True, slots=True)
class Completeness:
    """How much of what is expected a record has.

    percent: score by weight, whole per cent; 100 only where nothing is missing. missing: names of the gaps, heaviest
    first. is_told: whether one of them weighs enough to be asked for.
    """

    percent: int
    missing: tuple[str, ...]
    is_told: bool


def completeness(case: Case) -> Completeness:
    """Return the completeness of a record."""
    asked = [(each, has) for each in _EXPECTED if (has := each.has(case)) is not None]
    whole = sum(each.weight for each, _ in asked)
    gaps = sorted((each for each, has in asked if not has), key=lambda each: -each.weight)
    percent = 100 - (100 * sum(gap.weight for gap in gaps) + whole - 1) // whole
    return Completeness(percent, tuple(gap.label for gap in gaps), any(gap.weight > LIGHT for gap in gaps))


_NO_BASE = (
    "nucleophile: {name: butan-1-amine, smiles: CCCCN, equivalents: 1.1}\n"
    "stages: [{add: [DMF, butan-1-amine, 2-bromobutane], temperature: 60 °C, measured: internal, time: 16 h,"
    " vessel: open, atmosphere: nitrogen, end_point: 'GC, bromide < 1 %'}]\ntake_away: '41 % in 16 h'\n"
) + outcome_example(
    "{conversion: 51 %, by: GC}, {yield: 41 %, of: A, kind: isolated}",
    products="{label: A, name: N-butan-2-ylbutan-1-amine, smiles: 'CCCCNC(C)CC', use: desired, stereo: racemate}",
    more="claim: {mechanism: SN2, course: not determined, basis: [product structure]}",
)


@rule(
    id="record-incomplete",
    title="What a complete record would add",
    level=Level.REMARK,
    source="common-practice",
    fires_on=("# without notebook", "# without work_up", _NO_BASE),
    silent_on=(
        "take_away: '81 % in 16 h; no alkene seen'",
        _NO_BASE + "\nbase: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C(=O)[O-]', equivalents: 1.5}",
    ),
)
def record_is_incomplete(case: Case) -> Iterator[Fault]:
    """A complete record says everything the next person needs to repeat the experiment.

    A first draft may lack it: this is a remark, and the score shows how far the record has come. Order of addition, end
    point, quench, number of runs, base and water weigh most: they explain most runs that could not be repeated. Gaps
    that weigh little lower the score and are named, but alone they are not asked for.
    """
    found = completeness(case)
    if found.is_told:
        yield Fault(
            at=(),
            message=f"{found.percent} % complete; missing: {', '.join(found.missing)}",
            mend="add what is known",
            data={"percent": found.percent, "missing": list(found.missing)},
        )


# --- what is expected -----------------------------------------------------------------------------------------

_WATER = re.compile(r"\b(water|ppm|dried|dry|sieves?|anhydrous|distilled|moisture|Karl Fischer)\b", re.IGNORECASE)
_WEIGHED_OR_SEEN = {YieldKind.ISOLATED, YieldKind.ASSAY}
ENOUGH_TO_TAKE_THE_ACID = 1.9
"""Equivalents of an amine from which one half can take up the acid that the other sets free."""
HIGH_YIELD = 95.0


def _has_products(case: Case) -> bool:
    return any(result.gives_products for result in case.record.outcome.result)


def _measured(case: Case, *kinds: str) -> list[Measurement]:
    return [line for line in case.record.outcome.measured if line.what in kinds]


def _stereo_of_products(case: Case) -> Asked:
    """Ask of each product with a stereocentre which of the states it is in."""
    drawn = [
        product.stereo is not None
        for index, product in enumerate(case.record.outcome.products)
        if (structure := case.structures.get(("outcome", "products", index))) and structure.stereocentres.total
    ]
    return all(drawn) if drawn else None


def _is_covered(case: Case) -> bool:
    return case.record.substrate.leaving_group != NO_LEAVING_GROUP


def _claim(case: Case) -> Asked:
    return case.record.outcome.claim is not None if _is_covered(case) else None


def _basis(case: Case) -> Asked:
    claim = case.record.outcome.claim
    return None if claim is None else claim.basis is not None


def _conversion(case: Case) -> Asked:
    """Ask for the conversion, or what was recovered, unless the yield leaves no room for doubt."""
    yields = [line.yield_.magnitude for line in _measured(case, "yield") if line.yield_ is not None]
    if sum(yields) >= HIGH_YIELD or case.record.outcome.time_course is not None:
        return None
    return bool(_measured(case, "conversion", "recovered"))


def _yield(case: Case) -> Asked:
    """Ask for a yield that is one, area shares are none; kinetics and failures have other numbers."""
    outcome = case.record.outcome
    if not _has_products(case):
        return bool(_measured(case, "recovered", "conversion"))
    if outcome.rate_constant is not None or outcome.time_course is not None:
        return None
    return any(line.kind in _WEIGHED_OR_SEEN for line in _measured(case, "yield"))


def _excess(case: Case) -> Asked:
    """Ask for an ee, er or dr where a single enantiomer is wanted and its stereocentre reacts."""
    claim = case.record.outcome.claim
    shown = claim is None or (claim.mechanism not in ELIMINATIONS and claim.course is not Course.NOT_APPLICABLE)
    at_risk = any(each.site.alpha_carbon in each.on.stereocentre_marks for each in case.sites)
    single = {
        product.label
        for product in case.record.desired
        if product.stereo is StereoKind.SINGLE_ENANTIOMER and product.course is not Course.NOT_APPLICABLE
    }
    if not (shown and at_risk and single and _has_products(case)):
        return None
    of = {label for line in _measured(case, "ee", "er", "dr", "ratio") for label in _labels(line)}
    return single <= of


def _labels(line: Measurement) -> Iterator[str]:
    yield from line.of or ()
    yield from (label for part in (line.ratio.parts if line.ratio else ()) for label in part)


def _isomers(case: Case) -> Asked:
    """Ask how isomeric products were divided, by a ratio or by a yield of each."""
    by_formula: dict[str, set[str]] = {}
    for index, product in enumerate(case.record.outcome.products):
        structure = case.structures.get(("outcome", "products", index))
        if structure is not None:
            by_formula.setdefault(structure.formula, set()).add(product.label)
    isomers = {label for labels in by_formula.values() if len(labels) > 1 for label in labels}
    if not isomers:
        return None
    single = {label for line in _measured(case, "yield") if len(line.of or ()) == 1 for label in line.of or ()}
    return isomers <= single | {label for line in _measured(case, "ratio") for label in _labels(line)}


def _methods(case: Case) -> Asked:
    """Ask by which method each number was found; an isolated yield is weighed."""
    lines = [line.by is not None for line in case.record.outcome.measured if line.kind is not YieldKind.ISOLATED]
    return all(lines) if lines else None


def _calibration(case: Case) -> Asked:
    """Ask of ratios by chromatography whether they are calibrated; enantiomers need no factor."""
    lines = [line for line in _measured(case, "ratio", "dr") if is_chromatography(line.by)]
    return all(line.calibrated is not None for line in lines) if lines else None


def _cause(case: Case) -> Asked:
    return None if _has_products(case) else case.record.outcome.failure is not None


def _acid_is_taken_up(case: Case) -> Asked:
    """Ask for a base where a neutral N–H, O–H or S–H nucleophile sets free the acid of the leaving group."""
    record = case.record
    rows = [row for row in case.amounts.rows if row.role is Role.NUCLEOPHILE]
    structures = [case.structures.get(row.path) for row in rows]
    is_acidic = Result.SUBSTITUTION in record.outcome.result and any(map(_sets_acid_free, structures))
    is_plentiful = any((row.equivalents or 0.0) >= ENOUGH_TO_TAKE_THE_ACID for row in rows)
    is_meant = any(reagent.use in {ReagentUse.ACID, ReagentUse.ACTIVATOR} for reagent in record.reagents)
    if not is_acidic or is_plentiful or is_meant or _keeps_its_group(case):
        return None
    return bool(record.bases) or any(each.use in {ReagentUse.BASE, ReagentUse.BUFFER} for each in record.reagents)


def _sets_acid_free(structure: Structure | None) -> bool:
    if structure is None or structure.signs:
        return False
    return any(found.loses_proton and found.symbol in {"N", "O", "S"} for found in attacking_atoms(structure))


def _keeps_its_group(case: Case) -> bool:
    """Say whether the group that opens stays on the molecule, as that of an epoxide does, and takes the proton."""
    return all(each.site.leaving_ring_size is not None for each in case.sites)


def _water(case: Case) -> Asked:
    """Ask what is known of water where little of it changes the outcome: with fluoride, hydride or alkoxide."""
    record = case.record
    charged = [case.structures.get(row.path) for row in case.amounts.rows if row.role in {Role.NUCLEOPHILE, Role.BASE}]
    if not any(structure is not None and _minds_water(structure) for structure in charged):
        return None
    if any(_is_protic(case.structures.get(("solvent", i)), solvent.name) for i, solvent in enumerate(record.solvents)):
        return None
    forms = [substance.form for substance in (*record.solvents, *record.nucleophiles, *record.bases)]
    notes = [text for stage in record.stages for text in (stage.note, stage.atmosphere, *(stage.add or ()))]
    return any(_WATER.search(text or "") for text in (*forms, *notes, *(solvent.name for solvent in record.solvents)))


def _minds_water(structure: Structure) -> bool:
    """Say whether a salt holds fluoride, hydride or an alkoxide."""
    return any(piece.smiles in {"[F-]", "[H-]"} or _is_alkoxide(piece) for piece in structure.fragments)


def _is_alkoxide(piece: Structure) -> bool:
    atoms = piece.atoms
    return any(
        atom.symbol == "O"
        and atom.charge < 0
        and any(atoms[other].symbol == "C" and atoms[other].hybridisation == "sp3" for other, _ in atom.neighbours)
        for atom in atoms
    )


def _is_protic(structure: Structure | None, name: str) -> bool:
    if structure is not None:
        return any(atom.symbol == "O" and atom.hydrogens for atom in structure.atoms)
    return bool(re.search(r"water|anol\b|alcohol|acid", name))


_EXPECTED: tuple[_Expected, ...] = (
    _Expected("order of addition (stages.add)", HEAVY, lambda case: any(stage.add for stage in case.record.stages)),
    _Expected("end point of the last stage", HEAVY, lambda case: case.record.stages[-1].end_point is not None),
    _Expected("work_up with its quench", HEAVY, lambda case: case.record.work_up is not None),
    _Expected("number of runs (performed.runs)", HEAVY, lambda case: case.record.performed.runs is not None),
    _Expected("base that takes up the acid set free", HEAVY, _acid_is_taken_up),
    _Expected("water: ppm, or how solvent and salt were dried (form)", HEAVY, _water),
    _Expected("yield, or what was recovered", HEAVY, _yield),
    _Expected("cause of the failure", HEAVY, _cause),
    _Expected("notebook", PLAIN, lambda case: case.record.notebook is not None),
    _Expected("substrate.stereo", PLAIN, lambda case: case.record.substrate.stereo is not None),
    _Expected("stereo of every product with a stereocentre", PLAIN, _stereo_of_products),
    _Expected("where the temperature was measured", PLAIN, lambda case: all(s.measured for s in case.record.stages)),
    _Expected("vessel of every stage", PLAIN, lambda case: all(stage.vessel for stage in case.record.stages)),
    _Expected("atmosphere", PLAIN, lambda case: any(stage.atmosphere for stage in case.record.stages)),
    _Expected("claim of mechanism and course", PLAIN, _claim),
    _Expected("conversion", PLAIN, _conversion),
    _Expected("ee, er or dr of the single enantiomer", PLAIN, _excess),
    _Expected("ratio of the isomers, or a yield of each", PLAIN, _isomers),
    _Expected("evidence", PLAIN, lambda case: bool(case.record.evidence)),
    _Expected("review", PLAIN, lambda case: case.record.reviewed is not None),
    _Expected("take_away", PLAIN, lambda case: case.record.take_away is not None),
    _Expected("basis of the claim", LIGHT, _basis),
    _Expected("method of every measurement (by)", LIGHT, _methods),
    _Expected("calibrated: true or false for ratios by chromatography", LIGHT, _calibration),
    _Expected(
        "purity of the substrate",
        LIGHT,
        lambda case: bool(case.record.substrate.purity or case.record.substrate.strength),
    ),
    _Expected("disclosure", LIGHT, lambda case: case.record.disclosure is not None),
)

COMPLETENESS_CHECKS = (record_is_incomplete,)
