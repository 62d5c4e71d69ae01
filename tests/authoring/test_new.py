"""New records: what follows from structures is right, what is open is a gap, and filled gaps make a sound record."""

import datetime as dt
from collections.abc import Callable, Sequence
from dataclasses import replace
from itertools import takewhile
from pathlib import Path
from typing import TypeVar

import pytest

from builder.authoring import new as new_module
from builder.authoring.dialogue import Silence
from builder.authoring.new import NEAREST, Draft, Stated, draft_record, folder_inside, write_draft
from builder.book import examine
from builder.finding import Level
from builder.mechanism.asking import AskingError
from builder.records.model import Record
from builder.records.quantities import QuantityError
from builder.records.reader import read_bytes
from builder.records.settings import Settings
from builder.records.specimen import specimen_text, with_example
from tests.authoring.filling import filled

TODAY = dt.date(2026, 12, 1)
RXN = Path(__file__).parents[1] / "data" / "rxn"
Answer = TypeVar("Answer")


@pytest.fixture
def book(tmp_path: Path) -> Path:
    folder = tmp_path / "entries"
    folder.mkdir()
    settings = (
        "format: 1\ntitle: A book\npeople:\n  - {code: bench-1, shown_as: one}\n  - {code: bench-2, shown_as: two}\n"
    )
    (folder / "handbook.yml").write_text(settings, "utf-8")
    (folder / "NS4T9XQ2N.yml").write_text(specimen_text(), "utf-8")
    return folder


class Told(Silence):
    """Nobody to ask; what is told is kept."""

    def __init__(self) -> None:
        self.lines: list[str] = []

    def tell(self, text: str) -> None:
        self.lines.append(text)


class Answers(Told):
    """Somebody with prepared answers, in order; an empty one leaves a question open."""

    is_live = True

    def __init__(self, *answers: str) -> None:
        super().__init__()
        self.answers = list(answers)
        self.questions: list[str] = []

    def _next(self, question: str) -> str:
        self.questions.append(question)
        return self.answers.pop(0) if self.answers else ""

    def must_choose(self, question: str, options: Sequence[str], mend: str) -> int:
        return int(self._next(question)) - 1

    def may_choose(self, question: str, options: Sequence[str]) -> int | None:
        answer = self._next(question)
        return int(answer) - 1 if answer else None

    def may_say(self, question: str, read: Callable[[str], Answer]) -> Answer | None:
        answer = self._next(question)
        return read(answer) if answer else None

    def agrees(self, question: str, *, by_enter: bool = True) -> bool:
        answer = self._next(question)
        return by_enter if not answer else answer == "y"


def _draft(book: Path, stated: Stated, dialogue: Told | None = None) -> Draft:
    return draft_record(stated, book, TODAY, dialogue or Told())


def _record(text: str) -> Record:
    reading = read_bytes(text.encode(), "NS4T9XQ2N.yml")
    assert [f.message for f in reading.findings if f.level is Level.ERROR] == []
    assert reading.record is not None
    return reading.record


def _run(
    substrate: str,
    nucleophile: str = "",
    solvent: str = "DMF",
    temperature: str = "60 °C",
    *,
    base: str = "",
    stereo: str = "",
    leaving_group: str = "",
) -> Stated:
    return Stated(
        substrate=substrate,
        nucleophile=nucleophile,
        base=base,
        stereo=stereo,
        leaving_group=leaving_group,
        solvents=[solvent],
        temperature=temperature,
        time="16 h",
    )


