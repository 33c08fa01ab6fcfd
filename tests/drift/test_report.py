"""A drift report is written so that machines and people can read it."""

from __future__ import annotations

import csv
import importlib.resources
import io
import json
import re
from dataclasses import replace
from html.parser import HTMLParser
from xml.etree import ElementTree as ET

import jsonschema
import pytest
import small_diagrams

from gtfs_schematic.drift.figures import FIGURE, FIGURES
from gtfs_schematic.drift.limits import judge, parse_limit
from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.page import Beside, to_html
from gtfs_schematic.drift.plot import to_png, to_svg
from gtfs_schematic.drift.report import to_csv, to_json
from gtfs_schematic.drift.verdict import verdict_of

DIAGRAM = small_diagrams.two_ways()


class Odd(small_diagrams.Stop):
    """A station whose name is markup."""

    name = 'Äußere "Mühle", <Nord> & </script>'


ODD = replace(DIAGRAM, stations=(Odd("a", 0, 0, 0, 0, "a"), *DIAGRAM.stations[1:]))


@pytest.fixture(scope="module")
def report():
    return measure_edition(DIAGRAM)


@pytest.fixture(scope="module")
def odd():
    return measure_edition(ODD)


def schema():
    text = (importlib.resources.files("gtfs_schematic.drift") / "drift.schema.json").read_text()
    return json.loads(text)


def test_json_meets_its_schema(report):
    limits = judge(report, [parse_limit("residual=0.0001"), parse_limit("bearing-max=180")])
    document = json.loads(to_json(report, limits, ("Other", report)))
    jsonschema.validate(document, schema(), cls=jsonschema.Draft202012Validator)
    assert [s["id"] for s in document["stations"]] == ["a", "b", "c", "d", "e", "f"]
    assert [entry["exceeded"] for entry in document["limits"]] == [True, False]
    assert document["fit"]["free"]["residual"] == pytest.approx(report.free.residual, abs=1e-6)
    assert document["journeys"]["worst"][0]["fastest"]["legs"][0]["line"] == "2"
    assert document["beside"]["figures"] == document["figures"]
    assert set(document["figures"]) == set(FIGURE)
    assert "not to scale" in document["caution"]


def test_json_without_a_timetable_meets_it_too():
    document = json.loads(to_json(measure_edition(replace(DIAGRAM, patterns=()))))
    jsonschema.validate(document, schema(), cls=jsonschema.Draft202012Validator)
    assert document["journeys"] is None
    assert document["figures"]["planning-error-max"] is None


def test_schema_refuses_a_residual_above_one(report):
    document = json.loads(to_json(report))
    document["fit"]["free"]["residual"] = 1.5
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(document, schema())


def test_csv_reads_back(odd):
    rows = list(csv.DictReader(io.StringIO(to_csv(odd).decode("utf-8"), newline="")))
    assert [(row["kind"], row["id"]) for row in rows] == [
        *(("station", key) for key in "abcdef"),
        *(("link", key) for key in ("ab", "bd", "ac", "cd", "ef")),
    ]
    assert rows[0]["name"] == Odd.name
    shown = float(rows[0]["displacement_m"])
    assert shown == pytest.approx(odd.stations[0].displacement_m, abs=0.051)
    assert rows[6]["displacement_m"] == ""
    assert (rows[6]["from"], rows[6]["to"]) == ("a", "b")


class Page(HTMLParser):
    """What of a page points elsewhere, and whether its elements nest."""

    void = frozenset(["meta", "link", "br", "input"])

    def __init__(self, text: str) -> None:
        super().__init__()
        self.links: list[str] = []
        self.open: list[str] = []
        self.ids: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag, attrs):
        """Open an element."""
        values = dict(attrs)
        self.links += [str(values[key]) for key in ("src", "href") if key in values]
        self.ids += [values["id"]] if "id" in values else []
        if tag not in self.void:
            self.open.append(tag)

    def handle_startendtag(self, tag, attrs):
        """Leave out what closes itself."""

    def handle_endtag(self, tag):
        """Close the element that was opened last."""
        assert self.open.pop() == tag


