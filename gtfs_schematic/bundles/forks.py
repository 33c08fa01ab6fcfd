"""See where links that leave a station together part, and give the shared stretch as a link.

A station with more neighbours than the diagram has directions lets some of its links leave
together. On their common stretch all their lines are one bundle.
"""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, replace

from gtfs_schematic.bundles.slots import turn_angle
from gtfs_schematic.geometry import Point, unit_vector
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Line, Link

_Place = tuple[int, int]
"""Hundredths of a millimetre: whole numbers, in which a layout is exact."""


def with_forks(layout: Layout) -> Layout:
    """Give a layout with a fork wherever links part that left a station together.

    A fork is an end of links that is no station. The common stretch becomes a link of its own,
    with the lines of all links on it; every link keeps its id on the stretch that is its own.
    Courses run through the forks. A layout in which no links leave together is given back itself.
    """
    draft = _Draft(layout)
    for station in sorted(draft.at):
        draft.part(station, station, draft.leaving(station))
    return draft.layout() if draft.stems else layout


def without_crossings(
    layout: Layout, forked: Layout, orders: Mapping[str, tuple[str, ...]]
) -> Mapping[str, tuple[str, ...]]:
    """Order the lines of every common stretch as the links that part at its end have them.

    So nothing crosses at a fork; what must cross does so under the marker of the station. For any
    two lines on the stretch this saves a crossing at the fork or costs none at the station that
    it does not save.

    Parameters
    ----------
    layout, forked
        What `with_forks` took and gave.
    orders
        Per link id of `forked` its lines from left to right, seen from start to end.
    """
    fresh = dict(orders)
    stems = [k for k in forked.network.links if k.id not in layout.network.link]
    # A fork beyond a fork has the higher number, and comes first.
    for stem in sorted(stems, key=lambda k: _number(k.end), reverse=True):
        path = forked.paths[stem.id]
        into = unit_vector(path[-2], path[-1])
        branches = []
        for link in forked.network.links:
            if stem.end in (link.start, link.end) and link.id != stem.id:
                leaves = link.start == stem.end
                away = forked.paths[link.id][:: 1 if leaves else -1]
                turn = turn_angle(into, unit_vector(*away[:2]))
                branches.append((turn, fresh[link.id][:: 1 if leaves else -1]))
        lines = [line for _, order in sorted(branches) for line in order]
        fresh[stem.id] = tuple(dict.fromkeys(lines))
    return fresh


def _number(fork: str) -> int:
    return int(fork.split()[1])


@dataclass(frozen=True, slots=True)
class _Leaving:
    """A link as it leaves a station or fork."""

    link: str
    forward: bool
    path: tuple[_Place, ...]


class _Draft:
    """The layout while its links are cut."""

    def __init__(self, layout: Layout) -> None:
        self.base = layout
        self.links = {link.id: link for link in layout.network.links}
        self.paths = {
            key: tuple(_place(point) for point in layout.paths[key]) for key in self.links
        }
        self.at = {key: _place(point) for key, point in layout.positions.items()}
        self.stems: dict[str, Link] = {}
        self.count = 0
        self.ways: dict[tuple[str, str], list[str]] = defaultdict(list)
        """Per link and station the forks that the link passes as it leaves, in order."""
        self._around: dict[str, list[str]] = defaultdict(list)
        for link in layout.network.links:
            self._around[link.start].append(link.id)
            self._around[link.end].append(link.id)

    def leaving(self, station: str) -> list[_Leaving]:
        """Give the links of a station as they leave it."""
        found = []
        for key in self._around[station]:
            forward = self.links[key].start == station
            path = self.paths[key] if forward else self.paths[key][::-1]
            found.append(_Leaving(key, forward, path))
        return found

    def part(self, station: str, node: str, leaving: list[_Leaving]) -> None:
        """Cut links that leave a station, or a fork of it, together where the first parts."""
        together: dict[_Place, list[_Leaving]] = defaultdict(list)
        for each in leaving:
            together[_direction(each.path)].append(each)
        for group in (some for some in together.values() if len(some) > 1):
            common = _common([each.path for each in group])
            self.count += 1
            fork = f"fork {self.count} of {station}"
            self.at[fork] = common[-1]
            lines = sorted({line for each in group for line in self.links[each.link].lines})
            stem = Link(f"{node}, {fork}", node, fork, tuple(lines))
            self.stems[stem.id], self.paths[stem.id] = stem, common
            onward = []
            for each in group:
                rest = _after(each.path, common)
                link = self.links[each.link]
                self.links[each.link] = (
                    replace(link, start=fork) if each.forward else replace(link, end=fork)
                )
                self.paths[each.link] = rest if each.forward else rest[::-1]
                self.ways[each.link, station].append(fork)
                onward.append(_Leaving(each.link, each.forward, rest))
            self.part(station, fork, onward)

    def layout(self) -> Layout:
        """Give the cut layout."""
        network = self.base.network
        links = {**self.links, **self.stems}
        cut = replace(
            network,
            links=tuple(links[key] for key in sorted(links)),
            lines=tuple(self._line(line) for line in network.lines),
        )
        return replace(
            self.base,
            network=cut,
            positions={key: _point(self.at[key]) for key in sorted(self.at)},
            paths={key: tuple(map(_point, self.paths[key])) for key in sorted(self.paths)},
        )

    def _line(self, line: Line) -> Line:
        courses = []
        for course in line.courses:
            through = list(course[:1])
            for a, b in itertools.pairwise(course):
                link = self.base.network.link_between[frozenset((a, b))].id
                through += [*self.ways[link, a], *reversed(self.ways[link, b]), b]
            courses.append(tuple(through))
        return replace(line, courses=tuple(courses))


def _place(point: Point) -> _Place:
    return round(point[0] * 100), round(point[1] * 100)


def _point(place: _Place) -> Point:
    return place[0] / 100, place[1] / 100


def _direction(path: tuple[_Place, ...]) -> _Place:
    """Give the direction in which a path starts, by the signs and the ratio of its step."""
    dx, dy = path[1][0] - path[0][0], path[1][1] - path[0][1]
    long = max(abs(dx), abs(dy))
    return round(dx / long * 1000), round(dy / long * 1000)


def _common(paths: list[tuple[_Place, ...]]) -> tuple[_Place, ...]:
    """Give the corners of the stretch that all paths have in common from their start on."""
    first = paths[0]
    for other in paths[1:]:
        first = _both(first, other)
    return first


def _both(p: tuple[_Place, ...], q: tuple[_Place, ...]) -> tuple[_Place, ...]:
    common = [p[0]]
    i = j = 1
    while i < len(p) and j < len(q):
        ends = ((common[-1], p[i]), (common[-1], q[j]))
        if _direction(ends[0]) != _direction(ends[1]):
            break
        common.append(min(p[i], q[j], key=lambda place: _length(common[-1], place)))
        i, j = i + (common[-1] == p[i]), j + (common[-1] == q[j])
    return tuple(common)


def _after(path: tuple[_Place, ...], common: tuple[_Place, ...]) -> tuple[_Place, ...]:
    """Give what is left of a path behind its common stretch."""
    rest = path[len(common) - 1 :]
    return rest if rest[0] == common[-1] else (common[-1], *rest)


def _length(a: _Place, b: _Place) -> int:
    return max(abs(b[0] - a[0]), abs(b[1] - a[1]))
