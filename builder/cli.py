"""The `handbook` command: thin edges over the rooms below.

Exit 0 fine, 1 findings at the failing level, 2 misuse, 3 our fault.
"""

import datetime as dt
import json
import os
import re
import sys
from collections.abc import Iterable, Mapping, Sequence
from difflib import get_close_matches
from importlib.resources import files
from pathlib import Path
from typing import Any, NoReturn

import click

from builder.authoring.column_map import ColumnMap
from builder.authoring.dialogue import Prompts, Silence
from builder.authoring.first_map import FirstMap, first_map
from builder.authoring.fix import Mended, diff_of, mended_files, with_exact_edits, write_mended
from builder.authoring.import_report import as_plain, cell_table, import_text
from builder.authoring.import_sheet import NoKeyError, State, open_sheet, plan_import, write_import
from builder.authoring.new import Stated, draft_record, folder_inside, write_draft
from builder.authoring.schema import schemas, write_schemas
from builder.authoring.sheet import Sheet, SheetError, likely_heading_row
from builder.authoring.start import StartError, start_book
from builder.authoring.whole_file import written_new, written_whole
from builder.book import Book, is_aside, open_book, record_files
from builder.checks.case import Case
from builder.checks.forecast_cautions import forecast_cautions
from builder.checks.house import DISTRIBUTION
from builder.checks.register import all_rules
from builder.checks.report import render_json, render_rule, render_text, summary
from builder.finding import Finding, Level
from builder.mechanism.answer import answer_of, change_of, how_read
from builder.mechanism.asking import AskingError, question_from_words, read_wish
from builder.mechanism.batch import answers, lines_of, usual_processes
from builder.mechanism.calibration import calibrate as calibration_of
from builder.mechanism.engine import predict as forecast_of
from builder.mechanism.fit_report import RESIDUALS_TABLE, fit_report, fitted_table, residuals_table
from builder.mechanism.improve import improvements, is_as_wanted
from builder.mechanism.rate_terms import FITTED_TABLE
from builder.publish.build import AddressError, NotOurSiteError, SiteBuildError, build_date, build_site, serve_site
from builder.publish.console import put_up_with_any_console
from builder.publish.export import (
    BYTE_ORDER_MARK,
    CLEARED_FOR,
    Exported,
    csv_text,
    exported_records,
    jsonl_text,
    within,
)
from builder.publish.figures import how_many
from builder.publish.forecast_text import render_forecast
from builder.publish.progress import counted, stepped, watched
from builder.records.quantities import QuantityError
from builder.records.reader import MAX_BYTES, read_file_into, read_settings
from builder.records.schema import RECORD_SCHEMA
from builder.records.settings import SETTINGS_FILE
from builder.records.vocabulary import Status
from builder.records.yaml_text import Places

__all__ = ["main"]

FINDINGS, MISUSE, OUR_FAULT = 1, 2, 3
_BOOK = click.option(
    "--book",
    type=click.Path(exists=True, file_okay=False, path_type=Path),
    default=Path("entries"),
    show_default=True,
    help="The folder with the records and handbook.yml.",
)


def _a_book(_: click.Context, __: click.Parameter, config: Path) -> Path:
    if not config.is_file():
        raise click.UsageError(f"there is no {config} here: go to the folder of a book, or `handbook start` one")
    return config


_CONFIG = click.option(
    "--config",
    type=click.Path(dir_okay=False, path_type=Path),
    default=Path("mkdocs.yml"),
    callback=_a_book,
    show_default=True,
    help="The book's mkdocs.yml.",
)
_RXN = click.Path(exists=True, dir_okay=False, path_type=Path)
_JSON = click.option("--json", "as_json", is_flag=True, help="Print JSON for machines instead of text.")


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name=DISTRIBUTION)
def handbook() -> None:
    """Check, draw and publish a group's reaction conditions.

    \b
    Example:
      handbook new 2-bromobutane --nucleophile 'sodium thiophenolate'
      handbook check
      handbook build
    """