def test_page_is_self_contained_escaped_and_nests(odd):
    text = to_html(odd, ODD, title="A <b>& c").decode()
    page = Page(text)
    assert page.open == []
    assert page.links == ["data:,"]
    assert len(set(page.ids)) == len(page.ids)
    assert not re.search(r"url\(|@import|https?://(?!www\.w3\.org/2000/svg)", text)
    assert "&lt;Nord&gt;" in text
    assert "A &lt;b&gt;&amp; c" in text
    assert text.count("</script>") == 2
    places = re.search(r'id="data">(.*?)</script>', text, re.DOTALL).group(1)
    assert json.loads(places)["stations"][0]["name"] == Odd.name


def test_page_defines_every_figure(report):
    text = to_html(report, DIAGRAM, title="t").decode()
    for figure in FIGURES:
        assert f"<code>{figure.name}</code>" in text
        assert len(figure.meaning) > 10


def test_page_puts_two_drawings_side_by_side(report):
    other = measure_edition(replace(DIAGRAM, patterns=()))
    beside = Beside("Today's", other, DIAGRAM)
    text = to_html(report, DIAGRAM, title="t", beside=beside).decode()
    assert text.count('<svg class="net') == 2
    assert "Today&#x27;s" in text
    assert "not measured" in text


def test_charts_and_picture_are_xml_and_count_everything(report):
    text = to_html(report, DIAGRAM, title="t").decode()
    charts = re.findall(r'<svg class="chart".*?</svg>', text, re.DOTALL)
    totals = [sum(int(t.text) for t in list(ET.fromstring(chart))[1:-1:3]) for chart in charts]
    assert totals == [len(report.stations), len(report.links), len(report.links)]
    net = ET.fromstring(re.search(r'<svg class="net".*?</svg>', text, re.DOTALL).group())
    kinds = {group.get("class"): list(group) for group in net}
    assert len(kinds["stations"]) == len(report.stations)
    assert len(kinds["courses"]) == len(DIAGRAM.links) + len(DIAGRAM.walks)


def test_arrows_end_where_stations_are_drawn(report):
    text = to_html(report, DIAGRAM, title="t").decode()
    net = re.search(r'<svg class="net".*?</svg>', text, re.DOTALL).group()
    heads = set(re.findall(r'class="head" d="M([\d.-]+ [\d.-]+)L', net))
    drawn = {f"{x} {y}" for x, y in re.findall(r'cx="([\d.-]+)" cy="([\d.-]+)"', net)}
    assert heads
    assert heads <= drawn


def test_plots(report):
    svg = to_svg(report, DIAGRAM, title="A & <b>")
    root = ET.fromstring(svg)
    assert root.find("{http://www.w3.org/2000/svg}title").text == "A & <b>"
    assert b"var(" not in svg
    png = to_png(svg, width=300)
    assert png.startswith(b"\x89PNG")
    assert int.from_bytes(png[16:20], "big") == 300


def test_everything_is_written_the_same_again(report):
    again = measure_edition(small_diagrams.two_ways())
    assert to_json(again) == to_json(report)
    assert to_html(again, DIAGRAM, title="t") == to_html(report, DIAGRAM, title="t")


def test_a_verdict_says_what_holds_and_what_does_not(report):
    verdict = verdict_of(report)
    assert any("Worst: Stop" in text for text in verdict.bad)
    true_map = replace(
        DIAGRAM,
        stations=tuple(replace(s, x_mm=s.x_m / 50, y_mm=-s.y_m / 50) for s in DIAGRAM.stations),
        patterns=(),
    )
    good = verdict_of(measure_edition(true_map))
    assert [text for text in good.bad if "Journeys were not measured" not in text] == []
