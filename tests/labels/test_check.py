"""The check finds what is wrong with labels that were spoilt by hand."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import pytest

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.check import faults
from gtfs_schematic.labels.model import Label, LabelledLayout, LabelSettings
from gtfs_schematic.labels.place import place_labels


@pytest.fixture(scope="module")
def sound(networks: Mapping[str, BundledLayout]) -> LabelledLayout:
    labelled = place_labels(networks["star"], LabelSettings())
    assert faults(labelled) == ()
    return labelled


def moved(label: Label, by: Point) -> Label:
    dx, dy = by
    return replace(
        label,
        pivot_mm=(label.pivot_mm[0] + dx, label.pivot_mm[1] + dy),
        lines=tuple(replace(r, x_mm=r.x_mm + dx, y_mm=r.y_mm + dy) for r in label.lines),
        badges=tuple(replace(b, x_mm=b.x_mm + dx, y_mm=b.y_mm + dy) for b in label.badges),
        outline_mm=tuple((x + dx, y + dy) for x, y in label.outline_mm),
    )


def spoilt(labelled: LabelledLayout, label: Label) -> LabelledLayout:
    return replace(labelled, labels={**labelled.labels, label.station_id: label})


@pytest.mark.parametrize(
    ("station_id", "by", "said"),
    [
        ("quell", (-8.0, 0.0), "comes too near to line D"),
        ("quell", (-8.0, 0.0), "comes too near to the marker of station quell"),
        ("lohe", (30.0, 0.0), "leaves the sheet's frame"),
        ("rehwiese", (0.0, 0.0), "is no station"),
    ],
)
def test_a_label_out_of_place_is_found(
    sound: LabelledLayout, station_id: str, by: Point, said: str
):
    label = sound.labels.get(station_id) or replace(sound.labels["reh"], station_id=station_id)
    assert any(said in fault for fault in faults(spoilt(sound, moved(label, by))))


def test_two_labels_on_one_place_are_found(sound: LabelledLayout):
    twin = replace(sound.labels["quell"], station_id="pappel")
    found = faults(spoilt(sound, twin))
    assert any("pappel and quell come too near" in fault for fault in found)
    assert any("says 'Quellgasse', not 'Pappelallee'" in fault for fault in found)


def test_rows_and_badges_outside_the_outline_are_found(sound: LabelledLayout):
    label = sound.labels["lohe"]
    shifted = moved(label, (9.0, 0.0))
    assert any(
        "row 'Lohe'" in f for f in faults(spoilt(sound, replace(label, lines=shifted.lines)))
    )
    found = faults(spoilt(sound, replace(label, badges=shifted.badges)))
    assert any("badge 'B'" in fault for fault in found)


def test_a_lost_label_is_found(sound: LabelledLayout):
    labels = {key: label for key, label in sound.labels.items() if key != "sand"}
    found = faults(replace(sound, labels=labels))
    assert found == ("Station sand must have a label or be listed without, and is not.",)
    assert faults(replace(sound, labels=labels, unplaced=("sand",))) == ()
