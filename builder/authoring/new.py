"""`handbook new`: from what a chemist is about to run, a record to be completed at the bench."""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace
from difflib import get_close_matches
from pathlib import Path

from builder.authoring.borrowing import borrowed, offer_of, run_in
from builder.authoring.dialogue import Dialogue
from builder.authoring.drawing import Drawing, leaving_sites, read_drawing
from builder.authoring.expectation import expected_products, forecast_line, read_want
from builder.authoring.partners import (
    is_swapped,
    leaving_group_of,
    read_equivalents,
    read_nucleophile,
    read_quantity,
    read_solvents,
    stereo_of,
)
from builder.authoring.plan import NEAT, Plan, PlannedReagent, PlannedStage, safety_case, trial_case
from builder.authoring.schema import schema_seen_from
from builder.authoring.skeleton import skeleton
from builder.authoring.whole_file import written_new
from builder.book import Shelf, is_aside, read_shelf
from builder.checks.case import Case
from builder.checks.forecast_cautions import MOST_CAUTIONS, plain_caution, planned_hazards
from builder.checks.hazards.cautions import Severity
from builder.checks.hazards.meetings import Hazard
from builder.checks.nearest import Likeness, attacker_of, nearest
from builder.chemistry.perception import attacking_atoms
from builder.finding import Level
from builder.mechanism.asking import AskingError
from builder.mechanism.compounds import Identified, identified, identify
from builder.mechanism.forecast import Forecast
from builder.records.identifiers import mint_identifier
from builder.records.model import Record
from builder.records.piece import TEMPERATURE, TIME, read_piece
from builder.records.quantities import parse_temperature
from builder.records.reader import read_bytes, read_settings
from builder.records.settings import SETTINGS_FILE, Settings
from builder.records.specimen import GAP
from builder.records.vocabulary import NucleophileWord, Status

__all__ = ["NEAREST", "Draft", "Stated", "book_around", "draft_record", "folder_inside", "write_draft"]

