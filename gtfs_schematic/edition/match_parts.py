"""Find what became part of another: merged stations and lines; turned round, what was split off."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from gtfs_schematic.edition.evidence import likeness
from gtfs_schematic.edition.match_stations import StationMatching
from gtfs_schematic.edition.roster import Roster, RosterLine

Part = tuple[str, str, str, float]
"""Id of the part, id of the whole, reason, and how sure, 0 … 1."""

_TRUSTED = 1.5
_NAMED_M = 150.0
_BESIDE_M = 50.0
_ALIKE = 0.85
_MOST = 0.8
"""Share of a line's links that must have come from, or gone to, the other."""


def absorbed_stations(old: Roster, new: Roster, known: Mapping[str, str]) -> Iterator[Part]:
    """Find old stations without a match that a matched new station took in.

    1. It has stop ids of theirs, where the feeds keep ids.
    2. It has their name, and lies no further than 150 m away.
    3. It lies within 50 m, and most of their neighbours are its own.

    Parameters
    ----------
    old, new
        The two rosters.
    known
        New ids by old of what matches.
    """
    matching = StationMatching(old, new)
    trusted = matching.worths[0].agree >= _TRUSTED
    matched = set(known.values())
    beside = matching.beside([s.id not in known for s in matching.rows], _NAMED_M)
    for i, others in beside.items():
        station = matching.rows[i]
        judged = []
        for other in (matching.columns[j] for j in others):
            away = matching.meters((i, matching.column_of[other.id]))
            if other.id not in matched:
                continue
            if trusted and set(station.stop_ids) & set(other.stop_ids):
                judged.append((0.95, -away, other.id, "its stop ids"))
            elif away > _NAMED_M:
                continue
            elif likeness(station.name, other.name) >= _ALIKE:
                judged.append((0.8, -away, other.id, f"its name, {away:.0f} m away"))
            elif away <= _BESIDE_M and _serves(old, new, known, (station.id, other.id)):
                judged.append((0.6, -away, other.id, f"its neighbors, {away:.0f} m away"))
        if judged:
            sure, _, whole, why = max(judged)
            yield station.id, whole, why, sure


def _serves(old: Roster, new: Roster, known: Mapping[str, str], pair: tuple[str, str]) -> bool:
    """Whether the whole has the neighbours of the part."""
    part, whole = pair
    around = [known[s] for s in sorted(old.neighbors[part]) if s in known]
    own = {whole} | new.neighbors[whole]
    hits = sum(s in own for s in around)
    return bool(around) and whole not in around and hits >= _MOST * len(around)


def absorbed_lines(
    old: Roster, new: Roster, stations: Mapping[str, str], lines: Mapping[str, str]
) -> Iterator[Part]:
    """Find old lines without a match whose links a matched new line took over.

    Links that the new line already had as the old line that it is do not count: a line withdrawn
    beside another was not merged with it.

    Parameters
    ----------
    old, new
        The two rosters.
    stations, lines
        New ids by old of what matches.
    """
    before = {new_id: old_id for old_id, new_id in lines.items()}
    for line in sorted(old.lines, key=lambda k: k.id):
        if line.id in lines:
            continue
        mine = _mapped(old, line, stations)
        if not mine:
            continue
        shares = []
        for other in new.lines:
            if other.id not in before or other.mode != line.mode:
                continue
            gained = new.links_of[other.id] - _mapped(old, old.line[before[other.id]], stations)
            shares.append((-len(mine & gained) / len(mine), other.id))
        share, best = min(shares, default=(0.0, ""))
        if -share >= _MOST:
            named = bool(set(line.route_ids) & set(new.line[best].route_ids))
            yield line.id, best, f"{-share:.0%} of its links", 0.95 if named else 0.75


def _mapped(old: Roster, line: RosterLine, known: Mapping[str, str]) -> frozenset[frozenset[str]]:
    """Give a line's links by the new ids of their stations, as far as these are known."""
    return frozenset(
        frozenset(known[s] for s in link)
        for link in old.links_of[line.id]
        if all(s in known for s in link)
    )
