"""Carry water, parks and boundaries through the deformation of the network, or leave them out.

A shape's outline crosses on the sheet just what it has to cross, in the order and sense that it has
on the ground (its word), and among all curves that do so the one is taken that is short, has few
bends and lies near its image under the local deformation. So no line is crossed that the ground
does not cross, and every station stays on its side of the shore.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
import shapely.affinity
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.background.board import Board, board_of, close_stations
from gtfs_schematic.background.bridges import add_bridges
from gtfs_schematic.background.finish import NO_WAY, Outline, finished
from gtfs_schematic.background.legs import Arcs
from gtfs_schematic.background.model import (
    Background,
    BackgroundSettings,
    Feature,
    Kind,
    LeftOut,
    Shape,
    Source,
)
from gtfs_schematic.background.resolve import apart
from gtfs_schematic.background.route import Curve, Ends, Slots, keep_off, occupy, route
from gtfs_schematic.background.word import word_of
from gtfs_schematic.labels.model import LabelledLayout

Floats = NDArray[np.float64]

_ORDER: tuple[Kind, ...] = ("park", "water", "boundary")
_CLOSE_MM = 0.3
"""Detail below this size on the sheet is not looked at."""
_STEP_MM = 2.0
"""Points of a curve stand no further apart than this on the sheet."""
_BEYOND = 0.6
"""Shapes are cut off this far beyond the network, in its sizes."""
_LEAST_MM = 4.0
"""Shorter lines are left out."""
_LEAST_MM2 = 18.0
"""Smaller surfaces that hold no station are left out."""
_FREE_MM = 2.0

TOO_SMALL = "too small to show"


def carry(labelled: LabelledLayout, source: Source, settings: BackgroundSettings) -> Background:
    """Carry the features of a background to a labelled sheet.

    Parameters
    ----------
    labelled
        The network on its sheet; shapes keep a distance from markers, lines and names.
    source
        The features, in degrees.
    settings
        Kept with the result.
    """
    if not source.features:
        return Background(settings, (), source.left_out)
    board = board_of(labelled)
    add_bridges(board)
    shapes: list[Shape] = []
    left_out = list(source.left_out)
    for kind in _ORDER:
        features = [feature for feature in source.features if feature.kind == kind]
        if kind != "boundary":
            shapes += _surfaces(board, features, kind, left_out)
    close_stations(board.lattice, board.planes, board.radii, settings.river_width_mm / 2.0)
    for feature in source.features:
        shapes += _courses(board, feature, shapes, left_out)
    shapes.sort(key=lambda shape: _ORDER.index(shape.kind))
    return Background(settings, tuple(shapes), tuple(left_out))


@dataclass(frozen=True)
class _Surface:
    """A polygon to carry: the outline first, then the holes."""

    name: str
    ground: shapely.Polygon
    curves: tuple[Curve, ...]


def _surfaces(
    board: Board, features: Sequence[Feature], kind: Kind, left_out: list[LeftOut]
) -> Iterator[Shape]:
    """Carry all surfaces of a kind: those that touch become one; none lies over another."""
    lattice = board.lattice
    before = lattice.crossed.copy(), lattice.closed.copy(), lattice.cost.copy()
    surfaces = [_surface(board, name, part) for name, part in _joined(board, features)]
    small = [_is_small(surface.curves[0]) for surface in surfaces]
    wanted = [
        (k, curve)
        for k, surface in enumerate(surfaces)
        if not small[k]
        for curve in surface.curves
        if not _is_small(curve)
    ]
    slots = _slots(board, [curve for _, curve in wanted])
    routed = _all_routed(board, wanted, slots)
    for k, surface in enumerate(surfaces):
        shape: Shape | str = TOO_SMALL if small[k] else NO_WAY
        if routed.get(k):
            outlines = [Outline(arcs, closed=True) for arcs in routed[k]]
            shape = finished(board, kind, surface.name, surface.ground, outlines)
        if isinstance(shape, Shape):
            yield shape
        else:
            left_out.append(LeftOut(surface.name or f"a surface of {kind}", shape))
    lattice.crossed[:], lattice.closed[:], lattice.cost[:] = before


def _all_routed(
    board: Board, wanted: Sequence[tuple[int, Curve]], slots: Slots
) -> dict[int, list[Arcs]]:
    """Route the outlines of surfaces one after another, none across another.

    One that finds no way because of those before it is laid before them, and they anew. Gives per
    surface its outlines, in order; a surface of which one finds no way at all is not there.
    """
    lattice = board.lattice
    before = lattice.crossed.copy(), lattice.closed.copy(), lattice.cost.copy()
    order = sorted(range(len(wanted)), key=lambda i: (-len(wanted[i][1].word), i))
    hopeless: set[int] = set()
    for _ in range(2 * len(order) + 1):
        lattice.crossed[:], lattice.closed[:], lattice.cost[:] = before
        laid: dict[int, Arcs] = {}
        for at, i in enumerate(order):
            surface, curve = wanted[i]
            if surface in hopeless:
                continue
            arcs = _routed(board, curve, slots)
            if arcs is None:
                if laid:
                    order.insert(0, order.pop(at))
                else:
                    hopeless.add(surface)
                break
            occupy(board, arcs, closed=True)
            keep_off(board, arcs)
            laid[i] = arcs
        else:
            break
    found: dict[int, list[Arcs]] = defaultdict(list)
    for i in sorted(laid):
        found[wanted[i][0]].append(laid[i])
    whole = {k: sum(surface == k for surface, _ in wanted) for k in found}
    return {k: arcs for k, arcs in found.items() if len(arcs) == whole[k]}


def _routed(board: Board, curve: Curve, slots: Slots, into: Ends = (None, None)) -> Arcs | None:
    """Route a curve, without its slots if it must be, so that it nowhere meets itself."""
    for allowed in (slots, {}):
        arcs = route(board, curve, allowed, into)
        if arcs is not None:
            arcs = apart(board, curve, arcs)
        if arcs is not None:
            return arcs
    return None


def _joined(board: Board, features: Sequence[Feature]) -> list[tuple[str, shapely.Polygon]]:
    """Join surfaces that touch; each whole takes the name of its largest named part."""
    parts = [
        (feature.name, part)
        for feature in features
        for part in shapely.get_parts(_cut(board, feature.geometry))
        if part.geom_type == "Polygon"
    ]
    if not parts:
        return []
    whole = shapely.get_parts(shapely.union_all([part for _, part in parts]))
    found = []
    for polygon in whole:
        if polygon.geom_type != "Polygon":
            continue
        named = [(part.area, name) for name, part in parts if name and polygon.intersects(part)]
        found.append((max(named)[1] if named else "", polygon))
    return found


def _cut(board: Board, geometry: BaseGeometry) -> BaseGeometry:
    """Cut a shape in degrees off far beyond the network."""
    low, high = board.degrees
    beyond = _BEYOND * float((high - low).max())
    x0, y0 = low - beyond
    x1, y1 = high + beyond
    return shapely.make_valid(shapely.clip_by_rect(geometry, x0, y0, x1, y1))


def _surface(board: Board, name: str, polygon: shapely.Polygon) -> _Surface:
    rings = (polygon.exterior, *polygon.interiors)
    return _Surface(name, polygon, tuple(_curve(board, ring, closed=True) for ring in rings))


def _curve(board: Board, line: shapely.LineString, *, closed: bool) -> Curve:
    """Put a line on both planes."""
    scale = board.field.scale_mm_per_m
    ground = shapely.LineString(board.planes.projection(list(line.coords)))
    plain = shapely.simplify(ground, _CLOSE_MM / scale)
    if closed and len(plain.coords) < 4:
        plain = ground
    points = np.asarray(shapely.segmentize(plain, _STEP_MM / scale).coords)
    if closed:
        points[-1] = points[0]
    word = word_of(points, board.planes.pieces, closed=closed)
    return Curve(points, board.field(points), word, closed)


def _is_small(curve: Curve) -> bool:
    return not curve.word and shapely.Polygon(curve.image).area < _LEAST_MM2


def _slots(board: Board, curves: Sequence[Curve]) -> Slots:
    """Share every piece out among all that cross it, in the order of the ground."""
    met: Mapping[int, set[float]] = defaultdict(set)
    for curve in curves:
        for letter in curve.word:
            met[abs(letter.piece)].add(letter.share)
    slots: dict[tuple[int, float], tuple[float, float]] = {}
    for number, shares in sorted(met.items()):
        piece = board.planes.pieces[number - 1]
        length = float(np.hypot(*np.diff(piece.sheet, axis=0).T).sum())
        low = _FREE_MM / length if piece.ends[0] else 0.0
        high = 1.0 - _FREE_MM / length if piece.ends[1] else 1.0
        if low >= high:
            low, high = 0.0, 1.0
        step = (high - low) / len(shares)
        for i, share in enumerate(sorted(shares)):
            bounds = (low + i * step, low + (i + 1) * step)
            slots[number, share] = bounds if len(shares) > 1 else (0.0, 1.0)
    return slots


def _courses(
    board: Board, feature: Feature, shapes: Sequence[Shape], left_out: list[LeftOut]
) -> Iterator[Shape]:
    """Carry the lines of a feature, each part by itself; they may cross surfaces.

    Of a boundary that is given as a surface the outline is carried.
    """
    lines = feature.geometry.boundary if feature.kind == "boundary" else feature.geometry
    if "Line" not in lines.geom_type:
        lines = feature.geometry
    for part in shapely.get_parts(_cut(board, lines)):
        if part.geom_type != "LineString":
            continue
        closed = part.is_closed
        curve = _curve(board, part if closed else _run_on(board, part), closed=closed)
        small = float(np.hypot(*np.diff(curve.image, axis=0).T).sum()) < _LEAST_MM
        into = _into(part, feature.kind, shapes)
        arcs = None if small else _routed(board, curve, {}, into)
        shape: Shape | str = TOO_SMALL if small else NO_WAY
        if arcs is not None:
            shape = finished(board, feature.kind, feature.name, part, [Outline(arcs, closed)])
        if isinstance(shape, Shape):
            yield shape
        else:
            left_out.append(LeftOut(feature.name or feature.source, shape))


def _run_on(board: Board, line: shapely.LineString) -> shapely.LineString:
    """Lengthen a line that ends outside of the network: where the data end, a river does not."""
    low, high = board.degrees
    points = np.asarray(line.coords)[:, :2]
    size = _BEYOND * float((high - low).max())
    ends = []
    for point in (points[0], points[-1]):
        out = np.where(point < low, point - low, np.where(point > high, point - high, 0.0))
        away = float(np.hypot(*out))
        ends.append([point + size * out / away] if away > 0.0 else [])
    return shapely.LineString([*ends[0], *points, *ends[1]])


def _into(line: shapely.LineString, kind: Kind, shapes: Sequence[Shape]) -> Ends:
    """Give, per end of a line, the surface on the sheet in which it ends on the ground."""
    found: list[BaseGeometry | None] = []
    for end in (line.coords[0], line.coords[-1]):
        holders = [
            shape.drawn
            for shape in shapes
            if shape.surface and shape.kind == kind and shape.on_ground.contains(shapely.Point(end))
        ]
        found.append(
            shapely.affinity.scale(holders[0], 1.0, -1.0, origin=(0, 0)) if holders else None
        )
    return found[0], found[1]
