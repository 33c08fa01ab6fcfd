"""Settle lengths: a linear programme in sheet millimetres, all directions and sides kept.

Directions and left/right relations are fixed, so octilinearity and planarity are linear. What is
left to choose is every length: even or true spacing, room for labels, and the sheet. The form is
that of the length stage in Nöllenburg and Wolff (2011); separators as in their planarity rule,
but fixed by the drawing at hand.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import scipy.sparse as sp
import shapely
from numpy.typing import NDArray
from scipy.optimize import linprog

from gtfs_schematic.errors import InternalFaultError, LayoutError
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.asked import Relative, hold_relative
from gtfs_schematic.layout.columns import (
    Columns,
    Runs,
    bound_lengths,
    keep_directions,
    piece_lengths,
)
from gtfs_schematic.layout.crowding import Crowding
from gtfs_schematic.layout.drift_limits import DriftLimits, colliding, hold_drift
from gtfs_schematic.layout.rows import Rows
from gtfs_schematic.layout.separation import Separations, near_pairs, separate
from gtfs_schematic.layout.skeleton import Skeleton

_MOST_REPAIRS = 20
_INFEASIBLE = 2
"""Status by which `linprog` says that no solution exists."""
_GRADES = ((0.15, 0.4), (0.2, 1.0), (0.3, 2.0), (np.inf, 4.0))
"""Shares of the wanted length that may be missing or too much, each at its own price: rising
prices spread what must give way over many pieces, instead of squeezing a few to the least."""
_AWAY = ((1.5, 1.0), (np.inf, 3.0))
"""Distances from its anchor, in typical wanted lengths, that a vertex may be off, at their prices:
few far strays count for more than many near ones, as in the residual of a similarity."""
_LACK_WEIGHT = 0.6
"""Price of a millimetre lacking to the wanted room, against one of wanted length."""
_PIN_WEIGHT = 1000.0
_MISSED_MM = 0.01
_SLACK = 1e-4
"""Distance by which a solution may miss a clearance, millimetres."""


class NoRoomError(LayoutError):
    """The least lengths do not fit the box."""


class DriftLimitsCollideError(LayoutError):
    """Drift limits that cannot all be kept; the message names them."""


class PinsCollideError(LayoutError):
    """Pins that cannot all be kept; the message names them."""


@dataclass(frozen=True)
class Wants:
    """What the lengths should be, millimetres; arrays per segment (m), piece (p), node (k)."""

    least: NDArray[np.float64]
    """Least length of each segment, shape (m,)."""
    piece_least: NDArray[np.float64]
    """Least length of each piece, shape (p,)."""
    piece_goal: NDArray[np.float64]
    """Wanted length of each piece, shape (p,)."""
    piece_weight: NDArray[np.float64]
    """Weight of the wanted length, shape (p,)."""
    anchors: NDArray[np.float64]
    """Wanted places of the vertices, shape (n, 2)."""
    anchor_weight: float
    half_width: NDArray[np.float64]
    """Half the width of what is drawn along each segment, shape (m,)."""
    clear: float
    """Least distance between what is drawn along two segments."""
    room: NDArray[np.float64]
    """Wanted distance between them along each of the eight axes, shape (m, 8)."""
    spread: float
    """Weight of the drawing's width and height."""
    pinned: Mapping[int, Point]
    """Vertices whose place is fixed, millimetres."""
    jogs: NDArray[np.float64]
    """Weight of the length of each segment that is better gone, shape (m,)."""
    relative: tuple[Relative, ...] = ()
    """Places that vertices keep as seen from others."""
    limits: DriftLimits | None = None
    """How far stations may be from their true places."""
    crowding: Crowding | None = None
    """Room for names whose places are known."""


def settle(
    skeleton: Skeleton,
    wants: Wants,
    box: tuple[float, float] | None,
    pairs: NDArray[np.int64] | None = None,
) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """Solve for the nodes' places.

    Parameters
    ----------
    skeleton
        The drawing whose directions and sides are kept; any unit.
    wants
        Lengths and distances, millimetres.
    box
        Width and height that the drawing may fill, millimetres; None: as much as it needs.
    pairs
        Pairs of segments known to matter, shape (q, 2); None: those that are near.

    Returns
    -------
    tuple
        Places in millimetres, y north, the box's lower left corner at the origin, shape (k, 2);
        and the pairs of segments that mattered.

    Raises
    ------
    NoRoomError
        If the box is too small.
    PinsCollideError
        If the pins cannot all be kept.
    DriftLimitsCollideError
        If the drift limits cannot all be kept, though without them there is a drawing.
    """
    if pairs is None:
        lengths = np.hypot(*np.diff(skeleton.points[skeleton.segments], axis=1)[:, 0].T)
        pairs = near_pairs(skeleton, skeleton.points, 2.0 * float(np.median(lengths)))
    apart = separate(skeleton, pairs)
    for _ in range(_MOST_REPAIRS):
        points = _solve(skeleton, wants, apart, box)
        fresh = _too_near(skeleton, wants, points, pairs)
        if not len(fresh):
            return points, pairs
        pairs = np.concatenate([pairs, fresh])
        apart = apart.extended(separate(skeleton, fresh))
    raise InternalFaultError("Settling the lengths found no end.")


