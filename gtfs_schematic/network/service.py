"""When a line runs: all day, in the peak, at night or on some days only, and how often."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Collection, Iterable
from dataclasses import dataclass
from statistics import median_low

from gtfs_schematic.feed.model import Pattern
from gtfs_schematic.network.model import ServicePattern

_HOUR = 3600
_DAY = 24 * _HOUR
_NIGHT = (22 * _HOUR, 29 * _HOUR)
"""From 22:00 to 05:00; common practice, no source."""
_MIDDAY = (10 * _HOUR, 14 * _HOUR)
"""Between the peaks, 10:00 to 14:00; common practice, no source."""
_DAYTIME = (5 * _HOUR, 20 * _HOUR)
"""Outside these hours nobody speaks of a peak."""
_NEARLY_ALL = 0.95


@dataclass(frozen=True, slots=True)
class Service:
    """When and how often a line runs on the service date; times in seconds after noon - 12 h."""

    pattern: ServicePattern
    trips: int
    first_s: int
    last_s: int
    headway_s: int | None


def service_of(
    patterns: Iterable[Pattern], days: Collection[int], all_days: Collection[int]
) -> Service:
    """Judge the service of one line.

    Parameters
    ----------
    patterns
        All of the line's patterns, rare ones included.
    days, all_days
        Weekdays on which the line runs, and on which any line of the network runs.

    Notes
    -----
    Night goes before peak, and peak before some days: what a rider must know first.
    """
    by_origin: dict[str, set[int]] = defaultdict(set)
    departures: list[int] = []
    for pattern in patterns:
        departures.extend(pattern.departures_s)
        by_origin[pattern.stop_ids[0]].update(pattern.departures_s)
    departures.sort()
    _, busiest = min(by_origin.items(), key=lambda item: (-len(item[1]), item[0]))
    gaps = [later - sooner for sooner, later in itertools.pairwise(sorted(busiest))]
    return Service(
        pattern=_pattern(departures, days, all_days),
        trips=len(departures),
        first_s=departures[0],
        last_s=departures[-1],
        headway_s=median_low(gaps) if gaps else None,
    )


def _pattern(
    departures: list[int], days: Collection[int], all_days: Collection[int]
) -> ServicePattern:
    if _share(departures, [_NIGHT]) >= _NEARLY_ALL:
        return "night"
    morning, afternoon = (_DAYTIME[0], _MIDDAY[0]), (_MIDDAY[1], _DAYTIME[1])
    if len(departures) > 1 and _share(departures, [morning, afternoon]) >= _NEARLY_ALL:
        return "peak"
    if days and set(days) < set(all_days):
        return "some-days"
    return "all-day"


def _share(departures: list[int], windows: list[tuple[int, int]]) -> float:
    """Share of departures within the windows, the small hours counted as 24:00 and later."""
    hits = 0
    for time in departures:
        clock = time % _DAY
        later = clock + _DAY
        hits += any(low <= clock < high or low <= later < high for low, high in windows)
    return hits / len(departures)
