"""The site as MkDocs builds it: strict, safe in the parts we do not write, and the same bytes every time."""

from pathlib import Path

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
    assert 'rel="icon" href="assets/mark.svg"' in (built.site / "index.html").read_text("utf-8")


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