# what is stated, classes, leaving group, SMILES of product A as forecast, result
PAIRS: dict[str, tuple[Stated, set[str], str, str, str]] = {
    "primary and azide": (
        _run("octyl bromide", "NaN3"),
        {"primary"},
        "bromide",
        "CCCCCCCCN=[N+]=[N-]",
        "substitution",
    ),
    "mesylate and thiolate, configuration drawn": (
        _run("CCCCCC[C@H](C)OS(C)(=O)=O", "sodium thiophenolate", stereo="single enantiomer"),
        {"secondary"},
        "mesylate",
        "CCCCCC[C@@H](C)Sc1ccccc1",
        "substitution",
    ),
    "solvolysis of a tertiary chloride": (
        _run("tert-butyl chloride", "solvent", "ethanol"),
        {"tertiary"},
        "chloride",
        "CCOC(C)(C)C",
        "substitution",
    ),
    "epoxide and amine": (
        _run("CC1(C)CO1", "morpholine", "ethanol"),
        {"primary", "tertiary", "cyclic"},
        "epoxide",
        "CC(C)(O)CN1CCOCC1",
        "ring opening",
    ),
    "epoxide beside a chloride": (
        _run("ClCC1CO1", "morpholine", "ethanol", leaving_group="epoxide", stereo="racemate"),
        {"primary", "secondary", "cyclic", "vicinal"},
        "epoxide",
        "OC(CCl)CN1CCOCC1",
        "ring opening",
    ),
    "base alone": (
        _run("CCCC(C)Br", "", "tert-butanol", base="potassium tert-butoxide", stereo="racemate"),
        {"secondary"},
        "bromide",
        "C=CCCC",
        "elimination",
    ),
    "addition to an alkene": (
        _run("CC1=CCCCC1", "hydrogen bromide", "acetic acid", "20 °C"),
        {"alkene"},
        "none",
        "CC1(Br)CCCCC1",
        "addition",
    ),
    "neopentyl": (
        _run("neopentyl bromide", "sodium iodide"),
        {"primary", "neopentyl"},
        "bromide",
        "CC(C)(C)CI",
        "substitution",
    ),
    "allyl and phenolate": (
        _run("allyl bromide", "NaOPh"),
        {"primary", "allylic"},
        "bromide",
        "C=CCOc1ccccc1",
        "substitution",
    ),
    "propargyl": (
        _run("C#CCBr", "sodium thiophenolate"),
        {"primary", "propargylic"},
        "bromide",
        "C#CCSc1ccccc1",
        "substitution",
    ),
    "alpha-bromo ketone": (
        _run("O=C(CBr)c1ccccc1", "KSCN", "acetone", "25 °C"),
        {"primary", "alpha-carbonyl"},
        "bromide",
        "N#CSCC(=O)c1ccccc1",
        "substitution",
    ),
    "internal nucleophile": (
        _run("OCCCCBr", "internal", "THF", "25 °C", base="potassium tert-butoxide"),
        {"primary"},
        "bromide",
        "C1CCOC1",
        "substitution",
    ),
    "benzyl and thioacetate": (
        _run("benzyl chloride", "KSAc"),
        {"primary", "benzylic"},
        "chloride",
        "CC(=O)SCc1ccccc1",
        "substitution",
    ),
}


@pytest.mark.parametrize(("stated", "classes", "group", "product", "result"), PAIRS.values(), ids=PAIRS.keys())
def test_a_filled_record_passes_the_checks(
    book: Path, stated: Stated, classes: set[str], group: str, product: str, result: str
) -> None:
    draft = _draft(book, stated)
    unread = read_bytes(draft.text.encode(), f"{draft.entry}.yml")
    assert {f.rule for f in unread.findings if f.level is not Level.REMARK} == {"gap-left-open"}
    assert len([f for f in unread.findings if f.rule == "gap-left-open"]) == draft.gaps
    whole = read_bytes(filled(draft.text, result=result).encode(), f"{draft.entry}.yml")
    assert whole.record is not None, [f.message for f in whole.findings]
    assert set(whole.record.substrate.classes) == classes
    assert whole.record.substrate.leaving_group == group
    assert whole.record.outcome.products[0].smiles == product
    found = examine(whole, Settings(format=1, title="A book"), TODAY).findings
    assert [f"{f.rule}: {f.message}" for f in found if f.level in {Level.ERROR, Level.QUERY}] == []


# --- what is read ---------------------------------------------------------------------------------------------

