"""Real feeds go the whole way: every guarantee kept, every file as promised.

The feeds are published by their operators, and travel in source distributions on the package index.
"""

from __future__ import annotations

import csv
import io
import json
import re
import zipfile
from pathlib import Path
from xml.etree import ElementTree as ET

import pypdf
import pytest

from gtfs_schematic.cli.main import run
from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.edition.folder import FILES, load_edition

FEEDS = ("cairns_feed", "nyc_subway_feed", "ann_arbor_feed")
SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module", params=FEEDS)
def drawn(request, tmp_path_factory):
    """Draw a feed once; give the feed and the folder."""
    feed: Path = request.getfixturevalue(request.param)
    out = tmp_path_factory.mktemp("real") / request.param
    # Exit code 0 says that every stage's own check found no fault.
    assert run(["draw", str(feed), "--out", str(out), "--effort", "quick", "--json"]) == 0
    return feed, out


def table(feed: Path, name: str) -> list[dict[str, str]]:
    """Read a table of a feed with the standard library alone."""
    with zipfile.ZipFile(feed) as archive:
        (member,) = [each for each in archive.namelist() if each.split("/")[-1] == name]
        return list(csv.DictReader(io.StringIO(archive.read(member).decode("utf-8-sig"))))


def test_all_files_are_there(drawn):
    _, out = drawn
    assert sorted(file.name for file in out.iterdir()) == sorted(FILES)


def test_every_route_is_drawn_or_left_out(drawn):
    feed, out = drawn
    edition = load_edition(out)
    routes = {row["route_id"].strip() for row in table(feed, "routes.txt")}
    shown = {key for line in edition.lines for key in line.route_ids}
    left_out = {key for kind, key, _ in edition.left_out if kind == "route"}
    assert shown | left_out == routes
    assert not shown & left_out


def test_every_stop_stands_in_one_station_at_most(drawn):
    feed, out = drawn
    edition = load_edition(out)
    ids = [key for station in edition.stations for key in station.stop_ids]
    assert len(ids) == len(set(ids))
    assert set(ids) <= {row["stop_id"].strip() for row in table(feed, "stops.txt")}


def test_names_can_be_found_in_svg_and_pdf(drawn):
    _, out = drawn
    edition = load_edition(out)
    root = ET.parse(out / "diagram.svg").getroot()
    groups = [g for g in root.iter(f"{SVG}g") if g.get("class") == "station"]
    assert {g.get("data-station") for g in groups} == {s.id for s in edition.stations}
    text = re.sub(r"\W", "", pypdf.PdfReader(out / "diagram.pdf").pages[0].extract_text())
    named = [station for station in edition.stations if station.label_side]
    assert len(named) >= 0.95 * len(edition.stations)
    for station in named:
        assert re.sub(r"\W", "", station.name) in text


def test_every_link_is_octilinear_and_joins_its_stations(drawn):
    """Seen in the saved file: exact multiples of 45 degrees, to the rounding of the file."""
    _, out = drawn
    for link in load_edition(out).links:
        for (x, y), (u, v) in zip(link.path_mm, link.path_mm[1:], strict=False):
            dx, dy = abs(u - x), abs(v - y)
            assert min(dx, dy, abs(dx - dy)) < 1e-3, link.id
            assert max(dx, dy) > 0.0, link.id


def test_the_drift_is_that_of_the_saved_edition(drawn):
    _, out = drawn
    document = json.loads((out / "drift.json").read_bytes())
    report = measure_edition(load_edition(out))
    saved = document["fit"]["north_up"]["residual"]
    assert saved == pytest.approx(report.north_up.residual, abs=1e-6)
    # A schematic that keeps north up resembles the ground: far better than chance, which is 1.
    assert report.north_up.residual < 0.5
    assert report.summary.distance_correlation > 0.5
