"""Reading the part of a feed that must be known before its service date is chosen."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.archive import FeedFiles
from gtfs_schematic.feed.blocks import Masks
from gtfs_schematic.feed.calendars import (
    Headway,
    find_unknown_services,
    read_calendars,
    read_headways,
)
from gtfs_schematic.feed.complete import check_complete
from gtfs_schematic.feed.dates import EARLY, LATE
from gtfs_schematic.feed.digest import Digest
from gtfs_schematic.feed.encodings import legacy_codec
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.info import Imprint, read_imprint, read_languages
from gtfs_schematic.feed.kernels import Ints
from gtfs_schematic.feed.model import Agency, FeedSettings, Route
from gtfs_schematic.feed.night import first_departures, starts_by_service
from gtfs_schematic.feed.routes import read_agencies, read_routes
from gtfs_schematic.feed.service import Validity, validity_of
from gtfs_schematic.feed.tables import REQUIRED_COLUMNS, Tables
from gtfs_schematic.feed.trips import Trips, read_trips

_GAP = dt.timedelta(days=13)
"""As long as service may pause without being missed: two weeks of holidays."""


@dataclass(frozen=True)
class Plan:
    """What is known of a feed before its service date is chosen."""

    tables: Tables
    digest: Digest
    imprint: Imprint
    agencies: Mapping[str, Agency]
    routes: Mapping[str, Route]
    """Those asked for."""
    trips: Trips
    """Of all routes."""
    drawn: Masks
    """Which trips are of the routes asked for."""
    headways: Mapping[int, tuple[Headway, ...]]
    """Per number of a trip."""
    firsts: Ints | None
    """Earliest departure of every trip, if they were asked for; seconds after noon minus 12 h."""
    validity: Validity


@dataclass(frozen=True)
class Draft:
    """What is known of a feed when only its agencies and routes are read."""

    tables: Tables
    digest: Digest
    agencies: Mapping[str, Agency]
    routes: Mapping[str, Route]

    @property
    def label(self) -> str:
        """What to call the feed."""
        return self.tables.notebook.prefix + self.tables.files.label


def draft_feed(files: FeedFiles, digest: Digest, prefix: str) -> Draft:
    """Read agencies and routes.

    Raises
    ------
    FeedError
        Files or columns are missing.
    """
    tables = Tables(files, digest.is_utf8, Notebook(prefix))
    check_complete(tables)
    _find_odd_files(tables)
    tables = replace(tables, legacy=legacy_codec(read_languages(tables)))
    agencies = read_agencies(tables)
    return Draft(tables, digest, agencies, read_routes(tables, agencies))


def plan_feed(draft: Draft, routes: Mapping[str, Route], settings: FeedSettings) -> Plan:
    """Read what is needed to choose the service date: everything but stops, calls and shapes.

    Parameters
    ----------
    routes
        Those asked for.

    Raises
    ------
    FeedError
        Nothing ever runs on them.
    """
    tables = draft.tables
    trips = read_trips(tables, draft.routes)
    headways = {
        trips.ids.find_text(ident): rows for ident, rows in read_headways(tables, trips.ids).items()
    }
    drawn = trips.of_routes(routes)
    counts = _trips_by_service(trips, drawn, headways)
    calendars, imprint = read_calendars(tables), read_imprint(tables)
    find_unknown_services(tables, calendars, trips.service_ids())
    if not counts:
        raise FeedError(f"{draft.label} has no trip on any of the routes asked for.")
    validity = validity_of(draft.label, calendars, imprint, counts)
    _find_odd_validity(tables.notebook, validity, imprint)
    firsts = None
    if settings.date == "night":
        firsts = first_departures(tables, trips)
        early, late = (
            starts_by_service(trips, drawn, firsts, headways, hours) for hours in (EARLY, LATE)
        )
        validity = replace(validity, early=early, late=late)
    return Plan(
        tables,
        draft.digest,
        imprint,
        draft.agencies,
        routes,
        trips,
        drawn,
        headways,
        firsts,
        validity,
    )


def _trips_by_service(
    trips: Trips, drawn: Masks, headways: Mapping[int, tuple[Headway, ...]]
) -> dict[str, int]:
    """Count the trips of every service, headway-based ones counted out."""
    weights = drawn.astype(np.int64)
    for trip, rows in headways.items():
        weights[trip] *= sum(len(row.departures) for row in rows) or 1
    sums = np.bincount(trips.service, weights, minlength=len(trips.services)).astype(np.int64)
    return {trips.services[n]: int(sums[n]) for n in np.unique(trips.service[drawn]).tolist()}


def _find_odd_files(tables: Tables) -> None:
    files, notes = tables.files, tables.notebook
    if files.folder:
        fault = "the files are in a folder inside the zip or folder, not at its root"
        notes.find("info", files.folder, fault)
    for folder in files.ignored_folders:
        notes.find("warning", folder, "a folder beside the feed looks like a feed; it is ignored")
    for name in sorted(set(files.names) - REQUIRED_COLUMNS.keys()):
        if not tables.is_utf8(name):
            notes.find("info", name, "the file is not UTF-8 text; it is not used")


def _find_odd_validity(notes: Notebook, validity: Validity, imprint: Imprint) -> None:
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
        return
    last = max(validity.days)
    if validity.end - last > _GAP:
        fault = "the last date with service is long before feed_end_date; ask for a newer feed"
        notes.find("warning", "feed_info.txt", fault, field="feed_end_date", value=f"{last}")