REFUSED = [
    (Stated(substrate="2-bromobutan"), 'unknown substrate "2-bromobutan"; did you mean "2-bromobutane"?'),
    (Stated(substrate="dimethylnonsense"), "the tables do not know this name: give its SMILES"),
    (Stated(substrate="CCC(C"), "branch that is not closed (character 4)"),
    (Stated(substrate="CCBr", nucleophile="sodium azid"), 'did you mean "sodium azide"?'),
    (Stated(substrate="CCBr", base="potasium carbonate"), 'did you mean "potassium carbonate"?'),
    (Stated(substrate="NaN3"), "NaN3 attacks, and bears nothing that leaves"),
    (Stated(substrate="NaN3", nucleophile="K2CO3"), "NaN3 attacks, and bears nothing that leaves"),
    (Stated(substrate="NaN3", nucleophile="CCCBr"), "write `handbook new 'propyl bromide' --nucleophile 'NaN3'`"),
    (Stated(substrate="BrBr", nucleophile="C=CC"), "bromine attacks, and C=CC is attacked"),
    (Stated(substrate="CCBr", origin=NEAREST), "state nucleophile or base"),
    (Stated(substrate="ClCCCBr"), "bromide (primary, at C4), chloride (primary, at C2)"),
    (Stated(substrate="CCBr", leaving_group="tosylate"), "no tosylate is found on CCBr; it has bromide"),
    (Stated(substrate="CCBr", leaving_group="bromid"), 'did you mean "bromide"?'),
    (Stated(substrate="CCC(C)Br", stereo="single enantiomer"), "single enantiomer does not fit the drawing CCC(C)Br"),
    (Stated(substrate="CCBr", stereo="racemate"), "write achiral"),
    (Stated(substrate="CCBr", solvents=["DFM"]), 'did you mean "DMF"?'),
    (Stated(substrate="CCBr", solvents=["ethanol:80%", "water"]), "some solvents have a fraction"),
    (Stated(substrate="CCBr", solvents=["ethanol:120%"]), "120% of ethanol is no share"),
    (Stated(substrate="CCBr", want="nonsense"), "write substitution, elimination, addition, a mechanism or a SMILES"),
    (Stated(substrate="CCBr", equivalents="some"), "no number of equivalents"),
    (Stated(substrate="CCBr", equivalents="0"), "out of range"),
    (Stated(substrate="CCBr", nucleophile="NaN3", origin="NS4T9XQ2M"), 'did you mean "NS4T9XQ2N"?'),
    (Stated(substrate="CCBr", title="<b>bold</b>"), "looks like HTML"),
    (Stated(), "no substrate is given"),
    (Stated(rxn="$RXN\n"), "RXN block without counts"),
]


@pytest.mark.parametrize(("stated", "message"), REFUSED, ids=[message for _, message in REFUSED])
def test_what_cannot_be_read_is_refused_with_its_mend(book: Path, stated: Stated, message: str) -> None:
    before = sorted(book.rglob("*"))
    with pytest.raises(AskingError) as refusal:
        _draft(book, stated)
    assert message in str(refusal.value)
    assert sorted(book.rglob("*")) == before


@pytest.mark.parametrize(
    ("stated", "mend"),
    [
        (Stated(substrate="CCBr", temperature="60"), 'write "60 °C" or "333 K"'),
        (Stated(substrate="CCBr", time="overnight"), 'such as "16 h"'),
        (Stated(substrate="CCBr", amount="3"), 'write "3 g" or "3 mg"'),
        (Stated(substrate="CCBr", amount="0 g"), "write a value above zero"),
        (Stated(substrate="CCBr", amount="-1 mmol"), "write a value above zero"),
        (Stated(substrate="CCBr", temperature="2000 °C"), "write at most 1,500 °C"),
        (Stated(substrate="CCBr", time="0 h"), "write a value above zero"),
        (Stated(substrate="CCBr", solvents=["DMF:0 mL"]), "write a value above zero"),
        (Stated(substrate="CCBr", solvents=["DMF:20 g"]), "mL"),
        (Stated(substrate="CCBr", solvents=["DMF:20"]), "20 of DMF is no share"),
    ],
)
def test_quantities_are_refused_as_in_records(book: Path, stated: Stated, mend: str) -> None:
    with pytest.raises((QuantityError, AskingError)) as refusal:
        _draft(book, stated)
    assert mend in f"{refusal.value} {getattr(refusal.value, 'mend', '')}"


