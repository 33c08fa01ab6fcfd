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
from gtfs_schematic.network.between import from_station_to_station
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
    nodes = (*network.stations, *network.junctions)
    places = [(node.lon, node.lat) for node in nodes]
    ground = ground_about(places)
    metres = ground.metres(places)
    return ground, {node.id: shapely.Point(p) for node, p in zip(nodes, metres, strict=True)}


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


def _shapes(timetable: Timetable, network: Network) -> dict[str, list[shapely.LineString]]:
    """Give the shapes of every line, in metres."""
    ground, _ = _ground(network)
    line_of = {route: line.id for line in network.lines for route in line.route_ids}
    used = {(line_of[p.route_id], p.shape_id) for p in timetable.patterns if p.route_id in line_of}
    shapes: dict[str, list[shapely.LineString]] = defaultdict(list)
    for line, shape in sorted(used, key=str):
        if shape in timetable.shapes:
            shapes[line].append(shapely.LineString(ground.metres(timetable.shapes[shape])))
    return shapes


def _street_m(ends: tuple[shapely.Point, shapely.Point], shapes: list[shapely.LineString]) -> float:
    """Give the least way from end to end along a shape that passes both, else the straight one."""
    straight = ends[0].distance(ends[1])
    near = 2.2 * NetworkSettings().alongside_m
    ways = [
        abs(shape.project(ends[0]) - shape.project(ends[1]))
        for shape in shapes
        if all(shape.distance(end) < near for end in ends)
    ]
    return min((way for way in ways if way >= 0.8 * straight), default=straight)


def test_every_kept_pattern_can_be_walked_calling_in_order(timetable, network):
    _, at = _ground(network)
    shapes = _shapes(timetable, network)
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
                # As far as its shape goes, or twice as far as the crow flies, and a block: bus
                # routes bend round estates.
                street = 1.1 * _street_m((at[a], at[b]), shapes[line_id])
                limit = max(street, 2.0 * at[a].distance(at[b])) + 300.0
                assert length <= limit, (line.name, a, b)
    assert walked >= 0.8 * sum(trips.total() for trips in _patterns(timetable, network).values())


def test_links_are_as_long_as_the_streets_to_within_a_tenth(timetable, network):
    """Streets are the union of all shapes, each made as wide as two that count as one street.

    A link is as long as the street between its ends, by the shapes of the lines on it: what is
    drawn twice, or not at all, shows.
    """
    ground, at = _ground(network)
    width = NetworkSettings().alongside_m
    by_line = _shapes(timetable, network)
    used = {p.shape_id for p in timetable.patterns if p.shape_id is not None}
    streets = [
        shapely.LineString(ground.metres(timetable.shapes[shape])).buffer(
            width / 2.0, cap_style="flat"
        )
        for shape in sorted(used)
    ]
    union = shapely.union_all(streets)
    links = sum(
        _street_m((at[k.start], at[k.end]), [s for line in k.lines for s in by_line[line]])
        for k in network.links
    )
    assert links == pytest.approx(union.area / width, rel=0.1)


@pytest.mark.parametrize("key", ["alongside_m", "alongside_deg", "alongside_min_m"])
def test_small_changes_of_a_tolerance_change_little(timetable, network, key):
    def drawn(network: Network) -> tuple[set[tuple[str, str]], float]:
        _, at = _ground(network)
        ways = {(way.start, way.end) for way in from_station_to_station(network)}
        return ways, sum(at[k.start].distance(at[k.end]) for k in network.links)

    ways, length = drawn(network)
    for factor in (0.9, 1.1):
        settings = NetworkSettings(**{key: factor * getattr(NetworkSettings(), key)})
        other = build_network(timetable, settings)
        assert faults(other) == ()
        found, long = drawn(other)
        assert len(ways & found) >= 0.95 * len(ways | found)
        assert long == pytest.approx(length, rel=0.03)


def test_junctions_are_of_buses_alone(timetable, network):
    by_stations = build_network(timetable, NetworkSettings(corridors="stations"))
    modes = {line.mode for line in network.lines}
    assert bool(network.junctions) == (modes == {"bus"})
    if not network.junctions:
        assert network == by_stations
    # Whoever called somewhere still does, and every line of a link keeps one.
    assert [line.itineraries for line in network.lines] == [
        line.itineraries for line in by_stations.lines
    ]
