"""The service of a line is judged from its departures and days."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

import pytest

from gtfs_schematic.feed.model import Pattern
from gtfs_schematic.network.service import service_of

HOUR = 3600
WEEK = range(7)


def _pattern(times: Iterable[int], stops: tuple[str, ...] = ("A", "B")) -> Pattern:
    offsets = tuple(120 * i for i in range(len(stops)))
    return Pattern("r", None, "", None, tuple(stops), tuple(sorted(times)), offsets)


@pytest.mark.parametrize(
    ("hours", "days", "expected"),
    [
        (range(6, 23), WEEK, "all-day"),
        (range(6, 23), range(5), "some-days"),
        ([6, 7, 8, 16, 17, 18], WEEK, "peak"),
        ([6, 7, 8, 16, 17, 18], range(5), "peak"),
        ([7, 8], WEEK, "peak"),
        ([23, 24, 25, 26, 27, 28], WEEK, "night"),
        ([0, 1, 2, 3], WEEK, "night"),
        ([24, 25, 26], [4, 5], "night"),
        ([12], WEEK, "all-day"),
        (range(6, 23), [], "all-day"),
    ],
)
def test_patterns_of_service(hours, days, expected):
    service = service_of([_pattern([hour * HOUR for hour in hours])], set(days), set(WEEK))
    assert service.pattern == expected


def test_a_network_of_weekdays_only_has_no_odd_days():
    assert service_of([_pattern([h * HOUR for h in WEEK])], {0, 1}, {0, 1}).pattern != "some-days"


def test_headway_is_that_of_the_busier_direction():
    out = _pattern(range(6 * HOUR, 20 * HOUR, 600))
    back = _pattern(range(6 * HOUR, 20 * HOUR, 1800), ("B", "A"))
    service = service_of([out, back], WEEK, WEEK)
    assert service.headway_s == 600
    assert service.trips == 84 + 28
    assert (service.first_s, service.last_s) == (6 * HOUR, 20 * HOUR - 600)


def test_branches_from_one_terminus_share_a_headway():
    one = _pattern(range(6 * HOUR, 20 * HOUR, 1200), ("A", "B", "C"))
    other = _pattern(range(6 * HOUR + 600, 20 * HOUR, 1200), ("A", "B", "D"))
    assert service_of([one, other], WEEK, WEEK).headway_s == 600


def test_one_trip_has_no_headway():
    assert service_of([_pattern([8 * HOUR])], WEEK, WEEK).headway_s is None


def test_days_reach_the_line(town):
    written = town.row("ABC").both("x", "A B").both("y", "B C")
    days = {"x": frozenset(range(5)), "y": frozenset(range(7))}
    network = replace(written, timetable=replace(written.timetable, operating_days=days)).network()
    assert network.line["x"].service == "some-days"
    assert network.line["y"].service == "all-day"


def test_headways_by_period():
    """A clock-face timetable: every 10 minutes in the peaks, every 30 between, none at night."""
    peak = [*range(7 * HOUR, 9 * HOUR, 600), *range(15 * HOUR, 19 * HOUR, 600)]
    between = range(9 * HOUR, 15 * HOUR, 1800)
    service = service_of([_pattern([*peak, *between])], WEEK, WEEK)
    found = {p.period: (p.trips, p.headway_s) for p in service.periods}
    assert found == {
        "morning peak": (12, 600),
        "midday": (12, 1800),
        "afternoon peak": (24, 600),
    }
    assert sum(p.trips for p in service.periods) == service.trips


def test_platforms_of_a_terminus_count_together():
    one = _pattern(range(7 * HOUR, 9 * HOUR, 1200), ("A1", "B"))
    other = _pattern(range(7 * HOUR + 600, 9 * HOUR, 1200), ("A2", "B"))
    apart = service_of([one, other], WEEK, WEEK)
    assert apart.headway_s == 1200
    assert service_of([one, other], WEEK, WEEK, {"A1": "A", "A2": "A"}).headway_s == 600


def test_small_hours_belong_to_the_night_before():
    service = service_of([_pattern([23 * HOUR, 24 * HOUR, 25 * HOUR])], WEEK, WEEK)
    early = service_of([_pattern([23 * HOUR, 0, HOUR])], WEEK, WEEK)
    for found in (service, early):
        assert [(p.period, p.headway_s) for p in found.periods] == [("night", HOUR)]


def test_an_extension_at_peak_only_is_told_by_its_links(town):
    network = (
        town.row("ABCD")
        .run("red", "A B C", trips=40)
        .run("red", "C B A", trips=40)
        .run("red", "A B C D", trips=6)
        .network()
    )
    line = network.line["red"]
    assert line.itineraries == (("A", "B", "C", "D"),)
    # Six trips from 6:00 on, every 25 minutes: all before 10:00.
    assert line.part_service == (("C", "D", "peak"),)
    assert line.service == "all-day"
