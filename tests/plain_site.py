"""A built site as plain MkDocs and Material pages, as a group without this tool would write them by hand.

Every page becomes one Markdown page with the same headings, tables, lists and texts, and with its first drawing as
inline SVG; stock search is on, the menu holds only what ours holds, and nothing is padded. It is made from the HTML
of the site, so that both have the same content whatever the templates do.
"""

import html
import json
import re
import shutil
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field
from html.parser import HTMLParser
from itertools import groupby
from pathlib import Path, PurePosixPath
from typing import Any

import yaml

__all__ = ["write_plain_site"]

CONFIG: dict[str, Any] = {
    "site_name": "Plain pages for comparison",
    "theme": {
        "name": "material",
        "language": "en",
        "font": False,
        "features": ["navigation.indexes", "navigation.tabs", "search.highlight", "toc.follow"],
    },
    "plugins": ["search"],
    "validation": {"nav": {"omitted_files": "ignore"}},
}
_PARTS = re.compile(r"<main\b[^>]*>(.*?)</main>|<aside\b[^>]*>(.*?)</aside>", re.DOTALL)
_TITLE = re.compile(r"<title>(.*?)</title>", re.DOTALL)
_DRAWING = re.compile(r"<svg\b.*?</svg>", re.DOTALL)
_SPECIAL = re.compile(r"[\\`*_\[\]<>|]")
_HEADINGS = ("h1", "h2", "h3", "h4")
_SECTIONS = ("aside", "details", "div", "figure", "footer", "header", "section")
_BLOCKS = frozenset((*_HEADINGS, *_SECTIONS, "caption", "dl", "figcaption", "ol", "p", "pre", "summary", "table", "ul"))
_LEFT_OUT = frozenset({"button", "form", "nav", "script", "template"})
"""Controls, and the contents of the page, which the theme makes for itself."""
_VOID = frozenset({"br", "hr", "img", "input", "link", "meta", "wbr"})


def write_plain_site(site: Path, folder: Path) -> Path:
    """Write the source of a plain site with the pages of `site` into `folder`; return the path of its mkdocs.yml."""
    menu: list[dict[str, str]] = []
    for page in sorted(site.rglob("index.html")):
        text = page.read_text("utf-8")
        place = page.relative_to(site).with_suffix(".md")
        source = folder / "docs" / place
        source.parent.mkdir(parents=True, exist_ok=True)
        source.write_text(_markdown_page(text), "utf-8")
        for download in (*page.parent.glob("*.yml"), *page.parent.glob("*.svg")):
            shutil.copy(download, source.parent)
        if len(place.parts) <= 2:  # the indexes of sections; what lies below them stays out of the menu
            menu.append({_title(text): place.as_posix()})
    config = folder / "mkdocs.yml"
    config.write_text(yaml.safe_dump(CONFIG | {"nav": menu}, sort_keys=False, allow_unicode=True), "utf-8")
    return config


def _title(text: str) -> str:
    found = _TITLE.search(text)
    assert found is not None
    return html.unescape(found[1]).partition(" · ")[0]


def _markdown_page(text: str) -> str:
    body = "\n".join(main or aside for main, aside in _PARTS.findall(text))
    drawing = next((found[0] for found in _DRAWING.finditer(body) if 'role="img"' in found[0]), "")
    tree = _Tree()
    tree.feed(_DRAWING.sub(lambda found: "<wbr>" if found[0] == drawing else "", body))
    blocks = [block.replace(_PLACE_OF_DRAWING, f"<figure>{drawing}</figure>") for block in _blocks(tree.root)]
    return "\n\n".join([f"---\ntitle: {json.dumps(_title(text), ensure_ascii=False)}\n---", *blocks]) + "\n"


# --- HTML as a tree -----------------------------------------------------------------------------------------


@dataclass
class _Node:
    tag: str
    attributes: dict[str, str]
    inside: "list[_Node | str]" = field(default_factory=list)


