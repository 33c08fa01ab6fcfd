"""Lines that share a street without a stop run through every stage as one bundle."""

from __future__ import annotations

import itertools
import json
import math
import re
from dataclasses import replace
from pathlib import Path

import jsonschema
import networkx as nx
import pytest
import shapely
from shared_streets import write_feed

from gtfs_schematic.bundles.check import faults as bundle_faults
from gtfs_schematic.cli import inspect
from gtfs_schematic.config import Settings
from gtfs_schematic.drawing.listing import to_text
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.edition.adjusted import adjusted
from gtfs_schematic.edition.adjustments import Adjustments
from gtfs_schematic.edition.save import from_json, to_json
from gtfs_schematic.network.between import link_towards, part_service_of
from gtfs_schematic.network.check import faults
from gtfs_schematic.network.export import to_geojson, to_graphml
from gtfs_schematic.pipeline import Result, draw
from gtfs_schematic.revision import revise

SETTINGS = Settings(network={"corridors": "shapes"}, layout={"effort": "quick"})
SCHEMA = Path(__file__).parents[1] / "gtfs_schematic" / "edition" / "edition.schema.json"


@pytest.fixture(scope="module")
def feed(tmp_path_factory) -> Path:
    """Give the folder of a feed."""
    return write_feed(tmp_path_factory.mktemp("feed"))


@pytest.fixture(scope="module")
def result(feed) -> Result:
    """Draw it; every stage checks what it gives."""
    return draw(feed, SETTINGS)


def test_lines_join_and_part_at_junctions(result):
    network = result.network
    # Line 30 is on the street of the others from its junction to Hazel, and leaves them there.
    assert len(network.junctions) == 3
    shared = sorted(len(link.lines) for link in network.links if len(link.lines) > 1)
    assert shared == [2, 2, 2, 3, 3]
    assert network.junction.keys() <= result.layout.positions.keys()


def test_nothing_but_the_lines_is_drawn_at_a_junction(result):
    svg = to_svg(result.drawing).decode()
    assert set(re.findall(r'data-station="([^"]+)"', svg)) == set(result.network.station)
    assert not result.network.junction.keys() & result.labelled.labels.keys()
    assert "@" not in to_text(result.network, result.settings.drawing).decode()
    assert "@" not in svg


def test_every_line_is_one_whole_on_the_sheet(result):
    """The strokes of a line hang together, also where nothing but they is drawn."""
    assert bundle_faults(result.bundled) == ()
    width = result.bundled.settings.line_width_mm
    for line in result.network.lines:
        strokes = [
            shapely.LineString([corner.at_mm for corner in stretch.corners]).buffer(width / 2.0)
            for stretch in result.bundled.stretches
            if stretch.line_id == line.id
        ]
        assert shapely.union_all(strokes).geom_type == "Polygon"


def test_links_of_an_edition_join_stations(result):
    edition = result.edition
    data = to_json(edition)
    assert from_json(data) == edition
    document = json.loads(data)
    jsonschema.validate(document, json.loads(SCHEMA.read_text("utf-8")))
    places = {s["id"]: [s["x_mm"], s["y_mm"]] for s in document["stations"]}
    junctions = {j["id"]: [j["x_mm"], j["y_mm"]] for j in document["junctions"]}
    steps = set()
    for link in document["links"]:
        assert link["path_mm"][0] == places[link["from"]]
        assert link["path_mm"][-1] == places[link["to"]]
        assert all(junctions[key] in link["path_mm"] for key in link.get("via", ()))
        steps |= {(line, frozenset((link["from"], link["to"]))) for line in link["lines"]}
    for line in document["lines"]:
        for itinerary in line["itineraries"]:
            graph = nx.Graph([tuple(ends) for key, ends in steps if key == line["id"]])
            assert all(nx.has_path(graph, a, b) for a, b in itertools.pairwise(itinerary))


def test_parts_of_an_edition_are_what_links_over_junctions_run_over(result):
    edition = result.edition
    parts = {frozenset((p.start, p.end)): p for p in edition.parts}
    used = {key: set() for key in parts}
    for link in edition.links:
        for step in itertools.pairwise((link.start, *link.via, link.end) if link.via else ()):
            used[frozenset(step)] |= set(link.lines)
            part = shapely.LineString(parts[frozenset(step)].path_mm)
            assert shapely.LineString(link.path_mm).buffer(1e-3).covers(part)
    assert {key: set(part.lines) for key, part in parts.items()} == used


def test_drift_is_of_stations(result):
    report = result.drift
    assert {s.station_id for s in report.stations} == set(result.network.station)
    assert all(math.isfinite(k.bearing_change_deg) for k in report.links)


def test_a_revision_keeps_junctions_where_they_are(tmp_path, result):
    before = result.edition
    moved = write_feed(tmp_path / "moved", aside_m=12.0)
    again = revise(before, moved, SETTINGS)
    assert not again.anew
    assert again.result.edition.places == before.places
    assert {p.id: p.path_mm for p in again.result.edition.parts} == {
        p.id: p.path_mm for p in before.parts
    }
    fewer = revise(before, write_feed(tmp_path / "fewer", ["10", "20"]), SETTINGS)
    after = fewer.result.edition
    assert not fewer.anew
    assert len(after.junctions) == 2
    kept = after.places.keys() & before.places.keys()
    assert len(kept) == len(after.places)
    assert {key: after.places[key] for key in kept} == {key: before.places[key] for key in kept}


@pytest.mark.parametrize(("line", "left"), [("10", 1), ("20", 1), ("30", 2)])
def test_hiding_a_line_takes_its_junctions_along(result, line, left):
    hidden = Adjustments.model_validate({"lines": {line: {"hide": True}}})
    network = adjusted(result.network, hidden).network
    assert faults(network) == ()
    assert len(network.junctions) == left


def test_merged_and_hidden_stations_leave_one_way_between_stations(result):
    told = {
        "merge": [{"stations": ["Cedar", "Hazel"]}],
        "stations": {"Damson": {"hide": True}, "Birch": {"hide": True}},
    }
    network = adjusted(result.network, Adjustments.model_validate(told)).network
    assert faults(network) == ()
    assert network.junctions


def test_exports_show_junctions_as_what_they_are(result):
    network = result.network
    features = json.loads(to_geojson(network))["features"]
    shown = [f["properties"] for f in features if f["properties"]["layer"] == "junction"]
    assert [each["id"] for each in shown] == sorted(network.junction)
    graph = nx.parse_graphml(to_graphml(network).decode())
    assert {n for n, kind in graph.nodes(data="kind") if kind == "junction"} == set(
        network.junction
    )
    assert graph.number_of_edges() == len(network.links) + len(network.walks)


def test_machines_are_told_links_from_station_to_station(result):
    network = result.network
    told = json.loads(inspect.to_json(network))
    assert told["links"] == len(result.edition.links)
    assert told["junctions"] == len(network.junctions)
    for link in result.edition.links:
        towards = link_towards(network, link.start, link.end)
        assert link.start in (towards.start, towards.end)
        assert set(link.lines) <= set(towards.lines)


def test_part_service_is_told_from_station_to_station(result):
    line = result.network.lines[0]
    whole = [
        (*sorted(step), "peak") for course in line.courses for step in itertools.pairwise(course)
    ]
    told = part_service_of(result.network, replace(line, part_service=tuple(sorted(whole))))
    assert told == tuple(
        (k.start, k.end, "peak") for k in result.edition.links if line.id in k.lines
    )
    assert part_service_of(result.network, line) == ()
