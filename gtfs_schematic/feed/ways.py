"""Reading transfers.txt and shapes.txt."""

from __future__ import annotations

from collections.abc import Collection, Container, Mapping
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed import numerals
from gtfs_schematic.feed.blocks import Block, Masks, read_in_blocks
from gtfs_schematic.feed.cells import Cell, whole_of
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.interned import UNKNOWN, Interned
from gtfs_schematic.feed.kernels import Ints, Places
from gtfs_schematic.feed.model import Pattern, Transfer
from gtfs_schematic.feed.tables import REQUIRED_COLUMNS, Tables
from gtfs_schematic.feed.values import is_nowhere, parse_degrees, parse_whole

Floats = NDArray[np.float64]

_SHAPES = "shapes.txt"
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
    reader = _ShapeReader(tables.notebook, sorted(wanted))
    read_in_blocks(tables, _SHAPES, REQUIRED_COLUMNS[_SHAPES], reader.bulk, reader.single)
    return reader.shapes()


class _ShapeReader:
    """Gathers points of shapes: number of the shape, place in its order, lon, lat."""

    def __init__(self, notebook: Notebook, wanted: list[str]) -> None:
        self._notebook = notebook
        self._ids = Interned(wanted)
        self._parts: list[tuple[Places, Ints, Floats, Floats]] = []

    def bulk(self, block: Block) -> Masks:
        """Take what is regular; see `read_in_blocks`."""
        shape = self._ids.find(block.column(0), block.regular.view(np.uint8))
        here = shape != UNKNOWN
        odd = np.zeros(len(shape), dtype=np.uint8)
        lat, lon = np.empty(len(shape)), np.empty(len(shape))
        order = np.empty(len(shape), dtype=np.int64)
        used = here.view(np.uint8)
        numerals.parse_decimals(block.column(1), used, odd, lat)
        numerals.parse_decimals(block.column(2), used, odd, lon)
        numerals.parse_wholes(block.column(3), used, odd, order)
        nowhere = ((np.abs(lon) < 1.0) & (np.abs(lat) < 1.0)) | (np.abs(lat) > 89.0)
        strange: Masks = here & ((odd != 0) | nowhere | (np.abs(lon) > 180.0))
        good = here & ~strange
        self._parts.append((shape[good], order[good], lon[good], lat[good]))
        return strange

    def single(self, row: int, texts: tuple[str, ...]) -> None:
        """Take one row strictly."""
        ident, lat, lon, sequence = texts
        shape = self._ids.find_text(ident)
        if shape == UNKNOWN:
            return
        try:
            place = parse_degrees(lon, 180.0), parse_degrees(lat, 90.0)
            order = parse_whole(sequence)
        except ValueError:
            place, order = (0.0, 0.0), 0
        if is_nowhere(*place):
            fault = "shape point is no place on Earth or has no number; it does not count"
            cell = Cell(_SHAPES, row, "shape_pt_lat", f"{lat}, {lon}, {sequence}")
            cell.found(self._notebook, "warning", fault)
            return
        self._parts.append(
            (
                np.array([shape], dtype=np.int32),
                np.array([order], dtype=np.int64),
                np.array([place[0]]),
                np.array([place[1]]),
            )
        )

    def shapes(self) -> dict[str, Floats]:
        """Give all shapes gathered, by id in order."""
        if not self._parts:
            return {}
        shape, order, lon, lat = map(np.concatenate, zip(*self._parts, strict=True))
        ranks = np.argsort(shape, kind="stable")
        if not (np.diff(order[ranks])[np.diff(shape[ranks]) == 0] > 0).all():
            # Equal numbers are against the rules; the coordinates make the order definite.
            ranks = np.lexsort((lat, lon, order, shape))
        shape, points = shape[ranks], np.column_stack([lon, lat])[ranks]
        cuts = np.searchsorted(shape, np.arange(len(self._ids) + 1))
        found = {}
        for number in range(len(self._ids)):
            own = points[cuts[number] : cuts[number + 1]].copy()
            own.setflags(write=False)
            if len(own) >= 2:
                found[self._ids[number]] = own
        return found


def without_missing_shapes(
    tables: Tables, patterns: tuple[Pattern, ...], shapes: Mapping[str, NDArray[np.float64]]
) -> tuple[Pattern, ...]:
    """Give the patterns with the shapes that are not there taken out; each is found once."""
    missing = {p.shape_id for p in patterns if p.shape_id and p.shape_id not in shapes}
    for ident in sorted(missing):
        fault = "shape of a trip is not in shapes.txt, or has fewer than two points"
        tables.notebook.find("warning", "trips.txt", fault, field="shape_id", value=ident)
    return tuple(replace(p, shape_id=None) if p.shape_id in missing else p for p in patterns)
