"""The layout engine: from a network to an octilinear drawing with the ground's topology.

It starts from a drawing that is topologically right, the ground itself, and never leaves that
topology: (1) planarise, (2) move towards even spacing under a guard, (3) lay every piece on an
octilinear lattice along its course, (4) improve by local search, (5) settle all lengths by a
linear programme on the sheet, (6) snap to whole hundredths of a millimetre and put the smoothed
stations back.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.anchors import anchor_points
from gtfs_schematic.layout.asked import ask, kept_stations, relative_pins
from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.drift_limits import anchor_price, anchors_keep, are_limited
from gtfs_schematic.layout.embed import embed
from gtfs_schematic.layout.fit import (
    Sizes,
    link_least,
    link_wishes,
    part_wants,
    pins_in_frame,
    wants_of,
)
from gtfs_schematic.layout.forks import fork
from gtfs_schematic.layout.improve import improve
from gtfs_schematic.layout.model import (
    Clearances,
    Layout,
    LayoutSettings,
    RoomRequest,
    SheetFrame,
)
from gtfs_schematic.layout.objective import Weights
from gtfs_schematic.layout.planarise import planarise
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.refine import at_stations
from gtfs_schematic.layout.remembered import remembered
from gtfs_schematic.layout.restore import restore
from gtfs_schematic.layout.settle import (
    DriftLimitsCollideError,
    NoRoomError,
    PinsCollideError,
    settle,
)
from gtfs_schematic.layout.skeleton import Skeleton, build, skeleton_of
from gtfs_schematic.layout.snap import UNITS_PER_MM, snap
from gtfs_schematic.layout.turn import best_turn, turned
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress, Silent

_SWEEPS = {"quick": 2, "standard": 8, "thorough": 30}
_PORTS = 8
_STEP_DEG = 45.0
"""Directions in which pieces may leave a vertex, and the angle between two of them."""
_UNITS = (6, 9, 13, 20, 30, 45)
"""Lattice steps in a spacing, tried in turn; six let all anchors keep three steps' distance."""
_ROOM = 1.1
"""Share by which a sheet should exceed the least size of the drawing, for labels and air."""
_LOOSEST = 3.0
"""A station spacing grows to at most so many times the least, however large the sheet."""
_MAGNIFIED = 1.25
"""How much a settled drawing may be enlarged as it is, whatever the spacing then becomes."""
_NO_LENGTH_MM = 0.02
_ANCHORS_SHARE = 0.8
_MORE_FIDELITY = 0.15
"""Limits on the drift raise the fidelity in such steps until anchors keep this share of them."""
_FILLINGS = 4
_FULL = 1.06
"""How often the scale is raised to fill the sheet, and when it is full: sheet over drawing."""


@dataclass(frozen=True)
class Placement:
    """A network placed on the lattice: directions, bends and sides are chosen, lengths are not."""

    network: Network
    settings: LayoutSettings
    anchors: NDArray[np.float64]
    """Anchors of the vertices in station spacings, y north, shape (n, 2)."""
    skeleton: Skeleton
    rotation_deg: float = 0.0
    """Counter-clockwise turn of the ground."""


