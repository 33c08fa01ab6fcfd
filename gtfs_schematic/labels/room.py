"""Says where names stand, and where those without a place are to stand, for the layout.

A name without a place asks for the place that lacks least: the sum of what lines and other names
would have to give way, each along the axis in which that is least.
"""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.anywhere import around
from gtfs_schematic.labels.costs import own_cost
from gtfs_schematic.labels.model import Label, LabelledLayout
from gtfs_schematic.labels.positions import Candidate, positions
from gtfs_schematic.labels.problem import WORD_SPACE_MM, grown_corners, row_space
from gtfs_schematic.labels.reach import Reach
from gtfs_schematic.labels.site import Site, sites_of
from gtfs_schematic.layout.model import NameRoom

_ASKED = Reach()
_IN_WEDGES = Reach(around_mm=10.0)
_WITHIN_MM = 40.0
_LACK = 2.0
"""Cost of a millimetre that a line would have to give way, in the units of `costs`."""
_LACK_NAME = 1.0
"""The same of a name, which may go elsewhere."""
_CLEAR_MM = 0.9
_IN_VAIN = 8.0
"""Cost of a place that was asked for before."""
_SAME_MM = 3.0
_LEVEL_MM = 0.03
_AIR_SHARE = 0.7
_MARKER_MM = 2.0
_PUSHED_MM = 5.0
_FURTHER = 1.5
"""Cost of a millimetre that a name is pushed from its marker."""

Floats = NDArray[np.float64]

_ANGLES = np.radians(45.0 * np.arange(8))
_NORMALS = np.round(np.column_stack([np.cos(_ANGLES), np.sin(_ANGLES)]), 12)


def name_rooms(labelled: LabelledLayout, before: Sequence[NameRoom] = ()) -> tuple[NameRoom, ...]:
    """Give where every name stands or is to stand, sorted by station id.

    Names that nothing can be asked for are left out: every place lies on their station's own lines.
    Places that were asked for `before` in vain are asked for again only if others lack far more.
    """
    in_vain: dict[str, list[NameRoom]] = defaultdict(list)
    for room in before:
        if not room.stands:
            in_vain[room.station_id].append(room)
    positions_of = labelled.bundled.layout.positions
    sites = {site.station_id: site for site in sites_of(labelled.bundled, labelled.settings)}
    drawn = _Drawn(labelled)
    rooms = []
    for station_id in sorted(sites):
        label = labelled.labels.get(station_id)
        if label is not None:
            grown = grown_corners(
                np.array([label.outline_mm]), WORD_SPACE_MM, row_space(bold=label.bold) / 2.0
            )[0]
            outline = _seen_from([(float(x), float(y)) for x, y in grown], positions_of[station_id])
            rooms.append(NameRoom(station_id, outline, stands=True))
            continue
        found = drawn.least_lacking(sites[station_id], in_vain[station_id])
        if found is not None:
            outline = _seen_from([(float(x), float(y)) for x, y in found], positions_of[station_id])
            rooms.append(NameRoom(station_id, outline, stands=False))
    return tuple(rooms)


def _seen_from(outline: Sequence[Point], at: Point) -> tuple[Point, ...]:
    return tuple((x - at[0], y - at[1]) for x, y in outline)


