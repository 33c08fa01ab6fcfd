"""Give way: move as little as possible until a drawing has all its distances again.

Directions and sides of the drawing are kept, so everything is linear, as in `layout.settle`; but
the goal is another: every station stays where it is (least sum of moves along x and y, which moves
few of them), and what is not free does not move at all. What stood too near before may stay so.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, field

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.optimize import linprog

from gtfs_schematic.errors import InternalFaultError
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.draft import Draft
from gtfs_schematic.layout.figure import Figure
from gtfs_schematic.layout.rows import Rows
from gtfs_schematic.layout.separation import near_pairs, separate
from gtfs_schematic.layout.skeleton import STEP
from gtfs_schematic.layout.snap import snap

_AIR_MM = 0.5
"""What two new neighbours get beside twice the gap of lines, as where all is laid out anew."""
_CORNER = 0.85
"""Length that two 45-degree corners of one radius take: 2 tan(22.5°) of that radius."""
_WALK_SHARE = 0.75
_STATION, _BEND, _NEW, _SHORT = 1.0, 0.1, 0.01, 0.05
"""Prices of a millimetre: a station moved, a bend moved, what is new away from its first place,
and a new link shorter than a station spacing."""
_LEEWAY_MM = 3.0
_MOST_REPAIRS = 12
_SLACK = 1e-4
OUTSIDE_MM = 0.05
"""What stands outside the frame by less is there for rounding."""
_STILL_MM = 0.004
"""Moves below this are the solver's, not the drawing's."""


@dataclass(frozen=True)
class Free:
    """What may move, and how."""

    stations: Collection[str]
    edges: Collection[str]
    """Edges whose bends may move though their stations may not."""
    fresh: Collection[str]
    """Edges that are laid now: all their distances must be kept."""
    home: Mapping[str, Point]
    """Places of the stations that stood before, millimetres, y down."""
    pins: Mapping[str, Point] = field(default_factory=dict)
    """Places that stations must get, likewise."""
    even: float = 0.0
    """From 0, only what must moves, to 1, links are as even as directions allow."""


def give_way(draft: Draft, free: Free) -> Draft | None:
    """Move what is free until every distance is kept; None if that is not enough."""
    programme = _Programme(draft, free)
    points = programme.solved()
    if points is None:
        return None
    figure = programme.figure
    still = np.abs(points - figure.skeleton.points).max(axis=1) < _STILL_MM
    points[still] = figure.skeleton.points[still]
    pinned = np.zeros(len(points), dtype=bool)
    pinned[: len(figure.stations)] = [s in free.pins for s in figure.stations]
    for fixed in (still | pinned | ~programme.free, pinned | ~programme.free):
        try:
            units = snap(figure.skeleton, points, frozenset(np.flatnonzero(fixed).tolist()))
        except InternalFaultError:
            continue
        return figure.drawn(draft, units)
    return None


class _Programme:
    """The linear programme: columns x, y per node, then what is away from home, then lacks."""

    def __init__(self, draft: Draft, free: Free) -> None:
        self.draft, self.wish = draft, free
        self.figure = Figure.of(draft)
        skeleton = self.figure.skeleton
        self.half = self.figure.half_widths(draft)
        self.fresh = np.isin(self.figure.edges, sorted(free.fresh))
        self.owner = skeleton.piece_of
        self.free = self._free_nodes()
        self.lines = self.figure.lines
        self.columns = np.arange(2 * len(skeleton.points)).reshape(2, -1)

    def _free_nodes(self) -> NDArray[np.bool_]:
        figure, wish = self.figure, self.wish
        free = np.zeros(len(figure.skeleton.points), dtype=bool)
        stations = set(wish.stations) | {s for s in figure.stations if s not in wish.home}
        stations |= set(wish.pins)
        free[: len(figure.stations)] = [s in stations for s in figure.stations]
        for e, key in enumerate(figure.edges):
            nodes = figure.skeleton.polyline(e)
            if key in wish.edges or self.fresh[e] or free[[nodes[0], nodes[-1]]].any():
                free[nodes[1:-1]] = True
        return free

    def solved(self) -> NDArray[np.float64] | None:
        """Solve; again with the pairs that a solution brought too near, until none is."""
        skeleton = self.figure.skeleton
        reach = 2.0 * float(self.half.max()) + self._clear + _LEEWAY_MM
        pairs = self._matter(near_pairs(skeleton, skeleton.points, reach))
        for _ in range(_MOST_REPAIRS):
            points = self._solve(pairs)
            if points is None:
                return None
            near = self._matter(near_pairs(skeleton, points, reach - _LEEWAY_MM))
            lines = shapely.linestrings(points[skeleton.segments])
            gaps = shapely.distance(lines[near[:, 0]], lines[near[:, 1]])
            near = near[gaps < self._wanted(near) - _SLACK]
            count = len(skeleton.segments)
            fresh = near[~np.isin(near @ [count, 1], pairs @ [count, 1])]
            if not len(fresh):
                return points
            pairs = np.concatenate([pairs, fresh])
        return None

    @property
    def _clear(self) -> float:
        return 2.0 * self.draft.clearances.line_gap_mm + _AIR_MM

    def _matter(self, pairs: NDArray[np.int64]) -> NDArray[np.int64]:
        """Pairs of which something may move."""
        segments = self.figure.skeleton.segments
        free = self.free[segments[pairs]].any(axis=(1, 2))
        return pairs[free]

    def _wanted(self, pairs: NDArray[np.int64]) -> NDArray[np.float64]:
        """Distance that each pair must keep: what stood nearer before may stay so."""
        full = self.half[pairs].sum(axis=1) + self._clear
        now = shapely.distance(self.lines[pairs[:, 0]], self.lines[pairs[:, 1]])
        fresh = self.fresh[self.owner[pairs]].any(axis=1)
        return np.asarray(np.where(fresh, full, np.minimum(full, now - _SLACK)))

    def _solve(self, pairs: NDArray[np.int64]) -> NDArray[np.float64] | None:
        skeleton = self.figure.skeleton
        k, e = len(skeleton.points), len(self.figure.edges)
        most, equal = Rows(), Rows()
        away = np.arange(2 * k, 4 * k).reshape(2, k)
        short = np.arange(4 * k, 4 * k + e)
        width = 4 * k + e
        self._keep_directions(equal, most)
        self._keep_lengths(most, short)
        crossing = shapely.crosses(self.lines[pairs[:, 0]], self.lines[pairs[:, 1]])
        self._keep_apart(most, pairs[~crossing])
        self._keep_crossed(most, pairs[crossing])
        home = self._home()
        for axis in (0, 1):
            x, d = self.columns[axis], away[axis]
            most.add([(x, 1.0), (d, -1.0)], home[:, axis])
            most.add([(x, -1.0), (d, -1.0)], -home[:, axis])
        upper, right = most.matrix(width)
        matrix, zero = equal.matrix(width)
        solution = linprog(
            self._cost(away, short, width),
            A_ub=upper, b_ub=right, A_eq=matrix, b_eq=zero,
            bounds=self._bounds(width), method="highs",
        )  # fmt: skip
        if not solution.success:
            return None
        # Rounded, so that the last bits of different processors decide nothing further on.
        return np.asarray(np.round(solution.x[: 2 * k].reshape(2, k).T, 6))

    def _home(self) -> NDArray[np.float64]:
        home = self.figure.skeleton.points.copy()
        for i, station in enumerate(self.figure.stations):
            if station in self.wish.home:
                x, y = self.wish.home[station]
                home[i] = (x, -y)
        return home

    def _bounds(self, width: int) -> NDArray[np.float64]:
        skeleton, frame = self.figure.skeleton, self.draft.frame
        bounds = np.zeros((width, 2))
        bounds[:, 1] = np.inf
        sides = ((frame.left_mm, frame.right_mm), (-frame.bottom_mm, -frame.top_mm))
        for axis in (0, 1):
            here = skeleton.points[:, axis]
            low, high = sides[axis]
            # What stands a little outside for rounding may stay there.
            least = np.where(here > low - OUTSIDE_MM, np.minimum(low, here), low)
            most = np.where(here < high + OUTSIDE_MM, np.maximum(high, here), high)
            bounds[self.columns[axis], 0] = np.where(self.free, least, here)
            bounds[self.columns[axis], 1] = np.where(self.free, most, here)
        for i, station in enumerate(self.figure.stations):
            if station in self.wish.pins:
                x, y = self.wish.pins[station]
                bounds[self.columns[:, i]] = np.array([[x, x], [-y, -y]])
        return bounds

    def _cost(
        self, away: NDArray[np.int64], short: NDArray[np.int64], width: int
    ) -> NDArray[np.float64]:
        cost = np.zeros(width)
        weight = np.full(len(self.free), _BEND)
        for i, station in enumerate(self.figure.stations):
            weight[i] = _STATION if station in self.wish.home else _NEW
        owner = self.figure.node_edges()
        weight[(owner >= 0) & self.fresh[owner]] = _NEW
        # The third power, so that a little relaxing already lets the worst even out.
        cost[away] = weight * max(0.05, (1.0 - self.wish.even) ** 3)
        cost[short] = np.where(self.fresh, _SHORT, self.wish.even)
        return cost

    def _keep_directions(self, equal: Rows, most: Rows) -> None:
        """Keep every segment on its direction, and at least as long as a corner takes."""
        skeleton = self.figure.skeleton
        matters = self.free[skeleton.segments].any(axis=1)
        a, b = skeleton.segments[matters].T
        step = STEP[skeleton.directions[matters]].astype(np.float64)
        x, y = self.columns
        # Along (u, v) the vector (dx, dy) has u dy − v dx = 0, whole numbers all.
        equal.add(
            [(y[b], step[:, 0]), (y[a], -step[:, 0]), (x[b], -step[:, 1]), (x[a], step[:, 1])], 0.0
        )
        length = np.hypot(step[:, 0], step[:, 1])
        now = np.hypot(*(skeleton.points[b] - skeleton.points[a]).T)
        wanted = _CORNER * (self.draft.clearances.marker_mm + self.half[matters])
        old = ~self.fresh[self.owner[matters]]
        least = np.where(old, np.minimum(wanted, now), wanted)
        u, v = (step / length[:, None]).T
        most.add([(x[b], -u), (x[a], u), (y[b], -v), (y[a], v)], -least + 1e-7)

    def _keep_lengths(self, most: Rows, short: NDArray[np.int64]) -> None:
        """Keep every edge at least its least length, and wish for a station spacing."""
        skeleton = self.figure.skeleton
        spacing, wish = self.draft.clearances.spacing_mm, self.draft.spacing()
        lengths = np.hypot(*np.diff(skeleton.points[skeleton.segments], axis=1)[:, 0].T)
        unit = STEP / np.hypot(STEP[:, :1], STEP[:, 1:])
        for e, key in enumerate(self.figure.edges):
            course = np.array(skeleton.courses[e])
            share = 1.0 if self.draft.edges[key].lines else _WALK_SHARE
            now = float(lengths[course].sum())
            least = share * spacing
            if not self.fresh[e]:
                least = min(least, now)
            a, b = skeleton.segments[course].T
            if not self.free[[*a, *b]].any():
                continue
            u, v = (unit[skeleton.directions[course]]).T
            x, y = self.columns
            nodes = np.concatenate([x[b], x[a], y[b], y[a]])[:, None]
            values = np.concatenate([-u, u, -v, v])
            single = list(zip(nodes, values.tolist(), strict=True))
            most.add(single, -least + 1e-7)
            if self.fresh[e] or self.wish.even > 0.0:
                most.add([*single, (short[e : e + 1], -1.0)], -share * wish)

    def _keep_apart(self, most: Rows, pairs: NDArray[np.int64]) -> None:
        """Keep the gap of every pair along the axis along which it is widest."""
        skeleton = self.figure.skeleton
        apart = separate(skeleton, pairs)
        gap = self.half[pairs].sum(axis=1) + self._clear
        fresh = self.fresh[self.owner[pairs]].any(axis=1)
        i, j = apart.facing(skeleton)
        normal = apart.normals()
        now = ((skeleton.points[i] - skeleton.points[j]) * normal).sum(axis=1)
        wanted = np.where(fresh, gap, np.minimum(gap, now))
        self._differ(most, (i, j), normal, wanted)

    def _keep_crossed(self, most: Rows, pairs: NDArray[np.int64]) -> None:
        """Keep the ends of each of two crossing segments on both sides of the other."""
        skeleton = self.figure.skeleton
        step = STEP[skeleton.directions]
        unit = step / np.hypot(step[:, :1], step[:, 1:])
        for one, other in (pairs.T, pairs[:, ::-1].T):
            normal = np.column_stack([-unit[other, 1], unit[other, 0]])
            a, b = skeleton.segments[one].T
            on = skeleton.segments[other, 0]
            side = ((skeleton.points[b] - skeleton.points[a]) * normal).sum(axis=1)
            normal = normal * np.sign(side)[:, None]
            fresh = self.fresh[self.owner[one]] | self.fresh[self.owner[other]]
            full = self.draft.clearances.marker_mm / 2.0 + self.half[other]
            for i, j in ((b, on), (on, a)):
                now = ((skeleton.points[i] - skeleton.points[j]) * normal).sum(axis=1)
                self._differ(most, (i, j), normal, np.where(fresh, full, np.minimum(full, now)))

    def _differ(
        self,
        most: Rows,
        nodes: tuple[NDArray[np.int64], NDArray[np.int64]],
        normal: NDArray[np.float64],
        least: NDArray[np.float64],
    ) -> None:
        """Let the first node lie at least so far before the second along a normal."""
        x, y = self.columns
        i, j = nodes
        terms = [(x[i], -normal[:, 0]), (x[j], normal[:, 0])]
        terms += [(y[i], -normal[:, 1]), (y[j], normal[:, 1])]
        most.add(terms, -least + 1e-7)
