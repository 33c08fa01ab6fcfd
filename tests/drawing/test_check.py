"""The check passes sound drawings and faults each kind of damage."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import pytest

from gtfs_schematic.drawing.check import faults
from gtfs_schematic.drawing.model import Drawing, Group, PathShape, TextShape
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.network.model import Network


@pytest.fixture(scope="session")
def network(labelled: LabelledLayout) -> Network:
    """Give the network of each hand-made layout."""
    return labelled.bundled.layout.network


def altered(drawing: Drawing, name: str, change: Callable[[Group], tuple[Group, ...]]) -> Drawing:
    """Replace every top group or group below it of a class by what `change` makes of it."""

    def walk(group: Group) -> tuple[Group, ...]:
        if group.css_class == name:
            return change(group)
        children: list[PathShape | TextShape | Group] = []
        for child in group.children:
            children += walk(child) if isinstance(child, Group) else (child,)
        return (replace(group, children=tuple(children)),)

    return replace(drawing, groups=tuple(g for top in drawing.groups for g in walk(top)))


def test_a_sound_drawing_has_no_faults(drawing: Drawing, network: Network):
    assert faults(drawing, network) == ()


@pytest.mark.parametrize("name", ["line", "station"])
def test_missing_and_doubled_groups_are_found(drawing: Drawing, network: Network, name: str):
    count = len(network.lines if name == "line" else network.stations)
    missing = faults(altered(drawing, name, lambda _: ()), network)
    assert sum(f"{name} '" in fault and "0 times" in fault for fault in missing) == count
    doubled = faults(altered(drawing, name, lambda group: (group, group)), network)
    assert sum("2 times" in fault for fault in doubled) == count


def test_a_strange_station_is_found(drawing: Drawing, network: Network):
    fewer = replace(network, stations=network.stations[1:])
    assert any("not in the network" in fault for fault in faults(drawing, fewer))


def test_a_missing_or_wrong_name_is_found(drawing: Drawing, network: Network):
    def misspelt(group: Group) -> tuple[Group, ...]:
        return (
            replace(
                group,
                children=tuple(
                    replace(child, text="Nirgendwo") if isinstance(child, TextShape) else child
                    for child in group.children
                ),
            ),
        )

    found = faults(altered(drawing, "station", misspelt), network)
    assert sum("Nirgendwo" in fault for fault in found) == len(network.stations)


def test_a_name_that_found_no_room_may_be_missing_but_not_wrong(drawing: Drawing, network: Network):
    def nameless(group: Group) -> tuple[Group, ...]:
        kept = tuple(child for child in group.children if not isinstance(child, TextShape))
        return (replace(group, children=kept),)

    bare = altered(drawing, "station", nameless)
    ids = [station.id for station in network.stations]
    assert len(faults(bare, network)) == len(ids)
    assert faults(bare, network, unnamed=ids) == ()
    assert len(faults(drawing, network, unnamed=ids)) == len(ids)


def test_what_leaves_the_page_is_found(drawing: Drawing, network: Network):
    cut = replace(drawing, width_mm=drawing.width_mm / 2.0)
    found = faults(cut, network)
    assert any("leaves the page" in fault and "line" in fault for fault in found)
    assert any("leaves the page" in fault and "station" in fault for fault in found)


def test_missing_cautions_and_attribution_are_found(drawing: Drawing, network: Network):
    bare = altered(drawing, "notes", lambda _: ())
    assert any("navigation" in fault for fault in faults(bare, network))
    owed = replace(network, info=replace(network.info, attributions=("Karte: Amt Wiesmarn",)))
    assert any("Amt Wiesmarn" in fault for fault in faults(drawing, owed))
