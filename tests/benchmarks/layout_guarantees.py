"""Lay out many generated networks and count those that keep every guarantee of the layout.

    PYTHONPATH=tests python tests/benchmarks/layout_guarantees.py --out FOLDER

Sizes are spread evenly in their logarithm from 20 to `--largest` stations over the kinds of
`sized_networks` and the fidelities 0, 0.35 and 1. Everything of network number i follows from i:
``--first i --count 1`` does one again. The table goes to FOLDER/guarantees.csv; every network that
is refused, or whose layout `layout.check` faults, is printed with what makes it again. Goal: all.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import csv
import time
from dataclasses import astuple, dataclass, fields
from pathlib import Path

from sized_networks import KINDS

from gtfs_schematic.errors import SchematicError
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.model import Clearances, LayoutSettings, SheetFrame

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAMES = tuple(
    SheetFrame(w, h, 12.0, 30.0, w - 12.0, h - 40.0)
    for w, h in ((420.0, 594.0), (1189.0, 841.0), (1682.0, 2378.0), (9000.0, 9000.0))
)
"""The last is no paper size: what is asked here is topology, not whether a sheet is for sale."""
FIDELITIES = (0.35, 0.0, 0.35, 1.0)
_SMALLEST = 20
_GOLDEN = 0.6180339887498949


@dataclass(frozen=True)
class Result:
    """One network and how its layout came out."""

    number: int
    kind: str
    wanted: int
    fidelity: float
    stations: int
    links: int
    lines: int
    crossings: int
    seconds: float
    outcome: str
    """`kept`, `faults`, `refused` (with an error meant for people) or `broken` (any other)."""
    first: str
    """The first fault or the error."""


def case(number: int, largest: int) -> tuple[str, int, float]:
    """Give kind, wanted size and fidelity of a network by its number."""
    kinds = sorted(KINDS)
    share = (number * _GOLDEN) % 1.0
    wanted = round(_SMALLEST * (largest / _SMALLEST) ** share)
    return kinds[number % len(kinds)], wanted, FIDELITIES[number // len(kinds) % len(FIDELITIES)]


def run(number: int, largest: int, effort: str) -> Result:
    """Make a network by its number, lay it out and check the layout."""
    kind, wanted, fidelity = case(number, largest)
    network = KINDS[kind](wanted, number)
    settings = LayoutSettings.model_validate({"fidelity": fidelity, "effort": effort})
    crossings, found, started = 0, "", time.perf_counter()
    try:
        layout = lay_out(network, settings, CLEARANCES, FRAMES)
        crossings = len(layout.crossings)
        seconds = time.perf_counter() - started
        wrong = faults(layout, CLEARANCES)
        outcome = "faults" if wrong else "kept"
        found = f"{len(wrong)}: {wrong[0]}" if wrong else ""
    except SchematicError as error:
        outcome, found = "refused", str(error)
        seconds = time.perf_counter() - started
    except Exception as error:  # noqa: BLE001 - whatever breaks is a result here
        outcome, found = "broken", repr(error)
        seconds = time.perf_counter() - started
    size = (len(network.stations), len(network.links), len(network.lines))
    return Result(
        number, kind, wanted, fidelity, *size, crossings, round(seconds, 2), outcome, found
    )


def main() -> None:
    """Run the numbers asked for; print what failed and the share that was kept."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, required=True, help="folder for the table")
    parser.add_argument("--count", type=int, default=300)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--largest", type=int, default=1000, help="stations")
    parser.add_argument("--effort", default="quick", choices=("quick", "standard", "thorough"))
    asked = parser.parse_args()
    asked.out.mkdir(parents=True, exist_ok=True)
    results = []
    with (asked.out / "guarantees.csv").open("w", newline="", encoding="utf-8") as file:
        table = csv.writer(file)
        table.writerow([field.name for field in fields(Result)])
        for number in range(asked.first, asked.first + asked.count):
            result = run(number, asked.largest, asked.effort)
            results.append(result)
            table.writerow(astuple(result))
            file.flush()
            if result.outcome != "kept":
                print(*astuple(result), sep="  ", flush=True)
    _summary(results)


def _summary(results: list[Result]) -> None:
    print("kind         networks   kept    share  median and most stations")
    for kind in [*sorted(KINDS), "all"]:
        some = [r for r in results if kind in (r.kind, "all")]
        if some:
            kept = sum(r.outcome == "kept" for r in some)
            sizes = sorted(r.stations for r in some)
            median, most = sizes[len(sizes) // 2], sizes[-1]
            share = 100.0 * kept / len(some)
            print(f"{kind:12} {len(some):8} {kept:6} {share:6.1f} %  {median}, {most}")


if __name__ == "__main__":
    main()
