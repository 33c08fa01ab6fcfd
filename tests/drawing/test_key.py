"""The key lists what the sheet shows, and nothing else, in an order a rider expects."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import drawn_networks
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.drawing.key import key_below, key_beside, key_rows, used_signs
from gtfs_schematic.drawing.model import Drawing, DrawingSettings, Group, TextShape
from gtfs_schematic.drawing.style import type_scale
from gtfs_schematic.drawing.words import line_course, natural, subtitle, validity, walk_title, wrap
from gtfs_schematic.labels.fonts import text_width_mm
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.network.model import Network

SETTINGS = DrawingSettings()
TYPE = type_scale(420.0, 297.0)


def varied() -> Network:
    """Give a network whose lines differ in mode and service."""
    network = drawn_networks.ribbon().network
    changes = [
        {"name": "10", "mode": "bus", "service": "night"},
        {"name": "9", "mode": "bus", "one_way_links": (("m1", "m2"),)},
        {"name": "Uferschnellverbindung", "mode": "ferry", "service": "some-days"},
        {"name": "U1", "mode": "metro", "service": "peak"},
    ]
    lines = tuple(
        replace(*pair[:1], **pair[1]) for pair in zip(network.lines, changes, strict=True)
    )
    return replace(network, lines=lines)


def texts(group: Group) -> Iterator[str]:
    for child in group.children:
        if isinstance(child, TextShape):
            yield child.text
        elif isinstance(child, Group):
            yield from texts(child)


def test_every_line_has_a_row_and_its_name(drawing: Drawing, labelled: LabelledLayout):
    (key,) = (group for group in drawing.groups if group.css_class == "key")
    rows = [child for child in key.children if isinstance(child, Group)]
    lines = [row.data["for-line"] for row in rows if "for-line" in row.data]
    network = labelled.bundled.layout.network
    assert sorted(lines) == [line.id for line in network.lines]
    for row in rows:
        if "for-line" in row.data:
            assert network.line[row.data["for-line"]].name in list(texts(row))


def test_lines_stand_by_mode_and_natural_name_with_their_service():
    rows = key_rows(varied(), SETTINGS, TYPE)
    said = [" ".join(row.bold_text) or row.name for row in rows]
    assert said[: said.index("Signs")] == [
        "Metro", "U1", "Bus", "9", "10", "Ferry", "Uferschnellverbindung",
    ]  # fmt: skip
    notes = {row.name or row.bold_text[0]: " ".join(row.text) for row in rows if row.kind == "line"}
    assert notes["10"].endswith("nights only, every 10 min")
    assert notes["U1"].endswith("peak hours only, every 10 min")
    assert notes["9"] == "Line 2, every 10 min"


def test_the_key_explains_the_signs_in_use_and_no_others():
    plain = drawn_networks.star().network
    assert used_signs(plain, SETTINGS) == ("stop", "interchange", "terminus")
    assert "walk" in used_signs(drawn_networks.walk_and_crossing().network, SETTINGS)
    assert set(used_signs(varied(), SETTINGS)) >= {"one-way", "peak", "night"}
    free = replace(plain, stations=tuple(replace(s, boarding="yes") for s in plain.stations))
    assert "step-free" not in used_signs(free, SETTINGS)
    assert "step-free" in used_signs(free, DrawingSettings(show_step_free=True))


@given(st.floats(1.0, 1500.0), st.booleans())
def test_rows_keep_their_order_and_do_not_overlap(limit: float, beside: bool):  # noqa: FBT001
    make = key_beside if beside else key_below
    key = make(varied(), SETTINGS, TYPE, limit)
    assert [placed.row for placed in key.rows] == list(key_rows(varied(), SETTINGS, TYPE))
    columns: dict[float, float] = {}
    for placed in key.rows:
        assert placed.y >= columns.get(placed.x, 0.0) - 1e-9
        columns[placed.x] = placed.y + placed.row.height
    assert max(columns.values()) == pytest.approx(key.height)
    last = {placed.x: placed.row.kind for placed in key.rows}
    assert "heading" not in last.values()
    if beside and limit > 30.0:
        assert key.height <= limit + 1e-6
    if not beside and limit > 150.0:
        assert key.width <= limit + 1e-6


@given(st.text("ab cde", max_size=60), st.floats(5.0, 60.0))
def test_wrapping_keeps_letters_and_width(text: str, width: float):
    lines = wrap(text, width, 3.0)
    assert "".join(lines).replace(" ", "") == text.replace(" ", "")
    assert all(text_width_mm(line, 3.0) <= width for line in lines)
    if all(text_width_mm(word, 3.0) <= width for word in text.split()):
        assert " ".join(lines).split() == text.split()


def test_a_line_never_begins_with_a_dash():
    lines = wrap("Krähenwald – Auenbruck – Neustift", 20.0, 3.0)
    assert lines == ("Krähenwald –", "Auenbruck –", "Neustift")


def test_natural_order_counts():
    assert sorted(["10", "2", "1A", "S1", "1"], key=natural) == ["1", "1A", "2", "10", "S1"]


def test_dates_are_an_iso_8601_interval():
    network = drawn_networks.star().network
    assert validity(network) == "Valid 2026-03-01/2026-06-30"
    open_end = replace(network, info=replace(network.info, end_date=""))
    assert validity(open_end) == "Valid from 2026-03-01"
    unknown = replace(network.info, start_date="", end_date="", version="", service_date="")
    assert subtitle(replace(network, info=unknown)) == "Data: Verkehrsbund Wiesmarn-Mitte"


def test_courses_name_ends_branches_and_rings():
    star, ring = drawn_networks.star().network, drawn_networks.ring().network
    assert line_course(star.line["B"], star) == "Dornau – Lohe / Moorende Gewerbepark"
    assert line_course(ring.line["R"], ring) == "Ring by Nordring"


def test_a_walk_is_never_said_to_be_shorter_than_it_is():
    network = drawn_networks.walk_and_crossing().network
    walk = replace(network.walks[0], time_s=181)
    assert walk_title(walk, network) == "Walk Krone – Passage, 4 min"
