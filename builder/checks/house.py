"""The settings of a book: is the tool the one it was checked with, can its colours be read, is its logo there."""

from collections.abc import Iterator
from dataclasses import dataclass
from importlib.metadata import version

from builder.chemistry.inks import LEAST_CONTRAST, PAPER, contrast, legible
from builder.finding import Level
from builder.records.settings import Settings
from builder.rule import Fault, rule

__all__ = ["DISTRIBUTION", "HOUSE_CHECKS", "House", "tool_version"]

DISTRIBUTION = "condition-handbook"
"""The name under which the tool is packaged."""


@dataclass(frozen=True, slots=True)
class House:
    """The settings of a book, and the version of the tool that looks at it.

    has_logo: whether the file they name as logo lies in the book's folder; true where they name none.
    """

    settings: Settings
    tool: str
    has_logo: bool = True


def tool_version() -> str:
    """Return the version of this tool as installed."""
    return version(DISTRIBUTION)


@rule(
    id="accent-faint",
    title="An accent colour too faint to read",
    source="wcag-2-2",
    fires_on=(
        "# handbook.yml\naccent: {light: '#f2b600', dark: '#f2b600'}",
        "# handbook.yml\naccent: {light: '#1b6a52', dark: '#1b6a52'}",
    ),
    silent_on=("# handbook.yml\naccent: {light: '#1b6a52', dark: '#62cfa8'}",),
)
def accent_is_faint(house: House) -> Iterator[Fault]:
    """The accent has the contrast of text, 4.5:1, on light and on dark paper.

    Links are written in it. Few colours are legible on both papers, so there are two of them.
    """
    accent = house.settings.accent
    if accent is None:
        return
    for kind, colour, paper in (("light", accent.light, PAPER.light), ("dark", accent.dark, PAPER.dark)):
        found = contrast(colour, paper)
        if found < LEAST_CONTRAST:
            fix = f"'{legible(colour, paper)}'"
            message = (
                f"{colour} on the {kind} paper, {paper}, has a contrast of {found:.2f}:1; text needs {LEAST_CONTRAST}:1"
            )
            yield Fault(at=("accent", kind), message=message, mend=f"write {fix}, or another colour", fix=fix)


@rule(
    id="engine-differs",
    title="The book is pinned to another version of the tool",
    level=Level.QUERY,
    source="record-format",
    fires_on=("# handbook.yml\nengine: 0.9.0",),
    silent_on=("# handbook.yml\nengine: 1.4.0  # the version that runs", "# handbook.yml\nlicence: CC0-1.0"),
)
def engine_differs(house: House) -> Iterator[Fault]:
    """Where the settings name a version of the tool under `engine`, this version checks the book.

    Another version may judge entries otherwise. With the pin everybody sees the same verdicts, and an upgrade is one
    change that shows which of them moved.
    """
    pinned = house.settings.engine
    if pinned is not None and pinned != house.tool:
        yield Fault(
            at=("engine",),
            message=f"the book is pinned to version {pinned}, and {house.tool} is running",
            mend=f"install {pinned}; or read what {house.tool} finds, and write engine: {house.tool} to adopt it",
            data={"pinned": pinned, "running": house.tool},
        )


@rule(
    id="logo-missing",
    title="A logo that is not in the book",
    source="record-format",
    fires_on=("# handbook.yml\nlogo: nowhere.svg",),
    silent_on=("# handbook.yml\nlogo: logo.svg  # which lies beside the settings", "# handbook.yml\nlicence: CC0-1.0"),
)
def logo_is_missing(house: House) -> Iterator[Fault]:
    """The logo is a file in the folder of the book.

    Every page shows it. What lies elsewhere is not published, also where a link in the folder leads there.
    """
    if not house.has_logo:
        message = f"{house.settings.logo} is no file of the book"
        yield Fault(at=("logo",), message=message, mend="put it beside the settings, or drop the line")


HOUSE_CHECKS = (accent_is_faint, engine_differs, logo_is_missing)
