"""Names are shortened only where they find no place, only as the table says, and that is told."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.labels.check import faults
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.labels.place import place_labels

LONG = "Unterobereckerbacherlandstraßenbahnbetriebshofgelände Nord"
TABLE = {"Unterobereckerbacherlandstraßenbahnbetriebshofgelände": "U.", "Nord": "N"}


def narrow(straight: Callable[..., BundledLayout]) -> BundledLayout:
    """Give a line on a sheet so narrow that the long name has no place."""
    bundled = straight(["Au", LONG, "Ried"], (0.0, 15.0), (30.0, 40.0))
    sheet = replace(bundled.layout.sheet, left_mm=12.0, right_mm=48.0)
    return replace(bundled, layout=replace(bundled.layout, sheet=sheet))


def test_a_name_without_a_place_gets_its_short_form(straight):
    bundled = narrow(straight)
    assert place_labels(bundled, LabelSettings()).unplaced == ("s01",)
    labelled = place_labels(bundled, LabelSettings(abbreviations=TABLE))
    assert labelled.unplaced == ()
    assert labelled.abbreviated == {"s01": "U. N"}
    assert " ".join(row.text for row in labelled.labels["s01"].lines) == "U. N"
    assert faults(labelled) == ()


def test_names_that_find_a_place_stay_whole(straight):
    bundled = straight(["Au", "Bad Nord", "Ried"], (25.0, 0.0))
    labelled = place_labels(bundled, LabelSettings(abbreviations={"Nord": "N"}))
    assert labelled.abbreviated == {}
    assert " ".join(row.text for row in labelled.labels["s01"].lines) == "Bad Nord"


def test_the_check_faults_a_short_form_that_the_table_does_not_have(straight):
    labelled = place_labels(narrow(straight), LabelSettings(abbreviations=TABLE))
    other = replace(labelled, settings=LabelSettings(abbreviations={"Nord": "N"}))
    assert any("s01" in fault for fault in faults(other))
