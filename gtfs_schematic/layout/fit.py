"""What lengths a drawing should have, and which sheet it fits."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.asked import Relative
from gtfs_schematic.layout.crowding import Crowding, crowding
from gtfs_schematic.layout.drift_limits import limits_of
from gtfs_schematic.layout.model import (
    Clearances,
    LayoutSettings,
    NameRoom,
    SheetFrame,
)
from gtfs_schematic.layout.plane import Piece, PlaneGraph
from gtfs_schematic.layout.settle import Wants
from gtfs_schematic.layout.skeleton import Skeleton
from gtfs_schematic.network.model import Network

_WALK_SHARE = 0.75
"""Length of a walk in shares of a station spacing: short, so that it reads as one place."""

_AIR_MM = 0.2
_NAME_CLEAR_MM = 0.8
"""What names are kept clear of lines and each other."""
_BROKEN_SHARE = 0.7
"""Share of its width that a name takes when it may be broken into rows."""
_WIDEST_ROOM_MM = 25.0

_CORNER = {45: 0.85, 90: 2.0}
"""By the angle of corners the length that two of one radius take of the segment between them:
2 tan(22.5°) and 2 tan(45°) of that radius."""


@dataclass(frozen=True)
class Sizes:
    """Everything that lengths depend on beside the drawing itself."""

    settings: LayoutSettings
    clearances: Clearances
    anchors: NDArray[np.float64]
    """Anchors of the vertices in station spacings, y north, shape (n, 2)."""
    link_least: Mapping[str, float]
    """Least length of each link and walk, millimetres."""
    pinned: Mapping[int, Point] = field(default_factory=dict)
    """Per pinned vertex its place, millimetres from the frame's lower left corner, y north."""
    relative: tuple[Relative, ...] = ()
    """Places that vertices keep as seen from others."""
    names: tuple[NameRoom, ...] = ()
    """Room for names; only once the drawing has been settled."""


def wants_of(
    skeleton: Skeleton,
    sizes: Sizes,
    scale_mm: float,
    box: tuple[float, float] | None,
    grown: float = 1.0,
) -> Wants:
    """Say what the lengths should be when a station spacing is `scale_mm` on the sheet.

    Without a `box` (width and height, millimetres) the least size is asked for instead: that is
    how the sheet is chosen. With one, the skeleton's points are millimetres, and the drawing is to
    become `grown` times as large.
    """
    tight = box is None
    clearances = sizes.clearances
    graph = skeleton.graph
    walk = np.array([piece.is_walk for piece in graph.pieces], dtype=bool)
    least = np.array([_part_leasts(graph, piece, sizes).sum() for piece in graph.pieces])
    lines = np.array([max(1, len(piece.lines)) for piece in graph.pieces])
    least = np.maximum(least, _between_ends(graph, clearances))
    fidelity = sizes.settings.fidelity
    even = 1.0 if tight else 1.0 - 0.95 * fidelity**2
    goal = _spans(skeleton, fidelity) * scale_mm
    goal[walk] = np.maximum(least[walk], _WALK_SHARE * scale_mm)
    spans = np.array([piece.spans for piece in graph.pieces])
    owner = skeleton.piece_of
    lines = lines[owner]
    half = np.array([clearances.half_width_mm(len(piece.lines)) for piece in graph.pieces])[owner]
    jog = skeleton.jogs
    shortest: NDArray[np.float64] = np.where(jog, 0.0, _corners(sizes, half))
    weight = 1.0 / np.sqrt(np.maximum(spans, 0.3))
    return Wants(
        least=np.round(shortest, 6),
        piece_least=np.round(least, 6),
        piece_goal=np.round(least if tight else np.maximum(goal, least), 6),
        piece_weight=np.where(walk, 2.0, 1.0) * weight * even,
        anchors=_anchors(skeleton, sizes, scale_mm, box, grown),
        anchor_weight=0.02 if tight else 0.05 + 3.0 * fidelity**3,
        half_width=half,
        clear=2.0 * clearances.line_gap_mm + 0.5,
        room=np.zeros((len(owner), 8)) if tight else _label_room(skeleton, clearances),
        pinned=sizes.pinned,
        relative=sizes.relative,
        limits=limits_of(graph, sizes.settings),
        jogs=np.where(jog, 3.0 * lines, 0.0),
        spread=2.0 if tight else 0.0,
        crowding=_crowding(skeleton, sizes, half),
    )