@handbook.command()
@click.argument("files", nargs=-1, type=click.Path(exists=True, path_type=Path))
@_BOOK
@_JSON
@click.option(
    "--fail-on",
    type=click.Choice([level.value for level in Level]),
    default=Level.ERROR.value,
    show_default=True,
    help="The lightest level that makes the command fail.",
)
@click.option(
    "--show",
    type=click.Choice([level.value for level in Level]),
    help="The lightest level to show.  [default: query; remark for FILES and JSON]",
)
@click.option(
    "--fix",
    is_flag=True,
    help="Mend what can only be meant in one way: quotes, spaces, spelled-out units, mistyped keys, a key repeated.",
)
@click.option(
    "--offered",
    multiple=True,
    metavar="RULE",
    help="With --fix or --diff: mend also what this rule only offers, such as the nearest known name. Repeat it.",
)
@click.option("--diff", is_flag=True, help="Show what --fix would change, and write nothing; with --fix, what it did.")
def check(
    *,
    files: tuple[Path, ...],
    book: Path,
    as_json: bool,
    fail_on: str,
    show: str | None,
    fix: bool,
    offered: tuple[str, ...],
    diff: bool,
) -> None:
    """Check every record of the book, or show the findings of FILES only.

    Accepted queries are shown with the remarks. --fix changes what it mends and nothing else in a file: comments,
    order, quotes and line ends stay. --diff ends with 1 if there is something to mend.

    \b
    Example:
      handbook check
      handbook check entries/azides/NS4T9XQ2N.yml --fail-on query
      handbook check --diff
      handbook check --fix --offered temperature-looks-kelvin
    """
    if offered and not (fix or diff):
        raise click.UsageError("--offered goes with --fix or --diff")
    if unknown := [each for each in offered if each not in all_rules()]:
        raise click.UsageError(f'no rule is called "{unknown[0]}"{_near(unknown[0], all_rules())}')
    if diff and as_json:
        raise click.UsageError("--diff prints a diff; --json lists the same edits, so give one of them")
    opened = _open(book)
    shown, records = _selected(opened, files)
    mended = mended_files(opened, shown, offered) if fix or diff else []
    if diff:
        click.echo("".join(map(diff_of, mended)), nl=False)
    if diff and not fix:
        sys.exit(FINDINGS if mended else 0)
    if mended:
        _write(mended)
        opened = _open(book)
        shown, records = _selected(opened, files)
    threshold = Level(show) if show else (Level.REMARK if as_json or files else Level.QUERY)
    visible = [
        finding
        for finding in shown
        if finding.level.weight >= threshold.weight and (finding.accepted is None or threshold is Level.REMARK)
    ]
    applied = [finding for each in mended for finding in each.applied]
    if as_json:
        click.echo(render_json(with_exact_edits(opened, visible), applied if fix else None))
    else:
        for finding in applied:
            click.echo(f"{finding.place}: mended {finding.rule}: {finding.message}")
        if visible:
            click.echo(render_text(visible, book))
        click.echo(summary(shown, records, were_mended=fix))
    _end(shown, Level(fail_on))


@handbook.command()
@_CONFIG
@click.option(
    "--site",
    type=click.Path(file_okay=False, path_type=Path),
    default=Path("site"),
    show_default=True,
    help="Where the site goes; a folder that this command made, or an empty one.",
)
def build(config: Path, site: Path) -> None:
    """Check the book of a mkdocs.yml and publish it as a static site.

    A failed build leaves the last good site as it was.

    \b
    Example:
      handbook build --site /srv/handbook
    """
    _today()  # a wrong SOURCE_DATE_EPOCH is misuse, and said here rather than by the child
    click.echo(f"building {site}/ ...", err=True)
    try:
        report = build_site(config, site)
    except NotOurSiteError as error:
        raise click.UsageError(str(error)) from error
    except SiteBuildError as error:
        click.echo(str(error), err=True)
        sys.exit(FINDINGS if error.report is not None and error.report.failing else MISUSE)
    click.echo(f"{how_many(report.entries, 'entry', 'entries')} published in {site}/")


