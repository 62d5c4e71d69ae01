"""Outcome cases: what is published of a reaction beside what the engine answers, and how the answer is scored.

One case a line in data/cases-*.jsonl, in the form of a batch of `handbook predict`, with what was found under
`expected`; every line carries its source and how it is known. An answer is the plain value of `predict`. A case asks up
to four questions: mechanism, main product, course, and whether the product is rearranged.
"""

import json
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from functools import cache
from pathlib import Path
from typing import Any

from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.answer import answer_of
from builder.mechanism.asking import AskingError, question_from_line
from builder.mechanism.engine import predict
from builder.mechanism.rate_terms import Parameters

__all__ = ["Asked", "CaseSet", "Scored", "Tally", "answer_to", "load_cases", "score", "scores_of", "tally"]

DATA = Path(__file__).parent / "data"
_COURSES = {
    "retention": {"retention", "double_inversion"},
    "double_inversion": {"retention", "double_inversion"},
    "racemisation": {"racemisation", "partial_inversion"},
    "partial_inversion": {"racemisation", "partial_inversion"},
}
"""Answers that count for a published course; only itself for any other."""
_EITHER_FACE = frozenset({"racemisation", "partial_inversion"})
_ELIMINATIONS = frozenset({"E2", "E1", "E1cB"})

Case = Mapping[str, Any]
Answer = Mapping[str, Any]


class CaseSet(StrEnum):
    """The sets, by when they were written: all but the open ones before the engine saw them."""

    OPEN = "open"
    FRESH = "fresh"
    HELD_OUT = "held-out"
    THIRD = "third"
    FOURTH = "fourth"


class Asked(StrEnum):
    """What a case asks."""

    MECHANISM = "mechanism"
    PRODUCT = "product"
    COURSE = "course"
    REARRANGED = "rearranged"


@dataclass(frozen=True, slots=True)
class Scored:
    """One case beside its answer.

    right: for each question the case asks, whether the answer is. misses: what was answered for what, in words.
    is_rearranged, says_rearranged: as published and as answered; elimination_error: in points, None where not asked.
    """

    id: str
    title: str
    tags: tuple[str, ...]
    right: dict[Asked, bool]
    misses: tuple[str, ...]
    is_rearranged: bool
    says_rearranged: bool
    elimination_error: float | None


@dataclass(frozen=True, slots=True)
class Tally:
    """The scores of many cases. by_tag: mechanism right, of all, for each tag."""

    right: Counter[Asked]
    asked: Counter[Asked]
    rearrangements: int
    found: int
    false_alarms: int
    elimination_errors: tuple[float, ...]
    by_tag: dict[str, tuple[int, int]] = field(repr=False)

    def percent(self, question: Asked) -> float:
        """Return the share of right answers to a question, %."""
        return 100 * self.right[question] / self.asked[question]

    def missed(self, question: Asked) -> int:
        """Return how many answers to a question are wrong."""
        return self.asked[question] - self.right[question]


@cache
def load_cases(which: CaseSet) -> tuple[Case, ...]:
    """Return the cases of a set, in file order."""
    lines = (DATA / f"cases-{which}.jsonl").read_text("utf-8").splitlines()
    return tuple(json.loads(line) for line in lines if line)


def answer_to(case: Case, parameters: Parameters | None = None) -> Answer:
    """Return what the engine answers, or under `error` why it cannot be asked."""
    try:
        question = question_from_line(case).question
    except AskingError as fault:
        return {"error": str(fault)}
    return answer_of(predict(question, parameters))