NEAREST = "nearest"
"""In place of an identifier: whichever entry comes nearest."""
LONGEST_TITLE = 160
"""Characters; the model of the record allows no more."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Stated:
    """What was stated beforehand, as typed; empty where nothing was.

    rxn: content of an RXN file. origin: identifier of an entry whose stages are to be taken, or NEAREST.
    """

    substrate: str = ""
    nucleophile: str = ""
    base: str = ""
    solvents: Sequence[str] = ()
    temperature: str = ""
    time: str = ""
    amount: str = ""
    equivalents: str = ""
    leaving_group: str = ""
    stereo: str = ""
    want: str = ""
    origin: str = ""
    rxn: str = ""
    title: str = ""
    person: str = ""


@dataclass(frozen=True, slots=True)
class Draft:
    """A record that is not written yet, and how many gaps it has."""

    entry: str
    text: str
    gaps: int


def draft_record(stated: Stated, folder: Path, today: dt.date, dialogue: Dialogue) -> Draft:
    """Return a new record for `folder`, a book or a folder of one, under a fresh identifier; nothing is written.

    dialogue: asked for what is missing, and told what was understood.
    Raises AskingError or QuantityError for what cannot be read, or is ambiguous where nobody can be asked.
    """
    book = book_around(folder)
    settings = _settings(book)
    want = read_want(stated.want) if stated.want else None
    plan = _what_reacts(stated, today, dialogue)
    shelf = read_shelf(book, today)
    plan, guide = _how_it_is_run(plan, stated, shelf, dialogue)
    plan = replace(plan, person=_person(stated, settings, dialogue), title=_title(plan, stated, shelf))
    entry = _free_identifier(book, settings)
    schema = schema_seen_from(folder, book)
    _refuse_what_no_reader_takes(skeleton(plan, (), None, entry=entry, schema=schema), entry)
    forecast, hazards = _forecast(plan, guide, dialogue)
    expected = expected_products(forecast, want, plan.products, plan.stereo)
    text = skeleton(plan, expected, forecast, entry=entry, schema=schema, warnings=_work_up_warnings(hazards))
    return Draft(entry, text, sum(line.partition(" # ")[0].count(GAP) for line in text.splitlines()))


def write_draft(draft: Draft, folder: Path) -> Path:
    """Write a draft into a folder, which is made if need be; return its path.

    Raises FileExistsError where a file of that name is there; it stays as it is.
    """
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / f"{draft.entry}.yml"
    with written_new(path) as file:
        file.write(draft.text)
    return path


def folder_inside(book: Path, inside: str | None) -> Path:
    """Return the folder of a book that was named; the book itself where none was.

    Raises AskingError for one outside the book, or where no records are kept.
    """
    folder = book / (inside or ".")
    within = folder.resolve().relative_to(book.resolve()) if folder.resolve().is_relative_to(book.resolve()) else None
    if within is None:
        raise AskingError(f"{inside} lies outside the book {book}", "name a folder below it")
    if is_aside(within):
        raise AskingError(f"no records are kept in {inside}", "name another folder")
    return folder if inside else book


def book_around(folder: Path) -> Path:
    """Return the nearest folder upwards that holds the settings of a book; the folder itself if none does."""
    upwards = (folder.resolve(), *folder.resolve().parents)
    return next((each for each in upwards if (each / SETTINGS_FILE).is_file()), folder.resolve())


def _settings(book: Path) -> Settings | None:
    file = book / SETTINGS_FILE
    return read_settings(file, file.name)[0] if file.is_file() else None


def _free_identifier(book: Path, settings: Settings | None) -> str:
    """Return an identifier that no file of the book bears and that its settings do not retire."""
    taken = {path.name.split(".", 1)[0].upper() for path in book.rglob("[Nn][Ss]*")}
    taken |= set(settings.retired if settings else ())
    return next(minted for minted in iter(mint_identifier, "") if minted not in taken)


def _refuse_what_no_reader_takes(text: str, entry: str) -> None:
    """Refuse a title, code or name that would make the record unreadable; its gaps are what it is for."""
    for finding in read_bytes(text.encode(), f"{entry}.yml").findings:
        if finding.level is Level.ERROR and finding.rule != "gap-left-open":
            raise AskingError(finding.message, finding.mend)


# --- what reacts ----------------------------------------------------------------------------------------------


def _what_reacts(stated: Stated, today: dt.date, dialogue: Dialogue) -> Plan:
    """Return the plan with substrate, site, and whatever attacks or takes protons."""
    named = identify(stated.substrate, "substrate") if stated.substrate else None
    drawing = _drawing(stated, named, dialogue) if stated.rxn else None
    if named is None and drawing is not None:
        named = identified(drawing.substrate)
    if named is None:
        named = dialogue.may_say("Substrate (name or SMILES)", _read_substrate)
    if named is None:
        raise AskingError("no substrate is given", "write `handbook new SUBSTRATE`, or give --rxn FILE")
    if not stated.nucleophile and drawing is None:
        _refuse_a_lone_nucleophile(named)
    nucleophile, base = _attackers(stated, drawing, dialogue)
    if isinstance(nucleophile, Identified) and is_swapped(named, nucleophile):
        named, nucleophile = _swapped(named, nucleophile, dialogue)
    molecule = named.structure
    if molecule is None:
        raise AskingError(f"{named.name} has no one structure", "give the SMILES of what bears the leaving group")
    _refuse_a_lone_nucleophile(named)
    _tell_readings(named, nucleophile, base, dialogue)
    named = _with_name(named, "substrate", dialogue)
    if isinstance(nucleophile, Identified):
        nucleophile = _with_name(nucleophile, "nucleophile", dialogue)
    base = None if base is None else _with_name(base, "base", dialogue)
    drawn_group = drawing.leaving_group if drawing is not None else ""
    group, classes = leaving_group_of(molecule, stated.leaving_group or drawn_group, dialogue)
    if group:
        dialogue.tell(f"perceived: leaving group {group}, class {', '.join(classes)}")
    return Plan(
        substrate=named,
        classes=classes,
        leaving_group=group,
        stereo=stereo_of(molecule, stated.stereo, dialogue),
        nucleophile=nucleophile,
        base=base,
        reagents=_reagents(drawing),
        products=drawing.products if drawing is not None else (),
        date=today,
    )


def _drawing(stated: Stated, substrate: Identified | None, dialogue: Dialogue) -> Drawing:
    nucleophile = read_nucleophile(stated.nucleophile) if stated.nucleophile else None
    return read_drawing(
        stated.rxn,
        dialogue,
        substrate=None if substrate is None else substrate.structure,
        nucleophile=nucleophile.structure if isinstance(nucleophile, Identified) else None,
    )


def _attackers(
    stated: Stated, drawing: Drawing | None, dialogue: Dialogue
) -> tuple[Identified | NucleophileWord | None, Identified | None]:
    """Return nucleophile and base: as stated, else as drawn, else as asked."""
    nucleophile = read_nucleophile(stated.nucleophile) if stated.nucleophile else None
    base = identify(stated.base, "base") if stated.base else None
    if drawing is not None:
        if nucleophile is None and drawing.nucleophile is not None:
            nucleophile = identified(drawing.nucleophile)
        if base is None and drawing.base is not None:
            base = identified(drawing.base)
        return nucleophile, base
    if nucleophile is None and base is None:
        nucleophile = dialogue.may_say("Nucleophile (name, SMILES, solvent or internal)", read_nucleophile)
        base = dialogue.may_say("Base (name or SMILES)", lambda answer: identify(answer, "base"))
    return nucleophile, base


def _reagents(drawing: Drawing | None) -> tuple[PlannedReagent, ...]:
    drawn = drawing.reagents if drawing is not None else ()
    return tuple(PlannedReagent(identified(structure), use) for structure, use in drawn)


def _swapped(first: Identified, second: Identified, dialogue: Dialogue) -> tuple[Identified, Identified]:
    """Return substrate and nucleophile the other way round, if the writer agrees."""
    said = f"{_called(first)} attacks, and {_called(second)} is attacked: they stand the wrong way round"
    if dialogue.agrees(f"{said}. Swap them?"):
        return second, first
    if dialogue.is_live:
        return first, second
    raise AskingError(said, f"write `handbook new '{_called(second)}' --nucleophile '{_called(first)}'`")


def _read_substrate(answer: str) -> Identified:
    substrate = identify(answer, "substrate")
    _refuse_a_lone_nucleophile(substrate)
    return substrate


def _refuse_a_lone_nucleophile(substrate: Identified) -> None:
    """Refuse an ion or a salt as substrate that has nothing to leave: it is the nucleophile."""
    structure = substrate.structure
    if structure is None or all(not piece.charge for piece in structure.fragments):
        return
    if attacking_atoms(structure) and not leaving_sites(structure):
        called = _called(substrate)
        mend = f"write `handbook new SUBSTRATE --nucleophile '{called}'`"
        raise AskingError(f"{called} attacks, and bears nothing that leaves", mend)


def _with_name(compound: Identified, role: str, dialogue: Dialogue) -> Identified:
    """Return a compound with the name that a writer gives it where the tables have none."""
    if compound.name:
        return compound
    return replace(compound, name=dialogue.may_say(f"Name of the {role}", _plain_line) or "")


def _plain_line(text: str) -> str:
    if not text.isprintable() or "<" in text:
        raise AskingError("that is no plain text", "write a name without mark-up, as it is to be shown")
    return text


def _called(compound: Identified) -> str:
    return compound.name or compound.smiles


def _tell_readings(
    substrate: Identified,
    nucleophile: Identified | NucleophileWord | None,
    base: Identified | None,
    dialogue: Dialogue,
) -> None:
    for role, compound in (("substrate", substrate), ("nucleophile", nucleophile), ("base", base)):
        if isinstance(compound, Identified):
            dialogue.tell(f"{role}: {compound.taken}")
            if compound.structure is not None and compound.structure.charge:
                dialogue.tell("  it is drawn with a charge; the record wants the salt that was weighed")
        if compound is substrate and substrate.structure is not None and len(substrate.structure.fragments) > 1:
            dialogue.tell("  it is given as a salt or with solvent of crystallisation: its mass is that of the whole")


# --- how it is run --------------------------------------------------------------------------------------------


def _how_it_is_run(plan: Plan, stated: Stated, shelf: Shelf, dialogue: Dialogue) -> tuple[Plan, Case | None]:
    """Return the plan with quantities and conditions; and the entry that guides where it has none of its own."""
    solvents, is_neat = read_solvents(stated.solvents)
    stage = PlannedStage(
        temperature=str(read_piece(TEMPERATURE, stated.temperature)) if stated.temperature else "",
        time=str(read_piece(TIME, stated.time)) if stated.time else "",
    )
    quantity = read_quantity(stated.amount) if stated.amount else None
    equivalents = read_equivalents(stated.equivalents) if stated.equivalents else None
    plan = replace(
        plan,
        quantity=quantity or dialogue.may_say(f"Amount or mass of substrate ({_EXAMPLE_AMOUNTS})", read_quantity),
        equivalents=equivalents,
        solvents=solvents,
        is_neat=is_neat,
        stages=(stage,),
    )
    near = _nearest(plan, shelf)
    plan = replace(plan, nearest=near.record.entry if near is not None else "")
    origin = _origin(stated.origin, near, shelf, plan, dialogue)
    if origin is not None:
        plan = borrowed(plan, origin)
        _tell_what_is_not_taken(plan, origin, dialogue)
    return _asked_conditions(plan, dialogue), origin or near


_EXAMPLE_AMOUNTS = "10 mmol or 1.37 g"


def _asked_conditions(plan: Plan, dialogue: Dialogue) -> Plan:
    """Return the plan with what a writer answers where solvent, equivalents, temperature or time are still open."""
    if not plan.solvents and not plan.is_neat:
        question = f"Solvent (name, ethanol:80%, several with + between, or {NEAT})"
        answer = dialogue.may_say(question, lambda text: read_solvents(text.split("+")))
        if answer is not None:
            plan = replace(plan, solvents=answer[0], is_neat=answer[1])
    if plan.equivalents is None and (isinstance(plan.nucleophile, Identified) or plan.base is not None):
        what = "nucleophile" if isinstance(plan.nucleophile, Identified) else "base"
        plan = replace(plan, equivalents=dialogue.may_say(f"Equivalents of {what} (1.5)", read_equivalents))
    first, *others = plan.stages
    if not first.temperature:
        asked = dialogue.may_say("Temperature (60 °C)", lambda text: str(read_piece(TEMPERATURE, text)))
        first = replace(first, temperature=asked or "")
    if not first.time:
        asked = dialogue.may_say("Time (16 h)", lambda text: str(read_piece(TIME, text)))
        first = replace(first, time=asked or "")
    return replace(plan, stages=(first, *others))


def _nearest(plan: Plan, shelf: Shelf) -> Case | None:
    """Return the nearest current entry without errors that went, and has site class and attacking atom in common."""
    if not plan.leaving_group or not plan.attacks_or_takes_protons:
        return None
    nucleophile = plan.nucleophile.structure if isinstance(plan.nucleophile, Identified) else plan.nucleophile
    if nucleophile is None and isinstance(plan.nucleophile, Identified):
        return None
    solvents = [solvent.structure for solvent in plan.solvents if solvent.structure is not None]
    attacker = attacker_of(nucleophile, solvents)
    if not attacker and nucleophile is NucleophileWord.SOLVENT:
        attacker = "O"  # as of nearly all that solvolyse, while nobody has said which
    asked = Likeness(plan.molecule, frozenset(plan.classes), attacker)
    worth_a_look = (entry for entry, (record, _) in shelf.records.items() if _may_guide(record, plan))
    found = nearest(asked, map(shelf.case, worth_a_look))
    alike = (case for case, like in found if like.resembles(asked))
    return next((case for case in alike if shelf.is_sound(case.record.entry)), None)


def _may_guide(record: Record, plan: Plan) -> bool:
    """Say whether an entry is current, gave products, and names a class of the plan."""
    went = any(result.gives_products for result in record.outcome.result)
    is_current = record.status is Status.CURRENT
    return went and is_current and not set(plan.classes).isdisjoint(record.substrate.classes)


def _origin(stated: str, near: Case | None, shelf: Shelf, plan: Plan, dialogue: Dialogue) -> Case | None:
    """Return the entry whose stages are to be taken: the one that was named, or the nearest if the writer agrees."""
    if stated and stated.lower() != NEAREST:
        if stated.upper() not in shelf.records:
            near_id = get_close_matches(stated.upper(), shelf.records, n=1)
            mend = f'did you mean "{near_id[0]}"?' if near_id else f"name one that is, or --from {NEAREST}"
            raise AskingError(f"{stated:.40} is no readable entry of the book", mend)
        origin = shelf.case(stated.upper())
        _tell_of_its_standing(origin.record, shelf, dialogue)
        return origin
    if near is None:
        said = f"no entry has this class ({', '.join(plan.classes) or 'none'}) and attacking atom in common"
        if stated and not plan.attacks_or_takes_protons:
            raise AskingError("the nearest entry depends on what attacks", "state nucleophile or base")
        if stated:
            dialogue.tell(f"{said}: solvent, stages and work-up are not taken from any")
        return None
    offer = f"{near.record.entry}, {near.record.title} ({offer_of(near)})"
    if stated or dialogue.agrees(f"Take solvent, stages and work-up of the nearest entry, {offer}?", by_enter=False):
        dialogue.tell(f"taken from {offer}")
        return near
    if not dialogue.is_live:
        dialogue.tell(f"nearest entry: {offer}; --from {NEAREST} takes its solvent, stages and work-up")
    return None


def _tell_of_its_standing(record: Record, shelf: Shelf, dialogue: Dialogue) -> None:
    """Tell of an entry that was named although it would not have been offered."""
    if record.status is not Status.CURRENT:
        dialogue.tell(f"{record.entry} is not current ({record.status}): judge what is taken from it")
    if not shelf.is_sound(record.entry):
        dialogue.tell(f"{record.entry} has errors: `handbook check` names them; judge what is taken from it")


def _tell_what_is_not_taken(plan: Plan, origin: Case, dialogue: Dialogue) -> None:
    record = origin.record
    extra = [*([] if plan.base is not None else record.bases), *([] if plan.reagents else record.reagents)]
    if extra:
        names = ", ".join(each.name for each in extra)
        dialogue.tell(f"  {record.entry} had {names} besides, which the new record has not")


# --- who, what it is called -----------------------------------------------------------------------------------


def _person(stated: Stated, settings: Settings | None, dialogue: Dialogue) -> str:
    """Return the code of who ran it: as stated, else chosen among the people of the book, else open."""
    people = settings.people if settings is not None else ()
    codes = [each.code for each in people]
    if stated.person and people and stated.person not in codes:
        dialogue.tell(f"{stated.person} is none of the people in {SETTINGS_FILE}: {', '.join(codes)}")
    if stated.person or not people:
        return stated.person
    place = dialogue.may_choose("Who runs it?", [f"{each.code} ({each.shown_as})" for each in people])
    return "" if place is None else people[place].code


def _title(plan: Plan, stated: Stated, shelf: Shelf) -> str:
    """Return the title: as stated, else from the names, unless one is open or another entry has it."""
    partner = plan.nucleophile if isinstance(plan.nucleophile, Identified) else plan.base
    where = "without solvent" if plan.is_neat else "in " + " and ".join(each.name for each in plan.solvents)
    if stated.title or not plan.substrate.name or (partner is not None and not partner.name):
        return stated.title
    if where == "in ":
        return ""
    held = max(plan.stages, key=_warmth).temperature
    said = f"{plan.substrate.name} {f'and {partner.name} ' if partner is not None else ''}{where}"
    title = said + (f" at {held}" if held else "")
    is_taken = any(record.title == title for record, _ in shelf.records.values())
    return "" if len(title) > LONGEST_TITLE or is_taken else title


def _warmth(stage: PlannedStage) -> float:
    return parse_temperature(stage.temperature).highest_c if stage.temperature else float("-inf")


# --- what is to be expected -----------------------------------------------------------------------------------


def _forecast(plan: Plan, guide: Case | None, dialogue: Dialogue) -> tuple[Forecast | None, tuple[Hazard, ...]]:
    """Return forecast and hazards of the plan, and tell of them; where it has no conditions, in those of the guide."""
    case, like = trial_case(plan), ""
    if case is None and guide is not None:
        plan, like = run_in(plan, guide), f", run like {guide.record.entry}"
        case = trial_case(plan)
    forecast = None if case is None else case.forecast
    if case is None:
        dialogue.tell("nothing is forecast: that takes a leaving group, a nucleophile or base, solvent and temperature")
    elif forecast is None:
        dialogue.tell(f"nothing is forecast: {case.unasked or 'the engine does not cover this'}")
    else:
        dialogue.tell(f"forecast: {forecast_line(case, forecast)}{like}")
    hazards = planned_hazards(safety_case(plan), forecast)
    grave = [hazard for hazard in hazards if hazard.caution.severity is Severity.STOP]
    milder = [hazard for hazard in hazards if hazard.caution.severity is not Severity.STOP][:MOST_CAUTIONS]
    for caution in map(plain_caution, (*grave, *milder)):
        grade, text = Severity(caution["severity"]).word, f"{caution['text']}; {caution['precaution']}"
        dialogue.tell(f"{grade}: {text} [{caution['source']}; {caution['decides']}]")
    return forecast, hazards


def _work_up_warnings(hazards: Sequence[Hazard]) -> dict[int, list[str]]:
    """Return what is to be said above each step of a work-up that is hazardous with what it meets."""
    found: dict[int, list[str]] = {}
    for hazard in hazards:
        match hazard.at.path:
            case ("work_up", int(place)):
                met = " and ".join(dict.fromkeys(other.shown for other in hazard.others))
                grade = hazard.caution.severity.word
                found.setdefault(place, []).append(f"{grade}: with {met}: {hazard.caution.hazard}")
    return found
