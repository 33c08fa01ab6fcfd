"""The course on the ground of every pattern, from its shape or straight from stop to stop."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.network.patterns import Calling

Course = NDArray[np.float64]
"""A polyline in local metres, shape (n, 2)."""

_STEP_M = 20.0
"""Distance of the points at which a shape may be cut; small against any stop spacing."""
_ASTRAY_M = 250.0
"""A shape that leaves one of its stops this far aside is not trusted."""


@dataclass(frozen=True)
class Track:
    """Where one pattern runs: a section per step from station to station."""

    calling: Calling
    sections: tuple[Course, ...]
    shaped: bool
    """Whether the sections come from a shape."""

    @property
    def whole(self) -> Course:
        """All sections as one polyline."""
        return np.vstack(self.sections)


def track_of(
    calling: Calling,
    stops: Mapping[str, tuple[float, float]],
    sites: Mapping[str, tuple[float, float]],
    shape: Course | None,
) -> Track:
    """Cut a pattern's shape at its stops; without a good shape, join its stations straight.

    Parameters
    ----------
    calling
        The pattern.
    stops, sites
        Places of stops and stations in local metres.
    shape
        The pattern's shape in local metres, or None.
    """
    stations = np.array([sites[s] for s in calling.stations])
    if shape is not None and len(shape) > 1:
        platforms = np.array(
            [
                stops.get(s, sites[t])
                for s, t in zip(calling.stop_ids, calling.stations, strict=True)
            ]
        )
        cuts = _cut(shape, platforms)
        if cuts is not None:
            return Track(calling, cuts, shaped=True)
    straight = tuple(np.array([p, q]) for p, q in itertools.pairwise(stations))
    return Track(calling, straight, shaped=False)


def length_of(course: Course) -> float:
    """Give the length of a polyline, metres."""
    return float(np.hypot(*np.diff(course, axis=0).T).sum())


def samples(course: Course, step_m: float = _STEP_M) -> Course:
    """Give points on the polyline no further apart than `step_m`, its vertices among them."""
    if length_of(course) == 0.0:
        return course[[0, -1]]  # shapely divides no line that leads nowhere
    return np.asarray(
        shapely.get_coordinates(shapely.segmentize(shapely.linestrings(course), step_m))
    )


def _cut(shape: Course, stops: Course) -> tuple[Course, ...] | None:
    """Cut the shape where the sum of squared distances to the stops, in order, is least.

    Dynamic programme over (stop, sample): exact, and indifferent to loops and to shapes that
    run the same street twice. None if some stop lies too far off.
    """
    points = samples(shape)
    gaps = np.hypot(points[None, :, 0] - stops[:, None, 0], points[None, :, 1] - stops[:, None, 1])
    square = gaps**2
    best = square[0]
    came: list[NDArray[np.int64]] = []
    for row in square[1:]:
        lowest = np.minimum.accumulate(best)
        # The sample at which the running minimum was reached, for the way back.
        reached = np.where(best == lowest, np.arange(len(best)), 0)
        came.append(np.maximum.accumulate(reached))
        best = lowest + row
    at = [int(np.argmin(best))]
    for reached in reversed(came):
        at.append(int(reached[at[-1]]))
    at.reverse()
    if float(gaps[np.arange(len(stops)), at].max()) > _ASTRAY_M:
        return None
    return tuple(_piece(points, i, j) for i, j in itertools.pairwise(at))


def _piece(points: Course, first: int, last: int) -> Course:
    """Give the samples from first to last; two equal points where the cut fell on one."""
    return points[[first, first]] if first == last else points[first : last + 1]


def sections_by_pair(tracks: Sequence[Track]) -> dict[tuple[str, str], tuple[Course, bool]]:
    """Give, per pair of stations called at in a row (sorted ids), the section with most trips.

    A section from a shape goes before a straight one. It runs from the lesser id to the greater.
    """
    best: dict[tuple[str, str], tuple[tuple[bool, int, int], Course, bool]] = {}
    for n, track in enumerate(tracks):
        steps = itertools.pairwise(track.calling.stations)
        for (a, b), section in zip(steps, track.sections, strict=True):
            pair, course = ((a, b), section) if a < b else ((b, a), section[::-1])
            rank = (not track.shaped, -track.calling.trips, n)
            if pair not in best or rank < best[pair][0]:
                best[pair] = (rank, course, track.shaped)
    return {pair: (course, shaped) for pair, (_, course, shaped) in sorted(best.items())}
