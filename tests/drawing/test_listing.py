"""The description in words says the same as the network."""

from __future__ import annotations

import re
from dataclasses import replace

import drawn_networks
import pytest

from gtfs_schematic.drawing.listing import to_text
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.words import how_often
from gtfs_schematic.network.model import Network, PeriodService

SETTINGS = DrawingSettings()


@pytest.fixture(params=sorted(drawn_networks.ALL))
def network(request) -> Network:
    return drawn_networks.ALL[request.param]().network


def sections(network: Network) -> dict[str, list[str]]:
    """Give the rows under each heading in capitals."""
    found: dict[str, list[str]] = {"": []}
    current = ""
    for row in to_text(network, SETTINGS).decode().splitlines():
        if re.match("(LINE|STATIONS|NOTES)", row):
            current = row
            found[current] = []
        elif row:
            found[current].append(row)
    return found


def test_every_line_lists_its_calls_in_order(network: Network):
    text = sections(network)
    for line in network.lines:
        rows = next(rows for head, rows in text.items() if head.startswith(f"LINE {line.name}:"))
        said = [row.split(". ", 1)[1].split(":")[0] for row in rows if re.match(r"\d+\. ", row)]
        calls = sorted(line.itineraries, key=lambda c: (-len(c), c))
        wanted = [
            network.station[key].name for c in calls for key in (c[:-1] if c[0] == c[-1] else c)
        ]
        assert said == wanted


def test_every_station_is_listed_once_with_its_lines(network: Network):
    rows = sections(network)["STATIONS"]
    assert len(rows) == len(network.stations)
    for station in network.stations:
        (row,) = [row for row in rows if row.startswith(f"{station.name}:")]
        for key in station.lines:
            assert re.search(rf"\b{network.line[key].name}\b", row)


def test_walks_are_told_at_both_ends():
    network = drawn_networks.walk_and_crossing().network
    (walk,) = network.walks
    rows = sections(network)["STATIONS"]
    for here, there in ((walk.start, walk.end), (walk.end, walk.start)):
        name, other = network.station[here].name, network.station[there].name
        assert any(row.startswith(name) and f"walk to {other}, 3 min" in row for row in rows)


def test_cautions_and_date_are_there(network: Network):
    text = to_text(network, SETTINGS).decode()
    assert "not to scale" in text
    assert "Service of Wednesday 2026-03-11" in text


def test_a_name_can_neither_break_a_row_nor_turn_it_round():
    whole = drawn_networks.star().network
    first = replace(whole.stations[0], name="A\nLINE X: \u202egnirts\x1b[31m")
    network = replace(whole, stations=(first, *whole.stations[1:]))
    rows = to_text(network, SETTINGS).decode().splitlines()
    assert not any(row.startswith("LINE X") for row in rows)
    assert not any("\u202e" in row or "\x1b" in row for row in rows)


def test_how_often_is_said_of_midday():
    line = drawn_networks.star().network.lines[0]
    assert how_often(line) == "every 10 min"
    by_day = replace(line, periods=(PeriodService("midday", 30, 450),))
    assert how_often(by_day) == "every 8 min"
    assert how_often(replace(line, headway_s=None)) == ""
