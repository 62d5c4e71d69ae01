"""What an entry, a prediction, a whole build and the search cost: `make bench`.

usage: python -m tests.bench [--batch]    --batch adds 10,000 predictions, on one process and on two; some minutes

Milliseconds of CPU time per entry over the demonstration book, in one process, and each as a ratio to a baseline of
the same run: PyYAML's own C loader over the same files, which only builds values. Ratios can be compared between
machines, milliseconds cannot. Predictions likewise: over the open outcome cases with nothing remembered of any
structure, beside what RDKit takes to read and write the same substrates.
"""

import datetime as dt
import gc
import io
import itertools
import json
import os
import random
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from statistics import median, quantiles
from types import ModuleType
from typing import Any

import yaml
from rdkit import Chem

from builder.book import Book, examine, open_book
from builder.checks.case import Case, forecast_for
from builder.checks.hazards.meetings import find_hazards
from builder.checks.register import RECORD_CHECKS
from builder.checks.run import check_record
from builder.mechanism.batch import Answer, answers, lines_of
from builder.mechanism.products import search_routes
from builder.publish.pages import build_pages
from builder.publish.portrait import portrait_of
from builder.publish.schemes import entry_scheme
from builder.records.reader import Reading, read_record
from tests.build_bench import print_build
from tests.outcomes import CaseSet, answer_to, load_cases
from tests.search_bench import print_search

ROOT = Path(__file__).parents[1]
TODAY = dt.date(2026, 12, 1)
REPEATS = 3
DEAREST = 6
PREDICTIONS = 500
BATCH = 10_000
EARLY = 1_000
"""Predictions after which the memory of a batch is first looked at."""
MEDIAN_MS, NINETY_FIVE_MS, SPEED_UP, GROWTH = 5.0, 30.0, 1.7, 1.5


def _cpu_ms(work: Callable[[], object], entries: int, forget: Callable[[], None] = lambda: None) -> float:
    """Return the least CPU time of a few runs, in ms per entry; `forget` empties the caches before each."""
    best = float("inf")
    for _ in range(REPEATS):
        forget()
        start = time.process_time()
        work()
        best = min(best, time.process_time() - start)
    return 1000.0 * best / entries


def _again_ms(work: Callable[[tuple[Case, Reading]], object], opened: Sequence[tuple[Case, Reading]]) -> float:
    """Return the CPU time, in ms per entry, of work on one entry done again, its forecast and routes remembered."""
    spent = 0.0
    for each in opened:
        work(each)
        start = time.process_time()
        for _ in range(REPEATS):
            work(each)
        spent += time.process_time() - start
    return 1000.0 * spent / (REPEATS * len(opened))


def _forget() -> None:
    search_routes.cache_clear()
    find_hazards.cache_clear()
    forecast_for.cache_clear()


def _verdict(words: str, *, is_met: bool) -> str:
    return f"   [{words}: {'ok' if is_met else 'MISSED'}]"


# --- entries --------------------------------------------------------------------------------------------------


def print_entries() -> None:
    """Print what the demonstration book costs to read, check, draw and emit."""
    folder = ROOT / "entries"
    files = sorted(folder.rglob("NS*.yml"))
    texts = [path.read_text("utf-8-sig") for path in files]
    book: Book[Case] = open_book(folder, today=TODAY)  # also warms what every run needs once: units, tables, patterns
    portrayed = open_book(folder, today=TODAY, keep=portrait_of)
    readings: list[Reading] = [read_record(path, path.name) for path in files]
    baseline = _cpu_ms(lambda: [yaml.load(text, Loader=yaml.CSafeLoader) for text in texts], len(files))
    opened = [(entry.kept, reading) for entry in book.entries for reading in readings if _is_of(reading, entry.id)]
    steps = {
        "full check": _cpu_ms(lambda: open_book(folder, today=TODAY, keep=_nothing), len(files), _forget),
        "read": _cpu_ms(lambda: [read_record(path, path.name) for path in files], len(files)),
        "examine": _cpu_ms(lambda: [examine(each, book.settings, TODAY) for each in readings], len(files), _forget),
        "checks alone": _again_ms(lambda at: check_record(at[0], at[1].places), opened),
        "draw": _cpu_ms(lambda: [entry_scheme(entry.kept) for entry in book.entries], len(book.entries)),
        "emit": _cpu_ms(lambda: [page.write() for page in build_pages(portrayed)], len(book.entries)),
    }
    print(f"{len(files)} entries, CPU ms per entry; ratio to yaml.load with CSafeLoader of the same files")
    print("full check: the whole `handbook check`; checks alone: without reading, structures, forecasts and routes")
    print(f"{'baseline':<14}{baseline:8.2f}")
    for name, cost in steps.items():
        print(f"{name:<14}{cost:8.2f}   x{cost / baseline:.1f}")
    print("The dearest checks: " + ", ".join(f"{name} {cost:.2f}" for name, cost in _dearest(opened)))


def _nothing(_: Case) -> None:
    """Keep nothing of a case, as `handbook check` does."""


def _is_of(reading: Reading, entry: str) -> bool:
    return reading.record is not None and reading.record.entry == entry


