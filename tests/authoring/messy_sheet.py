"""A workbook as people keep it: fifty invented runs, among them twenty-odd cells that nothing can read.

`python -m tests.authoring.messy_sheet FOLDER` writes messy.xlsx and its map, to look at.
"""

import datetime as dt
import sys
from pathlib import Path
from typing import Any

from openpyxl import Workbook

HEADINGS = (
    "Exp. no.",
    "Date",
    "Chemist",
    "Substrate",
    "SM SMILES",
    "CAS",
    "Scale (mmol)",
    "Reagent",
    "Reagent SMILES",
    "Equiv.",
    "Solvent",
    "Volume [mL]",
    "Temp / °C",
    "Time",
    "Vessel",
    "Product",
    "Product SMILES",
    "Yield (%)",
    "er",
    "Remarks",
    "Fridge shelf",
)

SUBSTRATES = (
    # name, what remains of the SMILES without its bromine, CAS number (from memory; the check digits are tested)
    ("1-bromobutane", "CCCC", "109-65-9"),
    ("1-bromopentane", "CCCCC", "110-53-2"),
    ("1-bromohexane", "CCCCCC", "111-25-1"),
    ("1-bromoheptane", "CCCCCCC", "629-04-9"),
    ("1-bromooctane", "CCCCCCCC", "111-83-1"),
    ("1-bromodecane", "CCCCCCCCCC", "112-29-8"),
    ("1-bromododecane", "CCCCCCCCCCCC", "143-15-7"),
    ("1-bromo-3-methylbutane", "CC(C)CC", "107-82-4"),
    ("1-bromo-3-phenylpropane", "c1ccccc1CCC", "637-59-2"),
    ("1-bromo-2-methylpropane", "CC(C)C", "78-77-3"),
)
REAGENTS = (
    # name, SMILES, what it puts in the place of the bromine, what the product is called
    ("sodium azide", "[Na+].[N-]=[N+]=[N-]", "N=[N+]=[N-]", "azide"),
    ("potassium thioacetate", "[K+].CC(=O)[S-]", "SC(C)=O", "thioacetate"),
    ("sodium thiophenolate", "[Na+].[S-]c1ccccc1", "Sc1ccccc1", "phenyl sulfide"),
    ("sodium iodide", "[Na+].[I-]", "I", "iodide"),
    ("potassium acetate", "[K+].CC(=O)[O-]", "OC(C)=O", "acetate"),
)

MAP = """\
columns:
  Exp. no.: notebook
  Date: performed.date
  Chemist: performed.by
  Substrate: substrate.name
  SM SMILES: substrate.smiles
  CAS: substrate.cas
  Scale (mmol): substrate.amount
  Reagent: nucleophile.name
  Reagent SMILES: nucleophile.smiles
  Equiv.: nucleophile.equivalents
  Solvent: solvent.name
  'Volume [mL]': solvent.volume
  Temp / °C: stages.temperature
  Time: stages.time
  Vessel: {to: stages.vessel, words: {flask: open, tube: sealed}}
  Product: outcome.products.1.name
  Product SMILES: outcome.products.1.smiles
  Yield (%): outcome.measured.1.yield
  er: outcome.measured.2.er
  Remarks: take_away
  Fridge shelf: ignore
constants:
  title: '{substrate.name} and {nucleophile.1.name} in {solvent.1.name}'
  outcome.result: substitution
  outcome.products.1.label: A
  outcome.products.1.use: desired
  outcome.measured.1.of: A
  outcome.measured.1.kind: isolated
  outcome.measured.2.of: A
  outcome.measured.2.by: chiral HPLC
words:
  n/a: not recorded
"""

SEEDED: dict[str, tuple[Any, str]] = {
    # cell: what stands there instead, and the rule that must name it
    "M3": ("r.t.", "quantity-vague"),
    "M5": ("60 °F", "quantity-unknown-unit"),
    "N6": (16, "quantity-without-unit"),
    "N8": ("overnight", "quantity-vague"),
    "N9": ("16 h 30 min", "quantity-arithmetic"),
    "R10": ("85-90", "quantity-arithmetic"),
    "R12": ("good", "quantity-unreadable"),
    "L13": ("2,5", "quantity-decimal-comma"),
    "J15": ("1.5 eq", "value-wrong-type"),
    "S16": (dt.timedelta(hours=97, minutes=3), "cell-altered"),
    "F18": (dt.datetime(2020, 10, 5), "cell-altered"),
    "F19": ("109-65-8", "value-not-permitted"),
    "E20": ("CCCC(Br", "structure-unreadable"),
    "Q22": ("CCCC?", "structure-unreadable"),
    "B23": ("31.02.2026", "value-not-permitted"),
    "G25": ("=5*2", "cell-without-result"),
    "G26": ("#REF!", "cell-without-result"),
    "G27": ("10 g", "quantity-wrong-dimension"),
    "O29": ("autoclav", "value-not-permitted"),
    "T30": ("clean <b>product</b>", "markup-in-text"),
    "D31": (dt.datetime(2026, 3, 1), "cell-altered"),
    "M33": ("60 g", "quantity-wrong-dimension"),
    "L33": ("ten", "quantity-unreadable"),
}
"""Row 33 has two, for a row is told of all its cells at once."""

SEEDED_ROWS = {
    # row: what is done to it, and the rule that must name the row
    35: ("no key", "row-without-key"),
    2: ("its key stands in row 37 again", "row-repeated"),
    37: ("the key of row 2 again", "row-repeated"),
    39: ("no solvent", "key-missing"),
}


def messy_workbook() -> Workbook:
    """Return the workbook; its headings are in row 1, the runs in rows 2 to 51."""
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "Runs"
    sheet.append(HEADINGS)
    for number in range(50):
        sheet.append(_run(number))
        sheet.cell(number + 2, 7).number_format = "0.0"
    sheet["A35"], sheet["A37"], sheet["K39"] = None, sheet["A2"].value, None
    sheet["L39"] = None
    for cell, (value, _) in SEEDED.items():
        sheet[cell] = value
    return book


def _run(number: int) -> list[Any]:
    name, rest, cas = SUBSTRATES[number % 10]
    reagent, reagent_smiles, group, word = REAGENTS[number // 10]
    return [
        f"XB7/{number + 1:03}",
        dt.datetime(2026, 2, 1) + dt.timedelta(days=number),
        f"bench-{number % 3 + 1}",
        name,
        f"{rest}Br",
        cas,
        10,
        reagent,
        reagent_smiles,
        1.2 + 0.1 * (number % 4),
        "DMF" if number % 2 else " acetone ",
        20,
        50 + number % 20,
        f"{4 + number % 9} h",
        "flask" if number % 2 else "tube",
        f"{name.replace('1-bromo', '')} {word}",
        rest + group,
        70 + number % 25,
        None,
        None if number % 5 else f"Run {number + 1} went as the others did; nothing to add.",
        "3b",
    ]


if __name__ == "__main__":
    folder = Path(sys.argv[1])
    messy_workbook().save(folder / "messy.xlsx")
    (folder / "messy.yml").write_text(MAP, "utf-8")
