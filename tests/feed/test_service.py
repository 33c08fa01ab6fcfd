"""Which services run when, and which date is chosen."""

from __future__ import annotations

import datetime as dt
from collections import Counter

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.calendars import Calendars, Exceptional, Span
from gtfs_schematic.feed.dates import choose_dates
from gtfs_schematic.feed.info import Imprint
from gtfs_schematic.feed.service import service_days, typical_weekdays, validity_of

FIRST = dt.date(2026, 2, 20)
SERVICES = ("NA", "001", "ü,\n", "x")

dates = st.integers(0, 40).map(lambda n: FIRST + dt.timedelta(days=n))
spans = st.builds(
    Span,
    st.sampled_from(SERVICES),
    st.tuples(*[st.booleans()] * 7),
    dates,
    dates,
)
exceptions = st.builds(Exceptional, st.sampled_from(SERVICES), dates, st.booleans())
calendars = st.builds(
    Calendars,
    st.lists(spans, max_size=5).map(tuple),
    st.lists(exceptions, max_size=8).map(tuple),
)


@given(calendars, st.sets(st.sampled_from(SERVICES)))
def test_days_follow_the_definition_date_by_date(calendars, ids):
    expected = {}
    for n in range(60):
        date = FIRST + dt.timedelta(days=n)
        running = {
            row.service_id
            for row in calendars.spans
            if row.start <= date <= row.end and row.weekdays[date.weekday()]
        }
        running |= {
            row.service_id for row in calendars.exceptions if row.date == date and row.added
        }
        running -= {
            row.service_id for row in calendars.exceptions if row.date == date and not row.added
        }
        if running & ids:
            expected[date] = running & ids
    assert service_days(calendars, ids) == expected


@given(calendars, st.dictionaries(st.sampled_from(SERVICES), st.integers(1, 9), min_size=1))
def test_the_busiest_date_is_the_earliest_of_the_most_trips(calendars, trips):
    days = service_days(calendars, trips)
    if not days:
        with pytest.raises(FeedError, match="no service on any date"):
            validity_of("feed", calendars, Imprint(), trips)
        return
    choice = choose_dates([validity_of("feed", calendars, Imprint(), trips)], "busiest")
    chosen, reason = choice.date, choice.reason
    totals = Counter({date: sum(trips[i] for i in ids) for date, ids in days.items()})
    assert totals[chosen] == max(totals.values())
    assert all(totals[date] < totals[chosen] for date in days if date < chosen)
    assert f"{totals[chosen]:,}" in reason
    # 20 February 2026 was a Friday by Zeller's congruence, worked by hand
    weekday = ["Friday", "Saturday", "Sunday", "Monday", "Tuesday", "Wednesday", "Thursday"][
        (chosen - FIRST).days % 7
    ]
    assert reason.startswith(f"{weekday} {chosen.day} ")


def test_busiest_is_the_first_full_weekday_of_the_town(read_town):
    info = read_town(date="busiest").info
    assert (info.start_date, info.end_date) == ("2026-03-02", "2026-03-28")
    assert info.service_date == "2026-03-02"
    assert info.service_reason == (
        "Monday 2 March 2026 has the most trips, 4, of the 24 dates with service from 2026-03-02 "
        "to 2026-03-28, as the first of 20 such dates."
    )


def test_headway_trips_make_a_date_busy(read_town):
    headways = "trip_id,start_time,end_time,headway_secs\nt1s,06:00:00,07:00:00,600\n"
    info = read_town({"frequencies.txt": headways}, date="busiest").info
    assert info.service_date == "2026-03-07"
    assert "has the most trips, 6, of" in info.service_reason


def test_a_given_date_is_taken_or_refused_with_the_range(read_town):
    timetable = read_town(date="2026-03-14")
    assert timetable.info.service_date == "2026-03-14"
    assert {p.route_id for p in timetable.patterns} == {"t1"}
    assert ("route", "b7", "does not run on 2026-03-14") in {
        (item.kind, item.id, item.reason) for item in timetable.left_out
    }
    with pytest.raises(FeedError, match=r"outside the validity.*2026-03-02 to 2026-03-28"):
        read_town(date="2027-03-14")
    with pytest.raises(FeedError, match=r"Sunday 8 March 2026.*nearest.*2026-03-07"):
        read_town(date="2026-03-08")
    with pytest.raises(UsageError, match="YYYY-MM-DD"):
        read_town(date="next week")


def test_calendar_dates_alone_are_enough(read_town):
    changes = {
        "calendar.txt": None,
        "calendar_dates.txt": "service_id,date,exception_type\nwk,20260504,1\nsa,20260505,1\n",
    }
    info = read_town(changes).info
    assert (info.start_date, info.end_date, info.service_date) == (
        "2026-05-04",
        "2026-05-05",
        "2026-05-04",
    )


def test_removed_days_do_not_count_and_all_removed_is_an_error(read_town):
    removed = "service_id,date,exception_type\n" + "".join(
        f"wk,{dt.date(2026, 3, 2) + dt.timedelta(days=n):%Y%m%d},2\n" for n in range(28)
    )
    assert read_town({"calendar_dates.txt": removed}).info.service_date == "2026-03-07"
    removed += removed.replace("wk", "sa").split("\n", 1)[1]
    with pytest.raises(FeedError, match="no service on any date"):
        read_town({"calendar_dates.txt": removed})


