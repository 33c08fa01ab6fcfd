"""Keeping only what is asked for, and saying what was left out."""

from __future__ import annotations

import pytest

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed


@pytest.fixture
def changes(table):
    """Give a second agency, whose bus runs twice on weekdays."""
    return {
        "agency.txt": table("agency.txt") + "lok,Locks Buses,https://l.example,Europe/Zurich,en\n",
        "routes.txt": table("routes.txt").replace("b7,oulm", "b7,lok") + "b8,lok,7,More,3,,\n",
        "trips.txt": table("trips.txt") + "b8,wk,b8a,Tamselby,,\n",
        "stop_times.txt": table("stop_times.txt")
        + "b8a,09:00:00,09:00:00,tams,1\nb8a,09:08:00,09:08:00,vend,2\n",
    }


def kept(timetable):
    assert faults(timetable) == ()
    return [route.id for route in timetable.routes]


def reasons(timetable):
    return {item.id: item.reason for item in timetable.left_out if item.kind == "route"}


@pytest.mark.parametrize("name", ["lok", "Locks Buses"])
def test_agencies_are_kept_by_id_or_name(read_town, changes, name):
    timetable = read_town(changes, agencies=(name,))
    assert kept(timetable) == ["b7", "b8"]
    assert [agency.id for agency in timetable.agencies] == ["lok"]
    assert reasons(timetable) == {"t1": "agency Oulm Tramways is not among those asked for"}


@pytest.mark.parametrize(
    ("settings", "ids"),
    [
        ({"routes": ("b8",)}, ["b8"]),
        ({"routes": ("7",)}, ["b7", "b8"]),
        ({"routes": ("Locks bus", "1")}, ["b7", "t1"]),
        ({"without_routes": ("7",)}, ["t1"]),
        ({"without_routes": ("More",), "modes": ("bus",)}, ["b7"]),
    ],
)
def test_routes_are_kept_or_left_out_by_id_or_name(read_town, changes, settings, ids):
    timetable = read_town(changes, **settings)
    assert kept(timetable) == ids
    assert reasons(timetable).keys() == {"t1", "b7", "b8"} - set(ids)


def test_routes_of_one_name_count_their_trips_together(read_town, changes):
    assert kept(read_town(changes, min_trips=2)) == ["b7", "b8", "t1"]
    timetable = read_town(changes, min_trips=3)
    assert kept(timetable) == ["t1"]
    assert reasons(timetable)["b8"] == "its line has 2 trips on 2026-03-02, fewer than 3"
    with pytest.raises(FeedError, match="Nothing is left to draw"):
        read_town(changes, min_trips=4)


def test_names_that_no_feed_has_are_refused_with_the_nearest(read_town, changes):
    with pytest.raises(UsageError, match=r"No agency has the id or name 'Lock Buses'.*Locks Buses"):
        read_town(changes, agencies=("Lock Buses",))
    with pytest.raises(UsageError, match=r"No route has the id or name '99'\. There are 1, 7, "):
        read_town(changes, without_routes=("99",))
    with pytest.raises(FeedError, match=r"Nothing is left to draw that is asked for\. 2 × route"):
        read_town(changes, agencies=("lok",), modes=("tram",))


def test_of_several_feeds_one_can_be_meant(town, changes):
    paths = [town(), town(changes, "other.zip")]
    timetable = read_feed(paths, FeedSettings(routes=("1:t1", "b8")))
    assert kept(timetable) == ["1:t1", "2:b8"]


def test_a_feed_without_any_route_asked_for_is_named(town, changes):
    timetable = read_feed([town(), town(changes, "other.zip")], FeedSettings(routes=("b8",)))
    assert kept(timetable) == ["2:b8"]
    reasons = {(item.kind, item.id): item.reason for item in timetable.left_out}
    assert reasons["feed", "1:town.zip"] == "none of its routes is asked for"
    assert reasons["route", "1:t1"] == "it is not among the routes asked for"
