"""A fine lattice over a part of the sheet: what stands near its nodes, and what its steps cross."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
import shapely
from numba import njit
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.layout.obstacles import Obstacles

NEVER = np.int64(1) << 40
FREE, BLOCKED, MAYBE = -1, -2, -3
"""What a step crosses: nothing, what it must not, what it may; else the edge's number."""
SPACING = 1000
"""Price of a station spacing of length; all other prices are relative to it."""
DX = np.array([1, 1, 0, -1, -1, -1, 0, 1], dtype=np.int64)
DY = np.array([0, -1, -1, -1, 0, 1, 1, 1], dtype=np.int64)
"""Steps of the eight directions, 0 east, counter-clockwise as seen on the sheet (y down)."""

_STEP_MM = 0.6
_MOST_NODES = 60_000
_OFFSET = (0.137, 0.211)
"""Shift of the lattice in steps, so that hardly anything lies exactly on it."""
_THIN_MM = 0.2
"""Distance from a foreign centre line that even a thread keeps."""
_LACK = 1500
"""Price of a spacing run along where all of the clearance is lacking."""
_AWAY = 150
"""Price of a spacing run along at one spacing from where the ground wants the course."""
_END_AWAY = 700
"""Price of an end one spacing from where the ground wants it."""


@dataclass(frozen=True)
class Errand:
    """From where a course goes to where; millimetres, y down."""

    start: Point
    leaving: tuple[int, ...]
    """Directions in which it may leave, the best first."""
    end: Point
    arriving: tuple[int, ...] | None
    """Directions as seen from the end; None if the course only should end near there."""
    expected: shapely.LineString
    """Where the ground wants it."""
    spacing_mm: float
    ends: tuple[Point, ...]
    """Places where it may come near the edges that end there."""


