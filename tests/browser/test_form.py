"""The form that writes an entry: by keyboard alone, what it says of slips, its draft, its files in the check."""

import dataclasses
import gzip
import re
import shutil
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any

import material
import pytest
import yaml
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st
from jinja2 import Environment
from pydantic import TypeAdapter, ValidationError

from builder.book import open_book
from builder.finding import Level
from builder.publish.form_page import form_page
from builder.publish.frame import content_policy, inks_style
from builder.publish.page import Page
from builder.records import fields
from builder.records.identifiers import is_identifier
from builder.records.reader import read_bytes
from builder.records.settings import Person
from tests.browser.built import ROOT, SETTINGS
from tests.browser.chromium import ARGUMENTS, CHROMIUM
from tests.publish.handmade import book_of, entry_of, text_of
from tests.specimens import TODAY

sync_api = pytest.importorskip("playwright.sync_api")
axe_api = pytest.importorskip("axe_playwright_python.sync_playwright")

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(CHROMIUM is None, reason="no chromium on this machine"),
]

PEOPLE = ("bench-1", "bench-2", "bench-3", "safety-1")
BOOK_SETTINGS = f"{SETTINGS}people:\n" + "".join(f"  - {{code: {code}, shown_as: {code}}}\n" for code in PEOPLE)
FRAME = """\
<!doctype html><html lang="en"><head><meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="{{ policy }}">
<meta name="viewport" content="width=device-width, initial-scale=1"><title>The form alone</title>
{% for path in styles %}<link rel="stylesheet" href="../../{{ path }}">{% endfor %}</head>
<body><div class="hb-frame"><main class="hb-main md-typeset">{{ body }}</main>
<aside class="hb-rail md-typeset" aria-label="About this page">{{ rail }}</aside></div>
{% for path in scripts %}<script defer src="../../{{ path }}"></script>{% endfor %}</body></html>
"""
MOST_BYTES = 60_000
"""Of the page with its scripts and styles, compressed: opened on a phone at the bench."""


@pytest.fixture(scope="module")
def page_of_form() -> Page:
    book = book_of(entry_of(text_of("NS2H8WDRW")), entry_of(text_of("NS7K3QFMC")))
    people = tuple(Person(code=code, shown_as=code) for code in PEOPLE)
    return form_page(dataclasses.replace(book, settings=book.settings.model_copy(update={"people": people})))


@pytest.fixture(scope="module")
def address(page_of_form: Page, tmp_path_factory: pytest.TempPathFactory) -> str:
    """Write the form alone into a folder, under the site's policy; return its address there, file:///…"""
    folder = tmp_path_factory.mktemp("form")
    shutil.copytree(ROOT / "site_overrides" / "assets", folder / "assets")
    theme = next((Path(material.__file__).parent / "templates/assets/stylesheets").glob("main.*.min.css"))
    shutil.copy(theme, folder / "assets/theme.css")
    for asset in (*page_of_form.assets, inks_style(None)):
        (folder / asset.path).write_bytes(asset.data)
    written = page_of_form.write()
    html = (
        Environment(autoescape=False)
        .from_string(FRAME)
        .render(
            policy=content_policy(),
            styles=("assets/theme.css", "assets/handbook.css", "assets/inks.css", *page_of_form.styles),
            scripts=("assets/handbook.js", *page_of_form.scripts),
            body=written.body,
            rail=written.rail,
        )
    )
    file = folder / page_of_form.path / "index.html"
    file.parent.mkdir(parents=True)
    file.write_text(html, "utf-8")
    return file.as_uri()


Opener = Callable[..., "sync_api.Page"]


@pytest.fixture(scope="module")
def opener() -> Iterator[Opener]:
    """Open tabs, each with a memory of its own, in which nothing may complain or ask another host."""
    with sync_api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=ARGUMENTS)

        def open_tab(**options: object) -> "sync_api.Page":
            tab = browser.new_context(**options).new_page()
            tab.on("console", lambda message: _complain(message.text))
            tab.on("pageerror", lambda error: _complain(str(error)))
            tab.on("request", lambda made: None if made.url.startswith(("file:", "blob:")) else _complain(made.url))
            return tab

        yield open_tab
        browser.close()
    assert complaints == []


complaints: list[str] = []


def _complain(text: str) -> None:
    complaints.append(text)


@pytest.fixture(scope="module")
def desk(opener: Opener, address: str) -> "sync_api.Page":
    """A tab with the form in it."""
    tab = opener(viewport={"width": 1280, "height": 900})
    tab.goto(address)
    return tab


@pytest.fixture
def fresh(opener: Opener, address: str) -> Iterator["sync_api.Page"]:
    """A tab with an empty form in it."""
    tab = opener(viewport={"width": 1280, "height": 900})
    tab.goto(address)
    yield tab
    tab.context.close()
    assert complaints == []


# --- whole records by keyboard --------------------------------------------------------------------------------


@dataclass(frozen=True)
class Step:
    """One field of the form, and what is typed into it; without a text, a button or a fold to press."""

    section: str
    label: str
    text: str = ""
    which: int = 0


