"""Nearest entries: site class first, then the attacking atom, then the likeness of the substrate."""

import datetime as dt

import pytest

from builder.checks.case import Case, open_case
from builder.checks.nearest import Likeness, attacker_of, likeness_of, nearest
from builder.chemistry.structure import parse_smiles
from builder.records.reader import read_bytes
from builder.records.settings import Settings
from builder.records.specimen import with_example
from builder.records.vocabulary import NucleophileWord

AZIDE = "name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]'"
THIOLATE = "name: sodium thiophenolate, smiles: '[Na+].[S-]c1ccccc1'"


def _case(entry: str, smiles: str, classes: str, nucleophile: str) -> Case:
    substrate = f"name: substrate, smiles: '{smiles}', class: {classes}, leaving_group: bromide, amount: 10 mmol"
    text = with_example(
        f"entry: {entry}\nsubstrate: {{{substrate}}}\nnucleophile: {{{nucleophile}, equivalents: 1.5}}\n"
    )
    record = read_bytes(text.encode(), f"{entry}.yml").record
    assert record is not None
    return open_case(record, f"{entry}.yml", Settings(format=1, title="A book"), dt.date(2026, 12, 1))


CASES = [
    _case("NS4T9XQ2N", "CCCC(C)Br", "secondary", AZIDE),
    _case("NS7K3QFMC", "CCC(C)Br", "secondary", THIOLATE),
    _case("NS2H8WDRW", "CCCCBr", "primary", AZIDE),
    _case("NS3V6TDMZ", "BrC(CC)CCCCCCC", "secondary", AZIDE),
]


@pytest.mark.parametrize(
    ("smiles", "classes", "attacker", "order"),
    [
        ("CCC(C)Br", {"secondary"}, "N", ["NS4T9XQ2N", "NS3V6TDMZ", "NS7K3QFMC", "NS2H8WDRW"]),
        ("CCC(C)Br", {"secondary"}, "S", ["NS7K3QFMC", "NS4T9XQ2N", "NS3V6TDMZ", "NS2H8WDRW"]),
        ("CCCBr", {"primary"}, "S", ["NS2H8WDRW", "NS7K3QFMC", "NS4T9XQ2N", "NS3V6TDMZ"]),
    ],
)
def test_class_then_atom_then_likeness(smiles: str, classes: set[str], attacker: str, order: list[str]) -> None:
    asked = Likeness(parse_smiles(smiles), frozenset(classes), attacker)
    assert [case.record.entry for case, _ in nearest(asked, CASES)] == order


def test_what_attacks() -> None:
    ethanol = parse_smiles("CCO")
    assert attacker_of(NucleophileWord.SOLVENT, [ethanol]) == "O"
    assert attacker_of(NucleophileWord.INTERNAL, [ethanol]) == "internal"
    assert attacker_of(None, [ethanol]) == "base"
    assert attacker_of(parse_smiles("[Na+].[S-]c1ccccc1"), []) == "S"


def test_a_likeness_follows_from_the_record() -> None:
    found = likeness_of(CASES[1])
    assert found is not None
    assert (found.substrate.smiles, found.classes, found.attacker) == ("CCC(C)Br", {"secondary"}, "S")
    assert found.resembles(Likeness(parse_smiles("CC(C)Br"), frozenset({"secondary", "cyclic"}), "S"))
    assert not found.resembles(Likeness(parse_smiles("CC(C)Br"), frozenset({"secondary"}), "N"))
