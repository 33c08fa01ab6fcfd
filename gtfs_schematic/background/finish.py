"""From nodes of the lattice to corners on the sheet, cut off at the field's edge."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.affinity import scale
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.background.board import Board
from gtfs_schematic.background.calm import calmed
from gtfs_schematic.background.legs import Arcs
from gtfs_schematic.background.model import Kind, Shape
from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.geometry import Point

Floats = NDArray[np.float64]

_RADII_MM = {1: 6.0, 2: 2.5}
"""Radius of a corner of 45 and of one of 90 degrees: neither cuts off more than a millimetre."""
_ON_EDGE_MM = 1e-6


NO_WAY = "it finds no course between the lines"
OUTSIDE = "it comes to lie outside of the sheet"


@dataclass(frozen=True)
class Outline:
    """A routed curve."""

    arcs: Arcs
    closed: bool


def finished(
    board: Board, kind: Kind, name: str, ground: BaseGeometry, outlines: Sequence[Outline]
) -> Shape | str:
    """Give the shape on the sheet, or why there is none."""
    lines = [_corners(board, outline) for outline in outlines]
    low, high = board.box
    box = shapely.box(low[0], -high[1], high[0], -low[1])
    surface = ground.geom_type == "Polygon"
    if any(len(line) < (4 if surface else 2) for line in lines):
        return NO_WAY
    whole: BaseGeometry
    if surface:
        whole = shapely.Polygon(lines[0], lines[1:])
        if not whole.is_valid:
            return NO_WAY
        whole = scale(calmed(board, scale(whole, 1, -1, origin=(0, 0))), 1, -1, origin=(0, 0))
    else:
        whole = shapely.LineString(lines[0])
    rings = []
    for part in shapely.get_parts(shapely.intersection(whole, box)):
        if part.is_empty:
            continue
        if part.geom_type == "Polygon":
            # Holes run the other way round, so that every way of filling leaves them out.
            turned = shapely.orient_polygons(part)
            rings += [
                _rounded(list(ring.coords)[:-1], box, closed=True)
                for ring in (turned.exterior, *turned.interiors)
            ]
        elif part.geom_type == "LineString":
            rings.append(_rounded(list(part.coords), box, closed=False))
    if not rings:
        return OUTSIDE
    return Shape(kind, name, tuple(rings), surface, ground)


def _corners(board: Board, outline: Outline) -> Floats:
    """Give the places where a curve turns, and its ends; millimetres, y down."""
    places = board.lattice.at(np.concatenate(outline.arcs)) * (1.0, -1.0)
    if outline.closed:
        steps = np.diff(np.vstack([places[-1:], places, places[:1]]), axis=0)
        turns = _turning(steps)
        ring = places[turns]
        return np.vstack([ring, ring[:1]])
    turns = np.ones(len(places), dtype=np.bool_)
    turns[1:-1] = _turning(np.diff(places, axis=0))
    return places[turns]


def _turning(steps: Floats) -> NDArray[np.bool_]:
    """Tell between which consecutive steps the direction changes."""
    a, b = steps[:-1], steps[1:]
    cross = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    return np.asarray(np.abs(cross) > 1e-6)


def _rounded(points: list[Point], box: shapely.Polygon, *, closed: bool) -> tuple[Corner, ...]:
    """Give corners with their radii; where the field ends they are sharp."""
    edge = box.exterior
    corners = []
    for i, point in enumerate(points):
        inner = closed or 0 < i < len(points) - 1
        if not inner or edge.distance(shapely.Point(point)) < _ON_EDGE_MM:
            corners.append(Corner(_hundredths(point), 0.0))
            continue
        before, after = points[i - 1], points[(i + 1) % len(points)]
        into = math.atan2(point[1] - before[1], point[0] - before[0])
        out = math.atan2(after[1] - point[1], after[0] - point[0])
        turn = round(abs(math.remainder(out - into, math.tau)) / (math.pi / 4.0))
        corners.append(Corner(_hundredths(point), _RADII_MM.get(turn, 0.0)))
    return tuple(corners)


def _hundredths(point: Point) -> Point:
    return (round(point[0], 3), round(point[1], 3))
