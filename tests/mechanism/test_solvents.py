"""Solvents: the table against compilations it was not copied from, names as people type them, mixtures."""

import math
from statistics import median

import pytest
from chemicals import Tb, Tb_methods, Tm, Tm_methods
from chemicals.identifiers import pubchem_db
from chemicals.permittivity import permittivity_data_CRC
from chemicals.volume import rho_data_Perry_8E_105_l
from hypothesis import given
from hypothesis import strategies as st

from builder.chemistry.structure import parse_smiles
from builder.mechanism.solvents import (
    Solvent,
    SolventKind,
    _read_solvents,
    boiling_point_c,
    find_solvent,
    freezing_point_c,
    load_solvents,
    nearest_solvents,
)
from builder.sources import load_sources

SOLVENTS = load_solvents()
METHODS_OF_SOURCE = {
    "crc-handbook-95": {"CRC_ORG", "CRC_INORG"},
    "nist-webbook": {"WEBBOOK"},
    "cas-common-chemistry": {"COMMON_CHEMISTRY"},
    "open-melting-points": {"OPEN_NTBKM"},
}
ESTIMATES = {"JOBACK"}
PLAIN_SLIPS = {"DIPEA": {"CRC_ORG", "COMMON_CHEMISTRY"}}
"""One compilation boils it at 114 °C against 126.5 °C in the others; one gives the boiling point as melting point."""


def by_name(solvent: Solvent) -> str:
    return solvent.name


def named(name: str) -> Solvent:
    found = find_solvent(name)
    assert found is not None, name
    return found


def elsewhere_c(read, methods: list[str], solvent: Solvent, quantity: str) -> float | None:
    """Return the median in °C over all compilations but the one the table's value was copied from."""
    own = METHODS_OF_SOURCE.get(solvent.sources[quantity], set()) | ESTIMATES | PLAIN_SLIPS.get(solvent.name, set())
    values = [read(solvent.cas, method=method) - 273.15 for method in methods if method not in own]
    return median(values) if values else None


# Outside check of boiling and melting points: the other compilations carried by the Python package chemicals 1.5.2
# (Yaws 2014, NIST WebBook, CAS Common Chemistry, Wikidata, REFPROP, Open Melting Point Dataset). 2 K is their usual
# spread for a boiling point, 3 K for a melting point; what spreads wider stands here with the reason.
BOILING_SPREAD_K = {
    "ethylene carbonate": 3,
    "DMI": 3,
    "DMSO": 3,
    "NMP": 3,
    "N-methylformamide": 4,
    "N-methylacetamide": 4,
}
MELTING_SPREAD_K = {"DME": 6}  # -58 and -69 °C are both in print


@pytest.mark.parametrize("solvent", SOLVENTS, ids=by_name)
def test_boiling_point_agrees_with_other_compilations(solvent: Solvent) -> None:
    other = elsewhere_c(Tb, Tb_methods(solvent.cas), solvent, "bp_c")
    if other is None:
        assert solvent.name in {"CPME", "DMPU"}
        return
    assert solvent.bp_c == pytest.approx(other, abs=BOILING_SPREAD_K.get(solvent.name, 2))


@pytest.mark.parametrize("solvent", SOLVENTS, ids=by_name)
def test_melting_point_agrees_with_other_compilations(solvent: Solvent) -> None:
    other = elsewhere_c(Tm, Tm_methods(solvent.cas), solvent, "mp_c")
    assert other is not None
    assert solvent.mp_c == pytest.approx(other, abs=MELTING_SPREAD_K.get(solvent.name, 3))


def perry_density(solvent: Solvent) -> float | None:
    """Return g/mL at the temperature of the table's value, from DIPPR equation 105 in Perry's Handbook, 8th ed."""
    if solvent.cas not in rho_data_Perry_8E_105_l.index or solvent.density_t_c is None:
        return None
    row = rho_data_Perry_8E_105_l.loc[solvent.cas]
    kelvin = solvent.density_t_c + 273.15
    mol_per_m3 = row.C1 / row.C2 ** (1 + (1 - kelvin / row.C3) ** row.C4)
    return float(mol_per_m3) * parse_smiles(solvent.smiles).mass / 1e6


