"""What a whole build costs beside plain MkDocs and Material pages of the same content.

CPU time is that of the child and of all processes it waited for, as the kernel adds it up. Memory is sampled over the
whole tree of processes at the same moment, as proportional set size (PSS): pages that forked workers share are
counted once. The plain sum (RSS) is printed beside it. Linux only, because of /proc.
"""

import gzip
import os
import re
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from html.parser import HTMLParser
from pathlib import Path
from urllib.parse import urlsplit

from tests.browser.built import mkdocs_command, mkdocs_environment, write_book
from tests.generated_book import generated_texts, settings_text
from tests.plain_site import write_plain_site

__all__ = ["Cost", "Weight", "measured", "page_weight", "print_build"]

RATIO, MEMORY_MB, PAGE_KB = 0.5, 350.0, 60.0
"""Goals: CPU time as a fraction of that of plain pages; peak memory over all processes; an entry's page, gzipped."""
REPEATS = 2
EVERY_S = 0.05
"""Between two looks at the memory."""


# --- processes ----------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Cost:
    """What a command used: CPU and elapsed seconds, peak of all its processes together in MB (2**20 bytes)."""

    cpu_s: float
    wall_s: float
    pss_mb: float
    rss_mb: float


def measured(command: list[str], environment: dict[str, str]) -> Cost:
    """Run a command and return what it cost.

    Raises CalledProcessError with its output if it fails.
    """
    with tempfile.TemporaryFile() as output:
        start = time.perf_counter()
        child = subprocess.Popen(command, env=environment, stdout=output, stderr=subprocess.STDOUT)
        peaks = (0, 0)
        while True:
            pid, status, usage = os.wait4(child.pid, os.WNOHANG)
            if pid:
                break
            peaks = tuple(map(max, peaks, _memory_kb(child.pid)))
            time.sleep(EVERY_S)
        wall = time.perf_counter() - start
        child.returncode = os.waitstatus_to_exitcode(status)
        if child.returncode:
            output.seek(0)
            raise subprocess.CalledProcessError(child.returncode, command, output.read().decode())
    return Cost(usage.ru_utime + usage.ru_stime, wall, peaks[0] / 1024, peaks[1] / 1024)


def _memory_kb(root: int) -> tuple[int, int]:
    """Return PSS and RSS of a process and all below it; one that ended meanwhile counts nothing."""
    pss = rss = 0
    for pid in _tree(root):
        try:
            rollup = Path(f"/proc/{pid}/smaps_rollup").read_text("ascii")
        except (FileNotFoundError, ProcessLookupError, PermissionError):
            continue
        sizes = dict(re.findall(r"^(Pss|Rss):\s+(\d+) kB", rollup, re.MULTILINE))
        pss += int(sizes.get("Pss", 0))
        rss += int(sizes.get("Rss", 0))
    return pss, rss


def _tree(root: int) -> Iterator[int]:
    yield root
    for task in Path(f"/proc/{root}/task").glob("*/children"):
        try:
            below = task.read_text("ascii").split()
        except (FileNotFoundError, ProcessLookupError):
            continue
        for pid in below:
            yield from _tree(int(pid))


# --- the weight of a page -----------------------------------------------------------------------------------


@dataclass(frozen=True)
class Weight:
    """Bytes after gzip -9 of a page and of every file it loads, by path below the site."""

    page: str
    parts: dict[str, int]

    @property
    def bytes(self) -> int:
        return sum(self.parts.values())


class _Loads(HTMLParser):
    """Collects what a browser fetches for a page without being asked; addresses as written."""

    RELATIONS = frozenset({"stylesheet", "icon", "preload", "modulepreload", "manifest"})

    def __init__(self) -> None:
        super().__init__()
        self.addresses: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        given = {name: value or "" for name, value in attrs}
        if tag == "link" and self.RELATIONS & set(given.get("rel", "").split()):
            self.addresses.append(given["href"])
        elif tag in {"script", "img", "source", "iframe"} and given.get("src"):
            self.addresses.append(given["src"])


def page_weight(site: Path, page: Path) -> Weight:
    """Return the weight of a page with its styles, scripts, pictures and fonts; search data are left out."""
    text = page.read_text("utf-8")
    loads = _Loads()
    loads.feed(text)
    waiting = [(page, address) for address in loads.addresses]
    parts = {page.relative_to(site).as_posix(): _gzipped(page)}
    while waiting:
        source, address = waiting.pop()
        path = (source.parent / urlsplit(address).path).resolve()
        name = path.relative_to(site.resolve()).as_posix()
        if name in parts or name.startswith("search/"):
            continue
        parts[name] = _gzipped(path)
        if path.suffix == ".css":
            waiting += [(path, found) for found in _fetched_by_style(path.read_text("utf-8"))]
    return Weight(page.relative_to(site).as_posix(), parts)


