"""The picture of the drift page: the network that moves between ground and diagram, as SVG."""

from __future__ import annotations

import itertools
import math
from bisect import bisect_right
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from html import escape
from typing import Any

from gtfs_schematic.drift.model import DriftReport, LinkDrift, StationDrift, Warp
from gtfs_schematic.drift.placed import CourseLink, Diagram, PlacedWalk
from gtfs_schematic.geometry import Point, distance

SHARE_EDGES = (0.01, 0.02, 0.04, 0.08)
"""Bounds of the classes of displacement, shares of the diagonal."""
TURN_EDGES = (-22.5, -7.5, 7.5, 22.5)
"""Bounds of the classes of turn, degrees clockwise."""
SCALE_EDGES = (0.5, 0.8, 1.25, 2.0)
"""Bounds of the classes of scale, against the typical one."""

_SIZE = 1000.0
_MARGIN = 14.0
_LEAST_ARROW = 3.0


@dataclass(frozen=True, slots=True)
class _Frame:
    """From sheet units to picture units, of which the longer side of the picture has 1000."""

    left: float
    top: float
    scale: float
    width: float
    height: float

    def at(self, point: Point) -> Point:
        """Give a point in picture units, to a tenth."""
        x = (point[0] - self.left) * self.scale + _MARGIN
        y = (point[1] - self.top) * self.scale + _MARGIN
        return (round(x, 1) + 0.0, round(y, 1) + 0.0)


@dataclass(frozen=True, slots=True)
class _Course:
    """A link or walk: per corner its true place and its drawn one, in picture units."""

    key: str
    kind: str
    ends: tuple[str, str]
    true: tuple[Point, ...]
    drawn: tuple[Point, ...]


def picture(report: DriftReport, diagram: Diagram, *, label: str) -> tuple[str, Mapping[str, Any]]:
    """Draw the network where the diagram has it, with arrows and the distorted grid.

    Parameters
    ----------
    report
        What was measured of the diagram.
    diagram
        For the courses of links and walks.
    label
        Text alternative.

    Returns
    -------
    tuple
        An SVG element, and the places from which the page's script moves it: per station, link
        and line of the grid where it lies on the ground and where it is drawn.
    """
    frame = _frame(report, diagram)
    courses = _courses(report, diagram, frame)
    radius = _radius(report, frame)
    changed = {link.link_id: link for link in report.links}
    moved = {station.station_id: station for station in report.stations}
    grid = _grid(report.warp, frame)
    parts = [
        (
            f'<svg class="net" viewBox="0 0 {frame.width:g} {frame.height:g}" role="img" '
            f'aria-label="{escape(label)}" style="--r:{radius:g}">'
        ),
        '<g class="grid">',
        *(f'<path d="{_path(drawn)}"/>' for _, drawn in grid),
        '</g><g class="courses">',
        *(_drawn_course(course, changed, moved) for course in courses),
        '</g><g class="routes"></g><g class="arrows" aria-hidden="true">',
        *_arrows(report, frame),
        '</g><g class="stations">',
        *(_drawn_station(station, frame, radius) for station in report.stations),
        '</g><g class="marks"></g></svg>',
    ]
    data = {
        "stations": [
            {
                "id": s.station_id,
                "name": s.name,
                "t": frame.at(s.true_mm),
                "d": frame.at(s.drawn_mm),
            }
            for s in report.stations
        ],
        "courses": [
            {"id": c.key, "ends": c.ends, "t": _flat(c.true), "d": _flat(c.drawn)} for c in courses
        ],
        "grid": [{"t": _flat(true), "d": _flat(drawn)} for true, drawn in grid],
    }
    return "".join(parts), data


def class_of(value: float | None, edges: Sequence[float]) -> int:
    """Give the class of a value: how many bounds it has reached; the middle one if unknown."""
    return len(edges) // 2 if value is None else bisect_right(edges, value)


def _frame(report: DriftReport, diagram: Diagram) -> _Frame:
    points = [p for s in report.stations for p in (s.true_mm, s.drawn_mm)]
    grid = zip(report.warp.near, report.warp.true_mm, report.warp.drawn_mm, strict=True)
    points += [p for near, *ends in grid if near for p in ends]
    points += [p for link in diagram.links for p in link.path_mm]
    points += [p for walk in diagram.walks for p in walk.path_mm]
    left, top = min(x for x, _ in points), min(y for _, y in points)
    width, height = max(x for x, _ in points) - left, max(y for _, y in points) - top
    scale = (_SIZE - 2 * _MARGIN) / max(width, height)
    return _Frame(
        left,
        top,
        scale,
        round(width * scale + 2 * _MARGIN, 1),
        round(height * scale + 2 * _MARGIN, 1),
    )