@handbook.command()
@_CONFIG
@click.option("--address", default="127.0.0.1:8000", show_default=True, help="Where to serve.")
def serve(config: Path, address: str) -> None:
    """Serve the book on this machine and rebuild it on every change.

    \b
    Example:
      handbook serve --address 127.0.0.1:8123
    """
    try:
        code = serve_site(config, address)
    except AddressError as error:
        raise click.UsageError(str(error)) from error
    sys.exit(code)


@handbook.command()
@click.argument("substrate", required=False)
@click.option("--nucleophile", help="Name or SMILES, counter-ion included; or solvent, internal, none.")
@click.option("--base", help="Name or SMILES of an added base.")
@click.option("--rxn", type=_RXN, help="A CTfile RXN (V2000 or V3000) with substrate, nucleophile and product.")
@click.option("--leaving-group", help="Where several could leave; none for an addition to a multiple bond.")
@click.option("--stereo", help='What the bottle holds: "single enantiomer", racemate, ...')
@click.option("--amount", help='Of the substrate: "10 mmol" or "1.37 g".')
@click.option("--equivalents", help="Of the nucleophile, or else of the base.")
@click.option("--solvent", "solvents", multiple=True, metavar="NAME[:VOLUME|:FRACTION]", help='Or "neat". Repeat it.')
@click.option("--temperature", help='With its unit: "60 °C", "0 °C to 25 °C".')
@click.option("--time", help='With its unit: "16 h".')
@click.option("--want", metavar="RESULT|MECHANISM|SMILES", help="Which product is the desired one.  [default: main]")
@click.option("--from", "origin", metavar="NS…|nearest", help="Take solvent, stages and work-up of that entry, if any.")
@click.option("--title", help="In one line.  [default: from the names]")
@click.option("--by", "person", envvar="HANDBOOK_BY", show_envvar=True, help="Your code in handbook.yml.")
@click.option("--in", "inside", metavar="FOLDER", help="A folder of the book; it is made if need be.")
@click.option("--yes", is_flag=True, help="Ask nothing: what is missing stays open.")
@click.option("--print", "to_terminal", is_flag=True, help="Print the record instead of writing it.")
@_BOOK
def new(*, book: Path, inside: str | None, rxn: Path | None, yes: bool, to_terminal: bool, **words: Any) -> None:
    """Write a new record for SUBSTRATE (name or SMILES) under a fresh identifier.

    What follows from the structures is filled in: class, leaving group, products to confirm with their forecast. What
    is missing is asked for on a terminal; elsewhere, or with --yes, it says TO FILL IN with what belongs there. No
    file is ever overwritten.

    \b
    Example:
      handbook new                                              asks for everything
      handbook new 2-bromobutane --nucleophile 'sodium thiophenolate' --amount '10 mmol'
      handbook new 'CCCCCCC(C)OS(C)(=O)=O' --nucleophile KSAc --from nearest --in alkylations
      handbook new 'tert-butyl chloride' --nucleophile solvent --solvent ethanol:80% --solvent water:20%
      handbook new --rxn drawn.rxn --solvent 'DMF:20 mL' --temperature '60 °C' --time '16 h' --print
    """
    person = words["person"]
    if person and not re.fullmatch(r"[A-Za-z0-9.-]{1,40}", person):
        raise click.UsageError(f'"{person}" is no person code: letters, digits, dot and hyphen')
    typed = {name: value for name, value in words.items() if value}
    is_live = not yes and sys.stdin.isatty() and sys.stdout.isatty()
    dialogue = Prompts() if is_live else Silence()
    try:
        folder = folder_inside(book, inside)
        stated = Stated(**typed, rxn="" if rxn is None else _small_text(rxn))
        draft = draft_record(stated, folder, _today(), dialogue)
    except AskingError as error:
        raise click.UsageError(str(error)) from error
    except QuantityError as error:
        raise click.UsageError(f"{error.message}; {error.mend}") from error
    if to_terminal:
        click.echo(draft.text, nl=False)
        return
    path = folder / f"{draft.entry}.yml"
    if is_live:
        click.echo(f"\n{draft.text}", err=True)
        if not dialogue.agrees(f"Write {path}?"):
            click.echo("nothing is written")
            return
    write_draft(draft, folder)
    click.echo(f"{path}: {how_many(draft.gaps, 'place', 'places')} TO FILL IN, then `handbook check {path}`")


