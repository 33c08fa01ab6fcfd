"""The command `drift`: limits, other drawings, and a report in a folder of its own."""

from __future__ import annotations

import json
import zipfile
from pathlib import Path

import pytest
from small_diagrams import Drawn, two_ways

from gtfs_schematic.cli.main import run
from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.edition.model import (
    Edition,
    EditionFeed,
    EditionLine,
    EditionLink,
    EditionStation,
    EditionWalk,
)
from gtfs_schematic.edition.save import to_json

WRITTEN = ["drift.csv", "drift.html", "drift.json", "drift.png", "drift.svg"]


def edition_of(diagram: Drawn, patterns: tuple[TimedPattern, ...]) -> Edition:
    """Save a small diagram as draw would, 50 mm into its sheet."""

    def at(x: float, y: float) -> tuple[float, float]:
        return (x + 50.0, y + 50.0)

    return Edition(
        title="Two ways",
        feed=EditionFeed("0" * 64, "P", "v", "", "", "2026-03-11"),
        width_mm=200.0,
        height_mm=200.0,
        stations=tuple(
            EditionStation(
                s.id, s.name, s.stop_ids, s.lon, s.lat, *at(s.x_mm, s.y_mm), "stop", (), s.group
            )
            for s in diagram.stations
        ),
        links=tuple(
            EditionLink(k.id, k.start, k.end, k.lines, tuple(at(*p) for p in k.path_mm))
            for k in diagram.links
        ),
        lines=tuple(EditionLine(k.id, k.name, k.color, "#FFFFFF", (), ()) for k in diagram.lines),
        walks=tuple(
            EditionWalk(w.id, w.start, w.end, w.time_s, tuple(at(*p) for p in w.path_mm))
            for w in diagram.walks
        ),
        patterns=patterns,
    )


@pytest.fixture
def edition(tmp_path) -> Path:
    file = tmp_path / "edition.json"
    diagram = two_ways()
    file.write_bytes(to_json(edition_of(diagram, diagram.patterns)))
    return file


@pytest.fixture
def table(tmp_path) -> Path:
    """Places of another drawing, y up, that lacks one station."""
    file = tmp_path / "today.csv"
    rows = [f"{s.id}1,{s.x_m},{s.y_m}" for s in two_ways().stations[:-1]]
    file.write_text("\n".join(["stop_id,x,y", *rows]))
    return file


def test_it_says_whom_the_edition_misleads(edition, capsys):
    assert run(["drift", str(edition)]) == 0
    out = capsys.readouterr().out
    assert "journeys: " in out
    assert "of 28 take over 15 % longer by the way that looks shortest, the worst 86 %" in out


def test_limits_of_journeys_gate(edition, capsys):
    limits = ["--limit", "planning-error-over-1.15=5%", "--limit", "bearing-over-90=0"]
    assert run(["drift", str(edition), *limits]) == 4
    out = capsys.readouterr().out
    assert "Limit planning-error-over-1.15=5%: EXCEEDED (measured " in out
    assert "Limit bearing-over-90=0%: kept (measured 0.0 %)" in out


def test_limits_may_stand_in_the_configuration(edition, tmp_path, capsys):
    config = tmp_path / "mine.toml"
    config.write_text('[drift.limits]\nplanning-error-over-1.15 = "5%"\n')
    assert run(["drift", str(edition), "--config", str(config), "--json"]) == 4
    said = capsys.readouterr()
    assert json.loads(said.out)["limits"][0]["exceeded"] is True
    assert "EXCEEDED" in said.err
    wins = ["--limit", "planning-error-over-1.15=100%"]
    assert run(["drift", str(edition), "--config", str(config), *wins]) == 0
    config.write_text("[drift.limits]\nplanning-eror = 1\n")
    assert run(["drift", str(edition), "--config", str(config)]) == 2
    assert "drift.limits.planning-eror: no such measure" in capsys.readouterr().err


def test_an_edition_without_a_timetable_says_so(tmp_path, capsys):
    file = tmp_path / "edition.json"
    file.write_bytes(to_json(edition_of(two_ways(), ())))
    assert run(["drift", str(file)]) == 0
    assert "journeys: not measured" in capsys.readouterr().out
    assert run(["drift", str(file), "--limit", "planning-error-max=2"]) == 3
    assert "holds no timetable" in capsys.readouterr().err


