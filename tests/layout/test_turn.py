"""The ground turned so that links lie near the directions, and the arrow that says so."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import numpy as np
import pytest
from generated_networks import network_of, star_network
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.config import Settings
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.model import Group, PathShape
from gtfs_schematic.drift.fit import free_fit
from gtfs_schematic.edition.make import edition_of
from gtfs_schematic.edition.save import from_json, to_json
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.ground import project
from gtfs_schematic.layout.model import Clearances, LayoutSettings, SheetFrame
from gtfs_schematic.layout.planarise import planarise
from gtfs_schematic.layout.turn import best_turn, turned
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import labelled_anew
from gtfs_schematic.progress import Silent

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAMES = (SheetFrame(210.0, 297.0, 12.0, 30.0, 198.0, 257.0),)
BEST = LayoutSettings(effort="quick", north="best")


def grid(turn_deg: float, side: int = 4) -> Network:
    """Make a grid of lines turned counter-clockwise."""
    turn = complex(math.cos(math.radians(turn_deg)), math.sin(math.radians(turn_deg)))
    at = {f"G{x}{y}": complex(x, y) * turn for x in range(side) for y in range(side)}
    courses = [[f"G{x}{y}" for y in range(side)] for x in range(side)]
    courses += [[f"G{x}{y}" for x in range(side)] for y in range(side)]
    return network_of({key: (z.real, z.imag) for key, z in at.items()}, courses)


@given(st.integers(-22, 22), st.floats(0.0, 1.0))
def test_the_best_turn_undoes_that_of_a_grid(turn_deg: int, fidelity: float):
    found = best_turn(planarise(grid(turn_deg)), fidelity, 45.0)
    assert found == pytest.approx(-turn_deg, abs=1.0)


def test_no_turn_for_little_gain():
    # The arms of a star with all bearings suit one turn as well as another.
    assert best_turn(planarise(star_network(1, 24)), 0.35, 45.0) == 0.0


def test_turning_keeps_the_graph_and_its_lengths():
    graph = planarise(grid(7.0))
    other = turned(graph, 30.0)
    a, b = graph.segments.T
    before, after = ((g.points[b] - g.points[a]) @ [1.0, 1.0j] for g in (graph, other))
    assert np.abs(np.abs(after) - np.abs(before)).max() < 1e-3
    assert np.degrees(np.angle(after / before)) == pytest.approx(30.0, abs=1e-3)
    assert other.rotation == graph.rotation


def test_a_turned_layout_says_by_how_much_and_keeps_its_limits_turned():
    network = grid(-18.0)
    up = lay_out(network, LayoutSettings(effort="quick"), CLEARANCES, FRAMES)
    assert up.rotation_deg == 0.0
    wanted = BEST.model_copy(update={"drift_limit_m": 150.0})
    layout = lay_out(network, wanted, CLEARANCES, FRAMES)
    assert layout.rotation_deg == 18.0
    assert faults(layout, CLEARANCES, {}, wanted) == ()
    # Without the turn that it says it would be far off.
    assert faults(replace(layout, rotation_deg=0.0), CLEARANCES, {}, wanted) != ()
    stations = network.stations
    ground = project([(s.lon, s.lat) for s in stations]) @ [1.0, 1.0j]
    sheet = np.array([complex(x, -y) for x, y in (layout.positions[s.id] for s in stations)])
    assert free_fit(ground, sheet).rotation_deg == pytest.approx(18.0, abs=1.0)


@pytest.mark.parametrize("turn_deg", [-20.0, 15.0])
def test_an_arrow_points_north_and_the_edition_keeps_the_turn(turn_deg: float):
    network = grid(turn_deg)
    wanted = Settings(layout=BEST)
    labelled = labelled_anew(network, wanted, {}, Silent())
    drawing = compose(labelled, wanted.drawing)
    [arrow] = [g for g in drawing.groups if isinstance(g, Group) and g.css_class == "north"]
    shaft = next(shape for shape in arrow.children if isinstance(shape, PathShape))
    ax, ay, bx, by = (float(text) for text in re.findall(r"-?\d+(?:\.\d+)?", shaft.d))
    # True north, seen on a sheet that is turned the other way round by the grid's own turn.
    assert math.degrees(math.atan2(-(by - ay), bx - ax)) == pytest.approx(90.0 - turn_deg, abs=1.0)
    assert f"{abs(turn_deg):g}° to the {'left' if turn_deg < 0.0 else 'right'}" in arrow.title
    edition = edition_of(labelled, "A turned grid")
    assert edition.rotation_deg == -turn_deg
    assert from_json(to_json(edition)).rotation_deg == -turn_deg


def test_north_up_has_no_arrow():
    labelled = labelled_anew(grid(20.0), Settings(), {}, Silent())
    drawing = compose(labelled, Settings().drawing)
    assert all(group.css_class != "north" for group in drawing.groups)
