"""Rules that compare a number with a limit: azides, heat, impurities, restricted solvents.

Screening estimates, not safety assessments. A number is shown with its limit; what is not assessed says so.
"""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from builder.checks.case import Case, compounds_of
from builder.checks.hazards.azides import AzideView, azides_of
from builder.checks.hazards.cautions import WHO_DECIDES, Severity
from builder.checks.hazards.formed import formed_by
from builder.checks.hazards.formulae import RULE_OF_SIX, one_decimal
from builder.checks.hazards.gases import gases_evolved
from builder.checks.hazards.meetings import Whereabouts
from builder.checks.hazards.mutagens import MutagenAlert, alert_of, limits_text
from builder.checks.hazards.presents import hazards_of, presents_of
from builder.checks.hazards.scope import is_mass_reviewed
from builder.checks.hazards.solvent_limits import load_restrictions
from builder.finding import Level
from builder.mechanism.gas import gas_volume_l, gases_of_record
from builder.mechanism.thermal import (
    LOW_BELOW_K,
    SCREEN_ONLY,
    THERMAL_SOURCE,
    CriticalityClass,
    ThermalScreen,
    ThermalSeverity,
    thermal_screen,
)
from builder.records.model import Compound, Product
from builder.records.vocabulary import ProductUse
from builder.rule import Fault, Path, rule

__all__ = ["SCREEN_CHECKS", "MutagenicSpecies", "mutagenic_species"]

_TWO_AZIDOBUTANE = """\
substrate: {{name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, amount: {amount}}}
nucleophile: {{name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.3}}
solvent: [{{name: DMSO, volume: 500 mL}}]
stages: [{{temperature: 50 °C, time: 16 h}}]
outcome:
  result: [substitution]
  products: [{{label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired}}]
  measured: [{{yield: 85 %, of: A, kind: {kind}, by: weighed}}]
safety_review: {{by: safety-1, date: 2026-03-12, scope: '{scope}'}}
"""


@rule(
    id="azide-over-limit",
    title="More of an organic azide than may be isolated",
    source="azide-guideline",
    fires_on=(
        _TWO_AZIDOBUTANE.format(amount="72.98 mmol", kind="isolated", scope="azide at 100 mmol"),
        _TWO_AZIDOBUTANE.format(amount="72.98 mmol", kind="isolated", scope="azide at 100 mmol, azide up to 5.5 g"),
    ),
    silent_on=(
        _TWO_AZIDOBUTANE.format(amount="50 mmol", kind="isolated", scope="azide at 50 mmol"),
        _TWO_AZIDOBUTANE.format(amount="72.98 mmol", kind="assay", scope="azide at 100 mmol"),
        _TWO_AZIDOBUTANE.format(amount="72.98 mmol", kind="isolated", scope="azide at 73 mmol, azide up to 6.5 g"),
    ),
)
def azide_is_over_limit(case: Case) -> Iterator[Fault]:
    """An organic azide is isolated only up to the mass that its carbon to nitrogen ratio allows, unless reviewed.

    Below 1 carbon and oxygen atom per nitrogen atom it is not isolated at all, between 1 and 3 up to 5 g, from 3 on up
    to 20 g. The mass is the one weighed, else scale times yield, with others in a mixture as an upper bound; what stays
    in solution does not count. A safety review lifts it where its scope states a mass of azide as large as that. The
    rule of six and the oxygen balance stand beside it as second opinions.
    """
    for azide in azides_of(case):
        mass_g = azide.mass_g
        if azide.is_over and mass_g is not None and not is_mass_reviewed(case, azide.present, mass_g):
            yield Fault(
                at=azide.path,
                message=f"{azide.name}: {azide.mass_text}, and (C + O)/N {azide.ratio:.2f} says "
                f"{azide.limit.words}; {_second_opinions(azide)}",
                mend=f"keep it in solution, or run it in parts; otherwise have {mass_g:.3g} g reviewed and"
                f" named in the scope of safety_review; {WHO_DECIDES}",
                data={
                    "carbon_ratio": round(azide.ratio, 2),
                    "mass_g": mass_g,
                    "most_g": azide.limit.most_g,
                    "carbons_per_azide": azide.carbons_per_azide,
                    "oxygen_balance_percent": round(azide.oxygen_balance, 1),
                    "severity": Severity.STOP.value,
                },
                source=azide.limit.source,
            )