def test_another_drawing_is_told_beside_the_edition(edition, table, capsys):
    arguments = ["drift", str(edition), "--positions", str(table), "--y-axis", "up"]
    assert run([*arguments, "--limit", "displacement-max=1%"]) == 0
    out = capsys.readouterr().out
    assert out.startswith("Two ways (today.csv)\nDrift: residual 0.000")
    assert "Without a position: 1 station\n  f\n" in out
    assert "Side by side" in out
    assert run([*arguments, "--json"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert document["figures"]["residual"] < document["beside"]["figures"]["residual"]
    # The wrong way round it is a mirror image.
    assert run([*arguments[:-1], "down", "--limit", "order-flips=10%"]) == 4


def test_a_wrong_table_is_named_with_its_row(edition, table, capsys):
    table.write_text("stop_id,x,y\na1,1,2\nb1,1,?\n")
    assert run(["drift", str(edition), "--positions", str(table)]) == 3
    assert f"{table}: row 3: y = '?' is no number" in capsys.readouterr().err


def test_a_report_goes_into_a_folder_of_its_own(edition, table, tmp_path, capsys):
    out = tmp_path / "reports" / "march"
    arguments = ["drift", str(edition), "--positions", str(table), "--out", str(out)]
    assert run(arguments) == 0
    assert sorted(file.name for file in out.iterdir()) == WRITTEN
    first = {file.name: file.read_bytes() for file in out.iterdir()}
    assert b"Beside it" in first["drift.html"]
    assert run(arguments) == 2
    assert "stands there already. Give --overwrite" in capsys.readouterr().err
    assert run([*arguments, "--overwrite"]) == 0
    assert {file.name: file.read_bytes() for file in out.iterdir()} == first
    assert run(["drift", str(edition), "--out", str(edition.parent), "--overwrite"]) == 2
    assert "an edition stands there" in capsys.readouterr().err
    assert run(["drift", str(edition), "--out", str(edition)]) == 2


def test_draw_obeys_limits_of_the_configuration(tmp_path, capsys):
    feed = tmp_path / "feed.zip"
    tables = {
        "agency.txt": "agency_name,agency_url,agency_timezone\nA,https://example.org,Etc/UTC",
        "stops.txt": "stop_id,stop_name,stop_lat,stop_lon\na,Ah,9,9\nb,Be,9,9.01\nc,Ce,9.03,9.02",
        "routes.txt": "route_id,route_short_name,route_type\n1,1,0",
        "calendar.txt": "service_id,monday,tuesday,wednesday,thursday,friday,saturday,sunday,"
        "start_date,end_date\ns,1,1,1,1,1,1,1,20260301,20260331",
        "trips.txt": "route_id,service_id,trip_id\n1,s,t",
        "stop_times.txt": "trip_id,arrival_time,departure_time,stop_id,stop_sequence\n"
        "t,08:00:00,08:00:00,a,1\nt,08:05:00,08:05:00,b,2\nt,08:10:00,08:10:00,c,3",
    }
    with zipfile.ZipFile(feed, "w") as archive:
        for name, text in tables.items():
            archive.writestr(name, text)
    config = tmp_path / "mine.toml"
    config.write_text("[drift.limits]\nresidual = 1e-12\n")
    out = tmp_path / "diagram"
    assert run(["draw", str(feed), "--out", str(out), "--config", str(config), "--quiet"]) == 4
    assert "Limit residual=1e-12: EXCEEDED" in capsys.readouterr().out
    document = json.loads((out / "drift.json").read_bytes())
    assert document["limits"][0]["exceeded"] is True
    assert document["journeys"]["pairs"] == 3
    assert b"class=over>exceeded" in (out / "drift.html").read_bytes()
    # The edition alone gives the same report.
    assert run(["drift", str(out), "--json"]) == 0
    again = json.loads(capsys.readouterr().out)
    assert again | {"limits": document["limits"]} == document
