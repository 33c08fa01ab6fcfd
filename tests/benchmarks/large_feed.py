"""Measure how a feed as large as a country's is read, against plain scans of its stop times.

Run as ``python tests/benchmarks/large_feed.py [--cache DIR] [--zip]`` with the optional
dependencies "benchmark". The feed (national_feed.py, over 1 GB) is written once and kept. Then, in
several rounds, one after the other, each in a process of its own: scans of stop_times.txt that take
every column as text, with pyarrow, DuckDB and polars, and our reading of the busiest typical
weekday; at last, with --zip, our reading from a zip, and partridge loading the same date. Wall time
counts from after the imports. Goals: the best of our readings takes at most 3 times the best of all
scans, and under 2 GiB. Exits with 1 if they are missed.
"""
# ruff: noqa: T201, PLC0415 - results go to standard output; a task imports what it measures

from __future__ import annotations

import argparse
import json
import resource
import subprocess
import sys
import time
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

_GOAL_RATIO = 3.0
_GOAL_MB = 2048.0
_COLUMNS = (
    *("trip_id", "arrival_time", "departure_time", "stop_id"),
    *("stop_sequence", "pickup_type", "drop_off_type"),
)


def scan_with_pyarrow(folder: Path) -> Callable[[], int]:
    """Stream all columns as text."""
    import pyarrow as pa
    from pyarrow import csv

    convert = csv.ConvertOptions(column_types={name: pa.string() for name in _COLUMNS})
    read = csv.ReadOptions(block_size=1 << 24)

    def run() -> int:
        with csv.open_csv(
            str(folder / "stop_times.txt"), read_options=read, convert_options=convert
        ) as reader:
            return sum(batch.num_rows for batch in reader)

    return run


def scan_with_duckdb(folder: Path) -> Callable[[], int]:
    """Take the greatest text of every column, so that all are parsed."""
    import duckdb

    most = ", ".join(f"max({name})" for name in _COLUMNS)
    file = str(folder / "stop_times.txt").replace("'", "''")
    query = f"SELECT count(*), {most} FROM read_csv('{file}', all_varchar=true, header=true)"  # noqa: S608 - our own file

    def run() -> int:
        return int(duckdb.sql(query).fetchall()[0][0])

    return run


def scan_with_polars(folder: Path) -> Callable[[], int]:
    """Take the greatest text of every column, so that all are parsed."""
    import polars as pl

    scan = pl.scan_csv(folder / "stop_times.txt", infer_schema=False)

    def run() -> int:
        wanted = scan.select(pl.len(), *(pl.col(name).max() for name in _COLUMNS))
        return int(wanted.collect(engine="streaming")[0, 0])

    return run


def read_by_us(feed: Path) -> Callable[[], int]:
    """Read the timetable of the busiest typical weekday; give its trips."""
    from gtfs_schematic.feed.model import FeedSettings
    from gtfs_schematic.feed.read import read_feed

    def run() -> int:
        timetable = read_feed([feed], FeedSettings())
        return sum(len(pattern.departures_s) for pattern in timetable.patterns)

    return run


def load_with_partridge(feed: Path) -> Callable[[], int]:
    """Load the tables that we read, for the same date; give its trips."""
    # With pyarrow at hand, pandas keeps texts in it, which makes partridge much slower.
    sys.modules["pyarrow"] = None  # type: ignore[assignment]
    import warnings

    warnings.simplefilter("ignore")  # of partridge's own making
    import partridge

    def run() -> int:
        days = partridge.read_service_ids_by_date(str(feed))
        counts = partridge.read_trip_counts_by_date(str(feed))
        date = min((d for d in counts if d.weekday() < 5), key=lambda d: (-counts[d], d))
        loaded = partridge.load_feed(str(feed), view={"trips.txt": {"service_id": days[date]}})
        for name in ("agency", "stops", "routes", "stop_times", "shapes", "transfers"):
            getattr(loaded, name)
        return len(loaded.trips)

    return run


