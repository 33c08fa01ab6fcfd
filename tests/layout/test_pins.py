"""Pinned stations keep their place; pins that collide are named."""

from __future__ import annotations

import pytest
from generated_networks import network_of, radial_network

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings, SheetFrame
from gtfs_schematic.network.model import Network

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAME = SheetFrame(420.0, 297.0, 12.0, 30.0, 408.0, 257.0)


def pinned(network: Network, pins: dict[str, tuple[float, float]]) -> Layout:
    settings = LayoutSettings(effort="quick", pins=pins)
    layout = lay_out(network, settings, CLEARANCES, [FRAME])
    assert faults(layout, CLEARANCES, pins) == ()
    return layout


def test_pins_hold_and_the_rest_settles_round_them():
    pins = {"C": (200.0, 120.37), "A0N05": (320.5, 120.37)}
    layout = pinned(radial_network(2, 6, 1, 5), pins)
    assert layout.positions["C"] == (200.0, 120.37)
    assert layout.positions["A0N05"] == (320.5, 120.37)


def test_a_smoothed_station_can_be_pinned():
    network = network_of({c: (i, 0.1 * i) for i, c in enumerate("ABCDE")}, ["ABCDE"])
    assert pinned(network, {"C": (100.0, 100.0)}).positions["C"] == (100.0, 100.0)


def test_pins_that_collide_are_named():
    network = network_of({c: (i, 0.1 * i) for i, c in enumerate("ABC")}, ["ABC"])
    with pytest.raises(LayoutError, match=r"pins cannot all be kept.*missed: [ABC] \("):
        pinned(network, {"A": (100.0, 100.0), "C": (101.0, 100.0)})


def test_a_pin_off_the_frame_and_a_strange_station_are_refused():
    network = network_of({c: (i, 0.1 * i) for i, c in enumerate("ABC")}, ["ABC"])
    with pytest.raises(LayoutError, match="station A at \\(5, 100\\) mm lies outside"):
        pinned(network, {"A": (5.0, 100.0)})
    with pytest.raises(LayoutError, match="does not have: Z"):
        pinned(network, {"Z": (50.0, 100.0)})


def test_the_check_sees_a_missed_pin():
    network = network_of({c: (i, 0.1 * i) for i, c in enumerate("ABC")}, ["ABC"])
    layout = pinned(network, {"A": (100.0, 100.0)})
    assert faults(layout, CLEARANCES, {"A": (100.0, 101.0)}) == ("Station A is not at its pin.",)
