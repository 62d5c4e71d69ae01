"""The site as MkDocs builds it: strict, safe in the parts we do not write, and the same bytes every time."""

import re
from pathlib import Path

import pytest

from builder.chemistry.inks import palette_css
from tests.browser.built import RECORDS, ROOT, Build, build, files_of, good_texts, write_book
from tests.publish.handmade import Markup

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
    loads = {"script": "src", "img": "src", "link": "href", "iframe": "src", "source": "src"}
    for path in built.site.rglob("*.html"):
        for tag, attributes in Markup(path.read_text("utf-8")).elements:
            if attributes.get("rel") == "canonical":  # names the page's own address, and is never fetched
                continue
            assert not re.match(r"(https?:)?//", attributes.get(loads.get(tag, ""), "")), (path, attributes)


def test_records_reach_the_site_only_as_downloads(built: Build) -> None:
    yaml = sorted(path.relative_to(built.site).as_posix() for path in built.site.rglob("*.yml"))
    assert yaml == [f"e/{name}/{name}.yml" for name in RECORDS]


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


def test_the_style_sheet_has_the_inks_of_the_drawings() -> None:
    style = (ROOT / "site_overrides" / "assets" / "handbook.css").read_text("utf-8")
    light, dark = style.split('[data-md-color-scheme="slate"]', 1)
    assert palette_css() in light
    assert palette_css(dark=True) in dark