def score(case: Case, answer: Answer) -> Scored:
    """Return which of the questions of a case an answer gets right."""
    expected = case["expected"]
    right: dict[Asked, bool] = {}
    misses: list[str] = []

    def mark(question: Asked, said: object, published: object, *, is_right: bool) -> None:
        right[question] = is_right
        if not is_right:
            misses.append(f"{question} {said} for {published}")

    # an addition through a cation is entered as SN1 in the cases
    mechanism = "SN1" if answer.get("mechanism") == "AdE" else answer.get("mechanism")
    accepted = {expected["dominant"], *expected.get("acceptable", ())}
    mark(Asked.MECHANISM, mechanism, expected["dominant"], is_right=mechanism in accepted)
    major = expected.get("major_product")
    if major and expected["dominant"] != "none":
        said = next((p["smiles"] for p in answer.get("products", ())), None)
        mark(Asked.PRODUCT, said, major, is_right=said is not None and _is_main_product(case, said))
    course = expected.get("stereo")
    if course and course != "not_applicable":
        said = answer.get("stereo")
        mark(Asked.COURSE, said, course, is_right=said in _COURSES.get(course, {course}))
    says_rearranged = bool(answer.get("rearranged"))
    if expected.get("rearranged") is not None:
        is_right = says_rearranged == bool(expected["rearranged"])
        mark(Asked.REARRANGED, says_rearranged, expected["rearranged"], is_right=is_right)
    if "error" in answer:
        misses.append(f"error: {answer['error']}")
    return Scored(
        id=case["id"],
        title=case["title"],
        tags=tuple(case.get("tags", ())),
        right=right,
        misses=tuple(misses),
        is_rearranged=bool(expected.get("rearranged")),
        says_rearranged=says_rearranged,
        elimination_error=_elimination_error(expected, answer.get("shares") or {}),
    )


def tally(scored: Iterable[Scored]) -> Tally:
    """Return the scores added up."""
    cases = list(scored)
    tags: dict[str, list[bool]] = {}
    for case in cases:
        for tag in case.tags:
            tags.setdefault(tag, []).append(case.right[Asked.MECHANISM])
    return Tally(
        right=Counter(q for case in cases for q, is_right in case.right.items() if is_right),
        asked=Counter(q for case in cases for q in case.right),
        rearrangements=sum(case.is_rearranged for case in cases),
        found=sum(case.is_rearranged and case.says_rearranged for case in cases),
        false_alarms=sum(case.says_rearranged and not case.is_rearranged for case in cases),
        elimination_errors=tuple(c.elimination_error for c in cases if c.elimination_error is not None),
        by_tag={tag: (sum(found), len(found)) for tag, found in sorted(tags.items())},
    )


def _elimination_error(expected: Mapping[str, Any], shares: Mapping[str, float]) -> float | None:
    published = expected.get("elimination_percent")
    if published is None or not shares or expected["dominant"] == "none":
        return None
    eliminated = sum(share for mechanism, share in shares.items() if mechanism in _ELIMINATIONS)
    return abs(100 * eliminated / sum(shares.values()) - published)


# --- the main product -----------------------------------------------------------------------------------------


def _is_main_product(case: Case, said: str) -> bool:
    """Say whether a product is the published one, configuration counted as far as the case can tell it."""
    answered, accepted = _organic(said), _accepted_products(case)
    if answered in accepted:
        return True
    is_either_face = case["expected"].get("stereo") in _EITHER_FACE
    if not is_either_face or _organic(case["expected"]["major_product"]).stereocentres.total > 1:
        return False
    return answered.flat_smiles in {product.flat_smiles for product in accepted}


def _accepted_products(case: Case) -> set[Structure]:
    """Return the published product, with its mirror image or formula without stereo where these say the same.

    In aqueous mixtures alcohol and ether form side by side, and labels tell two halves apart: each counts.
    """
    expected = case["expected"]
    substrate, major = _organic(case["substrate"]), _organic(expected["major_product"])
    accepted = {major}
    if substrate == substrate.mirror_image or expected.get("stereo") == "racemisation":
        accepted.add(major.mirror_image)
    if expected.get("stereo") in _EITHER_FACE:
        accepted.add(major.flat)
    solvents = [name for name, _ in case["solvent"]]
    is_shared_with_water = "water" in solvents and len(solvents) > 1 and expected["dominant"] in {"SN1", "NGP"}
    if is_shared_with_water or "label" in case["title"].lower():
        accepted |= {_organic(other) for other in expected.get("other_products") or ()}
    return accepted


def _organic(smiles: str) -> Structure:
    """Return the largest species that holds carbon."""
    return parse_smiles(smiles).fragments[0]


def scores_of(cases: Sequence[Case], parameters: Parameters | None = None) -> list[Scored]:
    """Return every case scored against the engine's answer."""
    return [score(case, answer_to(case, parameters)) for case in cases]
