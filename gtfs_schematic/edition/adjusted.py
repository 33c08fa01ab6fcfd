"""Apply adjustments to a network: names, colors, what is hidden, merged and split."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TypeVar

from gtfs_schematic.drawing.contrast import contrast_ratio
from gtfs_schematic.edition.adjustments import Adjustments, LineAdjustment, StationAdjustment
from gtfs_schematic.edition.rebuilt import Draft, rebuilt
from gtfs_schematic.edition.splitting import split_station
from gtfs_schematic.errors import UsageError
from gtfs_schematic.feed.model import LeftOut, Timetable
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import Side
from gtfs_schematic.network.model import Line, Network, Station

Told = TypeVar("Told", StationAdjustment, LineAdjustment)

_BLACK, _WHITE = "#000000", "#FFFFFF"


@dataclass(frozen=True, slots=True)
class Adjusted:
    """A network with adjustments applied, and what later stages must heed."""

    network: Network
    sides: Mapping[str, Side]
    """Per station id the side of its name, for `LabelSettings.sides`."""
    pins: Mapping[str, Point]
    """Per station id its place on the sheet, millimetres, for `LayoutSettings.pins`."""
    stale: tuple[str, ...]
    """Adjustments that apply to nothing of this network; they are kept for the next."""


def adjusted(
    network: Network, adjustments: Adjustments, timetable: Timetable | None = None
) -> Adjusted:
    """Apply adjustments to a network, in this order.

    1. Stations are split, then merged.
    2. Stations and lines are hidden: lines pass, and what is left without a second call goes.
    3. Words of names are abbreviated; names and colors that a person gave stand as they are.

    Parameters
    ----------
    network
        Is not altered.
    adjustments
        Keyed by ids of stations and lines, or of their stops and routes.
    timetable
        What the network was built from; without it no station can be split.

    Raises
    ------
    UsageError
        If two adjustments contradict each other about one station or line; names both.
    """
    known = _Known(network, adjustments)
    draft = Draft.of(network)
    for each in adjustments.split:
        station = known.station(each.station, f"split {each.station}")
        if station is not None:
            for missing in split_station(draft, station, each.parts, timetable):
                known.stale.append((f"split {each.station}", missing))
    # Parts have ids of their own, which merges, names and pins may mean.
    known.refresh(draft)
    for merge in adjustments.merge:
        where = f"merge {' '.join(merge.stations)}"
        ids = [s for key in merge.stations if (s := known.station(key, where)) is not None]
        if len(set(ids)) > 1:
            draft.merge(tuple(dict.fromkeys(ids)), merge.name)
    known.refresh(draft)
    stations, lines = known.settled()
    for key, told in stations.items():
        if told.hide:
            draft.hide_station(key)
    for key, line_told in lines.items():
        if line_told.hide:
            draft.hide_line(key)
    result = rebuilt(network, draft)
    named = tuple(_named(s, stations, adjustments.abbreviations) for s in result.stations)
    colored = tuple(_told(line, lines.get(line.id)) for line in result.lines)
    said = [*_hidden(stations, lines), *(LeftOut("adjustment", *each) for each in known.stale)]
    left_out = sorted({*result.left_out, *said}, key=lambda o: (o.kind, o.id, o.reason))
    drawn = {station.id for station in named}
    return Adjusted(
        replace(result, stations=named, lines=colored, left_out=tuple(left_out)),
        {k: t.label_side for k, t in stations.items() if t.label_side and k in drawn},
        {k: t.pin_mm for k, t in stations.items() if t.pin_mm and k in drawn},
        tuple(f"{where}: {why}" for where, why in known.stale),
    )


class _Known:
    """Which station or line a key means."""

    def __init__(self, network: Network, adjustments: Adjustments) -> None:
        self.adjustments = adjustments
        self.stale: list[tuple[str, str]] = []
        self._lines = {route: k.id for k in network.lines for route in k.route_ids}
        self._lines |= {k.id: k.id for k in network.lines}
        self._stations = {stop: s.id for s in network.stations for stop in s.stop_ids}
        self._stations |= {s.id: s.id for s in network.stations}

    def refresh(self, draft: Draft) -> None:
        """Heed what has been merged and split."""
        before = self._stations
        now = {stop: s.id for s in draft.stations.values() for stop in s.stop_ids}
        self._stations = {
            key: draft.became.get(old, old) for key, old in before.items() if key not in now
        }
        self._stations |= now | {key: key for key in draft.stations}

    def station(self, key: str, where: str) -> str | None:
        """Give the id of the station that is meant; note where it is unknown."""
        if key not in self._stations:
            self.stale.append((where, f"no station or stop {key} is drawn"))
        return self._stations.get(key)

    def settled(self) -> tuple[dict[str, StationAdjustment], dict[str, LineAdjustment]]:
        """Gather what is said of each station and line, and refuse what cannot all hold."""
        stations: dict[str, tuple[str, StationAdjustment]] = {}
        for key, told in sorted(self.adjustments.stations.items()):
            station = self.station(key, f"stations.{key}")
            if station is None:
                continue
            where = f"stations.{key}"
            if told.hide and (told.pin_mm or told.label_side or told.name):
                other = "pin_mm" if told.pin_mm else "label_side" if told.label_side else "name"
                raise UsageError(f"{where}.hide and {where}.{other} contradict each other.")
            stations[station] = _both(stations.get(station), where, told)
        lines: dict[str, tuple[str, LineAdjustment]] = {}
        for key, line_told in sorted(self.adjustments.lines.items()):
            line = self._lines.get(key)
            if line is None:
                self.stale.append((f"lines.{key}", f"no line or route {key} is drawn"))
            else:
                lines[line] = _both(lines.get(line), f"lines.{key}", line_told)
        _pins_apart({where: t.pin_mm for where, t in stations.values() if t.pin_mm})
        return (
            {key: told for key, (_, told) in stations.items()},
            {key: told for key, (_, told) in lines.items()},
        )


def _both(first: tuple[str, Told] | None, where: str, told: Told) -> tuple[str, Told]:
    """Put together what two keys say of one thing."""
    if first is None:
        return where, told
    one, other = first[1].model_dump(exclude_defaults=True), told.model_dump(exclude_defaults=True)
    for key in sorted(set(one) & set(other)):
        if one[key] != other[key]:
            raise UsageError(
                f"{first[0]}.{key} and {where}.{key} contradict each other: both mean the same "
                f"{'station' if isinstance(told, StationAdjustment) else 'line'}."
            )
    return f"{first[0]}, {where}", first[1].model_copy(update=told.model_dump(exclude_unset=True))


def _pins_apart(pins: Mapping[str, Point]) -> None:
    """Refuse two stations in one place."""
    seen: dict[Point, str] = {}
    for where, pin in pins.items():
        if pin in seen:
            raise UsageError(f"{seen[pin]}.pin_mm and {where}.pin_mm are the same place.")
        seen[pin] = where


def _named(
    station: Station, told: Mapping[str, StationAdjustment], words: Mapping[str, str]
) -> Station:
    given = told[station.id].name if station.id in told else ""
    return replace(station, name=given or abbreviated(station.name, words))


def abbreviated(name: str, words: Mapping[str, str]) -> str:
    """Write short forms for whole words of a name, longer words first."""
    short = name
    for word in sorted(words, key=lambda w: (-len(w), w)):
        short = words[word].join(re.split(rf"(?<!\w){re.escape(word)}(?!\w)", short))
    return " ".join(short.split()) or name


def _told(line: Line, told: LineAdjustment | None) -> Line:
    if told is None:
        return line
    color = (told.color or line.color).upper()
    text = (told.text_color or line.text_color).upper()
    if told.color and not told.text_color:
        text = max(_BLACK, _WHITE, key=lambda ink: contrast_ratio(ink, color))
    return replace(
        line,
        name=told.name or line.name,
        color=color,
        text_color=text,
        # A person's choice stands like the feed's: nothing later may replace it.
        color_from_feed=line.color_from_feed or bool(told.color),
    )


def _hidden(
    stations: Mapping[str, StationAdjustment],
    lines: Mapping[str, LineAdjustment],
) -> Iterable[LeftOut]:
    for kind, told in (("station", stations), ("line", lines)):
        for key, each in told.items():
            if each.hide:
                note = f": {each.note}" if each.note else ""
                yield LeftOut(kind, key, f"hidden by an adjustment{note}")
