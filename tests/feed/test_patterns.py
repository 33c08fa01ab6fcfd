"""Trips of the service date become patterns: what is counted, filled in and left out."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.errors import FeedError

TRIPS = "route_id,service_id,trip_id,trip_headsign,direction_id,shape_id\n"
TIMES = "trip_id,arrival_time,departure_time,stop_id,stop_sequence"


def pattern(timetable, route_id, first):
    (found,) = [p for p in timetable.patterns if p.route_id == route_id and p.stop_ids[0] == first]
    return found


def left_out(timetable, kind):
    return {item.id: item.reason for item in timetable.left_out if item.kind == kind}


def one_trip(rows, columns=TIMES):
    """Give changes that leave one trip, x, of route t1 with these calls."""
    return {
        "trips.txt": f"{TRIPS}t1,wk,x,End,0,\n",
        "stop_times.txt": columns + "\n" + "".join(f"x,{row}\n" for row in rows),
    }


def test_trips_with_the_same_stops_are_one_pattern(read_town):
    timetable = read_town()
    assert len(timetable.patterns) == 3
    up = pattern(timetable, "t1", "gate1")
    assert up.stop_ids == ("gate1", "tams", "vend", "parv")
    assert up.departures_s == (8 * 3600 + 30, 25 * 3600 + 30)
    # arrivals after departure: 210 and 330 s, 510 and 630 s, 870 and 990 s; medians by hand
    assert up.offsets_s == (0, 270, 570, 930)
    assert (up.direction_id, up.headsign, up.shape_id) == (0, "Parvinholm", "up")
    bus = pattern(timetable, "b7", "vend")
    assert (bus.direction_id, bus.shape_id, bus.departures_s) == (None, None, (25200,))


def test_headways_are_counted_out_end_excluded(read_town):
    headways = (
        "trip_id,start_time,end_time,headway_secs,exact_times\n"
        "b7a,06:00:00,07:00:00,1200,\n"
        "b7a,23:50:00,24:10:00,600,1\n"
        "b7a,09:00:00,08:00:00,600,0\n"
        "b7a,09:00:00,10:00:00,0,0\n"
        "zzz,09:00:00,10:00:00,60,0\n"
    )
    timetable = read_town({"frequencies.txt": headways})
    bus = pattern(timetable, "b7", "vend")
    assert bus.departures_s == (21600, 22800, 24000, 85800, 86400)
    assert bus.offsets_s == (0, 480)
    assert [(f.row, f.field) for f in timetable.findings] == [(4, None), (5, None), (6, "trip_id")]


def test_missing_times_lie_evenly_between_known_ones(read_town):
    rows = [
        "08:00:00,08:00:00,gate1,1",
        ",,tams,2",
        ",,vend,3",
        "08:09:00,,parv,4",
        ",,vend,5",
        "08:20:00,08:20:00,tams,6",
    ]
    (only,) = read_town(one_trip(rows)).patterns
    assert only.offsets_s == (0, 180, 360, 540, 870, 1200)


def test_missing_times_at_the_ends_are_those_of_the_neighbor(read_town):
    rows = [",,gate1,1", "08:04:00,08:05:00,tams,2", "08:09:00,08:09:00,vend,3", ",,parv,4"]
    (only,) = read_town(one_trip(rows)).patterns
    assert only.departures_s == (8 * 3600 + 240,)
    assert only.offsets_s == (0, 0, 300, 300)


@given(st.data())
def test_interpolation_agrees_with_fractions(data):
    import numpy as np  # noqa: PLC0415

    from gtfs_schematic.feed.calls import Calls, _interpolated  # noqa: PLC0415

    trips = data.draw(
        st.lists(
            st.lists(st.none() | st.integers(0, 9000), min_size=2, max_size=8).filter(
                lambda times: any(t is not None for t in times)
            ),
            min_size=1,
            max_size=4,
        )
    )
    trips = [
        [
            None
            if t is None
            else sorted(x for x in trip if x is not None)[sum(u is not None for u in trip[:n])]
            for n, t in enumerate(trip)
        ]
        for trip in trips
    ]
    flat = [-1 if t is None else t for trip in trips for t in trip]
    numbers = np.array([n for n, trip in enumerate(trips) for _ in trip])
    times = np.array(flat)
    calls = Calls(numbers, numbers, numbers, times, times, numbers)
    got = _interpolated(calls).arrival.tolist()
    for trip in trips:
        filled, got = got[: len(trip)], got[len(trip) :]
        known = [(n, t) for n, t in enumerate(trip) if t is not None]
        for n, time in enumerate(filled):
            before = max((k for k in known if k[0] <= n), default=known[0])
            after = min((k for k in known if k[0] >= n), default=known[-1])
            gap = after[0] - before[0]
            exact = (
                before[1] + (after[1] - before[1]) * (n - before[0]) / gap if gap > 0 else before[1]
            )
            assert abs(time - exact) <= 0.5


def test_bad_times_are_found_and_filled_in(read_town):
    rows = ["08:00:00,08:00:00,gate1,1", "8:05,8 h 5,tams,2", "08:08:00,08:08:00,vend,3"]
    timetable = read_town(one_trip(rows))
    assert timetable.patterns[0].offsets_s == (0, 240, 480)
    assert [(f.file, f.row, f.field, f.value) for f in timetable.findings] == [
        ("stop_times.txt", 3, "arrival_time", "8:05"),
        ("stop_times.txt", 3, "departure_time", "8 h 5"),
    ]


def test_times_that_run_back_are_found_and_held(read_town):
    rows = ["08:00:00,08:00:00,gate1,1", "08:09:00,08:09:00,tams,2", "08:05:00,08:05:00,vend,3"]
    timetable = read_town(one_trip(rows))
    assert timetable.patterns[0].offsets_s == (0, 540, 540)
    assert [(f.severity, f.row) for f in timetable.findings] == [("error", 4)]


def test_the_order_is_by_number_not_by_row_or_text(read_town):
    rows = ["08:20:00,08:20:00,vend,100", "08:00:00,08:00:00,gate1,9", "08:10:00,08:10:00,tams,20"]
    assert read_town(one_trip(rows)).patterns[0].stop_ids == ("gate1", "tams", "vend")


def test_equal_numbers_are_found_and_put_in_order_of_time(read_town):
    rows = ["08:20:00,08:20:00,vend,2", "08:00:00,08:00:00,gate1,1", "08:10:00,08:10:00,tams,2"]
    timetable = read_town(one_trip(rows))
    assert timetable.patterns[0].stop_ids == ("gate1", "tams", "vend")
    assert [(f.severity, f.field) for f in timetable.findings] == [("error", "stop_sequence")]


def test_a_trip_whose_order_is_unknown_is_left_out(read_town, table):
    text = table("stop_times.txt").replace("parv,6", "parv,last")
    timetable = read_town({"stop_times.txt": text})
    assert left_out(timetable, "trip") == {"t1a": "the order of its stops is unknown"}
    assert [(f.row, f.value) for f in timetable.findings] == [(5, "last")]
    assert len(pattern(timetable, "t1", "gate1").departures_s) == 1


def test_a_ring_calls_at_its_first_stop_again(read_town):
    rows = [
        "08:00:00,08:00:00,gate1,1",
        "08:05:00,08:05:00,tams,2",
        "08:06:00,08:07:00,tams,3",
        "08:10:00,08:10:00,vend,4",
        "08:20:00,08:20:00,gate1,5",
    ]
    timetable = read_town(one_trip(rows))
    (ring,) = timetable.patterns
    assert [(f.severity, f.row) for f in timetable.findings] == [("info", 4)]
    assert ring.stop_ids == ("gate1", "tams", "vend", "gate1")
    assert ring.offsets_s == (0, 300, 600, 1200)


def test_calls_that_are_none_do_not_count(read_town):
    columns = f"{TIMES},pickup_type,drop_off_type"
    rows = [
        "08:00:00,08:00:00,gate1,1,0,1",
        "08:05:00,08:05:00,tams,2,1,1",
        "08:07:00,08:07:00,nowhere,3,,",
        "08:08:00,08:08:00,,4,2,2",
        "08:10:00,08:10:00,vend,5,1,",
    ]
    timetable = read_town(one_trip(rows, columns))
    assert timetable.patterns[0].stop_ids == ("gate1", "vend")
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [
        ("error", 4, "nowhere"),
        ("info", 5, ""),
    ]


@pytest.mark.parametrize(
    ("rows", "reason"),
    [
        (["t1s,10:00:00,10:00:00,gate1,1"], "fewer than two usable stops"),
        ([], "it has no row in stop_times.txt"),
        (
            ["t1s,,,,1", "t1s,,,,2"],
            "it runs on demand: stop_times.txt names areas for it instead of stops",
        ),
        (["t1s,,,gate1,1", "t1s,,,tams,2"], "no time at any stop"),
    ],
)
def test_trips_that_cannot_be_drawn_are_left_out_with_the_reason(read_town, table, rows, reason):
    kept = [row for row in table("stop_times.txt").splitlines() if not row.startswith("t1s")]
    trips = table("trips.txt").replace("t1,sa,t1s", "b7,wk,t1s")
    text = "\n".join([*kept, *rows]) + "\n"
    timetable = read_town({"stop_times.txt": text, "trips.txt": trips})
    assert left_out(timetable, "trip") == {"t1s": reason}


def test_calls_of_unknown_trips_are_found(read_town, table):
    text = table("stop_times.txt") + "zz,08:00:00,08:00:00,tams,1\n"
    timetable = read_town({"stop_times.txt": text})
    assert [(f.row, f.field, f.value) for f in timetable.findings] == [(18, "trip_id", "zz")]


def test_headsign_direction_and_shape_are_those_of_most_departures(read_town, table):
    trips = table("trips.txt").replace("t1b,Parvinholm,0,up", "t1b,Locks,1,")
    timetable = read_town({"trips.txt": trips})
    up = pattern(timetable, "t1", "gate1")
    assert (up.headsign, up.direction_id, up.shape_id) == ("Locks", 0, "up")  # equal: the least
    headways = "trip_id,start_time,end_time,headway_secs\nt1a,06:00:00,07:00:00,600\n"
    up = pattern(read_town({"trips.txt": trips, "frequencies.txt": headways}), "t1", "gate1")
    assert up.headsign == "Parvinholm"
    # seven runs, six of them with the first trip's times
    assert (len(up.departures_s), up.offsets_s) == (7, (0, 210, 510, 870))


def test_nothing_to_draw_is_an_error_with_the_reasons(read_town, table):
    head, *rows = table("stop_times.txt").splitlines()
    saturday = [row for row in rows if row.startswith("t1s")]
    told = r"Nothing is left to draw that runs on 2026-03-02\. 4 × trip: it has no row"
    with pytest.raises(FeedError, match=told):
        read_town({"stop_times.txt": "\n".join([head, *saturday]) + "\n"})


def test_the_reasons_name_the_rows_at_fault(read_town, table):
    stops = table("stops.txt").replace(",47.", ",147.")
    with pytest.raises(FeedError, match=r"stops.txt, row 2: coordinate is not a number of degrees"):
        read_town({"stops.txt": stops})
