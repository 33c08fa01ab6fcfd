"""Read where another drawing of a network has its stations, and lay the network out so."""

from __future__ import annotations

import csv
import io
import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from gtfs_schematic.drift.placed import Diagram, NamedLine, NamedStation, TimedPattern
from gtfs_schematic.errors import EditionError
from gtfs_schematic.geometry import Point

_COLUMNS = ("stop_id", "x", "y")


@dataclass(frozen=True, slots=True)
class RedrawnStation:
    """A station where another drawing has it."""

    id: str
    name: str
    lon: float
    lat: float
    x_mm: float
    y_mm: float
    stop_ids: tuple[str, ...]
    group: str
    change_s: int | None


@dataclass(frozen=True, slots=True)
class RedrawnLink:
    """A link, straight from station to station: a table of places knows no bends."""

    id: str
    start: str
    end: str
    lines: tuple[str, ...]
    path_mm: tuple[Point, ...]
    time_s: int | None = None
    """Of a walk."""


@dataclass(frozen=True, slots=True)
class Redrawn:
    """A network as another drawing has it; units are those of its table, y down."""

    stations: tuple[RedrawnStation, ...]
    links: tuple[RedrawnLink, ...]
    walks: tuple[RedrawnLink, ...]
    lines: Sequence[NamedLine]
    patterns: Sequence[TimedPattern]
    missing: tuple[str, ...]
    """Ids of the stations that the table does not place."""


def places_from_csv(data: bytes, *, y_up: bool) -> dict[str, Point]:
    """Read a table of places with the columns stop_id, x and y.

    Parameters
    ----------
    data
        CSV in UTF-8 with a header; other columns are let by.
    y_up
        Whether y grows towards the top of the drawing; else towards its foot.

    Returns
    -------
    dict
        Per stop id its place, in the table's units, y down; the mean if it stands several times.

    Raises
    ------
    EditionError
        If a column is missing, or a coordinate is no number; names the row (the header is row 1).
    """
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise EditionError(f"not a CSV file in UTF-8 ({error.reason}).") from error
    reader = csv.DictReader(io.StringIO(text, newline=""), skipinitialspace=True)
    heads = {head.strip().lower(): head for head in reader.fieldnames or () if head}
    lacking = [name for name in _COLUMNS if name not in heads]
    if lacking:
        raise EditionError(f"no column {lacking[0]!r}; needed are stop_id, x and y.")
    found: dict[str, list[Point]] = defaultdict(list)
    for number, row in enumerate(reader, start=2):
        stop, x, y = ((row[heads[name]] or "").strip() for name in _COLUMNS)
        if stop:
            at = (_number(x, number, "x"), _number(y, number, "y"))
            found[stop].append((at[0], -at[1] if y_up else at[1]))
    return {stop: _mean(points) for stop, points in found.items()}


def redrawn(diagram: Diagram, places: Mapping[str, Point]) -> Redrawn:
    """Lay a diagram's stations out where another drawing has them.

    Parameters
    ----------
    diagram
        An edition of the same network.
    places
        Per stop id or station id a place, y down. A station lies at the mean of its stops.

    Returns
    -------
    Redrawn
        Without the stations that no place is given for, and without their links.

    Raises
    ------
    EditionError
        If fewer than two stations are placed.
    """
    at = {station.id: _place(station, places) for station in diagram.stations}
    stations = tuple(
        RedrawnStation(
            station.id,
            station.name,
            station.lon,
            station.lat,
            *point,
            tuple(station.stop_ids),
            station.group,
            station.change_s,
        )
        for station in diagram.stations
        if (point := at[station.id]) is not None
    )
    if len(stations) < 2:
        raise EditionError(
            f"places {len(stations)} of the edition's {len(at)} stations. Stop ids must be those "
            "of the feed or of edition.json."
        )
    return Redrawn(
        stations=stations,
        links=tuple(
            RedrawnLink(link.id, link.start, link.end, tuple(link.lines), path)
            for link in diagram.links
            if (path := _straight(at[link.start], at[link.end]))
        ),
        walks=tuple(
            RedrawnLink(walk.id, walk.start, walk.end, (), path, walk.time_s)
            for walk in diagram.walks
            if (path := _straight(at[walk.start], at[walk.end]))
        ),
        lines=diagram.lines,
        patterns=diagram.patterns,
        missing=tuple(key for key, point in at.items() if point is None),
    )


def _place(station: NamedStation, places: Mapping[str, Point]) -> Point | None:
    if station.id in places:
        return places[station.id]
    points = [places[stop] for stop in station.stop_ids if stop in places]
    return _mean(points) if points else None


def _straight(start: Point | None, end: Point | None) -> tuple[Point, ...]:
    return () if start is None or end is None else (start, end)


def _mean(points: Sequence[Point]) -> Point:
    return (
        math.fsum(x for x, _ in points) / len(points),
        math.fsum(y for _, y in points) / len(points),
    )


def _number(text: str, row: int, column: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise EditionError(f"row {row}: {column} = {text!r} is no number.")
    return value
