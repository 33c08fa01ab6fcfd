"""Gives every station of a bundled layout a place for its name."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.labels.along import run_badges
from gtfs_schematic.labels.choice import Choice, Problem, greedy, solve
from gtfs_schematic.labels.mend import mended
from gtfs_schematic.labels.model import Label, LabelledLayout, LabelSettings
from gtfs_schematic.labels.neighbors import Neighbors, neighbors_of
from gtfs_schematic.labels.obstacles import Obstacles, obstacles_of
from gtfs_schematic.labels.problem import ROW_SPACE_MM, Entry, entries_of, state_problem
from gtfs_schematic.labels.reach import ANYWHERE, FAR, NEAR
from gtfs_schematic.labels.site import Site, sites_of
from gtfs_schematic.progress import Progress, Silent

_SILENT = Silent()
_WORK = (1.0, 2.0)
"""Limits of the first and the second solve in CP-SAT's deterministic seconds."""


def place_labels(
    bundled: BundledLayout,
    settings: LabelSettings,
    *,
    widen: bool = True,
    progress: Progress = _SILENT,
) -> LabelledLayout:
    """Place the name of every station.

    No label touches a line, walk, marker or other label or leaves the frame, each by the
    clearance of the settings. Where the usual places do not do, labels are pushed further out,
    broken into more rows and set at 90 % of their size, at last abbreviated; what still finds no
    place is listed.
    """
    progress.phase("placing names", 3)
    sites = sites_of(bundled, settings)
    obstacles = obstacles_of(bundled, settings)
    neighbors = neighbors_of(bundled, sites)
    entries = entries_of(sites, obstacles, settings, NEAR)
    progress.step()
    groups = [entries[site.station_id] for site in sites]
    problem, listed = state_problem(groups, neighbors, (settings.clearance_mm, ROW_SPACE_MM))
    choice = solve(problem, mended(problem, greedy(problem)), work=_WORK[0])
    progress.step()
    chosen = _chosen(sites, choice, listed)
    if widen and len(chosen) < len(sites):
        chosen = _widen(sites, entries, chosen, (obstacles, neighbors, settings))
    short = _shortened(sites, chosen, settings) if widen else sites
    if short != sites:
        chosen = _widen(short, entries, chosen, (obstacles, neighbors, settings))
    progress.step()
    labels = {station_id: label_at(chosen[station_id]) for station_id in sorted(chosen)}
    return LabelledLayout(
        bundled=bundled,
        settings=settings,
        labels=labels,
        abbreviated={
            station_id: chosen[station_id].candidate.site.name
            for station_id in sorted(chosen)
            if chosen[station_id].candidate.site.shortened
        },
        unplaced=tuple(site.station_id for site in sites if site.station_id not in chosen),
        run_badges=run_badges(bundled, settings, obstacles, tuple(labels.values())),
    )


def _shortened(
    sites: tuple[Site, ...], chosen: dict[str, Entry], settings: LabelSettings
) -> tuple[Site, ...]:
    """Give the sites, with the words of names that found no place in their short forms."""
    found = []
    for site in sites:
        words = [settings.abbreviations.get(word, word) for word in site.name.split(" ")]
        name = " ".join(words)
        lost = site.station_id not in chosen and name != site.name and not site.rows
        found.append(replace(site, name=name, shortened=True) if lost else site)
    return tuple(found)


def _chosen(sites: Sequence[Site], choice: Choice, listed: Sequence[Entry]) -> dict[str, Entry]:
    """Give the chosen entry per station id."""
    return {
        site.station_id: listed[i] for site, i in zip(sites, choice, strict=True) if i is not None
    }


def _widen(
    sites: Sequence[Site],
    entries: dict[str, list[Entry]],
    chosen: dict[str, Entry],
    surroundings: tuple[Obstacles, Sequence[Neighbors], LabelSettings],
) -> dict[str, Entry]:
    """Choose again round the stations without a label, with more places for them and theirs.

    The labels in the way of any of their places may change too.
    """
    obstacles, neighbors, settings = surroundings
    lost = [i for i, site in enumerate(sites) if site.station_id not in chosen]
    more = dict(entries)
    wide = lost
    for reach in (ANYWHERE, FAR):  # first for the lost ones, then for all that are in their way
        new = [sites[i] for i in wide if more[sites[i].station_id] is entries[sites[i].station_id]]
        for station_id, found in entries_of(new, obstacles, settings, reach).items():
            more[station_id] = [*entries[station_id], *found]
        groups = [more[site.station_id] for site in sites]
        problem, listed = state_problem(
            groups, neighbors, (settings.clearance_mm, 0.0), held=tuple(chosen.values())
        )
        wide = sorted(_around(problem, lost))
    number = {id(entry): i for i, entry in enumerate(listed)}
    start: Choice = tuple(
        number[id(chosen[site.station_id])] if site.station_id in chosen else None for site in sites
    )
    better = mended(problem, start)
    changed = {i for i, (old, new) in enumerate(zip(start, better, strict=True)) if old != new}
    free = {*wide, *changed}
    return _chosen(sites, solve(problem, better, free, work=_WORK[1]), listed)


def _around(problem: Problem, stations: Sequence[int]) -> set[int]:
    """Give some stations and all that one of their candidates excludes a candidate of."""
    found = set(stations)
    for station in stations:
        for candidate in problem.groups[station]:
            found |= {problem.station_of[other] for other in problem.conflicts[candidate]}
    return found


def label_at(entry: Entry) -> Label:
    """Give the label that stands at an entry's place."""
    candidate = entry.candidate
    lines, badges = candidate.block.moved(candidate.origin)
    return Label(
        station_id=candidate.site.station_id,
        bold=candidate.site.bold,
        pivot_mm=candidate.pivot,
        angle_deg=candidate.angle_deg,
        side=candidate.side,
        lines=lines,
        outline_mm=candidate.corners(),
        badges=badges,
    )