def _mesylate() -> Sequence[Step]:
    return (
        Step("who", "Title", "Azide displacement: a secondary mesylate #1"),
        Step("who", "Date", "2026-03-14"),
        Step("who", "By", "bench-2"),
        Step("who", "Runs", "2"),
        Step("who", "Notebook", "BK2/112"),
        Step("who", "Status", "current"),
        Step("substrate", "Name", "(S)-octan-2-yl methanesulfonate"),
        Step("substrate", "SMILES", "CCCCCC[C@H](C)OS(C)(=O)=O"),
        Step("substrate", "Mass", "2.083 g"),
        Step("substrate", "Stereo", "single enantiomer"),
        Step("substrate", "ee", "99 %"),
        Step("substrate", "secondary"),
        Step("substrate", "Leaving group", "mesylate"),
        Step("attack", "Name", "sodium azide"),
        Step("attack", "SMILES", "[Na+].[N-]=[N+]=[N-]"),
        Step("attack", "Equivalents", "1.5"),
        Step("solvent", "Name", "DMF"),
        Step("solvent", "Volume", "20 mL"),
        Step("stages", "Add", "(S)-octan-2-yl methanesulfonate\nsodium azide\nDMF"),
        Step("stages", "Temperature", "60"),
        Step("stages", "Write 60 °C"),
        Step("stages", "Measured", "internal"),
        Step("stages", "Time", "16 h"),
        Step("stages", "Vessel", "open"),
        Step("stages", "Atmosphere", "nitrogen"),
        Step("outcome", "substitution"),
        Step("outcome", "Claim"),
        Step("outcome", "Mechanism", "SN2"),
        Step("outcome", "Course", "inversion"),
        Step("outcome", "Basis", "chiral HPLC of product"),
        Step("outcome", "Name", "(R)-2-azidooctane"),
        Step("outcome", "SMILES", "CCCCCC[C@@H](C)N=[N+]=[N-]"),
        Step("outcome", "Use", "desired"),
        Step("outcome", "Stereo", "single enantiomer"),
        Step("outcome", "Yield", "88 %"),
        Step("outcome", "Of", "A"),
        Step("outcome", "Kind", "isolated"),
        Step("outcome", "Mass", "1.366 g"),
        Step("outcome", "Add a measurement"),
        Step("outcome", "What was measured", "ee", 1),
        Step("outcome", "ee", "97 %", 1),
        Step("outcome", "Of", "A", 1),
        Step("outcome", "By", "chiral HPLC", 1),
        Step("work-up", "Work-up", "quench: 60 mL water, kept above pH 9\nextract with 3 × 20 mL heptane"),
        Step("evidence", "Evidence", "1H NMR\nchiral HPLC"),
        Step("safety", "Safety review"),
        Step("safety", "By", "safety-1"),
        Step("safety", "Date", "2026-03-12"),
        Step("safety", "Scope", "azide at 10 mmol, no acid"),
    )


def _failure() -> Sequence[Step]:
    return (
        Step("who", "Title", "Neopentyl bromide and sodium azide in aqueous ethanol, no reaction"),
        Step("who", "Date", "2026-03-16"),
        Step("who", "By", "bench-3"),
        Step("substrate", "Name", "neopentyl bromide"),
        Step("substrate", "SMILES", "CC(C)(C)CBr"),
        Step("substrate", "Amount", "10 mmol"),
        Step("substrate", "Stereo", "achiral"),
        Step("substrate", "neopentyl"),
        Step("substrate", "primary"),
        Step("substrate", "Leaving group", "bromide"),
        Step("attack", "Name", "sodium azide"),
        Step("attack", "SMILES", "[Na+].[N-]=[N+]=[N-]"),
        Step("attack", "Amount", "15 mmol"),
        Step("solvent", "Name", "ethanol"),
        Step("solvent", "Volume", "16 mL"),
        Step("solvent", "Add a solvent"),
        Step("solvent", "Name", "water", 1),
        Step("solvent", "Volume", "4 mL", 1),
        Step("stages", "Temperature", "78 °C"),
        Step("stages", "Measured", "internal"),
        Step("stages", "Time", "24 h"),
        Step("stages", "Vessel", "reflux"),
        Step("outcome", "no reaction"),
        Step("outcome", "Name", "neopentyl azide", 1),
        Step("outcome", "SMILES", "CC(C)(C)CN=[N+]=[N-]", 1),
        Step("outcome", "What was measured", "conversion"),
        Step("outcome", "Conversion", "< 2 %"),
        Step("outcome", "By", "1H NMR"),
        Step("outcome", "Add a measurement"),
        Step("outcome", "What was measured", "recovered", 1),
        Step("outcome", "Recovered", "96 %", 1),
        Step("outcome", "Of", "substrate", 1),
        Step("outcome", "Cause", "backside attack blocked"),
        Step("outcome", "Basis", "assumed", 1),
        Step("outcome", "Repeated", "false"),
        Step("safety", "Safety review"),
        Step("safety", "By", "safety-1"),
        Step("safety", "Date", "2026-03-12"),
        Step("safety", "Scope", "azide at 15 mmol"),
    )


