"""What `inspect` says: all that a feed has is drawn or listed, and advice names real options."""

from __future__ import annotations

import csv
import io
import json
import re
import zipfile
from pathlib import Path
from typing import Any

import pytest

from gtfs_schematic.cli.draw import draw
from gtfs_schematic.cli.inspect import inspect
from gtfs_schematic.cli.main import run

BEFORE = Path(__file__).parents[2] / "data" / "before.zip"

VILLAGE = {
    "agency.txt": (
        "agency_id,agency_name,agency_url,agency_timezone\n"
        "vr,Vessel Road Buses,https://vr.example,Europe/Zurich\n"
    ),
    "stops.txt": (
        "stop_id,stop_name,stop_lat,stop_lon,location_type,parent_station\n"
        "top,Tarn Cross,47.000,8.000,1,\n"
        "a,Tarn Cross,47.0001,8.0001,0,top\n"
        "b,Brell Mill,47.010,8.000,0,\n"
        "c,Cawl End,47.020,8.000,0,\n"
        "d,Dorn Hill,47.030,8.000,0,\n"
        "nowhere,Nowhere,,,0,\n"
        "zero,Null Point,0,0,0,\n"
        "unused,Unused,47.040,8.000,0,\n"
        "e,Ebb Farm,47.010,8.020,0,\n"
    ),
    "routes.txt": (
        "route_id,agency_id,route_short_name,route_long_name,route_type\n"
        "r1,vr,1,,3\nr2,vr,2,,3\nr3,vr,3,,714\nr4,vr,4,,3\nr5,vr,5,,3\n"
    ),
    "trips.txt": (
        "route_id,service_id,trip_id\n"
        + "".join(f"r1,wk,t{n}\n" for n in range(30))
        + "r1,wk,short\nr1,wk,lone\nr1,wk,empty\nr2,wk,lost\nr3,wk,bus\nr4,we,end\nr5,wk,once\n"
    ),
    "stop_times.txt": (
        "trip_id,arrival_time,departure_time,stop_id,stop_sequence\n"
        + "".join(
            f"t{n},{6 + n // 2:02d}:{30 * (n % 2) + 5 * k:02d}:00,"
            f"{6 + n // 2:02d}:{30 * (n % 2) + 5 * k:02d}:00,{stop},{k}\n"
            for n in range(30)
            for k, stop in enumerate("abcd" if n % 2 else "dcba")
        )
        + "short,07:10:00,07:10:00,b,1\nshort,07:20:00,07:20:00,e,2\n"
        + "lone,07:10:00,07:10:00,b,1\n"
        + "lost,07:10:00,07:10:00,nowhere,1\nlost,07:20:00,07:20:00,zero,2\n"
        + "bus,07:10:00,07:10:00,a,1\nbus,07:20:00,07:20:00,b,2\n"
        + "end,07:10:00,07:10:00,a,1\nend,07:20:00,07:20:00,b,2\n"
        + "once,07:10:00,07:10:00,b,1\nonce,07:20:00,07:20:00,d,2\n"
    ),
    "calendar.txt": (
        "service_id,monday,tuesday,wednesday,thursday,friday,saturday,sunday,start_date,end_date\n"
        "wk,1,1,1,1,1,0,0,20260302,20260329\nwe,0,0,0,0,0,1,1,20260302,20260329\n"
    ),
}
"""A line that can be drawn, and something of every kind that cannot."""


@pytest.fixture
def village(tmp_path):
    path = tmp_path / "village.zip"
    with zipfile.ZipFile(path, "w") as archive:
        for name, text in VILLAGE.items():
            archive.writestr(name, text)
    return path


@pytest.fixture
def told(capsys):
    """Give a function that inspects a feed for machines."""

    def tell(path: Path, *arguments: str) -> dict[str, Any]:
        assert run(["inspect", str(path), "--json", "--quiet", *arguments]) == 0
        return json.loads(capsys.readouterr().out)

    return tell


def tables_of(path):
    with zipfile.ZipFile(path) as archive:
        return {
            name: list(csv.DictReader(io.TextIOWrapper(archive.open(name), "utf-8-sig")))
            for name in archive.namelist()
        }


def left_out(document, kind):
    return {item["id"]: item["reason"] for item in document["left_out"] if item["kind"] == kind}


def test_all_that_cannot_be_drawn_is_listed_with_its_reason(village, told):
    document = told(village)
    (drawn, once) = document["lines"]
    assert drawn["route_ids"] == ["r1"]
    assert once["route_ids"] == ["r5"]
    assert document["stations"] == 4
    routes = left_out(document, "route")
    assert routes.keys() == {"r2", "r3", "r4"}
    assert routes["r2"] == "none of its trips can be used"
    assert "replacement" in routes["r3"]
    assert routes["r4"] == "does not run on 2026-03-02"
    assert left_out(document, "trip") == {
        "lone": "fewer than two usable stops",
        "empty": "it has no row in stop_times.txt",
        "lost": "fewer than two usable stops",
    }
    assert left_out(document, "stop").keys() == {"nowhere", "zero", "unused"}
    (pattern,) = left_out(document, "pattern").items()
    assert pattern[0].startswith("r1: b – e")
    assert "1 of the line's 31 trips" in pattern[1]
    assert left_out(document, "station") == {"e": "only patterns that are left out call here"}
    rows = {(f["file"], f["row"]) for f in document["findings"] if f["severity"] == "error"}
    assert rows == {("stops.txt", 7), ("stops.txt", 8)}


