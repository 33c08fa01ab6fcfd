"""Pages are those of ISO 216, and leave the network its room."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import drawn_networks
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError

from gtfs_schematic.drawing.model import SHEET_SIZES, DrawingSettings, SheetSettings
from gtfs_schematic.drawing.page import plan_of_frame
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.errors import UsageError
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.network.model import Network

SETTINGS = DrawingSettings()


def test_sizes_are_those_of_iso_216():
    # ISO 216:2007, main series A, from memory; the doubles come from DIN 476.
    assert dict(SHEET_SIZES) == {
        "4A0": (1682, 2378),
        "2A0": (1189, 1682),
        "A0": (841, 1189),
        "A1": (594, 841),
        "A2": (420, 594),
        "A3": (297, 420),
        "A4": (210, 297),
        "A5": (148, 210),
    }


def test_each_size_is_half_the_next_and_all_have_the_shape_of_root_two():
    sizes = list(SHEET_SIZES.values())
    for (short, long), (next_short, next_long) in itertools.pairwise(sizes):
        assert next_short == long
        assert next_long // 2 == short
    for short, long in sizes:
        assert long / short == pytest.approx(math.sqrt(2.0), rel=0.005)
    assert math.prod(SHEET_SIZES["A0"]) == pytest.approx(1_000_000, rel=0.0001)


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_automatic_pages_rise_and_hold_everything(name: str):
    network = drawn_networks.ALL[name]().network
    frames = candidate_frames(network, SheetSettings(), SETTINGS)
    areas = [frame.width_mm * frame.height_mm for frame in frames]
    assert areas == sorted(areas)
    assert areas[-1] == 1682 * 2378
    for frame in frames:
        assert sorted((frame.width_mm, frame.height_mm)) in map(list, SHEET_SIZES.values())
        _holds_everything(network, frame)


def _holds_everything(network: Network, frame: SheetFrame) -> None:
    page = plan_of_frame(network, SETTINGS, frame)
    assert page.frame == frame
    (x, y), key = page.key_at, page.key
    margin = frame.left_mm
    assert x >= margin - 1e-6
    assert x + key.width <= frame.width_mm - margin + 1e-6
    assert y >= page.subtitle.at[1]
    assert y + key.height <= page.rule_y
    apart = x >= frame.right_mm or y >= frame.bottom_mm
    assert apart
    last = max(block.at[1] + 1.3 * page.type.body * (len(block.lines) - 1) for block in page.notes)
    assert page.rule_y < min(block.at[1] for block in page.notes)
    assert last <= frame.height_mm - margin


def test_a_page_comes_with_its_key_beside_and_below():
    sheet = SheetSettings(size="A2", orientation="landscape")
    frames = candidate_frames(drawn_networks.star().network, sheet, SETTINGS)
    assert len(frames) == 2
    beside, below = sorted(frames, key=lambda frame: frame.right_mm)
    assert beside.right_mm < below.right_mm
    assert beside.bottom_mm > below.bottom_mm


def test_an_oblong_network_gets_oblong_pages_and_an_upright_one_upright():
    network = drawn_networks.star().network
    wide = replace(
        network,
        stations=tuple(replace(s, lat=50.0 + (s.lat - 50.0) * 0.2) for s in network.stations),
    )
    tall = replace(
        network,
        stations=tuple(replace(s, lon=11.0 + (s.lon - 11.0) * 0.2) for s in network.stations),
    )
    sheet = SheetSettings()
    assert all(f.width_mm > f.height_mm for f in candidate_frames(wide, sheet, SETTINGS))
    assert all(f.width_mm < f.height_mm for f in candidate_frames(tall, sheet, SETTINGS))


@pytest.mark.parametrize("orientation", ["portrait", "landscape"])
def test_an_orientation_that_was_asked_for_is_kept(orientation: str):
    sheet = SheetSettings.model_validate({"size": "a3", "orientation": orientation})
    frames = candidate_frames(drawn_networks.ring().network, sheet, SETTINGS)
    expected = (297, 420) if orientation == "portrait" else (420, 297)
    assert {(frame.width_mm, frame.height_mm) for frame in frames} == {expected}


@given(st.integers(200, 2000), st.integers(200, 2000), st.integers(0, 20))
def test_a_free_size_is_taken_as_given(width: int, height: int, margin: int):
    sheet = SheetSettings(size=f"{width}x{height}", margin_mm=float(margin))
    network = drawn_networks.star().network
    frames = candidate_frames(network, sheet, SETTINGS)
    assert frames
    for frame in frames:
        assert (frame.width_mm, frame.height_mm, frame.left_mm) == (width, height, margin)
        _holds_everything(network, frame)


@pytest.mark.parametrize("size", ["A9", "letterish", "10x10", "300x", "1x2x3", "-300x200", "infx9"])
def test_no_size_is_refused_with_what_is_one(size: str):
    with pytest.raises(ValidationError, match="A5, A4, A3"):
        SheetSettings(size=size)


def test_a_page_too_small_for_its_key_says_so():
    network = drawn_networks.star().network
    many = tuple(
        replace(network.lines[0], id=f"L{i:03}", name=str(i), long_name=f"Nach Hinterwald {i}")
        for i in range(120)
    )
    with pytest.raises(UsageError, match="120 lines"):
        candidate_frames(replace(network, lines=many), SheetSettings(size="A5"), SETTINGS)
