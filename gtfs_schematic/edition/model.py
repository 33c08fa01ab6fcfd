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
    via: tuple[str, ...] = ()
    """Ids of the junctions on it; its path leads through them."""


@dataclass(frozen=True, slots=True)
class EditionJunction:
    """Where lines join or part between stations; nothing is drawn there but they."""

    id: str
    lon: float
    lat: float
    x_mm: float
    y_mm: float


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
class EditionDrift:
    """How much of the ground an edition loses, as `drift` measures it with north kept up."""

    edition: str
    """SHA-256 of its `edition.json`; empty for the edition that says this."""
    service_date: str
    residual: float


@dataclass(frozen=True, slots=True)
class Edition:
    """Everything that `edition.json` says."""

    title: str
    feed: EditionFeed
    width_mm: float
    height_mm: float
    stations: tuple[EditionStation, ...]
    links: tuple[EditionLink, ...]
    """From station to station; those that run together lie on each other from junction to
    junction."""
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
    junctions: tuple[EditionJunction, ...] = ()
    parts: tuple[EditionLink, ...] = ()
    """What links over junctions are made of: from a station or junction to a junction, each once
    and with all its lines."""
    rotation_deg: float = 0.0
    """Counter-clockwise turn of the ground on the sheet: so far left of the top is north."""
    angles: int = 45
    """Angle between two neighbouring directions of links, degrees."""
    drifts: tuple[EditionDrift, ...] = ()
    """Drift of the editions since all was last laid out anew, this one last; empty for a first."""

    @property
    def drawn(self) -> tuple[EditionLink, ...]:
        """What is drawn, each once: links over no junction, and the parts of the others."""
        return (*(link for link in self.links if not link.via), *self.parts)

    @property
    def places(self) -> dict[str, Point]:
        """Per station and junction its place on the sheet, millimetres."""
        stations = {station.id: (station.x_mm, station.y_mm) for station in self.stations}
        return stations | {each.id: (each.x_mm, each.y_mm) for each in self.junctions}
