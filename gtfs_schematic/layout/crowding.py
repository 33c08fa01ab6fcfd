"""Names as boxes beside their stations, which lines and other names are to keep clear of.

Where a box stands beside its station is fixed, so that keeping it clear of a segment, or of another
box, along one of the eight axes is linear in the places of the nodes.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.layout.model import NameRoom
from gtfs_schematic.layout.restore import stops_on
from gtfs_schematic.layout.rows import Rows
from gtfs_schematic.layout.skeleton import STEP, Skeleton
from gtfs_schematic.layout.snap import UNITS_PER_MM

_NORMALS = np.round(STEP / np.hypot(STEP[:, :1], STEP[:, 1:]), 12)
_REACH_MM = 8.0
"""What is further than this from a name is not in its way."""
_ASKED = 80.0
"""Price of a millimetre that a name without a place lacks."""
_STANDING = (10.0, 40.0)
"""The same of one that stands: the more, the fewer are without a place."""
_MANY = 300.0
"""Names without a place times the price of one that stands, between these."""
_BESIDE_MM = 0.01
_MARKER_MM = 2.0
_AIR_SHARE = 0.7
_MOST_AIR_MM = 5.0
"""A name keeps from other stations so much of what it keeps from its own, markers apart."""

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Crowding:
    """Distances to keep: n · Σ share · point ≥ need, as far as the price of lacking makes them.

    All arrays have one row per distance.
    """

    nodes: NDArray[np.int64]
    """Shape (r, 4): two on the name's side, two on that of what it keeps clear of."""
    shares: Floats
    """Shape (r, 4): of each node's place; negative on the other side."""
    normals: Floats
    """Shape (r, 2), unit vectors."""
    need: Floats
    price: Floats

    def keep(
        self,
        most: Rows,
        columns: tuple[NDArray[np.int64], NDArray[np.int64]],
        lack: NDArray[np.int64],
    ) -> None:
        """Add the rows of a linear programme; `columns` are those of x and y per node."""
        terms = [
            (columns[axis][self.nodes[:, i]], -self.normals[:, axis] * self.shares[:, i])
            for axis in (0, 1)
            for i in range(4)
        ]
        most.add([*terms, (lack, -np.ones(len(lack)))], -self.need)


@dataclass(frozen=True)
class _Boxes:
    """Where the names stand: the station between two nodes, and the outline as seen from it."""

    nodes: NDArray[np.int64]
    """Shape (b, 2)."""
    shares: Floats
    """Shape (b, 2)."""
    at: Floats
    """Places of the stations now, shape (b, 2)."""
    outlines: list[Floats]
    """Corners as seen from the station, y north."""
    low: Floats
    """Least extent of each outline along each of the eight axes, shape (b, 8)."""
    price: Floats


def crowding(
    skeleton: Skeleton,
    names: Sequence[NameRoom],
    part_wants: Sequence[Floats],
    half_width: Floats,
    clear_mm: float,
) -> Crowding:
    """State what names keep clear of, by the present places in millimetres.

    Parameters
    ----------
    skeleton
        The drawing, settled once.
    names
        The boxes.
    part_wants
        As `restore` takes them: they say where smoothed stations stand.
    half_width
        Half the width of what is drawn along each segment, markers included, shape (m,).
    clear_mm
        What is kept between a name and anything else.
    """
    boxes = _boxes(skeleton, names, part_wants)
    rows = [
        *_against_segments(skeleton, boxes, half_width + clear_mm),
        *_against_names(boxes, clear_mm),
        *_against_stations(skeleton, boxes, part_wants, clear_mm),
    ]
    nodes = np.array([row[0] for row in rows], dtype=np.int64).reshape(-1, 4)
    shares = np.array([row[1] for row in rows]).reshape(-1, 4)
    axis = np.array([row[2] for row in rows], dtype=np.int64)
    return Crowding(
        nodes,
        shares,
        _NORMALS[axis],
        np.round([row[3] for row in rows], 6),
        np.array([row[4] for row in rows]),
    )


_Row = tuple[list[int], list[float], int, float, float]
"""Nodes, shares, axis, need and price."""


def _boxes(skeleton: Skeleton, names: Sequence[NameRoom], part_wants: Sequence[Floats]) -> _Boxes:
    """Find the stations of the names on the drawing."""
    stands = _stands(skeleton, part_wants)
    known = [name for name in names if name.station_id in stands]
    nodes = np.array([stands[name.station_id][0] for name in known]).reshape(-1, 2)
    shares = np.array([stands[name.station_id][1] for name in known]).reshape(-1, 2)
    outlines = [np.array(name.outline_mm) * [1.0, -1.0] for name in known]
    low = np.array([(outline @ _NORMALS.T).min(axis=0) for outline in outlines]).reshape(-1, 8)
    at = np.einsum("bi,bij->bj", shares, skeleton.points[nodes])
    lost = sum(not name.stands for name in known)
    standing = float(np.clip(_MANY / max(lost, 1), *_STANDING))
    price = np.array([standing if name.stands else _ASKED for name in known])
    return _Boxes(nodes, shares, at, outlines, low, price)


def _stands(
    skeleton: Skeleton, part_wants: Sequence[Floats]
) -> Mapping[str, tuple[tuple[int, int], tuple[float, float]]]:
    """Give per station the two nodes between which it stands, and its share of each."""
    graph = skeleton.graph
    found: dict[str, tuple[tuple[int, int], tuple[float, float]]] = {
        station: ((v, v), (1.0, 0.0))
        for v, station in enumerate(graph.station_of)
        if station is not None and station not in graph.junctions
    }
    for p, piece in enumerate(graph.pieces):
        units = np.rint(skeleton.points[skeleton.polyline(p)] * UNITS_PER_MM).astype(np.int64)
        corners = [(int(x), int(y)) for x, y in units]
        stops = stops_on(corners, part_wants[p])
        for station, (place, k) in zip(piece.stations, stops, strict=True):
            a, b = skeleton.segments[skeleton.courses[p][k]]
            whole = math.dist(corners[k], corners[k + 1])
            share = math.dist(corners[k], place) / max(whole, 1e-9)
            found[station] = ((int(a), int(b)), (round(1.0 - share, 9), round(share, 9)))
    return found


