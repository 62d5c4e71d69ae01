"""The form that writes an entry: fields, words, units and conditions of the JSON Schema as the data of a script.

The script (`site_overrides/assets/form.js`) knows kinds of controls, no key, word or unit of the format; in which
order sections stand and what is folded away is said here.
"""

from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from builder.book import Book
from builder.chemistry.perception import leaving_group_names, site_class_names
from builder.publish.page import Asset, Page, Written
from builder.publish.portrait import Portrait
from builder.publish.search_index import as_script
from builder.publish.templating import render
from builder.records.fields import MARKUP
from builder.records.identifiers import CROCKFORD, DRAWN, PREFIX
from builder.records.model import CHARGED_KEYS, KINDS_OF_MEASUREMENT
from builder.records.quantities import writing_aids
from builder.records.schema import RECORD_SCHEMA, modeline, record_schema
from builder.records.specimen import specimen_text
from builder.records.vocabulary import Result, Status

__all__ = [
    "FORM_PATH",
    "LEFT_OUT",
    "SECTIONS",
    "SET_BY_THE_FORM",
    "Section",
    "form_data",
    "form_page",
    "new_file_address",
]

FORM_PATH = "how-to-add/form/"
_DATA = "assets/form-data.js"


@dataclass(frozen=True, slots=True)
class Section:
    """A part of the form under one heading. keys: of the record. lead: what to know before filling it in."""

    id: str
    title: str
    keys: tuple[str, ...]
    lead: str = ""
    folded: bool = False


SECTIONS = (
    Section("who", "Who and when", ("title", "performed", "notebook", "status")),
    Section("substrate", "Substrate", ("substrate",), "Type one quantity: mass, amount or volume."),
    Section(
        "attack",
        "Nucleophile and base",
        ("nucleophile", "base"),
        "At least one of the two, each with one quantity: mass, amount, volume or equivalents.",
    ),
    Section("reagents", "Reagents", ("reagents",), "Acids, activators, catalysts, additives; none is fine."),
    Section(
        "solvent",
        "Solvent",
        ("solvent", "neat", "concentration"),
        "Volumes for all solvents; or fractions for all, with the concentration.",
    ),
    Section("stages", "Stages", ("stages",), "One for each temperature held or addition made."),
    Section("outcome", "Outcome", ("outcome",), "A failed reaction is as welcome: name what was sought and the cause."),
    Section("work-up", "Work-up", ("work_up",)),
    Section("evidence", "Evidence and take-away", ("evidence", "take_away")),
    Section(
        "safety",
        "Safety review",
        ("safety_review",),
        "Azides, cyanides, hydrides, peroxides and their like may need one: the build asks where a hazard is grave.",
    ),
    Section(
        "rest",
        "The rest",
        ("procedure", "scale_limit", "thermal", "related", "preceded_by", "disclosure", "reviewed", "rxn_file"),
        folded=True,
    ),
)
SET_BY_THE_FORM = ("format", "entry", "revision")
LEFT_OUT = ("accepted", "superseded", "withdrawn")
"""Keys that answer to what comes later: a finding of the check, a better entry, a doubt."""

