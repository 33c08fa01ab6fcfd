"""The network depends on what a timetable says, not on its order, and loses nothing of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise
from typing import TYPE_CHECKING

import networkx as nx
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.errors import FeedError
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.check import faults
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.smooth import unfold
from gtfs_schematic.progress import Silent

if TYPE_CHECKING:
    from conftest import Town


def test_the_busy_town_is_without_fault(busy_town):
    network = busy_town.network()
    assert faults(network) == ()
    assert unfold(network.corridors) == network.links


def test_the_busy_town_has_what_was_written(busy_town):
    network = busy_town.network()
    assert network.line["fast"].courses == (("A", "B", "C", "D", "E", "F", "G"),)
    assert network.line["t5"].courses[0][:3] == ("T1", "U1", "T2")
    assert len({network.station[s].group for s in ("G", "P1", "X1")}) == 1
    assert len(network.walks) == 2
    assert network.station["Z"].name == network.station["D"].name
    assert network.station["A"].stop_ids == ("A", "A1")
    assert {tuple(step) for step in network.line["t6"].one_way_links} == {
        ("L1", "L2"),
        ("L2", "L3"),
        ("L3", "L1"),
    }


@settings(max_examples=25)
@given(st.randoms(use_true_random=False))
def test_shuffled_timetables_give_the_same_network(busy_town, random):
    timetable = busy_town.timetable

    def shuffled(things: Sequence[object]) -> tuple[object, ...]:
        things = list(things)
        random.shuffle(things)
        return tuple(things)

    mixed = replace(
        timetable,
        stops=shuffled(timetable.stops),
        routes=shuffled(timetable.routes),
        patterns=shuffled(timetable.patterns),
        transfers=shuffled(timetable.transfers),
    )
    assert build_network(mixed, NetworkSettings()) == busy_town.network()


@st.composite
def _timetables(draw: st.DrawFn, town: Town) -> Town:
    """Draw a town with stops on a coarse grid and lines that wander between them."""
    ids = [f"s{n}" for n in range(draw(st.integers(2, 12)))]
    written = town
    for stop_id in ids:
        x, y = draw(st.integers(0, 12)), draw(st.integers(0, 12))
        name = draw(st.sampled_from([stop_id, stop_id, "Mill Lane"]))
        written = written.stop(stop_id, 130.0 * x, 130.0 * y, name=name)
    for n in range(draw(st.integers(1, 5))):
        written = written.route(f"r{n}", mode=draw(st.sampled_from(["metro", "tram", "ferry"])))
        for _ in range(draw(st.integers(1, 3))):
            run = draw(st.lists(st.sampled_from(ids), min_size=2, max_size=8))
            written = written.run(f"r{n}", run, trips=draw(st.integers(1, 30)))
    for _ in range(draw(st.integers(0, 4))):
        one, other = draw(st.sampled_from(ids)), draw(st.sampled_from(ids))
        if one != other:
            written = written.transfer(one, other)
    return written


@settings(max_examples=150)
@given(st.data())
def test_any_timetable_gives_a_network_without_fault(town, data):
    written = data.draw(_timetables(town))
    try:
        network = written.network()
    except FeedError:
        return
    assert faults(network) == ()
    assert unfold(network.corridors) == network.links


@settings(max_examples=60)
@given(st.data())
def test_what_a_trip_joins_stays_joined(town, data):
    written = data.draw(_timetables(town))
    try:
        network = written.network(min_pattern_share=0.0)
    except FeedError:
        return
    station_of = {stop: s.id for s in network.stations for stop in s.stop_ids}
    ridden = nx.Graph()
    for pattern in written.timetable.patterns:
        called = [station_of[stop] for stop in pattern.stop_ids if stop in station_of]
        ridden.add_nodes_from(called)
        ridden.add_edges_from(step for step in pairwise(called) if step[0] != step[1])
    drawn = nx.Graph([(link.start, link.end) for link in network.links])
    expected = {frozenset(part) for part in nx.connected_components(ridden)}
    found = {frozenset(part) for part in nx.connected_components(drawn)}
    # Passing over foreign stations may join what trips do not, but nothing may fall apart.
    assert all(any(part <= whole for whole in found) for part in expected)
    assert set(drawn) == set(ridden)


def test_nothing_to_draw_is_an_error(town):
    alone = town.stop("A", 0).stop("B", 0, lon=None).run("r", "A B")
    with pytest.raises(FeedError, match="another date"):
        alone.network()


def test_progress_is_told(busy_town):
    class Listener(Silent):
        def __init__(self) -> None:
            self.phases: list[str] = []

        def phase(self, name: str, total: int | None = None) -> None:  # noqa: ARG002 (the protocol)
            self.phases.append(name)

    listener = Listener()
    build_network(busy_town.timetable, NetworkSettings(), progress=listener)
    assert len(listener.phases) == 3
