"""Observations: what the tables refuse, and their numbers against laws and numbers that they were not copied from."""

import math
from statistics import linear_regression

import pytest

from builder.chemistry.structure import parse_smiles
from builder.mechanism.observations.tables import (
    Anchor,
    AnchorKind,
    Channel,
    Known,
    Quantity,
    Rate,
    Share,
    ShareKind,
    ToleranceKind,
    _read_anchors,
    _read_rates,
    _read_shares,
    load_anchors,
    load_rates,
    load_shares,
)
from builder.sources import load_sources
from builder.table import table_text
from tests.anchors import CUMYL_SIGMA_PLUS

PACKAGE = "builder.mechanism.observations"
RATES, SHARES, ANCHORS = load_rates(), load_shares(), load_anchors()


def solvent_of(row: Rate | Share | Anchor) -> str:
    return "+".join(f"{part.name}:{fraction:g}" for part, fraction in row.solvent)


def rate(substrate: str, channel: Channel, solvent: str, nucleophile: str | None = None, t_c: float = 25) -> float:
    """Return log10 k of the one rate constant in the table; the first where there are two sources."""
    return next(
        row.value
        for row in RATES
        if row.quantity is Quantity.LOG_K
        and (row.substrate, row.nucleophile, row.channel) == (substrate, nucleophile, channel)
        and (solvent_of(row), row.temperature_c) == (solvent, t_c)
    )


# --- against laws and other publications ----------------------------------------------------------------------


# Winstein and Fainberg, J. Am. Chem. Soc. 1957, 79, 5937: kcal/mol and cal/mol/K at 25 °C (from memory). They come from
# rates at several temperatures, so the Eyring equation is a check of the rate at 25 °C.
@pytest.mark.parametrize(
    ("solvent", "enthalpy", "entropy"),
    [
        ("ethanol:0.8+water:0.2", 22.34, -6.6),
        ("ethanol:1", 26.13, -3.2),
        ("methanol:1", 24.88, -3.1),
        ("water:1", 23.22, 12.2),
        ("acetic acid:1", 25.8, -2.5),
        ("formic acid:1", 21.0, -1.7),
    ],
)
def test_tert_butyl_chloride_ionises_as_its_activation_parameters_say(solvent, enthalpy, entropy):
    eyring = math.log10(1.380649e-23 * 298.15 / 6.62607015e-34)
    expected = eyring + (entropy - enthalpy * 1000 / 298.15) / (1.987204 * math.log(10))
    assert rate("CC(C)(C)Cl", Channel.IONISATION, solvent) == pytest.approx(expected, abs=0.05)


# ρ+ -4.54: Okamoto, Inukai and Brown, J. Am. Chem. Soc. 1958, 80, 4972 (from memory).
def test_cumyl_chlorides_lie_on_the_published_line():
    found = {row.substrate: row.value for row in RATES if row.set == "cumyl chlorides"}
    assert found.keys() == CUMYL_SIGMA_PLUS.keys()
    slope, intercept = linear_regression(
        list(CUMYL_SIGMA_PLUS.values()), [found[smiles] for smiles in CUMYL_SIGMA_PLUS]
    )
    assert slope == pytest.approx(-4.54, abs=0.1)
    assert intercept == pytest.approx(0, abs=0.05)


# Half-lives as printed by Mabey and Mill, J. Phys. Chem. Ref. Data 1978, 7, 383 (from memory).
@pytest.mark.parametrize(
    ("substrate", "days"),
    [("CBr", 20), ("CI", 110), ("CCBr", 30), ("CC(C)I", 2.8), ("ClCc1ccccc1", 15 / 24), ("CF", 30 * 365.25)],
)
def test_hydrolyses_have_their_half_lives(substrate, days):
    assert 10 ** rate(substrate, Channel.SOLVOLYSIS, "water:1", "O") == pytest.approx(
        math.log(2) / (days * 86400), rel=0.05
    )


