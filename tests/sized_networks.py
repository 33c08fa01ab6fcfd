"""Networks of a wanted size: radial, ring-radial, grid, tree and wandering, for the benchmarks."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable

import networkx as nx
import numpy as np
from generated_networks import network_of, wandering_network

from gtfs_schematic.network.model import Network

_ARMS = 8
_STEP_KM = 0.7


def radial(stations: int, seed: int) -> Network:
    """Make eight arms that fork whenever their distance from the centre has about doubled."""
    return _forking(stations, seed, rings=False)


def ring_radial(stations: int, seed: int) -> Network:
    """Make the same with a ring line just before every fork."""
    return _forking(stations, seed, rings=True)


def grid(stations: int, seed: int) -> Network:
    """Make streets east and north with a line on each, and a stop between every two corners."""
    chance = np.random.default_rng(seed)
    columns = max(2, round(math.sqrt(stations / 3.0)))
    rows = max(2, round(stations / 3.0 / columns))
    east = [[(x, y) for x in range(2 * columns - 1)] for y in range(0, 2 * rows - 1, 2)]
    north = [[(x, y) for y in range(2 * rows - 1)] for x in range(0, 2 * columns - 1, 2)]
    courses = [[f"S{x:03}{y:03}" for x, y in street] for street in east + north]
    spots = sorted({spot for street in east + north for spot in street})
    shaken = chance.normal(0, 0.12, (len(spots), 2)) + np.array(spots)
    places = {
        f"S{x:03}{y:03}": (_STEP_KM * float(e), _STEP_KM * float(n))
        for (x, y), (e, n) in zip(spots, shaken, strict=True)
    }
    return network_of(places, courses)


def tree(stations: int, seed: int) -> Network:
    """Make shortest ways from a centre to random places; a line joins the next by five stops."""
    chance = np.random.default_rng(seed)
    side = max(3, math.ceil(math.sqrt(3.0 * stations)))
    spots = list(itertools.product(range(side), range(side)))
    shaken = chance.normal(0, 0.18, (len(spots), 2)) + np.array(spots)
    at = {spot: (float(x), float(y)) for spot, (x, y) in zip(spots, shaken, strict=True)}
    ground = nx.Graph()
    for x, y in spots:
        for other in ((x + 1, y), (x, y + 1), (x + 1, y + 1), (x + 1, y - 1)):
            if other in at:
                ground.add_edge((x, y), other, length=math.dist(at[x, y], at[other]))
    ways = nx.single_source_dijkstra_path(ground, (side // 2, side // 2), weight="length")
    taken: set[tuple[int, int]] = set()
    courses = []
    for i in chance.permutation(len(spots)):
        way = ways[spots[i]]
        joint = next((k for k in range(len(way) - 1, -1, -1) if way[k] in taken), 0)
        if len(way) - joint > 2:
            courses.append([f"S{x:03}{y:03}" for x, y in way[max(0, joint - 5) :]])
            taken.update(way)
        if len(taken) >= stations:
            break
    places = {f"S{x:03}{y:03}": (_STEP_KM * e, _STEP_KM * n) for (x, y), (e, n) in at.items()}
    return network_of(places, courses)


def wandering(stations: int, seed: int) -> Network:
    """Make lines that wander over a shaken grid and cross with and without stations."""
    side = max(3, round(math.sqrt(1.6 * stations)))
    return wandering_network(seed, side, max(2, round(2.6 * stations / side)), side)


KINDS: dict[str, Callable[[int, int], Network]] = {
    "radial": radial,
    "ring-radial": ring_radial,
    "grid": grid,
    "tree": tree,
    "wandering": wandering,
}
"""By name, how to make a network of about so many stations from a seed."""


def _forking(stations: int, seed: int, *, rings: bool) -> Network:
    chance = np.random.default_rng(seed)
    places = {"C": (0.0, 0.0)}
    tips: list[tuple[float, tuple[str, ...]]]
    tips = [(2.0 * math.pi * arm / _ARMS, ("C",)) for arm in range(_ARMS)]
    courses: list[list[str]] = []
    forks: list[int] = []
    step, fork = 0, 4
    while len(places) < stations:
        step += 1
        if step == fork:
            forks.append(step)
            fork = 2 * fork + 4
            turn = math.pi / len(tips) / 2.0
            tips = [(a + s * turn, way) for a, way in tips for s in (-1, 1)]
        row = []
        for i, (angle, way) in enumerate(tips):
            name = f"R{step:03}A{i:03}"
            places[name] = _polar(
                angle + chance.normal(0, 0.1) * 2.0 * math.pi / len(tips),
                step + chance.normal(0, 0.12),
            )
            row.append(name)
            tips[i] = (angle, (*way, name))
        if rings and step == fork - 1:
            courses.append(_ring(places, row, tips[0][0], step, chance))
    return network_of(places, courses + _lines_of([way for _, way in tips], forks))


def _polar(angle: float, radius: float) -> tuple[float, float]:
    return _STEP_KM * radius * math.cos(angle), _STEP_KM * radius * math.sin(angle)


def _ring(
    places: dict[str, tuple[float, float]],
    row: list[str],
    first: float,
    step: int,
    chance: np.random.Generator,
) -> list[str]:
    """Place the stops of a ring line between the arms; give its course."""
    between = max(0, round(2.0 * math.pi * step / len(row)) - 1)
    course = []
    for i, name in enumerate(row):
        course.append(name)
        for k in range(1, between + 1):
            turn = 2.0 * math.pi * (i + k / (between + 1)) / len(row)
            stop = f"O{step:03}A{i:03}N{k}"
            places[stop] = _polar(first + turn, step + chance.normal(0, 0.12))
            course.append(stop)
    return [*course, row[0]]


def _lines_of(ways: list[tuple[str, ...]], forks: list[int]) -> list[list[str]]:
    """Join opposite ends through the centre; beyond two forks, lines end at the last but one."""
    half = len(ways) // 2
    if len(forks) <= 1:
        return [[*reversed(a), *b[1:]] for a, b in zip(ways[:half], ways[half:], strict=True)]
    inner = list(dict.fromkeys(way[: forks[-1]] for way in ways))
    return _lines_of(inner, forks[:-1]) + [list(way[forks[-2] - 1 :]) for way in ways]
