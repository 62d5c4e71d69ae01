"""Reagents: what the table says of each, and names with strengths as people write them."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from builder.chemistry.structure import parse_smiles
from builder.mechanism.nucleophiles import find_nucleophile, nucleophile_by_structure
from builder.mechanism.reagents import (
    Reagent,
    Role,
    _read_reagents,
    find_reagent,
    load_reagents,
    nearest_reagents,
    reagent_by_structure,
)
from builder.sources import load_sources
from builder.table import table_text

REAGENTS = load_reagents()
TABLE = table_text("builder.mechanism", "reagents.tsv")


def named(text: str) -> Reagent:
    found = find_reagent(text)
    assert found is not None, text
    return found.reagent


@pytest.mark.parametrize("reagent", REAGENTS, ids=lambda reagent: reagent.name)
def test_a_row_is_sound(reagent: Reagent) -> None:
    assert reagent.source in load_sources()
    assert all(named(name) is reagent for name in (reagent.name, *reagent.synonyms))
    if reagent.smiles is not None:
        assert reagent_by_structure(reagent.smiles) is reagent
        assert parse_smiles(reagent.smiles).charge == 0 or reagent.name == "barium hydroxide"
    if reagent.supplies is not None:
        assert nucleophile_by_structure(reagent.supplies) is not None


def test_every_role_is_played() -> None:
    assert len(REAGENTS) >= 70
    assert {reagent.role for reagent in REAGENTS} == set(Role)


@pytest.mark.parametrize(
    "names",
    [
        # From strong to weak: settled facts (March's Advanced Organic Chemistry, 7th ed., table 8.1, from memory).
        "TfOH HI HBr HCl H2SO4 TsOH TFA H3PO4 HF HCO2H AcOH NH4Cl",
        "TCA DCA ClCH2CO2H AcOH",
    ],
)
def test_order_of_acids(names: str) -> None:
    strengths = [named(name).strength for name in names.split()]
    assert strengths == sorted(s for s in strengths if s is not None)


@pytest.mark.parametrize("reagent", [r for r in REAGENTS if r.role is Role.BASE], ids=lambda reagent: reagent.name)
def test_a_base_is_as_strong_here_as_among_the_nucleophiles(reagent: Reagent) -> None:
    found = find_nucleophile(reagent.name)
    if found is None:
        assert reagent.name in {"N-methylmorpholine", "dipotassium hydrogenphosphate"}
        return
    assert reagent.strength == found.pka_water


@pytest.mark.parametrize(
    ("names", "grade"),
    [
        # Our judgement; the extremes are common practice.
        *[
            ("AlCl3 BF3·OEt2 BBr3 TiCl4 SnCl4 TMSOTf", 3),
            ("ZnCl2 ZnBr2 FeCl3 TMSI Sc(OTf)3", 2),
            ("LiClO4 MgBr2 I2", 1),
        ],
    ],
)
def test_grade_of_lewis_acids(names: str, grade: int) -> None:
    assert {(named(name).role, named(name).strength) for name in names.split()} == {(Role.LEWIS_ACID, grade)}


@pytest.mark.parametrize(
    ("names", "role"),
    [
        *[("AgNO3 AgBF4 AgOAc Ag2O AgOTf AgClO4 AgSbF6 Hg(OAc)2", Role.SILVER), ("18-crown-6 15-crown-5", Role.CROWN)],
        *[("TBAB TBAI TBAHSO4 BnEt3NCl", Role.ONIUM), ("NaNO2 HNO2", Role.NITROSATION), ("NaI KI", Role.IODIDE_SOURCE)],
        *[("H2O2 AIBN BPO", Role.PEROXIDE), ("K2CO3 NaH DIPEA Cs2CO3 LDA", Role.BASE), ("water brine", Role.WATER)],
        *[("NH4Cl NaH2PO4", Role.BUFFER_ACID), ("CSA PPTS Amberlyst HBF4 P2O5", Role.BRONSTED_ACID)],
    ],
)
def test_role(names: str, role: Role) -> None:
    assert {named(name).role for name in names.split()} == {role}


@pytest.mark.parametrize(
    ("name", "supplies", "activates", "partner"),
    [
        ("HBr", "[Br-]", None, None),
        ("PBr3", "[Br-]", "alkoxyphosphonium", None),
        ("SOCl2", "[Cl-]", "chlorosulfite", None),
        ("POCl3", "[Cl-]", "phosphate", None),
        ("TsCl", "[Cl-]", "tosylate", None),
        ("MsCl", "[Cl-]", "mesylate", None),
        ("Tf2O", None, "triflate", None),
        ("DIAD", None, "alkoxyphosphonium", "triphenylphosphine"),
        ("CBr4", "[Br-]", "alkoxyphosphonium", "triphenylphosphine"),
        ("I2", "[I-]", "alkoxyphosphonium", "triphenylphosphine"),
        ("PPh3", None, "alkoxyphosphonium", "DEAD"),
        ("NaNO2", "O=N[O-]", None, "hydrogen chloride"),
        ("TMSI", "[I-]", None, None),
        ("AgBF4", None, None, None),
    ],
)
def test_what_it_brings_and_makes(name: str, supplies: str | None, activates: str | None, partner: str | None) -> None:
    found = named(name)
    assert (found.supplies, found.activates) == (supplies, activates)
    assert partner in found.needs if partner else found.needs == ()


def test_partners() -> None:
    assert named("PBr3").works_beside(())
    assert not named("DIAD").works_beside({"DIAD", "carbon tetrabromide"})
    assert named("DIAD").works_beside({"tributylphosphine"})


def test_partners_need_each_other() -> None:
    by_name = {reagent.name: reagent for reagent in REAGENTS}
    for reagent in REAGENTS:
        if reagent.activates == "alkoxyphosphonium" and "triphenylphosphine" in reagent.needs:
            assert reagent.name in by_name["triphenylphosphine"].needs, reagent.name


@pytest.mark.parametrize(
    ("typed", "name", "mass_percent", "said"),
    [
        ("HBr (48% aq)", "hydrogen bromide", 48, "aqueous concentrated"),
        ("HCl (37% aq)", "hydrogen chloride", 37, "aqueous concentrated"),
        ("HBr (fuming)", "hydrogen bromide", 66, "aqueous concentrated"),
        ("48 % HBr", "hydrogen bromide", 48, "aqueous concentrated"),
        ("conc. HCl", "hydrogen chloride", 37, "aqueous concentrated"),
        ("H2SO4 (conc.)", "sulfuric acid", 98, "concentrated"),
        ("concentrated H₂SO₄", "sulfuric acid", 98, "concentrated"),
        ("20 wt% H2SO4", "sulfuric acid", 20, "aqueous"),
        ("aq. HBr", "hydrogen bromide", None, "aqueous"),
        ("HCl", "hydrogen chloride", None, ""),
        ("hydrochloric acid", "hydrogen chloride", None, "aqueous"),
        ("2 M HCl", "hydrogen chloride", None, "aqueous"),
        ("4 M HCl in dioxane", "hydrogen chloride", None, ""),
        ("HBr (33% in AcOH)", "hydrogen bromide", 33, ""),
        ("dry HCl gas", "hydrogen chloride", None, ""),
        ("I2 (catalytic)", "iodine", None, "catalytic"),
        ("cat. TsOH", "4-toluenesulfonic acid", None, "catalytic"),
        ("TsOH (cat.)", "4-toluenesulfonic acid", None, "catalytic"),
        ("TBAI (10 mol%)", "tetrabutylammonium iodide", None, "catalytic"),
        ("TBAI (120 mol%)", "tetrabutylammonium iodide", None, ""),
        ("TsOH·H2O", "4-toluenesulfonic acid", None, ""),
        ("p-toluenesulfonic acid monohydrate", "4-toluenesulfonic acid", None, ""),
        ("fuming sulfuric acid", "oleum", None, ""),
        ("sat. aq. NH4Cl", "ammonium chloride", None, "aqueous"),
        ("(±)-camphorsulfonic acid", "camphorsulfonic acid", None, ""),
        ("boron trifluoride diethyl etherate", "boron trifluoride etherate", None, ""),
        ("4 Å molecular sieves", "molecular sieves", None, ""),
        ("30% H2O2", "hydrogen peroxide", 30, "aqueous concentrated"),
    ],
)
def test_strengths_and_grades(typed: str, name: str, mass_percent: float | None, said: str) -> None:
    dose = find_reagent(typed)
    assert dose is not None
    flags = {"aqueous": dose.is_aqueous, "catalytic": dose.is_catalytic, "concentrated": dose.is_concentrated}
    assert (dose.reagent.name, dose.mass_percent) == (name, mass_percent)
    assert " ".join(flag for flag, is_so in flags.items() if is_so) == said


@given(st.text(max_size=30))
def test_any_text_may_be_looked_up(text: str) -> None:
    assert find_reagent(text) is None or nearest_reagents(text) == ()


@pytest.mark.parametrize(
    ("typed", "first"),
    [
        ("triphenylphosphin", "triphenylphosphine"),
        ("quartz wool", None),
        ("conc. sulphuric acd", "sulphuric acid"),
        ("DIDA", "DIAD"),
    ],
)
def test_near_misses(typed: str, first: str | None) -> None:
    assert find_reagent(typed) is None
    assert nearest_reagents(typed)[:1] == ((first,) if first else ())


@pytest.mark.parametrize(
    ("drawn", "name"),
    [
        *[
            ("CC(C)OC(=O)/N=N/C(=O)OC(C)C", "DIAD"),
            ("[Ag+].[O-][N+]([O-])=O", "silver nitrate"),
            ("Br", "hydrogen bromide"),
        ],
        *[("CC1(C)[C@@H]2CC[C@]1(CS(=O)(=O)O)C(=O)C2", "camphorsulfonic acid"), ("[Li]CCCC", "n-butyllithium")],
        *[("[K+].[K+].[O-]C([O-])=O", "potassium carbonate"), ("CC[O+](CC)[B-](F)(F)F", "boron trifluoride etherate")],
    ],
)
def test_structures_as_drawn(drawn: str, name: str) -> None:
    found = reagent_by_structure(parse_smiles(drawn).smiles)
    assert found is not None
    assert found.name == name


def test_an_unknown_structure_is_no_row() -> None:
    assert reagent_by_structure(parse_smiles("C[C@H](O)CC").smiles) is None


ROW = next(line for line in TABLE.splitlines() if line.startswith("hydrogen bromide\t"))
PBR3 = next(line for line in TABLE.splitlines() if line.startswith("phosphorus tribromide\t"))


@pytest.mark.parametrize(
    ("row", "was", "becomes", "complaint"),
    [
        (ROW, "-9", "-", "strength"),
        (ROW, "-9", "-99", "out of range"),
        (ROW, "bronsted acid", "silver", "strength"),
        (ROW, "bronsted acid", "sour", "sour"),
        (ROW, "[Br-]", "[Br-:1]", "not canonical"),
        (ROW, "pka-compilations", "hearsay", "unknown source"),
        (ROW, ROW, f"{ROW}\n{ROW}", "given twice"),
        (PBR3, "alkoxyphosphonium", "phosphite ester", "unknown partner or leaving group"),
        (PBR3, "alkoxyphosphonium\t-", "alkoxyphosphonium\tmagic", "unknown partner or leaving group"),
        (PBR3, "alkoxyphosphonium", "-", "must say what it makes"),
    ],
)
def test_faults_in_the_table_are_refused(row: str, was: str, becomes: str, complaint: str) -> None:
    assert was in row
    with pytest.raises(ValueError, match=complaint):
        _read_reagents(TABLE.replace(row, row.replace(was, becomes)))
