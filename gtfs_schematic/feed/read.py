"""Reading one or several feeds: paths become the timetable of one service date.

The page to read first in this room. Each feed goes through: finding its files (archive.py), a
fingerprint (digest.py), its tables as text (tables.py; large ones in blocks.py), routes (routes.py;
those asked for, filters.py), trips (trips.py) and calendars (calendars.py, service.py), all of it
called by plan.py. Then the service dates are chosen for all feeds (dates.py). Then, per feed, the
calls of those dates (callrows.py, calls.py) become patterns (patterns.py), and what those need is
added: stops (stops.py; what lies astray is put to its station, families.py, or left out,
speeds.py), transfers and shapes (ways.py), names and credits (info.py). Several feeds are joined at
the end (join.py).
"""

from __future__ import annotations

import datetime as dt
import gc
from collections.abc import Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import ExitStack, contextmanager
from pathlib import Path

import numpy as np

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.archive import open_feed
from gtfs_schematic.feed.blocks import Masks
from gtfs_schematic.feed.callrows import NOT_TODAY, Wanted
from gtfs_schematic.feed.calls import read_calls, without_stops
from gtfs_schematic.feed.dates import Choice, choose_dates, with_expiry
from gtfs_schematic.feed.digest import Digest
from gtfs_schematic.feed.families import with_families_together, with_stations_in_place
from gtfs_schematic.feed.filters import (
    check_modes,
    check_names,
    keep_routes,
    names_of_agency,
    names_of_route,
    without_rare_routes,
)
from gtfs_schematic.feed.findings import Notebook, refuse_empty
from gtfs_schematic.feed.info import read_attributions, read_stop_names
from gtfs_schematic.feed.interned import Interned
from gtfs_schematic.feed.join import join_timetables
from gtfs_schematic.feed.model import FeedInfo, FeedSettings, Pattern, Route, Stop, Timetable
from gtfs_schematic.feed.patterns import Hours, Runs, gather_patterns
from gtfs_schematic.feed.plan import Draft, Plan, draft_feed, plan_feed
from gtfs_schematic.feed.service import typical_weekdays
from gtfs_schematic.feed.speeds import find_leaps
from gtfs_schematic.feed.stops import (
    leave_out_unserved,
    read_stops,
    stops_of_timetable,
)
from gtfs_schematic.feed.ways import read_shapes, read_transfers, without_missing_shapes
from gtfs_schematic.progress import Progress, Silent

_SILENT = Silent()


def read_feed(
    paths: Sequence[Path], settings: FeedSettings, *, progress: Progress = _SILENT
) -> Timetable:
    """Read the timetable of one service date, or of several together, from GTFS Schedule feeds.

    Parameters
    ----------
    paths
        Zips or folders. With several, every id is prefixed "1:", "2:", … in the order given;
        the files named in findings and the ids left out as well.
    settings
        Service dates, what to keep, and second language.

    Returns
    -------
    Timetable
        Every stop has coordinates, every pattern at least two calls and one departure. What the
        feed has and the timetable has not is in `left_out`, what is odd in `findings`.

    Raises
    ------
    FeedError
        A feed that cannot be used, or nothing of it runs then.
    UsageError
        No path, or a setting that means nothing.
    """
    if not paths:
        raise UsageError("No feed was given. Give a GTFS zip or a folder.")
    check_modes(settings)
    with _without_collector(), ExitStack() as stack:
        progress.phase("Reading the feed", 2 * len(paths))
        drafts = [_draft(stack, path, prefix) for path, prefix in _prefixed(paths)]
        plans, unused = _plans(drafts, settings, progress)
        choice = choose_dates([plan.validity for plan in plans], settings.date)
        choice = with_expiry(choice, [plan.validity for plan in plans], settings.today)
        progress.note(choice.reason)
        parts = []
        for plan in plans:
            with _naming(plan.tables.notebook.prefix):
                part = _timetable(plan, choice, settings)
            parts.append((plan.tables.notebook.prefix, part))
            progress.step()
    timetable = join_timetables(parts, unused)
    if not timetable.patterns:
        refuse_empty(timetable.left_out, timetable.findings, f"runs {choice.when}")
    return timetable


