"""The networks of routes, from routes.txt or from networks.txt with route_networks.txt."""

from __future__ import annotations

import pytest

from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import NetworkSettings

NETWORKS = "network_id,network_name\nland,Town on land\nlake,Town on water\n"


def with_column(text, values):
    head, *rows = text.splitlines()
    lines = [f"{head},network_id", *(f"{r},{v}" for r, v in zip(rows, values, strict=True))]
    return "\n".join(lines) + "\n"


def networks_of(timetable):
    return {route.id: route.network_id for route in timetable.routes}


def test_routes_name_their_network_themselves(read_town, table):
    timetable = read_town({"routes.txt": with_column(table("routes.txt"), ["land", ""])})
    assert networks_of(timetable) == {"t1": "land", "b7": ""}
    assert timetable.findings == ()


def test_networks_come_from_files_of_their_own(read_town):
    changes = {
        "networks.txt": NETWORKS,
        "route_networks.txt": "network_id,route_id\nland,t1\nlake,b7\n",
    }
    timetable = read_town(changes)
    assert networks_of(timetable) == {"t1": "land", "b7": "lake"}
    assert timetable.findings == ()


def test_a_feed_with_both_is_told_which_counts(read_town, table):
    changes = {
        "routes.txt": with_column(table("routes.txt"), ["land", ""]),
        "networks.txt": NETWORKS,
        "route_networks.txt": "network_id,route_id\nlake,t1\nlake,b7\n",
    }
    timetable = read_town(changes)
    assert networks_of(timetable) == {"t1": "land", "b7": ""}
    (finding,) = timetable.findings
    assert (finding.severity, finding.file) == ("warning", "route_networks.txt")
    assert "given in routes.txt as well; those count" in finding.message


def test_an_empty_column_does_not_hide_the_files(read_town, table):
    changes = {
        "routes.txt": with_column(table("routes.txt"), ["", ""]),
        "networks.txt": NETWORKS,
        "route_networks.txt": "network_id,route_id\nlake,t1\n",
    }
    assert networks_of(read_town(changes)) == {"t1": "lake", "b7": ""}


@pytest.mark.parametrize(
    ("rows", "networks", "row", "field"),
    [
        ("land,t9", {"t1": "", "b7": ""}, 2, "route_id"),
        ("land,t1\nlake,t1", {"t1": "land", "b7": ""}, 3, "route_id"),
        (",t1", {"t1": "", "b7": ""}, 2, "network_id"),
        ("air,t1", {"t1": "air", "b7": ""}, 2, "network_id"),
    ],
)
def test_bad_rows_are_found(read_town, rows, networks, row, field):
    changes = {
        "networks.txt": NETWORKS,
        "route_networks.txt": f"network_id,route_id\n{rows}\n",
    }
    timetable = read_town(changes)
    assert networks_of(timetable) == networks
    assert [(f.file, f.row, f.field) for f in timetable.findings] == [
        ("route_networks.txt", row, field)
    ]


def test_networks_of_several_feeds_stay_apart(town, table):
    text = with_column(table("routes.txt"), ["land", ""])
    paths = [town({"routes.txt": text}, name) for name in ("one.zip", "two.zip")]
    assert networks_of(read_feed(paths, FeedSettings())) == {
        "1:b7": "",
        "1:t1": "1:land",
        "2:b7": "",
        "2:t1": "2:land",
    }


def test_lines_can_be_grouped_by_network(read_town, table):
    """The tram and a second tram under another name, which it meets, are one network."""
    routes = table("routes.txt") + "t2,oulm,2,Locks tram,0,,\n"
    changes = {
        "routes.txt": with_column(routes, ["land", "land", "land"]),
        "trips.txt": table("trips.txt") + "t2,wk,t2a,Tamselby,,\n",
        "stop_times.txt": table("stop_times.txt")
        + "t2a,07:00:00,07:00:00,vend,1\nt2a,07:08:00,07:08:00,tams,2\n",
    }
    timetable = read_town(changes)
    apart, joined = (
        {line.route_ids for line in build_network(timetable, settings).lines}
        for settings in (NetworkSettings(), NetworkSettings(group_lines="network"))
    )
    assert apart == {("b7",), ("t1",), ("t2",)}
    assert joined == {("b7",), ("t1", "t2")}