def _second_opinions(azide: AzideView) -> str:
    keeps = "keeps" if azide.carbons_per_azide >= RULE_OF_SIX else "breaks"
    return (
        f"it {keeps} the rule of six; oxygen balance {one_decimal(azide.oxygen_balance)} %, which says little of azides"
    )


# --- heat -------------------------------------------------------------------------------------------------------

_THERMAL = "thermal: {{reaction_enthalpy: {enthalpy} kJ/mol, heat_capacity: 1.8 J/(g K), source: RC1 run 12{more}}}"
_GRAVE = frozenset({CriticalityClass.THREE, CriticalityClass.FOUR, CriticalityClass.FIVE})


@rule(
    id="thermal-runaway",
    title="A reaction that heats itself past a limit",
    level=Level.CAUTION,
    source=THERMAL_SOURCE,
    fires_on=(
        f"# without solvent\nneat: true\n{_THERMAL.format(enthalpy='-180', more='')}",
        _THERMAL.format(enthalpy="-60", more=", accumulation: 100 %, onset: {temperature: 65 °C, by: DSC}"),
    ),
    silent_on=(
        _THERMAL.format(enthalpy="-60", more=", accumulation: 100 %"),
        _THERMAL.format(enthalpy="-60", more=", accumulation: 40 %, onset: {temperature: 180 °C, by: DSC}"),
    ),
)
def reaction_can_run_away(case: Case) -> Iterator[Fault]:
    """The heat of a reaction, let go at once, lies above a limit: adiabatic rise, MTSR or criticality class.

    From given data only: a rise of 50 K and more, or any where gas forms; a maximum temperature of the synthesis
    reaction (MTSR) that reaches the measured onset of decomposition; or class 3 to 5 of Stoessel. Silence is no
    clearance: it is a screening estimate, and without the data nothing is assessed.
    """
    if case.record.thermal is None:
        return
    forms_gas = bool(gases_of_record(case.record, case.structures, case.amounts))
    screen = thermal_screen(case.record, case.structures, case.amounts, forms_gas=forms_gas)
    said = [*_rise_said(screen), *_temperatures_said(screen)]
    if said:
        yield Fault(
            at=("thermal",),
            message=f"{'; '.join(said)}; {SCREEN_ONLY}",
            mend=f"dose instead of charging at once, dilute, measure the heat before any larger scale; {WHO_DECIDES}",
            data={"rise_k": screen.rise_k, "mtsr_c": screen.mtsr_c, "severity": Severity.WARN.value},
        )


def _rise_said(screen: ThermalScreen) -> Iterator[str]:
    if screen.rise_k is not None and screen.severity is not ThermalSeverity.LOW:
        gas = " because gas forms" if screen.rise_k < LOW_BELOW_K else ""
        yield f"adiabatic rise {screen.rise_k:.1f} K, severity {screen.severity}{gas}"


def _temperatures_said(screen: ThermalScreen) -> Iterator[str]:
    if screen.mtsr_c is not None and screen.onset_c is not None and screen.mtsr_c >= screen.onset_c:
        yield f"MTSR {one_decimal(screen.mtsr_c)} °C reaches the onset of decomposition at {screen.onset_c:g} °C"
    if screen.criticality in _GRAVE:
        yield f"criticality class {screen.criticality} of 5"


