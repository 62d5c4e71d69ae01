"""Polarity: the scales against each other and against settled facts, mixtures, and faults in the table."""

from math import sqrt

import pytest

from builder.mechanism.polarity import Polarity, _read_polarities, load_polarities, mixed_polarity, polarity_of
from builder.mechanism.solvents import SolventKind, load_solvents
from builder.sources import load_sources
from builder.table import table_text

POLARITIES = load_polarities()
TABLE = table_text("builder.mechanism", "polarity.tsv")

# What the dye of the E_T(30) scale sees otherwise than the Kamlet-Taft dyes: large polarisable molecules, cyclic
# carbonates and carboxylic acids.
ODD_FOR_THE_DYE = {"carbon disulfide", "2,4,6-collidine", "propylene carbonate", "ethylene carbonate", "propionic acid"}


def by_name(each: Polarity) -> str:
    return each.name


def test_every_solvent_has_a_polarity() -> None:
    assert [each.name for each in POLARITIES] == [solvent.name for solvent in load_solvents()]


@pytest.mark.parametrize("each", POLARITIES, ids=by_name)
def test_every_value_has_a_known_source(each: Polarity) -> None:
    quantities = ("alpha", "beta", "pi_star", "donor_number", "etn")
    assert set(each.sources) == {q for q in quantities if getattr(each, q) is not None}
    assert set(each.sources.values()) <= set(load_sources())
    estimated = "estimated-here" in {each.sources[q] for q in ("alpha", "beta", "pi_star")}
    assert each.error >= 0.15 if estimated else each.error in {0.05, 0.1}


@pytest.mark.parametrize(
    "each", [p for p in POLARITIES if p.etn is not None and p.name not in ODD_FOR_THE_DYE], ids=by_name
)
def test_scales_agree_with_reichardts(each: Polarity) -> None:
    # Marcus, Chem. Soc. Rev. 1993, 22, 409 (from memory): E_T(30) = 31.2 + 15.2 alpha + 11.5 pi*, in kcal/mol.
    assert each.etn == pytest.approx((31.2 + 15.2 * each.alpha + 11.5 * each.pi_star - 30.7) / 32.4, abs=0.14)


def test_alpha_follows_from_hydrogens() -> None:
    kind = {solvent.name: solvent.kind for solvent in load_solvents()}
    assert {each.name for each in POLARITIES if each.alpha > 0.25} == {
        name for name, its_kind in kind.items() if its_kind is SolventKind.PROTIC and name != "ammonia"
    }


@pytest.mark.parametrize(
    ("quantity", "names"),
    [
        # From weak to strong: Reichardt and Welton, Solvents and Solvent Effects, ch. 7 (from memory).
        ("alpha", "acetone acetonitrile tert-butanol 2-propanol ethanol methanol water trifluoroethanol HFIP"),
        ("beta", "hexane toluene acetonitrile THF DMF DMSO HMPA"),
        ("pi_star", "hexane ether THF acetone DMF DMSO water"),
        ("donor_number", "hexane nitromethane acetonitrile acetone DMF DMSO pyridine HMPA triethylamine"),
        ("etn", "hexane toluene THF DMF acetonitrile 2-propanol ethanol methanol water"),
    ],
)
def test_order_of_solvents(quantity: str, names: str) -> None:
    values = [getattr(polarity_of(name), quantity) for name in names.split()]
    assert values == sorted(values)


@pytest.mark.parametrize(
    ("typed", "name"), [("EtOH", "ethanol"), ("N,N-dimethylformamide", "DMF"), ("ether", "diethyl ether")]
)
def test_any_name_of_a_solvent_will_do(typed: str, name: str) -> None:
    assert polarity_of(typed).name == name


def test_a_mixture_lies_between_its_components() -> None:
    mixed = mixed_polarity([("ethanol", 8), ("water", 2)])
    assert mixed.alpha == pytest.approx(0.8 * 0.86 + 0.2 * 1.17)
    assert mixed.pi_star == pytest.approx(0.8 * 0.54 + 0.2 * 1.09)
    assert mixed.error == pytest.approx(sqrt(0.05**2 + 0.031**2))
    assert mixed.name == "80 % ethanol / 20 % water"
    assert set(mixed.sources.values()) == {"estimated-here"}


def test_one_solvent_is_no_mixture_and_a_missing_value_stays_missing() -> None:
    assert mixed_polarity([("EtOH", 3), ("ethanol", 1), ("water", 0)]) is polarity_of("ethanol")
    assert mixed_polarity([("2-propanol", 1), ("water", 1)]).donor_number is None


@pytest.mark.parametrize("parts", [[], [("water", 0.0)], [("water", -1.0)], [("water", float("inf"))]])
def test_a_mixture_needs_a_part(parts: list[tuple[str, float]]) -> None:
    with pytest.raises(ValueError, match="positive share"):
        mixed_polarity(parts)


def test_an_unknown_solvent_is_an_error() -> None:
    with pytest.raises(KeyError, match="brine"):
        mixed_polarity([("brine", 1.0), ("water", 1.0)])


WATER = next(line for line in TABLE.splitlines() if line.startswith("water\t"))


@pytest.mark.parametrize(
    ("was", "becomes", "complaint"),
    [
        ("\t1.17\t", "\tnan\t", "out of range"),
        ("\t1.17\topen-solvent-tables", "\t-\t-", "are needed"),
        ("\t18.0\t", "\t-\t", "needs a value and a source"),
        ("gutmann-1976", "hearsay", "unknown source"),
        (WATER, f"{WATER}\n{WATER}", "given twice"),
        (f"{WATER}\n", "", "water"),
        ("water\t", "brine\t", "brine"),
        ("pi_star\t", "pi\t", "header"),
    ],
)
def test_faults_in_the_table_are_refused(was: str, becomes: str, complaint: str) -> None:
    assert was in TABLE
    with pytest.raises(ValueError, match=complaint):
        _read_polarities(TABLE.replace(was, becomes, 1) if was != "pi_star\t" else TABLE.replace(was, becomes))
