"""Reading stop_times.txt: the calls of the trips of one service date, as arrays."""

from __future__ import annotations

from array import array
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed.cells import Cell
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.values import parse_time, parse_whole

Ints = NDArray[np.int64]

_FILE = "stop_times.txt"
_COLUMNS = (
    "trip_id",
    "stop_id",
    "stop_sequence",
    "arrival_time",
    "departure_time",
    "pickup_type",
    "drop_off_type",
)
NOT_TODAY = -1
_UNKNOWN = -2
_NO_TIME = -1


@dataclass(frozen=True)
class Calls:
    """Calls of trips at stops, sorted by trip and sequence: arrays of one length.

    Trips and stops are numbered by who reads; times are seconds after noon minus 12 h.
    """

    trip: Ints
    stop: Ints
    sequence: Ints
    arrival: Ints
    departure: Ints
    row: Ints

    def spans(self) -> Iterator[tuple[int, int]]:
        """Yield where each trip's calls start and end."""
        starts, ends = _bounds(self.trip)
        yield from zip(starts.tolist(), ends.tolist(), strict=True)

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


def read_calls(
    tables: Tables, trips: Mapping[str, int], stops: Mapping[str, int], placed: frozenset[int]
) -> Calls:
    """Read the calls of the trips given, leaving out trips that cannot be used.

    Rows are read one by one and only the calls of these trips are kept, as numbers.

    A call does not count if riders can neither board nor alight, if it names no stop or one
    that stops.txt does not have, or if its stop cannot be placed. A trip does not count if the
    order of its calls is unknown, if it has no time, or if fewer than two calls remain.

    Parameters
    ----------
    trips
        Numbers of all trips by id: from 0 in order of id for those of the service date,
        `NOT_TODAY` for the others.
    stops
        Numbers of all stops, by id; order of ids and of numbers are the same.
    placed
        Numbers of the stops that have a place.
    """
    calls, broken = _stream(tables, trips, stops)
    ids = sorted((i for i, number in trips.items() if number >= 0), key=trips.__getitem__)
    for trip in sorted(broken):
        tables.notebook.leave_out("trip", ids[trip], "the order of its stops is unknown")
    calls = calls.where(~np.isin(calls.trip, sorted(broken)))
    # Equal sequence numbers are against the rules; time, then stop, make the order definite.
    order = np.lexsort(
        (calls.stop, np.maximum(calls.arrival, calls.departure), calls.sequence, calls.trip)
    )
    calls = calls.where(order)
    _find_equal_sequences(tables, calls)
    calls = _drop_unplaced(tables, calls, list(stops), placed)
    calls = _merge_repeated(tables, calls)
    calls = _drop_short(tables, calls, ids)
    return _with_times(tables, calls, ids)


def _stream(
    tables: Tables, trips: Mapping[str, int], stops: Mapping[str, int]
) -> tuple[Calls, set[int]]:
    """Read the rows of the trips; give also the trips whose order is unknown."""
    columns = tuple(array("q") for _ in range(6))
    trip_col, stop_col, seq_col, arr_col, dep_col, row_col = columns
    broken: set[int] = set()
    times: dict[str, int] = {"": _NO_TIME}
    notes = tables.notebook
    for row, (trip_id, stop_id, sequence, arrival, departure, pickup, drop_off) in tables.rows(
        _FILE, _COLUMNS
    ):
        trip = trips.get(trip_id, _UNKNOWN)
        if trip < 0 or (pickup == "1" and drop_off == "1"):
            if trip == _UNKNOWN:
                Cell(_FILE, row, "trip_id", trip_id).found(
                    notes, "error", "trip is not in trips.txt"
                )
            continue
        stop = stops.get(stop_id)
        if stop is None:
            _find_no_stop(tables, row, stop_id)
            continue
        try:
            number = parse_whole(sequence)
        except ValueError:
            fault = "not a whole number; the trip is left out"
            Cell(_FILE, row, "stop_sequence", sequence).found(notes, "error", fault)
            broken.add(trip)
            continue
        arrives = times.get(arrival)
        if arrives is None:
            arrives = _time(tables, Cell(_FILE, row, "arrival_time", arrival), times)
        departs = times.get(departure)
        if departs is None:
            departs = _time(tables, Cell(_FILE, row, "departure_time", departure), times)
        trip_col.append(trip)
        stop_col.append(stop)
        seq_col.append(number)
        arr_col.append(arrives)
        dep_col.append(departs)
        row_col.append(row)
    arrays = [np.array(column, dtype=np.int64) for column in columns]
    return Calls(*arrays), broken


def _time(tables: Tables, cell: Cell, times: dict[str, int]) -> int:
    """Give a time not met before, and keep it; a bad one is found every time it is met."""
    try:
        times[cell.text] = parse_time(cell.text)
    except ValueError:
        fault = "not a time as HH:MM:SS; taken as not given"
        cell.found(tables.notebook, "warning", fault)
        return _NO_TIME
    return times[cell.text]


def _find_no_stop(tables: Tables, row: int, stop_id: str) -> None:
    cell = Cell(_FILE, row, "stop_id", stop_id)
    if stop_id:
        cell.found(tables.notebook, "error", "stop is not in stops.txt; the call does not count")
    else:
        cell.found(tables.notebook, "info", "call without a stop (service on demand) is skipped")