class _Tree(HTMLParser):
    """Reads a piece of HTML into nodes."""

    def __init__(self) -> None:
        super().__init__()
        self.root = _Node("div", {})
        self._open = [self.root]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        node = _Node(tag, {name: value or "" for name, value in attrs})
        self._open[-1].inside.append(node)
        if tag not in _VOID:
            self._open.append(node)

    def handle_endtag(self, tag: str) -> None:
        closed = self._open.pop()
        assert closed.tag == tag, f"<{closed.tag}> ends as </{tag}>"

    def handle_data(self, data: str) -> None:
        self._open[-1].inside.append(data)


# --- the tree as Markdown -----------------------------------------------------------------------------------

_PLACE_OF_DRAWING = "\0"


def _blocks(node: _Node) -> Iterator[str]:
    """Yield the paragraphs, lists, tables and headings of a node; loose text between them is a paragraph."""
    writer = _WRITERS.get(node.tag)
    if writer is not None:
        text = writer(node)
        yield from [text] if text else []
        return
    for is_block, parts in groupby(node.inside, key=_is_block):
        if is_block:
            for part in parts:
                yield from _blocks(part) if part.tag not in _LEFT_OUT else ()
        elif text := _inline(parts):
            yield text


def _is_block(part: "_Node | str") -> bool:
    return isinstance(part, _Node) and part.tag in _BLOCKS


def _inline(parts: "Iterable[_Node | str]") -> str:
    """Return parts as one run of Markdown; blocks among them are parted by line breaks, as in a cell of a table."""
    pieces: list[str] = []
    for part in parts:
        if isinstance(part, str):
            pieces.append(_SPECIAL.sub(r"\\\g<0>", re.sub(r"\s+", " ", part)))
        elif part.tag not in _LEFT_OUT:
            text = _INLINE.get(part.tag, _plain)(part)
            pieces.append(f"{text}<br>" if part.tag in _BLOCKS and text else text)
    return "".join(pieces).strip().removesuffix("<br>")


def _plain(node: _Node) -> str:
    return _inline(node.inside)


def _text(node: _Node) -> str:
    return "".join(part if isinstance(part, str) else _text(part) for part in node.inside)


def _link(node: _Node) -> str:
    address = node.attributes.get("href", "")
    is_page = address.endswith("/") and "//" not in address
    return f"[{_plain(node)}]({PurePosixPath(address) / 'index.md' if is_page else address})"


def _around(before: str, after: str) -> Callable[[_Node], str]:
    def write(node: _Node) -> str:
        text = _plain(node)
        return f"{before}{text}{after}" if text else ""

    return write


_INLINE: dict[str, Callable[[_Node], str]] = {
    "a": _link,
    "b": _around("**", "**"),
    "br": lambda _: "<br>",
    "code": lambda node: f"`{_text(node)}`",
    "sub": _around("<sub>", "</sub>"),
    "wbr": lambda _: _PLACE_OF_DRAWING,
}


def _items(marker: str) -> Callable[[_Node], str]:
    return lambda node: "\n".join(f"{marker} {_plain(item)}" for item in _below(node, "li"))


def _definitions(node: _Node) -> str:
    pairs = zip(_below(node, "dt"), _below(node, "dd"), strict=True)
    return "\n".join(f"- **{_plain(term)}**: {_plain(meaning)}" for term, meaning in pairs)


def _table(node: _Node) -> str:
    rows = [f"| {' | '.join(_plain(cell) for cell in _below(row, 'th', 'td'))} |" for row in _below(node, "tr")]
    caption = [f"{_plain(each)}\n" for each in _below(node, "caption")]
    return "\n".join([*caption, rows[0], "|---" * (rows[0].count(" | ") + 1) + "|", *rows[1:]])


def _below(node: _Node, *tags: str) -> list[_Node]:
    """Return the nearest nodes of these tags below a node."""
    found: list[_Node] = []
    for part in node.inside:
        if isinstance(part, _Node):
            found += [part] if part.tag in tags else _below(part, *tags)
    return found


_WRITERS: dict[str, Callable[[_Node], str]] = {
    **{heading: _around(f"{'#' * level} ", "") for level, heading in enumerate(_HEADINGS, start=1)},
    **dict.fromkeys(("p", "summary", "figcaption"), _plain),
    "ul": _items("-"),
    "ol": _items("1."),
    "dl": _definitions,
    "table": _table,
    "pre": lambda node: f"```\n{_text(node).strip()}\n```",
}
