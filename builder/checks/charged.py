"""What was charged: amounts that follow, and quantities typed twice."""

from collections.abc import Iterator

from builder.checks.case import Case
from builder.finding import Level
from builder.mechanism.amounts import QUANTITY_ORDER, Role, charged_rows, moles_from, rounding_of
from builder.records.model import Charged
from builder.rule import Fault, Path, rule

__all__ = ["CHARGED_CHECKS"]

QUERY_ABOVE = 0.02  # relative disagreement; common practice, no source
ERROR_ABOVE = 0.05


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
        "concentration: 0.8 mol/L",
    ),
    silent_on=(
        "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', mass: 0.975 g, equivalents: 1.5}",
        "concentration: 0.5 mol/L",
        "concentration: 0.530 mol/L\n"
        "substrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', class: secondary, leaving_group: bromide, mass: 1.4 g}",
    ),
)
def quantities_disagree(case: Case) -> Iterator[Fault]:
    """Quantities typed as cross-checks agree within 2 %, honest rounding apart; beyond 5 % one of them is wrong.

    The first of mass, amount, volume, equivalents is used for everything; the others only check it. A factor of
    1000 is a slipped prefix, a factor of the purity a forgotten one.
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
            if kind != used:
                yield from _disagreement(path, substance, used, kind, value / known[used])
    yield from _concentration_disagreement(case)


def _disagreement(path: Path, substance: Charged, used: str, kind: str, ratio: float) -> Iterator[Fault]:
    level = _level_of(ratio, rounding_of(substance, used) + rounding_of(substance, kind))
    if level is not None:
        yield Fault(
            at=(*path, kind),
            message=f"{kind} and {used} of {substance.name} differ by {_factor_words(ratio)}",
            mend=_factor_mend(ratio, substance),
            level=level,
            data={"ratio": round(ratio, 4)},
        )


def _level_of(ratio: float, rounding: float) -> Level | None:
    """Return how much a disagreement weighs; None if honest rounding, or the tolerance, explains it."""
    off = abs(ratio - 1.0)
    if off <= max(QUERY_ABOVE, rounding):
        return None
    return Level.ERROR if off > max(ERROR_ABOVE, rounding) else Level.QUERY


def _factor_words(ratio: float) -> str:
    return f"a factor of {ratio:.3g}" if ratio > 1.5 or ratio < 1 / 1.5 else f"{100 * abs(ratio - 1):.1f} %"


def _factor_mend(ratio: float, substance: Charged) -> str:
    for factor in (1000.0, 0.001):
        if abs(ratio / factor - 1.0) < ERROR_ABOVE:
            return "a factor of 1000: look for mg against g, mmol against mol, µL against mL"
    if substance.purity and abs(ratio * substance.purity.magnitude / 100.0 - 1.0) < QUERY_ABOVE:
        return "the factor is the purity: it counts for the mass"
    return "correct one of them; the first of mass, amount, volume, equivalents is used"


def _concentration_disagreement(case: Case) -> Iterator[Fault]:
    typed, volume = case.record.concentration, case.amounts.solvent_volume_l
    moles = case.amounts.substrate.amount_mol
    if typed is None or volume is None or moles is None:
        return
    volumes = [solvent.volume for solvent in case.record.solvents if solvent.volume is not None]
    rounding = typed.half_digit + rounding_of(case.record.substrate) + max(each.half_digit for each in volumes)
    level = _level_of(typed.magnitude / (moles / volume), rounding)
    if level is not None:
        yield Fault(
            at=("concentration",),
            message=f"{typed} typed, {moles / volume:.3g} mol/L from amount and solvent volume",
            mend="correct it, or drop it: with volumes given it is derived",
            level=level,
        )


CHARGED_CHECKS = (
    amount_cannot_be_derived,
    quantities_disagree,
)
