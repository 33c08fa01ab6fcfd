"""Links fold into corridors and unfold exactly."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping
from itertools import pairwise

import networkx as nx
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.network.links import link_id
from gtfs_schematic.network.model import Link, Station
from gtfs_schematic.network.smooth import corridors_of, unfold


def _stations(ids: Iterable[str], walked: Iterable[str] = ()) -> tuple[Station, ...]:
    return tuple(
        Station(s, s, "", (s,), 0.0, 0.0, "stop", "walk" if s in walked else s, (), "unknown")
        for s in sorted(ids)
    )


def _links(steps: Mapping[tuple[str, str], str]) -> tuple[Link, ...]:
    """Make links from {(a, b): lines}."""
    links = [
        Link(link_id(min(a, b), max(a, b)), min(a, b), max(a, b), tuple(sorted(lines)))
        for (a, b), lines in steps.items()
    ]
    return tuple(sorted(links, key=lambda link: link.id))


def _chain(ids: str, lines: str = "x") -> dict[tuple[str, str], str]:
    return {tuple(sorted(step)): lines for step in pairwise(ids)}


graphs = st.dictionaries(
    st.tuples(st.sampled_from("ABCDEFGHIJ"), st.sampled_from("ABCDEFGHIJ"))
    .filter(lambda pair: pair[0] != pair[1])
    .map(lambda pair: tuple(sorted(pair))),
    st.sampled_from(["x", "x", "x", "xy"]),
    min_size=1,
    max_size=14,
)


@given(graphs, st.sets(st.sampled_from("ABCDEFGHIJ"), max_size=3), st.randoms())
def test_unfolding_gives_exactly_the_links(steps, walked, random):
    links = _links(steps)
    shuffled = list(links)
    random.shuffle(shuffled)
    stations = _stations({s for pair in steps for s in pair}, walked)
    corridors = corridors_of(stations, shuffled)
    assert unfold(corridors) == links
    assert corridors == corridors_of(stations, links)


@given(graphs)
def test_corridors_are_as_long_as_they_can_be(steps):
    graph = nx.Graph(list(steps))
    corridors = corridors_of(_stations(graph.nodes), _links(steps))
    through = {
        s
        for s in graph
        if graph.degree[s] == 2
        and len({steps[tuple(sorted((s, other)))] for other in graph[s]}) == 1
    }
    # Every station that can be inside a corridor is, but for one per pure ring.
    rings = sum(
        all(s in through for s in part) for part in map(set, nx.connected_components(graph))
    )
    inside = [s for corridor in corridors for s in corridor.station_ids[1:-1]]
    assert len(inside) == len(set(inside)) == len(through) - rings


def test_a_pure_ring_starts_and_ends_at_its_least_station():
    (corridor,) = corridors_of(_stations("BCDE"), _links(_chain("CDEBC")))
    assert corridor.station_ids in {("B", "C", "D", "E", "B"), ("B", "E", "D", "C", "B")}
    assert len(corridor.link_ids) == 4


def test_a_loop_at_the_end_of_a_stem():
    corridors = corridors_of(_stations("ABCDE"), _links(_chain("ABCDEB")))
    ends = Counter(corridor.station_ids[0] + corridor.station_ids[-1] for corridor in corridors)
    assert ends == {"AB": 1, "BB": 1}


def test_walks_and_a_change_of_lines_end_a_corridor():
    steps = _chain("ABCD") | _chain("DE", "xy")
    corridors = corridors_of(_stations("ABCDEZ", walked="BZ"), _links(steps))
    assert sorted("".join(corridor.station_ids) for corridor in corridors) == ["AB", "BCD", "DE"]
    assert {corridor.lines for corridor in corridors} == {("x",), ("x", "y")}
