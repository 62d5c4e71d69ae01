"""The site as MkDocs builds it: strict, safe in the parts we do not write, and the same bytes every time."""

import re
from pathlib import Path
from urllib.parse import unquote, urlsplit

import pytest

from builder.chemistry.inks import palette_css
from builder.publish.frame import CONTENT_POLICY, content_policy
from tests.browser.built import RECORDS, ROOT, Build, build, files_of, good_texts, write_book
from tests.publish.handmade import Markup, asked_of_other_hosts

EVIL = '"><imgx src=x onerror=alert(1)>'
HOSTILE_FOLDER = 'a" onclick="alert(1)'


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Build:
    title = "title: One-pot mesylation and azidation of (S)-octan-2-ol"
    texts = dict(good_texts())
    text = texts.pop("NSC0W7N51.yml").replace(title, f"title: '{EVIL}'")
    texts[f"{HOSTILE_FOLDER}/NSC0W7N51.yml"] = text + f"take_away: '</title>{EVIL}'\n"
    return build(write_book(tmp_path_factory.mktemp("book"), texts.items()))


def test_the_strict_build_is_clean(built: Build) -> None:
    assert built.code == 0, built.out
    assert "WARNING" not in built.out


def test_nothing_of_a_record_is_html_in_the_frame_either(built: Build) -> None:
    page = Markup((built.site / "e/NSC0W7N51/index.html").read_text("utf-8"))
    assert "imgx" not in {tag for tag, _ in page.elements}
    assert "onclick" not in {name for _, attributes in page.elements for name in attributes}
    assert "bx" not in {tag for tag, _ in Markup((built.site / "404.html").read_text("utf-8")).elements}
    edit = next(attributes["href"] for tag, attributes in page.elements if attributes.get("rel") == "edit")
    assert edit == "https://forge.example/book/edit/main/entries/a%22%20onclick%3D%22alert%281%29/NSC0W7N51.yml"


def test_no_page_asks_another_host_for_anything(built: Build) -> None:
    assert asked_of_other_hosts(built.site) == []


def test_records_reach_the_site_only_as_downloads(built: Build) -> None:
    yaml = sorted(path.relative_to(built.site).as_posix() for path in built.site.rglob("*.yml"))
    assert yaml == [f"e/{name}/{name}.yml" for name in RECORDS]


def test_a_folder_of_the_groups_own_goes_before_our_theme(tmp_path: Path) -> None:
    config = write_book(tmp_path, good_texts())
    text = config.read_text("utf-8")
    config.write_text(text.replace("  name: material\n", "  name: material\n  custom_dir: own\n", 1), "utf-8")
    own = tmp_path / "own" / "assets" / "mark.svg"
    own.parent.mkdir(parents=True)
    own.write_text("<svg/>", "utf-8")
    built = build(config)
    assert built.code == 0, built.out
    ours = ROOT / "site_overrides" / "assets" / "handbook.css"
    assert (built.site / "assets" / "mark.svg").read_text("utf-8") == "<svg/>"
    assert (built.site / "assets" / "handbook.css").read_bytes() == ours.read_bytes()
    assert 'rel="icon" href="./assets/mark.svg"' in (built.site / "index.html").read_text("utf-8")


@pytest.fixture(scope="module")
def own(tmp_path_factory: pytest.TempPathFactory) -> Build:
    """Build a book with pages and files of the group's own."""
    files = {
        "README.md": "# Our front page\n",
        "lists.md": "# Our lists\n",
        "hoods.md": "# Hoods & <b>benches</b>\n",
        "quoted.md": f"---\ntitle: '{EVIL}'\ndescription: '{EVIL}'\n---\nNo heading.\n",
        "assets/images/logo.svg": "<svg/>",
        "own.css": "p {}",
        "notes.txt": "not for readers",
    }
    config = write_book(tmp_path_factory.mktemp("own"), [*good_texts(), *files.items()])
    settings = config.parent / "entries" / "handbook.yml"
    odd = settings.read_text("utf-8").replace("book/edit/", """book/?a=1&b="'<edit>/""")
    settings.write_text(f"{odd}logo: assets/images/logo.svg\n", "utf-8")
    config.write_text(config.read_text("utf-8") + "extra_css: [own.css]\n", "utf-8")
    return build(config)


def _head(site: Path, page: str) -> dict[str, str]:
    """Return title, description, edit address and main heading of a page, as a browser reads them."""
    markup = Markup((site / page).read_text("utf-8"))
    tags = dict(markup.elements)
    named = {a.get("name") or a.get("rel"): a.get("content") or a.get("href") for _, a in markup.elements}
    assert "imgx" not in tags
    return {"title": markup.texts[0], "description": named.get("description", ""), "edit": named.get("edit", "")}


def test_pages_of_the_groups_own_go_before_ours(own: Build) -> None:
    assert own.code == 0, own.out
    assert "WARNING" not in own.out
    assert "Our front page" in (own.site / "index.html").read_text("utf-8")
    assert "Our lists" in (own.site / "lists/index.html").read_text("utf-8")


def test_titles_of_the_groups_own_are_text(own: Build) -> None:
    book = "A book <bx>for</bx> tests"
    assert _head(own.site, "hoods/index.html")["title"] == f"Hoods & benches · {book}"
    quoted = _head(own.site, "quoted/index.html")
    assert quoted["title"] == f'"> · {book}'  # without what looks like an element
    assert quoted["description"] == '">'
    assert quoted["edit"] == """https://forge.example/book/?a=1&b="'<edit>/main/entries/quoted.md"""
    offered = (own.site / "assets" / "search-data.js").read_text("utf-8")
    assert '"Hoods & benches"' in offered


