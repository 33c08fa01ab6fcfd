"""What a new course meets on the drawing that stands, and which of it it may cross."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.detour import Course
from gtfs_schematic.layout.model import Clearances, SheetFrame
from gtfs_schematic.layout.places import point_of

_TOUCH_M = 30.0
"""Distance on the ground below which a crossing and a near miss are not told apart, metres."""
_END_MM = 0.02
_THIN_MM = 0.1
"""Distance that is enough for now where others will give way."""


@dataclass(frozen=True)
class Edge:
    """A link or walk of the changed network."""

    id: str
    start: str
    end: str
    lines: int


@dataclass(frozen=True)
class Chain:
    """Edges without a path, through stations without a place that nothing else meets."""

    stations: tuple[str, ...]
    edges: tuple[Edge, ...]


@dataclass(frozen=True)
class Obstacles:
    """What a new course meets: placed edges and stations, and which of them it may cross."""

    frame: SheetFrame
    lines: NDArray[np.object_]
    half: NDArray[np.float64]
    shared: NDArray[np.bool_]
    """Edges that end at an end of the new course."""
    events: tuple[tuple[int, int], ...]
    """What the course crosses on the ground, in that order: number of the edge that stands, and
    of the chain's edge that crosses it."""
    unsure: tuple[tuple[int, int], ...]
    """What it may cross or not, likewise: on the ground they nearly touch."""
    markers: NDArray[np.object_]
    own: NDArray[np.bool_]
    width: float
    clear: float
    marker: float

    @staticmethod
    def of(
        chain: Chain,
        placed: Sequence[tuple[Edge, tuple[Point, ...]]],
        at: Mapping[str, Point],
        ground: Mapping[str, Point],
        limits: tuple[Clearances, SheetFrame],
    ) -> Obstacles:
        """Gather what stands in the way of a chain.

        `placed` are the edges that have their path, `at` the places of stations in millimetres,
        `ground` those in local metres.
        """
        clearances, frame = limits
        edges = [edge for edge, _ in placed]
        lines = np.array([shapely.LineString(path) for _, path in placed], dtype=object)
        ends = {chain.stations[0], chain.stations[-1]}
        stations = sorted(at)
        events, unsure = _crossings(chain, edges, ground)
        return Obstacles(
            frame,
            lines,
            np.array([clearances.half_width_mm(e.lines) for e in edges]),
            np.array([bool({e.start, e.end} & ends) for e in edges], dtype=bool),
            events,
            unsure,
            shapely.points([at[s] for s in stations]),
            np.array([s in ends for s in stations], dtype=bool),
            max(clearances.half_width_mm(e.lines) for e in chain.edges),
            2.0 * clearances.line_gap_mm,
            clearances.marker_mm / 2.0,
        )

    @property
    def must(self) -> NDArray[np.bool_]:
        """Edges that the course crosses on the ground."""
        return np.isin(np.arange(len(self.lines)), [k for k, _ in self.events])

    @property
    def may(self) -> NDArray[np.bool_]:
        """Edges that it may cross or not."""
        return np.isin(np.arange(len(self.lines)), [k for k, _ in self.unsure])

    def stations_along(
        self, path: tuple[Point, ...], count: int, *, thin: bool = False
    ) -> list[float] | None:
        """Share a path out among `count` edges, each of which crosses what it must.

        Gives the lengths along the path at which the chain's stations stand, ends included,
        millimetres; None if the path crosses what it must not, or in the wrong order. On a `thin`
        path stations may stand near each other: room is made later.
        """
        line = shapely.LineString(path)
        crossing = np.asarray(shapely.crosses(self.lines, line), dtype=bool)
        must = self.must
        if (must & ~crossing).any() or (crossing & ~(must | self.may)).any():
            return None
        low, high = np.zeros(count + 1), np.full(count + 1, line.length)
        number = np.arange(count + 1)
        margin = _THIN_MM if thin else self.marker + self.width
        for k in np.flatnonzero(crossing):
            meetings = shapely.get_parts(self.lines[k].intersection(line))
            if any(meeting.geom_type != "Point" for meeting in meetings):
                return None
            lengths = sorted(map(line.project, meetings))
            if self.shared[k]:
                # Where the course begins or ends it only meets what ends there, too.
                lengths = [t for t in lengths if _END_MM < t < line.length - _END_MM]
            owners = self._owners(int(k), lengths, line.length / count)
            if owners is None:
                return None
            room = margin + (0.0 if thin else float(self.half[k]))
            for t, e in zip(lengths, owners, strict=True):
                low = np.where(number > e, np.maximum(low, t + room), low)
                high = np.where(number <= e, np.minimum(high, t - room), high)
        even = np.linspace(0.0, line.length, count + 1)
        stops = np.clip(even, low, high)
        stops[0], stops[-1] = 0.0, line.length
        gaps = np.diff(stops)
        least = _THIN_MM if thin else 2.0 * self.marker + self.clear
        if (low[1:-1] > high[1:-1]).any() or (gaps < least).any():
            return None
        return [float(stop) for stop in stops]

    def _owners(self, k: int, lengths: list[float], share: float) -> list[int] | None:
        """Edges of the chain that cross an edge at lengths along the course; None if none may."""
        must = [e for edge, e in self.events if edge == k]
        may = [e for edge, e in self.unsure if edge == k]
        free = len(lengths) - len(must)
        if not 0 <= free <= len(may):
            return None
        # Where the stations would stand evenly, these would be nearest to the crossings.
        away = {e: min(abs((e + 0.5) * share - t) for t in lengths) for e in may}
        return sorted([*must, *sorted(may, key=lambda e: (round(away[e], 6), e))[:free]])

    def allow(self, course: Course) -> bool:
        """Whether a course keeps the sheet, its distances, and its own shape."""
        line = shapely.LineString([point_of(corner) for corner in course.corners])
        frame = self.frame
        low_x, low_y, high_x, high_y = line.bounds
        inside = low_x >= frame.left_mm and high_x <= frame.right_mm
        if not (inside and low_y >= frame.top_mm and high_y <= frame.bottom_mm and line.is_simple):
            return False
        near = shapely.distance(self.markers, line) < self.marker + self.width + self.clear
        if (near & ~self.own).any():
            return False
        crossing = np.asarray(shapely.crosses(self.lines, line), dtype=bool)
        touching = np.asarray(shapely.intersects(self.lines, line), dtype=bool)
        for other in self.lines[touching]:
            if other.intersection(line).geom_type != "Point":
                return False
        tight = shapely.distance(self.lines, line) < self.half + self.width + self.clear
        return not (tight & ~crossing & ~self.shared).any()


