"""The stations and lines of an edition or of a network, as identity and change sheet see them."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

from gtfs_schematic.edition.model import Edition
from gtfs_schematic.network.between import from_station_to_station
from gtfs_schematic.network.model import Junction, Network


@dataclass(frozen=True, slots=True)
class RosterStation:
    """A station, drawn or not; lon and lat in degrees (WGS 84)."""

    id: str
    name: str
    second_name: str
    stop_ids: tuple[str, ...]
    stop_codes: tuple[str, ...]
    lon: float
    lat: float
    lines: tuple[str, ...]
    boarding: str


@dataclass(frozen=True, slots=True)
class RosterLine:
    """A line; `mode` is empty where nothing is known of its service."""

    id: str
    name: str
    long_name: str
    color: str
    text_color: str
    mode: str
    route_ids: tuple[str, ...]
    itineraries: tuple[tuple[str, ...], ...]
    service: str
    trips: int
    first_departure_s: int | None
    last_departure_s: int | None
    headway_s: int | None


@dataclass(frozen=True)
class Roster:
    """All stations, lines, links and walks of one edition or network."""

    title: str
    sha256: str
    start_date: str
    end_date: str
    service_date: str
    stations: tuple[RosterStation, ...]
    lines: tuple[RosterLine, ...]
    links: tuple[tuple[str, str, tuple[str, ...]], ...]
    """(station, station, sorted ids of the lines between them)."""
    walks: tuple[tuple[str, str, int | None], ...] = ()
    """(station, station, seconds)."""
    junctions: tuple[Junction, ...] = ()

    @cached_property
    def station(self) -> dict[str, RosterStation]:
        """Stations by id."""
        return {station.id: station for station in self.stations}

    @cached_property
    def line(self) -> dict[str, RosterLine]:
        """Lines by id."""
        return {line.id: line for line in self.lines}

    @cached_property
    def neighbors(self) -> dict[str, frozenset[str]]:
        """Per station id the stations at the other ends of its links and walks."""
        around: dict[str, set[str]] = {station.id: set() for station in self.stations}
        for a, b, _ in (*self.links, *self.walks):
            around[a].add(b)
            around[b].add(a)
        return {key: frozenset(ids) for key, ids in around.items()}

    @cached_property
    def links_of(self) -> dict[str, frozenset[frozenset[str]]]:
        """Per line id its links, each as its two stations."""
        found: dict[str, set[frozenset[str]]] = defaultdict(set)
        for a, b, lines in self.links:
            for line in lines:
                found[line].add(frozenset((a, b)))
        return {line.id: frozenset(found[line.id]) for line in self.lines}


def roster_of_edition(edition: Edition) -> Roster:
    """Give the roster of an edition."""
    feed = edition.feed
    return Roster(
        edition.title,
        feed.sha256,
        feed.start_date,
        feed.end_date,
        feed.service_date,
        tuple(
            RosterStation(
                s.id, s.name, s.second_name, s.stop_ids, s.stop_codes, s.lon, s.lat, s.lines,
                s.boarding,
            )
            for s in edition.stations
        ),
        tuple(
            RosterLine(
                k.id, k.name, k.long_name, k.color, k.text_color, k.mode, k.route_ids,
                k.itineraries, k.service, k.trips, k.first_departure_s, k.last_departure_s,
                k.headway_s,
            )
            for k in edition.lines
        ),
        tuple((k.start, k.end, tuple(sorted(k.lines))) for k in edition.links),
        tuple((w.start, w.end, w.time_s) for w in edition.walks),
        tuple(Junction(j.id, j.lon, j.lat) for j in edition.junctions),
    )  # fmt: skip


def roster_of_network(
    network: Network, stop_codes: Mapping[str, tuple[str, ...]] | None = None, title: str = ""
) -> Roster:
    """Give the roster of a network.

    Parameters
    ----------
    network
        Of a feed.
    stop_codes
        Per station id the codes at its stops (`make.stop_codes_of`).
    title
        What to call it.
    """
    codes = stop_codes or {}
    info = network.info
    return Roster(
        title or info.publisher,
        info.sha256,
        info.start_date,
        info.end_date,
        info.service_date,
        tuple(
            RosterStation(
                s.id, s.name, s.second_name, s.stop_ids, codes.get(s.id, ()), round(s.lon, 7),
                round(s.lat, 7), s.lines, s.boarding,
            )
            for s in network.stations
        ),
        tuple(
            RosterLine(
                k.id, k.name, k.long_name, k.color, k.text_color, k.mode, k.route_ids,
                k.itineraries, k.service, k.trips, k.first_departure_s, k.last_departure_s,
                k.headway_s,
            )
            for k in network.lines
        ),
        tuple((k.start, k.end, k.lines) for k in from_station_to_station(network)),
        tuple((w.start, w.end, w.time_s) for w in network.walks),
        network.junctions,
    )  # fmt: skip
