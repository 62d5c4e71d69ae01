"""What was charged: amounts that follow, and quantities typed twice."""

from collections.abc import Iterator

from builder.checks.case import Case
from builder.checks.slips import Mismatch, explained, is_saline_hydride, level_of, typed_text
from builder.finding import Level
from builder.mechanism.amounts import QUANTITY_ORDER, Role, charged_rows, moles_from, rounding_of
from builder.records.figures import amount_text, concentration_text, equivalents_text, significant, volume_text
from builder.records.model import Charged
from builder.records.vocabulary import ReagentUse
from builder.rule import Fault, rule

__all__ = ["CHARGED_CHECKS"]

LEAST_MOL_PER_L, MOST_MOL_PER_L = 0.005, 5.0  # common practice, no source
USUAL_MOL_PER_L, USUAL_MOL = 0.3, 0.01  # only to tell which of two numbers a thousand apart has slipped
LEAST_EQUIVALENTS, MOST_EQUIVALENTS = 0.001, 100.0
CATALYST_AT_MOST = 1.05  # equivalents
_DISPERSED = ("dispersion", "dispersed", "in oil", "mineral oil", "in paraffin")
_REVIEWED = "safety_review: {by: safety-1, date: 2026-03-12, scope: sodium hydride in DMF at 15 mmol}"


@rule(
    id="amount-not-derivable",
    title="A volume that stands for no amount",
    source="record-format",
    needs=("structure-unreadable", "quantity-missing"),
    fires_on=(
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, volume: 1 mL}",
    ),
    silent_on=(
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, volume: 1 mL,"
        " density: 1.26 g/mL}",
    ),
)
def amount_cannot_be_derived(case: Case) -> Iterator[Fault]:
    """The amount of every substance but a solvent follows from what is typed.

    A volume needs the density of the liquid or the strength of the solution, a mass needs the structure.
    """
    for row in case.amounts.rows:
        if row.role is not Role.SOLVENT and row.amount_mol is None and row.typed and row.typed != "equivalents":
            wanted = "density: 1.26 g/mL or strength: 2.5 mol/L" if row.typed == "volume" else "smiles: '…'"
            yield Fault(
                at=(*row.path, row.typed), message=f"no amount of {row.name} follows from this", mend=f"add {wanted}"
            )


@rule(
    id="quantities-disagree",
    title="Two quantities of one substance disagree",
    level=Level.QUERY,
    source="common-practice",
    needs=("structure-unreadable",),
    fires_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g, equivalents: 1.8}",
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 975 g, amount: 15.0 mmol}",
        "nucleophile: {name: sodium acetate, smiles: '[Na+].CC([O-])=O', mass: 2.04 g, amount: 15.0 mmol}",
        "base: {name: sodium hydride, smiles: '[Na+].[H-]', mass: 0.60 g, amount: 15.0 mmol}",
        "reagents: [{name: sodium iodide, smiles: '[Na+].[I-]', use: catalyst, mass: 150 mg, equivalents: 10}]",
        "concentration: 0.8 mol/L",
    ),
    silent_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g, equivalents: 1.5}",
        "nucleophile: {name: sodium acetate, smiles: '[Na+].CC([O-])=O.O.O.O', mass: 2.04 g, amount: 15.0 mmol}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\noutcome: {result: [no reaction], measured: [{recovered: 96 %, of:"
        " substrate}]}",
        "base: {name: sodium hydride, smiles: '[Na+].[H-]', mass: 0.60 g, purity: 60 %, amount: 15.0 mmol}\n"
        + _REVIEWED,
        "concentration: 0.5 mol/L",
        "concentration: 0.530 mol/L\n"
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, mass: 1.4 g}",
    ),
)
def quantities_disagree(case: Case) -> Iterator[Fault]:
    """Quantities typed as cross-checks agree within 2 %, honest rounding apart; beyond 5 % one of them is wrong.

    The first of mass, amount, volume, equivalents is believed and used for everything; the others only check it. What
    would explain the difference is named: a slipped prefix (1000), a purity or density left out, a dispersion in oil,
    mol% typed as equivalents, or another form of the substance than the one drawn (hydrate, salt, free base, bare ion).
    A concentration is the amount of substrate over the volume of solvent; where the number fits the total volume, all
    liquids added up, the finding says so.
    """
    substrate_mol = case.amounts.substrate.amount_mol
    for path, role, substance in charged_rows(case.record):
        structure = case.structures.get(path)
        moles = {
            kind: moles_from(kind, substance, structure, substrate_mol)
            for kind in QUANTITY_ORDER
            if not (role is Role.SUBSTRATE and kind == "equivalents")
        }
        known = {kind: value for kind, value in moles.items() if value}
        used = next(iter(known), None)
        if used is None:
            continue
        for kind, value in known.items():
            rounding = _rounding(case, substance, used) + _rounding(case, substance, kind)
            level = level_of(value / known[used], rounding)
            if kind != used and level is not None:
                usual = _usual_mol(case, role)
                told = Mismatch(substance, structure, used, known[used], kind, value, usual, rounding)
                yield Fault(
                    at=(*path, kind),
                    message=f"{typed_text(substance, used)} of {substance.name} is {amount_text(known[used])},"
                    f" {typed_text(substance, kind)} is {amount_text(value)}: {_apart(value / known[used])} apart",
                    mend=f"{explained(told)}; the {used} is believed and used, so correct it or the {kind}",
                    level=level,
                    data={"ratio": round(value / known[used], 4)},
                )
    yield from _concentration_disagreement(case)


