"""Gas: how much of it the charged substances can give off, its volume, and the pressure in a closed vessel.

Screening estimates for checks and cautions, not a safety assessment: complete reaction, ideal gas. The gases stand in
gases.tsv, what gives them off in gas_sources.tsv.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache, lru_cache

from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.amounts import AmountRow, Amounts, present_rows
from builder.mechanism.log_rate import GAS_CONSTANT
from builder.mechanism.solvents import solvent_of, structure_of
from builder.records.model import Record
from builder.records.vocabulary import NucleophileWord, YieldKind
from builder.rule import Path
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = [
    "ATMOSPHERE_BAR",
    "ZERO_C_IN_K",
    "Gas",
    "GasFormed",
    "InFlask",
    "closed_vessel_bar",
    "gas_volume_l",
    "gases_from",
    "gases_of_record",
    "load_gases",
    "present_in",
]

ATMOSPHERE_BAR = 1.01325
ZERO_C_IN_K = 273.15
PERMANENT_BELOW_C = -50.0  # boils lower: no solvent at the bench holds back much of it; common practice, no source
_BAR_L_PER_J = 0.01
_STRONG_ACID = "Cl"  # stands for whatever acid the leaving group makes


@dataclass(frozen=True, slots=True)
class Gas:
    """One gas. bp_c: °C at 1.013 bar. hazard: a few words ("toxic, flammable"). source: key of the bibliography."""

    formula: str
    name: str
    bp_c: float
    hazard: str
    source: str

    @property
    def is_permanent(self) -> bool:
        """Say whether it stays a gas in a flask; others condense, or dissolve in part."""
        return self.bp_c < PERMANENT_BELOW_C


@dataclass(frozen=True, slots=True)
class InFlask:
    """A substance in the flask. moles: None where the record cannot tell."""

    path: Path
    structure: Structure
    moles: float | None


@dataclass(frozen=True, slots=True)
class GasFormed:
    """Gas that the flask can give off: at most so many moles, None where an amount is unknown.

    cause: what gives it ("carbonate or hydrogencarbonate with acid"). paths: of the substances it comes from.
    source: key of the bibliography for the reaction.
    """

    gas: Gas
    moles: float | None
    cause: str
    paths: tuple[Path, ...]
    source: str


def gas_volume_l(moles: float, temperature_c: float = 25.0, pressure_bar: float = ATMOSPHERE_BAR) -> float:
    """Return the volume (L) of an ideal gas, V = nRT/p.

    >>> round(gas_volume_l(1.0), 2), round(gas_volume_l(1.0, 25.0, 1.0), 2), round(gas_volume_l(1.0, 0.0, 1.0), 2)
    (24.47, 24.79, 22.71)
    """
    return moles * GAS_CONSTANT * _BAR_L_PER_J * (temperature_c + ZERO_C_IN_K) / pressure_bar


def closed_vessel_bar(
    temperature_c: float,
    vapour_bar: float,
    gas_moles: float = 0.0,
    headspace_l: float | None = None,
    closed_at_c: float = 25.0,
    inert_bar: float = ATMOSPHERE_BAR,
) -> float:
    """Return the absolute pressure (bar) in a closed vessel: p = p_vap(T) + p_inert T/T0 + nRT/V.

    vapour_bar: of the solvent at `temperature_c`. inert_bar: of the gas shut in at `closed_at_c`.
    gas_moles: formed inside; they need a `headspace_l`.
    Raises ValueError for gas without a headspace: its pressure would be a guess.
    """
    if gas_moles and not headspace_l:
        raise ValueError("the pressure of a gas needs the volume of the headspace")
    warmed = inert_bar * (temperature_c + ZERO_C_IN_K) / (closed_at_c + ZERO_C_IN_K)
    formed = gas_volume_l(gas_moles, temperature_c, 1.0) / headspace_l if headspace_l else 0.0
    return vapour_bar + warmed + formed


def gases_from(present: Sequence[InFlask]) -> tuple[GasFormed, ...]:
    """Return the gases that these substances give off together, in the order of gas_sources.tsv.

    Complete reaction is assumed: the moles are upper bounds.
    """
    formed = (_formed(source, present) for source in _sources())
    return tuple(each for each in formed if each is not None)


def gases_of_record(
    record: Record, structures: Mapping[Path, Structure], amounts: Amounts, stage: int | None = None
) -> tuple[GasFormed, ...]:
    """Return the gases that a record can give off: from what was charged, and products that are gases.

    stage: only those that form in this stage, so that what left an open flask earlier is not counted; products form
    in the last stage. None: those of all stages.
    Of a product its stated yield counts, else as much as there was substrate. A solvolysis sets one acid free for each
    substrate, which drives carbon dioxide out of a hydrogencarbonate that was meant as buffer.
    """
    last = len(record.stages) - 1
    index = last if stage is None else stage
    present = present_in(record, structures, amounts, index)
    formed = gases_from((*present, *_acid_set_free(record, amounts)) if index == last else present)
    if stage:
        before = {
            (each.gas, each.cause): each for each in gases_from(present_in(record, structures, amounts, stage - 1))
        }
        formed = tuple(each for each in (_since(one, before.get((one.gas, one.cause))) for one in formed) if each)
    return (*formed, *_gaseous_products(record, structures, amounts)) if index == last else formed


def present_in(
    record: Record, structures: Mapping[Path, Structure], amounts: Amounts, stage: int
) -> tuple[InFlask, ...]:
    """Return what is in the flask during a stage with its moles; solvents by the density of the table.

    What has no structure is left out; what an earlier stage made or used up is not followed.
    """
    present: list[InFlask] = []
    for row in present_rows(record, amounts, stage):
        drawn = structures.get(row.path)
        structure = structure_of(row.name, drawn) if row.path[0] == "solvent" else drawn
        if structure is not None:
            present.append(InFlask(row.path, structure, _moles(row, structure)))
    return tuple(present)


def _acid_set_free(record: Record, amounts: Amounts) -> tuple[InFlask, ...]:
    """Return the strong acid that a solvolysis leaves, as much as there was substrate; empty for other reactions."""
    if record.nucleophile != NucleophileWord.SOLVENT:
        return ()
    return (InFlask(("substrate",), parse_smiles(_STRONG_ACID), amounts.substrate.amount_mol),)


def _since(formed: GasFormed, before: GasFormed | None) -> GasFormed | None:
    """Return what formed after the stage before; None where nothing did, or an unknown amount had."""
    if before is None:
        return formed
    if formed.moles is None or before.moles is None or formed.moles <= before.moles * 1.001:
        return None
    return GasFormed(formed.gas, formed.moles - before.moles, formed.cause, formed.paths, formed.source)


def _moles(row: AmountRow, structure: Structure) -> float | None:
    """Return the moles of a row; of a solvent measured by volume, by the density of the table."""
    if row.amount_mol is not None or row.volume_l is None:
        return row.amount_mol
    solvent = solvent_of(row.name, structure)
    if solvent is None or solvent.density_g_ml is None:
        return None
    return row.volume_l * 1000.0 * solvent.density_g_ml / structure.mass


def _gaseous_products(record: Record, structures: Mapping[Path, Structure], amounts: Amounts) -> tuple[GasFormed, ...]:
    found: list[GasFormed] = []
    for index, product in enumerate(record.outcome.products):
        path: Path = ("outcome", "products", index)
        gas = _by_smiles().get(structures[path].smiles) if path in structures else None
        if gas is not None:
            yields = [
                line.yield_.magnitude
                for line in record.outcome.measured
                if line.yield_ is not None and line.kind is not YieldKind.AREA and product.label in (line.of or ())
            ]
            share = max(yields, default=100.0) / 100.0
            substrate = amounts.substrate.amount_mol
            moles = None if substrate is None else share * substrate
            found.append(GasFormed(gas, moles, f"product {product.label}", (path,), gas.source))
    return tuple(found)


# --- the tables -----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Source:
    """One row of gas_sources.tsv; its header explains the columns."""

    gas: Gas
    per_gives: float
    gives: Fragment
    partner: Fragment | None
    per_partner: float
    spends: Fragment | None
    takes: Fragment | None
    beside: Fragment | None
    cause: str
    source: str


def _formed(source: _Source, present: Sequence[InFlask]) -> GasFormed | None:
    """Return what one source gives off; None where something it needs is not there, or nothing is left over."""
    givers = [each for each in present if _is_in(source.gives, each.structure)]
    if not givers:
        return None
    partners = [each for each in present if source.partner is not None and _is_in(source.partner, each.structure)]
    lacks_company = source.beside is not None and not any(_is_in(source.beside, each.structure) for each in present)
    if (source.partner is not None and not partners) or lacks_company:
        return None
    given = _times(source.per_gives, _sites(source.gives, givers))
    if source.partner is not None:
        allowed = _less(_sites(source.partner, partners), source.spends, present)
        allowed = _times(source.per_partner, allowed)
        given = None if given is None or allowed is None else min(given, allowed)
    moles = _less(given, source.takes, present)
    if moles is not None and moles <= 0.0:
        return None
    paths = dict.fromkeys(each.path for each in (*givers, *partners))
    return GasFormed(source.gas, moles, source.cause, tuple(paths), source.source)


@lru_cache(maxsize=4096)
def _is_in(fragment: Fragment, structure: Structure) -> bool:
    return fragment.is_in(structure)


def _sites(fragment: Fragment, present: Sequence[InFlask]) -> float | None:
    """Return the moles of matches; None where a substance that matches has no amount."""
    counts = [(fragment.count_in(each.structure), each.moles) for each in present]
    total = 0.0
    for count, moles in counts:
        if count and moles is None:
            return None
        total += count * (moles or 0.0)
    return total


def _times(factor: float, moles: float | None) -> float | None:
    return None if moles is None else factor * moles


def _less(moles: float | None, taker: Fragment | None, present: Sequence[InFlask]) -> float | None:
    """Return the moles that are left when each match of `taker` has taken one."""
    taken = _sites(taker, present) if taker is not None else 0.0
    return None if moles is None or taken is None else max(0.0, moles - taken)


@cache
def load_gases() -> dict[str, Gas]:
    """Return the gases by formula.

    Raises ValueError for a wrong header, blank cells, unknown sources and formulae given twice.
    """
    rows = _gas_rows()
    refuse_twice("gases.tsv", "formula", [row["formula"] for row in rows])
    return {
        row["formula"]: Gas(row["formula"], row["name"], float(row["bp_c"]), row["hazard"], row["source"])
        for row in rows
    }


@cache
def _by_smiles() -> dict[str, Gas]:
    drawn = {row["formula"]: row["smiles"] for row in _gas_rows() if row["smiles"] != NOTHING}
    return {parse_smiles(smiles).smiles: load_gases()[formula] for formula, smiles in drawn.items()}


def _gas_rows() -> list[dict[str, str]]:
    columns = ("formula", "name", "smiles", "bp_c", "hazard", "source")
    return list(rows_of("gases.tsv", table_text("builder.mechanism", "gases.tsv"), columns))


@cache
def _sources() -> tuple[_Source, ...]:
    name = "gas_sources.tsv"
    columns = ("gas", "per_gives", "gives", "partner", "per_partner", "spends", "takes", "beside", "cause", "source")
    return tuple(
        _Source(
            gas=load_gases()[row["gas"]],
            per_gives=float(row["per_gives"]),
            gives=Fragment.from_smarts(row["gives"]),
            partner=_fragment(row["partner"]),
            per_partner=0.0 if row["per_partner"] == NOTHING else float(row["per_partner"]),
            spends=_fragment(row["spends"]),
            takes=_fragment(row["takes"]),
            beside=_fragment(row["beside"]),
            cause=row["cause"],
            source=row["source"],
        )
        for row in rows_of(name, table_text("builder.mechanism", name), columns)
    )


def _fragment(smarts: str) -> Fragment | None:
    return None if smarts == NOTHING else Fragment.from_smarts(smarts)