# Two tables that were entered apart: rate constants, and alkene shares of the same reactions.
@pytest.mark.parametrize("substrate", ["CCCCBr", "CC(C)Br", "BrCCc1ccccc1"])
def test_rates_of_substitution_and_elimination_make_the_share(substrate):
    substitution, elimination = (
        10 ** rate(substrate, channel, "ethanol:1", "CC[O-]", 55) for channel in (Channel.SN2, Channel.E2)
    )
    share = next(row for row in SHARES if (row.substrate, row.kind) == (substrate, ShareKind.ELIMINATION))
    assert elimination / (elimination + substitution) == pytest.approx(share.value, abs=0.01)


# Independent works on one quantity agree within their errors: water (Mabey and Mill, and Fainberg and Winstein),
# exo/endo 350 (Winstein and Trifan), tert-butyl bromide/chloride 39 (Hughes and Ingold), all from memory.
def test_sources_agree_where_they_meet():
    in_water = [row.value for row in RATES if row.substrate == "CC(C)(C)Cl" and solvent_of(row) == "water:1"]
    assert len(in_water) == 2
    assert max(in_water) - min(in_water) < 0.05
    for anchor in ("A06", "A41"):
        found = next(row for row in ANCHORS if row.id == anchor)
        assert found.second_substrate is not None
        upper, lower = (
            rate(smiles, Channel.IONISATION, solvent_of(found)) for smiles in (found.substrate, found.second_substrate)
        )
        assert found.is_met(upper - lower)


def test_every_anchor_is_there_and_agrees_with_the_observation_of_the_same_reaction():
    assert {row.id[:3] for row in ANCHORS} == {f"A{number:02d}" for number in range(1, 51)}
    observed = {
        (row.kind, row.substrate, row.nucleophile, solvent_of(row), row.temperature_c, row.product): row.value
        for row in SHARES
    } | {
        (row.quantity, row.substrate, row.nucleophile, solvent_of(row), row.temperature_c, None): row.value
        for row in RATES
        if row.quantity is Quantity.LOG_K
    }
    met = 0
    for row in ANCHORS:
        key = (row.kind, row.substrate, row.nucleophile, solvent_of(row), row.temperature_c, row.product)
        if key in observed:
            met += 1
            assert row.is_met(observed[key]), row.id
    assert met >= 40


def test_alkenes_are_hydrocarbons_that_the_substrate_can_give():
    for row in SHARES:
        if row.kind in {ShareKind.ALKENE, ShareKind.TRANS_CIS}:
            product, substrate = parse_smiles(row.product), parse_smiles(row.substrate)
            assert {atom.symbol for atom in product.atoms} == {"C"}, row.id
            assert any(order == 2 for atom in product.atoms for _, order in atom.neighbours), row.id
            assert len(product.atoms) < len(substrate.atoms), row.id


def test_numbers_are_marked_as_their_source_is_known():
    how = {Known.LOOKED_UP: {"looked up"}, Known.MEMORY: {"from memory", "common practice"}}
    for row in (*RATES, *SHARES, *ANCHORS):
        assert load_sources()[row.source].how in how[row.how], row.id


# --- anchors ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("kind", "tolerance", "computed", "met"),
    [
        (ToleranceKind.FACTOR, 2, 1.30, True),
        (ToleranceKind.FACTOR, 2, 1.31, False),
        (ToleranceKind.ABSOLUTE, 0.2, 0.81, True),
        (ToleranceKind.ABSOLUTE, 0.2, 0.79, False),
        (ToleranceKind.AT_LEAST, 0.9, 0.9, True),
        (ToleranceKind.AT_LEAST, 0.9, 0.89, False),
        (ToleranceKind.AT_MOST, 0.05, 0.05, True),
        (ToleranceKind.AT_MOST, 0.05, 0.06, False),
    ],
)
def test_a_tolerance_bounds_what_is_computed(kind, tolerance, computed, met):
    anchor = Anchor(
        **{name: getattr(ANCHORS[0], name) for name in Anchor.__slots__}
        | {"kind": AnchorKind.LOG_RATIO, "expected": 1.0, "tolerance_kind": kind, "tolerance": tolerance}
    )
    assert anchor.is_met(computed) is met


