"""All tables of one demo feed, as rows of text."""

from __future__ import annotations

from gtfs_schematic.demo.lines import Line
from gtfs_schematic.demo.plans import WEEKDAY, WEEKEND
from gtfs_schematic.demo.region import Region
from gtfs_schematic.demo.script import LANGUAGE, SECOND_LANGUAGE, second_name
from gtfs_schematic.demo.stops import HEADER, Row, stop_rows
from gtfs_schematic.demo.trips import trip_tables

AGENCY_ID, AGENCY_NAME = "movl", "Movål Nåsvelt"
_URL = "https://nasvelt.example/"
"""A name that never resolves (RFC 2606)."""
_TIME_ZONE = "Etc/GMT+1"
_ROUTE_TYPE = {"tram": "0", "metro": "1", "rail": "2", "bus": "3", "ferry": "4"}
_HALL, _SQUARE, _PIER = "192", "341", "361"
"""The three stations of the interchange that only transfers.txt joins."""
_WALKS = ((_HALL, _SQUARE, 240), (_HALL, _PIER, 270), (_SQUARE, _PIER, 210))
_CHANGES = (("122-R1", "122-U1", 180), ("122-R2", "122-U2", 180))
"""Changes inside one station: from and to platforms that share a parent."""


def _agency() -> list[Row]:
    return [
        ("agency_id", "agency_name", "agency_url", "agency_timezone", "agency_lang"),
        (AGENCY_ID, AGENCY_NAME, _URL, _TIME_ZONE, LANGUAGE),
    ]


def _route(line: Line) -> Row:
    return (
        line.key,
        AGENCY_ID,
        line.name,
        line.long_name,
        _ROUTE_TYPE[line.mode],
        line.color,
        "FFFFFF" if line.color else "",
        str(line.order),
    )


def _routes(region: Region) -> list[Row]:
    header = (
        "route_id",
        "agency_id",
        "route_short_name",
        "route_long_name",
        "route_type",
        "route_color",
        "route_text_color",
        "route_sort_order",
    )
    return [header, *(_route(line) for line in region.lines)]


def _calendar(region: Region) -> list[Row]:
    days = ("monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday")
    dates = (region.start_date, region.end_date)
    return [
        ("service_id", *days, "start_date", "end_date"),
        (WEEKDAY, *"1111100", *dates),
        (WEEKEND, *"0000011", *dates),
    ]


def _calendar_dates(region: Region) -> list[Row]:
    return [
        ("service_id", "date", "exception_type"),
        (WEEKDAY, region.holiday, "2"),
        (WEEKEND, region.holiday, "1"),
    ]


def _transfers() -> list[Row]:
    pairs = [*_WALKS, *_CHANGES]
    rows = [
        row
        for start, end, seconds in pairs
        for row in ((start, end, "2", str(seconds)), (end, start, "2", str(seconds)))
    ]
    return [("from_stop_id", "to_stop_id", "transfer_type", "min_transfer_time"), *rows]


def _translations(region: Region) -> list[Row]:
    header = ("table_name", "field_name", "language", "translation", "record_id")
    texts = [
        ("agency", "agency_name", AGENCY_NAME, AGENCY_ID),
        *(("routes", "route_long_name", line.long_name, line.key) for line in region.lines),
        *(("stops", "stop_name", row[2], row[0]) for row in stop_rows(region)),
    ]
    rows = [
        (table, field, SECOND_LANGUAGE, second_name(text), record)
        for table, field, text, record in texts
    ]
    return [header, *rows]


def _feed_info(region: Region) -> list[Row]:
    header = (
        "feed_publisher_name",
        "feed_publisher_url",
        "feed_lang",
        "feed_start_date",
        "feed_end_date",
        "feed_version",
        "feed_contact_url",
    )
    dates = (region.start_date, region.end_date)
    return [header, (AGENCY_NAME, _URL, LANGUAGE, *dates, region.version, _URL)]


def _attributions() -> list[Row]:
    header = (
        "attribution_id",
        "organization_name",
        "is_producer",
        "is_operator",
        "is_authority",
        "attribution_url",
    )
    return [
        header,
        ("1", AGENCY_NAME, "1", "1", "0", _URL),
        ("2", "Råd Nåsveltő", "0", "0", "1", f"{_URL}rad"),
    ]


def feed_tables(region: Region) -> dict[str, list[Row]]:
    """Give every table of a region's feed, header first, by file name."""
    return {
        "agency.txt": _agency(),
        "stops.txt": [HEADER, *stop_rows(region)],
        "routes.txt": _routes(region),
        "calendar.txt": _calendar(region),
        "calendar_dates.txt": _calendar_dates(region),
        **trip_tables(region),
        "transfers.txt": _transfers(),
        "translations.txt": _translations(region),
        "feed_info.txt": _feed_info(region),
        "attributions.txt": _attributions(),
    }
