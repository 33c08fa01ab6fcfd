"""Route a curve of the ground over the sheet, with its word and as near as may be to its image."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy import ndimage
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.background.board import Board, clamped, nodes_of, numbered, window_of
from gtfs_schematic.background.lattice import DX, DY, SEVERAL, lay
from gtfs_schematic.background.legs import Arcs, Ints, search, search_stepwise
from gtfs_schematic.background.search import Door, Starts
from gtfs_schematic.background.word import Crossed

Floats = NDArray[np.float64]
Slots = Mapping[tuple[int, float], tuple[float, float]]
"""Per piece (its number without sign) and share on the ground, the shares allowed on the sheet."""

_RAY_MM = 45.0
_END = 1.5
"""What an open end pays per millimetre from its true place."""
_END_REACH_MM = 4.0
_OUT_REACH_MM = 25.0
_OUT = 0.3
"""Likewise where it leaves the field."""
_INTO_MM = 2.0
"""So far inside a surface ends what flows into it."""
BANKS_MM = 3.5
_BESIDE_BANK = 2.5
"""Nearer than this to another shore a shore costs more."""
LEAST_MM = 2.2
"""Radius of the least closed curve."""


@dataclass(frozen=True)
class Curve:
    """A curve on the ground and its image."""

    ground: Floats
    """Metres, y north, close points; a closed curve repeats its first."""
    image: Floats
    """Millimetres, y up, one per point."""
    word: tuple[Crossed, ...]
    closed: bool


Ends = tuple[BaseGeometry | None, BaseGeometry | None]


def route(board: Board, curve: Curve, slots: Slots, into: Ends = (None, None)) -> Arcs | None:
    """Route a curve; None if there is no way.

    Parameters
    ----------
    board
        Where it is routed.
    curve
        What to route.
    slots
        Where it may cross pieces; all along where it does not say.
    into
        Per end of an open curve a surface (millimetres, y up) in which it is to end.
    """
    if not curve.closed:
        return _open(board, curve, slots, into)
    if not curve.word:
        return _round(board, curve)
    arcs = None
    # The first time it starts across the first piece, where that seems best; then from where the
    # curve found a place in the middle.
    turns = [0, len(curve.word) // 2] if len(curve.word) > 1 else [0]
    step = None
    for first in turns:
        word = (*curve.word[first:], *curve.word[:first])
        if arcs is not None:
            step = (int(arcs[first - 1][-1]), int(arcs[first][0]))
        step = step or _first_step(board, curve, word[0], slots)
        if step is None:
            return arcs
        again = _ring(board, curve, word, step, slots)
        if again is None:
            return arcs
        k = len(word)
        arcs = [again[(i - first) % k] for i in range(k)]
    return arcs


def _ring(
    board: Board, curve: Curve, word: Sequence[Crossed], step: tuple[int, int], slots: Slots
) -> Arcs | None:
    way = _way(board, *step)
    starts = Starts(np.array([step[1]]), np.array([way]), np.zeros(1))
    doors = [_door(each, slots) for each in word[1:]]
    doors.append(Door(word[0].piece, 0.0, 1.0, step[0], way))
    stops = [*(each.along for each in word), word[0].along + len(curve.ground) - 1]
    courses = [_between(board, curve, *ends) for ends in itertools.pairwise(stops)]
    return search(board, starts, list(zip(courses, doors, strict=True)))


def _open(board: Board, curve: Curve, slots: Slots, into: Ends) -> Arcs | None:
    starts = _end_nodes(board, curve, 0, into[0])
    goals = _end_nodes(board, curve, -1, into[1])
    if starts is None or goals is None:
        return None
    doors: list[Door | Starts] = [*(_door(each, slots) for each in curve.word), goals]
    stops = [0.0, *(each.along for each in curve.word), float(len(curve.ground) - 1)]
    courses = [_between(board, curve, *ends) for ends in itertools.pairwise(stops)]
    return search(board, starts, list(zip(courses, doors, strict=True)))


def _round(board: Board, curve: Curve) -> Arcs | None:
    """Route a ring in one face: once round a closed spot, across a ray that leaves it."""
    inner = shapely.Polygon(curve.ground).representative_point()
    at = np.array([[inner.x, inner.y]])
    label = label_at(board, at[0])
    wanted = clamped(board, board.field(at))[0]
    if label is None:
        return None
    node = _nearest(board, label, wanted, LEAST_MM)
    if node is None:
        return None
    lattice = board.lattice
    middle = lattice.at(np.array([node]))[0]
    moved = Curve(curve.ground, curve.image + (middle - wanted), (), closed=True)
    number = len(board.planes.pieces) + 1
    top = moved.image[:, 1].max() + _RAY_MM
    before = lattice.crossed.copy()
    closed = lattice.closed.copy()
    lay(lattice, number, np.array([middle + 0.003, [middle[0] + 0.003, top]]), None)
    spot = nodes_of(lattice, window_of(lattice, middle[None, :], LEAST_MM))
    lattice.closed[spot[np.hypot(*(lattice.at(spot) - middle).T) < LEAST_MM - 0.2]] = True
    # West over the ray: from its right to its left, counted as the lattice does.
    sense = 1 if shapely.LinearRing(curve.ground).is_ccw else -1
    letter = Crossed(sense * number, 0.5, float(np.argmax(moved.image[:, 1])))
    step = _first_step(board, moved, letter, {})
    arcs = _ring(board, moved, [letter], step, {}) if step else None
    lattice.crossed[:], lattice.closed[:] = before, closed
    return arcs


def _door(letter: Crossed, slots: Slots) -> Door:
    low, high = slots.get((abs(letter.piece), letter.share), (0.0, 1.0))
    return Door(letter.piece, low, high, -1, -1)


def _between(board: Board, curve: Curve, start: float, end: float) -> Floats:
    """Give the image of a part of a curve, clamped to the lattice, in steps below a node."""
    last = len(curve.ground) - 1
    whole = np.arange(np.ceil(start), np.floor(end) + 1.0)
    along = np.concatenate([[start], whole, [end]])
    if curve.closed:
        along = along % last
    xy = [np.interp(along, np.arange(last + 1), curve.image[:, i]) for i in (0, 1)]
    points = clamped(board, np.column_stack(xy))
    way = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    at = np.linspace(0.0, way[-1], 2 + int(2.0 * way[-1] / board.lattice.pitch))
    return np.column_stack([np.interp(at, way, points[:, i]) for i in (0, 1)])


def _first_step(
    board: Board, curve: Curve, letter: Crossed, slots: Slots
) -> tuple[int, int] | None:
    """Give the step (node, node) across a piece that suits a curve best."""
    lattice = board.lattice
    door = _door(letter, slots)
    nodes, d = np.nonzero(np.abs(lattice.crossed) == abs(letter.piece))
    share = lattice.share[nodes, d]
    nodes, d = (each[(share >= door.low) & (share <= door.high)] for each in (nodes, d))
    there = nodes + DY[d] * lattice.width + DX[d]
    ok = ~lattice.closed[nodes] & ~lattice.closed[there]
    nodes, d, there = nodes[ok], d[ok], there[ok]
    if len(nodes) == 0:
        return None
    wanted = _between(board, curve, letter.along, letter.along)[0]
    places = (lattice.at(nodes) + lattice.at(there)) / 2.0
    cost = np.hypot(*(places - wanted).T) + 6.0 * lattice.slant[nodes, d] + lattice.cost[nodes]
    i = int(np.argmin(cost))
    ends = int(nodes[i]), int(there[i])
    return ends if lattice.crossed[nodes[i], d[i]] == letter.piece else ends[::-1]


def _way(board: Board, a: int, b: int) -> int:
    """Give the direction of the step from one node to a neighbour."""
    width = board.lattice.width
    dx, dy = b % width - a % width, b // width - a // width
    return next(d for d in range(8) if (DX[d], DY[d]) == (dx, dy))


def _end_nodes(board: Board, curve: Curve, end: int, into: BaseGeometry | None) -> Starts | None:
    """Give the nodes where an open curve may begin or end, with what they cost."""
    label = label_at(board, curve.ground[end])
    wanted = clamped(board, curve.image[[end]])[0]
    if label is None or (node := _nearest(board, label, wanted, 0.0)) is None:
        return None
    lattice = board.lattice
    near = nodes_of(lattice, window_of(lattice, lattice.at(np.array([node])), _END_REACH_MM))
    if into is not None and (inner := into.buffer(-_INTO_MM)):
        near = nodes_of(lattice, window_of(lattice, np.array(inner.bounds).reshape(2, 2)))
        near = near[shapely.contains_xy(inner, *lattice.at(near).T)]
    near = near[(board.labels[near] == label) & ~lattice.closed[near]]
    if len(near) == 0:
        return None
    if _is_outside(board, wanted):
        # Where it leaves the field matters little: straight on is best.
        edge = window_of(lattice, wanted[None, :], _OUT_REACH_MM)
        near = nodes_of(lattice, edge)
        near = near[[_is_outside(board, place) for place in lattice.at(near)]]
        near = near[~lattice.closed[near]]
        return Starts(
            near,
            np.full(len(near), -1),
            _OUT * np.hypot(*(lattice.at(near) - wanted).T),
        )
    costs = _END * np.hypot(*(lattice.at(near) - wanted).T)
    return Starts(near, np.full(len(near), -1), costs)


def _is_outside(board: Board, place: Floats) -> bool:
    low, high = board.box
    return bool((place < low - 1.0).any() or (place > high + 1.0).any())


def _nearest(board: Board, label: int, wanted: Floats, clear_mm: float) -> int | None:
    """Give the node of a face nearest to a place, clear of lines by a radius and a little more."""
    lattice = board.lattice
    fits = (board.labels == label) & (lattice.clear > clear_mm + 1.0) & ~lattice.closed
    nodes = np.flatnonzero(fits)
    if len(nodes) == 0:
        return None
    return int(nodes[np.argmin(np.hypot(*(lattice.at(nodes) - wanted).T))])


def label_at(board: Board, point: Floats) -> int | None:
    """Give the face on the sheet that a place of the ground lies in.

    It is that on the same side of a piece that is seen from the place.
    """
    numbers = [n for n, piece in numbered(board.planes.pieces) if piece.half_mm > 0.0]
    courses = np.array([board.planes.pieces[n - 1].ground for n in numbers])
    walls = shapely.STRtree(shapely.linestrings(courses))
    middles = courses.mean(axis=1)
    order = np.argsort(np.hypot(*(middles - point).T), kind="stable")
    for k in order[:40].tolist():
        ray = shapely.LineString([point, point + 0.9999 * (middles[k] - point)])
        if len(walls.query(ray, predicate="intersects")):
            continue
        u, v = courses[k][1] - courses[k][0], point - courses[k][0]
        left = u[0] * v[1] - u[1] * v[0] > 0.0
        label = _side_label(board, numbers[k], left=left)
        if label is not None:
            return label
    return None


def _side_label(board: Board, number: int, *, left: bool) -> int | None:
    """Give the face on one side of a piece: that of most nodes from which a step crosses it."""
    lattice = board.lattice
    nodes, d = np.nonzero(np.abs(lattice.crossed) == number)
    middle = np.abs(lattice.share[nodes, d] - 0.5) < 0.3
    nodes, d = nodes[middle], d[middle]
    there = nodes + DY[d] * lattice.width + DX[d]
    # A positive step runs from the right of the piece to its left.
    ends_left = lattice.crossed[nodes, d] > 0
    side = np.where(ends_left == left, there, nodes)
    labels = board.labels[side]
    labels = labels[labels >= 0]
    if len(labels) == 0:
        return None
    values, counts = np.unique(labels, return_counts=True)
    return int(values[np.argmax(counts)])


def relay(
    board: Board, curve: Curve, arcs: Arcs, k: int, corner_mm: float, *, stepwise: bool
) -> Ints | None:
    """Lay one face's part of a curve anew, from where it comes in to where it goes out."""
    arc, closed = arcs[k], board.lattice.closed
    coming = int(arcs[k - 1][-1]) if curve.closed or k else -1
    way = _way(board, coming, int(arc[0])) if coming >= 0 else -1
    starts = Starts(arc[:1], np.array([way]), np.zeros(1))
    course, before = board.lattice.at(arc), closed.copy()
    out: Door | Starts = Starts(arc[-1:], np.array([-1]), np.zeros(1))
    if curve.closed or k < len(arcs) - 1:
        after = int(arcs[(k + 1) % len(arcs)][0])
        way = _way(board, int(arc[-1]), after)
        out = Door(_number(board, int(arc[-1]), way), 0.0, 1.0, int(arc[-1]), way)
        closed[after] = False
    if stepwise:
        laid = search_stepwise(board, starts, course, out, corner_mm)
    else:
        found = search(board, starts, [(course, out)], corner_mm=corner_mm)
        laid = found[0] if found else None
    closed[:] = before
    return laid


