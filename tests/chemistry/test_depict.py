"""Drawings: what they show, that they can be read, and that the same structure gives the same bytes."""

import os
import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from collections.abc import Callable
from io import BytesIO
from itertools import combinations

import cairosvg
import pytest
from indigo import Indigo
from PIL import Image
from rdkit import Chem

from builder.chemistry.depict import Marks, depict
from builder.chemistry.inks import PALETTE, PAPER, element_paint, palette_css, resolve_colours, standalone
from builder.chemistry.lettering import text_width, wrap
from builder.chemistry.plane import Box, convex_hull, exit_distance, is_inside
from builder.chemistry.scheme import Arrow, DrawnCompound, SchemeLayout, draw_scheme, draw_structure, lay_out
from builder.chemistry.sketch import Line, Sketch, mol_block, sketch
from builder.chemistry.structure import Structure, parse_smiles

SVG = "{http://www.w3.org/2000/svg}"
CHOLESTERYL_MESYLATE = "CC(C)CCC[C@@H](C)[C@H]1CC[C@@H]2[C@@]1(CC[C@H]1[C@H]2CC=C2C[C@@H](OS(C)(=O)=O)CC[C@]12C)C"
MESYLATE, AZIDE = "CCCCCC[C@H](C)OS(C)(=O)=O", "CCCCCC[C@@H](C)N=[N+]=[N-]"


def compound(smiles: str, label: str = "", caption: str = "", leaves: str = "", arrives: str = "") -> DrawnCompound:
    structure = parse_smiles(smiles)
    return DrawnCompound(structure, label, caption, matched(structure, leaves), matched(structure, arrives))


def matched(structure: Structure, smarts: str) -> frozenset[int]:
    if not smarts:
        return frozenset()
    return frozenset(structure.mol.GetSubstructMatch(Chem.MolFromSmarts(smarts)))


Steps = list[list[DrawnCompound] | Arrow]
SCHEMES: dict[str, Steps] = {
    "elimination": [
        [compound("CCC(C)Br", caption="2-bromobutane, racemate", leaves="Br")],
        Arrow(("potassium ethoxide (2 equiv)",), ("ethanol", "70 °C, 4 h")),
        [
            compound("C/C=C/C", "E", "(E)-but-2-ene"),
            compound("C/C=C\\C", "Z", "by-product"),
            compound("C=CCC", "T", "by-product"),
            compound("CCOC(C)CC", "O", "2-ethoxybutane", arrives="OCC"),
        ],
    ],
    "inversion": [
        [compound(MESYLATE, leaves="OS(C)(=O)=O")],
        Arrow(("sodium azide (1.5 equiv)",), ("DMF, 60 °C, 16 h",)),
        [compound(AZIDE, "A", "88 % isolated, 97 % ee", arrives="N=[N+]=[N-]")],
    ],
    "failure": [
        [compound("CC(C)(C)CBr", caption="neopentyl bromide")],
        Arrow(("sodium azide (1.5 equiv)",), ("80 % ethanol, 78 °C, 24 h",), failed=True),
        [compound("CC(C)(C)CN=[N+]=[N-]", caption="sought, not found")],
    ],
    "two-stages": [
        [compound("CCCCCC[C@H](C)O")],
        Arrow(("methanesulfonyl chloride (1.2 equiv)", "triethylamine (1.5 equiv)"), ("2-MeTHF, 0 °C, 1 h",)),
        [compound(MESYLATE, caption="not isolated")],
        Arrow(("sodium azide (1.5 equiv)",), ("DMF, 60 °C, 16 h",)),
        [compound(AZIDE, "A", "84 % isolated"), compound("CCCCCCC(C)Cl", "B", "4 % (GC)")],
    ],
    "steroid": [
        [compound(CHOLESTERYL_MESYLATE, leaves="OS(C)(=O)=O")],
        Arrow(("sodium azide",), ("DMPU, 80 °C",)),
        [compound(CHOLESTERYL_MESYLATE.replace("OS(C)(=O)=O", "O"), "A"), compound(CHOLESTERYL_MESYLATE, "B")],
    ],
    "salts": [
        [compound("[Na+].[N-]=[N+]=[N-]"), compound("CCCC[N+](CCCC)(CCCC)CCCC.[Br-]"), compound("[K+].[Cl-]")],
        Arrow(("a reagent with a name so long that it has to be broken more than once " * 3,), ()),
        [compound("CCCCCCCCCCCCCCCCCCCCCCCCCCCCCC[N+](C)(C)C.[Br-]", "A"), compound("O", "B"), compound("CI", "C")],
    ],
    "forecast": [[compound("C=CCCl")], Arrow(forecast=True), [compound("C=CCC#N", "A"), compound("C=C=CC", "B")]],
    "open": [[compound("CC(C)(C)CBr")], Arrow(("sodium azide",), failed=True)],
}  # fmt: skip
LAYOUTS: tuple[SchemeLayout, ...] = ("wide", "tall")
every_scheme = pytest.mark.parametrize("steps", SCHEMES.values(), ids=SCHEMES.keys())
every_layout = pytest.mark.parametrize("layout", LAYOUTS)


