"""The data behind the search box: what is in it, what is not, and its form as a script."""

import json
from typing import Any

import pytest

from builder.book import Book, Entry
from builder.publish.page import Page
from builder.publish.search_index import Listed, as_script, listed_of, search_assets, search_data, search_notes
from tests.publish.handmade import book_of, entry_of, text_of

MOST_BYTES_AN_ENTRY = 2_000
"""What keeps a shard of a thousand entries below 2 MB."""


def _data(*entries: Entry) -> Any:
    return json.loads(json.dumps(search_data(entries, ())))


def _parts(data: Any, place: int) -> dict[str, set[str]]:
    """Return the names of what takes part in an entry, by role in words."""
    listed = data["entries"]["participants"][place]
    found: dict[str, set[str]] = {}
    for compound, role in zip(listed[::2], listed[1::2], strict=True):
        found.setdefault(data["roles"][role][0], set()).update(data["compounds"]["names"][compound].split("\t"))
    return found


def test_what_takes_part_is_there_by_role() -> None:
    data = _data(entry_of(text_of("NSC0W7N51")))
    parts = _parts(data, 0)
    assert parts["substrate"] == {"(S)-octan-2-ol"}
    assert parts["formed in stage 1"] == {"(S)-octan-2-yl methanesulfonate"}
    assert parts["nucleophile"] == {"sodium azide"}
    assert "(R)-2-azidooctane" in parts["product A"]


def test_roles_weigh_what_a_reaction_is_about_before_what_it_uses() -> None:
    weights = dict(_data(*(entry_of(text_of(name)) for name in ("NSC0W7N51", "NS9PZ4GK7")))["roles"])
    assert weights["substrate"] == weights["product A"] > weights["nucleophile"] > weights["solvent"]
    assert weights["product A"] > weights["formed in stage 1"] > weights["nucleophile"]


def test_a_compound_stands_there_once_with_all_its_names() -> None:
    text = text_of("NSC0W7N51")
    other = text_of("NS9PZ4GK7").replace("name: sodium azide", "name: NaN3 (fresh)")
    data = _data(entry_of(text), entry_of(other))
    columns = data["compounds"]
    place = columns["inchikey"].index("PXIPVTKHYLBLMZ-UHFFFAOYSA-N")
    assert columns["inchikey"].count("PXIPVTKHYLBLMZ-UHFFFAOYSA-N") == 1
    assert columns["names"][place].split("\t") == ["sodium azide", "NaN3 (fresh)"]
    assert {"NaN3", "azide"} <= set(columns["synonyms"][place].split("\t"))
    assert columns["formulas"][place].split() == ["N3Na", "N3-", "Na+"]
    assert "[N-]=[N+]=[N-]" in columns["variants"][place].split()
    assert {len(column) for column in columns.values()} == {len(columns["names"])}


def test_a_solvent_without_a_structure_has_that_of_the_table() -> None:
    columns = _data(entry_of(text_of("NSC0W7N51")))["compounds"]
    place = next(i for i, names in enumerate(columns["names"]) if names == "DMF")
    assert columns["cas"][place] == "68-12-2"
    assert columns["smiles"][place] == "CN(C)C=O"


def test_columns_are_of_one_length(book: Book) -> None:
    data = search_data(book.entries, ())
    entries = data["entries"]
    assert isinstance(entries, dict)
    assert {len(column) for column in entries.values()} == {len(book.entries)} == {len(search_notes(book.entries))}


def test_no_text_runs_over_its_line() -> None:
    text = text_of("NSC0W7N51").replace("name: sodium azide", 'name: "sodium\\tazide"')
    title = "One-pot mesylation and azidation of (S)-octan-2-ol"
    text = text.replace(title, '"One-pot\\nmesylation and azidation of (S)-octan-2-ol"')
    entry = entry_of(text + "procedure: |\n  first this\n  then\tthat\n")
    data = _data(entry)
    assert "first this then that" in search_notes([entry])[0]
    assert data["entries"]["title"] == [title]
    assert "sodium azide" in data["compounds"]["names"]


def test_entries_are_filed_by_claim_group_and_status(book: Book) -> None:
    data = _data(*book.entries)
    place = data["entries"]["id"].index("NSC0W7N51")
    filed = [data["facets"][facet] for facet in data["entries"]["facets"][place]]
    assert ["mechanism claimed", "SN2", ""] in filed
    assert ["leaving group", "mesylate", "OMs"] in filed
    assert ["status", "current", ""] in filed


def test_only_entries_of_the_book_leave_a_trace(book: Book) -> None:
    kept = [entry for entry in book.entries if entry.id != "NSC0W7N51"]
    written = "".join(asset.data.decode() for asset in search_assets(kept, ()))
    assert "NS9PZ4GK7" in written
    assert not [word for word in ("NSC0W7N51", "octan-2-ol", "2-azidooctane", "methanesulfonyl") if word in written]


def test_the_same_book_gives_the_same_bytes(book: Book) -> None:
    again = book_of(*(entry_of(entry.text, *entry.findings, verdict=entry.verdict) for entry in reversed(book.entries)))
    assert search_assets(book.entries, ()) == search_assets(again.entries, ())


def test_a_thousand_entries_stay_below_two_megabytes(book: Book) -> None:
    data, notes = search_assets(book.entries, ())
    assert len(data.data) < MOST_BYTES_AN_ENTRY * len(book.entries)
    assert len(notes.data) < MOST_BYTES_AN_ENTRY * len(book.entries)


@pytest.mark.parametrize("text", ["</script><script>", "<!--", "a\u2028b\u2029c", '"\\\n', "−"])
def test_no_text_breaks_out_of_the_script(text: str) -> None:
    script = as_script("name", [text])
    assert script.startswith("globalThis.name=")
    assert not set("<\u2028\u2029") & set(script)
    assert script.count("\n") == 1
    assert json.loads(script.removeprefix("globalThis.name=").removesuffix(";\n")) == [text]


def test_pages_beside_the_entries_are_offered_by_title(pages: dict[str, Page]) -> None:
    listed = [found for page in pages.values() if (found := listed_of(page))]
    assert (
        Listed(
            "rules/sn1-closed-methyl/",
            "No methyl cation",
            pages["rules/sn1-closed-methyl/"].description,
            "sn1-closed-methyl",
        )
        in listed
    )
    assert not [each.path for each in listed if each.path.startswith("e/") or not each.path]
