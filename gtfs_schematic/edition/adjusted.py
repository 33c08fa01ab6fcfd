"""Apply adjustments to a network: names, colors, what is hidden, merged and split."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TypeVar

from gtfs_schematic.drawing.contrast import contrast_ratio
from gtfs_schematic.edition.adjustments import Adjustments, LineAdjustment, StationAdjustment
from gtfs_schematic.edition.contradictions import station_contradictions
from gtfs_schematic.edition.grouping import group_lines
from gtfs_schematic.edition.rebuilt import Draft, rebuilt
from gtfs_schematic.edition.splitting import split_station
from gtfs_schematic.edition.wishes import Asked, Wishes
from gtfs_schematic.errors import UsageError
from gtfs_schematic.feed.model import LeftOut, Timetable
from gtfs_schematic.network.model import Line, Network, Station

Told = TypeVar("Told", StationAdjustment, LineAdjustment)
_Told = dict[str, tuple[str, Told]]
"""Per id where something is said of it, and what."""

_BLACK, _WHITE = "#000000", "#FFFFFF"


@dataclass(frozen=True, slots=True)
class Adjusted:
    """A network with adjustments applied, and what later stages must heed."""

    network: Network
    wishes: Wishes
    """What layout, bundles and labels are asked for."""
    stale: tuple[str, ...]
    """Adjustments that apply to nothing of this network; they are kept for the next."""


def adjusted(
    network: Network, adjustments: Adjustments, timetable: Timetable | None = None
) -> Adjusted:
    """Apply adjustments to a network, in this order.

    1. Stations are split, then merged; lines are grouped.
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
        If two adjustments contradict each other about one station, line or link; names both.
    """
    known = _Known(network, adjustments)
    draft = Draft.of(network)
    _regrouped(known, draft, adjustments, timetable)
    stations, lines = known.settled()
    for key, (_, told) in stations.items():
        if told.hide:
            draft.hide_station(key)
    for key, (_, line_told) in lines.items():
        if line_told.hide:
            draft.hide_line(key)
    result = rebuilt(network, draft)
    named = tuple(_named(s, stations, adjustments.abbreviations) for s in result.stations)
    colored = tuple(_told(line, lines.get(line.id)) for line in result.lines)
    result = replace(result, stations=named, lines=colored)
    links = [(f"links.{i}", told) for i, told in enumerate(adjustments.links)]
    wishes = Asked(result, known.station, known.line).wishes(stations, links, known.stale)
    said = [*_hidden(stations, lines), *(LeftOut("adjustment", *each) for each in known.stale)]
    left_out = sorted({*result.left_out, *said}, key=lambda o: (o.kind, o.id, o.reason))
    return Adjusted(
        replace(result, left_out=tuple(left_out)),
        wishes,
        tuple(f"{where}: {why}" for where, why in known.stale),
    )


def _regrouped(
    known: _Known, draft: Draft, adjustments: Adjustments, timetable: Timetable | None
) -> None:
    """Split and merge stations, and group lines."""
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
    for i, group in enumerate(adjustments.group):
        where = f"group {' '.join(group.lines)}"
        lines = [k for key in group.lines if (k := known.line(key, where)) is not None]
        hidden = [
            key for key in group.lines if key in adjustments.lines and adjustments.lines[key].hide
        ]
        if hidden:
            raise UsageError(
                f"group.{i} and lines.{hidden[0]}.hide contradict each other about one line."
            )
        if len(set(lines)) > 1:
            group_lines(draft, tuple(dict.fromkeys(lines)), group, timetable)
    known.refresh(draft)


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
        """Heed what has been merged, split and grouped."""
        before = self._stations
        now = {stop: s.id for s in draft.stations.values() for stop in s.stop_ids}
        self._stations = {
            key: draft.became.get(old, old) for key, old in before.items() if key not in now
        }
        self._stations |= now | {key: key for key in draft.stations}
        self._lines = {key: draft.line_became.get(old, old) for key, old in self._lines.items()}

    def station(self, key: str, where: str) -> str | None:
        """Give the id of the station that is meant; note where it is unknown."""
        if key not in self._stations:
            self.stale.append((where, f"no station or stop {key} is drawn"))
        return self._stations.get(key)

    def line(self, key: str, where: str) -> str | None:
        """Give the id of the line that is meant; note where it is unknown."""
        if key not in self._lines:
            self.stale.append((where, f"no line or route {key} is drawn"))
        return self._lines.get(key)

    def settled(self) -> tuple[_Told[StationAdjustment], _Told[LineAdjustment]]:
        """Gather where and what is said of each station and line; refuse what cannot all hold."""
        stations: _Told[StationAdjustment] = {}
        for key, told in sorted(self.adjustments.stations.items()):
            station = self.station(key, f"stations.{key}")
            if station is not None:
                stations[station] = _both(stations.get(station), f"stations.{key}", told)
        for where, told in stations.values():
            for found in station_contradictions(where, told):
                raise UsageError(f"{found}.")
        lines: _Told[LineAdjustment] = {}
        for key, line_told in sorted(self.adjustments.lines.items()):
            line = self.line(key, f"lines.{key}")
            if line is not None:
                lines[line] = _both(lines.get(line), f"lines.{key}", line_told)
        return stations, lines


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


def _named(station: Station, told: _Told[StationAdjustment], words: Mapping[str, str]) -> Station:
    given = told[station.id][1].name if station.id in told else ""
    return replace(station, name=given or abbreviated(station.name, words))


def abbreviated(name: str, words: Mapping[str, str]) -> str:
    """Write short forms for whole words of a name, longer words first."""
    short = name
    for word in sorted(words, key=lambda w: (-len(w), w)):
        short = words[word].join(re.split(rf"(?<!\w){re.escape(word)}(?!\w)", short))
    return " ".join(short.split()) or name


def _told(line: Line, said: tuple[str, LineAdjustment] | None) -> Line:
    if said is None:
        return line
    _, told = said
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


def _hidden(stations: _Told[StationAdjustment], lines: _Told[LineAdjustment]) -> Iterable[LeftOut]:
    for kind, told in (("station", stations), ("line", lines)):
        for key, (_, each) in told.items():
            if each.hide:
                note = f": {each.note}" if each.note else ""
                yield LeftOut(kind, key, f"hidden by an adjustment{note}")