def drawn(steps: Steps, layout: SchemeLayout = "wide") -> str:
    return draw_scheme(steps, name="a reaction", ident="x", layout=layout)


# --- the drawing as a document ----------------------------------------------------------------------------


# Drawn with RDKit 2026.9.1; another release may place atoms elsewhere, then the files are written anew.
@pytest.mark.parametrize(("name", "layout"), [("elimination", "wide"), ("inversion", "tall"), ("failure", "wide")])
def test_golden(name: str, layout: SchemeLayout, golden: Callable[[str, str], None]) -> None:
    golden(f"drawings/{name}-{layout}.svg", drawn(SCHEMES[name], layout))


@every_scheme
@every_layout
def test_drawing_may_stand_in_any_page(steps: Steps, layout: SchemeLayout) -> None:
    svg = drawn(steps, layout)
    root = ET.fromstring(svg)
    ids = [element.get("id") for element in root.iter() if element.get("id")]
    assert len(ids) == len(set(ids))
    assert all(ident == "x" or (ident or "").startswith("x-") for ident in ids)
    for refers in ("aria-labelledby", "aria-describedby"):
        assert root.get(refers, ids[0]) in ids
    assert root.get("role") == "img"
    # A strict Content-Security-Policy allows neither; nothing is fetched; no paper is painted.
    assert "style" not in svg
    assert "<rect" not in svg
    assert "href" not in svg
    assert not svg.startswith("<?xml")


def test_words_are_escaped() -> None:
    hostile = '<img src=x onerror="alert(1)"> & \x00\x1b'
    steps: Steps = [[compound("CBr", hostile, hostile)], Arrow((hostile,), (hostile,)), [compound("CO")]]
    svg = draw_scheme(steps, name=hostile, ident="x", description=hostile)
    texts = [element.text or "" for element in ET.fromstring(svg).iter()]
    assert "<img" not in svg
    assert sum("<img src=x" in text for text in texts) >= 5


@pytest.mark.parametrize("ident", ["", "2a", "a b", 'a"', "a<b"])
def test_ident_that_is_no_id_is_refused(ident: str) -> None:
    with pytest.raises(ValueError, match="id"):
        draw_structure(compound("CBr"), name="x", ident=ident)


@pytest.mark.parametrize(
    "steps", [[], [[]], [Arrow()], [[compound("CBr")], [compound("CO")]], [[compound("CBr")], Arrow(), Arrow()]]
)
def test_compounds_and_arrows_alternate(steps: Steps) -> None:
    with pytest.raises(ValueError, match="scheme"):
        drawn(steps)


def test_description_says_what_the_outlines_mean() -> None:
    description = ET.fromstring(drawn(SCHEMES["inversion"])).findtext(f"{SVG}desc") or ""
    assert "dashed outline marks what leaves" in description
    assert "solid outline marks what arrives" in description
    assert "dotted" not in description
    assert "<desc" not in drawn(SCHEMES["forecast"])


def test_outlines_differ_by_more_than_colour() -> None:
    svg = drawn(SCHEMES["inversion"])
    outlines = {
        name: element.get("stroke-dasharray")
        for element in ET.fromstring(svg).iter(f"{SVG}path")
        for name in ("leaves", "arrives")
        if f"--hb-{name}" in element.get("stroke", "")
    }
    assert outlines == {"leaves": "4.5 3", "arrives": None}


# --- same bytes -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("smiles", [MESYLATE, CHOLESTERYL_MESYLATE, "c1ccc([C@@H]2CO2)cc1", "[Na+].[N-]=[N+]=[N-]"])
def test_drawing_depends_on_the_structure_alone(smiles: str) -> None:
    once = draw_structure(compound(smiles), name="x", ident="x")
    for rewritten in Chem.MolToRandomSmilesVect(Chem.MolFromSmiles(smiles), 5, randomSeed=7):
        depict.cache_clear()
        sketch.cache_clear()
        assert draw_structure(compound(rewritten), name="x", ident="x") == once


