"""Which services run when, and how many trips they have."""

from __future__ import annotations

import csv
import datetime as dt
import itertools
import tempfile
import warnings
from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.calendars import Calendars
from gtfs_schematic.feed.info import Imprint

with warnings.catch_warnings():
    # partridge 1.1.2 uses idioms that pandas and pyproj have announced to drop; we call none of
    # them directly and cannot change them, so its import and calls are kept quiet.
    warnings.simplefilter("ignore", FutureWarning)
    warnings.simplefilter("ignore", DeprecationWarning)
    import partridge

Days = Mapping[dt.date, frozenset[str]]
"""Services that run, by date."""

_WEEKDAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
_TYPICAL_SHARE = 0.5


@dataclass(frozen=True)
class Validity:
    """When one feed holds, and what runs then."""

    label: str
    start: dt.date
    end: dt.date
    days: Days
    """Only dates from `start` to `end`, only services with trips."""
    trips: Mapping[str, int]
    """Trips of every service, headway-based ones counted out."""
    early: Mapping[str, int] = field(default_factory=dict)
    late: Mapping[str, int] = field(default_factory=dict)
    """Those that start in the night before the date's morning, and after its evening."""

    def count(self, date: dt.date) -> int:
        """Give the number of trips on a date."""
        return sum(self.trips[service] for service in self.days.get(date, ()))


def service_days(calendars: Calendars, service_ids: Iterable[str]) -> Days:
    """Give the services among `service_ids` that run on every date with any service.

    partridge works the calendars out. It gets a copy of them in which every service is a plain
    token: read directly, it would take the id "NA" for no id, guess encodings, and stumble over
    dates that are none. An empty result is ours to tell, since it only asserts.
    """
    tokens = {service: f"s{n}" for n, service in enumerate(sorted(set(service_ids)))}
    services = {token: service for service, token in tokens.items()}
    spans = [row for row in calendars.spans if row.service_id in tokens and any(row.weekdays)]
    exceptions = [row for row in calendars.exceptions if row.service_id in tokens]
    if not spans and not any(row.added for row in exceptions):
        return {}
    with tempfile.TemporaryDirectory(prefix="gtfs-schematic-") as name:
        folder = Path(name)
        _write(
            folder / "trips.txt",
            [["route_id", "service_id", "trip_id"]],
            (("r", token, f"t{n}") for n, token in enumerate(tokens.values())),
        )
        _write(
            folder / "calendar.txt",
            [["service_id", *(day.lower() for day in _WEEKDAYS), "start_date", "end_date"]],
            (
                (
                    tokens[r.service_id],
                    *map(int, r.weekdays),
                    _basic(r.start),
                    _basic(r.end),
                )
                for r in spans
            ),
        )
        _write(
            folder / "calendar_dates.txt",
            [["service_id", "date", "exception_type"]],
            ((tokens[r.service_id], _basic(r.date), 1 if r.added else 2) for r in exceptions),
        )
        return {
            date: frozenset(services[token] for token in running)
            for date, running in sorted(_partridge_days(folder).items())
        }


def _partridge_days(folder: Path) -> Days:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", FutureWarning)  # see the import
        warnings.simplefilter("ignore", DeprecationWarning)
        try:
            days: Days = partridge.read_service_ids_by_date(str(folder))
        except AssertionError:  # its way to say that all days were removed
            return {}
    return days


def _basic(date: dt.date) -> str:
    # Not strftime, which writes years before 1000 with fewer digits.
    return date.isoformat().replace("-", "")


def _write(path: Path, header: Sequence[Sequence[str]], rows: Iterable[Sequence[object]]) -> None:
    with path.open("w", encoding="ascii", newline="") as stream:
        csv.writer(stream).writerows(itertools.chain(header, rows))


def validity_of(
    label: str, calendars: Calendars, imprint: Imprint, trips: Mapping[str, int]
) -> Validity:
    """Find from when to when a feed holds: as feed_info.txt says, else as its calendars do.

    Data outside the range of feed_info.txt is not authoritative (GTFS Schedule reference,
    feed_info.txt), so it does not count, unless there is no service inside that range at all.

    Raises
    ------
    FeedError
        No service on any date.
    """
    days = service_days(calendars, trips)
    if not days:
        raise FeedError(
            f"{label} has no service on any date: calendar.txt and calendar_dates.txt switch on "
            "no service_id of the trips asked for. Ask the feed's publisher."
        )
    first, last = min(days), max(days)
    start, end = imprint.start or first, imprint.end or last
    inside = {date: running for date, running in days.items() if start <= date <= end}
    if not inside:
        return Validity(label, first, last, days, trips)
    return Validity(label, start, end, inside, trips)


def typical_weekdays(
    days: Days, services: Mapping[str, frozenset[str]]
) -> dict[str, frozenset[int]]:
    """Give the weekdays (0 Monday) on which every route runs in a typical week.

    Parameters
    ----------
    services
        Per route id the services of its trips.

    Notes
    -----
    Between a route's first and last date, a weekday is typical if the route runs on at least
    half of its dates; so holidays neither add nor remove one. A route that reaches that on no
    weekday gets all weekdays on which it ever runs.
    """
    dates_of: defaultdict[str, list[dt.date]] = defaultdict(list)
    for date, running in days.items():
        for service in running:
            dates_of[service].append(date)
    # Many routes of a large feed have the same services.
    typical = {
        ids: _typical({date for ident in ids for date in dates_of[ident]})
        for ids in set(services.values())
    }
    return {route: typical[ids] for route, ids in services.items()}


def _typical(dates: set[dt.date]) -> frozenset[int]:
    if not dates:
        return frozenset()
    first, last = min(dates), max(dates)
    runs = Counter(date.weekday() for date in dates)
    span = (last - first).days + 1
    chances = Counter((first.weekday() + n) % 7 for n in range(span))
    often = frozenset(day for day in runs if runs[day] >= _TYPICAL_SHARE * chances[day])
    return often or frozenset(runs)
