"""What an entry costs to read, check, draw and emit: `make bench`.

Milliseconds of CPU time per entry over the demonstration book, in one process, and each as a ratio to a baseline of
the same run: PyYAML's own C loader over the same files, which only builds values. Ratios can be compared between
machines, milliseconds cannot.
"""

import datetime as dt
import sys
import time
from collections.abc import Callable
from pathlib import Path

import yaml

from builder.book import Book, examine, open_book
from builder.checks.cautions import find_hazards
from builder.mechanism.products import search_routes
from builder.publish.pages import build_pages
from builder.publish.schemes import entry_scheme
from builder.records.reader import Reading, read_record

ROOT = Path(__file__).parents[1]
TODAY = dt.date(2026, 12, 1)
REPEATS = 3


def _cpu_ms(work: Callable[[], object], entries: int, forget: Callable[[], None] = lambda: None) -> float:
    """Return the least CPU time of a few runs, in ms per entry; `forget` empties the caches before each."""
    best = float("inf")
    for _ in range(REPEATS):
        forget()
        start = time.process_time()
        work()
        best = min(best, time.process_time() - start)
    return 1000.0 * best / entries


def _forget() -> None:
    search_routes.cache_clear()
    find_hazards.cache_clear()


def main() -> int:
    """Print the table."""
    folder = ROOT / "entries"
    files = sorted(folder.rglob("NS*.yml"))
    texts = [path.read_text("utf-8-sig") for path in files]
    book: Book = open_book(folder, today=TODAY)  # also warms what every run needs once: units, tables, patterns
    readings: list[Reading] = [read_record(path, path.name) for path in files]
    baseline = _cpu_ms(lambda: [yaml.load(text, Loader=yaml.CSafeLoader) for text in texts], len(files))
    steps = {
        "read": _cpu_ms(lambda: [read_record(path, path.name) for path in files], len(files)),
        "check": _cpu_ms(lambda: [examine(each, book.settings, TODAY) for each in readings], len(files), _forget),
        "draw": _cpu_ms(lambda: [entry_scheme(entry.case) for entry in book.entries], len(book.entries)),
        "emit": _cpu_ms(lambda: build_pages(book), len(book.entries)),
    }
    print(f"{len(files)} entries, CPU ms per entry; ratio to yaml.load with CSafeLoader of the same files")
    print(f"{'baseline':<10}{baseline:8.2f}")
    for name, cost in steps.items():
        print(f"{name:<10}{cost:8.2f}   x{cost / baseline:.1f}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
