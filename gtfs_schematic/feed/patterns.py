"""Reading stop_times.txt and gathering the trips of the service date into patterns."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed.calendars import Headway
from gtfs_schematic.feed.calls import Calls
from gtfs_schematic.feed.model import Pattern
from gtfs_schematic.feed.routes import Trip

T = TypeVar("T", int, str)


@dataclass(frozen=True, slots=True)
class _Run:
    """One trip's calls."""

    trip: Trip
    arrivals_s: NDArray[np.int64]
    departures_s: Sequence[int]


def gather_patterns(
    trips: Sequence[Trip],
    stop_ids: Sequence[str],
    calls: Calls,
    headways: Mapping[str, tuple[Headway, ...]],
) -> tuple[Pattern, ...]:
    """Gather trips that call at the same stops in the same order.

    Parameters
    ----------
    trips, stop_ids
        What the numbers in `calls` stand for.
    headways
        Per trip id the rows of frequencies.txt; such a trip is counted out, and its own times
        only give the time from stop to stop.

    Returns
    -------
    tuple of Pattern
        Sorted by their fields. Direction, headsign and shape are those of most departures; of
        equal ones the least.
    """
    groups: defaultdict[tuple[str, bytes], list[_Run]] = defaultdict(list)
    for start, end in calls.spans():
        trip = trips[calls.trip[start]]
        first = int(calls.departure[start])
        rows = headways.get(trip.id)
        departures = [s for row in rows for s in row.departures] if rows else [first]
        run = _Run(trip, calls.arrival[start:end] - first, departures)
        groups[trip.route_id, calls.stop[start:end].tobytes()].append(run)
    patterns = [
        _pattern(route_id, [stop_ids[n] for n in np.frombuffer(key, calls.stop.dtype)], runs)
        for (route_id, key), runs in groups.items()
    ]
    return tuple(sorted(patterns, key=pattern_key))


def pattern_key(pattern: Pattern) -> tuple[object, ...]:
    """Give what patterns are sorted by: their fields, None first."""
    return (
        pattern.route_id,
        -1 if pattern.direction_id is None else pattern.direction_id,
        pattern.headsign,
        pattern.shape_id or "",
        pattern.stop_ids,
        pattern.departures_s,
        pattern.offsets_s,
    )


def _pattern(route_id: str, stop_ids: list[str], runs: list[_Run]) -> Pattern:
    weights = [len(run.departures_s) for run in runs]
    offsets = np.repeat(np.stack([run.arrivals_s for run in runs]), weights, axis=0)
    median = np.rint(np.median(offsets, axis=0)).astype(np.int64)
    median[0] = 0
    directions = _most_common((r.trip.direction_id, w) for r, w in zip(runs, weights, strict=True))
    return Pattern(
        route_id,
        directions,
        _most_common((r.trip.headsign or None, w) for r, w in zip(runs, weights, strict=True))
        or "",
        _most_common((r.trip.shape_id or None, w) for r, w in zip(runs, weights, strict=True)),
        tuple(stop_ids),
        tuple(sorted(s for run in runs for s in run.departures_s)),
        tuple(int(n) for n in np.maximum.accumulate(median)),
    )


def _most_common(values: Iterable[tuple[T | None, int]]) -> T | None:
    """Give the value of most weight that is not None; of equal ones the least."""
    weights: Counter[T] = Counter()
    for value, weight in values:
        if value is not None:
            weights[value] += weight
    return min(weights, key=lambda value: (-weights[value], value), default=None)
