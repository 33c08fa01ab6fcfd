"""The demo files: those committed, read with csv and zipfile alone, and those written now."""

from __future__ import annotations

import csv
import io
import json
import zipfile
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import pytest

from gtfs_schematic.demo.write import demo_files

DATA = Path(__file__).parents[2] / "data"


@dataclass
class Feed:
    """A feed as tables of text, with what many tests ask of it."""

    tables: dict[str, list[dict[str, str]]]
    stops: dict[str, dict[str, str]] = field(init=False)
    trips: dict[str, dict[str, str]] = field(init=False)
    calls: dict[str, list[str]] = field(init=False)
    """Per trip the stop ids, in order."""
    places: dict[str, dict[str, set[tuple[str, ...]]]] = field(init=False)
    """Per route and service the distinct sequences of places."""

    def __post_init__(self) -> None:
        """Index the tables once."""
        self.stops = {row["stop_id"]: row for row in self["stops"]}
        self.trips = {row["trip_id"]: row for row in self["trips"]}
        sequence: dict[str, list[tuple[int, str]]] = {}
        for row in self["stop_times"]:
            call = (int(row["stop_sequence"]), row["stop_id"])
            sequence.setdefault(row["trip_id"], []).append(call)
        self.calls = {trip: [stop for _, stop in sorted(rows)] for trip, rows in sequence.items()}
        self.places = {}
        for trip, calls in self.calls.items():
            route, service = self.trips[trip]["route_id"], self.trips[trip]["service_id"]
            places = tuple(self.place(stop) for stop in calls)
            self.places.setdefault(route, {}).setdefault(service, set()).add(places)

    def __getitem__(self, table: str) -> list[dict[str, str]]:
        """Give the rows of a table, named without its ending."""
        return self.tables[f"{table}.txt"]

    def place(self, stop_id: str) -> str:
        """Give the station above a stop, or for the pair 301-1, 301-2 the common 301."""
        return self.stops[stop_id]["parent_station"] or stop_id.split("-", maxsplit=1)[0]

    def patterns(self, route_id: str, service: str = "") -> set[tuple[str, ...]]:
        """Give the distinct sequences of places of a route."""
        services = self.places[route_id]
        return set().union(*(services[key] for key in services if service in ("", key)))

    def longest(self, route_id: str) -> tuple[str, ...]:
        """Give the longest sequence of places of a route; ties by the ids."""
        return max(self.patterns(route_id), key=lambda places: (len(places), places))

    def served(self, route_id: str) -> set[str]:
        """Give the places where a route calls."""
        return {place for places in self.patterns(route_id) for place in places}

    def lon_lat(self, place: str) -> tuple[float, float]:
        """Give where a place lies: its parent row, or the middle of its stops."""
        rows = [self.stops[place]] if place in self.stops else self.members(place)
        lon = sum(float(row["stop_lon"]) for row in rows) / len(rows)
        lat = sum(float(row["stop_lat"]) for row in rows) / len(rows)
        return (lon, lat)

    def members(self, place: str) -> list[dict[str, str]]:
        """Give the rows of stops.txt that belong to a place."""
        return [row for stop, row in self.stops.items() if self.place(stop) == place]

    def name(self, place: str) -> str:
        """Give the one name that all rows of a place bear."""
        (name,) = {row["stop_name"] for row in self.members(place)}
        return name


def read_feed(content: bytes) -> Feed:
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        texts = {name: archive.read(name).decode() for name in archive.namelist()}
    return Feed({name: list(csv.DictReader(io.StringIO(text))) for name, text in texts.items()})


@pytest.fixture(scope="session")
def before() -> Feed:
    return read_feed((DATA / "before.zip").read_bytes())


@pytest.fixture(scope="session")
def after() -> Feed:
    return read_feed((DATA / "after.zip").read_bytes())


@pytest.fixture(scope="session", params=["before", "after"])
def feed(request: pytest.FixtureRequest) -> Feed:
    return request.getfixturevalue(request.param)


@pytest.fixture(scope="session")
def truth() -> dict[str, Any]:
    return json.loads((DATA / "changes-truth.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="session")
def written() -> dict[str, bytes]:
    return demo_files()
