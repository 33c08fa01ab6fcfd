"""Measure how much of a diagram stays over many single changes of its feed, beside drawing anew.

Usage: python tests/benchmarks/revisions.py FEED… [--seeds 5] [--fresh 3] [--effort standard]

Draws each feed, then makes each change of `changed_timetables.CHANGES`, and a new line, once per
seed and revises the edition; the first `--fresh` changes of each feed are drawn from scratch, too.
All checks run as always: a broken guarantee fails the revision. Prints one line per revision, then
per feed and over all

- how many were laid out anew, and how many failed;
- the share of untouched stations that moved, and of names and pairs of lines that changed places;
- links from the change to the farthest station that moved: median, and how many beyond 3;
- drift and bends, as shares of those of a drawing from scratch;
- seconds of revising and of drawing, both from the network on.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import itertools
import math
import sys
import time
from collections import Counter
from dataclasses import dataclass, field
from pathlib import Path
from statistics import median

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

import changed_timetables as changes

from gtfs_schematic import pipeline
from gtfs_schematic.config import Settings, settings_of
from gtfs_schematic.drawing.palette import recolored
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.edition.changes import ChangeSheet
from gtfs_schematic.edition.folder import Beside
from gtfs_schematic.edition.state import from_json
from gtfs_schematic.errors import SchematicError
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import Result
from gtfs_schematic.progress import Silent
from gtfs_schematic.revision import Revision, Told, revise_network


@dataclass
class Tally:
    """What was counted over some revisions."""

    count: Counter[str] = field(default_factory=Counter)
    far: list[int] = field(default_factory=list)
    seconds: list[float] = field(default_factory=list)
    fresh_seconds: list[float] = field(default_factory=list)
    drift: list[float] = field(default_factory=list)
    bends: list[float] = field(default_factory=list)

    def add(self, other: Tally) -> None:
        """Add what was counted elsewhere."""
        self.count.update(other.count)
        for name in ("far", "seconds", "fresh_seconds", "drift", "bends"):
            getattr(self, name).extend(getattr(other, name))

    def tell(self, name: str) -> None:
        """Print it."""
        print(f"{name}: {', '.join(f'{n} {key}' for key, n in sorted(self.count.items()))}")
        share = self.count["untouched moved"] / max(1, self.count["untouched"])
        print(f"  untouched stations moved: {share:.2%}")
        if self.far:
            beyond = sum(each > 3 for each in self.far)
            print(f"  links to the farthest move: median {median(self.far)}, {beyond} beyond 3")
        if self.drift:
            worst = f"{max(self.drift):.3f}, bends {max(self.bends):.3f}"
            print(
                f"  drift beside a fresh drawing: median {median(self.drift):.3f}, bends "
                f"{median(self.bends):.3f}; at most {worst}"
            )
        if self.fresh_seconds:
            print(
                f"  seconds: revising {median(self.seconds):.1f}, drawing "
                f"{median(self.fresh_seconds):.1f}"
            )


def main() -> None:
    """Measure all feeds."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("feeds", type=Path, nargs="+")
    parser.add_argument("--seeds", type=int, default=5)
    parser.add_argument("--fresh", type=int, default=3)
    parser.add_argument("--effort", default="standard")
    given = parser.parse_args()
    settings = settings_of({"layout": {"effort": given.effort}}, "benchmark")
    total = Tally()
    for feed in given.feeds:
        tally = _measured(feed, settings, given.seeds, given.fresh)
        tally.tell(feed.name)
        total.add(tally)
    total.tell("all")


