"""Adjustments change what they name, keep the network sound, and are never dropped."""

from __future__ import annotations

import re
import tomllib
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic import pipeline
from gtfs_schematic.drawing.contrast import contrast_ratio
from gtfs_schematic.edition.adjusted import Adjusted, abbreviated, adjusted
from gtfs_schematic.edition.adjustments import adjustments_from_toml, adjustments_of, plain
from gtfs_schematic.errors import UsageError
from gtfs_schematic.network.check import faults

ROOT = Path(__file__).parents[2]
TIMETABLE, NETWORK = pipeline.inspect(ROOT / "data" / "before.zip")


def apply(**values: object) -> Adjusted:
    result = adjusted(NETWORK, adjustments_of(values, "test"), TIMETABLE)
    assert faults(result.network) == ()
    return result


def test_the_example_of_the_readme_holds():
    text = (ROOT / "README.md").read_text("utf-8")
    (example,) = re.findall(r"```toml\n(.*?)```", text, re.DOTALL)
    said = adjustments_from_toml(example.encode(), "README.md")
    result = adjusted(NETWORK, said, TIMETABLE)
    assert faults(result.network) == ()
    assert result.stale == ()
    assert result.network.station["183"].name == "Mulgavé Hall"
    assert any(station.name.startswith("Univ.") for station in result.network.stations)
    assert {"335-1", "332-1"}.isdisjoint(result.network.station)
    assert "152-B1" in result.network.station
    assert plain(said) == tomllib.loads(example)


def test_no_adjustment_changes_nothing():
    assert apply().network == NETWORK


def test_names_and_colors():
    result = apply(
        stations={"183": {"name": "Mulg", "label_side": "S", "pin_mm": [100, 80]}},
        lines={"m1": {"name": "One", "color": "#102030"}, "m2": {"text_color": "#ABCDEF"}},
    )
    network = result.network
    assert network.station["183"].name == "Mulg"
    assert network.line["m1"].name == "One"
    assert network.line["m1"].color == "#102030"
    assert contrast_ratio(network.line["m1"].text_color, "#102030") > 4.5  # WCAG 2.2, 1.4.3
    assert network.line["m2"].text_color == "#ABCDEF"
    assert result.wishes.sides == {"183": "S"}
    assert result.wishes.pins == {"183": (100.0, 80.0)}
    assert result.stale == ()


def test_keys_may_be_stops_and_routes():
    station = next(s for s in NETWORK.stations if len(s.stop_ids) > 1)
    other = next(stop for stop in station.stop_ids if stop != station.id)
    result = apply(stations={other: {"name": "Elsewhere"}})
    assert result.network.station[station.id].name == "Elsewhere"


def test_a_hidden_station_is_passed():
    before = next(k for k in NETWORK.lines if len(k.itineraries[0]) > 4).itineraries[0]
    key = before[2]
    network = apply(stations={key: {"hide": True, "note": "not yet open"}}).network
    assert key not in network.station
    assert frozenset((before[1], before[3])) in network.link_between
    told = {(o.kind, o.id, o.reason) for o in network.left_out}
    assert ("station", key, "hidden by an adjustment: not yet open") in told


def test_a_hidden_line_takes_its_own_stations_along():
    network = apply(lines={"b9": {"hide": True}}).network
    assert "b9" not in network.line
    own = {s.id for s in NETWORK.stations if s.lines == ("b9",)}
    assert own
    assert set(NETWORK.station) - set(network.station) == own


def test_merged_stations_are_one():
    link = next(k for k in NETWORK.links if NETWORK.station[k.start].lines)
    ids = [link.end, link.start]
    result = apply(
        merge=[{"stations": ids, "name": "Both"}], stations={link.end: {"pin_mm": [1, 2]}}
    )
    network = result.network
    assert len(network.stations) == len(NETWORK.stations) - 1
    whole = network.station[link.start]
    assert whole.name == "Both"
    assert set(whole.stop_ids) == {s for key in ids for s in NETWORK.station[key].stop_ids}
    assert result.wishes.pins == {link.start: (1.0, 2.0)}
    assert sum(k.trips for k in network.lines) == sum(k.trips for k in NETWORK.lines)