def test_it_says_how_everything_was_read(book: Path) -> None:
    told = Told()
    _draft(book, _run("BrCCC(C)N.Br", "NaSPh"), told)
    assert told.lines[:4] == [
        "substrate: SMILES BrCCC(C)N.Br",
        "  it is given as a salt or with solvent of crystallisation: its mass is that of the whole",
        "nucleophile: NaSPh, SMILES [Na+].[S-]c1ccccc1",
        "perceived: leaving group bromide, class primary",
    ]
    assert any(line.startswith("forecast: SN2") and "at 60 °C in 16 h: conversion" in line for line in told.lines)
    assert any(line.startswith("CAUTION: the substrate: alkylating agent") for line in told.lines)


def test_without_a_leaving_group_site_and_forecast_stay_open(book: Path) -> None:
    told = Told()
    text = _draft(book, _run("hexane", "NaOPh"), told).text
    assert "class: [TO FILL IN]" in text
    assert "leaving_group: TO FILL IN" in text
    assert "no leaving group and no multiple bond is perceived in CCCCCC" in "\n".join(told.lines)


def test_a_group_that_is_made_in_the_flask_has_the_class_of_what_is_drawn(book: Path) -> None:
    told = Told()
    text = _draft(book, Stated(substrate="CCCC(C)O", nucleophile="NaN3", leaving_group="mesylate"), told).text
    assert "class: [secondary]" in text
    assert "leaving_group: mesylate" in text
    assert any(line.startswith("mesylate is to be made of hydroxyl") for line in told.lines)


def test_an_ion_without_counter_ion_leaves_the_salt_open(book: Path) -> None:
    lines = _draft(book, _run("CCBr", "azide")).text.splitlines()
    hint = "the salt as it was weighed, counter-ion and all; read as [N-]=[N+]=[N-]"
    assert f"  smiles: 'TO FILL IN'  # {hint}" in lines


def test_amounts_are_worked_out_beside_what_was_typed(book: Path) -> None:
    # 2-bromobutane 137.02 g/mol, 10 mmol = 1.370 g (trade practice 4.1: 10.00 g = 72.98 mmol);
    # sodium azide 65.01 g/mol, 1.30 equivalents of 72.98 mmol = 6.168 g there.
    stated = Stated(substrate="2-bromobutane", nucleophile="NaN3", amount="10.00 g", equivalents="1.30")
    lines = _draft(book, stated).text.splitlines()
    assert "  mass: 10.00 g  # 72.98 mmol of 137.02 g/mol" in lines
    assert "  equivalents: 1.30  # 94.88 mmol = 6.168 g" in lines
    assert (
        "  amount: 10 mmol  # 1.370 g of 137.02 g/mol"
        in _draft(book, Stated(substrate="2-bromobutane", amount="10 mmol")).text.splitlines()
    )


@pytest.mark.parametrize(
    ("want", "first", "second"),
    [
        ("", "C=CCC", "C/C=C/C"),
        ("C/C=C/C", "C/C=C/C", "C=CCC"),
        ("E2", "C=CCC", "C/C=C/C"),
        ("CCC(C)OC(C)(C)C", "CCC(C)OC(C)(C)C", "C=CCC"),
    ],
)
def test_the_wanted_product_comes_first_and_others_above_a_twentieth_follow(
    book: Path, want: str, first: str, second: str
) -> None:
    stated = Stated(
        substrate="CCC(C)Br", base="KOtBu", solvents=["tert-butanol"], temperature="60 °C", want=want, stereo="racemate"
    )
    products = _record(filled(_draft(book, stated).text, result="elimination")).outcome.products
    assert [product.smiles for product in products][:2] == [first, second]
    assert [product.label for product in products] == ["A", "B", "C", "D"][: len(products)]
    assert [product.use for product in products] == ["desired", *["by-product"] * (len(products) - 1)]


