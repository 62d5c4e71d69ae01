"""The built site in a browser, at desk and phone width and in both palettes."""

from collections.abc import Iterator, Sequence
from pathlib import Path

import pytest

from tests.browser.built import ROOT, build, good_texts, write_book
from tests.browser.chromium import ARGUMENTS, CHROMIUM, served

sync_api = pytest.importorskip("playwright.sync_api")

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(CHROMIUM is None, reason="no chromium on this machine"),
]

PAGES = [
    "",
    "e/NSC0W7N51/",
    "e/NS7K3QFMC/",
    "lists/",
    "lists/class/",
    "lists/solvent/ethanol/",
    "rules/",
    "rules/sn1-closed-methyl/",
    "how-to-add/",
    "how-to-cite/",
    "404.html",
]
SUB_PATH = "group/book/"


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build the site, in a folder below which it may be served at a sub-path."""
    built = build(write_book(tmp_path_factory.mktemp("book"), good_texts()))
    assert built.code == 0, built.out
    folder = tmp_path_factory.mktemp("served") / SUB_PATH
    folder.parent.mkdir()
    return built.site.rename(folder)


@pytest.fixture(scope="module")
def address(site: Path) -> Iterator[str]:
    """Serve the site below its sub-path, from this machine."""
    with served(site.parents[1]) as address:
        yield address + SUB_PATH


@pytest.fixture(scope="module", params=["light-1280", "light-360", "dark-1280", "dark-360"])
def tab(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator["sync_api.Page"]:
    scheme, width = request.param.split("-")
    with sync_api.sync_playwright() as playwright:
        context = playwright.chromium.launch_persistent_context(
            tmp_path_factory.mktemp("user"),
            executable_path=CHROMIUM,
            args=ARGUMENTS,
            viewport={"width": int(width), "height": 800},
            color_scheme=scheme,
        )
        yield context.new_page()
        context.close()


def test_pages_are_quiet_local_and_fit(tab: "sync_api.Page", address: str) -> None:
    _visit(tab, address, PAGES)


@pytest.mark.slow
def test_every_entry_of_the_demonstration_book_fits(
    tab: "sync_api.Page", tmp_path_factory: pytest.TempPathFactory
) -> None:
    folder = tmp_path_factory.mktemp("demo")
    entries = ROOT / "entries"
    texts = [(path.relative_to(entries).as_posix(), path.read_text("utf-8")) for path in entries.rglob("NS*.yml")]
    built = build(write_book(folder, texts))
    assert built.code == 0, built.out
    pages = sorted(path.parent.relative_to(built.site).as_posix() + "/" for path in built.site.glob("e/*/index.html"))
    with served(built.site) as address:
        _visit(tab, address, pages)


def _visit(tab: "sync_api.Page", address: str, pages: Sequence[str]) -> None:
    """Open pages; none may complain, call another host, scroll sideways or use an id twice."""
    said: list[str] = []
    asked: list[str] = []
    tab.on("console", lambda message: said.append(message.text) if message.type in {"error", "warning"} else None)
    tab.on("pageerror", lambda error: said.append(str(error)))
    tab.on("request", lambda request: asked.append(request.url))
    for path in pages:
        tab.goto(address + path)
        assert not said, f"{path} says {said}"
        wide = tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
        assert wide <= 0, f"{path} scrolls sideways by {wide} px"
        twice = tab.evaluate(
            "[...document.querySelectorAll('[id]')].map(e => e.id).filter((id, at, all) => all.indexOf(id) !== at)"
        )
        assert twice == [], f"{path} has ids twice"
    outside = [url for url in asked if not url.startswith((address, "data:", "blob:"))]
    assert outside == []


def test_the_palette_follows_the_system(tab: "sync_api.Page", address: str) -> None:
    tab.goto(address)
    dark = tab.evaluate("matchMedia('(prefers-color-scheme: dark)').matches")
    assert tab.evaluate("getComputedStyle(document.body).backgroundColor") == (
        "rgb(27, 30, 36)" if dark else "rgb(255, 255, 255)"
    )


def test_one_scheme_is_shown_and_named(tab: "sync_api.Page", address: str) -> None:
    tab.goto(address + "e/NSC0W7N51/")
    shown = tab.locator("svg.hb-drawing:visible")
    assert shown.count() == 1
    name = shown.locator("title").text_content()
    assert name is not None
    assert "gives (R)-2-azidooctane" in name


def test_a_page_opened_from_a_folder_leads_on(tab: "sync_api.Page", site: Path) -> None:
    tab.goto((site / "index.html").as_uri())
    tab.locator(".hb-row__title a", has_text="Neopentyl bromide").first.click()
    assert tab.locator("h1").text_content() == "Neopentyl bromide and sodium azide in aqueous ethanol, no reaction"


def test_a_printed_page_says_which_revision_it_is(tab: "sync_api.Page", address: str) -> None:
    tab.goto(address + "e/NSC0W7N51/")
    tab.emulate_media(media="print")
    assert not tab.locator(".md-header").is_visible()
    assert tab.locator(".hb-printed").is_visible()
    printed = tab.locator(".hb-printed").text_content()
    assert printed is not None
    assert printed.startswith("NSC0W7N51 · revision 1 · ")
    tab.emulate_media(media="screen")
