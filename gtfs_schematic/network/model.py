"""What the network room gives: stations, links, lines and the corridors they form."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from gtfs_schematic.feed.model import Boarding, FeedInfo, Finding, LeftOut

StationKind = Literal["stop", "interchange", "terminus"]
ServicePattern = Literal["all-day", "peak", "night", "some-days"]
LineGrouping = Literal["route", "color", "network"]
Corridors = Literal["shapes", "stations"]
Period = Literal["early", "morning peak", "midday", "afternoon peak", "evening", "night"]


class NetworkSettings(BaseModel):
    """How stops become stations and trips become links."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    merge_name_m: float = Field(default=150.0, ge=0.0)
    """Stops without a parent and of the same name merge if no further apart than this, metres."""
    merge_kerbs_m: float = Field(default=45.0, ge=0.0)
    """Stops without a parent at which a route calls in opposed directions merge within this
    distance under any names, metres."""
    merge_group_m: float = Field(default=90.0, ge=0.0)
    """Stations joined by transfers merge into one if all lie within this distance, metres."""
    merge_hub_m: float = Field(default=70.0, ge=0.0)
    """Differently named stops of buses and trams whose lines meet merge within this distance
    if no trip calls at one right after the other, metres."""
    min_pattern_share: float = Field(default=0.04, ge=0.0, le=1.0)
    """Patterns with a smaller share of their line's trips are left out, and listed."""
    express_detour: float = Field(default=1.25, ge=1.0)
    """A local track at most this many times longer than the express link carries the express."""
    alongside_m: float = Field(default=60.0, ge=0.0)
    """Two courses no further apart than this may be one way, metres."""
    alongside_deg: float = Field(default=35.0, ge=0.0, le=90.0)
    """Greatest angle between two courses on one way, either way round, degrees."""
    alongside_min_m: float = Field(default=300.0, ge=0.0)
    """Courses must stay together for this long to be one way, metres."""
    corridors: Corridors = "shapes"
    """Whether buses and trams that run along one street share its links from where they join to
    where they part ("shapes"), or from station to station only ("stations")."""
    group_lines: LineGrouping = "route"
    """What makes several routes one line: their name ("route"), or also their color (trunk lines),
    or the network that the feed puts them in."""
    outlier_km: float = Field(default=300.0, gt=0.0)
    """A stop further than this from the network's median stop is an outlier and not drawn."""
    outlier_spreads: float = Field(default=10.0, ge=0.0)
    """But it is none if no further than this many times the median of those distances."""


@dataclass(frozen=True, slots=True)
class Station:
    """Merged stops that a rider takes for one place; lon and lat in degrees (WGS 84)."""

    id: str
    name: str
    second_name: str
    stop_ids: tuple[str, ...]
    lon: float
    lat: float
    kind: StationKind
    group: str
    """Id of the interchange group: the least station id among those joined by walks."""
    lines: tuple[str, ...]
    """Ids of the lines that call here; a line that only passes is not among them."""
    boarding: Boarding
    merge_reason: str = ""
    """Which stops were made one and why; empty if the feed says so itself."""
    merge_confidence: float = 1.0
    """How sure the least sure of the merges is, 0 … 1."""


@dataclass(frozen=True, slots=True)
class Junction:
    """Where lines join or part between stations; lon and lat in degrees (WGS 84)."""

    id: str
    """Is no station's id."""
    lon: float
    lat: float


@dataclass(frozen=True, slots=True)
class PeriodService:
    """How often a line runs in one part of the day."""

    period: Period
    trips: int
    """Trips that start in the period, both directions."""
    headway_s: int | None
    """Median time between departures of the busier direction at its first stop, seconds; None if
    fewer than two depart in the period."""


@dataclass(frozen=True, slots=True)
class Line:
    """What a rider sees as one coloured line: one or more routes, both directions."""

    id: str
    name: str
    long_name: str
    color: str
    """"#RRGGBB", never empty: a missing or unusable colour is replaced by a distinct one."""
    text_color: str
    color_from_feed: bool
    mode: str
    route_ids: tuple[str, ...]
    itineraries: tuple[tuple[str, ...], ...]
    """Ids of the stations called at, in order; one direction only where the other is its mirror."""
    courses: tuple[tuple[str, ...], ...]
    """As `itineraries`, index by index, with the stations that are passed without a call, and
    with junctions."""
    trips: int
    """Trips on the service date, both directions."""
    service: ServicePattern
    first_departure_s: int
    last_departure_s: int
    headway_s: int | None
    """Median time between departures of the busier direction at its first stop, seconds."""
    one_way_links: tuple[tuple[str, str], ...] = ()
    """(from, to) of links that the line runs in this direction only."""
    periods: tuple[PeriodService, ...] = ()
    """The parts of the day in which it runs, in the order of the day."""
    part_service: tuple[tuple[str, str, ServicePattern], ...] = ()
    """(start, end, service) of links on which the line runs in the peak or at night only, though
    elsewhere it runs more."""
    sort_order: int | None = None
    """The feed's wish for the line's place in keys and bundles, smaller first."""


@dataclass(frozen=True, slots=True)
class Link:
    """Two neighbouring stations or junctions that a line joins; `start` sorts before `end`."""

    id: str
    start: str
    end: str
    lines: tuple[str, ...]
    """Ids of the lines on the link, calling or passing, sorted."""


@dataclass(frozen=True, slots=True)
class Walk:
    """Two stations of an interchange group joined on foot; `start` sorts before `end`."""

    id: str
    start: str
    end: str
    time_s: int | None


@dataclass(frozen=True, slots=True)
class Corridor:
    """A chain of links through stations of degree two that all carry the same lines.

    `station_ids` holds both ends, which may be junctions, and everything between;
    ``link_ids[i]`` joins ``station_ids[i]`` and ``station_ids[i + 1]``, so unfolding is exact.
    """

    id: str
    station_ids: tuple[str, ...]
    link_ids: tuple[str, ...]
    lines: tuple[str, ...]


@dataclass(frozen=True)
class Network:
    """The route-station graph of one service date; tuples sorted by id."""

    info: FeedInfo
    agencies: tuple[str, ...]
    stations: tuple[Station, ...]
    links: tuple[Link, ...]
    walks: tuple[Walk, ...]
    lines: tuple[Line, ...]
    corridors: tuple[Corridor, ...]
    findings: tuple[Finding, ...]
    left_out: tuple[LeftOut, ...]
    junctions: tuple[Junction, ...] = ()

    @cached_property
    def station(self) -> dict[str, Station]:
        """Stations by id."""
        return {station.id: station for station in self.stations}

    @property
    def nodes(self) -> tuple[Station | Junction, ...]:
        """What links join: stations, then junctions."""
        return (*self.stations, *self.junctions)

    @cached_property
    def junction(self) -> dict[str, Junction]:
        """Junctions by id."""
        return {junction.id: junction for junction in self.junctions}

    @cached_property
    def link(self) -> dict[str, Link]:
        """Links by id."""
        return {link.id: link for link in self.links}

    @cached_property
    def line(self) -> dict[str, Line]:
        """Lines by id."""
        return {line.id: line for line in self.lines}

    @cached_property
    def link_between(self) -> dict[frozenset[str], Link]:
        """Links by the set of their two ends."""
        return {frozenset((link.start, link.end)): link for link in self.links}

    @property
    def groups(self) -> int:
        """Count of interchange groups, single stations included."""
        return len({station.group for station in self.stations})