def test_mirror_images_are_one_product_with_their_ratio(book: Path) -> None:
    text = _draft(book, _run("C[C@H](Cl)c1ccccc1", "solvent", "ethanol", stereo="single enantiomer")).text
    (line,) = [line for line in text.splitlines() if "label: A" in line]
    assert "enantiomers 5" in line
    assert text.count("CCO[C@") == 1
    assert "    # - {ee: 97 %, of: A, by: chiral HPLC}" in text.splitlines()


@pytest.mark.parametrize("stated", [Stated(), Stated(substrate="NaN3"), Stated(substrate="NaN3", base="K2CO3")])
def test_what_only_attacks_is_refused_as_substrate_before_anything_else_is_asked(book: Path, stated: Stated) -> None:
    somebody = Answers("NaN3")
    with pytest.raises(AskingError, match="NaN3 attacks, and bears nothing that leaves"):
        _draft(book, stated, somebody)
    assert somebody.questions == ([] if stated.substrate else ["Substrate (name or SMILES)"])


def test_the_nearest_entry_is_done_without_where_none_is_near(book: Path) -> None:
    told = Told()
    text = _draft(book, Stated(substrate="C=CC", nucleophile="HBr", origin=NEAREST), told).text
    said = "no entry has this class (alkene) and attacking atom in common"
    assert f"{said}: solvent, stages and work-up are not taken from any" in told.lines
    assert "temperature: TO FILL IN" in text


# --- from an entry, from a drawing ----------------------------------------------------------------------------


def test_stages_of_an_entry_are_taken_and_its_outcome_is_not(book: Path) -> None:
    told = Told()
    stated = Stated(
        substrate="CC(CCc1ccccc1)OS(C)(=O)=O", nucleophile="NaN3", amount="5.0 mmol", origin=NEAREST, stereo="racemate"
    )
    record = _record(filled(_draft(book, stated, told).text, result="substitution"))
    assert [line for line in told.lines if line.startswith("taken from NS4T9XQ2N")]
    source = _record(specimen_text())
    assert (str(record.stages[0].temperature), str(record.stages[0].time)) == (
        str(source.stages[0].temperature),
        str(source.stages[0].time),
    )
    assert record.related == ("NS4T9XQ2N",)
    assert record.work_up == source.work_up
    assert [solvent.name for solvent in record.solvents] == [solvent.name for solvent in source.solvents]
    assert "88 %" not in "".join(line for line in str(record.outcome).splitlines())


def test_substances_whose_names_are_open_keep_their_places_in_the_order_of_addition(book: Path) -> None:
    stated = Stated(substrate="CC(CCc1ccccc1)OS(C)(=O)=O", nucleophile="[Na+].CC(C)(C)CC[S-]", origin="NS4T9XQ2N")
    lines = _draft(book, stated).text.splitlines()
    at = lines.index("  - add:")
    assert [line.strip() for line in lines[at + 1 : at + 4]] == ["- TO FILL IN", "- TO FILL IN", "- DMF"]


