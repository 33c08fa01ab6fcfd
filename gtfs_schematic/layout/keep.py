"""Take over what a previous drawing has: places, paths, and ways through closed stations."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.draft import Draft
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.layout.ways import way_through, ways_of


@dataclass(frozen=True, slots=True)
class Standing:
    """The drawing that stands, millimetres, y down."""

    positions: Mapping[str, Point]
    """Places of its stations."""
    paths: Mapping[str, tuple[Point, ...]]
    """Paths of its links and walks, by any ids: their ends say what they join."""
    frame: SheetFrame
    reach: int | None = None
    """Links from a change within which stations may give way at most; None: all."""
    rotation_deg: float = 0.0
    """Counter-clockwise turn of its ground."""
    angles: int = 45
    """Angle between two of its directions, degrees."""


def keep(draft: Draft, standing: Standing) -> None:
    """Take over places and paths; join the paths of closed stations, divide for opened."""
    positions = standing.positions
    draft.at = {n.id: positions[n.id] for n in draft.network.nodes if n.id in positions}
    old = ways_of(positions, standing.paths)
    gone = set(old) - set(draft.at)
    for edge in draft.edges.values():
        if edge.end in old.get(edge.start, {}):
            draft.path[edge.id] = old[edge.start][edge.end]
    drawn = {frozenset((e.start, e.end)) for e in draft.edges.values()}
    for chain in draft.chains():
        a, b = chain.stations[0], chain.stations[-1]
        way = None
        if len(chain.edges) == 1 or frozenset((a, b)) not in drawn:
            way = way_through(old, gone, a, b)
        if way is not None:
            # A course that the ground no longer bears out must be laid anew.
            stops = draft.obstacles(chain).stations_along(way, len(chain.edges))
            if stops is not None:
                draft.lay(chain, way, stops)