def _anchors(
    skeleton: Skeleton,
    sizes: Sizes,
    scale_mm: float,
    box: tuple[float, float] | None,
    grown: float,
) -> NDArray[np.float64]:
    """Lay the anchors over the drawing that is to grow; to scale where there is none yet.

    Only how stations stand to each other is true or not, so the anchors are spread as far as the
    drawing is on the whole, about the middle of the box, or of the pins.
    """
    if box is None:
        return np.asarray((sizes.anchors - sizes.anchors.min(axis=0)) * scale_mm)
    anchors = sizes.anchors - sizes.anchors.mean(axis=0)
    places = skeleton.points[: len(anchors)]
    middle = places.mean(axis=0)
    spread = np.sqrt(((places - middle) ** 2).sum() / max(float((anchors**2).sum()), 1e-9))
    laid = anchors * float(spread) * grown
    if sizes.pinned:
        laid += np.mean([sizes.pinned[v] - laid[v] for v in sorted(sizes.pinned)], axis=0)
    else:
        laid += (np.asarray(box) - laid.min(axis=0) - laid.max(axis=0)) / 2.0
    return np.asarray(np.round(laid, 6))


def _corners(sizes: Sizes, half: NDArray[np.float64]) -> NDArray[np.float64]:
    """Least length of a segment between two corners of bundles so wide to each side."""
    return _CORNER[sizes.settings.angles] * (sizes.clearances.marker_mm + half)


def pins_in_frame(
    graph: PlaneGraph, settings: LayoutSettings, frame: SheetFrame
) -> dict[int, Point]:
    """Give the pinned vertices' places from the frame's lower left corner, y north, millimetres.

    Raises
    ------
    LayoutError
        If a pin lies outside the frame.
    """
    pinned: dict[int, Point] = {}
    for v, station in enumerate(graph.station_of):
        if station is None or station not in settings.pins:
            continue
        x, y = settings.pins[station]
        if not (frame.left_mm <= x <= frame.right_mm and frame.top_mm <= y <= frame.bottom_mm):
            raise LayoutError(
                f"The pin of station {station} at ({x:g}, {y:g}) mm lies outside the frame of the "
                f"sheet: x {frame.left_mm:g} to {frame.right_mm:g} mm, y {frame.top_mm:g} to "
                f"{frame.bottom_mm:g} mm. Move the pin or choose another sheet."
            )
        pinned[v] = (round(x - frame.left_mm, 2), round(frame.bottom_mm - y, 2))
    return pinned


def _crowding(skeleton: Skeleton, sizes: Sizes, half: NDArray[np.float64]) -> Crowding | None:
    """Say what names keep clear of; markers reach over the outer lines of a bundle."""
    if not sizes.names:
        return None
    clearances = sizes.clearances
    over = (clearances.marker_mm - clearances.line_width_mm) / 2.0
    wants = part_wants(skeleton.graph, sizes)
    return crowding(skeleton, sizes.names, wants, half + over, _NAME_CLEAR_MM)


def _label_room(skeleton: Skeleton, clearances: Clearances) -> NDArray[np.float64]:
    """Say how much room names want beside each segment along each of the eight axes, millimetres.

    Names are level: sideways they take their width, less what a break into rows saves; up and
    down their height; aslant a part of both. Shape (m, 8).
    """
    graph = skeleton.graph
    height = clearances.label_height_mm
    widths = np.zeros(len(graph.pieces))
    for p, piece in enumerate(graph.pieces):
        names = [*piece.stations, *(graph.station_of[v] for v in piece.ends)]
        known = [clearances.label_width_mm.get(name or "", 0.0) for name in names]
        widths[p] = min(_BROKEN_SHARE * float(np.median(known)), _WIDEST_ROOM_MM)
    width = widths[skeleton.piece_of]
    aslant = (width + height) / math.sqrt(2.0) / 2.0
    upright = np.full(len(width), 1.5 * height)
    return np.stack([width, aslant, upright, aslant] * 2, axis=1)


