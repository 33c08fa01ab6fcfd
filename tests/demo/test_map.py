"""The network of the demo feeds makes a good diagram: few crossings, sane stations."""

from __future__ import annotations

import itertools
from typing import TYPE_CHECKING

import networkx as nx
from pyproj import Geod
from shapely.geometry import LineString

from gtfs_schematic.demo.ground import CENTER_LAT, CENTER_LON, METERS_PER_DEGREE, lon_lat

if TYPE_CHECKING:
    from tests.demo.conftest import Feed

GEOD = Geod(ellps="WGS84")


def _graph(feed: Feed) -> nx.Graph:
    """Give the links between places; the express and the shared street follow every stop."""
    graph = nx.Graph()
    street = ["107", "311", "312", "313", "314", "315"]
    for route in (row["route_id"] for row in feed["routes"] if row["route_id"] != "rx"):
        for places in feed.patterns(route):
            for a, b in itertools.pairwise(places):
                if a in street and b in street:
                    low, high = sorted((street.index(a), street.index(b)))
                    nx.add_path(graph, street[low : high + 1])
                else:
                    graph.add_edge(a, b)
    return graph


def _crossings(feed: Feed, graph: nx.Graph) -> list[tuple[tuple[str, str], tuple[str, str]]]:
    lines = {edge: LineString([feed.lon_lat(place) for place in edge]) for edge in graph.edges}
    return [
        (first, second)
        for first, second in itertools.combinations(sorted(lines), 2)
        if not set(first) & set(second) and lines[first].crosses(lines[second])
    ]


def test_no_station_has_too_many_neighbors(feed: Feed):
    graph = _graph(feed)
    assert max(degree for _, degree in graph.degree) == 6
    assert sum(degree >= 4 for _, degree in graph.degree) >= 10


def test_few_links_cross_without_a_station(before: Feed, after: Feed):
    assert len(_crossings(before, _graph(before))) == 3
    assert len(_crossings(after, _graph(after))) == 2  # the rerouted line calls at one


def test_the_network_is_whole(feed: Feed):
    graph = _graph(feed)
    for walk in (("192", "341"), ("192", "361"), ("322", "362")):
        graph.add_edge(*walk)
    assert nx.is_connected(graph)


def test_stations_lie_closer_in_the_center_than_at_the_ends(feed: Feed):
    graph = _graph(feed)
    lengths: dict[bool, list[float]] = {True: [], False: []}
    for a, b in graph.edges:
        mean = [(p + q) / 2 for p, q in zip(feed.lon_lat(a), feed.lon_lat(b), strict=True)]
        away = GEOD.inv(CENTER_LON, CENTER_LAT, *mean)[2]
        lengths[away < 2500].append(GEOD.inv(*feed.lon_lat(a), *feed.lon_lat(b))[2])
    inner, outer = (sorted(part) for part in (lengths[True], lengths[False]))
    assert 500 < inner[len(inner) // 2] < 900
    assert outer[len(outer) // 2] > 1.4 * inner[len(inner) // 2]


def test_degrees_agree_with_the_geodesic():
    # pyproj.Geod (Karney 2013) against the fixed metres per degree used for the region.
    for east, north in ((1000, 0), (0, 1000), (15_000, 7100), (-7300, -8050)):
        lon, lat = lon_lat(east, north)
        length = GEOD.inv(CENTER_LON, CENTER_LAT, lon, lat)[2]
        assert abs(length / (east**2 + north**2) ** 0.5 - 1) < 0.002
    assert METERS_PER_DEGREE[0] < METERS_PER_DEGREE[1]