def test_the_range_of_feed_info_bounds_the_choice(read_town):
    info = "feed_publisher_name,feed_start_date,feed_end_date,feed_version\nOulm,{},{},v7\n"
    inside = read_town({"feed_info.txt": info.format("20260310", "20260331")}).info
    assert (inside.start_date, inside.end_date) == ("2026-03-10", "2026-03-31")
    assert (inside.service_date, inside.publisher, inside.version) == ("2026-03-10", "Oulm", "v7")
    outside = read_town({"feed_info.txt": info.format("20250101", "20250131")})
    assert outside.info.service_date == "2026-03-02"
    assert [(f.severity, f.file) for f in outside.findings] == [("warning", "feed_info.txt")]


@pytest.mark.parametrize(("end", "rows"), [("20260410", 0), ("20260630", 1)])
def test_a_feed_that_outlives_its_service_is_told(read_town, end, rows):
    """The last Saturday is 28 March."""
    head = "feed_publisher_name,feed_publisher_url,feed_lang,feed_start_date,feed_end_date"
    text = f"{head}\nO,https://o.example,en,20260301,{end}\n"
    found = read_town({"feed_info.txt": text}).findings
    assert [(f.file, f.field, f.value) for f in found] == [
        ("feed_info.txt", "feed_end_date", "2026-03-28")
    ] * rows


def test_bad_calendar_rows_are_found_and_the_others_count(read_town, table):
    text = table("calendar.txt") + (
        "sa,yes,0,0,0,0,1,0,20260302,20260329\n"
        "wk,1,1,1,1,1,1,1,2026-03-02,20260329\n"
        "wk,1,1,1,1,1,1,1,20260329,20260302\n"
    )
    extra = "service_id,date,exception_type\nwk,20260302,3\nwk,tomorrow,1\n"
    timetable = read_town({"calendar.txt": text, "calendar_dates.txt": extra})
    assert [(f.file, f.row, f.field, f.value) for f in timetable.findings] == [
        ("calendar.txt", 4, "monday", "yes"),
        ("calendar.txt", 4, "service_id", "sa"),
        ("calendar.txt", 5, "service_id", "wk"),
        ("calendar.txt", 5, "start_date", "2026-03-02"),
        ("calendar.txt", 6, "end_date", "20260302"),
        ("calendar.txt", 6, "service_id", "wk"),
        ("calendar_dates.txt", 2, "exception_type", "3"),
        ("calendar_dates.txt", 3, "date", "tomorrow"),
    ]
    assert timetable.info.service_date == "2026-03-02"


def test_dates_at_the_ends_of_time_do_no_harm(read_town, table):
    week = "1,1,1,1,1,1,1"
    text = table("calendar.txt") + (
        f"sa,{week},99991230,99991231\nwk,{week},00010101,00010102\nsa,{week},20250101,20991231\n"
    )
    timetable = read_town({"calendar.txt": text})
    assert (timetable.info.start_date, timetable.info.end_date) == ("0001-01-01", "9999-12-31")
    assert timetable.info.service_date == "2026-03-02"
    assert [(f.severity, f.row, f.field) for f in timetable.findings] == [
        *(("warning", row, "service_id") for row in (4, 5)),
        ("warning", 6, "end_date"),
        ("warning", 6, "service_id"),
    ]


def test_services_and_routes_of_trips_that_are_nowhere_are_found(read_town, table):
    text = table("trips.txt") + "t1,zz,t1z,Nowhere,0,\nq9,wk,q9a,Nowhere,0,\n"
    timetable = read_town({"trips.txt": text})
    assert {(f.field, f.value) for f in timetable.findings} == {
        ("service_id", "zz"),
        ("route_id", "q9"),
    }
    assert ("trip", "q9a") in {(item.kind, item.id) for item in timetable.left_out}


def test_holidays_neither_add_nor_remove_a_typical_weekday():
    monday = dt.date(2026, 3, 2)
    days = {}
    for n in range(28):
        date = monday + dt.timedelta(days=n)
        running = {"wk"} if date.weekday() < 5 else {"we"}
        days[date] = frozenset(running)
    days[monday] = frozenset({"we"})  # a public holiday
    days[monday + dt.timedelta(days=9)] = frozenset({"wk", "once"})
    typical = typical_weekdays(
        days,
        {
            "bus": frozenset({"wk"}),
            "walkers": frozenset({"we"}),
            "fair": frozenset({"once"}),
            "daily": frozenset({"wk", "we"}),
            "none": frozenset(),
        },
    )
    assert typical == {
        "bus": frozenset(range(5)),
        "walkers": frozenset({5, 6}),
        "fair": frozenset({2}),
        "daily": frozenset(range(7)),
        "none": frozenset(),
    }


def test_service_since_ever_starts_no_earlier_than_the_format(read_town, table):
    text = table("calendar.txt").replace("20260302,20260329\nsa", "19000101,20260329\nsa")
    timetable = read_town({"calendar.txt": text})
    assert timetable.info.start_date == "2000-01-03"  # the first Monday
    assert [(f.severity, f.row, f.field, f.value) for f in timetable.findings] == [
        ("warning", 2, "start_date", "19000101")
    ]
    # The line still runs today, not only for the forty years after 1900.
    assert read_town({"calendar.txt": text}, date="2026-03-11").patterns


def test_absurd_numbers_of_departures_are_refused(read_town):
    text = "trip_id,start_time,end_time,headway_secs\n" + "b7a,00:00:00,999:00:00,1\n" * 6
    told = r"frequencies.txt, row 7, field headway_secs, value '1': adds up to more than 20,000,000"
    with pytest.raises(FeedError, match=told):
        read_town({"frequencies.txt": text})
