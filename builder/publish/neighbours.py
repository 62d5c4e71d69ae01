"""Which entries belong together: sequences of steps, and runs towards the same product under other conditions."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from markupsafe import Markup

from builder.book import Entry
from builder.chemistry.scheme import Arrow, DrawnCompound, draw_scheme
from builder.chemistry.structure import parse_smiles
from builder.publish.figures import joined
from builder.publish.portrait import Portrait
from builder.publish.summary import Summary

__all__ = ["SequenceView", "Variant", "same_product", "sequences", "variant_of", "view_sequence"]


@dataclass(frozen=True, slots=True)
class SequenceView:
    """A sequence as one drawing, wide and tall, with its steps; words say what leads to what."""

    words: str
    wide: Markup
    tall: Markup
    steps: tuple[Summary, ...]


@dataclass(frozen=True, slots=True)
class Variant:
    """One way to a product, as a row beside the others."""

    summary: Summary
    leaving_group: str
    partners: str
    solvent: str
    temperature: str
    time: str


def variant_of(entry: Entry[Portrait], summary: Summary) -> Variant:
    """Return an entry as a row beside others that were after the same product."""
    facts = {fact.label: fact.value for fact in entry.kept.strip}
    return Variant(
        summary=summary,
        leaving_group=entry.record.substrate.leaving_group,
        partners=joined(facts.get(label, "") for label in ("Nucleophile", "Base", "Reagents")),
        solvent=facts["Solvent"],
        temperature=facts["Temperature"],
        time=facts["Time"],
    )


def sequences(entries: Iterable[Entry[Portrait]]) -> tuple[tuple[Entry[Portrait], ...], ...]:
    """Return every run of entries that make each other's substrate, from its first step to each of its last ones.

    An entry follows the first of those it names; so no run comes back to itself. One that the book does not hold, as
    while it is being written, is passed over.
    """
    by_id = {entry.id: entry for entry in entries}
    after: dict[str, list[Entry[Portrait]]] = {}
    first = []
    for entry in by_id.values():
        before = next((each for each in entry.record.preceded_by or () if each in by_id), None)
        if before is None:
            first.append(entry)
        else:
            after.setdefault(before, []).append(entry)
    found: list[tuple[Entry[Portrait], ...]] = []
    waiting: list[tuple[Entry[Portrait], ...]] = [(entry,) for entry in first if entry.id in after]
    while waiting:
        run = waiting.pop(0)
        further = after.get(run[-1].id, ())
        waiting += [(*run, entry) for entry in further]
        if not further:
            found.append(run)
    return tuple(found)


def same_product(entries: Iterable[Entry[Portrait]]) -> Mapping[str, tuple[Entry[Portrait], ...]]:
    """Return by identifier the other entries that were after the same product, whatever its stereochemistry."""
    groups: dict[str, list[Entry[Portrait]]] = {}
    for entry in entries:
        if entry.kept.goal is not None:
            groups.setdefault(entry.kept.goal.flat_smiles, []).append(entry)
    return {entry.id: tuple(e for e in group if e is not entry) for group in groups.values() for entry in group}


def view_sequence(run: Sequence[Entry[Portrait]], summaries: Mapping[str, Summary]) -> SequenceView | None:
    """Return a sequence as shown; None where a structure is missing."""
    start, names = run[0].record.substrate.name, []
    if not run[0].kept.start:
        return None
    drawn: list[list[DrawnCompound] | Arrow] = [[DrawnCompound(parse_smiles(run[0].kept.start), caption=start)]]
    for number, entry in enumerate(run, start=1):
        goal, arrow = entry.kept.goal, entry.kept.arrow
        if goal is None:
            return None
        product = DrawnCompound(parse_smiles(goal.smiles), caption=joined((goal.name, goal.caption), "\n"))
        drawn += [replace(arrow, above=(f"step {number}", *arrow.above)), [product]]
        names.append(goal.name)
    words, ident = joined((start, *names), " to "), f"sequence-{run[-1].id}"
    wide = draw_scheme(drawn, name=words, ident=f"{ident}-wide", layout="wide")
    tall = draw_scheme(drawn, name=words, ident=f"{ident}-tall", layout="tall")
    steps = tuple(summaries[entry.id] for entry in run)
    return SequenceView(words, Markup(wide), Markup(tall), steps)  # noqa: S704 - our own drawings, as in schemes