def _crossings(
    chain: Chain, edges: Sequence[Edge], ground: Mapping[str, Point]
) -> tuple[tuple[tuple[int, int], ...], tuple[tuple[int, int], ...]]:
    """Give what a chain crosses on the ground, in order, and with what that is not sure."""
    courses = shapely.linestrings([(ground[e.start], ground[e.end]) for e in edges])
    tips = shapely.points([(ground[e.start], ground[e.end]) for e in edges])
    events: list[tuple[int, int]] = []
    doubts: list[tuple[int, int]] = []
    for number, (a, b) in enumerate(itertools.pairwise(chain.stations)):
        step = shapely.LineString([ground[a], ground[b]])
        apart = np.array([not {a, b} & {e.start, e.end} for e in edges], dtype=bool)
        reach = shapely.distance(tips, step).min(axis=1)
        for end in (a, b):
            reach = np.minimum(reach, shapely.distance(courses, shapely.Point(ground[end])))
        unsure = apart & (reach < _TOUCH_M)
        doubts += [(int(k), number) for k in np.flatnonzero(unsure)]
        crossed = np.flatnonzero(apart & ~unsure & shapely.crosses(courses, step))
        meetings = shapely.intersection(courses[crossed], step)
        along = shapely.line_locate_point(step, meetings)
        events += [(int(crossed[i]), number) for i in np.argsort(along, kind="stable")]
    return tuple(events), tuple(doubts)
