"""Bundles move aside so that lines run straight on, and into free room only."""

from __future__ import annotations

import itertools
from dataclasses import replace

import drawn_networks
import numpy as np
import pytest
from drawn_networks import Sketch, drawn

from gtfs_schematic.bundles.aside import asides
from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.bundles.check import faults
from gtfs_schematic.bundles.joints import is_straight
from gtfs_schematic.bundles.junction import junctions
from gtfs_schematic.bundles.model import BundleSettings
from gtfs_schematic.bundles.slots import Slots
from gtfs_schematic.layout.model import Layout

SETTINGS = BundleSettings()
PITCH = SETTINGS.line_width_mm + SETTINGS.line_gap_mm


def street(parallel_mm: float = 60.0) -> Layout:
    """Give a street of four stops on which line C runs one stretch only, and a line beside it."""
    xs = (30.0, 60.0, 90.0, 120.0, 150.0)
    return drawn(
        Sketch(
            places={f"s{i}": (x, 60.0, f"Stop {i}") for i, x in enumerate(xs)}
            | {"c0": (30.0, 90.0, "C west"), "c1": (150.0, 90.0, "C east")}
            | {"p0": (30.0, 60.0 - parallel_mm, "P west"), "p1": (150.0, 60.0 - parallel_mm, "P")},
            courses={
                "A": ("#AA0000", ("s0 s1 s2 s3 s4",)),
                "B": ("#00AA00", ("s0 s1 s2 s3 s4",)),
                "C": ("#0000AA", ("c0 s1 s2 s3 c1",)),
                "P": ("#555555", ("p0 p1",)),
            },
        )
    )


def jogs(layout: Layout, orders, moved) -> list[float]:
    """Give how far each line jogs at each station that it passes straight."""
    slots = Slots(orders, SETTINGS, moved)
    found = []
    for junction in junctions(layout).values():
        for way in junction.passes:
            first, second = junction.leg[way.first], junction.leg[way.second]
            if is_straight(first, second):
                sides = [slots.outward(leg, way.line_id) for leg in (first, second)]
                found.append(abs(sum(sides)))
    return found


def test_lines_that_go_on_run_straight_where_another_joins_and_leaves():
    layout = street()
    bundled = bundle(layout, SETTINGS)
    assert faults(bundled) == ()
    assert sum(jogs(layout, bundled.orders, {})) > 0.0
    assert max(jogs(layout, bundled.orders, bundled.asides)) == pytest.approx(0.0, abs=1e-3)
    for line in ("A", "B"):
        (stretch,) = (s for s in bundled.stretches if s.line_id == line)
        ys = [corner.at_mm[1] for corner in stretch.corners]
        assert max(ys) - min(ys) < 0.01


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_no_choice_of_half_pitches_jogs_less(name):
    """Against brute force over the links that are moved at all and their neighbours."""
    layout = drawn_networks.ALL[name]()
    bundled = bundle(layout, SETTINGS)
    best = sum(jogs(layout, bundled.orders, bundled.asides))
    assert best <= sum(jogs(layout, bundled.orders, {})) + 1e-6
    touched = sorted(
        {
            link
            for junction in junctions(layout).values()
            for way in junction.passes
            for link in (way.first, way.second)
        }
    )[:6]
    for choice in itertools.product((-PITCH / 2.0, 0.0, PITCH / 2.0), repeat=len(touched)):
        trial = {**bundled.asides, **dict(zip(touched, choice, strict=True))}
        cost = sum(jogs(layout, bundled.orders, trial)) + 0.05 * sum(map(abs, trial.values()))
        assert cost >= best + 0.05 * sum(map(abs, bundled.asides.values())) - 1e-3


def test_a_bundle_takes_half_of_the_free_room_at_most():
    wide = bundle(street(), SETTINGS)
    free = 0.4
    close = street(parallel_mm=2.0 * PITCH + PITCH / 2.0 + free)
    narrow = bundle(close, SETTINGS)
    assert faults(narrow) == ()
    most = max(abs(aside) for aside in narrow.asides.values()) if narrow.asides else 0.0
    assert most <= free / 2.0 + PITCH / 2.0 + 1e-6
    assert most < max(abs(aside) for aside in wide.asides.values()) + 1e-9


def test_without_jogs_all_bundles_are_centred():
    layout = street()
    alone = replace(
        layout.network,
        lines=tuple(line for line in layout.network.lines if line.id != "C"),
        links=tuple(
            replace(link, lines=tuple(line for line in link.lines if line != "C"))
            for link in layout.network.links
            if link.lines != ("C",)
        ),
    )
    layout = replace(layout, network=alone)
    orders = {link.id: link.lines for link in alone.links}
    assert asides(layout, junctions(layout), Slots(orders, SETTINGS)) == {}


def test_the_check_sees_a_bundle_that_is_not_where_it_is_said_to_be():
    bundled = bundle(street(), SETTINGS)
    assert bundled.asides
    moved = {key: aside + 0.7 for key, aside in bundled.asides.items()}
    assert any("beside each other" in fault for fault in faults(replace(bundled, asides=moved)))
    assert np.isfinite(list(bundled.asides.values())).all()
