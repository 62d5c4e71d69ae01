"""The completeness of a record: what is asked of whom, in which order, at what weight."""

import pytest

from builder.checks.completeness import Completeness, completeness
from builder.records.specimen import outcome_example, with_example
from tests.specimens import examine_text

ASSAY = "{conversion: 90 %, by: GC}, {yield: 81 %, of: A, kind: assay, by: GC}"
CLAIM = "claim: {mechanism: SN2, course: not determined, basis: [product structure]}"
WHOLE = "take_away: 81 % in 16 h\nsubstrate: {name: 2-bromobutane, smiles: 'CCC(C)Br', stereo: racemate,\
 class: secondary, leaving_group: bromide, amount: 10 mmol, purity: 98 %}\n"


def _completeness(example: str) -> Completeness:
    return completeness(examine_text(with_example(example)).kept)


def test_a_whole_record_has_100_percent() -> None:
    assert _completeness(WHOLE) == Completeness(100, (), False)


def test_what_weighs_little_alone_is_not_asked_for() -> None:
    found = _completeness("take_away: 81 % in 16 h")
    assert found.missing == ("purity of the substrate",)
    assert found.percent < 100
    assert not found.is_told


def test_heavy_gaps_come_first() -> None:
    found = _completeness("# without notebook\n# without work_up\n# without take_away")
    assert found.missing[0] == "work_up with its quench"
    assert found.missing[-1] == "purity of the substrate"
    assert found.is_told
    assert found.percent < _completeness("# without notebook").percent


AMINE = (
    "nucleophile: {{name: the amine, smiles: {smiles}, equivalents: {equivalents}}}\n"
    "stages: [{{temperature: 60 °C, time: 16 h}}]\n"
)
BASE = "base that takes up the acid set free"


@pytest.mark.parametrize(
    ("example", "is_asked"),
    [
        (AMINE.format(smiles="CCCCN", equivalents=1.1), True),
        (AMINE.format(smiles="CCCCN", equivalents=2.5), False),  # the second equivalent takes it
        (AMINE.format(smiles="CCN(CC)CC", equivalents=1.1), False),  # no hydrogen to lose
        (AMINE.format(smiles="'[Na+].[N-]=[N+]=[N-]'", equivalents=1.1), False),
        (AMINE.format(smiles="CCCCS", equivalents=1.1), True),
        ("nucleophile: solvent\nstages: [{temperature: 60 °C, time: 16 h}]", False),
    ],
)
def test_a_base_is_asked_for_where_acid_is_set_free(example: str, is_asked: bool) -> None:
    assert (BASE in _completeness(example).missing) is is_asked


FLUORIDE = "nucleophile: {name: caesium fluoride, smiles: '[Cs+].[F-]', equivalents: 2.0%s}\n"
STAGES = "stages: [{temperature: 60 °C, time: 16 h}]\n"
WATER = "water: ppm, or how solvent and salt were dried (form)"


@pytest.mark.parametrize(
    ("example", "is_asked"),
    [
        (FLUORIDE % "" + STAGES, True),
        (FLUORIDE % ", form: dried at 150 °C and 1 mbar" + STAGES, False),
        (FLUORIDE % "" + STAGES + "solvent: [{name: DMF, volume: 20 mL, form: 50 ppm water}]", False),
        (FLUORIDE % "" + STAGES + "solvent: [{name: tert-butanol, volume: 20 mL}]", False),
        (STAGES, False),  # azide does not mind
    ],
)
def test_water_is_asked_for_where_little_of_it_counts(example: str, is_asked: bool) -> None:
    assert (WATER in _completeness(example).missing) is is_asked


def test_an_area_share_is_no_yield() -> None:
    area = outcome_example(ASSAY.replace("assay", "area"), more=CLAIM)
    assert "yield, or what was recovered" in _completeness(area).missing
    assert "yield, or what was recovered" not in _completeness(outcome_example(ASSAY, more=CLAIM)).missing


def test_a_high_yield_needs_no_conversion() -> None:
    assert "conversion" in _completeness(outcome_example("{yield: 81 %, of: A, kind: isolated}")).missing
    assert "conversion" not in _completeness(outcome_example("{yield: 96 %, of: A, kind: isolated}")).missing
