"""What all tests share: the hypothesis profile, and real feeds fetched from the registry."""

from __future__ import annotations

import fcntl
import os
import subprocess
import sys
import tarfile
import tempfile
from pathlib import Path

import pytest
from hypothesis import settings

# Derandomized, so that a run says the same on every machine; machines differ in speed.
settings.register_profile("ci", derandomize=True, deadline=None)
settings.load_profile("ci")

_PACKAGES = {
    "cairns.zip": ("gtfs-kit==13.0.1", "data/cairns_gtfs.zip"),
    "nyc_subway.zip": ("gtfs-kit==13.0.1", "data/nyc_subway_gtfs.zip"),
    "ann_arbor.zip": (
        "gtfs-segments==2.1.7",
        "test/data/Ann Arbor-University of Michigan Transit Services-MI/gtfs.zip",
    ),
}
"""Feeds in the source distributions of Python packages: requirement, path inside."""

_BROKEN_FEEDS = ("transitfeed-py3==1.2.16", "tests/data")
"""Dozens of small broken feeds, made to test another reader."""

_PATIENCE_S = 300


@pytest.fixture(scope="session")
def cairns_feed() -> Path:
    """Give the zip of a bus network of 22 routes."""
    return _feed("cairns.zip")


@pytest.fixture(scope="session")
def nyc_subway_feed() -> Path:
    """Give the zip of two metro routes with parent stations."""
    return _feed("nyc_subway.zip")


@pytest.fixture(scope="session")
def ann_arbor_feed() -> Path:
    """Give the zip of a campus bus network with loops."""
    return _feed("ann_arbor.zip")


@pytest.fixture(scope="session")
def broken_feeds() -> Path:
    """Give a folder of small broken feeds, zips and folders."""
    return _cached("broken", *_BROKEN_FEEDS)


def _feed(name: str) -> Path:
    """Give a feed from the cache."""
    return _cached(name, *_PACKAGES[name])


def _cached(name: str, requirement: str, inside: str) -> Path:
    """Give a file or folder from the cache, fetching it first; skip the test if that fails.

    Under continuous integration (CI is set) one that cannot be had fails the test.
    """
    cache = _cache()
    target = cache / name
    cache.mkdir(parents=True, exist_ok=True)
    with (cache / f"{name}.lock").open("w") as lock:
        fcntl.flock(lock, fcntl.LOCK_EX)  # one worker fetches, the others wait for it
        if not target.exists():
            try:
                _fetch(requirement, inside, target)
            except (OSError, subprocess.SubprocessError, tarfile.TarError, KeyError) as error:
                told = getattr(error, "stderr", "") or str(error)
                reason = f"the source distribution {requirement} cannot be fetched: {told[-500:]}"
                if os.environ.get("CI"):
                    pytest.fail(reason)
                pytest.skip(reason)
    return target


def _cache() -> Path:
    named = os.environ.get("GTFS_SCHEMATIC_CACHE")
    root = Path(__file__).resolve().parent.parent
    return Path(named) if named else root / ".cache" / "feeds"


def _fetch(requirement: str, inside: str, target: Path) -> None:
    """Download a source distribution and keep one path of it, whole or not at all."""
    with tempfile.TemporaryDirectory(dir=target.parent) as name:
        folder = Path(name)
        # Source of this package only: what builds it may come as wheels, which saves minutes.
        command = [sys.executable, "-m", "pip", "download", "--quiet", "--no-deps"]
        command += ["--no-binary", requirement.partition("==")[0], "--dest", name, requirement]
        subprocess.run(command, check=True, capture_output=True, text=True, timeout=_PATIENCE_S)
        with tarfile.open(_only(folder)) as archive:
            top = archive.getnames()[0].split("/")[0]
            wanted = f"{top}/{inside}"
            members = [m for m in archive.getmembers() if f"{m.name}/".startswith(f"{wanted}/")]
            if not members:
                raise KeyError(inside)
            archive.extractall(folder / "unpacked", members, filter="data")
        (folder / "unpacked" / wanted).replace(target)


def _only(folder: Path) -> Path:
    found = sorted(folder.glob("*.tar.gz"))
    if not found:
        raise FileNotFoundError("pip brought no .tar.gz")
    return found[0]
