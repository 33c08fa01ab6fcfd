"""Tell which stations and lines of a new network are those of an earlier edition, and how surely.

Ids are hints, not proof: feeds renumber. What pairs share is weighed (evidence.py) and the
likeliest pairs are chosen together (pairing.py); stations and lines in turn, since each tell of
the other.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Protocol

from gtfs_schematic.edition.adjustments import Adjustments, Same
from gtfs_schematic.edition.match_lines import LineMatching
from gtfs_schematic.edition.match_parts import Part, absorbed_lines, absorbed_stations
from gtfs_schematic.edition.match_stations import Found, StationMatching
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.roster import Roster, roster_of_edition, roster_of_network
from gtfs_schematic.network.model import Network

DOUBTFUL = 0.8
"""Less sure matches are for a person to look at."""
_ROUNDS = 5
"""Stations and lines settle after two or three rounds."""
SAID = "an adjustment says so"


@dataclass(frozen=True, slots=True)
class Match:
    """A station or line of the new network, and the one of the edition that it is."""

    new_id: str
    old_id: str
    reason: str
    confidence: float
    """From 0 to 1."""


@dataclass(frozen=True, slots=True)
class Matches:
    """All matches, by new id; what is in neither map is new, or gone."""

    stations: Mapping[str, Match]
    lines: Mapping[str, Match]
    merged_stations: tuple[Match, ...] = ()
    """Old stations without a match that became part of a new one that has another."""
    split_stations: tuple[Match, ...] = ()
    """New stations without a match that were part of an old one that has another."""
    merged_lines: tuple[Match, ...] = ()
    split_lines: tuple[Match, ...] = ()
    unknown: tuple[str, ...] = ()
    """Adjustments that name what neither feed has."""

    @property
    def doubtful(self) -> tuple[Match, ...]:
        """Matches that a person should look at, the least sure first."""
        every = [*self.stations.values(), *self.lines.values()]
        every += [*self.merged_stations, *self.split_stations]
        every += [*self.merged_lines, *self.split_lines]
        found = [match for match in every if match.confidence < DOUBTFUL]
        return tuple(sorted(found, key=lambda m: (m.confidence, m.new_id, m.old_id)))


def match_edition(
    edition: Edition,
    network: Network,
    stop_codes: Mapping[str, tuple[str, ...]] | None = None,
    adjustments: Adjustments | None = None,
) -> Matches:
    """Match a network's stations and lines to those of an earlier edition.

    Parameters
    ----------
    edition
        The earlier edition.
    network
        The network of the new feed, with ids of its own.
    stop_codes
        Per station id of the network the codes at its stops (`make.stop_codes_of`).
    adjustments
        What a person says of the same and the not the same.
    """
    return match_rosters(
        roster_of_edition(edition), roster_of_network(network, stop_codes), adjustments
    )


def match_rosters(old: Roster, new: Roster, adjustments: Adjustments | None = None) -> Matches:
    """Match the stations and lines of two rosters; the other way round gives the same pairs.

    Parameters
    ----------
    old, new
        Any two; their ids need not agree in anything.
    adjustments
        What a person says of the same and the not the same.
    """
    said = adjustments or Adjustments()
    fixed_stations = _Said(said.same_station, old.stations, new.stations)
    fixed_lines = _Said(said.same_line, old.lines, new.lines)
    # Ties are broken by the order of rows and columns: it must not matter which roster is which.
    turned = _content(new) < _content(old)
    first, second = (new, old) if turned else (old, new)
    found = _settled(
        StationMatching(first, second),
        LineMatching(first, second),
        fixed_stations.turned(turned),
        fixed_lines.turned(turned),
    )
    stations, lines = (_turned(each) if turned else each for each in found)
    pairs = {key: new_id for key, (new_id, _, _) in stations.items()}
    line_pairs = {key: new_id for key, (new_id, _, _) in lines.items()}
    back, lines_back = ({b: a for a, b in each.items()} for each in (pairs, line_pairs))
    return Matches(
        {b: Match(b, a, why, sure) for a, b, why, sure in _rows(stations)},
        {b: Match(b, a, why, sure) for a, b, why, sure in _rows(lines)},
        _parts(absorbed_stations(old, new, pairs)),
        _parts(absorbed_stations(new, old, back), turned=True),
        _parts(absorbed_lines(old, new, pairs, line_pairs)),
        _parts(absorbed_lines(new, old, back, lines_back), turned=True),
        (*fixed_stations.unknown("same_station"), *fixed_lines.unknown("same_line")),
    )


def _settled(
    stations: StationMatching, lines: LineMatching, fixed: _Said, fixed_lines: _Said
) -> tuple[Found, Found]:
    """Match stations and lines in turn until nothing changes."""
    matched: Found = {}
    matched_lines: Found = {}
    for _ in range(_ROUNDS):
        before = (_ids(matched), _ids(matched_lines))
        matched = stations.matched(*before, fixed.settled) | fixed.found
        matched_lines = lines.matched(_ids(matched), fixed_lines.settled) | fixed_lines.found
        if (_ids(matched), _ids(matched_lines)) == before:
            break
    return matched, matched_lines


class _HasIds(Protocol):
    @property
    def id(self) -> str:
        """Its id."""


class _Said:
    """What adjustments say, by the ids of the two rosters."""

    def __init__(
        self, same: Iterable[Same], old: Iterable[_HasIds], new: Iterable[_HasIds]
    ) -> None:
        self._lost: list[tuple[int, str]] = []
        self.found: Found = {}
        ids_old, ids_new = _resolver(old), _resolver(new)
        gone: set[str] = set()
        for i, each in enumerate(same):
            a = ids_old.get(each.old)
            b = ids_new.get(each.new) if each.new else None
            if a is None or (each.new and b is None):
                self._lost.append((i, each.old if a is None else each.new))
            elif b is None:
                gone.add(a)
            else:
                self.found[a] = (b, SAID, 1.0)
        self.settled = ({*self.found, *gone}, {b for b, _, _ in self.found.values()})

    def turned(self, turned: bool) -> _Said:  # noqa: FBT001 - private, and its name says it
        """Give the same with old and new exchanged, if so."""
        if turned:
            self.settled = (self.settled[1], self.settled[0])
            self.found = _turned(self.found)
        return self

    def unknown(self, kind: str) -> list[str]:
        """Name the adjustments that apply to nothing."""
        return [f"{kind}.{i}: {key} is in neither feed" for i, key in self._lost]


def _resolver(things: Iterable[_HasIds]) -> dict[str, str]:
    """Per id, and per stop or route id, the id of the thing; its own id wins."""
    found: dict[str, str] = {}
    for thing in things:
        for part in getattr(thing, "stop_ids", ()) or getattr(thing, "route_ids", ()):
            found[part] = thing.id
    return found | {thing.id: thing.id for thing in things}


def _ids(found: Found) -> dict[str, str]:
    return {key: found[key][0] for key in sorted(found)}


def _turned(found: Found) -> Found:
    return {b: (a, why, sure) for a, (b, why, sure) in found.items()}


def _rows(found: Found) -> list[tuple[str, str, str, float]]:
    rows = [(a, b, why, round(sure, 3)) for a, (b, why, sure) in found.items()]
    return sorted(rows, key=lambda row: row[1])


def _parts(parts: Iterable[Part], *, turned: bool = False) -> tuple[Match, ...]:
    """Give parts of old things as matches, or parts of new things if turned."""
    return tuple(
        Match(part, whole, why, sure) if turned else Match(whole, part, why, sure)
        for part, whole, why, sure in parts
    )


def _content(roster: Roster) -> list[tuple[str, float, float, str]]:
    """Give a key that orders rosters by what they hold."""
    return sorted((s.name, s.lon, s.lat, s.id) for s in roster.stations)
