"""`handbook new`: mint an identifier and lay down a record to fill in."""

import datetime as dt
from collections.abc import Collection
from pathlib import Path

from builder.chemistry.perception import attacking_atoms, perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.records.identifiers import mint_identifier
from builder.records.specimen import GAP
from builder.records.yaml_text import quoted

__all__ = ["new_record", "write_new_record"]

_SKELETON = """\
# yaml-language-server: $schema={schema}
format: 1
entry: {entry}
revision: 1
status: draft
title: {title}
performed:
  date: {date}
  by: [{person}]
notebook: {gap}
substrate:
  name: {gap}
  smiles: {substrate}
  stereo: {stereo}
  class: [{classes}]
  leaving_group: {leaving_group}
  mass: {gap}
nucleophile:
  name: {nucleophile_name}
  smiles: {nucleophile}
  equivalents: 1.5
solvent:
  - name: {gap}
    volume: {gap}
stages:
  - temperature: {gap}
    measured: internal
    time: {gap}
    vessel: open
    atmosphere: nitrogen
outcome:
  result: [substitution]
  claim:
    mechanism: SN2
    course: {course}
    basis: [product structure]
  products:
    - label: A
      name: {gap}
      smiles: {gap}
      use: desired
  measured:
    - {{yield: {gap}, of: A, kind: isolated}}
evidence: [1H NMR]
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
        title=f"{GAP} (what was made from what)",
        date=date.isoformat(),
        person=person,
        gap=GAP,
        substrate=quoted(substrate),
        stereo=_stereo(structure),
        classes=", ".join(sorted(site.classes)) if site else GAP,
        leaving_group=site.leaving_group if site else "none",
        nucleophile_name=_kind(nucleophile) if nucleophile else GAP,
        nucleophile=quoted(nucleophile) if nucleophile else quoted(GAP),
        course="not determined" if structure.stereocentres.total else "not applicable",
    )


def write_new_record(
    book: Path, substrate: str, nucleophile: str | None, *, date: dt.date, person: str, taken: Collection[str]
) -> Path:
    """Write a new record below `book` under a fresh identifier; return its path.

    taken: identifiers in use or retired. Raises StructureError as `new_record` does; nothing is written then.
    """
    entry = next(minted for minted in iter(mint_identifier, "") if minted not in taken)
    text = new_record(substrate, nucleophile, entry=entry, date=date, person=person, schema="schema/record-1.json")
    path = book / f"{entry}.yml"
    with path.open("x", encoding="utf-8", newline="\n") as file:
        file.write(text)
    return path


def _stereo(structure: Structure) -> str:
    centres = structure.stereocentres
    if structure.is_achiral:
        return "achiral"
    return "single enantiomer" if centres.total and not centres.unspecified else "racemate"


def _kind(smiles: str) -> str:
    found = attacking_atoms(parse_smiles(smiles))
    return f"{GAP} ({found[0].kind})" if found else GAP
