"""Portrait: everything a page shows of one case, worked out once into plain data.

A portrait holds no structure and nothing of the other entries: it can be made in another process, sent from there, and
remembered by what it was made from. Texts are plain, not escaped; the templates escape.
"""

from dataclasses import dataclass

from builder.book import Entry
from builder.checks.case import Case, compounds_of
from builder.chemistry.perception import attacking_atoms
from builder.chemistry.scheme import Arrow
from builder.publish.charges import AmountView, StageView, amounts_note, view_amounts, view_stages
from builder.publish.expected import ExpectedView, expected_view, why_nothing_is_expected
from builder.publish.figures import formula_parts
from builder.publish.forecast_parts import GATE_IDS, Closed
from builder.publish.measured import MeasuredLine, measured_lines, outcome_headline, yield_caption
from builder.publish.participants import Participant, participants_of, role_of
from builder.publish.safety import SafetyView, view_safety
from builder.publish.schemes import Scheme, arrow_of, entry_scheme
from builder.publish.summary import Fact, Summary, conditions_line, conditions_strip, scale_mol
from builder.records.figures import molar_mass_text
from builder.records.model import Charged
from builder.records.vocabulary import NucleophileWord
from builder.rule import Path

__all__ = ["CompoundView", "Goal", "Portrait", "portrait_of", "summarise"]


@dataclass(frozen=True, slots=True)
class CompoundView:
    """Identifiers of one compound."""

    name: str
    role: str
    formula: tuple[tuple[str, str], ...]
    molar_mass: str
    cas: str
    inchikey: str
    smiles: str


@dataclass(frozen=True, slots=True)
class Goal:
    """The first desired product, or what was sought: its SMILES as typed, the same without stereochemistry, its words.

    caption: its yield with the kind, empty for what was only sought.
    """

    smiles: str
    flat_smiles: str
    name: str
    caption: str


@dataclass(frozen=True, slots=True)
class Portrait:
    """Everything a page shows of one case.

    conditions, outcome: each in a line. attackers: kinds of what attacks. gates: what closes a pathway in its forecast.
    start: SMILES of the substrate as typed, empty where it could not be read. arrow: the whole reaction as one arrow.
    """

    conditions: str
    outcome: str
    strip: tuple[Fact, ...]
    lines: tuple[MeasuredLine, ...]
    scheme: Scheme | None
    expected: ExpectedView | None
    nothing_expected: str
    amounts: tuple[AmountView, ...]
    amounts_note: str
    stages: tuple[StageView, ...]
    compounds: tuple[CompoundView, ...]
    participants: tuple[Participant, ...]
    attackers: tuple[str, ...]
    gates: tuple[Closed, ...]
    start: str
    goal: Goal | None
    arrow: Arrow
    safety: SafetyView


def portrait_of(case: Case) -> Portrait:
    """Return everything a page shows of a case."""
    substrate = case.structures.get(("substrate",))
    forecast = case.forecast
    strip, lines = conditions_strip(case), measured_lines(case.record, scale_mol(case))
    return Portrait(
        conditions=conditions_line(strip),
        outcome=outcome_headline(case.record, lines),
        strip=strip,
        lines=lines,
        scheme=entry_scheme(case),
        expected=expected_view(case),
        nothing_expected=why_nothing_is_expected(case),
        amounts=view_amounts(case),
        amounts_note=amounts_note(case),
        stages=view_stages(case),
        compounds=_compounds(case),
        participants=participants_of(case),
        attackers=_attackers(case),
        gates=tuple(Closed(r.text, r.rule) for r in forecast.reasons if r.rule in GATE_IDS) if forecast else (),
        start=substrate.typed if substrate is not None else "",
        goal=_goal(case),
        arrow=arrow_of(case),
        safety=view_safety(case),
    )


def summarise(entry: Entry[Portrait]) -> Summary:
    """Return an entry as a list shows it."""
    record = entry.record
    results = set(record.outcome.result)
    return Summary(
        id=entry.id,
        title=record.title,
        date=record.performed.date.isoformat(),
        conditions=entry.kept.conditions,
        outcome=entry.kept.outcome,
        verdict=str(entry.verdict),
        verdict_key=entry.verdict.key,
        take_away=record.take_away or "",
        status=str(record.status),
        is_failure=not any(result.gives_products for result in results) or record.outcome.failure is not None,
    )


def _goal(case: Case) -> Goal | None:
    outcome = case.record.outcome
    wanted = case.record.desired[:1]
    places: list[tuple[Path, str, str]] = [
        (("outcome", "products", outcome.products.index(each)), each.name, yield_caption(outcome, each.label))
        for each in wanted
    ]
    if outcome.sought is not None:
        places.append((("outcome", "sought"), outcome.sought.name, ""))
    for path, name, caption in places:
        structure = case.structures.get(path)
        if structure is not None:
            return Goal(structure.typed, structure.flat_smiles, name, caption)
    return None


def _attackers(case: Case) -> tuple[str, ...]:
    """Return the kinds of what attacks: nucleophiles, or the bases where no nucleophile is charged."""
    record = case.record
    if isinstance(record.nucleophile, NucleophileWord) and record.nucleophile is not NucleophileWord.NONE:
        return (str(record.nucleophile),)
    key, species = ("nucleophile", record.nucleophiles) if record.nucleophiles else ("base", record.bases)
    kinds = [_kind(case, (key, index), substance) for index, substance in enumerate(species)]
    return tuple(dict.fromkeys(kinds)) or (str(NucleophileWord.NONE),)


def _kind(case: Case, path: Path, substance: Charged) -> str:
    structure = case.structures.get(path)
    attackers = attacking_atoms(structure) if structure is not None else ()
    return attackers[0].kind if attackers else substance.name


def _compounds(case: Case) -> tuple[CompoundView, ...]:
    """Return the identifiers of every compound with a structure, each once."""
    seen: dict[tuple[str, str], CompoundView] = {}
    for path, compound in compounds_of(case.record):
        structure = case.structures.get(path)
        if structure is None:
            continue
        key = (compound.name, structure.smiles)
        seen.setdefault(
            key,
            CompoundView(
                name=compound.name,
                role=role_of(path, compound, case.record),
                formula=formula_parts(structure.formula),
                molar_mass=molar_mass_text(structure.mass),
                cas=compound.cas or "",
                inchikey=structure.inchikey,
                smiles=compound.smiles or structure.smiles,
            ),
        )
    return tuple(seen.values())