def test_a_forecast_like_an_entry_has_its_mixture_of_solvents(book: Path) -> None:
    mixed = with_example(
        "entry: NS7K3QFMC\nsubstrate: {name: tert-butyl bromide, smiles: 'CC(C)(C)Br', class: tertiary, "
        "leaving_group: bromide, amount: 10 mmol}\nnucleophile: solvent\n"
        "solvent: [{name: ethanol, volume: 80 mL}, {name: water, volume: 20 mL}]\n"
        "stages: [{temperature: 25 °C, time: 4 h}]\nwork_up: [evaporate]\n# without safety_review\n"
        "outcome: {result: [substitution], products: [{label: A, name: tert-butyl ethyl ether, smiles: 'CCOC(C)(C)C', "
        "stereo: achiral, use: desired}], measured: [{yield: 40 %, of: A, kind: assay, by: GC}]}\n"
    )
    (book / "NS7K3QFMC.yml").write_text(mixed, "utf-8")
    alike, stated = Told(), Told()
    _draft(book, Stated(substrate="tert-butyl chloride", nucleophile="solvent"), alike)
    solvents = ["ethanol:80%", "water:20%"]
    given = Stated(
        substrate="tert-butyl chloride", nucleophile="solvent", solvents=solvents, temperature="25 °C", time="4 h"
    )
    _draft(book, given, stated)
    (one,) = [line for line in alike.lines if line.startswith("forecast: ")]
    (other,) = [line for line in stated.lines if line.startswith("forecast: ")]
    assert one == f"{other}, run like NS7K3QFMC"


def test_what_is_stated_stands_before_what_an_entry_says(book: Path) -> None:
    stated = Stated(
        substrate="CCC(C)Br", nucleophile="NaN3", solvents=["DMSO"], temperature="25 °C", origin="ns4t9xq2n"
    )
    text = _draft(book, stated).text
    assert "  - name: DMSO" in text
    assert "temperature: 25 °C" in text
    assert "DMF" not in text


def test_the_nearest_entry_is_named_where_nobody_is_asked(book: Path) -> None:
    told = Told()
    text = _draft(book, Stated(substrate="CCC(C)Br", nucleophile="NaN3"), told).text
    assert any(line.startswith("nearest entry: NS4T9XQ2N") for line in told.lines)
    assert "related: [NS4T9XQ2N]  # the nearest entry" in text
    assert "temperature: TO FILL IN" in text
    assert any("run like NS4T9XQ2N" in line for line in told.lines)


def _acidified(book: Path, old: str = "status: current", new: str = "status: current", review: str = "") -> None:
    """Let the only entry of a book, an azide in DMF, be worked up with nitrite, acid and dichloromethane."""
    steps = "work_up: ['20% sodium nitrite, then 2 M sulfuric acid to pH 2', extract with dichloromethane]\n"
    text = with_example(f"{steps}{review}").replace(old, new)
    assert new in text
    (book / "NS4T9XQ2N.yml").write_text(text, "utf-8")


AZIDE = Stated(substrate="CCCCCCC(C)Br", nucleophile="NaN3", stereo="racemate", title="2-Azidooctane")
HAS_ERRORS = "# without safety_review\n"


@pytest.mark.parametrize(
    ("status", "review"), [("status: draft", ""), ("status: current", HAS_ERRORS)], ids=["draft", "with errors"]
)
def test_a_draft_or_an_entry_with_errors_is_not_offered(book: Path, status: str, review: str) -> None:
    _acidified(book, new=status, review=review)
    somebody = Answers()
    text = _draft(book, AZIDE, somebody).text
    assert [question for question in somebody.questions if question.startswith("Take")] == []
    assert "sulfuric" not in text
    assert "NS4T9XQ2N" not in text


def test_conditions_of_another_entry_are_taken_only_on_a_yes(book: Path) -> None:
    somebody = Answers("2-bromooctane", "10 mmol", "")
    text = _draft(book, AZIDE, somebody).text
    assert somebody.questions[2].startswith("Take solvent, stages and work-up of the nearest entry, NS4T9XQ2N")
    assert "temperature: TO FILL IN" in text


def test_hazards_of_a_work_up_that_is_taken_are_told_and_stand_above_its_steps(book: Path) -> None:
    _acidified(book, new="status: draft")
    told = Told()
    lines = _draft(book, replace(AZIDE, origin="NS4T9XQ2N"), told).text.splitlines()
    stops = [line for line in told.lines if line.startswith("STOP: NaN3 with ")]
    assert any("sulfuric acid to pH 2" in line for line in stops)
    assert any("extract with dichloromethane" in line for line in stops)
    assert "NS4T9XQ2N is not current (draft): judge what is taken from it" in told.lines
    for step in ("sulfuric acid to pH 2", "extract with dichloromethane"):
        (place,) = [number for number, line in enumerate(lines) if step in line and line.startswith("  - ")]
        above = takewhile(lambda line: line.startswith("  # "), reversed(lines[:place]))
        assert any(line.startswith("  # STOP: with NaN3: ") for line in above)


