"""The book as a plain MkDocs and Material site with hand-written pages: what a build is compared with.

One Markdown page for each page of ours, with the same facts (the scheme once, as inline SVG), stock search on and
only the indexes in the menu; no plugin of ours, nothing padded.
"""

import json
import re
from collections.abc import Iterator
from pathlib import Path

import yaml
from jinja2 import Environment, FileSystemLoader, StrictUndefined

from builder.book import Book
from builder.checks.register import all_rules
from builder.publish.entry_view import surroundings_of, view_entry
from builder.publish.facets import facet_indexes
from builder.publish.list_pages import newest_first
from builder.publish.rule_pages import view_rule
from builder.publish.summary import summarise

__all__ = ["write_plain_site"]

TEMPLATES = Path(__file__).parent / "data" / "plain_site"
CONFIG = {
    "site_name": "Plain site for comparison",
    "site_url": "https://handbook.example/generated/",
    "theme": {
        "name": "material",
        "language": "en",
        "font": False,
        "features": ["navigation.indexes", "navigation.tabs", "search.highlight", "toc.follow"],
    },
    "plugins": ["search"],
    "validation": {"nav": {"omitted_files": "ignore"}},
}
_SPECIAL = re.compile(r"[\\`*_\[\]<>|]")


def write_plain_site(book: Book, folder: Path) -> Path:
    """Write the site's source into `folder`; return the path of its mkdocs.yml."""
    menu: dict[str, str] = {}
    for path, label, text in _pages(book):
        page = folder / "docs" / path / "index.md"
        page.parent.mkdir(parents=True, exist_ok=True)
        page.write_text(text.lstrip(), "utf-8")
        if label:
            menu[label] = f"{path}index.md"
    config = folder / "mkdocs.yml"
    nav = [{label: path} for label, path in menu.items()]
    config.write_text(yaml.safe_dump(CONFIG | {"nav": nav}, sort_keys=False), "utf-8")
    return config


def _pages(book: Book) -> Iterator[tuple[str, str, str]]:
    """Yield address, label in the menu (empty for pages outside it) and Markdown of each page."""
    rules = sorted(all_rules().values(), key=lambda rule: rule.id)
    around = surroundings_of(book, rules)
    summaries = {entry.id: summarise(entry) for entry in book.entries}
    newest = newest_first(summaries.values())
    indexes = facet_indexes(book.entries)
    facets = [(index.facet.title, f"lists/{index.facet.key}/", len(index.values)) for index in indexes]
    yield "", "State of the book", _list(book, "", book.settings.title, facets, newest[:5])
    yield "lists/", "Entries", _list(book, "../", "Entries", [(a, f"../{b}", c) for a, b, c in facets], newest)
    for index in indexes:
        facet = index.facet
        values = [(value.value, f"{value.slug}/", len(value.entries)) for value in index.values]
        yield f"lists/{facet.key}/", facet.title, _list(book, "../../", f"By {facet.title.lower()}", values)
        for value in index.values:
            rows = newest_first([summaries[entry.id] for entry in value.entries])
            title = f"{facet.title}: {value.value}"
            yield f"lists/{facet.key}/{value.slug}/", "", _list(book, "../../../", title, [], rows)
    views = [view_rule(rule, book) for rule in rules]
    listed = [(f"{view.title}: {view.statement}", f"{view.id}/", len(view.touched)) for view in views]
    yield "rules/", "Rules", _list(book, "../", "Rules", listed)
    for view in views:
        yield f"rules/{view.id}/", "", _render("rule.md", rule=view, notice=book.settings.standing_notice)
    for entry in book.entries:
        view = view_entry(entry, around)
        yield f"e/{entry.id}/", "", _render("entry.md", view=view, notice=book.settings.standing_notice)


def _list(book: Book, root: str, title: str, links: object, summaries: object = ()) -> str:
    notice = book.settings.standing_notice
    return _render("list.md", root=root, title=title, links=links, summaries=summaries, notice=notice)


def _render(template: str, **values: object) -> str:
    return _ENVIRONMENT.get_template(template).render(**values)


def _markdown(text: str) -> str:
    """Return plain text so that Markdown shows it as it is."""
    return _SPECIAL.sub(r"\\\g<0>", text)


_ENVIRONMENT = Environment(
    loader=FileSystemLoader(TEMPLATES), undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True, autoescape=False
)
_ENVIRONMENT.filters |= {"md": _markdown, "json": lambda text: json.dumps(text, ensure_ascii=False)}
