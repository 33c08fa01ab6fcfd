"""Reading one or several feeds: paths become the timetable of one service date.

The page to read first in this room. Each feed goes through: finding its files (archive.py), a
fingerprint (digest.py), its tables as text (tables.py), routes and trips (routes.py), calendars
(calendars.py), all of it called by plan.py. Then one service date is chosen for all feeds
(service.py). Then, per feed, the calls of that date (calls.py) become patterns (patterns.py), and
what those need is added: stops (stops.py), transfers and shapes (ways.py), names and credits
(info.py). Several feeds are joined at the end (join.py).
"""

from __future__ import annotations

import datetime as dt
from collections import Counter, defaultdict
from collections.abc import Iterator, Sequence
from contextlib import ExitStack, contextmanager
from pathlib import Path

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.archive import open_feed
from gtfs_schematic.feed.calls import NOT_TODAY, read_calls
from gtfs_schematic.feed.info import read_attributions, read_stop_names
from gtfs_schematic.feed.join import join_timetables
from gtfs_schematic.feed.model import FeedInfo, FeedSettings, Pattern, Route, Timetable
from gtfs_schematic.feed.modes import MODES, REPLACEMENT
from gtfs_schematic.feed.patterns import gather_patterns
from gtfs_schematic.feed.plan import Plan, plan_feed
from gtfs_schematic.feed.service import choose_date, typical_weekdays
from gtfs_schematic.feed.speeds import find_leaps
from gtfs_schematic.feed.stops import leave_out_unserved, read_stops, stops_of_timetable
from gtfs_schematic.feed.ways import read_shapes, read_transfers, without_missing_shapes
from gtfs_schematic.progress import Progress, Silent

_SILENT = Silent()


def read_feed(
    paths: Sequence[Path], settings: FeedSettings, *, progress: Progress = _SILENT
) -> Timetable:
    """Read the timetable of one service date from one or several GTFS Schedule feeds.

    Parameters
    ----------
    paths
        Zips or folders. With several, every id is prefixed "1:", "2:", … in the order given;
        the files named in findings and the ids left out as well.
    settings
        Service date, modes and second language.

    Returns
    -------
    Timetable
        Every stop has coordinates, every pattern at least two calls and one departure. What the
        feed has and the timetable has not is in `left_out`, what is odd in `findings`.

    Raises
    ------
    FeedError
        A feed that cannot be used, or nothing of it runs on the date.
    UsageError
        No path, or a setting that means nothing.
    """
    _check_usage(paths, settings)
    with ExitStack() as stack:
        progress.phase("Reading the feed", 2 * len(paths))
        plans = []
        for number, path in enumerate(paths, start=1):
            prefix = f"{number}:" if len(paths) > 1 else ""
            files = stack.enter_context(open_feed(Path(path)))
            with _naming(prefix):
                plans.append(plan_feed(files, prefix, settings))
            progress.step()
        date, reason = choose_date([plan.validity for plan in plans], settings.date)
        progress.note(reason)
        parts = []
        for plan in plans:
            with _naming(plan.tables.notebook.prefix):
                parts.append(_timetable(plan, date, reason, settings))
            progress.step()
    timetable = join_timetables(parts)
    if not timetable.patterns:
        reasons = Counter(item.reason for item in timetable.left_out)
        told = "; ".join(f"{count} × {text}" for text, count in reasons.most_common(3))
        raise FeedError(f"Nothing is left to draw on {date}. Left out: {told or 'nothing'}.")
    return timetable


def _check_usage(paths: Sequence[Path], settings: FeedSettings) -> None:
    if not paths:
        raise UsageError("No feed was given. Give a GTFS zip or a folder.")
    unknown = sorted(set(settings.modes) - {*MODES, REPLACEMENT})
    if unknown:
        raise UsageError(
            f"There is no mode {unknown[0]!r}. Modes are {', '.join((*MODES, REPLACEMENT))}."
        )


