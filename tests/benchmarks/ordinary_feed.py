"""Measure how an ordinary feed becomes a network, against partridge loading the same date.

Run as ``python tests/benchmarks/ordinary_feed.py FEED [--runs N]``. In each run: partridge loads
the tables that we read, for the date that we draw; we read the feed and build its network. Goal: at
most 2.5 times partridge's time, medians of all runs. Exits with 1 if it is missed.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import datetime as dt
import itertools
import statistics
import sys
import time
import warnings
from pathlib import Path

# With pyarrow at hand, pandas keeps texts in it, which makes partridge much slower.
sys.modules["pyarrow"] = None  # type: ignore[assignment]
warnings.simplefilter("ignore")  # of partridge's own making

import partridge  # noqa: E402 - after what its import needs

from gtfs_schematic.feed.model import FeedSettings, Timetable  # noqa: E402
from gtfs_schematic.feed.read import read_feed  # noqa: E402
from gtfs_schematic.network.build import build_network  # noqa: E402
from gtfs_schematic.network.model import NetworkSettings  # noqa: E402

_GOAL = 2.5
_TABLES = (
    *("agency", "calendar", "calendar_dates", "stops", "routes", "trips"),
    *("stop_times", "shapes", "transfers"),
)


def load(feed: Path, date: dt.date) -> None:
    """Load a feed's tables for one date with partridge."""
    services = partridge.read_service_ids_by_date(str(feed))[date]
    loaded = partridge.load_feed(str(feed), view={"trips.txt": {"service_id": services}})
    for name in _TABLES:
        getattr(loaded, name)


def main() -> int:
    """Measure and compare."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n", maxsplit=1)[0])
    parser.add_argument("feed", type=Path)
    parser.add_argument("--runs", type=int, default=5)
    given = parser.parse_args()
    timetable: Timetable = read_feed([given.feed], FeedSettings())
    build_network(timetable, NetworkSettings())  # both once before, for what is compiled
    date = dt.date.fromisoformat(timetable.info.service_date)
    rows = []
    for _ in range(given.runs):
        moments = [time.perf_counter()]
        load(given.feed, date)
        moments.append(time.perf_counter())
        timetable = read_feed([given.feed], FeedSettings())
        moments.append(time.perf_counter())
        network = build_network(timetable, NetworkSettings())
        moments.append(time.perf_counter())
        rows.append([after - before for before, after in itertools.pairwise(moments)])
        print("partridge {:.2f} s, our reading {:.2f} s, network {:.2f} s".format(*rows[-1]))
    plain, reading, building = (statistics.median(column) for column in zip(*rows, strict=True))
    ratio = (reading + building) / plain
    print(
        f"{date}: {len(network.stations)} stations, {len(network.lines)} lines. Reading "
        f"{reading / plain:.2f}, network {building / plain:.2f}, together {ratio:.2f} times "
        f"partridge (goal: {_GOAL})."
    )
    return int(ratio > _GOAL)


if __name__ == "__main__":
    sys.exit(main())
