"""From lines to the rows of trips.txt, stop_times.txt, frequencies.txt and shapes.txt."""

from __future__ import annotations

import itertools
from collections.abc import Iterator

from gtfs_schematic.demo.ground import lon_lat, smooth
from gtfs_schematic.demo.lines import Line, Run
from gtfs_schematic.demo.places import Place
from gtfs_schematic.demo.plans import WEEKDAY, WEEKEND, Period
from gtfs_schematic.demo.region import Region
from gtfs_schematic.demo.stops import Row, stop_id
from gtfs_schematic.geometry import distance

TRIPS: Row = (
    "route_id",
    "service_id",
    "trip_id",
    "trip_headsign",
    "direction_id",
    "shape_id",
)
STOP_TIMES: Row = ("trip_id", "arrival_time", "departure_time", "stop_id", "stop_sequence")
FREQUENCIES: Row = ("trip_id", "start_time", "end_time", "headway_secs", "exact_times")
SHAPES: Row = ("shape_id", "shape_pt_lat", "shape_pt_lon", "shape_pt_sequence")

_PACE = {"metro": (9.5, 30), "tram": (6.5, 20), "rail": (18.0, 60), "bus": (8.0, 20)}
"""Running speed in metres a second and seconds lost by a call, invented."""
_FERRY_PACE = (5.5, 120)
_WAIT = {"rail": 30, "ferry": 180}
"""Seconds between arrival and departure on the way; none where not named."""
_GRAIN = 30
"""Times are whole multiples of this many seconds."""
_SHAPE_PIECES = 4


def _clock(seconds: int) -> str:
    return f"{seconds // 3600:02d}:{seconds // 60 % 60:02d}:{seconds % 60:02d}"


def _legs(run: Run, places: dict[str, Place]) -> Iterator[float]:
    """Give the metres between neighbouring calls, along the path."""
    calls = iter(run.calls[1:])
    call, length = next(calls), 0.0
    for here, there in itertools.pairwise(run.path):
        a, b = places[here], places[there]
        length += distance((a.east, a.north), (b.east, b.north))
        if there == call:
            yield length
            call, length = next(calls, ""), 0.0


def _offsets(line: Line, run: Run, places: dict[str, Place]) -> list[tuple[int, int]]:
    """Give arrival and departure at every call, seconds after the trip's first departure."""
    speed, loss = _PACE.get(line.mode, _FERRY_PACE)
    wait = _WAIT.get(line.mode, 0)
    offsets = [(0, 0)]
    for meters in _legs(run, places):
        seconds = max(2 * _GRAIN, _GRAIN * round((meters / speed + loss) / _GRAIN))
        arrival = offsets[-1][1] + seconds
        offsets.append((arrival, arrival + wait))
    offsets[-1] = (offsets[-1][0], offsets[-1][0])
    return offsets


def _shape_id(line: Line, run: Run) -> str:
    number = [other.path for other in line.runs].index(run.path) + 1
    return f"{line.key}-s{number}" if line.shaped else ""


class _Writer:
    """Gathers the rows of one region, line by line."""

    def __init__(self, region: Region) -> None:
        self.places = region.place()
        self.trips: list[Row] = []
        self.stop_times: list[Row] = []
        self.frequencies: list[Row] = []
        self.shapes: dict[str, list[Row]] = {}
        for line in region.lines:
            self._write(line)

    def _write(self, line: Line) -> None:
        for service in (WEEKDAY, WEEKEND):
            count = itertools.count(1)
            for run in line.runs:
                periods = [part for part in run.plan if part.service == service]
                starts = [start for part in periods for start in part.departures()]
                if line.by_headway:
                    starts = starts[:1]
                for start in starts:
                    trip_id = f"{line.key}-{service[1]}{next(count)}"
                    self._trip(line, run, service, (trip_id, start * 60))
                    if line.by_headway:
                        self._headways(trip_id, periods)
        for run in line.runs:
            self._shape(line, run)

    def _trip(self, line: Line, run: Run, service: str, trip: tuple[str, int]) -> None:
        trip_id, start = trip
        headsign = run.headsign or self.places[run.calls[-1]].name
        shape_id = _shape_id(line, run)
        row = (line.key, service, trip_id, headsign, str(run.direction), shape_id)
        self.trips.append(row)
        offsets = _offsets(line, run, self.places)
        for number, (key, times) in enumerate(zip(run.calls, offsets, strict=True), start=1):
            arrival, departure = (_clock(start + offset) for offset in times)
            stop = stop_id(self.places[key], line, run.direction)
            self.stop_times.append((trip_id, arrival, departure, stop, str(number)))

    def _headways(self, trip_id: str, periods: list[Period]) -> None:
        for part in periods:
            start, end = _clock(part.start * 60), _clock(part.end * 60)
            self.frequencies.append((trip_id, start, end, str(part.headway * 60), "0"))

    def _shape(self, line: Line, run: Run) -> None:
        shape_id = _shape_id(line, run)
        if not shape_id or shape_id in self.shapes:
            return
        points = tuple((self.places[key].east, self.places[key].north) for key in run.path)
        closed = run.path[0] == run.path[-1]
        rows: list[Row] = []
        for number, point in enumerate(smooth(points, _SHAPE_PIECES, closed=closed), start=1):
            lon, lat = lon_lat(*point)
            rows.append((shape_id, f"{lat:.6f}", f"{lon:.6f}", str(number)))
        self.shapes[shape_id] = rows


def trip_tables(region: Region) -> dict[str, list[Row]]:
    """Give the four tables, header first, by file name."""
    writer = _Writer(region)
    shapes = [row for rows in writer.shapes.values() for row in rows]
    return {
        "trips.txt": [TRIPS, *writer.trips],
        "stop_times.txt": [STOP_TIMES, *writer.stop_times],
        "frequencies.txt": [FREQUENCIES, *writer.frequencies],
        "shapes.txt": [SHAPES, *shapes],
    }
