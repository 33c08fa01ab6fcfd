"""Tell which wishes of a person a finished drawing does not meet."""

from __future__ import annotations

import itertools
from collections.abc import Iterator

from gtfs_schematic.edition.contradictions import OPPOSITE
from gtfs_schematic.edition.wishes import WAYS, Wishes, leads, passes_of
from gtfs_schematic.feed.model import Finding
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import Layout

_NEAR_MM = 0.02
Told = Iterator[tuple[str, str, str]]
"""Name of the wish, id of what it is about, and what became of it."""


def unmet(wishes: Wishes, labelled: LabelledLayout) -> tuple[Finding, ...]:
    """Look at the drawing itself, whatever the rooms meant to do; sorted by where it is said."""
    layout = labelled.bundled.layout
    told = [*_labels(wishes, labelled), *unmet_places(wishes, layout), *_orders(wishes, labelled)]
    found = [
        Finding("warning", "adjustments", f"{why}, so the wish is not met", field=said)
        for name, key, why in told
        if (said := wishes.said.get((name, key), ""))
    ]
    return tuple(sorted(found, key=lambda each: (each.field or "", each.message)))


def _labels(wishes: Wishes, labelled: LabelledLayout) -> Told:
    for name in ("sides", "angles", "rows", "short_names"):
        for key, wanted in getattr(wishes, name).items():
            label = labelled.labels.get(key)
            if label is None:
                yield name, key, "the name found no place at all"
                continue
            rows = tuple(row.text for row in label.lines if not row.second)
            if name == "sides" and label.side != wanted:
                yield name, key, f"the name found no place there and stands {label.side}"
            if name == "angles" and -label.angle_deg != wanted:
                yield (
                    name,
                    key,
                    f"the name found no place so and rises by {0.0 - label.angle_deg:g}°",
                )
            if name == "rows" and rows != wanted:
                yield name, key, f"the label says {' / '.join(rows)}"
            if name == "short_names" and "".join(rows).replace(" ", "") != wanted.replace(" ", ""):
                yield name, key, f"the label says {' '.join(rows)}"


def unmet_places(wishes: Wishes, layout: Layout) -> Told:
    """Tell which wishes for places and directions a layout does not meet."""
    yield from _places(wishes, layout)
    yield from _links(wishes, layout)


def _places(wishes: Wishes, layout: Layout) -> Told:
    at = layout.positions
    for key, pin in wishes.pins.items():
        if not _same(at[key], pin):
            yield "pins", key, f"the station stands at {at[key][0]:g}, {at[key][1]:g} mm"
    for key, (other, dx, dy) in wishes.pins_from.items():
        away = (at[key][0] - at[other][0], at[key][1] - at[other][1])
        if not _same(away, (away[0] if dx is None else dx, away[1] if dy is None else dy)):
            yield (
                "pins_from",
                key,
                f"the station stands {away[0]:.2f} mm to the right and {away[1]:.2f} mm below",
            )


def _links(wishes: Wishes, layout: Layout) -> Told:
    for key, way in wishes.directions.items():
        path = layout.paths[key]
        if not all(_leads(a, b, way) for a, b in itertools.pairwise(path)):
            first = _way(path[0], path[1])
            yield "directions", key, f"the link leaves {first}{' and bends' * (len(path) > 2)}"
    for station, lines in wishes.straights.items():
        for line in lines:
            passes = [
                [_way_out(layout, station, end) for end in ends]
                for ends in passes_of(layout.network, line, station)
            ]
            # Of a line that branches here one branch can go straight on.
            if not any(OPPOSITE.get(a) == b for a, b in passes):
                ways = " and ".join(f"from {a} to {b}" for a, b in passes)
                yield "straights", station, f"line {line} runs {ways}"


def _orders(wishes: Wishes, labelled: LabelledLayout) -> Told:
    for key, wanted in wishes.orders.items():
        order = [line for line in labelled.bundled.orders[key] if line in wanted]
        if tuple(order) != wanted:
            yield "orders", key, f"the lines stand {', '.join(order)} from left to right"


def _way_out(layout: Layout, station: str, other: str) -> str:
    link = layout.network.link_between[frozenset((station, other))]
    path = layout.paths[link.id] if link.start == station else layout.paths[link.id][::-1]
    return _way(path[0], path[1])


def _way(a: Point, b: Point) -> str:
    """Give the compass direction of a segment that runs at a multiple of 45 degrees."""
    return next((way for way in WAYS if _leads(a, b, way)), "aslant")


def _leads(a: Point, b: Point, way: str) -> bool:
    return leads((b[0] - a[0], b[1] - a[1]), way)


def _same(one: Point, other: Point) -> bool:
    return max(abs(one[0] - other[0]), abs(one[1] - other[1])) < _NEAR_MM
