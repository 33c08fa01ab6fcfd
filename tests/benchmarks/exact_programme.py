"""Ask an exact solver how much better than the engine's placement a drawing can be.

    PYTHONPATH=tests python tests/benchmarks/exact_programme.py [--seconds 60] [FEED...]

The programme is that of Nöllenburg and Wolff (2011), IEEE TVCG 17(5):626-641, from memory, for CP-
SAT: every piece between two vertices has the joints that the engine gave it, at least two; every
segment takes one of the eight directions (those of its true sector and the two beside it, and the
engine's); the order round every vertex is kept; segments that share no end keep a step apart, in
whichever of the eight directions, asked for only where a solution breaks it. Minimised are bends of
lines (1, 2, 3 for 135, 90, 45 degrees), segments off their true sector, and length, each times its
weight. The engine's placement minimises other prices and leaves lengths to a later stage: here it
gets the shortest lengths that its directions allow, is scored by the same function, and is where
the solver starts. Printed: the three terms of both, the sums, the bound, and the gaps.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import itertools
import math
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import shapely
from ortools.sat.python import cp_model
from sized_networks import KINDS

from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.layout.engine import place
from gtfs_schematic.layout.model import LayoutSettings
from gtfs_schematic.layout.skeleton import STEP, Skeleton
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

WEIGHTS = (6, 4, 1)
"""Of a bend, a segment off its sector, and a lattice step of length (six to a station spacing)."""
_STEPS = 6
_MOST_ROUNDS = 30


@dataclass(frozen=True)
class Drawing:
    """Segments between whole-number nodes, and everything that the programme asks of them."""

    start: np.ndarray
    """Nodes of the engine's placement, lattice steps, shape (k, 2)."""
    segments: np.ndarray
    """Shape (m, 2)."""
    sectors: np.ndarray
    """True sector of each segment, shape (m,)."""
    turns: tuple[tuple[int, int, int, int, int], ...]
    """Per passing of lines: segment, its end (0 or 1) there, the other, its end, count of lines."""
    around: tuple[tuple[tuple[int, int], ...], ...]
    """Per vertex the segment ends round it, counter-clockwise."""
    least: np.ndarray
    """Least length of each segment, steps, shape (m,)."""


