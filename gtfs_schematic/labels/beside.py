"""Places names beside those that stand: only what must find a place looks for one."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

import numpy as np
import shapely

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.labels.along import run_badges
from gtfs_schematic.labels.blocks import Block
from gtfs_schematic.labels.choice import Choice, Problem, cheapest, solve
from gtfs_schematic.labels.costs import NOT_ASKED
from gtfs_schematic.labels.model import Label, LabelledLayout, LabelSettings, RunBadge
from gtfs_schematic.labels.neighbors import neighbors_of
from gtfs_schematic.labels.obstacles import Obstacles, obstacles_of
from gtfs_schematic.labels.place import label_at
from gtfs_schematic.labels.positions import Candidate
from gtfs_schematic.labels.problem import Entry, entries_of, state_problem
from gtfs_schematic.labels.reach import ANYWHERE, FAR, NEAR, Reach
from gtfs_schematic.labels.site import Site, sites_of

_WORK = 1.0
"""Limit of a solve in CP-SAT's deterministic seconds."""
_SWEEPS = 6
_NOT_ASKED = round(10 * NOT_ASKED)
"""Costs in whole numbers are ten times those of `costs`."""
_TOLERANCE_MM = 0.01
_NO_BLOCK = Block((), (), 0.0, 0.0, 0.0, 0.0, 0.0, 0.0)


def place_beside(
    bundled: BundledLayout,
    settings: LabelSettings,
    standing: Mapping[str, Label],
    badges: Sequence[RunBadge] | None = None,
) -> LabelledLayout:
    """Place the names that have no place, or one that no longer does, beside all others.

    Parameters
    ----------
    bundled
        Lines and markers.
    settings
        Sizes and wishes.
    standing
        Labels of a drawing before, by station id; each stays if it still says the station's name,
        is free of lines and markers, and is what a person wants.
    badges
        Names along lines that stand; those that a name comes over go. None: placed anew.

    Returns
    -------
    LabelledLayout
        A name that finds no place with the remark on it stands without, as do names near it.
    """
    found = _placed(bundled, settings, standing, badges)
    # A remark may stand in the way of another name, too: the nearest go first.
    given_up = 0
    while found.unplaced and given_up < len(settings.remarks):
        given_up = max(len(set(found.unplaced) & set(settings.remarks)), 2 * given_up, 1)
        kept = _by_distance(bundled, found.unplaced, settings.remarks)[given_up:]
        remarks = {key: settings.remarks[key] for key in sorted(kept)}
        bare = settings.model_copy(update={"remarks": remarks})
        found = replace(_placed(bundled, bare, standing, badges), settings=settings)
    return found


def _by_distance(bundled: BundledLayout, lost: Sequence[str], stations: Iterable[str]) -> list[str]:
    """Give stations by their distance from the nearest of those lost, the nearest first."""
    at = bundled.layout.positions
    away = {
        key: round(min(math.dist(at[key], at[other]) for other in lost), 2)
        for key in stations
        if key in at
    }
    return sorted(away, key=lambda key: (away[key], key))


def _placed(
    bundled: BundledLayout,
    settings: LabelSettings,
    standing: Mapping[str, Label],
    badges: Sequence[RunBadge] | None,
) -> LabelledLayout:
    sites = sites_of(bundled, settings)
    obstacles = obstacles_of(bundled, settings)
    kept = _still_good(sites, obstacles, settings, standing)
    search = _Search(bundled, settings, sites, obstacles, kept)
    chosen = search.run()
    labels = {
        site.station_id: kept.get(site.station_id) or label_at(chosen[site.station_id])
        for site in sites
        if site.station_id in chosen
    }
    for key, entry in chosen.items():
        if key in kept and entry.candidate.block is not _NO_BLOCK:
            labels[key] = label_at(entry)
    every = tuple(labels[key] for key in sorted(labels))
    short = {s.station_id: s.name for s in sites if s.shortened and s.station_id in labels}
    return LabelledLayout(
        bundled=bundled,
        settings=settings,
        labels={key: labels[key] for key in sorted(labels)},
        unplaced=tuple(site.station_id for site in sites if site.station_id not in labels),
        abbreviated=short,
        run_badges=(
            run_badges(bundled, settings, obstacles, every)
            if badges is None
            else _uncovered(badges, every)
        ),
    )


def _still_good(
    sites: Sequence[Site],
    obstacles: Obstacles,
    settings: LabelSettings,
    standing: Mapping[str, Label],
) -> dict[str, Label]:
    """Give the labels that may stay as they are."""
    same = [
        standing[site.station_id]
        for site in sites
        if site.station_id in standing and _says(standing[site.station_id], site, settings)
    ]
    corners = np.array([label.outline_mm for label in same]).reshape(-1, 4, 2)
    blocked = obstacles.blocked(corners).tolist()
    free = [label for label, bad in zip(same, blocked, strict=True) if not bad]
    return _apart(free, settings.clearance_mm)


def _apart(labels: Sequence[Label], clearance_mm: float) -> dict[str, Label]:
    """Give labels that keep their distance, without those that are nearest to most others."""
    boxes = np.array([shapely.Polygon(label.outline_mm) for label in labels], dtype=object)
    tree = shapely.STRtree(boxes)
    reach = clearance_mm - _TOLERANCE_MM
    near: dict[int, set[int]] = {i: set() for i in range(len(labels))}
    for i, j in tree.query(boxes, predicate="dwithin", distance=reach).T.tolist():
        if i != j:
            near[i].add(j)
    while True:
        worst = max(near, key=lambda i: (len(near[i]), i), default=None)
        if worst is None or not near[worst]:
            return {labels[i].station_id: labels[i] for i in sorted(near)}
        for other in near.pop(worst):
            near[other].discard(worst)


