"""Commands `changes` and `editions`: what differs, and what there is."""

from __future__ import annotations

import importlib.resources
import json
from dataclasses import replace
from pathlib import Path

import jsonschema
import pytest
from pypdf import PdfReader

from gtfs_schematic.cli.main import run
from gtfs_schematic.edition.folder import digest_of_edition
from gtfs_schematic.edition.model import Edition, EditionFeed, EditionLine, EditionLink
from gtfs_schematic.edition.model import EditionStation as Station
from gtfs_schematic.edition.save import to_json

DATA = Path(__file__).parents[2] / "data"
BEFORE, AFTER = str(DATA / "before.zip"), str(DATA / "after.zip")
TRUTH = json.loads((DATA / "changes-truth.json").read_text("utf-8"))


def station(key: str, lon: float, x: float) -> Station:
    return Station(key, key.title(), (key,), lon, 50.0, x, 50.0, "stop", ("1",), key)


OLD = Edition(
    title="Three stops",
    feed=EditionFeed("0" * 64, "P", "v", "2026-01-01", "2026-05-31", "2026-03-11"),
    width_mm=100.0,
    height_mm=100.0,
    stations=(station("a", 10.00, 10.0), station("b", 10.01, 40.0), station("c", 10.02, 70.0)),
    links=(
        EditionLink("a~b", "a", "b", ("1",), ((10, 50), (40, 50))),
        EditionLink("b~c", "b", "c", ("1",), ((40, 50), (70, 50))),
    ),
    lines=(EditionLine("1", "1", "#AA0000", "#FFFFFF", ("r",), (("a", "b", "c"),)),),
)


def write(folder: Path, edition: Edition) -> Path:
    folder.mkdir(parents=True)
    (folder / "edition.json").write_bytes(to_json(edition))
    (folder / "diagram.svg").write_text('<svg viewBox="0 0 100 100"><title>t</title></svg>')
    return folder


def test_two_feeds_without_a_diagram(tmp_path, capsys):
    out = tmp_path / "out"
    assert run(["changes", BEFORE, AFTER, "--out", str(out), "--json", "-q"]) == 0
    document = json.loads(capsys.readouterr().out)
    schema = importlib.resources.files("gtfs_schematic.edition") / "changes.schema.json"
    jsonschema.validate(document, json.loads(schema.read_text("utf-8")))
    told = {(c["subject"], c["kind"], c["name"]) for c in document["changes"]}
    for kind, key in (("gone", "closed"), ("new", "opened"), ("moved", "moved")):
        names = {record["name"] for record in TRUTH["stations"][key]}
        assert {name for s, k, name in told if (s, k) == ("station", kind)} == names
    assert document["nothing_else_changed"]
    assert sorted(file.name for file in out.iterdir()) == [
        "changes.csv", "changes.html", "changes.json", "changes.pdf",
    ]  # fmt: skip
    text = "".join(page.extract_text() for page in PdfReader(out / "changes.pdf").pages)
    words = " ".join(text.split())
    assert all(c["name"] in words for c in document["changes"])
    assert "Nothing else changed" in words
    assert "Approved for print" in words


def test_the_same_feed_has_no_change(capsys):
    assert run(["changes", BEFORE, BEFORE, "-q"]) == 0
    out = capsys.readouterr().out
    assert "No change; 101 stations in both." in out
    assert "Nothing else changed, comparing" in out


def test_two_editions_side_by_side(tmp_path, capsys):
    """Here all ids are other ones; the name of one station tells, and places of the others."""
    old = write(tmp_path / "old", OLD)
    names = {"a": "x", "b": "y", "c": "z"}
    renamed = replace(
        OLD,
        stations=tuple(
            replace(s, id=names[s.id], stop_ids=(names[s.id],), group=names[s.id], lines=("7",))
            for s in OLD.stations
        ),
        links=(
            EditionLink("x~y", "x", "y", ("7",), ((10, 50), (40, 50))),
            EditionLink("y~z", "y", "z", ("7",), ((40, 50), (70, 50))),
        ),
        lines=(replace(OLD.lines[0], id="7", color="#0000AA", itineraries=(("x", "y", "z"),)),),
    )
    new = write(tmp_path / "new", renamed)
    out = tmp_path / "out"
    assert run(["changes", str(old), str(new / "edition.json"), "--out", str(out), "-q"]) == 0
    told = capsys.readouterr().out
    assert "Line 1 (1), recolored: #AA0000 with #FFFFFF letters, now #0000AA" in told
    assert "Station A (a), renumbered: a, now x" in told
    assert "Not compared: modes, long names and times of lines" in told
    page = (out / "changes.html").read_text("utf-8")
    assert page.count('<use href="#before"/>') == page.count('<use href="#after"/>') >= 1
    assert 'id="diagram-title"' not in page


def test_what_is_neither_is_refused(tmp_path, capsys):
    (tmp_path / "x").mkdir()
    assert run(["changes", str(tmp_path / "x"), BEFORE, "-q"]) in (2, 3)
    assert "x" in capsys.readouterr().err


@pytest.fixture
def archive(tmp_path):
    spring = write(tmp_path / "b-spring", OLD)
    summer = replace(OLD, previous=digest_of_edition(spring))
    summer = write(tmp_path / "a-summer", summer)
    write(tmp_path / "c-autumn", replace(OLD, previous="f" * 64))
    return tmp_path


def test_editions_in_the_order_in_which_they_were_made(archive, capsys):
    assert run(["editions", str(archive), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)["editions"]
    names = [each["name"] for each in found]
    assert names.index("b-spring") < names.index("a-summer")
    assert {e["name"]: e["previous_name"] for e in found} == {
        "b-spring": "", "a-summer": "b-spring", "c-autumn": "",
    }  # fmt: skip
    assert run(["editions", str(archive)]) == 0
    told = capsys.readouterr().out
    assert (
        "a-summer  Three stops, 2026-01-01 to 2026-05-31, 3 stations, 1 line; revises b-sp" in told
    )
    assert "revises ffffffffffff (not here)" in told


def test_editions_that_cannot_be_read_are_named(archive, capsys):
    (archive / "d-winter").mkdir()
    (archive / "d-winter" / "edition.json").write_text("{}")
    assert run(["editions", str(archive)]) == 0
    captured = capsys.readouterr()
    assert "d-winter" in captured.err
    assert "b-spring" in captured.out
    assert run(["editions", str(archive / "none")]) == 2
