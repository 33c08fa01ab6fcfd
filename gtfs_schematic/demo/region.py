"""The invented region as a whole, before the service change and after it."""

from __future__ import annotations

from dataclasses import dataclass, replace

from gtfs_schematic.demo.lines import LINES, Line, there_and_back
from gtfs_schematic.demo.places import PLACES, Place
from gtfs_schematic.demo.plans import BUS, BUS_WEEKDAY_ONLY, METRO


@dataclass(frozen=True, slots=True)
class Region:
    """All that one feed is written from; dates as YYYYMMDD, first a Monday, last a Sunday."""

    version: str
    start_date: str
    end_date: str
    holiday: str
    """A weekday that runs as a weekend."""
    places: tuple[Place, ...]
    """Those where no line calls are on the ground, but not in the feed."""
    lines: tuple[Line, ...]

    def served(self) -> tuple[Place, ...]:
        """Give the places where a line calls."""
        keys = {key for line in self.lines for run in line.runs for key in run.calls}
        return tuple(place for place in self.places if place.key in keys)

    def place(self) -> dict[str, Place]:
        """Give the places by key."""
        return {place.key: place for place in self.places}


CLOSED = "u5"
RENAMED, NEW_NAME = "e3", "Mulgavé Arenå"
RENUMBERED, NEW_NUMBER = "h6", 977
MOVED, MOVED_EAST, MOVED_NORTH = "l2", -48, 64  # 80 m: 48, 64, 80 is a right triangle
EXTENDED, EXTENSION = "m3", ("n5", "n4")
WITHDRAWN = "b9"
REROUTED = "b8"
OPENED: tuple[Place, ...] = (
    Place("n4", 134, "station", 1, -620, 7480, "Bivårdské"),
    Place("n5", 135, "station", 1, -1500, 8700, "Nulthařen"),
    Place("m1", 421, "single", 1, -6150, -2700, "Větrumé"),
    Place("m2", 422, "single", 0, -4700, -4870, "Selgoné"),
)
NEW_LINE = Line(
    "b10",
    "10",
    "Lethrovald – Zanvůrek",
    "bus",
    "6E9A1F",
    "B",
    100,
    there_and_back("w6 m1 u1 m2 b4", BUS, back_later=10),
)


def _place_after(place: Place) -> Place:
    if place.key == RENAMED:
        return replace(place, name=NEW_NAME)
    if place.key == RENUMBERED:
        return replace(place, number=NEW_NUMBER)
    if place.key == MOVED:
        return replace(place, east=place.east + MOVED_EAST, north=place.north + MOVED_NORTH)
    return place


def _without_closed(line: Line) -> Line:
    # The street stays where it is when a stop on it closes: only the calls change.
    runs = tuple(
        replace(run, calls=tuple(key for key in run.calls if key != CLOSED)) for run in line.runs
    )
    return replace(line, runs=runs)


def _line_after(line: Line) -> Line:
    if line.key == EXTENDED:
        calls = " ".join((*EXTENSION, *line.runs[0].calls))
        runs = there_and_back(calls, METRO, back_later=4)
        return replace(line, long_name="Nulthařen – Pradvelő-ur-Sulmé", runs=runs)
    if line.key == REROUTED:
        calls = "l7 h1 t2 h2 n2 h3 a2 h4 x5 h5 e6 h6 f3"
        return replace(line, runs=there_and_back(calls, BUS_WEEKDAY_ONLY, back_later=8))
    return _without_closed(line)


def _after(before: Region) -> Region:
    kept = tuple(line for line in before.lines if line.key != WITHDRAWN)
    lines = (*(_line_after(line) for line in kept), NEW_LINE)
    return Region(
        version="2",
        start_date="20260629",
        end_date="20261213",
        holiday="20261104",
        places=(*(_place_after(place) for place in before.places), *OPENED),
        lines=tuple(sorted(lines, key=lambda line: line.order)),
    )


BEFORE = Region(
    version="1",
    start_date="20260302",
    end_date="20260628",
    holiday="20260513",
    places=PLACES,
    lines=LINES,
)
AFTER = _after(BEFORE)
