"""Journeys: a worked example by hand, and shortest paths of networkx on the demo."""

from __future__ import annotations

import itertools
import statistics
from collections import defaultdict
from dataclasses import replace
from pathlib import Path

import networkx as nx
import numpy as np
import pytest
import small_diagrams
from hypothesis import given, settings
from hypothesis import strategies as st
from small_diagrams import Drawn, Named, Stop, rail

from gtfs_schematic.config import Settings
from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.drift.journeys import measure_journeys
from gtfs_schematic.drift.model import DriftSettings
from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.drift.rides import course_length, rides_of, typical_length
from gtfs_schematic.drift.timing import timing_of
from gtfs_schematic.drift.ways import ways_of
from gtfs_schematic.pipeline import inspect

BEFORE = Path(__file__).parents[2] / "data" / "before.zip"


def journey(journeys, start, end):
    return next(j for j in journeys.worst if (j.start, j.end) == (start, end))


def test_planning_error_by_hand():
    """From A to D line 1 looks shorter, but is slower.

    It is drawn 2 x 14.1 mm long and takes 300 + 1000 s with half a headway of 600 s; line 2, drawn
    2 x 31.6 mm long, takes 300 + 400 s. So the error is 1300 / 700. On to F both ways go on from
    D to E on foot (90 s) and ride 100 s after half of 1200 s.
    """
    found = measure_journeys(small_diagrams.two_ways(), DriftSettings())
    ad = journey(found, "a", "d")
    assert ad.ratio == pytest.approx(1300 / 700)
    assert [leg.line for leg in ad.looks_shortest.legs] == ["1"]
    assert ad.looks_shortest.legs[0].stations == ("a", "b", "d")
    assert (ad.looks_shortest.legs[0].wait_s, ad.looks_shortest.legs[0].time_s) == (300, 1000)
    assert ad.looks_shortest.time_s == 1300
    assert ad.looks_shortest.drawn_mm == pytest.approx(2 * 200**0.5, rel=1e-3)
    assert [leg.line for leg in ad.fastest.legs] == ["2"]
    assert found.largest == ad.ratio
    ways = ways_of(small_diagrams.two_ways(), DriftSettings())
    assert ways.looks_shortest(0, 5).time_s == 1300 + 90 + 600 + 100
    assert ways.fastest(0, 5).time_s == 700 + 90 + 600 + 100
    assert [leg.line for leg in ways.fastest(0, 5).legs] == ["2", "", "3"]
    # 6 stations, of which D and E are one interchange.
    assert (found.pairs, found.unreached, found.origins) == (6 * 5 - 2, 0, 6)


def test_a_diagram_that_draws_the_fast_line_short_misleads_nobody():
    diagram = small_diagrams.two_ways()
    b, c = diagram.stations[1], diagram.stations[2]
    places = {"b": (b.x_mm, 30.0), "c": (c.x_mm, -10.0)}
    stations = {
        s.id: replace(s, x_mm=places[s.id][0], y_mm=places[s.id][1]) if s.id in places else s
        for s in diagram.stations
    }
    links = tuple(rail(k.id, stations[k.start], stations[k.end], *k.lines) for k in diagram.links)
    found = measure_journeys(
        replace(diagram, stations=tuple(stations.values()), links=links), DriftSettings()
    )
    assert found.largest == 1.0
    assert found.worst == ()


def test_of_ways_that_look_equal_the_fastest_counts():
    """An express beside the local, on the same links, misleads nobody."""
    a, b, c = (Stop(key, 1000 * i, 0, 10 * i, 0, key) for i, key in enumerate("abc"))
    hour = tuple(range(30000, 33600, 300))
    found = measure_journeys(
        Drawn(
            (a, b, c),
            (rail("ab", a, b, "1", "x"), rail("bc", b, c, "1", "x")),
            (),
            (Named("1", "1"), Named("x", "X")),
            (
                TimedPattern("1", ("a", "b", "c"), (0, 200, 400), hour),
                TimedPattern("x", ("a", "c"), (0, 250), hour),
            ),
        ),
        DriftSettings(),
    )
    assert (found.largest, found.pairs, found.unreached) == (1.0, 3, 3)


def test_a_change_within_a_station_takes_its_time_and_looks_like_links():
    """Two lines cross at B: time 300 + 100 + change + 300 + 100, look 2 links and the change."""
    a, b, c = (Stop(key, 1000 * i, 0, 10 * i, 0, key) for i, key in enumerate("abc"))
    hour = tuple(range(30000, 33600, 600))
    patterns = (
        TimedPattern("1", ("a", "b"), (0, 100), hour),
        TimedPattern("2", ("b", "c"), (0, 100), hour),
        TimedPattern("3", ("a", "c"), (0, 2000), hour),
    )
    links = (rail("ab", a, b, "1"), rail("bc", b, c, "2"), rail("ac", a, c, "3"))
    lines = (Named("1", "1"), Named("2", "2"), Named("3", "3"))
    for given_s, expected in ((None, 180), (45, 45)):
        stations = (a, replace(b, change_s=given_s), c)
        diagram = Drawn(stations, links, (), lines, patterns)
        found = journey(measure_journeys(diagram, DriftSettings()), "a", "c")
        assert found.fastest.time_s == 800 + expected
        assert found.looks_shortest.time_s == 2300
        # Typical (median) link: 10 mm.
        assert found.fastest.drawn_mm == pytest.approx(20 + 3 * 10, rel=1e-3)
        assert found.looks_shortest.drawn_mm == pytest.approx(20, rel=1e-3)