TASKS: dict[str, Callable[[Path], Callable[[], int]]] = {
    "scan with pyarrow": scan_with_pyarrow,
    "scan with DuckDB": scan_with_duckdb,
    "scan with polars": scan_with_polars,
    "our reading": read_by_us,
    "partridge": load_with_partridge,
}


def measure(task: str, feed: Path) -> dict[str, Any]:
    """Run a task in a process of its own; give its seconds, peak memory and result."""
    command = [sys.executable, __file__, "--task", task, str(feed)]
    done = subprocess.run(command, check=False, capture_output=True, text=True)
    if done.returncode != 0:
        raise SystemExit(f"{task}: {done.stderr[-2000:]}")
    result: dict[str, Any] = json.loads(done.stdout)
    told = "{seconds:8.2f} s {cpu:8.2f} s of CPU {megabytes:8.0f} MB {result:>12,}"
    print(f"{task:<22}" + told.format(**result), flush=True)
    return result


def run_task(task: str, feed: Path) -> None:
    """Do one task and write what it took as JSON."""
    run = TASKS[task](feed)
    start, cpu = time.perf_counter(), time.process_time()
    result = run()
    print(
        json.dumps(
            {
                "seconds": time.perf_counter() - start,
                "cpu": time.process_time() - cpu,
                "megabytes": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024,
                "result": result,
            }
        )
    )


def written_feed(folder: Path, trips: int) -> Path:
    """Give the feed's folder, writing it if it is not there."""
    if not folder.exists():
        from national_feed import write_national_feed

        print(f"Writing {folder} …", flush=True)
        partial = folder.with_name(folder.name + ".partial")
        write_national_feed(partial, trips)
        partial.rename(folder)
    return folder


def zipped(folder: Path) -> Path:
    """Give the feed as a zip, packing it if it is not there."""
    path = folder.with_suffix(".zip")
    if not path.exists():
        print(f"Packing {path} …", flush=True)
        with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
            for file in sorted(folder.iterdir()):
                archive.write(file, file.name)
    return path


def compare(cache: Path, rounds: int, *, with_zip: bool) -> int:
    """Measure everything on the large feed and say whether the goals are met."""
    small = written_feed(cache / "warm", 400)
    feed = written_feed(cache / "national", 800_000)
    for file in feed.iterdir():  # so that nobody waits for the disk
        with file.open("rb") as stream:
            while stream.read(1 << 24):
                pass
    read_by_us(small)()  # compiles our loops, which is done once on a machine
    scans = [task for task in TASKS if task.startswith("scan")]
    scanned, read = [], []
    for _ in range(rounds):  # in turns, since a machine is not equally free at all times
        scanned += [measure(task, feed)["seconds"] for task in scans]
        read.append(measure("our reading", feed))
    ours, fastest = min(each["seconds"] for each in read), min(scanned)
    megabytes = max(each["megabytes"] for each in read)
    if with_zip:
        print("The same from a zip:")
        measure("our reading", zipped(feed))
    partridge = measure("partridge", feed)
    ratio = ours / fastest
    print(
        f"Best of {rounds} rounds: our reading takes {ratio:.2f} times the fastest scan (goal: "
        f"{_GOAL_RATIO}), {megabytes:.0f} MB (goal: {_GOAL_MB:.0f}) and "
        f"{ours / partridge['seconds']:.3f} times what partridge takes."
    )
    return int(ratio > _GOAL_RATIO or megabytes > _GOAL_MB)


def main() -> int:
    """Parse the command line."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n", maxsplit=1)[0])
    parser.add_argument("--cache", type=Path, default=Path(".cache/benchmarks"))
    parser.add_argument("--rounds", type=int, default=3)
    parser.add_argument("--zip", action="store_true", help="read it from a zip, too")
    parser.add_argument("--task", nargs=2, metavar=("TASK", "FEED"), help=argparse.SUPPRESS)
    given = parser.parse_args()
    if given.task:
        run_task(given.task[0], Path(given.task[1]))
        return 0
    return compare(given.cache, given.rounds, with_zip=given.zip)


if __name__ == "__main__":
    sys.exit(main())
