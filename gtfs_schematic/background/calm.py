"""Take slivers off a surface: strips too thin to read, where no station or line hangs on them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.background.board import Board

_THIN_MM = 2.8
"""What is thinner than this is a sliver."""
_SAME_MM = 1e-6
_TOUCH_MM = 0.05


def calmed(board: Board, surface: shapely.Polygon) -> BaseGeometry:
    """Give a surface (millimetres, y up) without thin parts, and without thin gaps.

    An opening and a closing of mathematical morphology (Serra 1982), piece by piece: a piece that
    holds a station, meets a line, or joins two places of the rest, as a strait does, stays as it
    is, so that crossings, sides and ways by water or land stay, too. Corners are mitred, so that
    all sides keep their directions.
    """
    walls = shapely.STRtree([shapely.LineString(piece.sheet) for piece in board.planes.pieces])

    def loose(piece: BaseGeometry, rest: BaseGeometry) -> bool:
        if len(walls.query(piece, predicate="intersects")):
            return False
        touching = shapely.get_parts(piece.buffer(_TOUCH_MM).intersection(rest))
        return bool(sum(part.area > 0.0 for part in touching) <= 1)

    opened = _resized(_resized(surface, -_THIN_MM / 2.0), _THIN_MM / 2.0)
    thin = _pieces(surface.difference(opened), opened, loose)
    left = shapely.difference(surface, shapely.union_all(thin)) if thin else surface
    closed = _resized(_resized(left, _THIN_MM / 2.0), -_THIN_MM / 2.0)
    around = left.envelope.buffer(2.0 * _THIN_MM).difference(closed)
    gaps = _pieces(closed.difference(left), around, loose)
    whole = shapely.union_all([left, *gaps]) if gaps else left
    return _clean(whole)


def _resized(surface: BaseGeometry, by_mm: float) -> BaseGeometry:
    return surface.buffer(by_mm, join_style="mitre", mitre_limit=3.0)


def _pieces(
    parts: BaseGeometry,
    rest: BaseGeometry,
    loose: Callable[[BaseGeometry, BaseGeometry], bool],
) -> list[BaseGeometry]:
    """Give the parts that may go, grown by a trace so that nothing of them is left behind."""
    return [
        _resized(part, _SAME_MM)
        for part in shapely.get_parts(parts)
        if part.geom_type == "Polygon" and part.area > _SAME_MM and loose(part, rest)
    ]


def _clean(whole: BaseGeometry) -> BaseGeometry:
    """Bring corners to whole thousandths, and drop those where nothing turns."""
    rounded = shapely.transform(whole, lambda places: np.round(places, 3))
    return shapely.make_valid(shapely.simplify(rounded, 0.002))
