"""The settings of one book, `entries/handbook.yml`: everything book-specific stands there."""

from typing import Annotated

from pydantic import AfterValidator, Field

from builder.records.fields import Count, EntryId, Flag, FormatNumber, Line, RelativePath, Shape, faulty
from builder.records.house_rules import HouseRule, HouseRuleLine
from builder.records.identifiers import has_orcid_check_character
from builder.records.model import Part

__all__ = ["SETTINGS_FILE", "Accent", "Person", "Settings"]

SETTINGS_FILE = "handbook.yml"


def _orcid(address: str) -> str:
    if not has_orcid_check_character(address):
        message = f"the check character of {address} is wrong"
        raise faulty("value-not-permitted", message, "copy it again from the page of the person")
    return address


Address = Annotated[
    str,
    Shape(
        r"^https?://\S+/$", "is not a web address with a slash at its end", "write it like https://book.example.org/"
    ),
]
Orcid = Annotated[
    str,
    Shape(
        r"^https://orcid\.org/[0-9]{4}-[0-9]{4}-[0-9]{4}-[0-9]{3}[0-9X]$",
        "is not an ORCID address",
        "write it like https://orcid.org/0000-0000-0000-0001",
    ),
    AfterValidator(_orcid),
]
Colour = Annotated[
    str,
    Shape(r"^#[0-9a-f]{6}$", "is not a colour", "write it like '#1b6a52', in quotes: red, green, blue from 00 to ff"),
]
Version = Annotated[
    str, Shape(r"^[0-9]+\.[0-9a-z.+]*[0-9a-z]$", "is not a version", "write it as `handbook --version` prints it")
]


class Accent(Part):
    """The colour of links and marks, for light and for dark paper, as #rrggbb."""

    light: Colour
    dark: Colour


class Person(Part):
    """A code that records use for a person, and what may be shown for it."""

    code: Line
    shown_as: Line
    orcid: Orcid | None = None


class Settings(Part):
    """Title, address, people, house rules of a book.

    house_rules: sentences that are shown, and rules that are checked.

    notice: shown on every page. invented: the book is a demonstration, and every page says so.
    site_address: full address under which the site is published, for citations.
    review_interval_months: after how long an entry without its own due date wants another look.
    retired: identifiers that must never come back.
    engine: version of the handbook that the book was last checked with, so that an upgrade is a decision.
    """

    format: FormatNumber
    title: Annotated[Line, Field(max_length=80)]
    group: Annotated[Line, Field(max_length=80)] | None = None
    notice: Annotated[Line, Field(max_length=400)] | None = None
    invented: Flag = False
    site_address: Address | None = None
    edit_address: Address | None = None
    logo: RelativePath | None = None
    accent: Accent | None = None
    people: tuple[Person, ...] = ()
    house_rules: tuple[HouseRuleLine, ...] = ()
    review_interval_months: Count = 24
    licence: Line = "LicenseRef-Internal"
    engine: Version | None = None
    contact: Line | None = None
    retired: tuple[EntryId, ...] = ()

    @property
    def checked_rules(self) -> tuple[tuple[int, HouseRule], ...]:
        """Return the house rules that demand something, each with its position in the list."""
        return tuple(
            (index, each) for index, each in enumerate(self.house_rules) if isinstance(each, HouseRule) and each.demand
        )

    @property
    def standing_notice(self) -> str:
        """Return what every page says: the book's notice; of an invented book at least that it is."""
        return self.notice or ("Demonstration book: every entry is invented." if self.invented else "")
