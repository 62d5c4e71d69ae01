"""Organic azides: the carbon to nitrogen rule, the rule of six and the oxygen balance; limits from azide_limits.tsv.

Screens of the formula, never a clearance. The oxygen balance says little of azides and is shown beside the rule only.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache

from builder.checks.case import Case, compounds_of
from builder.checks.hazards.formulae import carbon_ratio, carbons_per_azide, oxygen_balance_percent
from builder.checks.hazards.kinds import hazard_table, kinds_of
from builder.checks.hazards.meetings import Present, Whereabouts
from builder.chemistry.structure import Structure
from builder.records.model import Measurement, Product
from builder.records.vocabulary import YieldKind
from builder.rule import Path
from builder.table import NOTHING

__all__ = ["AzideLimit", "AzideView", "azide_limit", "azides_of", "load_azide_limits"]


_NITROGENS = 3


@dataclass(frozen=True, slots=True)
class AzideLimit:
    """One row of azide_limits.tsv: how much of an azide may be isolated in a range of the carbon ratio."""

    ratio_from: float
    ratio_below: float
    most_g: float
    words: str
    source: str
    revision: str
    read: str


@dataclass(frozen=True, slots=True)
class AzideView:
    """One organic azide of a record, judged.

    mass_g: what the record has of it, None where it cannot tell; is_joint: measured together with other products, so
    that it is an upper bound.
    """

    present: Present
    ratio: float
    carbons_per_azide: float
    oxygen_balance: float
    mass_g: float | None
    is_joint: bool
    is_isolated: bool
    limit: AzideLimit

    @property
    def path(self) -> Path:
        """Return where in the record it stands."""
        return self.present.path

    @property
    def name(self) -> str:
        """Return its name in the record."""
        return self.present.name

    @property
    def mass_text(self) -> str:
        """Return the mass in words."""
        if self.mass_g is None:
            return "mass unknown"
        return f"{'at most ' if self.is_joint else ''}{self.mass_g:.3g} g"

    @property
    def is_over(self) -> bool:
        """Say whether the record holds more than may be isolated."""
        return self.mass_g is not None and self.is_isolated and self.mass_g > self.limit.most_g


@cache
def load_azide_limits() -> tuple[AzideLimit, ...]:
    """Return the limits by rising carbon ratio; ValueError for blanks, unknown sources and gaps between rows."""
    columns = ("ratio_from", "ratio_below", "most_g", "words", "source", "revision", "read")
    found = tuple(
        AzideLimit(
            ratio_from=float(row["ratio_from"]),
            ratio_below=float("inf") if row["ratio_below"] == NOTHING else float(row["ratio_below"]),
            most_g=float(row["most_g"]),
            words=row["words"],
            source=row["source"],
            revision=row["revision"],
            read=row["read"],
        )
        for row in hazard_table("azide_limits.tsv", columns)
    )
    ends = [limit.ratio_below for limit in found]
    if [limit.ratio_from for limit in found] != [0.0, *ends[:-1]] or ends[-1] != float("inf"):
        raise ValueError("azide_limits.tsv: the ranges must follow each other from 0 on")
    return found


def azide_limit(ratio: float) -> AzideLimit:
    """Return the limit for a carbon ratio."""
    return next(limit for limit in load_azide_limits() if ratio < limit.ratio_below)


def azides_of(case: Case) -> Iterator[AzideView]:
    """Yield the organic azides of a record, each once, with the mass that it has of them.

    Of a product it is the isolated mass, else the yield times the scale, of it alone before that of a mixture it is in;
    of what a stage gives, what all of the substrate would give.
    """
    seen: set[str] = set()
    for path, compound in compounds_of(case.record):
        structure = case.structures.get(path)
        if structure is None or structure.smiles in seen or structure.elements.get("N", 0) < _NITROGENS:
            continue
        if "organic azide" not in kinds_of(structure):
            continue
        ratio = carbon_ratio(structure)
        if ratio is None:
            continue
        seen.add(structure.smiles)
        product = compound if isinstance(compound, Product) else None
        lines = _lines_of(case, product)
        is_isolated = product is None or any(line.kind is YieldKind.ISOLATED for line in lines)
        mass_g, is_joint = _mass_g(case, path, structure, lines)
        yield AzideView(
            present=Present(path, compound.name, Whereabouts.PRODUCT, structure),
            ratio=ratio,
            carbons_per_azide=carbons_per_azide(structure),
            oxygen_balance=oxygen_balance_percent(structure),
            mass_g=mass_g,
            is_joint=is_joint,
            is_isolated=is_isolated and not _stays_in_solution(case, path),
            limit=azide_limit(ratio),
        )


def _stays_in_solution(case: Case, path: Path) -> bool:
    """Answer whether a stage gives the azide without isolating it."""
    if path[0] != "stages":
        return False
    given = case.record.stages[int(path[1])].gives
    return given is None or not given.isolated


def _lines_of(case: Case, product: Product | None) -> tuple[Measurement, ...]:
    """Return the measurements of a product, those of mixtures that it is in too."""
    if product is None:
        return ()
    return tuple(line for line in case.record.outcome.measured if product.label in (line.of or ()))


def _mass_g(case: Case, path: Path, structure: Structure, lines: tuple[Measurement, ...]) -> tuple[float | None, bool]:
    """Return a mass in g, None where the record cannot tell, and whether it is that of a mixture."""
    if path[0] not in {"stages", "outcome"}:
        return case.amounts.at(path).mass_g, False
    scale_mol = case.amounts.substrate.amount_mol
    all_g = None if scale_mol is None else scale_mol * structure.mass
    if path[:2] != ("outcome", "products"):
        return all_g, False
    alone = _measured_g([line for line in lines if len(line.of or ()) == 1], all_g)
    return (alone, False) if alone is not None else (_measured_g(lines, all_g), True)


def _measured_g(lines: Sequence[Measurement], all_g: float | None) -> float | None:
    """Return the largest mass that was weighed, else the largest yield of all_g, the mass at a yield of 100 %."""
    masses = [line.mass.magnitude for line in lines if line.mass is not None]
    yields = [line.yield_.magnitude for line in lines if line.yield_ is not None and line.kind is not YieldKind.AREA]
    if masses or not yields or all_g is None:
        return max(masses, default=None)
    return max(yields) / 100.0 * all_g
