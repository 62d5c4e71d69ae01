"""What every chemist at the bench knows, asked of the engine. All of it common practice, no source."""

from collections.abc import Sequence
from typing import Any

import pytest

from builder.chemistry.structure import parse_smiles
from builder.mechanism.asking import read_question
from builder.mechanism.engine import predict
from builder.mechanism.forecast import Forecast
from builder.mechanism.solvents import SolventKind, find_solvent
from builder.records.vocabulary import Course, Mechanism

DAY_H = 24.0


def ask(
    substrate: str, nucleophile: str, solvent: str | Sequence[tuple[str, float]], t_c: float, **more: Any
) -> Forecast:
    parts = [(solvent, 1.0)] if isinstance(solvent, str) else solvent
    question = read_question(substrate=substrate, nucleophile=nucleophile, solvent=parts, temperature_c=t_c, **more)
    return predict(question.question)


def smiles_of(forecast: Forecast) -> list[str]:
    return [product.structure.smiles for product in forecast.products]


def same(smiles: str) -> str:
    return parse_smiles(smiles).smiles


# --- substitution ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("substrate", ["CCCCBr", "CCCBr", "CCCCCCCCBr", "CC(C)CCBr"])
def test_a_primary_bromide_with_methoxide_in_the_cold_gives_the_ether(substrate: str) -> None:
    # In the cold it takes weeks; what little reacts is substitution.
    for hours, is_main in ((DAY_H, False), (2400.0, True)):
        forecast = ask(substrate, "sodium methoxide", "methanol", 0, time_h=hours)
        assert forecast.shares[Mechanism.SN2] > 0.9
        if is_main:
            assert forecast.mechanism is Mechanism.SN2
            assert smiles_of(forecast)[0] == same(substrate.replace("Br", "OC"))


def test_a_secondary_chloride_with_a_thiolate_is_inverted() -> None:
    forecast = ask("C[C@H](Cl)CC", "sodium ethanethiolate", "DMF", 0)
    assert (forecast.mechanism, forecast.course) == (Mechanism.SN2, Course.INVERSION)
    assert smiles_of(forecast)[0] == same("C[C@@H](SCC)CC")


@pytest.mark.parametrize("substrate", ["CCC(C)Br", "CC(C)Br", "BrC1CCCC1"])
@pytest.mark.parametrize("solvent", ["ethanol", "DMF"])
def test_thiolates_displace_where_alkoxides_eliminate(substrate: str, solvent: str) -> None:
    thiolate = ask(substrate, "sodium ethanethiolate", solvent, 25)
    alkoxide = ask(substrate, "sodium ethoxide", solvent, 25)
    assert thiolate.shares[Mechanism.SN2] > 0.9
    assert alkoxide.shares[Mechanism.E2] > alkoxide.shares[Mechanism.SN2]
    assert thiolate.log_k["SN2"] > alkoxide.log_k["SN2"] + 1


def test_a_thiophenolate_outdoes_a_phenolate_of_greater_basicity() -> None:
    sulfur, oxygen = (
        ask("CCCCBr", n, "methanol", 25).log_k["SN2"] for n in ("sodium thiophenolate", "sodium phenoxide")
    )
    assert sulfur > oxygen + 1.5


def test_iodomethane_and_nitrite_give_nitromethane() -> None:
    for solvent in ("DMF", "DMSO"):
        forecast = ask("CI", "sodium nitrite", solvent, 25)
        assert smiles_of(forecast)[0] == same("C[N+](=O)[O-]")
        assert forecast.products[0].share > 0.6


# --- ionisation -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("group", ["OS(=O)(=O)c1ccc(C)cc1", "Br", "I"])
@pytest.mark.parametrize("solvent", ["water", "methanol"])
def test_a_tertiary_group_ionises_in_water_and_methanol(group: str, solvent: str) -> None:
    forecast = ask(f"CCC[C@](C)(CC){group}", solvent, solvent, 25)
    assert forecast.mechanism is Mechanism.SN1
    assert forecast.course in {Course.RACEMISATION, Course.PARTIAL_INVERSION}
    captured = [p for p in forecast.products if p.mechanism is Mechanism.SN1]
    assert len(captured) >= 2
    assert captured[0].structure == captured[1].structure.mirror_image  # both faces


@pytest.mark.parametrize("group", ["OS(=O)(=O)c1ccc(C)cc1", "Br", "I"])
@pytest.mark.parametrize("solvent", ["water", "methanol"])
def test_the_colder_the_more_substitution(group: str, solvent: str) -> None:
    found = [ask(f"CC(C)(C){group}", solvent, solvent, t_c).shares[Mechanism.SN1] for t_c in (0, 25, 60)]
    assert found == sorted(found, reverse=True)
    assert found[0] > 0.5


