"""Choosing the service date: which services run when, and which date has most trips."""

from __future__ import annotations

import csv
import datetime as dt
import itertools
import tempfile
import warnings
from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from gtfs_schematic.errors import FeedError, UsageError
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
_MONTHS = (
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
)
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
            f"{label} has no service on any date: no trip's service_id is switched on by "
            "calendar.txt or calendar_dates.txt. Ask the feed's publisher, or widen the modes."
        )
    first, last = min(days), max(days)
    start, end = imprint.start or first, imprint.end or last
    inside = {date: running for date, running in days.items() if start <= date <= end}
    if not inside:
        return Validity(label, first, last, days, trips)
    return Validity(label, start, end, inside, trips)


def choose_date(feeds: Sequence[Validity], wanted: str) -> tuple[dt.date, str]:
    """Choose the service date for one or several feeds together.

    Parameters
    ----------
    wanted
        "busiest", or a date as YYYY-MM-DD. The busiest is, among the dates on which most of the
        feeds run, the one with most trips; of several, the earliest.

    Returns
    -------
    date, reason
        The reason is one sentence for a person.

    Raises
    ------
    UsageError
        `wanted` is neither.
    FeedError
        The date is outside a feed's validity, or no feed runs on it; the feeds share no date.
    """
    if wanted == "busiest":
        return _busiest(feeds)
    try:
        date = dt.date.fromisoformat(wanted)
    except ValueError:
        raise UsageError(
            f"{wanted!r} is no service date: write YYYY-MM-DD, for example 2026-03-11, or busiest."
        ) from None
    for feed in feeds:
        if not feed.start <= date <= feed.end:
            raise FeedError(
                f"{date} is outside the validity of {feed.label}, which is {feed.start} to "
                f"{feed.end}. Give a date within it."
            )
    total = sum(feed.count(date) for feed in feeds)
    if total == 0:
        near = sorted({d for f in feeds for d in f.days}, key=lambda d: (abs(d - date), d))
        raise FeedError(
            f"No trip runs on {_spoken(date)}, {date}. The nearest date with service is {near[0]}."
        )
    return date, f"{_spoken(date)} was asked for; it has {total:,} trips."


def _busiest(feeds: Sequence[Validity]) -> tuple[dt.date, str]:
    start, end = max(feed.start for feed in feeds), min(feed.end for feed in feeds)
    totals: Counter[dt.date] = Counter()
    running: Counter[dt.date] = Counter()
    for feed in feeds:
        for date in feed.days:
            if start <= date <= end:
                totals[date] += feed.count(date)
                running[date] += 1
    if not totals:
        ranges = "; ".join(f"{feed.label}: {feed.start} to {feed.end}" for feed in feeds)
        raise FeedError(
            f"The feeds share no date with service ({ranges}). Give feeds that hold at one time."
        )
    date = min(totals, key=lambda d: (-running[d], -totals[d], d))
    same = sum(totals[d] == totals[date] and running[d] == running[date] for d in totals)
    first = f", as the first of {same} such dates" if same > 1 else ""
    return date, (
        f"{_spoken(date)} has the most trips, {totals[date]:,}, of the {len(totals):,} dates with "
        f"service from {start} to {end}{first}."
    )


def _spoken(date: dt.date) -> str:
    return f"{_WEEKDAYS[date.weekday()]} {date.day} {_MONTHS[date.month - 1]} {date.year}"


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
    typical = {}
    for route, ids in services.items():
        dates = {date for ident in ids for date in dates_of[ident]}
        typical[route] = _typical(dates)
    return typical


def _typical(dates: set[dt.date]) -> frozenset[int]:
    if not dates:
        return frozenset()
    first, last = min(dates), max(dates)
    runs = Counter(date.weekday() for date in dates)
    span = (last - first).days + 1
    chances = Counter((first.weekday() + n) % 7 for n in range(span))
    often = frozenset(day for day in runs if runs[day] >= _TYPICAL_SHARE * chances[day])
    return often or frozenset(runs)
