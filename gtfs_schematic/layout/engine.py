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
from gtfs_schematic.layout.anchors import anchor_points, true_points
from gtfs_schematic.layout.asked import ask, kept_stations, relative_pins
from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.drift_limits import anchor_price, anchors_keep, are_limited
from gtfs_schematic.layout.embed import embed
from gtfs_schematic.layout.filling import first_that_holds
from gtfs_schematic.layout.fit import (
    Sizes,
    link_least,
    part_wants,
    pins_in_frame,
)
from gtfs_schematic.layout.forks import fork
from gtfs_schematic.layout.improve import improve, tidy
from gtfs_schematic.layout.model import (
    Clearances,
    Layout,
    LayoutSettings,
    SheetFrame,
)
from gtfs_schematic.layout.objective import Weights
from gtfs_schematic.layout.planarise import planarise
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.refine import at_stations
from gtfs_schematic.layout.remembered import remembered
from gtfs_schematic.layout.restore import restore
from gtfs_schematic.layout.skeleton import Skeleton, skeleton_of
from gtfs_schematic.layout.snap import UNITS_PER_MM, snap
from gtfs_schematic.layout.turn import best_turn, turned
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress, Silent

_SWEEPS = {"standard": 8, "thorough": 30}
_OPENED = 0.25
"""Fidelity of the ground on which directions are chosen: dense places are open there. The knob
then moves lengths and places alone; bends stay, and whatever it says the drawing can be made."""
_UNITS = (6, 9, 13, 20, 30, 45)
"""Lattice steps in a spacing, tried in turn; six let all anchors keep three steps' distance."""
_ANCHORS_SHARE = 0.8
_MORE_FIDELITY = 0.15
"""Limits on the drift raise the fidelity in such steps until anchors keep this share of them."""


@dataclass(frozen=True)
class Placement:
    """A network placed on the lattice: directions, bends and sides are chosen, lengths are not."""

    network: Network
    settings: LayoutSettings
    anchors: NDArray[np.float64]
    """Where geography wants the vertices, in station spacings, y north, shape (n, 2)."""
    skeleton: Skeleton
    rotation_deg: float = 0.0
    """Counter-clockwise turn of the ground."""


@dataclass(frozen=True)
class Fitted:
    """A layout on its sheet, and what it takes to settle it again with room for names."""

    layout: Layout
    sizes: Sizes
    skeleton: Skeleton
    """Settled: its points are millimetres."""
    scale_mm: float
    """Length of a station spacing."""


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
    turn = best_turn(graph, settings.fidelity, settings.angles) if settings.north == "best" else 0.0
    graph = turned(graph, turn)
    settings, anchors = _anchors(graph, settings, progress)
    anchors = remembered(graph, anchors, previous or {})
    graph, anchors = fork(graph, anchors, 360 // settings.angles)
    board = _board(graph, anchors, settings, progress, remembers=bool(previous))
    if settings.effort == "quick":
        tidy(board, progress)
    else:
        improve(board, _SWEEPS[settings.effort], progress)
    skeleton = skeleton_of(board)
    if are_limited(settings):
        # A limit needs a station that the programme of lengths can hold.
        skeleton = at_stations(skeleton)
    wanted = board.anchors if previous else true_points(skeleton.graph, settings.fidelity)
    return Placement(network, settings, wanted[: skeleton.graph.n_vertices], skeleton, turn)


def _anchors(
    graph: PlaneGraph, settings: LayoutSettings, progress: Progress
) -> tuple[LayoutSettings, NDArray[np.float64]]:
    """Give anchors for the lattice, nearer to the ground as far as limits on the drift ask.

    The fidelity of the settings rises with them.
    """
    anchors = anchor_points(graph, _OPENED, settings.angles // 45)
    placed, wanted = _OPENED, settings.fidelity
    while placed < 1.0 and not anchors_keep(graph, anchors, settings, _ANCHORS_SHARE):
        placed = min(1.0, round(placed + _MORE_FIDELITY, 6))
        wanted = max(wanted, placed)
        anchors = anchor_points(graph, placed, settings.angles // 45)
    if wanted > settings.fidelity:
        progress.note(f"for the drift limits the fidelity is {wanted:g} here")
    return settings.model_copy(update={"fidelity": wanted}), anchors


def fit_sheet(
    placement: Placement,
    clearances: Clearances,
    frames: Sequence[SheetFrame],
    *,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Layout:
    """Settle a placement on the first sheet that holds it: see `fit`."""
    return fit(placement, clearances, frames, progress=progress).layout


def fit(
    placement: Placement,
    clearances: Clearances,
    frames: Sequence[SheetFrame],
    *,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Fitted:
    """Settle a placement on the first sheet that holds it.

    Parameters
    ----------
    placement
        What `place` gave.
    clearances
        What will be drawn, millimetres.
    frames
        Sheets in rising size.
    progress
        Told what is going on.

    Returns
    -------
    Fitted
        Its layout keeps every guarantee of `layout.check`.

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
        relative=relative_pins(placement.skeleton.graph, placement.settings),
    )
    sizes, (skeleton, frame, scale) = first_that_holds(placement.skeleton, sizes, frames)
    pinned = pins_in_frame(skeleton.graph, sizes.settings, frame)
    units = snap(skeleton, skeleton.points, frozenset(pinned), sizes.relative)
    places = on_paper(units, frame, centred=not pinned)
    layout = restore(network, skeleton, places, frame, part_wants(skeleton.graph, sizes))
    angles, turn = placement.settings.angles, placement.rotation_deg
    layout = dataclasses.replace(layout, rotation_deg=turn, angles=angles)
    return Fitted(layout, dataclasses.replace(sizes, pinned=pinned), skeleton, scale)


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
        board = Board(graph, anchors, weights, unit, settings.angles // 45)
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


def on_paper(units: NDArray[np.int64], frame: SheetFrame, *, centred: bool) -> NDArray[np.int64]:
    """Turn y down and put the drawing into its frame: centred, or as its pins have it."""
    if not centred:
        left, bottom = (round(side * UNITS_PER_MM) for side in (frame.left_mm, frame.bottom_mm))
        return np.column_stack([units[:, 0] + left, bottom - units[:, 1]])
    low, high = units.min(axis=0), units.max(axis=0)
    centre = np.array([frame.left_mm + frame.right_mm, frame.top_mm + frame.bottom_mm]) / 2.0
    shift = np.rint(centre * UNITS_PER_MM).astype(np.int64)
    middle = (low + high) // 2
    return np.column_stack([units[:, 0] - middle[0] + shift[0], middle[1] - units[:, 1] + shift[1]])
