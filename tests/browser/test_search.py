"""The search box: what it lists first, by keyboard alone, over http and from a folder, under the site's policy."""

import json
import re
import shutil
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
from jinja2 import Environment, FileSystemLoader

from builder.book import Book, Entry, open_book
from builder.checks.case import compounds_of, open_case
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.synonyms import structure_named
from builder.publish.frame import content_policy
from builder.publish.page import Asset
from builder.publish.pages import build_pages
from builder.publish.portrait import Portrait, portrait_of
from builder.publish.search_index import as_script, listed_of, search_assets
from builder.records.vocabulary import Status
from builder.rule import Path as ValuePath
from builder.table import rows_of
from tests.browser.built import ROOT, build, good_texts, write_book
from tests.browser.chromium import ARGUMENTS, CHROMIUM, served
from tests.specimens import PLAIN, TODAY

sync_api = pytest.importorskip("playwright.sync_api")

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(CHROMIUM is None, reason="no chromium on this machine"),
]

QUERIES = ROOT / "tests" / "data" / "search_queries.tsv"
IN_PART = {"part of a name", "slip", "text", "several"}
"""Kinds of queries that other entries may answer as well."""
PAGE = """\
<!doctype html><html lang="en" data-paper="{paper}"><head><meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="{policy}"><title>Search alone</title>
<link rel="stylesheet" href="assets/handbook.css"></head>
<body><h1>Search alone</h1>{box}
<p><a id="link" href="#link">a link</a> <label>Notes <input id="notes"></label></p>
<script src="assets/search-box.js"></script></body></html>
"""


# --- the table of queries over the demonstration book ---------------------------------------------------------


@pytest.fixture(scope="module")
def demo() -> Book[Portrait]:
    return open_book(ROOT / "entries", today=TODAY, keep=portrait_of, processes=2)


def _bare_site(folder: Path, index: Iterable[Asset]) -> Path:
    """Write pages with nothing on them but the box, one for each palette, and the index it is to look in."""
    jinja = Environment(loader=FileSystemLoader(ROOT / "site_overrides" / "partials"), autoescape=True)
    box = jinja.get_template("hb-search.html").render(root="./")
    shutil.copytree(ROOT / "site_overrides" / "assets", folder / "assets")
    for asset in index:
        (folder / asset.path).write_bytes(asset.data)
    for paper in ("light", "dark"):
        (folder / f"{paper}.html").write_text(PAGE.format(policy=content_policy(), paper=paper, box=box), "utf-8")
    return folder


@pytest.fixture(scope="module")
def demo_alone(tmp_path_factory: pytest.TempPathFactory, demo: Book[Portrait]) -> Path:
    listed = [page for page in map(listed_of, build_pages(demo)) if page is not None]
    return _bare_site(tmp_path_factory.mktemp("demo"), search_assets(demo.entries, listed))


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build a small book that has a page of the group's own."""
    own = ("fume-hoods.md", "# Which fume hoods we use\n")
    built = build(write_book(tmp_path_factory.mktemp("book"), [*good_texts(), own]))
    assert built.code == 0, built.out
    return built.site


@pytest.fixture(scope="module")
def browser() -> Iterator["sync_api.Browser"]:
    with sync_api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=ARGUMENTS)
        yield browser
        browser.close()


@pytest.fixture
def tab(browser: "sync_api.Browser") -> Iterator["sync_api.Page"]:
    page = browser.new_page()
    page.set_default_timeout(10_000)
    yield page
    page.close()


@dataclass(frozen=True)
class Asked:
    """An entry as the table of queries asks for it: its compounds by canonical SMILES, else by name."""

    entry: Entry[Portrait]
    drawn: Mapping[ValuePath, Structure]
    about: frozenset[str]
    used: frozenset[str]
    structures: tuple[Structure, ...]
    names: tuple[str, ...]


def _asked(entry: Entry[Portrait]) -> Asked:
    drawn = open_case(entry.record, entry.file, PLAIN, TODAY).structures
    about: set[str] = set()
    used: set[str] = set()
    structures, names = [], []
    for path, compound in compounds_of(entry.record):
        structure = drawn.get(path) or structure_named(compound.name)
        is_about = path[0] in {"substrate", "outcome", "stages"}
        (about if is_about else used).add(structure.smiles if structure else compound.name)
        structures += [structure] if structure else []
        names.append(compound.name)
    return Asked(entry, drawn, frozenset(about), frozenset(used), tuple(structures), tuple(names))


