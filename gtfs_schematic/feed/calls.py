"""Putting the calls of the trips of the service dates in order, and filling in their times."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from gtfs_schematic.feed.blocks import read_in_blocks
from gtfs_schematic.feed.callrows import COLUMNS, FILE, CallReader, Calls, Wanted
from gtfs_schematic.feed.numerals import NO_TIME
from gtfs_schematic.feed.tables import Tables


def read_calls(tables: Tables, wanted: Wanted) -> Calls:
    """Read the calls of the trips of the service date, leaving out trips that cannot be used.

    A call does not count if riders can neither board nor alight, if it names no stop or one
    that stops.txt does not have, or if its stop cannot be placed. A trip does not count if the
    order of its calls is unknown, if it has no time, or if fewer than two calls remain.
    """
    reader = CallReader(tables.notebook, wanted)
    read_in_blocks(tables, FILE, COLUMNS, reader.bulk, reader.single, known=wanted.trips)
    calls = reader.calls()
    ids = wanted.trip_id
    for trip in sorted(reader.broken):
        tables.notebook.leave_out("trip", ids(trip), "the order of its stops is unknown")
    if reader.broken:
        calls = calls.where(~np.isin(calls.trip, sorted(reader.broken)))
    calls = _in_order(calls)
    negative = calls.row[calls.sequence < 0].tolist()
    tables.notebook.find_rows(
        "warning", FILE, "stop_sequence is negative; it counts", negative, "stop_sequence"
    )
    _find_equal_sequences(tables, calls)
    calls = _drop_unplaced(tables, calls, wanted)
    calls = _merge_repeated(tables, calls)
    calls = _drop_short(tables, calls, wanted, reader)
    return _with_times(tables, calls, ids)


def without_stops(tables: Tables, calls: Calls, wanted: Wanted, stops: Sequence[int]) -> Calls:
    """Give the calls without those at some stops, and without trips that are then too short."""
    calls = _merge_repeated(tables, calls.where(~np.isin(calls.stop, stops)))
    return _drop_short(tables, calls, wanted, None)


def _in_order(calls: Calls) -> Calls:
    """Sort calls by trip and sequence.

    Equal sequence numbers are against the rules; time, then stop, make the order definite.
    """
    ahead = np.diff(calls.trip)
    if ((ahead > 0) | ((ahead == 0) & (np.diff(calls.sequence) > 0))).all():
        return calls
    return calls.where(
        np.lexsort(
            (
                calls.row,
                calls.stop,
                np.maximum(calls.arrival, calls.departure),
                calls.sequence,
                calls.trip,
            )
        )
    )


def _find_equal_sequences(tables: Tables, calls: Calls) -> None:
    equal = (calls.trip[1:] == calls.trip[:-1]) & (calls.sequence[1:] == calls.sequence[:-1])
    for n in np.flatnonzero(equal).tolist():
        tables.notebook.find(
            "error",
            FILE,
            "stop_sequence stands twice in the trip; the calls are taken in order of time",
            row=int(calls.row[n + 1]),
            field="stop_sequence",
            value=str(calls.sequence[n + 1]),
        )


def _drop_unplaced(tables: Tables, calls: Calls, wanted: Wanted) -> Calls:
    usable = wanted.placed[calls.stop]
    if usable.all():
        return calls
    for stop in np.unique(calls.stop[~usable]).tolist():
        reason = "neither it nor its station has coordinates"
        tables.notebook.leave_out("stop", wanted.stops[stop], reason)
    return calls.where(usable)


def _merge_repeated(tables: Tables, calls: Calls) -> Calls:
    """Merge neighbouring calls at one stop: arrival of the first, departure of the last."""
    again = np.zeros(len(calls.trip), dtype=bool)
    again[1:] = (calls.trip[1:] == calls.trip[:-1]) & (calls.stop[1:] == calls.stop[:-1])
    if not again.any():
        return calls
    for n in np.flatnonzero(again).tolist():
        fault = "trip calls at the same stop as in its call before; the two are taken as one"
        tables.notebook.find("info", FILE, fault, row=int(calls.row[n]), field="stop_id")
    firsts = np.flatnonzero(~again)
    lasts = np.append(firsts[1:], len(again)) - 1
    return replace(calls.where(firsts), departure=calls.departure[lasts])


def _drop_short(tables: Tables, calls: Calls, wanted: Wanted, reader: CallReader | None) -> Calls:
    counts = np.bincount(calls.trip, minlength=len(wanted.of_today))
    for trip in np.flatnonzero(counts < 2).tolist():
        if reader and not reader.listed[trip]:
            reason = "it has no row in stop_times.txt"
        elif reader and trip in reader.on_demand:
            reason = "it runs on demand: stop_times.txt names areas for it instead of stops"
        else:
            reason = "fewer than two usable stops"
        tables.notebook.leave_out("trip", wanted.trip_id(trip), reason)
    enough = counts[calls.trip] >= 2
    return calls if enough.all() else calls.where(enough)


def _with_times(tables: Tables, calls: Calls, trip_id: Callable[[int], str]) -> Calls:
    """Fill in missing times and make them run forward; trips without any time are left out."""
    half = (calls.arrival == NO_TIME) != (calls.departure == NO_TIME)
    if half.any():
        fault = "only one of arrival and departure is given; it is taken for both"
        field = "arrival_time, departure_time"
        tables.notebook.find_rows("info", FILE, fault, calls.row[half].tolist(), field)
    calls = replace(
        calls,
        arrival=np.where(calls.arrival == NO_TIME, calls.departure, calls.arrival),
        departure=np.where(calls.departure == NO_TIME, calls.arrival, calls.departure),
    )
    known = calls.arrival != NO_TIME
    if known.all():
        return _forward(tables, calls)
    timed = np.isin(calls.trip, calls.trip[known])
    for trip in np.unique(calls.trip[~timed]).tolist():
        tables.notebook.leave_out("trip", trip_id(trip), "no time at any stop")
    calls = calls.where(timed)
    starts, ends = calls.bounds()
    at_ends = np.unique(np.concatenate([starts, ends - 1]))
    missing = calls.row[at_ends[calls.arrival[at_ends] == NO_TIME]]
    fault = "trip has no time at its first or last stop; the nearest one known is taken"
    tables.notebook.find_rows("warning", FILE, fault, missing.tolist(), "arrival_time")
    return _forward(tables, _interpolated(calls))


def _interpolated(calls: Calls) -> Calls:
    """Fill in missing times.

    Between known times, missing ones lie evenly by number of calls; before the first and after
    the last known one of a trip, they are equal to it.
    """
    arrival, departure = calls.arrival.copy(), calls.departure.copy()
    known = arrival != NO_TIME
    if known.all():
        return calls
    for start, end in zip(*calls.bounds(), strict=True):
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
    arrival[gaps] = departure[gaps] = np.rint(between).astype(arrival.dtype)
    return replace(calls, arrival=arrival, departure=departure)


def _forward(tables: Tables, calls: Calls) -> Calls:
    """Make no arrival earlier than the one before."""
    backward = (calls.trip[1:] == calls.trip[:-1]) & (calls.arrival[1:] < calls.arrival[:-1])
    if not backward.any():
        return calls
    for n in np.flatnonzero(backward).tolist():
        tables.notebook.find(
            "error",
            FILE,
            "arrives earlier than at a stop before; the later time is taken for both",
            row=int(calls.row[n + 1]),
            field="arrival_time",
        )
    arrival = calls.arrival.copy()
    for start, end in zip(*calls.bounds(), strict=True):
        arrival[start:end] = np.maximum.accumulate(arrival[start:end])
    return replace(calls, arrival=arrival)