def test_of_the_groups_files_those_are_published_that_the_frame_shows(own: Build) -> None:
    published = files_of(own.site)
    assert {"assets/images/logo.svg", "own.css"} <= published.keys()
    assert "notes.txt" not in published
    assert [name for name in published if name.startswith(("assets/images/", "assets/javascripts/"))] == [
        "assets/images/logo.svg"
    ]


def _menu(site: Path, page: str) -> list[tuple[str, bool]]:
    markup = Markup((site / page).read_text("utf-8"))
    start = next(i for i, (tag, a) in enumerate(markup.elements) if a.get("class") == "hb-menu")
    end = next(i for i, (tag, _) in enumerate(markup.elements) if tag == "form")
    return [(a["href"], "aria-current" in a) for tag, a in markup.elements[start:end] if tag == "a"]


@pytest.fixture(scope="module")
def by_file(tmp_path_factory: pytest.TempPathFactory) -> Build:
    """Build a book whose addresses end in index.html."""
    config = write_book(tmp_path_factory.mktemp("by-file"), good_texts())
    config.write_text(config.read_text("utf-8") + "use_directory_urls: false\n", "utf-8")
    return build(config)


@pytest.mark.parametrize(("page", "marked"), [("e/NSC0W7N51", "lists"), ("rules/yield-above-100", "rules")])
def test_the_menu_marks_where_a_page_belongs(built: Build, by_file: Build, page: str, marked: str) -> None:
    for site, end in ((built.site, ""), (by_file.site, "index.html")):
        here = [href for href, is_here in _menu(site, f"{page}/index.html") if is_here]
        assert here == [f"../../{marked}/{end}"]


def test_every_link_leads_to_a_page_or_file(built: Build, own: Build, by_file: Build) -> None:
    for site in (built.site, own.site, by_file.site):
        pages = [path for path in site.rglob("*.html") if path.name != "404.html"]
        assert pages
        for path in pages:
            elements = Markup(path.read_text("utf-8")).elements
            for address in (a[key] for _, a in elements for key in ("href", "src", "action") if key in a):
                target = path.parent / unquote(urlsplit(address).path)
                is_ours = not urlsplit(address).scheme
                assert not is_ours or (target / "index.html").is_file() or target.is_file(), f"{path}: {address}"


def test_the_page_for_wrong_addresses_leads_back(built: Build) -> None:
    markup = Markup((built.site / "404.html").read_text("utf-8"))
    local = [address for key in ("href", "src", "action", "data-root") for address in markup.values(key)]
    assert "/group/book/lists/" in local
    assert [each for each in local if not re.match(r"/group/book/(?!/)|#", each)] == []


def test_a_menu_of_the_groups_own(tmp_path: Path) -> None:
    config = write_book(tmp_path, good_texts())
    nav = "nav:\n  - Start: index.md\n  - Later: []\n  - Wiki & more: https://wiki.example/?a=1&copy=2\n"
    config.write_text(config.read_text("utf-8") + nav, "utf-8")
    built = build(config)
    assert built.code == 0, built.out
    assert _menu(built.site, "index.html") == [("./", True), ("https://wiki.example/?a=1&copy=2", False)]


def test_an_error_stops_the_build_and_leaves_the_last_site(tmp_path: Path) -> None:
    texts = dict(good_texts())
    config = write_book(tmp_path, texts.items())
    (tmp_path / "site").mkdir()
    (tmp_path / "site" / "index.html").write_text("the last good site", "utf-8")
    wrong = texts["NS2H8WDRW.yml"].replace("temperature: 78 °C", "temperature: 78")
    (tmp_path / "entries" / "NS2H8WDRW.yml").write_text(wrong, "utf-8")
    failed = build(config)
    assert failed.code == 1
    assert "entries/NS2H8WDRW.yml:25:18: error quantity-without-unit" in failed.out
    assert "Traceback" not in failed.out
    assert files_of(failed.site) == {"index.html": b"the last good site"}


def test_the_same_book_gives_the_same_bytes(tmp_path: Path) -> None:
    one, two = tmp_path / "one", tmp_path / "another" / "place"
    one.mkdir()
    two.mkdir(parents=True)
    first, second = (
        build(write_book(one, good_texts()), PYTHONHASHSEED="1"),
        build(write_book(two, reversed(good_texts())), PYTHONHASHSEED="2"),
    )
    assert first.code == second.code == 0
    assert files_of(first.site) == files_of(second.site)


def test_the_inks_of_the_drawings_reach_the_pages(built: Build) -> None:
    assert palette_css() in (built.site / "assets" / "inks.css").read_text("utf-8")
    for path in built.site.rglob("*.html"):
        styles = [a["href"] for tag, a in Markup(path.read_text("utf-8")).elements if a.get("rel") == "stylesheet"]
        assert any(style.endswith("assets/inks.css") for style in styles), path


def test_every_page_carries_the_policy_and_nothing_runs_inline(built: Build) -> None:
    for path in built.site.rglob("*.html"):
        elements = Markup(path.read_text("utf-8")).elements
        policies = [a["content"] for _, a in elements if a.get("http-equiv") == "Content-Security-Policy"]
        assert policies == [content_policy()], path
        scripts = [a for tag, a in elements if tag == "script"]
        assert scripts, path
        assert all(a.get("src") for a in scripts), path
        assert not [a for tag, a in elements if tag == "style" or "style" in a or any(n.startswith("on") for n in a)], (
            path
        )


def test_the_policy_names_no_other_host_and_allows_nothing_inline() -> None:
    sources = {source for sources in CONTENT_POLICY.values() for source in sources.split()}
    assert sources == {"'none'", "'self'", "data:"}
    assert CONTENT_POLICY["default-src"] == CONTENT_POLICY["base-uri"] == "'none'"
