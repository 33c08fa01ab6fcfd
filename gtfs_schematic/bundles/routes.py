"""Cut every line into stretches: unbroken courses, from a terminus or branch to the next."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from gtfs_schematic.bundles.junction import Junction, Pass
from gtfs_schematic.bundles.slots import turn_angle
from gtfs_schematic.layout.model import Layout

_Ways = dict[tuple[str, str], str]


@dataclass(frozen=True, slots=True)
class Route:
    """The links of one stretch, in order."""

    line_id: str
    links: tuple[tuple[str, bool], ...]
    """Link ids, and whether the stretch runs through them from `start` to `end`."""
    closed: bool
    start_join: Pass | None
    """The pass by which the first link joins another stretch of the line, None at a terminus."""
    end_join: Pass | None


def cut_into_routes(layout: Layout, nodes: Mapping[str, Junction]) -> tuple[Route, ...]:
    """Give the routes of all lines; every link of a line lies on exactly one of them.

    Where a line branches, the smoothest of its passes goes through, and the other branch ends
    on it. At a junction, where no marker covers a gap, all branches that belong together do.
    """
    links: dict[str, list[str]] = {line.id: [] for line in layout.network.lines}
    for link in layout.network.links:
        for line_id in link.lines:
            links[line_id].append(link.id)
    ways: dict[str, _Ways] = defaultdict(dict)
    joins: dict[str, dict[tuple[str, str], Pass]] = defaultdict(dict)
    for junction in nodes.values():
        bare = junction.station_id in layout.network.junction
        ending = []
        for way in sorted(junction.passes, key=lambda way: _sharpness(junction, way)):
            ends = _ends(junction, way)
            through = ways[way.line_id]
            if through.keys().isdisjoint(ends) and not (bare and _joins(junction, way, through)):
                through[ends[0]], through[ends[1]] = way.second, way.first
            else:
                ending.append(way)
        if bare:
            ending.sort(key=lambda way: ways[way.line_id].keys().isdisjoint(_ends(junction, way)))
        for way in ending:
            for end in _ends(junction, way):
                joins[way.line_id].setdefault(end, way)
    return tuple(
        route
        for line in layout.network.lines
        for route in _line_routes(layout, line.id, links[line.id], (ways[line.id], joins[line.id]))
    )


def _ends(junction: Junction, way: Pass) -> tuple[tuple[str, str], tuple[str, str]]:
    return (way.first, junction.station_id), (way.second, junction.station_id)


def _joins(junction: Junction, way: Pass, through: _Ways) -> bool:
    """Whether the line passes from either link of a pass to one that it goes through already."""
    links = {way.first, way.second}
    return any(
        other.line_id == way.line_id
        and not links.isdisjoint((other.first, other.second))
        and not through.keys().isdisjoint(_ends(junction, other))
        for other in junction.passes
    )


def _sharpness(junction: Junction, way: Pass) -> tuple[float, str, str, str]:
    into = junction.leg[way.first].direction
    turn = turn_angle((-into[0], -into[1]), junction.leg[way.second].direction)
    return (round(abs(turn), 6), way.line_id, way.first, way.second)


def _line_routes(
    layout: Layout,
    line_id: str,
    links: list[str],
    passes: tuple[_Ways, dict[tuple[str, str], Pass]],
) -> Iterator[Route]:
    ways, joins = passes
    link_of = layout.network.link
    done: set[str] = set()

    def is_inner(link_id: str) -> bool:
        link = link_of[link_id]
        return (link_id, link.start) in ways and (link_id, link.end) in ways

    for seed in sorted(links, key=lambda link_id: (is_inner(link_id), link_id)):
        if seed in done:
            continue
        link = link_of[seed]
        closed = is_inner(seed)
        first_station = link.end if (seed, link.start) in ways and not closed else link.start
        at = first_station
        run: list[tuple[str, bool]] = []
        step: str | None = seed
        while step is not None and step not in done:
            done.add(step)
            link = link_of[step]
            run.append((step, link.start == at))
            at = link.end if link.start == at else link.start
            step = ways.get((step, at))
        yield Route(
            line_id,
            tuple(run),
            closed,
            None if closed else joins.get((seed, first_station)),
            None if closed else joins.get((run[-1][0], at)),
        )
