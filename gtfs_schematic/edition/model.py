"""What the edition room keeps: one issued version of a diagram, as `edition.json` holds it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.feed.model import Boarding
from gtfs_schematic.geometry import Point
from gtfs_schematic.network.model import StationKind


@dataclass(frozen=True, slots=True)
class EditionFeed:
    """Which feed the edition shows."""

    sha256: str
    publisher: str
    version: str
    start_date: str
    end_date: str
    service_date: str


@dataclass(frozen=True, slots=True)
class EditionStation:
    """A drawn station; lon and lat in degrees, sheet place in millimetres, y down."""

    id: str
    name: str
    stop_ids: tuple[str, ...]
    lon: float
    lat: float
    x_mm: float
    y_mm: float
    kind: StationKind
    lines: tuple[str, ...]
    group: str
    label_side: str = ""
    """Compass side of the marker on which the name stands; empty if it found no place."""
    change_s: int | None = None
    """Seconds that the feed gives for a change within the station."""
    stop_codes: tuple[str, ...] = ()
    """Codes that riders read at its stops, sorted."""
    second_name: str = ""
    boarding: Boarding = "unknown"


@dataclass(frozen=True, slots=True)
class EditionLink:
    """A drawn link with its lines from left to right as seen going from start to end."""

    id: str
    start: str
    end: str
    lines: tuple[str, ...]
    path_mm: tuple[Point, ...]


@dataclass(frozen=True, slots=True)
class EditionWalk:
    """A drawn walk between two stations of one group."""

    id: str
    start: str
    end: str
    time_s: int | None
    path_mm: tuple[Point, ...]


@dataclass(frozen=True, slots=True)
class EditionLine:
    """A drawn line."""

    id: str
    name: str
    color: str
    text_color: str
    route_ids: tuple[str, ...]
    itineraries: tuple[tuple[str, ...], ...]
    long_name: str = ""
    mode: str = ""
    """Empty in editions that do not say; then nothing is known of service either."""
    service: str = ""
    trips: int = 0
    """Trips on the service date, both directions."""
    first_departure_s: int | None = None
    """Seconds after noon minus 12 h."""
    last_departure_s: int | None = None
    headway_s: int | None = None
    """Median time between departures of the busier direction at its first stop, seconds."""


@dataclass(frozen=True, slots=True)
class Edition:
    """Everything that `edition.json` says."""

    title: str
    feed: EditionFeed
    width_mm: float
    height_mm: float
    stations: tuple[EditionStation, ...]
    links: tuple[EditionLink, ...]
    lines: tuple[EditionLine, ...]
    left_out: tuple[tuple[str, str, str], ...] = ()
    """(kind, id, reason) of everything in the feed that the diagram does not show."""
    findings: tuple[str, ...] = ()
    walks: tuple[EditionWalk, ...] = ()
    patterns: tuple[TimedPattern, ...] = ()
    """When the lines run on the service date; empty in editions that do not say."""
    previous: str = ""
    """SHA-256 of the `edition.json` that this edition revises; empty for a first one."""
    settings: Mapping[str, Any] = field(default_factory=dict)
    """What was set other than by default, as nested tables."""
    state_sha256: str = ""
    """SHA-256 of the `state.json` beside it (see state.py); empty for none."""
    adjustments: Mapping[str, Any] = field(default_factory=dict)
    """What a person overrode, as nested tables (see adjustments.py)."""