def _rounding(case: Case, substance: Charged, kind: str) -> float:
    """Return by how much rounding may put an amount off; equivalents are rounded twice, the substrate being one."""
    return rounding_of(substance, kind) + (rounding_of(case.record.substrate) if kind == "equivalents" else 0.0)


def _concentration_disagreement(case: Case) -> Iterator[Fault]:
    """Yield a typed concentration that amounts and volumes, which are believed, do not give."""
    typed, volume = case.record.concentration, case.amounts.solvent_volume_l
    moles = case.amounts.substrate.amount_mol
    if typed is None or not volume or moles is None:
        return
    volumes = [solvent.volume for solvent in case.record.solvents if solvent.volume is not None]
    rounding = typed.half_digit + rounding_of(case.record.substrate) + max(each.half_digit for each in volumes)
    level = level_of(typed.magnitude / (moles / volume), rounding)
    if level is None:
        return
    total = sum(row.volume_l for row in case.amounts.rows if row.volume_l is not None)
    if level_of(typed.magnitude / (moles / total), rounding) is None:
        why = f"it fits the total of all liquids, {volume_text(total)}; concentration is per solvent volume"
    elif any(level_of(typed.magnitude / (moles / volume) / factor, rounding) is None for factor in (1000.0, 0.001)):
        why = "a factor of 1000 fits: mmol/L against mol/L"
    else:
        why = "amount and volumes are believed"
    yield Fault(
        at=("concentration",),
        message=f"{typed} typed; {amount_text(moles)} in {volume_text(volume)} of solvent are"
        f" {concentration_text(moles / volume)}",
        mend=f"{why}; correct the number, or drop it: with volumes given it is derived",
        level=level,
    )


@rule(
    id="concentration-implausible",
    title="A dilution that is hardly meant",
    level=Level.QUERY,
    source="common-practice",
    needs=("structure-unreadable", "quantities-disagree"),
    fires_on=(
        "solvent: [{name: DMF, volume: 20 L}]",
        "solvent: [{name: DMF, volume: 1 mL}]",
    ),
    silent_on=(
        "solvent: [{name: DMF, volume: 2 mL}]",
        "# without solvent\nneat: true\nstages: [{temperature: 60 °C, time: 16 h}]",
    ),
)
def concentration_is_implausible(case: Case) -> Iterator[Fault]:
    """The substrate is between 0.005 and 5 mol/L in the solvent.

    Stronger, and the solvent is an additive (2-bromobutane is 9 mol/L neat); weaker, and 100 mmol would need 20 L. A
    factor of 1000 in volume or mass shows here. Rate measurements may be dilute on purpose.
    """
    concentration = case.amounts.concentration_mol_per_l
    outcome = case.record.outcome
    is_measured = outcome.rate_constant is not None or outcome.time_course is not None
    if concentration is None:
        return
    if concentration > MOST_MOL_PER_L or (concentration < LEAST_MOL_PER_L and not is_measured):
        at = ("concentration",) if case.record.concentration is not None else ("solvent", 0)
        yield Fault(
            at=at,
            message=f"the substrate is {concentration_text(concentration)} in the solvent",
            mend="look for mL against L, mg against g; write neat: true where the solvent is none; or accept it",
        )


