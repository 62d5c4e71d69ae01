"""Tables of the rate model: what they refuse, that they hold all the engine asks for, and outside checks."""

import ast
import importlib
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from chemicals.reaction import Hfg

import builder.mechanism.pathways
from builder.chemistry.geometry import ArylPosition, ArylSubstituent
from builder.chemistry.patterns import load_aryl_substituents, load_attack_patterns, load_leaving_groups
from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import parse_smiles
from builder.chemistry.transform import activation_groups
from builder.mechanism import constants, kinds, rate_terms
from builder.mechanism.constants import conformational_energy_kj, ring_strain_kj, sigma_plus
from builder.mechanism.kinds import BaseFamily, load_kinds
from builder.mechanism.rate_terms import fitted_parameters, load_rate_terms
from builder.sources import load_sources
from builder.table import table_text

PACKAGE = "builder.mechanism"
TERMS = load_rate_terms()

# table, its loader without a cache, and two of its columns: one that is a key, one that is a number
TABLES: dict[str, tuple[Callable[[], object], str]] = {
    "rate_terms.tsv": (rate_terms.load_rate_terms.__wrapped__, "builder.mechanism.rate_terms"),
    "nucleophile_kinds.tsv": (kinds.load_kinds.__wrapped__, "builder.mechanism.kinds"),
    "ring_strain.tsv": (constants._ring_strains.__wrapped__, "builder.mechanism.constants"),
    "aryl_constants.tsv": (constants._sigmas.__wrapped__, "builder.mechanism.constants"),
    "conformational_energies.tsv": (constants._conformational_energies.__wrapped__, "builder.mechanism.constants"),
}


def lines_of(table: str) -> list[list[str]]:
    """Return header and rows of a table as cells."""
    text = table_text(PACKAGE, table)
    return [line.split("\t") for line in text.splitlines() if line and not line.startswith("#")]


def load_changed(table: str, lines: list[list[str]], patch: pytest.MonkeyPatch) -> object:
    """Load a table from other lines than its own."""
    load, module = TABLES[table]
    patch.setattr(importlib.import_module(module), "table_text", lambda *_: "\n".join("\t".join(c) for c in lines))
    return load()


def twice(lines: list[list[str]]) -> list[list[str]]:
    return [*lines, lines[1]]


def unknown_source(lines: list[list[str]]) -> list[list[str]]:
    return [*lines[:2], [*lines[2][:-1], "nobody-1900"], *lines[3:]]


def blank(lines: list[list[str]]) -> list[list[str]]:
    return [*lines[:2], [lines[2][0], " ", *lines[2][2:]], *lines[3:]]


def short(lines: list[list[str]]) -> list[list[str]]:
    return [*lines[:2], lines[2][:-1], *lines[3:]]


def other_header(lines: list[list[str]]) -> list[list[str]]:
    return [["key", "value"], *lines[1:]]


def no_number(lines: list[list[str]]) -> list[list[str]]:
    return [*lines[:2], [lines[2][0], "fast", *lines[2][2:]], *lines[3:]]


