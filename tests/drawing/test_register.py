"""The index names every station once, and its references lead there."""

from __future__ import annotations

from collections.abc import Iterator

import drawn_networks
import drawn_sheets
import pytest

from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape, SheetSettings, TextShape
from gtfs_schematic.drawing.page import plan_of_frame
from gtfs_schematic.drawing.register import reference
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.drawing.words import alphabetical
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import SheetFrame

SETTINGS = DrawingSettings(index=True)


@pytest.fixture(scope="module", params=sorted(drawn_networks.ALL))
def labelled(request) -> LabelledLayout:
    layout = drawn_networks.ALL[request.param]()
    frame = candidate_frames(layout.network, SheetSettings(size="A2"), SETTINGS)[0]
    layout = drawn_sheets.in_frame(layout, frame)
    return drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))


def groups(group: Group) -> Iterator[Group]:
    yield group
    for child in group.children:
        if isinstance(child, Group):
            yield from groups(child)


def test_every_station_is_listed_once_in_order_and_leads_to_its_square(labelled: LabelledLayout):
    layout = labelled.bundled.layout
    drawing = compose(labelled, SETTINGS)
    rows = [g for top in drawing.groups for g in groups(top) if g.css_class == "index-row"]
    names = [row.children[0].text for row in rows if isinstance(row.children[0], TextShape)]
    wanted = sorted((s.name for s in layout.network.stations), key=alphabetical)
    assert names == wanted
    (grid,) = [g for g in drawing.groups if g.css_class == "grid"]
    xs, ys = lines_of(grid)
    for row in rows:
        place = row.children[1]
        assert isinstance(place, TextShape)
        column, line = ord(place.text[0]) - ord("A"), int(place.text[1:]) - 1
        x, y = layout.positions[row.data["for-station"]]
        assert xs[column] - 1e-6 <= x <= xs[column + 1] + 1e-6
        assert ys[line] - 1e-6 <= y <= ys[line + 1] + 1e-6


def lines_of(grid: Group) -> tuple[list[float], list[float]]:
    """Give the places of the upright and of the level lines."""
    xs, ys = [], []
    for shape in grid.children:
        if isinstance(shape, PathShape):
            start, end = (tuple(map(float, part.split(","))) for part in shape.d[1:].split("L"))
            if start[0] == end[0]:
                xs.append(start[0])
            else:
                ys.append(start[1])
    return sorted(xs), sorted(ys)


def test_the_index_stays_clear_of_the_network_and_on_the_page(labelled: LabelledLayout):
    drawing = compose(labelled, SETTINGS)
    frame = labelled.bundled.layout.sheet
    (index,) = [g for g in drawing.groups if g.css_class == "index"]
    texts = [c for g in groups(index) for c in g.children if isinstance(c, TextShape)]
    assert min(text.y - text.size for text in texts) >= frame.bottom_mm
    assert max(text.x + text.width for text in texts) <= frame.width_mm - frame.left_mm + 1e-6
    page = plan_of_frame(labelled.bundled.layout.network, SETTINGS, frame)
    assert max(text.y for text in texts) <= page.rule_y


def test_corners_of_the_frame_are_the_first_and_the_last_square():
    frame = SheetFrame(420.0, 297.0, 10.0, 30.0, 410.0, 250.0)
    type_ = plan_of_frame(drawn_networks.star().network, SETTINGS, frame).type
    assert reference((10.0, 30.0), frame, type_) == "A1"
    last = reference((410.0, 250.0), frame, type_)
    assert last[0] > "A"
    assert int(last[1:]) > 1


def test_letters_with_marks_stand_beside_those_without():
    names = ["Zell", "Ähren", "Aal", "Ost 10", "Ost 9"]
    assert sorted(names, key=alphabetical) == ["Aal", "Ähren", "Ost 9", "Ost 10", "Zell"]
