"""A book made by hand, so that pages are tested for what publishing does and not for what the checks find today."""

import datetime as dt
import re
from html.parser import HTMLParser
from pathlib import Path

from builder.book import Book, Entry, Verdict
from builder.checks.case import Case, open_case
from builder.checks.kinship import near_same_kin
from builder.checks.standing import standing_of
from builder.finding import Finding, Level, Place
from builder.publish.portrait import Portrait, portrait_of
from builder.records.digest import digest
from builder.records.reader import read_bytes
from builder.records.settings import Person, Settings

GOOD = Path(__file__).parents[1] / "data" / "records" / "good"
SETTINGS = Settings(
    format=1,
    title="A book for tests",
    group="group of the tests",
    notice="Every entry is invented.",
    site_address="https://handbook.example/",
    people=(Person(code="bench-2", shown_as="bench chemist 2"),),
)
TODAY = dt.date(2026, 12, 1)
CAUTION = Finding(
    rule="hazard-species",
    level=Level.CAUTION,
    message="sodium azide: very toxic",
    why="A substance belongs to a class with a known hazard.",
    mend="keep above pH 9",
    source="common-practice",
    place=Place("entries/x.yml", 1, 1, 2),
    data={"severity": "warn"},
)
QUERY = Finding(
    rule="mechanism-contrary",
    level=Level.QUERY,
    message="the record claims SN2, the engine has it closed",
    why="Backside attack needs room.",
    mend="correct the claim, or accept the finding with a reason",
    source="march-2013",
    place=Place("entries/x.yml", 1, 1, 2),
)
REMARK = Finding(
    rule="boolean-word",
    level=Level.REMARK,
    message="a remark",
    why="Because.",
    mend="do so",
    source="yaml-1-2",
    place=Place("entries/x.yml", 1, 1, 2),
)


def text_of(name: str) -> str:
    """Return the YAML of one of the good records."""
    return (GOOD / f"{name}.yml").read_text("utf-8")


def case_of(text: str, settings: Settings = SETTINGS) -> Case:
    """Return the case of a record."""
    record = read_bytes(text.encode(), "entries/x.yml").record
    assert record is not None
    return open_case(record, f"{record.entry}.yml", settings, TODAY)


def entry_of(
    text: str, *findings: Finding, verdict: Verdict = Verdict.IN_LINE, settings: Settings = SETTINGS
) -> Entry[Portrait]:
    """Return the entry of a record, with these findings and no others."""
    case = case_of(text, settings)
    record = case.record
    return Entry(record, case.file, text, digest(record), findings, verdict, standing_of(case), portrait_of(case))


def book_of(*entries: Entry[Portrait], settings: Settings = SETTINGS) -> Book[Portrait]:
    """Return a book of these entries."""
    findings = tuple(finding for entry in entries for finding in entry.findings)
    in_order = tuple(sorted(entries, key=lambda entry: entry.id))
    near_same = tuple(near_same_kin((entry.id, entry.standing) for entry in in_order))
    files = tuple(Path(entry.file) for entry in entries)
    return Book(Path("entries"), settings, TODAY, in_order, findings, files, near_same)


class Markup(HTMLParser):
    """What a piece of HTML holds: texts, elements with their attributes, whether tags close in order."""

    VOID = frozenset({"br", "meta", "link", "input", "hr", "img", "path", "rect", "circle", "line"})

    def __init__(self, html: str) -> None:
        super().__init__(convert_charrefs=True)
        self.texts: list[str] = []
        self.elements: list[tuple[str, dict[str, str]]] = []
        self.open: list[str] = []
        self.feed(html)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, {name: value or "" for name, value in attrs}))
        if tag not in self.VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, {name: value or "" for name, value in attrs}))

    def handle_endtag(self, tag: str) -> None:
        if tag not in self.VOID:
            assert self.open, f"</{tag}> closes nothing"
            assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if data.strip():
            self.texts.append(data.strip())

    def values(self, attribute: str) -> list[str]:
        """Return the values of an attribute wherever it stands."""
        return [attributes[attribute] for _, attributes in self.elements if attribute in attributes]


_LOADS = {"script": "src", "img": "src", "link": "href", "iframe": "src", "source": "src"}


def asked_of_other_hosts(site: Path) -> list[tuple[str, str]]:
    """Return what the pages of a built site make a browser load from elsewhere: the page, and the address."""
    return [
        (path.relative_to(site).as_posix(), address)
        for path in sorted(site.rglob("*.html"))
        for tag, attributes in Markup(path.read_text("utf-8")).elements
        if attributes.get("rel") not in {"canonical", "edit"}  # name an address, and are never fetched
        and re.match(r"(https?:)?//", address := attributes.get(_LOADS.get(tag, ""), ""))
    ]