def test_a_split_station_is_two_and_every_line_calls_at_its_own():
    station = NETWORK.station["152"]
    bus = tuple(stop for stop in station.stop_ids if "-B" in stop)
    rest = tuple(stop for stop in station.stop_ids if "-B" not in stop)
    parts = [{"stops": list(rest)}, {"stops": list(bus), "name": "Bus stand"}]
    network = apply(
        split=[{"station": "152", "parts": parts}], stations={bus[0]: {"label_side": "N"}}
    ).network
    stand = network.station[min(bus)]
    assert (stand.name, stand.stop_ids, stand.lines) == ("Bus stand", bus, ("b9",))
    assert "b9" not in network.station["152"].lines
    assert set(station.lines) == {*stand.lines, *network.station["152"].lines}
    stops = {stop.id: stop for stop in TIMETABLE.stops}
    assert stand.lon == pytest.approx(sum(stops[s].lon for s in bus) / len(bus))


def test_what_no_longer_applies_is_told():
    result = apply(
        stations={"gone": {"name": "X"}},
        lines={"zz": {"hide": True}},
        merge=[{"stations": ["gone", "183"]}],
        split=[{"station": "152", "parts": [{"stops": ["152"]}, {"stops": ["none"]}]}],
    )
    assert replace(result.network, left_out=NETWORK.left_out) == NETWORK
    assert sum(o.kind == "adjustment" for o in result.network.left_out) == 4
    assert sorted(told.split(":")[0] for told in result.stale) == [
        "lines.zz", "merge gone 183", "split 152", "stations.gone",
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("values", "both"),
    [
        (
            {"stations": {"152": {"name": "A"}, "152-B1": {"name": "B"}}},
            ("stations.152.name", "stations.152-B1.name"),
        ),
        (
            {"stations": {"152": {"hide": True, "pin_mm": [1, 1]}}},
            ("stations.152.hide", "stations.152.pin_mm"),
        ),
        (
            {"stations": {"152": {"pin_mm": [1, 1]}, "183": {"pin_mm": [1, 1]}}},
            ("stations.152.pin_mm", "stations.183.pin_mm"),
        ),
        (
            {
                "stations": {"152": {"pin_mm": [1, 1]}, "183": {"pin_mm": [2, 1]}},
                "merge": [{"stations": ["152", "183"]}],
            },
            ("stations.152.pin_mm", "stations.183.pin_mm"),
        ),
    ],
)
def test_contradictions_name_both(values, both):
    with pytest.raises(UsageError) as caught:
        apply(**values)
    assert all(name in str(caught.value) for name in both)


def test_nothing_left_is_an_error():
    with pytest.raises(UsageError, match="nothing is left to draw"):
        apply(lines={line.id: {"hide": True} for line in NETWORK.lines})


def test_abbreviations_stand_for_whole_words():
    words = {"Street": "St", "North Street": "N St", "Saint": ""}
    assert abbreviated("North Street and Streetham", words) == "N St and Streetham"
    assert abbreviated("Saint", words) == "Saint"
    assert abbreviated("Mill Street", words) == "Mill St"


@given(st.data())
@settings(max_examples=40)
def test_any_mixture_leaves_a_sound_network(data):
    ids = st.sampled_from([s.id for s in NETWORK.stations])
    merged = data.draw(st.lists(ids, unique=True, max_size=6))
    hidden = data.draw(st.lists(ids, unique=True, max_size=6))
    lines = data.draw(st.lists(st.sampled_from([k.id for k in NETWORK.lines]), max_size=4))
    groups = [merged[i : i + 2] for i in range(0, len(merged) - 1, 2)]
    result = apply(
        merge=[{"stations": group} for group in groups],
        stations={key: {"hide": True} for key in hidden},
        lines={key: {"hide": True} for key in lines},
    )
    assert not set(lines) & set(result.network.line)
    assert result.stale == ()


def ends_of(line: str, station: str) -> list[tuple[str, str]]:
    courses = NETWORK.line[line].courses
    return [
        (a, b)
        for course in courses
        for a, here, b in zip(course, course[1:], course[2:], strict=False)
        if here == station
    ]


def test_grouped_lines_are_one_that_runs_as_often():
    ids = ["t6", "t5"]
    result = apply(
        group=[{"lines": ids, "name": "T", "color": "#102030"}], lines={"t6": {"note": "one"}}
    )
    line = result.network.line["t5"]
    assert "t6" not in result.network.line
    assert (line.name, line.color) == ("T", "#102030")
    old = [NETWORK.line[key] for key in ids]
    assert line.trips == sum(each.trips for each in old)
    assert set(line.route_ids) == {route for each in old for route in each.route_ids}
    links = {k.id for k in NETWORK.links if set(ids) & set(k.lines)}
    assert {k.id for k in result.network.links if "t5" in k.lines} == links
    assert line.first_departure_s == min(each.first_departure_s for each in old)
    assert sum(period.trips for period in line.periods) <= line.trips
    assert result.stale == ()