def _dearest(opened: Sequence[tuple[Case, Reading]]) -> list[tuple[str, float]]:
    """Return the checks that take the most, with ms per entry, what they share with others remembered."""
    costs = {
        check.id: _again_ms(lambda at, look=check.look: list(look(at[0])), opened)
        for check in RECORD_CHECKS
        if check.look is not None
    }
    return sorted(costs.items(), key=lambda item: -item[1])[:DEAREST]


# --- predictions ----------------------------------------------------------------------------------------------


def print_predictions() -> None:
    """Print what one prediction costs, from a line of a batch to its answer, counterfactuals left out."""
    cases = load_cases(CaseSet.OPEN)
    for case in cases:
        answer_to(case)  # tables and patterns are read once
    forgettable = list(_caches_of_structures())
    costs: list[float] = []
    while len(costs) < PREDICTIONS:
        for cache in forgettable:
            cache.cache_clear()
        for case in cases:
            start = time.process_time()
            answer_to(case)
            costs.append(1000 * (time.process_time() - start))
    substrates = [case["substrate"] for case in cases]
    baseline = _cpu_ms(lambda: [Chem.MolToSmiles(Chem.MolFromSmiles(s)) for s in substrates], len(cases))
    middle, ninety_five = median(costs), quantiles(costs, n=20)[-1]
    print(
        f"\n{len(costs)} predictions, CPU ms each, {len(forgettable)} caches of structures emptied every {len(cases)}"
    )
    print(f"{'baseline':<10}{baseline:8.2f}   RDKit reads and writes the substrate")
    for name, cost, goal in (("median", middle, MEDIAN_MS), ("95 % in", ninety_five, NINETY_FIVE_MS)):
        print(f"{name:<10}{cost:8.2f}   x{cost / baseline:<6.0f}{_verdict(f'≤ {goal:g} ms', is_met=cost <= goal)}")


def _caches_of_structures() -> Iterator[Any]:
    """Yield the caches of the package that have a bound: those without one hold tables, which are read once."""
    seen: set[int] = set()
    modules = [m for name, m in sorted(sys.modules.items()) if name.startswith("builder.") and type(m) is ModuleType]
    for value in itertools.chain.from_iterable(vars(module).values() for module in modules):
        parameters = getattr(value, "cache_parameters", None)
        if parameters is not None and parameters()["maxsize"] is not None and id(value) not in seen:
            seen.add(id(value))
            yield value


def print_batch() -> None:
    """Print how a long batch gains from a second process, and whether its memory stays flat."""
    text = _batch_text()
    memory = {}
    start = time.perf_counter()
    for place, _ in enumerate(_answers(text, 1), 1):
        if place in {EARLY, BATCH}:
            gc.collect()
            memory[place] = _resident_mb()
    alone = time.perf_counter() - start
    start = time.perf_counter()
    errors = sum(answer.is_error for answer in _answers(text, 2))
    gain = alone / (time.perf_counter() - start)
    growth = memory[BATCH] / memory[EARLY]
    load = os.getloadavg()[0]  # a machine at other work shows too small a gain
    print(f"\n{BATCH} predictions: {alone:.0f} s on one process, {1000 * alone / BATCH:.1f} ms each; {errors} errors")
    verdict = _verdict(f"≥ {SPEED_UP}", is_met=gain >= SPEED_UP)
    print(f"{'speed-up':<10}{gain:8.2f}   on two processes, load {load:.1f}{verdict}")
    print(
        f"{'memory':<10}{memory[BATCH]:8.0f}   MB at the end, {memory[EARLY]:.0f} after {EARLY}"
        f"{_verdict(f'at most x{GROWTH}', is_met=growth <= GROWTH)}"
    )


def _no_cautions(*_: object) -> tuple[dict[str, str], ...]:
    return ()


def _answers(text: bytes, processes: int) -> Iterator[Answer]:
    return answers(lines_of(io.BytesIO(text)), processes, _no_cautions)


def _batch_text() -> bytes:
    """Return different questions over a quarter as many substrates, in an order that is the same every time."""
    frames = ("{0}OC{1}{2}", "{0}C({1}){2}", "{0}C(C){1}C{2}", "{0}C(C)({1}){2}", "c1ccccc1{0}C({1}){2}")
    chains = ["C" * length for length in range(1, 11)]
    leaving = ("Cl", "Br", "I", "OS(C)(=O)=O", "OS(=O)(=O)c1ccc(C)cc1")
    reagents = (("sodium azide", "DMF"), ("sodium methoxide", "methanol"), ("water", "ethanol"), ("KOtBu", "DMSO"))
    lines = [
        {
            "id": f"{frame} {left} {right} {group} {reagent}",
            "substrate": frame.format(left, right, group),
            "nucleophile": reagent,
            "solvent": [[solvent, 1.0]],
            "temperature_C": 25,
        }
        for frame, left, right, group, (reagent, solvent) in itertools.product(
            frames, chains, chains, leaving, reagents
        )
    ]
    random.Random(BATCH).shuffle(lines)
    return "".join(f"{json.dumps(line)}\n" for line in lines[:BATCH]).encode()


def _resident_mb() -> float:
    pages = int(Path("/proc/self/statm").read_text("ascii").split()[1])
    return pages * 4096 / 2**20


def main() -> int:
    """Print the tables."""
    print_entries()
    print_predictions()
    print_build()
    print_search()
    if "--batch" in sys.argv:
        print_batch()
    return 0


if __name__ == "__main__":
    sys.exit(main())
