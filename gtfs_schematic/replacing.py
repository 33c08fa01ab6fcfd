"""Move, bundle and label anew what an adjustment touches in a drawing that stands."""

from __future__ import annotations

import itertools
import math
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import shapely

from gtfs_schematic.bundles import check as bundles_check
from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.clearances import clearances_of
from gtfs_schematic.config import Settings
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.edition.adjusted import Adjusted
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.unmet import unmet_places
from gtfs_schematic.edition.wishes import WAYS, Wishes, passes_of
from gtfs_schematic.errors import LayoutError, must_be_sound
from gtfs_schematic.following import shifted
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import check as labels_check
from gtfs_schematic.labels.beside import place_beside
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.labels.place import place_labels
from gtfs_schematic.layout.keep import Standing
from gtfs_schematic.layout.model import Clearances, Layout, SheetFrame
from gtfs_schematic.lazily import lazily
from gtfs_schematic.network.model import Link, Network, Walk
from gtfs_schematic.progress import Progress

if TYPE_CHECKING:
    from gtfs_schematic.layout import revise
else:
    # Only what moves needs it.
    revise = lazily("gtfs_schematic.layout.revise")

_NEAR = 2
"""Within how many links others may give way at first."""
_TRIES = 4
"""How many places are tried for one wish."""
_LENGTHS = (1.0, 0.75, 1.25, 1.5, 0.5, 2.0)
"""Shares of a link's length that are tried when it is turned."""


def replaced(
    layout: Layout, steps: tuple[Network, Adjusted], settings: Settings, progress: Progress
) -> Layout:
    """Lay out an adjusted network beside what stands.

    First what stands gives way to what must be; then each wish for a direction or a straight
    line, as far as it can be met by moving one station. What is not met is for `unmet` to tell.

    Parameters
    ----------
    layout
        What stands, of the network before.
    steps
        The network before, and what was made of it now.
    settings
        With all wishes.
    progress
        Who listens.

    Raises
    ------
    LayoutError
        If there is no room for a station, a line or a pin.
    """
    old, new = steps
    network, wishes = new.network, new.wishes
    clearances = clearances_of(network, settings.bundles, settings.labels)
    standing = Standing(
        layout.positions,
        {**layout.paths, **layout.walk_paths},
        layout.sheet,
        rotation_deg=layout.rotation_deg,
        angles=layout.angles,
    )
    mover = _Mover(network, wishes, clearances, progress)
    frames = _frames(layout, (old, network), settings)
    tries = (mover.pinned(replace(standing, frame=frame)) for frame in frames)
    found = next((each for each in tries if each is not None), None)
    if found is None:
        pinned = [wishes.said[key] for key in wishes.said if key[0] in ("pins", "pins_from")]
        about = f" (asked for: {', '.join(sorted(pinned))})" if pinned else ""
        raise LayoutError(
            f"The drawing that stands has no room for this{about}. Choose another place, or draw "
            "the feed anew with these adjustments."
        )
    return mover.turned(found)


def _frames(
    layout: Layout, networks: tuple[Network, Network], settings: Settings
) -> list[SheetFrame]:
    """Give the parts of the sheet to try for the network: others if the key is another."""
    keys = [[(k.name, k.long_name, k.service, k.mode) for k in n.lines] for n in networks]
    if keys[0] == keys[1]:
        return [layout.sheet]
    size = f"{layout.sheet.width_mm:g}x{layout.sheet.height_mm:g}"
    sheet = settings.sheet.model_copy(update={"size": size, "orientation": "auto"})
    points = [point for path in layout.paths.values() for point in path]
    xs, ys = zip(*points, strict=True)

    def outside(frame: SheetFrame) -> float:
        beside = (frame.left_mm - min(xs), max(xs) - frame.right_mm)
        over = (frame.top_mm - min(ys), max(ys) - frame.bottom_mm)
        return float(round(max(0.0, *beside, *over), 1))

    return sorted(candidate_frames(networks[1], sheet, settings.drawing), key=outside)