def _radius(report: DriftReport, frame: _Frame) -> float:
    """Make markers as large as the typical link allows."""
    return round(min(max(0.2 * report.typical_link_mm * frame.scale, 2.6), 6.0), 1)


def _courses(report: DriftReport, diagram: Diagram, frame: _Frame) -> list[_Course]:
    true = {station.station_id: station.true_mm for station in report.stations}
    kinds: tuple[tuple[str, Sequence[CourseLink | PlacedWalk]], ...] = (
        ("link", diagram.links),
        ("walk", diagram.walks),
    )
    return [
        _Course(
            key=part.id,
            kind=kind,
            ends=(part.start, part.end),
            true=tuple(
                frame.at(_between(true[part.start], true[part.end], share))
                for share in _shares(part.path_mm)
            ),
            drawn=tuple(frame.at(point) for point in part.path_mm),
        )
        for kind, parts in kinds
        for part in parts
    ]


def _shares(path: Sequence[Point]) -> list[float]:
    """Give how much of a path's length lies before each corner, 0 to 1."""
    steps = [distance(p, q) for p, q in itertools.pairwise(path)]
    whole = sum(steps) or 1.0
    return [length / whole for length in itertools.accumulate(steps, initial=0.0)]


def _between(p: Point, q: Point, share: float) -> Point:
    return (p[0] + share * (q[0] - p[0]), p[1] + share * (q[1] - p[1]))


def _grid(warp: Warp, frame: _Frame) -> list[tuple[list[Point], list[Point]]]:
    """Give the grid's lines, true and drawn, cut where no station is near."""
    rows = [range(r * warp.columns, (r + 1) * warp.columns) for r in range(warp.rows)]
    columns = [range(c, warp.rows * warp.columns, warp.columns) for c in range(warp.columns)]
    lines = []
    for line in (*rows, *columns):
        for near, run in itertools.groupby(line, key=lambda i: warp.near[i]):
            nodes = list(run)
            if near and len(nodes) > 1:
                lines.append(
                    (
                        [frame.at(warp.true_mm[i]) for i in nodes],
                        [frame.at(warp.drawn_mm[i]) for i in nodes],
                    )
                )
    return lines


def _drawn_course(
    course: _Course, changed: Mapping[str, LinkDrift], moved: Mapping[str, StationDrift]
) -> str:
    if course.kind == "walk":
        return f'<path class="walk" d="{_path(course.drawn)}"/>'
    link = changed[course.key]
    share = sum(moved[end].displacement_share for end in course.ends) / 2.0
    classes = (
        class_of(share, SHARE_EDGES),
        class_of(link.bearing_change_deg, TURN_EDGES),
        class_of(link.length_ratio, SCALE_EDGES),
    )
    return f'<path class="{_classes(classes)}" d="{_path(course.drawn)}"/>'


def _drawn_station(station: StationDrift, frame: _Frame, radius: float) -> str:
    x, y = frame.at(station.drawn_mm)
    share = class_of(station.displacement_share, SHARE_EDGES)
    classes = (
        share,
        class_of(station.local_rotation_deg, TURN_EDGES),
        class_of(station.local_scale, SCALE_EDGES),
    )
    # Size says the same as color, for those who see no difference between colors.
    size = radius * (0.75 + 0.15 * share)
    return (
        f'<circle class="{_classes(classes)}" cx="{x:g}" cy="{y:g}" r="{size:.1f}">'
        f"<title>{escape(station.name)}</title></circle>"
    )


def _classes(classes: Iterable[int]) -> str:
    return " ".join(f"{kind}{number}" for kind, number in zip("dts", classes, strict=True))


def _arrows(report: DriftReport, frame: _Frame) -> Iterable[str]:
    """Draw an arrow from each station's true place to its drawn one, if they differ visibly."""
    for station in report.stations:
        (x, y), (u, v) = frame.at(station.true_mm), frame.at(station.drawn_mm)
        length = math.hypot(u - x, v - y)
        if length < _LEAST_ARROW:
            continue
        head = min(7.0, 0.4 * length)
        along = ((u - x) / length, (v - y) / length)
        base = (u - head * along[0], v - head * along[1])
        side = (-along[1] * head * 0.4, along[0] * head * 0.4)
        yield (
            f'<path d="M{x:g} {y:g}L{base[0]:.1f} {base[1]:.1f}"/>'
            f'<path class="head" d="M{u:g} {v:g}L{base[0] + side[0]:.1f} {base[1] + side[1]:.1f}'
            f'L{base[0] - side[0]:.1f} {base[1] - side[1]:.1f}Z"/>'
        )


def _path(points: Iterable[Point]) -> str:
    return "M" + "L".join(f"{x:g} {y:g}" for x, y in points)


def _flat(points: Iterable[Point]) -> list[float]:
    return [value for point in points for value in point]