@contextmanager
def _naming(prefix: str) -> Iterator[None]:
    """Let errors of one feed among several say which."""
    try:
        yield
    except FeedError as error:
        if not prefix or error.file is None:
            raise
        raise FeedError(
            error.what,
            file=prefix + error.file,
            row=error.row,
            field=error.field,
            value=error.value,
        ) from error


def _timetable(plan: Plan, date: dt.date, reason: str, settings: FeedSettings) -> Timetable:
    """Read what runs on the service date; ids are as in the feed, without prefix."""
    tables = plan.tables
    running = plan.validity.days.get(date, frozenset())
    trips = [trip for trip in plan.trips if trip.service_id in running]
    today = {trip.id: n for n, trip in enumerate(trips)}
    table = read_stops(tables)
    stop_ids = sorted(table.own)
    numbers = {ident: n for n, ident in enumerate(stop_ids)}
    calls = read_calls(
        tables,
        {ident: today.get(ident, NOT_TODAY) for ident in plan.trip_ids},
        numbers,
        frozenset(numbers[ident] for ident in table.placed),
    )
    patterns = gather_patterns(trips, stop_ids, calls, plan.headways)
    shapes = read_shapes(tables, {p.shape_id for p in patterns if p.shape_id})
    patterns = without_missing_shapes(tables, patterns, shapes)
    stops = stops_of_timetable(tables, table, {s for p in patterns for s in p.stop_ids})
    leave_out_unserved(tables, table, stops, date)
    names = read_stop_names(tables, settings.language)
    routes = _running_routes(plan, patterns, date)
    find_leaps(tables.notebook, patterns, stops, plan.routes)
    agency_ids = {route.agency_id for route in routes}
    for ident in plan.agencies.keys() - agency_ids:
        tables.notebook.leave_out("agency", ident, f"none of its routes is drawn on {date}")
    return Timetable(
        _info(plan, date, reason, agency_ids, [route.id for route in routes]),
        tuple(plan.agencies[ident] for ident in sorted(agency_ids & plan.agencies.keys())),
        tuple(names.translated(stop) for stop in stops),
        routes,
        patterns,
        read_transfers(tables, frozenset(stop.id for stop in stops), table.own),
        shapes,
        _operating_days(plan, routes),
        tables.notebook.findings,
        tables.notebook.left_out,
    )


def _running_routes(plan: Plan, patterns: Sequence[Pattern], date: dt.date) -> tuple[Route, ...]:
    """Give the routes with patterns; the others are noted as left out, with the reason."""
    running = {pattern.route_id for pattern in patterns}
    trips: defaultdict[str, set[str]] = defaultdict(set)
    for trip in plan.trips:
        trips[trip.route_id].add(trip.service_id)
    today = plan.validity.days.get(date, frozenset())
    for ident in plan.routes:
        if ident in running:
            continue
        if ident not in trips:
            reason = "has no trips"
        elif trips[ident] & today:
            reason = "none of its trips can be used"
        else:
            reason = f"does not run on {date}"
        plan.tables.notebook.leave_out("route", ident, reason)
    return tuple(plan.routes[ident] for ident in sorted(running))


def _operating_days(plan: Plan, routes: Sequence[Route]) -> dict[str, frozenset[int]]:
    services: dict[str, set[str]] = {route.id: set() for route in routes}
    for trip in plan.trips:
        if trip.route_id in services:
            services[trip.route_id].add(trip.service_id)
    return typical_weekdays(plan.validity.days, {r: frozenset(s) for r, s in services.items()})


def _info(
    plan: Plan, date: dt.date, reason: str, agency_ids: set[str], route_ids: list[str]
) -> FeedInfo:
    return FeedInfo(
        plan.sha256,
        plan.imprint.publisher,
        plan.imprint.version,
        plan.validity.start.isoformat(),
        plan.validity.end.isoformat(),
        date.isoformat(),
        reason,
        plan.imprint.lang,
        read_attributions(plan.tables, agency_ids, route_ids),
    )
