"""Measure how surely stations and lines are known again over many changed timetables of a feed.

Usage: python tests/benchmarks/identity.py FEED [SEEDS]

Every change of `changed_timetables.CHANGES` once per seed; then four changes at once with all ids
new, and with all ids exchanged. Prints what was taken for another, what was not found, and
precision and recall of stations and lines.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

import changed_timetables as changes

from gtfs_schematic import pipeline
from gtfs_schematic.edition.identity import match_rosters
from gtfs_schematic.edition.make import stop_codes_of
from gtfs_schematic.edition.roster import roster_of_network
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import NetworkSettings


def main() -> None:
    """Measure one feed."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("feed", type=Path)
    parser.add_argument("seeds", type=int, nargs="?", default=3)
    given = parser.parse_args()
    timetable, network = pipeline.inspect(given.feed)
    old = roster_of_network(network, stop_codes_of(timetable, network))
    totals = {"stations": [0, 0, 0], "lines": [0, 0, 0]}
    for seed in range(given.seeds):
        for changed in _feeds(timetable, seed):
            fresh = build_network(changed.timetable, NetworkSettings())
            new = roster_of_network(fresh, stop_codes_of(changed.timetable, fresh))
            matches = match_rosters(old, new)
            for kind, found, truth in (
                ("stations", matches.stations, changes.true_stations(network, fresh, changed)),
                ("lines", matches.lines, changes.true_lines(network, fresh, changed)),
            ):
                pairs = {(m.old_id, m.new_id) for m in found.values()}
                wrong, missed = truth.wrong(pairs), truth.missed(pairs)
                right = len(truth.certain & pairs)
                for i, count in enumerate((right, len(wrong), len(missed))):
                    totals[kind][i] += count
                if wrong or missed:
                    print(kind, sorted(wrong), sorted(missed), changed.done)
    for kind, (right, wrong, missed) in totals.items():
        precision, recall = right / max(1, right + wrong), right / max(1, right + missed)
        print(f"{kind}: {right} right, precision {precision:.4f}, recall {recall:.4f}")


def _feeds(timetable: Timetable, seed: int) -> Iterator[changes.Changed]:
    plain = changes.unchanged(timetable)
    for change in changes.CHANGES:
        yield change(plain, changes.chance_of(seed))
    for shuffle in (changes.renumber_all, changes.permute_all):
        chance = changes.chance_of(seed)
        changed = plain
        for change in chance.sample(changes.CHANGES, 4):
            changed = change(changed, chance)
        yield shuffle(changed, chance)


if __name__ == "__main__":
    main()