def _small_text(path: Path) -> str:
    if path.stat().st_size > MAX_BYTES:
        raise click.UsageError(f"{path} has more than {MAX_BYTES // 1024} kB; give one reaction")
    return path.read_bytes().decode("utf-8-sig", errors="replace")


@handbook.command("import")
@click.argument("sheet_file", metavar="SHEET", type=click.Path(exists=True, dir_okay=False, path_type=Path))
@click.option("--map", "map_file", type=click.Path(exists=True, dir_okay=False, path_type=Path), help="Of its columns.")
@click.option("--sheet", help="Which sheet of a workbook.")
@click.option("--heading-row", type=click.IntRange(min=1), help="Where the headings stand.  [default: the first row]")
@click.option("--into", type=click.Path(file_okay=False, path_type=Path), help="Folder of the book for new records.")
@click.option("--dry-run", is_flag=True, help="Say what would happen, and write nothing.")
@click.option("--sound-rows", is_flag=True, help="Write the sound rows although others are refused.")
@click.option("--update", is_flag=True, help="Let drafts follow the sheet that nobody has edited since their import.")
@click.option("--write-map", type=click.Path(dir_okay=False, path_type=Path), help="Write a first map, and stop.")
@click.option("--report", type=click.Path(dir_okay=False, path_type=Path), help="Write the cells to mend as CSV.")
@_BOOK
@_JSON
def import_(  # noqa: PLR0913 - an argument for each option
    *,
    sheet_file: Path,
    map_file: Path | None,
    sheet: str | None,
    heading_row: int | None,
    into: Path | None,
    write_map: Path | None,
    report: Path | None,
    book: Path,
    as_json: bool,
    **flags: bool,
) -> None:
    """Make records from the rows of SHEET (.csv, .xlsx, or .jsonl of `handbook export`), one a row.

    Every cell that cannot be read is named, and unless --sound-rows is given nothing is written while there is one.
    The key of a row (the notebook page, if the map names no other) decides which entry it makes: the same row makes the
    same entry every time, and one that is there already is left as it is.

    \b
    Example:
      handbook import screen.xlsx --write-map screen.yml
      handbook import screen.xlsx --map screen.yml --dry-run --report cells.csv
      handbook import screen.xlsx --map screen.yml --into entries/screen
    """
    folder = (into or book).resolve()
    if not folder.is_relative_to(book.resolve()):
        raise click.UsageError(f"--into {into} is no folder inside the book {book}")
    if is_aside(folder.relative_to(book.resolve())):
        raise click.UsageError(f"--into {into}: no records are read from there")
    for option, target in (("--report", report), ("--write-map", write_map)):
        if target is not None:
            _refuse_loss(option, target, {"the sheet": sheet_file, "the map": map_file}, book)
    column_map, places = _column_map(map_file)
    try:
        sheet, heading_row = sheet or column_map.sheet, heading_row or column_map.heading_row
        rows = open_sheet(sheet_file, sheet=sheet, heading_row=heading_row)
        if heading_row is None and (below := likely_heading_row(rows)) is not None:
            _tell_of_headings(rows, below, may_go_on=write_map is not None)
            rows = open_sheet(sheet_file, sheet=sheet, heading_row=below)
        if write_map is not None:
            _write_new(write_map, first_map(rows))
            return
        with counted("reading rows", len(rows.rows)) as advance:
            settings = book / SETTINGS_FILE
            planned = plan_import(
                rows,
                column_map,
                places,
                book=book.resolve(),
                settings=read_settings(settings, settings.name)[0] if settings.is_file() else None,
                into=folder,
                may_update=flags["update"],
                advance=advance,
            )
    except (SheetError, NoKeyError) as error:
        raise click.UsageError(str(error)) from error
    if report is not None:
        with written_whole(report) as file:
            file.write(cell_table(planned))
    written = () if flags["dry_run"] else write_import(planned, sound_rows=flags["sound_rows"])
    text = import_text(planned, written, is_dry=flags["dry_run"])
    click.echo(json.dumps(as_plain(planned, written), indent=2) if as_json else text)
    if planned.findings or planned.of(State.DIFFERS):
        sys.exit(FINDINGS)