_SELDOM = frozenset(
    {"inchi", "from_rxn", "cas", "purity", "form", "density", "strength"}
    | {"over", "pressure", "vessel_volume", "gives", "spread", "n", "note"}
)
"""Keys that stand folded behind the others of their part, where they are not required."""
_SELDOM_OF = {"Substrate": {"equivalents"}, "Solvent": {"smiles", "mass", "amount", "equivalents"}}
_SPELLED = {
    "smiles": "SMILES",
    "inchi": "InChI",
    "from_rxn": "From RXN",
    "cas": "CAS number",
    "sha256": "SHA-256",
    "rxn_file": "RXN file",
    "td24": "T_D24",
    "mtt": "MTT",
    "ee": "ee",
    "er": "er",
    "dr": "dr",
    "n": "n",
    "work_up": "Work-up",
    "take_away": "Take-away",
}
_ONE_OF = {"measured": "measurement", "evidence": "file"}
_ONLY_FOR = {
    # what a measurement line has beside its value -> the kinds it belongs to
    "kind": ("yield",),
    "mass": ("yield", "recovered"),
    "purity": ("yield", "recovered"),
}
_STARTS = frozenset({"nucleophile", "solvent", "products", "measured"})
"""Lists of which nearly every record has one, beside those that are required."""
_LONG = frozenset({"procedure", "note", "take_away", "cause", "scope", "scale_limit"})
"""Texts that want more than a line."""
_FAILED = tuple(str(result) for result in Result if not result.gives_products)
_OPENS_AFTER = {"sought": _FAILED, "failure": _FAILED}
"""Keys under which the substances stand that a stage adds by name."""
_SHAPED = ("pattern", "format", "maxLength", "x-measures", "x-units", "x-bounds")


def form_page(book: Book[Portrait]) -> Page:
    """Return the page of the form, with the data it is made of."""
    schema = record_schema(site_class_names(), leaving_group_names())
    data = form_data(schema, taken=_taken(book), people=[person.code for person in book.settings.people])
    root = "../../"
    return Page(
        kind="guide",
        path=FORM_PATH,
        title="Add an entry by form",
        description="Fill in a form, take the file, open a pull request; no YAML needed.",
        section="how-to-add/",
        write=lambda: Written(
            render(
                "form.html",
                root=root,
                specimen=specimen_text(),
                new_file=new_file_address(book.settings.edit_address),
            ),
            render("form_rail.html"),
        ),
        assets=(Asset(_DATA, as_script("handbookFormat", data).encode()),),
        styles=("assets/form.css",),
        scripts=(_DATA, "assets/chemistry.js", "assets/record.js", "assets/form.js"),
    )


def form_data(schema: Mapping[str, Any], *, taken: Sequence[str], people: Sequence[str]) -> dict[str, object]:
    """Return what the script of the form needs to know, as plain data.

    taken: identifiers that must not be drawn again. people: codes the book knows; empty if it keeps no list.
    """
    parts = [schema, *(part for part in schema["$defs"].values() if "properties" in part)]
    return {
        "record": schema["title"],
        "sections": [asdict(section) for section in SECTIONS],
        "parts": {part["title"]: _part(part, schema) for part in parts},
        "aids": {**writing_aids(), "markup": MARKUP.pattern},
        "identifier": {"prefix": PREFIX, "letters": CROCKFORD, "drawn": DRAWN, "taken": "".join(sorted(taken))},
        "people": list(people),
        "modeline": modeline(RECORD_SCHEMA),
    }


def _taken(book: Book[Portrait]) -> list[str]:
    return sorted({*(entry.id for entry in book.entries), *book.settings.retired})


def new_file_address(edit_address: str | None) -> str | None:
    """Return where a forge takes a new file, from where it edits one; None for an address of another pattern.

    GitHub and GitLab have /new/ beside /edit/, Forgejo and Gitea /_new/ beside /_edit/ (from memory).
    """
    for edit, new in (("/edit/", "/new/"), ("/_edit/", "/_new/")):
        if edit_address and edit in edit_address:
            return edit_address.replace(edit, new)
    return None


def _part(part: Mapping[str, Any], schema: Mapping[str, Any]) -> dict[str, object]:
    title, required = part["title"], part.get("required", ())
    left_out = {*LEFT_OUT} if part is schema else set()
    fields = [
        _field(title, key, node, schema, is_required=key in required)
        for key, node in part["properties"].items()
        if key not in left_out
    ]
    about: dict[str, object] = {"fields": fields}
    conditions = [each for each in part.get("allOf", ()) if not left_out & _keys_in(each)]
    if conditions:
        about["conditions"] = conditions
    if title == "Measurement":
        about["exactly"] = list(KINDS_OF_MEASUREMENT)
    return about


