"""Measure how well names and places alone recover the stations that feeds declare.

Run as ``python tests/benchmarks/station_recovery.py FEED...``. Parents and transfers are taken out
of each feed; then the pairs of stops that the merging rules put into one station are compared with
the pairs that have one parent (precision, recall and their harmonic mean F1). Two stages:

- stations, against the parents of the feed;
- interchanges, after stations of one name that stand close together have been joined: a pair is
  right if the feed's parents and transfers join it, and wanted if it has one parent.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import itertools
import sys
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

import networkx as nx

from gtfs_schematic.feed.model import FeedSettings, Timetable
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.likeness import sites_of
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.stations import top_parent
from gtfs_schematic.network.transfers import footways_of, merge_by_transfer

Pairs = frozenset[tuple[str, str]]


@dataclass(frozen=True)
class Score:
    """Pairwise agreement of two partitions."""

    precision: float
    recall: float
    wrong: Pairs
    missed: Pairs

    @property
    def f1(self) -> float:
        """Harmonic mean of precision and recall."""
        total = self.precision + self.recall
        return 2.0 * self.precision * self.recall / total if total else 0.0


def recovery(timetable: Timetable) -> tuple[Score, Score]:
    """Give the scores of stations and of interchanges."""
    stops = {stop.id: stop for stop in timetable.stops}
    called = sorted({stop_id for pattern in timetable.patterns for stop_id in pattern.stop_ids})
    parent = {stop_id: top_parent(stop_id, stops) for stop_id in called}
    graph = nx.Graph()
    graph.add_nodes_from(parent.values())
    graph.add_edges_from(
        (top_parent(t.from_stop_id, stops), top_parent(t.to_stop_id, stops))
        for t in timetable.transfers
        if t.transfer_type in (0, 1, 2) and t.from_stop_id in stops and t.to_stop_id in stops
    )
    complex_of = {
        station: str(n) for n, part in enumerate(nx.connected_components(graph)) for station in part
    }
    bare = replace(
        timetable, stops=tuple(replace(s, parent_id=None) for s in timetable.stops), transfers=()
    )
    settings = NetworkSettings()
    sites = sites_of(bare, settings)
    joined = merge_by_transfer(sites, footways_of(bare, sites, settings)[0], settings)
    stations = _pairs({stop_id: sites.site_of[stop_id] for stop_id in called})
    interchanges = _pairs({stop_id: joined.site_of[stop_id] for stop_id in called})
    wanted = _pairs(parent)
    right = _pairs({stop_id: complex_of[parent[stop_id]] for stop_id in called})
    return _score(stations, wanted, wanted), _score(interchanges, right, wanted)


def _score(found: Pairs, right: Pairs, wanted: Pairs) -> Score:
    return Score(
        precision=len(found & right) / len(found) if found else 1.0,
        recall=len(found & wanted) / len(wanted) if wanted else 1.0,
        wrong=found - right,
        missed=wanted - found,
    )


def _pairs(label: Mapping[str, str]) -> Pairs:
    groups: dict[str, list[str]] = defaultdict(list)
    for stop_id in sorted(label):
        groups[label[stop_id]].append(stop_id)
    return frozenset(pair for group in groups.values() for pair in itertools.combinations(group, 2))


def main(paths: list[str]) -> None:
    """Print both scores of every feed, and what went wrong."""
    for path in paths:
        timetable = read_feed([Path(path)], FeedSettings())
        name = {stop.id: stop.name for stop in timetable.stops}
        for what, score in zip(("stations", "interchanges"), recovery(timetable), strict=True):
            print(
                f"{path}: {what}: precision {score.precision:.4f}, recall {score.recall:.4f}, "
                f"F1 {score.f1:.4f}"
            )
            for kind, pairs in (("wrong", score.wrong), ("missed", score.missed)):
                for a, b in sorted(pairs):
                    print(f"  {kind}: {a} {name[a]} – {b} {name[b]}")


if __name__ == "__main__":
    main(sys.argv[1:])
