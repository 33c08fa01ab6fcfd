"""What the drift room looks at: any drawn diagram, an edition or a table of places."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

from gtfs_schematic.geometry import Point


class PlacedStation(Protocol):
    """A drawn station; lon and lat in degrees (WGS 84), sheet place in millimetres, y down."""

    @property
    def id(self) -> str:
        """Id of the station, unique in the diagram."""

    @property
    def name(self) -> str:
        """Name as a rider reads it."""

    @property
    def lon(self) -> float:
        """Longitude in degrees."""

    @property
    def lat(self) -> float:
        """Latitude in degrees."""

    @property
    def x_mm(self) -> float:
        """Place on the sheet, millimetres from its left edge."""

    @property
    def y_mm(self) -> float:
        """Place on the sheet, millimetres from its top edge."""


class NamedStation(PlacedStation, Protocol):
    """A station of a whole diagram, with what journeys need of it."""

    @property
    def stop_ids(self) -> Sequence[str]:
        """Ids of the feed's stops that the station stands for."""

    @property
    def group(self) -> str:
        """Id that stations of one interchange share."""

    @property
    def change_s(self) -> int | None:
        """Seconds that the feed gives for a change within the station."""


class PlacedLink(Protocol):
    """A drawn link between two stations, by their ids."""

    @property
    def id(self) -> str:
        """Id of the link, unique in the diagram."""

    @property
    def start(self) -> str:
        """Id of the first station."""

    @property
    def end(self) -> str:
        """Id of the second station."""


class CourseLink(PlacedLink, Protocol):
    """A link with its lines and its drawn course, sheet millimetres, y down."""

    @property
    def lines(self) -> Sequence[str]:
        """Ids of the lines on the link."""

    @property
    def path_mm(self) -> Sequence[Point]:
        """The course from `start` to `end`, every bend as a corner."""


class PlacedWalk(PlacedLink, Protocol):
    """A drawn walk between two stations."""

    @property
    def time_s(self) -> int | None:
        """Seconds that the feed gives for it."""

    @property
    def path_mm(self) -> Sequence[Point]:
        """The course from `start` to `end`."""


class NamedLine(Protocol):
    """A line by its name and color."""

    @property
    def id(self) -> str:
        """Id of the line."""

    @property
    def name(self) -> str:
        """Name as a rider reads it."""

    @property
    def color(self) -> str:
        """Color as "#RRGGBB"."""


@dataclass(frozen=True, slots=True)
class TimedPattern:
    """All trips of a line that call at the same stations in the same order, with their times."""

    line: str
    stations: tuple[str, ...]
    """Ids of the stations called at, in order."""
    times_s: tuple[int, ...]
    """Median time from the first departure to the arrival at each station, seconds."""
    departures_s: tuple[int, ...]
    """Departures from the first station, seconds after noon minus 12 h, sorted."""


class Diagram(Protocol):
    """A whole drawn diagram; an edition is one."""

    @property
    def stations(self) -> Sequence[NamedStation]:
        """All drawn stations."""

    @property
    def links(self) -> Sequence[CourseLink]:
        """All drawn links."""

    @property
    def walks(self) -> Sequence[PlacedWalk]:
        """All drawn walks."""

    @property
    def lines(self) -> Sequence[NamedLine]:
        """All drawn lines."""

    @property
    def patterns(self) -> Sequence[TimedPattern]:
        """The timetable of the service date; empty if the diagram does not know it."""
