"""A settled layout makes room for names beside their stations, and keeps all its guarantees."""

from __future__ import annotations

import pytest
import shapely
from generated_networks import network_of, radial_network
from shapely import affinity

from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import Fitted, fit, place
from gtfs_schematic.layout.model import (
    Clearances,
    Layout,
    LayoutSettings,
    NameRoom,
    SheetFrame,
)
from gtfs_schematic.layout.refit import refit
from gtfs_schematic.network.model import Network

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAME = SheetFrame(420.0, 297.0, 12.0, 30.0, 408.0, 257.0)


def fitted(network: Network) -> Fitted:
    return fit(place(network, LayoutSettings(effort="quick")), CLEARANCES, (FRAME,))


def free_beside(layout: Layout, room: NameRoom) -> float:
    """Give the distance of a name from all lines but those of its own station."""
    x, y = layout.positions[room.station_id]
    box = affinity.translate(shapely.Polygon(room.outline_mm), x, y)
    ends = {link.id: (link.start, link.end) for link in layout.network.links}
    strange = [path for key, path in layout.paths.items() if room.station_id not in ends[key]]
    return float(box.distance(shapely.MultiLineString(strange)))


def box(x: float, y: float, width: float, height: float) -> tuple[tuple[float, float], ...]:
    return ((x, y), (x + width, y), (x + width, y + height), (x, y + height))


@pytest.mark.parametrize("size", [(12.0, 4.0), (30.0, 8.0), (45.0, 12.0)])
def test_a_name_that_has_no_place_gets_it(size: tuple[float, float]):
    places = {c: (i, 0.0) for i, c in enumerate("ABCDE")}
    places |= {c: (i, -0.5) for i, c in enumerate("VWXYZ")}
    before = fitted(network_of(places, ["ABCDE", "VWXYZ", "CX"]))
    # Right below the upper line and right of the way down to the lower one.
    room = NameRoom("C", box(3.5, 3.5, *size), stands=False)
    after = refit(before, (room,))
    assert faults(after.layout, CLEARANCES) == ()
    half = CLEARANCES.line_width_mm / 2.0
    assert free_beside(after.layout, room) >= half + 0.5
    assert after.layout.sheet == before.layout.sheet


def test_names_above_each_other_are_drawn_apart():
    places = {c: (0.0, -0.3 * i) for i, c in enumerate("ABCD")}
    before = fitted(network_of(places | {"L": (-9, 0), "R": (9, 0)}, ["ABCD", "LAR"]))
    rooms = tuple(NameRoom(c, box(3.0, -6.0, 30.0, 12.0), stands=True) for c in "BCD")
    after = refit(before, rooms)
    assert faults(after.layout, CLEARANCES) == ()
    rows = sorted(after.layout.positions[c][1] for c in "BCD")
    assert rows[1] - rows[0] >= 12.0
    assert rows[2] - rows[1] >= 12.0


def test_without_names_a_layout_that_holds_stays_as_large():
    before = fitted(radial_network(1, 6, 1, 6))
    after = refit(before, ())
    assert faults(after.layout, CLEARANCES) == ()
    for axis in (0, 1):
        extents = [
            max(at[axis] for at in layout.positions.values())
            - min(at[axis] for at in layout.positions.values())
            for layout in (before.layout, after.layout)
        ]
        assert extents[1] == pytest.approx(extents[0], rel=0.2)


def test_the_same_rooms_give_the_same_layout():
    before = fitted(radial_network(2, 5, 1, 5))
    rooms = tuple(
        NameRoom(station.id, box(3.0, -2.0, 18.0, 3.0), stands=False)
        for station in before.layout.network.stations
    )
    assert refit(before, rooms).layout == refit(before, rooms).layout