def test_an_allylic_bromide_goes_by_sn2_with_methoxide_and_by_sn1_in_methanol_alone() -> None:
    with_base = ask("C/C=C/CBr", "sodium methoxide", "methanol", 25)
    alone = ask("C/C=C/CBr", "methanol", "methanol", 25)
    assert with_base.mechanism is Mechanism.SN2
    assert smiles_of(with_base)[0] == same("C/C=C/COC")
    assert alone.mechanism is Mechanism.SN1


# --- solvents -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "name", ["water", "methanol", "ethanol", "isopropanol", "tert-butanol", "acetic acid", "formic acid"]
)
def test_protic_solvents(name: str) -> None:
    solvent = find_solvent(name)
    assert solvent is not None
    assert solvent.kind is SolventKind.PROTIC


@pytest.mark.parametrize("name", ["acetone", "DMF", "DMSO", "acetonitrile", "dichloromethane", "chloroform"])
def test_aprotic_solvents(name: str) -> None:
    solvent = find_solvent(name)
    assert solvent is not None
    assert solvent.kind is not SolventKind.PROTIC


@pytest.mark.parametrize("solvent", ["DMF", "DMSO", "acetonitrile", "acetone"])
def test_aprotic_solvents_bare_the_anion(solvent: str) -> None:
    bare = ask("CCCCBr", "sodium azide", solvent, 25).log_k["SN2"]
    held = ask("CCCCBr", "sodium azide", "methanol", 25).log_k["SN2"]
    assert bare > held + 1


# --- rearrangement --------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("substrate", "nucleophile", "solvent", "more"),
    [
        ("OCC1CCC1", "none", "neat", {"additives": ["H2SO4"]}),
        ("C1CCC1COS(C)(=O)=O", "acetic acid", "acetic acid", {}),
        ("NCC1CCC1", "water", "water", {"additives": ["HNO2"]}),
    ],
)
def test_a_cyclobutylcarbinyl_cation_becomes_the_five_ring(
    substrate: str, nucleophile: str, solvent: str, more: dict[str, Any]
) -> None:
    forecast = ask(substrate, nucleophile, solvent, 70, **more)
    assert forecast.rearranged
    assert {a.ring_sizes for a in forecast.products[0].structure.atoms if a.ring_sizes} == {(5,)}


def test_a_tertiary_cation_beside_a_five_ring_mostly_stays() -> None:
    forecast = ask("CC(C)(Cl)C1CCCC1", "methanol", "methanol", 40)
    wider = [p.share for p in forecast.products if any(6 in a.ring_sizes for a in p.structure.atoms)]
    assert sum(wider) < 0.5
    assert not forecast.rearranged


def test_pinacol_becomes_pinacolone() -> None:
    forecast = ask("CC(C)(O)C(C)(C)O", "none", "neat", 80, additives=["H2SO4"])
    assert smiles_of(forecast)[0] == same("CC(=O)C(C)(C)C")
    assert forecast.rearranged


def test_neopentyl_gives_the_tert_pentyl_skeleton_or_nothing() -> None:
    # by SN2 it hardly reacts; what ionises has shifted
    assert ask("CC(C)(C)CBr", "sodium ethoxide", "ethanol", 25).mechanism is Mechanism.NONE
    forecast = ask("CC(C)(C)COS(=O)(=O)c1ccc(C)cc1", "acetic acid", "acetic acid", 75, time_h=1000.0)
    assert forecast.rearranged
    assert all(p.rearranged for p in forecast.products if p.mechanism in {Mechanism.SN1, Mechanism.E1})


# --- alkynes --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("substrate", "base", "solvent", "t_c", "alkyne"),
    [
        ("CC(Br)CBr", "sodium amide", "THF", 25, "CC#C"),
        ("BrCC(Br)c1ccccc1", "potassium hydroxide", "ethanol", 78, "C#Cc1ccccc1"),
        ("BrC(c1ccccc1)C(Br)c1ccccc1", "potassium hydroxide", "ethanol", 78, "C(#Cc1ccccc1)c1ccccc1"),
    ],
)
def test_a_vicinal_dihalide_with_two_equivalents_of_base_gives_the_alkyne(
    substrate: str, base: str, solvent: str, t_c: float, alkyne: str
) -> None:
    assert smiles_of(ask(substrate, base, solvent, t_c, equivalents=2))[0] == same(alkyne)
    assert same(alkyne) not in smiles_of(ask(substrate, base, solvent, t_c, equivalents=1))[:1]


@pytest.mark.parametrize(("acid", "halogen"), [("HBr", "Br"), ("HCl", "Cl")])
def test_two_equivalents_of_hydrogen_halide_and_an_alkyne_give_the_gem_dihalide(acid: str, halogen: str) -> None:
    forecast = ask("CC#C", "none", "dichloromethane", 25, additives=[acid], equivalents=2, time_h=240.0)
    assert smiles_of(forecast)[0] == same(f"CC(C)({halogen}){halogen}")


