"""Gathering the trips of the service dates into patterns."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import chain

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed.blocks import Masks
from gtfs_schematic.feed.calendars import Headway
from gtfs_schematic.feed.callrows import Calls, Ints
from gtfs_schematic.feed.dates import EVER
from gtfs_schematic.feed.interned import Interned
from gtfs_schematic.feed.model import Pattern
from gtfs_schematic.feed.trips import NO_DIRECTION, Trips


@dataclass(frozen=True)
class Hours:
    """Departures of some services within hours; seconds after noon minus 12 h."""

    services: Masks
    """Per service whether it runs."""
    low: int
    high: int
    """The first time that is too late."""
    shift: int
    """To be added to the departures."""


@dataclass(frozen=True)
class Runs:
    """What is known of the trips whose calls are gathered."""

    trips: Trips
    numbers: Ints
    """Per trip in the calls its number among all trips."""
    days: tuple[tuple[Hours, ...], ...]
    """A departure counts as often as in the day that has it most often."""
    headways: Mapping[int, tuple[Headway, ...]] = field(default_factory=dict)
    """Per number among all trips the rows of frequencies.txt; such a trip is counted out, and its
    own times only give the time from stop to stop."""

    @property
    def plain(self) -> bool:
        """Whether all departures of the trips count."""
        return len(self.days) == 1 and [(h.low, h.high, h.shift) for h in self.days[0]] == [
            (*EVER, 0)
        ]


def gather_patterns(runs: Runs, stop_ids: Sequence[str], calls: Calls) -> tuple[Pattern, ...]:
    """Gather trips that call at the same stops in the same order.

    Parameters
    ----------
    stop_ids
        What the numbers of stops in `calls` stand for.

    Returns
    -------
    tuple of Pattern
        Sorted by their fields. Direction, headsign and shape are those of most departures; of
        equal ones the least.
    """
    starts, ends = calls.bounds()
    numbers = runs.numbers[calls.trip[starts]]
    routes = runs.trips.route[numbers].tolist()
    groups: defaultdict[tuple[int, bytes], list[int]] = defaultdict(list)
    data, size = calls.stop.tobytes(), calls.stop.itemsize
    places = zip(routes, (starts * size).tolist(), (ends * size).tolist(), strict=True)
    for n, (route, start, end) in enumerate(places):
        groups[route, data[start:end]].append(n)
    patterns = []
    for (route, key), members in groups.items():
        chosen = numbers[members]
        firsts = starts[members]
        length = len(key) // size
        departures = [
            _departures(runs, trip, first)
            for trip, first in zip(chosen.tolist(), calls.departure[firsts].tolist(), strict=True)
        ]
        services = runs.trips.service[chosen].tolist()
        told = _united(runs, services, departures)
        if not told:
            continue
        weights = np.array([len(times) for times in departures])
        arrivals = calls.arrival[firsts[:, None] + np.arange(length)]
        patterns.append(
            Pattern(
                runs.trips.route_ids[route],
                _direction(runs.trips.direction[chosen], weights),
                _text(runs.trips.headsigns, runs.trips.headsign[chosen], weights) or "",
                _text(runs.trips.shapes, runs.trips.shape[chosen], weights) or None,
                tuple(stop_ids[n] for n in np.frombuffer(key, calls.stop.dtype).tolist()),
                told,
                _offsets(arrivals - calls.departure[firsts][:, None], weights),
            )
        )
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


def _departures(runs: Runs, trip: int, first: int) -> list[int]:
    """Give all departures of a trip on a day on which it runs."""
    rows = runs.headways.get(trip)
    return [s for row in rows for s in row.departures] if rows else [first]


def _united(
    runs: Runs, services: Sequence[int], departures: Sequence[Sequence[int]]
) -> tuple[int, ...]:
    """Give the departures of all days in order.

    A departure counts as often as on the day that has it most often (the union of multisets), so
    that trips that run on several days count once.
    """
    if runs.plain:
        return tuple(sorted(chain.from_iterable(departures)))
    union: Counter[int] = Counter()
    for day in runs.days:
        own: Counter[int] = Counter()
        for window in day:
            for service, times in zip(services, departures, strict=True):
                if window.services[service]:
                    own.update(t + window.shift for t in times if window.low <= t < window.high)
        union |= own
    return tuple(sorted(union.elements()))


def _offsets(arrivals: NDArray[np.signedinteger], weights: Ints) -> tuple[int, ...]:
    """Give the median time to every call, never running back; rows count by their weights."""
    if (arrivals == arrivals[0]).all():
        median = arrivals[0].copy()
    else:
        all_rows = np.repeat(arrivals, weights, axis=0)
        median = np.rint(np.median(all_rows, axis=0)).astype(np.int64)
    median[0] = 0
    return tuple(np.maximum.accumulate(median).tolist())


def _direction(directions: Ints, weights: Ints) -> int | None:
    known = directions != NO_DIRECTION
    sums = np.bincount(directions[known], weights[known], minlength=2)
    return int(np.argmax(sums)) if known.any() else None


def _text(texts: Interned, numbers: Ints, weights: Ints) -> str:
    """Give the text of most weight that is not empty; of equal ones the least."""
    if (numbers == numbers[0]).all():
        return texts[int(numbers[0])]
    kinds, places = np.unique(numbers, return_inverse=True)
    sums = np.bincount(places, weights)
    told = {texts[int(kind)]: total for kind, total in zip(kinds, sums, strict=True)}
    told.pop("", None)
    return min(told, key=lambda text: (-told[text], text), default="")
