"""A first map of a sheet: what headings and cells suggest; what nobody has said is left to fill in."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from builder.authoring.column_map import IGNORED, ColumnMap, Target, likely_column, split_unit, target_of, tidy
from builder.authoring.sheet import Sheet
from builder.chemistry.structure import StructureError, parse_smiles
from builder.mechanism.synonyms import structure_named
from builder.records.mended_text import quoted
from builder.records.specimen import GAP

__all__ = ["FirstMap", "first_map"]

LOOKED_AT = 20
"""Different cells of a column that are looked at."""
MOST = 0.8
"""Of them, that make a column one of SMILES."""


@dataclass(frozen=True, slots=True)
class FirstMap:
    """The text of a map to go on from, and the headings of columns that hold something and lead nowhere."""

    text: str
    ignored: tuple[str, ...]


def first_map(sheet: Sheet) -> FirstMap:
    """Return a map to go on from: each heading with the likeliest column, its unit and an example from the sheet."""
    lines = [
        f"# What the columns of {tidy(sheet.shown_as)} mean. Each was guessed from its heading: read them all.",
        "# Columns are named as `handbook export --format csv` heads them; what a record does not keep says ignore.",
    ]
    if sheet.heading_row > 1:
        lines.append(f"heading_row: {sheet.heading_row}")
    heading_of: dict[str, str] = {}
    ignored: list[str] = []
    body: list[str] = []
    for column, heading in enumerate(map(tidy, sheet.headings)):
        if not heading:
            continue
        texts = _texts(sheet, column)
        to = _likely_target(heading, texts)
        such_as = f"such as {tidy(texts[0])[:40]}" if texts else "empty"
        if to is not None and to not in heading_of:
            heading_of[to] = heading
            unit = split_unit(heading)[1]
            body.append(f"  {quoted(heading)}: {f'{{to: {to}, unit: {quoted(unit)}}}' if unit else to}  # {such_as}")
        elif texts:
            ignored.append(heading)
            why = f", for {heading_of[to]} is {to}" if to is not None else ""
            body.append(f"  {quoted(heading)}: {IGNORED}  # NOT KEPT{why}: {such_as}")
        else:
            body.append(f"  {quoted(heading)}: {IGNORED}  # {such_as}")
    key = next((heading for to, heading in heading_of.items() if to in {"entry", "notebook"}), None)
    lines.append(_NO_KEY if key is None else f"key: [{quoted(key)}]  # what tells rows apart")
    text = "\n".join([*lines, "columns:", *body, "constants:", *_constants(heading_of), *_MORE])
    return FirstMap(f"{text}\n", tuple(ignored))


def _texts(sheet: Sheet, column: int) -> list[str]:
    return [row.cells[column].text for row in sheet.rows if column in row.cells]


def _likely_target(heading: str, texts: Sequence[str]) -> str | None:
    """Return the column of a record that a heading means, unless its cells speak against that; None for no idea."""
    direct = target_of(heading, ColumnMap())
    if isinstance(direct, Target):
        return direct.name
    guess = _by_letter(heading, texts) or likely_column(heading)
    if guess == "performed.runs" and ("runs" not in heading.casefold() or len(texts) > 1 == texts.count(texts[0])):
        return None  # the number of the run, not how many there were
    if guess is not None and guess.endswith(".name") and _are_smiles(texts):
        return f"{guess.removesuffix('name')}smiles"
    return guess


_SYMBOLS = {"V": "solvent.1.volume", "T": "stages.1.temperature", "m": "substrate.mass", "n": "substrate.amount"}
"""What a quantity's symbol stands for in a table of runs; common practice, no source."""


def _by_letter(heading: str, texts: Sequence[str]) -> str | None:
    bare, unit = split_unit(heading)
    if bare == "t":
        typed = unit or next(iter(texts), "")
        return _SYMBOLS["T"] if typed.endswith(("C", "K")) else "stages.1.time"
    return _SYMBOLS.get(bare)


def _are_smiles(texts: Iterable[str]) -> bool:
    different = list(dict.fromkeys(texts))[:LOOKED_AT]
    return bool(different) and sum(map(_is_smiles, different)) >= MOST * len(different)


def _is_smiles(text: str) -> bool:
    """Say whether a text is a structure, and no name such as HI or CO that could be read as one."""
    if structure_named(text) is not None:
        return False
    try:
        parse_smiles(text)
    except StructureError:
        return False
    return True


_MORE = (
    "# words: {r.t.: 22 °C}  # whole cells that stand for a value",
    "# empty: [n/a]          # whole cells that stand for nothing",
    "# decimal_comma: true   # 2,083 is read as 2.083",
)
_NO_KEY = "# key: []  # headings that tell rows apart; they must go into the record, notebook best"


def _constants(names: Iterable[str]) -> list[str]:
    """Return what holds for every row and no column says: labels as text, facts as gaps."""
    given = set(names)
    wanted = {
        "status": "draft",
        "title": "'{substrate.name} and {nucleophile.1.name} in {solvent.1.name}'",
        "performed.by": f"{GAP}  # the code of who ran them, as in handbook.yml",
        "outcome.result": f"{GAP}  # such as substitution; drop it where rows differ, and give them a column",
        "outcome.products.1.label": "A",
        "outcome.products.1.use": "desired",
        "outcome.measured.1.of": "A",
        "outcome.measured.1.kind": f"{GAP}  # isolated, assay or area",
    }
    return [f"  {name}: {value}" for name, value in wanted.items() if name not in given]