def _keys_in(condition: Any) -> set[str]:
    """Return every word of a condition of the schema, keys of the record among them."""
    if isinstance(condition, dict):
        return set().union(*map(_keys_in, condition.values()), condition)
    if isinstance(condition, list):
        return set().union(*map(_keys_in, condition))
    return {str(condition)}


def _field(
    part: str, key: str, node: Mapping[str, Any], schema: Mapping[str, Any], *, is_required: bool
) -> dict[str, object]:
    field: dict[str, object] = {
        "key": key,
        "label": _SPELLED.get(key, key.replace("_", " ").capitalize()),
        "means": node["description"],
        **_control(node, schema),
    }
    if is_required:
        field["required"] = True
    elif key in _SELDOM or key in _SELDOM_OF.get(part, ()):
        field["seldom"] = True
    if field["is"] in {"list", "mixed", "choice"}:
        field["one"] = _ONE_OF.get(key, key.removesuffix("s").replace("_", " "))
    if part == "Measurement" and key in _ONLY_FOR:
        field["only_for"] = _ONLY_FOR[key]
    if part == "Outcome" and key in _OPENS_AFTER:
        field["opens_after"] = {"result": _OPENS_AFTER[key]}
    if key == "of" and "of" in field:
        field["words"] = ["substrate"]
    if part == "Stage" and key == "add":
        field["names_of"] = list(CHARGED_KEYS)
    if key == "title":
        field["wide"] = True
    if key in _LONG:
        field["long"] = True
    if key in _STARTS:
        field["starts"] = True
    if key == "status":
        field["has_preset"] = True
        field["words"] = [str(status) for status in Status if not status.is_retired]
    return field


def _control(node: Mapping[str, Any], schema: Mapping[str, Any]) -> dict[str, object]:
    """Return which control takes a value of this schema, and what limits it."""
    while "$ref" in node:
        node = schema["$defs"][node["$ref"].rsplit("/", 1)[-1]]
    if "const" in node:
        return {"is": "fixed", "text": str(node["const"])}
    if "enum" in node:
        return {"is": "word", "words": [str(word) for word in node["enum"]]}
    if "properties" in node:
        return {"is": "part", "part": node["title"]}
    if "if" in node:
        return _alternatives(node, schema)
    kind = node.get("type")
    if kind == "array":
        return _many(node["items"], schema)
    if kind == "boolean":
        return {"is": "word", "words": ["true", "false"], "flag": True}
    if kind in {"integer", "number"}:
        limits = {"least": node.get("minimum"), "above": node.get("exclusiveMinimum"), "most": node.get("maximum")}
        return {"is": str(kind), "example": str(node.get("examples", [""])[0])} | _given(limits)
    return {"is": "text", "example": str(node.get("examples", [""])[0])} | _given({k: node.get(k) for k in _SHAPED})


def _alternatives(node: Mapping[str, Any], schema: Mapping[str, Any]) -> dict[str, object]:
    """Return the control of a value that is one or a list of them, or a text or a mapping."""
    text, more = node["then"], node["else"]
    if text.get("items") == more:
        return _many(more, schema)
    one = _control(text, schema)
    if one["is"] == "word":
        return {**_control(more, schema), "is": "choice", "words": one["words"]}
    return _control(more, schema)


def _many(item: Mapping[str, Any], schema: Mapping[str, Any]) -> dict[str, object]:
    if "prefixItems" in item:
        return {"is": "points", "of": [_control(each, schema) for each in item["prefixItems"]]}
    if "if" in item and _control(item["then"], schema)["is"] == "text":
        return {"is": "mixed", "text": _control(item["then"], schema), "of": _control(item["else"], schema)}
    return {"is": "list", "of": _control(item, schema)}


def _given(limits: Mapping[str, object]) -> dict[str, object]:
    return {key.removeprefix("x-"): value for key, value in limits.items() if value is not None}