def _says(label: Label, site: Site, settings: LabelSettings) -> bool:
    """Tell whether a label says what it should, as a person wants it."""
    rows = tuple(row.text for row in label.lines if not row.second)
    second = "".join(row.text for row in label.lines if row.second)
    badges = tuple((badge.line_id, badge.text) for badge in label.badges)
    return (
        _bare(" ".join(rows)) == _bare(site.name)
        and _bare(second) == _bare(site.second_name)
        and label.bold == site.bold
        and badges in ((), tuple(sorted(site.badges)), site.badges)
        and (not site.rows or rows == site.rows)
        and label.side == settings.sides.get(site.station_id, label.side)
        and (site.angle is None or -label.angle_deg == site.angle)
    )


def _bare(text: str) -> str:
    return "".join(text.split())


class _Search:
    """Looks for places for the names that have none, first near, then ever further."""

    def __init__(
        self,
        bundled: BundledLayout,
        settings: LabelSettings,
        sites: Sequence[Site],
        obstacles: Obstacles,
        kept: Mapping[str, Label],
    ) -> None:
        self.sites, self.obstacles, self.settings = sites, obstacles, settings
        self.neighbors = neighbors_of(bundled, sites)
        self.groups: dict[str, list[Entry]] = {
            site.station_id: [_held(site, kept[site.station_id])] if site.station_id in kept else []
            for site in sites
        }
        self.free = {site.station_id for site in sites if site.station_id not in kept}

    def run(self) -> dict[str, Entry]:
        """Give an entry per station that has a place."""
        chosen: dict[str, Entry] = {}
        waiting = set(self.free)
        for reach in (NEAR, FAR, ANYWHERE):
            self._widen(waiting, reach)
            chosen = self._choose(self.free)
            # A name that stands otherwise than a person asks looks on, too.
            unasked = {key for key in self.free & set(chosen) if chosen[key].cost >= _NOT_ASKED}
            waiting = (self.free - set(chosen)) | unasked
            if not waiting:
                return chosen
        # Those in the way may change places, too: beside their own they get more.
        near = self._in_the_way(waiting)
        self._widen(near, FAR)
        return self._choose(self.free | near, exactly=True)

    def _widen(self, stations: set[str], reach: Reach) -> None:
        some = [site for site in self.sites if site.station_id in stations]
        if not some:
            return
        found = entries_of(some, self.obstacles, self.settings, reach)
        for key, entries in found.items():
            self.groups[key] = [*self.groups[key], *entries]

    def _choose(self, free: set[str], *, exactly: bool = False) -> dict[str, Entry]:
        groups = [self.groups[site.station_id] for site in self.sites]
        held = [self.groups[key][0] for key in self.groups if key not in self.free]
        problem, listed = state_problem(
            groups, self.neighbors, (self.settings.clearance_mm, 0.0), held=held
        )
        number = {id(entry): i for i, entry in enumerate(listed)}
        start = [
            None if site.station_id in self.free else number[id(self.groups[site.station_id][0])]
            for site in self.sites
        ]
        self._fill(problem, start)
        index = {i for i, site in enumerate(self.sites) if site.station_id in free}
        choice: Choice = tuple(start)
        if exactly:
            choice = solve(problem, choice, index, work=_WORK)
        return {
            site.station_id: listed[i]
            for site, i in zip(self.sites, choice, strict=True)
            if i is not None
        }

    def _fill(self, problem: Problem, choice: list[int | None]) -> None:
        """Give the stations without a place the cheapest beside the others, the tightest first."""
        order = [i for i, chosen in enumerate(choice) if chosen is None]
        order.sort(key=lambda i: (len(problem.groups[i]), i))
        for _ in range(_SWEEPS):
            before = tuple(choice)
            for i in order:
                choice[i] = cheapest(problem, choice, i)
            if tuple(choice) == before:
                break

    def _in_the_way(self, waiting: set[str]) -> set[str]:
        """Give the stations whose names stand where one that waits could."""
        boxes = np.array(
            [
                entry.box
                for key in sorted(waiting)
                for entry in self.groups[key]
                if entry.cost < _NOT_ASKED
            ]
        )
        held = {key: group[0].box for key, group in self.groups.items() if key not in self.free}
        if not len(boxes) or not held:
            return set()
        ids = sorted(held)
        tree = shapely.STRtree(np.array([held[key] for key in ids]))
        hits = tree.query(boxes, predicate="dwithin", distance=self.settings.clearance_mm)
        return {ids[i] for i in hits[1].tolist()}


def _held(site: Site, label: Label) -> Entry:
    """Give the entry of a label that stands."""
    candidate = Candidate(
        site, _NO_BLOCK, label.side, label.pivot_mm, label.pivot_mm, (0.0, 0.0),
        label.angle_deg, len(label.lines), 0.0, 1.0, bare=False,
    )  # fmt: skip
    return Entry(candidate, shapely.Polygon(label.outline_mm), 0)


def _uncovered(badges: Sequence[RunBadge], labels: Sequence[Label]) -> tuple[RunBadge, ...]:
    """Give the names along lines that no label comes over."""
    tree = shapely.STRtree(np.array([shapely.Polygon(label.outline_mm) for label in labels]))
    boxes = []
    for badge in badges:
        (x, y), w, h = badge.at_mm, badge.width_mm / 2.0, badge.height_mm / 2.0
        box = shapely.box(x - w, y - h, x + w, y + h)
        boxes.append(shapely.affinity.rotate(box, badge.angle_deg))
    hit = set(tree.query(np.array(boxes), predicate="intersects")[0].tolist()) if boxes else set()
    return tuple(badge for i, badge in enumerate(badges) if i not in hit)