def _refuse_loss(option: str, target: Path, read: Mapping[str, Path | None], book: Path) -> None:
    """Refuse to write over what is read, or among the records."""
    for what, path in read.items():
        if path is not None and target.exists() and target.samefile(path):
            raise click.UsageError(f"{option} is {what} itself; give another file")
    if target.resolve().is_relative_to(book.resolve()):
        raise click.UsageError(f"{option} {target} lies inside the book {book}; give a file outside")


def _column_map(path: Path | None) -> tuple[ColumnMap, Places]:
    if path is None:
        return ColumnMap(), Places("")
    column_map, findings, places = read_file_into(ColumnMap, path, path.name)
    if column_map is None:
        click.echo(render_text(findings, path.parent))
        sys.exit(FINDINGS)
    return column_map, places


def _tell_of_headings(rows: Sheet, below: int, *, may_go_on: bool) -> None:
    """Say that the headings stand below a title; refuse to go on where the map was not made for that."""
    said = f"{rows.shown_as}: the headings seem to stand in row {below}, below a title in row {rows.heading_row}"
    if not may_go_on:
        mend = f"say --heading-row {below}, or heading_row: {below} in the map"
        raise SheetError(f"{said}; {mend} (or {rows.heading_row} if they do not)")
    click.echo(f"{said}; the map says heading_row: {below}", err=True)


def _write_new(path: Path, first: FirstMap) -> None:
    try:
        with written_new(path) as file:
            file.write(first.text)
    except FileExistsError as error:
        raise click.UsageError(f"{path} is there already: name a new file") from error
    if first.ignored:
        click.echo(f"not kept, unless the map says where they go: {', '.join(first.ignored)}", err=True)
    click.echo(f"{path}: a first map, guessed from the headings; read and complete it, then import with --map {path}")


@handbook.command()
@click.option("--format", "form", type=click.Choice(["csv", "jsonl"]), default="csv", show_default=True)
@click.option("--only", type=click.Choice(list(CLEARED_FOR)), help="Keep back what is not cleared, or not published.")
@click.option(
    "--status", multiple=True, type=click.Choice([status.value for status in Status]), help="Of the entries. Repeat it."
)
@click.option("--output", type=click.Path(dir_okay=False, path_type=Path), help="A file instead of the terminal.")
@_BOOK
def export(form: str, only: str | None, status: tuple[str, ...], output: Path | None, book: Path) -> None:
    """Write the records as one table, a row each, from which `handbook import` makes them again without loss.

    Columns are named like stages.1.temperature, and every value is as it was typed; comments are left out.

    \b
    Example:
      handbook export --output book.csv
      handbook export --format jsonl --only cleared --status current --output cleared.jsonl
    """
    if output is not None:
        _refuse_loss("--output", output, {}, book)
    files, _ = record_files(book.resolve())
    found = list(watched(exported_records(book.resolve(), files), len(files)))
    unread = [each for each in found if isinstance(each, str)]
    going = within((each for each in found if isinstance(each, Exported)), only, [Status(word) for word in status])
    records = going.records
    text = csv_text(records) if form == "csv" else jsonl_text(records)
    if output is None:
        sys.stdout.buffer.write(text.encode())
    else:
        with written_whole(output) as file:
            file.write((BYTE_ORDER_MARK if form == "csv" else "") + text)
    click.echo(how_many(len(records), "entry", "entries") + " exported", err=True)
    for entry, column in going.left_out.items():
        click.echo(f"{entry} is left out, for its {column} names an entry that is kept back", err=True)
    for path in unread:
        click.echo(f"{path} cannot be read and is left out: see `handbook check`", err=True)
    if unread:
        sys.exit(FINDINGS)


