"""What a person asks of the picture is in it, or the edition says that it is not."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.config import settings_of
from gtfs_schematic.edition.adjusted import adjusted
from gtfs_schematic.edition.adjustments import adjustments_of
from gtfs_schematic.edition.unmet import unmet
from gtfs_schematic.pipeline import Result

ROOT = Path(__file__).parents[2]
QUICK = settings_of({"layout": {"effort": "quick"}}, "test")


def draw(**said: object) -> Result:
    return pipeline.draw(
        ROOT / "data" / "before.zip", QUICK, adjustments=adjustments_of(said, "test")
    )


def way(result: Result, here: str, there: str) -> int:
    """Give the octant (clockwise from east) in which a link leaves a station."""
    link = result.network.link_between[frozenset((here, there))]
    path = result.layout.paths[link.id]
    (ax, ay), (bx, by) = path[:2] if link.start == here else path[:-3:-1]
    return round(math.degrees(math.atan2(by - ay, bx - ax)) / 45) % 8


@pytest.fixture(scope="module")
def plain() -> Result:
    return draw()


@pytest.fixture(scope="module")
def bent(plain: Result) -> tuple[str, str, str, str]:
    """Give a line, a station with few others, and the neighbors between which it turns there."""
    lines_at = {station.id: len(station.lines) for station in plain.network.stations}
    return min(
        (
            (line.id, here, a, b)
            for line in plain.network.lines
            for course in line.courses
            for a, here, b in zip(course, course[1:], course[2:], strict=False)
            if (way(plain, here, a) - way(plain, here, b)) % 8 != 4
            and sum(course.count(here) for course in line.courses) == 1
        ),
        key=lambda turn: (lines_at[turn[1]], turn),
    )


@pytest.fixture(scope="module")
def wished(plain: Result, bent: tuple[str, str, str, str]) -> Result:
    orders = plain.bundled.orders
    return draw(
        stations={
            "106": {"pin_from": {"station": "343-1", "dx_mm": -25}},
            bent[1]: {"straight": [bent[0]]},
            "183": {"label_angle": 45, "short_name": "Mulg."},
            "152": {"label_rows": ["Two", "rows"]},
        },
        links=[
            {"between": ["101", "121"], "order": list(orders["101~121"][::-1])},
            {"between": ["101", "102"], "direction": "E"},
        ],
    )


def test_wishes_are_met(wished: Result, plain: Result, bent: tuple[str, str, str, str]) -> None:
    at = wished.layout.positions
    assert at["106"][0] - at["343-1"][0] == pytest.approx(-25.0)
    assert plain.layout.positions["106"][0] - plain.layout.positions["343-1"][0] != -25.0
    line, here, _, _ = bent
    courses = wished.network.line[line].courses
    passes = [
        (way(wished, here, a), way(wished, here, b))
        for course in courses
        for a, at_here, b in zip(course, course[1:], course[2:], strict=False)
        if at_here == here
    ]
    assert any((a - b) % 8 == 4 for a, b in passes)
    assert wished.bundled.orders["101~121"] == plain.bundled.orders["101~121"][::-1]
    assert way(wished, "101", "102") == 0
    label = wished.labelled.labels["183"]
    assert label.angle_deg == -45.0
    assert "".join(row.text for row in label.lines if not row.second) == "Mulg."
    rows = [row.text for row in wished.labelled.labels["152"].lines if not row.second]
    assert rows == ["Two", "rows"]
    assert wished.labelled.abbreviated["183"] == "Mulg."
    assert wished.network.station["183"].name == plain.network.station["183"].name
    assert plain.unmet == ()
    # A link that leaves as asked may have to bend on its way; nothing else is missed.
    assert all(each.field == "links.1.direction" for each in wished.unmet)


def test_what_is_not_met_is_told(plain: Result) -> None:
    link = plain.network.link["101~121"]
    (x, _), (u, _) = plain.layout.positions[link.start], plain.layout.positions[link.end]
    order = plain.bundled.orders[link.id]
    side = plain.labelled.labels["183"].side
    said = {
        "stations": {
            "183": {"label_side": "N" if side != "N" else "S", "label_angle": 90},
            "152": {"label_rows": ["A", "B"]},
            "192": {"short_name": "C", "pin_mm": [1, 1]},
            link.start: {"pin_from": {"station": link.end, "dx_mm": x - u + 1}},
        },
        "links": [{"between": [link.start, link.end], "order": list(order[::-1])}],
    }
    found = adjusted(plain.network, adjustments_of(said, "test"), plain.timetable)
    told = unmet(found.wishes, plain.labelled)
    assert {each.field for each in told} == {
        "stations.183.label_side",
        "stations.183.label_angle",
        "stations.152.label_rows",
        "stations.192.short_name",
        "stations.192.pin_mm",
        f"stations.{link.start}.pin_from",
        "links.0.order",
    }
    right = {"stations": {link.start: {"pin_from": {"station": link.end, "dx_mm": x - u}}}}
    found = adjusted(plain.network, adjustments_of(right, "test"), plain.timetable)
    assert unmet(found.wishes, plain.labelled) == ()


def test_each_bend_and_each_way_is_seen(plain: Result) -> None:
    for link in plain.network.links[::7]:
        path = plain.layout.paths[link.id]
        names = ("E", "SE", "S", "SW", "W", "NW", "N", "NE")
        asked = names[way(plain, link.start, link.end)]
        said = {"links": [{"between": [link.end, link.start], "direction": asked}]}
        found = adjusted(plain.network, adjustments_of(said, "test"), plain.timetable)
        # Said from the other end, it is the opposite, which no straight link can be.
        assert unmet(found.wishes, plain.labelled)
        turned = replace(found.wishes, directions={link.id: asked})
        assert bool(unmet(turned, plain.labelled)) == (len(path) > 2)


def test_a_place_that_cannot_be_kept_is_told_and_does_not_stop_the_drawing() -> None:
    result = draw(stations={"106": {"pin_from": {"station": "343-1", "dx_mm": 4000}}})
    assert [each.field for each in result.unmet] == ["stations.106.pin_from"]
    assert any("stations.106.pin_from" in text for text in result.edition.findings)
