"""Limits on how far stations may be drawn from their true places."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from generated_networks import network_of, radial_network, star_network, wandering_network
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.drift.fit import north_up_fit
from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.ground import project
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings, SheetFrame
from gtfs_schematic.layout.settle import DriftLimitsCollideError
from gtfs_schematic.network.model import Network

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAMES = tuple(
    SheetFrame(w, h, 12.0, 30.0, w - 12.0, h - 40.0)
    for w, h in ((210.0, 297.0), (420.0, 594.0), (1189.0, 841.0))
)


def laid(network: Network, **asked: object) -> Layout:
    wanted = LayoutSettings.model_validate({"effort": "quick", **asked})
    layout = lay_out(network, wanted, CLEARANCES, FRAMES)
    assert faults(layout, CLEARANCES, {}, wanted) == ()
    return layout


def drifts(layout: Layout) -> tuple[dict[str, float], dict[str, float]]:
    """Give the drift of every station in metres and in millimetres, by the drift room's fit."""
    stations = layout.network.stations
    ground = project([(s.lon, s.lat) for s in stations]) @ [1.0, 1.0j]
    sheet = np.array([complex(x, -y) for x, y in (layout.positions[s.id] for s in stations)])
    scale = north_up_fit(ground, sheet).scale_mm_per_km / 1000.0
    away = np.abs(sheet - sheet.mean() - scale * (ground - ground.mean()))
    ids = [s.id for s in stations]
    return dict(zip(ids, away / scale, strict=True)), dict(zip(ids, away, strict=True))


@pytest.mark.parametrize(
    ("network", "limit_m"),
    [(wandering_network(5, 6, 6, 9), 400.0), (radial_network(1, 6, 1, 6), 900.0)],
    ids=["wandering", "radial"],
)
def test_a_limit_in_metres_is_kept(network: Network, limit_m: float):
    free, _ = drifts(laid(network))
    assert max(free.values()) > limit_m
    held, _ = drifts(laid(network, drift_limit_m=limit_m))
    assert max(held.values()) <= limit_m * 1.005


def test_a_limit_in_millimetres_is_kept():
    network = star_network(1, 12)
    _, free = drifts(laid(network))
    limit = 0.7 * max(free.values())
    _, held = drifts(laid(network, drift_limit_mm=limit))
    assert max(held.values()) <= limit + 0.05


def test_one_station_may_have_a_limit_of_its_own():
    network = radial_network(1, 6, 1, 6)
    free, _ = drifts(laid(network))
    worst = max(free, key=lambda key: (free[key], key))
    held, _ = drifts(laid(network, drift_limits_m={worst: 0.4 * free[worst]}))
    assert held[worst] <= 0.4 * free[worst] * 1.005


def test_limits_that_collide_are_named_and_none_of_them_can_be_left_out():
    network = radial_network(1, 6, 1, 6)
    with pytest.raises(DriftLimitsCollideError) as raised:
        laid(network, drift_limit_m=200.0)
    named = re.findall(r"(A\dN\d\d) \(200 m\)", str(raised.value))
    assert 1 <= len(named) < len(network.stations) / 2
    # Those alone collide as well.
    alone = dict.fromkeys(named, 200.0) | {"C": 0.0}
    with pytest.raises(DriftLimitsCollideError) as again:
        laid(network, drift_limits_m=alone, fidelity=1.0)
    assert re.findall(r"(A\dN\d\d) \(200 m\)", str(again.value))


def test_a_limit_of_a_stranger_is_refused():
    with pytest.raises(LayoutError, match="does not have: Z"):
        laid(network_of({"A": (0, 0), "B": (1, 0)}, ["AB"]), drift_limits_m={"Z": 5.0})


def test_the_check_names_who_is_too_far():
    layout = laid(wandering_network(5, 6, 6, 9))
    far, _ = drifts(layout)
    worst = max(far, key=lambda key: (far[key], key))
    wanted = LayoutSettings(drift_limits_m={worst: 0.9 * far[worst]})
    assert [f for f in faults(layout, CLEARANCES, {}, wanted) if worst in f]
    wanted = LayoutSettings(drift_limits_m={worst: 1.1 * far[worst]})
    assert faults(layout, CLEARANCES, {}, wanted) == ()
    # A drawing that is moved as a whole has not drifted.
    shift = replace(
        layout,
        positions={key: (x + 9.0, y) for key, (x, y) in layout.positions.items()},
        paths={key: tuple((x + 9.0, y) for x, y in p) for key, p in layout.paths.items()},
    )
    assert not [f for f in faults(shift, CLEARANCES, {}, wanted) if "true place" in f]


@settings(max_examples=6, deadline=None)
@given(st.integers(0, 10**6), st.floats(0.6, 3.0))
def test_a_limit_is_kept_or_refused(seed: int, spacings: float):
    network = wandering_network(seed, 5, 5, 8)
    limit = round(spacings * 700.0)
    try:
        held, _ = drifts(laid(network, drift_limit_m=limit))
    except DriftLimitsCollideError:
        # Only limits tighter than a few hops of the lattice may be out of reach.
        assert spacings < 1.5
    else:
        assert max(held.values()) <= limit * 1.005