def _solvolysis() -> Sequence[Step]:
    return (
        Step("who", "Title", "Solvolysis rate of tert-butyl chloride in 80 % aqueous ethanol"),
        Step("who", "Date", "2026-03-15"),
        Step("who", "By", "bench-1, bench-2"),
        Step("substrate", "Name", "tert-butyl chloride"),
        Step("substrate", "SMILES", "CC(C)(C)Cl"),
        Step("substrate", "Amount", "5.0 mmol"),
        Step("substrate", "Stereo", "achiral"),
        Step("substrate", "tertiary"),
        Step("substrate", "Leaving group", "chloride"),
        Step("attack", "Given as", "solvent"),
        Step("solvent", "Name", "ethanol"),
        Step("solvent", "Volume", "80 mL"),
        Step("solvent", "Add a solvent"),
        Step("solvent", "Name", "water", 1),
        Step("solvent", "Volume", "20 mL", 1),
        Step("stages", "Temperature", "25.0 °C"),
        Step("stages", "Measured", "bath"),
        Step("stages", "Time", "48 h"),
        Step("stages", "Vessel", "sealed"),
        Step("outcome", "substitution"),
        Step("outcome", "elimination"),
        Step("outcome", "Claim"),
        Step("outcome", "Mechanism", "SN1"),
        Step("outcome", "Course", "not applicable"),
        Step("outcome", "Basis", "kinetics"),
        Step("outcome", "Name", "tert-butanol"),
        Step("outcome", "SMILES", "CC(C)(C)O"),
        Step("outcome", "Add a product"),
        Step("outcome", "Name", "ethyl tert-butyl ether", 1),
        Step("outcome", "SMILES", "CCOC(C)(C)C", 1),
        Step("outcome", "Add a product"),
        Step("outcome", "Name", "isobutene", 2),
        Step("outcome", "SMILES", "C=C(C)C", 2),
        Step("outcome", "What was measured", "ratio"),
        Step("outcome", "Ratio", "A+B:C = 83:17"),
        Step("outcome", "By", "GC"),
        Step("outcome", "Calibrated", "true"),
        Step("outcome", "Time course"),
        Step("outcome", "Follows", "conversion"),
        Step("outcome", "Time unit", "h"),
        Step("outcome", "Points", "0 0\n2 6.4\n4 12.4\n8 23.3\n16 41.1\n24 54.8\n48 79.6"),
        Step("outcome", "Rate constant"),
        Step("outcome", "Order", "1"),
        Step("outcome", "Value", "9.2e-6 1/s"),
        Step("outcome", "Temperature", "25.0 °C"),
        Step("outcome", "More: spread, n"),
        Step("outcome", "Spread", "0.2e-6 1/s", 1),
        Step("outcome", "n", "3", 1),
    )


_STOPS_ON_THE_WAY = """(control) => {
  const stops = [...document.querySelectorAll("a[href], button, input, select, textarea, summary, [tabindex='0']")];
  const seen = stops.filter((stop) => stop.checkVisibility());
  return Math.max(0, seen.indexOf(control) - seen.indexOf(document.activeElement));
}"""
WHOLE = {"mesylate": _mesylate, "failure": _failure, "solvolysis": _solvolysis}


def _control(tab: "sync_api.Page", step: Step) -> "sync_api.Locator":
    section = tab.locator(f"section[aria-labelledby={step.section}]")
    if step.text:
        return section.get_by_label(re.compile(rf"^{re.escape(step.label)}( required)?$")).nth(step.which)
    begins = re.compile(rf"^\s*{re.escape(step.label)}")
    button = section.get_by_role("button", name=step.label, exact=True)
    return (
        section.locator("summary", has_text=begins).or_(section.get_by_label(step.label, exact=True)).or_(button).first
    )


def _press(tab: "sync_api.Page", step: Step) -> None:
    """Go to a field with the tabulator key, as often as it takes, and fill it in."""
    control = _control(tab, step).element_handle(timeout=2000)
    for _ in range(control.evaluate(_STOPS_ON_THE_WAY)):
        tab.keyboard.press("Tab")
    assert control.evaluate("(element) => element === document.activeElement"), f"the keyboard does not reach {step}"
    kind = control.evaluate("(element) => element.type === 'checkbox' ? 'checkbox' : element.tagName")
    if kind == "SELECT":
        for _ in range(60):
            if control.evaluate("(element) => element.value") == step.text:
                return
            tab.keyboard.press("ArrowDown")
        pytest.fail(f"no such word: {step}")
    elif kind == "checkbox":
        tab.keyboard.press("Space")
    elif step.text:
        tab.keyboard.insert_text(step.text)
        if kind == "INPUT":
            tab.keyboard.press("End")
    else:
        tab.keyboard.press("Enter")


def _downloaded(tab: "sync_api.Page", folder: Path) -> Path:
    """Press the button that gives the file; return where it is."""
    with tab.expect_download() as waiting:
        _press(tab, Step("finish", f"Download {tab.locator('[data-form-entry]').first.text_content()}.yml"))
    path = folder / waiting.value.suggested_filename
    waiting.value.save_as(path)
    return path


@pytest.mark.parametrize("name", WHOLE)
def test_a_record_written_by_keyboard_alone_passes_the_check(name: str, fresh: "sync_api.Page", tmp_path: Path) -> None:
    for step in WHOLE[name]():
        _press(fresh, step)
    entries = tmp_path / "entries"
    entries.mkdir()
    (entries / "handbook.yml").write_text(BOOK_SETTINGS, "utf-8")
    file = _downloaded(fresh, entries)
    book = open_book(entries, today=TODAY)
    assert [each.message for each in book.findings if each.level in {Level.ERROR, Level.QUERY}] == []
    assert [entry.id for entry in book.entries] == [file.stem]
    assert "yaml-1-1-reads-otherwise" not in {each.rule for each in book.findings}


# --- what the form says of slips ------------------------------------------------------------------------------

