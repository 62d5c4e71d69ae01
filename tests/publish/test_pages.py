"""Every page of a small book: sound HTML, live links, no bare numbers, nothing from a record taken as HTML."""

import datetime as dt
import re
from collections.abc import Callable
from dataclasses import replace
from itertools import pairwise
from urllib.parse import urldefrag, urljoin

import pytest

from builder.book import Book, Verdict
from builder.publish.charges import amounts_as_tsv
from builder.publish.entry_view import next_review
from builder.publish.page import Page, menu_of
from builder.publish.pages import build_pages
from builder.publish.portrait import Portrait
from builder.records.house_rules import HouseRule
from builder.records.settings import Settings
from tests.publish.handmade import CAUTION, GOOD, QUERY, Markup, book_of, entry_of, text_of

EVIL = "<imgx src=x onerror=alert(1)>"  # no element that the reader knows and refuses
GOLDEN_PAGES = {
    "front.html": "",
    "entry-two-stages.html": "e/NSC0W7N51/",
    "entry-failure.html": "e/NS2H8WDRW/",
    "list-by-solvent.html": "lists/solvent/ethanol/",
    "rule-gate.html": "rules/sn1-closed-methyl/",
    "form.html": "how-to-add/form/",
}
_DRAWING = re.compile(r'<svg [^>]*class="hb-drawing.*?</svg>', re.DOTALL)
_FORECAST = re.compile(r'(<h2 id="expected">|<summary>Why the engine).*?(</section>|</details>)', re.DOTALL)


@pytest.mark.parametrize("name", GOLDEN_PAGES)
def test_pages_are_as_they_were_read_last(
    name: str, pages: dict[str, Page], golden: Callable[[str, str], None]
) -> None:
    # Drawings have golden files of their own, and the numbers of a forecast move with each calibration.
    body = _DRAWING.sub("<svg>drawing</svg>", pages[GOLDEN_PAGES[name]].body)
    golden(f"pages/{name}", _FORECAST.sub(r"\1forecast\2", body))


def test_html_is_sound(markup: dict[str, Markup]) -> None:
    for path, page in markup.items():
        assert not page.open, f"{path} leaves {page.open} open"
        ids = page.values("id")
        assert len(ids) == len(set(ids)), f"{path} has ids twice"


def test_headings_come_in_order(markup: dict[str, Markup]) -> None:
    for path, page in markup.items():
        levels = [int(tag[1]) for tag, _ in page.elements if re.fullmatch(r"h[1-6]", tag)]
        assert levels.count(1) == 1, path
        steps = [after - before for before, after in pairwise(levels)]
        assert levels[0] == 1, path
        assert max(steps, default=0) <= 1, f"{path} skips a level"


def test_tables_say_what_their_headers_head(markup: dict[str, Markup]) -> None:
    for path, page in markup.items():
        tags = [tag for tag, _ in page.elements]
        assert tags.count("table") == tags.count("caption"), path
        assert all(attributes.get("scope") in {"row", "col"} for tag, attributes in page.elements if tag == "th"), path


def test_no_inline_style_script_or_handler(markup: dict[str, Markup]) -> None:
    for path, page in markup.items():
        assert not page.values("style"), path
        assert not {tag for tag, _ in page.elements} & {"script", "style", "iframe", "object", "embed"}, path
        assert not [name for _, attributes in page.elements for name in attributes if name.startswith("on")], path


def test_links_lead_to_pages_and_files_of_the_book(pages: dict[str, Page], markup: dict[str, Markup]) -> None:
    root = "https://handbook.example/sub/"
    anchors = {urljoin(root, path): set(page.values("id")) for path, page in markup.items()}
    files = {urljoin(root, asset.path) for page in pages.values() for asset in page.assets}
    for path, page in markup.items():
        for href in page.values("href"):
            target, anchor = urldefrag(urljoin(urljoin(root, path), href))
            assert target in anchors.keys() | files, f"{path} links to {href}"
            assert not anchor or anchor in anchors[target], f"{path} links to {href}"


def test_no_percentage_stands_alone(markup: dict[str, Markup]) -> None:
    for path, page in markup.items():
        bare = [text for text in page.texts if re.fullmatch(r"[<>≤≥]?\s*\d+(\.\d+)?\s*%", text)]
        assert not bare, f"{path} shows {bare}"


def test_every_yield_has_kind_scale_and_runs(book: Book[Portrait], markup: dict[str, Markup]) -> None:
    typed = [(e.id, line) for e in book.entries for line in e.record.outcome.measured if line.what == "yield"]
    assert typed
    for entry_id, line in typed:
        text = " ".join(markup[f"e/{entry_id}/"].texts)
        assert re.search(rf"{line.value} {line.kind} yield [^%]*mmol scale, n (= \d+|not stated)", text)


