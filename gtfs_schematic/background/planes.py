"""One network on two planes: every piece of a link on the ground and the same on the sheet.

On the ground, links run straight between their stations. Where two cross, both are cut, here as on
the sheet, so that pieces meet at their ends only and what lies between them, a face, is the same on
both planes: the layout keeps the ground's topology.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.ops import substring

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.ground import Projection
from gtfs_schematic.layout.model import Layout

Floats = NDArray[np.float64]
_CLEAR = 0.02
"""Cuts keep this share of a link from its ends: what crosses so near to a station only touches."""


@dataclass(frozen=True)
class Piece:
    """A link or walk between its ends and crossings; both courses run the same way."""

    owner: str
    ground: Floats
    """Metres, y north, shape (2, 2)."""
    sheet: Floats
    """Millimetres, y up, shape (m, 2)."""
    half_mm: float
    """Half the width of what is drawn along it."""
    ends: tuple[str, str] = ("", "")
    """Ids of the stations at its ends; "" for a crossing."""


@dataclass
class Planes:
    """Pieces and stations on both planes. Piece i has the number i + 1; bridges come last."""

    projection: Projection
    stations: tuple[str, ...]
    ground: Floats
    """Per station metres, y north, shape (n, 2)."""
    sheet: Floats
    """Per station millimetres, y up, shape (n, 2)."""
    markers: list[Floats]
    """Per station the points that its marker covers, millimetres, y up."""
    pieces: list[Piece] = field(default_factory=list)


def planes_of(bundled: BundledLayout) -> Planes:
    """Put the network of a layout on both planes."""
    layout = bundled.layout
    stations = layout.network.stations
    projection = Projection([(s.lon, s.lat) for s in stations])
    ground = projection([(s.lon, s.lat) for s in stations])
    markers = [
        upright(bundled.spans[s.id].points_mm)
        if s.id in bundled.spans and bundled.spans[s.id].points_mm
        else upright([layout.positions[s.id]])
        for s in stations
    ]
    planes = Planes(
        projection,
        tuple(s.id for s in stations),
        ground,
        upright([layout.positions[s.id] for s in stations]),
        markers,
    )
    _add_pieces(planes, bundled)
    return planes


def upright(points: object) -> Floats:
    """Give points of the sheet with y up, shape (n, 2)."""
    return np.asarray(points, dtype=np.float64).reshape(-1, 2) * (1.0, -1.0)


def _add_pieces(planes: Planes, bundled: BundledLayout) -> None:
    layout = bundled.layout
    index = {key: i for i, key in enumerate(planes.stations)}
    width, gap = bundled.settings.line_width_mm, bundled.settings.line_gap_mm
    crossed = _crossed(layout)
    links = [(k.id, k.start, k.end, len(k.lines), layout.paths) for k in layout.network.links]
    walks = [(w.id, w.start, w.end, 0, layout.walk_paths) for w in layout.network.walks]
    ends = {owner: (index[a], index[b]) for owner, a, b, _, _ in (*links, *walks)}
    segments = {owner: planes.ground[list(pair)] for owner, pair in ends.items()}
    for owner, start, end, lines, paths in (*links, *walks):
        if owner not in paths:
            continue
        path = shapely.LineString(upright(paths[owner]))
        cuts = sorted(
            (float(path.project(shapely.Point(at[0], -at[1]))), other)
            for other, at in crossed[owner]
        )
        here = segments[owner]
        along = sorted(_met_at(here, segments[other]) for _, other in cuts)
        bounds = [0.0, *along, 1.0]
        stops = [0.0, *(at for at, _ in cuts), path.length]
        half = ((lines or 1) * (width + gap) - gap) / 2.0 + abs(bundled.asides.get(owner, 0.0))
        for i in range(len(stops) - 1):
            planes.pieces.append(
                Piece(
                    owner,
                    np.array([here[0] + t * (here[1] - here[0]) for t in bounds[i : i + 2]]),
                    _part(path, stops[i], stops[i + 1]),
                    half,
                    (start if i == 0 else "", end if i == len(stops) - 2 else ""),
                )
            )


def _crossed(layout: Layout) -> Mapping[str, list[tuple[str, Point]]]:
    """Give per link or walk what it crosses, and where on the sheet."""
    found: dict[str, list[tuple[str, Point]]] = defaultdict(list)
    for crossing in layout.crossings:
        found[crossing.first].append((crossing.second, crossing.at_mm))
        found[crossing.second].append((crossing.first, crossing.at_mm))
    return found


def _met_at(here: Floats, other: Floats) -> float:
    """Give how far along a segment another crosses it, as a share, never at its ends."""
    u, v, w = here[1] - here[0], other[1] - other[0], other[0] - here[0]
    turn = u[0] * v[1] - u[1] * v[0]
    share = (w[0] * v[1] - w[1] * v[0]) / turn if turn else 0.5
    return float(min(max(share, _CLEAR), 1.0 - _CLEAR))


def _part(path: shapely.LineString, start: float, end: float) -> Floats:
    return np.asarray(substring(path, start, end).coords, dtype=np.float64)
