"""Commands parse, call, report, and end with the right exit code; none shows a traceback."""

from __future__ import annotations

import csv
import io
import json
import re
import signal
import subprocess
import sys
import time
import zipfile
from dataclasses import replace
from pathlib import Path

import pytest

from gtfs_schematic.cli.main import run
from gtfs_schematic.edition.model import Edition, EditionFeed, EditionLine, EditionLink
from gtfs_schematic.edition.model import EditionStation as Station
from gtfs_schematic.edition.save import to_json

DATA = Path(__file__).parents[2] / "data"
BEFORE = DATA / "before.zip"


def station(key: str, lon: float, lat: float, x: float, y: float) -> Station:
    return Station(key, key.title(), (key,), lon, lat, x, y, "stop", ("1",), key)


EDITION = Edition(
    title="Three stops",
    feed=EditionFeed("0" * 64, "P", "v", "", "", "2026-03-11"),
    width_mm=100.0,
    height_mm=100.0,
    stations=(
        station("a", 10.00, 50.00, 10, 50),
        station("b", 10.01, 50.00, 40, 50),
        station("c", 10.01, 50.02, 40, 10),
    ),
    links=(
        EditionLink("a-b", "a", "b", ("1",), ((10, 50), (40, 50))),
        EditionLink("b-c", "b", "c", ("1",), ((40, 50), (40, 10))),
    ),
    lines=(EditionLine("1", "1", "#AA0000", "#FFFFFF", ("r",), (("a", "b", "c"),)),),
    findings=("warning: stops.txt: <odd>",),
)


@pytest.fixture
def edition(tmp_path):
    folder = tmp_path / "edition"
    folder.mkdir()
    (folder / "edition.json").write_bytes(to_json(EDITION))
    (folder / "diagram.svg").write_text('<svg viewBox="0 0 100 100"><title>t</title></svg>')
    return folder


@pytest.fixture
def empty_folder(tmp_path, monkeypatch):
    """Work in a folder of its own."""
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_help_is_quick():
    """Under half a second, the best of three so that a busy machine does not count."""
    seconds = []
    for arguments in (["--help"], ["draw", "--help"], ["inspect", "--help"]):
        begin = time.perf_counter()
        command = [sys.executable, "-m", "gtfs_schematic", *arguments]
        output = subprocess.run(command, capture_output=True, text=True, check=True).stdout
        seconds.append(time.perf_counter() - begin)
        assert "Usage: gtfs-schematic" in output
        assert "Example:" in output
    assert min(seconds) < 0.5


@pytest.mark.parametrize("command", ["inspect", "draw", "drift", "review", "demo"])
def test_every_command_helps_with_an_example(command, capsys):
    assert run([command, "--help"]) == 0
    assert f"gtfs-schematic {command} " in capsys.readouterr().out.split("Example:")[1]


def test_no_command_shows_help(capsys):
    assert run([]) == 2
    assert "Commands:" in capsys.readouterr().err


def test_drift_speaks(edition, capsys):
    assert run(["drift", str(edition)]) == 0
    out = capsys.readouterr().out
    assert out.startswith("Three stops\nDrift: residual ")
    assert "Caution: A schematic diagram is not to scale." in out