IN_PERRY = tuple(solvent for solvent in SOLVENTS if perry_density(solvent) is not None)


@pytest.mark.parametrize("solvent", IN_PERRY, ids=by_name)
def test_density_agrees_with_perry(solvent: Solvent) -> None:
    # Perry's Chemical Engineers' Handbook, 8th ed., table 2-32, through chemicals 1.5.2. It states errors up to 1 %;
    # N-methylacetamide is a supercooled liquid at 25 °C.
    within = 0.02 if solvent.name == "N-methylacetamide" else 0.012
    assert solvent.density_g_ml == pytest.approx(perry_density(solvent), rel=within)


def test_density_is_checked_for_most_solvents() -> None:
    assert len(IN_PERRY) >= 50


@pytest.mark.parametrize(
    ("name", "published"),
    [
        # Reichardt and Welton, Solvents and Solvent Effects, 4th ed., table A-1, 25 °C (from memory).
        *[("water", 78.36), ("methanol", 32.66), ("ethanol", 24.55), ("tert-butanol", 12.47), ("formamide", 111.0)],
        *[("acetone", 20.56), ("acetonitrile", 35.94), ("DMF", 36.71), ("DMSO", 46.45), ("HMPA", 29.6)],
        *[("nitromethane", 35.87), ("sulfolane", 43.3), ("propylene carbonate", 64.92), ("pyridine", 12.91)],
        *[("THF", 7.58), ("diethyl ether", 4.20), ("1,4-dioxane", 2.21), ("dichloromethane", 8.93)],
        *[("chloroform", 4.81), ("toluene", 2.38), ("hexane", 1.88), ("ethyl acetate", 6.02), ("acetic acid", 6.17)],
    ],
)
def test_permittivity_agrees_with_reichardt(name: str, published: float) -> None:
    within_3_percent = 0.03  # two compilations differ by as much as that
    assert named(name).permittivity == pytest.approx(published, rel=within_3_percent)


@pytest.mark.parametrize(
    "solvent", [s for s in SOLVENTS if s.sources.get("permittivity") == "crc-handbook-95"], ids=by_name
)
def test_permittivity_is_copied_faithfully(solvent: Solvent) -> None:
    # CRC Handbook, 95th ed., permittivity of liquids, as carried by chemicals 1.5.2: its polynomial at 25 °C where it
    # gives one, else the printed value with its temperature.
    printed = permittivity_data_CRC.loc[solvent.cas]
    assert solvent.permittivity_t_c is not None
    if solvent.permittivity_t_c == 25 and not math.isnan(printed["A"]):
        coefficients = (0.0 if math.isnan(printed[c]) else printed[c] for c in "ABCD")
        expected = sum(c * 298.15**power for power, c in enumerate(coefficients))
    else:
        expected = printed["Permittivity"]
        assert solvent.permittivity_t_c == pytest.approx(printed["T"] - 273.15, abs=0.5)
    assert solvent.permittivity == pytest.approx(expected, rel=0.003)


@pytest.mark.parametrize("solvent", SOLVENTS, ids=by_name)
def test_structure_belongs_to_the_cas_number(solvent: Solvent) -> None:
    # The register of compounds carried by chemicals 1.5.2 (PubChem).
    assert parse_smiles(solvent.smiles).inchikey == pubchem_db.search_CAS(solvent.cas).InChI_key


@pytest.mark.parametrize(
    ("kind", "names"),
    [
        # IUPAC glossary and Reichardt: settled facts of the trade.
        (SolventKind.PROTIC, "water methanol tert-butanol HFIP TFE AcOH TFA formamide NMF ammonia"),
        (SolventKind.DIPOLAR_APROTIC, "acetone DMF DMAc DMSO NMP MeCN HMPA sulfolane nitromethane pyridine"),
        (SolventKind.APOLAR, "THF ether dioxane DME toluene hexane EtOAc dichloromethane chloroform Et3N"),
    ],
)
def test_kind(kind: SolventKind, names: str) -> None:
    assert {named(name).kind for name in names.split()} == {kind}