@dataclass(frozen=True)
class FineLattice:
    """Nodes of a part of the sheet, row by row, and what stands near them."""

    left: float
    top: float
    step: float
    width: int
    height: int
    lack: NDArray[np.float64]
    """Share of the clearance that is lacking at each node."""
    cost: NDArray[np.int64]
    """Price of a step onto each node beside that of its length."""
    blocked: NDArray[np.bool_]
    code: NDArray[np.int64]
    """Per step to the east, north-east, north and north-west what it crosses."""

    @staticmethod
    def round_about(errand: Errand, frame: SheetFrame, margin: float) -> FineLattice:
        """Cover the errand with a margin of so many spacings, no further than the frame."""
        wide = margin * errand.spacing_mm
        x, y = np.array([errand.start, errand.end, *errand.expected.coords]).T
        left, right = max(frame.left_mm, x.min() - wide), min(frame.right_mm, x.max() + wide)
        top, bottom = max(frame.top_mm, y.min() - wide), min(frame.bottom_mm, y.max() + wide)
        step = max(_STEP_MM, math.sqrt((right - left) * (bottom - top) / _MOST_NODES))
        # The start lies a fixed share of a step off its node.
        left += (errand.start[0] - left) % step - _OFFSET[0] * step
        top += (errand.start[1] - top) % step - _OFFSET[1] * step
        width = max(2, math.floor((right - left) / step) + 2)
        height = max(2, math.floor((bottom - top) / step) + 2)
        size = width * height
        return FineLattice(
            left, top, step, width, height,
            np.zeros(size), np.zeros(size, dtype=np.int64), np.zeros(size, dtype=bool),
            np.full((4, size), FREE, dtype=np.int64),
        )  # fmt: skip

    def node(self, point: Point) -> int:
        """Nearest node of a point."""
        i = min(max(round((point[0] - self.left) / self.step), 0), self.width - 1)
        j = min(max(round((point[1] - self.top) / self.step), 0), self.height - 1)
        return j * self.width + i

    def point(self, node: int) -> Point:
        """Place of a node, millimetres."""
        x = self.left + node % self.width * self.step
        y = self.top + node // self.width * self.step
        return round(float(x), 2), round(float(y), 2)

    def points(self) -> NDArray[np.float64]:
        """Places of all nodes, shape (n, 2), millimetres."""
        number = np.arange(self.width * self.height)
        x = self.left + number % self.width * self.step
        return np.column_stack([x, self.top + number // self.width * self.step])

    def mark(self, obstacles: Obstacles, errand: Errand) -> None:
        """Mark what stands near the nodes, and price every step."""
        codes = np.full(len(obstacles.lines), BLOCKED)
        codes[obstacles.may] = MAYBE
        codes[obstacles.must] = np.flatnonzero(obstacles.must)
        ends = np.array(errand.ends, dtype=np.float64).reshape(-1, 2)
        for line, half, shared, code in zip(
            obstacles.lines, obstacles.half, obstacles.shared, codes, strict=True
        ):
            reach = float(half) + obstacles.width + obstacles.clear
            points = (np.array(line.coords) - (self.left, self.top)) / self.step
            own = (ends - (self.left, self.top)) / self.step if shared else np.zeros((0, 2))
            for a, b in itertools.pairwise(points):
                _mark(
                    (self.width, self.height),
                    (self.lack, self.blocked, self.code),
                    (a[0], a[1], b[0], b[1], reach / self.step, _THIN_MM / self.step, code),
                    own,
                )
        reach = obstacles.marker + obstacles.width + obstacles.clear
        for marker in obstacles.markers[~obstacles.own]:
            x, y = (marker.x - self.left) / self.step, (marker.y - self.top) / self.step
            sizes = (reach / self.step, 2.0 * _THIN_MM / self.step, FREE)
            known = (self.lack, self.blocked, self.code)
            _mark((self.width, self.height), known, (x, y, x, y, *sizes), np.zeros((0, 2)))
        away = shapely.distance(shapely.points(self.points()), errand.expected)
        share = self.lack * _LACK + away / errand.spacing_mm * _AWAY
        self.cost[:] = np.rint(share * self.step / errand.spacing_mm)

    def ending(self, errand: Errand) -> NDArray[np.int64]:
        """Price of ending at each node."""
        away = np.hypot(*(self.points() - errand.end).T) / errand.spacing_mm
        price = np.rint(away * _END_AWAY + self.lack * 3 * _LACK).astype(np.int64)
        return np.asarray(np.where(self.blocked, NEVER, price))


@njit(cache=True)
def _mark(
    size: tuple[int, int],
    known: tuple[NDArray[np.float64], NDArray[np.bool_], NDArray[np.int64]],
    segment: tuple[float, float, float, float, float, float, int],
    own: NDArray[np.float64],
) -> None:  # pragma: no cover - compiled
    """Mark the nodes near a segment and the steps across it; all lengths in steps.

    Round its `own` ends a course may come near it.
    """
    width, height = size
    lack, blocked, code = known
    ax, ay, bx, by, reach, thin, crossed = segment
    low_x, high_x = max(0, int(min(ax, bx) - reach - 1)), min(width, int(max(ax, bx) + reach + 2))
    low_y, high_y = max(0, int(min(ay, by) - reach - 1)), min(height, int(max(ay, by) + reach + 2))
    dx, dy = bx - ax, by - ay
    square = dx * dx + dy * dy
    for j in range(low_y, high_y):
        for i in range(low_x, high_x):
            node = j * width + i
            if not _is_near(i, j, own, 2.7 * reach):
                t = 0.0
                if square > 0.0:
                    t = min(1.0, max(0.0, ((i - ax) * dx + (j - ay) * dy) / square))
                away = math.hypot(i - ax - t * dx, j - ay - t * dy)
                lack[node] = max(lack[node], 1.0 - away / reach)
                blocked[node] |= away < thin and crossed < 0
            for d in range(4):
                # The lattice is a little off the station, so the first step proves nothing.
                r = _meets(i, j, d, (ax, ay, dx, dy))
                if r >= 0.0 and not _is_near(i + r * DX[d], j + r * DY[d], own, 1.0):
                    code[d, node] = crossed if code[d, node] == FREE else BLOCKED


@njit(cache=True)
def _meets(
    i: int, j: int, d: int, segment: tuple[float, float, float, float]
) -> float:  # pragma: no cover - compiled
    """Share of the step from a node at which it meets a segment (start, vector); else −1."""
    ax, ay, dx, dy = segment
    det = dx * DY[d] - dy * DX[d]
    if det == 0.0:
        return -1.0
    s = ((i - ax) * DY[d] - (j - ay) * DX[d]) / det
    r = ((i - ax) * dy - (j - ay) * dx) / det
    return r if 0.0 <= s <= 1.0 and 0.0 <= r <= 1.0 else -1.0


@njit(cache=True)
def _is_near(
    x: float, y: float, places: NDArray[np.float64], reach: float
) -> bool:  # pragma: no cover - compiled
    for k in range(places.shape[0]):
        if math.hypot(x - places[k, 0], y - places[k, 1]) < reach:
            return True
    return False
