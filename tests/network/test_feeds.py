"""Real feeds and the demo feeds become networks without fault."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from pathlib import Path

import networkx as nx
import pytest

from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.check import faults
from gtfs_schematic.network.model import Link, Network, NetworkSettings
from gtfs_schematic.network.smooth import unfold

DATA = Path(__file__).parents[2] / "data"


def _network(path: Path) -> Network:
    return build_network(read_feed([path], FeedSettings()), NetworkSettings())


def _degrees(network: Network) -> Counter[str]:
    return Counter(end for link in network.links for end in (link.start, link.end))


@pytest.mark.parametrize("feed", ["cairns_feed", "nyc_subway_feed", "ann_arbor_feed"])
def test_registry_feeds(request, feed):
    network = _network(request.getfixturevalue(feed))
    assert faults(network) == ()
    assert unfold(network.corridors) == network.links
    assert max(_degrees(network).values()) <= 8


def test_two_metro_lines_are_one_tree(nyc_subway_feed):
    network = _network(nyc_subway_feed)
    assert [line.name for line in network.lines] == ["1", "2"]
    graph = nx.Graph([(link.start, link.end) for link in network.links])
    # The express runs over the local track, so that nothing closes a circle.
    assert nx.is_tree(graph)


def test_no_link_is_a_chord_beside_the_local_track(script, nyc_subway_feed):
    expresses = script("expresses")
    timetable = read_feed([nyc_subway_feed], FeedSettings())
    network = build_network(timetable, NetworkSettings())
    assert not [s for s in expresses.suspects(timetable, network) if s.is_chord]
    # A chord that is put in by hand is found.
    a, b, c = network.lines[0].courses[0][3:6]
    chord = Link("chord", min(a, c), max(a, c), network.link_between[frozenset((a, b))].lines)
    spoiled = replace(network, links=(*network.links, chord))
    found = [s for s in expresses.suspects(timetable, spoiled) if s.is_chord]
    assert [(s.link.id, set(s.way)) for s in found] == [("chord", {a, b, c})]


def test_kerbs_of_a_bus_network_are_one_station(cairns_feed):
    timetable = read_feed([cairns_feed], FeedSettings())
    nothing = NetworkSettings(merge_name_m=0.0, merge_kerbs_m=0.0, merge_hub_m=0.0)
    apart = build_network(timetable, nothing)
    network = build_network(timetable, NetworkSettings())
    one_way = sum(len(line.one_way_links) for line in network.lines)
    before = sum(len(line.one_way_links) for line in apart.lines)
    assert one_way < 0.5 * before
    assert len(network.stations) < 0.75 * len(apart.stations)


@pytest.fixture(scope="module")
def demo() -> Network:
    """Give the network of the demo feed before the service change."""
    return _network(DATA / "before.zip")


def test_demo_feeds_are_without_fault(demo):
    assert faults(demo) == ()
    assert faults(_network(DATA / "after.zip")) == ()


def test_demo_express_runs_on_the_local_track(demo):
    fast, local = (next(line for line in demo.lines if line.name == name) for name in ("RX", "R1"))
    assert len(fast.itineraries[0]) < len(fast.courses[0])
    assert fast.courses == local.courses


def test_demo_trams_share_a_street(demo):
    one, other = (next(line for line in demo.lines if line.name == name) for name in ("5", "6"))
    shared = [link for link in demo.links if {one.id, other.id} <= set(link.lines)]
    assert len(shared) >= 4
    inside = {s for link in shared for s in (link.start, link.end)}
    callers = Counter(demo.station[s].lines for s in inside)
    assert callers[one.id,] >= 2
    assert callers[other.id,] >= 2


def test_demo_interchange_of_three_is_one_group(demo):
    sizes = Counter(station.group for station in demo.stations)
    assert sorted(sizes.values())[-2:] == [1, 3]
    assert len(demo.walks) == 2


def test_demo_namesakes_stay_apart(demo):
    names = Counter(station.name for station in demo.stations)
    assert [count for count in names.values() if count > 1] == [2]


def test_demo_loop_is_one_way_and_the_ring_is_not(demo):
    loops = [line for line in demo.lines if line.one_way_links]
    assert [line.name for line in loops] == ["7"]
    assert len(loops[0].one_way_links) == 4
    rings = [line for line in demo.lines if line.itineraries[0][0] == line.itineraries[0][-1]]
    assert [line.name for line in rings] == ["1"]


def test_demo_services(demo):
    services = {line.name: line.service for line in demo.lines}
    assert services["N1"] == "night"
    assert services["8"] == "some-days"
    part = {line.name: line.part_service for line in demo.lines if line.part_service}
    assert list(part) == ["4"]
    assert {service for _, _, service in part["4"]} == {"peak"}
    assert services["1"] == "all-day"
    assert [line.name for line in demo.lines if not line.color_from_feed] == ["8"]
