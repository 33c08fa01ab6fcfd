"""What adjustments ask of layout, bundles and labels, by ids of the network that is drawn."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from gtfs_schematic.edition.adjustments import LinkAdjustment, StationAdjustment
from gtfs_schematic.edition.contradictions import (
    OPPOSITE,
    pin_contradictions,
    pin_from_contradictions,
)
from gtfs_schematic.errors import UsageError
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import Side
from gtfs_schematic.network.between import link_towards
from gtfs_schematic.network.model import Network

Offset = tuple[str, float | None, float | None]
"""A station, and how far right and down of it another stands, millimetres; None: as it falls."""
Find = Callable[[str, str], str | None]
"""Gives the id of what a key means; notes where it is unknown."""

WAYS: Mapping[str, tuple[int, int]] = {
    "E": (1, 0), "NE": (1, -1), "N": (0, -1), "NW": (-1, -1),
    "W": (-1, 0), "SW": (-1, 1), "S": (0, 1), "SE": (1, 1),
}  # fmt: skip
"""Signs of dx and dy on the sheet, y down."""
_NEAR_MM = 0.02
_SIMPLE = (
    ("sides", "label_side"),
    ("angles", "label_angle"),
    ("short_names", "short_name"),
    ("rows", "label_rows"),
    ("pins", "pin_mm"),
)
"""Wishes that are said of a station just as they are asked for."""


@dataclass(frozen=True, slots=True)
class Wishes:
    """What later stages are asked for."""

    sides: dict[str, Side] = field(default_factory=dict)
    """Per station id the side of its name; likewise angles, wordings and rows."""
    angles: dict[str, int] = field(default_factory=dict)
    short_names: dict[str, str] = field(default_factory=dict)
    rows: dict[str, tuple[str, ...]] = field(default_factory=dict)
    pins: dict[str, Point] = field(default_factory=dict)
    """Per station id its place on the sheet, millimetres."""
    pins_from: dict[str, Offset] = field(default_factory=dict)
    directions: dict[str, Side] = field(default_factory=dict)
    """Per link id where it leads from its start."""
    straights: dict[str, tuple[str, ...]] = field(default_factory=dict)
    """Per station id the lines that go straight through."""
    orders: dict[str, tuple[str, ...]] = field(default_factory=dict)
    """Per link id some of its lines from left to right as seen from its start."""
    said: dict[tuple[str, str], str] = field(default_factory=dict)
    """Per name of a field above and id, where that is said."""

    def by_room(self) -> dict[str, dict[str, Mapping[str, object]]]:
        """Give the wishes by the settings that they are added to."""
        return {
            "labels": {
                "sides": self.sides,
                "angles": self.angles,
                "short_names": self.short_names,
                "rows": self.rows,
            },
            "layout": {
                "pins": self.pins,
                "pins_from": self.pins_from,
                "directions": self.directions,
                "straights": self.straights,
            },
            "bundles": {"orders": self.orders},
        }


class Asked:
    """Gathers wishes, and refuses those that cannot all be met."""

    def __init__(self, network: Network, station: Find, line: Find) -> None:
        self._network, self._station, self._line = network, station, line
        self._found = Wishes()

    def wishes(
        self,
        stations: Mapping[str, tuple[str, StationAdjustment]],
        links: Sequence[tuple[str, LinkAdjustment]],
        stale: list[tuple[str, str]],
    ) -> Wishes:
        """Gather what is said of stations (where, what) and links that the network has.

        Raises
        ------
        UsageError
            If two wishes contradict each other; names both.
        """
        for key, (where, told) in stations.items():
            if key in self._network.station:
                self._of_station(key, where, told, stale)
        for where, link_told in links:
            self._of_link(where, link_told, stale)
        problem = next(wish_contradictions(self._network, self._found), None)
        if problem:
            raise UsageError(f"{problem}.")
        return self._found

    def _of_station(
        self, key: str, where: str, told: StationAdjustment, stale: list[tuple[str, str]]
    ) -> None:
        found = self._found
        for name, word in _SIMPLE:
            value = getattr(told, word)
            if value not in (None, "", ()):
                getattr(found, name)[key] = value
                found.said[name, key] = f"{where}.{word}"
        if told.pin_from is not None:
            other = self._station(told.pin_from.station, f"{where}.pin_from")
            if other is not None and other in self._network.station:
                found.pins_from[key] = (other, told.pin_from.dx_mm, told.pin_from.dy_mm)
                found.said["pins_from", key] = f"{where}.pin_from"
        passing = []
        for name in told.straight:
            line = self._line(name, f"{where}.straight")
            if line is not None and not passes_of(self._network, line, key):
                stale.append((f"{where}.straight", f"line {name} does not pass through"))
            elif line is not None:
                passing.append(line)
        if passing:
            found.straights[key] = tuple(dict.fromkeys(passing))
            found.said["straights", key] = f"{where}.straight"

    def _of_link(self, where: str, told: LinkAdjustment, stale: list[tuple[str, str]]) -> None:
        found = self._found
        ends = [self._station(key, where) for key in told.between]
        if ends[0] is None or ends[1] is None:
            return
        link = link_towards(self._network, ends[0], ends[1])
        if link is None:
            stale.append((where, f"no link joins {told.between[0]} and {told.between[1]}"))
            return
        for name in ("directions", "orders"):
            if (name, link.id) in found.said:
                first = found.said[name, link.id]
                raise UsageError(f"{first} and {where} contradict each other about one link.")
        forward = link.start == ends[0]
        if told.direction is not None:
            way: Side = told.direction if forward else OPPOSITE[told.direction]
            found.directions[link.id] = way
            found.said["directions", link.id] = f"{where}.direction"
        order = []
        for name in told.order:
            line = self._line(name, f"{where}.order")
            if line is not None and line not in link.lines:
                stale.append((f"{where}.order", f"line {name} is not on the link"))
            elif line is not None:
                order.append(line)
        order = list(dict.fromkeys(order))
        if len(order) > 1:
            found.orders[link.id] = tuple(order if forward else reversed(order))
            found.said["orders", link.id] = f"{where}.order"


def passes_of(network: Network, line: str, station: str) -> list[tuple[str, str]]:
    """Give the pairs of neighbors between which a line passes a station, each once."""
    found: dict[frozenset[str], tuple[str, str]] = {}
    for course in network.line[line].courses:
        for before, here, after in zip(course, course[1:], course[2:], strict=False):
            if here == station and before != after:
                found.setdefault(frozenset((before, after)), (before, after))
    return list(found.values())


def way_from(network: Network, wishes: Wishes, station: str, other: str) -> tuple[str, str | None]:
    """Give the link from a station to a neighbor, and where it is asked to lead from there."""
    link = network.link_between[frozenset((station, other))]
    way = wishes.directions.get(link.id)
    return link.id, way if way is None or link.start == station else OPPOSITE[way]


def wish_contradictions(network: Network, wishes: Wishes) -> Iterator[str]:
    """Say which wishes cannot all be met, naming both by where they are said."""
    said = wishes.said
    yield from pin_contradictions(wishes.pins, said)
    yield from pin_from_contradictions(wishes.pins_from, said)
    for key, way in wishes.directions.items():
        link = network.link[key]
        told = said["directions", key]
        one, other = (wishes.pins.get(end) for end in (link.start, link.end))
        if one and other and not leads((other[0] - one[0], other[1] - one[1]), way):
            pins = " with ".join(said["pins", end] for end in (link.start, link.end))
            yield f"{told} and {pins} contradict each other"
        for a, b, out in ((link.start, link.end, OPPOSITE[way]), (link.end, link.start, way)):
            seen_from, dx, dy = wishes.pins_from.get(a, ("", None, None))
            if seen_from == b and not _may_lead(dx, dy, out):
                yield f"{told} and {said['pins_from', a]} contradict each other"
    for station, lines in wishes.straights.items():
        for line in lines:
            passes = passes_of(network, line, station)
            for ends in passes if len(passes) == 1 else ():
                (one_link, one_way), (two_link, two_way) = (
                    way_from(network, wishes, station, end) for end in ends
                )
                if one_way and two_way and OPPOSITE[one_way] != two_way:
                    told = " with ".join(said["directions", key] for key in (one_link, two_link))
                    yield f"{said['straights', station]} and {told} contradict each other"


def leads(vector: Point, way: str) -> bool:
    """Whether a vector on the sheet (millimetres, y down) leads just that way."""
    dx, dy = vector
    sx, sy = WAYS[way]
    if (dx > 0) - (dx < 0) != sx or (dy > 0) - (dy < 0) != sy:
        return False
    return not (sx and sy) or abs(abs(dx) - abs(dy)) < _NEAR_MM


def _may_lead(dx: float | None, dy: float | None, way: str) -> bool:
    """Whether an offset, of which one part may be open, may lead that way."""
    if dx is not None and dy is not None:
        return leads((dx, dy), way)
    known, sign = (dx, WAYS[way][0]) if dx is not None else (dy, WAYS[way][1])
    return ((known or 0.0) > 0) - ((known or 0.0) < 0) == sign