@rule(
    id="dispersion-without-purity",
    title="A dispersion in oil weighed as if it were pure",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("base: {name: sodium hydride, smiles: '[Na+].[H-]', form: 60 % dispersion in oil, mass: 0.60 g}",),
    silent_on=(
        "base: {name: sodium hydride, smiles: '[Na+].[H-]', form: 60 % dispersion in oil, mass: 0.60 g, purity: 60 %}\n"
        + _REVIEWED,
        "base: {name: sodium hydride, smiles: '[Na+].[H-]', form: 60 % dispersion in oil, amount: 15 mmol}\n"
        + _REVIEWED,
    ),
)
def dispersion_lacks_its_purity(case: Case) -> Iterator[Fault]:
    """A dispersion or suspension in oil that was weighed has its content in `purity`.

    The `form` is text; only `purity` counts. 0.60 g of sodium hydride is 25 mmol pure and 15 mmol as the usual 60 %
    dispersion. A hydride or alkali metal without a word about its form is a remark.
    """
    for path, _, substance in charged_rows(case.record):
        structure = case.structures.get(path)
        is_content_told = substance.purity is not None or substance.strength is not None
        if substance.mass is None or is_content_told or structure is None:
            continue
        text = f"{substance.name} {substance.form or ''}".casefold()
        is_dispersed = any(word in text for word in _DISPERSED)
        if is_dispersed or (is_saline_hydride(structure) and substance.form is None):
            yield Fault(
                at=(*path, "mass"),
                message=f"{substance.mass} of {substance.name} counts as pure: "
                f"{amount_text(substance.mass.magnitude / structure.mass)}",
                mend="add purity: 60 %, as the label says; for the pure solid write purity: 95 % or its form",
                level=None if is_dispersed else Level.REMARK,
            )


@rule(
    id="catalyst-above-stoichiometric",
    title="A catalyst in excess",
    level=Level.QUERY,
    source="common-practice",
    fires_on=("reagents: [{name: sodium iodide, smiles: '[Na+].[I-]', use: catalyst, equivalents: 10}]",),
    silent_on=("reagents: [{name: sodium iodide, smiles: '[Na+].[I-]', use: catalyst, equivalents: 0.10}]",),
)
def catalyst_is_in_excess(case: Case) -> Iterator[Fault]:
    """What is called a catalyst is charged below one equivalent.

    10 mol% is 0.1 equivalents; a percentage typed as equivalents is 100 times too much.
    """
    for row in case.amounts.rows:
        if row.use == ReagentUse.CATALYST and row.equivalents is not None and row.equivalents > CATALYST_AT_MOST:
            meant = f"; {row.equivalents:g} mol% would be {row.equivalents / 100:g}" if row.equivalents >= 2 else ""
            yield Fault(
                at=(*row.path, row.typed),
                message=f"{equivalents_text(row.equivalents)} equivalents of {row.name}, a catalyst",
                mend=f"correct the number{meant}, or its use",
            )


@rule(
    id="equivalents-implausible",
    title="An excess or a trace that is hardly meant",
    level=Level.QUERY,
    source="common-practice",
    needs=("quantities-disagree", "concentration-implausible", "catalyst-above-stoichiometric"),
    fires_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', amount: 15 mol}",
        "base: {name: sodium hydroxide, smiles: '[Na+].[OH-]', mass: 0.20 mg}",
    ),
    silent_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', amount: 15 mmol}",
        "reagents: [{name: sodium iodide, smiles: '[Na+].[I-]', use: catalyst, equivalents: 0.01}]",
    ),
)
def equivalents_are_implausible(case: Case) -> Iterator[Fault]:
    """What is charged beside the solvent is between a thousandth of the substrate and a hundred times as much.

    Beyond, a prefix has slipped: mg for g, mol for mmol, L for mL. A reagent in larger excess is a solvent, and is
    listed as one.
    """
    for row in case.amounts.rows[1:]:
        is_out = row.equivalents is not None and not LEAST_EQUIVALENTS <= row.equivalents <= MOST_EQUIVALENTS
        if row.role is not Role.SOLVENT and row.equivalents is not None and row.amount_mol is not None and is_out:
            yield Fault(
                at=(*row.path, row.typed),
                message=f"{amount_text(row.amount_mol)} of {row.name} are"
                f" {equivalents_text(row.equivalents)} equivalents",
                mend="look for mg against g, mol against mmol, L against mL; or accept it with the reason",
                data={"equivalents": row.equivalents},
            )


CHARGED_CHECKS = (
    amount_cannot_be_derived,
    catalyst_is_in_excess,
    concentration_is_implausible,
    dispersion_lacks_its_purity,
    equivalents_are_implausible,
    quantities_disagree,
)


def _usual_mol(case: Case, role: Role) -> float:
    """Return about how much of a substance is usual: as much as substrate; of that, for 0.3 mol/L, else 10 mmol."""
    volume, substrate_mol = case.amounts.solvent_volume_l, case.amounts.substrate.amount_mol
    if role is Role.SUBSTRATE or not substrate_mol:
        return USUAL_MOL_PER_L * volume if volume else USUAL_MOL
    return substrate_mol


def _apart(ratio: float) -> str:
    return (
        f"a factor of {significant(max(ratio, 1 / ratio))}"
        if not 1 / 1.5 < ratio < 1.5
        else f"{100 * abs(ratio - 1):.1f} %"
    )