def _measured(feed: Path, settings: Settings, seeds: int, fresh: int) -> Tally:
    drawn = pipeline.draw(feed, settings)
    beside = Beside(state=from_json(drawn.state, drawn.edition))
    tally = Tally()
    every = [*changes.CHANGES, changes.new_line]
    for number, (seed, change) in enumerate(itertools.product(range(seeds), every)):
        changed = change(changes.unchanged(drawn.timetable), changes.chance_of(seed))
        network = build_network(changed.timetable, settings.network)
        read = (changed.timetable, recolored(network, settings.drawing))
        begin = time.perf_counter()
        try:
            found = revise_network(drawn.edition, read, Told(settings, beside=beside))
        except SchematicError as error:
            tally.count["failed"] += 1
            print("failed", changed.done, str(error)[:300], flush=True)
            continue
        tally.seconds.append(time.perf_counter() - begin)
        _count(tally, found)
        beside_fresh = ""
        # A change a kind, spread over all kinds.
        if number % len(every) == (number // len(every)) * 3 % len(every) and fresh > 0:
            fresh -= 1
            beside_fresh = _compared(tally, found, read, settings)
        stays = found.sheet.stability
        print(
            f"{change.__name__} {seed}: {'anew' if found.anew else stays.moved} moved, at most "
            f"{stays.move_largest_mm:.1f} mm, {stays.farthest_links} links away; names "
            f"{stays.labels_turned}, pairs {stays.order_inversions}; {tally.seconds[-1]:.1f} s"
            f"{beside_fresh}",
            flush=True,
        )
    return tally


def _count(tally: Tally, found: Revision) -> None:
    stays = found.sheet.stability
    touched = touched_by(found.sheet)
    kept = {s.id for s in found.result.edition.stations} & {s.old_id for s in _same(found)}
    tally.count.update(
        {
            "revised": 1,
            "anew": int(found.anew),
            "untouched": len(kept - touched),
            "untouched moved": len({m.station for m in found.sheet.moved} - touched),
            "names on another side": stays.labels_turned,
            "pairs exchanged": stays.order_inversions,
            "colors changed": stays.colors_changed,
            "names without a place": len(found.result.labelled.unplaced),
        }
    )
    tally.far.append(stays.farthest_links)


def _same(found: Revision) -> list:
    return list(found.matches.stations.values())


def touched_by(sheet: ChangeSheet) -> set[str]:
    """Give the stations at which something changed in the feed."""
    return {place for c in sheet.changes if c.subject != "drawing" for place in c.places}


def _compared(
    tally: Tally, found: Revision, read: tuple[Timetable, Network], settings: Settings
) -> str:
    """Draw from scratch what was revised, and compare."""
    begin = time.perf_counter()
    network = found.result.network
    frames = candidate_frames(network, settings.sheet, settings.drawing)
    labelled = pipeline._labelled(network, settings, frames, Silent())
    fresh = pipeline.finish(read[0], labelled, settings, Silent())
    tally.fresh_seconds.append(time.perf_counter() - begin)
    tally.drift.append(residual_of(found.result) / residual_of(fresh))
    tally.bends.append(bends_of(found.result.layout) / bends_of(fresh.layout))
    return (
        f"; drift {tally.drift[-1]:.3f} and bends {tally.bends[-1]:.3f} of a fresh drawing, "
        f"{tally.fresh_seconds[-1]:.1f} s"
    )


def residual_of(result: Result) -> float:
    """Give what of the ground is lost, north kept up."""
    return result.drift.north_up.residual


def bends_of(layout: Layout) -> float:
    """Count the bends of all lines, those by 90 degrees twice, those by 135 three times."""
    total = 0.0
    paths: dict[tuple[str, str], tuple[tuple[float, float], ...]] = {}
    for link in layout.network.links:
        paths[link.start, link.end] = layout.paths[link.id]
        paths[link.end, link.start] = layout.paths[link.id][::-1]
    for line in layout.network.lines:
        seen = set()
        for course in line.courses:
            steps = [p for p in itertools.pairwise(course) if p in paths]
            for step in steps:
                if frozenset(step) not in seen:
                    seen.add(frozenset(step))
                    total += _turns(paths[step])
            for one, two in itertools.pairwise(steps):
                key = frozenset((one, two[::-1]))
                if one[1] == two[0] and one[0] != two[1] and key not in seen:
                    seen.add(key)
                    total += _turns((*paths[one][-2:], paths[two][1]))
    return total


def _turns(path: tuple[tuple[float, float], ...]) -> float:
    ways = [math.atan2(b[1] - a[1], b[0] - a[0]) for a, b in itertools.pairwise(path)]
    return sum(
        round(abs(math.remainder(b - a, math.tau)) / (math.pi / 4))
        for a, b in itertools.pairwise(ways)
    )


if __name__ == "__main__":
    main()
