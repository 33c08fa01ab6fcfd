"""The links of an edition: from station to station, and the parts of those that share streets."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

from gtfs_schematic.edition.model import EditionLink
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.between import Between, from_station_to_station

Orders = Mapping[str, tuple[str, ...]]
Round = Callable[[Sequence[Point]], tuple[Point, ...]]


def links_of(layout: Layout, orders: Orders, rounded: Round) -> tuple[EditionLink, ...]:
    """Give the links from station to station; several may run over the same parts.

    Parameters
    ----------
    layout
        Paths of the network's links.
    orders
        Per link of the network its lines from left to right.
    rounded
        Rounds a path to what is written.
    """
    return tuple(
        _joined(way, layout, orders, rounded) for way in from_station_to_station(layout.network)
    )


def parts_of(layout: Layout, orders: Orders, rounded: Round) -> tuple[EditionLink, ...]:
    """Give the links of the network that end at a junction."""
    junctions = layout.network.junction.keys()
    return tuple(
        EditionLink(k.id, k.start, k.end, orders[k.id], rounded(layout.paths[k.id]))
        for k in layout.network.links
        if not junctions.isdisjoint((k.start, k.end))
    )


def _joined(way: Between, layout: Layout, orders: Orders, rounded: Round) -> EditionLink:
    """Join the paths of the links on a way; every junction stays a point of the path."""
    path: list[Point] = [layout.positions[way.start]]
    order: tuple[str, ...] = ()
    here = way.start
    for key in way.links:
        link = layout.network.link[key]
        forward = link.start == here
        path += (layout.paths[key] if forward else layout.paths[key][::-1])[1:]
        # Lines may change sides where others join: the order is that in which they set off.
        order = order or (orders[key] if forward else orders[key][::-1])
        here = link.end if forward else link.start
    lines = tuple(line for line in order if line in way.lines)
    return EditionLink(way.id, way.start, way.end, lines, rounded(path), way.via)
