"""Run MkDocs as a child process: build beside the site and swap on success, or serve.

The child reads, checks and publishes the book once; what came of it returns in a small file, so that findings can be
told from a broken configuration.
"""

import datetime as dt
import json
import os
import shutil
import signal
import socket
import subprocess
import sys
import tempfile
from dataclasses import asdict, dataclass
from pathlib import Path

__all__ = [
    "AddressError",
    "BuildReport",
    "NotOurSiteError",
    "SiteBuildError",
    "build_date",
    "build_site",
    "serve_site",
    "write_report",
]

REPORT_VARIABLE = "HANDBOOK_BUILD_REPORT"
"""Names the file in which the plugin leaves its BuildReport for `build_site`."""
MARKER = ".handbook-site"
"""Lies in every folder that `build_site` made, so that no other folder is ever replaced."""


@dataclass(frozen=True, slots=True)
class BuildReport:
    """What became of the book in a build: entries published, findings that kept it from being published."""

    entries: int
    failing: int


class SiteBuildError(Exception):
    """MkDocs did not build the site; its output has said why, and the last good site stands.

    report: what the plugin said of the book, None if it was not even reached.
    """

    def __init__(self, message: str, report: BuildReport | None) -> None:
        super().__init__(message)
        self.report = report


class AddressError(Exception):
    """Nothing can be served at an address: it is none, or another program has it."""


class NotOurSiteError(Exception):
    """The folder to publish into holds something that `build_site` did not make."""


def build_site(config: Path, site: Path) -> BuildReport:
    """Build the site of the book that `config` (its mkdocs.yml) describes into `site`.

    The new site is made beside the old one and takes its place only when all of it is there; a link is followed.
    Raises NotOurSiteError before anything is done, SiteBuildError if MkDocs fails.
    """
    site = site.resolve()
    if site.exists() and not _is_ours(site):
        raise NotOurSiteError(f"{site} holds files that are no handbook site; name another folder, or empty it")
    fresh, former = site.with_name(f".{site.name}-new"), site.with_name(f".{site.name}-old")
    if former.exists() and not site.exists():  # a build was killed between its two renames
        former.rename(site)
    shutil.rmtree(fresh, ignore_errors=True)
    with tempfile.TemporaryDirectory() as scratch:
        report_file = Path(scratch) / "report.json"
        arguments = ("build", "--strict", "--clean", "--quiet", "-f", str(config), "-d", str(fresh))
        code = _mkdocs(*arguments, report=report_file)
        report = BuildReport(**json.loads(report_file.read_text("utf-8"))) if report_file.exists() else None
    if code or report is None:
        shutil.rmtree(fresh, ignore_errors=True)
        former_stands = f"; {site.name}/ is as it was" if site.exists() else ""
        raise SiteBuildError(f"no site was built{former_stands}", report)
    (fresh / MARKER).touch()
    _swap(fresh, site, former)
    return report


def serve_site(config: Path, address: str) -> int:
    """Serve the book and rebuild on every change; return the exit code of MkDocs.

    Raises AddressError where nothing can be served, before the book is read.
    """
    host, _, port = address.rpartition(":")
    if not host or not port.isdecimal():
        raise AddressError(f'"{address}" is no address to serve at; write it like 127.0.0.1:8000')
    try:
        with socket.create_server((host, int(port))):
            pass
    except (OSError, OverflowError) as error:
        raise AddressError(f"nothing can be served at {address}: {error}; name another with --address") from error
    return _mkdocs("serve", "-f", str(config), "-a", address)


def write_report(report: BuildReport) -> None:
    """Leave the report for the `build_site` that started this process, if one did."""
    wanted = os.environ.get(REPORT_VARIABLE)
    if wanted:
        Path(wanted).write_text(json.dumps(asdict(report)), "utf-8")


def build_date() -> dt.date:
    """Return the date of the build: SOURCE_DATE_EPOCH where it is set, so that builds can be repeated, else today.

    Raises ValueError if SOURCE_DATE_EPOCH is no number of seconds that a calendar has.
    """
    epoch = os.environ.get("SOURCE_DATE_EPOCH")
    if epoch is None:
        return dt.datetime.now().astimezone().date()
    try:
        return dt.datetime.fromtimestamp(int(epoch), dt.UTC).date()
    except (OverflowError, OSError) as error:
        raise ValueError(f"{epoch} seconds are in no calendar") from error


def _is_ours(site: Path) -> bool:
    if not site.is_dir():
        return False
    made_by_mkdocs = (site / "sitemap.xml").is_file() and (site / "assets" / "handbook.css").is_file()
    return (site / MARKER).is_file() or made_by_mkdocs or not any(site.iterdir())


def _swap(fresh: Path, site: Path, former: Path) -> None:
    shutil.rmtree(former, ignore_errors=True)
    if site.exists():
        site.rename(former)
    try:
        fresh.rename(site)
    except OSError:
        if former.exists():
            former.rename(site)
        raise
    shutil.rmtree(former, ignore_errors=True)


def _mkdocs(*arguments: str, report: Path | None = None) -> int:
    environment = {**os.environ, "NO_MKDOCS_2_WARNING": "1", "PYTHONUTF8": "1"}
    if report is not None:
        environment[REPORT_VARIABLE] = str(report)
    command = [sys.executable, "-m", "mkdocs", *arguments]
    with subprocess.Popen(command, env=environment) as child:  # noqa: S603 - our own arguments
        # Ended alone, we would leave the child behind, and it would keep its port. An interrupt reaches it by itself.
        before = signal.signal(signal.SIGTERM, lambda *_: child.terminate())
        try:
            return child.wait()
        except KeyboardInterrupt:
            return child.wait()
        finally:
            signal.signal(signal.SIGTERM, before)
