"""What an entry's page shows beside its cautions: GHS statements, solvents, azides, heat, and species that can form.

Facts and screening estimates with their sources, as plain data. Nothing here clears anything: what is not known is said
to be unknown, and nothing is ever marked as safe.
"""

from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.case import Case
from builder.checks.hazards.azides import AzideView, azides_of
from builder.checks.hazards.formed import FormedSpecies, formed_by
from builder.checks.hazards.formulae import RULE_OF_SIX, one_decimal
from builder.checks.hazards.ghs import Labelled, labelled
from builder.checks.hazards.meetings import Present
from builder.checks.hazards.mutagens import limits_text
from builder.checks.hazards.presents import hazards_of, presents_of
from builder.checks.hazards.screens import mutagenic_species
from builder.checks.hazards.solvent_limits import load_residual_limits, load_restrictions
from builder.mechanism.gas import gases_of_record
from builder.mechanism.thermal import SCREEN_ONLY, THERMAL_SOURCE, thermal_screen
from builder.publish.summary import Fact
from builder.records.model import CHARGED_KEYS
from builder.sources import source_text

__all__ = ["LabelView", "SafetyView", "view_safety"]


@dataclass(frozen=True, slots=True)
class LabelView:
    """The GHS statements of one substance: (code, wording) each, and where they are from."""

    name: str
    statements: tuple[tuple[str, str], ...]
    source: str


@dataclass(frozen=True, slots=True)
class SafetyView:
    """Everything beside the cautions.

    labels: of what is charged, as far as the table holds it; unlabelled: the names of the rest. The others are facts:
    value, and source or limits as detail.
    """

    labels: tuple[LabelView, ...]
    unlabelled: tuple[str, ...]
    solvents: tuple[Fact, ...]
    azides: tuple[Fact, ...]
    formed: tuple[Fact, ...]
    mutagens: tuple[Fact, ...]
    heat: tuple[Fact, ...]


def view_safety(case: Case) -> SafetyView:
    """Return what the page of a case shows beside its cautions."""
    presents = presents_of(case)
    charged = list({p.name: p for p in presents if p.path[0] in CHARGED_KEYS}.values())
    known = [(p, labelled(p.structure) if p.structure is not None else None) for p in charged]
    return SafetyView(
        labels=tuple(_label(p.name, row) for p, row in known if row is not None),
        unlabelled=tuple(p.name for p, row in known if row is None),
        solvents=tuple(fact for p in charged if p.path[0] == "solvent" for fact in _solvent(p)),
        azides=tuple(map(_azide, azides_of(case))),
        formed=tuple(map(_formed, formed_by(hazards_of(case), presents))),
        mutagens=tuple(_mutagens(case)),
        heat=tuple(_heat(case)),
    )


def _label(name: str, row: Labelled) -> LabelView:
    source = f"{source_text(row.source)}, {row.revision}, read {row.read}"
    return LabelView(name, tuple((each.code, each.text) for each in row.statements), source)


def _solvent(present: Present) -> Iterator[Fact]:
    smiles = present.structure.smiles if present.structure is not None else ""
    limit, restriction = load_residual_limits().get(smiles), load_restrictions().get(smiles)
    if limit is not None:
        yield Fact(
            present.name,
            f"ICH Q3C class {limit.solvent_class}, at most {limit.most_ppm:g} ppm in a drug substance"
            f" (PDE {limit.pde_mg:g} mg a day, dose of 10 g)",
            f"{source_text(limit.source)}, read {limit.read}",
        )
    if restriction is not None:
        yield Fact(
            present.name,
            f"{restriction.jurisdiction}, entry {restriction.entry}, from {restriction.since}: at most"
            f" {restriction.inhalation} mg/m³ in air, {restriction.dermal} mg/kg a day on the skin",
            f"{source_text(restriction.source)}, read {restriction.read}",
        )


def _formed(species: FormedSpecies) -> Fact:
    smiles = species.structure.smiles if species.structure is not None else ""
    return Fact(species.name, smiles, f"from {_listed(species.origins)}")


def _azide(azide: AzideView) -> Fact:
    keeps = "kept" if azide.carbons_per_azide >= RULE_OF_SIX else "broken"
    mass = "" if azide.mass_g is None else f", {azide.mass_text} here"
    where = "" if azide.is_isolated else " (in solution)"
    return Fact(
        azide.name,
        f"(C + O)/N {azide.ratio:.2f}: {azide.limit.words}{mass}{where}",
        f"rule of six {keeps}; oxygen balance {one_decimal(azide.oxygen_balance)} %, no measure of azides;"
        f" {source_text(azide.limit.source)}, read {azide.limit.read}",
    )


def _mutagens(case: Case) -> Iterator[Fact]:
    species = mutagenic_species(case)
    for each in species:
        limit = each.alert.note if each.alert.is_of_concern else ""
        yield Fact(each.name, f"{each.alert.name}, {each.whence}", limit)
    if species:
        detail = "drug substances only; not for the cohort of concern; the local quality unit decides"
        yield Fact("Limit", limits_text(), f"{source_text('ich-m7')}; {detail}")


def _heat(case: Case) -> Iterator[Fact]:
    """Yield adiabatic rise, MTSR and criticality, each with its value or with what is missing for it."""
    forms_gas = bool(gases_of_record(case.record, case.structures, case.amounts))
    screen = thermal_screen(case.record, case.structures, case.amounts, forms_gas=forms_gas)
    rise = f"{one_decimal(screen.rise_k)} K, severity {screen.severity}" if screen.rise_k is not None else ""
    mtsr = f"{one_decimal(screen.mtsr_c)} °C" if screen.mtsr_c is not None else ""
    criticality = f"class {screen.criticality} of 5" if screen.criticality is not None else ""
    if not any((rise, mtsr, criticality)) and case.record.thermal is None:
        yield Fact(
            "adiabatic rise, MTSR, criticality", "not assessed", f"missing: {_listed(screen.missing['criticality'])}"
        )
        return
    for what, value in (("adiabatic rise", rise), ("MTSR", mtsr), ("criticality", criticality)):
        lacking = screen.missing.get(what, ())
        yield Fact(what, value or "not assessed", "" if value else f"missing: {_listed(lacking)}")
    given = case.record.thermal
    if given is not None and given.onset is not None:
        yield Fact("onset of decomposition", str(given.onset.temperature), f"by {given.onset.by}")
    yield Fact("From", given.source if given else "", f"{SCREEN_ONLY}; {source_text(THERMAL_SOURCE)}")


def _listed(words: tuple[str, ...]) -> str:
    return ", ".join(words)
