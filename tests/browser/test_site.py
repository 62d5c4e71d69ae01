"""The built site in a browser, at desk and phone width and on both papers."""

import re
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path

import pytest

from tests.browser.built import ROOT, build, write_book
from tests.browser.chromium import ARGUMENTS, CHROMIUM, served

sync_api = pytest.importorskip("playwright.sync_api")
axe_api = pytest.importorskip("axe_playwright_python.sync_playwright")

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(CHROMIUM is None, reason="no chromium on this machine"),
]

# The success criteria of WCAG 2.2 at levels A and AA, as axe-core tags the rules that test them.
WCAG = {"runOnly": {"type": "tag", "values": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"]}}
TEMPLATES = {
    "front": "",
    "entry": "e/NSXBTQ65D/",
    "entry-contradicted": "e/NSFZPQCJ2/",
    "entry-explained": "e/NS8CF6RVD/",
    "entry-failed": "e/NSM8V017N/",
    "entry-in-a-sequence": "e/NSQSKPDRW/",
    "entry-superseded": "e/NSN2AVC1Z/",
    "entry-withdrawn": "e/NSED6BHKC/",
    "list-of-all": "lists/",
    "list-of-contradictions": "lists/contradictions/",
    "list-of-sequences": "lists/sequences/",
    "list-of-values": "lists/class/",
    "list": "lists/solvent/ethanol/",
    "rules": "rules/",
    "rule-gate": "rules/sn2-closed-tertiary/",
    "rule-check": "rules/yield-above-100/",
    "cautions": "cautions/",
    "how-to-add": "how-to-add/",
    "form": "how-to-add/form/",
    "how-to-cite": "how-to-cite/",
    "own-page": "fume-hoods/",
    "missing": "404.html",
}
OWN_PAGE = """\
# Fume hoods

!!! note
    Hood 3 is for azides.

| hood | for |
|---|---|
| 3 | azides |

```sh
handbook check
```
"""
SUB_PATH = "group/book/"
COPIED = {
    "Identifier": re.compile(r"NSXBTQ65D"),
    "Citation": re.compile(r".*entry NSXBTQ65D, revision 1, digest [0-9a-f]{12}, .*/e/NSXBTQ65D/"),
    "Address": re.compile(r"https://handbook\.example/group/book/e/NSXBTQ65D/"),
    "Amounts": re.compile(r"Substance\tRole\t.*\n\(S\)-4-phenylbutan-2-ol\tsubstrate\t1\.00\t.*", re.DOTALL),
    "InChIKey of sodium azide": re.compile(r"[A-Z]{14}-[A-Z]{10}-[A-Z]"),
    "SMILES of sodium azide": re.compile(re.escape("[Na+].[N-]=[N+]=[N-]")),
}


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build the demonstration book and a page of a group's own, in a folder below which it is served at a sub-path."""
    entries = ROOT / "entries"
    texts = [(path.relative_to(entries).as_posix(), path.read_text("utf-8")) for path in entries.rglob("NS*.yml")]
    config = write_book(tmp_path_factory.mktemp("book"), [*texts, ("fume-hoods.md", OWN_PAGE)])
    config.write_text(config.read_text("utf-8") + "markdown_extensions: [admonition, tables, fenced_code]\n", "utf-8")
    built = build(config)
    assert built.code == 0, built.out
    folder = tmp_path_factory.mktemp("served") / SUB_PATH
    folder.parent.mkdir()
    return built.site.rename(folder)


@pytest.fixture(scope="module")
def address(site: Path) -> Iterator[str]:
    """Serve the site below its sub-path, from this machine."""
    with served(site.parents[1]) as address:
        yield address + SUB_PATH


Opener = Callable[..., "sync_api.Page"]


@pytest.fixture(scope="module")
def opener() -> Iterator[Opener]:
    """Open tabs, each with a memory of its own."""
    with sync_api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=ARGUMENTS)
        yield lambda **options: browser.new_context(**options).new_page()
        browser.close()


@pytest.fixture(scope="module", params=["light-1280", "light-360", "dark-1280", "dark-360"])
def looks(request: pytest.FixtureRequest) -> str:
    """Name a paper and a width."""
    return str(request.param)


@pytest.fixture(scope="module")
def tab(looks: str, opener: Opener) -> Iterator["sync_api.Page"]:
    scheme, width = looks.split("-")
    page = opener(viewport={"width": int(width), "height": 800}, color_scheme=scheme)
    yield page
    page.context.close()


@pytest.fixture
def desk(opener: Opener) -> Iterator["sync_api.Page"]:
    page = opener(viewport={"width": 1280, "height": 800}, permissions=["clipboard-read", "clipboard-write"])
    yield page
    page.context.close()


@pytest.mark.parametrize("name", TEMPLATES)
def test_every_template_is_quiet_local_accessible_and_fits(
    name: str, looks: str, tab: "sync_api.Page", address: str, request: pytest.FixtureRequest
) -> None:
    _visit(tab, address, [TEMPLATES[name]])
    violations = axe_api.Axe().run(tab, options=WCAG).response["violations"]
    assert [(v["id"], [node["html"] for node in v["nodes"]]) for v in violations] == []
    folder = request.config.getoption("--screenshots")
    if folder is not None:
        Path(folder).mkdir(parents=True, exist_ok=True)
        tab.screenshot(path=f"{folder}/{name}-{looks}.png", full_page=True)


@pytest.mark.slow
def test_every_entry_fits(tab: "sync_api.Page", site: Path, address: str) -> None:
    _visit(tab, address, sorted(f"e/{path.parent.name}/" for path in site.glob("e/*/index.html")))


def _visit(tab: "sync_api.Page", address: str, pages: Sequence[str]) -> None:
    """Open pages; none may complain, call another host, scroll sideways or use an id twice."""
    said: list[str] = []
    asked: list[str] = []

    def hear(message: "sync_api.ConsoleMessage") -> None:
        if message.type in {"error", "warning"}:
            said.append(message.text)

    def note(made: "sync_api.Request") -> None:
        asked.append(made.url)

    tab.on("console", hear)
    tab.on("request", note)
    try:
        for path in pages:
            tab.goto(address + path)
            assert not said, f"{path} says {said}"
            wide = tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
            assert wide <= 0, f"{path} scrolls sideways by {wide} px"
            twice = tab.evaluate(
                "[...document.querySelectorAll('[id]')].map(e => e.id).filter((id, at, all) => all.indexOf(id) !== at)"
            )
            assert twice == [], f"{path} has ids twice"
    finally:
        tab.remove_listener("console", hear)
        tab.remove_listener("request", note)
    assert asked
    assert [url for url in asked if not url.startswith((address, "data:"))] == []


def test_the_paper_follows_the_system(tab: "sync_api.Page", looks: str, address: str) -> None:
    tab.goto(address)
    paper = tab.evaluate("getComputedStyle(document.querySelector('main')).backgroundColor")
    assert paper == ("rgb(27, 30, 36)" if looks.startswith("dark") else "rgb(255, 255, 255)")


def test_a_chosen_paper_stays_until_the_system_is_followed_again(desk: "sync_api.Page", address: str) -> None:
    desk.goto(address)
    seen = []
    for _ in range(3):
        desk.locator("button.hb-paper").click()
        desk.reload()
        seen.append(desk.evaluate("document.documentElement.dataset.paper ?? 'system'"))
    assert seen == ["light", "dark", "system"]


def test_the_form_is_at_work_below_a_sub_path(desk: "sync_api.Page", address: str) -> None:
    desk.goto(address + "how-to-add/form/")
    desk.get_by_label("Temperature").first.fill("60")
    desk.get_by_label("Temperature").first.blur()
    assert desk.get_by_text("The unit is missing: write 60 °C or 333 K.").first.is_visible()
    new_file = desk.get_by_role("link", name="open a new file there")
    assert new_file.get_attribute("href") == "https://forge.example/book/new/main/entries/"


def test_one_scheme_is_shown_and_named(tab: "sync_api.Page", address: str) -> None:
    tab.goto(address + "e/NSXBTQ65D/")
    shown = tab.locator("figure.hb-scheme svg.hb-drawing:visible")
    assert shown.count() == 1
    name = shown.locator("title").text_content()
    assert name is not None
    assert "gives (R)-(3-azidobutyl)benzene" in name


def test_cautions_and_conditions_are_in_the_first_screen(tab: "sync_api.Page", looks: str, address: str) -> None:
    tab.goto(address + "e/NSXBTQ65D/")
    height, is_phone = tab.evaluate("innerHeight"), looks.endswith("360")
    cautions = ".hb-cautions" if is_phone else ".hb-card a[href='#cautions']"
    # On a phone every hazard is written out before the conditions, which may then begin half a screen lower.
    for part, bottom in ((cautions, height), (".hb-strip", height * (1.5 if is_phone else 1))):
        box = tab.locator(part).bounding_box()
        assert box is not None
        assert box["y"] < bottom, f"{part} begins too low"
    cut = "ps => ps.filter((p) => p.scrollWidth > p.clientWidth + 1).map((p) => p.textContent)"
    assert tab.locator(".hb-cautions > p").evaluate_all(cut) == []


def test_an_entry_is_found_opened_and_cited_by_keyboard_alone(desk: "sync_api.Page", address: str) -> None:
    desk.goto(address)
    desk.keyboard.press("/")
    desk.keyboard.type("(R)-(3-azidobutyl)benzene")
    desk.locator("#hb-hits a").first.wait_for()
    desk.keyboard.press("Enter")
    desk.wait_for_url("**/e/*/")
    wanted = desk.locator("button[data-what=Citation]").last
    for _ in range(60):
        if wanted.evaluate("button => button === document.activeElement"):
            break
        desk.keyboard.press("Tab")
    desk.keyboard.press("Enter")
    desk.locator("[role=status]", has_text="Citation copied").wait_for(state="attached")
    assert desk.evaluate("navigator.clipboard.readText()") == desk.locator(".hb-citation").text_content()


@pytest.mark.parametrize("what", COPIED)
def test_a_button_copies_what_the_page_shows(what: str, desk: "sync_api.Page", address: str) -> None:
    desk.goto(address + "e/NSXBTQ65D/")
    desk.locator(f'button[data-what="{what}"]').first.click()
    desk.locator("[role=status]", has_text=f"{what} copied").wait_for(state="attached")
    assert COPIED[what].fullmatch(desk.evaluate("navigator.clipboard.readText()"))


def test_copying_needs_no_secure_address(desk: "sync_api.Page", address: str) -> None:
    desk.add_init_script("Object.defineProperty(navigator, 'clipboard', { value: undefined })")
    desk.goto(address + "e/NSXBTQ65D/")
    desk.evaluate("document.addEventListener('copy', () => { window.taken = document.activeElement.value; })")
    desk.locator("button[data-what=Identifier]").first.click()
    desk.locator("[role=status]", has_text="Identifier copied").wait_for(state="attached")
    assert desk.evaluate("window.taken") == "NSXBTQ65D"


def test_a_wrong_address_says_which_entry_is_missing(desk: "sync_api.Page", address: str) -> None:
    page = (desk.request.get(f"{address}404.html")).text()
    desk.route("**/e/NSAAAAAA0/", lambda route: route.fulfill(status=404, content_type="text/html", body=page))
    desk.goto(f"{address}e/NSAAAAAA0/")
    assert "NSAAAAAA0 is not in this book" in str(desk.locator(".hb-missing").text_content())
    assert desk.locator(".hb-missing").is_visible()


def test_a_page_can_be_read_without_scripts(opener: Opener, address: str) -> None:
    page = opener(java_script_enabled=False)
    page.goto(address + "e/NSXBTQ65D/")
    assert page.locator("h1").is_visible()
    assert page.locator("figure.hb-scheme svg.hb-drawing:visible").count() == 1
    assert page.locator("button:visible").count() == 0
    page.context.close()


def test_pages_opened_from_a_folder_lead_on(desk: "sync_api.Page", site: Path) -> None:
    said: list[str] = []
    desk.on("console", lambda message: said.append(message.text))
    desk.goto((site / "index.html").as_uri())
    desk.locator(".hb-row__title a").first.click()
    sync_api.expect(desk.locator(".hb-card .hb-id")).to_be_visible()
    assert desk.url.endswith("/index.html")
    assert said == []


def test_a_printed_page_says_which_revision_it_is(tab: "sync_api.Page", address: str) -> None:
    tab.goto(address + "e/NSXBTQ65D/")
    tab.emulate_media(media="print")
    assert not tab.locator(".hb-bar").is_visible()
    printed = tab.locator(".hb-printed")
    assert printed.is_visible()
    assert str(printed.text_content()).startswith("NSXBTQ65D · revision 1 · ")
    tab.emulate_media(media="screen")
