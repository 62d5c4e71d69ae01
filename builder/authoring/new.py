"""`handbook new`: mint an identifier and lay down a record to fill in."""

import datetime as dt
import os
from enum import StrEnum
from pathlib import Path

from builder.chemistry.perception import NO_LEAVING_GROUP, attacking_atoms, perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.records.identifiers import mint_identifier
from builder.records.mended_text import quoted
from builder.records.reader import read_settings
from builder.records.settings import SETTINGS_FILE
from builder.records.specimen import GAP
from builder.records.vocabulary import Course, Mechanism, Result, StereoKind, Thermometer, Vessel

__all__ = ["new_record", "write_new_record"]

_SKELETON = """\
# yaml-language-server: $schema={schema}
format: 1
entry: {entry}
revision: 1
status: draft
title: {gap}
performed:
  date: {date}
  by: [{person}]
  runs: 1
notebook: {gap}
substrate:
  name: {gap}
  smiles: {substrate}
  stereo: {stereo}
  class: [{classes}]
  leaving_group: {leaving_group}
  mass: {gap}                  # or amount, or volume with density
nucleophile:                         # or one of the words solvent, internal, none; a base goes under base:
  name: {nucleophile_name}
  smiles: {nucleophile}
  equivalents: {gap}           # or mass, amount, volume
solvent:
  - name: {gap}
    volume: {gap}
stages:
  - add: [{gap}]               # names of the substances above, in the order they went in
    temperature: {gap}
    measured: {gap}            # {thermometers}
    time: {gap}
    vessel: {gap}              # {vessels}
    atmosphere: {gap}
    end_point: {gap}
work_up:
  - {gap}                      # the quench first
outcome:
  result: [{gap}]              # {results}
  # claim:                           # what you hold happened, and the evidence
  #   mechanism: {mechanisms}
  #   course: {courses}
  #   basis: []
  products:
    - label: A
      name: {gap}
      smiles: '{gap}'
      use: desired
  measured:
    - {{yield: {gap}, of: A, kind: isolated}}
evidence: [{gap}]
# take_away: one sentence a colleague reads in a list
"""


def new_record(substrate: str, nucleophile: str | None, *, entry: str, date: dt.date, person: str, schema: str) -> str:
    """Return the YAML of a record with everything that follows from the substrate filled in.

    Raises StructureError for a SMILES that cannot be read.
    """
    structure = parse_smiles(substrate)
    site = next(iter(perceive_sites(structure)), None)
    return _SKELETON.format(
        schema=schema,
        entry=entry,
        date=date.isoformat(),
        person=person,
        gap=GAP,
        substrate=quoted(substrate),
        stereo=_stereo(structure),
        classes=", ".join(sorted(site.classes)) if site else GAP,
        leaving_group=site.leaving_group if site else NO_LEAVING_GROUP,
        nucleophile_name=_kind(nucleophile) if nucleophile else GAP,
        nucleophile=quoted(nucleophile) if nucleophile else quoted(GAP),
        thermometers=_words(Thermometer),
        vessels=_words(Vessel),
        results=_words(Result),
        mechanisms=_words(Mechanism),
        courses=_words(Course),
    )


def write_new_record(folder: Path, substrate: str, nucleophile: str | None, *, date: dt.date, person: str) -> Path:
    """Write a new record into `folder`, a book or a folder of one, under a fresh identifier; return its path.

    Raises StructureError as `new_record` does; nothing is written then.
    """
    book = _book_around(folder)
    schema = Path(os.path.relpath(book / "schema" / "record-1.json", folder)).as_posix()
    entry = _free_identifier(book)
    text = new_record(substrate, nucleophile, entry=entry, date=date, person=person, schema=schema)
    path = folder / f"{entry}.yml"
    with path.open("x", encoding="utf-8", newline="\n") as file:
        file.write(text)
    return path


def _book_around(folder: Path) -> Path:
    """Return the nearest folder upwards that holds the settings of a book; the folder itself if none does."""
    upwards = (folder.resolve(), *folder.resolve().parents)
    return next((each for each in upwards if (each / SETTINGS_FILE).is_file()), folder.resolve())


def _free_identifier(book: Path) -> str:
    """Return an identifier that no file of the book bears and that its settings do not retire."""
    files = {path.name.split(".", 1)[0] for path in book.rglob("NS*")}
    settings = book / SETTINGS_FILE
    retired = read_settings(settings, settings.name)[0] if settings.is_file() else None
    taken = files | set(retired.retired if retired else ())
    return next(minted for minted in iter(mint_identifier, "") if minted not in taken)


def _stereo(structure: Structure) -> str:
    """Return what follows from the drawing; whether a chiral one is a racemate, only the chemist knows."""
    kinds = (kind for kind in StereoKind if kind is not StereoKind.ACHIRAL)
    return str(StereoKind.ACHIRAL) if structure.is_achiral else f"{GAP}                # {' | '.join(kinds)}"


def _words(words: type[StrEnum]) -> str:
    return " | ".join(words)


def _kind(smiles: str) -> str:
    found = attacking_atoms(parse_smiles(smiles))
    return f"{GAP} ({found[0].kind})" if found else GAP
