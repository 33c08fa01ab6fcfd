"""What the feed room gives: the timetable of one service date, and what is wrong with the feed."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field

Severity = Literal["error", "warning", "info"]
Boarding = Literal["unknown", "yes", "no"]


class FeedSettings(BaseModel):
    """Which part of a feed goes into the diagram."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    date: str = "typical-weekday"
    """Which trips are drawn: "typical-weekday", "saturday", "sunday", "night", "busiest", a date as
    YYYY-MM-DD, or a range as YYYY-MM-DD/YYYY-MM-DD; `dates.choose_dates` says what each means."""
    today: str = ""
    """Date as YYYY-MM-DD with which the feed's validity is compared; empty: it is not."""
    modes: tuple[str, ...] = ()
    """Modes to keep, by the names of `Mode`; empty keeps all but replacement services."""
    agencies: tuple[str, ...] = ()
    """Agencies to keep, by id or name; empty keeps all."""
    routes: tuple[str, ...] = ()
    """Routes to keep, by id, short or long name; empty keeps all."""
    without_routes: tuple[str, ...] = ()
    """Routes to leave out, likewise."""
    min_trips: int = Field(default=0, ge=0)
    """Routes of a line with fewer trips on the service date are left out, and listed."""
    language: str = ""
    """BCP 47 language whose translations become the second name; empty: none."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing that is wrong or odd in a feed, and where; `row` counts the header as row 1."""

    severity: Severity
    file: str
    message: str
    row: int | None = None
    field: str | None = None
    value: str | None = None


@dataclass(frozen=True, slots=True)
class LeftOut:
    """Something of the feed that the diagram does not show, and why."""

    kind: str
    """"route", "trip", "stop", "station", "pattern", "transfer", …"""
    id: str
    reason: str


@dataclass(frozen=True, slots=True)
class Agency:
    """An operator named in agency.txt."""

    id: str
    name: str
    url: str
    timezone: str
    lang: str


@dataclass(frozen=True, slots=True)
class Stop:
    """A row of stops.txt; lon and lat in degrees (WGS 84), None where the feed has none."""

    id: str
    name: str
    code: str
    lon: float | None
    lat: float | None
    location_type: int
    parent_id: str | None
    boarding: Boarding
    second_name: str = ""
    platform_code: str = ""


@dataclass(frozen=True, slots=True)
class Route:
    """A row of routes.txt; colours as "#RRGGBB" or None where the feed leaves them empty."""

    id: str
    agency_id: str
    short_name: str
    long_name: str
    mode: str
    """"tram", "metro", "rail", "bus", "ferry", "cable", "aerial", "funicular", "trolleybus",
    "monorail" or "other"; extended route types are folded into these."""
    route_type: int
    color: str | None
    text_color: str | None
    sort_order: int | None
    network_id: str = ""
    """The network that the feed puts the route in; "" if it names none."""


@dataclass(frozen=True, slots=True)
class Pattern:
    """All trips of the service date that call at the same stops in the same order."""

    route_id: str
    direction_id: int | None
    headsign: str
    shape_id: str | None
    stop_ids: tuple[str, ...]
    departures_s: tuple[int, ...]
    """First departure of every trip, seconds after noon minus 12 h, sorted; headway-based trips
    of frequencies.txt are counted out."""
    offsets_s: tuple[int, ...]
    """Median time from the first departure to the arrival at each stop, seconds."""


@dataclass(frozen=True, slots=True)
class Transfer:
    """A row of transfers.txt between two different stops."""

    from_stop_id: str
    to_stop_id: str
    transfer_type: int
    min_time_s: int | None


@dataclass(frozen=True, slots=True)
class FeedInfo:
    """Where the data comes from and for when it holds; dates as YYYY-MM-DD, "" if unknown."""

    sha256: str
    publisher: str
    version: str
    start_date: str
    end_date: str
    service_date: str
    service_reason: str
    """Why that date, in one sentence for a person."""
    lang: str = ""
    attributions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Timetable:
    """One service date of a feed; every tuple is sorted by id (patterns: by their fields)."""

    info: FeedInfo
    agencies: tuple[Agency, ...]
    stops: tuple[Stop, ...]
    """All stops that a pattern calls at, and the stations above them."""
    routes: tuple[Route, ...]
    patterns: tuple[Pattern, ...]
    transfers: tuple[Transfer, ...] = ()
    shapes: Mapping[str, NDArray[np.float64]] = field(default_factory=dict)
    """Per shape id an (n, 2) array of lon, lat in degrees, in drawing order."""
    operating_days: Mapping[str, frozenset[int]] = field(default_factory=dict)
    """Per route id the weekdays (0 Monday … 6 Sunday) on which it runs in a typical week."""
    findings: tuple[Finding, ...] = ()
    left_out: tuple[LeftOut, ...] = ()