def _find_equal_sequences(tables: Tables, calls: Calls) -> None:
    equal = (calls.trip[1:] == calls.trip[:-1]) & (calls.sequence[1:] == calls.sequence[:-1])
    for n in np.flatnonzero(equal).tolist():
        tables.notebook.find(
            "error",
            _FILE,
            "stop_sequence stands twice in the trip; the calls are taken in order of time",
            row=int(calls.row[n + 1]),
            field="stop_sequence",
            value=str(calls.sequence[n + 1]),
        )


def _drop_unplaced(
    tables: Tables, calls: Calls, stop_ids: list[str], placed: frozenset[int]
) -> Calls:
    usable = np.isin(calls.stop, sorted(placed))
    for stop in np.unique(calls.stop[~usable]).tolist():
        reason = "neither it nor its station has coordinates"
        tables.notebook.leave_out("stop", stop_ids[stop], reason)
    return calls.where(usable)


def _merge_repeated(tables: Tables, calls: Calls) -> Calls:
    """Merge neighbouring calls at one stop: arrival of the first, departure of the last."""
    again = np.zeros(len(calls.trip), dtype=bool)
    again[1:] = (calls.trip[1:] == calls.trip[:-1]) & (calls.stop[1:] == calls.stop[:-1])
    if not again.any():
        return calls
    for n in np.flatnonzero(again).tolist():
        fault = "trip calls at the same stop as in its call before; the two are taken as one"
        tables.notebook.find("info", _FILE, fault, row=int(calls.row[n]), field="stop_id")
    firsts = np.flatnonzero(~again)
    lasts = np.append(firsts[1:], len(again)) - 1
    return replace(calls.where(firsts), departure=calls.departure[lasts])


def _drop_short(tables: Tables, calls: Calls, trip_ids: list[str]) -> Calls:
    counts = np.bincount(calls.trip, minlength=len(trip_ids))
    left_out = tables.notebook.left_out_ids("trip")
    for trip in np.flatnonzero(counts < 2).tolist():
        if tables.notebook.prefix + trip_ids[trip] not in left_out:
            tables.notebook.leave_out("trip", trip_ids[trip], "fewer than two usable stops")
    return calls.where(counts[calls.trip] >= 2)


def _with_times(tables: Tables, calls: Calls, trip_ids: list[str]) -> Calls:
    """Fill in missing times and make them run forward; trips without any time are left out."""
    calls = replace(
        calls,
        arrival=np.where(calls.arrival == _NO_TIME, calls.departure, calls.arrival),
        departure=np.where(calls.departure == _NO_TIME, calls.arrival, calls.departure),
    )
    timed = np.isin(calls.trip, calls.trip[calls.arrival != _NO_TIME])
    for trip in np.unique(calls.trip[~timed]).tolist():
        tables.notebook.leave_out("trip", trip_ids[trip], "no time at any stop")
    return _forward(tables, _interpolated(calls.where(timed)))


def _interpolated(calls: Calls) -> Calls:
    """Fill in missing times.

    Between known times, missing ones lie evenly by number of calls; before the first and after
    the last known one of a trip, they are equal to it.
    """
    arrival, departure = calls.arrival.copy(), calls.departure.copy()
    known = arrival != _NO_TIME
    if known.all():
        return calls
    for start, end in calls.spans():
        if known[start] and known[end - 1]:
            continue
        there = start + np.flatnonzero(known[start:end])
        first, last = int(there[0]), int(there[-1])
        arrival[start:first] = departure[start:first] = arrival[first]
        arrival[last + 1 : end] = departure[last + 1 : end] = departure[last]
        known[start:first] = known[last + 1 : end] = True
    # All ends are known now, so interpolation never reaches from trip to trip.
    place = np.arange(len(known))
    gaps = ~known
    between = np.interp(place[gaps], place[known], arrival[known])
    arrival[gaps] = departure[gaps] = np.rint(between).astype(np.int64)
    return replace(calls, arrival=arrival, departure=departure)


def _forward(tables: Tables, calls: Calls) -> Calls:
    """Make no arrival earlier than the one before."""
    backward = (calls.trip[1:] == calls.trip[:-1]) & (calls.arrival[1:] < calls.arrival[:-1])
    if not backward.any():
        return calls
    for n in np.flatnonzero(backward).tolist():
        tables.notebook.find(
            "error",
            _FILE,
            "arrives earlier than at a stop before; the later time is taken for both",
            row=int(calls.row[n + 1]),
            field="arrival_time",
        )
    arrival = calls.arrival.copy()
    for start, end in calls.spans():
        arrival[start:end] = np.maximum.accumulate(arrival[start:end])
    return replace(calls, arrival=arrival)


def _bounds(trip: Ints) -> tuple[Ints, Ints]:
    """Give where runs of equal numbers start and end."""
    if len(trip) == 0:
        return trip, trip
    cuts = np.flatnonzero(np.diff(trip)) + 1
    return np.concatenate(([0], cuts)), np.concatenate((cuts, [len(trip)]))