@pytest.mark.parametrize("solvent", SOLVENTS, ids=by_name)
def test_kind_follows_from_hydrogens_and_permittivity(solvent: Solvent) -> None:
    atoms = parse_smiles(solvent.smiles).atoms
    if any(atom.symbol in {"O", "N"} and atom.hydrogens for atom in atoms):
        assert solvent.kind is SolventKind.PROTIC
    elif solvent.permittivity is not None:
        dipolar = solvent.permittivity >= 12
        assert solvent.kind is (SolventKind.DIPOLAR_APROTIC if dipolar else SolventKind.APOLAR)
    else:
        assert solvent.kind is SolventKind.APOLAR


def test_table_covers_what_chemists_use() -> None:
    assert len(SOLVENTS) >= 45
    for name in ("2,6-lutidine", "nitrobenzene", "xylene", "N-methylformamide", "CPME", "2-MeTHF", "2-butanone", "DME"):
        assert find_solvent(name) is not None, name


@pytest.mark.parametrize("solvent", SOLVENTS, ids=by_name)
def test_every_value_has_a_known_source(solvent: Solvent) -> None:
    given = {q for q in ("bp_c", "mp_c", "density_g_ml", "permittivity") if getattr(solvent, q) is not None}
    assert set(solvent.sources) == given
    assert set(solvent.sources.values()) <= set(load_sources())
    assert solvent.mp_c < solvent.bp_c
    assert (solvent.density_g_ml is None) == (solvent.density_t_c is None)
    assert (solvent.permittivity is None) == (solvent.permittivity_t_c is None)


@pytest.mark.parametrize(
    ("typed", "name"),
    [
        ("dmf", "DMF"),
        ("N,N‑Dimethylformamide", "DMF"),
        ("anhydrous DMF", "DMF"),
        ("THF (dry)", "THF"),
        ("Water", "water"),
        ("t-BuOH", "tert-butanol"),
        ("tBuOH", "tert-butanol"),
        ("tert‐butanol", "tert-butanol"),
        ("2-methyltetrahydrofuran", "2-MeTHF"),
        ("2‑MeTHF", "2-MeTHF"),
        ("tert-butyl methyl ether", "MTBE"),
        ("γ-butyrolactone", "gamma-butyrolactone"),
        ("α,α,α-trifluorotoluene", "benzotrifluoride"),
        ("N,N′-dimethylpropyleneurea", "DMPU"),
        ("CH₂Cl₂", "dichloromethane"),
        ("glacial acetic acid", "acetic acid"),
        ("dry ice", None),
        ("petrol", None),
        ("", None),
    ],
)
def test_find_by_name(typed: str, name: str | None) -> None:
    found = find_solvent(typed)
    assert (found.name if found else None) == name


def test_structure_decides_over_the_name() -> None:
    assert find_solvent("DMF", parse_smiles("S(C)(C)=O").smiles) is named("DMSO")
    assert find_solvent("DMF", "CCCCCCCCCCC") is None


@given(st.text(max_size=40))
def test_any_text_may_be_looked_up(text: str) -> None:
    assert find_solvent(text) is None or nearest_solvents(text) == ()


@pytest.mark.parametrize(
    ("typed", "first"),
    [("DFM", "DMF"), ("MTEB", "MTBE"), ("acetonitril", "acetonitrile"), ("dichlormethane", "dichloromethane")],
)
def test_near_misses(typed: str, first: str) -> None:
    assert nearest_solvents(typed)[0] == first


@pytest.mark.parametrize("typed", ["DMF", "perfluorodecalin", "zzz", "brine"])
def test_no_near_miss(typed: str) -> None:
    assert nearest_solvents(typed) == ()