@contextmanager
def _without_collector() -> Iterator[None]:
    """Keep the garbage collector from walking through all that is read, again and again.

    What is read has no cycles. On a national feed this saves a tenth of the time.
    """
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _prefixed(paths: Sequence[Path]) -> Iterator[tuple[Path, str]]:
    """Yield every path with the prefix of its ids."""
    for number, path in enumerate(paths, start=1):
        yield Path(path), f"{number}:" if len(paths) > 1 else ""


def _draft(stack: ExitStack, path: Path, prefix: str) -> Draft:
    files = stack.enter_context(open_feed(path))
    # The digest reads all bytes once more, on another core if there is one.
    pool = ThreadPoolExecutor(1)
    stack.callback(pool.shutdown, cancel_futures=True)
    with _naming(prefix):
        return draft_feed(files, Digest(files, pool), prefix)


def _plans(
    drafts: Sequence[Draft], settings: FeedSettings, progress: Progress
) -> tuple[list[Plan], list[Notebook]]:
    """Plan the feeds; give also the notebooks of those that have none of the routes asked for."""
    notebooks = [draft.tables.notebook for draft in drafts]
    pairs = [(notebook.prefix, draft) for notebook, draft in zip(notebooks, drafts, strict=True)]
    check_names(
        settings,
        (names_of_agency(p, i, a) for p, draft in pairs for i, a in draft.agencies.items()),
        (names_of_route(p, r) for p, draft in pairs for r in draft.routes.values()),
    )
    plans, unused = [], []
    for draft, notes in zip(drafts, notebooks, strict=True):
        routes = keep_routes(notes, draft.routes, draft.agencies, settings)
        if routes:
            with _naming(notes.prefix):
                plans.append(plan_feed(draft, routes, settings))
        else:
            notes.leave_out("feed", draft.tables.files.label, "none of its routes is asked for")
            unused.append(notes)
        progress.step()
    if not plans:
        refuse_empty([item for notes in notebooks for item in notes.left_out], (), "is asked for")
    return plans, unused


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


def _timetable(plan: Plan, choice: Choice, settings: FeedSettings) -> Timetable:
    """Read what runs on the service dates; ids are as in the feed, without prefix."""
    tables = plan.tables
    table = read_stops(tables)
    running = _running(plan, choice)
    today = np.full(len(plan.drawn), NOT_TODAY, dtype=np.int32)
    today[running] = np.arange(running.sum(), dtype=np.int32)
    stop_ids = list(table.own)
    placed = np.array([ident in table.placed for ident in stop_ids], dtype=np.bool_)
    wanted = Wanted(plan.trips.ids, today, Interned(stop_ids), placed)
    calls = read_calls(tables, wanted)
    runs = Runs(plan.trips, np.flatnonzero(running), _days(plan, choice), plan.headways)
    patterns = gather_patterns(runs, stop_ids, calls)
    called = {ident for pattern in patterns for ident in pattern.stop_ids}
    stops = stops_of_timetable(tables, table, called)
    stops = with_families_together(tables.notebook, stops, table.rows)
    astray = find_leaps(tables.notebook, patterns, stops, plan.routes, table.rows)
    if astray:
        numbers = [n for n, ident in enumerate(stop_ids) if ident in astray]
        patterns = gather_patterns(runs, stop_ids, without_stops(tables, calls, wanted, numbers))
    if settings.min_trips:
        patterns = without_rare_routes(
            tables.notebook, patterns, plan.routes, settings.min_trips, choice.when
        )
    shapes = read_shapes(tables, {p.shape_id for p in patterns if p.shape_id})
    patterns = without_missing_shapes(tables, patterns, shapes)
    stops = with_stations_in_place(tables.notebook, _used(stops, patterns), table.rows)
    leave_out_unserved(tables, table, stops, choice.when)
    names = read_stop_names(tables, settings.language)
    routes = _running_routes(plan, patterns, running, choice.when)
    agency_ids = {route.agency_id for route in routes}
    for ident in plan.agencies.keys() - agency_ids:
        name = ident or plan.agencies[ident].name
        tables.notebook.leave_out("agency", name, f"none of its routes is drawn {choice.when}")
    services = plan.trips.services_of_routes()
    return Timetable(
        _info(plan, choice, agency_ids, [route.id for route in routes]),
        tuple(plan.agencies[ident] for ident in sorted(agency_ids & plan.agencies.keys())),
        tuple(names.translated(stop) for stop in stops),
        routes,
        patterns,
        read_transfers(tables, frozenset(stop.id for stop in stops), table.own),
        shapes,
        typical_weekdays(plan.validity.days, {route.id: services[route.id] for route in routes}),
        tables.notebook.findings,
        tables.notebook.left_out,
    )