@handbook.command()
@click.argument("folder", metavar="DIR", type=click.Path(path_type=Path))
@click.option("--title", default="Condition handbook", show_default=True, help="Of the book.")
@click.option("--group", help="Whose book it is.")
def start(folder: Path, title: str, group: str | None) -> None:
    """Start a book of your own in DIR, a new folder or an empty one.

    It gets settings, schemas, one sample entry to be deleted, mkdocs.yml, a CI workflow, settings for editors and git,
    a pull-request template and a README: all plain files, yours from then on.

    \b
    Example:
      handbook start our-book --title 'Conditions that worked' --group 'Building-block group'
    """
    try:
        started = start_book(folder, title=title, group=group, date=_today())
    except StartError as error:
        raise click.UsageError(str(error)) from error
    wheel = f"tools/{started.wheel.name}{', which is there' if started.wheel.data else ': put it there'}"
    click.echo(
        f"{folder}: a new book. Its sample entry, to be deleted, is entries/{started.sample}.yml. Next:\n"
        f'  cd "{folder}"\n'
        "  handbook check\n"
        "  handbook build     then open site/index.html\n"
        "People, house rules and licence stand in entries/handbook.yml; how to add an entry, in README.md.\n"
        f"CI installs {wheel}."
    )


@handbook.command()
@click.option("--print", "to_terminal", is_flag=True, help="Print the record schema instead of writing files.")
@_BOOK
def schema(to_terminal: bool, book: Path) -> None:
    """Write the JSON Schemas of records and settings, to which editors bind.

    \b
    Example:
      handbook schema
      handbook schema --print
    """
    if to_terminal:
        click.echo(json.dumps(schemas()[RECORD_SCHEMA.name], indent=2))
        return
    for path in write_schemas(book):
        click.echo(str(path))


@handbook.command()
@click.argument("rule_id", required=False)
@_JSON
def rule(rule_id: str | None, as_json: bool) -> None:
    """Explain one rule, or list them all.

    \b
    Example:
      handbook rule mechanism-contrary
      handbook rule
    """
    rules = all_rules()
    if rule_id is None:
        listed = [{"id": each.id, "title": each.title, "level": str(each.level)} for each in rules.values()]
        lines = [f"{each['id']:<32} {each['level']:<8} {each['title']}" for each in listed]
        click.echo(json.dumps({"rules": listed}, indent=2) if as_json else "\n".join(lines))
        return
    if rule_id not in rules:
        raise click.UsageError(f'no rule is called "{rule_id}"{_near(rule_id, rules)}')
    click.echo(render_rule(rules[rule_id], as_json=as_json))