TEMPERATURE = Step("stages", "Temperature", "-")
MASS = Step("substrate", "Mass", "-")
TIME = Step("stages", "Time", "-")
SMILES = Step("substrate", "SMILES", "-")
DATE = Step("who", "Date", "-")
OF = Step("outcome", "Of", "-")
SLIPS = [
    # field, what is typed, what the form says, what it offers to write
    (TEMPERATURE, "60", "The unit is missing: write 60 °C or 333 K.", ["60 °C", "333 K"]),
    (TEMPERATURE, "60 C°", "The unit “C°” is unknown: use °C or K.", []),
    (TEMPERATURE, "rt", "“rt” was not measured: write what the thermometer showed", []),
    (TEMPERATURE, "ca. 60 °C", "Leave out “about”: write 60 °C.", ["60 °C"]),
    (TEMPERATURE, "-300 °C", "This is impossible: write more than -273.15 °C.", []),
    (TEMPERATURE, "0 °C to 2500 °C", "This is impossible: write at most 1500 °C.", []),
    (TEMPERATURE, "60 min", "min is a unit of time: use °C or K.", []),
    (TIME, "16", "The unit is missing: write 16 s or 16 min; units: s, min, h, d.", ["16 s", "16 min"]),
    (TIME, "overnight", "“overnight” was not measured: write the time it was", []),
    (TIME, "16 hours", "The unit “hours” is unknown: write 16 h.", ["16 h"]),
    (TIME, "1-2 h", "Write one number and one unit, such as 16 h.", []),
    (MASS, "2,5 g", "There is a comma inside the number: write 2.5 g.", ["2.5 g"]),
    (MASS, "2,083 g", "There is a comma inside the number: write 2.083 g or 2083 g.", ["2.083 g", "2083 g"]),
    (MASS, "2 mL", "mL is a unit of volume: use g, mg, µg or kg.", []),
    (MASS, "0 g", "Write a number above zero, such as 2.083 g.", []),
    (MASS, "a spatula", "Write a number and a unit, such as 2.083 g.", []),
    (Step("substrate", "ee", "-"), "99", "The unit is missing: write 99 %.", ["99 %"]),
    (Step("substrate", "er", "-"), "97 : 3", "Write 97:3.", ["97:3"]),
    (Step("substrate", "er", "-"), "mostly S", "Write it like 97:3.", []),
    (Step("attack", "Equivalents", "-"), "1,5", "Write 1.5.", ["1.5"]),
    (Step("attack", "Equivalents", "-"), "1.5 equiv", "Write 1.5.", ["1.5"]),
    (Step("attack", "Equivalents", "-"), "excess", "Write a bare number, such as 1.5.", []),
    (Step("who", "Runs", "-"), "two", "Write a whole number.", []),
    (SMILES, "CCC(C", "This is not a SMILES: a branch ( ) has only one end.", []),
    (SMILES, "[Na+.[OH-]", "This is not a SMILES: a bracket [ ] has only one end.", []),
    (SMILES, "C1CCCC", "This is not a SMILES: ring 1 is not closed.", []),
    (SMILES, "CC(C)(C)(C)C", "This is not a SMILES: carbon with 5 bonds.", []),
    (SMILES, "C[N](C)(C)C", "", []),
    (SMILES, "CN(C)(C)C", "This is not a SMILES: nitrogen with 4 bonds; one with a charge is written [N+].", []),
    (SMILES, "NaN3", "This is not a SMILES: a is no sign of one; an element beyond", []),
    (SMILES, "[N-]=[N+]=[N-]", "This is an ion without its counter-ion, charge \u22121: write both, such as", []),
    (SMILES, "[Na+].[N-]=[N+]=[N-]", "", []),
    (Step("stages", "Add", "-"), "sodium azid", "“sodium azid” is not the name of a substance above: name them", []),
    (DATE, "14.3.2026", "Write 2026-03-14.", ["2026-03-14"]),
    (DATE, "2026-02-30", "2026-02-30 is no day of the calendar.", []),
    (DATE, "March", "Write year, month and day, such as 2026-03-14.", []),
    (Step("who", "By", "-"), "bench-2, bench-9", "The book knows bench-1, bench-2, bench-3 or safety-1; ask", []),
    (Step("who", "Title", "-"), "the <sup>13</sup>C signal", "<sup> looks like HTML: write plain text.", []),
    (Step("who", "Title", "-"), "x" * 161, "This is too long: at most 160 characters.", []),
    (Step("substrate", "CAS number", "-"), "26628-22-9", "The check digit of this CAS number is wrong.", []),
    (Step("substrate", "InChI", "-"), "CCC", "An InChI begins with InChI=1S/.", []),
    (OF, "Q", "No product has the label Q.", []),
    (OF, "A, A", "A stands twice.", []),
    (Step("rest", "Related", "-"), "NS7K3QFMD", "The last character does not fit: look for a slip.", []),
    (Step("outcome", "Points", "-"), "0 0\n2", "“2” is not 2 numbers.", []),
    (Step("outcome", "Points", "-"), "2 5\n1 4", "Write the points in the order of time.", []),
]


@pytest.mark.parametrize(
    ("step", "typed", "says", "offers"), SLIPS, ids=[f"{row[0].label}-{row[1]:.20}".replace("\n", " ") for row in SLIPS]
)
def test_a_slip_is_named_beside_its_field(
    step: Step, typed: str, says: str, offers: list[str], desk: "sync_api.Page"
) -> None:
    control = _control(desk, step)
    handle = control.element_handle()
    handle.evaluate(_TYPE, typed)
    try:
        said, invalid = handle.evaluate(_SAID)
        assert said[:1] == ([] if not says else [said[0]])
        assert "".join(said[:1]).startswith(says)
        assert bool(says) == invalid
        assert said[1:] == [f"Write {text}" for text in offers]
    finally:
        handle.evaluate(_TYPE, "")


_TYPE = """(control, text) => {
  control.value = text;
  control.dispatchEvent(new Event("input"));
  control.dispatchEvent(new Event("blur"));
}"""
_SAID = """(control) => {
  const said = document.getElementById(control.getAttribute("aria-describedby").split(" ").at(-1));
  return [[...said.querySelectorAll("p, button")].map((each) => each.textContent), control.ariaInvalid === "true"];
}"""