def _keys(name: str, book: Sequence[Asked]) -> frozenset[str]:
    """Return how the compound that some record of the book calls so is known."""
    found = set()
    for asked in book:
        for path, compound in compounds_of(asked.entry.record):
            if compound.name == name:
                structure = asked.drawn.get(path) or structure_named(name)
                found.add(structure.smiles if structure else name)
    return frozenset(found)


def _fits(rule: str, asked: Asked, book: Sequence[Asked]) -> bool:
    """Say whether an entry is what a cell of the table asks for, by what its record says."""
    kind, _, value = rule.partition(":")
    outcome = asked.entry.record.outcome
    match kind:
        case "any" | "all":
            everything = asked.about | asked.used
            return all(_keys(name, book) & everything for name in value.split(" + "))
        case "about":
            return bool(_keys(value, book) & asked.about)
        case "skeleton":
            flat = {parse_smiles(smiles).flat_smiles for smiles in _keys(value, book)}
            return bool(flat & {s.flat_smiles for s in asked.structures if s.smiles in asked.about})
        case "ion":
            return any(value in structure.smiles.split(".") for structure in asked.structures)
        case "formula":
            return value in {structure.formula for structure in asked.structures}
        case "part":
            return any(value in name for name in asked.names)
        case "claims":
            return outcome.claim is not None and outcome.claim.mechanism == value
        case "leaves":
            return asked.entry.record.substrate.leaving_group == value
        case "result":
            return value in outcome.result
    return asked.entry.id == rule


def _acceptable(first: str, book: Sequence[Asked]) -> frozenset[str]:
    """Return the addresses that may come first; retired entries only where no other fits."""
    rules = first.split(" | ")
    pages = {rule.removeprefix("page:") for rule in rules if rule.startswith("page:")}
    fitting = [each.entry for each in book if any(_fits(rule, each, book) for rule in rules)]
    holding = [entry for entry in fitting if entry.record.status in {Status.CURRENT, Status.DRAFT}]
    return frozenset(pages | {f"e/{entry.id}/" for entry in holding or fitting})


def _hits(tab: "sync_api.Page") -> list[str]:
    """Return where the hits lead, below the site's root."""
    links: list[str] = tab.evaluate("[...document.querySelectorAll('#hb-hits:not([hidden]) a')].map(a => a.pathname)")
    return [
        re.sub(r"^.*?/((?:e|rules|lists|how-to-\w+|fume-hoods)/.*?)(?:index\.html)?$", r"\1", link) for link in links
    ]


def _type(tab: "sync_api.Page", query: str) -> list[str]:
    """Type a query over the last one, all but its end at a stroke, and return its hits."""
    tab.keyboard.press("Control+A")
    tab.keyboard.insert_text(query[:-1])
    tab.keyboard.type(query[-1])
    return _hits(tab)


def test_each_query_lists_first_what_it_means(tab: "sync_api.Page", demo_alone: Path, demo: Book[Portrait]) -> None:
    rows = list(rows_of(QUERIES.name, QUERIES.read_text("utf-8"), ("query", "kind", "first", "note")))
    assert len(rows) >= 45
    tab.goto((demo_alone / "light.html").as_uri())
    tab.keyboard.press("/")
    tab.keyboard.type("xx")
    _wait_for_count(tab, "found")
    book = [_asked(entry) for entry in demo.entries]
    wrong = []
    for row in rows:
        acceptable = _acceptable(row["first"], book)
        assert acceptable, f"{row['query']}: nothing in the book fits {row['first']}"
        hits = _type(tab, row["query"])
        fitting = [hit in acceptable for hit in hits]
        is_sorted = row["kind"] in IN_PART or fitting == sorted(fitting, reverse=True)
        if fitting[:1] != [True] or not is_sorted:
            wrong.append((row["query"], hits[:3]))
    assert wrong == []


# --- in the site as it is built ---------------------------------------------------------------------------------


@pytest.mark.parametrize("is_served", [True, False], ids=["served", "from a folder"])
def test_find_and_open_by_keyboard(tab: "sync_api.Page", site: Path, is_served: bool) -> None:
    with served(site.parent) as address:
        root = f"{address}{site.name}/" if is_served else f"{site.as_uri()}/"
        asked: list[str] = []
        tab.on("request", lambda request: asked.append(request.url))
        tab.goto(f"{root}rules/sn1-closed-methyl/index.html")
        assert not any("search-data" in url for url in asked)
        tab.keyboard.press("s")
        tab.keyboard.type("NSC0W7N51")
        tab.keyboard.press("Enter")  # before the index is there, or after: either way it opens
        tab.wait_for_url(f"{root}e/NSC0W7N51/**")
        assert tab.locator("h1").text_content() == "One-pot mesylation and azidation of (S)-octan-2-ol"
        assert all(url.startswith(root) for url in asked)


