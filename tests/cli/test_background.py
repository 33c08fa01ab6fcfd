"""Backgrounds are asked for on the command line, and what is wrong with them is told at once."""

from __future__ import annotations

import json
from pathlib import Path

from gtfs_schematic.cli.main import run

DATA = Path(__file__).parents[2] / "data"


def test_water_lies_beneath_and_is_remembered(tmp_path, capsys):
    out = tmp_path / "out"
    water = str(DATA / "background.geojson")
    feed = [str(DATA / "before.zip"), "--mode", "tram", "--mode", "ferry"]
    assert run(["draw", *feed, "--effort", "quick", "--background", water, "--out", str(out)]) == 0
    told = capsys.readouterr().out
    assert "Background: " in told
    svg = (out / "diagram.svg").read_text("utf-8")
    assert '<g class="background">' in svg
    assert "Lóm Ovředa" in svg
    edition = json.loads((out / "edition.json").read_text("utf-8"))
    assert edition["settings"]["background"]["files"] == [water]


def test_a_wrong_background_stops_the_run_before_the_work(tmp_path, capsys):
    bad = tmp_path / "bad.geojson"
    bad.write_text('{"type": "FeatureCollection", "features": [{"type": "Pond"}]}')
    for file, says in ((bad, "feature 1"), (tmp_path / "gone", "cannot read the background")):
        out = tmp_path / "out"
        command = ["draw", str(DATA / "before.zip"), "--background", str(file), "--out", str(out)]
        assert run(command) == 2
        told = capsys.readouterr()
        assert says in told.err
        assert "Reading" not in told.err
        assert not out.exists()
