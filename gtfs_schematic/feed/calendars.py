"""Reading calendar.txt, calendar_dates.txt and frequencies.txt."""

from __future__ import annotations

import datetime as dt
from collections import defaultdict
from collections.abc import Container, Iterable, Mapping
from dataclasses import dataclass

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.cells import Cell, whole_of
from gtfs_schematic.feed.tables import REQUIRED_COLUMNS, Tables
from gtfs_schematic.feed.values import parse_date, parse_time

_LONGEST_YEARS = 40
_FIRST = dt.date(2000, 1, 1)
"""A calendar row that runs longer than this is cut, so that a slip of the pen in a year does not
cost millions of dates. Rows that start "since ever" start in 2000: GTFS is from 2006."""
_MOST_DEPARTURES = 20_000_000
"""More than the largest countries have on a day, times several."""


@dataclass(frozen=True, slots=True)
class Span:
    """A usable row of calendar.txt; dates inclusive."""

    service_id: str
    weekdays: tuple[bool, ...]
    start: dt.date
    end: dt.date


@dataclass(frozen=True, slots=True)
class Exceptional:
    """A usable row of calendar_dates.txt."""

    service_id: str
    date: dt.date
    added: bool


@dataclass(frozen=True, slots=True)
class Headway:
    """A usable row of frequencies.txt; seconds after noon minus 12 h, end exclusive."""

    start_s: int
    end_s: int
    headway_s: int

    @property
    def departures(self) -> range:
        """Departures from the trip's first stop."""
        return range(self.start_s, self.end_s, self.headway_s)


@dataclass(frozen=True)
class Calendars:
    """When the services of one feed run."""

    spans: tuple[Span, ...]
    exceptions: tuple[Exceptional, ...]


def read_calendars(tables: Tables) -> Calendars:
    """Read both calendar tables, of which either may be missing."""
    return Calendars(tuple(_spans(tables)), tuple(_exceptions(tables)))


def find_unknown_services(tables: Tables, calendars: Calendars, service_ids: Iterable[str]) -> None:
    """Find services of trips that neither calendar table has in a usable row."""
    known = {row.service_id for row in calendars.spans}
    known |= {row.service_id for row in calendars.exceptions}
    for ident in sorted(set(service_ids) - known):
        fault = "no usable row of the calendars has the service of a trip, so it never runs"
        tables.notebook.find("error", "trips.txt", fault, field="service_id", value=ident)


def read_headways(tables: Tables, trip_ids: Container[str]) -> Mapping[str, tuple[Headway, ...]]:
    """Give the usable rows of frequencies.txt per trip id, in order of time.

    Raises
    ------
    FeedError
        They add up to an absurd number of departures.
    """
    headways: defaultdict[str, list[Headway]] = defaultdict(list)
    total = 0
    file = "frequencies.txt"
    for row, (trip, start, end, text) in tables.rows(file, REQUIRED_COLUMNS[file]):
        if trip not in trip_ids:
            fault = "trip is not in trips.txt; the row does not count"
            Cell(file, row, "trip_id", trip).found(tables.notebook, "error", fault)
            continue
        headway = whole_of(tables.notebook, Cell(file, row, "headway_secs", text))
        try:
            start_s, end_s = parse_time(start), parse_time(end)
        except ValueError:
            start_s = end_s = 0
        if headway is None or headway <= 0 or end_s <= start_s:
            tables.notebook.find(
                "error",
                file,
                "row needs a start before its end and a headway above zero; it does not count",
                row=row,
                value=f"{start}, {end}, {text}",
            )
            continue
        headways[trip].append(Headway(start_s, end_s, headway))
        total += len(headways[trip][-1].departures)
        if total > _MOST_DEPARTURES:
            raise FeedError(
                f"adds up to more than {_MOST_DEPARTURES:,} departures up to here, which no feed "
                "has. Check headway_secs.",
                file=file,
                row=row,
                field="headway_secs",
                value=text,
            )
    return {
        trip: tuple(sorted(rows, key=lambda r: (r.start_s, r.end_s, r.headway_s)))
        for trip, rows in headways.items()
    }


def _spans(tables: Tables) -> list[Span]:
    spans = []
    file = "calendar.txt"
    seen = set()
    for row, (service, *days, start, end) in tables.rows(file, REQUIRED_COLUMNS[file]):
        if service in seen:
            fault = "service stands in the table before; all its rows count"
            Cell(file, row, "service_id", service).found(tables.notebook, "warning", fault)
        seen.add(service)
        dates = (
            _date(tables, file, row, "start_date", start),
            _date(tables, file, row, "end_date", end),
        )
        weekdays = []
        for name, text in zip(REQUIRED_COLUMNS[file][1:8], days, strict=True):
            if text not in {"0", "1"}:
                message = "a weekday needs 0 or 1 and is taken as 0"
                tables.notebook.find("error", file, message, row=row, field=name, value=text)
            weekdays.append(text == "1")
        first, last = dates
        if first is None or last is None:
            continue
        if last < first:
            message = "service ends before it starts and does not count"
            tables.notebook.find("error", file, message, row=row, field="end_date", value=end)
            continue
        if first < _FIRST <= last:
            first = _FIRST
            message = f"service starts before {_FIRST}; it counts from then on"
            tables.notebook.find("warning", file, message, row=row, field="start_date", value=start)
        longest = dt.timedelta(days=366 * _LONGEST_YEARS)
        limit = first + min(longest, dt.date.max - first)
        if last > limit:
            message = f"service runs for more than {_LONGEST_YEARS} years; only those count"
            tables.notebook.find("warning", file, message, row=row, field="end_date", value=end)
        spans.append(Span(service, tuple(weekdays), first, min(last, limit)))
    return spans


def _exceptions(tables: Tables) -> list[Exceptional]:
    exceptions = []
    file = "calendar_dates.txt"
    for row, (service, text, kind) in tables.rows(file, REQUIRED_COLUMNS[file]):
        date = _date(tables, file, row, "date", text)
        if kind not in {"1", "2"}:
            tables.notebook.find(
                "error",
                file,
                "exception type is neither 1 (added) nor 2 (removed); the row does not count",
                row=row,
                field="exception_type",
                value=kind,
            )
        elif date is not None:
            exceptions.append(Exceptional(service, date, kind == "1"))
    return exceptions


def _date(tables: Tables, file: str, row: int, field: str, text: str) -> dt.date | None:
    try:
        return parse_date(text)
    except ValueError:
        tables.notebook.find(
            "error",
            file,
            "not a date as YYYYMMDD; the row does not count",
            row=row,
            field=field,
            value=text,
        )
        return None