def test_drawing_is_the_same_in_another_process() -> None:
    program = (
        "from builder.chemistry.scheme import *; from builder.chemistry.structure import parse_smiles as p\n"
        "c = [DrawnCompound(p(s), leaves=frozenset({0, 1, 2})) for s in "
        f"({MESYLATE!r}, {CHOLESTERYL_MESYLATE!r}, 'CC=CC')]\n"
        "print(draw_scheme([c[:1], Arrow(('x',)), c[1:]], name='x', ident='x'), end='')"
    )
    runs = [
        subprocess.run(
            [sys.executable, "-c", program], env={**os.environ, "PYTHONHASHSEED": seed}, capture_output=True, check=True
        ).stdout
        for seed in ("1", "2")
    ]
    assert runs[0] == runs[1]
    assert runs[0].startswith(b"<svg")


# --- layout -----------------------------------------------------------------------------------------------


@every_scheme
@every_layout
def test_nothing_overlaps(steps: Steps, layout: SchemeLayout) -> None:
    placed = lay_out(steps, layout=layout)
    meeting = [(a.kind, b.kind) for a, b in combinations(placed, 2) if a.box.overlaps(b.box)]
    assert meeting == []


@every_scheme
@every_layout
def test_width_keeps_its_bound(steps: Steps, layout: SchemeLayout) -> None:
    width = Box.around(item.box for item in lay_out(steps, layout=layout)).width
    # The chain of thirty carbons is wider than a phone even when shrunk to the least legible size.
    bound = 560 if layout == "tall" and steps is SCHEMES["salts"] else {"wide": 760, "tall": 340}[layout]
    assert width <= bound


@pytest.mark.parametrize(
    "smiles",
    [
        *(MESYLATE, AZIDE, "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O", "[NH4+].[Cl-]", "NC(=[NH2+])SCC.[Br-]"),
        *("CI", "C[N+](=O)[O-]", "OB(O)CCCl", "FC(F)(F)S(=O)(=O)OCC", "C[N+](C)(C)Cc1ccccc1.[OH-]"),
        CHOLESTERYL_MESYLATE,
    ],
)
def test_letters_do_not_overlap(smiles: str) -> None:
    # Letters of one label touch; a hair's breadth is no overlap.
    letters = [box.grown(-0.6) for box in depict(parse_smiles(smiles)).letters]
    assert not any(a.overlaps(b) for a, b in combinations(letters, 2))


def test_outline_goes_round_its_atoms_only() -> None:
    # A common outline of both ends of the chain would enclose its middle: each end gets its own.
    ends = depict(parse_smiles("BrCCCCBr"), Marks(leaves=matched(parse_smiles("BrCCCCBr"), "Br")))
    assert ends.markup.count("--hb-leaves") == 1
    both = Marks(leaves=frozenset(i for i, a in enumerate(parse_smiles("BrCCCCBr").atoms) if a.symbol == "Br"))
    assert depict(parse_smiles("BrCCCCBr"), both).markup.count("--hb-leaves") == 2


# --- what the pen shows -----------------------------------------------------------------------------------

STEREO = [
    *(MESYLATE, AZIDE, CHOLESTERYL_MESYLATE, "CC[C@H](Br)C", "C[C@](F)(Cl)Br", "c1ccc([C@@H]2CO2)cc1"),
    *("C/C=C/C", "C/C=C\\C", "C/C(Cl)=C(/C)Br", "C[C@H](/C=C/C)Br", "C/C=N/O", "C[C@@H](Br)[C@H](C)Br"),
    "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1OS(=O)(=O)c1ccc(C)cc1",
    "CC1(C)O[C@@H]2CO[C@]3(COS(=O)(=O)C(F)(F)F)OC(C)(C)O[C@H]3[C@@H]2O1",
    "CC(=O)O[C@@H]1C[C@H]2CC[C@@H]1C2",
    "C[C@]12CCCC[C@@H]1CCCC2",
    "CN1[C@H]2CC[C@@H]1[C@@H](C(=O)OC)[C@@H](OC(=O)c1ccccc1)C2",
    "CN1CC[C@]23c4c5ccc(O)c4O[C@H]2[C@@H](O)C=C[C@H]3[C@H]1C5",
    "CC1(C)[C@@H]2CC[C@@]1(C)C(=O)C2",
    "C[C@@H]1CC[C@H]2[C@@H](C)C(=O)O[C@@H]3O[C@@]4(C)CC[C@@H]1[C@@]23OO4",
    "C[S@](=O)c1ccccc1",
    "[2H][C@H](C)Br",
    "Br[C@H]1CC[C@H](Cl)CC1",
    "O1[C@@H]2CCCC[C@H]12",
]


