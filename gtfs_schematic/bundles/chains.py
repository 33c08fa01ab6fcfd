"""Shrink a network for ordering: lines into teams, links into chains that share one order.

Reductions after Bast, Brosi, Storandt 2018 ("Efficient Generation of Geographically Accurate
Transit Maps"): lines that always travel together become one, links joined by a mere pass become
one, and links of one line need no order.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass

from gtfs_schematic.bundles.junction import Junction, Pass
from gtfs_schematic.geometry import left_normal, unit_vector
from gtfs_schematic.layout.model import Layout

Branches = Mapping[str, frozenset[tuple[str, str]]]
"""Per line the link ends (station, link) from which it goes on to several links."""


@dataclass(frozen=True, slots=True)
class Chain:
    """Links in a row that share one order of their teams."""

    links: tuple[tuple[str, bool], ...]
    """Link ids, and whether the chain runs through them from `start` to `end`."""
    teams: tuple[int, ...]
    ascending: bool
    """Whether route order from left to right along the chain reads downwards on the sheet."""


def find_branches(nodes: Mapping[str, Junction]) -> Branches:
    """Give the branching link ends of every line that has any."""
    counts: dict[str, Counter[tuple[str, str]]] = defaultdict(Counter)
    for junction in nodes.values():
        for way in junction.passes:
            for link_id in (way.first, way.second):
                counts[way.line_id][junction.station_id, link_id] += 1
    found = {
        line_id: frozenset(end for end, count in ends.items() if count > 1)
        for line_id, ends in counts.items()
    }
    return {line_id: ends for line_id, ends in found.items() if ends}


def find_teams(
    layout: Layout,
    nodes: Mapping[str, Junction],
    branches: Branches,
    single: Collection[str] = (),
) -> tuple[tuple[str, ...], ...]:
    """Merge lines with the same links and passes; a line that branches stays alone.

    Two lines that branch alike must cross each other, so they are no team. Nor are lines that
    are to be ordered one by one (`single`).
    """
    uses: dict[str, list[tuple[str, ...]]] = {line.id: [] for line in layout.network.lines}
    for link in layout.network.links:
        for line_id in link.lines:
            uses[line_id].append((link.id,))
    for junction in nodes.values():
        for way in junction.passes:
            uses[way.line_id].append((junction.station_id, way.first, way.second))
    merged: dict[tuple[tuple[str, ...], ...], list[str]] = defaultdict(list)
    for line in layout.network.lines:
        alone = ((line.id,),) if line.id in branches or line.id in single else ()
        merged[(*uses[line.id], *alone)].append(line.id)
    return tuple(tuple(members) for members in merged.values())


def find_chains(
    layout: Layout, nodes: Mapping[str, Junction], branches: Branches, team_of: Mapping[str, int]
) -> tuple[Chain, ...]:
    """Give the chains of all links with at least two lines."""
    link_of = layout.network.link
    onward: dict[tuple[str, str], str] = {}
    for junction in nodes.values():
        for first, second in _mere_passes(layout, junction, branches):
            onward[first, junction.station_id] = second
            onward[second, junction.station_id] = first
    done: set[str] = set()
    chains: list[Chain] = []
    links = [link for link in layout.network.links if len(link.lines) > 1]
    for seed in sorted(links, key=lambda k: all((k.id, end) in onward for end in (k.start, k.end))):
        if seed.id in done:
            continue
        at = seed.end if (seed.id, seed.start) in onward else seed.start
        run: list[tuple[str, bool]] = []
        step: str | None = seed.id
        while step is not None and step not in done:
            done.add(step)
            link = link_of[step]
            run.append((step, link.start == at))
            at = link.end if link.start == at else link.start
            step = onward.get((step, at))
        teams = sorted({team_of[line_id] for line_id in seed.lines})
        chains.append(Chain(tuple(run), tuple(teams), _reads_down(layout, run)))
    return tuple(chains)


def _mere_passes(
    layout: Layout, junction: Junction, branches: Branches
) -> Iterator[tuple[str, str]]:
    """Give pairs of links that carry the same lines, all of which go on from one to the other.

    Giving both the same order costs no more, for crossings can be put off to the chain's end;
    except where two lines branch alike at both ends, when crossing between the branches costs
    one and at either end two.
    """
    ways: dict[str, set[Pass]] = defaultdict(set)
    for way in junction.passes:
        ways[way.first].add(way)
        ways[way.second].add(way)
    for first, second in sorted({(way.first, way.second) for way in junction.passes}):
        lines = layout.network.link[first].lines
        wanted = {Pass(line_id, first, second) for line_id in lines}
        alike = Counter(end for line_id in lines for end in branches.get(line_id, ()))
        if (
            lines == layout.network.link[second].lines
            and ways[first] == wanted == ways[second]
            and sum(count > 1 for count in alike.values()) < 2
        ):
            yield first, second


def _reads_down(layout: Layout, run: list[tuple[str, bool]]) -> bool:
    """Say whether the left of a chain is up on the sheet, or left where it runs straight down."""
    first, last = layout.paths[run[0][0]], layout.paths[run[-1][0]]
    start = first[0] if run[0][1] else first[-1]
    end = last[-1] if run[-1][1] else last[0]
    if start == end:
        end = first[1] if run[0][1] else first[-2]
    x, y = left_normal(unit_vector(start, end))
    return y < -1e-6 or (y < 1e-6 and x < 0.0)
