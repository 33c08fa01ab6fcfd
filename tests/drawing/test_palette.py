"""Lines get colours by which they can be told apart, and keep those that do."""

from __future__ import annotations

import itertools
from dataclasses import replace

import drawn_networks
import pytest
from coloraide import Color
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.drawing.contrast import contrast_ratio
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.palette import recolored
from gtfs_schematic.network.model import Network


def network(*colors: str, text: str = "#FFFFFF") -> Network:
    """Give a network of lines of these colours, the busiest first."""
    whole = drawn_networks.star().network
    lines = tuple(
        replace(whole.lines[0], id=f"{i:02}", name=f"N{i}", color=c, text_color=text, trips=900 - i)
        for i, c in enumerate(colors)
    )
    return replace(whole, lines=lines)


def colors(network: Network) -> list[str]:
    return [line.color for line in network.lines]


def least_difference(values: list[str]) -> float:
    """Give the least CIEDE2000 by another library."""
    pairs = itertools.combinations(map(Color, values), 2)
    return min(a.delta_e(b, method="2000") for a, b in pairs)


def test_colors_that_do_their_work_stay():
    before = network("#C23A3A", "#1C6E9E", "#2F7A4A")
    after = recolored(before, DrawingSettings())
    assert colors(after) == colors(before)
    assert all(line.color_from_feed for line in after.lines)


@pytest.mark.parametrize("background", ["#FFFFFF", "#14171A"])
def test_one_color_for_all_becomes_one_for_each(background: str):
    settings = DrawingSettings(background=background, ink="#808080")
    after = recolored(network(*["#7BC142"] * 22), settings)
    assert least_difference(colors(after)) > 6.0
    assert all(contrast_ratio(color, background) >= 3.0 for color in colors(after))
    assert not any(line.color_from_feed for line in after.lines)
    assert any("22 lines share" in f.message for f in after.findings)


def test_of_two_that_look_alike_the_busier_stays():
    after = recolored(network("#1C6E9E", "#C23A3A", "#1F73A6"), DrawingSettings())
    assert colors(after)[:2] == ["#1C6E9E", "#C23A3A"]
    assert least_difference(colors(after)) > 10.0


def test_a_family_stays_one_and_changes_together():
    alike = ("#1C6E9E", "#1C6E9E", "#1C6E9E", "#C23A3A", "#1F73A6", "#1F73A6", "#222222")
    after = colors(recolored(network(*alike), DrawingSettings()))
    assert after[:4] == list(alike[:4])
    assert after[4] == after[5] != alike[4]


def test_the_feed_is_kept_if_asked_for():
    before = network("#7BC142", "#7BC142", "#7CC242")
    assert colors(recolored(before, DrawingSettings(colors="feed"))) == colors(before)


def test_distinct_parts_families_and_what_one_kind_of_eye_confuses():
    before = network("#C23A3A", "#C23A3A", "#2F7A4A", "#6E5A1E")
    after = recolored(before, DrawingSettings(colors="distinct"))
    assert len(set(colors(after))) == 4
    seen = [Color(c).filter("deutan", method="machado").to_string(hex=True) for c in colors(after)]
    assert least_difference(seen) >= 5.0
    assert colors(after)[0] == "#C23A3A"


def test_a_line_mostly_keeps_its_color_when_another_comes():
    few = network(*["#7BC142"] * 20)
    more = network(*["#7BC142"] * 21)
    one, other = (colors(recolored(each, DrawingSettings())) for each in (few, more))
    assert sum(a == b for a, b in zip(one, other, strict=False)) >= 16


@given(st.integers(0, 0xFFFFFF).map("#{:06X}".format), st.integers(0, 0xFFFFFF))
def test_every_name_can_be_read_on_its_line(color: str, text: int):
    (line,) = recolored(network(color, text=f"#{text:06X}"), DrawingSettings()).lines
    assert contrast_ratio(line.text_color, line.color) >= 4.5


def test_colors_that_only_some_eyes_confuse_are_named():
    after = recolored(network("#D86018", "#008000", "#1C3E9E"), DrawingSettings())
    assert colors(after) == ["#D86018", "#008000", "#1C3E9E"]
    assert any("N0 and N1 may look alike" in f.message for f in after.findings)


def test_more_lines_than_colors_still_get_one():
    assert len(recolored(network(*["#7BC142"] * 400), DrawingSettings()).lines) == 400


def test_on_dark_paper_every_color_shows_and_on_light_paper_it_stays():
    dark = DrawingSettings(background="#14181D", ink="#F1F3F5", colors="feed")
    before = network("#23275F", "#C23A3A", "#FFE45C")
    after = recolored(before, dark)
    assert all(contrast_ratio(color, "#14181D") >= 3.0 for color in colors(after))
    assert colors(after)[1:] == colors(before)[1:]
    assert colors(recolored(before, DrawingSettings(colors="feed"))) == colors(before)
