"""Reading agency.txt and routes.txt."""

from __future__ import annotations

from functools import partial

from gtfs_schematic.feed.cells import Cell, is_usable_id, name_of, value_of, whole_of
from gtfs_schematic.feed.model import Agency, Route
from gtfs_schematic.feed.modes import mode_of
from gtfs_schematic.feed.networks import with_networks
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.values import parse_color, parse_whole


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
        "network_id",
    )
    notes = tables.notebook
    for row, texts in tables.rows("routes.txt", columns):
        ident, agency, short, long_, type_, color, text_color, order, network = map(
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
            network.text,
        )
    return with_networks(tables, routes)


def _agency_id(tables: Tables, cell: Cell, agencies: dict[str, Agency]) -> str:
    if cell.text in agencies:
        return cell.text
    sole = next(iter(agencies)) if len(agencies) == 1 else None
    if sole is None:
        cell.found(tables.notebook, "warning", "agency is not in agency.txt")
        return cell.text
    if cell.text:
        fault = "agency is not in agency.txt; the only one there is taken"
        cell.found(tables.notebook, "warning", fault)
    return sole


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
