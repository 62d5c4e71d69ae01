"""Nucleophiles: values against rate data they were not copied from, names and salts as people write them."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from builder.chemistry.structure import parse_smiles
from builder.mechanism.nucleophiles import (
    Bulk,
    Reactivity,
    _read_nucleophiles,
    find_nucleophile,
    find_nucleophile_and_counter_ion,
    load_nucleophiles,
    nearest_nucleophiles,
    nucleophile_by_structure,
)
from builder.sources import load_sources

SPECIES = load_nucleophiles()
TETRABUTYLAMMONIUM = "CCCC[N+](CCCC)(CCCC)CCCC"


def named(name: str) -> Reactivity:
    found = find_nucleophile(name)
    assert found is not None, name
    return found


def by_name(each: Reactivity) -> str:
    return each.name


def test_table_covers_what_chemists_use() -> None:
    assert len(SPECIES) >= 85
    assert sum(each.n is not None for each in SPECIES) >= 45


@pytest.mark.parametrize(
    ("name", "log10_k"),
    [
        # Iodomethane in methanol at 25 °C, log10 k in L/mol/s: Pearson et al., J. Am. Chem. Soc. 1968, 90, 319 (from
        # memory). n = log10 k + 9.89, k0 = 1.3e-10 L/mol/s.
        *[("LiCl", -5.52), ("LiBr", -4.10), ("NaI", -2.47), ("NaN3", -4.11), ("KSCN", -3.19), ("NaCN", -3.19)],
        *[("NaOAc", -5.59), ("NaSPh", 0.03), ("NaOMe", -3.60), ("NaOPh", -4.14), ("pyridine", -4.66)],
        *[("Et3N", -3.23), ("thiourea", -2.62)],
    ],
)
def test_n_agrees_with_the_rate_constant(name: str, log10_k: float) -> None:
    assert named(name).n == pytest.approx(log10_k + 9.89, abs=0.02)


@pytest.mark.parametrize(
    ("name", "relative_rate"),
    [
        # Methyl bromide in aqueous ethanol, water = 1: Solomons, Organic Chemistry, section 6.14B (looked up). The
        # scale is another one, so only the order and the size of the steps are asked.
        *[("cyanide", 125_000), ("iodide", 100_000), ("methoxide", 25_000), ("hydroxide", 16_000)],
        *[("chloride", 1_000), ("ammonia", 700)],
    ],
)
def test_n_agrees_in_order_with_rates_of_methyl_bromide(name: str, relative_rate: float) -> None:
    found = named(name).n
    assert found is not None
    assert found - math.log10(relative_rate) == pytest.approx(2.0, abs=0.75)


@pytest.mark.parametrize(
    ("stronger", "weaker", "at_least"),
    [
        # Settled facts of physical organic chemistry (IUPAC glossary, Carey and Sundberg part A; from memory).
        *[("thiophenoxide", "phenoxide", 3), ("hydroperoxide", "hydroxide", 1), ("iodide", "bromide", 1)],
        *[("bromide", "chloride", 1), ("chloride", "fluoride", 1), ("tributylphosphine", "triethylamine", 1)],
        *[("hydrazine", "ammonia", 1), ("PhSeNa", "PhSNa", 0.5)],
    ],
)
def test_order_of_nucleophiles(stronger: str, weaker: str, at_least: float) -> None:
    first, second = named(stronger).n, named(weaker).n
    assert first is not None
    assert second is not None
    assert first - second >= at_least


def test_hydrogencarbonate_has_no_n() -> None:
    # 3.8 is on the scale of methyl bromide in water, Swain and Scott, J. Am. Chem. Soc. 1953, 75, 141 (from memory).
    assert named("NaHCO3").n is None


@pytest.mark.parametrize(
    ("acid", "base"),
    [
        *[("water", "hydroxide"), ("methanol", "methoxide"), ("tert-butanol", "KOtBu"), ("phenol", "phenoxide")],
        *[("acetic acid", "acetate"), ("thiophenol", "NaSPh"), ("phthalimide", "potassium phthalimide")],
        *[("imidazole", "imidazolide"), ("HCN", "cyanide"), ("HN3", "azide"), ("TsNH2", "TsNHNa")],
        *[("diethyl malonate", "diethyl malonate anion"), ("acetylacetone", "acetylacetonate"), ("H2S", "NaSH")],
        *[("ethyl acetoacetate", "sodium ethyl acetoacetate"), ("nitromethane", "nitromethane anion")],
        *[("acetone", "acetone enolate"), ("ammonia", "sodium amide"), ("iPr2NH", "LDA"), ("indole", "indolide")],
    ],
)
def test_acid_and_conjugate_base_tell_the_same(acid: str, base: str) -> None:
    assert named(acid).pka_acid == pytest.approx(named(base).pka_water, abs=0.06)
    before, after = parse_smiles(named(acid).smiles), parse_smiles(named(base).smiles)
    assert before.mass - after.mass == pytest.approx(1.008, abs=0.01)
    assert before.charge - after.charge == 1


def test_dmso_weakens_acids_that_leave_a_small_anion() -> None:
    # Bordwell, Acc. Chem. Res. 1988, 21, 456 (from memory): an anion that hydrogen bonds hold in water is a much
    # stronger base in DMSO; protonated amines hardly change.
    shift = {each.name: each.pka_dmso - each.pka_water for each in SPECIES if each.pka_dmso and each.pka_water}
    assert all(shift[name] > 10 for name in ("hydroxide", "methoxide", "tert-butoxide", "fluoride"))
    assert all(abs(shift[name]) < 2 for name in ("ammonia", "triethylamine", "piperidine", "pyridine"))


@pytest.mark.parametrize("each", SPECIES, ids=by_name)
def test_every_value_has_a_known_source(each: Reactivity) -> None:
    quantities = ("n", "pka_water", "pka_dmso", "pka_acid", "mayr_n", "mayr_sn")
    assert set(each.sources) == {q for q in quantities if getattr(each, q) is not None}
    assert set(each.sources.values()) <= set(load_sources())
    assert parse_smiles(each.smiles).radical_electrons == 0
    assert nucleophile_by_structure(each.smiles) is each
    assert all(find_nucleophile(name) is each for name in (each.name, *each.synonyms))


@pytest.mark.parametrize(
    ("typed", "name", "counter_ion"),
    [
        ("sodium azide", "azide", "[Na+]"),
        ("NaN3", "azide", "[Na+]"),
        ("N3⁻", "azide", None),
        ("caesium acetate", "acetate", "[Cs+]"),
        ("Cesium Fluoride", "fluoride", "[Cs+]"),
        ("KOtBu", "tert-butoxide", "[K+]"),
        ("t-BuOK", "tert-butoxide", "[K+]"),
        ("K₂CO₃", "carbonate", "[K+]"),
        ("MgBr2", "bromide", "[Mg+2]"),
        ("AgNO2", "nitrite", "[Ag+]"),
        ("silver(I) cyanide", "cyanide", "[Ag+]"),
        ("Ag2O", "oxide", "[Ag+]"),
        ("TBAF", "fluoride", TETRABUTYLAMMONIUM),
        ("Bu4NBr", "bromide", TETRABUTYLAMMONIUM),
        ("tetrabutylammonium cyanide", "cyanide", TETRABUTYLAMMONIUM),
        ("potassium phthalimide", "phthalimide anion", "[K+]"),
        ("phthalimide potassium salt", "phthalimide anion", "[K+]"),
        ("phthalimide", "phthalimide", None),
        ("ethyl acetoacetate (potassium enolate)", "ethyl acetoacetate anion", "[K+]"),
        ("LDA", "diisopropylamide", "[Li+]"),
        ("NaHMDS", "bis(trimethylsilyl)amide", "[Na+]"),
        ("n-BuLi", "n-butyllithium", "[Li+]"),
        ("NaH", "hydride", "[Na+]"),
        ("sodium sulfide nonahydrate", "sulfide", "[Na+]"),
        ("hydroxide (counter-ion)", "hydroxide", None),
        ("Hünig's base", "DIPEA", None),
        ("anhydrous ammonia", "ammonia", None),
        ("N-ethyldiisopropylamine", "DIPEA", None),
    ],
)
def test_names_and_salts(typed: str, name: str, counter_ion: str | None) -> None:
    found = find_nucleophile_and_counter_ion(typed)
    assert found is not None
    assert (found[0].name, found[1]) == (name, counter_ion)


@pytest.mark.parametrize("typed", ["", "sodium", "K", "none (internal nucleophile)", "HBr", "tosylate of sodium"])
def test_what_is_no_nucleophile(typed: str) -> None:
    assert find_nucleophile(typed) is None


@given(st.text(max_size=30))
def test_any_text_may_be_looked_up(text: str) -> None:
    assert find_nucleophile(text) is None or nearest_nucleophiles(text) == ()


@pytest.mark.parametrize(
    ("typed", "first"),
    [
        *[("LAD", "LDA"), ("sodium azid", "sodium azide"), ("triethylamin", "triethylamine"), ("thiourae", "thiourea")],
        *[("potassium cyanid", "potassium cyanide"), ("pyridin", "pyridine")],
        *[("sodum azide", "sodium azide"), ("potasium cyanid", "potassium cyanide"), ("benzil amine", "benzylamine")],
    ],
)
def test_near_misses(typed: str, first: str) -> None:
    assert nearest_nucleophiles(typed)[0] == first


@pytest.mark.parametrize(
    ("drawn", "name"),
    [
        *[("[Na+].[N-]=[N+]=[N-]", "azide"), ("[K+].[K+].[O-]C([O-])=O", "carbonate"), ("[Li]CCCC", "n-butyllithium")],
        *[
            ("[Ag+].[Ag+].[O-2]", "oxide"),
            ("O=C1[N-]C(=O)c2ccccc12", "phthalimide anion"),
            ("SC(C)=O", "thioacetic acid"),
        ],
    ],
)
def test_structures_as_drawn(drawn: str, name: str) -> None:
    assert nucleophile_by_structure(parse_smiles(drawn).smiles) is named(name)


def test_an_unknown_structure_or_a_mixture_is_no_row() -> None:
    assert nucleophile_by_structure("CCCCCCCCCC") is None
    assert nucleophile_by_structure(parse_smiles("[N-]=[N+]=[N-].[C-]#N").smiles) is None


def test_bulk_of_the_usual_bases() -> None:
    # Common practice, no source.
    assert {named(name).bulk for name in ("KOtBu", "LDA", "LiHMDS", "DIPEA", "2,6-lutidine", "DBU")} == {Bulk.HINDERED}
    assert {named(name).bulk for name in ("NaN3", "NaCN", "NaOMe", "KF", "NaSMe")} == {Bulk.SMALL}


HEADER = (
    "name\tsynonyms\tnamed_salts\tsmiles\tdrawn_as\tn\tn_error\tn_source\tpka_water\tpka_water_source\tpka_dmso\t"
    "pka_dmso_source\tpka_acid\tpka_acid_source\tmayr_n\tmayr_n_source\tmayr_sn\tmayr_sn_source\tmayr_solvent\tbulk\tnote"
)
ROW = (
    "azide\tN3-\tsmite=[Na+]\t[N-]=[N+]=[N-]\t-\t5.78\t0.05\tpearson-songstad-1968\t4.72\tpka-compilations\t-\t-\t-\t-\t"
    "20.50\tmayr-open-files\t0.59\tmayr-papers\tDMSO\tsmall\t-"
)


@pytest.mark.parametrize(
    ("was", "becomes", "complaint"),
    [
        ("N3-", "", "blank"),
        ("5.78", "nan", "out of range"),
        ("4.72", "472", "out of range"),
        ("0.05", "-", "n needs its error"),
        ("DMSO", "-", "mayr_n its solvent"),
        ("DMSO", "brine", "unknown solvent"),
        ("pka-compilations", "-", "needs a value and a source"),
        ("pka-compilations", "hearsay", "unknown source"),
        ("[N-]=[N+]=[N-]", "N(=[N+]=[N-])[Na]", "not canonical"),
        ("smite=[Na+]", "smite=[Xe+]", "unknown counter-ion"),
        ("small", "tiny", "tiny"),
        (ROW, f"{ROW}\n{ROW}", "given twice"),
        ("bulk", "size", "header"),
    ],
)
def test_faults_in_the_table_are_refused(was: str, becomes: str, complaint: str) -> None:
    sound = f"{HEADER}\n{ROW}\n"
    assert _read_nucleophiles(sound).species[0].name == "azide"
    with pytest.raises(ValueError, match=complaint):
        _read_nucleophiles(sound.replace(was, becomes))
