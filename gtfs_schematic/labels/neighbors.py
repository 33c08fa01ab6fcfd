"""What the labels of two neighbouring stations owe each other: one side, one angle."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point, unit_vector
from gtfs_schematic.labels.model import Side
from gtfs_schematic.labels.site import Site, side_vector

HAND = 3.0
"""Changing from one side of the lines to the other between neighbours."""
TILTED = 4.0
"""A tilted label beside one that is not."""
SIDE = 0.5
"""Another of the eight sides than the neighbour's."""
_AT_NODE = 0.4
"""Share of these costs that counts where lines meet or part."""


@dataclass(frozen=True, slots=True)
class Neighbors:
    """Two stations joined by a link, as indexes into the sites."""

    first: int
    second: int
    leaving: Point
    """Unit vector in which the link leaves the first station."""
    arriving: Point
    """Unit vector in which it arrives at the second."""
    weight: float


def neighbors_of(bundled: BundledLayout, sites: Sequence[Site]) -> tuple[Neighbors, ...]:
    """Give the neighbours along every link, sorted by link id."""
    index = {site.station_id: i for i, site in enumerate(sites)}
    found = []
    for link in sorted(bundled.layout.network.links, key=lambda link: link.id):
        path = [point for point, _ in itertools.groupby(bundled.layout.paths[link.id])]
        if len(path) < 2 or not {link.start, link.end} <= index.keys():
            continue
        first, second = index[link.start], index[link.end]
        through = all(sites[i].run != "node" for i in (first, second))
        found.append(
            Neighbors(
                first=first,
                second=second,
                leaving=unit_vector(path[0], path[1]),
                arriving=unit_vector(path[-2], path[-1]),
                weight=1.0 if through else _AT_NODE,
            )
        )
    return tuple(found)


def hand(direction: Point, side: Side) -> int:
    """Tell on which hand of a direction a side lies: -1 left, 1 right, 0 straight on or back."""
    u, v = side_vector(side)
    turn = direction[0] * v - direction[1] * u
    if abs(turn) < 1e-6:
        return 0
    return 1 if turn > 0.0 else -1
