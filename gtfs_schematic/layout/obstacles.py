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
    must: NDArray[np.bool_]
    """Edges that the course crosses on the ground."""
    may: NDArray[np.bool_]
    """Edges that it may cross or not: on the ground they nearly touch."""
    where: NDArray[np.int64]
    """Per edge that must be crossed the number of the chain's edge that crosses it."""
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
        shared = np.array([bool({e.start, e.end} & ends) for e in edges], dtype=bool)
        course = shapely.LineString([ground[s] for s in chain.stations])
        courses = np.array(
            [shapely.LineString([ground[e.start], ground[e.end]]) for e in edges],
            dtype=object,
        )
        crosses = np.asarray(shapely.crosses(courses, course), dtype=bool) & ~shared
        stations = sorted(at)
        points = np.array([ground[s] for s in chain.stations])
        tips = [
            min(
                float(shapely.distance(shapely.points(ground[s]), course)) for s in (e.start, e.end)
            )
            for e in edges
        ]
        reach = shapely.distance(shapely.points(points)[:, None], courses[None, :]).min(axis=0)
        unsure = (np.minimum(np.array(tips), reach) < _TOUCH_M) & ~shared
        return Obstacles(
            frame,
            lines,
            np.array([clearances.half_width_mm(e.lines) for e in edges]),
            shared,
            crosses & ~unsure,
            unsure,
            _crossed_by(chain, courses, ground),
            shapely.points([at[s] for s in stations]),
            np.array([s in ends for s in stations], dtype=bool),
            max(clearances.half_width_mm(e.lines) for e in chain.edges),
            2.0 * clearances.line_gap_mm,
            clearances.marker_mm / 2.0,
        )

    def stations_along(self, path: tuple[Point, ...], count: int) -> list[float] | None:
        """Share a path out among `count` edges, each of which crosses what it must.

        Gives the lengths along the path at which the chain's stations stand, ends included,
        millimetres; None if the path crosses what it must not, or in the wrong order.
        """
        line = shapely.LineString(path)
        crossing = np.asarray(shapely.crosses(self.lines, line), dtype=bool)
        if (self.must & ~crossing).any() or (crossing & ~(self.must | self.may)).any():
            return None
        low, high = np.zeros(count + 1), np.full(count + 1, line.length)
        number = np.arange(count + 1)
        margin = self.marker + self.width
        for k in np.flatnonzero(self.must):
            meeting = self.lines[k].intersection(line)
            if meeting.geom_type != "Point":
                return None
            t, e = float(line.project(meeting)), int(self.where[k])
            room = margin + float(self.half[k])
            low = np.where(number > e, np.maximum(low, t + room), low)
            high = np.where(number <= e, np.minimum(high, t - room), high)
        even = np.linspace(0.0, line.length, count + 1)
        stops = np.clip(even, low, high)
        stops[0], stops[-1] = 0.0, line.length
        gaps = np.diff(stops)
        if (low[1:-1] > high[1:-1]).any() or (gaps < 2.0 * self.marker + self.clear).any():
            return None
        return [float(stop) for stop in stops]

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


def _crossed_by(
    chain: Chain, courses: NDArray[np.object_], ground: Mapping[str, Point]
) -> NDArray[np.int64]:
    """Give the number of the chain's first edge that crosses each course on the ground."""
    where = np.zeros(len(courses), dtype=np.int64)
    steps = list(itertools.pairwise(chain.stations))
    for e, (a, b) in reversed(list(enumerate(steps))):
        crosses = shapely.crosses(courses, shapely.LineString([ground[a], ground[b]]))
        where[np.asarray(crosses, dtype=bool)] = e
    return where