def _too_near(
    skeleton: Skeleton,
    wants: Wants,
    points: NDArray[np.float64],
    known: NDArray[np.int64],
) -> NDArray[np.int64]:
    """Pairs that came too near and are not among the `known` ones."""
    half = wants.half_width
    pairs = near_pairs(skeleton, points, 2.0 * float(half.max()) + wants.clear)
    lines = shapely.linestrings(points[skeleton.segments])
    gaps = shapely.distance(lines[pairs[:, 0]], lines[pairs[:, 1]])
    pairs = pairs[gaps < half[pairs[:, 0]] + half[pairs[:, 1]] + wants.clear - _SLACK]
    count = len(skeleton.segments)
    return np.asarray(pairs[~np.isin(pairs @ [count, 1], known @ [count, 1])])


def _solve(
    skeleton: Skeleton,
    wants: Wants,
    apart: Separations,
    box: tuple[float, float] | None,
    *,
    loosened: bool = False,
) -> NDArray[np.float64]:
    """Solve the programme; `loosened`, pins only draw their stations, but strongly."""
    runs = Runs.of(skeleton)
    limits = wants.limits
    held = len(limits.stations) if limits is not None else 0
    crowding = wants.crowding
    names = len(crowding.need) if crowding is not None else 0
    roomy = _roomy(wants, apart)
    columns = Columns.of(skeleton, (len(_GRADES), len(_AWAY)), len(roomy), held, names)
    equal, most = Rows(), Rows()
    keep_directions(equal, runs, columns)
    hold_relative(equal, (columns.x, columns.y), wants.relative if not loosened else ())
    bound_lengths(most, runs, columns, wants.least)
    _reach_anchors(most, columns, wants)
    if limits is not None:
        hold_drift(equal, most, columns, limits)
    _keep_apart(most, skeleton, columns, wants, apart)
    _give_room(most, skeleton, columns, wants, apart.only(roomy))
    if crowding is not None:
        crowding.keep(most, (columns.x, columns.y), columns.crowd)
    for axis, nodes in enumerate((columns.x, columns.y)):
        most.add([(nodes, 1.0), (np.full(len(nodes), columns.extent[axis]), -1.0)], 0.0)
    blocks, rights = piece_lengths(runs, columns, wants.piece_least, wants.piece_goal)
    upper, right = most.matrix(columns.count)
    matrix, zero = equal.matrix(columns.count)
    solution = linprog(
        _cost(runs, columns, wants, loosened=loosened),
        A_ub=sp.vstack([upper, *blocks], format="csc"),
        b_ub=np.concatenate([right, *rights]),
        A_eq=matrix,
        b_eq=zero,
        bounds=_bounds(columns, wants, box, loosened=loosened),
        method="highs-ipm",
    )
    if solution.status == _INFEASIBLE:
        if limits is not None and limits.loose is None:
            raise DriftLimitsCollideError(_missed_limits(skeleton, wants, apart, box))
        if (wants.pinned or wants.relative) and not loosened:
            raise PinsCollideError(_collisions(skeleton, wants, apart, box))
        raise NoRoomError("The drawing does not fit its box.")
    if not solution.success:
        raise InternalFaultError(f"Settling the lengths failed: {solution.message}")
    # Rounded, so that the last bits of different processors decide nothing further on.
    return np.round(np.column_stack([solution.x[columns.x], solution.x[columns.y]]), 6)


def _bounds(
    columns: Columns, wants: Wants, box: tuple[float, float] | None, *, loosened: bool
) -> NDArray[np.float64]:
    """Least and most of every variable, shape (count, 2)."""
    bounds = np.zeros((columns.count, 2))
    bounds[:, 1] = np.inf
    if wants.limits is not None:
        bounds[columns.excess, 1] = 0.0
        bounds[columns.excess[sorted(wants.limits.loose or ())], 1] = np.inf
    for grade, (share, _) in zip(columns.slack, _GRADES, strict=True):
        bounds[grade, 1] = share * wants.piece_goal
    for away, (share, _) in zip(columns.away, _AWAY, strict=True):
        bounds[away, 1] = share * float(np.median(wants.piece_goal))
    if box is not None:
        bounds[columns.extent, 1] = box
    for v, place in wants.pinned.items():
        if not loosened:
            bounds[[columns.x[v], columns.y[v]]] = np.array(place)[:, None]
    return bounds


