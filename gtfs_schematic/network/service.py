"""When a line runs: all day, in the peak, at night or on some days only, and how often."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass
from statistics import median_low

from gtfs_schematic.feed.model import Pattern
from gtfs_schematic.network.model import Period, PeriodService, ServicePattern

_HOUR = 3600
_DAY = 24 * _HOUR
_NIGHT = (22 * _HOUR, 29 * _HOUR)
"""From 22:00 to 05:00; common practice, no source."""
_MIDDAY = (10 * _HOUR, 14 * _HOUR)
"""Between the peaks, 10:00 to 14:00; common practice, no source."""
_DAYTIME = (5 * _HOUR, 20 * _HOUR)
"""Outside these hours nobody speaks of a peak."""
_PERIODS: tuple[tuple[Period, int, int], ...] = (
    ("early", 5 * _HOUR, 7 * _HOUR),
    ("morning peak", 7 * _HOUR, 9 * _HOUR),
    ("midday", 9 * _HOUR, 15 * _HOUR),
    ("afternoon peak", 15 * _HOUR, 19 * _HOUR),
    ("evening", 19 * _HOUR, 22 * _HOUR),
    ("night", *_NIGHT),
)
"""Parts of the day, from the first hour to before the last; common practice, no source."""
_NEARLY_ALL = 0.95


@dataclass(frozen=True, slots=True)
class Service:
    """When and how often a line runs on the service date; times in seconds after noon - 12 h."""

    pattern: ServicePattern
    trips: int
    first_s: int
    last_s: int
    headway_s: int | None
    periods: tuple[PeriodService, ...]


def service_of(
    patterns: Iterable[Pattern],
    days: Collection[int],
    all_days: Collection[int],
    site_of: Mapping[str, str] | None = None,
) -> Service:
    """Judge the service of one line.

    Parameters
    ----------
    patterns
        All of the line's patterns, rare ones included.
    days, all_days
        Weekdays on which the line runs, and on which any line of the network runs.
    site_of
        Per stop id the station, so that departures from all platforms of a terminus count
        together.

    Notes
    -----
    Night goes before peak, and peak before some days: what a rider must know first.
    """
    by_origin: dict[tuple[str, int], set[int]] = defaultdict(set)
    departures: list[int] = []
    for pattern in patterns:
        departures.extend(pattern.departures_s)
        first = pattern.stop_ids[0]
        origin = (site_of or {}).get(first, first)
        by_origin[origin, pattern.direction_id or 0].update(pattern.departures_s)
    departures.sort()
    starts = [sorted(times) for _, times in sorted(by_origin.items())]
    return Service(
        pattern=pattern_of(departures, days, all_days),
        trips=len(departures),
        first_s=departures[0],
        last_s=departures[-1],
        headway_s=_headway(max(starts, key=len)),
        periods=_periods(departures, starts),
    )


def _headway(departures: Sequence[int]) -> int | None:
    gaps = [later - sooner for sooner, later in itertools.pairwise(departures)]
    return median_low(gaps) if gaps else None


def _periods(
    departures: Sequence[int], starts: Sequence[Sequence[int]]
) -> tuple[PeriodService, ...]:
    """Give trips and headway of every part of the day in which there are trips."""
    found = []
    for period, low, high in _PERIODS:
        trips = sum(_within(time, low, high) for time in departures)
        if trips:
            own: list[list[int]] = [
                [_after(t, low) for t in times if _within(t, low, high)] for times in starts
            ]
            busiest = max(own, key=len)
            found.append(PeriodService(period, trips, _headway(sorted(busiest))))
    return tuple(found)


def _after(time: int, low: int) -> int:
    """Count a time of the small hours as one after midnight of the day before, if need be."""
    return time if time >= low else time + _DAY


def _within(time: int, low: int, high: int) -> bool:
    """Whether a time, or the same time a day later or sooner, lies in a part of the day."""
    clock = time % _DAY
    return low <= clock < high or low <= clock + _DAY < high


def pattern_of(
    departures: Sequence[int], days: Collection[int], all_days: Collection[int]
) -> ServicePattern:
    """Judge departures (seconds after noon minus 12 h) and weekdays, as `service_of` does."""
    if _share(departures, [_NIGHT]) >= _NEARLY_ALL:
        return "night"
    morning, afternoon = (_DAYTIME[0], _MIDDAY[0]), (_MIDDAY[1], _DAYTIME[1])
    if len(departures) > 1 and _share(departures, [morning, afternoon]) >= _NEARLY_ALL:
        return "peak"
    if days and set(days) < set(all_days):
        return "some-days"
    return "all-day"


def _share(departures: Sequence[int], windows: list[tuple[int, int]]) -> float:
    """Share of departures within the windows, the small hours counted as 24:00 and later."""
    hits = sum(any(_within(time, low, high) for low, high in windows) for time in departures)
    return hits / len(departures)
