"""Bundled layouts for the labels' tests, without the bundles room's work."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Mapping

import drawn_networks
import pytest
import shapely
from drawn_networks import Sketch, drawn

from gtfs_schematic.bundles.model import (
    BundledLayout,
    BundleSettings,
    Corner,
    OrderQuality,
    StationSpan,
    Stretch,
)
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Layout

Bundler = Callable[[Layout], BundledLayout]


def plain_bundle(layout: Layout) -> BundledLayout:
    """Set the lines of every link side by side in the order of their ids, link by link."""
    settings = BundleSettings()
    pitch = settings.line_width_mm + settings.line_gap_mm
    stretches: list[Stretch] = []
    covered: dict[str, set[Point]] = defaultdict(set)
    for link in layout.network.links:
        path = shapely.LineString(layout.paths[link.id])
        for rank, line_id in enumerate(link.lines):
            shift = (rank - (len(link.lines) - 1) / 2.0) * pitch
            course = path.offset_curve(shift, join_style="mitre") if shift else path
            points = [(float(x), float(y)) for x, y in course.coords]
            corners = [Corner(point, settings.corner_radius_mm) for point in points]
            corners[0], corners[-1] = Corner(points[0], 0.0), Corner(points[-1], 0.0)
            stretches.append(Stretch(line_id, (link.id,), tuple(corners)))
            for station_id, (x, y) in ((link.start, points[0]), (link.end, points[-1])):
                if line_id in layout.network.station[station_id].lines:
                    covered[station_id].add((round(x, 6), round(y, 6)))
    return BundledLayout(
        layout=layout,
        settings=settings,
        orders={link.id: link.lines for link in layout.network.links},
        stretches=tuple(stretches),
        spans={key: StationSpan(key, tuple(sorted(covered[key]))) for key in sorted(covered)},
        quality=OrderQuality(0, 0, 0),
        forked=layout,
    )


@pytest.fixture(scope="session")
def bundler() -> Bundler:
    return plain_bundle


@pytest.fixture(scope="session")
def networks() -> Mapping[str, BundledLayout]:
    """Give the hand-drawn networks, bundled."""
    return {name: plain_bundle(drawn_networks.ALL[name]()) for name in sorted(drawn_networks.ALL)}


@pytest.fixture
def straight() -> Callable[..., BundledLayout]:
    """Give a maker of one straight line through named stations, a given step apart."""

    def make(names: list[str], step: Point, start: Point = (60.0, 70.0)) -> BundledLayout:
        ids = [f"s{i:02d}" for i in range(len(names))]
        places = {
            station_id: (start[0] + i * step[0], start[1] + i * step[1], name)
            for i, (station_id, name) in enumerate(zip(ids, names, strict=True))
        }
        return plain_bundle(drawn(Sketch(places, {"L": ("#1F5FA8", (" ".join(ids),))})))

    return make
