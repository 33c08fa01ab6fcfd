"""Measure how much of a diagram stays over many single changes of its feed.

Usage: python tests/benchmarks/revisions.py FEED [SEEDS] [--effort quick]

Draws the feed, then makes each change of `changed_timetables.CHANGES` once per seed and revises the
edition. Prints what was laid out anew, and over all other revisions: stations that moved, names on
another side, pairs of lines that changed places, and seconds beside those of drawing.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import sys
import time
from collections import Counter
from pathlib import Path
from statistics import median

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

import changed_timetables as changes

from gtfs_schematic import pipeline
from gtfs_schematic.config import settings_of
from gtfs_schematic.drawing.palette import recolored
from gtfs_schematic.errors import SchematicError
from gtfs_schematic.network.build import build_network
from gtfs_schematic.revision import Told, revise_network


def main() -> None:
    """Measure one feed."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("feed", type=Path)
    parser.add_argument("seeds", type=int, nargs="?", default=3)
    parser.add_argument("--effort", default="standard")
    given = parser.parse_args()
    settings = settings_of({"layout": {"effort": given.effort}}, "benchmark")
    begin = time.perf_counter()
    drawn = pipeline.draw(given.feed, settings)
    fresh_s = time.perf_counter() - begin
    count: Counter[str] = Counter()
    seconds, far = [], []
    for seed in range(given.seeds):
        for change in changes.CHANGES:
            changed = change(changes.unchanged(drawn.timetable), changes.chance_of(seed))
            network = build_network(changed.timetable, settings.network)
            read = (changed.timetable, recolored(network, settings.drawing))
            begin = time.perf_counter()
            try:
                found = revise_network(drawn.edition, read, Told(settings))
            except SchematicError as error:
                count["failed"] += 1
                print("failed", changed.done, str(error)[:300])
                continue
            seconds.append(time.perf_counter() - begin)
            count["revised"] += 1
            if found.anew:
                count["anew"] += 1
                print("anew", changed.done)
                continue
            stayed = found.sheet.stability
            count["stations moved"] += stayed.moved
            count["stations kept"] += stayed.kept
            count["names on another side"] += stayed.labels_turned
            count["names kept"] += stayed.labels_kept
            count["pairs of lines exchanged"] += stayed.order_inversions
            count["colors changed"] += stayed.colors_changed
            far.append(stayed.farthest_links)
    for name, number in count.items():
        print(f"{name}: {number}")
    print(f"median links from a change to the farthest move: {median(far)}")
    print(f"median seconds: {median(seconds):.1f}, drawing {fresh_s:.1f}")


if __name__ == "__main__":
    main()