def test_a_fix_is_written_by_its_button(fresh: "sync_api.Page") -> None:
    control = _control(fresh, TEMPERATURE)
    control.fill("60")
    control.blur()
    fresh.get_by_role("button", name="Write 60 °C").click()
    assert control.input_value() == "60 °C"
    assert control.get_attribute("aria-invalid") is None


@pytest.mark.parametrize("hold_ms", [0, 1200], ids=["clicked", "held"])
def test_what_is_said_of_a_slip_takes_no_click_away(hold_ms: int, fresh: "sync_api.Page") -> None:
    er, box = _control(fresh, Step("substrate", "er", "-")), _control(fresh, Step("substrate", "secondary"))
    er.fill("97/3")
    box.scroll_into_view_if_needed()
    at = box.bounding_box()
    assert at is not None
    fresh.mouse.move(at["x"] + at["width"] / 2, at["y"] + at["height"] / 2)
    fresh.mouse.down()
    fresh.wait_for_timeout(hold_ms)
    fresh.mouse.up()
    assert box.is_checked()
    fresh.get_by_text("Write 97:3.").first.wait_for()
    assert er.get_attribute("aria-invalid") == "true"


def test_what_a_stage_adds_is_named_as_it_is_listed(fresh: "sync_api.Page") -> None:
    _control(fresh, Step("substrate", "Name", "-")).fill("2-bromobutane")
    _control(fresh, Step("attack", "Name", "-")).fill("sodium azide")
    adds = _control(fresh, Step("stages", "Add", "-"))
    adds.fill("2-bromobutane\nsodium azid")
    adds.blur()
    said = "“sodium azid” is not the name of a substance above: write 2-bromobutane, sodium azide."
    assert said in str(fresh.locator("#hb-form-mend").text_content())
    adds.fill("2-bromobutane\nsodium azide")
    assert adds.get_attribute("aria-invalid") is None


def test_a_slip_is_announced_once_typing_pauses(fresh: "sync_api.Page") -> None:
    _control(fresh, TEMPERATURE).press_sequentially("60")
    status = fresh.locator("[role=status]", has_text="Temperature: The unit is missing")
    assert status.count() == 0
    status.wait_for(state="attached")


def test_the_labels_of_a_ratio_are_those_of_products(fresh: "sync_api.Page") -> None:
    fresh.get_by_label("What was measured").select_option("ratio")
    ratio = _control(fresh, Step("outcome", "Ratio", "-"))
    ratio.fill("A:B = 65:35")
    ratio.blur()
    said = fresh.locator(".hb-field__said", has_text="No product has the label B.")
    assert said.is_visible()
    fresh.get_by_role("button", name="Add a product").click()
    assert _control(fresh, Step("outcome", "Label", "-", 1)).input_value() == "B"
    _control(fresh, Step("outcome", "Name", "-", 1)).fill("octene")
    assert said.count() == 0


def test_what_is_missing_is_told_at_the_download_and_leads_to_its_field(fresh: "sync_api.Page") -> None:
    assert fresh.locator("[aria-invalid]").count() == 0
    fresh.get_by_role("button", name="Download").click()
    assert fresh.evaluate("document.activeElement.id") == "hb-form-summary"
    missing = fresh.locator("#hb-form-missing li")
    assert set(missing.all_text_contents()) == {
        "Who and when: Title missing.",
        "Who and when: Date missing.",
        "Who and when: By missing.",
        "Substrate: Name missing.",
        "Substrate: Class missing.",
        "Substrate: Leaving group missing.",
        "Substrate: SMILES, InChI or from RXN missing.",
        "Substrate: Mass, amount or volume missing.",
        "Nucleophile and base: Nucleophile or base missing.",
        "Solvent: Solvent missing.",
        "Stages, Stage 1: Temperature missing.",
        "Stages, Stage 1: Time missing.",
        "Outcome: Result missing.",
    }
    missing.get_by_text("Stage 1: Time missing").click()
    assert _control(fresh, TIME).evaluate("(element) => element === document.activeElement")


def test_a_reaction_that_went_wants_a_product_and_a_failed_one_its_aim(fresh: "sync_api.Page") -> None:
    missing = fresh.locator("#hb-form-missing")
    _control(fresh, Step("outcome", "substitution")).check()
    assert "Outcome: Products missing." in str(missing.text_content())
    _control(fresh, Step("outcome", "substitution")).uncheck()
    _control(fresh, Step("outcome", "no reaction")).check()
    assert "Products" not in str(missing.text_content())
    assert _control(fresh, Step("outcome", "Cause", "-")).is_visible()


def test_groups_are_added_and_removed(fresh: "sync_api.Page") -> None:
    fresh.get_by_role("button", name="Add a solvent").click()
    names = fresh.locator("section[aria-labelledby=solvent]").get_by_label(re.compile("^Name"))
    names.nth(0).fill("ethanol")
    names.nth(1).fill("water")
    fresh.get_by_role("button", name="Remove solvent 1").click()
    assert [names.nth(i).input_value() for i in range(names.count())] == ["water"]
    assert fresh.locator("legend", has_text="Solvent 1").count() == 1
    assert fresh.evaluate("document.activeElement.textContent") == "Add a solvent"


# --- draft, identifier, file ----------------------------------------------------------------------------------


