"""Tell which adjustments cannot both hold, whatever the feed."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from gtfs_schematic.edition.adjustments import Adjustments, StationAdjustment
    from gtfs_schematic.labels.model import Side

_PLACED = ("pin_mm", "pin_from", "label_side", "label_angle", "label_rows", "short_name", "name")
"""What makes no sense of a hidden station."""


def contradictions(adjustments: Adjustments) -> Iterator[str]:
    """Give a sentence for each pair, naming both by their paths."""
    merged = [(f"merge.{i}", s) for i, m in enumerate(adjustments.merge) for s in m.stations]
    split = [(f"split.{i}", each.station) for i, each in enumerate(adjustments.split)]
    yield from _twice([*merged, *split], "station")
    grouped = [(f"group.{i}", k) for i, g in enumerate(adjustments.group) for k in g.lines]
    yield from _twice(grouped, "line")
    for kind in ("same_station", "same_line"):
        for side in ("old", "new"):
            ids = [getattr(same, side) for same in getattr(adjustments, kind)]
            places = [(f"{kind}.{i}.{side}", key) for i, key in enumerate(ids) if key]
            yield from _twice(places, "id")
    for where, told in adjustments.stations.items():
        yield from station_contradictions(f"stations.{where}", told)
    yield from _of_links(adjustments)


def station_contradictions(where: str, told: StationAdjustment) -> Iterator[str]:
    """Say what of one station cannot hold together."""
    pairs = [("hide", other) for other in _PLACED] if told.hide else []
    pairs += [("pin_mm", "pin_from"), ("short_name", "label_rows")]
    for one, other in pairs:
        if getattr(told, one) and getattr(told, other) not in (None, "", ()):
            yield f"{where}.{one} and {where}.{other} contradict each other"


def pin_contradictions(
    pins: Mapping[str, tuple[float, float]], said: Mapping[tuple[str, str], str]
) -> Iterator[str]:
    """Refuse two stations in one place.

    Parameters
    ----------
    pins
        Per station its place.
    said
        Per ("pins", station) where that is said.
    """
    seen: dict[tuple[float, float], str] = {}
    for station, pin in pins.items():
        where = said["pins", station]
        if pin in seen:
            yield f"{seen[pin]} and {where} are the same place"
        seen[pin] = where


def pin_from_contradictions(
    pins: Mapping[str, tuple[str, float | None, float | None]],
    said: Mapping[tuple[str, str], str],
) -> Iterator[str]:
    """Refuse pins that wait for each other, or are the same place; see `pin_contradictions`."""
    offsets: dict[tuple[str, float, float], str] = {}
    for station, (other, dx, dy) in pins.items():
        where = said["pins_from", station]
        here, last = other, station
        for _ in pins:
            if here == station:
                yield (
                    f"{where} and {said['pins_from', last]} contradict each other: each waits for "
                    "the other's place"
                )
                return
            last, here = here, pins.get(here, ("", None, None))[0]
        if dx is None or dy is None:
            continue
        if (dx, dy) == (0.0, 0.0):
            yield f"{where} is the place of station {other}"
        if (other, dx, dy) in offsets:
            yield f"{offsets[other, dx, dy]} and {where} are the same place"
        offsets[other, dx, dy] = where


def _of_links(adjustments: Adjustments) -> Iterator[str]:
    """Say where one link is told two things, or one station sends two links the same way."""
    links: dict[frozenset[str], int] = {}
    ways: dict[tuple[str, str], int] = {}
    for i, told in enumerate(adjustments.links):
        where = f"links.{i}"
        first, second = told.between
        if first == second:
            yield f"{where}.between: a link joins two stations"
        ends = frozenset(told.between)
        if ends in links:
            yield f"links.{links[ends]} and {where} contradict each other about one link"
        links[ends] = i
        if len(set(told.order)) < len(told.order):
            yield f"{where}.order: a line stands there twice"
        if told.direction is None:
            continue
        for way in ((first, told.direction), (second, OPPOSITE[told.direction])):
            if way in ways:
                yield (
                    f"links.{ways[way]}.direction and {where}.direction contradict each other: "
                    f"both leave station {way[0]} towards {way[1]}"
                )
            ways[way] = i


OPPOSITE: Mapping[str, Side] = {
    "E": "W", "NE": "SW", "N": "S", "NW": "SE", "W": "E", "SW": "NE", "S": "N", "SE": "NW",
}  # fmt: skip


def _twice(places: Iterable[tuple[str, str]], noun: str) -> Iterator[str]:
    first: dict[str, str] = {}
    for where, key in places:
        if key in first:
            yield f"{first[key]} and {where} contradict each other about {noun} {key}"
        first[key] = where
