"""What a kind of nucleophile or base is like, from nucleophile_kinds.tsv; used where no row names the species."""

from dataclasses import dataclass
from enum import StrEnum
from functools import cache

from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = ["BaseFamily", "Kind", "load_kinds"]


class BaseFamily(StrEnum):
    """Family of a base in E2; each has its own offset from alkoxides."""

    OXYGEN = "oxygen"
    BULKY_ALKOXIDE = "bulky alkoxide"
    NITROGEN = "nitrogen"
    AMIDINE = "amidine"
    AMIDE = "amide"
    SOFT = "soft"
    CARBON = "carbon"
    HALIDE = "halide"
    CARBOXYLATE = "carboxylate"


@dataclass(frozen=True, slots=True, kw_only=True)
class Kind:
    """One row; the table's header gives units.

    base: None for what takes no proton in an E2. anion: the kind left when its proton is taken; None where it has none.
    element: of the ring it closes as a neighbouring group; None where it closes none.
    """

    name: str
    n: float
    error: float
    hardness: float
    desolvation: float
    pka: float
    pka_dmso: float
    base: BaseFamily | None
    anion: str | None
    acid_pka: float | None
    element: str | None
    solvolyses: bool
    source: str


@cache
def load_kinds() -> dict[str, Kind]:
    """Return the kinds by name.

    Raises ValueError for a wrong header, a kind given twice, or an anion that is no kind.
    """
    name = "nucleophile_kinds.tsv"
    columns = ("kind", "n", "error", "hardness", "desolvation", "pka", "pka_dmso", "base", "anion", "acid_pka")
    rows = list(rows_of(name, table_text("builder.mechanism", name), (*columns, "element", "solvolyses", "source")))
    refuse_twice(name, "kind", [row["kind"] for row in rows])
    found = {
        row["kind"]: Kind(
            name=row["kind"],
            n=float(row["n"]),
            error=float(row["error"]),
            hardness=float(row["hardness"]),
            desolvation=float(row["desolvation"]),
            pka=float(row["pka"]),
            pka_dmso=float(row["pka_dmso"]),
            base=None if row["base"] == NOTHING else BaseFamily(row["base"]),
            anion=None if row["anion"] == NOTHING else row["anion"],
            acid_pka=None if row["acid_pka"] == NOTHING else float(row["acid_pka"]),
            element=None if row["element"] == NOTHING else row["element"],
            solvolyses=row["solvolyses"] == "yes",
            source=row["source"],
        )
        for row in rows
    }
    for kind in found.values():
        if kind.anion is not None and kind.anion not in found:
            raise ValueError(f"{name}: {kind.name}: {kind.anion} is no kind")
    return found
