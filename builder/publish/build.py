"""Run MkDocs as a child process: build beside the site and swap on success, or serve."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

__all__ = ["SiteBuildError", "build_site", "serve_site"]


class SiteBuildError(Exception):
    """MkDocs did not build the site; its output has said why, and the last good site stands."""


def build_site(config: Path, site: Path) -> None:
    """Build the site of the book that `config` (its mkdocs.yml) describes into `site`.

    The new site is made beside the old one and takes its place only when all of it is there.
    Raises SiteBuildError if MkDocs fails.
    """
    fresh, former = site.with_name(f".{site.name}-new"), site.with_name(f".{site.name}-old")
    for leftover in (fresh, former):
        shutil.rmtree(leftover, ignore_errors=True)
    code = _mkdocs("build", "--strict", "--clean", "--quiet", "-f", str(config), "-d", str(fresh.resolve()))
    if code:
        shutil.rmtree(fresh, ignore_errors=True)
        raise SiteBuildError(f"MkDocs ended with code {code}; {site.name}/ is as it was")
    if site.exists():
        site.rename(former)
    fresh.rename(site)
    shutil.rmtree(former, ignore_errors=True)


def serve_site(config: Path, address: str) -> int:
    """Serve the book and rebuild on every change; return the exit code of MkDocs."""
    return _mkdocs("serve", "-f", str(config), "-a", address)


def _mkdocs(*arguments: str) -> int:
    environment = {**os.environ, "NO_MKDOCS_2_WARNING": "1", "PYTHONUTF8": "1"}
    command = [sys.executable, "-m", "mkdocs", *arguments]
    return subprocess.run(command, env=environment, check=False).returncode  # noqa: S603 - our own arguments
