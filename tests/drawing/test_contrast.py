"""Contrast follows WCAG 2.2; see https://www.w3.org/TR/WCAG22/#dfn-contrast-ratio."""

from __future__ import annotations

import math
from dataclasses import replace

import drawn_networks
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.drawing.contrast import (
    contrast_findings,
    contrast_ratio,
    mix,
    relative_luminance,
)

COLORS = st.integers(0, 0xFFFFFF).map("#{:06X}".format)


@pytest.mark.parametrize(
    ("first", "second", "ratio"),
    [
        # The ends of the scale follow from the definition: (1 + 0.05) / (0 + 0.05).
        ("#000000", "#FFFFFF", 21.0),
        # The palest grey that passes 4.5:1 on white, and the next that fails: from memory.
        ("#767676", "#FFFFFF", 4.54),
        ("#777777", "#FFFFFF", 4.48),
        # Widely published values for pure red and blue on white: from memory.
        ("#FF0000", "#FFFFFF", 4.00),
        ("#0000FF", "#FFFFFF", 8.59),
    ],
)
def test_published_ratios(first: str, second: str, ratio: float):
    assert contrast_ratio(first, second) == pytest.approx(ratio, abs=0.005)


def test_luminance_of_primaries_are_the_published_weights():
    weights = [relative_luminance(c) for c in ("#FF0000", "#00FF00", "#0000FF")]
    assert weights == pytest.approx([0.2126, 0.7152, 0.0722])


@given(COLORS, COLORS)
def test_ratio_is_symmetric_and_bounded(first: str, second: str):
    ratio = contrast_ratio(first, second)
    assert ratio == contrast_ratio(second, first)
    assert 1.0 <= ratio <= 21.0 + 1e-9


@given(COLORS)
def test_black_or_white_always_reads_on_a_color(color: str):
    # The product of both ratios is 21, so the better one is at least its root, 4.58.
    black, white = contrast_ratio(color, "#000000"), contrast_ratio(color, "#FFFFFF")
    assert black * white == pytest.approx(21.0)
    assert max(black, white) >= math.sqrt(21.0) - 1e-9


@given(COLORS, COLORS)
def test_mixing_nothing_or_everything_gives_the_ends(color: str, other: str):
    assert mix(color, other, 0.0) == color
    assert mix(color, other, 1.0) == other


def test_findings_name_pale_lines_and_pale_names():
    network = drawn_networks.star().network
    assert contrast_findings(replace(network, lines=network.lines[:1]), "#FFFFFF") == ()
    pale = replace(network.lines[0], color="#FFE45C", text_color="#FFFFFF")
    found = contrast_findings(replace(network, lines=(pale,)), "#FFFFFF")
    assert [(f.line_id, f.part, f.minimum) for f in found] == [
        ("A", "line", 3.0),
        ("A", "text", 4.5),
    ]
    assert "below 3:1" in found[0].message


def test_a_ratio_is_never_rounded_up_to_the_limit():
    network = drawn_networks.star().network
    grey = replace(network.lines[0], color="#777777", text_color="#FFFFFF")
    (finding,) = contrast_findings(replace(network, lines=(grey,)), "#FFFFFF")
    assert finding.part == "text"
    assert "4.47:1" in finding.message
