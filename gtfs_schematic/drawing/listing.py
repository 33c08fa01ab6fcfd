"""The network in plain words: line by line, station by station, for who does not see the diagram.

Such descriptions are read aloud or on braille displays, so there are no tables and no signs that
carry meaning alone: one fact a line, headings in capitals, and lists that say how long they are.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator

from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.words import (
    MODE_NAMES,
    SERVICE_NOTES,
    alphabetical,
    hours,
    how_often,
    line_title,
    natural,
    notes,
    sentence,
    sheet_title,
    subtitle,
    walk_time,
)
from gtfs_schematic.network.model import Line, Network, Station


def to_text(network: Network, settings: DrawingSettings) -> bytes:
    """Give the description as UTF-8, every line's itineraries with their changes in full."""
    book = _Book(network, settings)
    return ("\n".join(book.rows()) + "\n").encode()


class _Book:
    """Writes one network."""

    def __init__(self, network: Network, settings: DrawingSettings) -> None:
        self.network, self.settings = network, settings
        self.lines = sorted(network.lines, key=lambda line: (natural(line.name), line.id))
        self.walks: dict[str, list[tuple[str, int | None]]] = {}
        for walk in network.walks:
            self.walks.setdefault(walk.start, []).append((walk.end, walk.time_s))
            self.walks.setdefault(walk.end, []).append((walk.start, walk.time_s))

    def rows(self) -> Iterator[str]:
        network = self.network
        yield _plain(sheet_title(network, self.settings))
        yield _plain(subtitle(network))
        yield (
            f"{_count(len(network.lines), 'line')} and {_count(len(network.stations), 'station')}. "
            "First every line with its stations in order, then every station in alphabetical "
            "order."
        )
        for line in self.lines:
            yield from self._line(line)
        yield ""
        yield "STATIONS"
        for station in sorted(network.stations, key=lambda s: (alphabetical(s.name), s.id)):
            yield self._station(station)
        yield ""
        yield "NOTES"
        yield from (_plain(note) for note in notes(network, self.settings))

    def _line(self, line: Line) -> Iterator[str]:
        mode = MODE_NAMES.get(line.mode, line.mode)
        yield ""
        yield _plain(f"LINE {line.name}: {mode}. {line_title(line, self.network)}.")
        runs = (SERVICE_NOTES[line.service], how_often(line), hours(line))
        yield f"Runs {sentence(runs)}."
        one_way = set(line.one_way_links)
        for calls in sorted(line.itineraries, key=lambda calls: (-len(calls), calls)):
            if len(calls) < 2:
                continue
            ring = calls[0] == calls[-1]
            start, end = self._name(calls[0]), self._name(calls[-1])
            count = _count(len(calls) - ring, "station")
            both = "" if one_way & set(itertools.pairwise(calls)) else ", and back"
            where = f"Ring from {start}" if ring else f"From {start} to {end}"
            yield _plain(f"{where}{both}, {count}:")
            for i, key in enumerate(calls[: len(calls) - ring], start=1):
                yield _plain(f"{i}. {self._call(self.network.station[key], line)}")

    def _call(self, station: Station, line: Line) -> str:
        """Write a station as the rider of a line meets it: with what can be changed to."""
        others = [each for each in self.lines if each.id in station.lines and each.id != line.id]
        changes = []
        if others:
            changes.append(f"change for {_names(others)}")
        for other, time in self._walks(station.id):
            changes.append(f"walk to {self._name(other)}{walk_time(time)}")
        return f"{station.name}: {'; '.join(changes)}" if changes else station.name

    def _station(self, station: Station) -> str:
        lines = [line for line in self.lines if line.id in station.lines]
        second = f" ({station.second_name})" if station.second_name else ""
        parts = [f"{station.name}{second}: {_names(lines) if lines else 'no line calls'}"]
        parts += [
            f"walk to {self._name(other)}{walk_time(time)}"
            for other, time in self._walks(station.id)
        ]
        if self.settings.show_step_free and station.boarding == "yes":
            parts.append("step-free according to the feed")
        return _plain(f"{'; '.join(parts)}.")

    def _walks(self, station_id: str) -> list[tuple[str, int | None]]:
        return sorted(
            self.walks.get(station_id, ()),
            key=lambda walk: (alphabetical(self._name(walk[0])), walk[0]),
        )

    def _name(self, station_id: str) -> str:
        return self.network.station[station_id].name


def _names(lines: list[Line]) -> str:
    names = list(dict.fromkeys(line.name for line in lines))
    return f"{'line' if len(names) == 1 else 'lines'} {', '.join(names)}"


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"


def _plain(text: str) -> str:
    """Keep a name from breaking the line that it stands in, or from steering a terminal."""
    return "".join(" " if letter.isspace() else letter for letter in text if _shows(letter))


def _shows(letter: str) -> bool:
    """Tell letters, blanks and joiners from marks that steer."""
    return letter.isspace() or letter.isprintable() or letter in "\u200c\u200d"