def test_a_draft_outlives_a_reload_until_it_is_discarded(fresh: "sync_api.Page") -> None:
    _control(fresh, Step("who", "Title", "-")).fill("Azide displacement")
    fresh.get_by_role("button", name="Add a base").click()
    _control(fresh, Step("attack", "Name", "-", 1)).fill("potassium carbonate")
    _control(fresh, Step("substrate", "secondary")).check()
    _control(fresh, Step("outcome", "What was measured", "-")).select_option("dr")
    _control(fresh, Step("outcome", "dr", "-")).fill("3:1")
    yaml, entry = (fresh.locator(part).first.text_content() for part in ("#hb-form-yaml", "[data-form-entry]"))
    fresh.reload()
    assert fresh.locator("#hb-form-yaml").text_content() == yaml
    assert str(yaml).count("dr: '3:1'") == 1
    fresh.once("dialog", lambda dialog: dialog.accept())
    fresh.get_by_role("button", name="Discard draft").click()
    fresh.wait_for_function("!document.querySelector('#hb-form-yaml').textContent.includes('title:')")
    assert fresh.locator("[data-form-entry]").first.text_content() != entry


def test_identifiers_drawn_in_the_browser_are_ones(desk: "sync_api.Page") -> None:
    drawn = desk.evaluate(
        "() => { const r = handbookRecord(handbookFormat); return Array.from({length: 1000}, () => r.mint()) }"
    )
    assert [each for each in drawn if not is_identifier(each)] == []
    assert len(set(drawn)) == 1000


def test_an_identifier_of_the_book_is_drawn_again(desk: "sync_api.Page") -> None:
    # NS7K3QFMC is in the book; its letters are drawn first, then others.
    drawn = desk.evaluate("""() => {
      const { letters } = handbookFormat.identifier, bodies = ["7K3QFM", "2H8WDR", "4T9XQ2"];
      return handbookRecord(handbookFormat).mint(() => [...bodies.shift()].map((letter) => letters.indexOf(letter)));
    }""")
    assert drawn == "NS4T9XQ2N"


def test_a_page_without_scripts_says_what_to_do(opener: Opener, address: str) -> None:
    tab = opener(java_script_enabled=False)
    tab.goto(address)
    assert tab.get_by_text("This form needs scripts").is_visible()
    assert tab.locator("pre", has_text="entry: NS4T9XQ2N").is_visible()
    assert not tab.locator("#hb-form").is_visible()
    tab.context.close()


def test_the_page_is_light(page_of_form: Page) -> None:
    made = {asset.path: asset.data for asset in page_of_form.assets}
    loaded = [*page_of_form.scripts, *page_of_form.styles, "assets/handbook.js", "assets/handbook.css"]
    files = [made.get(path) or (ROOT / "site_overrides" / path).read_bytes() for path in loaded]
    assert sum(len(gzip.compress(data)) for data in (page_of_form.body.encode(), *files)) < MOST_BYTES


@pytest.mark.parametrize("looks", ["light-360", "dark-1280"])
def test_a_form_full_of_findings_can_be_read_by_all(
    looks: str, opener: Opener, address: str, request: pytest.FixtureRequest
) -> None:
    scheme, width = looks.split("-")
    tab = opener(viewport={"width": int(width), "height": 800}, color_scheme=scheme)
    tab.goto(address)
    for step, text in ((TEMPERATURE, "60"), (SMILES, "CCC(C"), (MASS, "2,083 g")):
        _control(tab, step).fill(text)
    tab.evaluate("for (const fold of document.querySelectorAll('details')) fold.open = true")
    tab.get_by_role("button", name="Download").click()
    violations = axe_api.Axe().run(tab, options=WCAG).response["violations"]
    assert [(v["id"], [node["html"] for node in v["nodes"]]) for v in violations] == []
    assert tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth") <= 0
    small = tab.evaluate(_SMALL_TARGETS)
    assert small == []
    folder = request.config.getoption("--screenshots")
    if folder is not None:
        Path(folder).mkdir(parents=True, exist_ok=True)
        tab.screenshot(path=f"{folder}/form-with-findings-{looks}.png", full_page=True)
    tab.context.close()