def test_what_inspect_lists_stands_in_the_edition(village, told, tmp_path, capsys):
    document = told(village)
    folder = tmp_path / "out"
    arguments = ["draw", str(village), "--out", str(folder), "--effort", "quick", "--quiet"]
    assert run(arguments) == 0
    capsys.readouterr()
    edition = json.loads((folder / "edition.json").read_bytes())
    assert edition["left_out"] == document["left_out"]
    assert len(edition["findings"]) == len(document["findings"])
    for sentence, finding in zip(edition["findings"], document["findings"], strict=True):
        assert finding["message"] in sentence
        assert finding["row"] is None or f"row {finding['row']}" in sentence


@pytest.mark.parametrize("feed", ["cairns_feed", "nyc_subway_feed", "ann_arbor_feed"])
def test_nothing_of_a_real_feed_is_lost(feed, request, told):
    path = request.getfixturevalue(feed)
    tables, document = tables_of(path), told(path)
    drawn = {ident for line in document["lines"] for ident in line["route_ids"]}
    routes = {row["route_id"] for row in tables["routes.txt"]}
    assert routes == drawn | left_out(document, "route").keys()
    assert drawn.isdisjoint(left_out(document, "route"))
    # Of stops, inspect tells those that are not drawn; the others are the stations, some merged.
    lost = left_out(document, "stop").keys() | left_out(document, "station").keys()
    stops = {row["stop_id"]: row.get("parent_station") or "" for row in tables["stops.txt"]}
    kept = {ident for ident, parent in stops.items() if lost.isdisjoint((ident, parent))}
    assert document["stations"] <= len({stops[ident] or ident for ident in kept})
    assert document["stations"] >= len({stops[ident] or ident for ident in kept}) / 2


def options_in(text):
    return set(re.findall(r"--[a-z][a-z-]+", text))


@pytest.mark.parametrize("arguments", [[], ["--date", "saturday"], ["--min-trips", "5"]])
def test_suggestions_name_options_that_there_are(village, told, capsys, arguments):
    document = told(village, *arguments)
    known = {name for command in (inspect, draw) for p in command.params for name in p.opts}
    assert options_in(" ".join(document["suggestions"])) <= known
    assert run(["inspect", str(village), "--quiet", *arguments]) == 0
    assert options_in(capsys.readouterr().out) <= known


def test_suggestions_do_what_they_promise(village, told):
    (rare,) = [s for s in told(village)["suggestions"] if "fewer than 5 trips" in s]
    assert rare.startswith("1 line with fewer than 5 trips")
    after = told(village, "--min-trips", "5")
    assert [line["name"] for line in after["lines"]] == ["1"]
    assert "its line has 1 trip" in left_out(after, "route")["r5"]


def test_a_line_of_few_trips_has_no_headway(village, capsys):
    assert run(["inspect", str(village), "--quiet"]) == 0
    out = capsys.readouterr().out
    (often,) = re.findall(r"^  1 \(bus\).*$", out, re.MULTILINE)
    (once,) = re.findall(r"^  5 \(bus\).*$", out, re.MULTILINE)
    assert "Tarn Cross" in often
    assert "31 trips, 06:00 to 20:30, every 60 min" in often
    assert once == "  5 (bus): Brell Mill – Dorn Hill, 2 stations, 1 trip, at 07:10"


def test_the_summary_has_dates_agencies_modes_and_counts(village, capsys):
    assert run(["inspect", str(village), "--quiet", "--all"]) == 0
    out = capsys.readouterr().out
    for line in (
        "Feed: Vessel Road Buses, valid 2026-03-02 to 2026-03-29",
        "Agencies: Vessel Road Buses",
        "Modes: bus (2 lines)",
        "Network: 2 lines, 4 stations in 4 interchange groups, 3 links, 0 walks",
        "Left out: 1 pattern, 3 routes, 1 station, 3 stops, 3 trips",
    ):
        assert line in out.splitlines()
    assert "stops.txt, row 8, field stop_lat, value '0'" in out


def test_a_feed_that_does_not_hold_today_is_told_apart_from_the_results(village, capsys):
    """The feed is of spring 2026; what goes to standard output is the same on any day."""
    assert run(["inspect", str(village)]) == 0
    captured = capsys.readouterr()
    assert "expired" not in captured.out
    assert ("expired" in captured.err) or ("not valid yet" in captured.err)


@pytest.mark.parametrize(
    ("changes", "told"),
    [
        ({"stops.txt": None}, "village.zip lacks stops.txt"),
        ({"stops.txt": "stop_id;stop_name\n"}, "separated by semicolons; they must be by commas"),
        ({"trips.txt": "route_id,service_id,trip_id\n"}, "lacks rows in trips.txt"),
        ({"routes.txt": "route_id,route_type\nr1,714\nr2,110\n"}, "2 × route: replacement service"),
        ({"stops.txt": VILLAGE["stops.txt"].replace("Tarn", '"Tarn')}, "row 2: cannot be read as"),
        ({"stops.txt": VILLAGE["stops.txt"].encode("utf-16")}, "looks like UTF-16"),
        ({"calendar.txt": VILLAGE["calendar.txt"].replace("2026", "26")}, "no service on any date"),
        ({"stops.txt": VILLAGE["stops.txt"].replace("47.0", "147.0")}, "not a number of degrees"),
        ({"../stops.txt": ""}, "leads outside the zip"),
        ({"shapes.txt": " " * 40 * 2**20}, "more than 200 times its packed size"),
    ],
)
def test_what_cannot_be_used_is_one_error_of_one_line(tmp_path, capsys, changes, told):
    path = tmp_path / "village.zip"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in {**VILLAGE, **changes}.items():
            if content is not None:
                archive.writestr(name, content)
    assert run(["inspect", str(path), "--quiet"]) == 3
    captured = capsys.readouterr()
    assert captured.out == ""
    (line,) = captured.err.splitlines()
    assert line.startswith("Error: ")
    assert told in line
