"""Reading the rows of stop_times.txt: the calls of the trips of the service dates, as arrays."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed import numerals
from gtfs_schematic.feed.blocks import Block, Masks
from gtfs_schematic.feed.cells import Cell
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.interned import UNKNOWN, Interned
from gtfs_schematic.feed.numerals import NO_TIME
from gtfs_schematic.feed.values import parse_time, parse_whole

Ints = NDArray[Any]
"""Whole numbers, in 32 or 64 bits."""

FILE = "stop_times.txt"
COLUMNS = (
    "trip_id",
    "stop_id",
    "stop_sequence",
    "arrival_time",
    "departure_time",
    "pickup_type",
    "drop_off_type",
)
NOT_TODAY = -1
_ONE = 49


@dataclass(frozen=True)
class Calls:
    """Calls of trips at stops, sorted by trip and sequence: arrays of one length.

    Trips and stops are numbered as in `Wanted`; times are seconds after noon minus 12 h.
    """

    trip: Ints
    stop: Ints
    sequence: Ints
    arrival: Ints
    departure: Ints
    row: Ints

    def bounds(self) -> tuple[Ints, Ints]:
        """Give where each trip's calls start and end."""
        if len(self.trip) == 0:
            return np.empty(0, np.int64), np.empty(0, np.int64)
        cuts = np.flatnonzero(np.diff(self.trip)) + 1
        return np.concatenate(([0], cuts)), np.concatenate((cuts, [len(self.trip)]))

    def where(self, mask: NDArray[np.bool_] | Ints) -> Calls:
        """Give the calls that a mask or an order of numbers picks."""
        return Calls(
            self.trip[mask],
            self.stop[mask],
            self.sequence[mask],
            self.arrival[mask],
            self.departure[mask],
            self.row[mask],
        )


@dataclass(frozen=True)
class Wanted:
    """What calls are read for."""

    trips: Interned
    """All trips of the feed."""
    today: Ints
    """Per trip its number among those of the service date, or `NOT_TODAY`."""
    stops: Interned
    """All stops of the feed."""
    placed: Masks
    """Per stop whether it has a place."""

    @cached_property
    def of_today(self) -> Ints:
        """Trips of the service date, in order of their numbers."""
        chosen = np.flatnonzero(self.today != NOT_TODAY)
        return np.asarray(chosen[np.argsort(self.today[chosen])])

    def trip_id(self, number: int) -> str:
        """Give the id of a trip of the service date."""
        return self.trips[int(self.of_today[number])]


class CallReader:
    """Gathers the calls of the trips of the service date, as numbers."""

    def __init__(self, notebook: Notebook, wanted: Wanted) -> None:
        self._notebook, self._wanted = notebook, wanted
        # UNKNOWN picks the last entry.
        self._today = np.append(wanted.today, NOT_TODAY)
        self._parts: list[Calls] = []
        self._times: dict[str, int] = {"": NO_TIME}
        self.broken: set[int] = set()
        """Trips whose order is unknown."""
        self.on_demand: set[int] = set()
        """Trips with a row that names no stop."""
        self.listed: Masks = np.zeros(len(wanted.of_today), dtype=np.bool_)
        """Which trips have any row."""

    def bulk(self, block: Block) -> Masks:
        """Take what is regular; see `read_in_blocks`."""
        trips = block.numbers
        trip = self._today[trips]
        here = block.regular & (trip != NOT_TODAY)
        rest: Masks = (trips == UNKNOWN) & block.regular
        if not here.any():
            return rest
        self.listed[trip[here]] = True
        rows = np.flatnonzero(here)
        here[rows[_is_one(block, 5, rows) & _is_one(block, 6, rows)]] = False
        odd = np.zeros(len(trip), dtype=np.uint8)
        used = here.view(np.uint8)
        stop = self._wanted.stops.find(block.column(1), used)
        sequence, arrival, departure = (np.empty(len(trip), dtype=np.int64) for _ in range(3))
        numerals.parse_wholes(block.column(2), used, odd, sequence)
        numerals.parse_times(block.column(3), used, odd, arrival)
        numerals.parse_times(block.column(4), used, odd, departure)
        strange = here & ((odd != 0) | (stop == UNKNOWN))
        good = here & ~strange
        self._parts.append(
            Calls(
                trip[good].astype(np.int32),
                stop[good],
                sequence[good],
                arrival[good].astype(np.int32),
                departure[good].astype(np.int32),
                block.rows[good],
            )
        )
        rest |= strange
        return rest

    def single(self, row: int, texts: tuple[str, ...]) -> None:
        """Take one row strictly."""
        trip_id, stop_id, sequence, arrival, departure, pickup, drop_off = texts
        number = self._wanted.trips.find_text(trip_id)
        if number == UNKNOWN:
            Cell(FILE, row, "trip_id", trip_id).found(
                self._notebook, "error", "trip is not in trips.txt"
            )
            return
        trip = int(self._wanted.today[number])
        if trip == NOT_TODAY:
            return
        self.listed[trip] = True
        if pickup == "1" and drop_off == "1":
            return
        stop = self._wanted.stops.find_text(stop_id)
        if stop == UNKNOWN:
            _find_no_stop(self._notebook, row, stop_id)
            if not stop_id:
                self.on_demand.add(trip)
            return
        try:
            order = parse_whole(sequence)
        except ValueError:
            fault = "not a whole number; the trip is left out"
            Cell(FILE, row, "stop_sequence", sequence).found(self._notebook, "error", fault)
            self.broken.add(trip)
            return
        arrives = self._time(Cell(FILE, row, "arrival_time", arrival))
        departs = self._time(Cell(FILE, row, "departure_time", departure))
        values = (trip, stop, order, arrives, departs, row)
        self._parts.append(Calls(*(np.array([value]) for value in values)))

    def _time(self, cell: Cell) -> int:
        """Give a time; a bad one is found every time it is met."""
        if cell.text not in self._times:
            try:
                self._times[cell.text] = parse_time(cell.text)
            except ValueError:
                fault = "not a time as HH:MM:SS; taken as not given"
                cell.found(self._notebook, "warning", fault)
                return NO_TIME
        return self._times[cell.text]

    def calls(self) -> Calls:
        """Give all calls gathered."""
        types = (np.int32, np.int32, np.int64, np.int32, np.int32, np.int64)
        names = ("trip", "stop", "sequence", "arrival", "departure", "row")
        columns = []
        for name, kind in zip(names, types, strict=True):
            parts = [getattr(part, name) for part in self._parts]
            columns.append(np.concatenate([np.empty(0, kind), *parts]).astype(kind, copy=False))
        self._parts.clear()
        return Calls(*columns)


def _is_one(block: Block, column: int, rows: Ints) -> Masks:
    """Tell which of some rows have the text "1" in a column."""
    buffer, starts, ends = block.column(column)
    one: Masks = ends[rows] - starts[rows] == 1
    one[one] = buffer[starts[rows[one]]] == _ONE
    return one


def _find_no_stop(notebook: Notebook, row: int, stop_id: str) -> None:
    cell = Cell(FILE, row, "stop_id", stop_id)
    if stop_id:
        cell.found(notebook, "error", "stop is not in stops.txt; the call does not count")
    else:
        cell.found(notebook, "info", "call without a stop (service on demand) is skipped")