WCAG = {
    "runOnly": {"type": "tag", "values": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"]},
    "preload": False,
}
_SMALL_TARGETS = """() => [...document.querySelectorAll("#hb-form :is(button, select, textarea, input, summary)")]
  .filter((each) => each.type !== "checkbox" && each.getClientRects().length)
  .filter((each) => { const { width, height } = each.getBoundingClientRect(); return width < 24 || height < 24; })
  .map((each) => each.outerHTML)"""


DRAFT = {
    "status": "draft",
    "title": "Solvolysis of 2-bromobutane, nothing seen",
    "performed": {"date": "2026-03-14", "by": "bench-2"},
    "substrate": {
        "name": "2-bromobutane",
        "smiles": "CCC(C)Br",
        "amount": "10 mmol",
        "class": ["secondary"],
        "leaving_group": "bromide",
    },
    "nucleophile": {"word": "solvent"},
    "solvent": [{"name": "ethanol", "volume": "20 mL"}],
    "stages": [{"temperature": "25 °C", "time": "1 h"}],
    "outcome": {"result": ["no reaction"]},
}


def test_a_doubt_is_told_and_does_not_keep_the_file_back(fresh: "sync_api.Page", tmp_path: Path) -> None:
    fresh.evaluate(_KEEP, {"entry": "NS4T9XQ2N", "raw": DRAFT})
    fresh.reload()
    assert fresh.locator("#hb-form-state").text_content() == "Ready to download"
    by = _control(fresh, Step("who", "By", "-"))
    by.fill("bench-9")
    download = fresh.get_by_role("button", name="Download")
    download.click()
    assert fresh.get_by_text("press Download again").first.is_visible()
    with fresh.expect_download() as waiting:
        download.click()
    assert "by: [bench-9]" in waiting.value.path().read_text("utf-8")


# --- the same grammar on both sides ---------------------------------------------------------------------------


# A batch that fails names the texts at fault; making it smaller would take a browser minutes.
SETTINGS_OF_BATCHES: dict[str, Any] = {
    "deadline": None,
    "derandomize": True,
    "phases": [Phase.generate],
    "suppress_health_check": list(HealthCheck),
}


def _texts(*pieces: str) -> st.SearchStrategy[list[str]]:
    number = st.sampled_from(
        ["60", "0", "0.5", ".5", "5.", "-78", "+3", "1e3", "1e40", "2,083", "1.5e-3", "0.0", "9" * 41]
    )
    piece = st.sampled_from([*pieces, " ", "\u00a0", "-", "\u2013", "\u2212", "<", "to", " to ", "rt", "C", "M", "x"])
    text = st.lists(number | piece, min_size=1, max_size=6).map("".join)
    likely = st.tuples(number, st.sampled_from(["", " "]), st.sampled_from(pieces)).map("".join)
    return st.lists(text | likely, min_size=60, max_size=60)


QUANTITIES: dict[str, tuple[str, Any, tuple[str, ...]]] = {
    # part and key whose control is asked, how Python reads it, pieces of its texts
    "temperature": ("Stage.temperature", fields.TypedTemperature, ("°C", "K", "ºC", "° C", "°F")),
    "time": ("Stage.time", fields.Time, ("h", "min", "hours", "d", "s")),
    "mass": ("Substrate.mass", fields.Mass, ("g", "mg", "µg", "\u03bcg", "ug", "kg", "mL")),
    "volume": ("Solvent.volume", fields.Volume, ("mL", "ml", "cm³", "L", "µl")),
    "percent": ("Measurement.yield", fields.TypedPercent, ("%", "< 2 %", "≥", "> 99 %")),
    "strength": ("Nucleophile.strength", fields.Strength, ("mol/L", "M", "%", "mM")),
    "rate-constant": ("RateConstant.value", fields.RateConstantValue, ("1/s", "s-1", "s^-1", "L/(mol s)", "M-1 s-1")),
    "date": ("Performed.date", fields.Date, ("2026-03-14", "2026-13-01", "2024-02-29", "2026-02-29")),
    "cas": ("Substrate.cas", fields.CasNumber, ("26628-22-8", "26628-22-9", "75-26-3")),
    "entry": ("Superseded.by", fields.EntryId, ("NS4T9XQ2N", "NS4T9XQ2M", "NSIIIIIII")),
    "ratio": (
        "Measurement.ratio",
        fields.LabelledRatio,
        ("A:B = 65:35", "A+B:C = 82:18", "A:A = 1:1", "A:B", "=", "0:0"),
    ),
    "er": ("Substrate.er", fields.NumberRatio, ("97:3", "97.5:2.5", "0:0", ":", "97 : 3")),
}
_ASKED = """([place, texts]) => {
  const [part, key] = place.split("."), record = handbookRecord(handbookFormat);
  const control = handbookFormat.parts[part].fields.find((field) => field.key === key);
  return texts.map((text) => record.problem(control, text)?.says ?? "");
}"""


@pytest.mark.parametrize("name", QUANTITIES)
def test_browser_and_reader_take_and_refuse_the_same(name: str, desk: "sync_api.Page") -> None:
    place, kind, pieces = QUANTITIES[name]
    adapter: TypeAdapter[Any] = TypeAdapter(Annotated[kind, "read as a record reads it"])

    @settings(max_examples=6, **SETTINGS_OF_BATCHES)
    @given(_texts(*pieces))
    def compare(texts: list[str]) -> None:
        texts = [text for text in texts if text.strip()]
        said = desk.evaluate(_ASKED, [place, texts])
        differ = [(text, one) for text, one in zip(texts, said, strict=True) if _reads(adapter, text) == bool(one)]
        assert differ == []

    compare()


def _reads(adapter: TypeAdapter[Any], text: str) -> bool:
    try:
        adapter.validate_python(text.strip())
    except ValidationError:
        return False
    return True


# --- YAML -----------------------------------------------------------------------------------------------------

_WRITTEN = """(texts) => {
  const text = (each) => ({ style: "text", text: each }), plain = (each) => ({ style: "plain", text: each });
  const map = (pairs) => ({ keys: Object.entries(pairs) }), list = (items) => ({ items });
  return texts.map(([title, name, step, method, note]) => handbookRecord(handbookFormat).yaml(map({
    format: plain("1"), entry: plain("NS4T9XQ2N"), revision: plain("1"), status: text("draft"), title: text(title),
    performed: map({ date: plain("2026-03-14"), by: list([text("bench-2")]) }),
    substrate: map({ name: text(name), smiles: { style: "quoted", text: "CCC(C)Br" }, class: list([text("secondary")]),
      leaving_group: text("bromide"), amount: { style: "quantity", text: "10 mmol" } }),
    nucleophile: text("solvent"),
    solvent: list([map({ name: text(name), volume: { style: "quantity", text: "20 mL" } })]),
    stages: list([map({ add: list([text(name), text(step)]), temperature: { style: "quantity", text: "-78 °C" },
      time: { style: "quantity", text: "16 h" }, note: text(note) })]),
    work_up: list([text(step), text(note)]),
    outcome: map({ result: list([text("no reaction")]), measured: list([
      map({ conversion: { style: "quantity", text: "> 2 %" }, by: text(method) })]) }),
    procedure: text(note),
  })));
}"""
_LINE = (
    st.text(
        st.characters(
            codec="utf-8", exclude_categories=("Cc", "Cs", "Co", "Cn", "Zl", "Zp"), exclude_characters="\ufeff"
        )
        | st.sampled_from("'\"#:-?[]{},&*!|>%@` \\<="),
        min_size=1,
        max_size=40,
    )
    .map(str.strip)
    .filter(bool)
)
_TYPED = _LINE | st.sampled_from(
    [
        "no",
        "NO",
        "null",
        "~",
        "1e5",
        "0x1F",
        "1_000",
        "12:30",
        "97:3",
        "2026-03-14",
        ".5",
        "- a",
        "a: b",
        "a #b",
        "---",
        "=",
        "it's",
        "'",
        "2,2-dimethylpropane",
        "1,4-dioxane",
        "[OH-]",
        "a:",
        "? a",
        "<<",
        "...",
    ]
)
_NOTE = st.lists(_LINE | st.just("") | st.just("  deep"), min_size=1, max_size=4).map(
    lambda lines: "\n".join(lines).strip()
)


def test_every_text_survives_to_the_reader(desk: "sync_api.Page") -> None:
    @settings(max_examples=8, **SETTINGS_OF_BATCHES)
    @given(st.lists(st.tuples(_TYPED, _TYPED, _TYPED, _TYPED, _NOTE.filter(bool)), min_size=15, max_size=15))
    def compare(texts: list[tuple[str, ...]]) -> None:
        texts = [each for each in texts if not any(fields.MARKUP.search(text) for text in each)]
        for (title, name, step, method, note), written in zip(texts, desk.evaluate(_WRITTEN, texts), strict=True):
            reading = read_bytes(written.encode(), "NS4T9XQ2N.yml")
            assert reading.findings == (), written
            record = reading.record
            assert record is not None
            (stage,) = record.stages
            assert (record.title, record.substrate.name, record.solvents[0].name) == (title, name, name)
            assert (stage.add, stage.note, record.work_up) == ((name, step), note, (step, note))
            assert (record.outcome.measured[0].by, record.procedure) == (method, note)

    compare()


# --- every record of the book, through the form ---------------------------------------------------------------


def _draft(kept: Any, field: Any, form: Any) -> Any:
    """Return what a draft of the form keeps for a value of a record, as its YAML is typed."""
    listed = kept if isinstance(kept, list) else [kept]
    match field["is"]:
        case "part":
            return _draft_of_part({"name": kept, "smiles": kept} if isinstance(kept, str) else kept, field, form)
        case "choice":
            return (
                {"word": kept}
                if isinstance(kept, str)
                else {"items": [_draft(each, field["of"], form) for each in listed]}
            )
        case "mixed":
            texts = [each for each in listed if isinstance(each, str)]
            files = [_draft(each, field["of"], form) for each in listed if not isinstance(each, str)]
            return {"text": "\n".join(texts), "items": files}
        case "points":
            return "\n".join(" ".join(point) for point in listed)
        case "list" if field["of"]["is"] == "part":
            return [_draft(each, field["of"], form) for each in listed]
        case "list" if field["of"]["is"] == "word":
            return listed
        case "list":
            return (", " if field["of"].get("format") in {"person", "label", "entry"} else "\n").join(listed)
        case _:
            return kept


def _draft_of_part(kept: Any, field: Any, form: Any) -> dict[str, Any]:
    about = form["parts"][field["part"]]
    draft = {each["key"]: _draft(kept[each["key"]], each, form) for each in about["fields"] if each["key"] in kept}
    return draft | {"?": next((key for key in about.get("exactly", ()) if key in kept), None)}


DEMO = sorted((ROOT / "entries").glob("**/NS*.yml"))
FEW = [path for path in DEMO if path.parent.name != "archive"][::20]
_KEEP = "(draft) => localStorage.setItem(`handbook-form ${location.pathname}`, JSON.stringify(draft))"


@pytest.mark.parametrize(
    "path", [pytest.param(path, marks=() if path in FEW else pytest.mark.slow) for path in DEMO], ids=str
)
def test_a_record_comes_out_of_the_form_as_it_went_in(path: Path, desk: "sync_api.Page") -> None:
    text = path.read_text("utf-8")
    typed = yaml.load(text, yaml.BaseLoader)
    form = desk.evaluate("handbookFormat")
    fields_of_record = form["parts"][form["record"]]["fields"]
    raw = {
        field["key"]: _draft(typed[field["key"]], field, form) for field in fields_of_record if field["key"] in typed
    }
    if typed["status"] in {"superseded", "withdrawn"}:
        raw["status"] = "current"
    try:
        desk.evaluate(_KEEP, {"entry": "NS4T9XQ2N", "raw": raw})
        desk.reload()
        written = str(desk.locator("#hb-form-yaml").text_content())
        open_problems = desk.locator("#hb-form-mend li").all_text_contents()
    finally:
        desk.evaluate("localStorage.clear()")
        desk.reload()
    before = read_bytes(text.encode(), path.name).record
    reading = read_bytes(written.encode(), "NS4T9XQ2N.yml")
    assert before is not None
    assert reading.findings == ()
    assert reading.record is not None
    later = {"entry", "revision", "accepted", "superseded", "withdrawn", "status"}
    assert reading.record.model_dump(exclude=later) == before.model_dump(exclude=later)
    assert [each for each in open_problems if "The book knows" not in each] == []
