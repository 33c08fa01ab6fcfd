"""The criteria of the hill climb give the values that their formulas give by hand."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from layout_criteria import (
    Drawing,
    angular_resolution,
    balanced_edge_length,
    crossings,
    edge_length,
    octilinearity,
    straightness,
)


def star(*bearings_deg: float, length: float = 1.0) -> Drawing:
    """Make links of one length that leave one station at these bearings."""
    links = [f"k{i}" for i in range(len(bearings_deg))]
    tips = [
        (length * math.cos(math.radians(b)), length * math.sin(math.radians(b)))
        for b in bearings_deg
    ]
    return Drawing(
        {link: ("C", f"s{i}") for i, link in enumerate(links)},
        {link: ((0.0, 0.0), tip) for link, tip in zip(links, tips, strict=True)},
        [("C", links[0], links[1])] if len(links) > 1 else [],
    )


@pytest.mark.parametrize(
    ("bearings", "value"),
    [
        ((0, 90, 180, 270), 0.0),
        ((30, 150, 270), 0.0),
        ((0, 90, 180), 2 * math.pi / 3),  # gaps 90, 90, 180 against 120 each
        ((0, 90), math.pi),  # 90 and 270 against 180
        ((0, 45, 180, 225), math.pi),  # 45, 135, 45, 135 against 90
        ((77,), 0.0),
    ],
)
def test_angular_resolution(bearings: tuple[float, ...], value: float):
    assert angular_resolution(star(*bearings)) == pytest.approx(value, abs=1e-12)


@pytest.mark.parametrize(
    ("bearing", "value"),
    [(0, 0), (5, 0.342020), (10, 0.642788), (15, 0.866025), (22.5, 1), (45, 0), (90, 0)],
)
def test_octilinearity(bearing: float, value: float):
    assert octilinearity(star(bearing)) == pytest.approx(value, abs=1e-6)
    assert octilinearity(star(-bearing)) == pytest.approx(value, abs=1e-6)


def test_edge_length_counts_too_long_and_too_short_alike():
    assert edge_length(star(0, 90, length=1.5), 1.0) == pytest.approx(1.0)
    assert edge_length(star(0, 90, length=0.5), 1.0) == pytest.approx(1.0)


def test_balance_looks_at_stations_with_two_links_only():
    long = {"k0": ((0.0, 0.0), (3.0, 0.0)), "k1": ((0.0, 0.0), (0.0, 1.0))}
    pair = Drawing({"k0": ("C", "A"), "k1": ("C", "B")}, long, [])
    assert balanced_edge_length(pair, 1.0) == pytest.approx(2.0)
    assert balanced_edge_length(pair, 2.0) == pytest.approx(1.0)
    three = Drawing({**pair.ends, "k2": ("C", "D")}, {**long, "k2": ((0.0, 0.0), (0.0, -9.0))}, [])
    assert balanced_edge_length(three, 1.0) == 0.0


@given(st.floats(1.0, 179.0))
def test_a_turn_at_a_station_and_one_between_stations_cost_the_same(turn: float):
    at_station = star(180, turn)
    (_, first), (_, second) = at_station.paths["k0"], at_station.paths["k1"]
    between = Drawing({"k": ("A", "B")}, {"k": (first, (0.0, 0.0), second)}, [])
    assert straightness(at_station, {"k0": 1, "k1": 1}) == pytest.approx(math.radians(turn))
    assert straightness(between, {"k": 1}) == pytest.approx(math.radians(turn))
    assert straightness(between, {"k": 3}) == pytest.approx(3 * math.radians(turn))
    assert angular_resolution(between) == pytest.approx(angular_resolution(at_station))


def test_crossings_are_counted_but_not_stations():
    cross = {"a": ((-1.0, 0.0), (1.0, 0.0)), "b": ((0.0, -1.0), (0.0, 1.0))}
    apart = Drawing({"a": ("A", "B"), "b": ("C", "D")}, cross, [])
    assert crossings(apart) == 1
    assert crossings(star(0, 45, 90, 200)) == 0
    twice = Drawing(
        {"a": ("A", "B"), "b": ("C", "D")},
        {**cross, "b": ((-0.5, -1.0), (-0.5, 1.0), (0.5, 1.0), (0.5, -1.0))},
        [],
    )
    assert crossings(twice) == 2
