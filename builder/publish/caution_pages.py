"""The table of cautions as a page: what is hazardous, why, what to do, from where, and the entries each row touches."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from builder.book import Book
from builder.checks.hazards.azides import load_azide_limits
from builder.checks.hazards.cautions import WHO_DECIDES, Caution, CautionKind, Severity, load_cautions
from builder.checks.hazards.mutagens import load_intake_limits
from builder.checks.hazards.solvent_limits import load_residual_limits, load_restrictions
from builder.publish.page import Page
from builder.publish.portrait import Portrait
from builder.publish.templating import deferred
from builder.sources import source_text

__all__ = ["CautionView", "LimitTable", "caution_page"]

_SHOWN_ENTRIES = 12
_MEETING = {
    CautionKind.PAIR: "anywhere in the sequence",
    CautionKind.SOLUTION: "in one flask",
    CautionKind.QUENCH: "before it is destroyed",
    CautionKind.NEUTRALISED: "while the mixture is basic",
    CautionKind.ISOLATION: "at the isolation",
    CautionKind.WORK_UP: "at the quench or work-up",
    CautionKind.SCRUBBER: "as gas into a scrubber",
}
_GROUPS = {
    Severity.STOP: (
        "Not without a safety review",
        "An error until the scope of a safety review names it, both partners of a pair.",
    ),
    Severity.WARN: ("Serious", "Shown as a caution on every entry that it touches."),
    Severity.NOTE: ("Good to know", "Shown as a remark."),
}


@dataclass(frozen=True, slots=True)
class CautionView:
    """One row of the table of cautions as the page shows it; entries are (identifier, title), `further` counts more."""

    id: str
    what: str
    hazard: str
    precaution: str
    source: str
    entries: tuple[tuple[str, str], ...]
    further: int


@dataclass(frozen=True, slots=True)
class LimitTable:
    """One table of limits: caption, headings, rows of text; sources: of all rows, or numbered for a last column."""

    title: str
    caption: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    sources: tuple[str, ...]


def caution_page(book: Book[Portrait]) -> Page:
    """Return the page of the table of cautions and of the limits beside it."""
    touched = _touched(book)
    cautions = load_cautions()
    groups = [
        (*_GROUPS[severity], [_view(each, touched) for each in cautions if each.severity is severity])
        for severity in Severity
    ]
    return Page(
        kind="rule",
        path="cautions/",
        title="Cautions",
        description=f"The {len(cautions)} cautions that records are searched for, with source and entries.",
        write=deferred("cautions.html", groups=groups, limits=_limits(), decides=WHO_DECIDES, root="../"),
        section="rules/",
    )


def _touched(book: Book[Portrait]) -> Mapping[str, Mapping[str, str]]:
    """Return by id of the caution the titles of the entries with a finding of it, by identifier."""
    found: dict[str, dict[str, str]] = {}
    for entry in book.entries:
        for finding in entry.findings:
            others = finding.data.get("others")
            named = [finding.data.get("caution"), *(others if isinstance(others, list) else [])]
            for caution in named:
                if isinstance(caution, str):
                    found.setdefault(caution, {})[entry.id] = entry.record.title
    return found


def _view(caution: Caution, touched: Mapping[str, Mapping[str, str]]) -> CautionView:
    entries = sorted(touched.get(caution.id, {}).items())
    return CautionView(
        id=caution.id,
        what=_what(caution),
        hazard=caution.hazard,
        precaution=caution.precaution,
        source=source_text(caution.source),
        entries=tuple(entries[:_SHOWN_ENTRIES]),
        further=max(len(entries) - _SHOWN_ENTRIES, 0),
    )


def _what(caution: Caution) -> str:
    """Return what the caution speaks of: the substances, where they meet, and under which further demand."""
    first = caution.first.name
    if caution.second is None:
        where = "charged or formed" if caution.kind is CautionKind.CHARGED else ""
        parts = [first, where, caution.condition_text]
    else:
        parts = [f"{first} with {caution.second.name}", _MEETING[caution.kind], caution.condition_text]
    return ", ".join(filter(None, parts))


def _range(low: float, below: float) -> str:
    return f"{low:g} and more" if math.isinf(below) else f"{low:g} to below {below:g}"


def _table(title: str, caption: str, columns: Sequence[str], rows: Mapping[tuple[str, ...], str]) -> LimitTable:
    """Return a table from rows and the source of each; each source is stated once, with a number if there are more."""
    sources = tuple(dict.fromkeys(rows.values()))
    if len(sources) == 1:
        return LimitTable(title, caption, tuple(columns), tuple(rows), sources)
    numbered = tuple((*row, str(sources.index(source) + 1)) for row, source in rows.items())
    return LimitTable(title, caption, (*columns, "Source"), numbered, sources)


def _limits() -> Sequence[LimitTable]:
    return (
        _table(
            "Organic azides",
            "How much may be isolated, by (C + O)/N",
            ("(C + O)/N", "Isolated"),
            {
                (
                    _range(row.ratio_from, row.ratio_below),
                    row.words,
                ): f"{source_text(row.source)}, {row.revision}, read {row.read}"
                for row in load_azide_limits()
            },
        ),
        _table(
            "Mutagenic impurities",
            "Acceptable intake in µg a day; drug substances only, not for the cohort of concern; the local quality unit"
            " decides",
            ("Treatment", "One impurity", "All together"),
            {
                (
                    row.treatment,
                    f"{row.one:g} µg a day",
                    f"{row.several:g} µg a day",
                ): f"{source_text(row.source)}, {row.revision}, read {row.read}"
                for row in load_intake_limits()
            },
        ),
        _table(
            "Restricted solvents",
            "Exposure of workers that may not be exceeded (DNEL)",
            ("Solvent", "In air", "On the skin", "Where", "From"),
            {
                (
                    row.name,
                    f"{row.inhalation} mg/m³",
                    f"{row.dermal} mg/kg a day",
                    f"{row.jurisdiction}, entry {row.entry}",
                    row.since,
                ): f"{source_text(row.source)}, read {row.read}"
                for row in load_restrictions().values()
            },
        ),
        _table(
            "Residual solvents",
            "Limits in a drug substance at a dose of 10 g a day",
            ("Solvent", "Class", "At most, ppm", "PDE, mg a day"),
            {
                (
                    row.name,
                    str(row.solvent_class),
                    f"{row.most_ppm:g}",
                    f"{row.pde_mg:g}",
                ): f"{source_text(row.source)}, read {row.read}"
                for row in load_residual_limits().values()
            },
        ),
    )
