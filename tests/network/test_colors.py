"""Colors of lines are visible, distinct and the operator's where it gave any."""

from __future__ import annotations

import itertools
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.network.colors import (
    _from_oklab,
    _oklab,
    contrast,
    generated_colors,
    is_usable,
    luminance,
    text_color_on,
)

hex_colors = st.integers(0, 0xFFFFFF).map(lambda value: f"#{value:06X}")


@pytest.mark.parametrize(
    ("color", "on_white"),
    [
        # The formula of WCAG 2.2 ("relative luminance", "contrast ratio"), worked by hand.
        ("#000000", 21.0),
        ("#767676", 4.5422),
        ("#777777", 4.4781),
        ("#FF0000", 3.9985),
        ("#0000FF", 8.5925),
        ("#FFFF00", 1.0738),
    ],
)
def test_contrast_is_that_of_wcag(color, on_white):
    assert contrast(color, "#FFFFFF") == pytest.approx(on_white, abs=5e-5)
    assert contrast("#FFFFFF", color) == contrast(color, "#FFFFFF")


def test_luminance_of_the_primaries_adds_up_to_white():
    parts = [luminance(color) for color in ("#FF0000", "#00FF00", "#0000FF")]
    assert parts == pytest.approx([0.2126, 0.7152, 0.0722])


@given(hex_colors)
def test_oklab_there_and_back(color):
    assert _from_oklab(_oklab(color)) == color


def test_oklab_of_red():
    # CSS Color 4 gives red as oklch(62.796% 0.25768 29.234); from memory.
    lightness, a, b = _oklab("#FF0000")
    assert lightness == pytest.approx(0.62796, abs=1e-4)
    assert math.hypot(a, b) == pytest.approx(0.25768, abs=1e-4)
    assert math.degrees(math.atan2(b, a)) == pytest.approx(29.234, abs=0.02)


@given(hex_colors, st.none() | hex_colors)
def test_text_can_be_read_on_every_color(color, wanted):
    text = text_color_on(color, wanted)
    if text == wanted:
        assert contrast(color, text) >= 3.0
    else:
        # Black or white has at least the square root of 21 on any color.
        assert contrast(color, text) >= math.sqrt(21.0) - 1e-9


@given(
    st.lists(st.text(max_size=4), min_size=1, max_size=30, unique=True),
    st.lists(hex_colors, max_size=6),
)
def test_generated_colors_show_on_white_and_do_not_hang_on_order(line_ids, taken):
    given_colors = generated_colors(line_ids, taken)
    assert set(given_colors) == set(line_ids)
    assert all(contrast(color, "#FFFFFF") >= 3.0 for color in given_colors.values())
    assert generated_colors(line_ids[::-1], taken[::-1]) == given_colors


def test_a_dozen_generated_colors_are_distinct():
    colors = generated_colors([f"line {n}" for n in range(12)], ["#C23A3A", "#1C6E9E"])
    every = [*colors.values(), "#C23A3A", "#1C6E9E"]
    gaps = [
        math.dist(_oklab(one), _oklab(other)) for one, other in itertools.combinations(every, 2)
    ]
    assert min(gaps) >= 0.06


@pytest.mark.parametrize("color", [None, "#FFFFFF", "#F4F4F4"])
def test_white_and_nothing_are_replaced(town, color):
    network = (
        town.row("AB").route("r", color=color, text_color="#FFFFFF").both("r", "A B").network()
    )
    (line,) = network.lines
    assert not line.color_from_feed
    assert contrast(line.color, "#FFFFFF") >= 3.0
    assert contrast(line.color, line.text_color) >= 3.0
    assert any(finding.field == "route_color" for finding in network.findings)


def test_a_bright_color_stays_with_a_warning(town):
    assert is_usable("#FFFF00")
    network = (
        town.row("AB").route("r", color="#FFFF00", text_color="#FFFFFF").both("r", "A B").network()
    )
    (line,) = network.lines
    assert line.color == "#FFFF00"
    assert line.text_color == "#000000"
    assert [finding.severity for finding in network.findings] == ["warning"]


def test_a_readable_pair_stays(town):
    network = (
        town.row("AB").route("r", color="#224488", text_color="#FFEE00").both("r", "A B").network()
    )
    assert network.lines[0].text_color == "#FFEE00"
    assert network.findings == ()