@pytest.mark.parametrize("smiles", STEREO)
def test_drawn_stereo_reads_back(smiles: str) -> None:
    structure = parse_smiles(smiles)
    model = parse_smiles("CCCCCC[C@@H](C)O")
    for seen in (sketch(structure), sketch(structure, model)):
        block = mol_block(seen)
        assert parse_smiles(Chem.MolToSmiles(Chem.MolFromMolBlock(block))) == structure
        # A second toolkit, with its own way of reading wedges: epam-indigo.
        assert parse_smiles(Indigo().loadMolecule(block).canonicalSmiles()) == structure


def test_undefined_stereo_asserts_nothing() -> None:
    assert lines(sketch(parse_smiles("CCC(C)Br"))) == {Line.PLAIN}
    assert lines(sketch(parse_smiles("CCCC=CC"))) == {Line.PLAIN, Line.WAVY}


@pytest.mark.parametrize("smiles", [AZIDE.replace("@@", ""), "C=C=CC", "CC(C)=CC", "CC=O", "C1CCC=CC1", "c1ccccc1"])
def test_bond_with_one_geometry_is_not_wavy(smiles: str) -> None:
    assert Line.WAVY not in lines(sketch(parse_smiles(smiles)))


def lines(seen: Sketch) -> set[Line]:
    return {bond.line for bond in seen.bonds}


def test_inversion_is_seen_at_a_glance() -> None:
    substrate, product = parse_smiles(MESYLATE), parse_smiles(AZIDE)
    before, after = sketch(substrate), sketch(product, substrate)
    leaving, entering = stereo_arm(before), stereo_arm(after)
    assert (leaving[0], entering[0]) == (Line.HASH, Line.WEDGE)
    assert leaving[1] == pytest.approx(entering[1], abs=0.1)


def test_bystanding_centre_keeps_its_wedge() -> None:
    # cis-4-tert-butylcyclohexyl bromide gives the trans azide: only the bond that reacts changes sides.
    substrate = parse_smiles("CC(C)(C)[C@H]1CC[C@@H](Br)CC1")
    for smiles in ("CC(C)(C)[C@H]1CC[C@H](N=[N+]=[N-])CC1", "CC(C)(C)[C@@H]1CC[C@@H](N=[N+]=[N-])CC1"):
        before, after = sketch(substrate), sketch(parse_smiles(smiles), substrate)
        assert arm_to(before, "C") == arm_to(after, "C")
        assert {arm_to(before, "Br"), arm_to(after, "N")} == {Line.HASH, Line.WEDGE}


def arm_to(seen: Sketch, symbol: str) -> Line:
    (line,) = [b.line for b in seen.bonds if b.line is not Line.PLAIN and seen.atoms[b.b].symbol == symbol]
    return line


def stereo_arm(seen: Sketch) -> tuple[Line, complex]:
    (bond,) = [bond for bond in seen.bonds if bond.line is not Line.PLAIN]
    assert seen.atoms[bond.b].symbol in {"O", "N"}
    (ax, ay), (bx, by) = seen.places[bond.a], seen.places[bond.b]
    return bond.line, complex(bx - ax, by - ay)


def test_steroid_lies_as_is_customary() -> None:
    # Common practice, no source: ring A lower left, side chain upper right.
    seen = sketch(parse_smiles(CHOLESTERYL_MESYLATE))
    sulfur = next(place for place, atom in zip(seen.places, seen.atoms, strict=True) if atom.symbol == "S")
    assert max(seen.places)[0] - sulfur[0] > 5
    assert max(y for _, y in seen.places) - sulfur[1] > 5


@pytest.mark.parametrize(
    ("smiles", "letters"),
    [
        ("CCCBr", "Br"),
        ("CI", "CH3I"),
        ("O", "OH2"),
        ("CCO", "OH"),
        ("[NH4+].[Cl-]", "NH4+Cl−"),
        ("C=C=CC", "C"),
        ("[2H]CCBr", "BrD"),
        ("[13CH3]CBr", "Br13CH3"),
        ("[K+].[K+].[O-]C([O-])=O", "2K+O−O−O"),
        ("[Mg+2].[Cl-].[Cl-]", "Mg2+2Cl−"),
        ("CC[S-]", "S−"),
        ("C#N", "CHN"),
    ],
)
def test_letters(smiles: str, letters: str) -> None:
    markup = f"<svg>{depict(parse_smiles(smiles)).markup}</svg>"
    written = "".join(element.text or "" for element in ET.fromstring(markup).iter("text"))
    assert sorted(written) == sorted(letters)


