"""The lattice with its vertices and paths: laying, lifting, rules at vertices, and cost."""

from __future__ import annotations

import math

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.layout import router
from gtfs_schematic.layout.lattice import BLOCKED, DX, DY, FREE, Lattice, direction, mark
from gtfs_schematic.layout.objective import Weights, port_bearing_costs, turn_costs
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.router import Prices, Trip

_MARGIN_SPACINGS = 5.0


class Board:
    """Mutable state of the lattice stages; vertices are 0 … n − 1, piece p has code n + p.

    Coordinates are lattice steps, `unit` of them to a station spacing, y north. A vertex keeps
    its eight neighbours free for the ports of its own pieces, so vertices stand at least three
    steps apart and every port can be reached. Of the eight ports every `stride`-th is used.
    """

    def __init__(
        self,
        graph: PlaneGraph,
        anchors: NDArray[np.float64],
        weights: Weights,
        unit: int,
        stride: int = 1,
    ) -> None:
        self.graph, self.weights, self.unit, self.stride = graph, weights, unit, stride
        self.n = graph.n_vertices
        self.anchors = anchors - anchors.min(axis=0) + _MARGIN_SPACINGS
        self.place = np.full(self.n, -1, dtype=np.int64)
        self.paths: list[NDArray[np.int64] | None] = [None] * len(graph.pieces)
        self.ports = [-1] * (2 * len(graph.pieces))
        """Port through which each piece end leaves its vertex; -1 while it is not laid."""
        self.bearing_costs = [
            np.where(np.arange(8) % stride == 0, port_bearing_costs(bearing, weights), BLOCKED)
            for bearing in self._bearings().tolist()
        ]
        self.turns: list[list[tuple[int, int, int]]] = [[] for _ in range(2 * len(graph.pieces))]
        for v, a, b, count in graph.through:
            lines = count
            if graph.station_of[v] is None:
                lines = max(lines, weights.crossing_bend)
            lines = min(lines, weights.most_lines)
            self.turns[a].append((b, lines, v))
            self.turns[b].append((a, lines, v))
        self.position = {
            end: (v, k) for v, around in enumerate(graph.rotation) for k, end in enumerate(around)
        }
        extent = self.anchors.max(axis=0) + _MARGIN_SPACINGS
        self.width, self.height = (math.ceil(side * unit) + 1 for side in extent)
        size = self.width * self.height
        occupied, diagonals, guard = (np.full(size, FREE, dtype=np.int32) for _ in range(3))
        claims = np.zeros(size, dtype=np.int32)
        self.lattice = Lattice(self.width, self.height, occupied, diagonals, guard, claims)
        self.courses = [self._course(p) for p in range(len(self.graph.pieces))]
        self.bounds = [(*c.min(axis=0).tolist(), *c.max(axis=0).tolist()) for c in self.courses]
        self.prices = [self._prices(p) for p in range(len(self.graph.pieces))]

    def _course(self, p: int) -> NDArray[np.float64]:
        points = self.anchors[list(self.graph.pieces[p].nodes)] * self.unit
        line = shapely.LineString(points).simplify(0.3 * self.unit, preserve_topology=False)
        return np.array(line.coords)

    def _bearings(self) -> NDArray[np.float64]:
        """Measure the true bearing of every piece end a spacing or so along, radians."""
        bearings = np.zeros(2 * len(self.graph.pieces))
        for p, piece in enumerate(self.graph.pieces):
            points = self.anchors[list(piece.nodes)]
            for i, run in enumerate((points, points[::-1])):
                line = shapely.LineString(run)
                ahead = line.interpolate(min(1.5, line.length))
                bearings[2 * p + i] = math.atan2(ahead.y - run[0][1], ahead.x - run[0][0])
        return bearings

    def _prices(self, p: int) -> Prices:
        weights = self.weights
        piece = self.graph.pieces[p]
        lines = min(max(1, len(piece.lines)), weights.most_lines)
        low, high = weights.piece_bends
        share = weights.walk_share if piece.is_walk else 1.0
        return Prices(
            hop=round(weights.length * share),
            bend_135=round(low * lines * share),
            bend_90=round(high * lines * share),
            near=weights.near,
            course=round(weights.course * share),
            claim=weights.claim,
            unit=self.unit,
            stride=self.stride,
        )

    # ---- vertices and paths ----------------------------------------------------------------

    def put(self, v: int, node: int) -> None:
        """Stand vertex `v` on a node."""
        self.place[v] = node
        self.lattice.occupied[node] = v
        self._set_guard(node, v)

    def take(self, v: int) -> None:
        """Take vertex `v` off the lattice."""
        node = int(self.place[v])
        self.place[v] = -1
        self.lattice.occupied[node] = FREE
        self._set_guard(node, FREE)

    def _set_guard(self, node: int, value: int) -> None:
        for d in range(8):
            self.lattice.guard[node + int(DY[d]) * self.width + int(DX[d])] = value

    def lay(self, p: int, path: NDArray[np.int64]) -> None:
        """Lay the path of piece `p`, from its first end to its second."""
        self.paths[p] = path
        mark(path, self.n + p, self.lattice)
        self.ports[2 * p] = direction(path[0], path[1], self.width)
        self.ports[2 * p + 1] = direction(path[-1], path[-2], self.width)

    def lift(self, p: int) -> NDArray[np.int64]:
        """Lift the path of piece `p` and give it back."""
        path = self.paths[p]
        assert path is not None  # noqa: S101 - callers lift only what is laid
        mark(path, FREE, self.lattice)
        self.paths[p] = None
        self.ports[2 * p] = self.ports[2 * p + 1] = -1
        return path

    def acceptable(self, node: int) -> bool:
        """Whether a new vertex may stand on a node: it and all around are free of others."""
        x, y = node % self.width, node // self.width
        if not (2 <= x < self.width - 2 and 2 <= y < self.height - 2):
            return False
        block = (slice(y - 1, y + 2), slice(x - 1, x + 2))
        occupied = self.lattice.occupied.reshape(self.height, self.width)[block]
        guard = self.lattice.guard.reshape(self.height, self.width)[block]
        return bool((occupied == FREE).all() and (guard == FREE).all())

    def port_costs(self, end: int) -> NDArray[np.int64]:
        """Cost of every port for a piece end that is not laid: order, room for others, turns."""
        v, k = self.position[end]
        around = self.graph.rotation[v]
        degree = len(around)
        costs = self.bearing_costs[end].copy()
        ports = [self.ports[other] for other in around]
        before = after = None
        for step in range(1, degree):
            if before is None and ports[(k - step) % degree] >= 0:
                before = (ports[(k - step) % degree], step)
            if after is None and ports[(k + step) % degree] >= 0:
                after = (ports[(k + step) % degree], step)
        if before is not None and after is not None:
            gap = (after[0] - before[0] - 1) % 8 + 1
            for port in range(8):
                offset = (port - before[0]) % 8
                if not before[1] * self.stride <= offset <= gap - after[1] * self.stride:
                    costs[port] = BLOCKED
        for other, lines, _ in self.turns[end]:
            if self.ports[other] >= 0:
                costs += turn_costs(self.ports[other], lines, self.weights)
        return np.minimum(costs, BLOCKED)

    # ---- routing and cost ---------------------------------------------------------------------

    def xy(self, nodes: NDArray[np.int64]) -> NDArray[np.float64]:
        """Lattice coordinates of nodes, shape (n, 2)."""
        return np.column_stack([nodes % self.width, nodes // self.width]).astype(np.float64)

    def window(self, p: int, nodes: list[int], margin: float) -> tuple[int, int, int, int]:
        """Part of the lattice round a piece's course and `nodes`, `margin` spacings wider."""
        low_x, low_y, high_x, high_y = self.bounds[p]
        xs, ys = [n % self.width for n in nodes], [n // self.width for n in nodes]
        wide = margin * self.unit
        return (
            max(0, int(min(low_x, *xs) - wide)),
            max(0, int(min(low_y, *ys) - wide)),
            min(self.width - 1, int(max(high_x, *xs) + wide)),
            min(self.height - 1, int(max(high_y, *ys) + wide)),
        )

    def route(
        self, p: int, margin: float, limit: int = int(BLOCKED)
    ) -> tuple[int, NDArray[np.int64]]:
        """Find the cheapest path of piece `p` for less than `limit`; nothing is laid."""
        a, b = self.graph.pieces[p].ends
        nodes = [int(self.place[a]), int(self.place[b])]
        trip = Trip(
            a, nodes[0], b, nodes[1],
            self.port_costs(2 * p), self.port_costs(2 * p + 1),
            *self.window(p, nodes, margin),
        )  # fmt: skip
        return router.route(self.lattice, trip, self.courses[p], self.prices[p], limit)

    def anchor_cost(self, v: int, node: int) -> int:
        """Cost of vertex `v` standing on a node away from its anchor."""
        dx = node % self.width / self.unit - self.anchors[v, 0]
        dy = node // self.width / self.unit - self.anchors[v, 1]
        return round(self.weights.anchor * float(dx * dx + dy * dy))

    def cost(self, pieces: list[int], vertices: list[int]) -> int:
        """Cost of everything that the given pieces and vertices take part in."""
        total = sum(self.anchor_cost(v, int(self.place[v])) for v in vertices)
        own = set(pieces)
        for p in pieces:
            path = self.paths[p]
            assert path is not None  # noqa: S101 - asked only of laid pieces
            codes = (*self.graph.pieces[p].ends, self.n + p)
            total += router.path_cost(path, codes, self.lattice, self.courses[p], self.prices[p])
            for end in (2 * p, 2 * p + 1):
                port = self.ports[end]
                total += int(self.bearing_costs[end][port])
                for other, lines, _ in self.turns[end]:
                    # A turn between two of the pieces is met from both: count it once.
                    if other // 2 in own and other < end:
                        continue
                    there = self.ports[other]
                    if there >= 0:
                        total += int(turn_costs(there, lines, self.weights)[port])
        return total
