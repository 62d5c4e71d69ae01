"""How far gates and transformations reach, on outcome cases from the literature: `make eval`.

For each case of tests/data/cases-open.jsonl (source and how it is known stand in every line): does the published
main product follow from what was charged, and is the published mechanism open at a reacting carbon? The answers are
about what is possible; which pathway wins is a matter of rates.
"""

import json
import sys
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from builder.chemistry.perception import attacking_atoms, perceive_sites
from builder.chemistry.structure import Structure, StructureError, parse_smiles
from builder.mechanism.products import search_routes
from builder.mechanism.reaction import SiteInPlay
from builder.mechanism.rules import Situation, closing_gates
from builder.mechanism.solvents import find_solvent
from builder.records.vocabulary import Mechanism

CASES = Path(__file__).parent / "data" / "cases-open.jsonl"
# Parts of additive names that stand for an acid or an activator: the cases give many additives as words.
_ACTIVATING = (
    *("H2SO4", "H3PO4", "HCl", "HBr", "HI", "HClO4", "TsOH", "acid", "BF3", "ZnCl2", "AlCl3", "Ag", "HNO2"),
    *("SOCl2", "PBr3", "PCl3", "POCl3", "PPh3", "chloride", "Tf2O", "anhydride", "DEAD", "DIAD", "Br2"),
)


@dataclass(frozen=True)
class Judged:
    """One case: whether its product follows and its mechanism is open; None where the case does not ask."""

    id: str
    title: str
    follows: bool | None
    is_open: bool | None


def judge(case: dict[str, Any]) -> Judged:
    """Judge one case by structures alone."""
    substrate = parse_smiles(case["substrate"])
    flask = tuple(_species(case))
    activated = any(word in additive for additive in case["additives"] for word in _ACTIVATING) or any(
        nucleophile.kind == "hydrogen halide" for each in flask for nucleophile in attacking_atoms(each)
    )
    sites = tuple(SiteInPlay(substrate, site, activated) for site in perceive_sites(substrate))
    expected = case["expected"]
    follows = is_open = None
    if expected.get("major_product") and expected["dominant"] != "none":
        (routes,) = search_routes((parse_smiles(expected["major_product"]),), sites, flask).routes
        follows = any(not route.closed_by for route in routes)
    if expected["dominant"] != "none":
        words = {expected["dominant"], *expected.get("acceptable", [])} - {"none"}
        mechanisms = [Mechanism(word) for word in words]
        situations = [Situation(substrate, each.site, activated) for each in sites]
        is_open = any(not closing_gates(mechanism, s) for mechanism in mechanisms for s in situations)
    return Judged(case["id"], case["title"], follows, is_open)


def _species(case: dict[str, Any]) -> Iterator[Structure]:
    names = [case["nucleophile_smiles"], case["base"], *case["additives"], *(name for name, _ in case["solvent"])]
    for name in names:
        row = find_solvent(name, None) if name else None
        try:
            if name:
                yield parse_smiles(row.smiles if row else name)
        except StructureError:
            continue  # a word without a structure ("Ag2O", "heat") attacks nothing


def main() -> int:
    """Print the scores and, with --misses, what is missed."""
    judged = [judge(json.loads(line)) for line in CASES.read_text("utf-8").splitlines() if line]
    for question, asked in (("main product follows", "follows"), ("mechanism is open", "is_open")):
        answers = Counter(getattr(each, asked) for each in judged if getattr(each, asked) is not None)
        print(f"{question}: {answers[True]}/{answers.total()} = {100 * answers[True] / answers.total():.1f} %")
        if "--misses" in sys.argv:
            for each in judged:
                if getattr(each, asked) is False:
                    print(f"  {each.id} {each.title}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