def test_without_a_timetable_nothing_is_measured():
    diagram = replace(small_diagrams.two_ways(), patterns=())
    assert measure_journeys(diagram, DriftSettings()) is None


def test_night_lines_do_not_count_by_day():
    diagram = small_diagrams.two_ways()
    late = tuple(
        replace(p, departures_s=(90000, 90600)) if p.line == "2" else p for p in diagram.patterns
    )
    rides = rides_of(replace(diagram, patterns=late), DriftSettings())
    assert set(rides.line) == {"1", "3"}
    only_late = tuple(p for p in late if p.line == "2")
    assert set(rides_of(replace(diagram, patterns=only_late), DriftSettings()).line) == {"2"}


def test_rare_rides_are_no_choice():
    diagram = small_diagrams.two_ways()
    rare = TimedPattern("1", ("a", "d"), (0, 10), (36000,))
    found = rides_of(replace(diagram, patterns=(*diagram.patterns, rare)), DriftSettings())
    # The way from A to D is drawn over B all the same, so the trip joins the ride over B.
    ad = [i for i in range(len(found.line)) if found.stations[i] == ("a", "b", "d")]
    assert [int(found.time_s[i]) for i in ad] == [1000]
    ring = replace(rare, stations=("b", "a", "b"), times_s=(0, 10, 20))
    lone = rides_of(replace(diagram, patterns=(*diagram.patterns, ring)), DriftSettings())
    assert len(lone.line) == len(found.line)


def test_origins_are_spread_when_there_are_too_many():
    found = measure_journeys(small_diagrams.two_ways(), DriftSettings(most_origins=2))
    assert found.origins == 2
    # From A (5 other interchanges' stations) and F (5).
    assert found.pairs == 10


@given(st.integers(0, 2**32 - 1))
@settings(max_examples=30)
def test_errors_are_at_least_one_and_shares_fall(seed):
    found = measure_journeys(random_network(seed), DriftSettings())
    assert 1.0 <= found.median <= found.p95 <= found.largest
    shares = [share for _, share in found.over]
    assert shares == sorted(shares, reverse=True)
    for worst in found.worst:
        assert worst.looks_shortest.time_s >= worst.fastest.time_s
        assert worst.looks_shortest.drawn_mm <= worst.fastest.drawn_mm + 1e-9


def random_network(seed: int) -> Drawn:
    """Draw three random lines over nine stations."""
    rng = np.random.default_rng(seed)
    stops = tuple(
        Stop(f"s{i}", *rng.uniform(0, 5000, 2), *rng.uniform(0, 100, 2), f"s{i}") for i in range(9)
    )
    index = {s.id: s for s in stops}
    rails, patterns = {}, []
    for line in "123":
        way = [f"s{i}" for i in rng.permutation(9)[:6]]
        times = (0, *np.cumsum(rng.integers(60, 600, 5)).tolist())
        departures = tuple(range(28800, 43200, int(rng.integers(3, 40)) * 60))
        patterns += [TimedPattern(line, tuple(ids), times, departures) for ids in (way, way[::-1])]
        for a, b in itertools.pairwise(way):
            key = "-".join(sorted((a, b)))
            lines = (*(rails[key].lines if key in rails else ()), line)
            rails[key] = rail(key, *(index[k] for k in sorted((a, b))), *lines)
    return Drawn(
        stops, tuple(rails.values()), (), tuple(Named(x, x) for x in "123"), tuple(patterns)
    )


@pytest.fixture(scope="module")
def demo() -> Drawn:
    """Draw the demo by its coordinates, stretched and bent, with its timetable."""
    timetable, network = inspect(BEFORE, Settings())
    timing = timing_of(timetable, network)
    places = local_metres([(s.lon, s.lat) for s in network.stations])
    at = {
        s.id: (p.real / 60.0 + p.imag**2 / 4e6, -p.imag / 90.0)
        for s, p in zip(network.stations, places, strict=True)
    }
    stops = {
        s.id: Stop(s.id, p.real, p.imag, *at[s.id], s.group, timing.change_s.get(s.id))
        for s, p in zip(network.stations, places, strict=True)
    }
    return Drawn(
        tuple(stops.values()),
        tuple(rail(k.id, stops[k.start], stops[k.end], *k.lines) for k in network.links),
        tuple(rail(w.id, stops[w.start], stops[w.end], time_s=w.time_s) for w in network.walks),
        tuple(Named(line.id, line.name) for line in network.lines),
        timing.patterns,
    )