def test_an_entry_comes_scheme_first_with_its_cautions_in_sight(pages: dict[str, Page]) -> None:
    body = pages["e/NSC0W7N51/"].body
    in_order = ("hb-drawing", "hb-strip", "sodium azide: very toxic", 'id="seen"', 'id="expected"', 'id="procedure"')
    places = [body.index(part) for part in in_order]
    assert places == sorted(places)


def test_an_entry_says_who_decides(pages: dict[str, Page]) -> None:
    assert "Local rules and qualified people decide" in pages["e/NS7K3QFMC/"].body


def test_derived_amounts_are_told_from_typed_ones(pages: dict[str, Page]) -> None:
    body = pages["e/NSC0W7N51/"].body
    # By hand: 1.302 g of C8H18O (130.23 g/mol) are 9.998 mmol; 1.2 equivalents of that, 12.0 mmol.
    assert '<span class="hb-typed">1.302 g</span>' in body
    assert '<span class="hb-derived">10.0 mmol</span>' in body
    assert '<span class="hb-derived">12.0 mmol</span>' in body
    assert "Solvent in all 40.0 mL, substrate 0.250 mol/L in it" in body


def test_copied_amounts_keep_their_columns() -> None:
    entry = entry_of(text_of("NSC0W7N51").replace("name: sodium azide", 'name: "sodium\\tazide\\n(fresh)"'))
    rows = [row.split("\t") for row in amounts_as_tsv(entry.kept.amounts).split("\n")]
    assert {len(row) for row in rows} == {7}
    assert "sodium azide (fresh)" in {row[0] for row in rows}


def test_the_record_can_be_taken_away_as_written(pages: dict[str, Page]) -> None:
    files = {asset.path: asset.data for asset in pages["e/NSC0W7N51/"].assets}
    assert files["e/NSC0W7N51/NSC0W7N51.yml"] == (GOOD / "NSC0W7N51.yml").read_bytes()
    assert files["e/NSC0W7N51/NSC0W7N51.svg"].startswith(b"<svg ")


def test_nothing_of_a_record_is_taken_as_html() -> None:
    text = text_of("NSC0W7N51")
    for plain in ("One-pot mesylation and azidation of (S)-octan-2-ol", "2-chlorooctane", "DMF", "BK2/121"):
        text = text.replace(plain, f"'{EVIL}'")
    text = text.replace("time: 16 h", f"time: 16 h\n    note: '{EVIL}'")
    text += f"take_away: '{EVIL}'\nwork_up: ['{EVIL}']\nprocedure: '{EVIL}'\nevidence: ['{EVIL}']\n"
    assert text.count(EVIL) >= 9
    settings = Settings(format=1, title=EVIL, group=EVIL, notice=EVIL, contact=EVIL, house_rules=(EVIL,))
    book = book_of(entry_of(text, settings=settings), settings=settings)
    for page in build_pages(book):
        assert "<img" not in page.body, page.path
        assert "imgx" not in {tag for tag, _ in Markup(page.body).elements}, page.path
        assert not [asset for asset in page.assets if asset.path.endswith("svg") and b"<img" in asset.data]


def test_hostile_names_get_harmless_addresses() -> None:
    text = text_of("NS7K3QFMC").replace("name: water", "name: ../../Ω water?#")
    paths = [page.path for page in build_pages(book_of(entry_of(text)))]
    assert "lists/solvent/water/" in paths
    assert all(re.fullmatch(r"([A-Za-z0-9-]+/)*", path) for path in paths)


def test_a_withdrawn_entry_keeps_its_page_and_says_why() -> None:
    text = text_of("NS7K3QFMC").replace("status: current", "status: superseded")
    text += "superseded: {by: NS2H8WDRW, date: 2026-06-01, because: the water was not degassed}\n"
    successor = entry_of(text_of("NS2H8WDRW"))
    pages = {page.path: page for page in build_pages(book_of(entry_of(text), successor))}
    old, new = pages["e/NS7K3QFMC/"], pages["e/NS2H8WDRW/"]
    assert not old.indexed
    assert "Superseded on 2026-06-01" in old.body
    assert "the water was not degassed" in old.body
    assert 'href="../../e/NS2H8WDRW/"' in old.body
    assert "takes the place of" in new.body
    assert "Solvolysis rate" not in pages[""].body


def test_an_empty_book_has_a_site() -> None:
    pages = {page.path: page for page in build_pages(book_of())}
    assert "The book is empty" in pages[""].body
    assert "0 entries." in pages["lists/"].body
    assert all(page.body for page in pages.values())


