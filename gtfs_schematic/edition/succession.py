"""Let the network of a new feed follow an edition: same ids for the same things, adjusted again.

What a person merged, split or hid is matched as it was before that: an edition's state holds the
network without adjustments, and so they survive whatever becomes of the feed's ids.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from gtfs_schematic.edition.adjusted import Adjusted, adjusted
from gtfs_schematic.edition.adjustments import Adjustments
from gtfs_schematic.edition.carry import carried_matches, with_carried_ids
from gtfs_schematic.edition.identity import SAID, Match, Matches, match_rosters
from gtfs_schematic.edition.make import stop_codes_of
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.roster import Roster, roster_of_edition, roster_of_network
from gtfs_schematic.edition.state import State
from gtfs_schematic.edition.stops import same_stops
from gtfs_schematic.edition.translated import translated
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.network.model import Network


@dataclass(frozen=True, slots=True)
class Succession:
    """A new network with the ids of the edition before."""

    raw: Network
    """Before any adjustment."""
    adjusted: Adjusted
    adjustments: Adjustments
    """With the stops and routes of the new feed."""
    matches: Matches
    """Of what is drawn, by the ids of the new edition."""


def succeed(
    before: Edition,
    state: State | None,
    read: tuple[Timetable, Network],
    adjustments: Adjustments,
) -> Succession:
    """Match a new network to an edition, give it the edition's ids, and adjust it.

    Parameters
    ----------
    before
        The edition.
    state
        What is kept beside it; None: only ids tell what was merged, split and hidden.
    read
        The new feed's timetable and network.
    adjustments
        By ids of the edition, or by stops and routes of its feed.

    Raises
    ------
    UsageError
        If two adjustments contradict each other; names both.
    """
    timetable, network = read
    old = roster_of_edition(before)
    if state is not None:
        codes = stop_codes_of(state.timetable, state.network)
        old = roster_of_network(state.network, codes, before.title)
    new = roster_of_network(network, stop_codes_of(timetable, network))
    found = match_rosters(old, new, adjustments)
    raw = with_carried_ids(network, old, found)
    matches = carried_matches(network, old, found)
    stops = same_stops(state.stops if state else (), timetable.stops, _pairs(old, raw))
    said = _of_now(adjustments, (old, raw), stops, matches if state is None else None)
    now = adjusted(raw, said, timetable)
    return Succession(raw, now, said, _of_drawn(matches, before, now.network))


def _pairs(old: Roster, raw: Network) -> list[tuple[tuple[str, ...], tuple[str, ...]]]:
    """Give the stops of each station of both, before and now."""
    return [(old.station[s.id].stop_ids, s.stop_ids) for s in raw.stations if s.id in old.station]


def _of_now(
    adjustments: Adjustments,
    networks: tuple[Roster, Network],
    stops: Mapping[str, str],
    parts: Matches | None,
) -> Adjustments:
    """Give adjustments that name stops or routes of the old feed by what stands for those now.

    Where only the edition's own stations are known (`parts`), merges get what these split into.
    """
    old, raw = networks
    known = {stop for s in raw.stations for stop in (*s.stop_ids, s.id)}
    routes = {route for k in raw.lines for route in (*k.route_ids, k.id)}
    stations = {
        stop: stops.get(stop, s.id) for s in old.stations for stop in s.stop_ids if stop != s.id
    }
    ids = {s.id for s in old.stations}
    stations = {key: now for key, now in stations.items() if key not in ids}
    lines = {
        route: k.id
        for k in old.lines
        for route in k.route_ids
        if route not in routes and route not in old.line
    }
    # A stop that the new feed has in another station is another stop.
    stations = {k: v for k, v in stations.items() if k not in known or stops.get(k) != k}
    found = translated(adjustments, stations, lines, stops)
    if parts is None:
        return found
    merges = []
    for merge in found.merge:
        split = [m.new_id for m in parts.split_stations if m.old_id in merge.stations]
        every = tuple(dict.fromkeys((*merge.stations, *split)))
        merges.append(merge.model_copy(update={"stations": every}))
    return found.model_copy(update={"merge": tuple(merges)})


def _of_drawn(matches: Matches, before: Edition, network: Network) -> Matches:
    """Keep the matches of what both editions draw."""
    old = {s.id for s in before.stations} | {k.id for k in before.lines}

    def drawn(some: Iterable[Match], now: Mapping[str, object]) -> tuple[Match, ...]:
        return tuple(m for m in some if m.old_id in old and m.new_id in now)

    stations, lines = network.station, network.line
    # The parts of a station that a person split are in no feed.
    parts = {s.id: Match(s.id, s.id, SAID, 1.0) for s in network.stations if s.id in old}
    return Matches(
        parts | {m.new_id: m for m in drawn(matches.stations.values(), stations)},
        {m.new_id: m for m in drawn(matches.lines.values(), lines)},
        drawn(matches.merged_stations, stations),
        drawn(matches.split_stations, stations),
        drawn(matches.merged_lines, lines),
        drawn(matches.split_lines, lines),
        matches.unknown,
    )