def test_a_page_that_the_group_wrote_is_found_too(tab: "sync_api.Page", site: Path) -> None:
    tab.goto((site / "index.html").as_uri())
    _search(tab, "fume hoods")
    assert _hits(tab) == ["fume-hoods/"]


# --- the box by itself, over a few handmade entries -----------------------------------------------------------

EVIL = "</script><img src=x onerror=alert(1)>"
#         id           title                      date          status        what takes part, by role
ENTRIES = [
    ("NS0000001", "Menthol made into a chloride", "2026-01-01", "current", {"menthol": "substrate"}),
    ("NS0000002", "Old menthol", "2026-06-01", "withdrawn", {"menthol": "substrate"}),
    ("NS0000003", "Newer menthol", "2026-02-01", "current", {"menthol": "product A"}),
    ("NS0000004", "Menthol as a by-product", "2026-05-01", "current", {"menthol": "product B, by-product"}),
    ("NS0000005", "Attack by an alkoxide", "2026-05-01", "current", {"menthol": "nucleophile"}),
    ("NS0000006", "In a strange medium", "2026-06-01", "current", {"menthol": "solvent"}),
    ("NS0000007", "Menthol is only mentioned", "2026-07-01", "current", {"anisole": "substrate"}),
    ("NS0000008", "A longer name", "2026-07-01", "current", {"menthol oxide": "substrate"}),
    ("NS0000009", EVIL, "2026-07-01", "current", {"(R)-carvone": "substrate", f"name {EVIL}": "solvent"}),
]
ROLES = {"substrate": 6, "product A": 6, "product B, by-product": 5, "nucleophile": 4, "solvent": 2}


def _handmade() -> dict[str, Any]:
    compounds = list(dict.fromkeys(name for *_, parts in ENTRIES for name in parts))
    roles = list(ROLES)
    blank = [""] * len(ENTRIES)
    return {
        "format": 1,
        "entries": {
            "id": [row[0] for row in ENTRIES],
            "title": [row[1] for row in ENTRIES],
            "date": [row[2] for row in ENTRIES],
            "status": [int(row[3] != "current") for row in ENTRIES],
            "participants": [
                [n for c, r in row[4].items() for n in (compounds.index(c), roles.index(r))] for row in ENTRIES
            ],
            "verdict": [0] * len(ENTRIES),
            "facets": [[0]] * len(ENTRIES),
            "take_away": [EVIL, *blank[1:]],
            **dict.fromkeys(("notebook", "conditions", "outcome"), blank),
        },
        "compounds": {"names": compounds}
        | {
            column: [""] * len(compounds)
            for column in ("synonyms", "formulas", "cas", "inchikey", "smiles", "variants")
        },
        "roles": list(ROLES.items()),
        "facets": [["mechanism claimed", "SN1", ""]],
        "verdicts": ["in line"],
        "statuses": ["current", "withdrawn"],
        "retired": ["superseded", "withdrawn"],
        "pages": {"title": ["How to menthol"], "path": ["how-to-menthol/"], "text": ["A page."], "key": [""]},
    }