@rule(
    id="thermal-not-assessed",
    title="Thermal data from which nothing can be worked out",
    level=Level.REMARK,
    source=THERMAL_SOURCE,
    fires_on=(
        "thermal: {reaction_enthalpy: -100 kJ/mol, source: RC1 run 12}",
        "thermal: {heat_capacity: 1.8 J/(g K), accumulation: 40 %, source: RC1 run 12}",
    ),
    silent_on=(_THERMAL.format(enthalpy="-100", more=", accumulation: 40 %"),),
)
def heat_is_not_assessed(case: Case) -> Iterator[Fault]:
    """A record that gives thermal data gives what adiabatic rise and MTSR need.

    Enthalpy of reaction, heat capacity, accumulation, and the mass of everything charged. What is missing is never
    assumed.
    """
    if case.record.thermal is None:
        return
    screen = thermal_screen(case.record, case.structures, case.amounts)
    for what in ("adiabatic rise", "MTSR"):
        if missing := screen.missing.get(what):
            yield Fault(
                at=("thermal",),
                message=f"{what} not assessed; missing: {', '.join(missing)}",
                mend="add reaction_enthalpy, heat_capacity, accumulation under thermal, as measured; never an estimate",
                data={"missing": list(missing)},
            )
            return


@rule(
    id="gas-evolved",
    title="Gas that must go somewhere",
    level=Level.CAUTION,
    source="prudent-practices-2011",
    fires_on=(
        "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 12 mmol}]\nwork_up: ['quench with 5 mL methanol']",
        "reagents: [{name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', use: additive, amount: 130 mmol}]\n"
        "work_up: ['neutralised with 2 mol/L hydrochloric acid']",
    ),
    silent_on=(
        "reagents: [{name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', use: additive, amount: 30 mmol}]",
    ),
)
def gas_is_evolved(case: Case) -> Iterator[Fault]:
    """A gas that a reaction, quench or work-up can give off is named with its volume, what it does and where it goes.

    Complete reaction is assumed, and what the work-up names is taken to be there in excess: an upper bound at 25 °C and
    1 atm (24.47 L/mol). The peak rate is that of the dosing. Toxic, corrosive and flammable gases are cautions, others
    remarks; small volumes are left out. Whether a closed vessel holds it is asked elsewhere.
    """
    for evolved in gases_evolved(case, presents_of(case)):
        yield Fault(
            at=evolved.at,
            message=f"{' and '.join(evolved.names)}, {evolved.gas.hazard}: {evolved.shown}, from {evolved.cause}",
            mend=f"{evolved.outlet.outlet}; the rate is that of the dosing; {WHO_DECIDES}",
            data={
                "gas": evolved.gas.formula,
                "moles": evolved.moles,
                "volume_l": None if evolved.moles is None else round(gas_volume_l(evolved.moles), 3),
                "severity": (Severity.WARN if evolved.outlet.level is Level.CAUTION else Severity.NOTE).value,
            },
            level=evolved.outlet.level,
            source=evolved.outlet.source,
        )


# --- impurities and solvents ------------------------------------------------------------------------------------


_HARMLESS = """\
substrate: {name: cyclohexanol, smiles: 'OC1CCCCC1', class: secondary, leaving_group: hydroxyl, amount: 10 mmol}
nucleophile: none
stages: [{temperature: 60 °C, time: 6 h}]
outcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate, by: GC}]}
"""


@dataclass(frozen=True, slots=True)
class MutagenicSpecies:
    """A species with an alert: where it stands, () for one that can form aside; whence says how it comes to be."""

    path: Path
    name: str
    alert: MutagenAlert
    whence: str

    @property
    def shown(self) -> str:
        """Return its name, the alert and whence in words."""
        return f"{self.name} ({self.alert.name}, {self.whence})"


def mutagenic_species(case: Case) -> tuple[MutagenicSpecies, ...]:
    """Return the species of a record with an alert: charged, formed by a stage or aside, obtained beside the product.

    The desired product is left out: it is what the next step is judged by.
    """
    presents, compounds = presents_of(case), dict(compounds_of(case.record))
    found: dict[str, MutagenicSpecies] = {}
    for present in presents:
        alert = alert_of(present.structure) if present.structure is not None else None
        if alert is not None and present.structure is not None and not _is_wanted(present.path, compounds):
            is_formed = present.whereabouts is Whereabouts.PRODUCT or present.path[0] == "stages"
            whence = "formed" if is_formed else "charged"
            found.setdefault(present.structure.smiles, MutagenicSpecies(present.path, present.name, alert, whence))
    for species in formed_by(hazards_of(case), presents):
        alert = alert_of(species.structure) if species.structure is not None else None
        if alert is not None and species.structure is not None:
            whence = f"can form from {' and '.join(species.origins)}"
            found.setdefault(species.structure.smiles, MutagenicSpecies((), species.shown, alert, whence))
    return tuple(found.values())