def _reach_anchors(most: Rows, columns: Columns, wants: Wants) -> None:
    for axis, nodes in enumerate((columns.x, columns.y)):
        away = [(grade, -1.0) for grade in columns.away[:, axis]]
        vertices, goal = nodes[: len(wants.anchors)], wants.anchors[:, axis]
        most.add([(vertices, 1.0), *away], goal)
        most.add([(vertices, -1.0), *away], -goal)


def _keep_apart(
    most: Rows, skeleton: Skeleton, columns: Columns, wants: Wants, apart: Separations
) -> None:
    gap = wants.half_width[apart.first] + wants.half_width[apart.second]
    most.add(_apart(skeleton, columns, apart), -(gap + wants.clear))


def _give_room(
    most: Rows, skeleton: Skeleton, columns: Columns, wants: Wants, apart: Separations
) -> None:
    gap = wants.half_width[apart.first] + wants.half_width[apart.second]
    lack = (columns.lack, np.full(len(gap), -1.0))
    most.add([*_apart(skeleton, columns, apart), lack], -(gap + _room(wants, apart)))


def _apart(
    skeleton: Skeleton, columns: Columns, apart: Separations
) -> list[tuple[NDArray[np.int64], NDArray[np.float64]]]:
    """Give the terms of the negative distances of pairs along their axes."""
    normal = apart.normals()
    i, j = apart.facing(skeleton)
    return [
        (columns.x[i], -normal[:, 0]),
        (columns.x[j], normal[:, 0]),
        (columns.y[i], -normal[:, 1]),
        (columns.y[j], normal[:, 1]),
    ]


def _room(wants: Wants, apart: Separations) -> NDArray[np.float64]:
    """Wanted distance of what is drawn along two segments.

    Of two that face each other one can bear its names on the other side: the lesser wish holds.
    """
    room = np.minimum(wants.room[apart.first, apart.axis], wants.room[apart.second, apart.axis])
    return np.asarray(room)


def _roomy(wants: Wants, apart: Separations) -> NDArray[np.int64]:
    """Pairs that want more than they must have."""
    return np.flatnonzero(_room(wants, apart) > wants.clear)


def _collisions(
    skeleton: Skeleton, wants: Wants, apart: Separations, box: tuple[float, float] | None
) -> str:
    """Name the pins that cannot all be kept, and how far off the nearest drawing has them."""
    anchors = wants.anchors.copy()
    for v, place in wants.pinned.items():
        anchors[v] = place
    loose = _solve(skeleton, replace(wants, anchors=anchors), apart, box, loosened=True)
    missed = [
        f"{skeleton.graph.station_of[v]} ({np.hypot(*(loose[v] - place)):.1f} mm off)"
        for v, place in sorted(wants.pinned.items())
        if np.abs(loose[v] - place).max() > _MISSED_MM
    ]
    return (
        "The pins cannot all be kept with every line in the directions of the diagram and all "
        f"distances kept. In the nearest drawing these are missed: {', '.join(missed)}. Move or "
        "drop them, or choose a larger sheet."
    )


def _missed_limits(
    skeleton: Skeleton, wants: Wants, apart: Separations, box: tuple[float, float] | None
) -> str:
    """Name drift limits that collide; a box or pins that leave no drawing at all are told first."""
    limits = wants.limits
    assert limits is not None  # noqa: S101 - asked only where limits are held
    everyone = frozenset(range(len(limits.stations)))
    _solve(skeleton, replace(wants, limits=replace(limits, loose=everyone)), apart, box)

    def solve(some: DriftLimits) -> NDArray[np.float64] | None:
        try:
            return _solve(skeleton, replace(wants, limits=some), apart, box)
        except LayoutError:
            return None

    pins = ", the pins where they are" if wants.pinned or wants.relative else ""
    return limits.said(colliding(limits, solve), skeleton.graph.station_of, pins)


def _cost(runs: Runs, columns: Columns, wants: Wants, *, loosened: bool) -> NDArray[np.float64]:
    cost = np.zeros(columns.count)
    for grade, (_, price) in zip(columns.slack, _GRADES, strict=True):
        cost[grade] = price * wants.piece_weight
    for away, (_, price) in zip(columns.away, _AWAY, strict=True):
        cost[away] = price * wants.anchor_weight
    if loosened:
        cost[columns.away[:, :, sorted(wants.pinned)]] = _PIN_WEIGHT
    cost[columns.lack] = _LACK_WEIGHT
    if wants.crowding is not None:
        cost[columns.crowd] = wants.crowding.price
    cost[columns.extent] = wants.spread
    cost[columns.excess] = _PIN_WEIGHT
    np.add.at(cost, columns.along(runs, runs.end), wants.jogs * runs.forward)
    np.add.at(cost, columns.along(runs, runs.start), -wants.jogs * runs.forward)
    return cost