def test_hazards_are_told_where_nothing_can_be_forecast(book: Path) -> None:
    told = Told()
    _draft(book, Stated(substrate="CCCCBr", nucleophile="NaN3", solvents=["dichloromethane"]), told)
    assert any(line.startswith("nothing is forecast") for line in told.lines)
    assert any(line.startswith("STOP: NaN3 with dichloromethane") for line in told.lines)


# file, substrate, nucleophile, base, leaving group, product A
DRAWN = [
    ("cyanide", "ClCCCBr", "[C-]#N.[Na+]", None, "bromide", "N#CCCCCl"),
    ("phenol-with-carbonate", "CCCCBr", "Oc1ccccc1", "O=C([O-])[O-].[K+].[K+]", "bromide", "CCCCOc1ccccc1"),
    ("elimination", "CCC(C)Br", None, "CC(C)(C)[O-].[K+]", "bromide", "C/C=C/C"),
    ("addition", "C=CCCCC", "Br", None, "none", "CCCCC(C)Br"),
]


@pytest.mark.parametrize(("file", "substrate", "nucleophile", "base", "group", "product"), DRAWN)
def test_a_drawn_reaction_is_told_apart(
    book: Path, file: str, substrate: str, nucleophile: str | None, base: str | None, group: str, product: str
) -> None:
    stated = Stated(rxn=(RXN / f"{file}.rxn").read_text("utf-8"))
    record = _record(filled(_draft(book, stated).text, result="substitution"))
    assert record.substrate.smiles == substrate
    assert [n.smiles for n in record.nucleophiles] == ([nucleophile] if nucleophile else [])
    assert [b.smiles for b in record.bases] == ([base] if base else [])
    assert record.substrate.leaving_group == group
    assert record.outcome.products[0].smiles == product


def test_a_drawing_with_two_substrates_wants_one_named(book: Path) -> None:
    drawn = (RXN / "two-bromides.rxn").read_text("utf-8")
    with pytest.raises(AskingError, match="Which reactant is the substrate: C=CCBr, BrCc1ccccc1"):
        _draft(book, Stated(rxn=drawn))
    record = _record(filled(_draft(book, Stated(rxn=drawn, substrate="allyl bromide")).text, result="substitution"))
    assert record.substrate.name == "allyl bromide"
    with pytest.raises(AskingError, match="the RXN file has no reactant CCBr; it has"):
        _draft(book, Stated(rxn=drawn, substrate="CCBr"))


def test_a_drawing_with_two_nucleophiles_wants_one_named(book: Path) -> None:
    drawn = (RXN / "two-thiols.rxn").read_text("utf-8")
    with pytest.raises(AskingError, match="Which is the nucleophile: "):
        _draft(book, Stated(rxn=drawn))
    record = _record(filled(_draft(book, Stated(rxn=drawn, nucleophile="NaSPh")).text, result="substitution"))
    assert [nucleophile.name for nucleophile in record.nucleophiles] == ["NaSPh"]
    assert [reagent.use for reagent in record.reagents] == ["additive"]


def test_a_code_outside_the_people_of_the_book_is_remarked_on(book: Path) -> None:
    told = Told()
    _draft(book, Stated(substrate="CCBr", person="bench-7"), told)
    assert "bench-7 is none of the people in handbook.yml: bench-1, bench-2" in told.lines


# --- with somebody to ask -------------------------------------------------------------------------------------


