"""Which dates are meant by a weekday, a Saturday, a night, a range."""

from __future__ import annotations

import datetime as dt
from collections import Counter
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.dates import Window, choose_dates, with_expiry
from gtfs_schematic.feed.service import Validity

MONDAY = dt.date(2026, 3, 2)


def validity(counts, label="feed"):
    """Give a feed with one service per date, by trips per date from Monday 2 March 2026 on."""
    dates = {MONDAY + dt.timedelta(days=n): trips for n, trips in enumerate(counts)}
    days = {date: frozenset({date.isoformat()}) for date, trips in dates.items() if trips}
    trips = {date.isoformat(): count for date, count in dates.items()}
    return Validity(label, MONDAY, max(dates), days, trips)


WEEK = [100, 100, 100, 100, 104, 60, 40]


def test_an_event_and_a_holiday_are_no_typical_weekday():
    counts = WEEK * 6
    counts[9] = 300  # an event on a Wednesday
    counts[0] = 40  # a holiday
    choice = choose_dates([validity(counts)], "typical-weekday")
    # Nor are Fridays, on which some more trips run.
    assert choice.date == dt.date(2026, 3, 3)
    assert "is the busiest typical weekday: it has 100 trips" in choice.reason
    assert "of the 30 dates" in choice.reason
    assert "22 have about as many; 7 with more trips are not typical" in choice.reason
    assert choose_dates([validity(counts)], "busiest").date == dt.date(2026, 3, 11)


def test_term_time_is_typical_though_holidays_are_longer():
    counts = [200] * 5 + [0, 0]
    counts = counts * 3 + [150, 150, 150, 150, 150, 0, 0] * 5
    assert choose_dates([validity(counts)], "typical-weekday").date == MONDAY


def test_saturday_and_sunday_mean_typical_ones():
    counts = WEEK * 6
    counts[5] = 300  # an event
    counts[12] = 0  # a holiday
    assert choose_dates([validity(counts)], "saturday").date == dt.date(2026, 3, 21)
    choice = choose_dates([validity(counts)], "sunday")
    assert choice.date == dt.date(2026, 3, 8)
    assert "of the 6 Sundays with service" in choice.reason
    with pytest.raises(FeedError, match=r"No trip runs on a Sunday.*2026-03-02"):
        choose_dates([validity([5, 5])], "sunday")


def test_a_feed_of_one_date_says_so():
    weekday = choose_dates([validity([0, 0, 1])], "typical-weekday")
    assert weekday.date == dt.date(2026, 3, 4)
    told = "Wednesday 4 March 2026 is the only date from Monday to Friday with service"
    assert weekday.reason.startswith(told)
    assert weekday.reason.endswith("; it has 1 trip.")
    sunday = choose_dates([validity([0] * 6 + [7])], "typical-weekday")
    assert "Sunday 8 March 2026 is the only date with service" in sunday.reason
    named = choose_dates([validity([0] * 6 + [7])], "sunday")
    assert named.reason.startswith("Sunday 8 March 2026 is the only Sunday with service")


def test_equal_dates_are_told_as_all():
    choice = choose_dates([validity([5] * 14)], "typical-weekday")
    assert "of the 10 dates from Monday to Friday with service" in choice.reason
    assert choice.reason.endswith("all have about as many.")


def test_without_weekdays_the_busiest_date_stands_in():
    choice = choose_dates([validity([0, 0, 0, 0, 0, 7, 9])], "typical-weekday")
    assert choice.date == dt.date(2026, 3, 8)
    assert choice.reason.startswith("There is no service from Monday to Friday. Sunday 8 March")


def test_a_long_thin_tail_does_not_make_full_service_untypical():
    counts = [100, 100, 100, 100, 100, 0, 0] * 3 + [10, 10, 10, 10, 10, 0, 0] * 40
    assert choose_dates([validity(counts)], "typical-weekday").date == MONDAY


@given(st.lists(st.integers(0, 50), min_size=8, max_size=60))
def test_no_weekday_that_is_busier_than_a_typical_one_is_usual(counts):
    feed = validity(counts)
    totals = [feed.count(date) for date in feed.days if date.weekday() < 5]
    if not totals:
        return
    usual = feed.count(choose_dates([feed], "typical-weekday").date)
    alike = {total: sum(n >= 0.98 * total for n in totals) for total in totals}
    for total, count in alike.items():
        least = max(0.25 * sum(2 * n >= total for n in totals), min(10, 0.05 * len(totals)))
        is_usual = count >= max(least, min(3, len(totals) / 2))
        assert is_usual if total == usual else total < usual or not is_usual


def test_of_several_feeds_only_dates_count_on_which_most_run():
    one, other = validity([10, 50, 10], "one"), validity([10, 0, 10, 10], "other")
    assert choose_dates([one, other], "typical-weekday").date == MONDAY
    late = Validity("late", dt.date(2027, 1, 1), dt.date(2027, 1, 2), {}, {})
    with pytest.raises(FeedError, match=r"share no date.*one: 2026-03-02 to 2026-03-04; late"):
        choose_dates([one, late], "typical-weekday")


def test_a_range_takes_all_its_dates_and_names_the_busiest():
    choice = choose_dates([validity(WEEK * 2)], "2026-03-05/2026-03-09")
    assert choice.date == dt.date(2026, 3, 6)
    assert choice.days == tuple((Window(dt.date(2026, 3, n)),) for n in range(5, 10))
    assert choice.when == "from 2026-03-05 to 2026-03-09"
    assert "all trips of its 5 dates with service" in choice.reason