def test_drift_as_json_from_the_file_itself(edition, capsys):
    assert run(["drift", str(edition / "edition.json"), "--json", "--limit", "residual=1"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert [row["id"] for row in document["stations"]] == ["a", "b", "c"]
    assert document["limits"][0]["exceeded"] is False


def test_drift_as_csv(edition, capsysbinary):
    assert run(["drift", str(edition), "--csv"]) == 0
    text = capsysbinary.readouterr().out.decode()
    assert len(list(csv.DictReader(io.StringIO(text, newline="")))) == 5


def test_an_exceeded_limit_is_exit_code_4(edition, capsys):
    limits = ["--limit", "bearing-max=180", "--limit", "residual=1e-9"]
    assert run(["drift", str(edition), *limits]) == 4
    out = capsys.readouterr().out
    assert "Limit bearing-max=180: kept" in out
    assert "Limit residual=1e-09: EXCEEDED" in out
    assert run(["drift", str(edition), "--json", "--limit", "residual=1e-9"]) == 4
    assert "EXCEEDED" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (["fly"], 2, "No such command 'fly'"),
        (["draw"], 2, "Missing argument 'FEED...'"),
        (["draw", "x.zip"], 2, "Missing option '--out'"),
        (["draw", "x.zip", "--out", "o", "--sheat", "A4"], 2, "--sheat"),
        (["draw", "x.zip", "--out", "o", "--sheet", "A9"], 2, "sheet.size = 'A9'"),
        (["draw", "x.zip", "--out", "o", "--fidelity", "2"], 2, "layout.fidelity = 2"),
        (["draw", "x.zip", "--out", "o", "--effort", "huge"], 2, "layout.effort = 'huge'"),
        (["draw", "x.zip", "--out", "o", "--limit", "residul=1"], 2, "Did you mean residual"),
        (["draw", "x.zip", "--out", "o", "--config", "no.toml"], 2, "no.toml: cannot read"),
        (["drift", "nowhere"], 3, "nowhere: cannot read the edition"),
        (["drift", "nowhere", "--limit", "x"], 2, "not of the form"),
        (["drift", "nowhere", "--json", "--csv"], 2, "not both"),
        (["review", "nowhere"], 3, "nowhere: cannot read the edition"),
        (["review", "nowhere", "--port", "x"], 2, "--port"),
        (["demo", "/dev/null/x"], 2, "cannot write the demo feeds"),
    ],
)
def test_wrong_usage_is_named(arguments, code, message, capsys, empty_folder):
    assert run(arguments) == code
    error = capsys.readouterr().err
    assert message in error
    assert "Traceback" not in error
    assert list(empty_folder.iterdir()) == []


def bad_feed(kind: str, folder: Path) -> Path:
    """Make an input that is no feed, in one of several ways."""
    path = folder / "feed.zip"
    if kind == "empty file":
        path.write_bytes(b"")
    elif kind == "no zip":
        path.write_bytes(b"PK\x03\x04 but not really")
    elif kind == "cut zip":
        path.write_bytes(BEFORE.read_bytes()[:3000])
    elif kind == "empty folder":
        path = folder / "feed"
        path.mkdir()
    elif kind == "zip of other things":
        with zipfile.ZipFile(path, "w") as archive:
            archive.writestr("readme.txt", "hello")
    elif kind == "headers only":
        with zipfile.ZipFile(BEFORE) as old, zipfile.ZipFile(path, "w") as archive:
            for name in old.namelist():
                archive.writestr(name, old.read(name).splitlines()[0])
    return path


KINDS = [
    "missing",
    "empty file",
    "no zip",
    "cut zip",
    "empty folder",
    "zip of other things",
    "headers only",
]


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("command", ["inspect", "draw"])
def test_a_bad_feed_is_exit_code_3_with_a_reason(kind, command, capsys, tmp_path):
    feed = bad_feed(kind, tmp_path)
    out = tmp_path / "out"
    arguments = [command, str(feed), *(["--out", str(out)] if command == "draw" else [])]
    assert run(arguments) == 3
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith("Error: ") or "\nError: " in captured.err
    assert "Traceback" not in captured.err
    assert "defect of this program" not in captured.err
    assert len(captured.err.split("Error: ")[1]) > 20
    assert not out.exists()


@pytest.mark.parametrize(
    ("option", "value"),
    [("--date", "2031-01-01"), ("--date", "11.3.2026"), ("--mode", "hovercraft")],
)
def test_options_that_the_feed_cannot_meet(option, value, capsys):
    assert run(["inspect", str(BEFORE), option, value]) in (2, 3)
    error = capsys.readouterr().err
    assert value in error
    assert "defect of this program" not in error


def test_inspect_for_people(capsys):
    assert run(["inspect", str(BEFORE), "--date", "2026-03-11"]) == 0
    captured = capsys.readouterr()
    assert "Service date: 2026-03-11" in captured.out
    assert "Wednesday 11 March 2026 was asked for" in captured.err
    with zipfile.ZipFile(BEFORE) as archive:
        routes = csv.DictReader(io.StringIO(archive.read("routes.txt").decode("utf-8-sig")))
        for route in routes:
            assert re.search(rf"^  {route['route_short_name']} \(", captured.out, re.MULTILINE)


