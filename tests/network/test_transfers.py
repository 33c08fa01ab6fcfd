"""Transfers merge what is close and few; the rest become walks of one interchange group."""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING

import networkx as nx
import pytest
from pyproj import Geod

if TYPE_CHECKING:
    from conftest import Town


@pytest.fixture
def two_stations(town):
    """Give two lines that meet in two stations without a transfer."""

    def at(gap_m: float) -> Town:
        return (
            town.row(["A", "S"], gap_m=2000)
            .stops({"T": (2000 + gap_m, 0), "B": (4000, 900)})
            .both("red", "A S")
            .both("blue", "T B")
        )

    return at


def test_close_stations_joined_by_a_transfer_merge(two_stations):
    network = two_stations(80).transfer("S", "T").network()
    assert network.station["S"].stop_ids == ("S", "T")
    assert "transfers" in network.station["S"].merge_reason
    assert network.walks == ()


def test_stations_further_apart_keep_a_walk_and_share_a_group(two_stations):
    network = two_stations(200).transfer("T", "S", time_s=240).transfer("S", "T").network()
    (walk,) = network.walks
    assert (walk.start, walk.end, walk.time_s) == ("S", "T", 180)
    assert network.station["S"].group == network.station["T"].group == "S"
    assert network.groups == len(network.stations) - 1
    assert {network.station[s].kind for s in "ST"} == {"interchange"}


@pytest.mark.parametrize("kind", [3, 4, 5])
def test_transfers_that_nobody_walks_join_nothing(two_stations, kind):
    network = two_stations(80).transfer("S", "T", kind).network()
    assert len(network.stations) == 4
    assert network.walks == ()


def test_a_transfer_too_far_to_walk_is_left_out(two_stations):
    network = two_stations(2600).transfer("S", "T").network()
    assert network.walks == ()
    assert [out.id for out in network.left_out if out.kind == "transfer"] == ["S – T"]


def test_walks_are_a_shortest_spanning_tree(town):
    places = {"P": (0, 0), "Q": (300, 0), "R": (300, 200), "S": (0, 260)}
    written = town.stops(places)
    for n, (station, (x, y)) in enumerate(places.items()):
        far = f"{station}2"
        written = written.stop(far, x + 3000 * (-1) ** n, y * 20).both(f"l{n}", [station, far])
    for a in places:
        for b in places:
            if a < b:
                written = written.transfer(a, b)
    network = written.network()
    graph = nx.Graph()
    geod = Geod(ellps="WGS84")
    for a in places:
        for b in places:
            if a < b:
                one, other = network.station[a], network.station[b]
                _, _, length = geod.inv(one.lon, one.lat, other.lon, other.lat)
                graph.add_edge(a, b, weight=length)
    tree = nx.minimum_spanning_tree(graph, algorithm="prim")
    assert {(w.start, w.end) for w in network.walks} == {tuple(sorted(e)) for e in tree.edges}


def test_a_complex_is_not_merged_into_one_point(town):
    written = town
    ids = [f"S{i}" for i in range(5)]
    for i, station in enumerate(ids):
        written = written.stop(station, 15 * i).stop(f"E{i}", 2000, 900 * i)
        written = written.both(f"l{i}", [station, f"E{i}"])
    for a, b in pairwise(ids):
        written = written.transfer(a, b)
    network = written.network()
    merged = [station for station in network.stations if station.id.startswith("S")]
    assert max(len(station.stop_ids) for station in merged) <= 3
    assert len({station.group for station in merged}) == 1


def test_stations_with_a_common_track_need_no_walk(town):
    network = town.row("ABC", gap_m=300).both("red", "A B C").transfer("A", "B").network()
    assert network.walks == ()
    assert len(network.stations) == 3