def lay_out(
    network: Network,
    settings: LayoutSettings,
    clearances: Clearances,
    frames: Sequence[SheetFrame],
    *,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Layout:
    """Lay a network out on the first sheet that holds it: `place`, then `fit_sheet`."""
    placement = place(network, settings, progress=progress)
    return fit_sheet(placement, clearances, frames, progress=progress)


def place(
    network: Network,
    settings: LayoutSettings,
    *,
    previous: Mapping[str, Point] | None = None,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Placement:
    """Choose the direction of everything; the sheet and its sizes play no part yet.

    Parameters
    ----------
    network
        Stations, links, walks and corridors.
    settings
        Fidelity to the ground, and effort.
    previous
        Places of stations in an earlier drawing that this one should resemble, millimetres.
    progress
        Told what is going on.

    Raises
    ------
    LayoutError
        If there is nothing to draw, or a pin names a station that the network does not have.
    """
    if not network.links:
        raise LayoutError("The network has no links: there is nothing to draw.")
    progress.phase("placing on the ground")
    graph = planarise(network, kept_stations(network, settings))
    turn = best_turn(graph, settings.fidelity, _STEP_DEG) if settings.north == "best" else 0.0
    graph = turned(graph, turn)
    settings, anchors = _anchors(graph, settings, progress)
    anchors = remembered(graph, anchors, previous or {})
    graph, anchors = fork(graph, anchors, _PORTS)
    board = _board(graph, anchors, settings, progress, remembers=bool(previous))
    improve(board, _SWEEPS[settings.effort], progress)
    skeleton = skeleton_of(board)
    if are_limited(settings):
        # A limit needs a station that the programme of lengths can hold.
        skeleton = at_stations(skeleton)
    anchors = board.anchors[: skeleton.graph.n_vertices]
    return Placement(network, settings, anchors, skeleton, turn)


def _anchors(
    graph: PlaneGraph, settings: LayoutSettings, progress: Progress
) -> tuple[LayoutSettings, NDArray[np.float64]]:
    """Give anchors, at a fidelity that is raised as far as limits on the drift ask."""
    anchors = anchor_points(graph, settings.fidelity)
    wanted = settings.fidelity
    while wanted < 1.0 and not anchors_keep(graph, anchors, settings, _ANCHORS_SHARE):
        wanted = min(1.0, round(wanted + _MORE_FIDELITY, 6))
        anchors = anchor_points(graph, wanted)
    if wanted > settings.fidelity:
        progress.note(f"for the drift limits the fidelity is {wanted:g} here")
    return settings.model_copy(update={"fidelity": wanted}), anchors


def fit_sheet(
    placement: Placement,
    clearances: Clearances,
    frames: Sequence[SheetFrame],
    *,
    requests: tuple[RoomRequest, ...] = (),
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Layout:
    """Settle a placement on the first sheet that holds it.

    Parameters
    ----------
    placement
        What `place` gave.
    clearances
        What will be drawn, millimetres.
    frames
        Sheets in rising size.
    requests
        Wishes of later stages for longer links, met as far as the sheet allows.
    progress
        Told what is going on.

    Returns
    -------
    Layout
        Every guarantee of `layout.check` kept.

    Raises
    ------
    LayoutError
        If no sheet is large enough, or pins collide.
    """
    progress.phase("settling lengths")
    network = placement.network
    sizes = Sizes(
        placement.settings,
        clearances,
        placement.anchors,
        link_least(network, clearances),
        link_wishes(network, requests),
        relative=relative_pins(placement.skeleton.graph, placement.settings),
    )
    sizes, (skeleton, points, frame) = _first_that_holds(placement.skeleton, sizes, frames)
    pinned = pins_in_frame(skeleton.graph, sizes.settings, frame)
    units = snap(skeleton, points, frozenset(pinned), sizes.relative)
    places = _on_paper(units, frame, centred=not pinned)
    layout = restore(network, skeleton, places, frame, part_wants(skeleton.graph, sizes))
    return dataclasses.replace(layout, rotation_deg=placement.rotation_deg)


def _board(
    graph: PlaneGraph,
    anchors: NDArray[np.float64],
    settings: LayoutSettings,
    progress: Progress,
    *,
    remembers: bool,
) -> Board:
    """Lay the graph on the coarsest lattice that holds it."""
    progress.phase("laying lines", len(_UNITS))
    stuck = 0
    plain = Weights()
    anchor = plain.previous if remembers else plain.anchor
    weights = Weights(anchor=anchor_price(graph, settings, anchor))
    for unit in _UNITS:
        board = Board(graph, anchors, weights, unit)
        ask(board, settings)
        failed = embed(board)
        progress.step()
        if failed is None:
            return board
        stuck = failed
    names = [graph.station_of[v] or "a crossing" for v in graph.pieces[stuck].ends]
    raise LayoutError(
        f"Between {names[0]} and {names[1]} the network is too dense to be drawn without new "
        "crossings. Draw fewer lines or modes at once."
    )


def _first_that_holds(
    skeleton: Skeleton, sizes: Sizes, frames: Sequence[SheetFrame]
) -> tuple[Sizes, tuple[Skeleton, NDArray[np.float64], SheetFrame]]:
    """Settle with all wishes; without places beside other stations, or without room, if need be."""
    tries = [sizes, dataclasses.replace(sizes, link_wishes={})]
    if sizes.relative:
        tries += [dataclasses.replace(each, relative=()) for each in tries]
    for each in tries[:-1]:
        try:
            return each, _on_sheet(skeleton, each, frames)
        except (NoRoomError, PinsCollideError, DriftLimitsCollideError) as error:
            # What is in the way may be a wish; pins that collide without one are an error.
            if isinstance(error, PinsCollideError) and not each.relative:
                raise
    return tries[-1], _on_sheet(skeleton, tries[-1], frames)


def _on_sheet(
    skeleton: Skeleton, sizes: Sizes, frames: Sequence[SheetFrame]
) -> tuple[Skeleton, NDArray[np.float64], SheetFrame]:
    """Choose the sheet by the least size with some air, then fill it."""
    spacing = sizes.clearances.spacing_mm
    skeleton, points, pairs = _settled(skeleton, sizes, spacing, None)
    width, height = np.ptp(points, axis=0)
    fits = [f for f in frames if _inner(f)[0] >= width * _ROOM and _inner(f)[1] >= height * _ROOM]
    fits = fits or [f for f in frames if _inner(f)[0] >= width and _inner(f)[1] >= height]
    if not fits:
        largest = frames[-1]
        raise LayoutError(
            f"The drawing needs at least {width:.0f} × {height:.0f} mm, but the largest sheet "
            f"allowed ({largest.width_mm:.0f} × {largest.height_mm:.0f} mm) leaves "
            f"{_inner(largest)[0]:.0f} × {_inner(largest)[1]:.0f} mm. Allow a larger sheet, "
            "smaller type or thinner lines, or draw fewer lines."
        )
    frame = _best_of_size(fits, width, height)
    box, scale = _inner(frame), spacing
    sizes = dataclasses.replace(sizes, pinned=pins_in_frame(skeleton.graph, sizes.settings, frame))
    skeleton = dataclasses.replace(skeleton, points=points)
    for _ in range(_FILLINGS):
        # What has no more room in one direction still grows in the other, the less the more the
        # drawing is to be true to the ground.
        spare = np.maximum(1.0, np.asarray(box) / np.maximum(np.ptp(points, axis=0), 1e-9))
        fidelity = sizes.settings.fidelity
        grow = float(spare.min() ** fidelity * spare.max() ** (1.0 - fidelity))
        if not sizes.pinned and (grow < _FULL or scale >= _LOOSEST * spacing):
            break
        scale = min(scale * 0.98 * grow, _LOOSEST * spacing)
        skeleton, points, pairs = _settled(skeleton, sizes, scale, box, pairs)
    if not sizes.pinned and not sizes.settings.drift_limit_mm:
        points = points * _magnified(points, box, _LOOSEST * spacing / scale)
    return skeleton, points, frame


def _magnified(points: NDArray[np.float64], box: tuple[float, float], most: float) -> float:
    """Give the factor by which a settled drawing is enlarged as it is, to fill its box.

    It keeps every direction and only adds to every distance, so no guarantee can suffer.
    """
    spare = np.asarray(box) / np.maximum(np.ptp(points, axis=0), 1e-9)
    return float(np.clip(spare.min(), 1.0, max(most, _MAGNIFIED)))


def _best_of_size(fits: list[SheetFrame], width: float, height: float) -> SheetFrame:
    """Of the least sheets, upright or not, the one that the drawing can fill best."""
    least = [f for f in fits if f.width_mm * f.height_mm <= fits[0].width_mm * fits[0].height_mm]
    wide, high = max(width, 1e-9), max(height, 1e-9)
    return max(least, key=lambda f: min(_inner(f)[0] / wide, _inner(f)[1] / high))


def _inner(frame: SheetFrame) -> tuple[float, float]:
    return frame.right_mm - frame.left_mm, frame.bottom_mm - frame.top_mm


def _settled(
    skeleton: Skeleton,
    sizes: Sizes,
    scale_mm: float,
    box: tuple[float, float] | None,
    pairs: NDArray[np.int64] | None = None,
) -> tuple[Skeleton, NDArray[np.float64], NDArray[np.int64] | None]:
    """Settle, then take out bends that have shrunk to nothing, and settle again."""
    while True:
        wants = wants_of(skeleton, sizes, scale_mm, box)
        points, pairs = settle(skeleton, wants, box, pairs)
        lengths = np.hypot(*np.diff(points[skeleton.segments], axis=1)[:, 0].T)
        gone = lengths < _NO_LENGTH_MM
        if not gone.any():
            return skeleton, points, pairs
        skeleton, pairs = _without(skeleton, points, gone), None


def _without(skeleton: Skeleton, points: NDArray[np.float64], gone: NDArray[np.bool_]) -> Skeleton:
    """Drop segments without length; their neighbours run on as one."""
    routes = []
    for p in range(len(skeleton.courses)):
        course = skeleton.courses[p]
        route = [points[skeleton.segments[course[0], 0]]]
        for k in course:
            step = points[skeleton.segments[k, 1]] - points[skeleton.segments[k, 0]]
            route.append(route[-1] if gone[k] else route[-1] + step)
        routes.append(np.array(route))
    return build(skeleton.graph, points[: skeleton.graph.n_vertices], routes)


def _on_paper(units: NDArray[np.int64], frame: SheetFrame, *, centred: bool) -> NDArray[np.int64]:
    """Turn y down and put the drawing into its frame: centred, or as its pins have it."""
    if not centred:
        left, bottom = (round(side * UNITS_PER_MM) for side in (frame.left_mm, frame.bottom_mm))
        return np.column_stack([units[:, 0] + left, bottom - units[:, 1]])
    low, high = units.min(axis=0), units.max(axis=0)
    centre = np.array([frame.left_mm + frame.right_mm, frame.top_mm + frame.bottom_mm]) / 2.0
    shift = np.rint(centre * UNITS_PER_MM).astype(np.int64)
    middle = (low + high) // 2
    return np.column_stack([units[:, 0] - middle[0] + shift[0], middle[1] - units[:, 1] + shift[1]])
