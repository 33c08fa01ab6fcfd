"""An edition says what a labelled layout draws."""

from __future__ import annotations

import drawn_networks
import numpy as np
import pytest

from gtfs_schematic.bundles.model import BundledLayout, BundleSettings, OrderQuality
from gtfs_schematic.edition.check import faults
from gtfs_schematic.edition.make import edition_of, sentence
from gtfs_schematic.edition.save import from_json, to_json
from gtfs_schematic.feed.model import Finding
from gtfs_schematic.labels.model import LabelledLayout, LabelSettings


def labelled(layout) -> LabelledLayout:
    """Give a layout with its lines in reversed order and no labels."""
    orders = {link.id: tuple(reversed(link.lines)) for link in layout.network.links}
    bundled = BundledLayout(layout, BundleSettings(), orders, (), {}, OrderQuality(0, 0, 0), layout)
    return LabelledLayout(bundled, LabelSettings(), {}, ())


@pytest.mark.parametrize("name", ["star", "ring", "ribbon", "walk_and_crossing"])
def test_everything_drawn_is_in_the_edition(name):
    layout = getattr(drawn_networks, name)()
    edition = edition_of(labelled(layout), "A title")
    assert faults(edition) == ()
    assert [s.id for s in edition.stations] == [s.id for s in layout.network.stations]
    assert {w.id for w in edition.walks} == {w.id for w in layout.network.walks}
    for link, drawn in zip(layout.network.links, edition.links, strict=True):
        assert drawn.lines == tuple(reversed(link.lines))
        assert np.array(drawn.path_mm) == pytest.approx(np.array(layout.paths[link.id]), abs=1e-4)
    for station in edition.stations:
        assert (station.x_mm, station.y_mm) == pytest.approx(layout.positions[station.id], abs=1e-4)
    assert (edition.width_mm, edition.title) == (layout.sheet.width_mm, "A title")
    assert edition.feed.service_date == layout.network.info.service_date


def test_rounding_is_done_before_writing():
    """What is loaded is what was measured, to the last digit."""
    edition = edition_of(labelled(drawn_networks.ring()), "Ring")
    assert from_json(to_json(edition)) == edition


def test_a_finding_as_a_sentence():
    finding = Finding("warning", "stops.txt", "Far away.", row=7, field="stop_lat", value="0")
    assert sentence(finding) == "warning: stops.txt, row 7, field stop_lat, value '0': Far away."
    assert sentence(Finding("info", "", "No shapes.")) == "note: feed: No shapes."
