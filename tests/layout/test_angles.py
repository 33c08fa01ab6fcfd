"""Directions 90 degrees apart: level and upright links only."""

from __future__ import annotations

import itertools
from dataclasses import replace

import pytest
from generated_networks import (
    hub_network,
    network_of,
    radial_network,
    star_network,
    wandering_network,
)
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from gtfs_schematic.config import Settings
from gtfs_schematic.drawing import check as drawing_check
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.edition.make import edition_of
from gtfs_schematic.edition.save import from_json, to_json
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings, SheetFrame
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import labelled_anew
from gtfs_schematic.progress import Silent

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAMES = tuple(
    SheetFrame(w, h, 12.0, 30.0, w - 12.0, h - 40.0) for w, h in ((210.0, 297.0), (420.0, 594.0))
)
RIGHT = LayoutSettings(effort="quick", angles=90)


def laid(network: Network) -> Layout:
    layout = lay_out(network, RIGHT, CLEARANCES, FRAMES)
    assert faults(layout, CLEARANCES, {}, RIGHT) == ()
    for path in (*layout.paths.values(), *layout.walk_paths.values()):
        assert all(a[0] == b[0] or a[1] == b[1] for a, b in itertools.pairwise(path))
    return layout


@pytest.mark.parametrize(
    "network",
    [
        star_network(1, 12),
        hub_network(),
        radial_network(1, 8, 2, 6),
        wandering_network(6, 8, 9, 12),
    ],
    ids=["star", "hub", "radial", "wandering"],
)
def test_all_links_are_level_or_upright(network: Network):
    assert laid(network).angles == 90


def test_four_arms_leave_apart_and_a_fifth_with_another():
    assert len(ports(laid(star_network(1, 4)))) == 4
    five = ports(laid(star_network(1, 5)))
    assert (len(five), len(set(five))) == (5, 4)


def ports(layout: Layout) -> list[tuple[int, int]]:
    """Give the signs of the first steps from the centre."""
    steps = []
    for link in layout.network.links:
        path = layout.paths[link.id][:: 1 if link.start == "C" else -1]
        if "C" in (link.start, link.end):
            (ax, ay), (bx, by) = path[:2]
            steps.append(((bx > ax) - (bx < ax), (by > ay) - (by < ay)))
    return steps


def test_the_check_faults_a_diagonal_and_a_needless_sharing():
    network = network_of({"A": (0, 0), "B": (1, 1)}, ["AB"])
    at = {"A": (50.0, 90.0), "B": (90.0, 50.0)}
    aslant = Layout(network, FRAMES[0], at, {"A-B": (at["A"], at["B"])}, {}, ())
    assert faults(aslant, CLEARANCES) == ()
    assert "A-B is off the 4 directions" in faults(replace(aslant, angles=90), CLEARANCES)[0]
    five = laid(star_network(1, 5))
    assert any("in only 4 directions" in f for f in faults(replace(five, angles=45), CLEARANCES))


def test_a_hub_is_drawn_from_end_to_end_and_its_edition_keeps_the_angle():
    network = hub_network()
    wanted = Settings(layout=RIGHT)
    labelled = labelled_anew(network, wanted, {}, Silent())
    drawing = compose(labelled, wanted.drawing)
    assert drawing_check.faults(drawing, network, unnamed=labelled.unplaced) == ()
    edition = edition_of(labelled, "A hub")
    assert from_json(to_json(edition)).angles == 90


def test_other_angles_are_refused():
    with pytest.raises(ValidationError):
        LayoutSettings.model_validate({"angles": 30})


@settings(max_examples=8, deadline=None)
@given(st.integers(0, 10**6), st.integers(3, 7), st.integers(2, 7), st.integers(3, 10))
def test_wandering_lines(seed: int, side: int, lines: int, length: int):
    laid(wandering_network(seed, side, lines, length))


def test_a_wide_bundle_has_room_for_its_corners():
    places = {"A": (0, 0), "B": (1, 0.9), "C": (1.2, 2.0), "D": (0.3, 2.2), "E": (0.0, 1.0)}
    network = network_of(places, ["ABCDE"] * 5 + ["ABC", "CDE"])
    # The check of the bundles is an error if inner lines are pinched out of a corner.
    labelled = labelled_anew(network, Settings(layout=RIGHT), {}, Silent())
    assert labelled.bundled.layout.angles == 90