def _against_segments(skeleton: Skeleton, boxes: _Boxes, apart: Floats) -> list[_Row]:
    """Keep names clear of segments on which their stations do not stand.

    The name and its station stay on one side of the segment.
    """
    ends = skeleton.points[skeleton.segments]
    tree = shapely.STRtree(shapely.linestrings(ends))
    areas = shapely.polygons([o + at for o, at in zip(boxes.outlines, boxes.at, strict=True)])
    pairs = tree.query(areas, predicate="dwithin", distance=_REACH_MM).T
    pairs = pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))]
    along = np.einsum("mij,dj->mdi", ends, _NORMALS)
    high, own = along.max(axis=2), boxes.at @ _NORMALS.T
    beside: dict[int, set[int]] = defaultdict(set)
    for u, v in skeleton.segments.tolist():
        beside[u].add(v)
        beside[v].add(u)
    rows: list[_Row] = []
    for b, k in pairs.tolist():
        stand = set(boxes.nodes[b].tolist())
        if stand & set(skeleton.segments[k].tolist()) and (
            len(stand) == 1 or stand == set(skeleton.segments[k].tolist())
        ):
            continue
        a, c = ends[k] - boxes.at[b]
        if abs(a[0] * c[1] - a[1] * c[0]) < _BESIDE_MM * math.dist(a, c):
            continue  # it runs on from the station, or towards it: nothing can move it aside
        marker = own[b] - high[k]
        facing = skeleton.segments[k][np.argmax(np.round(along[k], 6), axis=1)]
        # A node on a line that leaves the station stays level with it: that axis gives no room.
        gaps, near = marker + boxes.low[b], beside[int(boxes.nodes[b, 0])] | stand
        fixed = (np.abs(marker) < _BESIDE_MM) & np.isin(facing, sorted(near))
        usable = (marker > -_BESIDE_MM) & (~fixed | (gaps >= apart[k]))
        gaps = np.where(usable, gaps, -np.inf)
        axis = int(np.argmax(np.round(gaps, 9)))
        if not np.isfinite(gaps[axis]):
            continue
        far = facing[axis]
        nodes = [*boxes.nodes[b].tolist(), int(far), int(far)]
        shares = [*boxes.shares[b].tolist(), -1.0, 0.0]
        rows.append((nodes, shares, axis, apart[k] - boxes.low[b, axis], float(boxes.price[b])))
    return rows


def _against_stations(
    skeleton: Skeleton, boxes: _Boxes, part_wants: Sequence[Floats], clear_mm: float
) -> list[_Row]:
    """Keep names that lie off their own station from others, so that they do not seem theirs."""
    stands = _stands(skeleton, part_wants)
    keys = sorted(stands)
    nodes = np.array([stands[key][0] for key in keys])
    shares = np.array([stands[key][1] for key in keys])
    places = np.einsum("si,sij->sj", shares, skeleton.points[nodes])
    points = shapely.points(places)
    tree = shapely.STRtree(points)
    back = (np.arange(8) + 4) % 8
    rows: list[_Row] = []
    for b, outline in enumerate(boxes.outlines):
        own = float(shapely.distance(shapely.polygons(outline), shapely.Point(0.0, 0.0)))
        air = min(_AIR_SHARE * max(0.0, own - _MARKER_MM), _MOST_AIR_MM)
        apart = _MARKER_MM + max(clear_mm, air)
        area = shapely.polygons(outline + boxes.at[b])
        for s in sorted(tree.query(area, "dwithin", distance=apart + 2.0).tolist()):
            same = np.abs(places[s] - boxes.at[b]).max() < _BESIDE_MM
            if same:
                continue
            gaps = boxes.at[b] @ _NORMALS.T + boxes.low[b] + places[s] @ _NORMALS[back].T
            axis = int(np.argmax(np.round(gaps, 9)))
            both = [*boxes.nodes[b].tolist(), *nodes[s].tolist()]
            weights = [*boxes.shares[b].tolist(), *(-shares[s]).tolist()]
            need = apart - float(boxes.low[b, axis])
            rows.append((both, weights, axis, need, float(boxes.price[b])))
    return rows


def _against_names(boxes: _Boxes, clear_mm: float) -> list[_Row]:
    """Keep names clear of each other."""
    areas = shapely.polygons([o + at for o, at in zip(boxes.outlines, boxes.at, strict=True)])
    pairs = shapely.STRtree(areas).query(areas, predicate="dwithin", distance=_REACH_MM).T
    pairs = pairs[pairs[:, 0] < pairs[:, 1]]
    pairs = pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))]
    own = boxes.at @ _NORMALS.T
    back = (np.arange(8) + 4) % 8
    rows: list[_Row] = []
    for a, b in pairs.tolist():
        # The greatest extent along an axis is the least along the opposite one, negated.
        reach = boxes.low[a] + boxes.low[b][back]
        gaps = own[a] - own[b] + reach
        axis = int(np.argmax(np.round(gaps, 9)))
        nodes = [*boxes.nodes[a].tolist(), *boxes.nodes[b].tolist()]
        shares = [*boxes.shares[a].tolist(), *(-boxes.shares[b]).tolist()]
        price = float(max(boxes.price[a], boxes.price[b]))
        rows.append((nodes, shares, axis, clear_mm - reach[axis], price))
    return rows