def _number(board: Board, node: int, way: int) -> int:
    """Give what a step crosses."""
    lattice = board.lattice
    if way < 4:
        return int(lattice.crossed[node, way])
    there = node + int(DY[way]) * lattice.width + int(DX[way])
    return -int(lattice.crossed[there, way - 4])


def occupy(board: Board, arcs: Arcs, *, closed: bool) -> None:
    """Close what a curve takes, so that no other crosses or touches it."""
    nodes = np.concatenate(arcs)
    lattice = board.lattice
    lattice.closed[nodes] = True
    steps = zip(nodes, np.roll(nodes, -1), strict=True) if closed else itertools.pairwise(nodes)
    for a, b in steps:
        dx, dy = (
            int(b % lattice.width - a % lattice.width),
            int(b // lattice.width - a // lattice.width),
        )
        if abs(dx) == 1 and abs(dy) == 1:
            low = a if dy > 0 else b
            rising = dx * dy > 0
            corner = low + (1 if rising else -1)
            lattice.crossed[corner, 3 if rising else 1] = SEVERAL


def keep_off(board: Board, arcs: Arcs) -> None:
    """Let other curves rather not come near to one, so that water shows as water."""
    lattice = board.lattice
    nodes = np.concatenate(arcs)
    window = window_of(lattice, lattice.at(nodes), BANKS_MM)
    around = nodes_of(lattice, window)
    free = ~np.isin(around, nodes).reshape(window[3] - window[1] + 1, -1)
    away = ndimage.distance_transform_edt(free).ravel() * lattice.pitch
    lattice.cost[around] += _BESIDE_BANK * np.clip(1.0 - away / BANKS_MM, 0.0, 1.0)
