"""Formulae and slugs as a page shows them; expected texts by hand."""

import pytest

from builder.publish.facets import slug_of
from builder.publish.figures import formula_parts


@pytest.mark.parametrize(
    ("formula", "parts"),
    [
        ("C8H17N3", (("C", "8"), ("H", "17"), ("N", "3"))),
        ("C2H5O-", (("C", "2"), ("H", "5"), ("O", ""), ("-", ""))),
        ("H4N+", (("H", "4"), ("N", ""), ("+", ""))),
        ("C4H4O4-2", (("C", "4"), ("H", "4"), ("O", "4"), ("-2", ""))),
    ],
)
def test_formulae_are_split_for_subscripts(formula: str, parts: tuple[tuple[str, str], ...]) -> None:
    assert formula_parts(formula) == parts


@pytest.mark.parametrize(
    ("text", "slug"),
    [("sodium azide", "sodium-azide"), ("SN2'", "sn2"), ("../../x", "x"), ("Ω", ""), ("tert-butanol", "tert-butanol")],
)
def test_slugs_are_plain(text: str, slug: str) -> None:
    assert slug_of(text) == slug