# --- in the flask ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("base", ["potassium carbonate", "caesium carbonate", "triethylamine"])
def test_a_base_goes_on_taking_the_proton_of_a_phenol(base: str) -> None:
    # The phenoxide there at any time is a part of the phenol only; all of it is used in the end.
    forecast = ask("CI", "4-methoxyphenol", "acetone", 50, base=base, equivalents=1.2, time_h=1000.0)
    assert forecast.conversion > 0.95


def test_a_phenol_reacts_no_further_than_its_base_lasts() -> None:
    forecast = ask("CCCCBr", "4-methoxyphenol", "DMF", 50, base="sodium hydride", equivalents=0.4, time_h=100.0)
    assert forecast.conversion == pytest.approx(0.4, abs=0.02)


@pytest.mark.parametrize(("salt", "solvent"), [("KCN", "acetonitrile"), ("potassium fluoride", "acetonitrile")])
def test_a_crown_brings_the_salt_of_a_hard_anion_into_a_weak_donor(salt: str, solvent: str) -> None:
    alone = ask("CCCCBr", salt, solvent, 60)
    helped = ask("CCCCBr", salt, solvent, 60, additives=["18-crown-6"])
    assert helped.log_k["SN2"] - alone.log_k["SN2"] > 1


def test_sodium_iodide_dissolves_in_acetone() -> None:
    assert (
        ask("CCCCCl", "NaI", "acetone", 56).log_k == ask("CCCCCl", "NaI", "acetone", 56, additives=["18-crown-6"]).log_k
    )


def test_an_oil_over_aqueous_cyanide_needs_a_salt_that_carries_it() -> None:
    alone = ask("CCCCCCCCCCCl", "NaCN", "water", 100)
    carried = ask("CCCCCCCCCCCl", "NaCN", "water", 100, additives=["tetrabutylammonium bromide"])
    assert alone.mechanism is Mechanism.NONE
    assert smiles_of(carried)[0] == same("CCCCCCCCCCC#N")


def test_azide_opens_an_aziridinium_ion_before_water_does() -> None:
    forecast = ask("ClCCN(C)C", "NaN3", "water", 25)
    assert forecast.mechanism is Mechanism.NGP
    assert smiles_of(forecast)[0] == same("CN(C)CCN=[N+]=[N-]")


def test_a_lewis_acid_opens_a_sulfonylaziridine_where_it_ionises() -> None:
    forecast = ask(
        "Cc1ccc(S(=O)(=O)N2CC2c2ccc(C)cc2)cc1", "methanol", "methanol", 20, additives=["BF3 etherate"], time_h=24
    )
    assert smiles_of(forecast)[0] == same("COC(CNS(=O)(=O)c1ccc(C)cc1)c1ccc(C)cc1")


def test_a_carbinol_beside_a_diazonium_ion_becomes_the_ketone() -> None:
    forecast = ask("N#[N+]CC(O)(c1ccc(C)cc1)c1ccc(C)cc1", "water", "water", 5)
    assert smiles_of(forecast)[0] == same("O=C(Cc1ccc(C)cc1)c1ccc(C)cc1")
    assert forecast.products[0].rearranged


@pytest.mark.parametrize("alcohol", ["OCc1ccccc1", "CCO"])
def test_water_in_place_of_water_is_no_reaction(alcohol: str) -> None:
    assert ask(alcohol, "none", "water", 60, additives=["H2SO4"]).mechanism is Mechanism.NONE


# --- gates ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("substrate", ["Clc1ccccc1", "C=CBr", "BrC12CC3CC(CC(C3)C1)C2", "BrC12CCC(CC1)C2"])
def test_no_backside_attack_at_aryl_vinyl_or_bridgehead(substrate: str) -> None:
    forecast = ask(substrate, "sodium azide", "DMF", 80)
    assert "SN2" not in forecast.log_k
    assert Mechanism.SN2 not in forecast.shares


@pytest.mark.parametrize("substrate", ["CCCCO", "CCOCC", "CCCN"])
def test_a_poor_leaving_group_stays(substrate: str) -> None:
    forecast = ask(substrate, "sodium azide", "DMF", 80)
    assert forecast.mechanism is Mechanism.NONE
    assert not forecast.products


@pytest.mark.parametrize(("substrate", "product"), [("CCCCO", "CCCCBr"), ("CC(C)(C)O", "CC(C)(C)Br")])
def test_acid_makes_a_hydroxyl_group_leave(substrate: str, product: str) -> None:
    forecast = ask(substrate, "bromide", "water", 100 if substrate == "CCCCO" else 25, additives=["HBr (48% aq)"])
    assert smiles_of(forecast)[0] == same(product)


def test_an_epoxide_opens_at_the_open_end_in_base_and_at_the_full_end_in_acid() -> None:
    base = ask("CC1(C)CO1", "sodium methoxide", "methanol", 60)
    acid = ask("CC1(C)CO1", "methanol", "methanol", 25, additives=["H2SO4"])
    assert smiles_of(base)[0] == same("COCC(C)(C)O")
    assert smiles_of(acid)[0] == same("COC(C)(C)CO")