def link_least(network: Network, clearances: Clearances) -> dict[str, float]:
    """Give every link and walk its least length: the spacing, or a share of it; millimetres."""
    least = {link.id: clearances.spacing_mm for link in network.links}
    least |= {walk.id: _WALK_SHARE * clearances.spacing_mm for walk in network.walks}
    return least


def _between_ends(graph: PlaneGraph, clearances: Clearances) -> NDArray[np.float64]:
    """Least length of each piece for what stands at its ends: a marker, or another bundle."""
    pitch = clearances.line_width_mm + clearances.line_gap_mm
    ends = np.zeros(len(graph.pieces))
    for p, piece in enumerate(graph.pieces):
        for i, v in enumerate(piece.ends):
            if graph.station_of[v] is not None and graph.station_of[v] not in graph.junctions:
                ends[p] += clearances.marker_mm / 2.0
            else:
                crossed = max(
                    len(graph.pieces[end // 2].lines)
                    for end in graph.rotation[v]
                    if end != 2 * p + i
                )
                ends[p] += crossed * pitch / 2.0
    return ends + pitch


def part_wants(graph: PlaneGraph, sizes: Sizes) -> tuple[NDArray[np.float64], ...]:
    """Say per piece what share of it each of its parts should get, and no less than what.

    Stations of a corridor stand evenly but for high fidelity: its third power blends towards
    true lengths, so that unevenness shows only where it is asked for.

    Returns
    -------
    tuple
        Per piece an array of shape (parts, 2): wanted share, and least length in millimetres.
    """
    a, b = graph.segments.T
    true = np.hypot(*(graph.points[a] - graph.points[b]).T)
    power = sizes.settings.fidelity**3
    wants = []
    start = 0
    for piece in graph.pieces:
        stop = start + len(piece.parts)
        shares = np.array([part.share for part in piece.parts])
        least = _part_leasts(graph, piece, sizes)
        run = true[start:stop]
        run = run / max(float(run.sum()), 1e-9)
        blend = run**power * (shares / shares.sum()) ** (1.0 - power)
        wants.append(np.column_stack([blend, least]))
        start = stop
    return tuple(wants)


def _part_leasts(graph: PlaneGraph, piece: Piece, sizes: Sizes) -> NDArray[np.float64]:
    """Least length of each part of a piece, millimetres.

    Beside a crossing it is so long that the markers of two stations next to it do not touch where
    the lines cross at 45 degrees; beside a junction, that a marker stays clear of the bundle there.
    """
    least = np.array([part.share * sizes.link_least[part.owner] for part in piece.parts])
    apart = sizes.clearances.marker_mm / (2.0 * math.sin(math.pi / 8)) + _AIR_MM
    for end, part in ((0, 0), (1, -1)):
        if graph.station_of[piece.ends[end]] is None:
            least[part] = max(least[part], apart)
        elif graph.station_of[piece.ends[end]] in graph.junctions:
            around = graph.rotation[piece.ends[end]]
            widest = max(len(graph.pieces[each // 2].lines) for each in around)
            half = sizes.clearances.half_width_mm(widest)
            least[part] = max(least[part], sizes.clearances.marker_mm + half)
    return least


def _spans(skeleton: Skeleton, fidelity: float) -> NDArray[np.float64]:
    """Length of each piece in spacings: a blend of true and even, link by link."""
    graph = skeleton.graph
    a, b = graph.segments.T
    true = np.hypot(*(graph.points[a] - graph.points[b]).T)
    spacing = float(np.median(true / graph.segment_shares)) if len(true) else 1.0
    blend = (true / max(spacing, 1e-9)) ** fidelity * graph.segment_shares ** (1.0 - fidelity)
    owner = np.repeat(np.arange(len(graph.pieces)), [len(p.parts) for p in graph.pieces])
    return np.asarray(np.bincount(owner, weights=blend, minlength=len(graph.pieces)))
