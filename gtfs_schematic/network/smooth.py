"""Fold links through stations of degree two into corridors, and unfold them again."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Sequence

from gtfs_schematic.network.model import Corridor, Link, Station


def corridors_of(stations: Sequence[Station], links: Sequence[Link]) -> tuple[Corridor, ...]:
    """Fold links into corridors, as long as they can be.

    A corridor runs on through a station if exactly two links meet there, both carry the same
    lines, and no walk does (its interchange group is the station alone). A ring without any
    other kind of station starts and ends at its least station.

    Returns
    -------
    tuple[Corridor, ...]
        Sorted by id, which is the least id of the corridor's links; every link is in exactly one.
    """
    groups = Counter(station.group for station in stations)
    walked = {station.id for station in stations if groups[station.group] > 1}
    around: dict[str, list[Link]] = defaultdict(list)
    for link in sorted(links, key=lambda link: link.id):
        around[link.start].append(link)
        around[link.end].append(link)
    through = {
        station: (pair[0], pair[1])
        for station, pair in around.items()
        if len(pair) == 2 and pair[0].lines == pair[1].lines and station not in walked
    }
    done: set[str] = set()
    corridors: list[Corridor] = []
    ends = [station for station in sorted(around) if station not in through]
    # Stations at which a chain must end come first; what is left then are pure rings.
    for station in [*ends, *sorted(through)]:
        for link in around[station]:
            if link.id not in done:
                corridor = _chain(station, link, through)
                done.update(corridor.link_ids)
                corridors.append(corridor)
    return tuple(sorted(corridors, key=lambda corridor: corridor.id))


def unfold(corridors: Iterable[Corridor]) -> tuple[Link, ...]:
    """Give back exactly the links that `corridors_of` folded, sorted by id."""
    links = [
        Link(link_id, min(a, b), max(a, b), corridor.lines)
        for corridor in corridors
        for link_id, a, b in zip(
            corridor.link_ids, corridor.station_ids, corridor.station_ids[1:], strict=False
        )
    ]
    return tuple(sorted(links, key=lambda link: link.id))


def _chain(start: str, link: Link, through: dict[str, tuple[Link, Link]]) -> Corridor:
    stations, chain = [start], [link]
    while True:
        here = link.end if link.start == stations[-1] else link.start
        stations.append(here)
        if here not in through or here == start:
            break
        one, other = through[here]
        link = other if one is link else one
        chain.append(link)
    if stations[-1] < stations[0] or (stations[-1] == stations[0] and stations[-2] < stations[1]):
        stations.reverse()
        chain.reverse()
    return Corridor(
        id=min(link.id for link in chain),
        station_ids=tuple(stations),
        link_ids=tuple(link.id for link in chain),
        lines=chain[0].lines,
    )
