"""The hand-drawn networks are octilinear and free of crossings but for those listed."""

from __future__ import annotations

import itertools

import drawn_networks
import pytest
import shapely


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_every_segment_is_octilinear(name: str):
    layout = drawn_networks.ALL[name]()
    for path in (*layout.paths.values(), *layout.walk_paths.values()):
        assert all(bearing % 45.0 == 0.0 for bearing in drawn_networks.bearings(path))


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_links_meet_only_at_stations_and_listed_crossings(name: str):
    layout = drawn_networks.ALL[name]()
    listed = {frozenset((crossing.first, crossing.second)) for crossing in layout.crossings}
    found = set()
    paths = {**layout.paths, **layout.walk_paths}
    for (a, p), (b, q) in itertools.combinations(sorted(paths.items()), 2):
        shared = shapely.MultiPoint(sorted({p[0], p[-1]} & {q[0], q[-1]}))
        meet = shapely.LineString(p).intersection(shapely.LineString(q))
        if not meet.difference(shared).is_empty:
            found.add(frozenset((a, b)))
    assert found == listed


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_corridors_cover_every_link_once(name: str):
    network = drawn_networks.ALL[name]().network
    covered = sorted(link_id for corridor in network.corridors for link_id in corridor.link_ids)
    assert covered == [link.id for link in network.links]
    for corridor in network.corridors:
        assert len(corridor.station_ids) == len(corridor.link_ids) + 1
        for a, b, link_id in zip(
            corridor.station_ids, corridor.station_ids[1:], corridor.link_ids, strict=False
        ):
            assert network.link_between[frozenset((a, b))].id == link_id