class _Mover:
    """Moves stations in a drawing that stands."""

    def __init__(
        self, network: Network, wishes: Wishes, clearances: Clearances, progress: Progress
    ) -> None:
        self.network, self.wishes = network, wishes
        self.clearances, self.progress = clearances, progress

    def pinned(self, standing: Standing) -> Layout | None:
        """Put stations where their pins want them, and all else beside them."""
        pins = self._pins(standing.positions)
        off = {key: pin for key, pin in pins.items() if standing.positions.get(key) != pin}
        found = self._revised(standing, pins, _NEAR if off else None)
        if found is None and off:
            # With its links laid anew a station often needs nobody else to move.
            found = self._relaid(standing, off, _NEAR)
            if found is None:
                found = self._revised(standing, pins, None)
            if found is None:
                found = self._relaid(standing, off, None)
        return found

    def turned(self, layout: Layout) -> Layout:
        """Meet wishes for directions and straight lines, one after the other."""
        for name in ("directions", "straights"):
            for key in sorted(getattr(self.wishes, name)):
                wish = Wishes(said=self.wishes.said)
                getattr(wish, name)[key] = getattr(self.wishes, name)[key]
                if next(unmet_places(wish, layout), None) is not None:
                    layout = self._met(layout, name, key, wish)
        return layout

    def _met(self, layout: Layout, name: str, key: str, wish: Wishes) -> Layout:
        places = self._for_direction if name == "directions" else self._for_straight
        held = self._pins(layout.positions)
        tried = 0
        for station, place in places(layout, key):
            if station in held or tried == _TRIES or self._crowded(layout, station, place):
                continue
            tried += 1
            standing = Standing(
                layout.positions,
                {**layout.paths, **layout.walk_paths},
                layout.sheet,
                rotation_deg=layout.rotation_deg,
                angles=layout.angles,
            )
            found = self._relaid(standing, {station: place}, _NEAR)
            worse = found is None or any(
                True for _ in unmet_places(self._met_before(layout), found)
            )
            if found is not None and not worse and not list(unmet_places(wish, found)):
                return found
        return layout

    def _crowded(self, layout: Layout, station: str, place: Point) -> bool:
        """Whether another station or a foreign path is in the way of a place."""
        own = {key for key, k in self._edges() if station in (k.start, k.end)}
        others = [at for key, at in layout.positions.items() if key != station]
        paths = [p for key, p in {**layout.paths, **layout.walk_paths}.items() if key not in own]
        at = shapely.Point(place)
        frame = layout.sheet
        return (
            not (frame.left_mm <= place[0] <= frame.right_mm)
            or not (frame.top_mm <= place[1] <= frame.bottom_mm)
            or at.distance(shapely.MultiPoint(others)) < 0.5 * self.clearances.spacing_mm
            or at.distance(shapely.MultiLineString(paths)) < self.clearances.marker_mm
        )

    def _met_before(self, layout: Layout) -> Wishes:
        """Give the wishes that a layout meets already: they are not given up for another."""
        missed = {(name, key) for name, key, _ in unmet_places(self.wishes, layout)}
        kept = Wishes(said=self.wishes.said)
        for name in ("pins", "pins_from", "directions", "straights"):
            for key, value in getattr(self.wishes, name).items():
                if (name, key) not in missed:
                    getattr(kept, name)[key] = value
        return kept

    def _relaid(
        self, standing: Standing, places: Mapping[str, Point], reach: int | None
    ) -> Layout | None:
        """Move stations at once, and lay their links anew."""
        ends = {key: {k.start, k.end} for key, k in self._edges()}
        paths = {
            key: path
            for key, path in standing.paths.items()
            if not ends.get(key, set()) & set(places)
        }
        moved = replace(standing, positions={**standing.positions, **places}, paths=paths)
        pins = self._pins(moved.positions) | dict(places)
        return self._revised(moved, pins, reach)

    def _revised(
        self, standing: Standing, pins: Mapping[str, Point], reach: int | None
    ) -> Layout | None:
        found = revise.revise_layout(
            self.network,
            replace(standing, reach=reach),
            self.clearances,
            pins=pins,
            progress=self.progress,
        )
        return None if found is None else found.layout

    def _edges(self) -> Iterator[tuple[str, Link | Walk]]:
        yield from ((k.id, k) for k in self.network.links)
        yield from ((w.id, w) for w in self.network.walks)

    def _pins(self, positions: Mapping[str, Point]) -> dict[str, Point]:
        """Give all pins as places, those seen from other stations from where these stand."""
        pins = dict(self.wishes.pins)
        waiting = dict(self.wishes.pins_from)
        while waiting:
            for key in sorted(waiting):
                other, dx, dy = waiting[key]
                if other in waiting or other not in positions:
                    continue
                # What is seen from another station holds only if that one stays.
                x, y = pins.setdefault(other, positions[other])
                here = positions.get(key, (x, y))
                pins[key] = (
                    here[0] if dx is None else round(x + dx, 2),
                    here[1] if dy is None else round(y + dy, 2),
                )
                del waiting[key]
                break
            else:
                break
        return pins

    def _for_direction(self, layout: Layout, key: str) -> Iterator[tuple[str, Point]]:
        """Give places of either end at which a link may lead as wished."""
        link, way = self.network.link[key], WAYS[self.wishes.directions[key]]
        a, b = layout.positions[link.start], layout.positions[link.end]
        length = max(math.dist(a, b), self.clearances.spacing_mm)
        slant = 1.0 if 0 in way else math.sqrt(0.5)
        for share in _LENGTHS:
            step = max(share * length, self.clearances.spacing_mm) * slant
            yield link.end, (round(a[0] + way[0] * step, 2), round(a[1] + way[1] * step, 2))
            yield link.start, (round(b[0] - way[0] * step, 2), round(b[1] - way[1] * step, 2))

    def _for_straight(self, layout: Layout, station: str) -> Iterator[tuple[str, Point]]:
        """Give places of a station between its neighbors, on straight lines through one of them."""
        at = layout.positions
        for line in self.wishes.straights[station]:
            for before, after in passes_of(self.network, line, station):
                for a, b in ((before, after), (after, before)):
                    length = math.dist(at[a], at[station])
                    for way, share in itertools.product(WAYS.values(), (1.0, 0.75, 1.25)):
                        slant = 1.0 if 0 in way else math.sqrt(0.5)
                        step = max(share * length, self.clearances.spacing_mm) * slant
                        place = (
                            round(at[a][0] + way[0] * step, 2),
                            round(at[a][1] + way[1] * step, 2),
                        )
                        ahead = (at[b][0] - place[0]) * way[0] + (at[b][1] - place[1]) * way[1]
                        near = math.dist(place, at[station]) <= length
                        if ahead > 0.0 and near:
                            yield station, place