def _is_wanted(path: Path, compounds: Mapping[Path, Compound]) -> bool:
    compound = compounds[path]
    is_desired = isinstance(compound, Product) and compound.use is not ProductUse.BY_PRODUCT
    return is_desired or path == ("outcome", "sought")


@rule(
    id="mutagenic-impurity",
    title="Species with an alert for mutagenic impurities",
    level=Level.REMARK,
    source="ich-m7",
    fires_on=(
        "reagents: [{name: iodomethane, smiles: CI, use: additive, amount: 1 mmol}]",
        f"{_HARMLESS}reagents: [{{name: methanesulfonic acid, smiles: 'CS(=O)(=O)O', use: acid, amount: 2 mmol}}]\n"
        "solvent: [{name: methanol, volume: 20 mL}]",
    ),
    silent_on=(_HARMLESS + "solvent: [{name: toluene, volume: 20 mL}]", "notebook: BK2/112"),
)
def impurity_may_be_mutagenic(case: Case) -> Iterator[Fault]:
    """Alkylating agents, nitrosamines and their like, charged or formed, are impurities to control in a drug substance.

    By structure: alkyl halides, sulfonate esters, sulfates, epoxides, aziridines, hydrazines, azides, N-nitrosamines.
    Formed ones count: the alkyl chloride from a sulfonyl chloride, methyl chloride from hydrogen chloride in methanol,
    the ester of a sulfonic acid and the alcohol it stands in. A substrate alone is left to its own caution. The limits
    of ICH M7 are for drug substances and nothing else, the threshold never holds for the cohort of concern, and data of
    the compound outweigh both.
    """
    species = mutagenic_species(case)
    if all(each.path == ("substrate",) for each in species):
        return
    concern = dict.fromkeys(f"{each.alert.name}: {each.alert.note}" for each in species if each.alert.is_of_concern)
    others = any(not each.alert.is_of_concern for each in species)
    limits = [*([f"at most {limits_text()}"] if others else []), *concern]
    listed = [each.shown for each in species]
    yield Fault(
        at=("substrate",),
        message=f"alert by structure: {'; '.join(listed)}; in a drug substance, and only there: {'; '.join(limits)}",
        mend="where this leads to a drug substance, show that it is purged or control it; ppm = µg a day / dose in g a"
        " day; the local quality unit decides",
        data={"species": listed},
    )


@rule(
    id="restricted-solvent",
    title="A solvent whose use a law restricts",
    level=Level.REMARK,
    source="reach-annex-xvii",
    fires_on=("solvent: [{name: DMF, volume: 20 mL}]", "solvent: [{name: N-methylpyrrolidone, volume: 20 mL}]"),
    silent_on=(_HARMLESS + "solvent: [{name: DMSO, volume: 20 mL}]",),
)
def solvent_is_restricted(case: Case) -> Iterator[Fault]:
    """A solvent of the record is restricted somewhere; the jurisdiction, the entry and the day are named.

    The values are exposures of workers that must be kept below (DNEL), for the solvent and mixtures with 0.3 % or more
    of it. Laws change: the date on which the table was read stands beside them, and local law decides.
    """
    for present in presents_of(case):
        known = load_restrictions().get(present.structure.smiles) if present.structure is not None else None
        if known is not None and present.path[0] == "solvent":
            yield Fault(
                at=present.path,
                message=f"{present.name}: {known.jurisdiction}, entry {known.entry}, from {known.since}: at most"
                f" {known.inhalation} mg/m³ in air and {known.dermal} mg/kg a day on the skin (read {known.read})",
                mend=f"another solvent, or exposure below these values; {WHO_DECIDES}",
                data={"jurisdiction": known.jurisdiction, "entry": known.entry, "from": known.since},
                source=known.source,
            )


SCREEN_CHECKS = (
    azide_is_over_limit,
    gas_is_evolved,
    heat_is_not_assessed,
    impurity_may_be_mutagenic,
    reaction_can_run_away,
    solvent_is_restricted,
)
