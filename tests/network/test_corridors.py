"""Real networks can be walked, are as long as their streets, and keep under small changes."""

from __future__ import annotations

import itertools
from collections import Counter, defaultdict
from pathlib import Path

import networkx as nx
import pytest
import shapely

from gtfs_schematic.feed.model import FeedSettings, Timetable
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.check import faults
from gtfs_schematic.network.ground import Ground, ground_about
from gtfs_schematic.network.model import Line, Network, NetworkSettings

FEEDS = ("cairns_feed", "nyc_subway_feed", "ann_arbor_feed")


@pytest.fixture(scope="module", params=FEEDS)
def timetable(request) -> Timetable:
    """Give the timetable of a real feed."""
    path: Path = request.getfixturevalue(request.param)
    return read_feed([path], FeedSettings())


@pytest.fixture(scope="module")
def network(timetable) -> Network:
    """Give its network."""
    return build_network(timetable, NetworkSettings())


def _ground(network: Network) -> tuple[Ground, dict[str, shapely.Point]]:
    places = [(s.lon, s.lat) for s in network.stations]
    ground = ground_about(places)
    metres = ground.metres(places)
    return ground, {s.id: shapely.Point(p) for s, p in zip(network.stations, metres, strict=True)}


def _patterns(timetable: Timetable, network: Network) -> dict[str, Counter[tuple[str, ...]]]:
    """Per line the trips by stations called at in order, each once if called at twice in a row."""
    line_of = {route: line.id for line in network.lines for route in line.route_ids}
    station_of = {stop: s.id for s in network.stations for stop in s.stop_ids}
    trips: dict[str, Counter[tuple[str, ...]]] = defaultdict(Counter)
    for pattern in timetable.patterns:
        stations = [station_of[s] for s in pattern.stop_ids if s in station_of]
        calls = tuple(key for key, _ in itertools.groupby(stations))
        if pattern.route_id in line_of and len(calls) > 1:
            trips[line_of[pattern.route_id]][calls] += len(pattern.departures_s)
    return trips


def _walkable(network: Network, line: Line, at: dict[str, shapely.Point]) -> nx.DiGraph:
    """Give the links of a line in the directions in which it runs them."""
    graph = nx.DiGraph()
    one_way = set(line.one_way_links)
    for link in network.links:
        if line.id in link.lines:
            for step in ((link.start, link.end), (link.end, link.start)):
                if step[::-1] not in one_way:
                    graph.add_edge(*step, length=at[step[0]].distance(at[step[1]]))
    return graph


def test_every_kept_pattern_can_be_walked_calling_in_order(timetable, network):
    _, at = _ground(network)
    walked = 0
    for line_id, trips in _patterns(timetable, network).items():
        line = network.line[line_id]
        graph = _walkable(network, line, at)
        for calls, count in trips.items():
            both = count + (trips[calls[::-1]] if calls != calls[::-1] else 0)
            if both < NetworkSettings().min_pattern_share * trips.total():
                continue  # rare: the network may leave it out, and lists it
            walked += count
            for a, b in itertools.pairwise(calls):
                assert line_id in network.station[a].lines
                length = nx.shortest_path_length(graph, a, b, weight="length")
                # Twice as far as the crow flies, and a block: bus routes bend round estates.
                assert length <= 2.0 * at[a].distance(at[b]) + 300.0, (line.name, a, b)
    assert walked >= 0.8 * sum(trips.total() for trips in _patterns(timetable, network).values())


def test_links_are_as_long_as_the_streets_to_within_a_fifth(timetable, network):
    """Streets are the union of all shapes, each made as wide as two that count as one street.

    Links are straight from station to station, so shorter where streets bend; they are longer where
    lines share a street but no station on it.
    """
    ground, at = _ground(network)
    width = NetworkSettings().alongside_m
    used = sorted({p.shape_id for p in timetable.patterns if p.shape_id is not None})
    shapes = [shapely.LineString(ground.metres(timetable.shapes[shape])) for shape in used]
    union = shapely.union_all([s.buffer(width / 2.0, cap_style="flat") for s in shapes])
    links = sum(at[link.start].distance(at[link.end]) for link in network.links)
    assert links == pytest.approx(union.area / width, rel=0.2)
    # Without sharing, the same links would be drawn once for every line.
    each = sum(at[k.start].distance(at[k.end]) * len(k.lines) for k in network.links)
    assert each > links


@pytest.mark.parametrize("key", ["alongside_m", "alongside_deg", "alongside_min_m"])
def test_small_changes_of_a_tolerance_change_little(timetable, network, key):
    links = {(link.start, link.end) for link in network.links}
    for factor in (0.9, 1.1):
        settings = NetworkSettings(**{key: factor * getattr(NetworkSettings(), key)})
        other = build_network(timetable, settings)
        assert faults(other) == ()
        found = {(link.start, link.end) for link in other.links}
        assert len(links & found) >= 0.95 * len(links | found)