# --- inks -------------------------------------------------------------------------------------------------


def luminance(colour: str) -> float:
    """Relative luminance of #rrggbb, by WCAG 2.2."""
    channels = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


@pytest.mark.parametrize("name", PALETTE)
def test_contrast(name: str) -> None:
    # WCAG 2.2, success criterion 1.4.3: 4.5:1 for text; 1.4.11 asks 3:1 of bonds, arrows and outlines.
    for ink, paper in ((PALETTE[name].light, PAPER.light), (PALETTE[name].dark, PAPER.dark)):
        low, high = sorted((luminance(ink), luminance(paper)))
        assert (high + 0.05) / (low + 0.05) >= 4.5


def test_elements_of_the_trade_have_an_ink() -> None:
    assert all("var(" in element_paint(symbol) for symbol in ["N", "O", "S", "P", "B", "F", "Cl", "Br", "I", "Si"])
    assert element_paint("C") == element_paint("Na") == "currentColor"


@pytest.mark.parametrize("dark", [False, True])
def test_resolved_drawing_needs_no_page(dark: bool) -> None:
    svg = resolve_colours(drawn(SCHEMES["inversion"]), dark=dark)
    assert "var(" not in svg
    assert "currentColor" not in svg
    assert (PALETTE["n"].dark if dark else PALETTE["n"].light) in svg


@every_scheme
def test_a_second_renderer_draws_it(steps: Steps) -> None:
    # cairosvg, an SVG renderer of its own, refuses what is no sound SVG and CSS variables that are left.
    svg = drawn(steps)
    pictures = (cairosvg.svg2png(resolve_colours(svg, dark=dark).encode()) for dark in (False, True))
    light, dark = (Image.open(BytesIO(picture)) for picture in pictures)
    width, height = (float(number) for number in re.findall(r' (?:width|height)="([\d.]+)"', svg)[:2])
    assert light.size == dark.size == (pytest.approx(width, abs=1.5), pytest.approx(height, abs=1.5))
    covered = light.getchannel("A").getbbox()
    assert covered is not None
    assert covered[2] - covered[0] > 0.9 * light.width
    assert light.tobytes() != dark.tobytes()


def test_palette_names_every_variable_of_a_drawing() -> None:
    svg = drawn(SCHEMES["inversion"])
    used = {part.split(",")[0] for part in svg.split("var(")[1:]}
    assert used
    assert all(f"{name}:" in palette_css() for name in used)


def test_file_follows_the_reader() -> None:
    svg = standalone(drawn(SCHEMES["inversion"]))
    assert ET.fromstring(svg)[0].tag == f"{SVG}style"
    assert all(f"--hb-{name}:{ink.dark};" in svg for name, ink in PALETTE.items() if name != "ink")


# --- letters and plane ------------------------------------------------------------------------------------


@pytest.mark.parametrize("text", ["sodium azide (1.5 equiv), 60 °C, 16 h", "1,3-dimethyltetrahydropyrimidin-2(1H)-one"])
def test_wrapped_lines_fit_and_lose_nothing(text: str) -> None:
    lines = wrap(text, 13.0, 90.0)
    assert all(text_width(line, 13.0) <= 90.0 for line in lines)
    assert "".join("".join(lines).split()) == "".join(text.split())


def test_number_stays_with_its_unit() -> None:
    for width in range(45, 200, 5):
        lines = [line.replace("\u00a0", " ") for line in wrap("stirred at 60 °C for 16 h, left < 2 %", 13.0, width)]
        assert any("60 °C" in line for line in lines)
        assert any("16 h" in line for line in lines)
        assert any("< 2 %" in line for line in lines)


def test_plane() -> None:
    square = convex_hull([(0, 0), (2, 0), (2, 2), (0, 2), (1, 1), (1, 0)])
    assert sorted(square) == [(0, 0), (0, 2), (2, 0), (2, 2)]
    assert is_inside((1, 1), square)
    assert not is_inside((3, 1), square)
    assert exit_distance(Box(-1, -1, 1, 1), (0, 0), (1, 0)) == 1
    assert exit_distance(Box(4, -1, 6, 1), (0, 0), (1, 0)) == 6
    assert exit_distance(Box(4, -1, 6, 1), (0, 0), (-1, 0)) == 0
    assert not Box(0, 0, 1, 1).overlaps(Box(1, 0, 2, 1))
    assert Box(0, 0, 1, 1).overlaps(Box(0.5, 0.5, 2, 2))
