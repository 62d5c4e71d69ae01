"""How to add an entry, and how to cite one."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from builder.book import Book
from builder.chemistry.perception import leaving_group_names, site_class_meanings, site_class_names
from builder.finding import Level
from builder.publish.figures import capital
from builder.publish.page import Page
from builder.publish.portrait import Portrait
from builder.publish.templating import deferred
from builder.records.house_rules import HouseRule
from builder.records.schema import record_schema
from builder.records.specimen import SPECIMEN_FILE, sample_text

__all__ = ["FormatPart", "FormatRow", "HouseRuleRow", "format_parts", "guide_pages", "house_rule_row"]

_SUBSTANCE = "Nucleophile"
"""The part whose keys every charged substance has; the others list only what they add."""


@dataclass(frozen=True, slots=True)
class FormatRow:
    """One key of a part of the record: whether it is required there, what it takes, and what that says."""

    key: str
    required: bool
    takes: str
    meaning: str


@dataclass(frozen=True, slots=True)
class FormatPart:
    """One part of the record with its keys.

    places: the keys under which it stands ("nucleophile", "base"); empty for the record itself.
    beyond: the part whose keys it has as well, not listed again.
    """

    places: tuple[str, ...]
    meaning: str
    beyond: str
    rows: tuple[FormatRow, ...]


@dataclass(frozen=True, slots=True)
class HouseRuleRow:
    """A house rule as people read it: what, why, and how it is checked; the last two may be empty."""

    statement: str
    because: str
    how: str


def house_rule_row(line: str | HouseRule) -> HouseRuleRow:
    """Return what the page says of a house rule; a sentence stands as it is."""
    if isinstance(line, str):
        return HouseRuleRow(line, "", "")
    since = f" from {line.since} on" if line.since else ""
    answer = "may be set aside with a reason" if line.weight is Level.QUERY else "without exception"
    how = f"checked{since}, {answer}" if line.demand else ""
    return HouseRuleRow(capital(line.statement), line.because, how)


def format_parts(schema: Mapping[str, Any]) -> tuple[FormatPart, ...]:
    """Return the parts of the record format in the order in which a record holds them, from its JSON Schema."""
    places: dict[str, list[str]] = {}
    parts: dict[str, Mapping[str, Any]] = {}
    waiting = [("", schema)]
    while waiting:
        key, part = waiting.pop(0)
        places.setdefault(part["title"], []).append(key)
        if part["title"] in parts:
            continue
        parts[part["title"]] = part
        waiting.extend(
            (f"{key}.{name}".strip("."), below)
            for name, node in part["properties"].items()
            if (below := _part_of(node, schema)) is not None
        )
    return tuple(_format_part(part, places[title], schema) for title, part in parts.items())


def guide_pages(book: Book[Portrait]) -> tuple[Page, ...]:
    """Return the two guides."""
    schema = record_schema(site_class_names(), leaving_group_names())
    meanings = site_class_meanings()
    example = next((entry.id for entry in book.entries if not entry.record.status.is_retired), Path(SPECIMEN_FILE).stem)
    return (
        Page(
            kind="guide",
            path="how-to-add/",
            title="How to add an entry",
            description="From the bench to the book: write the record, check it, ask for review.",
            write=deferred(
                "how_to_add.html",
                sample=sample_text(),
                sample_file=SPECIMEN_FILE,
                format_parts=format_parts(schema),
                classes=[(name, meanings[name]) for name in site_class_names()],
                leaving_groups=leaving_group_names(),
                house_rules=[house_rule_row(line) for line in book.settings.house_rules],
                root="../",
            ),
            menu="Add",
        ),
        Page(
            kind="guide",
            path="how-to-cite/",
            title="How to cite",
            description="Identifier, revision and digest name one experiment for good.",
            write=deferred("how_to_cite.html", settings=book.settings, example=example, root="../"),
            menu="Cite",
        ),
    )


def _format_part(part: Mapping[str, Any], places: Sequence[str], schema: Mapping[str, Any]) -> FormatPart:
    properties = part["properties"]
    substance = set(schema["$defs"][_SUBSTANCE]["properties"])
    beyond = "nucleophile" if part["title"] != _SUBSTANCE and substance <= set(properties) else ""
    required = part.get("required", ())
    rows = tuple(
        FormatRow(name, name in required, _takes(node, schema), node["description"])
        for name, node in properties.items()
        if not beyond or name not in substance
    )
    return FormatPart(tuple(filter(None, places)), part.get("description", ""), beyond, rows)


def _resolve(node: Mapping[str, Any], schema: Mapping[str, Any]) -> Mapping[str, Any]:
    while "$ref" in node:
        node = schema["$defs"][node["$ref"].rsplit("/", 1)[-1]]
    return node


def _choices(node: Mapping[str, Any]) -> tuple[Mapping[str, Any], ...]:
    """Return what a key may take instead: the schemas of anyOf, or the two branches of if/then/else."""
    return (*node.get("anyOf", ()), *(node[branch] for branch in ("then", "else") if branch in node))


def _part_of(node: Mapping[str, Any], schema: Mapping[str, Any]) -> Mapping[str, Any] | None:
    """Return the mapping a key takes, also where it takes a list of them."""
    node = _resolve(node, schema)
    if "properties" in node:
        return node
    below = [*_choices(node), *([node["items"]] if isinstance(node.get("items"), dict) else [])]
    return next((part for choice in below if (part := _part_of(choice, schema)) is not None), None)


def _takes(node: Mapping[str, Any], schema: Mapping[str, Any]) -> str:
    """Return in a few words what a key takes."""
    node = _resolve(node, schema)
    if "const" in node:
        return str(node["const"])
    if "enum" in node:
        words = [str(word) for word in node["enum"]]
        return " | ".join(words) if len(words) <= 9 else f"one of {len(words)} words, listed below"
    if "properties" in node:
        return "keys of its own"
    one = node.get("else")
    if one is not None and node["then"].get("items") == one:
        return f"{_takes(one, schema)}, or a list"
    if choices := _choices(node):
        return " or ".join(dict.fromkeys(_takes(choice, schema) for choice in choices))
    if "x-units" in node:
        return f"such as {node['examples'][0]} ({', '.join(node['x-units'])})"
    if "examples" in node:
        return f"such as {node['examples'][0]}"
    if "prefixItems" in node:
        return f"[{', '.join(_takes(item, schema) for item in node['prefixItems'])}]"
    if node.get("type") == "array":
        item = node.get("items")
        return f"a list: {_takes(item, schema)}" if isinstance(item, dict) else "a list"
    return _PLAIN.get(node.get("type", ""), "text")


_PLAIN = {"integer": "a whole number", "number": "a number", "boolean": "true | false"}