def drawing_of(skeleton: Skeleton) -> Drawing:
    """Read the engine's placement."""
    graph = skeleton.graph
    start = np.rint(skeleton.points * _STEPS).astype(np.int64)
    start = start - start.min(axis=0) + 2 * _STEPS
    sectors = np.zeros(len(skeleton.segments), dtype=np.int64)
    turns: list[tuple[int, int, int, int, int]] = []
    for p, course in enumerate(skeleton.courses):
        a, b = (graph.points[v] for v in graph.pieces[p].ends)
        sectors[list(course)] = round(math.atan2(b[1] - a[1], b[0] - a[0]) / (math.pi / 4)) % 8
        lines = len(graph.pieces[p].lines)
        turns += [(j, 1, k, 0, lines) for j, k in itertools.pairwise(course) if lines]
    ends = {}
    for p, course in enumerate(skeleton.courses):
        ends[2 * p], ends[2 * p + 1] = (course[0], 0), (course[-1], 1)
    turns += [(*ends[a], *ends[b], count) for _, a, b, count in graph.through]
    around = tuple(tuple(ends[end] for end in rotation) for rotation in graph.rotation)
    length = np.abs(start[skeleton.segments[:, 1]] - start[skeleton.segments[:, 0]]).max(axis=1)
    return Drawing(
        start, skeleton.segments, sectors, tuple(turns), around, np.minimum(length, _STEPS // 2)
    )


class Programme:
    """The programme of one drawing; crossings are forbidden as they turn up."""

    def __init__(self, drawing: Drawing, directions: Sequence[int], *, turning: bool) -> None:
        self.drawing, self.model = drawing, cp_model.CpModel()
        side = int(drawing.start.max()) + 2 * _STEPS
        self.nodes = [
            [self.model.new_int_var(0, side, "") for _ in range(2)] for _ in drawing.start
        ]
        self.length = [self.model.new_int_var(int(v), side, "") for v in drawing.least]
        self.choice: list[dict[int, cp_model.IntVar]] = []
        self.heading: list[cp_model.IntVar] = []
        for k, own in enumerate(directions):
            self._segment(k, own, turning=turning)
        for ends in drawing.around:
            self._order(ends)
        self.bends = [self._bend(*turn) for turn in drawing.turns]
        off = [1 - self.choice[k].get(int(s), 0) for k, s in enumerate(drawing.sectors)]
        bend, sector, length = WEIGHTS
        lines = [turn[4] for turn in drawing.turns]
        self.model.minimize(
            bend * sum(n * b for n, b in zip(lines, self.bends, strict=True))
            + sector * sum(off)
            + length * sum(self.length)
        )
        for node, place_ in zip(self.nodes, drawing.start, strict=True):
            for variable, value in zip(node, place_, strict=True):
                self.model.add_hint(variable, int(value))
        for k, own in enumerate(directions):
            for d, literal in self.choice[k].items():
                self.model.add_hint(literal, d == own)

    def _segment(self, k: int, own: int, *, turning: bool) -> None:
        model, sector = self.model, int(self.drawing.sectors[k])
        (ax, ay), (bx, by) = (self.nodes[int(v)] for v in self.drawing.segments[k])
        allowed = sorted({(sector + turn) % 8 for turn in (-1, 0, 1) if turning} | {int(own)})
        literals = {d: model.new_bool_var("") for d in allowed}
        model.add_exactly_one(literals.values())
        for d, literal in literals.items():
            dx, dy = (int(v) for v in STEP[d])
            model.add(bx - ax == dx * self.length[k]).only_enforce_if(literal)
            model.add(by - ay == dy * self.length[k]).only_enforce_if(literal)
        heading = model.new_int_var(0, 7, "")
        model.add(heading == sum(d * literal for d, literal in literals.items()))
        self.choice.append(literals)
        self.heading.append(heading)

    def _leaving(self, k: int, end: int) -> cp_model.IntVar:
        """Direction in which a segment leaves the node at one of its ends."""
        if end == 0:
            return self.heading[k]
        back = self.model.new_int_var(0, 7, "")
        self.model.add_modulo_equality(back, self.heading[k] + 4, 8)
        return back

    def _order(self, ends: tuple[tuple[int, int], ...]) -> None:
        if len(ends) < 2:
            return
        leaving = [self._leaving(*end) for end in ends]
        last = [self.model.new_bool_var("") for _ in ends]
        self.model.add_exactly_one(last)
        for here, there, wrap in zip(leaving, leaving[1:] + leaving[:1], last, strict=True):
            self.model.add(here + 1 <= there + 8 * wrap)

    def _bend(self, j: int, one: int, k: int, other: int, _lines: int) -> cp_model.IntVar:
        model = self.model
        gap, turn = model.new_int_var(0, 7, ""), model.new_int_var(0, 3, "")
        model.add_modulo_equality(gap, self._leaving(j, one) - self._leaving(k, other) + 8, 8)
        # Straight on is 4 apart; 1 and 7 are the sharpest turns, 0 would lie on itself.
        model.add_allowed_assignments([gap, turn], [(g, abs(4 - g)) for g in range(1, 8)])
        return turn

    def keep_apart(self, j: int, k: int) -> None:
        """Hold two segments a step apart along one of the eight directions."""
        model, literals = self.model, []
        for dx, dy in STEP.tolist():
            literal = model.new_bool_var("")
            literals.append(literal)
            for a, b in itertools.product(*(self.drawing.segments[i] for i in (j, k))):
                (ax, ay), (bx, by) = self.nodes[int(a)], self.nodes[int(b)]
                model.add(dx * (ax - bx) + dy * (ay - by) >= 1).only_enforce_if(literal)
        model.add_bool_or(literals)


def touching(drawing: Drawing, points: np.ndarray) -> set[tuple[int, int]]:
    """Pairs of segments without a common end that meet."""
    lines = shapely.linestrings(points[drawing.segments].astype(float))
    pairs = shapely.STRtree(lines).query(lines, predicate="intersects").T
    segments = drawing.segments
    return {
        (int(j), int(k))
        for j, k in pairs
        if j < k and not set(segments[j].tolist()) & set(segments[k].tolist())
    }


def terms(drawing: Drawing, points: np.ndarray) -> tuple[int, int, int]:
    """Bends, segments off their sector, and length of any drawing."""
    step = points[drawing.segments[:, 1]] - points[drawing.segments[:, 0]]
    headings = np.rint(np.arctan2(step[:, 1], step[:, 0]) / (math.pi / 4)).astype(int) % 8
    bends = 0
    for j, one, k, other, lines in drawing.turns:
        gap = (headings[j] + 4 * one - headings[k] - 4 * other) % 8
        bends += lines * int(abs(4 - gap))
    off = int((headings != drawing.sectors).sum())
    return bends, off, int(np.abs(step).max(axis=1).sum())


def solve(
    drawing: Drawing, directions: Sequence[int], seconds: float, *, turning: bool = True
) -> tuple[np.ndarray, float]:
    """Solve, adding pairs that must stay apart; give the best planar drawing and the bound.

    Without `turning` the directions stay, and only lengths are chosen.
    """
    programme = Programme(drawing, directions, turning=turning)
    best, bound, asked = drawing.start, 0.0, set[tuple[int, int]]()
    until = time.monotonic() + seconds
    for _ in range(_MOST_ROUNDS):
        left = until - time.monotonic()
        if left <= 0.0:
            break
        solver = cp_model.CpSolver()
        solver.parameters.num_workers = 1
        solver.parameters.random_seed = 1
        solver.parameters.max_time_in_seconds = left
        status = solver.solve(programme.model)
        # Fewer rules than all only lower the optimum, so that every round's bound holds.
        bound = max(bound, solver.best_objective_bound)
        if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
            break
        found = np.array([[solver.value(v) for v in node] for node in programme.nodes])
        fresh = touching(drawing, found) - asked
        if not fresh and total(drawing, found) < total(drawing, best):
            best = found
        if not fresh:
            break
        for pair in sorted(fresh):
            programme.keep_apart(*pair)
        asked |= fresh
    return best, bound


def total(drawing: Drawing, points: np.ndarray) -> int:
    """Sum the three terms at their weights."""
    return sum(w * t for w, t in zip(WEIGHTS, terms(drawing, points), strict=True))


def main() -> None:
    """Compare on all networks asked for."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("feeds", type=Path, nargs="*")
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--sizes", type=int, nargs="*", default=[15, 30])
    parser.add_argument("--kinds", nargs="+", default=["radial", "tree", "wandering"])
    asked = parser.parse_args()
    print("network  segments  bends, off sector, length: engine | exact   sums  bound  gaps")
    for name, network in _networks(asked):
        begun = time.monotonic()
        skeleton = place(network, LayoutSettings()).skeleton
        placed = time.monotonic()
        drawing = drawing_of(skeleton)
        directions = skeleton.directions.tolist()
        # The engine chooses lengths later, by the sheet: here they are the programme's.
        own, _ = solve(drawing, directions, asked.seconds, turning=False)
        begin = time.monotonic()
        best, bound = solve(drawing, directions, asked.seconds)
        solved = time.monotonic()
        ours, theirs = total(drawing, own), total(drawing, best)
        if ours < theirs:
            best, theirs = own, ours
        print(
            f"{name}  {len(drawing.segments)}  {terms(drawing, own)} | "
            f"{terms(drawing, best)}  {ours} {theirs}  {bound:.0f}  engine over best "
            f"{100.0 * (ours / theirs - 1.0):.1f} %, over bound "
            f"{100.0 * (ours / max(bound, 1.0) - 1.0):.1f} %  "
            f"{placed - begun:.1f} s, {solved - begin:.1f} s",
            flush=True,
        )


def _networks(asked: argparse.Namespace) -> Iterator[tuple[str, Network]]:
    for size, kind in itertools.product(asked.sizes, asked.kinds):
        yield f"{kind} {size}", KINDS[kind](size, 1)
    for feed in asked.feeds:
        yield feed.stem, build_network(read_feed([feed], FeedSettings()), NetworkSettings())


if __name__ == "__main__":
    main()
