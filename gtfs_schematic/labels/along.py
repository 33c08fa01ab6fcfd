"""Names of lines stand on the lines themselves, every so often along their runs."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import shapely

from gtfs_schematic.bundles.course import tangent_mm
from gtfs_schematic.bundles.model import BundledLayout, Stretch
from gtfs_schematic.geometry import Point, distance, unit_vector
from gtfs_schematic.labels.badges import LONGEST_BADGE
from gtfs_schematic.labels.blocks import badge_height, badge_width, type_size_mm
from gtfs_schematic.labels.model import Label, LabelSettings, RunBadge
from gtfs_schematic.labels.obstacles import Obstacles
from gtfs_schematic.labels.positions import BADGE_SIZE

_STEP_MM = 1.0
_REACH = 0.45
"""How far from where a name should stand it is tried, in distances of names."""
_NEAREST = 0.4
"""Names of one line keep at least this apart, in distances of names."""
_AIR_MM = 0.4
"""From markers, names and other badges."""
_FROM_MARKERS_MM = (2.0, _AIR_MM)
"""What a badge keeps from markers if it can, so that it does not seem to be a station's name."""
_TOUCH_MM = 0.12
"""A badge may reach over the gap between two lines of a bundle, and so much over the next line."""


@dataclass(frozen=True, slots=True)
class _Spot:
    at: Point
    angle_deg: float
    box: shapely.Polygon


def run_badges(
    bundled: BundledLayout, settings: LabelSettings, obstacles: Obstacles, labels: Sequence[Label]
) -> tuple[RunBadge, ...]:
    """Give the names along all lines, where they cover nothing but their own line.

    On each stretch names are wanted at even distances, and tried from there outwards. A badge
    stands upright where nothing is beside it, otherwise along the line.
    """
    if not settings.line_names_every_mm or not settings.line_badges:
        return ()
    artist = _Artist(bundled, settings, obstacles, labels)
    return tuple(badge for stretch in bundled.stretches for badge in artist.on(stretch))


class _Artist:
    """Places badges one after the other, each clear of those before it."""

    def __init__(
        self,
        bundled: BundledLayout,
        settings: LabelSettings,
        obstacles: Obstacles,
        labels: Sequence[Label],
    ) -> None:
        self.bundled, self.obstacles = bundled, obstacles
        self.every = settings.line_names_every_mm
        self.size = BADGE_SIZE * type_size_mm(settings, bold=False)
        self.outlines = np.array([shapely.Polygon(label.outline_mm) for label in labels])
        self.names = shapely.STRtree(self.outlines)
        self.placed: list[shapely.Polygon] = []
        self.places: dict[str, list[Point]] = {}
        for label in labels:
            for badge in label.badges:
                self.places.setdefault(badge.line_id, []).append(label.pivot_mm)

    def on(self, stretch: Stretch) -> Iterator[RunBadge]:
        """Give the badges of one stretch."""
        text = self.bundled.layout.network.line[stretch.line_id].name.strip()
        if not text or len(text) > LONGEST_BADGE:
            return
        points = [corner.at_mm for corner in stretch.corners]
        length = sum(distance(a, b) for a, b in itertools.pairwise(points))
        count = int(length / self.every + 0.35)
        for i in range(count):
            wanted = (i + 0.5) * length / count
            spot = self._free_spot(stretch, text, wanted)
            if spot is None:
                continue
            self.placed.append(spot.box)
            self.places.setdefault(stretch.line_id, []).append(spot.at)
            yield RunBadge(
                line_id=stretch.line_id,
                text=text,
                at_mm=spot.at,
                width_mm=badge_width(text, self.size),
                height_mm=badge_height(self.size),
                size_mm=self.size,
                angle_deg=spot.angle_deg,
            )

    def _free_spot(self, stretch: Stretch, text: str, wanted: float) -> _Spot | None:
        """Give the free spot nearest to a length along a stretch."""
        both = (self._spot_within(stretch, text, wanted, air) for air in _FROM_MARKERS_MM)
        return next((spot for spot in both if spot is not None), None)

    def _spot_within(self, stretch: Stretch, text: str, wanted: float, air: float) -> _Spot | None:
        width, height = badge_width(text, self.size), badge_height(self.size)
        steps = int(_REACH * self.every / _STEP_MM)
        for k in sorted(range(-steps, steps + 1), key=abs):
            found = _on_straight(stretch, wanted + k * _STEP_MM, width / 2.0 + _AIR_MM)
            if found is None or self._near_its_like(stretch.line_id, found[0]):
                continue
            at, along = found
            upright = _Spot(at, 0.0, _box(at, width, height, 0.0))
            if self._is_free(upright.box, stretch.line_id, 0.0, air):
                return upright
            angle = _reading_angle(along)
            turned = _Spot(at, angle, _box(at, width, height, angle))
            if self._is_free(turned.box, stretch.line_id, _TOUCH_MM, air):
                return turned
        return None

    def _near_its_like(self, line_id: str, at: Point) -> bool:
        least = _NEAREST * self.every
        return any(distance(at, other) < least for other in self.places.get(line_id, ()))

    def _is_free(
        self, box: shapely.Polygon, line_id: str, over_mm: float, from_markers: float
    ) -> bool:
        """Tell whether a box covers nothing but its own line, others by `over_mm` at most."""
        obstacles = self.obstacles
        if len(self.names.query(box, predicate="dwithin", distance=_AIR_MM)):
            return False
        if len(obstacles.marker_tree.query(box, predicate="dwithin", distance=from_markers)):
            return False
        if len(obstacles.walk_tree.query(box, predicate="dwithin", distance=1.0)):
            return False
        near = obstacles.piece_tree.query(
            box, predicate="dwithin", distance=obstacles.half_width - over_mm
        )
        if any(obstacles.piece_lines[i] != line_id for i in near.tolist()):
            return False
        return all(box.distance(other) >= _AIR_MM for other in self.placed)


def _on_straight(stretch: Stretch, length: float, half: float) -> tuple[Point, Point] | None:
    """Give the point so far along a stretch, and its direction, if all is straight around it."""
    corners = stretch.corners
    for i, (a, b) in enumerate(itertools.pairwise(corners)):
        piece = distance(a.at_mm, b.at_mm)
        if length <= piece:
            # No nearer to a bend than its radius, and never on its arc.
            start = half + max(a.radius_mm, tangent_mm(corners, i))
            end = half + max(b.radius_mm, tangent_mm(corners, i + 1))
            if not start <= length <= piece - end:
                return None
            way = unit_vector(a.at_mm, b.at_mm)
            return (a.at_mm[0] + length * way[0], a.at_mm[1] + length * way[1]), way
        length -= piece
    return None


def _reading_angle(way: Point) -> float:
    """Give the angle of text along a direction that reads from the left, or upwards."""
    angle = round(math.degrees(math.atan2(way[1], way[0])), 6)
    if angle > 89.0:
        return angle - 180.0
    return angle + 180.0 if angle < -91.0 else angle


def _box(at: Point, width: float, height: float, angle_deg: float) -> shapely.Polygon:
    cosine, sine = math.cos(math.radians(angle_deg)), math.sin(math.radians(angle_deg))
    corners = []
    for dx, dy in ((-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0)):
        x, y = dx * width / 2.0, dy * height / 2.0
        corners.append((at[0] + x * cosine - y * sine, at[1] + x * sine + y * cosine))
    return shapely.Polygon(corners)