@handbook.command()
@click.option("--substrate", help="SMILES of the substrate.")
@click.option("--nucleophile", help='Name or SMILES; "none (internal nucleophile)" where the substrate has its own.')
@click.option("--base", help="Name or SMILES of an added base.")
@click.option(
    "--additive", "additives", multiple=True, help='Acid, activator, silver salt, ...: "HBr (48% aq)". Repeat it.'
)
@click.option("--solvent", multiple=True, metavar="NAME[:FRACTION]", help='By volume, or "neat". Repeat it.')
@click.option("--temperature", help='With its unit: "25 °C".')
@click.option("--concentration", help='Of the substrate.  [default: "0.5 mol/L"]')
@click.option("--equivalents", type=float, help="Of nucleophile and base.  [default: 1.5]")
@click.option("--time", help='How long it is run.  [default: "24 h"]')
@click.option(
    "--want", metavar="SMILES|MECHANISM[:SHARE]", help="Say what would bring this about, to 0.9 or the share."
)
@_JSON
@click.option(
    "--batch",
    type=click.Path(exists=True, dir_okay=False, path_type=Path),
    help="A file with one question as JSON in each line.",
)
@click.option("--output", type=click.Path(dir_okay=False, path_type=Path), help="Where the answers to a batch go.")
@click.option("--processes", type=click.IntRange(min=1), help="For a batch.  [default: one for each processor]")
def predict(
    *, want: str | None, as_json: bool, batch: Path | None, output: Path | None, processes: int | None, **words: Any
) -> None:
    """Forecast mechanism, products and rate of a reaction, or of each line of a batch.

    Keys of a batch line: id, substrate, nucleophile, nucleophile_smiles, base, additives, solvent as [[name, fraction],
    ...], temperature_C, and if wanted concentration (mol/L), equivalents, time_h. A bad line gives {"id", "error"}, the
    others go on, and the command ends with 1.

    \b
    Example:
      handbook predict --substrate 'CCC(C)Br' --nucleophile 'sodium azide' --solvent DMF --temperature '25 °C'
      handbook predict --substrate 'CC(C)(C)Cl' --solvent ethanol:0.8 --solvent water:0.2 --temperature '25 °C'
      handbook predict --substrate 'CCC(C)Br' --nucleophile NaOEt --solvent ethanol --temperature '55 °C' --want E2:0.95
      handbook predict --batch cases.jsonl --output results.jsonl
    """
    stated = [name for name, value in {**words, "want": want}.items() if value not in (None, ())]
    if batch is not None:
        if stated:
            raise click.UsageError(f"--{stated[0]} belongs to a single question, not to --batch")
        if output is None:
            raise click.UsageError("--batch needs --output, the file for the answers")
        _predict_batch(batch, output, processes or usual_processes())
        return
    if output is not None or processes is not None:
        raise click.UsageError("--output and --processes go with --batch")
    if missing := [name for name in ("substrate", "solvent", "temperature") if not words[name]]:
        raise click.UsageError(f"--{missing[0]} is missing, or give --batch")
    try:
        read = question_from_words(**words)
        wish = None if want is None else read_wish(want)
    except AskingError as error:
        raise click.UsageError(str(error)) from error
    forecast = forecast_of(read.question)
    cautions = forecast_cautions(read.question, forecast)
    changes, is_met = None, False
    if wish is not None:
        wanted: dict[str, Any] = {"product": wish.product, "mechanism": wish.mechanism, "share": wish.share}
        changes, is_met = improvements(read.question, **wanted), is_as_wanted(forecast, **wanted)
    if not as_json:
        click.echo(render_forecast(read, forecast, cautions, changes, is_met=is_met), nl=False)
        return
    plain = {**answer_of(forecast, cautions), **how_read(read)}
    if changes is not None:
        plain["as_wanted"] = is_met
        plain["changes"] = [change_of(change) for change in changes]
    click.echo(json.dumps(plain, indent=2, allow_nan=False))


def _predict_batch(batch: Path, output: Path, processes: int) -> None:
    if output.resolve() == batch.resolve():
        raise click.UsageError("--output is the batch itself; give another file")
    done = bad = 0
    with (
        batch.open("rb") as questions,
        written_whole(output) as results,
        counted("forecasting", batch.stat().st_size) as advance,
    ):
        for answer in answers(lines_of(questions), processes, forecast_cautions):
            results.write(f"{answer.text}\n")
            done, bad = done + 1, bad + answer.is_error
            advance(answer.size)
    click.echo(f"{how_many(done, 'line', 'lines')} answered in {output}, {bad} of them with an error", err=True)
    if bad:
        sys.exit(FINDINGS)


