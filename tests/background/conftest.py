"""Hand-made sheets, and shapes told in sheet millimetres and put on the ground."""

from __future__ import annotations

import drawn_networks
import drawn_sheets
import numpy as np
import pytest
import shapely

from gtfs_schematic.background.model import Feature, Kind
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import SheetFrame


def labelled_of(name: str) -> LabelledLayout:
    """Give a hand-made network, placed, bundled and labelled in the simplest way."""
    layout = drawn_sheets.in_frame(
        drawn_networks.ALL[name](), SheetFrame(270.0, 210.0, 10.0, 10.0, 260.0, 200.0)
    )
    return drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))


@pytest.fixture(scope="session", params=sorted(drawn_networks.ALL))
def labelled(request: pytest.FixtureRequest) -> LabelledLayout:
    """Give each hand-made network."""
    return labelled_of(request.param)


@pytest.fixture(scope="session")
def star() -> LabelledLayout:
    """Give the star."""
    return labelled_of("star")


def on_ground(labelled: LabelledLayout, points: list[Point]) -> list[Point]:
    """Give degrees of places that are told in millimetres of a hand-made sheet.

    By the affine map that takes the positions of stations to their longitudes and latitudes best:
    hand-made networks are nearly true to scale.
    """
    layout = labelled.bundled.layout
    stations = layout.network.stations
    sheet = np.array([(*layout.positions[s.id], 1.0) for s in stations])
    ground = np.array([(s.lon, s.lat) for s in stations])
    matrix, *_ = np.linalg.lstsq(sheet, ground, rcond=None)
    return [tuple(place) for place in (np.array([(*p, 1.0) for p in points]) @ matrix).tolist()]


def lake(labelled: LabelledLayout, points: list[Point], kind: Kind = "water") -> Feature:
    """Give a surface by its corners in millimetres."""
    return Feature(kind, "Lake", "test", shapely.Polygon(on_ground(labelled, points)))


def river(labelled: LabelledLayout, points: list[Point]) -> Feature:
    """Give a line of water by its corners in millimetres."""
    return Feature("water", "River", "test", shapely.LineString(on_ground(labelled, points)))


def box(center: Point, width: float, height: float) -> list[Point]:
    """Give the corners of a rectangle about a place."""
    (x, y), w, h = center, width / 2.0, height / 2.0
    return [(x - w, y - h), (x + w, y - h), (x + w, y + h), (x - w, y + h)]


class Sketches:
    """What tests put on a sheet."""

    lake = staticmethod(lake)
    river = staticmethod(river)
    box = staticmethod(box)
    on_ground = staticmethod(on_ground)


@pytest.fixture(scope="session")
def sketch() -> type[Sketches]:
    """Give the ways to put shapes on a sheet."""
    return Sketches
