"""Putting routes in the networks that a feed names."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from functools import partial

from gtfs_schematic.feed.cells import Cell
from gtfs_schematic.feed.model import Route
from gtfs_schematic.feed.tables import Tables

_FILE = "route_networks.txt"


def with_networks(tables: Tables, routes: Mapping[str, Route]) -> dict[str, Route]:
    """Give the routes with the networks of route_networks.txt, if routes.txt names none.

    Both together are forbidden (GTFS Schedule reference, routes.txt, network_id). Where they stand
    together all the same, routes.txt counts, which every reader of the feed knows.
    """
    if not tables.has(_FILE):
        return dict(routes)
    if any(route.network_id for route in routes.values()):
        fault = "networks are given in routes.txt as well; those count, this file does not"
        tables.notebook.find("warning", _FILE, fault)
        return dict(routes)
    networks = _networks_by_route(tables, routes)
    return {i: replace(route, network_id=networks.get(i, "")) for i, route in routes.items()}


def _networks_by_route(tables: Tables, routes: Mapping[str, Route]) -> dict[str, str]:
    known = {ident for _, (ident,) in tables.rows("networks.txt", ("network_id",))}
    networks: dict[str, str] = {}
    for row, (network, route) in tables.rows(_FILE, ("network_id", "route_id")):
        at = partial(Cell, _FILE, row)
        cell, fault = at("route_id", route), ""
        if not network:
            cell, fault = at("network_id", network), "row names no network and does not count"
        elif route not in routes:
            fault = "route is not in routes.txt; the row does not count"
        elif route in networks:
            fault = "route is in a network before; the first row counts"
        else:
            networks[route] = network
            if network not in known:
                cell, fault = at("network_id", network), "network is not in networks.txt; it counts"
        if fault:
            cell.found(tables.notebook, "warning", fault)
    return networks
