"""The check finds every kind of fault that it promises to find."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from gtfs_schematic.network.check import faults
from gtfs_schematic.network.model import Walk


def _first(things: tuple[Any, ...], **parts: object) -> tuple[Any, ...]:
    return (replace(things[0], **parts), *things[1:])


def _last(things: tuple[Any, ...], **parts: object) -> tuple[Any, ...]:
    return (*things[:-1], replace(things[-1], **parts))


_SPOILED = {
    "not sorted": lambda n: replace(n, links=n.links[::-1]),
    "without repeats": lambda n: replace(n, stations=(*n.stations, n.stations[-1])),
    "does not sort before": lambda n: replace(
        n, links=_first(n.links, start=n.links[0].end, end=n.links[0].start)
    ),
    "station nowhere is missing": lambda n: replace(n, links=_last(n.links, end="nowhere")),
    "line ghost is missing": lambda n: replace(n, links=_first(n.links, lines=("ghost",))),
    "has no course here": lambda n: replace(
        n, links=_first(n.links, lines=tuple(sorted(line.id for line in n.lines)))
    ),
    "no link carries it": lambda n: replace(n, links=n.links[1:]),
    "are joined 2 times": lambda n: replace(
        n,
        walks=(*n.walks, Walk("~~", n.links[0].start, n.links[0].end, None)),
    ),
    "not those that call": lambda n: replace(n, stations=_first(n.stations, lines=())),
    "no place on Earth": lambda n: replace(n, stations=_first(n.stations, lat=91.0)),
    "belongs to two stations": lambda n: replace(
        n, stations=_first(n.stations, stop_ids=n.stations[1].stop_ids)
    ),
    "no name": lambda n: replace(n, stations=_first(n.stations, name="")),
    "called at but missing": lambda n: replace(n, stations=n.stations[1:]),
    "do not pair up": lambda n: replace(n, lines=_first(n.lines, courses=())),
    "does not run through": lambda n: replace(
        n, lines=_first(n.lines, itineraries=(n.lines[0].itineraries[0][::-1],))
    ),
    "one-way step": lambda n: replace(n, lines=_first(n.lines, one_way_links=(("D", "A"),))),
    "in 0 corridors": lambda n: replace(n, corridors=n.corridors[1:]),
    "in 2 corridors": lambda n: replace(n, corridors=(*n.corridors, n.corridors[-1])),
    "does not fit": lambda n: replace(n, corridors=_first(n.corridors, lines=("ghost",))),
    "do not alternate": lambda n: replace(n, corridors=_first(n.corridors, link_ids=())),
    "group": lambda n: replace(n, stations=_first(n.stations, group="Z")),
    "two colors": lambda n: replace(n, lines=_first(n.lines, color="red")),
    "no routes": lambda n: replace(n, lines=_first(n.lines, route_ids=())),
    "0 trips": lambda n: replace(n, lines=_first(n.lines, trips=0)),
    "its periods": lambda n: replace(n, lines=_first(n.lines, trips=n.lines[0].trips + 1)),
    "part service": lambda n: replace(n, lines=_first(n.lines, part_service=(("D", "A", "peak"),))),
    "not in (0, 1]": lambda n: replace(n, stations=_first(n.stations, merge_confidence=1.5)),
    "without a reason": lambda n: replace(
        n, stations=_first(n.stations, merge_confidence=0.5, merge_reason="")
    ),
    "headway": lambda n: replace(n, lines=_first(n.lines, headway_s=0)),
}


@pytest.mark.parametrize("words", sorted(_SPOILED))
def test_faults_are_found(busy_town, words):
    network = busy_town.network()
    assert faults(network) == ()
    assert any(words in fault for fault in faults(_SPOILED[words](network)))


def test_a_corridor_cut_in_two_is_found(busy_town):
    network = busy_town.network()
    long = next(corridor for corridor in network.corridors if len(corridor.link_ids) > 1)
    halves = (
        replace(long, station_ids=long.station_ids[:2], link_ids=long.link_ids[:1]),
        replace(long, station_ids=long.station_ids[1:], link_ids=long.link_ids[1:]),
    )
    rest = [corridor for corridor in network.corridors if corridor != long]
    spoiled = replace(network, corridors=(*rest, *halves))
    assert any("where none needs to" in fault for fault in faults(spoiled))


def test_a_corridor_through_a_junction_is_found(busy_town):
    network = busy_town.network()
    ring = next(c for c in network.corridors if c.lines == ("ring",))
    walk = Walk("~~", *sorted((ring.station_ids[1], "P2")), None)
    spoiled = replace(network, walks=(*network.walks, walk))
    assert any("which should end it" in fault for fault in faults(spoiled))
