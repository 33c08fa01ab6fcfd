"""The sheet made ready for routing: stations closed, lines and names with a distance kept."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy import ndimage

from gtfs_schematic.background.field import Field
from gtfs_schematic.background.lattice import Lattice, blank, faces, lay
from gtfs_schematic.background.planes import Piece, Planes, planes_of, upright
from gtfs_schematic.background.search import NOWHERE, Door, Found, Starts, sweep
from gtfs_schematic.labels.model import LabelledLayout

Floats = NDArray[np.float64]
Window = tuple[int, int, int, int]

_PITCH_MM = 0.75
_MOST_NODES = 2_000_000
_COMMON_MM = 500.0
"""Side of a square field from which on bends cost more, in proportion."""
EDGE_MM = 10.0
"""So far beyond the field's edge shapes are carried on, to be cut off there."""
_HEART = 0.55
"""No shore enters this share of a marker; the rest hides it, where there is no other way."""
_STATION_AIR_MM = 0.6
_UNDER_MARKER = 8.0
"""What a millimetre of way so near to a marker costs beside itself."""
_AIR_MM = 3.0
"""Nearer than this to a line or marker, a shore costs more."""
_NEAR = 1.4
_ON_NAME = 0.7
"""What a millimetre of way beside a line, or under a name, costs beside itself."""
_AWAY = 0.03
_MOST_AWAY = 40.0
"""Per square millimetre of distance from the true course, and at most."""


@dataclass
class Board:
    """Where shapes are routed; `box` is the field in millimetres, y up: low and high corner."""

    planes: Planes
    field: Field
    lattice: Lattice
    labels: NDArray[np.int32]
    """Per node the number of its face; bridges do not part faces here."""
    box: tuple[Floats, Floats]
    radii: tuple[float, ...]
    """Per station that of its marker, millimetres."""
    degrees: tuple[Floats, Floats]
    """The network's box on the ground: west and south, east and north."""


def board_of(labelled: LabelledLayout) -> Board:
    """Lay the network of a sheet on a lattice over its frame."""
    bundled = labelled.bundled
    sheet = bundled.layout.sheet
    low = np.array([sheet.left_mm, -sheet.bottom_mm])
    high = np.array([sheet.right_mm, -sheet.top_mm])
    planes = planes_of(bundled)
    area = float(np.prod(high - low + 2.0 * EDGE_MM))
    pitch = max(_PITCH_MM, (area / _MOST_NODES) ** 0.5)
    lattice = blank(low - EDGE_MM, high + EDGE_MM, pitch)
    lattice.calm = max(1.0, float(np.prod(high - low)) ** 0.5 / _COMMON_MM)
    for number, piece in enumerate(planes.pieces, start=1):
        lay(lattice, number, piece.sheet, piece.half_mm)
    lattice.cost[:] = _NEAR * np.clip(1.0 - lattice.clear / _AIR_MM, 0.0, 1.0)
    radii = _radii(labelled, planes)
    close_stations(lattice, planes, radii, 0.0)
    for label in labelled.labels.values():
        if label.outline_mm:
            nodes, inside = _within(lattice, upright(label.outline_mm))
            lattice.cost[nodes[inside]] += _ON_NAME
    stations = bundled.layout.network.stations
    degrees = np.array([(station.lon, station.lat) for station in stations])
    return Board(
        planes,
        Field(planes),
        lattice,
        faces(lattice),
        (low, high),
        radii,
        (degrees.min(axis=0), degrees.max(axis=0)),
    )


def _radii(labelled: LabelledLayout, planes: Planes) -> tuple[float, ...]:
    """Give the outer radius of every station's marker round its points."""
    settings = labelled.settings
    station = labelled.bundled.layout.network.station
    large = [station[key].kind in ("interchange", "terminus") for key in planes.stations]
    both = (settings.marker_radius_mm, settings.interchange_radius_mm)
    return tuple(both[each] for each in large)