def rides_by_force(diagram: Drawn, told: DriftSettings) -> nx.MultiDiGraph:
    """Write every ride of a diagram as an edge."""
    unit = typical_length(diagram.links) / 1000
    tracks = defaultdict(nx.Graph)
    for link in diagram.links:
        for line in link.lines:
            tracks[line].add_edge(link.start, link.end, look=round(course_length(link) / unit))
    trips = defaultdict(list)
    whole = defaultdict(int)
    for pattern in diagram.patterns:
        day = [d for d in pattern.departures_s if 6 * 3600 <= d < 22 * 3600]
        whole[pattern.line] += len(day)
        ways = [
            nx.dijkstra_path_length(tracks[pattern.line], a, b, weight="look")
            for a, b in itertools.pairwise(pattern.stations)
        ]
        for i, j in itertools.combinations(range(len(pattern.stations)), 2):
            a, b = pattern.stations[i], pattern.stations[j]
            run = pattern.times_s[j] - pattern.times_s[i]
            key = (pattern.line, a, b, sum(ways[i:j]))
            if a != b:
                trips[key] += [(d + pattern.times_s[i], run) for d in day]
    graph = nx.MultiDiGraph()
    for (line, a, b, look), runs in trips.items():
        if len(runs) < told.rare_share * whole[line] or not runs:
            continue
        boarded = sorted(time for time, _ in runs)
        gaps = [later - sooner for sooner, later in itertools.pairwise(boarded)]
        wait = min(int(statistics.median(gaps)) // 2, 1800) if gaps else 1800
        run = statistics.median_low(run for _, run in runs)
        graph.add_edge((a, 0), (b, 1), look=look, time=wait + run)
    return graph


def brute_force(diagram: Drawn) -> nx.MultiDiGraph:
    """Write every ride, change and walk of a diagram as an edge with its look and its time.

    Written anew from the definitions: medians by the statistics module, courses by networkx on
    lengths in millimetres.
    """
    told = DriftSettings()
    graph = rides_by_force(diagram, told)
    unit = typical_length(diagram.links) / 1000
    for stop in diagram.stations:
        change = told.change_s if stop.change_s is None else stop.change_s
        graph.add_edge((stop.id, 1), (stop.id, 0), look=3000, time=change)
    for walk in diagram.walks:
        look = round(course_length(walk) / unit)
        for a, b in itertools.permutations((walk.start, walk.end)):
            for i, j, more in ((0, 0, 0), (1, 1, 0), (1, 0, 3000)):
                graph.add_edge((a, i), (b, j), look=look + more, time=walk.time_s)
    return graph


def least(graph: nx.MultiDiGraph, start: str, first: str, second: str) -> dict:
    """Give shortest lengths by one weight, then the other."""

    def both(_: object, __: object, edges: dict) -> int:
        return min(edge[first] * 10**7 + edge[second] for edge in edges.values())

    return nx.single_source_dijkstra_path_length(graph, (start, 0), weight=both)


def test_all_journeys_of_the_demo_are_those_of_networkx(demo):
    graph = brute_force(demo)
    ratios = []
    for start in demo.stations:
        seen = least(graph, start.id, "look", "time")
        fast = least(graph, start.id, "time", "look")
        ratios += [
            (seen[end.id, 1] % 10**7) / (fast[end.id, 1] // 10**7)
            for end in demo.stations
            if end.group != start.group and (end.id, 1) in fast
        ]
    found = measure_journeys(demo, DriftSettings())
    assert found.pairs == len(ratios)
    assert found.mean == pytest.approx(statistics.fmean(ratios), rel=1e-12)
    assert found.largest == pytest.approx(max(ratios), rel=1e-12)
    assert dict(found.over)[1.15] == pytest.approx(sum(r > 1.15 for r in ratios) / len(ratios))
    assert found.largest > 1.15  # the picture is bent enough to mislead somebody


def test_worst_journeys_of_the_demo_are_spelled_out_as_ridden(demo):
    """Every leg runs over links of its line, and the parts make up the whole."""
    found = measure_journeys(demo, DriftSettings())
    links = {frozenset((k.start, k.end)): k.lines for k in demo.links}
    change = {s.id: 180 if s.change_s is None else s.change_s for s in demo.stations}
    assert len(found.worst) == 30
    for worst in found.worst:
        for way in (worst.looks_shortest, worst.fastest):
            time, before = 0, ""
            for leg in way.legs:
                time += leg.wait_s + leg.time_s
                if leg.line and before:
                    time += change[leg.stations[0]]
                before = leg.line
                for a, b in itertools.pairwise(leg.stations):
                    assert not leg.line or leg.line in links[frozenset((a, b))]
            assert time == way.time_s
            assert (way.legs[0].stations[0], way.legs[-1].stations[-1]) == (worst.start, worst.end)
        assert worst.ratio == pytest.approx(worst.looks_shortest.time_s / worst.fastest.time_s)
