"""Identifiers: the check character of ISO 7064, and what a slip of the hand becomes."""

import string

import pytest
from hypothesis import given
from hypothesis import strategies as st
from stdnum.iso7064 import mod_37_36

from builder.records.identifiers import (
    CROCKFORD,
    has_orcid_check_character,
    is_identifier,
    mend_identifier,
    mint_identifier,
)
from builder.records.reader import read_into
from builder.records.settings import Settings

EXAMPLES = ["NS4T9XQ2N", "NS3V6TDMZ", "NS7K3QFMC", "NS2H8WDRW", "NSC0W7N51", "NS9PZ4GK7"]


def test_the_check_system_is_that_of_the_standard() -> None:
    # Global Release Identifier of the music trade, an ISO 7064 MOD 37,36 code: A12425GABC1234002 has check M
    # (worked example of the GRid standard, from memory).
    assert mod_37_36.calc_check_digit("A12425GABC1234002") == "M"


@pytest.mark.parametrize("text", EXAMPLES)
def test_accepts(text: str) -> None:
    assert is_identifier(text)


@pytest.mark.parametrize("text", ["NS4T9XQ2", "ns4t9xq2n", "NS4T9XQ2M", "XX4T9XQ2N", "NS4T9XQ2N1", "../NS4T9XQ", ""])
def test_refuses(text: str) -> None:
    assert not is_identifier(text)


@pytest.mark.parametrize(
    ("typed", "meant"),
    [("ns4t9xq2n", "NS4T9XQ2N"), ("NS-4T9XQ2N", "NS4T9XQ2N"), ("NSCOW7N5I", "NSC0W7N51"), ("NS4T9XQ2M", None)],
)
def test_mends_what_was_plainly_meant(typed: str, meant: str | None) -> None:
    assert mend_identifier(typed) == meant


def test_minted_identifiers_are_valid_and_avoid_look_alikes() -> None:
    minted = {mint_identifier() for _ in range(300)}
    assert len(minted) == 300
    assert all(is_identifier(text) for text in minted)
    assert not set("ILOU") & set("".join(text[2:] for text in minted))


@given(st.sampled_from(EXAMPLES), st.integers(2, 8), st.sampled_from(CROCKFORD))
def test_one_wrong_character_is_always_seen(text: str, place: int, other: str) -> None:
    wrong = text[:place] + other + text[place + 1 :]
    assert is_identifier(wrong) == (wrong == text)


@given(st.sampled_from(EXAMPLES), st.integers(2, 7))
def test_two_swapped_neighbours_are_seen(text: str, place: int) -> None:
    swapped = text[:place] + text[place + 1] + text[place] + text[place + 2 :]
    assert is_identifier(swapped) == (swapped == text)


def test_the_alphabet_is_that_of_crockford() -> None:
    # Crockford, Base 32 (crockford.com, from memory): digits and capitals without I, L, O, U.
    assert "".join(c for c in string.digits + string.ascii_uppercase if c not in "ILOU") == CROCKFORD


def test_the_check_character_of_a_person_is_that_of_the_standard() -> None:
    # ORCID, "Structure of the ORCID Identifier": 0000-0002-1825-0097, the fictional example person (from memory).
    assert has_orcid_check_character("https://orcid.org/0000-0002-1825-0097")
    # The worked examples of ISO 7064, MOD 11-2: 079 has X, 0794 has 0 (from memory).
    assert has_orcid_check_character("https://orcid.org/079X")
    assert has_orcid_check_character("https://orcid.org/07940")
    assert not has_orcid_check_character("https://orcid.org/0000-0002-1825-0079")


def test_settings_refuse_an_orcid_with_a_slip() -> None:
    text = (
        "format: 1\ntitle: A book\npeople: [{code: b-1, shown_as: one, orcid: https://orcid.org/0000-0002-1825-0079}]"
    )
    settings, findings, _ = read_into(Settings, text, "handbook.yml")
    assert settings is None
    assert [(finding.rule, finding.place.line) for finding in findings] == [("value-not-permitted", 3)]
    assert "check character" in findings[0].message
