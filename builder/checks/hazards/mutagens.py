"""Mutagenic impurities: structural alerts and the intake limits of ICH M7, from mutagen_alerts.tsv, mutagen_limits.tsv.

They speak of drug substances only; the local quality unit decides.
"""

from dataclasses import dataclass
from functools import cache

from builder.checks.hazards.kinds import hazard_table, kinds_of, load_substance_kinds
from builder.chemistry.structure import Structure
from builder.table import NOTHING

__all__ = ["IntakeLimit", "MutagenAlert", "alert_of", "limits_text", "load_intake_limits", "load_mutagen_alerts"]


@dataclass(frozen=True, slots=True)
class MutagenAlert:
    """One row of mutagen_alerts.tsv; is_of_concern marks the cohort to which the threshold never applies."""

    name: str
    kind: str
    is_of_concern: bool
    note: str
    source: str


@dataclass(frozen=True, slots=True)
class IntakeLimit:
    """One row of mutagen_limits.tsv, in µg a day: of one impurity, and of several together."""

    treatment: str
    one: float
    several: float
    source: str
    revision: str
    read: str


@cache
def load_mutagen_alerts() -> tuple[MutagenAlert, ...]:
    """Return the alerts, those that outweigh others first; ValueError for blanks and unknown kinds or sources."""
    found = tuple(
        MutagenAlert(
            row["alert"],
            row["kind"],
            row["cohort"] == "yes",
            "" if row["note"] == NOTHING else row["note"],
            row["source"],
        )
        for row in hazard_table("mutagen_alerts.tsv", ("alert", "kind", "cohort", "note", "source"))
    )
    if unknown := [alert.kind for alert in found if alert.kind not in load_substance_kinds()]:
        raise ValueError(f"mutagen_alerts.tsv: unknown kind of substance {unknown[0]}")
    return found


@cache
def load_intake_limits() -> tuple[IntakeLimit, ...]:
    """Return the limits, the shortest treatment first; ValueError for blanks and unknown sources."""
    columns = ("treatment", "one", "several", "source", "revision", "read")
    return tuple(
        IntakeLimit(
            row["treatment"],
            float(row["one"]),
            float(row["several"]),
            row["source"],
            row["revision"],
            row["read"],
        )
        for row in hazard_table("mutagen_limits.tsv", columns)
    )


def alert_of(structure: Structure) -> MutagenAlert | None:
    """Return the first alert that a structure shows, None where it shows none."""
    kinds = kinds_of(structure)
    return next((alert for alert in load_mutagen_alerts() if alert.kind in kinds), None)


def limits_text() -> str:
    """Return the intake limits of one impurity in a line."""
    limits = load_intake_limits()
    staged = ", ".join(f"{limit.one:g} µg a day for {limit.treatment}" for limit in limits[:-1])
    return f"{limits[-1].one:g} µg a day for life ({staged})"