@pytest.mark.parametrize("table", TABLES)
@pytest.mark.parametrize(
    ("spoil", "message"),
    [
        (twice, "given twice"),
        (unknown_source, "unknown source nobody-1900"),
        (blank, "a cell is blank or missing"),
        (short, "a cell is blank or missing"),
        (other_header, "the header must read"),
        (no_number, "could not convert"),
    ],
)
def test_a_spoilt_table_is_refused(
    table: str, spoil: Callable[[list[list[str]]], list[list[str]]], message: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    with pytest.raises(ValueError, match=message):
        load_changed(table, spoil(lines_of(table)), monkeypatch)


@pytest.mark.parametrize("table", TABLES)
def test_every_row_names_a_source_and_the_header_says_what_is_in_it(table: str) -> None:
    header, *rows = lines_of(table)
    assert {row[header.index("source")] for row in rows} <= set(load_sources())
    words = [line[1:].split(":")[0].strip() for line in table_text(PACKAGE, table).splitlines() if line[0] == "#"]
    assert {"quantity", "unit", "range", "copied"} <= set(words)


@pytest.mark.parametrize(
    ("column", "cell", "message"),
    [("value", "nan", "finite value"), ("error", "0", "positive error"), ("error", "inf", "positive error")],
)
def test_a_term_needs_a_finite_value_and_a_positive_error(
    column: str, cell: str, message: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    header, first, *rest = lines_of("rate_terms.tsv")
    first[header.index(column)] = cell
    with pytest.raises(ValueError, match=message):
        load_changed("rate_terms.tsv", [header, first, *rest], monkeypatch)


def test_an_anion_that_is_no_kind_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    header, first, *rest = lines_of("nucleophile_kinds.tsv")
    first[header.index("anion")] = "unobtainate"
    with pytest.raises(ValueError, match="unobtainate is no kind"):
        load_changed("nucleophile_kinds.tsv", [header, first, *rest], monkeypatch)


# --- all that is asked for is there ---------------------------------------------------------------------------


def test_every_kind_of_attacking_atom_has_a_row() -> None:
    assert {pattern.kind for pattern in load_attack_patterns()} <= set(load_kinds())


@pytest.mark.parametrize("group", sorted({row.name for row in load_leaving_groups()} | set(activation_groups())))
def test_every_leaving_group_has_a_term_in_each_mechanism(group: str) -> None:
    inert = {f"{mechanism}.leave.{group}" for mechanism in ("sn2", "sn1", "e2")} - set(TERMS)
    assert not inert


def test_every_shape_of_site_has_its_terms() -> None:
    degrees = ("methyl", "primary", "secondary", "tertiary")
    sizes = range(3, 10)
    assert {f"sn2.alpha.{degree}" for degree in degrees} <= set(TERMS)
    assert {f"cation.{degree}" for degree in degrees} <= set(TERMS)
    assert {f"sn2.ring.{size}" for size in sizes} | {f"cation.ring.{size}" for size in sizes} <= set(TERMS)
    assert {f"sn2.beta.{branches}" for branches in (1, 2, 3)} <= set(TERMS)
    activating = {key.split(".")[2] for key in TERMS if key.startswith("sn2.activation.")}
    assert {f"sn2.activation.{name}.{d}" for name in activating for d in ("primary", "secondary")} <= set(TERMS)


def test_every_element_closes_every_ring() -> None:
    elements = {kind.element for kind in load_kinds().values()} - {None}
    assert {f"ngp.ring.{size}.{element}" for size in range(3, 9) for element in elements} <= set(TERMS)


def test_every_family_of_bases_has_its_terms() -> None:
    plain = {
        family for family in BaseFamily if family is not BaseFamily.OXYGEN and family is not BaseFamily.CARBOXYLATE
    }
    assert {f"e2.family.{family}" for family in plain} <= set(TERMS)


def test_what_the_fit_changed_stays_near_what_it_started_from() -> None:
    # Beyond five standard errors of the estimate the data and the table tell different stories.
    fitted = fitted_parameters()
    for key, before in TERMS.items():
        after = fitted[key]
        assert abs(after.value - before.value) <= 5 * before.error, key
        assert after.error > 0
        assert after.rows >= 0


# --- outside checks -------------------------------------------------------------------------------------------

CYCLOALKANES = {3: "75-19-4", 4: "287-23-0", 5: "287-92-3", 6: "110-82-7", 7: "291-64-5", 8: "292-64-8"}
CH2_KJ = -20.63
"""Enthalpy of formation of an unstrained CH2 group: Benson, Thermochemical Kinetics, 1976, -4.93 kcal (from memory)."""


@pytest.mark.parametrize("size", CYCLOALKANES)
def test_ring_strain_is_what_heats_of_formation_say(size: int) -> None:
    # Enthalpies of formation of the gases as collected in `chemicals`.
    formation = Hfg(CYCLOALKANES[size])
    assert formation is not None
    assert ring_strain_kj(size) == pytest.approx(formation / 1000 - size * CH2_KJ, abs=3)


def test_larger_rings_count_as_nine() -> None:
    assert ring_strain_kj(12) == ring_strain_kj(9)


# Hansch, Leo and Taft, Chem. Rev. 1991, 91, 165: σp+ and σm (from memory); σm+ of methoxyl: Brown and Okamoto,
# J. Am. Chem. Soc. 1958, 80, 4979 (from memory).
@pytest.mark.parametrize(
    ("name", "para", "meta"),
    [
        *[("OMe", -0.78, 0.047), ("Me", -0.31, -0.07), ("F", -0.07, 0.34), ("Cl", 0.11, 0.37), ("Br", 0.15, 0.39)],
        *[("NO2", 0.79, 0.71), ("CF3", 0.61, 0.43), ("CN", 0.66, 0.56), ("NMe2", -1.70, -0.16), ("OH", -0.92, 0.12)],
    ],
)
def test_substituent_constants(name: str, para: float, meta: float) -> None:
    def sigma(position: ArylPosition) -> float:
        return sigma_plus(ArylSubstituent(atom=0, position=position, name=name))

    assert sigma(ArylPosition.PARA) == pytest.approx(para, abs=0.03)
    assert sigma(ArylPosition.META) == pytest.approx(meta, abs=0.03)
    assert sigma(ArylPosition.ORTHO) == sigma(ArylPosition.PARA)


def test_every_aryl_substituent_has_its_constants() -> None:
    assert {row.name for row in load_aryl_substituents()} <= {row[0] for row in lines_of("aryl_constants.tsv")[1:]}


# Hirsch, Top. Stereochem. 1967, 1, 199, and Eliel: A values in kcal/mol (from memory).
@pytest.mark.parametrize(
    ("symbol", "branches", "kcal"),
    [
        *[("C", 0, 1.74), ("C", 1, 1.79), ("C", 2, 2.21), ("C", 3, 4.9), ("F", 0, 0.25), ("Cl", 0, 0.53)],
        *[("Br", 0, 0.48), ("I", 0, 0.47), ("O", 0, 0.87)],
    ],
)
def test_conformational_energies(symbol: str, branches: int, kcal: float) -> None:
    assert conformational_energy_kj(symbol, branches) == pytest.approx(kcal * 4.184, abs=0.9)


# --- no number of the model in code ---------------------------------------------------------------------------

NAMED = {
    "elimination.py": {"SMALLEST_ALKYNE_RING", "_REFERENCE_PKA", "_STRONGEST_PKA", "_WEAKEST_PKA"},
    "ionisation.py": {
        "HOPELESS",
        "_BEST_ASSISTANCE",
        "HOT_K",
        "_LEAST_WEIGHT",
        "_MOST_GAIN",
        "_ALL",
        "_RACEMISED",
        "_INVERTED",
    },
    "participation.py": {"LARGEST_RING", "_LEAST_WEIGHT", "_LEAST_IONISED"},
    "substitution.py": {"_HARD_LEAVING_GROUP", "_POWER_ZERO", "_ALL_WATER", "_OILY", "_CARRIED"},
}
"""Constants that set bounds and zeros of scales, not the size of an effect."""
PLAIN = {0.0, 1.0, 2.0, 3.0, 1.5, 10.0, 0.5}
"""Nothing, all, bond orders, the base of logarithms, and more than half."""


def loose_numbers(tree: ast.Module) -> Iterator[float]:
    """Yield the floats of a module that stand in no named constant, guards against rounding left out."""
    named = {id(n) for top in tree.body if isinstance(top, ast.Assign | ast.AnnAssign) for n in ast.walk(top)}
    floats = (n for n in ast.walk(tree) if isinstance(n, ast.Constant) and isinstance(n.value, float))
    for value in (node.value for node in floats if id(node) not in named):
        is_guard = 0 < value < 1e-3 or 0.99 < value < 1
        if value not in PLAIN and not is_guard:
            yield value


def named_numbers(tree: ast.Module) -> Iterator[str]:
    for top in tree.body:
        if isinstance(top, ast.Assign | ast.AnnAssign) and top.value is not None:
            value = top.value.operand if isinstance(top.value, ast.UnaryOp) else top.value
            if isinstance(value, ast.Constant) and isinstance(value.value, int | float):
                yield ast.unparse(top.targets[0] if isinstance(top, ast.Assign) else top.target)


PATHWAYS = sorted(Path(builder.mechanism.pathways.__file__).parent.glob("*.py"))


@pytest.mark.parametrize("module", PATHWAYS, ids=lambda path: path.stem)
def test_no_parameter_is_typed_into_a_pathway(module: Path) -> None:
    assert list(loose_numbers(ast.parse(module.read_text("utf-8")))) == []


@pytest.mark.parametrize("module", PATHWAYS, ids=lambda path: path.stem)
def test_named_numbers_are_bounds(module: Path) -> None:
    assert set(named_numbers(ast.parse(module.read_text("utf-8")))) <= NAMED.get(module.name, set())


def test_the_search_for_numbers_finds_them() -> None:
    tree = ast.parse("ZERO = -1.25\ndef f(x):\n    return 0.98 * x if x > 1e-6 else 1.0")
    assert list(loose_numbers(tree)) == [0.98]
    assert list(named_numbers(tree)) == ["ZERO"]


def test_every_group_a_site_can_bear_is_known_to_the_model() -> None:
    # one of each family, through perception rather than by name
    for smiles in ("CCI", "CCOS(C)(=O)=O", "CCOC(C)=O", "CC[N+](C)(C)C", "C1CO1", "CCO", "CC[N+]#N"):
        for site in perceive_sites(parse_smiles(smiles)):
            assert f"sn2.leave.{site.leaving_group}" in TERMS