def test_wishes_are_by_ids_of_the_network():
    link = next(k for k in NETWORK.links if len(k.lines) > 2)
    first, second, third = link.lines[:3]
    line = NETWORK.links[0].lines[0]
    station = next(
        s.id for s in NETWORK.stations if line in s.lines and len(ends_of(line, s.id)) > 0
    )
    platform = NETWORK.station[link.end].stop_ids[-1]
    result = apply(
        stations={
            station: {"straight": [line], "label_angle": 0, "short_name": "S"},
            link.start: {"pin_from": {"station": platform, "dy_mm": 0}},
        },
        links=[{"between": [platform, link.start], "order": [third, first], "direction": "E"}],
    )
    wishes = result.wishes
    assert wishes.straights == {station: (line,)}
    assert wishes.angles == {station: 0}
    assert wishes.short_names == {station: "S"}
    assert wishes.pins_from == {link.start: (link.end, None, 0.0)}
    # Said from the link's end: seen from its start all is the other way round.
    assert wishes.orders == {link.id: (first, third)}
    assert wishes.directions == {link.id: "W"}
    assert result.stale == ()
    assert second not in wishes.orders[link.id]


def test_wishes_that_apply_to_nothing_are_told():
    link = NETWORK.links[0]
    stranger = next(k.id for k in NETWORK.lines if k.id not in link.lines)
    far = next(s.id for s in NETWORK.stations if frozenset((s.id, link.start)) not in
               NETWORK.link_between and s.id != link.start)  # fmt: skip
    result = apply(
        stations={link.start: {"straight": [stranger], "pin_from": {"station": "x", "dx_mm": 1}}},
        links=[
            {"between": [link.start, link.end], "order": [stranger, link.lines[0]]},
            {"between": [link.start, far], "direction": "E"},
        ],
        group=[{"lines": ["zz", link.lines[0]]}],
    )
    assert (result.wishes.straights, result.wishes.orders) == ({}, {})
    assert len(result.stale) == 5
    assert replace(result.network, left_out=NETWORK.left_out) == NETWORK


A, B, C = next(
    (a, s.id, b) for k in NETWORK.lines for s in NETWORK.stations for a, b in ends_of(k.id, s.id)
)
THROUGH = next(k.id for k in NETWORK.lines if ends_of(k.id, B))


@pytest.mark.parametrize(
    ("values", "both"),
    [
        (
            {
                "stations": {A: {"pin_mm": [10, 10]}, B: {"pin_mm": [20, 10]}},
                "links": [{"between": [A, B], "direction": "N"}],
            },
            ("links.0.direction", f"stations.{A}.pin_mm"),
        ),
        (
            {
                "stations": {A: {"pin_from": {"station": B, "dx_mm": 5}}},
                "links": [{"between": [A, B], "direction": "E"}],
            },
            ("links.0.direction", f"stations.{A}.pin_from"),
        ),
        (
            {
                "stations": {
                    A: {"pin_from": {"station": B, "dx_mm": 5}},
                    B: {"pin_from": {"station": A, "dy_mm": 5}},
                },
            },
            (f"stations.{A}.pin_from", f"stations.{B}.pin_from"),
        ),
        (
            {
                "stations": {B: {"straight": [THROUGH]}},
                "links": [
                    {"between": [A, B], "direction": "E"},
                    {"between": [B, C], "direction": "S"},
                ],
            },
            (f"stations.{B}.straight", "links.0.direction", "links.1.direction"),
        ),
        (
            {"lines": {"t6": {"hide": True}}, "group": [{"lines": ["t5", "t6"]}]},
            ("group.0", "lines.t6.hide"),
        ),
        (
            {
                "stations": {
                    NETWORK.station["152"].stop_ids[0]: {"pin_mm": [1, 2]},
                    NETWORK.station["152"].stop_ids[1]: {
                        "pin_from": {"station": "183", "dx_mm": 1}
                    },
                }
            },
            ("pin_mm", "pin_from", "152"),
        ),
    ],
)  # fmt: skip
def test_wishes_that_cannot_all_be_met_name_both(values, both):
    with pytest.raises(UsageError) as caught:
        apply(**values)
    assert all(name in str(caught.value) for name in both)
