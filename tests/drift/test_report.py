"""A drift report is written so that machines and people can read it."""

from __future__ import annotations

import csv
import importlib.resources
import io
import json
import re
from dataclasses import dataclass
from xml.etree import ElementTree as ET

import jsonschema
import pytest

from gtfs_schematic.drift.limits import MEASURES, Limit, exceeded, judge, parse_limit
from gtfs_schematic.drift.measure import measure
from gtfs_schematic.drift.page import to_html
from gtfs_schematic.drift.report import to_csv, to_json
from gtfs_schematic.errors import EditionError, UsageError

SVG = b"""<?xml version="1.0"?>
<svg xmlns="http://www.w3.org/2000/svg" width="100mm" height="80mm" viewBox="0 0 100 80">
<title>x</title></svg>"""


@dataclass(frozen=True)
class Place:
    """A drawn station."""

    id: str
    name: str
    lon: float
    lat: float
    x_mm: float
    y_mm: float


@dataclass(frozen=True)
class Joined:
    """A drawn link."""

    id: str
    start: str
    end: str


@pytest.fixture
def report():
    places = [
        Place("a", 'Äußere "Mühle", <Nord>', 0.0, 0.0, 10.0, 50.0),
        Place("b", "Born", 0.0, 0.02, 10.0, 20.0),
        Place("c", "Cot", 0.03, 0.02, 60.0, 20.0),
    ]
    return measure(places, [Joined("a-b", "a", "b"), Joined("b-c", "b", "c")])


def schema():
    text = (importlib.resources.files("gtfs_schematic.drift") / "drift.schema.json").read_text()
    return json.loads(text)


def test_json_meets_its_schema(report):
    limits = judge(report, [parse_limit("residual<0.0001"), parse_limit("bearing<=180")])
    document = json.loads(to_json(report, limits))
    jsonschema.validate(document, schema(), cls=jsonschema.Draft202012Validator)
    assert [s["id"] for s in document["stations"]] == ["a", "b", "c"]
    assert [entry["exceeded"] for entry in document["limits"]] == [True, False]
    assert document["fit"]["free"]["residual"] == pytest.approx(report.free.residual, abs=1e-6)
    assert "not to scale" in document["caution"]


def test_schema_refuses_a_residual_above_one(report):
    document = json.loads(to_json(report))
    document["fit"]["free"]["residual"] = 1.5
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(document, schema())


def test_csv_reads_back(report):
    rows = list(csv.DictReader(io.StringIO(to_csv(report).decode("utf-8"), newline="")))
    assert [(row["kind"], row["id"]) for row in rows] == [
        ("station", "a"),
        ("station", "b"),
        ("station", "c"),
        ("link", "a-b"),
        ("link", "b-c"),
    ]
    assert rows[0]["name"] == 'Äußere "Mühle", <Nord>'
    assert float(rows[0]["displacement_m"]) == pytest.approx(
        report.stations[0].displacement_m, abs=0.051
    )
    assert rows[3]["displacement_m"] == ""


def test_page_is_self_contained_and_escaped(report):
    page = to_html(report, SVG, title="A <b>& c").decode()
    assert "<?xml" not in page
    assert "&lt;Nord&gt;" in page
    assert "<Nord>" not in page
    assert "A &lt;b&gt;&amp; c" in page
    assert not re.search(r"(src|href)\s*=|url\(|@import|<script", page)
    charts = re.findall(r'<svg class="(?:chart|arrows)".*?</svg>', page, re.DOTALL)
    assert len(charts) == 3
    for chart in charts:
        ET.fromstring(chart)


def test_histogram_counts_every_station(report):
    page = to_html(report, SVG, title="t").decode()
    chart = re.search(r'aria-label="Stations by displacement".*?</svg>', page, re.DOTALL).group()
    counts = re.findall(r"<rect[^>]*/><text[^>]*>(\d+)</text>", chart)
    assert sum(map(int, counts)) == len(report.stations)


def test_arrows_end_where_stations_are_drawn(report):
    page = to_html(report, SVG, title="t").decode()
    heads = re.findall(r'class="head" d="M([\d.-]+) ([\d.-]+)L', page)
    drawn = {(round(s.drawn_mm[0], 2), round(s.drawn_mm[1], 2)) for s in report.stations}
    assert heads
    assert {(float(x), float(y)) for x, y in heads} <= drawn


def test_page_without_a_diagram_is_refused(report):
    with pytest.raises(EditionError, match="no <svg> element"):
        to_html(report, b"<html></html>", title="t")


@pytest.mark.parametrize(
    ("text", "limit"),
    [
        ("residual<0.1", Limit("residual", strict=True, value=0.1)),
        (" bearing-p95 <= 4e1 ", Limit("bearing-p95", strict=False, value=40.0)),
    ],
)
def test_limits_are_read(text, limit):
    assert parse_limit(text) == limit
    assert parse_limit(str(limit)) == limit


@pytest.mark.parametrize(
    ("text", "advice"),
    [
        ("residual", "not of the form"),
        ("residual<abc", "not of the form"),
        ("residual>0.1", "not of the form"),
        ("residual<e", "not of the form"),
        ("residul<0.1", "Did you mean residual"),
        ("zzz<1", "Known: residual"),
    ],
)
def test_wrong_limits_get_advice(text, advice):
    with pytest.raises(UsageError, match=advice):
        parse_limit(text)


def test_strict_limits_stop_at_the_value_itself(report):
    at = report.north_up.residual
    assert exceeded(report, [Limit("residual", strict=True, value=at)])
    assert not exceeded(report, [Limit("residual", strict=False, value=at)])


def test_every_measure_can_be_read(report):
    limits = [Limit(name, strict=False, value=-1.0) for name in MEASURES]
    results = judge(report, limits)
    assert [result.exceeded for result in results] == [True] * len(MEASURES)
