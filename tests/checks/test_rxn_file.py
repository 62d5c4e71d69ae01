"""Structures from an RXN file beside the record: read, hashed, never followed outside the book."""

import hashlib
from pathlib import Path

import pytest

from builder.book import Book, open_book
from builder.checks.case import Case
from builder.records.specimen import with_example
from tests.specimens import TODAY

# CTfile RXN V2000, written by hand: iodomethane -> methanol, without hydrogens.
MOLECULE = """$MOL


  {note}
  2  1  0  0  0  0            999 V2000
    0.0000    0.0000    0.0000 C   0  0
    1.0000    0.0000    0.0000 {element}   0  0
  1  2  1  0
M  END
"""
RXN = (
    "$RXN\n\n  scheme\n\n  1  1\n"
    + MOLECULE.format(note="reactant", element="I ")
    + MOLECULE.format(note="product", element="O ")
)
RECORD = """\
rxn_file: {{path: {path}, sha256: {sha}}}
substrate: {{name: iodomethane, from_rxn: reactant 1, class: methyl, leaving_group: iodide, amount: 10 mmol}}
nucleophile: {{name: sodium hydroxide, smiles: '[Na+].[OH-]', equivalents: 1.5}}
stages: [{{temperature: 40 °C, time: 16 h}}]
outcome:
  result: [substitution]
  products: [{{label: A, name: methanol, from_rxn: {product}, use: desired}}]
  measured: [{{yield: 81 %, of: A, kind: assay}}]
"""


def _book(
    tmp_path: Path, *, path: str = "scheme.rxn", sha: str = "", product: str = "product 1", rxn: str = RXN
) -> Book[Case]:
    folder = tmp_path / "entries"
    folder.mkdir()
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    (folder / "scheme.rxn").write_text(rxn, "utf-8", newline="\n")
    (tmp_path / "outside.rxn").write_text(rxn, "utf-8", newline="\n")
    (folder / "link.rxn").symlink_to(tmp_path / "outside.rxn")
    sha = sha or hashlib.sha256(rxn.encode()).hexdigest()
    example = RECORD.format(path=path, sha=sha, product=product)
    (folder / "NS4T9XQ2N.yml").write_text(with_example(example), "utf-8")
    return open_book(folder, today=TODAY)


@pytest.mark.parametrize("rxn", [RXN, "\ufeff" + RXN.replace("\n", "\r\n")], ids=["plain", "written by Windows"])
def test_structures_are_taken_from_the_file(tmp_path: Path, rxn: str) -> None:
    book = _book(tmp_path, rxn=rxn)
    (entry,) = book.entries
    assert entry.kept.substrate.smiles == "CI"
    assert entry.kept.structures[("outcome", "products", 0)].smiles == "CO"
    assert [finding.rule for finding in entry.findings if finding.level == "error"] == []


FAULTS = [
    ({"path": "missing.rxn"}, "rxn-file-unusable", "missing, outside the book, or too large"),
    ({"path": "link.rxn"}, "rxn-file-unusable", "missing, outside the book, or too large"),
    ({"rxn": RXN + " " * 300_000}, "rxn-file-unusable", "missing, outside the book, or too large"),
    ({"path": "../outside.rxn"}, "value-not-permitted", "leads out of the book"),
    ({"path": "/etc/passwd"}, "value-not-permitted", "leads out of the book"),
    ({"sha": "f" * 64}, "rxn-file-unusable", "not the one whose SHA-256"),
    ({"rxn": "no RXN at all"}, "rxn-file-unusable", "not an RXN block"),
    ({"product": "product 2"}, "structure-unreadable", "has no product 2"),
]


@pytest.mark.parametrize(("change", "rule", "message"), FAULTS, ids=[str(row[0]) for row in FAULTS])
def test_faults_are_found(tmp_path: Path, change: dict[str, str], rule: str, message: str) -> None:
    book = _book(tmp_path, **change)
    errors = [finding for finding in book.findings if finding.level == "error"]
    assert [finding.rule for finding in errors] == [rule]
    assert message in errors[0].message
    assert book.entries == ()


def test_a_component_needs_a_file(tmp_path: Path) -> None:
    folder = tmp_path / "entries"
    folder.mkdir()
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    example = RECORD.format(path="x.rxn", sha="f" * 64, product="product 1").split("\n", 1)[1]
    (folder / "NS4T9XQ2N.yml").write_text(with_example(example), "utf-8")
    rules = {finding.rule for finding in open_book(folder, today=TODAY).findings if finding.level == "error"}
    assert rules == {"rxn-file-unusable"}