def test_inspect_for_machines(capsys):
    assert run(["inspect", str(BEFORE), "--json", "--quiet"]) == 0
    captured = capsys.readouterr()
    document = json.loads(captured.out)
    assert captured.err == ""
    assert set(document) >= {
        "service_date",
        "agencies",
        "lines",
        "stations",
        "interchange_groups",
        "links",
        "left_out",
        "findings",
    }
    assert all(set(line) >= {"id", "name", "route_ids", "trips"} for line in document["lines"])
    keys = {"severity", "file", "row", "field", "value", "message"}
    assert all(set(finding) == keys for finding in document["findings"])
    assert document["interchange_groups"] < document["stations"]


def test_inspect_writes_geojson(capsys, tmp_path):
    file = tmp_path / "network.geojson"
    assert run(["inspect", str(BEFORE), "--json", "--geojson", str(file)]) == 0
    document = json.loads(capsys.readouterr().out)
    collection = json.loads(file.read_bytes())
    kinds = [feature["geometry"]["type"] for feature in collection["features"]]
    assert kinds.count("Point") == document["stations"]
    missing = tmp_path / "no" / "x"
    assert run(["inspect", str(BEFORE), "--geojson", str(missing)]) == 2
    assert "cannot be written" in capsys.readouterr().err


def test_demo_writes_the_feeds_once(capsys, tmp_path):
    assert run(["demo", str(tmp_path / "feeds")]) == 0
    listed = capsys.readouterr().out.split()
    assert {Path(name).name for name in listed} >= {"before.zip", "after.zip"}
    assert run(["inspect", str(tmp_path / "feeds" / "after.zip"), "--quiet"]) == 0
    capsys.readouterr()
    assert run(["demo", str(tmp_path / "feeds")]) == 2
    assert "--overwrite" in capsys.readouterr().err
    assert run(["demo", str(tmp_path / "feeds"), "--overwrite"]) == 0


def test_a_defect_is_reported_without_a_traceback(edition, capsys, monkeypatch):
    def broken(*_: object) -> None:
        raise ZeroDivisionError("oops")

    monkeypatch.setattr("gtfs_schematic.drift.measure.measure_edition", broken)
    monkeypatch.delenv("GTFS_SCHEMATIC_TRACEBACK", raising=False)
    assert run(["drift", str(edition)]) == 1
    error = capsys.readouterr().err
    assert "ZeroDivisionError: oops" in error
    assert "Traceback" not in error
    monkeypatch.setenv("GTFS_SCHEMATIC_TRACEBACK", "1")
    assert run(["drift", str(edition)]) == 1
    assert "Traceback" in capsys.readouterr().err


def test_ctrl_c_is_no_defect(edition, capsys, monkeypatch):
    """Also where compiled code wraps it in another error."""

    def stopped(*_: object) -> None:
        raise KeyboardInterrupt

    def wrapped(*_: object) -> None:
        raise SystemError("wrapped") from KeyboardInterrupt()

    for interrupted in (stopped, wrapped):
        monkeypatch.setattr("gtfs_schematic.drift.measure.measure_edition", interrupted)
        assert run(["drift", str(edition)]) == 130
        assert capsys.readouterr().err.strip() == "Stopped; nothing was written."


def test_review_says_where_until_ctrl_c(edition):
    command = [sys.executable, "-m", "gtfs_schematic", "review", str(edition)]
    with subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        address = process.stdout.readline()
        process.stderr.readline()
        process.send_signal(signal.SIGINT)
        assert process.wait(timeout=20) == 0
    assert re.fullmatch(r"http://127\.0\.0\.1:\d+/\n", address)


def test_an_edition_with_one_place_is_exit_code_3(tmp_path, capsys):
    one = replace(EDITION, stations=EDITION.stations[:1], links=(), lines=())
    lone = replace(one, stations=(replace(one.stations[0], lines=()),))
    (tmp_path / "edition.json").write_bytes(to_json(lone))
    assert run(["drift", str(tmp_path)]) == 3
    assert "no two stations have different places" in capsys.readouterr().err
