"""What became of stations and walks between two rosters with the same ids for the same things."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from pyproj import Geod

from gtfs_schematic.edition.differences import Change, ChangeLimits, Kind, listed
from gtfs_schematic.edition.roster import Roster, RosterStation

_EARTH = Geod(ellps="WGS84")
_LEAST_M = 0.5
"""Coordinates that differ by less are rounded otherwise."""
_BOARDING = {"unknown": "not said", "yes": "step-free", "no": "not step-free"}


def station_changes(
    old: Roster, new: Roster, parts: Mapping[str, str], limits: ChangeLimits
) -> Iterator[Change]:
    """Compare stations.

    Parameters
    ----------
    old, new
        The rosters.
    parts
        Per id of a gone station the new one that it became part of, and per id of a new station
        the old one that it was part of.
    limits
        What is small.
    """
    names = [{k.id: k.name for k in roster.lines} for roster in (old, new)]
    for key in sorted(set(old.station) | set(new.station)):
        before, after = old.station.get(key), new.station.get(key)
        if before is None and after is not None:
            lines = f"lines {listed(after.lines, names[1])}"
            if key in parts:
                was = old.station[parts[key]]
                places = (key, was.id)
                yield Change("station", "split", key, after.name, was.name, lines, places)
            else:
                yield Change("station", "new", key, after.name, "", lines, (key,))
        elif before is not None and after is None:
            lines = f"lines {listed(before.lines, names[0])}"
            if key in parts:
                now = new.station[parts[key]]
                places = (key, now.id)
                yield Change("station", "merged", key, before.name, lines, now.name, places)
            else:
                yield Change("station", "gone", key, before.name, lines, "", (key,))
        elif before is not None and after is not None:
            yield from _kept(before, after, names, limits)


def _kept(
    old: RosterStation, new: RosterStation, lines: list[dict[str, str]], limits: ChangeLimits
) -> Iterator[Change]:
    def change(kind: Kind, before: str, after: str, *, small: bool = False) -> Change:
        return Change("station", kind, new.id, new.name, before, after, (new.id,), small)

    if old.name != new.name:
        yield change("renamed", old.name, new.name)
    if old.second_name != new.second_name:
        yield change("second name", old.second_name, new.second_name)
    if set(old.stop_ids) != set(new.stop_ids):
        kind: Kind = "stops" if set(old.stop_ids) & set(new.stop_ids) else "renumbered"
        yield change(kind, *_exchanged(old.stop_ids, new.stop_ids))
    if set(old.stop_codes) != set(new.stop_codes):
        yield change("codes", *_exchanged(old.stop_codes, new.stop_codes))
    if old.boarding != new.boarding:
        yield change("step-free", _BOARDING[old.boarding], _BOARDING[new.boarding])
    away = _EARTH.inv(old.lon, old.lat, new.lon, new.lat)[2]
    if away >= _LEAST_M:
        small = away < limits.moved_m
        yield change("moved", "", f"{away:.0f} m on the ground", small=small)
    if set(old.lines) != set(new.lines):
        gone = [k for k in old.lines if k not in new.lines]
        come = [k for k in new.lines if k not in old.lines]
        yield change(
            "lines",
            f"without {listed(gone, lines[0])} now" if gone else "",
            f"with {listed(come, lines[1])} now" if come else "",
        )


def _exchanged(old: tuple[str, ...], new: tuple[str, ...]) -> tuple[str, str]:
    """Give what is gone and what has come."""
    return " ".join(k for k in old if k not in new), " ".join(k for k in new if k not in old)


def walk_changes(old: Roster, new: Roster) -> Iterator[Change]:
    """Compare walks."""
    times = [{frozenset((a, b)): s for a, b, s in roster.walks} for roster in (old, new)]
    for pair in sorted(set(times[0]) | set(times[1]), key=sorted):
        ids = tuple(sorted(pair))
        roster = new if pair in times[1] else old
        name = " – ".join(roster.station[s].name for s in ids)
        key = "~~".join(ids)
        if pair not in times[0]:
            yield Change("walk", "new", key, name, "", _minutes(times[1][pair]), ids)
        elif pair not in times[1]:
            yield Change("walk", "gone", key, name, _minutes(times[0][pair]), "", ids)
        elif times[0][pair] != times[1][pair]:
            before, after = (_minutes(each[pair]) for each in times)
            yield Change("walk", "time", key, name, before, after, ids)


def _minutes(seconds: int | None) -> str:
    return "on foot" if seconds is None else f"{seconds} s on foot"
