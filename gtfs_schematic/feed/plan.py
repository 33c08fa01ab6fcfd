"""Reading the part of a feed that must be known before its service date is chosen."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from gtfs_schematic.feed.archive import FeedFiles
from gtfs_schematic.feed.calendars import (
    Headway,
    find_unknown_services,
    read_calendars,
    read_headways,
)
from gtfs_schematic.feed.digest import fingerprint
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.info import Imprint, read_imprint
from gtfs_schematic.feed.model import Agency, FeedSettings, Route
from gtfs_schematic.feed.routes import Trip, keep_modes, read_agencies, read_routes, read_trips
from gtfs_schematic.feed.service import Validity, validity_of
from gtfs_schematic.feed.tables import Tables, check_tables


@dataclass(frozen=True)
class Plan:
    """What is known of a feed before its service date is chosen."""

    tables: Tables
    sha256: str
    imprint: Imprint
    agencies: Mapping[str, Agency]
    routes: Mapping[str, Route]
    """Of the wanted modes."""
    trips: Sequence[Trip]
    """Of those routes, in order of id."""
    trip_ids: frozenset[str]
    """Of all routes."""
    headways: Mapping[str, tuple[Headway, ...]]
    validity: Validity


def plan_feed(files: FeedFiles, prefix: str, settings: FeedSettings) -> Plan:
    """Read what is needed to choose the service date: everything but stops, calls and shapes.

    Raises
    ------
    FeedError
        Files or columns are missing, or nothing ever runs.
    """
    content = fingerprint(files)
    notes = Notebook(prefix)
    tables = Tables(files, content.not_utf8, notes)
    check_tables(tables)
    _find_odd_files(tables)
    agencies = read_agencies(tables)
    routes = read_routes(tables, agencies)
    trips = read_trips(tables, routes)
    kept = keep_modes(tables, routes, settings.modes)
    headways = read_headways(tables, trips)
    drawn = sorted((t for t in trips.values() if t.route_id in kept), key=lambda trip: trip.id)
    counts: Counter[str] = Counter()
    for trip in drawn:
        counts[trip.service_id] += sum(len(r.departures) for r in headways.get(trip.id, ())) or 1
    calendars, imprint = read_calendars(tables), read_imprint(tables)
    find_unknown_services(tables, calendars, (trip.service_id for trip in trips.values()))
    validity = validity_of(prefix + files.label, calendars, imprint, counts)
    _find_empty_validity(notes, validity, imprint)
    return Plan(
        tables,
        content.sha256,
        imprint,
        agencies,
        kept,
        drawn,
        frozenset(trips),
        headways,
        validity,
    )


def _find_odd_files(tables: Tables) -> None:
    files, notes = tables.files, tables.notebook
    if files.folder:
        fault = "the files are in a folder inside the zip or folder, not at its root"
        notes.find("info", files.folder, fault)
    for folder in files.ignored_folders:
        notes.find("warning", folder, "a folder beside the feed looks like a feed; it is ignored")
    for name in sorted(tables.not_utf8):
        notes.find("warning", name, "the file is not all UTF-8; the columns that are used are")


def _find_empty_validity(notes: Notebook, validity: Validity, imprint: Imprint) -> None:
    if (imprint.start or validity.start, imprint.end or validity.end) != (
        validity.start,
        validity.end,
    ):
        notes.find(
            "warning",
            "feed_info.txt",
            "no service between feed_start_date and feed_end_date; the calendars' dates count",
            value=f"{imprint.start or ''} to {imprint.end or ''}",
        )