def _used(stops: Sequence[Stop], patterns: Sequence[Pattern]) -> tuple[Stop, ...]:
    """Give the stops that patterns call at, and the stations above them."""
    called = {ident for pattern in patterns for ident in pattern.stop_ids}
    above = {stop.parent_id for stop in stops if stop.id in called}
    return tuple(stop for stop in stops if stop.id in called or stop.id in above)


def _services(plan: Plan, date: dt.date) -> Masks:
    """Tell which services run on a date."""
    running = plan.validity.days.get(date, frozenset())
    services = plan.trips.services
    return np.array([services[n] in running for n in range(len(services))], dtype=np.bool_)


def _days(plan: Plan, choice: Choice) -> tuple[tuple[Hours, ...], ...]:
    """Give the days chosen, those that are alike once."""
    days = {}
    for day in choice.days:
        hours = tuple(Hours(_services(plan, w.date), w.low, w.high, w.shift) for w in day)
        days[tuple((h.services.tobytes(), h.low, h.high, h.shift) for h in hours)] = hours
    return tuple(days.values())


def _running(plan: Plan, choice: Choice) -> Masks:
    """Tell which trips are drawn."""
    running = np.zeros(len(plan.drawn), dtype=np.bool_)
    for day in _days(plan, choice):
        for hours in day:
            some = plan.drawn & hours.services[plan.trips.service]
            if plan.firsts is not None:
                inside = (plan.firsts >= hours.low) & (plan.firsts < hours.high)
                inside[list(plan.headways)] = True
                some &= inside
            running |= some
    return running


def _running_routes(
    plan: Plan, patterns: Sequence[Pattern], running: Masks, when: str
) -> tuple[Route, ...]:
    """Give the routes with patterns; the others are noted as left out, with the reason."""
    drawn = {pattern.route_id for pattern in patterns}
    trips, today = plan.trips.route, plan.trips.route[running]
    any_trips = {plan.trips.route_ids[n] for n in np.unique(trips[trips >= 0]).tolist()}
    any_today = {plan.trips.route_ids[n] for n in np.unique(today).tolist()}
    for ident in plan.routes:
        if ident in drawn:
            continue
        if ident not in any_trips:
            reason = "has no trips"
        elif ident in any_today:
            reason = "none of its trips can be used"
        else:
            reason = f"does not run {when}"
        plan.tables.notebook.leave_out("route", ident, reason)
    return tuple(plan.routes[ident] for ident in sorted(drawn))


def _info(plan: Plan, choice: Choice, agency_ids: set[str], route_ids: list[str]) -> FeedInfo:
    return FeedInfo(
        plan.digest.sha256,
        plan.imprint.publisher,
        plan.imprint.version,
        plan.validity.start.isoformat(),
        plan.validity.end.isoformat(),
        choice.date.isoformat(),
        choice.reason,
        plan.imprint.lang,
        read_attributions(plan.tables, agency_ids, route_ids),
    )