@handbook.command()
@click.option("--write", is_flag=True, help="Write the fitted terms and the residuals into the package.")
@click.option("--report", type=click.Path(dir_okay=False, path_type=Path), help="Write the table of residuals here.")
def calibrate(write: bool, report: Path | None) -> None:
    """Fit the terms of the rate model to the tables of observations, and say how good the fit is.

    It takes some minutes. Without --write nothing in the package changes.

    \b
    Example:
      handbook calibrate --report residuals.tsv
      handbook calibrate --write
    """
    folder = Path(str(files("builder.mechanism")))
    if write and not os.access(folder, os.W_OK):
        raise click.UsageError(f"{folder} cannot be written: --write needs a checkout of the sources")
    with stepped("fitting") as told:
        found = calibration_of(told)
    texts = (
        {folder / FITTED_TABLE: fitted_table(found), folder / RESIDUALS_TABLE: residuals_table(found)} if write else {}
    )
    if report is not None:
        texts[report] = residuals_table(found)
    for path, text in texts.items():
        with written_whole(path) as file:
            file.write(text)
    click.echo(fit_report(found), nl=False)
    for path in texts:
        click.echo(f"wrote {path}", err=True)


def _write(mended: Iterable[Mended]) -> None:
    for each in mended:
        if not write_mended(each):
            raise click.UsageError(f"{each.file} was changed meanwhile and is left as it is; run this again")


def _nothing(_: Case) -> None:
    """Keep nothing of a case: its findings are all that is asked for."""


def _open(book: Path) -> Book[None]:
    return open_book(book, today=_today(), keep=_nothing, progress=watched)


def _today() -> dt.date:
    try:
        return build_date()
    except ValueError as error:
        raise click.UsageError(f"SOURCE_DATE_EPOCH: {error}") from error


def _selected(opened: Book[None], files: Sequence[Path]) -> tuple[list[Finding], int]:
    """Return the findings in the named files and folders, and how many records these hold; all if none is named."""
    if not files:
        return list(opened.findings), len(opened.files)
    above = opened.folder.parent
    known = {*opened.files, *(above / finding.place.file for finding in opened.findings), opened.folder / SETTINGS_FILE}
    wanted = [path.resolve() for path in files]
    for path, real in zip(files, wanted, strict=True):
        if not any(_is_in(each, [real]) for each in known):
            raise click.UsageError(f"{path} is no file of the book {opened.folder}")
    found = [finding for finding in opened.findings if _is_in(above / finding.place.file, wanted)]
    return found, sum(_is_in(path, wanted) for path in opened.files)


def _is_in(path: Path, wanted: Sequence[Path]) -> bool:
    return any(path == each or each in path.parents for each in wanted)


def _end(findings: Iterable[Finding], failing: Level) -> None:
    if any(finding.accepted is None and finding.level.weight >= failing.weight for finding in findings):
        sys.exit(FINDINGS)


def _near(word: str, known: Iterable[str]) -> str:
    close = get_close_matches(word, list(known), n=1)
    return f'; did you mean "{close[0]}"?' if close else "; `handbook rule` lists them"


def main(arguments: Sequence[str] | None = None) -> NoReturn:
    """Run the command; a crash is our fault and says so with exit code 3."""
    put_up_with_any_console()
    try:
        handbook.main(args=arguments, prog_name="handbook", standalone_mode=True)
    except OSError as error:
        click.echo(f"handbook: {error.filename or ''}: {error.strerror or error}", err=True)
        sys.exit(MISUSE)
    except Exception as error:
        if os.environ.get("HANDBOOK_DEBUG"):
            raise
        click.echo(f"handbook: our fault: {type(error).__name__}: {error}", err=True)
        click.echo("run again with HANDBOOK_DEBUG=1 and report what it prints", err=True)
        sys.exit(OUR_FAULT)
    sys.exit(0)
