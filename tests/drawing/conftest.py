"""Hand-made sheets and their scenes, for the tests of the drawing room."""

from __future__ import annotations

import drawn_networks
import drawn_sheets
import pytest

from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.labels.model import LabelledLayout


@pytest.fixture(scope="session", params=sorted(drawn_networks.ALL))
def labelled(request: pytest.FixtureRequest) -> LabelledLayout:
    """Give each hand-made network, placed, bundled and labelled in the simplest way."""
    layout = drawn_sheets.on_page(drawn_networks.ALL[request.param]())
    return drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))


@pytest.fixture(scope="session")
def drawing(labelled: LabelledLayout) -> Drawing:
    """Give its scene."""
    return compose(labelled, drawn_sheets.SETTINGS)