# --- what is refused -------------------------------------------------------------------------------------------


def changed(table: str, row_id: str, **cells: str) -> str:
    """Return the text of a table with some cells of one row changed."""
    lines = [line.split("\t") for line in table_text(PACKAGE, table).splitlines() if not line.startswith("#")]
    row = next(line for line in lines if line[0] == row_id)
    for column, cell in cells.items():
        assert row[lines[0].index(column)] != cell
        row[lines[0].index(column)] = cell
    return "\n".join("\t".join(line) for line in lines)


@pytest.mark.parametrize(
    ("row_id", "cells", "message"),
    [
        ("r002", {"id": "r001"}, "id given twice: r001"),
        ("r002", {"nucleophile": "[F-]"}, "observation given twice"),
        ("r002", {"value": "nan"}, "nan is not finite"),
        ("r002", {"temperature_c": "inf"}, "inf is not finite"),
        ("r002", {"solvent": "MeOH:1"}, "MeOH is no name in the solvent table"),
        ("r002", {"solvent": "methanol"}, "methanol is no name in the solvent table"),
        ("r002", {"solvent": "methanol:0.8+water:0.3"}, "must be positive and add up to 1"),
        ("r002", {"substrate": "IC"}, "IC is not canonical; write CI"),
        ("r002", {"channel": "SN3"}, "'SN3' is not a valid Channel"),
        ("r002", {"source": "nobody-1900"}, "unknown source nobody-1900"),
        ("r002", {"error": "0"}, "error must be positive"),
        ("r002", {"relative_to": "r060"}, "a ratio needs a set and a reference"),
        ("r061", {"relative_to": "r999"}, "r999 is no reference of the set"),
        ("r061", {"relative_to": "r068"}, "r068 is no reference of the set"),
        ("r061", {"relative_to": "r062"}, "r062 is no reference of the set"),
        ("r060", {"value": "0.1"}, "the reference must have value 0"),
        ("r061", {"temperature_c": "30"}, "the same temperature"),
    ],
)
def test_a_wrong_rate_is_refused(row_id, cells, message):
    with pytest.raises(ValueError, match=message):
        _read_rates(changed("rates.tsv", row_id, **cells))


@pytest.mark.parametrize(
    ("row_id", "cells", "message"),
    [
        ("s002", {"id": "s001"}, "id given twice: s001"),
        ("s002", {"substrate": "CCBr"}, "observation given twice"),
        ("s002", {"value": "9.8"}, "the share must lie between 0 and 1"),
        ("s011", {"concentration_m": "0"}, "a concentration of 0 mol/L"),
        ("s039", {"product": "-"}, "needs the product it counts"),
    ],
)
def test_a_wrong_share_is_refused(row_id, cells, message):
    with pytest.raises(ValueError, match=message):
        _read_shares(changed("shares.tsv", row_id, **cells))


@pytest.mark.parametrize(
    ("row_id", "cells", "message"),
    [
        ("A02", {"id": "A01"}, "id given twice: A01"),
        ("A01", {"channel": "-"}, "a rate needs its channel"),
        ("A06", {"second_substrate": "-"}, "needs a second substrate"),
        ("A01", {"second_solvent": "water:1"}, "needs a second substrate"),
        ("A01", {"substrate": "-"}, "need a substrate"),
        ("A01", {"tolerance": "0.9"}, "a factor above 1"),
        ("A08", {"tolerance_kind": "factor", "tolerance": "2"}, "only rates have a factor"),
    ],
)
def test_a_wrong_anchor_is_refused(row_id, cells, message):
    with pytest.raises(ValueError, match=message):
        _read_anchors(changed("anchors.tsv", row_id, **cells))
