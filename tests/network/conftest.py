"""Hand-made timetables on a flat piece of ground, written in metres; all names are invented."""

from __future__ import annotations

import importlib.util
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

from gtfs_schematic.feed.model import Agency, FeedInfo, Pattern, Route, Stop, Timetable, Transfer
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

_LON, _LAT = 12.0, 45.0
_LON_M, _LAT_M = 78846.84, 111131.78
"""Metres in a degree of longitude and latitude at 45° north (WGS 84)."""

_FIRST_S, _HEADWAY_S = 6 * 3600, 1500

INFO = FeedInfo(
    sha256="",
    publisher="Overland Transit",
    version="1",
    start_date="2026-01-05",
    end_date="2026-06-28",
    service_date="2026-01-07",
    service_reason="a Wednesday",
)


@dataclass(frozen=True)
class Town:
    """A timetable that grows by one piece per call; every call gives a new town."""

    timetable: Timetable

    def stop(self, stop_id: str, x: float, y: float = 0.0, **told: object) -> Town:
        """Put a stop `x` metres east and `y` north of the town's corner."""
        stop = Stop(
            id=stop_id,
            name=str(told.pop("name", f"{stop_id} Place")),
            code="",
            lon=_LON + x / _LON_M,
            lat=_LAT + y / _LAT_M,
            location_type=0,
            parent_id=None,
            boarding="unknown",
        )
        stop = replace(stop, **told)
        return self._with(stops=(*self.timetable.stops, stop))

    def stops(self, places: Mapping[str, tuple[float, float]]) -> Town:
        """Put many stops."""
        town = self
        for stop_id, (x, y) in places.items():
            town = town.stop(stop_id, x, y)
        return town

    def row(self, ids: Sequence[str], gap_m: float = 600.0, y: float = 0.0, x: float = 0.0) -> Town:
        """Put stops in a row from west to east."""
        return self.stops({stop_id: (x + gap_m * i, y) for i, stop_id in enumerate(ids)})

    def route(self, route_id: str, **told: object) -> Town:
        """Add a route; a metro without color unless told."""
        route = Route(route_id, "op", route_id, "", "metro", 1, None, None, None)
        return self._with(routes=(*self.timetable.routes, replace(route, **told)))

    def run(
        self,
        route_id: str,
        stops: Sequence[str],
        *,
        trips: int = 40,
        shape: str | None = None,
    ) -> Town:
        """Add one direction of a route, and the route if it is new; "A B C" or a list of stops."""
        ids = tuple(stops.split()) if isinstance(stops, str) else tuple(stops)
        town = self
        if all(route.id != route_id for route in self.timetable.routes):
            town = self.route(route_id)
        pattern = Pattern(
            route_id=route_id,
            direction_id=None,
            headsign="",
            shape_id=shape,
            stop_ids=ids,
            departures_s=tuple(_FIRST_S + _HEADWAY_S * i for i in range(trips)),
            offsets_s=tuple(120 * i for i in range(len(ids))),
        )
        return town._with(patterns=(*town.timetable.patterns, pattern))

    def both(self, route_id: str, stops: Sequence[str], **told: object) -> Town:
        """Add a route's pattern and its mirror image."""
        ids = tuple(stops.split()) if isinstance(stops, str) else tuple(stops)
        return self.run(route_id, ids, **told).run(route_id, ids[::-1], **told)

    def buses(
        self, *lines: tuple[str, Mapping[str, tuple[float, float]], Sequence[tuple[float, float]]]
    ) -> Town:
        """Add bus lines, both ways: id, stops with their places, points of the shape."""
        town = self
        for line, stops, points in lines:
            town = town.stops(stops).route(line, mode="bus").shape(line, points)
            town = town.both(line, list(stops), shape=line)
        return town

    def transfer(self, one: str, other: str, kind: int = 2, time_s: int | None = 180) -> Town:
        """Add a transfer."""
        transfer = Transfer(one, other, kind, time_s)
        return self._with(transfers=(*self.timetable.transfers, transfer))

    def shape(self, shape_id: str, points: Sequence[tuple[float, float]]) -> Town:
        """Add a shape through points in metres."""
        degrees = np.array([(_LON + x / _LON_M, _LAT + y / _LAT_M) for x, y in points])
        return self._with(shapes={**self.timetable.shapes, shape_id: degrees})

    def network(self, **settings: float) -> Network:
        """Build the network."""
        return build_network(self.timetable, NetworkSettings(**settings))

    def _with(self, **parts: object) -> Town:
        return Town(replace(self.timetable, **parts))


@pytest.fixture(scope="session")
def script():
    """Give a function that imports a script of the benchmarks by name."""

    def load(name: str) -> ModuleType:
        path = Path(__file__).parents[1] / "benchmarks" / f"{name}.py"
        spec = importlib.util.spec_from_file_location(name, path)
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module  # dataclasses look their module up there
        spec.loader.exec_module(module)
        return module

    return load


@pytest.fixture(scope="session")
def town() -> Town:
    """Give an empty town."""
    return Town(Timetable(INFO, (Agency("op", "Overland", "", "", ""),), (), (), ()))


@pytest.fixture(scope="session")
def busy_town(town) -> Town:
    """Give a town with most of what makes networks hard.

    A trunk with two lines and an express, a branch, a ring, trams that share a street with
    different stops, a terminal loop, a ferry, an interchange of three stations, a far station of
    the same name, and platforms with and without parents.
    """
    return (
        town.row("ABCDEFG")
        .stop("A1", 10, 5, parent_id="A", name="")
        .stops({"H": (2400, 700), "J": (2400, 1400)})
        .stops({"R1": (600, -600), "R2": (1200, -1100), "R3": (1800, -600)})
        .row(["T1", "T2", "T3", "T4"], gap_m=500, y=2500)
        .row(["U1", "U2", "U3"], gap_m=500, y=2510, x=250)
        .stops({"L1": (-700, 2500), "L2": (-900, 2900), "L3": (-1200, 2500)})
        .stops({"P1": (3650, -80), "P2": (6000, -3000)})
        .stops({"X1": (3600, -180), "X2": (3600, -1200)})
        .stop("Z", -5000, 0, name="D Place")
        .both("red", "A1 B C D E F G")
        .both("blue", "A1 B C D E H J")
        .both("fast", "A1 D G")
        .both("ring", "B R1 R2 R3 D C B")
        .route("t5", mode="tram")
        .both("t5", "T1 T2 T3 T4")
        .route("t6", mode="tram")
        .run("t6", "U3 U2 U1 L1 L2 L3 L1 U1 U2 U3")
        .route("boat", mode="ferry")
        .both("boat", "P1 P2")
        .both("south", "X1 X2")
        .both("west", "Z A1")
        .transfer("G", "P1")
        .transfer("P1", "X1")
        .transfer("X1", "G")
    )
