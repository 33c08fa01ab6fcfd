"""Reading transfers.txt and shapes.txt."""

from __future__ import annotations

from array import array
from collections import defaultdict
from collections.abc import Collection, Container, Mapping
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed.cells import Cell, whole_of
from gtfs_schematic.feed.model import Pattern, Transfer
from gtfs_schematic.feed.tables import REQUIRED_COLUMNS, Tables
from gtfs_schematic.feed.values import is_nowhere, parse_degrees, parse_whole

_TRANSFER_TYPES = range(6)
_NOT_POSSIBLE = 3


def read_transfers(
    tables: Tables, stop_ids: frozenset[str], known: Container[str]
) -> tuple[Transfer, ...]:
    """Give the transfers between two different stops of the timetable, stations included.

    A transfer that is forbidden between certain routes or trips only says nothing about the
    stops as such and is left out, as is one that names a stop which nothing calls at.
    """
    transfers = set()
    notes = tables.notebook
    columns = (
        "from_stop_id",
        "to_stop_id",
        "transfer_type",
        "min_transfer_time",
        "from_route_id",
        "to_route_id",
        "from_trip_id",
        "to_trip_id",
    )
    for row, (start, end, type_, time, *narrowing) in tables.rows("transfers.txt", columns):
        at = partial(Cell, "transfers.txt", row)
        unknown = [stop for stop in (start, end) if stop and stop not in known]
        if unknown:
            fault = "transfer names a stop that stops.txt does not have; it is left out"
            at("from_stop_id, to_stop_id", unknown[0]).found(notes, "error", fault)
        if start == end or not start or not end:
            continue  # a change within one stop, or from trip to trip, joins no two stops
        kind = whole_of(notes, at("transfer_type", type_)) or 0
        ident = f"{start} → {end}"
        if start not in stop_ids or end not in stop_ids:
            notes.leave_out("transfer", ident, "it names a stop that is not in the timetable")
        elif kind not in _TRANSFER_TYPES:
            at("transfer_type", type_).found(notes, "warning", "transfer type is unknown")
            notes.leave_out("transfer", f"{ident}, type {kind}", "its type is unknown")
        elif kind == _NOT_POSSIBLE and any(narrowing):
            notes.leave_out(
                "transfer", f"{ident}, type 3", "forbidden for certain routes or trips only"
            )
        else:
            seconds = whole_of(notes, at("min_transfer_time", time))
            usable = seconds if seconds is not None and seconds >= 0 else None
            transfers.add(Transfer(start, end, kind, usable))
    return tuple(sorted(transfers, key=transfer_key))


def transfer_key(transfer: Transfer) -> tuple[object, ...]:
    """Give what transfers are sorted by: their fields, None first."""
    time = -1 if transfer.min_time_s is None else transfer.min_time_s
    return (transfer.from_stop_id, transfer.to_stop_id, transfer.transfer_type, time)


def read_shapes(tables: Tables, wanted: Collection[str]) -> dict[str, NDArray[np.float64]]:
    """Give the shapes wanted as read-only (n, 2) arrays of lon, lat in degrees, n >= 2.

    Points that are no place on Earth are found and skipped.
    """
    points: defaultdict[str, tuple[array[int], array[float]]] = defaultdict(
        lambda: (array("q"), array("d"))
    )
    columns = REQUIRED_COLUMNS["shapes.txt"]
    for row, (ident, lat, lon, sequence) in tables.rows("shapes.txt", columns):
        if ident not in wanted:
            continue
        try:
            place = parse_degrees(lon, 180.0), parse_degrees(lat, 90.0)
            order = parse_whole(sequence)
        except ValueError:
            place, order = (0.0, 0.0), 0
        if is_nowhere(*place):
            fault = "shape point is no place on Earth or has no number; it does not count"
            cell = Cell("shapes.txt", row, "shape_pt_lat", f"{lat}, {lon}, {sequence}")
            cell.found(tables.notebook, "warning", fault)
            continue
        orders, places = points[ident]
        orders.append(order)
        places.extend(place)
    shapes = {}
    for ident in sorted(points):
        orders, places = points[ident]
        shape = np.array(places).reshape(-1, 2)
        # Equal numbers are against the rules; the coordinates make the order definite.
        shape = shape[np.lexsort((shape[:, 1], shape[:, 0], np.array(orders)))]
        shape.setflags(write=False)
        if len(shape) >= 2:
            shapes[ident] = shape
    return shapes


def without_missing_shapes(
    tables: Tables, patterns: tuple[Pattern, ...], shapes: Mapping[str, NDArray[np.float64]]
) -> tuple[Pattern, ...]:
    """Give the patterns with the shapes that are not there taken out; each is found once."""
    missing = {p.shape_id for p in patterns if p.shape_id and p.shape_id not in shapes}
    for ident in sorted(missing):
        fault = "shape of a trip is not in shapes.txt, or has fewer than two points"
        tables.notebook.find("warning", "trips.txt", fault, field="shape_id", value=ident)
    return tuple(replace(p, shape_id=None) if p.shape_id in missing else p for p in patterns)