def test_a_single_entry_is_not_many() -> None:
    pages = build_pages(book_of(entry_of(text_of("NS7K3QFMC"), verdict=Verdict.NOT_COVERED)), rules=())
    said = [text for page in pages for text in (page.description, *Markup(page.body).texts)]
    assert [text for text in said if re.search(r"\b1 [a-z ]*(entries|queries|cautions|sequences|drafts)\b", text)] == []
    assert "1 entry: 1 not covered." in said


def test_a_button_is_called_what_it_reads(pages: dict[str, Page]) -> None:
    # WCAG 2.2, 2.5.3: speech input finds a control by the words on it.
    body = "".join(page.body + page.write().rail for page in pages.values())
    named = re.findall(r'<button[^>]* aria-label="([^"]*)"[^>]*>([^<]*)<', body)
    assert ("Copy SMILES of sodium azide", "Copy") in named
    assert [pair for pair in named if pair[1] not in pair[0]] == []


def test_a_rule_counts_each_entry_once() -> None:
    entry = entry_of(text_of("NSC0W7N51"), CAUTION, replace(CAUTION, message="DMF: harms the unborn"))
    body = next(page.body for page in build_pages(book_of(entry)) if page.path == "rules/")
    assert "touches 1 entry" in body
    assert "touches 2" not in body


DUE = [
    # reviewed, months between reviews, due again
    ("2026-03-20", 24, "2028-03-20"),
    ("2026-11-30", 3, "2027-02-28"),  # no 30th there
    ("2026-12-31", 1, "2027-01-31"),
]


@pytest.mark.parametrize(("reviewed", "months", "due"), DUE)
def test_a_review_is_due_again_on_its_day_of_the_month(reviewed: str, months: int, due: str) -> None:
    record = entry_of(text_of("NSC0W7N51") + f"reviewed: {{by: bench-2, date: {reviewed}}}\n").record
    settings = Settings(format=1, title="A book for tests", review_interval_months=months)
    assert str(next_review(record, settings)) == due


def test_the_menu_is_short_and_ends_with_the_guides(pages: dict[str, Page]) -> None:
    menu = menu_of(pages.values())
    assert [next(iter(item)) for item in menu if isinstance(item, dict)] == ["State", "Entries", "Rules", "Add", "Cite"]


ANSWER = "Accepted by bench-1: DMSO oxidises it"
HOUSE = {"house_rule": "no DMF", "because": "toxic for reproduction"}


def test_the_verdict_names_the_house_rule_that_is_not_kept_or_set_aside() -> None:
    broken = replace(QUERY, rule="house-solvent-banned", data=HOUSE)
    accepted = replace(broken, accepted="DMSO oxidises it")
    text = text_of("NS9PZ4GK7")
    answered = text + "accepted: [{finding: house-solvent-banned, because: DMSO oxidises it, by: bench-1}]\n"
    for record, finding, said in (
        (text, broken, "House rule not kept: no DMF – toxic for reproduction."),
        (answered, accepted, f"House rule set aside: no DMF – toxic for reproduction. {ANSWER}"),
    ):
        pages = {page.path: page for page in build_pages(book_of(entry_of(record, finding, finding)))}
        (ruling,) = re.findall(r'<section class="hb-ruling.*?</section>', pages["e/NS9PZ4GK7/"].body, re.DOTALL)
        assert " ".join(" ".join(Markup(ruling).texts).split()).count(said) == 1


def test_house_rules_are_listed_with_their_reasons() -> None:
    rules = (
        "A failed run is entered like any other.",
        HouseRule(banned_solvents=("HMPA", "DMF"), because="toxic", level="error", since=dt.date(2026, 4, 1)),
        HouseRule(rule="four eyes", because="one overlooks"),
        HouseRule(measured=("internal",), because="a bath says little"),
    )
    settings = Settings(format=1, title="A book", house_rules=rules)
    pages = {page.path: page for page in build_pages(book_of(settings=settings))}
    (listed,) = re.findall(r'<section aria-labelledby="house-rules">.*?</ul>', pages["how-to-add/"].body, re.DOTALL)
    items = [" ".join(re.sub("<[^>]+>", " ", item).split()) for item in re.findall("<li>.*?</li>", listed, re.DOTALL)]
    assert items == [
        "A failed run is entered like any other.",
        "No HMPA or DMF – toxic checked from 2026-04-01 on, without exception",
        "Four eyes – one overlooks",
        "Temperature measured: internal – a bath says little checked, may be set aside with a reason",
    ]
