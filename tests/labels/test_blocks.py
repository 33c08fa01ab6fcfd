"""Rows, second names and badges are set where a typesetter would set them."""

from __future__ import annotations

from dataclasses import replace

import pytest

from gtfs_schematic.labels.blocks import Align, Wording, set_block
from gtfs_schematic.labels.fonts import metrics, text_width_mm

NAME = Wording(
    rows=("Haupt", "Bahnhofsplatz"),
    second="",
    badges=(),
    bold=True,
    size_mm=3.0,
    badge_size_mm=2.0,
    badge_place="none",
    leading=1.2,
)


@pytest.mark.parametrize(("align", "share"), [("left", 0.0), ("center", 0.5), ("right", 1.0)])
def test_rows_are_aligned_and_led(align: Align, share: float):
    first, second = set_block(NAME, align).lines
    slack = text_width_mm("Bahnhofsplatz", 3.0, bold=True) - text_width_mm("Haupt", 3.0, bold=True)
    assert first.x_mm == pytest.approx(share * slack)
    assert second.x_mm == pytest.approx(0.0)
    assert second.y_mm - first.y_mm == pytest.approx(1.2 * 3.0)


def test_the_middle_is_that_of_capitals_and_last_baseline():
    block = set_block(NAME, "left")
    cap = 3.0 * metrics(bold=True).cap_height
    assert block.middle == pytest.approx((3.6 - cap) / 2.0)


def test_a_badge_behind_the_name_is_level_with_its_capitals():
    block = set_block(replace(NAME, badges=(("x", "7"),), badge_place="after"), "right")
    (badge,) = block.badges
    last = block.lines[-1]
    assert badge.x_mm > last.x_mm + last.width_mm
    assert badge.x_mm + badge.width_mm == pytest.approx(block.width)
    cap = metrics(bold=True).cap_height
    middle = last.y_mm - cap * last.size_mm / 2.0
    assert badge.y_mm + badge.height_mm / 2.0 == pytest.approx(middle)
    assert badge.text_y_mm - cap * badge.size_mm / 2.0 == pytest.approx(middle)
    text_width = text_width_mm("7", badge.size_mm, bold=True)
    assert badge.text_x_mm + text_width / 2.0 == pytest.approx(badge.x_mm + badge.width_mm / 2.0)


def test_more_than_four_badges_wrap_into_rows():
    badges = tuple((f"l{i}", str(i)) for i in range(9))
    block = set_block(replace(NAME, badges=badges, badge_place="beneath"), "left")
    heights = [round(badge.y_mm, 6) for badge in block.badges]
    assert [heights.count(y) for y in sorted(set(heights))] == [4, 4, 1]
    assert min(heights) > block.last_baseline
    assert block.foot == pytest.approx(max(b.y_mm + b.height_mm for b in block.badges))
    for a, b in zip(block.badges, block.badges[1:], strict=False):
        assert a.y_mm != b.y_mm or a.x_mm + a.width_mm < b.x_mm


def test_ink_is_inside_the_block():
    wording = replace(NAME, rows=("Ågård",), second="Ψηλή", badges=(("x", "N1"),))
    block = set_block(replace(wording, badge_place="beneath"), "center")
    assert block.ink_top < block.cap_top  # the ring on the A
    assert block.ink_bottom >= block.foot
    for line in block.lines:
        assert line.x_mm >= 0.0
        assert line.x_mm + line.width_mm <= block.width + 1e-9
