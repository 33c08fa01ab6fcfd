"""Put smoothed stations back evenly, and give every link and walk its own path."""

from __future__ import annotations

import itertools
from collections import defaultdict

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Crossing, Layout, SheetFrame
from gtfs_schematic.layout.skeleton import Skeleton
from gtfs_schematic.layout.snap import UNITS_PER_MM
from gtfs_schematic.network.model import Network

_Place = tuple[int, int]

_STUB_MM = 2.2
"""Distance that a smoothed station keeps from a bend where it can."""


def restore(
    network: Network,
    skeleton: Skeleton,
    places: NDArray[np.int64],
    frame: SheetFrame,
    part_wants: tuple[NDArray[np.float64], ...],
) -> Layout:
    """Unfold a settled skeleton into a layout.

    Parameters
    ----------
    network
        The network that the skeleton draws.
    skeleton, places
        Directions, and the nodes in units of 1 / `UNITS_PER_MM` mm, y down, shape (k, 2).
    frame
        The sheet.
    part_wants
        Per piece of each part the wanted share, and the least length in millimetres.
    """
    graph = skeleton.graph
    at: dict[str, _Place] = {}
    for v, station in enumerate(graph.station_of):
        if station is not None:
            at[station] = _place(places[v])
    runs: dict[str, list[list[_Place]]] = defaultdict(list)
    for p, piece in enumerate(graph.pieces):
        corners = [_place(places[node]) for node in skeleton.polyline(p)]
        stops = stops_on(corners, part_wants[p])
        at.update(zip(piece.stations, (place for place, _ in stops), strict=True))
        for part, run in zip(piece.parts, _cut(corners, stops), strict=True):
            for owner, forward in ((part.owner, part.forward), *piece.others):
                runs[owner].append(run if forward else run[::-1])
    positions = {station: _point(at[station]) for station in sorted(at)}
    paths = {link.id: _join(runs[link.id], at[link.start]) for link in network.links}
    walks = {walk.id: _join(runs[walk.id], at[walk.start]) for walk in network.walks}
    return Layout(network, frame, positions, paths, walks, _crossings(skeleton, places))


def _place(row: NDArray[np.int64]) -> _Place:
    return int(row[0]), int(row[1])


def _point(place: _Place) -> Point:
    return place[0] / UNITS_PER_MM, place[1] / UNITS_PER_MM


def stops_on(corners: list[_Place], wants: NDArray[np.float64]) -> list[tuple[_Place, int]]:
    """Places of the stations on a piece, each with the number of the segment it stands on."""
    points = np.array(corners, dtype=np.float64)
    ends = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    lengths = _share_out(float(ends[-1]), wants[:, 0], wants[:, 1] * UNITS_PER_MM)
    stops: list[tuple[_Place, int]] = []
    for t, gap in zip(np.cumsum(lengths)[:-1], np.minimum(lengths[:-1], lengths[1:]), strict=True):
        s = _off_bends(float(t), ends, min(_STUB_MM * UNITS_PER_MM, 0.3 * float(gap)))
        k = min(max(int(np.searchsorted(ends, s, side="right")) - 1, 0), len(corners) - 2)
        (ax, ay), (bx, by) = corners[k], corners[k + 1]
        steps = max(abs(bx - ax), abs(by - ay))
        step = round((s - ends[k]) / max(ends[k + 1] - ends[k], 1e-9) * steps)
        place = (ax + step * (bx > ax) - step * (bx < ax), ay + step * (by > ay) - step * (by < ay))
        stops.append((place, k))
    return stops


def _share_out(
    total: float, shares: NDArray[np.float64], least: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Share a length out in proportion, but to each its least length first."""
    if total <= least.sum():
        return np.asarray(least * (total / least.sum()))
    if total <= least.sum() * (1.0 + 1e-9):
        return np.asarray(least)
    short = np.zeros(len(shares), dtype=bool)
    while True:
        rest = total - least[short].sum()
        lengths = np.where(short, least, shares * (rest / shares[~short].sum()))
        fresh = (lengths < least) & ~short
        if not fresh.any():
            return np.asarray(lengths)
        short |= fresh


def _off_bends(s: float, ends: NDArray[np.float64], stub: float) -> float:
    """Move a station along the piece to the nearest place that is `stub` off every bend."""
    bends = ends[1:-1]
    if not len(bends) or np.abs(bends - s).min() >= stub:
        return s
    choices = [
        t
        for t in sorted(np.concatenate([bends - stub, bends + stub]), key=lambda t: abs(t - s))
        if np.abs(bends - t).min() >= stub - 1e-6
    ]
    return float(choices[0]) if choices and abs(choices[0] - s) <= 2.0 * stub else s


def _cut(corners: list[_Place], stops: list[tuple[_Place, int]]) -> list[list[_Place]]:
    """Cut a polyline at its stops."""
    runs: list[list[_Place]] = []
    run, at = [corners[0]], 0
    for place, k in stops:
        run += [*corners[at + 1 : k + 1], place]
        runs.append(run)
        run, at = [place], k
    runs.append([*run, *corners[at + 1 :]])
    return runs


def _join(runs: list[list[_Place]], start: _Place) -> tuple[Point, ...]:
    """Chain the runs of one link from its start; drop repeats and points on a straight."""
    waiting = sorted(runs)
    course = [start]
    while waiting:
        run = next(run for run in waiting if run[0] == course[-1])
        waiting.remove(run)
        course += run[1:]
    course = [point for point, _ in itertools.groupby(course)]
    kept = [course[0]]
    for before, here, after in zip(course, course[1:], course[2:], strict=False):
        first = np.sign(here[0] - before[0]), np.sign(here[1] - before[1])
        second = np.sign(after[0] - here[0]), np.sign(after[1] - here[1])
        if first != second:
            kept.append(here)
    if len(course) > 1:
        kept.append(course[-1])
    return tuple(_point(place) for place in kept)


def _crossings(skeleton: Skeleton, places: NDArray[np.int64]) -> tuple[Crossing, ...]:
    graph = skeleton.graph
    owners: dict[int, set[str]] = defaultdict(set)
    for piece in graph.pieces:
        for v, part in ((piece.ends[0], piece.parts[0]), (piece.ends[1], piece.parts[-1])):
            if graph.station_of[v] is None and v not in graph.forks:
                owners[v].add(part.owner)
    found = []
    for v in sorted(owners):
        first, second = sorted(owners[v])
        found.append(Crossing(first, second, _point(_place(places[v]))))
    return tuple(sorted(found, key=lambda c: (c.first, c.second, c.at_mm)))