@pytest.mark.parametrize(
    ("wanted", "error", "told"),
    [
        ("2026-03-09/2026-03-05", UsageError, "ends before it starts"),
        ("2026-03-09/soon", UsageError, "'soon' is no service date"),
        ("monday", UsageError, "typical-weekday, saturday, sunday, night, busiest"),
        ("2027-01-01/2027-02-01", FeedError, "2027-01-01 to 2027-02-01 is outside the validity"),
        ("2026-03-07/2026-03-08", FeedError, "No trip runs from 2026-03-07.*2026-03-06"),
        ("night", FeedError, "No trip starts in the night"),
    ],
)
def test_what_means_nothing_is_refused(wanted, error, told):
    with pytest.raises(error, match=told):
        choose_dates([validity([5, 5, 5, 5, 5, 0, 0, 5])], wanted)


def test_a_feed_that_has_expired_is_told_only_if_today_is_given():
    feed = validity(WEEK)
    choice = choose_dates([feed], "typical-weekday")
    assert with_expiry(choice, [feed], "") == choice
    assert with_expiry(choice, [feed], "2026-03-08") == choice
    told = with_expiry(choice, [feed], "2026-03-09").reason
    assert told == choice.reason + (
        " feed has expired: it was valid until 2026-03-08, and today is 2026-03-09."
    )
    assert "feed is not valid yet" in with_expiry(choice, [feed], "2026-03-01").reason
    with pytest.raises(UsageError, match="'tomorrow'"):
        with_expiry(choice, [feed], "tomorrow")


NIGHTLY = {
    "trips.txt": "t1,sa,n1,Parvinholm,0,\nt1,wk,n2,Parvinholm,0,\nt1,wk,n3,Parvinholm,0,\n",
    "stop_times.txt": (
        "n1,25:30:00,25:30:00,gate1,1\nn1,25:50:00,25:50:00,tams,2\n"  # Saturday, late
        "n2,1:15:00,1:15:00,gate1,1\nn2,1:45:00,1:45:00,tams,2\n"  # weekdays, early
        "n3,27:00:00,27:00:00,tams,1\nn3,27:20:00,27:20:00,gate2,2\n"  # weekdays, late
    ),
}


def test_the_night_joins_one_evening_and_the_next_morning(read_town, table):
    changes = {name: table(name) + more for name, more in NIGHTLY.items()}
    timetable = read_town(changes, date="night")
    # Monday's late trips (t1b at 25:00:30 and n3) with Tuesday's early one: more than any Saturday.
    assert timetable.info.service_date == "2026-03-02"
    told = "The night after Monday 2 March 2026 is the busiest typical night: "
    assert told in timetable.info.service_reason
    assert sorted(t for p in timetable.patterns for t in p.departures_s) == [
        25 * 3600 + 30,
        25 * 3600 + 15 * 60,
        27 * 3600,
    ]
    reasons = {item.id: item.reason for item in timetable.left_out if item.kind == "route"}
    assert reasons == {"b7": "does not run in the night after 2026-03-02"}


def test_an_event_is_no_typical_night_but_weekends_are():
    """Some night service every night, more on Fridays and Saturdays, most of all once."""
    counts = [10, 10, 10, 10, 15, 15, 10] * 6
    counts[30] = 40
    plain = validity([100] * len(counts))
    late = {date.isoformat(): n for date, n in zip(sorted(plain.days), counts, strict=True)}
    choice = choose_dates([replace(plain, late=late)], "night")
    assert choice.date == dt.date(2026, 3, 6)
    assert "15 trips start from 01:00 to before 04:00" in choice.reason
    assert "of the 42 nights" in choice.reason
    assert choice.reason.endswith("12 have about as many; 1 with more trips is not typical.")


def test_headway_trips_run_at_night_only_for_its_hours(read_town, table):
    changes = {name: table(name) + more for name, more in NIGHTLY.items()}
    head = "trip_id,start_time,end_time,headway_secs\n"
    changes["frequencies.txt"] = f"{head}t1a,22:00:00,30:00:00,1800\n"
    timetable = read_town(changes, date="night")
    (pattern,) = (p for p in timetable.patterns if "parv" in p.stop_ids)
    halves = [25 * 3600 + n * 1800 for n in range(6)]
    assert list(pattern.departures_s) == sorted([*halves, 25 * 3600 + 30])


def test_a_departure_of_a_range_counts_as_often_as_on_its_busiest_date(read_town, table):
    twice = {  # the tram of 8:00 runs twice on weekdays, and once on Saturdays
        "trips.txt": "t1,wk,t1x,Parvinholm,0,up\nt1,sa,t1y,Parvinholm,0,up\n",
        "stop_times.txt": "".join(
            line.replace("t1a", ident)
            for ident in ("t1x", "t1y")
            for line in table("stop_times.txt").splitlines(keepends=True)
            if line.startswith("t1a")
        ),
    }
    changes = {name: table(name) + more for name, more in twice.items()}
    whole = read_town(changes, date="2026-03-02/2026-03-08")
    single = [read_town(changes, date=f"2026-03-{day:02d}").patterns for day in (2, 3, 4, 5, 6, 7)]
    expected = {}
    for patterns in single:
        for p in patterns:
            key = (p.route_id, p.stop_ids)
            expected[key] = expected.get(key, Counter()) | Counter(p.departures_s)
    got = {(p.route_id, p.stop_ids): Counter(p.departures_s) for p in whole.patterns}
    assert got == expected
    assert got["t1", ("gate1", "tams", "vend", "parv")][8 * 3600 + 30] == 2
    assert whole.info.service_date == "2026-03-02"
