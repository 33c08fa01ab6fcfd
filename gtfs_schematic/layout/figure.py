"""A drawing as nodes and straight segments, with what must stay between them."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.draft import Draft
from gtfs_schematic.layout.places import point_of, without_straights
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.skeleton import Skeleton


@dataclass(frozen=True)
class Figure:
    """Every station and bend of a draft is a node; millimetres, y north."""

    skeleton: Skeleton
    """Stations first, in the order of `stations`, then bends; one course per edge."""
    stations: tuple[str, ...]
    edges: tuple[str, ...]

    @staticmethod
    def of(draft: Draft) -> Figure:
        """Take a draft apart; directions that are not exact are rounded to the nearest."""
        stations = tuple(sorted(draft.at))
        number = {station: i for i, station in enumerate(stations)}
        points = [(x, -y) for x, y in (draft.at[station] for station in stations)]
        segments: list[tuple[int, int]] = []
        directions: list[int] = []
        courses: list[tuple[int, ...]] = []
        edges = tuple(sorted(draft.path))
        for key in edges:
            edge = draft.edges[key]
            nodes = [number[edge.start]]
            for x, y in draft.path[key][1:-1]:
                nodes.append(len(points))
                points.append((x, -y))
            nodes.append(number[edge.end])
            first = len(segments)
            segments += itertools.pairwise(nodes)
            directions += [_direction(a, b) for a, b in itertools.pairwise(draft.path[key])]
            courses.append(tuple(range(first, len(segments))))
        places = np.array(points, dtype=np.float64)
        vertices = PlaneGraph(places[: len(stations)], stations, (), (), ())
        skeleton = Skeleton(
            vertices,
            places,
            np.array(segments, dtype=np.int64).reshape(-1, 2),
            np.array(directions, dtype=np.int64),
            tuple(courses),
        )
        return Figure(skeleton, stations, edges)

    @property
    def lines(self) -> NDArray[np.object_]:
        """Segments as lines, shape (m,)."""
        ends = self.skeleton.points[self.skeleton.segments]
        return np.asarray(shapely.linestrings(ends), dtype=object)

    def half_widths(self, draft: Draft) -> NDArray[np.float64]:
        """Half of what is drawn along each segment, shape (m,)."""
        widths = [draft.clearances.half_width_mm(draft.edges[key].lines) for key in self.edges]
        return np.array(widths)[self.skeleton.piece_of]

    def node_edges(self) -> NDArray[np.int64]:
        """Give the number of the edge to which each bend belongs, −1 for a station; shape (k,)."""
        owner = np.full(len(self.skeleton.points), -1, dtype=np.int64)
        for e in range(len(self.edges)):
            owner[self.skeleton.polyline(e)[1:-1]] = e
        return owner

    def drawn(self, draft: Draft, units: NDArray[np.int64]) -> Draft:
        """Give a draft with its nodes at other places, whole units, y north."""
        found = draft.copy()
        places = [(int(x), int(-y)) for x, y in units]
        found.at.update({s: point_of(places[i]) for i, s in enumerate(self.stations)})
        for e, key in enumerate(self.edges):
            course = without_straights(places[node] for node in self.skeleton.polyline(e))
            found.path[key] = tuple(point_of(place) for place in course)
        return found


def _direction(a: Point, b: Point) -> int:
    """Nearest of the eight directions with y north, from places with y down."""
    return round(math.atan2(a[1] - b[1], b[0] - a[0]) / (math.pi / 4)) % 8
