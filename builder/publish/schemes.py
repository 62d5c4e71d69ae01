"""What the scheme of an entry shows: which compounds, which arrows, which words."""

from dataclasses import dataclass

from markupsafe import Markup

from builder.checks.case import Case
from builder.checks.derivation import main_route, routes_by_product
from builder.chemistry.inks import standalone
from builder.chemistry.perception import ReactiveSite, sites_of
from builder.chemistry.scheme import Arrow, DrawnCompound, draw_scheme, legend
from builder.chemistry.structure import AtomId, Structure
from builder.publish.figures import joined
from builder.publish.measured import yield_caption
from builder.records.figures import equivalents_text
from builder.records.model import Record, Stage
from builder.records.vocabulary import NucleophileWord
from builder.rule import Path

__all__ = ["Scheme", "arrow_of", "entry_scheme"]

LARGEST_OUTLINED_GROUP = 12
"""Heavy atoms of a leaving group that still gets one outline; a tosylate has eleven."""

Step = list[DrawnCompound] | Arrow


@dataclass(frozen=True, slots=True)
class Scheme:
    """A drawn scheme: as rows, and as one column for a phone.

    words: what it shows. legend: what its outlines mean.
    """

    wide: Markup
    tall: Markup
    words: str
    legend: str

    @property
    def file(self) -> bytes:
        """Return the drawing in rows as an SVG file."""
        return standalone(str(self.wide)).encode()


def entry_scheme(case: Case) -> Scheme | None:
    """Return the scheme of a record; None where the substrate has no structure that could be read."""
    if ("substrate",) not in case.structures:
        return None
    steps, words = _steps(case), scheme_words(case)
    wide = draw_scheme(steps, name=words, ident=f"{case.record.entry}-wide", layout="wide")
    tall = draw_scheme(steps, name=words, ident=f"{case.record.entry}-tall", layout="tall")
    # Drawings are our own; every text in them is escaped where it is set.
    return Scheme(Markup(wide), Markup(tall), words, legend(steps))  # noqa: S704


def scheme_words(case: Case) -> str:
    """Return the reaction in one sentence, the accessible name of its scheme."""
    record = case.record
    partners = _partners(record)
    start = f"{record.substrate.name} with {joined(partners, ' and ')}" if partners else record.substrate.name
    solvents = joined((solvent.name for solvent in record.solvents), " and ") or "no solvent"
    last = record.stages[-1]
    products = joined((product.name for product in record.outcome.products), ", ")
    sought = record.outcome.sought
    ends = f"gives {products}" if products else "gives no product"
    if not products and sought:
        ends = f"does not give {sought.name}"
    return f"{start} in {solvents} at {last.temperature} {ends}"


def _partners(record: Record) -> list[str]:
    words = {NucleophileWord.SOLVENT: ["the solvent"], NucleophileWord.INTERNAL: ["its own neighbouring group"]}
    named = [nucleophile.name for nucleophile in record.nucleophiles]
    if isinstance(record.nucleophile, NucleophileWord):
        named = words.get(record.nucleophile, [])
    return [*named, *(base.name for base in record.bases)]


def _steps(case: Case) -> list[Step]:
    record = case.record
    steps: list[Step] = [[_leaver(case, ("substrate",), record.substrate.name)]]
    for index, stage in enumerate(record.stages):
        path = ("stages", index, "gives")
        last = index == len(record.stages) - 1
        if stage.gives is not None and path in case.structures and not last:
            steps += [_arrow(case, _stages_up_to(case, index)), [_leaver(case, path, stage.gives.name)]]
    steps.append(_arrow(case, _stages_up_to(case, len(record.stages) - 1)))
    ends = _ends(case)
    return [*steps, ends] if ends else steps


def _stages_up_to(case: Case, index: int) -> tuple[int, ...]:
    """Return the stages that share an arrow: those since the last intermediate that is drawn."""
    first = max(
        (
            i + 1
            for i, stage in enumerate(case.record.stages[:index])
            if stage.gives is not None and ("stages", i, "gives") in case.structures
        ),
        default=0,
    )
    return tuple(range(first, index + 1))


def _leaver(case: Case, path: Path, name: str) -> DrawnCompound:
    """Return a compound with leaving group and reacting carbon outlined, where it bears the group that leaves.

    Of several such carbons it is the one from which the wanted product follows.
    """
    structure = case.structures[path]
    route = main_route(case)
    chosen = (route.site,) if route is not None and route.start == structure else ()
    site = next(iter((*chosen, *sites_of(structure, case.record.substrate.leaving_group))), None)
    if site is None:
        return DrawnCompound(structure, caption=name)
    return DrawnCompound(
        structure, caption=name, leaves=_leaving_group(structure, site), points=frozenset({site.alpha_carbon})
    )


def _leaving_group(structure: Structure, site: ReactiveSite) -> frozenset[AtomId]:
    """Return the atoms that leave; the leaving atom alone where it stays bonded, or drags a large piece along."""
    if site.leaving_atom is None:
        return frozenset()
    alone = frozenset({site.leaving_atom})
    if site.leaving_ring_size is not None:
        return alone
    group, waiting = set(alone), [site.leaving_atom]
    while waiting:
        around = {atom for atom, _ in structure.atoms[waiting.pop()].neighbours} - group - {site.alpha_carbon}
        group |= around
        waiting += around
    return frozenset(group) if len(group) <= LARGEST_OUTLINED_GROUP else alone


def _drawn(case: Case, path: Path, *, label: str = "", caption: str = "") -> DrawnCompound:
    structure = case.structures[path]
    routes = routes_by_product(case).get(path, ())
    arrives = next((route.arrives for route in routes if route.product == structure), frozenset())
    return DrawnCompound(structure, label=label, caption=caption, arrives=arrives)


def _ends(case: Case) -> list[DrawnCompound]:
    outcome = case.record.outcome
    drawn = [
        _drawn(case, ("outcome", "products", i), label=p.label, caption=yield_caption(outcome, p.label))
        for i, p in enumerate(outcome.products)
        if ("outcome", "products", i) in case.structures
    ]
    if not drawn and ("outcome", "sought") in case.structures:
        return [_drawn(case, ("outcome", "sought"), caption="sought, not found")]
    return drawn


def arrow_of(case: Case) -> Arrow:
    """Return the whole reaction of a record as one arrow."""
    return _arrow(case, tuple(range(len(case.record.stages))))


def _arrow(case: Case, stages: tuple[int, ...]) -> Arrow:
    record = case.record
    whole = len(stages) == len(record.stages)
    added = {name for i in stages for name in record.stages[i].add or ()}
    reagents = [
        joined((row.name, f"({equivalents_text(row.equivalents)} equiv)" if row.equivalents else ""), " ")
        for row in case.amounts.rows
        if row.role in {"nucleophile", "base", "reagent"} and (whole or row.name in added)
    ]
    solvents = [row.name for row in case.amounts.rows if row.role == "solvent" and (whole or row.name in added)]
    failed = not any(result.gives_products for result in record.outcome.result)
    return Arrow(
        above=tuple(reagents),
        below=tuple(part for part in (joined(solvents), *(_stage_line(record.stages[i]) for i in stages)) if part),
        failed=failed and stages[-1] == len(record.stages) - 1,
    )


def _stage_line(stage: Stage) -> str:
    return f"{stage.temperature}, {stage.time}"