class _Drawn:
    """What names keep clear of: straight pieces of links and walks, and the names that stand."""

    def __init__(self, labelled: LabelledLayout) -> None:
        self.labelled = labelled
        layout, half_of = labelled.bundled.layout, _half_widths(labelled.bundled)
        ends, halves = [], []
        for key, path in (*sorted(layout.paths.items()), *sorted(layout.walk_paths.items())):
            for a, b in itertools.pairwise(path):
                ends.append((a, b))
                halves.append(half_of[key])
        self.ends = np.array(ends)
        stations = sorted(layout.network.station)
        self.places = np.array([layout.positions[key] for key in stations])
        self.stations = shapely.STRtree(shapely.points(self.places))
        self.apart = np.array(halves) + _CLEAR_MM
        self.lines = shapely.linestrings(self.ends)
        self.tree = shapely.STRtree(self.lines)
        labels: list[Label] = [labelled.labels[key] for key in sorted(labelled.labels)]
        self.outlines = [np.array(label.outline_mm) for label in labels]
        self.names = shapely.STRtree(shapely.polygons(self.outlines) if labels else [])

    def least_lacking(self, site: Site, in_vain: Sequence[NameRoom]) -> Floats | None:
        """Give the place for a name for which lines and names have to give way least."""
        near = np.sort(self.tree.query(shapely.Point(site.at), "dwithin", distance=_WITHIN_MM))
        own = self._is_own(near, site)
        corners, cost = self._places(site, near[own])
        if not len(corners):
            return None
        low = (corners @ _NORMALS.T).min(axis=1)
        cost += _LACK * self._lacking(low, site, near[~own])
        cost += _LACK_NAME * self._lacking_names(corners, low)
        cost += _LACK * self._lacking_air(corners, site)
        for room in in_vain:
            apart = np.abs(corners - site.at - np.array(room.outline_mm)).max(axis=(1, 2))
            cost += np.where(apart < _SAME_MM, _IN_VAIN, 0.0)
        frame = self.labelled.bundled.layout.sheet
        over = [
            frame.left_mm - corners[:, :, 0].min(axis=1),
            corners[:, :, 0].max(axis=1) - frame.right_mm,
            frame.top_mm - corners[:, :, 1].min(axis=1),
            corners[:, :, 1].max(axis=1) - frame.bottom_mm,
        ]
        cost += np.where(np.max(over, axis=0) > 0.0, np.inf, 0.0)
        best = int(np.argmin(np.round(cost, 6)))
        return corners[best] if np.isfinite(cost[best]) else None

    def _is_own(self, near: NDArray[np.int64], site: Site) -> NDArray[np.bool_]:
        """Tell which segments leave the station or run on straight from it; they cannot yield."""
        octants, level, _ = self._rays(near, site)
        return np.asarray(level & np.isin(octants, self._leaving(site)))

    def _leaving(self, site: Site) -> NDArray[np.int64]:
        """Give the octants in which links and walks leave a station."""
        near = self.tree.query(shapely.Point(site.at), "dwithin", distance=_LEVEL_MM)
        octants, level, touching = self._rays(near, site)
        return np.unique(octants[level & touching])

    def _rays(
        self, near: NDArray[np.int64], site: Site
    ) -> tuple[NDArray[np.int64], NDArray[np.bool_], NDArray[np.bool_]]:
        """Give the octant of each segment's further end, if it leads to the station, touches it."""
        a, b = self.ends[near, 0] - site.at, self.ends[near, 1] - site.at
        level = np.abs(a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]) < _LEVEL_MM * np.hypot(*(b - a).T)
        far = np.where((np.hypot(*a.T) > np.hypot(*b.T))[:, None], a, b)
        octants = np.rint(np.degrees(np.arctan2(far[:, 1], far[:, 0])) / 45.0).astype(int) % 8
        touching = np.minimum(np.abs(a).max(axis=1), np.abs(b).max(axis=1)) < _LEVEL_MM
        return octants, level, touching

    def _places(self, site: Site, own: NDArray[np.int64]) -> tuple[Floats, Floats]:
        """Give boxes off the station's own lines, and the cost of each.

        The usual places, pushed off; where there are none, places in the wedges between the lines.
        """
        settings = self.labelled.settings
        candidates = list(positions(site, settings, _ASKED))
        corners = np.array([candidate.corners() for candidate in candidates]).reshape(-1, 4, 2)
        push = self._push_off(corners, candidates, own)
        off = np.flatnonzero(np.isfinite(push[:, 0]))
        candidates = [candidates[i] for i in off.tolist()]
        corners, further = corners[off] + push[off][:, None, :], np.hypot(*push[off].T)
        if not candidates:
            candidates, corners = around(
                site, settings, _IN_WEDGES, lambda boxes: ~self._hit(boxes, own)
            )
            further = shapely.distance(shapely.polygons(corners), shapely.Point(site.at))
        cost = np.array([own_cost(candidate, settings) for candidate in candidates])
        return corners, cost + _FURTHER * further

    def _hit(self, corners: Floats, own: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Tell which boxes lie on some segments."""
        boxes = shapely.polygons(corners)
        hit = np.zeros(len(corners), dtype=bool)
        for k in own.tolist():
            hit |= shapely.dwithin(boxes, self.lines[k], self.apart[k] - 0.3)
        return hit

    def _push_off(
        self, corners: Floats, candidates: Sequence[Candidate], own: NDArray[np.int64]
    ) -> Floats:
        """Give how far each box is pushed off its station's own lines; not a number if in vain."""
        vectors = np.array([candidate.push for candidate in candidates]).reshape(-1, 2)
        push = np.full((len(corners), 2), np.nan)
        left = np.arange(len(corners))
        for length in np.arange(0.0, _PUSHED_MM, 0.5):
            hit = self._hit(corners[left] + (vectors[left] * length)[:, None, :], own)
            push[left[~hit]] = vectors[left[~hit]] * length
            left = left[hit]
            if not len(left):
                break
        return push

    def _lacking(self, low: Floats, site: Site, near: NDArray[np.int64]) -> Floats:
        """Give by how much the segments near by would have to give way, per box.

        Those that give way along one axis go together: only the furthest counts.
        """
        along = self.ends[near] @ _NORMALS.T
        high, facing = along.max(axis=1), np.round(along, 6).argmax(axis=1)
        marker = np.array(site.at) @ _NORMALS.T - high
        gaps = low[None] - high[:, None]
        need = self.apart[near][:, None, None]
        # An end on a line that leaves the station stays level with it: that axis gives no room.
        rel = self.ends[near][np.arange(len(near))[:, None], facing] - site.at
        octants = np.rint(np.degrees(np.arctan2(rel[..., 1], rel[..., 0])) / 45.0).astype(int) % 8
        fixed = (np.abs(marker) < _LEVEL_MM) & np.isin(octants, self._leaving(site))
        usable = (marker > -_LEVEL_MM)[:, None] & (~fixed[:, None] | (gaps >= need))
        lack = np.maximum(0.0, need - np.where(usable, gaps, -np.inf))
        axis, least = lack.argmin(axis=2), lack.min(axis=2, initial=np.inf)
        most = np.zeros((8, len(low)))
        np.maximum.at(most, (axis, np.arange(len(low))[None, :]), least)
        return np.asarray(most.sum(axis=0))

    def _lacking_air(self, corners: Floats, site: Site) -> Floats:
        """Give what lacks to the nearest foreign marker, so that the name does not seem its own."""
        boxes = shapely.polygons(corners)
        air = _AIR_SHARE * np.maximum(0.0, shapely.distance(boxes, shapely.Point(site.at)) - 2.0)
        lack = np.zeros(len(corners))
        box, other = self.stations.query(boxes, "dwithin", distance=air + _MARKER_MM)
        foreign = np.abs(self.places[other] - site.at).max(axis=1, initial=0.0) > _LEVEL_MM
        box, other = box[foreign], other[foreign]
        gaps = shapely.distance(boxes[box], shapely.points(self.places[other])) - _MARKER_MM
        np.maximum.at(lack, box, air[box] - gaps)
        return lack

    def _lacking_names(self, corners: Floats, low: Floats) -> Floats:
        """Give what the names near by lack in all, per box."""
        lack = np.zeros(len(corners))
        box, name = self.names.query(shapely.polygons(corners), "dwithin", distance=_CLEAR_MM)
        if not len(box):
            return lack
        high = np.array([(outline @ _NORMALS.T).max(axis=0) for outline in self.outlines])
        gaps = (low[box] - high[name]).max(axis=1)
        np.add.at(lack, box, np.maximum(0.0, _CLEAR_MM - gaps))
        return lack


def _half_widths(bundled: BundledLayout) -> dict[str, float]:
    """Give half the width of what is drawn along each link and walk, markers included."""
    network, settings = bundled.layout.network, bundled.settings
    pitch = settings.line_width_mm + settings.line_gap_mm
    halves = {walk.id: settings.line_width_mm / 4.0 for walk in network.walks}
    for link in network.links:
        halves[link.id] = (len(link.lines) * pitch - settings.line_gap_mm) / 2.0
    return halves
