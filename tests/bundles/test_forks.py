"""Links that leave a station together are one bundle until they part."""

from __future__ import annotations

from dataclasses import replace

import pytest
import shapely
from generated_networks import network_of

from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.bundles.check import faults
from gtfs_schematic.bundles.forks import with_forks
from gtfs_schematic.bundles.model import BundleSettings
from gtfs_schematic.layout.model import Layout, SheetFrame


@pytest.fixture(scope="module")
def layout() -> Layout:
    """Three links that leave A together; one parts first, then the others; a line ends at A."""
    at = {"A": (20.0, 60.0), "B": (90.0, 60.0), "C": (90.0, 30.0), "D": (90.0, 90.0)}
    at["W"] = (5.0, 60.0)
    places = {key: (x / 10, -y / 10) for key, (x, y) in at.items()}
    network = network_of(places, ["WAB", "WAC", "AD", "WAD"])
    paths = {
        "A-B": (at["A"], at["B"]),
        "A-C": (at["A"], (60.0, 60.0), at["C"]),
        "A-D": (at["A"], (40.0, 60.0), (70.0, 90.0), at["D"]),
        "A-W": (at["A"], at["W"]),
    }
    return Layout(network, SheetFrame(120, 120, 1, 1, 119, 119), at, paths, {}, ())


def test_common_stretches_become_links_with_all_lines(layout: Layout):
    forked = with_forks(layout)
    stems = {k.id: k for k in forked.network.links if k.id not in layout.network.link}
    assert sorted(len(k.lines) for k in stems.values()) == [2, 4]
    lengths = {key: shapely.LineString(forked.paths[key]).length for key in stems}
    assert sorted(lengths.values()) == [20.0, 20.0]
    # Each line's course is as long as before.
    for line, whole in zip(forked.network.lines, layout.network.lines, strict=True):
        drawn = sum(
            shapely.LineString(forked.paths[forked.network.link_between[frozenset(pair)].id]).length
            for pair in zip(line.courses[0], line.courses[0][1:], strict=False)
        )
        links = [
            layout.network.link_between[frozenset(pair)].id
            for pair in zip(whole.courses[0], whole.courses[0][1:], strict=False)
        ]
        assert drawn == pytest.approx(
            sum(shapely.LineString(layout.paths[k]).length for k in links)
        )


def test_lines_run_side_by_side_and_part_without_crossing(layout: Layout):
    bundled = bundle(layout, BundleSettings())
    assert faults(bundled) == ()
    # From the left as seen from A: the link that goes off to the left comes first.
    first = next(k for k in bundled.forked.network.links if k.start == "A" and len(k.lines) == 4)
    order = bundled.orders[first.id]
    assert [order.index(line) for line in ("L01", "L00")] == [0, 1]
    assert {order.index(line) for line in ("L02", "L03")} == {2, 3}
    assert set(bundled.spans) == set(layout.positions)


def test_a_layout_without_common_stretches_stays_itself(layout: Layout):
    paths = {**layout.paths, "A-C": (layout.positions["A"], (50.0, 30.0), layout.positions["C"])}
    paths["A-D"] = (layout.positions["A"], (50.0, 90.0), layout.positions["D"])
    apart = replace(layout, paths=paths)
    assert with_forks(apart) is apart


def test_the_check_sees_a_stretch_that_lost_a_line_or_its_place(layout: Layout):
    bundled = bundle(layout, BundleSettings())
    stem = next(k for k in bundled.forked.network.links if len(k.lines) == 4)
    network = bundled.forked.network
    poorer = replace(stem, lines=stem.lines[1:])
    links = tuple(poorer if k.id == stem.id else k for k in network.links)
    lost = replace(bundled.forked, network=replace(network, links=links))
    assert any("lines of the links" in fault for fault in faults(replace(bundled, forked=lost)))
    shorter = {**bundled.forked.paths, stem.id: ((20.0, 60.0), (30.0, 60.0))}
    cut = replace(bundled.forked, paths=shorter)
    assert any("not whole" in fault for fault in faults(replace(bundled, forked=cut)))
