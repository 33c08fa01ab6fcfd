"""Reading agency.txt, routes.txt and trips.txt."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial

from gtfs_schematic.feed.cells import Cell, is_usable_id, name_of, value_of, whole_of
from gtfs_schematic.feed.model import Agency, Route
from gtfs_schematic.feed.modes import mode_of, refusal
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.values import parse_color, parse_whole


@dataclass(frozen=True, slots=True)
class Trip:
    """A row of trips.txt."""

    id: str
    route_id: str
    service_id: str
    headsign: str
    direction_id: int | None
    shape_id: str


def read_agencies(tables: Tables) -> dict[str, Agency]:
    """Give the agencies by id; the id of a sole agency may be empty."""
    agencies: dict[str, Agency] = {}
    columns = ("agency_id", "agency_name", "agency_url", "agency_timezone", "agency_lang")
    for row, (ident, name, *others) in tables.rows("agency.txt", columns):
        at = partial(Cell, "agency.txt", row)
        known = agencies or ()
        if (not ident and not known) or is_usable_id(
            tables.notebook, at("agency_id", ident), known
        ):
            named = name_of(tables.notebook, at("agency_name", name))
            agencies[ident] = Agency(ident, named, *others)
    return agencies


def read_routes(tables: Tables, agencies: dict[str, Agency]) -> dict[str, Route]:
    """Give all routes by id, of every mode."""
    routes: dict[str, Route] = {}
    columns = (
        "route_id",
        "agency_id",
        "route_short_name",
        "route_long_name",
        "route_type",
        "route_color",
        "route_text_color",
        "route_sort_order",
    )
    notes = tables.notebook
    for row, texts in tables.rows("routes.txt", columns):
        ident, agency, short, long_, type_, color, text_color, order = map(
            partial(Cell, "routes.txt", row), columns, texts
        )
        if not is_usable_id(notes, ident, routes):
            continue
        if not short.text and not long_.text:
            ident.found(notes, "warning", "route has no name")
        route_type, mode = _mode(tables, type_)
        routes[ident.text] = Route(
            ident.text,
            _agency_id(tables, agency, agencies),
            name_of(notes, short),
            name_of(notes, long_),
            mode,
            route_type,
            _color(tables, color),
            _color(tables, text_color),
            whole_of(notes, order),
        )
    return routes


def keep_modes(
    tables: Tables, routes: dict[str, Route], wanted: tuple[str, ...]
) -> dict[str, Route]:
    """Give the routes of the wanted modes; the others are noted as left out."""
    kept = {}
    for ident, route in routes.items():
        reason = refusal(route.route_type, route.mode, wanted)
        if reason:
            tables.notebook.leave_out("route", ident, reason)
        else:
            kept[ident] = route
    return kept


def read_trips(tables: Tables, routes: dict[str, Route]) -> dict[str, Trip]:
    """Give all trips by id; trips of unknown routes are found and left out."""
    trips: dict[str, Trip] = {}
    notes = tables.notebook
    columns = ("trip_id", "route_id", "service_id", "trip_headsign", "direction_id", "shape_id")
    for row, (trip_id, route_id, service_id, headsign, direction, shape_id) in tables.rows(
        "trips.txt", columns
    ):
        at = partial(Cell, "trips.txt", row)
        if not is_usable_id(notes, at("trip_id", trip_id), trips):
            continue
        if route_id not in routes:
            fault = "trip of a route that routes.txt does not have; it is left out"
            at("route_id", route_id).found(notes, "error", fault)
            notes.leave_out("trip", trip_id, "its route is not in routes.txt")
        trips[trip_id] = Trip(
            trip_id,
            route_id,
            service_id,
            name_of(notes, at("trip_headsign", headsign)),
            value_of(
                notes, at("direction_id", direction), _parse_direction, "direction is 0, 1 or empty"
            ),
            shape_id,
        )
    return trips


def _parse_direction(text: str) -> int:
    if text not in {"0", "1"}:
        raise ValueError(text)
    return int(text)


def _agency_id(tables: Tables, cell: Cell, agencies: dict[str, Agency]) -> str:
    if not cell.text and len(agencies) == 1:
        return next(iter(agencies))
    if cell.text not in agencies:
        cell.found(tables.notebook, "warning", "agency is not in agency.txt")
    return cell.text


def _mode(tables: Tables, cell: Cell) -> tuple[int, str]:
    """Give route type and mode; -1 and "other" for a type that is no number."""
    number, mode = -1, None
    try:
        number = parse_whole(cell.text)
        mode = mode_of(number)
    except ValueError:
        pass  # found below, as an unknown number is
    if mode is None:
        fault = "route type is unknown; the route is drawn as mode other"
        cell.found(tables.notebook, "warning", fault)
    return number, mode or "other"


def _color(tables: Tables, cell: Cell) -> str | None:
    if cell.text.startswith("#"):
        cell.found(tables.notebook, "info", "color should be written without '#'")
        cell = Cell(cell.file, cell.row, cell.field, cell.text[1:])
    fault = "color is not six hexadecimal digits; taken as not given"
    return value_of(tables.notebook, cell, parse_color, fault)