@pytest.mark.parametrize(
    ("first", "second", "boils_at"),
    [
        # CRC Handbook, azeotropic data for binary mixtures (from memory, rounded).
        *[("ethanol", "water", 78.2), ("toluene", "water", 84.5), ("nitromethane", "water", 83.6)],
        *[("methanol", "hexane", 50), ("methanol", "benzene", 58), ("acetonitrile", "water", 76.5)],
        *[("acetonitrile", "heptane", 69), ("1,4-dioxane", "water", 87.8), ("pyridine", "water", 93)],
        *[("formic acid", "water", 107.2), ("acetone", "chloroform", 64.5)],
    ],
)
def test_azeotropes_boil_within_the_interval(first: str, second: str, boils_at: float) -> None:
    low, high = boiling_point_c([(named(first), 3), (named(second), 1)])
    assert low <= boils_at <= high


@pytest.mark.parametrize(
    ("first", "second", "freezes_at"),
    [
        # Eutectics of aqueous mixtures (from memory): DMSO -73 °C, ethylene glycol -51 °C, methanol about -125 °C.
        *[("DMSO", "water", -73), ("ethylene glycol", "water", -51), ("methanol", "water", -125)]
    ],
)
def test_eutectics_freeze_within_the_interval(first: str, second: str, freezes_at: float) -> None:
    low, high = freezing_point_c([(named(first), 1), (named(second), 1)])
    assert low <= freezes_at <= high


def test_pure_solvents_and_traces() -> None:
    assert boiling_point_c([(named("DMF"), 20)]) == (152.8, 152.8)
    assert freezing_point_c([(named("DMSO"), 0.1)]) == (18.5, 18.5)
    assert boiling_point_c([(named("THF"), 10), (named("THF"), 5)]) == (66.0, 66.0)
    assert boiling_point_c([(named("chloroform"), 99.5), (named("ethanol"), 0.5)]) == (61.2, 61.2)


@pytest.mark.parametrize("parts", [[], [(0, 0.0)], [(0, -1.0)], [(0, float("nan"))]])
def test_a_mixture_needs_a_part(parts: list[tuple[int, float]]) -> None:
    with pytest.raises(ValueError, match="positive share"):
        boiling_point_c([(SOLVENTS[index], share) for index, share in parts])


WATER_ROW = "water\tH2O\tO\t7732-18-5\tprotic\t100.0\tcrc-handbook-95\t0.0\tcrc-handbook-95\t-\t-\t-\t-\t-\t-\t-"
HEADER = (
    "name\tsynonyms\tsmiles\tcas\tkind\tbp_c\tbp_c_source\tmp_c\tmp_c_source\tdensity_g_ml\tdensity_t_c\t"
    "density_g_ml_source\tpermittivity\tpermittivity_t_c\tpermittivity_source\tnote"
)


@pytest.mark.parametrize(
    ("was", "becomes", "complaint"),
    [
        ("H2O", "", "blank"),
        ("100.0", "nan", "out of range"),
        ("100.0", "inf", "out of range"),
        ("100.0", "1000", "out of range"),
        ("100.0", "-", "are needed"),
        ("protic", "wet", "wet"),
        ("crc-handbook-95", "hearsay", "unknown source"),
        (WATER_ROW, f"{WATER_ROW}\n{WATER_ROW}", "given twice"),
        (WATER_ROW, f"{WATER_ROW}\n{WATER_ROW}".replace("\nwater\tH2O\tO\t7732-18-5", "\nice\th-2-o\tOO\t0"), "name"),
        ("smiles", "structure", "header"),
    ],
)
def test_faults_in_the_table_are_refused(was: str, becomes: str, complaint: str) -> None:
    sound = f"{HEADER}\n{WATER_ROW}\n"
    assert _read_solvents(sound)[0].name == "water"
    with pytest.raises(ValueError, match=complaint):
        _read_solvents(sound.replace(was, becomes))
