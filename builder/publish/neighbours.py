"""Which entries belong together: sequences of steps, and runs towards the same product under other conditions."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from markupsafe import Markup

from builder.book import Entry
from builder.chemistry.scheme import Arrow, DrawnCompound, draw_scheme
from builder.chemistry.structure import Structure
from builder.publish.figures import joined
from builder.publish.measured import yield_caption
from builder.publish.schemes import arrow_of
from builder.publish.summary import Summary, conditions_strip
from builder.rule import Path

__all__ = ["SequenceView", "Step", "Variant", "same_product", "sequences", "variant_of", "view_sequence"]

LONGEST = 12
"""Steps after which a sequence is cut, so that a ring of records that precede one another ends."""


@dataclass(frozen=True, slots=True)
class Step:
    """One step of a sequence: its number and its entry."""

    number: int
    summary: Summary


@dataclass(frozen=True, slots=True)
class SequenceView:
    """A sequence as one drawing, wide and tall, with its steps; words say what leads to what."""

    words: str
    wide: Markup
    tall: Markup
    steps: tuple[Step, ...]


@dataclass(frozen=True, slots=True)
class Variant:
    """One way to a product, as a row beside the others."""

    summary: Summary
    leaving_group: str
    partners: str
    solvent: str
    temperature: str
    time: str
    scale: str


def variant_of(entry: Entry, summary: Summary) -> Variant:
    """Return an entry as a row beside others that were after the same product."""
    facts = {fact.label: fact.value for fact in conditions_strip(entry)}
    return Variant(
        summary=summary,
        leaving_group=entry.record.substrate.leaving_group,
        partners=joined(facts.get(label, "") for label in ("Nucleophile", "Base", "Reagents")),
        solvent=facts["Solvent"],
        temperature=facts["Temperature"],
        time=facts["Time"],
        scale=facts["Scale"],
    )


def _main_product(entry: Entry) -> Structure | None:
    """Return the structure of the first desired product, or what was sought; None where neither is drawn."""
    outcome, wanted = entry.record.outcome, entry.record.desired
    paths: list[Path] = [("outcome", "products", outcome.products.index(product)) for product in wanted[:1]]
    found = (entry.case.structures.get(path) for path in (*paths, ("outcome", "sought")))
    return next((structure for structure in found if structure is not None), None)


def sequences(entries: Iterable[Entry]) -> tuple[tuple[Entry, ...], ...]:
    """Return every run of entries that make each other's substrate, from its first step to each of its last ones."""
    by_id = {entry.id: entry for entry in entries}
    after: dict[str, list[Entry]] = {}
    for entry in by_id.values():
        for before in (entry.record.preceded_by or ())[:1]:
            after.setdefault(before, []).append(entry)
    found: list[tuple[Entry, ...]] = []
    waiting: list[tuple[Entry, ...]] = [(entry,) for entry in by_id.values() if entry.id in after and not entry.record.preceded_by]
    while waiting:
        run = waiting.pop(0)
        further = [entry for entry in after.get(run[-1].id, ()) if entry not in run and len(run) < LONGEST]
        waiting += [(*run, entry) for entry in further]
        if not further:
            found.append(run)
    return tuple(found)


def same_product(entries: Iterable[Entry]) -> Mapping[str, tuple[Entry, ...]]:
    """Return by identifier the other entries that were after the same product, whatever its stereochemistry."""
    groups: dict[str, list[Entry]] = {}
    for entry in entries:
        product = _main_product(entry)
        if product is not None:
            groups.setdefault(product.flat_smiles, []).append(entry)
    return {entry.id: tuple(e for e in group if e is not entry) for group in groups.values() for entry in group}


def view_sequence(run: Sequence[Entry], summaries: Mapping[str, Summary]) -> SequenceView | None:
    """Return a sequence as shown; None where a structure is missing."""
    drawn: list[list[DrawnCompound] | Arrow] = []
    for number, entry in enumerate(run, start=1):
        product, substrate = _main_product(entry), entry.case.structures.get(("substrate",))
        if product is None or substrate is None:
            return None
        if not drawn:
            drawn.append([DrawnCompound(substrate, caption=entry.record.substrate.name)])
        name, label = _name_of_product(entry)
        drawn += [
            arrow_of(entry.case, above=(f"step {number}",)),
            [DrawnCompound(product, caption=joined((name, yield_caption(entry.record.outcome, label)), "\n"))],
        ]
    words = joined((run[0].record.substrate.name, *(_name_of_product(entry)[0] for entry in run)), " to ")
    ident = f"sequence-{run[-1].id}"
    wide = draw_scheme(drawn, name=words, ident=f"{ident}-wide", layout="wide")
    tall = draw_scheme(drawn, name=words, ident=f"{ident}-tall", layout="tall")
    steps = tuple(Step(i, summaries[entry.id]) for i, entry in enumerate(run, start=1))
    return SequenceView(words, Markup(wide), Markup(tall), steps)  # noqa: S704 - our own drawings, as in schemes


def _name_of_product(entry: Entry) -> tuple[str, str]:
    """Return name and label of what a step leads to; no label for what was only sought."""
    outcome = entry.record.outcome
    if entry.record.desired:
        return entry.record.desired[0].name, entry.record.desired[0].label
    return (outcome.sought.name if outcome.sought else "", "")
