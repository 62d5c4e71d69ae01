"""The same reaction side by side: contradictions on both pages and in the lists, repeats and series beside them."""

import re
from collections.abc import Callable
from pathlib import Path

import pytest

from builder.book import Book, open_book
from builder.publish.front_page import state_of_book
from builder.publish.kindred import MOST_IN_SERIES, contradicting_pairs, relatives_of, view_kindred
from builder.publish.page import Page
from builder.publish.pages import build_pages
from builder.publish.portrait import Portrait, portrait_of, summarise
from builder.records.identifiers import mint_identifier
from builder.records.specimen import with_example
from tests.publish.handmade import Markup
from tests.specimens import TODAY

PLAIN, CARBONATE, LATER, DMSO, GONE = "NS4T9XQ2N", "NS7K3QFMC", "NS2H8WDRW", "NS3V6TDMZ", "NS9PZ4GK7"
HALF = """\
outcome:
  result: [substitution, elimination]
  products:
    - {label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired, stereo: racemate}
    - {label: B, name: but-1-ene, smiles: 'CCC=C', use: by-product}
  measured: [{yield: 52 %, of: A, kind: assay, by: 1H NMR}, {yield: 35 %, of: B, kind: assay, by: GC}]
"""
BASE = "base: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', equivalents: 2.0}\n"
REASON = "accepted: [{finding: outcomes-contradict, because: carbonate <imgx onerror=a()> or none, by: bench-1}]\n"
RUN = "performed: {{date: 2026-03-1{}, by: [{}], runs: 1}}\nnotebook: BK3/{}\ntitle: {}\n"
TEXTS = {
    PLAIN: "related: [NS3V6TDMZ]\n" + REASON,
    CARBONATE: RUN.format(5, "bench-3", 1, "With carbonate") + BASE + HALF,
    LATER: RUN.format(6, "bench-3", 2, "Run again") + REASON,
    DMSO: RUN.format(7, "bench-3", 3, "In DMSO")
    + "solvent: [{name: DMSO, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h, vessel: open}]\n",
    GONE: RUN.format(8, "bench-3", 4, "Wrong after all")
    + HALF
    + "status: withdrawn\nwithdrawn: {date: 2026-04-01, because: wrong bottle, by: bench-1}\n",
}


def _book(folder: Path, texts: dict[str, str]) -> Book[Portrait]:
    for entry, text in texts.items():
        (folder / f"{entry}.yml").write_text(with_example(f"entry: {entry}\n{text}"), "utf-8")
    (folder / "handbook.yml").write_text("format: 1\ntitle: A book for tests\n", "utf-8")
    return open_book(folder, today=TODAY, keep=portrait_of)


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book[Portrait]:
    return _book(tmp_path_factory.mktemp("entries"), TEXTS)


@pytest.fixture(scope="module")
def pages(book: Book[Portrait]) -> dict[str, Page]:
    return {page.path: page for page in build_pages(book)}


def test_every_record_of_a_contradiction_says_so_and_links_to_the_other(pages: dict[str, Page]) -> None:
    for here, there in ((PLAIN, CARBONATE), (CARBONATE, PLAIN), (LATER, CARBONATE)):
        body = pages[f"e/{here}/"].body
        assert "<b>Contradicted by" in body
        assert f'href="../../e/{there}/"' in body
        assert "a reason is still wanted" in body  # CARBONATE accepts nothing yet
    for here in (DMSO, GONE):
        assert "Contradicted by" not in pages[f"e/{here}/"].body


def test_the_block_is_as_it_was_read_last(pages: dict[str, Page], golden: Callable[[str, str], None]) -> None:
    block = re.search(
        r'<section class="hb-aside" aria-labelledby="in-our-hands">.*?</section>', pages[f"e/{PLAIN}/"].body, re.DOTALL
    )
    assert block is not None
    assert Markup(block[0]).open == []
    golden("pages/in-our-hands.html", block[0])


def test_relations_are_derived_and_say_more_than_related(pages: dict[str, Page]) -> None:
    assert f'variant of</span> <a href="../../e/{DMSO}/">' in pages[f"e/{PLAIN}/"].body
    assert f'variant of</span> <a href="../../e/{PLAIN}/">' in pages[f"e/{DMSO}/"].body  # typed in the other alone


def test_a_reason_is_wanted_of_both(book: Book[Portrait], tmp_path: Path) -> None:
    assert _open_and_all(book) == (2, 2)
    assert _open_and_all(_book(tmp_path, {**TEXTS, CARBONATE: TEXTS[CARBONATE] + REASON})) == (0, 2)


def _open_and_all(book: Book[Portrait]) -> tuple[int, int]:
    summaries = {entry.id: summarise(entry) for entry in book.entries}
    state = state_of_book(book, summaries, contradicting_pairs(relatives_of(book), summaries))
    return state.open_contradictions, state.contradictions


def test_lists_hold_the_pairs_with_scale_and_runs(pages: dict[str, Page]) -> None:
    for path in ("", "lists/contradictions/"):
        text = " ".join(Markup(pages[path].body).texts)
        assert "against With carbonate" in text.replace("Azide displacement of 2-bromobutane ", "")
        assert "81 % isolated yield (10.0 mmol, n = 2) in NS4T9XQ2N" in text
        assert "base: none in NS4T9XQ2N, potassium carbonate, 2.00 equiv in NS7K3QFMC" in text


def test_what_a_record_says_is_text(pages: dict[str, Page]) -> None:
    assert "carbonate &lt;imgx onerror=a()&gt; or none" in pages[f"e/{PLAIN}/"].body


def test_of_a_long_series_the_newest_are_listed(tmp_path: Path) -> None:
    names = [mint_identifier(lambda signs, n=n: signs[n]) for n in range(MOST_IN_SERIES + 3)]
    book = _book(tmp_path, {name: RUN.format(n % 10, "bench-2", n, f"Run {n}") for n, name in enumerate(names)})
    summaries = {entry.id: summarise(entry) for entry in book.entries}
    (series,) = view_kindred(names[0], relatives_of(book), summaries).series
    assert series.title == "Repeated under near-same conditions"
    assert [row.summary.id for row in series.rows] == [names[0], *names[:2:-1]][: MOST_IN_SERIES + 1]
    assert series.further == 2