def test_a_writer_is_asked_for_what_is_missing_only(book: Path) -> None:
    somebody = Answers("4-bromo-1-chloropentane", "1", "1", "10 mmol", "n", "1.2", "2")
    stated = Stated(substrate="ClCCCC(C)Br", nucleophile="NaN3", temperature="60 °C", time="16 h", solvents=["DMF"])
    record = _record(filled(_draft(book, stated, somebody).text, result="substitution"))
    assert [question.partition(",")[0] for question in somebody.questions] == [
        "Name of the substrate",
        "Which group leaves?",
        "What is in the bottle of the substrate?",
        "Amount or mass of substrate (10 mmol or 1.37 g)",
        "Take solvent",
        "Equivalents of nucleophile (1.5)",
        "Who runs it?",
    ]
    assert record.title == "4-bromo-1-chloropentane and NaN3 in DMF at 60 °C"
    assert (record.substrate.leaving_group, record.substrate.stereo) == ("bromide", "racemate")
    assert record.performed.by == ("bench-2",)
    assert record.related == ("NS4T9XQ2N",)


def test_everything_may_be_asked_and_left_open(book: Path) -> None:
    somebody = Answers("CC(C)(C)Cl")
    draft = _draft(book, Stated(), somebody)
    assert somebody.questions[:3] == [
        "Substrate (name or SMILES)",
        "Nucleophile (name, SMILES, solvent or internal)",
        "Base (name or SMILES)",
    ]
    assert "nucleophile:  # or one of the words solvent, internal, none; a base goes under base:" in draft.text
    unread = read_bytes(draft.text.encode(), f"{draft.entry}.yml")
    assert {finding.rule for finding in unread.findings} == {"gap-left-open"}


def test_a_swapped_pair_is_turned_round_when_the_writer_agrees(book: Path) -> None:
    somebody = Answers("y")
    text = _draft(book, Stated(substrate="NaN3", nucleophile="octyl bromide"), somebody).text
    assert "  name: octyl bromide" in text.split("nucleophile:")[0]
    assert "stand the wrong way round. Swap them?" in somebody.questions[0]


# --- on the disk ----------------------------------------------------------------------------------------------


def test_a_draft_is_written_under_a_fresh_name_and_never_over_another(
    book: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    minted = iter(["NS4T9XQ2N", "NS7K3QFMC"])
    monkeypatch.setattr(new_module, "mint_identifier", lambda: next(minted))
    draft = _draft(book, Stated(substrate="CCBr"))
    assert draft.entry == "NS7K3QFMC"  # the first one is taken
    path = write_draft(draft, book / "bromides")
    assert path.read_text("utf-8") == draft.text
    path.write_text("mine", "utf-8")
    with pytest.raises(FileExistsError):
        write_draft(draft, book / "bromides")
    assert [each.name for each in path.parent.iterdir()] == ["NS7K3QFMC.yml"]
    assert path.read_text("utf-8") == "mine"


def test_a_new_record_binds_the_schema_of_its_book(book: Path) -> None:
    draft = draft_record(Stated(substrate="CCBr"), book / "bromides" / "primary", TODAY, Told())
    assert draft.text.startswith("# yaml-language-server: $schema=../../schema/record-1.json\n")


@pytest.mark.parametrize("inside", ["..", "../other", "archive", "schema", "a/archive", ".git"])
def test_records_go_into_folders_of_the_book_only(book: Path, inside: str) -> None:
    with pytest.raises(AskingError):
        folder_inside(book, inside)


def test_a_folder_of_the_book_may_be_new(book: Path) -> None:
    assert folder_inside(book, "azides/secondary") == book / "azides" / "secondary"
    assert folder_inside(book, None) == book


def test_a_whole_new_record(book: Path, monkeypatch: pytest.MonkeyPatch, golden: Callable[[str, str], None]) -> None:
    monkeypatch.setattr(new_module, "mint_identifier", lambda: "NS7K3QFMC")
    stated = Stated(
        substrate="2-bromobutane",
        nucleophile="sodium thiophenolate",
        stereo="racemate",
        amount="10 mmol",
        equivalents="1.1",
        solvents=["ethanol:20 mL"],
        temperature="25 °C",
        time="4 h",
        person="bench-2",
    )
    golden("new/NS7K3QFMC.yml", _draft(book, stated).text)