@pytest.fixture(scope="module")
def alone(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a bare site over the handmade entries; one of their pages is there to be opened."""
    notes = ["stirred with Celite", *[""] * (len(ENTRIES) - 1)]
    scripts = {"data": as_script("handbookSearch", _handmade()), "notes": as_script("handbookNotes", notes)}
    index = [Asset(f"assets/search-{name}.js", script.encode()) for name, script in scripts.items()]
    folder = _bare_site(tmp_path_factory.mktemp("alone"), index)
    (folder / "e" / "NS0000003").mkdir(parents=True)
    (folder / "e" / "NS0000003" / "index.html").write_text("<title>Newer menthol</title>", "utf-8")
    return folder


@pytest.fixture
def opened(tab: "sync_api.Page", alone: Path) -> Iterator["sync_api.Page"]:
    """Yield the box alone, opened from its folder; it may not have complained or asked anything of anyone."""
    said: list[str] = []
    asked: list[str] = []
    tab.on("console", lambda message: said.append(message.text) if message.type in {"error", "warning"} else None)
    tab.on("pageerror", lambda error: said.append(str(error)))
    tab.on("dialog", lambda dialog: said.append(dialog.message))
    tab.on("request", lambda request: asked.append(request.url))
    tab.goto((alone / "light.html").as_uri())
    yield tab
    assert said == []
    assert all(url.startswith(alone.as_uri()) for url in asked)


def _wait_for_count(tab: "sync_api.Page", words: str) -> None:
    sync_api.expect(tab.locator(".hb-search__count")).to_have_text(re.compile(words))


def _search(tab: "sync_api.Page", query: str) -> None:
    tab.locator("#hb-query").focus()
    tab.keyboard.type(query)
    _wait_for_count(tab, "found$")
    sync_api.expect(tab.locator("[role=listbox]")).to_have_attribute("aria-busy", "false")


def _ids(tab: "sync_api.Page") -> list[str]:
    return tab.locator(".hb-hit__id").all_text_contents()


@pytest.mark.parametrize(
    ("query", "in_order"),
    [
        ("menthol", "3 1 4 5 6 2 8 7 page"),  # about it, newest first; used; retired; longer names; mentions; pages
        ("carvone", "9"),
        ("(S)-carvone", "9"),
        ("anisole menthol", "7"),
        ("menthol oxide", "8"),
        ("menthol made", "1"),  # the first words of the first title
        ("SN1", "7 8 9 6 4 5 3 1 2"),
        ("ns-0000002", "2"),
        ("mentol oxide", "8"),
    ],
)
def test_the_nearer_reading_comes_first(opened: "sync_api.Page", query: str, in_order: str) -> None:
    _search(opened, query)
    assert [each.removeprefix("NS000000") for each in _ids(opened)] == in_order.split()


def test_each_hit_says_why(opened: "sync_api.Page") -> None:
    _search(opened, "menthol")
    said = dict(zip(_ids(opened), opened.locator(".hb-hit__why").all_text_contents(), strict=True))
    assert said["NS0000004"] == "product B, by-product: menthol"
    assert said["NS0000006"] == "solvent: menthol"
    assert said["NS0000007"] == "mentioned in the title"
    assert said["NS0000008"] == "substrate, part of the name: menthol oxide"
    assert opened.locator(".hb-hit", has_text="NS0000002").locator(".hb-hit__status").text_content() == "withdrawn"


def test_a_page_of_text_is_not_put_right_word_by_word(opened: "sync_api.Page") -> None:
    _search(opened, "mentohl oxide " * 6)
    assert opened.locator(".hb-search__count").text_content() == "Nothing found"


def test_a_slip_is_said_to_be_one(opened: "sync_api.Page") -> None:
    _search(opened, "mentohl oxide")
    assert opened.locator(".hb-search__count").text_content() == (
        "Nothing is spelled like that; for “menthol oxide”: 1 found"
    )


def test_nothing_of_a_record_becomes_html(opened: "sync_api.Page") -> None:
    _search(opened, "carvone")
    assert opened.locator(".hb-hit__title").text_content() == EVIL
    assert opened.locator(".hb-search img").count() == 0


def test_the_index_is_fetched_when_it_is_first_wanted(opened: "sync_api.Page") -> None:
    assert opened.evaluate("globalThis.handbookSearch") is None
    _search(opened, "menthol")
    assert opened.evaluate("handbookSearch.format") == 1


def test_long_texts_are_looked_in_once_they_are_there(opened: "sync_api.Page") -> None:
    opened.locator("#hb-query").focus()
    opened.keyboard.type("Celite")
    _wait_for_count(opened, "^1 found$")
    assert opened.locator(".hb-hit__why").all_text_contents() == ["mentioned in the notes"]


def test_enter_waits_for_the_index(tab: "sync_api.Page", alone: Path) -> None:
    with served(alone) as address:
        held: list[sync_api.Route] = []

        def hold(route: "sync_api.Route") -> None:
            held.append(route)

        tab.route("**/search-data.js", hold)
        tab.goto(f"{address}light.html")
        tab.keyboard.press("/")
        tab.keyboard.type("NS0000003")
        assert tab.locator(".hb-search__count").text_content() == "Reading the index …"
        tab.keyboard.press("Enter")
        held[0].continue_()
        tab.wait_for_url("**/e/NS0000003/")


def test_a_missing_index_is_said_and_asked_for_again(tab: "sync_api.Page", alone: Path) -> None:
    with served(alone) as address:
        tab.route("**/search-data.js", lambda route: route.abort())
        tab.goto(f"{address}light.html")
        tab.locator("#hb-query").focus()
        _wait_for_count(tab, "could not be read")
        tab.unroute("**/search-data.js")
        _search(tab, "menthol oxide")
        assert _ids(tab) == ["NS0000008"]


def test_keys_and_what_assistive_technology_hears(opened: "sync_api.Page") -> None:
    box = opened.locator("#hb-query")
    opened.locator("#link").focus()
    opened.keyboard.press("/")
    assert box.evaluate("box => box === document.activeElement")
    opened.keyboard.type("menthol")
    _wait_for_count(opened, "found")
    assert box.get_attribute("aria-expanded") == "true"
    assert opened.locator("[role=status]").text_content() == "9 found"
    hits = opened.locator("[role=option]")
    marked = []
    for key in ("ArrowDown", "ArrowDown", "ArrowUp", "ArrowUp", "ArrowUp"):  # the box lies between last and first
        opened.keyboard.press(key)
        marked.append(box.get_attribute("aria-activedescendant"))
        chosen = [i for i in range(hits.count()) if hits.nth(i).get_attribute("aria-selected") == "true"]
        assert [f"hb-hit-{i}" for i in chosen] == ([marked[-1]] if marked[-1] else [])
    assert marked == ["hb-hit-0", "hb-hit-1", "hb-hit-0", None, "hb-hit-8"]
    opened.keyboard.press("Escape")
    assert opened.locator("#hb-hits").is_hidden()
    assert box.get_attribute("aria-expanded") == "false"
    assert opened.evaluate("document.activeElement.id") == "link"


def test_one_key_opens_the_box_unless_one_types_or_switched_it_off(opened: "sync_api.Page") -> None:
    opened.locator("#notes").focus()
    opened.keyboard.type("s/")
    assert opened.locator("#notes").input_value() == "s/"
    opened.locator("#link").focus()
    opened.keyboard.press("s")
    opened.keyboard.press("Tab")
    opened.keyboard.press("Enter")
    assert opened.locator(".hb-search__keys").text_content() == "Keys / and s open the search: off"
    opened.locator("#link").focus()
    opened.keyboard.press("/")
    assert opened.evaluate("document.activeElement.id") == "link"
    opened.evaluate("localStorage.clear()")


@pytest.mark.parametrize("paper", ["light", "dark"])
@pytest.mark.parametrize("width", [360, 1280])
def test_hits_can_be_read_and_pressed(tab: "sync_api.Page", alone: Path, paper: str, width: int) -> None:
    tab.set_viewport_size({"width": width, "height": 700})
    tab.goto((alone / f"{paper}.html").as_uri())
    _search(tab, "menthol")
    boxes = [hit.bounding_box() for hit in tab.locator(".hb-hit").all()]
    assert all(box and box["height"] >= 44 and box["x"] >= 0 and box["x"] + box["width"] <= width for box in boxes)
    assert tab.evaluate("document.documentElement.scrollWidth <= document.documentElement.clientWidth")
    for part in ("title", "id", "why", "status"):
        assert _contrast(tab, f".hb-hit__{part}") >= 4.5, part
    tab.locator(".hb-hit").first.click()
    tab.wait_for_url("**/e/NS0000003/index.html")


def _contrast(tab: "sync_api.Page", selector: str) -> float:
    """Return the contrast of a text with the panel behind it, as WCAG defines it."""
    text, panel = (
        tab.locator(each).first.evaluate(f"e => getComputedStyle(e).{style}")
        for each, style in ((selector, "color"), (".hb-search__panel", "backgroundColor"))
    )
    lighter, darker = sorted((_luminance(text), _luminance(panel)), reverse=True)
    return (lighter + 0.05) / (darker + 0.05)


def _luminance(colour: str) -> float:
    shares = [int(value) / 255 for value in re.findall(r"\d+", colour)[:3]]
    red, green, blue = (s / 12.92 if s <= 0.04045 else ((s + 0.055) / 1.055) ** 2.4 for s in shares)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


# --- formulae and SMILES --------------------------------------------------------------------------------------


def test_formulas_and_smiles_are_read_as_the_toolkit_reads_them(opened: "sync_api.Page", demo: Book[Portrait]) -> None:
    _search(opened, "menthol")
    odd = map(parse_smiles, ["c1cc[te]c1", "c1cc[se]c1", "C%10CC%10", "[NH3+][C@@H](C)C([O-])=O", "F/C=C/[Si](C)(C)C"])
    drawn = {s.smiles: s for s in (*odd, *(s for entry in demo.entries for s in _asked(entry).structures))}
    asked = json.dumps([[s.smiles, s.flat_smiles, s.typed] for s in drawn.values()])
    read = opened.evaluate(f"{asked}.map(forms => forms.map(handbookChemistry.outline))")
    for structure, forms in zip(drawn.values(), read, strict=True):
        assert {form["formula"] for form in forms} == {structure.formula}, structure
        assert len({form["outline"] for form in forms}) == 1, structure
    outlines = {
        forms[0]["outline"]: structure.flat_smiles for structure, forms in zip(drawn.values(), read, strict=True)
    }
    assert len(outlines) == len(set(outlines.values()))
