"""The digest: what changes it, what does not, and that the canonical form is RFC 8785."""

import hashlib

import pytest
import rfc8785

from builder.records.digest import canonical_json, digest
from builder.records.model import Record
from builder.records.reader import read_bytes
from builder.records.specimen import specimen_text, with_example


def _record(text: str) -> Record:
    record = read_bytes(text.encode(), "NS4T9XQ2N.yml").record
    assert record is not None
    return record


def test_the_canonical_form_is_rfc_8785() -> None:
    # RFC 8785, section 3.2.3: the sorting example, members by UTF-16 code units.
    names = {"\u20ac": 1, "\r": 2, "\ufb33": 3, "1": 4, "\U0001f600": 5, "\u0080": 6, "\u00f6": 7}
    expected = '{"\\r":2,"1":4,"\u0080":6,"ö":7,"€":1,"\U0001f600":5,"\ufb33":3}'
    assert rfc8785.dumps(names).decode() == expected


def test_golden_digest_of_the_specimen() -> None:
    content = canonical_json(_record(specimen_text()))
    assert content.startswith(b'{"evidence":["1H NMR","IR"],"nucleophile":[{"equivalents":"1.5","name":"sodium azide",')
    assert hashlib.sha256(content).hexdigest() == digest(_record(specimen_text()))


FROZEN = """\
outcome:
  result: [substitution]
  claim: {mechanism: SN2, course: not determined, basis: [product structure]}
  products: [{label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired, stereo: racemate}]
  measured: [{conversion: 99 %, by: GC}, {yield: 81 %, of: A, kind: assay, by: 1H NMR}]
"""


def test_the_digest_never_changes_by_itself() -> None:
    # Frozen on 2026-12-01: published citations quote digests, so a change of this one breaks them.
    frozen = "f6ec5fbd1654fd3aa7ca4a7956c8f9e420ead32be88d10a74c2543b176fbed64"
    assert digest(_record(with_example(FROZEN))) == frozen


SAME = {
    "title": "title: Another title",
    "review": "reviewed: {by: bench-3, date: 2026-04-01}",
    "take-away": "take_away: A sentence.",
    "disclosure": "disclosure: cleared",
    "unit": "solvent: [{name: DMF, volume: 0.020 L}]",
    "order of keys": "solvent: [{volume: 20 mL, name: DMF}]",
    "one in a list": "performed: {date: 2026-03-14, by: bench-2, runs: 2}",
    "comment": "notebook: BK2/112  # see there",
}
DIFFERENT = {
    "digits": "solvent: [{name: DMF, volume: 20.0 mL}]",
    "value": "solvent: [{name: DMF, volume: 21 mL}]",
    "typed SMILES": "nucleophile: {name: sodium azide, smiles: '[N-]=[N+]=[N-].[Na+]', equivalents: 1.5}",
    "runs": "performed: {date: 2026-03-14, by: [bench-2], runs: 3}",
    "evidence": "evidence: [1H NMR]",
}


@pytest.mark.parametrize("change", SAME.values(), ids=SAME.keys())
def test_stays(change: str) -> None:
    assert digest(_record(with_example(change))) == digest(_record(specimen_text()))


@pytest.mark.parametrize("change", DIFFERENT.values(), ids=DIFFERENT.keys())
def test_changes(change: str) -> None:
    assert digest(_record(with_example(change))) != digest(_record(specimen_text()))


def test_no_number_passes_through_a_float() -> None:
    record = _record(
        with_example("nucleophile: {name: x, smiles: '[N-]=[N+]=[N-]', equivalents: 0.1000000000000000055}")
    )
    assert b'"equivalents":"0.1000000000000000055"' in canonical_json(record)