def close_stations(
    lattice: Lattice, planes: Planes, radii: tuple[float, ...], half_mm: float
) -> None:
    """Close the nodes on markers, and make those beside them cost more.

    `half_mm` is half the width of what will be drawn along the curves.
    """
    for points, radius in zip(planes.markers, radii, strict=True):
        body = shapely.LineString(points) if len(points) > 1 else shapely.Point(points[0])
        reach = radius + _STATION_AIR_MM + _AIR_MM + half_mm
        nodes, away = _distances(lattice, body, reach)
        away -= radius
        lattice.closed[nodes[away < (_HEART - 1.0) * radius]] = True
        near = _NEAR * np.clip(1.0 - (away - half_mm) / _AIR_MM, 0.0, 1.0)
        near[away < _STATION_AIR_MM + half_mm] = _UNDER_MARKER
        lattice.cost[nodes] = np.maximum(lattice.cost[nodes], near)


def _distances(
    lattice: Lattice, body: shapely.Geometry, reach: float
) -> tuple[NDArray[np.int64], Floats]:
    x0, y0, x1, y1 = body.bounds
    nodes = nodes_of(
        lattice, window_of(lattice, np.array([[x0 - reach, y0 - reach], [x1 + reach, y1 + reach]]))
    )
    return nodes, np.asarray(shapely.distance(body, shapely.points(lattice.at(nodes))))


def _within(lattice: Lattice, corners: Floats) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    nodes = nodes_of(lattice, window_of(lattice, corners))
    places = lattice.at(nodes)
    polygon = shapely.Polygon(corners)
    return nodes, np.asarray(shapely.contains_xy(polygon, places[:, 0], places[:, 1]))


def window_of(lattice: Lattice, points: Floats, margin_mm: float = 0.0) -> Window:
    """Give the window of nodes round some places."""
    steps = lattice.steps(points)
    low = np.floor(steps.min(axis=0) - margin_mm / lattice.pitch).astype(int).tolist()
    high = np.ceil(steps.max(axis=0) + margin_mm / lattice.pitch).astype(int).tolist()
    w, h = lattice.width - 1, lattice.height - 1
    x0, y0 = min(max(low[0], 0), w), min(max(low[1], 0), h)
    return x0, y0, min(max(high[0], x0), w), min(max(high[1], y0), h)


def nodes_of(lattice: Lattice, window: Window) -> NDArray[np.int64]:
    """Give the nodes of a window in rows."""
    x0, y0, x1, y1 = window
    rows = np.arange(y0, y1 + 1, dtype=np.int64)[:, None] * lattice.width
    return np.asarray((rows + np.arange(x0, x1 + 1, dtype=np.int64)).ravel())


def explore(
    board: Board,
    window: Window,
    course: Floats,
    starts: Starts,
    door: Door,
    *,
    until: NDArray[np.int64] = NOWHERE,
) -> Found:
    """Search one face, drawn to a course on the sheet (millimetres, y up, close points)."""
    lattice = board.lattice
    x0, y0, x1, y1 = window
    shape = (y1 - y0 + 1, x1 - x0 + 1)
    steps = np.rint(lattice.steps(course)).astype(np.int64) - (x0, y0)
    off = np.ones(shape, dtype=np.bool_)
    off[np.clip(steps[:, 1], 0, shape[0] - 1), np.clip(steps[:, 0], 0, shape[1] - 1)] = False
    away = ndimage.distance_transform_edt(off) * lattice.pitch
    drawn = np.minimum(_AWAY * (away / lattice.calm) ** 2, _MOST_AWAY).ravel()
    cost = drawn + lattice.cost[nodes_of(lattice, window)]
    return sweep(lattice, cost.astype(np.float64), window, starts, door, until=until)


def clamped(board: Board, points: Floats) -> Floats:
    """Bring places that lie outside of the lattice to its edge."""
    low, high = (side + s * (EDGE_MM - 2.0) for side, s in zip(board.box, (-1, 1), strict=True))
    return np.clip(points, low, high)


def numbered(pieces: list[Piece]) -> Iterator[tuple[int, Piece]]:
    """Give pieces with their numbers."""
    return enumerate(pieces, start=1)