def rebundled(standing: LabelledLayout, orders: Mapping[str, Sequence[str]]) -> LabelledLayout:
    """Bundle a layout again, in the orders that it had as far as it has the same lines."""
    layout, settings = standing.bundled.layout, standing.bundled.settings
    lines = {link.id: set(link.lines) for link in layout.network.links}
    kept = {key: order for key, order in orders.items() if set(order) == lines.get(key)}
    bundled = bundle(layout, settings, previous=kept)
    must_be_sound("bundles", bundles_check.faults(bundled))
    return replace(standing, bundled=bundled)


def relabelled(
    standing: LabelledLayout, before: Edition, freed: Collection[str], *, badges_anew: bool
) -> LabelledLayout:
    """Place names beside those that stand; a name goes with its station.

    Those of the `freed` stations are placed anew. Only where a name would lose its place for it
    are all names placed again, on their sides if that can be.
    """
    was = {s.id: (s.x_mm, s.y_mm) for s in before.stations}
    at = standing.bundled.layout.positions
    labels = {
        key: shifted(label, (at[key][0] - was[key][0], at[key][1] - was[key][1]))
        for key, label in standing.labels.items()
        if key in at and key in was and key not in freed
    }
    badges = None if badges_anew else standing.run_badges
    settings = standing.settings
    labelled = place_beside(standing.bundled, settings, labels, badges)
    if set(labelled.unplaced) - set(standing.unplaced):
        sides = {key: label.side for key, label in labels.items()} | settings.sides
        asked = settings.model_copy(update={"sides": sides})
        anew = place_labels(standing.bundled, asked)
        if len(anew.unplaced) < len(labelled.unplaced):
            labelled = replace(anew, settings=settings)
    must_be_sound("labels", labels_check.faults(labelled))
    return labelled
