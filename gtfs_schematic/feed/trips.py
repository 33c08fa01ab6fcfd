"""Reading trips.txt into columns: a national feed has millions of trips, few of which are drawn."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed import numerals
from gtfs_schematic.feed.blocks import Block, Masks, read_in_blocks
from gtfs_schematic.feed.cells import Cell, is_usable_id, name_of, value_of
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.interned import UNKNOWN, Interned
from gtfs_schematic.feed.kernels import Ints
from gtfs_schematic.feed.model import Route
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.values import clean_name

_FILE = "trips.txt"
_COLUMNS = ("trip_id", "route_id", "service_id", "trip_headsign", "direction_id", "shape_id")
_ZERO, _ONE = 48, 49
NO_DIRECTION = -1


@dataclass(frozen=True)
class Trips:
    """All trips of a feed; a trip's number is its place in every array."""

    ids: Interned
    route: Ints
    """Number in `route_ids`; -1 if routes.txt does not have the route."""
    service: Ints
    headsign: Ints
    shape: Ints
    """Numbers in `services`, `headsigns` and `shapes`."""
    direction: Ints
    """0, 1 or `NO_DIRECTION`."""
    route_ids: Sequence[str]
    services: Interned
    headsigns: Interned
    shapes: Interned

    def of_routes(self, route_ids: Mapping[str, object]) -> Masks:
        """Tell which trips are of some routes."""
        chosen = np.array([*(ident in route_ids for ident in self.route_ids), False])
        return np.asarray(chosen[self.route], dtype=np.bool_)

    def service_ids(self) -> list[str]:
        """Give the services that any trip has."""
        return [self.services[n] for n in np.unique(self.service).tolist()]

    def services_of_routes(self) -> dict[str, frozenset[str]]:
        """Give the services of every route's trips, by route id."""
        known = self.route >= 0
        count = max(1, len(self.services))
        pairs = np.unique(self.route[known] * count + self.service[known])
        found: dict[str, set[str]] = {}
        for route, service in (divmod(pair, count) for pair in pairs.tolist()):
            found.setdefault(self.route_ids[route], set()).add(self.services[service])
        return {route: frozenset(services) for route, services in found.items()}


def read_trips(tables: Tables, routes: Mapping[str, Route]) -> Trips:
    """Read all trips; those of unknown routes are found and listed as left out."""
    reader = _Reader(tables.notebook, routes)
    read_in_blocks(tables, _FILE, _COLUMNS, reader.bulk, reader.single)
    return reader.result()


class _Texts:
    """One column of repeated texts; texts that the strict reader would change are refused."""

    def __init__(self) -> None:
        self.known = Interned()
        self._bad: list[int] = []

    def numbers(self, block: Block, column: int, wanted: Masks) -> tuple[NDArray[np.int32], Masks]:
        """Give the numbers of the wanted rows' texts, and whether each may be taken as it is."""
        buffer, starts, ends = block.column(column)
        before = len(self.known)
        numbers = self.known.add((buffer, starts[wanted], ends[wanted]))
        for number in range(before, len(self.known)):
            text = self.known[number]
            if clean_name(text) != text:
                self._bad.append(number)
        return numbers, ~np.isin(numbers, self._bad)


class _Reader:
    """Gathers the rows of trips.txt: numbers of row, id, route, service, headsign, …."""

    def __init__(self, notebook: Notebook, routes: Mapping[str, Route]) -> None:
        self._notebook = notebook
        self._route_ids = list(routes)
        self._routes = Interned(self._route_ids)
        self._ids = Interned()
        self._services, self._headsigns, self._shapes = _Texts(), _Texts(), _Texts()
        self._parts: list[Ints] = []
        self._unknown: dict[int, str] = {}

    def bulk(self, block: Block) -> Masks:
        odd = np.zeros(len(block.regular), dtype=np.uint8)
        regular = block.regular.view(np.uint8)
        numerals.mark_unprintable(block.column(0), regular, odd)
        route = self._routes.find(block.column(1))
        direction, clear = _directions(block)
        good: Masks = block.regular & (odd == 0) & (route != UNKNOWN) & clear
        columns = []
        for texts, column in ((self._services, 2), (self._headsigns, 3), (self._shapes, 5)):
            numbers, usable = texts.numbers(block, column, good)
            whole = np.zeros(len(good), dtype=np.int64)
            whole[good] = numbers
            good[good] = usable
            columns.append(whole)
        buffer, starts, ends = block.column(0)
        ids = self._ids.add((buffer, starts[good], ends[good]))
        self._parts.append(
            np.column_stack(
                [
                    block.rows[good],
                    ids,
                    route[good],
                    *(column[good] for column in columns),
                    direction[good],
                ]
            )
        )
        left: Masks = ~good
        return left

    def single(self, row: int, texts: tuple[str, ...]) -> None:
        trip_id, route_id, service_id, headsign, direction, shape_id = texts
        at = partial(Cell, _FILE, row)
        if not is_usable_id(self._notebook, at("trip_id", trip_id), ()):
            return
        route = self._routes.find_text(route_id)
        if route == UNKNOWN:
            self._unknown[row] = route_id
        name = name_of(self._notebook, at("trip_headsign", headsign))
        fault = "direction is 0, 1 or empty"
        way = value_of(self._notebook, at("direction_id", direction), _parse_direction, fault)
        values = [
            row,
            self._ids.add_text(trip_id),
            route,
            self._services.known.add_text(service_id),
            self._headsigns.known.add_text(name),
            self._shapes.known.add_text(shape_id),
            NO_DIRECTION if way is None else way,
        ]
        self._parts.append(np.array([values], dtype=np.int64))

    def result(self) -> Trips:
        rows = np.concatenate([np.empty((0, 7), dtype=np.int64), *self._parts])
        rows = rows[np.argsort(rows[:, 0], kind="stable")]
        _, firsts = np.unique(rows[:, 1], return_index=True)
        again = np.ones(len(rows), dtype=np.bool_)
        again[firsts] = False
        for row, ident in rows[again][:, :2].tolist():
            fault = "id stands in the table before; the first row counts"
            Cell(_FILE, row, "trip_id", self._ids[ident]).found(self._notebook, "error", fault)
            self._unknown.pop(row, None)
        rows = rows[firsts]
        for row, ident in sorted(rows[rows[:, 2] == UNKNOWN][:, :2].tolist()):
            fault = "trip of a route that routes.txt does not have; it is left out"
            cell = Cell(_FILE, row, "route_id", self._unknown[row])
            cell.found(self._notebook, "error", fault)
            self._notebook.leave_out("trip", self._ids[ident], "its route is not in routes.txt")
        route, service, headsign, shape, direction = (
            np.ascontiguousarray(rows[:, n]) for n in (2, 3, 4, 5, 6)
        )
        return Trips(
            self._ids,
            route,
            service,
            headsign,
            shape,
            direction,
            self._route_ids,
            self._services.known,
            self._headsigns.known,
            self._shapes.known,
        )


def _directions(block: Block) -> tuple[Ints, Masks]:
    """Give the directions, and whether each is clear."""
    buffer, starts, ends = block.column(4)
    size = ends - starts
    direction = np.full(len(starts), NO_DIRECTION, dtype=np.int64)
    one = size == 1
    direction[one] = buffer[starts[one]].astype(np.int64) - _ZERO
    return direction, (size == 0) | (one & (direction >= 0) & (direction <= _ONE - _ZERO))


def _parse_direction(text: str) -> int:
    if text not in {"0", "1"}:
        raise ValueError(text)
    return int(text)