def _fetched_by_style(style: str) -> list[str]:
    addresses = re.findall(r"""url\(\s*["']?([^"')]+)""", style)
    return [address for address in addresses if not address.startswith(("data:", "#"))]


def _gzipped(path: Path) -> int:
    return len(gzip.compress(path.read_bytes(), 9, mtime=0))


# --- the tables ---------------------------------------------------------------------------------------------


def print_build(entries: int = 1000) -> None:
    """Print what a build of so many generated entries costs, beside plain pages of the same content."""
    with tempfile.TemporaryDirectory() as scratch:
        ours, plain = Path(scratch) / "ours", Path(scratch) / "plain"
        ours.mkdir()
        config = write_book(ours, generated_texts(entries), settings_text())
        our_cost = _least(measured(mkdocs_command(config), mkdocs_environment()) for _ in range(REPEATS))
        again = mkdocs_environment() | {"XDG_CACHE_HOME": str(Path(scratch) / "cache")}
        measured(mkdocs_command(config), again)
        our_second = _least(measured(mkdocs_command(config), again) for _ in range(REPEATS))
        plain_config = write_plain_site(ours / "site", plain)
        plain_cost = _least(
            measured(mkdocs_command(plain_config, strict=False), mkdocs_environment()) for _ in range(REPEATS)
        )
        _print_costs(entries, ours / "site", our_cost, our_second, plain / "site", plain_cost)
        _print_weights(ours / "site")


def _least(costs: Iterable[Cost]) -> Cost:
    """Return the run with the least CPU time: other work on the machine only adds to it."""
    return min(costs, key=lambda cost: cost.cpu_s)


def _print_costs(entries: int, our_site: Path, ours: Cost, second: Cost, plain_site: Path, plain: Cost) -> None:
    print(f"\nwhole build of {entries} generated entries, least of {REPEATS}, load {os.getloadavg()[0]:.1f}")
    print(f"{'':<10}{'pages':>8}{'CPU s':>8}{'ms/page':>9}{'wall s':>8}{'peak PSS MB':>13}{'RSS MB':>8}")
    for name, site, cost in (("ours", our_site, ours), ("second", our_site, second), ("plain", plain_site, plain)):
        pages = sum(1 for _ in site.rglob("*.html"))
        print(
            f"{name:<10}{pages:>8}{cost.cpu_s:>8.1f}{1000 * cost.cpu_s / pages:>9.1f}{cost.wall_s:>8.1f}"
            f"{cost.pss_mb:>13.0f}{cost.rss_mb:>8.0f}"
        )
    _print_goal("ratio", ours.cpu_s / plain.cpu_s, RATIO, "of the CPU time of plain pages, nothing remembered")
    _print_goal("second", second.cpu_s / plain.cpu_s, RATIO, "the same, records remembered from the build before")
    _print_goal("memory", ours.pss_mb, MEMORY_MB, "MB over all processes at one moment")


def _print_weights(site: Path) -> None:
    """Print the weight of the lightest, the middle and the heaviest page of an entry, and what the last consists of."""
    pages = sorted((site / "e").glob("*/index.html"), key=lambda page: (page.stat().st_size, page))
    weights = [page_weight(site, page) for page in (pages[0], pages[len(pages) // 2], pages[-1])]
    print("\nan entry's page and all it loads, kB after gzip -9, search data left out")
    for weight in weights:
        _print_goal("page", weight.bytes / 1000, PAGE_KB, f"kB, {weight.page}")
    for name, size in sorted(weights[-1].parts.items(), key=lambda part: -part[1]):
        print(f"{'':<10}{size / 1000:8.1f}   {name}")


def _print_goal(name: str, value: float, goal: float, words: str) -> None:
    print(f"{name:<10}{value:8.2f}   {words}   [≤ {goal:g}: {'ok' if value <= goal else 'MISSED'}]")


def main() -> int:
    """Print the tables for the number of entries given, 1,000 unless said otherwise."""
    print_build(*(int(number) for number in sys.argv[1:2]))
    return 0


if __name__ == "__main__":
    sys.exit(main())
